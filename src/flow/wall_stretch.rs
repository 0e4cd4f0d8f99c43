//! Wall shear along one stretch of wall between two corners, or once round a loop without corners.
//!
//! The samples scatter by about the square of the spacing where the wall crosses the lattice at changing
//! distances from the nodes. Beside the corners the law of the corner holds ([`CornerLaw`]); what the laws
//! leave of the samples is smoothed by quadratics over two and a half spacings to either side, and a cubic
//! runs through the smoothed values. On a stretch too short for that, a polynomial times the leading
//! powers of both corners is fitted to all its samples.

use nalgebra::{DMatrix, DVector, Matrix3, Vector3};

use super::corner_law::CornerLaw;

/// Distance from a convex corner, in spacings, below which its law stands alone.
const UNRESOLVED: f64 = 3.0;
/// The same for a re-entrant corner.
const UNRESOLVED_SINGULAR: f64 = 4.0;
/// Distance from a convex corner, in spacings, up to which samples decide its law.
const LAW_REACH: f64 = 12.0;
/// The same as a share of the stretch.
const LAW_SHARE: f64 = 0.45;
/// Length, in spacings, below which a stretch is short.
const SHORT: f64 = 14.0;
/// Half width of the smoothing, in spacings.
const SMOOTHING: f64 = 2.5;
/// Least number of samples in the smoothing.
const LEAST_SAMPLES: usize = 5;
/// Length, in spacings, below which a short stretch has one coefficient.
const STEADY: f64 = 5.0;
/// Least mean of the basis that decides that coefficient; it is one in the middle.
const LEAST_BASIS: f64 = 0.5;
/// Largest number of coefficients on a short stretch.
const SHORT_TERMS: usize = 3;

/// Shear along a stretch, as a function of the distance from its start.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Stretch {
    /// Arc length at which it starts, m.
    pub(crate) start: f64,
    /// Length, m.
    pub(crate) length: f64,
    /// Distances from both ends at which the corner laws are left, m; zero without a corner.
    pub(crate) zone: [f64; 2],
    /// Leading exponents at both ends, `None` without a corner.
    pub(crate) leading: Option<[f64; 2]>,
    shape: Shape,
}

#[derive(Debug, Clone, PartialEq)]
enum Shape {
    /// Corner laws of both ends, where there are corners, and a cubic through evenly spaced values.
    Smooth {
        laws: Option<Box<[CornerLaw; 2]>>,
        rest: Vec<f64>,
        slope: Vec<f64>,
    },
    /// Powers of the shares of both ends and a polynomial in the share.
    Short { powers: [f64; 2], terms: Vec<f64> },
}

impl Stretch {
    /// A closed loop without corners.
    ///
    /// - `samples`: arc length and shear, sorted, m; `spacing`: of the lattice, m
    pub(crate) fn closed(length: f64, samples: &[(f64, f64)], spacing: f64) -> Self {
        let around: Vec<(f64, f64)> = [-length, 0.0, length]
            .iter()
            .flat_map(|turn| samples.iter().map(move |&(s, v)| (s + turn, v)))
            .collect();
        let count = pieces(length, spacing);
        let step = length / count as f64;
        let mut rest: Vec<f64> = (0..count)
            .map(|k| smoothed(&around, step * k as f64, spacing))
            .collect();
        rest.push(rest[0]);
        let slope = (0..=count)
            .map(|k| {
                let (before, after) = ((k + count - 1) % count, (k + 1) % count);
                (rest[after] - rest[before]) / 2.0
            })
            .collect();
        Self {
            start: 0.0,
            length,
            zone: [0.0; 2],
            leading: None,
            shape: Shape::Smooth {
                laws: None,
                rest,
                slope,
            },
        }
    }

