//! Area, wetted perimeter and bounds of every kind against closed forms (elementary geometry, derived here).

use std::f64::consts::{PI, SQRT_2};

use super::super::{Quantity, kinds, modifiers, post_parameters};
use super::{assert_sound, outline};
use crate::units::parse_length;

/// Relative difference allowed: the chord error's effect on areas and lengths.
const TOLERANCE: f64 = 1e-6;

/// Square micrometres and micrometres.
fn assert_measures(line: &str, area: f64, perimeter: Option<f64>) {
    let made = outline(line);
    assert_sound(&made, line);
    let found = made.area() * 1e12;
    assert!(
        (found / area - 1.0).abs() < TOLERANCE,
        "{line}: area {found}, expected {area}"
    );
    if let Some(perimeter) = perimeter {
        let found = made.wetted_perimeter() * 1e6;
        assert!(
            (found / perimeter - 1.0).abs() < TOLERANCE,
            "{line}: perimeter {found}, expected {perimeter}"
        );
    }
}

/// Composite Simpson rule with 20000 intervals.
fn simpson(f: impl Fn(f64) -> f64, a: f64, b: f64) -> f64 {
    let n = 20_000;
    let h = (b - a) / f64::from(n);
    let weight = |i| match i {
        0 => 1.0,
        i if i == n => 1.0,
        i if i % 2 == 1 => 4.0,
        _ => 2.0,
    };
    (0..=n)
        .map(|i| weight(i) * f(a + h * f64::from(i)))
        .sum::<f64>()
        * h
        / 3.0
}

#[test]
fn straight_kinds_have_their_area_and_perimeter() {
    assert_measures("rectangle width=100um height=40um", 4000.0, Some(280.0));
    assert_measures(
        "trapezoid top_width=100um depth=40um left_angle=90deg right_angle=45deg",
        40.0 * (100.0 + 60.0) / 2.0,
        Some(100.0 + 40.0 + 60.0 + 40.0 * SQRT_2),
    );
    assert_measures(
        "trapezoid top_width=100um depth=40um left_angle=135deg right_angle=90deg",
        40.0 * (100.0 + 140.0) / 2.0,
        Some(100.0 + 40.0 + 140.0 + 40.0 * SQRT_2),
    );
    let wall = 40.0 * 1.5_f64.sqrt();
    let floor = 100.0 - 40.0 * SQRT_2;
    assert_measures(
        "koh_groove opening=100um depth=40um",
        40.0 * (100.0 + floor) / 2.0,
        Some(100.0 + floor + 2.0 * wall),
    );
    assert_measures(
        "triangle base=100um left_angle=60deg right_angle=60deg",
        2500.0 * 3.0_f64.sqrt(),
        Some(300.0),
    );
    assert_measures(
        "triangle base=100um left_angle=120deg right_angle=30deg",
        2500.0 * 3.0_f64.sqrt(),
        Some(200.0 + 100.0 * 3.0_f64.sqrt()),
    );
    assert_measures(
        "triangle_height base=100um height=60um apex_offset=80um",
        3000.0,
        Some(100.0 + 130.0_f64.hypot(60.0) + 30.0_f64.hypot(60.0)),
    );
    assert_measures("triangle_sides a=50um b=40um c=30um", 600.0, Some(120.0));
    assert_measures("rhombus side=60um acute_angle=30deg", 1800.0, Some(240.0));
    let hexagon = 1.5 * 3.0_f64.sqrt() * 2500.0;
    assert_measures("regular_polygon sides=6 side=50um", hexagon, Some(300.0));
    assert_measures(
        "regular_polygon sides=4 across_flats=50um",
        2500.0,
        Some(200.0),
    );
}

