//! Sections of synthetic grooves: shapes with exact areas, lids, halves, what is refused, hostile traces.

#![expect(clippy::unwrap_used, reason = "a test stops at the first surprise")]

use proptest::prelude::*;

use super::corrected::CorrectedTrace;
use super::groove_problem::GrooveProblem;
use super::groove_section::GrooveSection;
use super::profile::{Profile, Zone};
use super::section_options::{LidChoice, SectionOptions, Tip};
use super::sections::sections;
use crate::geometry::Outline;
use crate::warning::Code;

const UM: f64 = 1e-6;

/// Height at a position on straight lines between corners, all in micrometres.
fn on_corners(corners: &[[f64; 2]], x: f64) -> f64 {
    let pair = corners.windows(2).find(|pair| x <= pair[1][0]);
    let Some(pair) = pair else {
        return corners.last().unwrap()[1];
    };
    let ([a, from], [b, to]) = (pair[0], pair[1]);
    from + (x - a) / (b - a) * (to - from)
}

/// A trace of a height function from 0 on, micrometres, with its lands.
fn trace(
    length: f64,
    step: f64,
    height: impl Fn(f64) -> f64,
    lands: &[[f64; 2]],
) -> CorrectedTrace {
    let count = (length / step).round() as usize;
    let x: Vec<f64> = (0..=count).map(|i| step * i as f64).collect();
    CorrectedTrace {
        profile: Profile {
            z: x.iter().map(|&x| UM * height(x)).collect(),
            x: x.iter().map(|x| UM * x).collect(),
        },
        lands: lands
            .iter()
            .map(|&[from, to]| Zone {
                from: UM * from,
                to: UM * to,
            })
            .collect(),
        ..CorrectedTrace::default()
    }
}

fn cornered(corners: &[[f64; 2]], step: f64, lands: &[[f64; 2]]) -> CorrectedTrace {
    let length = corners.last().unwrap()[0];
    trace(length, step, |x| on_corners(corners, x), lands)
}

/// Two lands of 50 um with a groove of 100 um between.
fn groove(height: impl Fn(f64) -> f64) -> CorrectedTrace {
    let height = |x: f64| {
        if (50.0..=150.0).contains(&x) {
            height(x - 50.0)
        } else {
            0.0
        }
    };
    trace(200.0, 0.5, height, &[[0.0, 48.0], [152.0, 200.0]])
}

/// The trace as a tip reads it.
fn read_by(tip: Tip, mut trace: CorrectedTrace) -> CorrectedTrace {
    let surface = trace.profile.clone();
    let highest = |at: &f64| {
        let places = surface.x.iter().zip(&surface.z);
        let heights = places.map(|(x, z)| z - tip.height_at(x - at));
        heights.fold(f64::NEG_INFINITY, f64::max)
    };
    trace.profile.z = surface.x.iter().map(highest).collect();
    trace
}

fn one(trace: &CorrectedTrace, options: &SectionOptions) -> GrooveSection {
    let mut all = sections(trace, options).unwrap();
    assert_eq!(all.len(), 1);
    all.remove(0)
}

fn plain(trace: &CorrectedTrace) -> GrooveSection {
    one(trace, &SectionOptions::default())
}

fn cone(radius: f64) -> Tip {
    Tip {
        radius: radius * UM,
        cone_angle: 60_f64.to_radians(),
    }
}

fn assert_close(value: f64, expected: f64, relative: f64) {
    assert!(
        (value / expected - 1.0).abs() <= relative,
        "{value} {expected}"
    );
}

fn codes(section: &GrooveSection) -> Vec<Code> {
    section.warnings.iter().map(|w| w.code).collect()
}

