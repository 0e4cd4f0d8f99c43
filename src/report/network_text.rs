//! The text view of a net: what was given, pressures, flows, and how sure they are.

use std::fmt::Write as _;

use super::network_document::{NetworkDocument, condition_word, is_moved};
use super::numbers::{self, one_line, per_cent, significant, title, with_unit};
use super::table::{Align, Table, paragraph};
use super::text::{TextOptions, finished, part, warnings};
use crate::study::{BeyondLimit, NetOutput, NetworkUncertainty, OutputUncertainty};

/// Rows of a table that are shown without `--verbose`.
const MOST_ROWS: usize = 60;
/// Zero of the Celsius scale, K.
const CELSIUS: f64 = 273.15;

/// The document as text, ended by a line feed.
pub fn network_text(document: &NetworkDocument<'_>, options: TextOptions) -> String {
    let most = if options.verbose {
        usize::MAX
    } else {
        MOST_ROWS
    };
    let mut parts = vec![head(document)];
    parts.extend(equivalent(document));
    parts.push(nodes(document, most));
    parts.push(flows(document, most));
    parts.push(walls(document, most));
    parts.push(balance(document));
    match document.uncertainty {
        Some(found) => parts.push(uncertainty(document, found, most)),
        None => parts.push(
            "Uncertainty: none, no card and no channel states any (`common` of a card, `spread` of a channel)\n"
                .to_owned(),
        ),
    }
    let notes: String = document
        .notes()
        .iter()
        .map(|note| paragraph("  - ", note))
        .collect();
    if !notes.is_empty() {
        parts.push(format!("Notes\n{notes}"));
    }
    parts.extend(warnings(&document.all_warnings()));
    finished(&parts, options)
}

fn head(document: &NetworkDocument<'_>) -> String {
    let net = document.network;
    let mut out = format!("Net {}\n", title(&net.name));
    let mut table = Table::new(&[Align::Left, Align::Left]);
    table.row(["file".to_owned(), one_line(document.source.path)]);
    table.row(["sha256", document.source.sha256]);
    let at = document
        .solution
        .temperature
        .map(|t| format!(" at {} C", significant(t - CELSIUS, 4)));
    table.row([
        "fluid".to_owned(),
        format!("{}{}", one_line(&net.fluid), at.unwrap_or_default()),
    ]);
    table.row([
        "net".to_owned(),
        format!("{} channels, {} nodes", net.channels.len(), net.nodes.len()),
    ]);
    out.push_str(&table.print(2));
    let mut table = Table::new(&[Align::Left, Align::Left, Align::Right, Align::Right]);
    table.row(["card", "file", "R(T)/R(T0)", "u common"]);
    let cards = net.cards.iter().zip(document.cards);
    for ((card, record), factor) in cards.zip(&document.solution.temperature_factors) {
        table.row([
            title(&card.name),
            one_line(record.path),
            significant(*factor, 6),
            per_cent(card.common()),
        ]);
    }
    out.push_str(&table.print(2));
    out
}

fn equivalent(document: &NetworkDocument<'_>) -> Option<String> {
    let found = document.solution.equivalent?;
    let nodes = &document.network.nodes;
    let [a, b] = found.between.map(|node| title(&nodes[node].name));
    let mut table = Table::new(&[Align::Left, Align::Left]);
    table.row([
        "R".to_owned(),
        format!("{} Pa s/m^3", significant(found.resistance, 7)),
    ]);
    let mut factors = document.solution.temperature_factors.iter();
    let label = if factors.any(|factor| is_moved(*factor)) {
        "proven for cards and laws as given"
    } else {
        "proven for the cards as given"
    };
    table.row([
        label.to_owned(),
        match found.proven {
            Some((low, high)) => format!(
                "{} to {} Pa s/m^3 ({})",
                significant(low, 7),
                significant(high, 7),
                per_cent((high - low) / found.resistance)
            ),
            None => "no range: a card has none".to_owned(),
        },
    ]);
    if let Some(one) = document.of(NetOutput::Resistance) {
        table.row([
            "standard uncertainty".to_owned(),
            format!("{} of R", per_cent(one.u / one.value)),
        ]);
    }
    Some(part(&format!("Resistance from {a} to {b}"), &table))
}

