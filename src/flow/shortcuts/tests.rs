//! Errors of the shortcut formulas against computed references.

use super::*;
use crate::flow::closed_form;
use crate::geometry::{Loop, Lumen, Outline};

fn rectangle(width: f64, height: f64) -> Outline {
    Outline::single(vec![
        [0.0, 0.0],
        [width, 0.0],
        [width, height],
        [0.0, height],
    ])
}

/// Flat bottom of width `mask`, quarter circles of radius `depth` up to a flat lid.
fn isotropic(mask: f64, depth: f64) -> Outline {
    let steps = 2000;
    let quarter = |i: i32| std::f64::consts::FRAC_PI_2 * f64::from(i) / f64::from(steps);
    let mut points = Vec::new();
    for i in 0..=steps {
        let (sin, cos) = quarter(i).sin_cos();
        points.push([-0.5 * mask - depth * cos, -depth * sin]);
    }
    for i in (0..=steps).rev() {
        let (sin, cos) = quarter(i).sin_cos();
        points.push([0.5 * mask + depth * cos, -depth * sin]);
    }
    if mask <= 0.0 {
        points.dedup();
    }
    Outline::single(points)
}

fn regular(sides: u32) -> Outline {
    Outline::single(
        (0..sides)
            .map(|i| {
                let (sin, cos) = (2.0 * PI * f64::from(i) / f64::from(sides)).sin_cos();
                [cos, sin]
            })
            .collect(),
    )
}

fn named<'a>(rows: &'a [ShortcutRow], part: &str) -> &'a ShortcutRow {
    rows.iter().find(|row| row.name.contains(part)).unwrap()
}

/// Error of R in per cent.
fn percent(outline: &Outline, conductance: f64, part: &str) -> f64 {
    100.0
        * named(&shortcuts(outline, conductance), part)
            .resistance_error
            .unwrap()
}

#[test]
fn an_isotropic_etch_drawn_as_a_rectangle_is_off_as_computed() {
    // Computed reference: K at depth 1 by a rational-approximation Laplace solver (1e-9); the factors are
    // those of exact rectangles (series) on top width, mean of top and bottom width, equal-area width.
    let table = [
        (1.0, 0.156_466_169_9, 1.262, 0.731, 1.0337),
        (2.0, 0.239_745_646, 1.171, 0.824, 1.0221),
        (5.0, 0.489_743_214_3, 1.084, 0.914, 1.0108),
        (20.0, 1.739_743_214, 1.024, 0.976, 1.0030),
    ];
    for (mask, solved, top, mean, equal_area) in table {
        let rows = shortcuts(&isotropic(mask, 1.0), solved);
        for (part, factor, half_digit) in [
            ("top width", top, 5e-4),
            ("mean of top and bottom", mean, 5e-4),
            ("equal-area", equal_area, 5e-5),
        ] {
            let row = named(&rows, part);
            let width = match part {
                "top width" => mask + 2.0,
                "equal-area" => mask + PI / 2.0,
                _ => mask + 1.0,
            };
            let exact = closed_form::rectangle(width, 1.0).unwrap().conductance;
            assert!(
                (exact / solved - factor).abs() < half_digit * 1.02,
                "{mask} {part}"
            );
            // The 0.63 form itself is within 0.2 % of the exact rectangle for h/w up to 0.5.
            let given = row.conductance.unwrap() / solved;
            assert!(
                (given / factor - 1.0).abs() < 2e-3 + half_digit,
                "{mask} {part} {given}"
            );
            let error = row.resistance_error.unwrap();
            assert!((error - (1.0 / given - 1.0)).abs() < 1e-12);
        }
    }
    // m/d = 1 in full: the numbers that a person would read.
    let rows = shortcuts(&isotropic(1.0, 1.0), 0.156_466_169_9);
    let factor = |part| 1.0 / (1.0 + named(&rows, part).resistance_error.unwrap());
    assert!((factor("top width") - 1.262).abs() < 5e-4);
    assert!((factor("equal-area") - 1.0337).abs() < 5e-4);
    // At half height the quarter circles are wider than the mean of top and bottom: m + sqrt(3) d.
    let width = 1.0 + 3.0_f64.sqrt();
    let expected = (width - 0.63) / 12.0 / 0.156_466_169_9;
    assert!((factor("mid-height") / expected - 1.0).abs() < 1e-6);
}