    /// A stretch between two corners with the given fluid angles.
    ///
    /// - `samples`: distance from the start and shear, sorted, m
    /// - `given`: laws of the corners that are known already
    /// - `spacing`: of the lattice, m; `fallback`: shear where there is no sample, m
    pub(crate) fn between(
        start: f64,
        length: f64,
        angles: [f64; 2],
        samples: &[(f64, f64)],
        given: [Option<CornerLaw>; 2],
        (spacing, fallback): (f64, f64),
    ) -> Self {
        let leading = angles.map(|angle| CornerLaw::fit(angle, spacing, &[]).leading);
        let unresolved = leading.map(|e| {
            let spacings = if e < 0.0 {
                UNRESOLVED_SINGULAR
            } else {
                UNRESOLVED
            };
            spacings * spacing
        });
        let inner: Vec<(f64, f64)> = samples
            .iter()
            .copied()
            .filter(|&(s, _)| s >= unresolved[0] && length - s >= unresolved[1])
            .collect();
        if length < SHORT * spacing || inner.len() < LEAST_SAMPLES {
            return Self {
                start,
                length,
                zone: [0.5 * length; 2],
                leading: Some(leading),
                shape: short(length, leading, samples, spacing, fallback),
            };
        }
        let law = |end: usize| {
            // The error of the grid falls with the distance from a re-entrant corner only slowly.
            let reach = if leading[end] < 0.0 {
                LAW_SHARE * length
            } else {
                (LAW_REACH * spacing).min(LAW_SHARE * length)
            };
            let from_end: Vec<(f64, f64)> = inner
                .iter()
                .map(|&(s, v)| (if end == 0 { s } else { length - s }, v))
                .filter(|&(r, _)| r <= reach)
                .collect();
            CornerLaw::fit(angles[end], spacing, &from_end)
        };
        let [first, second] = given;
        let faded = |law: CornerLaw| law.with_reach(LAW_SHARE * length);
        let laws = Box::new([
            first.map_or_else(|| law(0), faded),
            second.map_or_else(|| law(1), faded),
        ]);
        Self {
            start,
            length,
            zone: unresolved,
            leading: Some(leading),
            shape: smooth(length, unresolved, laws, &inner, spacing),
        }
    }

    /// Number of even pieces that the curve is made of.
    pub(crate) fn pieces(&self, spacing: f64) -> usize {
        match &self.shape {
            Shape::Smooth { rest, .. } => rest.len() - 1,
            Shape::Short { .. } => pieces(self.length, 0.5 * spacing),
        }
    }

    /// Shear at a distance from the start, m; without bound towards a re-entrant corner.
    pub(crate) fn value(&self, distance: f64) -> f64 {
        self.value_between(distance, self.length - distance)
    }

    /// The same from the distances to both ends, of which the smaller is exact.
    pub(crate) fn value_between(&self, s: f64, to_end: f64) -> f64 {
        let value = match &self.shape {
            Shape::Smooth { laws, rest, slope } => {
                let corners = laws
                    .as_ref()
                    .map_or(0.0, |l| l[0].value(s) + l[1].value(to_end));
                corners + cubic(rest, slope, s / self.length)
            }
            Shape::Short { powers, terms } => short_row(
                [s / self.length, to_end / self.length],
                *powers,
                terms.len(),
            )
            .iter()
            .zip(terms)
            .map(|(basis, c)| basis * c)
            .sum(),
        };
        // The velocity is positive, and so is its slope at the wall.
        value.max(0.0)
    }
}

/// The curve between two corners whose laws are known, from the samples outside the unresolved parts.
fn smooth(
    length: f64,
    unresolved: [f64; 2],
    laws: Box<[CornerLaw; 2]>,
    samples: &[(f64, f64)],
    spacing: f64,
) -> Shape {
    let left_over: Vec<(f64, f64)> = samples
        .iter()
        .map(|&(s, v)| {
            let ends = [s, length - s];
            let known = |end: usize| laws[end].value(ends[end]) + laws[end].grid_error(ends[end]);
            (s, v - known(0) - known(1))
        })
        .collect();
    let count = pieces(length, spacing);
    let step = length / count as f64;
    let rest: Vec<f64> = (0..=count)
        .map(|k| {
            let s = step * k as f64;
            // Within the unresolved part the law of that corner stands alone.
            if s < unresolved[0] {
                -laws[1].value(length - s)
            } else if length - s < unresolved[1] {
                -laws[0].value(s)
            } else {
                smoothed(&left_over, s, spacing)
            }
        })
        .collect();
    let slope = (0..=count)
        .map(|k| match k {
            0 => 2.0 * rest[1] - 1.5 * rest[0] - 0.5 * rest[2],
            k if k == count => 1.5 * rest[k] - 2.0 * rest[k - 1] + 0.5 * rest[k - 2],
            k => (rest[k + 1] - rest[k - 1]) / 2.0,
        })
        .collect();
    Shape::Smooth {
        laws: Some(laws),
        rest,
        slope,
    }
}

fn pieces(length: f64, spacing: f64) -> usize {
    ((length / spacing).ceil() as usize).max(4)
}

