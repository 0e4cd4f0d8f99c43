//! How a repeated trace lies on the first one: direction and shift along the trace.
//!
//! The place comes from the best correlation coefficient of the levelled heights over all shifts that
//! leave half of the shorter trace on the other. It is refined by the smallest mean distance and, to a part
//! of a sample, by least squares with bisquare weights (Gauss-Newton on shift and offset): first for the
//! whole trace, then for each channel by itself, since stages do not move evenly (two scans of 42 mm in
//! opposite directions were seen 40 um apart in the middle when they met at the ends). Between channels
//! shifts are interpolated.

use nalgebra::{Matrix2, Vector2};

use super::lands::piecewise;
use super::profile::{Profile, Zone};
use super::robust_line::bisquare;
use super::step_height::indices;
use crate::intake::order_statistics::scatter_about;

/// Most points of each trace while all shifts are tried.
const COARSE_POINTS: usize = 4096;

/// Points while a place is refined.
const FINE_POINTS: usize = 10_000;

/// Least correlation coefficient of two traces of one line.
pub(super) const LEAST_CORRELATION: f64 = 0.9;

/// A repeat fits better backwards if that leaves less than this share of the distance.
const CLEARLY_BETTER: f64 = 0.8;

/// Where a repeat lies.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Alignment {
    /// Correlation coefficient at that place.
    pub(super) correlation: f64,
    /// Position on the first trace and what to take off there to get the position on the repeat, which
    /// counts from its end where it is reversed.
    pub(super) shifts: Vec<(f64, f64)>,
    /// Whether it was traced backwards.
    pub(super) is_reversed: bool,
}

impl Alignment {
    /// Positions on the repeat for positions on the first trace, in the same order.
    pub(super) fn places(&self, x: &[f64]) -> Vec<f64> {
        let (Some(&first), Some(&last)) = (self.shifts.first(), self.shifts.last()) else {
            return x.to_vec();
        };
        let between = if self.shifts.len() > 1 {
            let within: Vec<f64> = x.iter().map(|x| x.clamp(first.0, last.0)).collect();
            piecewise(&self.shifts, &within)
        } else {
            vec![first.1; x.len()]
        };
        x.iter().zip(between).map(|(x, shift)| x - shift).collect()
    }
}

/// The trace read backwards, positions from zero.
pub(super) fn reversed(profile: &Profile) -> Profile {
    let end = profile.x.last().copied().unwrap_or(0.0);
    Profile {
        x: profile.x.iter().rev().map(|x| end - x).collect(),
        z: profile.z.iter().rev().copied().collect(),
    }
}

/// Finds where a repeat lies; both are levelled and without missing points.
pub(super) fn align(first: &Profile, repeat: &Profile, grooves: &[Zone]) -> Alignment {
    let (forwards, distance) = place(first, repeat, grooves);
    let (backwards, distance_backwards) = place(first, &reversed(repeat), grooves);
    // A symmetric channel fits both ways; then the direction does not matter.
    if distance_backwards < CLEARLY_BETTER * distance {
        Alignment {
            is_reversed: true,
            ..backwards
        }
    } else {
        forwards
    }
}

/// Where a repeat lies if it runs forwards, and the mean distance that remains, over the square of the
/// share of the first trace on which it lies.
fn place(first: &Profile, repeat: &Profile, grooves: &[Zone]) -> (Alignment, f64) {
    let (start, correlation, spacing) = best_shift(first, repeat);
    let whole = Zone {
        from: f64::NEG_INFINITY,
        to: f64::INFINITY,
    };
    let shift = refined(first, repeat, whole, start, spacing);
    let mut shifts: Vec<(f64, f64)> = grooves
        .iter()
        .map(|groove| {
            let width = groove.to - groove.from;
            let about = Zone {
                from: groove.from - 0.25 * width,
                to: groove.to + 0.25 * width,
            };
            let own = refined(first, repeat, about, shift, width / 16.0);
            let is_near = (own - shift).abs() <= 0.25 * width;
            (
                0.5 * (groove.from + groove.to),
                if is_near { own } else { shift },
            )
        })
        .collect();
    if shifts.is_empty() {
        shifts.push((0.0, shift));
    }
    let alignment = Alignment {
        correlation,
        shifts,
        is_reversed: false,
    };
    let places = alignment.places(&first.x);
    let heights = heights_at(repeat, places.iter().copied());
    let share = heights.iter().filter(|z| z.is_finite()).count() as f64 / heights.len() as f64;
    // A row of equal channels fits one pitch further on as well, but on less of the trace.
    let distance = mean_distance(&first.z, &heights) / (share * share);
    (alignment, distance)
}

