//! Wall shear along one stretch of wall between two corners, or once round a loop without corners.
//!
//! The samples scatter by about the square of the spacing where the wall crosses the lattice at changing
//! distances from the nodes. Beside the corners the law of the corner holds ([`CornerLaw`]); what the laws
//! leave of the samples is smoothed by quadratics over two and a half spacings to either side, and a cubic
//! runs through the smoothed values. On a stretch too short for that the samples are interpolated after
//! division by the leading powers of both corners. Where the layer on the wall (module `wall_layer`) gives the
//! shear beside a corner, that stands for the slopes and the law goes through it.

use nalgebra::{Matrix3, Vector3};

use super::corner_law::CornerLaw;

/// Distance from a convex corner, in spacings, below which its law stands alone.
const UNRESOLVED: f64 = 3.0;
/// The same for a re-entrant corner whose law comes from the nodes around it.
const UNRESOLVED_SINGULAR: f64 = 4.0;
/// The same for a re-entrant corner without such a law.
const NEAREST_SINGULAR: f64 = 1.0;
/// Distance, in spacings, up to which samples decide the leading power of such a corner.
const SINGULAR_REACH: f64 = 4.0;
/// Distance from a convex corner, in spacings, up to which samples decide its law.
pub(super) const LAW_REACH: f64 = 12.0;
/// The same as a share of the stretch.
pub(super) const LAW_SHARE: f64 = 0.45;
/// Distance from a corner, in pieces, from which its law is replaced by cubics, within 1e-6 of it.
const LAW_NEAR: f64 = 8.0;
/// Half the step of the difference that gives the slope of a law, in pieces.
const SLOPE_STEP: f64 = 1e-3;
/// Length, in spacings, below which a stretch is short.
pub(super) const SHORT: f64 = 14.0;
/// Distance from a corner, in spacings, within which there must be a sample of the layer for a law from it.
const AT_CORNER: f64 = 0.5;
/// Distance from a sample of the layer, in spacings, within which slopes are left out.
const SAME_AS_LAYER: f64 = 0.6;
/// The same on a short stretch.
const SAME_ON_SHORT: f64 = 1.0;
/// Half width of the smoothing, in spacings.
const SMOOTHING: f64 = 2.5;
/// Least number of samples in the smoothing.
const LEAST_SAMPLES: usize = 5;
/// Samples nearer to each other than this are one, spacings.
const SAME_PLACE: f64 = 0.2;
/// Length, in spacings, below which a short stretch has one factor.
const STEADY: f64 = 5.0;
/// Least mean of the powers that decides that factor; they are one in the middle.
const LEAST_BASIS: f64 = 0.5;

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
    /// A cubic through evenly spaced values, and the laws of the corners at the ends, where there are corners.
    Smooth {
        laws: Option<Box<[CornerLaw; 2]>>,
        /// Values and slopes per piece at both ends of each piece, without the laws that are added there.
        pieces: Vec<[f64; 4]>,
        /// Number of pieces from either end to which the law of that end is added; in the others it is part of the
        /// cubic.
        near: [usize; 2],
    },
    /// Leading powers of both ends times a factor, given at shares of the length.
    Short {
        powers: [f64; 2],
        places: Vec<(f64, f64)>,
    },
}

/// Distance from the start of a stretch and shear there, sorted, m.
pub(crate) struct Samples {
    /// From slopes along lattice lines.
    pub(crate) slopes: Vec<(f64, f64)>,
    /// From the layer on the wall beside corners: free of the grid's error.
    pub(crate) layer: Vec<(f64, f64)>,
}

impl Samples {
    /// Those of the layer up to a distance from an end, by the distance from it.
    fn layer_beside(&self, end: usize, length: f64, reach: f64) -> Vec<(f64, f64)> {
        let from_end = |&(s, v): &(f64, f64)| (if end == 0 { s } else { length - s }, v);
        let beside = self.layer.iter().map(from_end).filter(|s| s.0 < reach);
        beside.collect()
    }

