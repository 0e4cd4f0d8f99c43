//! What the uncertainty of the resistances does to the results: to first order, and by samples.

use rayon::prelude::*;

use super::linear::derivatives;
use super::net::{NetChannel, Network, NodeCondition};
use super::samples::samples;
use super::solution::NetworkSolution;

/// Samples where no number is asked for.
pub const DEFAULT_SAMPLES: usize = 1000;
/// Fewest samples that say anything.
pub const FEWEST_SAMPLES: usize = 10;
/// Multiplications spent on derivatives before results are left out, and fewest and most results.
const LINEAR_WORK: u64 = 100_000_000;
const FEWEST_OUTPUTS: u64 = 20;
const MOST_OUTPUTS: u64 = 500;
/// Multiplications spent on samples where no number of them is asked for.
const SAMPLE_WORK: u64 = 200_000_000;

/// Relative uncertainty below which there is nothing but rounding to compare.
const ROUNDING: f64 = 1e-9;
/// Standard errors of sampling beyond which a difference between samples and first order is no chance.
const BEYOND_CHANCE: f64 = 5.0;

/// A result that has an uncertainty.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum NetOutput {
    /// The resistance between the two nodes of given pressure, Pa s/m^3.
    Resistance,
    /// Flow into the net at a node of given pressure, m^3/s.
    Inflow(usize),
    /// Flow of a channel, m^3/s.
    Flow(usize),
    /// Pressure at a node, Pa.
    Pressure(usize),
}

/// How many samples, and from which seed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct SampleOptions {
    /// Number asked for, zero for none; `None` for [`DEFAULT_SAMPLES`], or fewer for a large net.
    pub count: Option<usize>,
    /// Seed.
    pub seed: u64,
}

/// What the samples say of one result.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Sampled {
    /// Mean.
    pub mean: f64,
    /// Standard deviation.
    pub u: f64,
    /// The value that 2.5 % of the samples are below.
    pub low: f64,
    /// The value that 97.5 % of the samples are below.
    pub high: f64,
}

/// One result with its uncertainty, in its own unit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct OutputUncertainty {
    /// Which result.
    pub output: NetOutput,
    /// Its value.
    pub value: f64,
    /// Standard uncertainty to first order.
    pub u: f64,
    /// Share of its square that comes from what the channels of one card have in common.
    pub common_share: f64,
    /// What the samples say.
    pub sampled: Option<Sampled>,
}

impl OutputUncertainty {
    /// Standard deviation of the samples over the uncertainty to first order, less 1; `None` where both are rounding.
    pub fn difference(&self) -> Option<f64> {
        let sampled = self.sampled?;
        (self.u > ROUNDING * self.value.abs()).then(|| sampled.u / self.u - 1.0)
    }
}

/// Uncertainty of the results of a net.
#[derive(Debug, Clone, PartialEq)]
pub struct NetworkUncertainty {
    /// The results that are covered: resistance, inflows, flows, pressures.
    pub outputs: Vec<OutputUncertainty>,
    /// All results that there are.
    pub all_outputs: usize,
    /// Samples that were used.
    pub samples: usize,
    /// Samples that would have been used in a smaller net, or were asked for.
    pub samples_wanted: usize,
    /// Seed.
    pub seed: u64,
}

impl NetworkUncertainty {
    /// Largest difference between samples and first order, relative to the latter.
    pub fn largest_difference(&self) -> Option<f64> {
        let all = self
            .outputs
            .iter()
            .filter_map(OutputUncertainty::difference);
        all.max_by(|a, b| a.abs().total_cmp(&b.abs()))
    }

    /// Whether samples and first order differ by more than chance explains; the samples are right then.
    pub fn is_beyond_first_order(&self) -> bool {
        let difference = self.largest_difference().zip(self.sampling_error());
        difference.is_some_and(|(difference, error)| difference.abs() > BEYOND_CHANCE * error)
    }

    /// Relative standard error of a standard deviation from so many samples: `1 / sqrt(2 (n - 1))`.
    pub fn sampling_error(&self) -> Option<f64> {
        (self.samples > 1).then(|| 1.0 / (2.0 * (self.samples as f64 - 1.0)).sqrt())
    }
}

impl NetChannel {
    /// Standard relative uncertainty of all channels side by side: that of one over the root of their number.
    pub fn bundle_spread(&self) -> f64 {
        self.spread / f64::from(self.parallel.max(1)).sqrt()
    }
}

impl Network {
    /// Whether any card or channel states an uncertainty.
    pub fn has_uncertainty(&self) -> bool {
        let is_used = |card: usize| self.cards.get(card).is_some_and(|c| c.common() > 0.0);
        let mut channels = self.channels.iter();
        channels.any(|channel| channel.spread > 0.0 || is_used(channel.card))
    }

