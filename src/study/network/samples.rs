//! The net solved again with resistances drawn at random.

use rayon::prelude::*;

use super::net::Network;
use super::random::NormalSource;
use super::solution::NetworkSolution;
use super::uncertainty::NetOutput;

/// Values of the outputs, one list for each sample, in the order of the samples.
///
/// `R = R0 exp(u_card z_card + u_channel z_channel)` with `z` standard normal: log-normal with the median at the value
/// of the card. Each sample has a seed of its own, so the number of threads changes nothing. A sample whose numbers
/// leave the range of doubles is left out.
pub(super) fn samples(
    network: &Network,
    solution: &NetworkSolution,
    outputs: &[NetOutput],
    count: usize,
    seed: u64,
) -> Vec<Vec<f64>> {
    let mut seeds = NormalSource::new(seed);
    let seeds: Vec<u64> = (0..count).map(|_| seeds.bits()).collect();
    let given = network.given(&solution.topology);
    let inflows = network.inflows();
    seeds
        .into_par_iter()
        .filter_map(|seed| {
            let resistances = drawn(network, solution, seed);
            let conductances: Vec<f64> = resistances.iter().map(|r| 1.0 / r).collect();
            let eliminated = solution.topology.eliminate(&conductances).ok()?;
            let state = solution
                .topology
                .state(network, &eliminated, &inflows, &given);
            let value = |output: &NetOutput| match *output {
                NetOutput::Flow(channel) => state.drops[channel] * conductances[channel],
                NetOutput::Pressure(node) => state.pressures[node],
                NetOutput::Inflow(node) => inflow(network, node, &state.drops, &conductances),
                NetOutput::Resistance => 1.0 / eliminated.between,
            };
            let values: Vec<f64> = outputs.iter().map(value).collect();
            values.iter().all(|v| v.is_finite()).then_some(values)
        })
        .collect()
}

fn drawn(network: &Network, solution: &NetworkSolution, seed: u64) -> Vec<f64> {
    let mut source = NormalSource::new(seed);
    let of_cards: Vec<f64> = network
        .cards
        .iter()
        .map(|card| card.common() * source.normal())
        .collect();
    network
        .channels
        .iter()
        .zip(&solution.channels)
        .map(|(channel, state)| {
            let own = channel.bundle_spread() * source.normal();
            state.resistance * (of_cards[channel.card] + own).exp()
        })
        .collect()
}

/// Flow into the net at a node.
fn inflow(network: &Network, node: usize, drops: &[f64], conductances: &[f64]) -> f64 {
    let channels = network.channels.iter().zip(drops.iter().zip(conductances));
    channels
        .map(|(channel, (drop, g))| {
            if channel.from == node {
                drop * g
            } else if channel.to == node {
                -drop * g
            } else {
                0.0
            }
        })
        .sum()
}