#[test]
fn a_trapezoid_has_its_exact_area_and_few_vertices() {
    let section = plain(&groove(|x| -(x.min(100.0 - x) * 0.8).min(20.0)));
    assert_close(
        section.outline.area(),
        (100.0 + 50.0) / 2.0 * 20.0 * UM * UM,
        1e-12,
    );
    assert_eq!(section.outline.lumens[0].outer.points.len(), 4);
    let n = section.numbers;
    assert_close(n.top_width, 100.0 * UM, 1e-12);
    assert_close(n.middle_width, 75.0 * UM, 1e-12);
    assert_close(n.bottom_width, 50.0 * UM, 1e-12);
    assert_close(n.depth, 20.0 * UM, 1e-12);
    assert_close(n.floor_depth, 20.0 * UM, 1e-12);
    assert_close(n.left_wall.angle, 0.8_f64.atan(), 1e-12);
    assert_close(n.right_wall.angle, 0.8_f64.atan(), 1e-12);
    assert!(n.bow.abs() < 1e-15 && n.left_wall.rms < 1e-15);
    assert_close(n.area, section.outline.area(), 1e-12);
    assert_close(n.aspect_ratio, 0.2, 1e-12);
    assert!(section.warnings.is_empty() && section.reach.is_none());
    assert_eq!(section.lid.z, [0.0, 0.0]);
}

#[test]
fn an_upright_wall_between_two_samples_keeps_its_slope_of_one_sample() {
    let section = plain(&groove(|x| if x > 0.0 && x < 100.0 { -50.0 } else { 0.0 }));
    assert_close(section.outline.area(), 99.5 * 50.0 * UM * UM, 1e-12);
    // Steeper than any common cone: no doubt about the flanks.
    assert!(section.flanks.is_empty());
}

#[test]
fn a_koh_groove_is_recognised_and_its_walls_are_doubted_softly() {
    let slope = 2_f64.sqrt();
    let section = plain(&groove(|x| -(x.min(100.0 - x) * slope).min(30.0)));
    let fit = section.numbers.koh.unwrap();
    // The foot lies between two samples, half a micrometre apart.
    assert_close(fit.top_width, 100.0 * UM, 1e-4);
    assert_close(fit.depth, 30.0 * UM, 1e-4);
    assert!(fit.rms < 0.02 * UM);
    assert!(section.numbers.isotropic.unwrap().rms > 0.5 * UM);
    let warning = &section.warnings[0];
    assert_eq!(warning.code, Code::FlankIsTip);
    assert!(warning.message.contains("KOH"), "{}", warning.message);
    assert!(section.reach.is_some());
    // The same under a cone that would show steeper walls: no doubt.
    let options = SectionOptions {
        tip: Some(cone(0.0)),
        ..SectionOptions::default()
    };
    let section = one(&groove(|x| -(x.min(100.0 - x) * slope).min(30.0)), &options);
    assert!(section.warnings.is_empty() && section.reach.is_none());
}

#[test]
fn an_isotropic_etch_is_recognised_and_no_tip_is_suspected() {
    let (opening, radius) = (40.0, 30.0_f64);
    let height = |x: f64| {
        let aside = ((x - 50.0).abs() - 0.5 * opening).max(0.0);
        -(radius * radius - aside * aside).max(0.0).sqrt()
    };
    let section = plain(&groove(height));
    let fit = section.numbers.isotropic.unwrap();
    // The curve is a polygon through samples half a micrometre apart, and steep at the edges.
    assert_close(fit.mask_opening, opening * UM, 2e-3);
    assert_close(fit.depth, radius * UM, 1e-3);
    assert!(fit.rms < 0.05 * UM && section.numbers.koh.unwrap().rms > 0.5 * UM);
    let exact = (opening * radius + 0.5 * std::f64::consts::PI * radius * radius) * UM * UM;
    assert_close(section.outline.area(), exact, 2e-3);
    assert!(section.warnings.is_empty(), "{:?}", section.warnings);
}