#[test]
fn a_koh_groove_deeper_than_its_opening_allows_is_a_v() {
    for depth in ["70.72um", "300um"] {
        let line = format!("koh_groove opening=100um depth={depth}");
        assert_measures(&line, 5000.0 / SQRT_2, Some(100.0 * (1.0 + 3.0_f64.sqrt())));
        let made = outline(&line);
        assert_eq!(made.lumens[0].outer.points.len(), 3);
        assert!((made.bounds().unwrap().0[1] + 100e-6 / SQRT_2).abs() < 1e-18);
    }
}

#[test]
fn round_kinds_have_their_area_and_perimeter() {
    assert_measures("circle diameter=100um", 2500.0 * PI, Some(100.0 * PI));
    assert_measures("ellipse width=200um height=20um", 1000.0 * PI, None);
    assert_measures("ellipse width=20um height=2000um", 10_000.0 * PI, None);
    let quarter = |a: f64, b: f64| simpson(|t| (a * t.sin()).hypot(b * t.cos()), 0.0, PI / 2.0);
    assert_measures(
        "ellipse width=120um height=40um",
        1200.0 * PI,
        Some(4.0 * quarter(60.0, 20.0)),
    );
    assert_measures(
        "half_ellipse width=120um depth=40um",
        1200.0 * PI,
        Some(120.0 + 2.0 * quarter(60.0, 40.0)),
    );
    for (radius, depth) in [(60.0_f64, 20.0_f64), (60.0, 100.0), (6000.0, 0.5)] {
        let angle = 2.0 * ((radius - depth) / radius).acos();
        let area = radius * radius / 2.0 * (angle - angle.sin());
        let chord = 2.0 * radius * (angle / 2.0).sin();
        let perimeter = radius * angle + chord;
        // The closed form itself loses digits for the shallow one, where two thirds of chord times depth holds.
        let area = if depth < 1.0 {
            2.0 / 3.0 * chord * depth * (1.0 + depth * depth / (chord * chord) * 0.8)
        } else {
            area
        };
        let line = format!("circular_segment radius={radius}um depth={depth}um");
        assert_measures(&line, area, Some(perimeter));
        if depth <= radius {
            let line = format!("circular_segment width={chord}um depth={depth}um");
            assert_measures(&line, area, Some(perimeter));
        }
    }
    for degrees in [20.0_f64, 180.0, 300.0] {
        let angle = degrees.to_radians();
        assert_measures(
            &format!("circular_sector radius=50um angle={degrees}deg"),
            1250.0 * angle,
            Some(100.0 + 50.0 * angle),
        );
    }
    for offset in [0.0, 10.0, -24.0] {
        assert_measures(
            &format!("annulus outer_diameter=100um inner_diameter=50um offset={offset}um"),
            1875.0 * PI,
            Some(150.0 * PI),
        );
    }
    assert_measures(
        "annulus outer_diameter=100um inner_diameter=98um",
        99.0 * PI,
        Some(198.0 * PI),
    );
}

#[test]
fn rounded_kinds_have_their_area_and_perimeter() {
    let corner = 1.0 - PI / 4.0;
    assert_measures(
        "rounded_rectangle width=100um height=40um radius=8um",
        4000.0 - 4.0 * 64.0 * corner,
        Some(280.0 - 64.0 + 16.0 * PI),
    );
    assert_measures(
        "rounded_rectangle width=100um height=40um radius_top_left=4um radius_top_right=8um \
         radius_bottom_left=12um radius_bottom_right=16um",
        4000.0 - (16.0 + 64.0 + 144.0 + 256.0) * corner,
        Some(280.0 - 80.0 + 20.0 * PI),
    );
    assert_measures(
        "rounded_rectangle width=40um height=40um radius=20um",
        400.0 * PI,
        Some(40.0 * PI),
    );
    assert_measures(
        "stadium width=120um height=40um",
        3200.0 + 400.0 * PI,
        Some(160.0 + 40.0 * PI),
    );
    assert_measures(
        "stadium width=40um height=120um",
        3200.0 + 400.0 * PI,
        Some(160.0 + 40.0 * PI),
    );
    assert_measures(
        "stadium width=40um height=40um",
        400.0 * PI,
        Some(40.0 * PI),
    );
}

