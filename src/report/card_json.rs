//! The JSON view of cards: SI, no number without its unit, no NaN, absence with a reason.
//!
//! The form is described by the JSON Schema [`CARD_JSON_SCHEMA`]. It grows by addition: readers ignore keys
//! they do not know, and the number in `schema` changes only when a key changes its meaning or goes away.

use std::collections::BTreeMap;

use serde::Serialize;

use super::card_document::{CardDocument, CardRecord, FailedCard};
use super::json::{FluidView, Source, WarningView};
use super::json_values::{Bracketed, Quantity, maybe, pretty};
use crate::flow::{PERCENTILES, TemperatureLaw};
use crate::study::{CardLimits, CardSensitivity, SectionCard, Stated, UncertaintyPart};

/// Name and version of this contract.
pub const CARD_SCHEMA: &str = "etchwise-card/1";
/// JSON Schema (draft 2020-12) of this contract.
pub const CARD_JSON_SCHEMA: &str = include_str!("schemas/card.schema.json");

const NO_DENSITY: &str = "the density of the fluid is not known";
const NO_BRACKET: &str = "the conductance has no proven range; see there";

/// The document as pretty-printed JSON with a closing line feed.
///
/// # Errors
/// The error of the serialiser; it has no cause in the data, since keys are text and numbers finite.
pub fn card_json(document: &CardDocument<'_>) -> Result<String, serde_json::Error> {
    let settings = || {
        let pairs = document.settings.iter();
        pairs.map(|(k, v)| (k.as_str(), v.as_str())).collect()
    };
    pretty(&Root {
        schema: CARD_SCHEMA,
        tool_version: env!("CARGO_PKG_VERSION"),
        cards: document
            .cards
            .iter()
            .map(|record| Card::new(record, settings()))
            .collect(),
        failed: document.failed.iter().map(Failed::new).collect(),
    })
}

#[derive(Serialize)]
struct Root<'a> {
    schema: &'static str,
    tool_version: &'static str,
    cards: Vec<Card<'a>>,
    failed: Vec<Failed<'a>>,
}

#[derive(Serialize)]
struct Failed<'a> {
    path: &'a str,
    reason: &'a str,
}

impl<'a> Failed<'a> {
    fn new(failed: &FailedCard<'a>) -> Self {
        Self {
            path: failed.path,
            reason: failed.reason,
        }
    }
}

#[derive(Serialize)]
struct Card<'a> {
    name: &'a str,
    kind: &'static str,
    source: Option<Source<'a>>,
    settings: BTreeMap<&'a str, &'a str>,
    fluid: FluidView<'a>,
    conductance: Bracketed,
    resistance_per_length: Resistance,
    uncertainty: Option<UncertaintyView<'a>>,
    reach: Option<Reach<'a>>,
    temperature_law: Option<Law>,
    inertance_per_length: Quantity,
    volume_per_length: Quantity,
    wall_area_per_length: Quantity,
    mean_depth: Quantity,
    momentum_factor: Quantity,
    kinetic_energy_factor: Quantity,
    incremental_pressure_drop: Quantity,
    wall_shear_per_flow_rate: Shear,
    log_resistance_sensitivity: BTreeMap<&'static str, Sensitivity<'a>>,
    validity: Validity,
    warnings: Vec<WarningView>,
    absent_because: BTreeMap<&'static str, String>,
}

