//! The JSON view of a net: SI, no number without its unit, no NaN, absence with a reason.
//!
//! The form is described by the JSON Schema [`NETWORK_JSON_SCHEMA`] and grows by addition.

use std::collections::BTreeMap;

use serde::Serialize;

use super::json::{Source, WarningView};
use super::json_values::{Quantity, pretty};
use super::network_document::{NetworkDocument, condition_word, direction_word};
use crate::study::{
    BeyondLimit, CardExtent, NetOutput, NetworkUncertainty, NodeCondition, OutputUncertainty,
};

/// Name and version of this contract.
pub const NETWORK_SCHEMA: &str = "etchwise-network/1";
/// JSON Schema (draft 2020-12) of this contract.
pub const NETWORK_JSON_SCHEMA: &str = include_str!("schemas/network.schema.json");

/// The document as pretty-printed JSON with a closing line feed.
///
/// # Errors
/// The error of the serialiser; it has no cause in the data, since keys are text and numbers finite.
pub fn network_json(document: &NetworkDocument<'_>) -> Result<String, serde_json::Error> {
    pretty(&Root::new(document))
}

#[derive(Serialize)]
struct Root<'a> {
    schema: &'static str,
    tool_version: &'static str,
    name: &'a str,
    source: Source<'a>,
    fluid: &'a str,
    temperature: Quantity,
    cards: Vec<CardView<'a>>,
    equivalent_resistance: Option<Equivalent<'a>>,
    mass_balance: Balance<'a>,
    nodes: Vec<NodeView<'a>>,
    channels: Vec<ChannelView<'a>>,
    uncertainty: Option<UncertaintyView>,
    notes: Vec<String>,
    warnings: Vec<WarningView>,
    absent_because: BTreeMap<&'static str, &'static str>,
}

impl<'a> Root<'a> {
    fn new(document: &NetworkDocument<'a>) -> Self {
        let (net, solution) = (document.network, document.solution);
        let mut absent_because = BTreeMap::new();
        if solution.equivalent.is_none() {
            absent_because.insert(
                "equivalent_resistance",
                "there are not exactly two nodes of given pressure that are joined",
            );
        }
        if document.uncertainty.is_none() {
            absent_because.insert(
                "uncertainty",
                "no card and no channel states an uncertainty",
            );
        }
        let uncertainties = document.uncertainties();
        let balance = solution.balance;
        let channels = 0..net.channels.len();
        let nodes = 0..net.nodes.len();
        Self {
            schema: NETWORK_SCHEMA,
            tool_version: env!("CARGO_PKG_VERSION"),
            name: &net.name,
            source: Source::new(document.source),
            fluid: &net.fluid,
            temperature: Quantity::optional(
                solution.temperature,
                "K",
                "neither the net nor its cards state a temperature",
            ),
            cards: CardView::all(document),
            equivalent_resistance: Equivalent::new(document),
            mass_balance: Balance {
                largest_imbalance: Quantity::real(balance.largest, "m^3/s"),
                relative: Quantity::real(balance.relative, "1"),
                node: &net.nodes[balance.node].name,
                sum_of_inflows: Quantity::real(balance.whole, "m^3/s"),
                is_kept: balance.is_kept(),
            },
            nodes: nodes
                .map(|index| NodeView::new(document, index, uncertainties.nodes[index]))
                .collect(),
            channels: channels
                .map(|index| ChannelView::new(document, index, uncertainties.flows[index]))
                .collect(),
            uncertainty: document
                .uncertainty
                .map(|found| UncertaintyView::new(document, found)),
            notes: document.notes(),
            warnings: WarningView::all(document.all_warnings()),
            absent_because,
        }
    }
}

/// A quantity with the standard uncertainty that was found for it.
fn uncertain(quantity: Quantity, found: Option<&OutputUncertainty>) -> Quantity {
    quantity.with_u(found.map(|one| one.u))
}

#[derive(Serialize)]
struct CardView<'a> {
    name: &'a str,
    card: &'a str,
    kind: &'static str,
    path: &'a str,
    sha256: &'a str,
    temperature_factor: Quantity,
    common_uncertainty: Quantity,
    warnings: &'a [String],
}