#[test]
fn etched_grooves_have_their_area_and_perimeter() {
    assert_measures(
        "isotropic_etch mask_opening=20um depth=30um",
        600.0 + 450.0 * PI,
        Some(20.0 + 80.0 + 30.0 * PI),
    );
    assert_measures(
        "isotropic_etch mask_opening=0um depth=30um",
        450.0 * PI,
        Some(60.0 + 30.0 * PI),
    );
    // Parabola: two thirds of the box; arc length by Simpson's rule.
    let slope = |x: f64| 8.0 * 33.0 * x / 1e4;
    assert_measures(
        "parabolic_groove width=100um depth=33um",
        2.0 / 3.0 * 3300.0,
        Some(100.0 + 2.0 * simpson(|x| 1.0_f64.hypot(slope(x)), 0.0, 50.0)),
    );
    for fraction in [0.01_f64, 0.3] {
        let edge = 80.0 * (-fraction.ln() / 8.0).sqrt();
        let full = 30.0 / (1.0 - fraction);
        let profile = |x: f64| full * ((-x * x / 800.0).exp() - fraction);
        let slope = |x: f64| full * x / 400.0 * (-x * x / 800.0).exp();
        let line = format!("gaussian_groove depth=30um width=80um truncation={fraction}");
        assert_measures(
            &line,
            2.0 * simpson(profile, 0.0, edge),
            Some(2.0 * (edge + simpson(|x| 1.0_f64.hypot(slope(x)), 0.0, edge))),
        );
        let (low, high) = outline(&line).bounds().unwrap();
        assert!((low[1] * 1e6 + 30.0).abs() < 1e-9 && high[1].abs() < 1e-20);
    }
}

#[test]
fn a_trench_has_its_area_with_taper_bow_scallops_and_foot() {
    let cot = 1.0 / 88.0_f64.to_radians().tan();
    let plain = 40.0 * 120.0 - 120.0 * 120.0 * cot;
    assert_measures(
        "drie_trench top_width=40um depth=120um taper=88deg",
        plain,
        Some(80.0 - 240.0 * cot + 240.0 * 1.0_f64.hypot(cot)),
    );
    // Parabolic bow: two thirds of its height on each wall.
    assert_measures(
        "drie_trench top_width=40um depth=120um taper=88deg bow=1.5um",
        plain + 2.0 * 120.0 * 1.5 * 2.0 / 3.0,
        None,
    );
    // Vertical wall: 39 whole scallops of 3 um above the foot of 2 um; each is a circular segment.
    let radius = (1.5_f64 * 1.5 + 0.2 * 0.2) / 0.4;
    let angle = 2.0 * (1.5 / radius).asin();
    let segment = radius * radius / 2.0 * (angle - angle.sin());
    assert_measures(
        "drie_trench top_width=40um depth=120um scallop_pitch=3um scallop_depth=0.2um foot_radius=2um",
        4800.0 + 2.0 * 39.0 * segment - 2.0 * 4.0 * (1.0 - PI / 4.0),
        Some(76.0 + 2.0 * (39.0 * radius * angle + 1.0 + PI)),
    );
    // Foot on a sloping wall: the corner of inner angle 180 deg - taper loses r^2 (cot(a/2) - (pi - a)/2).
    let inner = PI - 80.0_f64.to_radians();
    let cot = 1.0 / 80.0_f64.to_radians().tan();
    let lost = 9.0 * (1.0 / (inner / 2.0).tan() - (PI - inner) / 2.0);
    assert_measures(
        "drie_trench top_width=80um depth=100um taper=80deg foot_radius=3um",
        8000.0 - 1e4 * cot - 2.0 * lost,
        None,
    );
    let undercut =
        outline("drie_trench top_width=40um depth=120um taper=92deg foot_radius=3um bow=2um");
    assert_sound(&undercut, "undercut trench");
}

