//! One trace on its way through the corrections: what is missing in it and what is a spike.

use super::correction_options::CorrectionOptions;
use super::lands::Ground;
use super::profile::Profile;
use super::robust_line::{robust_line, typical_slope};
use super::spikes::{NARROW, SpikeRule, WIDEST, find_spikes};
use super::trace_problem::{FEWEST_SAMPLES, TraceProblem};
use crate::intake::order_statistics::{median, quantile, thinned};

/// Positions and heights beyond this are no trace, m.
const FARTHEST: f64 = 1e3;

/// Smallest height of a spike, in depths, where none is stated.
const SMALLEST_SPIKE: f64 = 0.005;

/// Widest spike, in widths of the narrowest land or channel.
const WIDEST_SPIKE: f64 = 0.02;

/// Relief that is none, m: a hundredth of an atom.
pub(super) const NO_RELIEF: f64 = 1e-12;

/// Steps of the smallest height over a whole trace from which a slope counts as a staircase of rounding.
const FEWEST_STAIRS: f64 = 5.0;

/// A trace with its marks.
#[derive(Debug, Clone)]
pub(super) struct Scan {
    /// Positions and heights, from the first to the last sample that has one; NaN where missing.
    pub(super) profile: Profile,
    /// Spikes, one mark for each sample.
    pub(super) is_spike: Vec<bool>,
    /// Samples left out at the two ends, without a height.
    pub(super) trimmed: usize,
    /// Widest spike that is looked for, m.
    pub(super) widest_spike: f64,
}

impl Scan {
    /// A trace checked, cut to where it has heights, and turned over where asked.
    pub(super) fn new(
        profile: &Profile,
        options: &CorrectionOptions,
    ) -> Result<Self, TraceProblem> {
        check(profile)?;
        let has_height = |z: &f64| z.is_finite();
        let found = profile.z.iter().filter(|z| has_height(z)).count();
        let samples = profile.z.len();
        let ends = (
            profile.z.iter().position(has_height),
            profile.z.iter().rposition(has_height),
        );
        let (Some(first), Some(last), true) = (ends.0, ends.1, found >= FEWEST_SAMPLES) else {
            return Err(TraceProblem::TooFewSamples { found, samples });
        };
        let sign = if options.invert { -1.0 } else { 1.0 };
        let z = profile.z[first..=last].iter();
        let z = z.map(|z| if z.is_finite() { sign * z } else { f64::NAN });
        let scan = Profile {
            x: profile.x[first..=last].to_vec(),
            z: z.collect(),
        };
        Ok(Self {
            is_spike: vec![false; scan.x.len()],
            trimmed: samples - scan.x.len(),
            widest_spike: 0.0,
            profile: scan,
        })
    }

    /// The numbers of the samples that have a height and are no spike.
    fn good_samples(&self) -> Vec<usize> {
        (0..self.is_spike.len())
            .filter(|&k| !self.is_spike[k] && !self.profile.z[k].is_nan())
            .collect()
    }

    /// The samples that have a height and are no spike.
    pub(super) fn good(&self) -> Profile {
        let kept = self.good_samples();
        Profile {
            x: kept.iter().map(|&k| self.profile.x[k]).collect(),
            z: kept.iter().map(|&k| self.profile.z[k]).collect(),
        }
    }

    /// Refuses a trace whose samples all lie on one straight line, to within the rounding of its heights.
    ///
    /// Heights rounded on a slope form a staircase whose smallest step is the rounding; a channel as
    /// deep as one such step is not in the numbers. Level lands have no staircase to judge by, and then
    /// only heights that are all the same, or straight to the accuracy of the arithmetic, are refused.
    pub(super) fn refuse_straight(&self) -> Result<(), TraceProblem> {
        let good = self.good();
        let ends = (good.x.first(), good.x.last(), good.z.first(), good.z.last());
        let (Some(&from), Some(&to), Some(&low), Some(&high)) = ends else {
            return Ok(());
        };
        let Some(line) = robust_line(&good.x, &good.z, 100) else {
            return Ok(());
        };
        let spread = |values: &mut dyn Iterator<Item = f64>| {
            let (least, most) = values.fold((f64::INFINITY, f64::NEG_INFINITY), |(a, b), z| {
                (a.min(z), b.max(z))
            });
            most - least
        };
        let mut rests = good.x.iter().zip(&good.z).map(|(x, z)| z - line.at(*x));
        let relief = spread(&mut rests);
        let range = spread(&mut good.z.iter().copied());
        let steps = good.z.windows(2).map(|pair| (pair[1] - pair[0]).abs());
        let step = steps.filter(|s| *s > 0.0).fold(f64::INFINITY, f64::min);
        let is_staircase = relief <= 1.5 * step && range >= FEWEST_STAIRS * step;
        let highest = good.z.iter().fold(0.0_f64, |most, z| most.max(z.abs()));
        if is_staircase || relief <= (1e-12 * highest).max(NO_RELIEF) {
            let (rise, length) = (high - low, to - from);
            return Err(TraceProblem::Straight { rise, length });
        }
        Ok(())
    }

