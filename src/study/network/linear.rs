//! Derivatives of a result with respect to the logarithm of every resistance, from one further solution.
//!
//! With `g d` the flow of a channel, a larger resistance, `R (1 + t)`, acts like the flow `g d t` let in at its begin
//! and taken out at its end. So for a result that is the pressure at a node, or a difference of two, the solution
//! `v` for a unit inflow there gives all derivatives at once (the net is its own adjoint):
//! `dy/dt_j = Q_j (v_from - v_to)`.

use super::net::Network;
use super::solution::NetworkSolution;
use super::uncertainty::NetOutput;

/// `dy / dlnR` of every channel.
pub(super) fn derivatives(
    network: &Network,
    solution: &NetworkSolution,
    output: NetOutput,
) -> Vec<f64> {
    let mut inflows = vec![0.0; network.nodes.len()];
    let mut kept = vec![0.0; solution.topology.kept.len()];
    match output {
        NetOutput::Flow(channel) => {
            let channel = &network.channels[channel];
            inflows[channel.from] += 1.0;
            inflows[channel.to] -= 1.0;
        }
        NetOutput::Pressure(node) => inflows[node] = 1.0,
        NetOutput::Inflow(node) => {
            let places = solution.topology.kept.iter().zip(&mut kept);
            for (_, pressure) in places.filter(|(other, _)| **other == node) {
                *pressure = 1.0;
            }
        }
        NetOutput::Resistance => {
            if let Some(pressure) = kept.first_mut() {
                *pressure = 1.0;
            }
        }
    }
    let drops = solution
        .topology
        .state(network, &solution.eliminated, &inflows, &kept)
        .drops;
    let of_all = solution.channels.iter().zip(drops);
    match output {
        NetOutput::Flow(own) => {
            let resistance = solution.channels[own].resistance;
            let mut found: Vec<f64> = of_all
                .map(|(channel, drop)| channel.flow * drop / resistance)
                .collect();
            found[own] -= solution.channels[own].flow;
            found
        }
        NetOutput::Pressure(_) => of_all.map(|(channel, drop)| channel.flow * drop).collect(),
        NetOutput::Inflow(_) => of_all.map(|(channel, drop)| -channel.flow * drop).collect(),
        NetOutput::Resistance => {
            // Share of the power spent in each channel: dlnR / dlnR_j = d_j^2 g_j / G for a unit of pressure.
            let whole = solution.equivalent.map_or(0.0, |e| e.resistance);
            of_all
                .map(|(channel, drop)| drop * drop / channel.resistance * whole * whole)
                .collect()
        }
    }
}
