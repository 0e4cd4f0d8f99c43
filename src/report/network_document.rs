//! The one document behind every output of `network`.

use super::document::{SourceRecord, pressure_caution};
use super::numbers::{one_line, per_cent};
use crate::study::{
    NetOutput, Network, NetworkSolution, NetworkUncertainty, NodeCondition, OutputUncertainty,
};
use crate::warning::{Code, Warning};

/// Where a card of the net came from.
#[derive(Debug, Clone, Copy)]
pub struct NetworkCardRecord<'a> {
    /// Path of its file.
    pub path: &'a str,
    /// Hash of its file.
    pub sha256: &'a str,
    /// Name of the card in its file.
    pub card_name: &'a str,
    /// Codes of the warnings that it carries, without mere cautions.
    pub warnings: &'a [String],
}

/// Everything an output of `network` may show.
#[derive(Debug, Clone, Copy)]
pub struct NetworkDocument<'a> {
    /// The net.
    pub network: &'a Network,
    /// Its solution.
    pub solution: &'a NetworkSolution,
    /// Uncertainty of the results; `None` where nothing states any.
    pub uncertainty: Option<&'a NetworkUncertainty>,
    /// The file of the net.
    pub source: SourceRecord<'a>,
    /// Where its cards came from, in their order.
    pub cards: &'a [NetworkCardRecord<'a>],
}

/// Word for what is given at a node.
pub(super) fn condition_word(condition: NodeCondition) -> &'static str {
    match condition {
        NodeCondition::Pressure(_) => "pressure",
        NodeCondition::Inflow(0.0) => "none",
        NodeCondition::Inflow(_) => "inflow",
    }
}

/// Whether a card's law is in force: the factor of one at its own temperature is exactly 1.
pub(super) fn is_moved(factor: f64) -> bool {
    factor.total_cmp(&1.0).is_ne()
}

/// Word for the direction of a flow.
pub(super) fn direction_word(flow: f64) -> &'static str {
    if flow > 0.0 {
        "forward"
    } else if flow < 0.0 {
        "backward"
    } else {
        "none"
    }
}

impl<'a> NetworkDocument<'a> {
    /// All warnings: of the solved net, of its cards, and the cautions.
    pub fn all_warnings(&self) -> Vec<Warning> {
        let mut all = self.solution.warnings(self.network);
        for (card, record) in self.network.cards.iter().zip(self.cards) {
            if !record.warnings.is_empty() {
                all.push(Warning {
                    code: Code::Caution,
                    message: format!(
                        "Card `{}` carries warnings of its own: {}.",
                        card.name,
                        record.warnings.join(", ")
                    ),
                    advice: format!("Read them in {}.", one_line(record.path)),
                    numbers: Vec::new(),
                });
            }
        }
        all.push(pressure_caution());
        all
    }

    /// What a reader should know about the numbers.
    pub fn notes(&self) -> Vec<String> {
        let mut notes = Vec::new();
        let cards = self.network.cards.iter();
        let factors = self.solution.temperature_factors.iter();
        let laws = cards
            .zip(factors)
            .filter(|(_, factor)| is_moved(**factor))
            .filter_map(|(card, _)| Some(card.law.as_ref()?.largest_relative_error));
        if let Some(error) = laws.reduce(f64::max) {
            notes.push(format!(
                "Resistances are brought to the temperature of the net by the law of each card, largest error {}, \
                 which is in no range and no uncertainty here; densities and inertances are those at the card's own \
                 temperature.",
                per_cent(error)
            ));
        }
        let silent: Vec<String> = self
            .network
            .cards
            .iter()
            .filter(|card| card.own_uncertainty.is_none())
            .map(|card| format!("`{}`", card.name))
            .collect();
        if let Some(first) = silent.first() {
            let more = match silent.len() {
                1 => String::new(),
                count => format!(" and {} more", count - 1),
            };
            notes.push(format!(
                "Card {first}{more} states no standard uncertainty of its resistance: only `common` and `spread` of \
                 the net count there."
            ));
        }
        if self.network.channels.iter().any(|c| c.parallel > 1) {
            notes.push(
                "`spread` is that of a single channel; N channels side by side have it over the square root of N."
                    .to_owned(),
            );
        }
        if let Some(found) = self.uncertainty {
            notes.extend(coverage_notes(found));
        }
        notes
    }

    /// Uncertainty of a result, where it is covered.
    pub(super) fn of(&self, output: NetOutput) -> Option<&'a OutputUncertainty> {
        let outputs = &self.uncertainty?.outputs;
        outputs.iter().find(|one| one.output == output)
    }

    /// Places of channels and nodes in the list of uncertainties.
    pub(super) fn uncertainties(&self) -> Uncertainties<'a> {
        let mut found = Uncertainties {
            flows: vec![None; self.network.channels.len()],
            nodes: vec![None; self.network.nodes.len()],
        };
        for one in self.uncertainty.iter().flat_map(|u| &u.outputs) {
            match one.output {
                NetOutput::Flow(channel) => found.flows[channel] = Some(one),
                NetOutput::Inflow(node) | NetOutput::Pressure(node) => {
                    found.nodes[node] = Some(one);
                }
                NetOutput::Resistance => {}
            }
        }
        found
    }

    /// Kind and name of a result.
    pub(super) fn output_name(&self, output: NetOutput) -> (&'static str, String) {
        let node = |node: usize| self.network.nodes[node].name.clone();
        match output {
            NetOutput::Resistance => ("resistance", String::new()),
            NetOutput::Inflow(index) => ("inflow", node(index)),
            NetOutput::Pressure(index) => ("pressure", node(index)),
            NetOutput::Flow(channel) => ("flow", self.network.channels[channel].name.clone()),
        }
    }
}

/// Uncertainties by the place of channel and node.
pub(super) struct Uncertainties<'a> {
    /// Of flows.
    pub(super) flows: Vec<Option<&'a OutputUncertainty>>,
    /// Of pressures, or of inflows at given pressures.
    pub(super) nodes: Vec<Option<&'a OutputUncertainty>>,
}

fn coverage_notes(found: &NetworkUncertainty) -> Vec<String> {
    let mut notes = Vec::new();
    if found.outputs.len() < found.all_outputs {
        notes.push(format!(
            "The net is large: uncertainty is given for {} of {} results, those at given pressures first.",
            found.outputs.len(),
            found.all_outputs
        ));
    }
    if found.samples < found.samples_wanted {
        notes.push(format!(
            "{} samples instead of {}: the net is large, or some left the range of numbers; --samples N takes N.",
            found.samples, found.samples_wanted
        ));
    }
    notes
}
