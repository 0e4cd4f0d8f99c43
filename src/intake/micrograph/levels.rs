//! Grey levels of fluid and wall: Otsu's threshold on all counts, and the levels beside the wall.
//!
//! Otsu's threshold is the one with the greatest variance between the two classes it makes. It parts two
//! classes of any picture, even of noise; whether there are two is decided by the distance of their
//! means over their deviation: 2.65 for one Gaussian, 3.46 for evenly spread greys, infinite for two levels.
//!
//! # Source
//! Otsu (1979), "A threshold selection method from gray-level histograms", IEEE Transactions on Systems,
//! Man, and Cybernetics 9, 62-66, doi:10.1109/TSMC.1979.4310076. Distance over deviation: Ashman, Bird, Zepf
//! (1994), Astronomical Journal 108, 2348, doi:10.1086/117248 (from memory); the two limits are computed.

use super::grey::Grey;
use super::micrograph_section::HistogramSummary;

/// Number of counts.
const COUNTS: usize = 1 << 16;
/// Steps of the histogram that is handed on.
const SUMMARY_STEPS: usize = 64;

/// How often each count occurs.
#[derive(Debug, Clone)]
pub(super) struct Histogram {
    counts: Vec<u64>,
    total: u64,
}

impl Histogram {
    /// Of some counts.
    pub(super) fn of(values: impl IntoIterator<Item = u16>) -> Self {
        let mut counts = vec![0_u64; COUNTS];
        let mut total = 0;
        for value in values {
            if let Some(count) = counts.get_mut(usize::from(value)) {
                *count += 1;
            }
            total += 1;
        }
        Self { counts, total }
    }

    /// Counts that occur, with how often, rising.
    fn present(&self) -> impl Iterator<Item = (f64, f64)> + '_ {
        self.counts
            .iter()
            .enumerate()
            .filter(|(_, n)| **n > 0)
            .map(|(count, &n)| (count as f64, n as f64))
    }

    /// The value below which a share of the pixels lies; between counts by interpolation in the step.
    pub(super) fn quantile(&self, share: f64) -> Option<f64> {
        let target = share * self.total as f64;
        let mut below = 0.0;
        let mut last = None;
        for (count, n) in self.present() {
            last = Some(count);
            if below + n >= target {
                break;
            }
            below += n;
        }
        last
    }

    /// The two classes Otsu's method makes; `None` if all pixels are alike.
    pub(super) fn otsu(&self) -> Option<Classes> {
        let total = self.total as f64;
        let (mut sum, mut squares) = (0.0, 0.0);
        for (count, n) in self.present() {
            sum += n * count;
            squares += n * count * count;
        }
        let (mut below, mut sum_below, mut squares_below) = (0.0, 0.0, 0.0);
        let mut before: Option<f64> = None;
        let mut best: Option<(f64, Classes)> = None;
        for (count, n) in self.present() {
            if let Some(before) = before {
                let above = total - below;
                let means = [sum_below / below, (sum - sum_below) / above];
                let between = below * above * (means[1] - means[0]).powi(2);
                if best
                    .as_ref()
                    .is_none_or(|(greatest, _)| between > *greatest)
                {
                    let deviation = |squares: f64, n: f64, mean: f64| {
                        (squares / n - mean * mean).max(0.0).sqrt()
                    };
                    let classes = Classes {
                        threshold: f64::midpoint(before, count),
                        means,
                        deviations: [
                            deviation(squares_below, below, means[0]),
                            deviation(squares - squares_below, above, means[1]),
                        ],
                        share_below: below / total,
                    };
                    best = Some((between, classes));
                }
            }
            below += n;
            sum_below += n * count;
            squares_below += n * count * count;
            before = Some(count);
        }
        best.map(|(_, classes)| classes)
    }

    /// The two classes a stated threshold makes; `None` if one of them is empty.
    pub(super) fn parted_at(&self, threshold: f64) -> Option<Classes> {
        let mut sums = [[0.0_f64; 3]; 2];
        for (count, n) in self.present() {
            let [low, high] = &mut sums;
            let side = if count < threshold { low } else { high };
            *side = [
                side[0] + n,
                side[1] + n * count,
                side[2] + n * count * count,
            ];
        }
        if sums.iter().any(|side| side[0] <= 0.0) {
            return None;
        }
        let means = sums.map(|[n, sum, _]| sum / n);
        let deviations = sums.map(|[n, sum, squares]| {
            let mean = sum / n;
            (squares / n - mean * mean).max(0.0).sqrt()
        });
        Some(Classes {
            threshold,
            means,
            deviations,
            share_below: sums[0][0] / (sums[0][0] + sums[1][0]),
        })
    }

    /// What is handed on, in the numbers of the file.
    pub(super) fn summary(&self, classes: &Classes, grey: &Grey) -> HistogramSummary {
        let mut present = self.present();
        let low = present.next().map_or(0.0, |(count, _)| count);
        let high = present.last().map_or(low, |(count, _)| count);
        let step = (high - low + 1.0) / SUMMARY_STEPS as f64;
        let mut counts = vec![0; SUMMARY_STEPS];
        for (count, n) in self.present() {
            let slot = ((count - low) / step) as usize;
            if let Some(slot) = counts.get_mut(slot.min(SUMMARY_STEPS - 1)) {
                *slot += n as u64;
            }
        }
        HistogramSummary {
            range: [low, high].map(|v| grey.to_file(v)),
            distinct: self.present().count(),
            class_means: classes.means.map(|v| grey.to_file(v)),
            class_deviations: classes.deviations.map(|v| v * grey.unit),
            share_below: classes.share_below,
            counts,
        }
    }
}