#[test]
fn a_v_has_no_floor_and_a_gaussian_its_area() {
    let section = plain(&groove(|x| -0.7 * x.min(100.0 - x)));
    assert_close(section.outline.area(), 0.5 * 100.0 * 35.0 * UM * UM, 1e-12);
    assert_eq!(section.outline.lumens[0].outer.points.len(), 3);
    assert!(section.numbers.bottom_width < 1e-12);
    let gaussian = groove(|x| -20.0 * ((-(x - 50.0).powi(2) / 200.0).exp() - (-12.5_f64).exp()));
    let exact = 20.0 * (200.0 * std::f64::consts::PI).sqrt() * UM * UM;
    // Its ends are cut where 0.2 % of the depth is left.
    assert_close(plain(&gaussian).outline.area(), exact, 4e-4);
}

#[test]
fn many_grooves_are_numbered_and_each_has_its_own_depth() {
    let height = |x: f64| {
        let (index, at) = ((x / 100.0).floor(), x % 100.0);
        if (30.0..=70.0).contains(&at) {
            -((at - 30.0).min(70.0 - at)).min(2.0 + index)
        } else {
            0.0
        }
    };
    let lands: Vec<[f64; 2]> = (0..=10)
        .map(|i| [f64::from(i) * 100.0 - 28.0, f64::from(i) * 100.0 + 28.0])
        .collect();
    let trace = trace(1000.0, 0.5, height, &lands);
    let all = sections(&trace, &SectionOptions::default()).unwrap();
    assert_eq!(all.len(), 10);
    for (section, index) in all.iter().zip(0..) {
        let depth = 2.0 + f64::from(index);
        assert_eq!(section.number, index as usize + 1);
        assert_close(
            section.outline.area(),
            (40.0 - depth) * depth * UM * UM,
            1e-9,
        );
    }
    let options = SectionOptions {
        groove: Some(7),
        ..SectionOptions::default()
    };
    assert_eq!(one(&trace, &options), all[6]);
    for number in [0, 11] {
        let options = SectionOptions {
            groove: Some(number),
            ..SectionOptions::default()
        };
        let problem = sections(&trace, &options).unwrap_err();
        assert_eq!(problem, GrooveProblem::GrooveNumber { number, count: 10 });
    }
}

#[test]
fn dips_between_two_stated_lands_are_told_apart() {
    let corners = [
        [0.0, 0.0],
        [50.0, 0.0],
        [60.0, -8.0],
        [70.0, 0.0],
        [80.0, 0.0],
        [90.0, -5.0],
        [100.0, 0.0],
        [150.0, 0.0],
    ];
    let all = sections(
        &cornered(&corners, 0.5, &[[0.0, 45.0], [110.0, 150.0]]),
        &SectionOptions::default(),
    )
    .unwrap();
    assert_eq!(all.len(), 2);
    assert_close(all[0].outline.area(), 80.0 * UM * UM, 1e-9);
    assert_close(all[1].outline.area(), 50.0 * UM * UM, 1e-9);
}

#[test]
fn what_stands_above_the_land_is_outside() {
    // Overshoot of 1 um at both edges, as optical profilers show.
    let corners = [
        [0.0, 0.0],
        [48.0, 0.0],
        [50.0, 1.0],
        [52.0, 0.0],
        [60.0, -10.0],
        [140.0, -10.0],
        [148.0, 0.0],
        [150.0, 1.0],
        [152.0, 0.0],
        [200.0, 0.0],
    ];
    let section = plain(&cornered(&corners, 0.5, &[[0.0, 45.0], [155.0, 200.0]]));
    assert_close(section.outline.area(), (96.0 + 80.0) * 5.0 * UM * UM, 1e-12);
    assert_close(section.zone.from, 52.0 * UM, 1e-12);
}

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

