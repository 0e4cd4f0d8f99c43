//! Shapes with exact areas, where grooves are, and what is refused.

use super::corrected::CorrectedTrace;
use super::groove_problem::GrooveProblem;
use super::groove_traces_tests::{
    UM, assert_close, codes, cone, cornered, groove, one, plain, trace,
};
use super::section_options::{SectionOptions, Tip};
use super::sections::sections;
use crate::warning::Code;

#[test]
fn a_trapezoid_has_its_exact_area_and_few_vertices() {
    let section = plain(&groove(|x| -(x.min(100.0 - x) * 0.8).min(20.0)));
    assert_close(section.outline.area(), 75.0 * 20.0 * UM * UM, 1e-12);
    assert_eq!(section.outline.lumens[0].outer.points.len(), 4);
    let n = section.numbers;
    assert_close(n.top_width, 100.0 * UM, 1e-12);
    assert_close(n.opening_width, 100.0 * UM, 1e-12);
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
    // Its tails level off where they are 0.4 % of the depth deep.
    assert_close(plain(&gaussian).outline.area(), exact, 3e-3);
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

#[test]
fn grooves_that_run_off_the_trace_are_counted_and_named() {
    let height = |x: f64| {
        let at = |from: f64| u8::from((50.0..=90.0).contains(&(x - from)));
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
        (
            SectionOptions {
                simplify: Some(1.0),
                ..SectionOptions::default()
            },
            "--simplify: 1.000 m is not possible: at most a fiftieth of the depth",
        ),
    ];
    for (options, name) in cases {
        let problem = sections(&trace, &options).unwrap_err();
        assert!(problem.to_string().starts_with(name), "{problem}");
    }
}

#[test]
fn an_edge_below_a_drifting_land_stays_where_the_wall_ends() {
    // The lands rise by 0.4 um away from the groove, as drift leaves them.
    let corners = [
        [0.0, 0.4],
        [50.0, 0.0],
        [70.0, -20.0],
        [130.0, -20.0],
        [150.0, 0.0],
        [200.0, 0.4],
    ];
    let section = plain(&cornered(&corners, 0.5, &[[0.0, 45.0], [155.0, 200.0]]));
    assert_close(section.zone.from, 50.0 * UM, 1e-9);
    assert_close(section.zone.to, 150.0 * UM, 1e-9);
    // The lid lies on the nearby land, 0.2 to 0.3 um above the edges.
    let area = section.outline.area() / UM / UM;
    assert!((1600.0..1635.0).contains(&area), "{area}");
}
