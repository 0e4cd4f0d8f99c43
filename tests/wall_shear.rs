//! The wall shear as a curve: exact values, identities of the exact solution, corners, named walls.

#![expect(clippy::unwrap_used, reason = "a test stops at the first surprise")]

use std::path::Path;

use etchwise::flow::closed_form::rectangle_mid_wall_shear;
use etchwise::flow::{CurvePoint, PointKind, SectionFlow, SolveOptions, WallReport, solve_outline};
use etchwise::geometry::{Loop, Lumen, NamedWall, NominalSpec, Outline, wall_stretches};
use etchwise::intake::{ReadOptions, read_section};

fn drawn(spec: &str) -> Outline {
    spec.parse::<NominalSpec>().unwrap().outline().unwrap()
}

fn solve(outline: &Outline, cells: f64) -> SectionFlow {
    let options = SolveOptions {
        cells_across: Some(cells),
        ..SolveOptions::default()
    };
    solve_outline(outline, &options).unwrap().flow
}

/// An L of three squares; its re-entrant corner lies at (1, 1) sides.
fn l_shape(side: f64) -> Outline {
    Outline::single(
        [
            [0.0, 0.0],
            [2.0, 0.0],
            [2.0, 1.0],
            [1.0, 1.0],
            [1.0, 2.0],
            [0.0, 2.0],
        ]
        .map(|p| p.map(|c| c * side))
        .to_vec(),
    )
}

fn turned(outline: &Outline, degrees: f64) -> Outline {
    let (s, c) = degrees.to_radians().sin_cos();
    let turn = |l: &Loop| {
        let point = |p: &[f64; 2]| [c * p[0] - s * p[1] + 1.7e-5, s * p[0] + c * p[1] - 3.1e-5];
        Loop::new(l.points.iter().map(point).collect())
    };
    let lumens = outline.lumens.iter().map(|lumen| Lumen {
        outer: turn(&lumen.outer),
        islands: lumen.islands.iter().map(turn).collect(),
    });
    Outline {
        lumens: lumens.collect(),
    }
}

fn points(flow: &SectionFlow) -> impl Iterator<Item = &CurvePoint> {
    flow.wall_shear.curve.loops.iter().flat_map(|l| &l.points)
}

fn off(flow: &SectionFlow, name: &str) -> f64 {
    let identity = flow.identities.iter().find(|i| i.name == name).unwrap();
    identity.relative_difference.abs()
}

/// How far the integral of the curve over the wall is from the area.
fn balanced(flow: &SectionFlow) -> f64 {
    (flow.wall_shear.curve.integrate(1, |_| 1.0) / flow.geometry.area - 1.0).abs()
}

#[test]
fn shear_at_the_mid_sides_of_rectangles_is_within_2e_4_of_the_series() {
    for aspect in [1.0, 1.5, 2.5, 5.0, 10.0] {
        let (width, height) = (aspect * 1e-4, 1e-4);
        let outline = Outline::single(vec![
            [0.0, 0.0],
            [width, 0.0],
            [width, height],
            [0.0, height],
        ]);
        let exact = rectangle_mid_wall_shear(width, height).unwrap();
        for (name, outline) in [
            ("flat", outline.clone()),
            ("turned", turned(&outline, 17.0)),
        ] {
            let curve = &solve(&outline, 128.0).wall_shear.curve.loops[0];
            for (arc, expected) in [
                (0.5 * width, exact.long_side),
                (width + 0.5 * height, exact.short_side),
                (1.5 * width + height, exact.long_side),
                (2.0 * width + 1.5 * height, exact.short_side),
            ] {
                let difference = curve.shear_at(arc) / expected - 1.0;
                assert!(
                    difference.abs() < 2e-4,
                    "{aspect} {name} at {arc}: {difference:e}"
                );
            }
        }
    }
}

