//! Curves to straight segments: arcs, elliptical arcs and any smooth parametric curve.
//!
//! Every vertex lies on the curve, so a polyline is off by at most its chord error (the sagitta of the
//! longest segment). All lengths in metres, angles in radians, anticlockwise positive.
//!
//! How small the chord error has to be follows from the shape derivative of the conductance,
//! `dK = integral of (dphi/dn)^2 dn_w ds` over the wall, `dn_w` the outward motion of the wall. An
//! inscribed chord of sagitta `s` moves the wall by `2 s / 3` in the mean, and by Rellich's identity
//! `integral of (r.n) (dphi/dn)^2 ds = 4 K`, so in a section that is star-shaped about the centre of a
//! circle of radius `rho` inside it `abs(dK)/K <= 8 s / (3 rho)`. With `s = 1e-7` of the smaller overall
//! dimension, `rho` half of it: `5.3e-7`, below the `1e-6` that the solver's best value can show. A full
//! circle then has about 5000 segments. Kinds with a narrower measure (the gap of an annulus, the height
//! left under a sagging lid) refer the chord error to that measure.

use std::f64::consts::{FRAC_PI_4, TAU};

use super::Point;

/// Largest distance between a curve and its segments, as a fraction of the section's smaller overall
/// dimension (or of a narrower measure that the kind states).
pub const CHORD_TOLERANCE: f64 = 1e-7;

/// Largest number of segments of one curve.
pub const MAX_SEGMENTS: usize = 1_000_000;

/// Bisection starts from this many equal pieces, so that no feature of a smooth curve is stepped over.
const FIRST_PIECES: u32 = 16;

/// Share of the chord error that the sampled distances may use; the rest covers the unsampled places.
const SAMPLED_SHARE: f64 = 0.9;

/// Why a curve could not be turned into segments.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum CurveError {
    /// The chord error asks for too many segments.
    #[error(
        "a curve needs {needed:.0} segments for a chord error of {chord_error:e} m; the limit is {limit}"
    )]
    TooManySegments {
        /// Segments that would be needed (for a bisected curve: reached when it was given up).
        needed: f64,
        /// Largest distance between curve and segment that was asked for, m.
        chord_error: f64,
        /// The limit.
        limit: usize,
    },
    /// A radius, angle or chord error is zero, negative or not finite, or the curve left the numbers.
    #[error("a curve has a size, an angle or a point that is not usable: {what} = {value}")]
    NotUsable {
        /// Which input.
        what: &'static str,
        /// Its value.
        value: f64,
    },
}

/// The circular arc from `start` over `sweep`, both ends included.
///
/// Segment angle `4 asin(sqrt(s / (2 R)))` for a sagitta `s`, and at most 45 degrees.
///
/// - `centre`: m; `radius`: m, above 0
/// - `start`, `sweep`: rad, `sweep` positive for anticlockwise, not 0
/// - `chord_error`: largest distance between arc and segment, m, above 0
///
/// # Errors
/// [`CurveError`] for an unusable size or more than [`MAX_SEGMENTS`] segments.
///
/// # Examples
/// ```
/// let quarter = etchwise::geometry::curves::arc([0.0, 0.0], 1.0, 0.0, 1.570796, 1e-3)?;
/// assert!(quarter.iter().all(|p| (p[0].hypot(p[1]) - 1.0).abs() < 1e-12));
/// # Ok::<(), etchwise::geometry::curves::CurveError>(())
/// ```
pub fn arc(
    centre: Point,
    radius: f64,
    start: f64,
    sweep: f64,
    chord_error: f64,
) -> Result<Vec<Point>, CurveError> {
    usable("radius", radius, radius > 0.0)?;
    usable("chord error", chord_error, chord_error > 0.0)?;
    usable("sweep", sweep, sweep != 0.0)?;
    usable("start angle", start, true)?;
    let step = 4.0 * (chord_error / (2.0 * radius)).min(1.0).sqrt().asin();
    let needed = (sweep.abs() / step.min(FRAC_PI_4)).ceil();
    if needed > MAX_SEGMENTS as f64 {
        return Err(CurveError::TooManySegments {
            needed,
            chord_error,
            limit: MAX_SEGMENTS,
        });
    }
    let count = needed as usize;
    Ok((0..=count)
        .map(|i| {
            let (sin, cos) = (start + sweep * i as f64 / count as f64).sin_cos();
            [centre[0] + radius * cos, centre[1] + radius * sin]
        })
        .collect())
}