#[test]
fn upright_walls_read_by_a_cone_are_restored_and_bracketed() {
    let truth = groove(|x| if x > 0.0 && x < 100.0 { -50.0 } else { 0.0 });
    for radius in [0.0, 2.0, 12.5] {
        let read = read_by(cone(radius), truth.clone());
        let with = |walls: Option<f64>| {
            let options = SectionOptions {
                tip: Some(cone(radius)),
                walls,
                ..SectionOptions::default()
            };
            one(&read, &options)
        };
        let section = with(None);
        assert_eq!(codes(&section), [Code::FlankIsTip]);
        assert_eq!(section.flanks.len(), 2, "{radius}");
        let outer = section
            .reach
            .as_ref()
            .unwrap()
            .outer
            .as_ref()
            .unwrap()
            .outline
            .area();
        assert_close(outer, 5000.0 * UM * UM, 1e-9);
        assert!(section.outline.area() < 4000.0 * UM * UM);
        let upright = with(Some(std::f64::consts::FRAC_PI_2));
        assert_close(upright.outline.area(), 5000.0 * UM * UM, 1e-6);
        let inner = upright.reach.as_ref().unwrap().inner.as_ref().unwrap();
        assert_close(inner.outline.area(), section.outline.area(), 1e-9);
        let slanted = with(Some(80_f64.to_radians()));
        let expected = 5000.0 - 50.0 * 50.0 / 80_f64.to_radians().tan();
        assert_close(slanted.outline.area(), expected * UM * UM, 1e-6);
        // Nothing is restored to flatter than was read.
        let flat = with(Some(40_f64.to_radians()));
        assert_close(flat.outline.area(), section.outline.area(), 1e-9);
    }
}

#[test]
fn an_unknown_tip_is_suspected_where_both_flanks_are_straight_and_alike() {
    let truth = groove(|x| if x > 0.0 && x < 100.0 { -50.0 } else { 0.0 });
    let section = plain(&read_by(cone(0.0), truth.clone()));
    assert_eq!(codes(&section), [Code::FlankIsTip]);
    assert!(section.warnings[0].message.contains("equally steep"));
    let outer = section.reach.unwrap().outer.unwrap().outline.area();
    assert!(
        outer >= 5000.0 * UM * UM * (1.0 - 1e-9) && outer < 5400.0 * UM * UM,
        "{outer}"
    );
}

#[test]
fn a_master_read_by_a_cone_is_bracketed_from_the_other_side() {
    for radius in [0.0, 2.0, 12.5] {
        // A ridge of 100 um by 50 um, read, then turned over.
        let ridge = trace(
            400.0,
            0.5,
            |x| {
                if (150.0..=250.0).contains(&x) {
                    50.0
                } else {
                    0.0
                }
            },
            &[[0.0, 100.0], [300.0, 400.0]],
        );
        let mut read = read_by(cone(radius), ridge);
        read.inverted = true;
        read.profile.z.iter_mut().for_each(|z| *z = -*z);
        let with = |tip: Option<Tip>, walls: Option<f64>| {
            let options = SectionOptions {
                tip,
                walls,
                ..SectionOptions::default()
            };
            one(&read, &options)
        };
        let section = with(Some(cone(radius)), None);
        assert_eq!(codes(&section), [Code::FlankIsTip]);
        let reach = section.reach.as_ref().unwrap();
        assert!(reach.outer.is_none());
        let inner = reach.inner.as_ref().unwrap().outline.area() / UM / UM;
        assert_close(inner, 5000.0, 1e-6);
        assert!(section.outline.area() > 6000.0 * UM * UM);
        let upright = with(Some(cone(radius)), Some(std::f64::consts::FRAC_PI_2));
        assert_close(upright.outline.area(), 5000.0 * UM * UM, 1e-6);
        let outer = upright.reach.unwrap().outer.unwrap().outline.area();
        assert_close(outer, section.outline.area(), 1e-9);
        let slanted = with(Some(cone(radius)), Some(80_f64.to_radians()));
        let expected = 5000.0 + 50.0 * 50.0 / 80_f64.to_radians().tan();
        assert_close(slanted.outline.area(), expected * UM * UM, 1e-6);
        let unknown = with(None, None);
        if radius < 3.0 {
            let inner = unknown.reach.unwrap().inner.unwrap().outline.area() / UM / UM;
            assert!(inner <= 5000.0 * (1.0 + 1e-9) && inner > 4000.0, "{inner}");
        }
    }
}

