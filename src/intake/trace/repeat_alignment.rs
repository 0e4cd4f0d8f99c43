//! How a repeated trace lies on the first one: direction and shift along the trace.
//!
//! The place comes from the best correlation coefficient of the levelled heights over all shifts that
//! leave half of the shorter trace on the other; it is refined by the smallest mean distance and, to a
//! part of a sample, by least squares with bisquare weights (Gauss-Newton on shift, stretch and offset).

use nalgebra::{Matrix3, Vector3};

use super::order_statistics::scatter_about;
use super::profile::Profile;
use super::robust_line::bisquare;

/// Points of each trace while all shifts are tried.
const COARSE_POINTS: usize = 4096;

/// Points while the place is refined.
const FINE_POINTS: usize = 20_000;

/// Least correlation coefficient of two traces of one line.
pub(super) const LEAST_CORRELATION: f64 = 0.8;

/// Where a repeat lies.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Alignment {
    /// Correlation coefficient at that place.
    pub(super) correlation: f64,
    /// Position on the first trace = position on the repeat (counted from its end where it is reversed)
    /// times `1 + stretch`, plus `shift`.
    pub(super) shift: f64,
    /// Relative difference of the lengths.
    pub(super) stretch: f64,
    /// Whether it was traced backwards.
    pub(super) is_reversed: bool,
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
pub(super) fn align(first: &Profile, repeat: &Profile) -> Alignment {
    let forwards = best_shift(first, repeat);
    let backwards = best_shift(first, &reversed(repeat));
    // A symmetric channel fits both ways: backwards only if that leaves half of the difference.
    let is_reversed = 1.0 - backwards.1 < 0.5 * (1.0 - forwards.1);
    let (start, correlation) = if is_reversed { backwards } else { forwards };
    let turned;
    let repeat = if is_reversed {
        turned = reversed(repeat);
        &turned
    } else {
        repeat
    };
    let (shift, stretch) = refined(first, repeat, start);
    Alignment {
        correlation,
        shift,
        stretch,
        is_reversed,
    }
}

/// Heights at increasing places by straight lines between samples; NaN outside or beside NaN.
pub(super) fn heights_at(profile: &Profile, places: impl Iterator<Item = f64>) -> Vec<f64> {
    let (x, z) = (&profile.x, &profile.z);
    let mut next = 0;
    places
        .map(|place| {
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

/// The shift of the best correlation coefficient, and that coefficient.
fn best_shift(first: &Profile, repeat: &Profile) -> (f64, f64) {
    let (Some((start, length)), Some((repeat_start, repeat_length))) =
        (extent(first), extent(repeat))
    else {
        return (0.0, -1.0);
    };
    let spacing = length.max(repeat_length) / COARSE_POINTS as f64;
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
    let mut best = (0.0, -1.0);
    let lowest = least as isize - b.len() as isize;
    let highest = a.len() as isize - least as isize;
    for lag in lowest..=highest {
        // Sample k of the first lies on sample k - lag of the repeat.
        let from = lag.max(0) as usize;
        let to = (a.len() as isize).min(b.len() as isize + lag) as usize;
        if to < from + least {
            continue;
        }
        let shifted = (from as isize - lag) as usize;
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
        if correlation > best.1 {
            let shift = start - repeat_start + lag as f64 * spacing;
            best = (shift, correlation.min(1.0));
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

/// Refines a shift, and finds the stretch.
fn refined(first: &Profile, repeat: &Profile, start: f64) -> (f64, f64) {
    let stride = (first.x.len() / FINE_POINTS).max(1);
    let x: Vec<f64> = first.x.iter().copied().step_by(stride).collect();
    let z: Vec<f64> = first.z.iter().copied().step_by(stride).collect();
    let Some((_, length)) = extent(first) else {
        return (start, 0.0);
    };
    let distance = |shift: f64| {
        let other = heights_at(repeat, x.iter().map(|x| x - shift));
        let rests = z.iter().zip(&other).map(|(a, b)| (a - b).abs());
        let (sum, count) = rests
            .filter(|rest| rest.is_finite())
            .fold((0.0, 0.0), |(sum, count), rest| (sum + rest, count + 1.0));
        sum / count
    };
    let mut best = (start, distance(start));
    let mut step = length / COARSE_POINTS as f64;
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
    least_squares(first, repeat, best.0, length)
}

/// Gauss-Newton on shift, stretch and offset.
fn least_squares(first: &Profile, repeat: &Profile, start: f64, length: f64) -> (f64, f64) {
    let middle = first.x[0] + 0.5 * length;
    let reach = length / first.x.len() as f64;
    // Position on the repeat = x - shift - stretch * (x - middle).
    let (mut shift, mut stretch, mut offset) = (start, 0.0, 0.0);
    for _ in 0..8 {
        let place = |x: f64, by: f64| x - shift - stretch * (x - middle) + by;
        let at = |by: f64| heights_at(repeat, first.x.iter().map(|x| place(*x, by)));
        let (here, before, after) = (at(0.0), at(-reach), at(reach));
        let rests: Vec<f64> = first
            .z
            .iter()
            .zip(&here)
            .map(|(a, b)| a - b - offset)
            .collect();
        let mut known: Vec<f64> = rests.iter().copied().filter(|r| r.is_finite()).collect();
        // Walls tell the shift, and have larger differences than the rest.
        let scatter = 3.0 * scatter_about(&mut known, 0.0);
        let mut matrix = Matrix3::zeros();
        let mut right = Vector3::zeros();
        for (k, rest) in rests.iter().enumerate() {
            let slope = (after[k] - before[k]) / (2.0 * reach);
            let w = bisquare(*rest, scatter);
            if !(slope.is_finite() && rest.is_finite() && w > 0.0) {
                continue;
            }
            let along = (first.x[k] - middle) / length;
            let row = Vector3::new(1.0, -slope, -slope * along);
            matrix += row * row.transpose() * w;
            right += row * (*rest * w);
        }
        let Some(step) = matrix.cholesky().map(|c| c.solve(&right)) else {
            break;
        };
        let within = |value: f64| value.is_finite() && value.abs() < 0.02 * length;
        if !(within(step.y) && within(step.z) && step.x.is_finite()) {
            break;
        }
        offset += step.x;
        shift += step.y;
        stretch += step.z / length;
        if step.y.abs().max(step.z.abs()) < 1e-3 * reach {
            break;
        }
    }
    // The same in the form: position on the first = position on the repeat * (1 + e) + shift.
    let scale = 1.0 / (1.0 - stretch);
    (scale * (shift - stretch * middle), scale - 1.0)
}