#[test]
fn mean_and_rellich_hold_on_many_sections() {
    let mut sections: Vec<(String, Outline)> = [
        "rectangle width=100um height=100um",
        "rectangle width=400um height=100um",
        "circle diameter=100um",
        "ellipse width=100um height=50um",
        "triangle base=100um left_angle=60deg right_angle=60deg",
        "triangle base=100um left_angle=20deg right_angle=40deg",
        "koh_groove opening=100um depth=40um",
        "isotropic_etch mask_opening=100um depth=50um",
        "annulus outer_diameter=100um inner_diameter=50um",
        "circular_sector radius=100um angle=60deg",
        "rounded_rectangle width=200um height=100um radius=20um",
        "regular_polygon sides=6 side=100um",
        "rhombus side=100um acute_angle=40deg",
        "half_ellipse width=100um depth=40um",
    ]
    .map(|spec| (spec.to_owned(), drawn(spec)))
    .into();
    let again: Vec<_> = sections
        .iter()
        .map(|(name, outline)| (format!("{name}, turned"), turned(outline, 17.0)))
        .collect();
    sections.extend(again);
    for degrees in [0.0, 17.0, 45.0] {
        sections.push((format!("L at {degrees}"), turned(&l_shape(1e-4), degrees)));
    }
    let square =
        |low: f64, high: f64| Loop::new(vec![[low, low], [high, low], [high, high], [low, high]]);
    let post = Outline {
        lumens: vec![Lumen {
            outer: square(0.0, 3e-4),
            islands: vec![square(1.1e-4, 1.7e-4)],
        }],
    };
    sections.push(("square post".to_owned(), post.oriented()));
    for (name, outline) in &sections {
        let flow = solve(outline, 128.0);
        let (slopes, rellich) = (off(&flow, "mean_wall_shear"), off(&flow, "rellich"));
        assert!(
            balanced(&flow) < 1e-5,
            "{name}: mean off by {:e}",
            balanced(&flow)
        );
        // The error that a re-entrant corner spreads over the grid falls with its power 4/3 only.
        let singular = !flow.wall_shear.singular_corners.is_empty();
        let allowed = match (singular, outline.lumens[0].islands.is_empty()) {
            (false, _) => 1e-4,
            (true, true) => 4e-4,
            (true, false) => 2e-3,
        };
        assert!(slopes < allowed, "{name}: slopes off by {slopes:e}");
        let allowed = if singular { 1e-3 } else { 1e-4 };
        assert!(rellich < allowed, "{name}: Rellich off by {rellich:e}");
    }
}

#[test]
fn the_mean_is_exact_and_rellich_holds_on_rough_and_many_cornered_walls() {
    // Relative difference of Rellich's identity at 128 cells, which do not resolve the scallops of the trench.
    let mut sections: Vec<(&str, Outline, f64)> = [
        ("isotropic_etch mask_opening=20um depth=30um", 1e-4),
        ("regular_polygon sides=20 side=20um", 2e-4),
        (
            "drie_trench top_width=20um depth=60um taper=89deg bow=1um foot_radius=3um",
            5e-4,
        ),
        (
            "drie_trench top_width=40um depth=120um taper=89.4deg bow=1.2um scallop_pitch=2um \
             scallop_depth=0.25um foot_radius=4um",
            4e-3,
        ),
    ]
    .map(|(spec, allowed)| (spec, drawn(spec), allowed))
    .into();
    // A traced wall: a circle with a zigzag of 0.04 % of its radius, two vertices a spacing.
    let traced = (0..900).map(|k| {
        let t = std::f64::consts::TAU * f64::from(k) / 900.0;
        let r = 50e-6 * (1.0 + 4e-4 * f64::from(k * 7919 % 13 - 6) / 6.0);
        [r * t.cos(), r * t.sin()]
    });
    sections.push(("traced circle", Outline::single(traced.collect()), 3e-3));
    // Two steps beside each other: a side of 8 cells between a convex and a re-entrant corner.
    let steps = [
        [0.0, 0.0],
        [100.0, 0.0],
        [100.0, 50.0],
        [94.0, 50.0],
        [94.0, 100.0],
        [-6.0, 100.0],
        [-6.0, 50.0],
        [0.0, 50.0],
    ];
    let steps = Outline::single(steps.map(|p| p.map(|c| 1e-6 * c)).to_vec());
    sections.push(("halves with an offset", steps, 2e-3));
    for (name, outline, allowed) in &sections {
        let flow = solve(outline, 128.0);
        assert!(
            balanced(&flow) < 1e-5,
            "{name}: mean off by {:e}",
            balanced(&flow)
        );
        let rellich = off(&flow, "rellich");
        println!("{name}: {rellich:e}");
        assert!(rellich < *allowed, "{name}: Rellich off by {rellich:e}");
    }
}

