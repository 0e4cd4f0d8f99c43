//! Fewer vertices within a tolerance, the area kept.
//!
//! Vertices are left out as long as none lies farther from the remaining line than the tolerance (Douglas,
//! Peucker 1973). That alone would take a sliver off every bulge, since vertices lie on the wall and chords inside
//! it: a circle would lose two thirds of the tolerance all round. So each remaining vertex is then moved across
//! the wall, by less than the tolerance, such that every edge encloses on average what its piece of the
//! contour did; the area of the loop stays as it was to first order. Loops are cut into pieces of [`PIECE`]
//! vertices first, which bounds the work.
//!
//! # Source
//! Douglas, Peucker (1973), "Algorithms for the reduction of the number of points required to represent a
//! digitized line or its caricature", Cartographica 10, 112-122, doi:10.3138/FM57-6770-U75U-7727.

use super::micrograph_section::PixelLoop;

/// Longest piece that is simplified at once, vertices.
const PIECE: usize = 512;
/// Loops of no more vertices stay as they are.
const FEWEST: usize = 8;

/// The loop with fewer vertices.
pub(super) fn simplified(points: &[[f64; 2]], tolerance: f64) -> PixelLoop {
    if points.len() <= FEWEST || tolerance <= 0.0 {
        return points.to_vec();
    }
    let kept = kept_vertices(points, tolerance);
    if kept.len() < 3 {
        return points.to_vec();
    }
    moved_across(points, &kept, tolerance)
}

/// Numbers of the vertices that stay, rising.
fn kept_vertices(points: &[[f64; 2]], tolerance: f64) -> Vec<usize> {
    // The first vertex is a corner of the loop: the one farthest from the first crossing found.
    let n = points.len();
    let pieces = n.div_ceil(PIECE).max(4);
    let mut is_kept = vec![false; n];
    let mut stack = Vec::new();
    for piece in 0..pieces {
        stack.push((piece * n / pieces, (piece + 1) * n / pieces));
    }
    while let Some((from, to)) = stack.pop() {
        let at = |i: usize| points.get(i % n).copied().unwrap_or_default();
        if let Some(kept) = is_kept.get_mut(from % n) {
            *kept = true;
        }
        let (a, b) = (at(from), at(to));
        let mut farthest = (tolerance, None);
        for i in from + 1..to {
            let distance = distance_to_segment(at(i), a, b);
            if distance > farthest.0 {
                farthest = (distance, Some(i));
            }
        }
        if let (_, Some(i)) = farthest {
            stack.push((from, i));
            stack.push((i, to));
        }
    }
    (0..n).filter(|&i| is_kept.get(i) == Some(&true)).collect()
}

fn distance_to_segment(p: [f64; 2], a: [f64; 2], b: [f64; 2]) -> f64 {
    let (ux, uy) = (b[0] - a[0], b[1] - a[1]);
    let (px, py) = (p[0] - a[0], p[1] - a[1]);
    let square = ux * ux + uy * uy;
    let share = if square > 0.0 {
        ((px * ux + py * uy) / square).clamp(0.0, 1.0)
    } else {
        0.0
    };
    (px - share * ux).hypot(py - share * uy)
}

/// The kept vertices, moved across the wall so that each edge keeps the area of its piece.
fn moved_across(points: &[[f64; 2]], kept: &[usize], tolerance: f64) -> PixelLoop {
    let n = points.len();
    let at = |i: usize| points.get(i % n).copied().unwrap_or_default();
    let ends = |edge: usize| {
        let from = kept.get(edge).copied().unwrap_or(0);
        let to = kept.get(edge + 1).copied();
        (from, to.unwrap_or(n + kept.first().copied().unwrap_or(0)))
    };
    // Area between the piece of the contour and its chord, and the chord.
    let edges: Vec<(f64, [f64; 2])> = (0..kept.len())
        .map(|edge| {
            let (from, to) = ends(edge);
            let (a, b) = (at(from), at(to));
            let area: f64 = (from..to)
                .map(|i| {
                    let (p, q) = (at(i), at(i + 1));
                    0.5 * ((p[0] - a[0]) * (q[1] - a[1]) - (q[0] - a[0]) * (p[1] - a[1]))
                })
                .sum();
            (area, [b[0] - a[0], b[1] - a[1]])
        })
        .collect();
    let before = edges.iter().cycle().skip(edges.len().saturating_sub(1));
    kept.iter()
        .zip(before.zip(&edges))
        .map(|(&i, ((area_before, chord_before), (area, chord)))| {
            let sum = [chord_before[0] + chord[0], chord_before[1] + chord[1]];
            // Moving the vertex by d along the normal of the chord past it adds d times half that chord.
            let length = sum[0].hypot(sum[1]);
            let shift = (area_before + area) / length;
            let p = at(i);
            if !shift.is_finite() || shift.abs() > tolerance {
                return p;
            }
            [
                p[0] + shift * sum[1] / length,
                p[1] - shift * sum[0] / length,
            ]
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::super::contour::{length, signed_area};
    use super::*;

    fn circle(radius: f64, count: u32) -> PixelLoop {
        (0..count)
            .map(|i| {
                let angle = f64::from(i) / f64::from(count) * std::f64::consts::TAU;
                [100.0 + radius * angle.cos(), 100.0 + radius * angle.sin()]
            })
            .collect()
    }

    #[test]
    fn a_circle_keeps_its_area_and_length() {
        let exact = circle(50.0, 5000);
        let few = simplified(&exact, 0.05);
        assert!(few.len() < 120, "{}", few.len());
        let area = signed_area(&few) / signed_area(&exact);
        assert!((area - 1.0).abs() < 2e-5, "{area}");
        let perimeter = length(&few) / length(&exact);
        assert!((perimeter - 1.0).abs() < 5e-4, "{perimeter}");
    }

    #[test]
    fn straight_walls_keep_their_corners() {
        let mut points: PixelLoop = Vec::new();
        for i in 0..1000 {
            points.push([f64::from(i), 0.0]);
        }
        for i in 0..500 {
            points.push([1000.0, f64::from(i)]);
        }
        for i in 0..1000 {
            points.push([1000.0 - f64::from(i), 500.0]);
        }
        for i in 0..500 {
            points.push([0.0, 500.0 - f64::from(i)]);
        }
        let few = simplified(&points, 0.05);
        assert!(few.len() <= 16, "{}", few.len());
        assert!((signed_area(&few) - 500_000.0).abs() < 1e-6);
        assert!((length(&few) - 3000.0).abs() < 1e-9);
    }

    #[test]
    fn nothing_is_moved_farther_than_the_tolerance() {
        let wavy: PixelLoop = circle(200.0, 4000)
            .into_iter()
            .enumerate()
            .map(|(i, p)| [p[0] + 0.4 * (i as f64).sin(), p[1]])
            .collect();
        for tolerance in [0.01, 0.1, 1.0] {
            let few = simplified(&wavy, tolerance);
            for p in &wavy {
                let next = few.iter().cycle().skip(1);
                let nearest = few
                    .iter()
                    .zip(next)
                    .map(|(&a, &b)| distance_to_segment(*p, a, b))
                    .fold(f64::INFINITY, f64::min);
                assert!(nearest <= 2.0 * tolerance, "{nearest} {tolerance}");
            }
        }
    }
}