impl<'a> CardView<'a> {
    fn all(document: &NetworkDocument<'a>) -> Vec<Self> {
        let cards = document.network.cards.iter().zip(document.cards);
        cards
            .zip(&document.solution.temperature_factors)
            .map(|((card, record), factor)| CardView {
                name: &card.name,
                card: record.card_name,
                kind: match card.extent {
                    CardExtent::PerLength => "section",
                    CardExtent::Whole => "route",
                },
                path: record.path,
                sha256: record.sha256,
                temperature_factor: Quantity::real(*factor, "1"),
                common_uncertainty: Quantity::real(card.common(), "1"),
                warnings: record.warnings,
            })
            .collect()
    }
}

#[derive(Serialize)]
struct Equivalent<'a> {
    between: [&'a str; 2],
    resistance: Quantity,
    #[serde(skip_serializing_if = "Option::is_none")]
    bracket_absent_because: Option<&'static str>,
}

impl<'a> Equivalent<'a> {
    fn new(document: &NetworkDocument<'a>) -> Option<Self> {
        let found = document.solution.equivalent?;
        let nodes = &document.network.nodes;
        let quantity = Quantity::real(found.resistance, "Pa s/m^3").between(found.proven);
        let none = "a card has no proven range";
        Some(Self {
            between: found.between.map(|node| nodes[node].name.as_str()),
            resistance: uncertain(quantity, document.of(NetOutput::Resistance)),
            bracket_absent_because: found.proven.is_none().then_some(none),
        })
    }
}

#[derive(Serialize)]
struct Balance<'a> {
    largest_imbalance: Quantity,
    relative: Quantity,
    node: &'a str,
    sum_of_inflows: Quantity,
    is_kept: bool,
}

#[derive(Serialize)]
struct NodeView<'a> {
    name: &'a str,
    given: &'static str,
    pressure: Quantity,
    inflow: Quantity,
    imbalance: Quantity,
}

impl<'a> NodeView<'a> {
    fn new(
        document: &NetworkDocument<'a>,
        index: usize,
        found: Option<&OutputUncertainty>,
    ) -> Self {
        let node = &document.network.nodes[index];
        let state = &document.solution.nodes[index];
        let (of_pressure, of_inflow) = match node.condition {
            NodeCondition::Pressure(_) => (None, found),
            NodeCondition::Inflow(_) => (found, None),
        };
        Self {
            name: &node.name,
            given: condition_word(node.condition),
            pressure: uncertain(Quantity::real(state.pressure, "Pa"), of_pressure),
            inflow: uncertain(Quantity::real(state.inflow, "m^3/s"), of_inflow),
            imbalance: Quantity::real(state.imbalance, "m^3/s"),
        }
    }
}

#[derive(Serialize)]
struct ChannelView<'a> {
    name: &'a str,
    from: &'a str,
    to: &'a str,
    card: &'a str,
    parallel: Quantity,
    length: Quantity,
    flow: Quantity,
    direction: &'static str,
    pressure_drop: Quantity,
    resistance: Quantity,
    mean_velocity: Quantity,
    reynolds_dh: Quantity,
    entrance_length: Quantity,
    wall_shear_mean: Quantity,
    wall_shear_max: Quantity,
    volume: Quantity,
    residence_time: Quantity,
    inertance: Quantity,
    time_constant: Quantity,
    beyond_limits: Vec<&'static str>,
}

