//! How well a groove agrees with two shapes of wet etching.
//!
//! - Anisotropic (KOH on (100) silicon): flat floor, or a V, with walls on (111) planes, arctan(sqrt 2) =
//!   54.7356 degrees against the surface.
//! - Isotropic: flat floor of the width of the mask opening, and quarter circles of the radius of the depth on
//!   both sides (the undercut of the mask is the depth).
//!
//! Points at equal distances along the wall are fitted by least squares of their distances from the shape; a
//! large residual says that the trace or the process is another.

use nalgebra::{Matrix3, Vector3};

use crate::geometry::Point;

/// Angle of (111) planes against a (100) surface, rad: arctan(sqrt 2).
pub const KOH_ANGLE: f64 = 0.955_316_618_124_509_3;

/// Points along the wall.
const POINTS: usize = 300;
/// Rounds of the fits.
const ROUNDS: usize = 60;

/// A trapezoid (or V) with walls at [`KOH_ANGLE`].
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct KohFit {
    /// Width at the lands, m.
    pub top_width: f64,
    /// Depth of the floor, m; for a V that of its tip.
    pub depth: f64,
    /// Middle at the lands, m.
    pub middle: f64,
    /// Root mean square distance of the wall from the shape, m.
    pub rms: f64,
}

/// A flat floor between quarter circles.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct IsotropicFit {
    /// Width of the floor, which is that of the mask opening, m.
    pub mask_opening: f64,
    /// Depth, radius and undercut, m.
    pub depth: f64,
    /// Middle, m.
    pub middle: f64,
    /// Root mean square distance of the wall from the shape, m.
    pub rms: f64,
}

/// Points at equal distances along a wall given as position and depth, from half a distance after its
/// begin on.
pub(super) fn along(wall: &[Point]) -> Vec<Point> {
    let length = |pair: &[Point]| (pair[1][0] - pair[0][0]).hypot(pair[1][1] - pair[0][1]);
    let total: f64 = wall.windows(2).map(length).sum();
    let spacing = total / POINTS as f64;
    let mut points = Vec::with_capacity(POINTS);
    let mut passed = 0.0;
    for pair in wall.windows(2) {
        let piece = length(pair);
        while points.len() < POINTS && (points.len() as f64 + 0.5) * spacing <= passed + piece {
            let t = ((points.len() as f64 + 0.5) * spacing - passed) / piece;
            points.push([
                pair[0][0] + t * (pair[1][0] - pair[0][0]),
                pair[0][1] + t * (pair[1][1] - pair[0][1]),
            ]);
        }
        passed += piece;
    }
    points
}

/// The trapezoid of least squares; `None` where the points do not fill it.
///
/// Every point belongs to the nearest of left wall, right wall and floor; each of the three lies in the mean of its
/// points, until nothing changes.
pub(super) fn koh(points: &[Point]) -> Option<KohFit> {
    let slope = KOH_ANGLE.tan();
    let shape = [
        points.first()?[0],
        points.last()?[0],
        points.iter().fold(0.0, |d: f64, p| d.max(p[1])),
    ];
    let (sine, cosine) = KOH_ANGLE.sin_cos();
    let distances = |[left, right, depth]: [f64; 3], &[x, d]: &Point| {
        [
            (x - left) * sine - d * cosine,
            (right - x) * sine - d * cosine,
            depth - d,
        ]
    };
    // Inside the shape all three are positive: the least one is the distance.
    let nearest = |all: [f64; 3]| {
        (0..3)
            .min_by(|&a, &b| all[a].total_cmp(&all[b]))
            .unwrap_or(2)
    };
    let mut shape = shape;
    for _ in 0..ROUNDS {
        let mut sums = [(0.0, 0_usize); 3];
        for p in points {
            let part = nearest(distances(shape, p));
            let own = [p[0] - p[1] / slope, p[0] + p[1] / slope, p[1]][part];
            sums[part] = (sums[part].0 + own, sums[part].1 + 1);
        }
        let mut change = 0.0_f64;
        for (value, (sum, count)) in shape.iter_mut().zip(sums) {
            if count > 0 {
                change = change.max((sum / count as f64 - *value).abs());
                *value = sum / count as f64;
            }
        }
        if change <= 1e-15 * shape[2] {
            break;
        }
    }
    let [left, right, depth] = shape;
    let square = |p: &Point| {
        let all = distances(shape, p);
        all[nearest(all)].powi(2)
    };
    let rms = (points.iter().map(square).sum::<f64>() / points.len() as f64).sqrt();
    let fit = KohFit {
        top_width: right - left,
        depth: depth.min(0.5 * (right - left) * slope),
        middle: 0.5 * (left + right),
        rms,
    };
    (fit.top_width > 0.0 && fit.depth > 0.0 && rms.is_finite()).then_some(fit)
}

/// The isotropic shape of least squares; `None` where the points have none.
///
/// Gauss-Newton steps for both centres and the depth; the centres do not pass each other.
pub(super) fn isotropic(points: &[Point]) -> Option<IsotropicFit> {
    let mut depth = points.iter().fold(0.0, |d: f64, p| d.max(p[1]));
    let (first, last) = (points.first()?[0], points.last()?[0]);
    let (mut left, mut right) = (first + depth, last - depth);
    if left > right {
        left = 0.5 * (first + last);
        right = left;
    }
    let distance = |[left, right, depth]: [f64; 3], &[x, d]: &Point| {
        let aside = (x - left).min(0.0) + (x - right).max(0.0);
        let radius = aside.hypot(d);
        (depth - radius, aside / radius.max(f64::MIN_POSITIVE))
    };
    for _ in 0..ROUNDS {
        // Moving a centre by 1 changes the distance by the sine of its side, the depth by 1; a point belongs
        // to one side only.
        let (mut squares, mut sums, mut rest) = ([0.0; 2], [0.0; 2], [0.0; 3]);
        for p in points {
            let (off, sine) = distance([left, right, depth], p);
            let side = usize::from(sine > 0.0);
            squares[side] += sine * sine;
            sums[side] += sine;
            rest[side] -= sine * off;
            rest[2] -= off;
        }
        // A side without points leaves its centre where it is.
        let count = points.len() as f64;
        let [a, b] = squares.map(|s| s + 1e-9 * count);
        let [d, e] = sums;
        let normal = Matrix3::new(a, 0.0, d, 0.0, b, e, d, e, count);
        let step = normal.lu().solve(&Vector3::from(rest))?;
        left += step[0];
        right += step[1];
        depth += step[2];
        if left > right {
            left = 0.5 * (left + right);
            right = left;
        }
        if step.amax() <= 1e-12 * depth.abs() {
            break;
        }
    }
    let square = |p: &Point| distance([left, right, depth], p).0.powi(2);
    let rms = (points.iter().map(square).sum::<f64>() / points.len() as f64).sqrt();
    let fit = IsotropicFit {
        mask_opening: right - left,
        depth,
        middle: 0.5 * (left + right),
        rms,
    };
    (depth > 0.0 && rms.is_finite() && fit.middle.is_finite()).then_some(fit)
}