#[test]
fn bonded_halves_join_where_the_openings_overlap() {
    let half = |width: f64| format!("(rectangle width={width}um height=20um)");
    let bonded = |lower, upper, rest: &str| {
        format!(
            "bonded_halves lower={} upper={} {rest}",
            half(lower),
            half(upper)
        )
    };
    assert_measures(&bonded(100.0, 100.0, ""), 4000.0, Some(280.0));
    assert_measures(&bonded(100.0, 60.0, ""), 3200.0, Some(280.0));
    assert_measures(&bonded(60.0, 100.0, "offset=-15um"), 3200.0, Some(280.0));
    assert_measures(&bonded(100.0, 100.0, "offset=5um"), 4000.0, Some(290.0));
    // A slab of the gap's height over both openings.
    assert_measures(
        &bonded(100.0, 100.0, "offset=5um gap=2um"),
        4000.0 + 210.0,
        Some(2.0 * 100.0 + 4.0 * 20.0 + 2.0 * 2.0 + 2.0 * 5.0),
    );
    let apart = outline(&bonded(20.0, 20.0, "offset=50um"));
    assert_sound(&apart, "apart");
    assert_eq!(apart.lumens.len(), 2);
    assert!((apart.area() * 1e12 - 800.0).abs() < 1e-9);
    let bridged = outline(&bonded(20.0, 20.0, "offset=50um gap=2um"));
    assert_sound(&bridged, "bridged");
    assert_eq!(bridged.lumens.len(), 1);
    assert!((bridged.area() * 1e12 - 940.0).abs() < 1e-9);
    assert_measures(
        "bonded_halves lower=(isotropic_etch mask_opening=20um depth=30um) \
         upper=(isotropic_etch mask_opening=20um depth=30um)",
        1200.0 + 900.0 * PI,
        Some(40.0 + 60.0 * PI),
    );
}

#[test]
fn an_arched_lid_takes_or_adds_a_circular_segment() {
    let (width, rise) = (100.0_f64, 5.0_f64);
    let radius = width * width / (8.0 * rise) + rise / 2.0;
    let angle = 2.0 * (width / 2.0 / radius).asin();
    let segment = radius * radius / 2.0 * (angle - angle.sin());
    for (line, sign) in [("lid_sag=5um", -1.0), ("lid_bulge=5um", 1.0)] {
        assert_measures(
            &format!("rectangle width=100um height=40um {line}"),
            4000.0 + sign * segment,
            Some(180.0 + radius * angle),
        );
    }
    assert_measures(
        "rectangle width=100um height=40um lid_bulge=50um",
        4000.0 + 1250.0 * PI,
        Some(180.0 + 50.0 * PI),
    );
    assert_measures(
        "rounded_rectangle width=100um height=40um radius=0um lid_sag=5um",
        4000.0 - segment,
        None,
    );
}

#[test]
fn posts_are_islands_about_their_centre_of_area() {
    let made = outline(
        "rectangle width=100um height=40um posts=[(circle diameter=10um x=-20um y=-15um) \
         (rectangle width=6um height=8um x=10um y=-20um rotation=30deg) \
         (triangle base=9um left_angle=60deg right_angle=60deg x=30um y=-20um)]",
    );
    assert_sound(&made, "posts");
    let islands = &made.lumens[0].islands;
    assert_eq!(islands.len(), 3);
    let expected = 4000.0 - 25.0 * PI - 48.0 - 81.0 * 3.0_f64.sqrt() / 4.0;
    assert!((made.area() * 1e12 / expected - 1.0).abs() < TOLERANCE);
    for (island, centre) in islands
        .iter()
        .zip([[-20.0, -15.0], [10.0, -20.0], [30.0, -20.0]])
    {
        let alone = crate::geometry::Outline::single(island.points.clone());
        let found = alone.centroid();
        assert!((found[0] * 1e6 - centre[0]).abs() < 1e-9, "{found:?}");
        assert!((found[1] * 1e6 - centre[1]).abs() < 1e-9, "{found:?}");
    }
    // A quarter turn makes 6 x 8 into 8 x 6.
    let turned = outline(
        "rectangle width=100um height=40um \
         posts=[(rectangle width=6um height=8um x=0um y=-20um rotation=90deg)]",
    );
    let xs = turned.lumens[0].islands[0].points.iter().map(|p| p[0]);
    assert!((xs.fold(0.0, f64::max) - 4e-6).abs() < 1e-18);
    let inner = outline(
        "bonded_halves lower=(rectangle width=50um height=20um posts=[(circle diameter=4um x=0um y=-10um)]) \
         upper=(rectangle width=50um height=20um posts=[(circle diameter=4um x=5um y=-10um)])",
    );
    assert_sound(&inner, "posts in halves");
    assert_eq!(inner.lumens[0].islands.len(), 2);
}

