//! Shapes whose largest circle is known, and random ones against sampling.

use super::*;
use crate::geometry::NominalSpec;
use crate::geometry::outline::{Loop, Outline};
use proptest::prelude::*;
use std::f64::consts::{PI, TAU};

fn lumen(outline: Outline) -> Lumen {
    outline.lumens.into_iter().next().unwrap()
}

fn rectangle(width: f64, height: f64) -> Outline {
    Outline::single(vec![
        [0.0, 0.0],
        [width, 0.0],
        [width, height],
        [0.0, height],
    ])
}

fn circle_points(radius: f64, centre: Point, n: usize) -> Vec<Point> {
    (0..n)
        .map(|i| {
            let angle = TAU * i as f64 / n as f64;
            [
                centre[0] + radius * angle.cos(),
                centre[1] + radius * angle.sin(),
            ]
        })
        .collect()
}

/// Checks the radius and returns the number of cells.
#[track_caller]
fn assert_radius(lumen: &Lumen, radius: f64) -> usize {
    let (circle, cells) = Search::new(lumen).unwrap().run();
    let circle = circle.unwrap();
    let error = circle.radius / radius - 1.0;
    assert!(
        error.abs() < 1.1e-6,
        "{circle:?}, expected {radius}, {cells} cells"
    );
    assert!(circle.radius_bound >= radius * (1.0 - 1e-12));
    assert!(
        circle.radius_bound <= radius * (1.0 + 1.1e-6),
        "{circle:?} {cells} cells"
    );
    cells
}

#[test]
fn long_rectangles_in_any_direction_need_few_cells() {
    for angle in [0.0, 0.1, 0.5, PI / 4.0, 1.3] {
        let slot = lumen(rectangle(1e-3, 1e-6).rotated(angle, [3e-4, 1e-4]));
        let cells = assert_radius(&slot, 0.5e-6);
        assert!(cells < CELL_LIMIT, "{cells} cells at {angle}");
    }
}

#[test]
fn a_slot_too_long_for_a_tight_bound_still_gives_its_radius() {
    let slot = lumen(rectangle(1e-1, 1e-6).rotated(0.6, [0.0; 2]));
    let (circle, cells) = Search::new(&slot).unwrap().run();
    let circle = circle.unwrap();
    assert!((circle.radius / 0.5e-6 - 1.0).abs() < 1e-6, "{circle:?}");
    assert!(circle.radius_bound > circle.radius && cells <= CELL_LIMIT + 4);
}

#[test]
fn a_slanted_comb_gives_the_circle_at_the_foot_of_a_tooth() {
    let mut points = vec![[0.0, 0.0]];
    for x in (0..1000).map(f64::from) {
        points.extend([[x, 90.0], [x + 0.4, 90.0], [x + 0.4, 1.0], [x + 1.0, 1.0]]);
    }
    points.push([1000.0, 0.0]);
    // Between two corners of a tooth, 0.4 apart, and the floor: r^2 = 0.2^2 + (1 - r)^2.
    let circle = largest_inscribed_circle(&lumen(Outline::single(points).rotated(0.5, [0.0; 2])));
    let circle = circle.unwrap();
    assert!((circle.radius - 0.52).abs() < 1e-5, "{circle:?}");
    assert!(circle.radius_bound >= 0.52 * (1.0 - 1e-12));
}

#[test]
fn a_triangle_gives_its_incircle() {
    let triangle = Outline::single(vec![[0.0, 0.0], [4.0, 0.0], [0.0, 3.0]]);
    assert_radius(&lumen(triangle.rotated(0.3, [0.0; 2])), 1.0);
}

#[test]
fn an_eccentric_annulus_gives_half_its_widest_gap_and_a_concentric_one_half_its_gap() {
    // Inscribed polygons: the gap lies between the vertex circles and the edge circles.
    for (offset, gap) in [(0.2, 0.7), (0.0, 0.5)] {
        let n = 4000;
        let ring = Lumen {
            outer: Loop::new(circle_points(1.0, [0.0; 2], n)),
            islands: vec![Loop::new(circle_points(0.5, [-offset, 0.0], n))],
        };
        let (circle, _) = Search::new(&ring).unwrap().run();
        let circle = circle.unwrap();
        let slack = 1.0 - (PI / n as f64).cos() + 1e-6;
        assert!((circle.radius - 0.5 * gap).abs() < slack, "{circle:?}");
        assert!(
            circle.radius_bound < circle.radius * (1.0 + 1e-3),
            "{circle:?}"
        );
    }
}

#[test]
fn a_wall_of_many_vertices_costs_no_more_cells() {
    let n = 100_000;
    let points = (0..n).map(|i| {
        let angle = TAU * f64::from(i) / f64::from(n);
        let r = 1e-4 * (1.0 + 0.01 * (40.0 * angle).cos());
        [r * angle.cos(), r * angle.sin()]
    });
    let wavy = lumen(Outline::single(points.collect()));
    assert!(assert_radius(&wavy, 0.99e-4) < 500);
}

#[test]
fn walls_that_run_into_a_point_do_not_put_the_circle_outside() {
    // Tails of a ten-millionth of the depth, where lid and bottom are nearest to a rounding.
    let groove: NominalSpec = "gaussian_groove depth=1um width=1mm truncation=1e-7"
        .parse()
        .unwrap();
    let circle = largest_inscribed_circle(&lumen(groove.outline().unwrap())).unwrap();
    assert!((4.9e-7..5.1e-7).contains(&circle.radius), "{circle:?}");
}

#[test]
fn a_lumen_without_inside_has_no_circle() {
    for points in [
        vec![],
        vec![[1.0, 1.0]],
        vec![[0.0, 0.0], [1.0, 0.0]],
        vec![[f64::NAN; 2]; 4],
    ] {
        assert_eq!(
            largest_inscribed_circle(&lumen(Outline::single(points))),
            None
        );
    }
}

proptest! {
    #[test]
    fn no_sampled_point_is_farther_from_the_wall(
        radii in proptest::collection::vec(0.2..1.0_f64, 3..40),
        samples in proptest::collection::vec((0.0..1.0_f64, 0.0..TAU), 50),
    ) {
        let n = radii.len() as f64;
        let star: Vec<Point> = radii.iter().enumerate().map(|(i, r)| {
            let angle = TAU * i as f64 / n;
            [r * angle.cos(), r * angle.sin()]
        }).collect();
        let star = lumen(Outline::single(star));
        let circle = largest_inscribed_circle(&star).unwrap();
        prop_assert!(circle.radius_bound <= circle.radius * (1.0 + 2.0 * RADIUS_TOLERANCE));
        let search = Search::new(&star).unwrap();
        let at_centre = search.tree.nearest(circle.centre).unwrap();
        prop_assert!((at_centre.distance - circle.radius).abs() < 1e-12);
        prop_assert!(is_inside_by_counting(&star, circle.centre));
        for (r, angle) in samples {
            let p = [r * angle.cos(), r * angle.sin()];
            let near = search.tree.nearest(p).unwrap();
            let is_inside = is_inside_by_counting(&star, p);
            prop_assert_eq!(is_inside, search.is_inside(p, &near));
            prop_assert!(!is_inside || near.distance <= circle.radius_bound * (1.0 + 1e-12));
        }
    }
}

fn is_inside_by_counting(lumen: &Lumen, p: Point) -> bool {
    let crossed = lumen.outer.edges().filter(|(a, b)| {
        (a[1] > p[1]) != (b[1] > p[1])
            && p[0] < a[0] + (p[1] - a[1]) * (b[0] - a[0]) / (b[1] - a[1])
    });
    crossed.count() % 2 == 1
}