fn shipped(file: &str) -> Outline {
    let path = Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("shapes")
        .join(file);
    read_section(&path, &ReadOptions::default())
        .unwrap()
        .outline
}

#[test]
fn rellich_holds_beside_corners_that_the_grid_hardly_resolves() {
    // Relative difference on the default grid and at 128 cells.
    for (file, allowed) in [
        ("drawn/drie_trench.toml", [1e-3, 2e-3]),
        ("drawn/bonded_glass_halves.toml", [1e-3, 1.5e-3]),
        ("made/bonded_halves.toml", [1.5e-3, 1e-3]),
        ("made/stylus_groove.toml", [1e-3, 1e-3]),
        ("made/post_undercut.toml", [1e-3, 1e-3]),
        ("made/drie_trench.toml", [1e-3, 1e-3]),
    ] {
        let outline = shipped(file);
        let on_default = solve_outline(&outline, &SolveOptions::default()).unwrap();
        for (flow, allowed) in [on_default.flow, solve(&outline, 128.0)]
            .iter()
            .zip(allowed)
        {
            let rellich = off(flow, "rellich");
            println!("{file}: {rellich:e}");
            assert!(rellich < allowed, "{file}: Rellich off by {rellich:e}");
            assert!(balanced(flow) < 1e-5, "{file}: mean off");
        }
    }
}

/// Root of the mean square of the difference of two curves over that of the second one.
fn distance(flow: &SectionFlow, finer: &SectionFlow) -> f64 {
    let (mut apart, mut whole) = (0.0, 0.0);
    for (one, other) in flow
        .wall_shear
        .curve
        .loops
        .iter()
        .zip(&finer.wall_shear.curve.loops)
    {
        for k in 0..20_000 {
            let s = other.length() * (f64::from(k) + 0.5) / 20_000.0;
            let (a, b) = (one.shear_at(s), other.shear_at(s));
            apart += (a - b).powi(2);
            whole += b * b;
        }
    }
    (apart / whole).sqrt()
}

#[test]
fn beside_corners_that_the_grid_hardly_resolves_the_shear_is_near_that_of_a_fine_grid() {
    // Slopes along lattice lines alone are 5.4e-2 and 1.3e-1 off.
    for (file, allowed) in [
        ("made/stylus_groove.toml", 2.5e-2),
        ("made/post_undercut.toml", 9e-2),
    ] {
        let outline = shipped(file);
        let apart = distance(&solve(&outline, 48.0), &solve(&outline, 512.0));
        println!("{file}: {apart:e}");
        assert!(apart < allowed, "{file}: {apart:e}");
    }
}

