//! What of a wall shear curve a picture shows where corners stand too close together to be told apart.
//!
//! Between crowded convex corners the largest value stands for the curve. Where re-entrant corners are among them, as on
//! a measured rough wall, the curve goes to infinity and back all the time and says nothing; there the mean over
//! a length that can be seen is drawn instead.

use crate::flow::{CurvePoint, LoopCurve, PointKind, WallCurve};

/// Re-entrant corners from which a crowd is drawn as a mean.
const LEAST_SINGULAR: usize = 3;
/// Means per length of their reach.
const MEANS_PER_REACH: f64 = 6.0;

/// A stretch of a loop with many re-entrant corners, arc lengths in m.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Crowd {
    pub(super) from: f64,
    pub(super) to: f64,
    /// Re-entrant corners in it; one on the first vertex of a loop may count twice.
    singular: usize,
}

impl Crowd {
    pub(super) fn holds(&self, arc_length: f64) -> bool {
        (self.from..=self.to).contains(&arc_length)
    }
}

/// Crowds of a loop in order.
///
/// - `near`: distance of corners below which they cannot be told apart, m; `length`: of the loop, m
pub(super) fn crowds(points: &[CurvePoint], near: f64, length: f64) -> Vec<Crowd> {
    let mut found: Vec<Crowd> = Vec::new();
    // A corner is there twice, once for either side.
    let mut last: Option<f64> = None;
    for point in points.iter().filter(|p| p.kind != PointKind::Regular) {
        let singular = usize::from(point.kind == PointKind::SingularCorner);
        let s = point.arc_length;
        match found.last_mut() {
            Some(crowd) if last == Some(s) => crowd.to = s,
            Some(crowd) if s - crowd.to < near => {
                crowd.to = s;
                crowd.singular += singular;
            }
            _ => found.push(Crowd {
                from: s,
                to: s,
                singular,
            }),
        }
        last = Some(s);
    }
    found.retain(|crowd| crowd.singular >= LEAST_SINGULAR);
    for crowd in &mut found {
        // Nothing can be seen either between a crowd and the ends of the axis.
        if crowd.from < near {
            crowd.from = 0.0;
        }
        if crowd.to > length - near {
            crowd.to = length;
        }
    }
    found
}

/// Arc lengths and means of the shear through a crowd, weighted with a triangle: a mean with equal weights would
/// go up and down with every corner that enters or leaves it.
///
/// - `reach`: half the base of the triangle, m
fn running_mean(along: &LoopCurve, crowd: &Crowd, reach: f64) -> Vec<(f64, f64)> {
    let length = crowd.to - crowd.from;
    let reach = reach.min(0.5 * along.length());
    let count = (MEANS_PER_REACH * length / reach).ceil().max(1.0);
    // Parts of equal length, a reach beyond either end; means stand between two of them.
    let part = length / count;
    let beyond = (reach / part).round().max(1.0);
    let integrals: Vec<f64> = (0..(count + 2.0 * beyond) as usize)
        .map(|k| {
            let start = crowd.from + (k as f64 - beyond) * part;
            along.integral(start, start + part)
        })
        .collect();
    let width = 2 * beyond as usize;
    let weight = |k: usize| 1.0 - ((k as f64 + 0.5) / beyond - 1.0).abs();
    integrals
        .windows(width)
        .enumerate()
        .map(|(k, own)| {
            let sum: f64 = own.iter().enumerate().map(|(j, i)| weight(j) * i).sum();
            (crowd.from + part * k as f64, sum / (beyond * part))
        })
        .collect()
}

/// Arc lengths and shear of the lines that show a loop: around its crowds the curve, through them the mean.
///
/// - `crowds`: of the loop, in order; `near`: as there; `reach`: of the mean, m
pub(super) fn lines(
    along: &LoopCurve,
    crowds: &[Crowd],
    near: f64,
    reach: f64,
) -> Vec<Vec<(f64, f64)>> {
    let total = along.length();
    let mut found = Vec::new();
    let mut begin = 0.0;
    for k in 0..=crowds.len() {
        let crowd = crowds.get(k);
        let end = crowd.map_or(total, |crowd| crowd.from);
        let is_after = k > 0;
        // The corners at the ends of a crowd belong to it.
        let is_last = crowd.is_none();
        let inside = |p: &&CurvePoint| {
            let s = p.arc_length;
            (s > begin || !is_after) && (s < end || is_last)
        };
        let own: Vec<CurvePoint> = along.points.iter().filter(inside).copied().collect();
        let mut line = shown(&own, near);
        // Without a corner on the first vertex the curve has no point there.
        if !is_after && end > 0.0 && line.first().is_none_or(|p| p.0 > 0.0) {
            line.insert(0, (0.0, along.shear_at(0.0)));
        }
        if crowd.is_none() && begin < total && line.last().is_none_or(|p| p.0 < total) {
            line.push((total, along.shear_at(0.0)));
        }
        found.push(line);
        if let Some(crowd) = crowd {
            found.push(running_mean(along, crowd, reach));
            begin = crowd.to;
        }
    }
    found.retain(|line| line.len() > 1);
    found
}

