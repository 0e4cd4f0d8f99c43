//! The parts of a new wall joined to closed loops, and the loops as polygons.

use std::collections::HashMap;

use super::super::curves::{CurveError, arc};
use super::super::outline::Point;
use super::curve::{Curve, cross, distance, minus, plus};
use super::trim::Part;

/// Parts in their order around a loop.
pub(super) type Chain = Vec<usize>;

/// The parts did not join to closed loops.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct NotClosed;

/// Joins parts whose ends are at most `tolerance` apart.
///
/// Ends that come together, directly or over others, make one knot. A part that begins and ends in one
/// knot and is no longer than a few tolerances is left out.
pub(super) fn chains(parts: &[Part], tolerance: f64) -> Result<Vec<Chain>, NotClosed> {
    let starts: Vec<Point> = parts.iter().map(Part::start).collect();
    let ends: Vec<Point> = parts.iter().map(Part::end).collect();
    let places: Vec<Point> = starts.iter().chain(&ends).copied().collect();
    let knot = knots(&places, tolerance);
    let count = parts.len();
    let is_crumb = |i: usize| {
        let [from, to] = parts[i].stretch;
        knot[i] == knot[count + i] && to - from <= 8.0 * tolerance
    };
    let mut leaving: Vec<Vec<usize>> = vec![Vec::new(); places.len()];
    let mut balance = vec![0_i32; places.len()];
    for i in (0..count).filter(|&i| !is_crumb(i)) {
        leaving[knot[i]].push(i);
        balance[knot[i]] += 1;
        balance[knot[count + i]] -= 1;
    }
    if balance.iter().any(|&b| b != 0) {
        return Err(NotClosed);
    }
    let mut is_used: Vec<bool> = (0..count).map(is_crumb).collect();
    let mut chains = Vec::new();
    for first in 0..count {
        if is_used[first] {
            continue;
        }
        let (mut chain, mut at) = (Vec::new(), first);
        loop {
            is_used[at] = true;
            chain.push(at);
            let here = knot[count + at];
            if here == knot[first] {
                break;
            }
            // Where several leave, the nearest: a touch in one point, which the caller will refuse.
            let apart = |i: &usize| distance(ends[at], starts[*i]);
            let free = leaving[here].iter().copied().filter(|&i| !is_used[i]);
            let next = free.min_by(|a, b| apart(a).total_cmp(&apart(b)));
            at = next.ok_or(NotClosed)?;
        }
        chains.push(chain);
    }
    Ok(chains)
}

/// The knot of each place: the index of one of the places that hang together.
fn knots(places: &[Point], tolerance: f64) -> Vec<usize> {
    let cell = |p: Point| p.map(|c| (c / tolerance).floor() as i64);
    let mut cells: HashMap<[i64; 2], Vec<usize>> = HashMap::new();
    let mut parent: Vec<usize> = (0..places.len()).collect();
    for (index, &place) in places.iter().enumerate() {
        let [x, y] = cell(place);
        for near in (x - 1..=x + 1).flat_map(|i| (y - 1..=y + 1).map(move |j| [i, j])) {
            for &other in cells.get(&near).into_iter().flatten() {
                if distance(place, places[other]) <= tolerance {
                    let (a, b) = (root(&mut parent, index), root(&mut parent, other));
                    parent[a.max(b)] = a.min(b);
                }
            }
        }
        cells.entry([x, y]).or_default().push(index);
    }
    (0..places.len()).map(|i| root(&mut parent, i)).collect()
}

fn root(parent: &mut [usize], mut index: usize) -> usize {
    while parent[index] != index {
        parent[index] = parent[parent[index]];
        index = parent[index];
    }
    index
}

/// A chain as a polygon.
///
/// - `chord_error`: of arcs, in the units of the parts
/// - `blends`: whether an arc of a single segment may become one vertex outside it, by at most the chord
///   error, so that a finely drawn wall keeps its number of vertices
/// - `tolerance`: vertices nearer to each other become one
pub(super) fn polygon(
    parts: &[Part],
    chain: &Chain,
    chord_error: f64,
    blends: bool,
    tolerance: f64,
) -> Result<Vec<Point>, CurveError> {
    let mut points: Vec<Point> = Vec::with_capacity(chain.len());
    let mut blended_last = false;
    let mut begins_plain = false;
    for (place, &index) in chain.iter().enumerate() {
        let part = &parts[index];
        let inner = match part.curve {
            Curve::Line { .. } => None,
            Curve::Arc { .. } => Some(along_arc(part, chord_error)?),
        };
        match inner {
            Some(inner) if blends && inner.is_empty() && part.is_whole() => {
                if blended_last {
                    points.push(part.start());
                }
                points.push(blend(&part.curve));
                blended_last = true;
            }
            other => {
                if !blended_last {
                    points.push(part.start());
                }
                begins_plain |= place == 0;
                points.extend(other.unwrap_or_default());
                blended_last = false;
            }
        }
    }
    // The first vertex was written as the start of its part, though the last part ends in a blend.
    if blended_last && begins_plain && points.len() > 3 {
        points.remove(0);
    }
    points.dedup_by(|later, earlier| distance(*later, *earlier) <= tolerance);
    while points.len() > 1 && distance(points[0], points[points.len() - 1]) <= tolerance {
        points.pop();
    }
    Ok(points)
}

/// Vertices inside an arc, its ends left out.
fn along_arc(part: &Part, chord_error: f64) -> Result<Vec<Point>, CurveError> {
    let Curve::Arc {
        centre,
        radius,
        start,
        ..
    } = part.curve
    else {
        return Ok(Vec::new());
    };
    let [from, to] = part.stretch;
    if to - from <= 0.0 {
        return Ok(Vec::new());
    }
    let begin = start[1].atan2(start[0]) - from / radius;
    let mut points = arc(centre, radius, begin, (from - to) / radius, chord_error)?;
    points.pop();
    Ok(points.split_off(1))
}

/// Where the tangents at both ends of an arc meet.
fn blend(curve: &Curve) -> Point {
    let Curve::Arc {
        centre,
        radius,
        from,
        to,
        ..
    } = *curve
    else {
        return curve.at(0.0);
    };
    let sum = plus(minus(from, centre), minus(to, centre), 1.0);
    let square = 0.5 * (sum[0] * sum[0] + sum[1] * sum[1]);
    plus(centre, sum, radius * radius / square)
}

/// Signed area of a polygon, about its first vertex.
pub(super) fn area(points: &[Point]) -> f64 {
    let Some(&o) = points.first() else {
        return 0.0;
    };
    let fan = points.windows(2);
    0.5 * fan
        .map(|pair| cross(minus(pair[0], o), minus(pair[1], o)))
        .sum::<f64>()
}