/// The elliptical arc `[cx + a cos t, cy + b sin t]` for `t` from `start` over `sweep`, both ends included.
///
/// - `centre`, `semi_axes` (`[a, b]` along x and y): m
/// - `start`, `sweep`: eccentric anomaly, rad
/// - `chord_error`: m, above 0
///
/// # Errors
/// [`CurveError`] for an unusable size or more than [`MAX_SEGMENTS`] segments.
pub fn elliptical_arc(
    centre: Point,
    semi_axes: [f64; 2],
    start: f64,
    sweep: f64,
    chord_error: f64,
) -> Result<Vec<Point>, CurveError> {
    usable("semi-axis", semi_axes[0], semi_axes[0] > 0.0)?;
    usable("semi-axis", semi_axes[1], semi_axes[1] > 0.0)?;
    usable("sweep", sweep, sweep != 0.0 && sweep.abs() <= TAU)?;
    let curve = |t: f64| {
        let (sin, cos) = t.sin_cos();
        [
            centre[0] + semi_axes[0] * cos,
            centre[1] + semi_axes[1] * sin,
        ]
    };
    parametric(curve, (start, start + sweep), chord_error)
}

/// Any smooth curve `curve(t)`, `t` over `range` in its order, both ends included, by bisection.
///
/// A piece is halved until its points at one, two and three quarters lie within `chord_error` of the
/// chord (less a reserve for the places between).
///
/// - `curve`: point in metres; smooth on the scale of a sixteenth of `range`
/// - `chord_error`: m, above 0
///
/// # Errors
/// [`CurveError`] for a chord error that is not above 0, a point that is not finite, or more than
/// [`MAX_SEGMENTS`] segments.
pub fn parametric(
    curve: impl Fn(f64) -> Point,
    range: (f64, f64),
    chord_error: f64,
) -> Result<Vec<Point>, CurveError> {
    usable("chord error", chord_error, chord_error > 0.0)?;
    let at = |t: f64| {
        let p = curve(t);
        usable("x", p[0], true)?;
        usable("y", p[1], true)?;
        Ok(p)
    };
    let node = |i: u32| range.0 + (range.1 - range.0) * f64::from(i) / f64::from(FIRST_PIECES);
    let mut open: Vec<(f64, f64)> = (0..FIRST_PIECES)
        .rev()
        .map(|i| (node(i), node(i + 1)))
        .collect();
    let mut points = vec![at(range.0)?];
    let allowed = SAMPLED_SHARE * chord_error;
    while let Some((from, to)) = open.pop() {
        let (a, b, middle) = (at(from)?, at(to)?, f64::midpoint(from, to));
        let mut worst = 0.0_f64;
        for t in [
            f64::midpoint(from, middle),
            middle,
            f64::midpoint(middle, to),
        ] {
            worst = worst.max(distance_to_segment(at(t)?, a, b));
        }
        let halvable = middle > from.min(to) && middle < from.max(to);
        if worst > allowed && halvable {
            open.push((middle, to));
            open.push((from, middle));
        } else {
            points.push(b);
        }
        if points.len() + open.len() > MAX_SEGMENTS {
            return Err(CurveError::TooManySegments {
                needed: (points.len() + open.len()) as f64,
                chord_error,
                limit: MAX_SEGMENTS,
            });
        }
    }
    Ok(points)
}

/// Distance of a point from a segment, m.
pub(crate) fn distance_to_segment(p: Point, a: Point, b: Point) -> f64 {
    let along = [b[0] - a[0], b[1] - a[1]];
    let from = [p[0] - a[0], p[1] - a[1]];
    let square = along[0] * along[0] + along[1] * along[1];
    let share = if square > 0.0 {
        ((from[0] * along[0] + from[1] * along[1]) / square).clamp(0.0, 1.0)
    } else {
        0.0
    };
    (from[0] - share * along[0]).hypot(from[1] - share * along[1])
}

