//! First-order changes of the conductance against central differences of new solves, closed forms and series.
//!
//! Differences are taken as a share of what all moving walls do together in absolute value, which is the
//! sensitivity itself wherever no part of the motion works against another.

#![expect(clippy::unwrap_used, reason = "a test stops at the first surprise")]

use std::path::Path;
use std::time::Instant;

use etchwise::flow::closed_form::{concentric_annulus, rectangle};
use etchwise::flow::{SolveOptions, solve_outline};
use etchwise::geometry::{NamedWall, NominalSpec, Outline, wall_stretches};
use etchwise::intake::{ReadOptions, read_section};
use etchwise::study::{
    FirstOrderRange, NoCheck, Sensitivity, SensitivityOptions, SensitivityStudy, moved_outline,
    sensitivity_study, solve_for_sensitivity, wall_motions,
};
use etchwise::warning::Code;

/// Sections drawn from parameters.
const DRAWN: [&str; 10] = [
    "rectangle width=100um height=40um",
    "rectangle width=100um height=100um",
    "trapezoid top_width=100um depth=50um left_angle=80deg right_angle=60deg",
    "koh_groove opening=100um depth=40um",
    "isotropic_etch mask_opening=100um depth=50um",
    "circle diameter=100um",
    "ellipse width=100um height=60um",
    "annulus outer_diameter=200um inner_diameter=80um",
    "rounded_rectangle width=200um height=100um radius=20um",
    "half_ellipse width=100um depth=40um",
];
/// Shipped outlines of invented wafers, rough and with more than a hundred vertices; one has two lumens.
const MADE: [&str; 4] = [
    "shapes/made/glass_etch_station_1.toml",
    "shapes/made/two_lumens.toml",
    "shapes/made/koh_rounded.toml",
    "shapes/outlines/plasma_etch.csv",
];
/// Largest share by which a prediction may differ from new solves.
const THOUSANDTH: f64 = 1e-3;
/// What new solves scatter by, relative to `K`: seen on curved walls with a step smaller than the grid.
const SCATTER: f64 = 1.5e-6;

fn drawn(text: &str) -> Outline {
    let spec: NominalSpec = text.parse().unwrap();
    spec.outline().unwrap()
}

fn made(path: &str) -> Outline {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join(path);
    let section = read_section(&path, &ReadOptions::default()).unwrap();
    section.outline.without_duplicate_vertices().0.oriented()
}

/// An L of 80 um by 80 um with arms 40 um wide: one re-entrant corner of 270 degrees.
fn l_shape() -> Outline {
    let u = 40e-6;
    Outline::single(vec![
        [0.0, 0.0],
        [2.0 * u, 0.0],
        [2.0 * u, u],
        [u, u],
        [u, 2.0 * u],
        [0.0, 2.0 * u],
    ])
}

fn study(outline: &Outline, check: bool) -> SensitivityStudy {
    let solved = solve_for_sensitivity(outline, &SolveOptions::default()).unwrap();
    sensitivity_study(&solved, &[], options(check))
}

/// Without a limit on time.
fn options(check: bool) -> SensitivityOptions {
    SensitivityOptions { check, until: None }
}

fn relative(study: &SensitivityStudy, name: &str) -> f64 {
    study.case(name).unwrap().relative
}

/// Prediction against new solves of every case: shares allowed where the whole section moves, and for the other
/// cases on top of the scatter.
fn assert_checked(name: &str, study: &SensitivityStudy, [whole_section, single_walls]: [f64; 2]) {
    assert!(study.cases.len() >= 10, "{name}");
    for case in &study.cases {
        let check = case.check.as_ref().unwrap();
        let off = case.check_difference().unwrap();
        let whole = ["scale", "depth", "width", "over_etch", "film"].contains(&case.name.as_str());
        let allowed = if whole {
            whole_section
        } else {
            single_walls + SCATTER / (check.step * case.gross)
        };
        assert!(
            off.abs() <= allowed,
            "{name}, {}: {} against {}, off by {off:.1e}",
            case.name,
            case.relative,
            check.first_order
        );
    }
}

