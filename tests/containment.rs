//! Whether one section lies inside another: shared walls, touches, crossings by one rounding step.

use etchwise::geometry::{EscapeKind, Loop, Lumen, Outline, Point};
use proptest::prelude::*;

fn rectangle(x: f64, y: f64, width: f64, height: f64) -> Vec<Point> {
    vec![
        [x, y],
        [x + width, y],
        [x + width, y + height],
        [x, y + height],
    ]
}

fn lumens(list: Vec<(Vec<Point>, Vec<Vec<Point>>)>) -> Outline {
    let lumens = list.into_iter().map(|(outer, islands)| Lumen {
        outer: Loop::new(outer),
        islands: islands.into_iter().map(Loop::new).collect(),
    });
    Outline {
        lumens: lumens.collect(),
    }
}

fn simple(points: Vec<Point>) -> Outline {
    Outline::single(points)
}

fn kind(inner: &Outline, outer: &Outline) -> Option<EscapeKind> {
    inner.proven_inside(outer).err().map(|escape| escape.kind)
}

#[test]
fn a_section_lies_inside_itself_and_a_shared_lid_is_allowed() {
    let channel = simple(rectangle(0.0, 0.0, 10.0, 4.0));
    assert_eq!(kind(&channel, &channel), None);
    let trapezoid = simple(vec![[1.0, 1.0], [9.0, 1.0], [10.0, 4.0], [0.0, 4.0]]);
    assert_eq!(kind(&trapezoid, &channel), None);
    assert_eq!(kind(&channel, &trapezoid), Some(EscapeKind::WallInFluid));
    // All corners on the wall around, one of them inside an edge.
    let diamond = simple(vec![[5.0, 0.0], [10.0, 2.0], [5.0, 4.0], [0.0, 2.0]]);
    assert_eq!(kind(&diamond, &channel), None);
    assert_eq!(kind(&channel, &diamond), Some(EscapeKind::WallInFluid));
}

#[test]
fn the_wrong_order_and_a_section_beside_are_refused() {
    let (low, high) = (
        simple(rectangle(1.0, 1.0, 2.0, 2.0)),
        simple(rectangle(0.0, 0.0, 10.0, 4.0)),
    );
    assert_eq!(kind(&low, &high), None);
    assert_eq!(kind(&high, &low), Some(EscapeKind::WallInFluid));
    let beside = simple(rectangle(20.0, 0.0, 2.0, 2.0));
    assert_eq!(kind(&beside, &high), Some(EscapeKind::Outside));
    // Side by side on a shared wall, and touching in one corner.
    let next = simple(rectangle(10.0, 0.0, 3.0, 4.0));
    assert_eq!(kind(&next, &high), Some(EscapeKind::Outside));
    let corner = simple(rectangle(10.0, 4.0, 3.0, 4.0));
    assert_eq!(kind(&corner, &high), Some(EscapeKind::Outside));
}

#[test]
fn one_rounding_step_decides() {
    let outer = simple(vec![[0.0, 0.0], [0.3, 0.1], [0.7, 0.9], [0.1, 0.8]]);
    // The tip goes over the middle of an edge, one rounding step at a time.
    let inside = |x: f64| simple(vec![[0.2, 0.3], [x, 0.5], [0.3, 0.6]]);
    let (mut last, mut changes) = (None, 0);
    let mut x = 0.5 - 4.0 * f64::EPSILON;
    for _ in 0..32 {
        let now = kind(&inside(x), &outer);
        assert!(matches!(now, None | Some(EscapeKind::Crossing)));
        changes += i32::from(last.is_some_and(|before| before != now));
        last = Some(now);
        x = x.next_up();
    }
    assert_eq!(changes, 1);
    assert_eq!(last, Some(Some(EscapeKind::Crossing)));
}

#[test]
fn islands_of_the_outer_section_lie_in_islands_of_the_inner_one() {
    let post = |size: f64| rectangle(5.0 - 0.5 * size, 2.0 - 0.5 * size, size, size);
    let with = |size: f64| lumens(vec![(rectangle(0.0, 0.0, 10.0, 4.0), vec![post(size)])]);
    assert_eq!(kind(&with(1.5), &with(1.0)), None);
    assert_eq!(kind(&with(1.0), &with(1.0)), None);
    assert_eq!(kind(&with(1.0), &with(1.5)), Some(EscapeKind::WallInFluid));
    let without = simple(rectangle(0.0, 0.0, 10.0, 4.0));
    assert_eq!(kind(&with(1.0), &without), None);
    assert_eq!(kind(&without, &with(1.0)), Some(EscapeKind::WallInFluid));
    // An island outside the inner section is no matter.
    let left = simple(rectangle(0.0, 0.0, 4.0, 4.0));
    assert_eq!(kind(&left, &with(1.0)), None);
    // The inner section fills the island.
    let core = simple(post(1.0));
    assert_eq!(kind(&core, &with(1.0)), Some(EscapeKind::Outside));
    let smaller = simple(post(0.5));
    assert_eq!(kind(&smaller, &with(1.0)), Some(EscapeKind::Outside));
}