/// Mean distance where both have a height.
fn mean_distance(a: &[f64], b: &[f64]) -> f64 {
    let rests = a.iter().zip(b).map(|(a, b)| (a - b).abs());
    let (sum, count) = rests
        .filter(|rest| rest.is_finite())
        .fold((0.0, 0.0), |(sum, count), rest| (sum + rest, count + 1.0));
    sum / count
}

/// Heights at increasing places by straight lines between samples; NaN outside or beside NaN.
pub(super) fn heights_at(profile: &Profile, places: impl Iterator<Item = f64>) -> Vec<f64> {
    let (x, z) = (&profile.x, &profile.z);
    let mut next = 0;
    let mut is_first = true;
    places
        .map(|place| {
            if is_first {
                next = x.partition_point(|x| *x < place);
                is_first = false;
            }
            while next < x.len() && x[next] < place {
                next += 1;
            }
            match (next.checked_sub(1), x.get(next)) {
                (_, Some(&here)) if here <= place => z[next],
                (Some(before), Some(&after)) => {
                    let share = (place - x[before]) / (after - x[before]);
                    z[before] + share * (z[next] - z[before])
                }
                _ => f64::NAN,
            }
        })
        .collect()
}

/// The shift of the best correlation coefficient, that coefficient, and the step between shifts.
fn best_shift(first: &Profile, repeat: &Profile) -> (f64, f64, f64) {
    let (Some((start, length)), Some((repeat_start, repeat_length))) =
        (extent(first), extent(repeat))
    else {
        return (0.0, -1.0, 0.0);
    };
    let points = first.x.len().max(repeat.x.len()).min(COARSE_POINTS);
    let spacing = length.max(repeat_length) / points as f64;
    let even = |profile: &Profile, start: f64, length: f64| {
        let count = (length / spacing) as usize + 1;
        let places = (0..count).map(|k| start + k as f64 * spacing);
        let mut heights = heights_at(profile, places);
        heights.retain(|z| z.is_finite());
        heights
    };
    let a = even(first, start, length);
    let b = even(repeat, repeat_start, repeat_length);
    let (a_sums, b_sums) = (running_sums(&a), running_sums(&b));
    let least = (a.len().min(b.len()) / 2).max(2);
    let mut best = (0.0, -1.0, spacing);
    let mut least_rest = f64::INFINITY;
    // From the last samples of the repeat on the first ones of the first trace to the reverse.
    for step in 0..=(a.len() + b.len()).saturating_sub(2 * least) {
        let from = (step + least).saturating_sub(b.len());
        let shifted = b.len().saturating_sub(step + least);
        let to = a.len().min(from + b.len() - shifted);
        if to < from + least {
            continue;
        }
        let count = to - from;
        let products: f64 = a[from..to]
            .iter()
            .zip(&b[shifted..shifted + count])
            .map(|(p, q)| p * q)
            .sum();
        let n = count as f64;
        let part = |sums: &[[f64; 2]], from: usize| {
            let (end, start) = (sums[from + count], sums[from]);
            [(end[0] - start[0]) / n, (end[1] - start[1]) / n]
        };
        let (pa, pb) = (part(&a_sums, from), part(&b_sums, shifted));
        let covariance = products / n - pa[0] * pb[0];
        let spread = ((pa[1] - pa[0] * pa[0]) * (pb[1] - pb[0] * pb[0])).sqrt();
        let correlation = covariance / spread;
        // What does not correlate, over the square of the share that overlaps.
        let share = n / a.len().min(b.len()) as f64;
        let rest = (1.0 - correlation).max(1e-9) / (share * share);
        if rest < least_rest {
            least_rest = rest;
            let lag = from as f64 - shifted as f64;
            let shift = start - repeat_start + lag * spacing;
            best = (shift, correlation.min(1.0), spacing);
        }
    }
    best
}

