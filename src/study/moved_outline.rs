//! The outline after a finite change of one [`WallMotion`] or several.
//!
//! The displacements of several motions are added edge by edge. Edges move on their lines and neighbours meet again where the moved lines cross (a mitre), so angles are
//! kept where both move alike. Where a wall that moves ends on a smooth stretch, the lines would cross far
//! away; there the wall gets a step as high as the change. For small changes only: the result is checked.

use crate::geometry::{Loop, Lumen, Outline, Point};

use super::resolve_check::NoCheck;
use super::wall_motion::{EdgeMotion, WallMotion, outward_normals};

/// How far a vertex may slide along a wall to meet its moved neighbour, times the speed; beyond, the wall gets
/// a step. Walls of unlike speed meet in a vertex where they turn by more than about 29 degrees.
const LARGEST_SLIDE: f64 = 2.0;

/// An outline whose walls have moved.
#[derive(Debug, Clone, PartialEq)]
pub struct MovedOutline {
    /// The outline.
    pub outline: Outline,
    /// Height of the highest step in a wall that was smooth before, m; zero where no stretch needed one.
    pub highest_step: f64,
}

/// The outline after `change` units of the motion.
///
/// - `outline`: oriented, as the motion was made for
///
/// # Errors
/// [`NoCheck::Outline`] when the moved outline crosses or touches itself: the change is too large for it.
pub fn moved_outline(
    outline: &Outline,
    motion: &WallMotion,
    change: f64,
) -> Result<MovedOutline, NoCheck> {
    outline_moved_by(outline, &[(motion, change)])
}

/// The outline after several motions at once: each wall goes by the sum of their displacements.
///
/// - `outline`: oriented, as the motions were made for
/// - `changes`: each motion with its change, in its unit
///
/// # Errors
/// As [`moved_outline`].
pub fn outline_moved_by(
    outline: &Outline,
    changes: &[(&WallMotion, f64)],
) -> Result<MovedOutline, NoCheck> {
    let (mut index, mut highest_step) = (0, 0.0_f64);
    let mut next = |wall: &Loop| {
        let (moved, step) = moved_loop(wall, changes, index);
        index += 1;
        highest_step = highest_step.max(step);
        moved
    };
    let moved = Outline {
        lumens: outline
            .lumens
            .iter()
            .map(|lumen| Lumen {
                outer: next(&lumen.outer),
                islands: lumen.islands.iter().map(&mut next).collect(),
            })
            .collect(),
    };
    let turned = outline
        .loops()
        .zip(moved.loops())
        .any(|(old, new)| old.signed_area() * new.signed_area() <= 0.0);
    let (moved, _) = moved.without_duplicate_vertices();
    if turned || moved.problems().has_errors() {
        return Err(NoCheck::Outline);
    }
    Ok(MovedOutline {
        outline: moved,
        highest_step,
    })
}

/// The loop and the height of its highest step, m.
fn moved_loop(wall: &Loop, changes: &[(&WallMotion, f64)], index: usize) -> (Loop, f64) {
    let normals = outward_normals(wall);
    let n = wall.points.len();
    let mut points = Vec::with_capacity(n);
    let mut highest = 0.0_f64;
    for (k, &p) in wall.points.iter().enumerate() {
        let before = (k + n - 1) % n;
        let shifted = |v: Point| [p[0] + v[0], p[1] + v[1]];
        let sides = [before, k].map(|edge| {
            let normal = normals[edge];
            let mut by = [0.0; 2];
            for (motion, change) in changes {
                let v = motion.velocity(index, edge, p, normal);
                by = [by[0] + change * v[0], by[1] + change * v[1]];
            }
            (normal, by)
        });
        // Both sides go with the same fields: so does the vertex, also where it hardly turns.
        let goes_along = changes.iter().all(|(motion, _)| {
            match [before, k].map(|edge| motion.edge(index, edge)) {
                [EdgeMotion::Follows(a), EdgeMotion::Follows(b)] => a == b,
                [a, b] => a == EdgeMotion::Rests && b == EdgeMotion::Rests,
            }
        });
        match (goes_along, vertex_velocity(sides)) {
            (true, _) => points.push(shifted(sides[0].1)),
            (_, Some(v)) => points.push(shifted(v)),
            (_, None) => {
                let [(_, a), (_, b)] = sides;
                highest = highest.max((b[0] - a[0]).hypot(b[1] - a[1]));
                points.extend([a, b].map(shifted));
            }
        }
    }
    (Loop::new(points), highest)
}

/// Velocity that keeps a vertex on the lines of both its edges; `None` where it would slide too far.
///
/// Each side is the unit normal of the edge and its velocity at the vertex. With the outward speeds `w1` and
/// `w2` and the turning `t`, the velocity is `(w1 + w2)/2 (n1 + n2)/(1 + cos t) + (w1 - w2)/2 (n1 - n2)/(1 - cos t)`.
fn vertex_velocity([(n1, v1), (n2, v2)]: [(Point, Point); 2]) -> Option<Point> {
    let w1 = v1[0] * n1[0] + v1[1] * n1[1];
    let w2 = v2[0] * n2[0] + v2[1] * n2[1];
    let (common, unlike) = (0.5 * (w1 + w2), 0.5 * (w1 - w2));
    // (n1 + n2) / (1 + cos t) and (n1 - n2) / (1 - cos t), from their own lengths: no cancellation.
    let over_half_square = |v: Point| {
        let half_square = 0.5 * (v[0] * v[0] + v[1] * v[1]);
        v.map(|c| c / half_square)
    };
    let sum = over_half_square([n1[0] + n2[0], n1[1] + n2[1]]);
    let difference = [n1[0] - n2[0], n1[1] - n2[1]];
    let turn = difference[0].hypot(difference[1]);
    let largest = w1.abs().max(w2.abs());
    if unlike.abs() <= 1e-12 * largest {
        return Some(sum.map(|c| common * c));
    }
    if 2.0 * unlike.abs() > LARGEST_SLIDE * largest * turn {
        return None;
    }
    let apart = over_half_square(difference);
    Some([
        common * sum[0] + unlike * apart[0],
        common * sum[1] + unlike * apart[1],
    ])
}