/// The largest shear per gradient that is drawn, m.
///
/// - `crowds`: of every loop; `reach`: of the mean, m
pub(super) fn largest_shown(curve: &WallCurve, crowds: &[Vec<Crowd>], reach: f64) -> f64 {
    let mut largest: f64 = 0.0;
    for (along, own) in curve.loops.iter().zip(crowds) {
        let outside = along
            .bounded(curve.singular_length)
            .filter(|p| !own.iter().any(|crowd| crowd.holds(p.arc_length)))
            .map(|p| p.shear_per_gradient);
        let means = own
            .iter()
            .flat_map(|crowd| running_mean(along, crowd, reach))
            .map(|mean| mean.1);
        largest = outside.chain(means).fold(largest, f64::max);
    }
    largest
}

/// Whether a loop has points outside of its crowds that are left out because convex corners stand close.
pub(super) fn leaves_out(along: &LoopCurve, crowds: &[Crowd], near: f64) -> bool {
    along
        .points
        .split(|p| crowds.iter().any(|crowd| crowd.holds(p.arc_length)))
        .any(|points| shown(points, near).len() < points.len())
}

/// Arc length and shear of the points that are drawn. Between convex corners closer than `near` that is the largest
/// value alone: a digitised round corner would be a solid block of lines up from zero and down again.
fn shown(points: &[CurvePoint], near: f64) -> Vec<(f64, f64)> {
    let shear = |p: &CurvePoint| match p.kind {
        PointKind::SingularCorner => f64::INFINITY,
        _ => p.shear_per_gradient,
    };
    let stretches: Vec<&[CurvePoint]> = points
        .split_inclusive(|p| p.kind == PointKind::ConvexCorner)
        .collect();
    let mut found: Vec<(f64, f64)> = Vec::with_capacity(points.len());
    let mut corner: Option<f64> = None;
    let mut after_crowd = false;
    for stretch in stretches {
        let Some(last) = stretch.last() else { continue };
        let is_bounded = last.kind == PointKind::ConvexCorner;
        let is_crowded = is_bounded && corner.is_some_and(|start| last.arc_length - start < near);
        if is_crowded {
            let inner = &stretch[..stretch.len() - 1];
            let largest = inner.iter().max_by(|a, b| shear(a).total_cmp(&shear(b)));
            found.extend(largest.map(|p| (p.arc_length, shear(p))));
        } else {
            if after_crowd {
                // The corner where the crowd ends is a zero of this stretch.
                found.extend(corner.map(|s| (s, 0.0)));
            }
            found.extend(stretch.iter().map(|p| (p.arc_length, shear(p))));
        }
        after_crowd = is_crowded;
        corner = is_bounded.then_some(last.arc_length);
    }
    found
}

#[cfg(test)]
mod tests {
    use super::*;

    fn point(arc_length: f64, shear: f64, kind: PointKind) -> CurvePoint {
        CurvePoint {
            arc_length,
            at: [arc_length, 0.0],
            normal: [0.0, -1.0],
            shear_per_gradient: shear,
            kind,
        }
    }

    #[test]
    fn a_crowd_is_three_re_entrant_corners_whose_neighbours_are_near() {
        let singular = |s| point(s, 1.0, PointKind::SingularCorner);
        let convex = |s| point(s, 0.0, PointKind::ConvexCorner);
        let along = [
            singular(1.0),
            singular(1.0),
            point(1.2, 1.0, PointKind::Regular),
            convex(1.5),
            convex(1.5),
            singular(2.0),
            singular(2.0),
            convex(2.5),
            singular(3.0),
            singular(3.0),
            // Two alone are drawn as they are.
            singular(7.0),
            singular(7.5),
        ];
        let expected = Crowd {
            from: 1.0,
            to: 3.0,
            singular: 3,
        };
        assert_eq!(crowds(&along, 0.6, 9.0), [expected]);
        assert_eq!(crowds(&along, 0.4, 9.0), []);
        let [wide] = crowds(&along, 1.1, 4.0)[..] else {
            panic!("one crowd");
        };
        assert_eq!((wide.from, wide.to), (0.0, 4.0));
        assert!(expected.holds(3.0) && !expected.holds(3.1));
    }

    #[test]
    fn between_crowded_corners_only_the_largest_value_is_drawn() {
        let corner = |s| point(s, 0.0, PointKind::ConvexCorner);
        let on = |s, v| point(s, v, PointKind::Regular);
        let along = [
            corner(0.0),
            on(5.0, 9.0),
            corner(10.0),
            on(10.2, 3.0),
            on(10.5, 4.0),
            corner(11.0),
            on(11.5, 5.0),
            corner(12.0),
            on(17.0, 8.0),
            corner(22.0),
        ];
        let ends = [(0.0, 0.0), (5.0, 9.0), (10.0, 0.0)];
        let others = [(12.0, 0.0), (17.0, 8.0), (22.0, 0.0)];
        let expected = [&ends[..], &[(10.5, 4.0), (11.5, 5.0)], &others].concat();
        assert_eq!(shown(&along, 2.0), expected);
        let all: Vec<(f64, f64)> = along
            .iter()
            .map(|p| (p.arc_length, p.shear_per_gradient))
            .collect();
        assert_eq!(shown(&along, 0.5), all);
    }

    #[test]
    fn a_singular_corner_is_drawn_without_bound_and_ends_no_crowd() {
        let along = [
            point(0.0, 0.0, PointKind::ConvexCorner),
            point(0.5, 7.0, PointKind::SingularCorner),
            point(1.0, 0.0, PointKind::ConvexCorner),
        ];
        assert_eq!(shown(&along, 2.0), [(0.0, 0.0), (0.5, f64::INFINITY)]);
        assert_eq!(shown(&along, 0.1)[1], (0.5, f64::INFINITY));
    }
}