fn extent(profile: &Profile) -> Option<(f64, f64)> {
    let (first, last) = (profile.x.first()?, profile.x.last()?);
    Some((*first, last - first))
}

/// Sums and sums of squares up to each sample.
fn running_sums(z: &[f64]) -> Vec<[f64; 2]> {
    let mut sums = vec![[0.0; 2]];
    let (mut sum, mut squares) = (0.0, 0.0);
    for z in z {
        sum += z;
        squares += z * z;
        sums.push([sum, squares]);
    }
    sums
}

/// Refines a shift over one zone of the first trace, at first within twice `step`.
fn refined(first: &Profile, repeat: &Profile, zone: Zone, start: f64, step: f64) -> f64 {
    let (from, to) = indices(first, zone);
    let stride = ((to - from) / FINE_POINTS).max(1);
    let part = Profile {
        x: first.x[from..to].iter().copied().step_by(stride).collect(),
        z: first.z[from..to].iter().copied().step_by(stride).collect(),
    };
    let distance = |shift: f64| {
        let other = heights_at(repeat, part.x.iter().map(|x| x - shift));
        mean_distance(&part.z, &other)
    };
    let mut best = (start, distance(start));
    let mut step = step;
    for _ in 0..6 {
        let centre = best.0;
        for k in [-4, -3, -2, -1, 1, 2, 3, 4] {
            let shift = centre + 0.5 * f64::from(k) * step;
            let found = distance(shift);
            if found < best.1 {
                best = (shift, found);
            }
        }
        step *= 0.25;
    }
    least_squares(&part, repeat, best.0)
}

/// Gauss-Newton on shift and offset from a shift that is right to a few samples.
fn least_squares(part: &Profile, repeat: &Profile, start: f64) -> f64 {
    let Some((_, length)) = extent(part) else {
        return start;
    };
    let reach = length / part.x.len() as f64;
    let (mut shift, mut offset) = (start, 0.0);
    for _ in 0..8 {
        let at = |by: f64| heights_at(repeat, part.x.iter().map(|x| x - shift + by));
        let (here, before, after) = (at(0.0), at(-reach), at(reach));
        let rests: Vec<f64> = part
            .z
            .iter()
            .zip(&here)
            .map(|(a, b)| a - b - offset)
            .collect();
        let mut known: Vec<f64> = rests.iter().copied().filter(|r| r.is_finite()).collect();
        // Walls tell the shift, and have larger differences than the rest.
        let scatter = 3.0 * scatter_about(&mut known, 0.0);
        let mut matrix = Matrix2::zeros();
        let mut right = Vector2::zeros();
        for (k, rest) in rests.iter().enumerate() {
            let slope = (after[k] - before[k]) / (2.0 * reach);
            let w = bisquare(*rest, scatter);
            if !(slope.is_finite() && rest.is_finite() && w > 0.0) {
                continue;
            }
            let row = Vector2::new(1.0, -slope);
            matrix += row * row.transpose() * w;
            right += row * (*rest * w);
        }
        let Some(step) = matrix.cholesky().map(|c| c.solve(&right)) else {
            break;
        };
        if !(step.x.is_finite() && step.y.abs() < 4.0 * reach) {
            break;
        }
        offset += step.x;
        shift += step.y;
        if step.y.abs() < 1e-3 * reach {
            break;
        }
    }
    shift
}
