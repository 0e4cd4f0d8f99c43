//! The net solved again with resistances drawn at random.

use rayon::prelude::*;

use super::net::Network;
use super::random::NormalSource;
use super::solution::NetworkSolution;
use super::uncertainty::NetOutput;

/// Values of the outputs, one list for each sample, in the order of the samples.
///
/// `R = R0 exp(u_card z_card + u_common z_entry + u_channel z_channel)` with `z` standard normal: log-normal with the median at the value
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
    // Flows into the net are summed over the channels there, found once.
    let ends: Vec<Vec<(usize, f64)>> = outputs.iter().map(|one| ends(network, *one)).collect();
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
            let value = |(output, ends): (&NetOutput, &Vec<(usize, f64)>)| match *output {
                NetOutput::Flow(channel) => state.drops[channel] * conductances[channel],
                NetOutput::Pressure(node) => state.pressures[node],
                NetOutput::Inflow(_) => ends
                    .iter()
                    .map(|&(channel, sign)| sign * state.drops[channel] * conductances[channel])
                    .sum(),
                NetOutput::Resistance => 1.0 / eliminated.between,
            };
            let values: Vec<f64> = outputs.iter().zip(&ends).map(value).collect();
            values.iter().all(|v| v.is_finite()).then_some(values)
        })
        .collect()
}

fn drawn(network: &Network, solution: &NetworkSolution, seed: u64) -> Vec<f64> {
    let mut source = NormalSource::new(seed);
    let of_origins: Vec<f64> = (0..network.origins()).map(|_| source.normal()).collect();
    let of_cards: Vec<f64> = network
        .cards
        .iter()
        .map(|card| {
            let own = card.own_uncertainty.unwrap_or(0.0) * of_origins[card.origin];
            own + card.common_uncertainty * source.normal()
        })
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

/// Channels at the node of an inflow, with 1 where they begin there and -1 where they end.
pub(super) fn ends(network: &Network, output: NetOutput) -> Vec<(usize, f64)> {
    let NetOutput::Inflow(node) = output else {
        return Vec::new();
    };
    let sign = |index: usize| {
        let channel = &network.channels[index];
        f64::from(i8::from(channel.from == node) - i8::from(channel.to == node))
    };
    (0..network.channels.len())
        .map(|index| (index, sign(index)))
        .filter(|(_, sign)| *sign != 0.0)
        .collect()
}