#[test]
fn the_linear_rectangle_form_is_off_as_computed() {
    // Error of R against the exact series, in per cent.
    for (aspect, expected, digit) in [
        (1.0, 14.0, 0.05),
        (0.9, 7.7, 0.05),
        (0.8, 3.9, 0.05),
        (0.7, 1.7, 0.05),
        (0.6, 0.62, 0.005),
        (0.5, 0.15, 0.005),
        (0.4, 0.013, 0.0005),
    ] {
        let solved = closed_form::rectangle(1.0, aspect).unwrap().conductance;
        for outline in [rectangle(1.0, aspect), rectangle(aspect, 1.0)] {
            for part in ["top width", "mid-height", "mean of top", "equal-area"] {
                let error = percent(&outline, solved, part);
                assert!(
                    (error - expected).abs() < digit * 1.1,
                    "{aspect} {part}: {error}"
                );
            }
        }
    }
}

#[test]
fn the_polar_moment_model_is_off_as_computed() {
    let rect = |w: f64, h: f64| closed_form::rectangle(w, h).unwrap().conductance;
    assert!((percent(&rectangle(1.0, 1.0), rect(1.0, 1.0), "polar") + 7.5).abs() < 0.05);
    assert!((percent(&rectangle(2.0, 1.0), rect(2.0, 1.0), "polar") + 5.96).abs() < 0.005);
    let slit = percent(&rectangle(1e4, 1.0), rect(1e4, 1.0), "polar");
    assert!((slit - 100.0 * (PI * PI / 9.0 - 1.0)).abs() < 0.02);
    // J = 4 K per side^4 of regular polygons, computed reference; in the unit circle the side is 2 sin(pi/n).
    for (sides, torsion, expected) in [
        (3, 0.021_650_635, -12.3),
        (5, 0.442_320_12, -4.5),
        (6, 1.035_458_9, -2.9),
        (8, 3.651_812_9, -1.4),
    ] {
        let side = 2.0 * (PI / f64::from(sides)).sin();
        let error = percent(&regular(sides), torsion / 4.0 * side.powi(4), "polar");
        assert!((error - expected).abs() < 0.05, "{sides}: {error}");
    }
    let half_round = percent(&isotropic(0.0, 1.0), PI / 8.0 - 1.0 / PI, "polar");
    // Closed form: Ip = pi/4 - 8/(9 pi) in the unit half circle.
    assert!((half_round + 3.0503).abs() < 1e-3, "{half_round}");
    let circle = percent(&regular(4000), PI / 8.0, "polar");
    assert!(circle.abs() < 1e-3);
}

#[test]
fn the_root_area_model_is_off_as_computed() {
    // Rectangles: the model is the first term of the series; error of R -0.67 %, -0.21 %, -0.03 %.
    for (aspect, expected, digit) in [
        (1.0, -0.67, 0.005),
        (0.5, -0.21, 0.005),
        (0.1, -0.03, 0.005),
    ] {
        let solved = closed_form::rectangle(1.0, aspect).unwrap().conductance;
        for outline in [rectangle(1.0, aspect), rectangle(aspect, 1.0)] {
            let error = percent(&outline, solved, "sqrt(A)");
            assert!((error - expected).abs() < digit * 1.05, "{aspect}: {error}");
        }
    }
    // KOH trapezoids, computed reference, stay within the stated -7.2 to +1.4 %.
    for (bottom, depth, solved) in [
        (0.0, 0.5_f64.sqrt(), 0.003_559_265_758),
        (0.5, 0.353_553_4, 0.001_816_418_574),
        (0.9, 0.070_710_7, 2.647_111_351e-5),
    ] {
        let outline = Outline::single(vec![
            [-0.5, 0.0],
            [-0.5 * bottom, -depth],
            [0.5 * bottom, -depth],
            [0.5, 0.0],
        ]);
        let error = percent(&outline, solved, "sqrt(A)");
        assert!((-7.25..1.45).contains(&error), "{bottom}: {error}");
    }
}

#[test]
fn the_compactness_fits_are_off_as_computed() {
    for aspect in [1.0, 0.8, 0.5, 0.25] {
        let solved = closed_form::rectangle(1.0, aspect).unwrap().conductance;
        let error = percent(&rectangle(1.0, aspect), solved, "rectangle form, alpha");
        assert!(error.abs() < 0.65, "{aspect}: {error}");
    }
    for (aspect, expected) in [(0.1, 1.9), (0.05, 3.1)] {
        let solved = closed_form::rectangle(1.0, aspect).unwrap().conductance;
        let error = percent(&rectangle(1.0, aspect), solved, "rectangle form, alpha");
        assert!((error.abs() - expected).abs() < 0.06, "{aspect}: {error}");
    }
    for (aspect, expected) in [(1.0, 0.0), (0.5, 0.14), (0.1, 3.9)] {
        let outline = Outline::single(
            (0..20_000)
                .map(|i| {
                    let (sin, cos) = (2.0 * PI * f64::from(i) / 2e4).sin_cos();
                    [0.5 * cos, 0.5 * aspect * sin]
                })
                .collect(),
        );
        let solved = closed_form::ellipse(1.0, aspect).unwrap().conductance;
        let error = percent(&outline, solved, "ellipse form");
        assert!((error.abs() - expected).abs() < 0.06, "{aspect}: {error}");
    }
    let solved = closed_form::equilateral_triangle(3.0_f64.sqrt())
        .unwrap()
        .conductance;
    assert!(percent(&regular(3), solved, "triangle form").abs() < 0.9);
}