#[test]
fn predictions_are_within_a_thousandth_of_new_solves_on_eleven_sections() {
    let mut sections: Vec<(&str, Outline)> =
        DRAWN.iter().map(|text| (*text, drawn(text))).collect();
    sections.push(("L-shape", l_shape()));
    for (text, outline) in sections {
        let study = study(&outline, true);
        assert_checked(text, &study, [THOUSANDTH; 2]);
        assert!(
            !study
                .warnings
                .iter()
                .any(|w| w.code == Code::SensitivityMismatch),
            "{text}"
        );
    }
}

#[test]
fn rough_outlines_stay_within_a_thousandth_as_a_whole_and_a_per_cent_wall_by_wall() {
    for path in MADE {
        assert_checked(path, &study(&made(path), true), [THOUSANDTH, 0.01]);
    }
    let study = study(&l_shape(), false);
    assert!(
        study
            .warnings
            .iter()
            .any(|w| w.code == Code::SensitivitySingular)
    );
}

#[test]
fn depth_and_width_make_up_the_scale_and_moving_the_section_does_nothing() {
    for text in DRAWN {
        let study = study(&drawn(text), false);
        assert!(
            (study.stretch_sum / 4.0 - 1.0).abs() < 2e-4,
            "{text}: {}",
            study.stretch_sum
        );
        let scale = relative(&study, "scale");
        assert!((scale - study.stretch_sum).abs() < 1e-12, "{text}");
        for moved in study.shift {
            assert!(moved.abs() < 1e-4, "{text}: {moved}");
        }
        let film = relative(&study, "film");
        let sides: f64 = ["lid", "floor", "left", "right"]
            .iter()
            .filter_map(|name| study.case(name))
            .map(|case| case.relative)
            .sum();
        assert!((sides + film).abs() < 1e-12 * film.abs(), "{text}");
    }
}

/// Central difference of a function, relative to its value.
fn slope(f: impl Fn(f64) -> f64, step: f64) -> f64 {
    (f(step) - f(-step)) / (2.0 * step * f(0.0))
}

fn assert_close(found: f64, exact: f64, tolerance: f64) {
    let off = found / exact - 1.0;
    assert!(off.abs() <= tolerance, "{found} against {exact}: {off:.1e}");
}

#[test]
fn a_rectangle_follows_the_derivatives_of_its_series() {
    let (w, h) = (100e-6, 40e-6);
    let study = study(&drawn("rectangle width=100um height=40um"), false);
    let k = |w: f64, h: f64| rectangle(w, h).unwrap().conductance;
    let depth = slope(|q| k(w, h * (1.0 + q)), 1e-4);
    let width = slope(|q| k(w * (1.0 + q), h), 1e-4);
    assert_close(relative(&study, "depth"), depth, 2e-4);
    assert_close(relative(&study, "width"), width, 2e-4);
    assert_close(
        study.case("depth").unwrap().per_metre().unwrap(),
        depth / h,
        2e-4,
    );
    let film = slope(|q| k(w - 2.0 * q, h - 2.0 * q), 1e-9);
    assert_close(relative(&study, "film"), film, 2e-4);
    assert_close(relative(&study, "floor"), depth / h, 2e-4);
    assert_close(relative(&study, "lid_gap"), depth / h, 2e-4);
    assert_close(relative(&study, "right"), width / w, 2e-4);
}