impl<'a> Card<'a> {
    fn new(record: &CardRecord<'a>, settings: BTreeMap<&'a str, &'a str>) -> Self {
        let (card, flow) = (record.card, record.flow);
        Self {
            name: record.name,
            kind: "section",
            source: record.source.map(Source::new),
            settings,
            fluid: FluidView::new(record.fluid),
            conductance: Quantity::bracketed(flow),
            resistance_per_length: Resistance::new(card),
            uncertainty: card.uncertainty.as_ref().map(|found| UncertaintyView {
                of_log_resistance: Quantity::real(found.of_log_resistance, "1"),
                method: "first order, inputs independent; only what was stated counts",
                parts: found.parts.iter().map(PartView::new).collect(),
            }),
            reach: Reach::new(record),
            temperature_law: card.temperature_law.as_ref().ok().map(Law::new),
            inertance_per_length: maybe(card.inertance_per_length, "kg/m^5", NO_DENSITY),
            volume_per_length: Quantity::real(flow.geometry.area, "m^2"),
            wall_area_per_length: Quantity::real(flow.geometry.wetted_perimeter, "m"),
            mean_depth: Quantity::real(card.mean_depth, "m"),
            momentum_factor: Quantity::estimate(flow.momentum_factor, "1"),
            kinetic_energy_factor: Quantity::estimate(flow.kinetic_energy_factor, "1"),
            incremental_pressure_drop: Quantity::estimate(card.incremental_pressure_drop, "1"),
            wall_shear_per_flow_rate: Shear::new(card),
            log_resistance_sensitivity: card
                .sensitivities
                .iter()
                .map(|one| (one.name, Sensitivity::new(one)))
                .collect(),
            validity: Validity::new(&card.limits, card.temperature_law.as_ref().ok()),
            warnings: WarningView::all(record.all_warnings()),
            absent_because: absent_parts(record),
        }
    }
}

/// Why whole parts are null.
fn absent_parts(record: &CardRecord<'_>) -> BTreeMap<&'static str, String> {
    let mut reasons = BTreeMap::new();
    let mut say = |part, reason: &str| {
        reasons.insert(part, reason.to_owned());
    };
    if record.source.is_none() {
        say(
            "source",
            "the section was built in code, not read from a file",
        );
    }
    if record.card.uncertainty.is_none() {
        say("uncertainty", "no uncertainty of a dimension was stated");
    }
    if record.reach.is_none() {
        say(
            "reach",
            "the section file gives no inner or outer section in [reach]",
        );
    }
    if let Err(error) = &record.card.temperature_law {
        say("temperature_law", &error.to_string());
    }
    reasons
}

/// Resistance per length with all that is known of its certainty.
#[derive(Serialize)]
struct Resistance {
    #[serde(flatten)]
    quantity: Quantity,
    #[serde(skip_serializing_if = "Option::is_none")]
    bracket_absent_because: Option<&'static str>,
}

impl Resistance {
    fn new(card: &SectionCard) -> Self {
        let r = card.resistance_per_length;
        let u = card.uncertainty.as_ref();
        Self {
            quantity: Quantity::estimate(r, "Pa s/m^4")
                .between(card.proven)
                .with_u(u.map(|u| u.of_log_resistance * r.value)),
            bracket_absent_because: card.proven.is_none().then_some(NO_BRACKET),
        }
    }
}

#[derive(Serialize)]
struct UncertaintyView<'a> {
    of_log_resistance: Quantity,
    method: &'static str,
    parts: Vec<PartView<'a>>,
}

#[derive(Serialize)]
struct PartView<'a> {
    input: &'a str,
    u: Quantity,
    of_log_resistance: Quantity,
}

impl<'a> PartView<'a> {
    fn new(part: &'a UncertaintyPart) -> Self {
        let u = match part.stated {
            Stated::Relative(share) => Quantity::real(share, "1"),
            Stated::Length(length) => Quantity::real(length, "m"),
            Stated::Angle(angle) => Quantity::real(angle, "rad"),
        };
        Self {
            input: &part.input,
            u,
            of_log_resistance: Quantity::real(part.of_log_resistance, "1"),
        }
    }
}

/// What the instrument could not see, carried to the resistance.
#[derive(Serialize)]
struct Reach<'a> {
    resistance_per_length: Quantity,
    #[serde(skip_serializing_if = "Option::is_none")]
    reason: Option<&'a str>,
}

impl<'a> Reach<'a> {
    fn new(record: &CardRecord<'a>) -> Option<Self> {
        let reach = record.reach?;
        let value = record.card.resistance_per_length.value;
        let quantity = match record.resistance_reach() {
            Some(bounds) => Quantity::real(value, "Pa s/m^4").between(Some(bounds)),
            None => Quantity::optional(
                None,
                "Pa s/m^4",
                "an inner or outer section has no proven range",
            ),
        };
        Some(Self {
            resistance_per_length: quantity,
            reason: reach.reason,
        })
    }
}