#[test]
fn the_flux_into_single_walls_of_a_triangle_is_that_of_the_closed_form() {
    // The wall shear of an equilateral triangle: its three sides receive the same, whatever the grid.
    let side = 100e-6;
    let triangle = drawn("triangle base=100um left_angle=60deg right_angle=60deg");
    let third = side * side * 3.0_f64.sqrt() / 12.0;
    for degrees in [0.0, 11.0, 38.0] {
        let flow = solve(&turned(&triangle, degrees), 64.0);
        let curve = &flow.wall_shear.curve;
        let corners: Vec<f64> = points(&flow)
            .filter(|p| p.kind == PointKind::ConvexCorner)
            .map(|p| p.arc_length)
            .collect();
        let start = corners.iter().copied().fold(f64::INFINITY, f64::min);
        for k in 0..3 {
            let from = start + f64::from(k) * side;
            let flux = curve.integrate_stretch(0, from, from + side, 1, |_| 1.0);
            let off = flux / third - 1.0;
            assert!(off.abs() < 2e-4, "{degrees} deg, side {k}: {off:e}");
        }
    }
}

#[test]
fn the_shear_of_a_circle_is_half_its_radius_everywhere() {
    let flow = solve(&turned(&drawn("circle diameter=100um"), 5.0), 128.0);
    for point in points(&flow) {
        let difference = point.shear_per_gradient / 25e-6 - 1.0;
        assert!(difference.abs() < 2e-4, "{point:?}: {difference:e}");
    }
}

#[test]
fn the_curve_is_smooth_along_straight_walls_and_zero_at_convex_corners() {
    for degrees in [0.0, 17.0, 45.0] {
        let flow = solve(
            &turned(&drawn("rectangle width=200um height=100um"), degrees),
            64.0,
        );
        let h = flow.grid.spacing;
        let curve = &flow.wall_shear.curve.loops[0];
        let corners: Vec<_> = points(&flow)
            .filter(|p| p.kind != PointKind::Regular)
            .collect();
        assert_eq!(corners.len(), 8);
        assert!(corners.iter().all(|p| p.kind == PointKind::ConvexCorner));
        assert!(corners.iter().all(|p| p.shear_per_gradient == 0.0));
        // The second derivative along the middle of a long side is about -1.2 of mean over height squared.
        let mean = flow.wall_shear.mean_per_gradient;
        let start = corners
            .iter()
            .map(|p| p.arc_length)
            .find(|s| *s > 0.0)
            .unwrap();
        let first_is_long = (start - 200e-6).abs() < 1e-9;
        let middle = if first_is_long { 100e-6 } else { 200e-6 };
        for k in -20..=20 {
            let s = middle + 0.5 * h * f64::from(k);
            let second = curve.shear_at(s + h) - 2.0 * curve.shear_at(s) + curve.shear_at(s - h);
            let scaled = second / mean * (100e-6 / h).powi(2);
            assert!(
                (-3.0..0.5).contains(&scaled),
                "{degrees} deg at {k}: {scaled}"
            );
        }
    }
}

#[test]
fn beside_a_re_entrant_corner_the_shear_follows_its_power() {
    for outline in [l_shape(1e-4), turned(&l_shape(1e-4), 17.0)] {
        let flow = solve(&outline, 128.0);
        let curve = &flow.wall_shear.curve.loops[0];
        let singular: Vec<_> = points(&flow)
            .filter(|p| p.kind == PointKind::SingularCorner)
            .collect();
        assert_eq!(singular.len(), 2);
        let [before, after] = [singular[0], singular[1]];
        assert!((before.shear_per_gradient / after.shear_per_gradient - 1.0).abs() < 2e-3);
        assert!(
            (before.normal[0] * after.normal[0] + before.normal[1] * after.normal[1]).abs() < 1e-9
        );
        for r in [1e-7, 1e-8] {
            for side in [-1.0, 1.0] {
                let at = |r: f64| curve.shear_at(before.arc_length + side * r);
                let exponent = (at(r) / at(2.0 * r)).log2();
                assert!(
                    (exponent - 1.0 / 3.0).abs() < 0.02,
                    "{r} {side}: {exponent}"
                );
            }
        }
    }
}