#[test]
fn a_tip_touched_the_size_that_was_measured() {
    let truth = groove(|x| if x > 0.0 && x < 100.0 { -50.0 } else { 0.0 });
    let mut read = read_by(cone(2.0), truth);
    for x in &mut read.profile.x {
        *x *= 0.9;
    }
    for z in &mut read.profile.z {
        *z *= 1.1;
    }
    for land in &mut read.lands {
        (land.from, land.to) = (0.9 * land.from, 0.9 * land.to);
    }
    read.shrinkage = [0.1, -0.1];
    let options = SectionOptions {
        tip: Some(cone(2.0)),
        ..SectionOptions::default()
    };
    let section = one(&read, &options);
    let outer = section.reach.unwrap().outer.unwrap().outline.area();
    assert_close(outer, 0.99 * 5000.0 * UM * UM, 1e-6);
}

#[test]
fn a_floor_that_no_tip_touched_has_no_largest_section() {
    let truth = groove(|x| if x > 30.0 && x < 70.0 { -80.0 } else { 0.0 });
    for radius in [0.0, 5.0] {
        let options = SectionOptions {
            tip: Some(cone(radius)),
            walls: Some(std::f64::consts::FRAC_PI_2),
            ..SectionOptions::default()
        };
        let section = one(&read_by(cone(radius), truth.clone()), &options);
        assert!(section.reach.is_none());
        assert!(section.flanks.iter().any(|f| f.is_bottomless));
        assert!(section.warnings[0].message.contains("no floor was touched"));
        assert!(
            section
                .steps
                .iter()
                .any(|s| s.text.contains("were not drawn"))
        );
    }
}

#[test]
fn grooves_that_run_off_the_trace_are_counted_and_named() {
    let height = |x: f64| {
        let at = |from: f64| (50.0 <= x - from && x - from <= 90.0) as u8;
        let depth = |from: f64| (x - from - 50.0).min(90.0 - x + from).min(10.0);
        -[-70.0, 60.0, 160.0]
            .map(|from| f64::from(at(from)) * depth(from))
            .iter()
            .sum::<f64>()
    };
    let trace = trace(230.0, 0.5, height, &[[24.0, 105.0], [155.0, 205.0]]);
    let all = sections(&trace, &SectionOptions::default()).unwrap();
    assert_eq!(all.len(), 1);
    assert_eq!(all[0].number, 2);
    assert_eq!(codes(&all[0]), [Code::GrooveLeftOut]);
    let options = SectionOptions {
        groove: Some(3),
        ..SectionOptions::default()
    };
    let problem = sections(&trace, &options).unwrap_err();
    assert!(
        problem.to_string().contains("cut off by the end"),
        "{problem}"
    );
}

