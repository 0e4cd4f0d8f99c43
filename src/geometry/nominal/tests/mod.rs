//! Tests over all kinds: measures against closed forms, refusals, random sections, shipped files.

mod measures;
mod properties;
mod refusals;
mod shipped;

use super::posts::segments_meet;
use super::{NominalError, NominalSpec};
use crate::geometry::{Outline, Point};

/// The outline of a one-line section.
fn outline(line: &str) -> Outline {
    let spec: NominalSpec = line.parse().unwrap();
    match spec.outline() {
        Ok(outline) => outline,
        Err(error) => panic!("{line}: {error}; {}", error.hint()),
    }
}

/// The error of a one-line section.
fn refusal(line: &str) -> NominalError {
    match line.parse::<NominalSpec>().and_then(|spec| spec.outline()) {
        Ok(_) => panic!("`{line}` was accepted"),
        Err(error) => error,
    }
}

/// Fails unless every loop is finite, without repeated vertices, spikes or crossings, turned as promised,
/// and no two loops meet.
fn assert_sound(outline: &Outline, what: &str) {
    for lumen in &outline.lumens {
        assert!(
            lumen.outer.signed_area() > 0.0,
            "{what}: outer loop turns clockwise"
        );
        assert!(lumen.outer.points.len() >= 3, "{what}");
        for island in &lumen.islands {
            assert!(
                island.signed_area() < 0.0,
                "{what}: island turns anticlockwise"
            );
        }
    }
    let mut edges = Vec::new();
    for (number, wall) in outline.loops().enumerate() {
        let count = wall.points.len();
        for (i, (a, b)) in wall.edges().enumerate() {
            assert!(a[0].is_finite() && a[1].is_finite(), "{what}");
            assert!(
                (a[0] - b[0]).hypot(a[1] - b[1]) > 0.0,
                "{what}: {a:?} twice"
            );
            edges.push((number, i, count, a, b));
        }
    }
    let (low, high) = outline.bounds().unwrap();
    let axis = usize::from(high[1] - low[1] > high[0] - low[0]);
    let span = |a: Point, b: Point| (a[axis].min(b[axis]), a[axis].max(b[axis]));
    edges.sort_by(|e, f| span(e.3, e.4).0.total_cmp(&span(f.3, f.4).0));
    for (k, &(loop_a, i, count, a, b)) in edges.iter().enumerate() {
        let end = span(a, b).1;
        for &(loop_b, j, _, c, d) in &edges[k + 1..] {
            if span(c, d).0 > end {
                break;
            }
            if loop_a == loop_b && (i + 1) % count == j {
                assert_no_spike(a, b, d, what);
            } else if loop_a == loop_b && (j + 1) % count == i {
                assert_no_spike(c, d, b, what);
            } else {
                assert!(
                    !segments_meet(a, b, c, d),
                    "{what}: {a:?} {b:?} meets {c:?} {d:?}"
                );
            }
        }
    }
}

/// Fails when the edge `b c` folds back onto the edge `a b`.
fn assert_no_spike(a: Point, b: Point, c: Point, what: &str) {
    let (u, v) = ([b[0] - a[0], b[1] - a[1]], [c[0] - b[0], c[1] - b[1]]);
    let (dot, cross) = (u[0] * v[0] + u[1] * v[1], u[0] * v[1] - u[1] * v[0]);
    assert!(
        dot > 0.0 || cross.abs() > -1e-9 * dot,
        "{what}: spike at {b:?}"
    );
}

#[test]
fn the_check_of_soundness_sees_a_crossing_a_spike_and_a_repeated_vertex() {
    let seen = |points: Vec<Point>| {
        std::panic::catch_unwind(|| assert_sound(&Outline::single(points), "bad")).is_err()
    };
    assert!(!seen(vec![[0.0, 0.0], [2.0, 0.0], [2.0, 1.0], [0.0, 1.0]]));
    assert!(seen(vec![
        [0.0, 0.0],
        [2.0, 0.0],
        [0.5, 1.0],
        [1.5, 1.0],
        [0.0, -3.0]
    ]));
    assert!(seen(vec![
        [0.0, 0.0],
        [3.0, 0.0],
        [2.0, 0.0],
        [2.0, 1.0],
        [0.0, 1.0]
    ]));
    assert!(seen(vec![[0.0, 0.0], [2.0, 0.0], [2.0, 0.0], [0.0, 1.0]]));
}
