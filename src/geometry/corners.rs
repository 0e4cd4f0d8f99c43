//! Corners of a loop as a grid of a given spacing sees them.
//!
//! The turning of the wall is summed over a window of one spacing, so that an arc smaller than the grid
//! counts as the corner it looks like, while a zigzag of the outline within the window cancels out.

use super::outline::{Loop, Point, distance};

/// A corner of the wall.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Corner {
    /// Arc length from the first vertex of the loop, m.
    pub arc_length: f64,
    /// Where, m.
    pub at: Point,
    /// Turning angle, radians: positive where the fluid angle is below 180 degrees (convex), negative
    /// where it is above (re-entrant), for a loop with the fluid on its left.
    pub turning: f64,
}

impl Corner {
    /// Angle on the fluid side, radians.
    pub fn fluid_angle(&self) -> f64 {
        std::f64::consts::PI - self.turning
    }
}

/// Corners whose turning within `window` is at least `least_turning` radians, in order along the loop.
///
/// A stretch of strong turning much longer than the window is a curve, not a corner, and a loop of only a
/// few windows is neither: both are left out.
///
/// - `wall`: fluid on the left
/// - `window`: arc length over which turning is summed, m
pub fn corners(wall: &Loop, window: f64, least_turning: f64) -> Vec<Corner> {
    let vertices = turnings(wall);
    let length = wall.length();
    let n = vertices.len();
    let mut found: Vec<Corner> = Vec::new();
    if n < 3 || length < 4.0 * window {
        return found;
    }
    // Two pointers over the loop unrolled three times keep the window sum.
    let place = |k: usize| vertices[k % n].0 + length * ((k / n) as f64 - 1.0);
    let (mut low, mut high, mut sum) = (n, n, 0.0);
    while place(low - 1) >= place(n) - 0.5 * window && low > 1 {
        low -= 1;
        sum += vertices[low % n].1;
    }
    // Where the stretch of the last corner began, and its last vertex so far.
    let mut stretch = (0.0, f64::NEG_INFINITY);
    for k in n..2 * n {
        while high < 3 * n && place(high) <= place(k) + 0.5 * window {
            sum += vertices[high % n].1;
            high += 1;
        }
        while place(low) < place(k) - 0.5 * window {
            sum -= vertices[low % n].1;
            low += 1;
        }
        if sum.abs() < least_turning {
            continue;
        }
        let corner = Corner {
            arc_length: vertices[k - n].0,
            at: wall.points[k - n],
            turning: sum,
        };
        // Neighbouring candidates are one corner; a vertex that turns most stands for it.
        let joins = corner.arc_length - stretch.1 < 0.5 * window;
        match found.last_mut() {
            Some(last) if joins && last.turning.signum() == sum.signum() => {
                if sum.abs() > last.turning.abs() + 1e-9 {
                    *last = corner;
                }
            }
            _ => {
                drop_if_curve(&mut found, stretch, window);
                stretch.0 = corner.arc_length;
                found.push(corner);
            }
        }
        stretch.1 = corner.arc_length;
    }
    drop_if_curve(&mut found, stretch, window);
    for corner in &mut found {
        to_sharp_vertex(corner, wall, &vertices, (window, length));
    }
    found.sort_by(|a, b| a.arc_length.total_cmp(&b.arc_length));
    // Two windows may have found one vertex.
    found.dedup_by(|a, b| a.arc_length.total_cmp(&b.arc_length).is_eq());
    found
}

/// Turning per vertex, radians, where a loop is a curve cut into straight pieces, weighted with the turning itself and
/// as a share of a full turn: `sum(turning^2) / (2 pi)` over the vertices that turn by less than `corner_turning`.
pub(crate) fn facet_turning(wall: &Loop, corner_turning: f64) -> f64 {
    let n = wall.points.len();
    let facets = (0..n)
        .map(|k| turning_at(wall, k).abs())
        .filter(|turning| *turning < corner_turning);
    facets.map(|turning| turning * turning).sum::<f64>() / std::f64::consts::TAU
}

/// Moves a corner to the vertex that makes up more than half of its turning, if one in its window does:
/// every window that holds such a vertex between even arcs turns alike.
fn to_sharp_vertex(
    corner: &mut Corner,
    wall: &Loop,
    vertices: &[(f64, f64)],
    (window, length): (f64, f64),
) {
    let n = vertices.len();
    let start = vertices.partition_point(|v| v.0 < corner.arc_length);
    let apart = |k: usize| {
        let d = (vertices[k % n].0 - corner.arc_length).rem_euclid(length);
        d.min(length - d)
    };
    let ahead = (start..start + n).take_while(|&k| apart(k) <= 0.5 * window);
    let behind = (1..n)
        .map(|k| start + n - k)
        .take_while(|&k| apart(k) <= 0.5 * window);
    let sharpest = ahead.chain(behind).map(|k| k % n).max_by(|&a, &b| {
        let turning = |k: usize| vertices[k].1 * corner.turning.signum();
        turning(a).total_cmp(&turning(b))
    });
    if let Some(k) = sharpest
        && vertices[k].1 * corner.turning.signum() > 0.5 * corner.turning.abs()
    {
        corner.arc_length = vertices[k].0;
        corner.at = wall.points[k];
    }
}

/// Takes the last corner back if its stretch is too long for one.
fn drop_if_curve(found: &mut Vec<Corner>, stretch: (f64, f64), window: f64) {
    if stretch.1 - stretch.0 > 1.5 * window {
        found.pop();
    }
}