#[test]
fn circle_ellipse_and_annulus_follow_their_closed_forms() {
    // K = pi R^4 / 8.
    let circle = study(&drawn("circle diameter=100um"), false);
    assert_close(relative(&circle, "over_etch"), 4.0 / 50e-6, 1e-4);
    assert_close(relative(&circle, "left"), 1.0 / 50e-6, 1e-4);

    // K = pi a^3 b^3 / (4 (a^2 + b^2)); on the wall (dphi/dn)^2 = (a b / (a^2 + b^2))^2 (a^2 sin^2 + b^2 cos^2).
    let (a, b) = (50e-6_f64, 30e-6_f64);
    let sum = a * a + b * b;
    let ellipse = study(&drawn("ellipse width=100um height=60um"), false);
    assert_close(relative(&ellipse, "width"), 3.0 - 2.0 * a * a / sum, 1e-4);
    assert_close(relative(&ellipse, "depth"), 3.0 - 2.0 * b * b / sum, 1e-4);
    let places = 1000_u32;
    let mean: f64 = (0..places)
        .map(|k| std::f64::consts::TAU * f64::from(k) / f64::from(places))
        .map(|t| ((a * t.sin()).powi(2) + (b * t.cos()).powi(2)).powf(1.5))
        .sum::<f64>()
        / f64::from(places);
    let around = std::f64::consts::TAU * mean * (a * b / sum).powi(2);
    let k = std::f64::consts::PI * (a * b).powi(3) / (4.0 * sum);
    assert_close(relative(&ellipse, "film"), -around / k, 1e-4);

    let annulus = study(
        &drawn("annulus outer_diameter=200um inner_diameter=80um"),
        false,
    );
    let k = |q: f64| {
        concentric_annulus(100e-6 + q, 40e-6 - q)
            .unwrap()
            .conductance
    };
    assert_close(relative(&annulus, "over_etch"), slope(k, 1e-9), 1e-4);
}

#[test]
fn the_second_order_says_where_the_first_is_not_enough() {
    let study = study(&drawn("circle diameter=100um"), true);
    let case = |name: &str| study.case(name).unwrap();
    let up_to = |case: &Sensitivity, resistance: bool| {
        let check = case.check.as_ref().unwrap();
        let reach = if resistance {
            check.reach_for_resistance()
        } else {
            check.reach_for_conductance()
        };
        match reach {
            FirstOrderRange::UpTo(change) => change,
            FirstOrderRange::AtLeast(change) => panic!("only at least {change}"),
        }
    };
    // K goes with R^4: the second-order term of q is 3 q / (2 R) of the first, and 5 q / (2 R) for 1/K.
    assert_close(up_to(case("scale"), false), 0.2 / 3.0, 1e-3);
    assert_close(up_to(case("scale"), true), 0.2 / 5.0, 1e-3);
    assert_close(up_to(case("film"), false), 50e-6 * 0.2 / 3.0, 0.02);
    assert_close(up_to(case("film"), true), 50e-6 * 0.2 / 5.0, 0.02);
    // The width of a wide rectangle acts almost in proportion.
    let rectangle = self::study(&drawn("rectangle width=100um height=40um"), true);
    let width = rectangle.case("width").unwrap().check.as_ref().unwrap();
    assert!(matches!(width.reach_for_conductance(), FirstOrderRange::AtLeast(q) if q > 0.2));
}

/// `dn_w` and the moved outline are two uses of one motion: the area must agree.
#[test]
fn the_area_swept_by_every_motion_is_the_integral_of_its_outward_speed() {
    let mut outlines: Vec<Outline> = DRAWN.iter().map(|text| drawn(text)).collect();
    outlines.extend(MADE.map(made));
    outlines.push(l_shape());
    let mut seen = 0;
    for outline in outlines {
        let size = outline.area().sqrt();
        for motion in wall_motions(&outline, &[], 0.0).cases.into_iter().flatten() {
            let mut swept = 0.0;
            for (index, wall) in outline.loops().enumerate() {
                for (edge, (a, b)) in wall.edges().enumerate() {
                    let (x, y) = (b[0] - a[0], b[1] - a[1]);
                    let length = x.hypot(y);
                    let normal = [y / length, -x / length];
                    let ends = [a, b].map(|p| motion.outward_speed(index, edge, p, normal));
                    swept += 0.5 * length * (ends[0] + ends[1]);
                }
            }
            // A small change in its own unit, relative to the size of the section.
            let step = if motion.measure.unit() == "m" {
                1e-6 * size
            } else {
                1e-6
            };
            let [minus, plus] = [-step, step].map(|q| moved_outline(&outline, &motion, q).unwrap());
            let difference = (plus.outline.area() - minus.outline.area()) / (2.0 * step);
            let scale = if motion.measure.unit() == "m" {
                size
            } else {
                size * size
            };
            assert!(
                (swept - difference).abs() < 1e-5 * scale,
                "{}: {swept} {difference}",
                motion.name
            );
            seen += 1;
        }
    }
    assert!(seen > 150, "{seen}");
}