/// Value of the piecewise cubic at a share of the whole; slopes are per piece.
fn cubic(values: &[f64], slopes: &[f64], share: f64) -> f64 {
    let count = values.len() - 1;
    let at = share * count as f64;
    let k = (at.floor().max(0.0) as usize).min(count - 1);
    let t = at - k as f64;
    let (a, b) = (values[k], values[k + 1]);
    let (u, v) = (slopes[k], slopes[k + 1]);
    let rise = b - a;
    a + t * (u + t * (3.0 * rise - 2.0 * u - v + t * (u + v - 2.0 * rise)))
}

/// Weighted quadratic fit to the samples around a place, at that place.
fn smoothed(samples: &[(f64, f64)], at: f64, spacing: f64) -> f64 {
    let mut half = SMOOTHING * spacing;
    let near = loop {
        let low = samples.partition_point(|s| s.0 <= at - half);
        let high = samples.partition_point(|s| s.0 < at + half);
        if high - low >= LEAST_SAMPLES || high - low == samples.len() {
            break &samples[low..high];
        }
        half *= 1.5;
    };
    let (mut matrix, mut wanted) = (Matrix3::zeros(), Vector3::zeros());
    for &(s, v) in near {
        let x = (s - at) / half;
        let weight = (1.0 - x * x).powi(2);
        let row = Vector3::new(1.0, x, x * x);
        matrix += weight * row * row.transpose();
        wanted += weight * v * row;
    }
    // Of two samples, or several at one place, the mean is all that can be had.
    let mean = wanted[0] / matrix[(0, 0)];
    let solved = matrix.cholesky().map(|c| c.solve(&wanted)[0]);
    let spread = near
        .iter()
        .fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), s| {
            (low.min(s.1), high.max(s.1))
        });
    let room = spread.1 - spread.0;
    match solved {
        Some(value) if value >= spread.0 - room && value <= spread.1 + room => value,
        _ if mean.is_finite() => mean,
        _ => 0.0,
    }
}

/// Basis of a short stretch at given distances from both ends, as shares of its length.
fn short_row(share: [f64; 2], powers: [f64; 2], terms: usize) -> [f64; SHORT_TERMS] {
    let ends = (2.0 * share[0]).powf(powers[0]) * (2.0 * share[1]).powf(powers[1]);
    let x = share[0] - share[1];
    let mut row = [ends, ends * x, ends * x * x];
    for value in row.iter_mut().skip(terms) {
        *value = 0.0;
    }
    row
}

/// Fit to all samples of a short stretch.
fn short(
    length: f64,
    leading: [f64; 2],
    samples: &[(f64, f64)],
    spacing: f64,
    fallback: f64,
) -> Shape {
    // Beside an acute corner the linear particular part leads.
    let powers = leading.map(|e| e.min(1.0));
    let away = |least: f64| -> Vec<(f64, f64)> {
        let far = |s: &&(f64, f64)| s.0.min(length - s.0) >= least;
        samples.iter().filter(far).copied().collect()
    };
    let is_singular = leading.iter().any(|e| *e < 0.0);
    let mut used = away(if is_singular { 0.5 } else { 1.0 } * spacing);
    if used.len() < 2 {
        used = away(0.25 * length.min(spacing));
    }
    if used.is_empty() {
        used = vec![(0.5 * length, fallback)];
    }
    if length < STEADY * spacing {
        // A polynomial through a few samples would swing between them, and one sample beside a corner
        // must not decide the middle.
        let basis = |s: f64| short_row([s / length, 1.0 - s / length], powers, 1)[0];
        let (sum, of_basis) = used
            .iter()
            .fold((0.0, 0.0), |sum, &(s, v)| (sum.0 + v, sum.1 + basis(s)));
        let least = LEAST_BASIS * used.len() as f64;
        return Shape::Short {
            powers,
            terms: vec![sum / of_basis.max(least)],
        };
    }
    let terms = (used.len() / 2).clamp(1, SHORT_TERMS);
    let matrix = DMatrix::from_fn(used.len(), terms, |row, column| {
        let share = used[row].0 / length;
        short_row([share, 1.0 - share], powers, terms)[column]
    });
    let wanted = DVector::from_fn(used.len(), |row, _| used[row].1);
    let terms = matrix
        .svd(true, true)
        .solve(&wanted, 1e-9)
        .map_or_else(|_| vec![fallback], |found| found.iter().copied().collect());
    Shape::Short { powers, terms }
}