#[test]
fn traces_without_a_groove_are_refused_with_a_hint() {
    let lands = [[0.0, 45.0], [155.0, 200.0]];
    let flat = trace(200.0, 0.5, |_| 0.0, &lands);
    let refused = |t: &CorrectedTrace| sections(t, &SectionOptions::default()).unwrap_err();
    assert!(matches!(refused(&flat), GrooveProblem::NoGroove { .. }));
    let ridge = trace(
        200.0,
        0.5,
        |x| {
            if (60.0..140.0).contains(&x) {
                20.0
            } else {
                0.0
            }
        },
        &lands,
    );
    assert!(matches!(refused(&ridge), GrooveProblem::Ridges { .. }));
    assert!(refused(&ridge).hint().contains("--invert"));
    let ramp = trace(200.0, 0.5, |x| 0.1 * x, &lands);
    assert!(
        matches!(refused(&ramp), GrooveProblem::NoGroove { .. }),
        "{:?}",
        refused(&ramp)
    );
    let no_lands = trace(200.0, 0.5, |x| -(x.min(200.0 - x)), &[]);
    assert!(matches!(
        refused(&no_lands),
        GrooveProblem::NoLands { lands: 0, .. }
    ));
    let one_land = trace(200.0, 0.5, |x| -(x.min(200.0 - x)), &[[190.0, 200.0]]);
    assert!(matches!(
        refused(&one_land),
        GrooveProblem::NoLands { lands: 1, .. }
    ));
    let one_sample = trace(
        200.0,
        0.5,
        |x| if (x - 100.0).abs() < 0.1 { -20.0 } else { 0.0 },
        &lands,
    );
    assert!(matches!(
        refused(&one_sample),
        GrooveProblem::NoneUsable { .. }
    ));
    let mut broken = flat.clone();
    broken.profile.z[7] = f64::NAN;
    assert!(matches!(
        refused(&broken),
        GrooveProblem::Profile { sample: 8, .. }
    ));
    broken.profile.z.truncate(2);
    assert!(matches!(refused(&broken), GrooveProblem::Profile { .. }));
    assert!(matches!(
        refused(&CorrectedTrace::default()),
        GrooveProblem::Profile { .. }
    ));
}

#[test]
fn options_out_of_range_are_refused_by_name() {
    let trace = groove(|x| -(x.min(100.0 - x)).min(20.0));
    let cases = [
        (
            SectionOptions {
                tip: Some(Tip {
                    radius: -1.0,
                    cone_angle: 1.0,
                }),
                ..SectionOptions::default()
            },
            "--tip-radius",
        ),
        (
            SectionOptions {
                tip: Some(Tip {
                    radius: 0.0,
                    cone_angle: 0.0,
                }),
                ..SectionOptions::default()
            },
            "--tip-angle",
        ),
        (
            SectionOptions {
                walls: Some(2.0),
                ..SectionOptions::default()
            },
            "--walls",
        ),
        (
            SectionOptions {
                lid_gap: f64::NAN,
                ..SectionOptions::default()
            },
            "--lid-gap",
        ),
    ];
    for (options, name) in cases {
        let problem = sections(&trace, &options).unwrap_err();
        assert!(problem.to_string().starts_with(name), "{problem}");
    }
}

/// Everything a caller relies on, for any trace.
fn assert_sound(section: &GrooveSection) {
    let valid = |outline: &Outline| assert!(outline.is_valid(), "{}", outline.problems());
    valid(&section.outline);
    assert!(section.outline.area() > 0.0 && section.zone.from < section.zone.to);
    assert!(section.lid.x.windows(2).all(|x| x[0] < x[1]));
    assert_eq!(section.surface.x.len(), section.is_touched.len());
    for alternative in &section.lid_alternatives {
        alternative.outline.iter().for_each(valid);
    }
    if let Some(reach) = &section.reach {
        assert!(reach.inner.is_some() || reach.outer.is_some());
        if let Some(outer) = &reach.outer {
            valid(&outer.outline);
            section.outline.proven_inside(&outer.outline).unwrap();
        }
        if let Some(inner) = &reach.inner {
            valid(&inner.outline);
            inner.outline.proven_inside(&section.outline).unwrap();
        }
    }
}

/// Options of every kind.
fn any_options() -> impl Strategy<Value = SectionOptions> {
    let tip = proptest::option::of((0.0..20.0_f64, 5.0..170.0_f64));
    let walls = proptest::option::of(5.0..90.0_f64);
    let lid = (0..4_usize, -3.0..3.0_f64, -3.0..3.0_f64, any::<bool>());
    (tip, walls, lid, proptest::option::of(0.0..0.5_f64)).prop_map(|(tip, walls, lid, simplify)| {
        SectionOptions {
            tip: tip.map(|(radius, angle)| Tip {
                radius: radius * UM,
                cone_angle: angle.to_radians(),
            }),
            walls: walls.map(f64::to_radians),
            lid: LidChoice::ALL[lid.0],
            lid_gap: if lid.3 { lid.1 * UM } else { 0.0 },
            lid_sag: if lid.3 { 0.0 } else { lid.2 * UM },
            simplify: simplify.map(|s| s * UM),
            ..SectionOptions::default()
        }
    })
}