#[test]
fn a_change_that_the_outline_does_not_allow_is_refused() {
    let outline = drawn("rectangle width=100um height=40um");
    let motions = wall_motions(&outline, &[], 0.0);
    let film = motions
        .cases
        .iter()
        .flatten()
        .find(|motion| motion.name == "film")
        .unwrap();
    assert!(moved_outline(&outline, film, 19e-6).is_ok());
    assert!(moved_outline(&outline, film, 21e-6).is_err());
    // A film of 1 um leaves 98 um by 38 um.
    let moved = moved_outline(&outline, film, 1e-6).unwrap();
    assert_close(moved.outline.area(), 98e-6 * 38e-6, 1e-12);
    assert!(moved.highest_step <= 0.0);
}

#[test]
fn a_section_without_a_floor_says_so() {
    let study = study(&drawn("koh_groove opening=100um depth=70.7106781um"), false);
    let solved = solve_outline(
        &drawn("triangle base=100um left_angle=50deg right_angle=50deg"),
        &SolveOptions::default(),
    )
    .unwrap();
    let triangle = sensitivity_study(&solved, &[], options(false));
    for study in [study, triangle] {
        assert!(study.case("floor").is_none());
        let [none] = &study.absent[..] else {
            panic!("{:?}", study.absent);
        };
        assert_eq!(none.name, "floor");
        assert!(none.reason.contains("45 degrees"));
    }
}

#[test]
fn a_wall_with_a_name_has_a_case_of_its_own() {
    let u = 1e-6;
    let outline = Outline::single(vec![
        [0.0, 0.0],
        [100.0 * u, 0.0],
        [100.0 * u, 40.0 * u],
        [0.0, 40.0 * u],
    ]);
    let wall = |name: &str, ends| NamedWall {
        name: name.to_owned(),
        loop_number: 1,
        ends: Some(ends),
    };
    // The floor in two parts, the second from the first corner of the outline backwards round it.
    let named = [
        wall("heated", [[30.0 * u, 0.0], [100.0 * u, 0.0]]),
        wall("bank", [[0.0, 40.0 * u], [30.0 * u, 0.0]]),
    ];
    let walls = wall_stretches(&outline, &named).unwrap();
    let solved = solve_for_sensitivity(&outline, &SolveOptions::default()).unwrap();
    let study = sensitivity_study(&solved, &walls, options(true));
    let heated = study.case("wall heated").unwrap();
    let bank = study.case("wall bank").unwrap();
    for case in [heated, bank] {
        let off = case.check_difference().unwrap();
        assert!(off.abs() < THOUSANDTH, "{}: {off:.1e}", case.name);
    }
    let both = heated.relative + bank.relative;
    let sides = relative(&study, "floor") + relative(&study, "left");
    assert_close(both, sides, 1e-6);
    assert!(heated.relative > bank.relative);
}

#[test]
fn checks_that_would_end_too_late_are_not_begun() {
    let solved = solve_for_sensitivity(&drawn(DRAWN[1]), &SolveOptions::default()).unwrap();
    let options = SensitivityOptions {
        check: true,
        until: Some(Instant::now()),
    };
    let study = sensitivity_study(&solved, &[], options);
    assert!(study.check_grid.is_none());
    assert!(!study.cases.is_empty());
    for case in &study.cases {
        assert_eq!(case.check, Err(NoCheck::Time), "{}", case.name);
        assert!(case.relative.is_finite(), "{}", case.name);
    }
}