    /// Those of the layer and the slopes that are not nearer to any of them than a distance.
    fn merged(&self, distance: f64) -> Vec<(f64, f64)> {
        let is_far = |&&(s, _): &&(f64, f64)| {
            let next = self.layer.partition_point(|l| l.0 < s);
            let near = self.layer[next.saturating_sub(1)..].iter().take(2);
            near.into_iter().all(|l| (l.0 - s).abs() >= distance)
        };
        let slopes = self.slopes.iter().filter(is_far).copied();
        let mut all: Vec<(f64, f64)> = slopes.chain(self.layer.iter().copied()).collect();
        all.sort_by(|a, b| a.0.total_cmp(&b.0));
        all
    }
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
        let slope: Vec<f64> = (0..=count)
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
                pieces: joined(&rest, &slope),
                near: [0; 2],
            },
        }
    }

    /// A stretch between two corners with the given fluid angles.
    ///
    /// - `given`: laws of the corners that are known already
    /// - `spacing`: of the lattice, m; `fallback`: shear where there is no sample, m
    pub(crate) fn between(
        start: f64,
        length: f64,
        angles: [f64; 2],
        samples: &Samples,
        given: [Option<CornerLaw>; 2],
        (spacing, fallback): (f64, f64),
    ) -> Self {
        let leading = angles.map(|angle| CornerLaw::fit(angle, spacing, &[]).leading);
        let has_layer = [0, 1].map(|end| {
            let beside = samples.layer_beside(end, length, AT_CORNER * spacing);
            !beside.is_empty()
        });
        let unresolved = [0, 1].map(|end| {
            let spacings = match (leading[end] < 0.0, &given[end]) {
                (false, _) if has_layer[end] => NEAREST_SINGULAR,
                (false, _) => UNRESOLVED,
                (true, Some(_)) => UNRESOLVED_SINGULAR,
                (true, None) => NEAREST_SINGULAR,
            };
            spacings * spacing
        });
        let mut inner = samples.merged(SAME_AS_LAYER * spacing);
        inner.retain(|&(s, _)| s >= unresolved[0] && length - s >= unresolved[1]);
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
            let reach = if leading[end] < 0.0 {
                SINGULAR_REACH * spacing
            } else {
                (LAW_REACH * spacing).min(LAW_SHARE * length)
            };
            let from_end: Vec<(f64, f64)> = inner
                .iter()
                .map(|&(s, v)| (if end == 0 { s } else { length - s }, v))
                .filter(|&(r, _)| r <= reach)
                .collect();
            if has_layer[end] {
                let reach = reach.min(SINGULAR_REACH * spacing);
                let beside = samples.layer_beside(end, length, reach);
                CornerLaw::through(angles[end], spacing, &beside)
            } else if leading[end] < 0.0 {
                CornerLaw::power(angles[end], spacing, &from_end)
            } else {
                CornerLaw::fit(angles[end], spacing, &from_end)
            }
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
            Shape::Smooth { pieces, .. } => pieces.len(),
            Shape::Short { .. } => pieces(self.length, 0.5 * spacing),
        }
    }

    /// Distances from the start at which the slope of the curve jumps, m.
    pub(crate) fn kinks(&self) -> impl Iterator<Item = f64> {
        let places = match &self.shape {
            Shape::Smooth { .. } => &[][..],
            Shape::Short { places, .. } => places,
        };
        places.iter().map(|place| place.0 * self.length)
    }

    /// Shear at a distance from the start, m; without bound towards a re-entrant corner.
    pub(crate) fn value(&self, distance: f64) -> f64 {
        self.value_between(distance, self.length - distance)
    }

    /// The same from the distances to both ends, of which the smaller is exact.
    pub(crate) fn value_between(&self, s: f64, to_end: f64) -> f64 {
        let value = match &self.shape {
            Shape::Smooth { laws, pieces, near } => {
                let count = pieces.len();
                let at = s / self.length * count as f64;
                let k = (at.max(0.0) as usize).min(count - 1);
                let mut value = cubic(&pieces[k], at - k as f64);
                if let Some(laws) = laws {
                    if k < near[0] {
                        value += laws[0].value(s);
                    }
                    if k + near[1] >= count {
                        value += laws[1].value(to_end);
                    }
                }
                value
            }
            Shape::Short { powers, places } => {
                let shares = [s / self.length, to_end / self.length];
                ends(shares, *powers) * between_places(places, shares[0])
            }
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
    let slope: Vec<f64> = (0..=count)
        .map(|k| match k {
            0 => 2.0 * rest[1] - 1.5 * rest[0] - 0.5 * rest[2],
            k if k == count => 1.5 * rest[k] - 2.0 * rest[k - 1] + 0.5 * rest[k - 2],
            k => (rest[k + 1] - rest[k - 1]) / 2.0,
        })
        .collect();
    let near = (LAW_NEAR.ceil() as usize).min(count);
    let mut pieces = joined(&rest, &slope);
    for (k, piece) in pieces.iter_mut().enumerate() {
        for (end, law) in laws.iter().enumerate() {
            let is_near = if end == 0 {
                k < near
            } else {
                k + near >= count
            };
            if !is_near {
                add_law(piece, law, end, (k, count, step));
            }
        }
    }
    Shape::Smooth {
        laws: Some(laws),
        pieces,
        near: [near; 2],
    }
}

/// Adds the law of a corner to a piece far from it: it is smooth there, and a cubic is cheaper.
fn add_law(
    piece: &mut [f64; 4],
    law: &CornerLaw,
    end: usize,
    (k, count, step): (usize, usize, f64),
) {
    for (side, node) in [k, k + 1].into_iter().enumerate() {
        let (away, sign) = if end == 0 {
            (node, 1.0)
        } else {
            (count - node, -1.0)
        };
        let at = |offset: f64| law.value((away as f64 + offset) * step);
        piece[side] += at(0.0);
        piece[2 + side] += sign * (at(SLOPE_STEP) - at(-SLOPE_STEP)) / (2.0 * SLOPE_STEP);
    }
}

/// Value and slope at both ends of each piece.
fn joined(values: &[f64], slopes: &[f64]) -> Vec<[f64; 4]> {
    let ends = values.windows(2).zip(slopes.windows(2));
    ends.map(|(v, s)| [v[0], v[1], s[0], s[1]]).collect()
}

fn pieces(length: f64, spacing: f64) -> usize {
    ((length / spacing).ceil() as usize).max(4)
}

/// Value of the cubic of a piece at a share of it.
fn cubic(&[a, b, u, v]: &[f64; 4], t: f64) -> f64 {
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

/// Both leading powers at given distances from the ends, as shares of the length; one in the middle.
fn ends(share: [f64; 2], powers: [f64; 2]) -> f64 {
    let twice = share.map(|s| 2.0 * s);
    if twice[0] > 0.0 && twice[1] > 0.0 {
        // Of one exponential: half the cost of two powers.
        (powers[0] * twice[0].ln() + powers[1] * twice[1].ln()).exp()
    } else {
        twice[0].powf(powers[0]) * twice[1].powf(powers[1])
    }
}

/// Value at a place among sorted ones: linear between them, constant beyond.
fn between_places(places: &[(f64, f64)], at: f64) -> f64 {
    let next = places.partition_point(|place| place.0 <= at);
    match (
        next.checked_sub(1).and_then(|k| places.get(k)),
        places.get(next),
    ) {
        (Some(a), Some(b)) => a.1 + (at - a.0) / (b.0 - a.0) * (b.1 - a.1),
        (Some(only), None) | (None, Some(only)) => only.1,
        (None, None) => 0.0,
    }
}

/// The samples of a short stretch over both leading powers.
fn short(length: f64, leading: [f64; 2], samples: &Samples, spacing: f64, fallback: f64) -> Shape {
    // Beside an acute corner the linear particular part leads.
    let powers = leading.map(|e| e.min(1.0));
    let away = |least: f64| -> Vec<(f64, f64)> {
        let far = |s: &&(f64, f64)| s.0.min(length - s.0) >= least;
        samples.slopes.iter().filter(far).copied().collect()
    };
    let mut used = away(spacing);
    if used.len() < 2 {
        used = away(0.25 * length.min(spacing));
    }
    if used.is_empty() {
        used = vec![(0.5 * length, fallback)];
    }
    let basis = |s: f64| ends([s / length, 1.0 - s / length], powers);
    if !samples.layer.is_empty() {
        let places = Samples {
            slopes: away(spacing),
            layer: samples.layer.clone(),
        }
        .merged(SAME_ON_SHORT * spacing);
        let places = places.into_iter().map(|(s, v)| (s / length, v / basis(s)));
        return Shape::Short {
            powers,
            places: places.collect(),
        };
    }
    if length < STEADY * spacing {
        // One sample beside a corner must not decide the middle.
        let (sum, of_basis) = used
            .iter()
            .fold((0.0, 0.0), |sum, &(s, v)| (sum.0 + v, sum.1 + basis(s)));
        let least = LEAST_BASIS * used.len() as f64;
        let places = vec![(0.5, sum / of_basis.max(least))];
        return Shape::Short { powers, places };
    }
    let places = used
        .chunk_by(|a, b| b.0 - a.0 < SAME_PLACE * spacing)
        .map(|group| {
            let count = group.len() as f64;
            let (s, v) = group.iter().fold((0.0, 0.0), |sum, place| {
                (sum.0 + place.0 / count, sum.1 + place.1 / count)
            });
            (s / length, v / basis(s))
        })
        .collect();
    Shape::Short { powers, places }
}
