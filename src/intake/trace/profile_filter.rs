//! The Gaussian profile filter.
//!
//! Weights `exp(-pi (u / (alpha c))^2)` with `alpha = sqrt(ln 2 / pi)` and the cut-off `c`, at which half of
//! a wave passes: ISO 16610-21 (from memory). Each sample counts with the length it stands for, so uneven
//! positions are allowed; the weights always add up to one, so that near the ends, within half a cut-off,
//! the mean is taken over what is there.

use super::profile::Profile;

/// How far the weights reach, in cut-offs; what is left out is below 1e-6.
const REACH: f64 = 1.0;

/// Evaluations per cut-off beyond which values between are interpolated.
const KNOTS_PER_CUTOFF: f64 = 48.0;

/// The filtered heights of a profile without missing points, one for each sample.
///
/// Where samples lie closer than a 48th of the cut-off, the filtered line, which is smooth on that scale, is
/// evaluated at knots and interpolated by cubics within 2e-5 of the height range; time stays linear.
pub(super) fn gaussian(profile: &Profile, cutoff: f64) -> Vec<f64> {
    let (x, z) = (&profile.x, &profile.z);
    let (Some(&start), Some(&end)) = (x.first(), x.last()) else {
        return Vec::new();
    };
    let lengths = sample_lengths(x);
    let spacing = cutoff / KNOTS_PER_CUTOFF;
    let count = ((end - start) / spacing).ceil() as usize + 3;
    if count >= x.len() {
        return means(profile, &lengths, x.iter().copied(), cutoff);
    }
    // One knot before the start and one beyond the end, so that every sample has two on either side.
    let knots = (0..count).map(|k| start + (k as f64 - 1.0) * spacing);
    let values = means(profile, &lengths, knots, cutoff);
    x.iter()
        .zip(z)
        .map(|(&x, &z)| {
            let place = (x - start) / spacing + 1.0;
            let at = (place.floor() as usize).clamp(1, count.saturating_sub(3));
            match values.get(at - 1..at + 3) {
                Some(&[a, b, c, d]) => cubic([a, b, c, d], place - at as f64),
                _ => z,
            }
        })
        .collect()
}

/// The length each sample stands for: from half way to the one before to half way to the next.
fn sample_lengths(x: &[f64]) -> Vec<f64> {
    let last = x.len() - 1;
    (0..x.len())
        .map(|k| 0.5 * (x[(k + 1).min(last)] - x[k.saturating_sub(1)]))
        .map(|length| if length > 0.0 { length } else { 1.0 })
        .collect()
}

/// Weighted means at increasing places.
fn means(
    profile: &Profile,
    lengths: &[f64],
    places: impl Iterator<Item = f64>,
    cutoff: f64,
) -> Vec<f64> {
    let (x, z) = (&profile.x, &profile.z);
    // -pi / alpha^2 = -pi^2 / ln 2
    let steepness = -std::f64::consts::PI.powi(2) / std::f64::consts::LN_2;
    let (mut first, mut last) = (0, 0);
    places
        .map(|place| {
            while first < x.len() && x[first] < place - REACH * cutoff {
                first += 1;
            }
            while last < x.len() && x[last] <= place + REACH * cutoff {
                last += 1;
            }
            let (mut sum, mut weights) = (0.0, 0.0);
            for k in first..last {
                let u = (x[k] - place) / cutoff;
                let w = lengths[k] * (steepness * u * u).exp();
                sum += w * z[k];
                weights += w;
            }
            sum / weights
        })
        .collect()
}

/// The cubic through four even values at -1, 0, 1, 2.
fn cubic([a, b, c, d]: [f64; 4], t: f64) -> f64 {
    let third = -a + 3.0 * b - 3.0 * c + d;
    b + t * ((c - b) + (t - 1.0) * (0.5 * (a - 2.0 * b + c) + (t + 1.0) * third / 6.0))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn wave(count: usize, spacing: f64, length: f64) -> Profile {
        let x: Vec<f64> = (0..count).map(|k| k as f64 * spacing).collect();
        let z = x.iter().map(|x| (std::f64::consts::TAU * x / length).cos());
        Profile { z: z.collect(), x }
    }

    #[test]
    fn the_cubic_is_exact_for_cubics() {
        let f = |t: f64| 1.0 + 2.0 * t - 3.0 * t * t + 0.5 * t * t * t;
        let four = [f(-1.0), f(0.0), f(1.0), f(2.0)];
        for t in [0.0, 0.3, 0.7, 1.0] {
            assert!((cubic(four, t) - f(t)).abs() < 1e-12);
        }
    }

    #[test]
    fn half_of_a_wave_of_the_cutoff_passes_on_both_ways_of_evaluation() {
        for spacing in [0.1, 0.01] {
            let profile = wave((40.0 / spacing) as usize + 1, spacing, 2.0);
            let filtered = gaussian(&profile, 2.0);
            assert_eq!(filtered.len(), profile.x.len());
            for ((x, z), f) in profile.x.iter().zip(&profile.z).zip(&filtered) {
                if (3.0..37.0).contains(x) {
                    assert!((f - 0.5 * z).abs() < 3e-5, "{spacing} {x}: {f} {z}");
                }
            }
        }
    }

    #[test]
    fn a_constant_stays_what_it_is_up_to_the_ends_and_on_uneven_positions() {
        let x: Vec<f64> = (0..500)
            .map(|k| f64::from(k) + 0.4 * f64::from(k % 3))
            .collect();
        let profile = Profile {
            z: vec![7.0; x.len()],
            x,
        };
        for cutoff in [4.0, 30.0, 200.0] {
            assert!(
                gaussian(&profile, cutoff)
                    .iter()
                    .all(|f| (f - 7.0).abs() < 1e-12)
            );
        }
    }
}