/// Arc length and turning angle of every vertex.
fn turnings(wall: &Loop) -> Vec<(f64, f64)> {
    let n = wall.points.len();
    let mut arc = 0.0;
    (0..n)
        .map(|k| {
            let entry = (arc, turning_at(wall, k));
            arc += distance(wall.points[k], wall.points[(k + 1) % n]);
            entry
        })
        .collect()
}

/// Turning angle of vertex `k`, radians, positive to the left.
pub(crate) fn turning_at(wall: &Loop, k: usize) -> f64 {
    let n = wall.points.len();
    let (a, b, c) = (
        wall.points[if k == 0 { n - 1 } else { k - 1 }],
        wall.points[k],
        wall.points[if k + 1 == n { 0 } else { k + 1 }],
    );
    let (ux, uy) = (b[0] - a[0], b[1] - a[1]);
    let (vx, vy) = (c[0] - b[0], c[1] - b[1]);
    angle_of(ux * vx + uy * vy, ux * vy - uy * vx)
}

/// Angle of the vector `(x, y)`; outlines have many vertices that hardly turn, for which the first terms of the series
/// are exact.
fn angle_of(x: f64, y: f64) -> f64 {
    const FLAT: f64 = 0.02;
    if y.abs() >= FLAT * x {
        return y.atan2(x);
    }
    let t = y / x;
    let q = t * t;
    t * (1.0 - q * (1.0 / 3.0 - q * (1.0 / 5.0 - q * (1.0 / 7.0 - q / 9.0))))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn small_angles_are_those_of_the_library() {
        for k in -4000..4000 {
            let t = 1e-5 * f64::from(k);
            let (x, y) = (3.0 * t.cos(), 3.0 * t.sin());
            assert!(
                (angle_of(x, y) - y.atan2(x)).abs() <= 4e-18_f64.max(2.3e-16 * t.abs()),
                "{t}"
            );
        }
        for (x, y) in [
            (0.0, 0.0),
            (-1.0, 1e-9),
            (0.0, -1.0),
            (-1.0, -1.0),
            (f64::NAN, 1.0),
        ] {
            assert_eq!(angle_of(x, y).to_bits(), y.atan2(x).to_bits());
        }
    }

    #[test]
    fn an_l_shape_has_five_convex_corners_and_one_re_entrant_one() {
        let l = Loop::new(vec![
            [0.0, 0.0],
            [2.0, 0.0],
            [2.0, 1.0],
            [1.0, 1.0],
            [1.0, 2.0],
            [0.0, 2.0],
        ]);
        let found = corners(&l, 0.1, 0.2);
        let re_entrant: Vec<_> = found.iter().filter(|c| c.turning < 0.0).collect();
        assert_eq!(found.len(), 6);
        assert_eq!(re_entrant.len(), 1);
        assert_eq!(re_entrant[0].at.map(f64::to_bits), [1.0_f64.to_bits(); 2]);
        assert!((re_entrant[0].fluid_angle().to_degrees() - 270.0).abs() < 1e-9);
    }

    #[test]
    fn a_crest_between_two_arcs_is_found_at_its_vertex() {
        let half = 28_f64.to_radians();
        let arc = |centre: f64| {
            (0..100).map(move |k| {
                let t = half * (f64::from(k) / 50.0 - 1.0);
                [centre + t.sin(), half.cos() - t.cos()]
            })
        };
        let mut points: Vec<Point> = arc(0.0).chain(arc(2.0 * half.sin())).collect();
        points.extend([[3.0 * half.sin(), 0.0], [0.5, 3.0]]);
        let crest = points[100];
        for window in [0.02, 0.05, 0.15] {
            let found = corners(&Loop::new(points.clone()), window, 0.2);
            let sharp: Vec<_> = found.iter().filter(|c| c.turning < 0.0).collect();
            assert_eq!(sharp.len(), 1, "{window}");
            assert_eq!(
                sharp[0].at.map(f64::to_bits),
                crest.map(f64::to_bits),
                "{window}"
            );
        }
    }

    #[test]
    fn a_small_arc_is_one_corner_and_a_large_circle_is_none() {
        let circle = |r: f64| {
            Loop::new(
                (0..720)
                    .map(|k| {
                        let t = f64::from(k).to_radians() / 2.0;
                        [r * t.cos(), r * t.sin()]
                    })
                    .collect(),
            )
        };
        assert!(corners(&circle(1.0), 0.02, 0.2).is_empty());
        assert!(corners(&circle(1.0), 0.5, 0.2).is_empty());
        let facets = facet_turning(&circle(1.0), 0.2);
        assert!((facets - 0.5_f64.to_radians()).abs() < 1e-9);
        let rounded = Loop::new(
            std::iter::once([10.0, -10.0])
                .chain((0..=90).map(|k| {
                    let t = f64::from(k).to_radians();
                    [9.9 + 0.1 * t.cos(), 9.9 + 0.1 * t.sin()]
                }))
                .chain([[-10.0, 10.0], [-10.0, -10.0]])
                .collect(),
        );
        let found = corners(&rounded, 1.0, 0.2);
        assert_eq!(found.len(), 4);
        assert!((found[1].turning.to_degrees() - 90.0).abs() < 1.0);
        // A quarter of the turning is in facets of one degree, the rest in corners.
        let facets = facet_turning(&rounded, 0.2);
        assert!((facets - 0.25_f64.to_radians()).abs() < 1e-4, "{facets}");
    }
}