impl<'a> ChannelView<'a> {
    fn new(
        document: &NetworkDocument<'a>,
        index: usize,
        found: Option<&OutputUncertainty>,
    ) -> Self {
        let net = document.network;
        let channel = &net.channels[index];
        let card = &net.cards[channel.card];
        let state = &document.solution.channels[index];
        let no_length = "the card of the route has no length";
        let no_density = "the card has no density, or no length";
        let no_shear = "the card has no wall shear";
        let no_inertance = "the card has no inertance";
        Self {
            name: &channel.name,
            from: &net.nodes[channel.from].name,
            to: &net.nodes[channel.to].name,
            card: &card.name,
            parallel: Quantity::count(channel.parallel as usize),
            length: Quantity::optional(channel.length.or(card.length), "m", no_length),
            flow: uncertain(Quantity::real(state.flow, "m^3/s"), found),
            direction: direction_word(state.flow),
            pressure_drop: Quantity::real(state.pressure_drop, "Pa"),
            resistance: Quantity::real(state.resistance, "Pa s/m^3").between(state.proven),
            mean_velocity: Quantity::optional(state.mean_velocity, "m/s", no_length),
            reynolds_dh: Quantity::optional(state.reynolds, "1", no_density),
            entrance_length: Quantity::optional(state.entrance_length, "m", no_density),
            wall_shear_mean: Quantity::optional(state.wall_shear_mean, "Pa", no_shear),
            wall_shear_max: Quantity::optional(state.wall_shear_max, "Pa", no_shear),
            volume: Quantity::real(state.volume, "m^3"),
            residence_time: Quantity::optional(state.residence_time, "s", "nothing flows"),
            inertance: Quantity::optional(state.inertance, "kg/m^4", no_inertance),
            time_constant: Quantity::optional(state.time_constant, "s", no_inertance),
            beyond_limits: state
                .beyond
                .iter()
                .map(|b: &BeyondLimit| b.word())
                .collect(),
        }
    }
}

#[derive(Serialize)]
struct UncertaintyView {
    method: &'static str,
    sampling: &'static str,
    outputs_covered: Quantity,
    outputs_in_all: Quantity,
    samples: Quantity,
    seed: String,
    sampling_error: Quantity,
    largest_difference: Quantity,
    outputs: Vec<OutputView>,
}

impl UncertaintyView {
    fn new(document: &NetworkDocument<'_>, found: &NetworkUncertainty) -> Self {
        let no_samples = "there are no samples";
        Self {
            method: "first order in lnR: cards independent of each other, all channels of one card together, spreads \
                     independent",
            sampling: "log-normal resistances with the median at the value of the card; SplitMix64 and Box-Muller",
            outputs_covered: Quantity::count(found.outputs.len()),
            outputs_in_all: Quantity::count(found.all_outputs),
            samples: Quantity::count(found.samples),
            // All 64 bits: a JSON number may lose some.
            seed: found.seed.to_string(),
            sampling_error: Quantity::optional(found.sampling_error(), "1", no_samples),
            largest_difference: Quantity::optional(found.largest_difference(), "1", no_samples),
            outputs: found
                .outputs
                .iter()
                .map(|one| OutputView::new(document, one))
                .collect(),
        }
    }
}

#[derive(Serialize)]
struct OutputView {
    kind: &'static str,
    name: String,
    result: Quantity,
    common_share: Quantity,
    sampled: Option<SampledView>,
    #[serde(skip_serializing_if = "Option::is_none")]
    absent_because: Option<&'static str>,
}

#[derive(Serialize)]
struct SampledView {
    mean: Quantity,
    u: Quantity,
    low_95: Quantity,
    high_95: Quantity,
    difference: Quantity,
}

impl OutputView {
    fn new(document: &NetworkDocument<'_>, one: &OutputUncertainty) -> Self {
        let unit = match one.output {
            NetOutput::Resistance => "Pa s/m^3",
            NetOutput::Inflow(_) | NetOutput::Flow(_) => "m^3/s",
            NetOutput::Pressure(_) => "Pa",
        };
        let (kind, name) = document.output_name(one.output);
        Self {
            kind,
            name,
            result: uncertain(Quantity::real(one.value, unit), Some(one)),
            common_share: Quantity::real(one.common_share, "1"),
            sampled: one.sampled.map(|sampled| SampledView {
                mean: Quantity::real(sampled.mean, unit),
                u: Quantity::real(sampled.u, unit),
                low_95: Quantity::real(sampled.low, unit),
                high_95: Quantity::real(sampled.high, unit),
                difference: Quantity::optional(
                    one.difference(),
                    "1",
                    "the uncertainty to first order is zero",
                ),
            }),
            absent_because: one.sampled.is_none().then_some("there are no samples"),
        }
    }
}