/// Heights of any kind: rounded (so that samples lie on each other's levels), with lands at zero and without.
fn any_trace() -> impl Strategy<Value = CorrectedTrace> {
    let heights = proptest::collection::vec(-30..4_i32, 4..80);
    let noise = proptest::collection::vec(-1.0..1.0_f64, 100);
    let kind = (any::<bool>(), any::<bool>());
    (heights, noise, 0.0..0.3_f64, 0.0..2.0_f64, kind).prop_map(
        |(heights, noise, size, step, (by_tip, inverted))| {
            let lands = if by_tip { 10 } else { 4 };
            let mut z = vec![0.0; lands];
            z.extend(heights.iter().map(|&h| f64::from(h.min(0)) + step));
            z.extend(vec![step; lands]);
            let spacing = |i: usize| i as f64 * 1.3 + 1e-4 * (i as f64).sqrt();
            let x: Vec<f64> = (0..z.len()).map(|i| spacing(i) * UM).collect();
            for (height, noise) in z.iter_mut().zip(noise.iter().cycle()) {
                *height = (*height + size * noise) * UM;
            }
            let zone = |from: usize, to: usize| Zone {
                from: x[from],
                to: x[to],
            };
            let lands = vec![zone(0, lands - 1), zone(z.len() - lands, z.len() - 1)];
            let trace = CorrectedTrace {
                lands,
                profile: Profile { x: x.clone(), z },
                inverted,
                ..CorrectedTrace::default()
            };
            if by_tip {
                read_by(cone(3.0), trace)
            } else {
                trace
            }
        },
    )
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(300))]
    #[test]
    fn every_section_of_a_hostile_trace_is_valid_and_nested(trace in any_trace(), options in any_options()) {
        match sections(&trace, &options) {
            Ok(all) => all.iter().for_each(assert_sound),
            Err(problem) => {
                prop_assert!(!matches!(problem, GrooveProblem::Polygon { .. }), "{problem}");
                prop_assert!(!problem.hint().is_empty());
            }
        }
    }

    #[test]
    fn two_hostile_halves_give_valid_sections(
        lower in any_trace(), upper in any_trace(), options in any_options(), offset in -40.0..40.0_f64,
    ) {
        let options = SectionOptions {
            lid_trace: Some(Box::new(upper)),
            lid_offset: offset * UM,
            lid_sag: 0.0,
            ..options
        };
        match sections(&lower, &options) {
            Ok(all) => all.iter().for_each(assert_sound),
            Err(problem) => prop_assert!(!matches!(problem, GrooveProblem::Polygon { .. }), "{problem}"),
        }
    }

    #[test]
    fn any_heights_and_lands_at_all_end_in_a_section_or_an_error(
        z in proptest::collection::vec(-1.0..1.0_f64, 0..60),
        lands in proptest::collection::vec((-10.0..70.0_f64, -10.0..70.0_f64), 0..5),
        kind in 0..4_u8,
    ) {
        let x: Vec<f64> = (0..z.len()).map(|i| i as f64 * UM).collect();
        let z: Vec<f64> = z.iter().enumerate().map(|(i, &z)| UM * match kind {
            0 => z,
            1 => if i % 2 == 0 { 0.0 } else { -1.0 },
            2 => i as f64,
            _ => z.round(),
        }).collect();
        let lands = lands.iter().map(|&(from, to)| Zone { from: from * UM, to: to * UM }).collect();
        let trace = CorrectedTrace { lands, profile: Profile { x, z }, ..CorrectedTrace::default() };
        if let Ok(all) = sections(&trace, &SectionOptions::default()) {
            all.iter().for_each(assert_sound);
        }
    }
}
