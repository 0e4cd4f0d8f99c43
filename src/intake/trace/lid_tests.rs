//! Lids: which land, gaps, sags, lids that touch the floor, other halves.

use super::corrected::CorrectedTrace;
use super::groove_problem::GrooveProblem;
use super::groove_traces_tests::{UM, assert_close, codes, cornered, groove, one, plain};
use super::section_options::{LidChoice, SectionOptions};
use super::sections::sections;
use crate::warning::Code;

/// Right land 2 um above the left one.
fn stepped() -> CorrectedTrace {
    let corners = [
        [0.0, 0.0],
        [50.0, 0.0],
        [70.0, -20.0],
        [128.0, -20.0],
        [150.0, 2.0],
        [200.0, 2.0],
    ];
    cornered(&corners, 0.5, &[[0.0, 45.0], [155.0, 200.0]])
}

#[test]
fn lands_that_differ_give_a_warning_and_the_other_lids() {
    let section = plain(&stepped());
    // Below a level of zero: 100 um from edge to edge less 2 um, and the triangle of the slanted lid.
    let low = 0.5 * (98.0 + 58.0) * 20.0;
    assert_close(
        section.outline.area(),
        (low + 0.5 * 98.0 * 2.0 + 0.5 * 2.0 * 2.0 - 0.5 * 2.0 * 2.0) * UM * UM,
        1e-9,
    );
    assert_eq!(codes(&section), [Code::LandsDiffer]);
    let area = |name: &str| {
        let all = &section.lid_alternatives;
        let outline = all.iter().find(|a| a.lid == name).unwrap().outline.as_ref();
        outline.unwrap().area() / UM / UM
    };
    assert_close(area("left"), low, 1e-9);
    // A lid at the right land ends at the left edge: the gap over the left land is solid.
    assert_close(area("right"), low + 0.5 * (98.0 + 100.0) * 2.0, 1e-9);
    assert!((area("fit") - section.outline.area() / UM / UM).abs() < 60.0);
    assert_eq!(section.lid_alternatives.len(), 3);
    let left = one(
        &stepped(),
        &SectionOptions {
            lid: LidChoice::Left,
            ..SectionOptions::default()
        },
    );
    assert_close(left.outline.area() / UM / UM, low, 1e-9);
}

#[test]
fn gaps_and_sags_add_their_areas() {
    let trace = groove(|x| -(x.min(100.0 - x)).min(20.0));
    let area = |gap: f64, sag: f64| {
        let options = SectionOptions {
            lid_gap: gap * UM,
            lid_sag: sag * UM,
            ..SectionOptions::default()
        };
        one(&trace, &options).outline.area() / UM / UM
    };
    assert_close(area(0.0, 0.0), 1600.0, 1e-12);
    assert_close(area(2.0, 0.0), 1800.0, 1e-9);
    assert_close(area(-2.0, 0.0), 1600.0 - 98.0 * 2.0, 1e-9);
    // Circular segment: R^2 a - (R - s) c with tan(a) = c / (R - s).
    let segment = |s: f64| {
        let radius = 0.5 * (2500.0 / s + s);
        radius * radius * 50_f64.atan2(radius - s) - (radius - s) * 50.0
    };
    assert_close(area(0.0, -5.0), 1600.0 + segment(5.0), 1e-5);
    assert_close(area(0.0, 5.0), 1600.0 - segment(5.0), 1e-5);
    assert_close(area(1.0, 1e-6), 1700.0, 1e-6);
    assert_close(
        area(0.0, -50.0),
        1600.0 + 0.5 * std::f64::consts::PI * 2500.0,
        1e-4,
    );
}

#[test]
fn a_lid_may_leave_two_lumens_or_nothing() {
    // A ridge up to 4 um below the land in the middle.
    let trace = groove(|x| {
        -(x.min(100.0 - x))
            .min(20.0)
            .min(4.0 + 0.8 * (x - 50.0).abs())
    });
    let with = |gap: f64, sag: f64| {
        let options = SectionOptions {
            lid_gap: gap * UM,
            lid_sag: sag * UM,
            ..SectionOptions::default()
        };
        sections(&trace, &options)
    };
    let sagging = with(0.0, 6.0).unwrap().remove(0);
    assert_eq!(sagging.outline.lumens.len(), 2);
    assert!(sagging.outline.is_valid());
    // Touching in one point only.
    let touching = with(0.0, 4.0).unwrap().remove(0);
    assert!(
        touching.outline.is_valid(),
        "{}",
        touching.outline.problems()
    );
    assert!(matches!(
        with(-6.0, 0.0),
        Err(GrooveProblem::LidCuts { lumens: 2, .. })
    ));
    assert!(matches!(
        with(-25.0, 0.0),
        Err(GrooveProblem::NoArea { groove: 1 })
    ));
    assert!(matches!(
        with(0.0, 51.0),
        Err(GrooveProblem::SagTooLarge { .. })
    ));
}

#[test]
fn two_halves_face_each_other_with_offset_and_gap() {
    let lower = groove(|x| -(x.min(100.0 - x)).min(20.0));
    // The other half: 60 um wide, steep on its left, measured face up and 30 um further on.
    let corners = [
        [0.0, 0.0],
        [80.0, 0.0],
        [90.0, -10.0],
        [120.0, -10.0],
        [140.0, 0.0],
        [200.0, 0.0],
    ];
    let upper = cornered(&corners, 0.5, &[[0.0, 75.0], [145.0, 200.0]]);
    let with = |offset: f64, gap: f64| {
        let options = SectionOptions {
            lid_trace: Some(Box::new(upper.clone())),
            lid_offset: offset * UM,
            lid_gap: gap * UM,
            ..SectionOptions::default()
        };
        one(&lower, &options)
    };
    let both = 1600.0 + 450.0;
    for (offset, gap) in [
        (0.0, 0.0),
        (5.0, 0.0),
        (-30.0, 0.0),
        (60.0, 0.0),
        (0.0, 2.0),
    ] {
        let section = with(offset, gap);
        assert_close(section.outline.area() / UM / UM, both + gap * 100.0, 1e-9);
        assert!(section.outline.is_valid());
    }
    // At 60 um half of the upper groove lies over the land to the right; its steep side is there too.
    let (low, high) = with(60.0, 0.0).outline.bounds().unwrap();
    assert_close(low[0], 50.0 * UM, 1e-9);
    assert_close(high[0], 190.0 * UM, 1e-9);
    assert_close(high[1], 10.0 * UM, 1e-9);
    let steep = |p: &[f64; 2]| (p[0] / UM - 180.0).abs() < 1e-6 && (p[1] / UM - 10.0).abs() < 1e-6;
    assert!(
        with(60.0, 0.0).outline.lumens[0]
            .outer
            .points
            .iter()
            .any(steep)
    );
    // Apart: two lumens.
    assert_eq!(with(100.0, 0.0).outline.lumens.len(), 2);
}