#[derive(Serialize)]
pub(super) struct Law {
    formula: String,
    reference_temperature: Quantity,
    temperature_low: Quantity,
    temperature_high: Quantity,
    coefficients: Vec<Quantity>,
    largest_relative_error: Quantity,
}

impl Law {
    pub(super) fn new(law: &TemperatureLaw) -> Self {
        Self {
            formula: law.formula(),
            reference_temperature: Quantity::real(law.reference, "K"),
            temperature_low: Quantity::real(law.low, "K"),
            temperature_high: Quantity::real(law.high, "K"),
            coefficients: law
                .coefficients
                .iter()
                .map(|&c| Quantity::real(c, "1"))
                .collect(),
            largest_relative_error: Quantity::real(law.largest_relative_error, "1"),
        }
    }
}

#[derive(Serialize)]
struct Shear {
    mean: Quantity,
    max: Quantity,
    percentiles: Vec<Percentile>,
    singular_corner_sides: Quantity,
}

#[derive(Serialize)]
struct Percentile {
    percent: f64,
    #[serde(flatten)]
    shear: Quantity,
}

impl Shear {
    fn new(card: &SectionCard) -> Self {
        let shear = card.wall_shear;
        let unit = "Pa s/m^3";
        Self {
            mean: Quantity::real(shear.mean, unit),
            max: Quantity::real(shear.max, unit),
            percentiles: PERCENTILES
                .into_iter()
                .zip(shear.percentiles)
                .map(|(percent, value)| Percentile {
                    percent,
                    shear: Quantity::real(value, unit),
                })
                .collect(),
            singular_corner_sides: Quantity::count(shear.singular_sides),
        }
    }
}

#[derive(Serialize)]
struct Sensitivity<'a> {
    #[serde(flatten)]
    value: Quantity,
    definition: &'a str,
}

impl<'a> Sensitivity<'a> {
    fn new(one: &'a CardSensitivity) -> Self {
        let value = match &one.value {
            Ok(estimate) => Quantity::estimate(*estimate, one.unit),
            Err(reason) => Quantity::optional(None, one.unit, reason),
        };
        Self {
            value,
            definition: &one.definition,
        }
    }
}

#[derive(Serialize)]
struct Validity {
    model: &'static str,
    reynolds_high: Quantity,
    hydraulic_diameter: Quantity,
    flow_rate_high: Quantity,
    entrance_share: Quantity,
    shortest_length_creeping: Quantity,
    shortest_length_at_flow_rate_high: Quantity,
    entrance_formula: &'static str,
    temperature_low: Quantity,
    temperature_high: Quantity,
    pressure_drop_high: Quantity,
    walls: &'static str,
}

impl Validity {
    fn new(limits: &CardLimits, law: Option<&TemperatureLaw>) -> Self {
        let no_law = "the fluid is known at its reference temperature only";
        Self {
            model: "fully developed, laminar, isothermal flow of a Newtonian fluid in a rigid section",
            reynolds_high: Quantity::real(limits.reynolds_high, "1"),
            hydraulic_diameter: Quantity::real(limits.hydraulic_diameter, "m"),
            flow_rate_high: Quantity::optional(limits.flow_rate_high, "m^3/s", NO_DENSITY),
            entrance_share: Quantity::real(limits.entrance_share, "1"),
            shortest_length_creeping: Quantity::real(limits.shortest_length_creeping, "m"),
            shortest_length_at_flow_rate_high: Quantity::real(
                limits.shortest_length_at_flow_rate_high,
                "m",
            ),
            entrance_formula: "L = Dh (0.619^1.6 + (0.0567 Re)^1.6)^(1/1.6) / entrance_share, Re on Dh; a square \
                               can need 1.6 times that",
            temperature_low: Quantity::optional(law.map(|l| l.low), "K", no_law),
            temperature_high: Quantity::optional(law.map(|l| l.high), "K", no_law),
            pressure_drop_high: Quantity::optional(
                limits.pressure_drop_high,
                "Pa",
                "no limit is known for this fluid",
            ),
            walls: "rigid; a section in a soft elastomer widens under pressure and its resistance falls",
        }
    }
}
