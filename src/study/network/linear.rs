//! Derivatives of a result with respect to the logarithm of every resistance, from one further solution.
//!
//! With `g d` the flow of a channel, a larger resistance, `R (1 + t)`, acts like the flow `g d t` let in at its begin
//! and taken out at its end. So for a result that is the pressure at a node, or a difference of two, the solution
//! `v` for a unit inflow there gives all derivatives at once (the net is its own adjoint):
//! `dy/dt_j = Q_j (v_from - v_to)`. The flow of a channel is such a difference times its conductance, which itself
//! changes with its own resistance; an inflow is a sum of flows.

use super::net::Network;
use super::samples::ends;
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
    // Channels whose flows make up the result, with their signs.
    let mut own: Vec<(usize, f64)> = Vec::new();
    match output {
        NetOutput::Flow(channel) => own.push((channel, 1.0)),
        NetOutput::Inflow(_) => own = ends(network, output),
        NetOutput::Pressure(node) => inflows[node] = 1.0,
        NetOutput::Resistance => {
            if let Some(pressure) = kept.first_mut() {
                *pressure = 1.0;
            }
        }
    }
    for &(index, sign) in &own {
        let channel = &network.channels[index];
        let g = sign / solution.channels[index].resistance;
        inflows[channel.from] += g;
        inflows[channel.to] -= g;
    }
    let drops = solution
        .topology
        .plain_drops(network, &solution.eliminated, &inflows, &kept);
    let of_all = solution.channels.iter().zip(drops);
    if output == NetOutput::Resistance {
        // Share of the power spent in each channel: dlnR / dlnR_j = d_j^2 g_j / G for a unit of pressure.
        let whole = solution.equivalent.map_or(0.0, |e| e.resistance);
        return of_all
            .map(|(channel, drop)| drop * drop / channel.resistance * whole * whole)
            .collect();
    }
    let mut found: Vec<f64> = of_all.map(|(channel, drop)| channel.flow * drop).collect();
    for (index, sign) in own {
        found[index] -= sign * solution.channels[index].flow;
    }
    found
}