    /// Marks spikes of up to three samples, before it is known what is land and what is channel.
    pub(super) fn mark_narrow_spikes(&mut self, options: &CorrectionOptions) {
        let smallest = SMALLEST_SPIKE * relief(&self.good());
        self.mark(options, NARROW, smallest);
    }

    /// Marks spikes that come back within a fiftieth of the narrowest land or channel.
    pub(super) fn mark_wider_spikes(&mut self, options: &CorrectionOptions, ground: &Ground) {
        let smallest = SMALLEST_SPIKE * ground.depth;
        if smallest < 0.8 * SMALLEST_SPIKE * relief(&self.good()) {
            self.mark(options, NARROW, smallest);
        }
        let spacing = median(&mut thinned(&spacings(&self.profile.x), 100_000));
        let within = (WIDEST_SPIKE * ground.narrowest / spacing) as usize;
        if within.min(WIDEST) > NARROW {
            self.mark(options, within.min(WIDEST), smallest);
        }
    }

    fn mark(&mut self, options: &CorrectionOptions, half_window: usize, smallest: f64) {
        if options.keep_spikes {
            return;
        }
        let kept = self.good_samples();
        let good = self.good();
        let rule = SpikeRule {
            half_window,
            smallest: options.spike_size.unwrap_or(smallest),
            is_stated: options.spike_size.is_some(),
        };
        for (first, last) in find_spikes(&good, &rule) {
            for &k in &kept[first..last] {
                self.is_spike[k] = true;
            }
        }
        let spacing = median(&mut thinned(&spacings(&good.x), 100_000));
        self.widest_spike = self.widest_spike.max(half_window as f64 * spacing);
    }
}

/// Distances of neighbours.
pub(super) fn spacings(x: &[f64]) -> Vec<f64> {
    x.windows(2).map(|pair| pair[1] - pair[0]).collect()
}

/// Spread of the heights about the typical slope: 1 to 99 % of them, m.
pub(super) fn relief(good: &Profile) -> f64 {
    let slope = typical_slope(&good.x, &good.z);
    let start = good.x.first().copied().unwrap_or(0.0);
    let level: Vec<f64> = good
        .x
        .iter()
        .zip(&good.z)
        .map(|(x, z)| z - slope * (x - start))
        .collect();
    let mut level = thinned(&level, 100_000);
    let spread = quantile(&mut level, 0.99) - quantile(&mut level, 0.01);
    if spread.is_finite() { spread } else { 0.0 }
}

/// Whether positions increase and lie where traces lie.
fn check(profile: &Profile) -> Result<(), TraceProblem> {
    if profile.x.len() != profile.z.len() {
        return Err(TraceProblem::Lengths {
            positions: profile.x.len(),
            heights: profile.z.len(),
        });
    }
    let mut before = f64::NEG_INFINITY;
    for (k, (&x, &z)) in profile.x.iter().zip(&profile.z).enumerate() {
        if !(x > before && x.is_finite()) {
            return Err(TraceProblem::Order { number: k + 1 });
        }
        let farthest = if z.is_finite() {
            x.abs().max(z.abs())
        } else {
            x.abs()
        };
        if farthest > FARTHEST {
            return Err(TraceProblem::TooFar {
                number: k + 1,
                distance: farthest,
            });
        }
        before = x;
    }
    Ok(())
}