#[test]
fn plates_over_predict_a_channel_twenty_times_as_wide_as_high_by_three_per_cent() {
    let solved = closed_form::rectangle(20.0, 1.0).unwrap().conductance;
    let row = shortcuts(&rectangle(20.0, 1.0), solved)[0].clone();
    assert!(row.name.starts_with("parallel plates"));
    assert!((row.conductance.unwrap() / solved - 1.0325).abs() < 5e-4);
    assert!(!row.remark.contains("outside its range"), "{}", row.remark);
    let square = &shortcuts(&rectangle(1.0, 1.0), 0.035_144_253_7)[0];
    assert!(square.remark.contains("outside its range"));
}

#[test]
fn both_pipe_models_are_exact_for_a_circle() {
    let rows = shortcuts(&regular(20_000), PI / 8.0);
    for part in ["round pipe of equal", "friction of a round pipe"] {
        assert!(named(&rows, part).resistance_error.unwrap().abs() < 1e-6);
    }
    // A circle closes at the top: there is no rectangle on its top width, and the table says so.
    let top = named(&rows, "on the top width");
    assert_eq!((top.conductance, top.resistance_error), (None, None));
    assert!(
        top.remark.contains("closes at this height"),
        "{}",
        top.remark
    );
    assert!(named(&rows, "mean of top").conductance.is_none());
}

#[test]
fn islands_and_several_lumens_give_reasons_and_no_numbers() {
    let with_post = Outline {
        lumens: vec![Lumen {
            outer: rectangle(4.0, 4.0).lumens[0].outer.clone(),
            islands: vec![Loop::new(vec![
                [1.0, 1.0],
                [1.0, 2.0],
                [2.0, 2.0],
                [2.0, 1.0],
            ])],
        }],
    };
    let two = Outline {
        lumens: [rectangle(1.0, 1.0), rectangle(2.0, 1.0)]
            .iter()
            .map(|outline| outline.lumens[0].clone())
            .collect(),
    };
    let none = Outline { lumens: Vec::new() };
    let flat = Outline::single(vec![[0.0, 0.0], [1.0, 0.0], [2.0, 0.0]]);
    for (outline, word) in [
        (with_post, "1 island"),
        (two, "2 lumens"),
        (none, "0 lumens"),
        (flat, "no area"),
    ] {
        for row in shortcuts(&outline, 1.0) {
            assert_eq!((row.conductance, row.resistance_error), (None, None));
            assert!(row.remark.contains(word), "{}: {}", row.name, row.remark);
        }
    }
}

#[test]
fn a_forked_bottom_has_no_single_width_there() {
    let outline = Outline::single(vec![
        [0.0, 0.0],
        [1.0, 0.0],
        [1.0, 1.5],
        [2.0, 1.5],
        [2.0, 0.0],
        [3.0, 0.0],
        [3.0, 2.0],
        [0.0, 2.0],
    ]);
    let rows = shortcuts(&outline, 0.1);
    for part in ["mid-height", "mean of top", "sqrt(A)"] {
        assert!(named(&rows, part).remark.contains("2 pieces"), "{part}");
        assert!(named(&rows, part).conductance.is_none());
    }
    assert!(named(&rows, "on the top width").conductance.is_some());
}

#[test]
fn without_a_solved_value_there_is_no_error_but_a_remark() {
    for solved in [0.0, -1.0, f64::NAN] {
        for row in shortcuts(&rectangle(2.0, 1.0), solved) {
            assert!(row.conductance.is_some() && row.resistance_error.is_none());
            assert!(row.remark.contains("no solved conductance"));
        }
    }
}

#[test]
fn an_upright_section_says_which_side_is_taken_as_the_height() {
    let rows = shortcuts(&rectangle(1.0, 5.0), 1.0);
    assert!(
        named(&rows, "on the top width")
            .remark
            .contains("shorter side")
    );
    let rows = shortcuts(&rectangle(5.0, 1.0), 1.0);
    assert!(
        !named(&rows, "on the top width")
            .remark
            .contains("shorter side")
    );
}
