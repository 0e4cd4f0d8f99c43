//! The CSV views of a net (RFC 4180): one row a channel, and one row a node; every head of a number ends in its unit.

use super::csv::{CsvError, number, table};
use super::network_document::{NetworkDocument, condition_word, direction_word};
use super::numbers::one_line;
use crate::study::{BeyondLimit, NodeCondition};

/// One row for each channel.
///
/// # Errors
/// [`CsvError`] when the writer refuses, which no name or number causes.
pub fn network_csv(document: &NetworkDocument<'_>) -> Result<String, CsvError> {
    let heads = [
        "name",
        "from",
        "to",
        "card",
        "parallel_1",
        "length_m",
        "flow_m3_per_s",
        "flow_u_m3_per_s",
        "flow_sampled_u_m3_per_s",
        "direction",
        "pressure_drop_pa",
        "resistance_pa_s_per_m3",
        "resistance_low_pa_s_per_m3",
        "resistance_high_pa_s_per_m3",
        "mean_velocity_m_per_s",
        "reynolds_dh_1",
        "entrance_length_m",
        "wall_shear_mean_pa",
        "wall_shear_max_pa",
        "volume_m3",
        "residence_time_s",
        "inertance_kg_per_m4",
        "time_constant_s",
        "beyond_limits",
    ];
    let net = document.network;
    let uncertainties = document.uncertainties();
    let rows = net.channels.iter().enumerate().map(|(index, channel)| {
        let state = &document.solution.channels[index];
        let found = uncertainties.flows[index];
        let beyond: Vec<&str> = state
            .beyond
            .iter()
            .map(|b: &BeyondLimit| b.word())
            .collect();
        vec![
            one_line(&channel.name),
            one_line(&net.nodes[channel.from].name),
            one_line(&net.nodes[channel.to].name),
            one_line(&net.cards[channel.card].name),
            channel.parallel.to_string(),
            number(channel.length.or(net.cards[channel.card].length)),
            number(state.flow),
            number(found.map(|one| one.u)),
            number(found.and_then(|one| Some(one.sampled?.u))),
            direction_word(state.flow).to_owned(),
            number(state.pressure_drop),
            number(state.resistance),
            number(state.proven.map(|p| p.0)),
            number(state.proven.map(|p| p.1)),
            number(state.mean_velocity),
            number(state.reynolds),
            number(state.entrance_length),
            number(state.wall_shear_mean),
            number(state.wall_shear_max),
            number(state.volume),
            number(state.residence_time),
            number(state.inertance),
            number(state.time_constant),
            beyond.join(" "),
        ]
    });
    table(&heads, rows, &net.name)
}

/// One row for each node.
///
/// # Errors
/// [`CsvError`] when the writer refuses, which no name or number causes.
pub fn network_nodes_csv(document: &NetworkDocument<'_>) -> Result<String, CsvError> {
    let heads = [
        "node",
        "given",
        "pressure_pa",
        "pressure_u_pa",
        "inflow_m3_per_s",
        "inflow_u_m3_per_s",
        "imbalance_m3_per_s",
    ];
    let net = document.network;
    let uncertainties = document.uncertainties();
    let rows = net.nodes.iter().enumerate().map(|(index, node)| {
        let state = &document.solution.nodes[index];
        let u = uncertainties.nodes[index].map(|one| one.u);
        let (of_pressure, of_inflow) = match node.condition {
            NodeCondition::Pressure(_) => (None, u),
            NodeCondition::Inflow(_) => (u, None),
        };
        vec![
            one_line(&node.name),
            condition_word(node.condition).to_owned(),
            number(state.pressure),
            number(of_pressure),
            number(state.inflow),
            number(of_inflow),
            number(state.imbalance),
        ]
    });
    table(&heads, rows, &net.name)
}