#[test]
fn named_walls_and_directions_make_up_the_whole_wall() {
    let outline = drawn("rectangle width=200um height=100um");
    let (low, high) = outline.bounds().unwrap();
    let solved = solve_outline(&outline, &SolveOptions::default()).unwrap();
    let curve = &solved.flow.wall_shear.curve;
    let named = NamedWall {
        name: "heated".to_owned(),
        loop_number: 1,
        ends: Some([[low[0] + 50e-6, low[1]], [high[0], low[1] + 30e-6]]),
    };
    let stretches = wall_stretches(solved.outline(), &[named]).unwrap();
    let report = WallReport::new(solved.outline(), curve, &stretches);
    let names: Vec<&str> = report.walls.iter().map(|w| w.name.as_str()).collect();
    assert_eq!(names, ["heated", "lid", "floor", "left", "right"]);
    let lengths = [180e-6, 200e-6, 50e-6, 100e-6, 70e-6];
    for (wall, length) in report.walls.iter().zip(lengths) {
        assert!((wall.length / length - 1.0).abs() < 1e-9, "{}", wall.name);
        let [p5, p25, p50, p75, p95] = wall.percentiles;
        let order = [wall.min, p5, p25, p50, p75, p95, wall.max];
        assert!(order.windows(2).all(|pair| pair[0] <= pair[1]), "{wall:?}");
        // Every one of these walls but none of its inner places touches a convex corner.
        assert!(wall.min.abs() < 1e-18, "{wall:?}");
    }
    let sum: f64 = report.walls.iter().map(|w| w.mean * w.length).sum();
    assert!((sum / (report.whole.mean * report.whole.length) - 1.0).abs() < 1e-9);
    let exact = rectangle_mid_wall_shear(200e-6, 100e-6).unwrap();
    let lid = &report.walls[1];
    assert!((lid.max / exact.long_side - 1.0).abs() < 5e-4);
    assert!((lid.max_at[0] - 0.5 * (low[0] + high[0])).abs() < 1e-6);
    // Half of a wall of this kind has no more shear than the median.
    let below: f64 = (0..10_000)
        .map(|k| {
            report.parts.iter().find(|p| p.wall == 1).unwrap().from + (f64::from(k) + 0.5) * 2e-8
        })
        .filter(|&s| curve.loops[0].shear_at(s) <= lid.percentiles[2])
        .count() as f64;
    assert!((below / 1e4 - 0.5).abs() < 2e-3, "{below}");
}

#[test]
fn singular_corners_are_reported_with_their_means_on_both_walls() {
    let solved = solve_outline(&l_shape(1e-4), &SolveOptions::default()).unwrap();
    let curve = &solved.flow.wall_shear.curve;
    let report = WallReport::new(solved.outline(), curve, &[]);
    let [corner] = report.singular_corners.as_slice() else {
        panic!("{:?}", report.singular_corners);
    };
    let names = corner.walls.map(|w| report.walls[w].name.as_str());
    assert_eq!(names, ["lid", "right"]);
    let length = 0.05 * solved.flow.geometry.hydraulic_diameter;
    assert!((curve.singular_length / length - 1.0).abs() < 1e-12);
    let mean = curve
        .integrate_stretch(0, corner.arc_length, corner.arc_length + length, 1, |_| 1.0)
        / length;
    assert!((mean / corner.means[1] - 1.0).abs() < 1e-9);
    // The largest value does not grow as the grid comes closer to the corner.
    let coarse = solve(&l_shape(1e-4), 64.0);
    let fine = solve(&l_shape(1e-4), 256.0);
    let ratio = coarse.wall_shear.max_per_gradient / fine.wall_shear.max_per_gradient;
    assert!((ratio - 1.0).abs() < 5e-3, "{ratio}");
    let touched: Vec<usize> = report.walls.iter().map(|w| w.singular_sides).collect();
    assert_eq!(touched.iter().sum::<usize>(), 2);
    assert_eq!(report.whole.singular_sides, 2);
}