/// A value with its standard uncertainty in the same unit.
fn with_u(value: f64, units: &[numbers::Unit], found: Option<&OutputUncertainty>) -> [String; 2] {
    if value == 0.0 && found.is_none_or(|one| one.u == 0.0) {
        return ["0".to_owned(), "-".to_owned()];
    }
    let (name, size) = numbers::fitting_unit(value, units);
    [
        format!("{} {name}", significant(value / size, 5)),
        found.map_or_else(
            || "-".to_owned(),
            |one| format!("{} {name}", significant(one.u / size, 2)),
        ),
    ]
}

/// Said below a table that was cut.
fn cut(shown: usize, all: usize, what: &str) -> String {
    if shown >= all {
        return String::new();
    }
    format!("  ... {shown} of {all} {what} shown; --verbose shows all, --csv and --json hold all\n")
}

fn nodes(document: &NetworkDocument<'_>, most: usize) -> String {
    let net = document.network;
    let uncertainties = document.uncertainties();
    let mut table = Table::new(&[
        Align::Left,
        Align::Left,
        Align::Right,
        Align::Right,
        Align::Right,
    ]);
    table.row([
        "node",
        "given",
        "pressure",
        "inflow",
        "u of what is not given",
    ]);
    for (index, node) in net.nodes.iter().enumerate().take(most) {
        let state = &document.solution.nodes[index];
        let found = uncertainties.nodes[index];
        let is_flow = found.is_some_and(|one| matches!(one.output, NetOutput::Inflow(_)));
        let (for_pressure, for_flow) = if is_flow {
            (None, found)
        } else {
            (found, None)
        };
        let [pressure, of_pressure] = with_u(state.pressure, numbers::PRESSURES, for_pressure);
        let [inflow, of_inflow] = with_u(state.inflow, numbers::FLOW_RATES, for_flow);
        table.row([
            title(&node.name),
            condition_word(node.condition).to_owned(),
            pressure,
            inflow,
            if is_flow { of_inflow } else { of_pressure },
        ]);
    }
    part("Nodes", &table) + &cut(most, net.nodes.len(), "nodes")
}

fn flows(document: &NetworkDocument<'_>, most: usize) -> String {
    let net = document.network;
    let uncertainties = document.uncertainties();
    let mut table = Table::new(&[
        Align::Left,
        Align::Left,
        Align::Right,
        Align::Right,
        Align::Right,
        Align::Right,
        Align::Right,
    ]);
    table.row([
        "channel",
        "flows",
        "flow",
        "u",
        "pressure drop",
        "velocity",
        "Re",
    ]);
    for (index, channel) in net.channels.iter().enumerate().take(most) {
        let state = &document.solution.channels[index];
        let ends = [channel.from, channel.to].map(|node| title(&net.nodes[node].name));
        let [from, to] = if state.flow < 0.0 {
            let [a, b] = ends;
            [b, a]
        } else {
            ends
        };
        let [flow, u] = with_u(
            state.flow.abs(),
            numbers::FLOW_RATES,
            uncertainties.flows[index],
        );
        let count = match channel.parallel {
            1 => String::new(),
            n => format!(" ({n} side by side)"),
        };
        table.row([
            format!("{}{count}", title(&channel.name)),
            format!("{from} -> {to}"),
            flow,
            u,
            with_unit(state.pressure_drop.abs(), numbers::PRESSURES, 5),
            state
                .mean_velocity
                .map_or("-".to_owned(), |v| with_unit(v, numbers::VELOCITIES, 4)),
            state
                .reynolds
                .map_or("-".to_owned(), |re| significant(re, 3)),
        ]);
    }
    part("Channels", &table) + &cut(most, net.channels.len(), "channels")
}