#[test]
fn each_of_several_lumens_is_looked_at() {
    let two = lumens(vec![
        (rectangle(0.0, 0.0, 3.0, 4.0), vec![]),
        (rectangle(5.0, 0.0, 3.0, 4.0), vec![]),
    ]);
    let around = simple(rectangle(0.0, 0.0, 8.0, 4.0));
    assert_eq!(kind(&two, &around), None);
    assert_eq!(kind(&around, &two), Some(EscapeKind::WallInFluid));
    let first = simple(rectangle(0.0, 0.0, 3.0, 4.0));
    assert_eq!(kind(&first, &two), None);
    let escape = two.proven_inside(&first).unwrap_err();
    assert_eq!(
        (escape.kind, escape.inner.lumen()),
        (EscapeKind::Outside, 1)
    );
    // A lumen in an island of the other section.
    let ring = lumens(vec![(
        rectangle(0.0, 0.0, 10.0, 10.0),
        vec![rectangle(2.0, 2.0, 6.0, 6.0)],
    )]);
    let cored = lumens(vec![
        (
            rectangle(0.0, 0.0, 10.0, 10.0),
            vec![rectangle(2.0, 2.0, 6.0, 6.0)],
        ),
        (rectangle(3.0, 3.0, 4.0, 4.0), vec![]),
    ]);
    assert_eq!(kind(&ring, &cored), None);
    assert_eq!(kind(&cored, &ring), Some(EscapeKind::Outside));
}

#[test]
fn places_are_told_in_metres_and_messages_name_the_walls() {
    let low = simple(rectangle(0.0, 0.0, 10e-6, 4e-6));
    let shifted = simple(rectangle(5e-6, 1e-6, 10e-6, 2e-6));
    let escape = shifted.proven_inside(&low).unwrap_err();
    assert_eq!(escape.kind, EscapeKind::Crossing);
    assert!((escape.at[0] - 10e-6).abs() < 1e-18);
    let text = escape.to_string();
    assert!(
        text.starts_with("its outer loop of lumen 1 crosses the outer loop of lumen 1 at (10, "),
        "{text}"
    );
}

/// Loops on a coarse grid touch and share stretches all the time.
fn coarse() -> impl Strategy<Value = Outline> {
    proptest::collection::vec((0..7_i32, 0..7_i32), 3..8).prop_map(|points| {
        let points = points.iter().map(|&(x, y)| [f64::from(x), f64::from(y)]);
        Outline::single(points.collect())
    })
}

/// Even-odd rule.
fn holds(outline: &Outline, p: Point) -> bool {
    let mut inside = false;
    for (a, b) in outline.loops().flat_map(Loop::edges) {
        if (a[1] > p[1]) != (b[1] > p[1]) {
            inside ^= a[0] + (p[1] - a[1]) / (b[1] - a[1]) * (b[0] - a[0]) > p[0];
        }
    }
    inside
}

proptest! {
    #![proptest_config(ProptestConfig { max_global_rejects: 100_000, ..ProptestConfig::default() })]
    #[test]
    fn containment_agrees_with_a_dense_sampling(inner in coarse(), outer in coarse()) {
        prop_assume!(inner.is_valid() && outer.is_valid());
        // The smallest piece between lines through points of a 7 by 7 grid is larger than these cells.
        let steps = 420;
        let mut escapes = false;
        'all: for i in 0..steps {
            for j in 0..steps {
                let at = |k: i32| 6.0 * (f64::from(k) + 0.503_7) / f64::from(steps);
                let p = [at(i), at(j) + 1e-4];
                if holds(&inner, p) && !holds(&outer, p) {
                    escapes = true;
                    break 'all;
                }
            }
        }
        let proven = inner.proven_inside(&outer);
        prop_assert_eq!(proven.is_err(), escapes, "{:?}", proven);
    }

    #[test]
    fn a_scaled_copy_about_a_centre_of_star_shape_lies_inside(
        radii in proptest::collection::vec(0.3..1.0_f64, 3..60),
        factor in 0.5..1.0_f64,
    ) {
        let count = radii.len() as f64;
        let of = |factor: f64| {
            let points = radii.iter().enumerate().map(|(i, r)| {
                let (sin, cos) = (std::f64::consts::TAU * i as f64 / count).sin_cos();
                [factor * r * cos, factor * r * sin]
            });
            Outline::single(points.collect())
        };
        prop_assert!(of(factor * (1.0 - 1e-12)).proven_inside(&of(1.0)).is_ok());
        prop_assert!(of(1.0).proven_inside(&of(factor * (1.0 - 1e-12))).is_err());
    }
}