/// Two classes of pixels, in counts.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Classes {
    /// Between the counts of the two.
    pub(super) threshold: f64,
    /// Means below and above.
    pub(super) means: [f64; 2],
    /// Standard deviations below and above.
    pub(super) deviations: [f64; 2],
    /// Share of the pixels below.
    pub(super) share_below: f64,
}

impl Classes {
    /// Distance of the means over the root mean square of the two deviations.
    pub(super) fn separation(&self) -> f64 {
        let [a, b] = self.deviations;
        let deviation = (f64::midpoint(a * a, b * b)).sqrt();
        let [low, high] = self.means;
        (high - low) / deviation
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn otsu_parts_two_levels_half_way() {
        let values = (0..900).map(|i| if i % 3 == 0 { 40 } else { 60_000 });
        let classes = Histogram::of(values).otsu().unwrap();
        assert!((classes.threshold - 30_020.0).abs() < 1e-9);
        assert!(
            (classes.means[0] - 40.0).abs() < 1e-9 && (classes.means[1] - 60_000.0).abs() < 1e-6
        );
        assert!((classes.share_below - 1.0 / 3.0).abs() < 1e-12);
        assert!(classes.separation().is_infinite());
        assert!(Histogram::of(vec![7; 10]).otsu().is_none());
        assert!(Histogram::of(vec![]).otsu().is_none());
    }

    #[test]
    fn otsu_finds_the_greatest_variance_between_classes() {
        // A skewed histogram, against all thresholds tried one by one.
        let values: Vec<u16> = (0..2000_u32)
            .map(|i| (i * i % 977 / 9 + i % 31) as u16)
            .collect();
        let histogram = Histogram::of(values.iter().copied());
        let between = |threshold: f64| {
            let c = histogram.parted_at(threshold)?;
            Some(c.share_below * (1.0 - c.share_below) * (c.means[1] - c.means[0]).powi(2))
        };
        let tried: Vec<f64> = (0..200)
            .filter_map(|t| between(f64::from(t) + 0.5))
            .collect();
        let greatest = tried.into_iter().fold(0.0, f64::max);
        let found = between(histogram.otsu().unwrap().threshold).unwrap();
        assert!((found / greatest - 1.0).abs() < 1e-12, "{found} {greatest}");
    }

    #[test]
    fn one_hump_and_even_greys_are_not_two_classes() {
        let even = Histogram::of(0..=60_000);
        let separation = even.otsu().unwrap().separation();
        assert!((separation - 3.46).abs() < 0.01, "{separation}");
        // Sums of twelve even numbers are nearly Gaussian.
        let mut state = 1_u64;
        let mut next = || {
            state = state
                .wrapping_mul(6_364_136_223_846_793_005)
                .wrapping_add(1);
            (state >> 33) % 1000
        };
        let humps = (0..50_000).map(|_| (0..12).map(|_| next()).sum::<u64>() as u16);
        let separation = Histogram::of(humps.collect::<Vec<_>>())
            .otsu()
            .unwrap()
            .separation();
        assert!((2.5..2.9).contains(&separation), "{separation}");
    }

    #[test]
    fn quantiles_are_counts_that_occur() {
        let histogram = Histogram::of([1, 2, 3, 4, 100]);
        assert_eq!(histogram.quantile(0.5), Some(3.0));
        assert_eq!(histogram.quantile(1.0), Some(100.0));
        assert_eq!(Histogram::of(vec![]).quantile(0.5), None);
    }
}