fn walls(document: &NetworkDocument<'_>, most: usize) -> String {
    let net = document.network;
    let mut table = Table::new(&[
        Align::Left,
        Align::Right,
        Align::Right,
        Align::Right,
        Align::Right,
        Align::Right,
        Align::Left,
    ]);
    table.row([
        "channel",
        "shear mean",
        "shear max",
        "volume",
        "residence",
        "L/R",
        "holds",
    ]);
    let shear = |v: Option<f64>| v.map_or("-".to_owned(), |v| with_unit(v, numbers::PRESSURES, 4));
    let time = |v: Option<f64>| v.map_or("-".to_owned(), |v| with_unit(v, numbers::TIMES, 4));
    for (channel, state) in net
        .channels
        .iter()
        .zip(&document.solution.channels)
        .take(most)
    {
        let beyond: Vec<&str> = state
            .beyond
            .iter()
            .map(|b: &BeyondLimit| b.word())
            .collect();
        table.row([
            title(&channel.name),
            shear(state.wall_shear_mean),
            shear(state.wall_shear_max),
            format!("{} \u{b5}L", significant(state.volume * 1e9, 4)),
            time(state.residence_time),
            time(state.time_constant),
            if beyond.is_empty() {
                "yes".to_owned()
            } else {
                format!("beyond: {}", beyond.join(", "))
            },
        ]);
    }
    part("Wall shear, times, and whether the cards hold", &table)
        + &cut(most, net.channels.len(), "channels")
}

fn balance(document: &NetworkDocument<'_>) -> String {
    let found = document.solution.balance;
    format!(
        "Mass balance: largest imbalance of a node {} m^3/s, {} of what flows there; all inflows add up to {} m^3/s\n",
        significant(found.largest, 2),
        significant(found.relative, 2),
        significant(found.whole, 2)
    )
}

fn uncertainty(document: &NetworkDocument<'_>, found: &NetworkUncertainty, most: usize) -> String {
    let mut table = Table::new(&[
        Align::Left,
        Align::Right,
        Align::Right,
        Align::Right,
        Align::Right,
        Align::Right,
    ]);
    table.row([
        "result",
        "value",
        "u first order",
        "u of samples",
        "95 % of samples",
        "from common parts",
    ]);
    for one in found.outputs.iter().take(most) {
        table.row(uncertainty_row(document, one));
    }
    let mut out = part("Standard uncertainty, first order and by samples", &table);
    out.push_str(&cut(most, found.outputs.len(), "results"));
    let mut said = String::new();
    match (found.largest_difference(), found.sampling_error()) {
        (Some(difference), Some(error)) => {
            let _ = write!(
                said,
                "{} samples, seed {}: their u differs from first order by at most {}; sampling alone makes about {}.",
                found.samples,
                found.seed,
                per_cent(difference.abs()),
                per_cent(error)
            );
            if found.is_beyond_first_order() {
                said.push_str(
                    " The difference is more than chance: over such uncertainties the net is not linear, so take the \
                     samples.",
                );
            }
        }
        _ => said.push_str("No samples were drawn: --samples N draws N."),
    }
    out.push_str(&paragraph("  ", &said));
    out
}

fn uncertainty_row(document: &NetworkDocument<'_>, one: &OutputUncertainty) -> [String; 6] {
    let (kind, name) = document.output_name(one.output);
    let (unit, size) = match one.output {
        NetOutput::Resistance => ("Pa s/m^3", 1.0),
        NetOutput::Inflow(_) | NetOutput::Flow(_) => {
            numbers::fitting_unit(one.value, numbers::FLOW_RATES)
        }
        NetOutput::Pressure(_) => numbers::fitting_unit(one.value, numbers::PRESSURES),
    };
    let number = |value: f64, digits: usize| significant(value / size, digits);
    [
        format!("{kind} {}", title(&name)).trim_end().to_owned(),
        format!("{} {unit}", number(one.value, 5)),
        number(one.u, 3),
        one.sampled.map_or("-".to_owned(), |s| number(s.u, 3)),
        one.sampled.map_or("-".to_owned(), |s| {
            format!("{} to {}", number(s.low, 4), number(s.high, 4))
        }),
        format!("{:.0} %", 100.0 * one.common_share),
    ]
}