#[test]
fn origins_are_where_the_table_says() {
    let bounds = |line: &str| outline(line).bounds().unwrap();
    let near = |a: [f64; 2], b: [f64; 2]| {
        (a[0] * 1e6 - b[0]).abs() < 1e-4 && (a[1] * 1e6 - b[1]).abs() < 1e-4
    };
    for line in [
        "rectangle width=100um height=40um",
        "half_ellipse width=100um depth=40um",
        "circular_segment width=100um depth=40um",
        "parabolic_groove width=100um depth=40um",
        "isotropic_etch mask_opening=20um depth=40um",
        "rounded_rectangle width=100um height=40um radius=3um",
        "drie_trench top_width=100um depth=40um",
        "triangle_height base=100um height=40um",
        "koh_groove opening=100um depth=40um",
    ] {
        let (low, high) = bounds(line);
        assert!(
            near(low, [-50.0, -40.0]) && near(high, [50.0, 0.0]),
            "{line}"
        );
    }
    for line in [
        "stadium width=100um height=40um",
        "ellipse width=100um height=40um",
    ] {
        let (low, high) = bounds(line);
        assert!(
            near(low, [-50.0, -20.0]) && near(high, [50.0, 20.0]),
            "{line}"
        );
    }
}

#[test]
fn the_table_is_complete_and_its_examples_can_be_read() {
    // Parameters that stand in for one another: the examples of one of each are left out.
    let instead = ["width", "radius", "across_flats"];
    for info in kinds() {
        let mut line = info.name.to_owned();
        for parameter in info.parameters {
            let skipped = matches!(
                (info.name, parameter.default),
                ("circular_segment" | "regular_polygon", Some(_))
            ) && instead.contains(&parameter.name)
                && !(info.name == "circular_segment" && parameter.name == "radius");
            if !skipped {
                line = format!(
                    "{line} {}={}",
                    parameter.name,
                    parameter.example.replace(' ', "\u{0}")
                );
            }
        }
        let line = tidy(&line);
        assert_sound(&outline(&line), &line);
        assert!(info.summary.contains("origin"), "{}", info.name);
    }
    for parameter in kinds()
        .iter()
        .flat_map(|info| info.parameters)
        .chain(modifiers())
        .chain(post_parameters())
    {
        assert!(!parameter.meaning.is_empty());
        if parameter.quantity == Quantity::Length {
            assert!(
                parse_length(parameter.example).is_ok(),
                "{}",
                parameter.name
            );
        }
    }
    let posts =
        outline("rectangle width=100um height=40um posts=[(circle diameter=10um x=0um y=-20um)]");
    assert_eq!(posts.lumens[0].islands.len(), 1);
}

/// Joins numbers with their units, and keeps the blanks inside brackets.
fn tidy(line: &str) -> String {
    let mut depth = 0;
    line.chars()
        .filter_map(|c| {
            depth += i32::from(c == '(') - i32::from(c == ')');
            match c {
                '\0' if depth > 0 => Some(' '),
                '\0' => None,
                c => Some(c),
            }
        })
        .collect()
}