/// An input that must be finite and `fits`.
fn usable(what: &'static str, value: f64, fits: bool) -> Result<(), CurveError> {
    if value.is_finite() && fits {
        Ok(())
    } else {
        Err(CurveError::NotUsable { what, value })
    }
}

#[cfg(test)]
mod tests {
    use std::f64::consts::{FRAC_PI_2, PI};

    use super::*;

    /// Largest distance from dense points of `curve` to the polyline, which visits them in order.
    fn largest_chord_error(curve: impl Fn(f64) -> Point, range: (f64, f64), line: &[Point]) -> f64 {
        let samples = 40 * line.len();
        let mut segment = 0;
        let mut worst = 0.0_f64;
        for i in 0..=samples {
            let p = curve(range.0 + (range.1 - range.0) * i as f64 / samples as f64);
            let distance = |s: usize| distance_to_segment(p, line[s], line[s + 1]);
            while segment + 2 < line.len() && distance(segment + 1) < distance(segment) {
                segment += 1;
            }
            worst = worst.max(distance(segment));
        }
        worst
    }

    #[test]
    fn an_arc_keeps_its_chord_error_and_does_not_waste_segments() {
        for chord_error in [1e-2, 1e-4, 1e-7] {
            let line = arc([3.0, -2.0], 1.5, 0.3, -2.0, chord_error).unwrap();
            let curve = |t: f64| [3.0 + 1.5 * t.cos(), -2.0 + 1.5 * t.sin()];
            let worst = largest_chord_error(curve, (0.3, -1.7), &line);
            assert!(worst <= chord_error * (1.0 + 1e-6) + 1e-15, "{worst:e}");
            assert!(
                worst >= 0.3 * chord_error,
                "{worst:e} against {chord_error:e}"
            );
        }
    }

    #[test]
    fn an_elliptical_arc_and_a_bell_curve_keep_their_chord_error() {
        for chord_error in [1e-3, 1e-6] {
            let line = elliptical_arc([0.0, 1.0], [5.0, 0.5], PI, PI, chord_error).unwrap();
            let curve = |t: f64| [5.0 * t.cos(), 1.0 + 0.5 * t.sin()];
            assert!(largest_chord_error(curve, (PI, 2.0 * PI), &line) <= chord_error);
            let bell = |x: f64| [x, -(-x * x).exp()];
            let line = parametric(bell, (-3.0, 3.0), chord_error).unwrap();
            assert!(largest_chord_error(bell, (-3.0, 3.0), &line) <= chord_error);
        }
    }

    #[test]
    fn a_full_circle_at_the_stated_tolerance_has_about_five_thousand_segments() {
        let line = arc([0.0; 2], 0.5, 0.0, TAU, CHORD_TOLERANCE).unwrap();
        assert_eq!(line.len() - 1, 4968);
    }

    #[test]
    fn ends_are_on_the_curve_and_a_tiny_radius_still_makes_a_figure() {
        let line = arc([0.0; 2], 1.0, 0.0, FRAC_PI_2, 1e-3).unwrap();
        assert!((line.last().unwrap()[1] - 1.0).abs() < 1e-15);
        assert_eq!(arc([0.0; 2], 1e-9, 0.0, TAU, 1.0).unwrap().len(), 9);
    }

    #[test]
    fn unusable_input_and_endless_curves_are_refused() {
        let endless = arc([0.0; 2], 1e3, 0.0, TAU, 1e-19);
        assert!(matches!(endless, Err(CurveError::TooManySegments { .. })));
        for (radius, sweep, chord_error) in [
            (0.0, 1.0, 1.0),
            (1.0, 0.0, 1.0),
            (1.0, 1.0, 0.0),
            (f64::NAN, 1.0, 1.0),
        ] {
            let refused = arc([0.0; 2], radius, 0.0, sweep, chord_error);
            assert!(matches!(refused, Err(CurveError::NotUsable { .. })));
        }
        let wild = parametric(|t| [t, 1.0 / t], (0.0, 1.0), 1e-3);
        assert!(matches!(wild, Err(CurveError::NotUsable { what: "y", .. })));
        let endless = parametric(|t| [t, (1e6 * t).sin()], (0.0, 1.0), 1e-9);
        assert!(matches!(endless, Err(CurveError::TooManySegments { .. })));
    }
}
