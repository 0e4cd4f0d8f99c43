//! Spikes and grains of dust: samples far from their neighbours that come back within a few samples.
//!
//! Each sample is set against the median of its window and the median absolute deviation there (Hampel
//! 1974, *The influence curve and its role in robust estimation*, J. Am. Stat. Assoc. 69, 383; from memory).
//! A wall, a rounded edge and a flank are monotone, so the median of a symmetric window is the sample itself;
//! the bottom of a V-groove or a round one has its own slope as scatter. What is left are excursions of fewer
//! samples than half a window whose two sides lie on one level.
//!
//! Overshoot beside a wall ("ears") is no spike, since one side of its window lies on the other level: it
//! is left, and the lands are taken without the parts next to walls.

use super::profile::Profile;
use crate::intake::order_statistics::{MAD_TO_SD, median, noise_of_neighbours, scatter_about};

/// Half width of the narrow window, samples: spikes of up to three samples.
pub(super) const NARROW: usize = 3;

/// Largest half width of a window, samples.
pub(super) const WIDEST: usize = 50;

/// Distance from the median, in robust standard deviations, from which a sample is a spike.
const SPIKE_SCATTERS: f64 = 6.0;

/// Samples over which the noise is taken together.
const NOISE_BLOCK: usize = 1000;

/// Jumps of one size from which that size counts as the resolution of the heights.
const TOGGLES: usize = 4;

/// Sizes within this share of each other are the same.
const SAME_SIZE: f64 = 0.01;

/// What counts as a spike.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct SpikeRule {
    /// Half width of the window, samples.
    pub(super) half_window: usize,
    /// Smallest height, m.
    pub(super) smallest: f64,
    /// Whether that height was stated, so that only the scatter of the window itself counts besides.
    pub(super) is_stated: bool,
}

/// Spikes of a profile without missing points, as ranges `first..last` of samples.
pub(super) fn find_spikes(good: &Profile, rule: &SpikeRule) -> Vec<(usize, usize)> {
    let z = &good.z;
    let deviations = from_running_median(z, rule.half_window);
    let noise = block_noise(z, &deviations);
    let smallest = if rule.is_stated {
        rule.smallest
    } else {
        rule.smallest + 3.0 * resolution(z)
    };
    let mut found: Vec<(usize, usize)> = Vec::new();
    let mut at = 0;
    while at < z.len() {
        let regional = noise[at / NOISE_BLOCK];
        if !is_spike(z, &deviations, at, regional, smallest, rule) {
            at += 1;
            continue;
        }
        let sign = deviations[at].signum();
        let mut last = at + 1;
        while last < z.len() && sign * deviations[last] > SPIKE_SCATTERS * regional + smallest {
            last += 1;
        }
        let peak = deviations[at..last]
            .iter()
            .fold(0.0_f64, |p, d| p.max(d.abs()));
        let foot = (2.0 * regional).max(0.1 * peak);
        let mut first = at;
        while first > 0 && sign * deviations[first - 1] > foot {
            first -= 1;
        }
        while last < z.len() && sign * deviations[last] > foot {
            last += 1;
        }
        // A spike comes back within half a window, and within the trace.
        if last - first <= rule.half_window + 2 && first > 0 && last < z.len() {
            found.push((first, last));
        }
        at = last;
    }
    found
}

/// Whether one sample stands out of its window and the window's sides are on one level.
fn is_spike(
    z: &[f64],
    deviations: &[f64],
    at: usize,
    regional: f64,
    smallest: f64,
    rule: &SpikeRule,
) -> bool {
    let size = deviations[at].abs();
    let half = rule.half_window.min(at).min(z.len() - 1 - at);
    let (weight, regional) = if rule.is_stated {
        (0.5 * SPIKE_SCATTERS, 0.0)
    } else {
        (SPIKE_SCATTERS, regional)
    };
    if half < NARROW || size <= smallest || size <= weight * regional {
        return false;
    }
    let window = &z[at - half..=at + half];
    let centre = z[at] - deviations[at];
    let side = (half / 3).max(1);
    let left = median(&mut window[..side].to_vec());
    let right = median(&mut window[window.len() - side..].to_vec());
    // On a flank the slope itself would count as scatter.
    let slope = (right - left) / (window.len() - side) as f64;
    let middle = 0.5 * (left + right);
    let level = |k: usize| middle + slope * (k as f64 - half as f64);
    let mut distances: Vec<f64> = (0..window.len())
        .map(|k| (window[k] - level(k)).abs())
        .collect();
    if size <= weight * MAD_TO_SD * median(&mut distances) {
        return false;
    }
    // Both sides on one level, or on one flank: an ear beside a wall has a side far below.
    (middle - centre).abs() <= 0.5 * size && (left - right).abs() <= 2.0 * size
}