    /// Uncertainty of the results of a solved net; `None` where none is stated.
    ///
    /// First order: `u^2 = sum over parts (u_part sum of dy/dlnR_j of its channels)^2 + sum over channels
    /// (u_j dy/dlnR_j)^2`, the parts being the own uncertainty of each card and the further one of each entry (Guide to the expression of uncertainty in measurement, JCGM 100:2008, 5.2, from memory).
    /// Different cards count as independent; entries of one and the same card share its own uncertainty.
    pub fn uncertainty(
        &self,
        solution: &NetworkSolution,
        options: SampleOptions,
    ) -> Option<NetworkUncertainty> {
        if !self.has_uncertainty() {
            return None;
        }
        let all = self.outputs(solution);
        let all_outputs = all.len();
        let structure = &solution.topology.structure;
        let channels = self.channels.len() as u64;
        let work = structure.work + channels;
        let of_one = 2 * structure.columns.len() as u64 + channels;
        let most = (LINEAR_WORK / of_one.max(1)).clamp(FEWEST_OUTPUTS, MOST_OUTPUTS) as usize;
        let covered: Vec<NetOutput> = all.into_iter().take(most).collect();
        let wanted = options.count.unwrap_or(DEFAULT_SAMPLES);
        let affordable = match options.count {
            Some(count) => count,
            None => wanted.min((SAMPLE_WORK / work.max(1)) as usize),
        };
        let count = if affordable < FEWEST_SAMPLES {
            0
        } else {
            affordable
        };
        let mut outputs: Vec<OutputUncertainty> = covered
            .par_iter()
            .map(|&output| self.first_order(solution, output))
            .collect();
        let drawn = samples(self, solution, &covered, count, options.seed);
        if drawn.len() >= FEWEST_SAMPLES {
            for (place, output) in outputs.iter_mut().enumerate() {
                output.sampled = Some(statistics(drawn.iter().map(|values| values[place])));
            }
        }
        Some(NetworkUncertainty {
            outputs,
            all_outputs,
            samples: drawn.len(),
            samples_wanted: wanted,
            seed: options.seed,
        })
    }

    /// One more than the largest number of an origin.
    pub(super) fn origins(&self) -> usize {
        let numbers = self.cards.iter().map(|card| card.origin + 1);
        numbers.max().unwrap_or(0)
    }

    /// All results: resistance, inflows, flows of channels at given pressures, other flows, pressures.
    fn outputs(&self, solution: &NetworkSolution) -> Vec<NetOutput> {
        let is_given =
            |node: usize| matches!(self.nodes[node].condition, NodeCondition::Pressure(_));
        let nodes = 0..self.nodes.len();
        let (first, later): (Vec<usize>, Vec<usize>) = (0..self.channels.len())
            .partition(|&c| is_given(self.channels[c].from) || is_given(self.channels[c].to));
        solution
            .equivalent
            .map(|_| NetOutput::Resistance)
            .into_iter()
            .chain(
                nodes
                    .clone()
                    .filter(|&n| is_given(n))
                    .map(NetOutput::Inflow),
            )
            .chain(first.into_iter().chain(later).map(NetOutput::Flow))
            .chain(nodes.filter(|&n| !is_given(n)).map(NetOutput::Pressure))
            .collect()
    }

    fn first_order(&self, solution: &NetworkSolution, output: NetOutput) -> OutputUncertainty {
        let slopes = derivatives(self, solution, output);
        let mut of_cards = vec![0.0; self.cards.len()];
        let mut own = 0.0;
        for (channel, slope) in self.channels.iter().zip(slopes) {
            of_cards[channel.card] += slope;
            own += (channel.bundle_spread() * slope).powi(2);
        }
        let mut of_origins = vec![0.0; self.origins()];
        let mut common = 0.0;
        for (card, slope) in self.cards.iter().zip(of_cards) {
            of_origins[card.origin] += card.own_uncertainty.unwrap_or(0.0) * slope;
            common += (card.common_uncertainty * slope).powi(2);
        }
        common += of_origins.iter().map(|part| part * part).sum::<f64>();
        let square = common + own;
        OutputUncertainty {
            output,
            value: match output {
                NetOutput::Resistance => solution.equivalent.map_or(f64::NAN, |e| e.resistance),
                NetOutput::Inflow(node) => solution.nodes[node].inflow,
                NetOutput::Flow(channel) => solution.channels[channel].flow,
                NetOutput::Pressure(node) => solution.nodes[node].pressure,
            },
            u: square.sqrt(),
            common_share: if square > 0.0 { common / square } else { 0.0 },
            sampled: None,
        }
    }
}

/// Mean, standard deviation and the range that holds 95 % of the values.
fn statistics(values: impl Iterator<Item = f64>) -> Sampled {
    let mut values: Vec<f64> = values.collect();
    values.sort_by(f64::total_cmp);
    let count = values.len() as f64;
    // Shifted by the median, so that a small spread on a large value keeps its digits.
    let middle = values[values.len() / 2];
    let shift = values.iter().map(|v| v - middle).sum::<f64>() / count;
    let squares: f64 = values.iter().map(|v| (v - middle - shift).powi(2)).sum();
    let quantile = |share: f64| {
        let place = share * (count - 1.0);
        let below = values[place as usize];
        let above = values[(place.ceil() as usize).min(values.len() - 1)];
        below + (above - below) * place.fract()
    };
    Sampled {
        mean: middle + shift,
        u: (squares / (count - 1.0)).sqrt(),
        low: quantile(0.025),
        high: quantile(0.975),
    }
}