/// Distance of each sample from the median of the window about it; windows shrink towards the ends.
fn from_running_median(z: &[f64], half_window: usize) -> Vec<f64> {
    let mut sorted: Vec<f64> = Vec::with_capacity(2 * half_window + 1);
    let (mut first, mut last) = (0, 0);
    (0..z.len())
        .map(|at| {
            let half = half_window.min(at).min(z.len() - 1 - at);
            while last <= at + half {
                let place = sorted.partition_point(|s| *s < z[last]);
                sorted.insert(place, z[last]);
                last += 1;
            }
            while first < at - half {
                let place = sorted.partition_point(|s| *s < z[first]);
                sorted.remove(place);
                first += 1;
            }
            z[at] - sorted[half]
        })
        .collect()
}

/// Noise block by block, each block with its neighbours the largest of three: robust scatter of the
/// distances from the median, or from sample to sample where that is larger. A sample that is the median
/// of its own window has no distance, so that the first alone would be too small.
fn block_noise(z: &[f64], deviations: &[f64]) -> Vec<f64> {
    let single: Vec<f64> = deviations
        .chunks(NOISE_BLOCK)
        .zip(z.chunks(NOISE_BLOCK))
        .map(|(deviations, heights)| {
            scatter_about(&mut deviations.to_vec(), 0.0).max(noise_of_neighbours(heights))
        })
        .collect();
    (0..single.len())
        .map(|k| {
            let near = &single[k.saturating_sub(1)..single.len().min(k + 2)];
            near.iter().copied().fold(0.0, f64::max)
        })
        .collect()
}

/// Resolution of the heights, m: the smallest size of the samples that stand alone by [`TOGGLES`] times
/// the same amount between straight neighbours; zero where there are none.
///
/// Heights kept in steps jump up and down by one step here and there. The steps of a ramp or a wall are no
/// resolution: they do not come back, and one spike is not repeated to the last digit.
fn resolution(z: &[f64]) -> f64 {
    let highest = z.iter().fold(0.0_f64, |high, z| high.max(z.abs()));
    // Below this, differences are rounding of the arithmetic.
    let rounding = 1e-12 * highest;
    let sizes = || {
        z.windows(5).filter_map(move |w| {
            let bend = |k: usize| w[k - 1] - 2.0 * w[k] + w[k + 1];
            let size = 0.5 * bend(2).abs();
            let is_alone = [bend(1), bend(3)]
                .iter()
                .all(|side| (side + 0.5 * bend(2)).abs() <= SAME_SIZE * size);
            (is_alone && size > rounding).then_some(size)
        })
    };
    let smallest = sizes().fold(f64::INFINITY, f64::min);
    let same = sizes().filter(|size| *size <= (1.0 + SAME_SIZE) * smallest);
    if same.count() >= TOGGLES {
        smallest
    } else {
        0.0
    }
}

#[cfg(test)]
mod tests {
    use super::super::test_traces::{Grooves, Noise, Shape};
    use super::*;

    const RULE: SpikeRule = SpikeRule {
        half_window: NARROW,
        smallest: 0.15e-6,
        is_stated: false,
    };

    #[test]
    fn no_sample_of_a_clean_groove_is_a_spike() {
        let shapes = [Shape::Rectangle, Shape::Koh, Shape::Isotropic, Shape::Vee];
        for shape in shapes {
            for spacing in [0.1e-6, 0.5e-6, 2e-6, 7e-6, 12e-6] {
                for half_window in [3, 5, 9] {
                    let grooves = Grooves {
                        spacing,
                        count: 3,
                        ..Grooves::one(shape)
                    };
                    // A window must not be wider than a groove.
                    if (2 * half_window + 1) as f64 * spacing > grooves.width {
                        continue;
                    }
                    let mut profile = grooves.profile();
                    for (x, z) in profile.x.iter().zip(&mut profile.z) {
                        *z += 0.08 * x;
                    }
                    let rule = SpikeRule {
                        half_window,
                        ..RULE
                    };
                    let found = find_spikes(&profile, &rule);
                    assert!(
                        found.is_empty(),
                        "{shape:?} {spacing} {half_window}: {found:?}"
                    );
                }
            }
        }
    }

    #[test]
    fn spikes_up_to_three_samples_are_found_where_they_are() {
        let mut noise = Noise::new(5);
        let mut profile = Grooves::one(Shape::Rectangle).profile();
        for z in &mut profile.z {
            *z += 0.02e-6 * noise.normal();
        }
        for (at, width, height) in [
            (100, 1, 3e-6),
            (400, 3, 2e-6),
            (430, 2, -2e-6),
            (700, 3, 40e-6),
        ] {
            for z in &mut profile.z[at..at + width] {
                *z += height;
            }
        }
        let found = find_spikes(&profile, &RULE);
        assert_eq!(found, [(100, 101), (400, 403), (430, 432), (700, 703)]);
    }

    #[test]
    fn spikes_on_a_flank_are_found_too() {
        let mut noise = Noise::new(3);
        // A land, then the flank.
        let flank = (0..300).map(|k| -0.3 * f64::from((k - 80).max(0)));
        let z: Vec<f64> = flank.map(|z| z + 1e-3 * noise.normal()).collect();
        let x: Vec<f64> = (0..300).map(f64::from).collect();
        for (size, samples) in [(1.2, 1), (-1.2, 1), (4.0, 2), (-4.0, 2)] {
            let mut spoilt = z.clone();
            for height in &mut spoilt[120..120 + samples] {
                *height += size;
            }
            let good = Profile {
                x: x.clone(),
                z: spoilt,
            };
            let rule = SpikeRule {
                half_window: NARROW,
                smallest: 0.1,
                is_stated: false,
            };
            assert_eq!(find_spikes(&good, &rule), [(120, 120 + samples)], "{size}");
        }
    }

    #[test]
    fn noise_alone_and_steps_of_resolution_are_no_spikes() {
        let mut noise = Noise::new(7);
        let x: Vec<f64> = (0..100_000).map(|k| 1e-7 * f64::from(k)).collect();
        let z = x.iter().map(|_| 0.2e-6 * noise.normal());
        let noisy = Profile {
            z: z.collect(),
            x: x.clone(),
        };
        assert!(find_spikes(&noisy, &RULE).is_empty());
        let z = (0..x.len()).map(|k| if k % 97 == 0 { 0.1e-6 } else { 0.0 });
        let coarse = Profile { z: z.collect(), x };
        let rule = SpikeRule {
            smallest: 1e-9,
            ..RULE
        };
        assert!(find_spikes(&coarse, &rule).is_empty());
        assert!(find_spikes(&Profile::default(), &RULE).is_empty());
    }

    #[test]
    fn the_slope_of_a_clean_trace_is_not_its_resolution() {
        // 0.1 um from sample to sample on the land, and a spike of 0.5 um.
        let mut clean = Grooves::one(Shape::Rectangle).profile();
        for (k, z) in clean.z.iter_mut().enumerate() {
            *z += 0.1e-6 * k as f64;
        }
        assert!(resolution(&clean.z).abs() <= 0.0);
        clean.z[100] += 0.5e-6;
        assert!(resolution(&clean.z).abs() <= 0.0);
        assert_eq!(find_spikes(&clean, &RULE), [(100, 101)]);
        let mut noise = Noise::new(3);
        let step = 0.05e-6;
        let rounded = clean
            .z
            .iter()
            .map(|z| step * ((z + 0.03e-6 * noise.normal()) / step).round());
        let found = resolution(&rounded.collect::<Vec<_>>());
        assert!((found - step).abs() < 0.01 * step, "{found}");
        let noisy: Vec<f64> = (0..100_000).map(|_| noise.normal()).collect();
        assert!(resolution(&noisy).abs() <= 0.0);
        assert!(resolution(&[]).abs() <= 0.0);
    }

    #[test]
    fn an_ear_beside_a_wall_is_left() {
        let mut profile = Grooves::one(Shape::Rectangle).profile();
        // The wall lies between samples 299 and 300.
        for (k, z) in profile.z[290..300].iter_mut().enumerate() {
            *z += 0.05e-6 * k as f64;
        }
        for half_window in [3, 10, 25] {
            let rule = SpikeRule {
                half_window,
                ..RULE
            };
            assert!(find_spikes(&profile, &rule).is_empty());
        }
    }
}
