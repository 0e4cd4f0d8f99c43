//! The card of a route: the few numbers that a network model needs, in the form of `etchwise-card/1`.

use std::collections::BTreeMap;

use serde::Serialize;

use super::card_json::{CARD_SCHEMA, Law};
use super::json::{FluidView, Source, WarningView};
use super::json_values::{Quantity, pretty};
use super::route_document::RouteDocument;
use crate::flow::{Fluid, NOT_LAMINAR};

/// Why a route has no card.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum RouteCardError {
    /// A resistance needs a fluid.
    #[error("a card needs a fluid")]
    NoFluid,
    /// The serialiser refused, for which there is no cause in the data.
    #[error("the card cannot be written: {0}")]
    Json(#[from] serde_json::Error),
}

/// The route as a card, pretty-printed JSON with a closing line feed.
///
/// `R = mu * integral of dx/K`, inertance `rho * integral of beta dx/A` with the flow split as the resistances
/// split it.
///
/// # Errors
/// [`RouteCardError`] without a fluid.
pub fn route_card_json(document: &RouteDocument<'_>) -> Result<String, RouteCardError> {
    let fluid = document.fluid.ok_or(RouteCardError::NoFluid)?;
    let root = Root {
        schema: CARD_SCHEMA,
        tool_version: env!("CARGO_PKG_VERSION"),
        cards: [RouteCard::new(document, fluid)],
    };
    Ok(pretty(&root)?)
}

#[derive(Serialize)]
struct Root<'a> {
    schema: &'static str,
    tool_version: &'static str,
    cards: [RouteCard<'a>; 1],
}

#[derive(Serialize)]
struct RouteCard<'a> {
    name: &'a str,
    kind: &'static str,
    source: Option<Source<'a>>,
    settings: BTreeMap<&'static str, &'a str>,
    fluid: FluidView<'a>,
    length: Quantity,
    resistance: Quantity,
    inertance: Quantity,
    volume: Quantity,
    wall_area: Quantity,
    temperature_law: Option<Law>,
    incremental_pressure_drop: Quantity,
    wall_shear_per_flow_rate: Shear,
    log_resistance_sensitivity: Sensitivity,
    validity: Validity,
    warnings: Vec<WarningView>,
    absent_because: BTreeMap<&'static str, &'static str>,
}

#[derive(Serialize)]
struct Shear {
    mean: Quantity,
    max: Quantity,
    percentiles: Vec<Quantity>,
    percentiles_absent_because: &'static str,
}

#[derive(Serialize)]
struct Sensitivity {
    depth: Quantity,
    width: Quantity,
    film: Quantity,
    scale: Quantity,
}

#[derive(Serialize)]
struct Validity {
    reynolds_high: Quantity,
    flow_rate_high: Quantity,
    entrance: &'static str,
    temperature_low: Quantity,
    temperature_high: Quantity,
    soft_walls: &'static str,
}

const NO_TEMPERATURE: &str = "the viscosity of the fluid is known at one temperature only";

impl<'a> RouteCard<'a> {
    fn new(document: &'a RouteDocument<'a>, fluid: &'a Fluid) -> Self {
        let route = document.route;
        let resistance = document
            .resistance()
            .map_or_else(
                || Quantity::optional(None, "Pa s/m^3", "no fluid was given"),
                |r| Quantity::estimate(r, "Pa s/m^3"),
            )
            .between(document.resistance_bounds());
        let value = fluid.viscosity * route.integral.value;
        let spread = document.spread.map(|s| s.linear * value);
        let mut absent_because = BTreeMap::new();
        if document.temperature_law.is_none() {
            absent_because.insert("temperature_law", NO_TEMPERATURE);
        }
        if document.source.is_none() {
            absent_because.insert("source", "the route was built in code");
        }
        if route.bounds.is_err() {
            absent_because.insert(
                "resistance.low",
                "not every section lies inside its neighbour or around it; the route says where",
            );
        }
        let of_density = |value: f64, unit| {
            let value = fluid.density.map(|rho| rho * value);
            Quantity::optional(value, unit, "the density of the fluid is not known")
        };
        Self {
            name: document.name,
            kind: "route",
            source: document.source.map(Source::new),
            settings: document
                .settings
                .iter()
                .map(|(k, v)| (*k, v.as_str()))
                .collect(),
            fluid: FluidView::new(fluid),
            length: Quantity::real(route.length(), "m"),
            resistance: resistance.with_u(spread),
            inertance: of_density(route.inertance(), "kg/m^4"),
            volume: Quantity::real(route.volume(), "m^3"),
            wall_area: Quantity::real(route.wall_area(), "m^2"),
            temperature_law: document.temperature_law.map(Law::new),
            incremental_pressure_drop: Quantity::optional(
                None,
                "1",
                "the sections differ along the route; `etchwise route` with a flow rate gives the pressure in Pa",
            ),
            wall_shear_per_flow_rate: shear(document, fluid),
            log_resistance_sensitivity: Sensitivity::of_route(),
            validity: validity(document, fluid),
            warnings: WarningView::all(document.all_warnings()),
            absent_because,
        }
    }
}

impl Sensitivity {
    /// Only the scale of all sections is known without more solves: `R` goes with its power -4 at a fixed length.
    fn of_route() -> Self {
        let absent = |unit| {
            let why =
                "it differs from section to section; `etchwise sensitivity` gives it for each";
            Quantity::optional(None, unit, why)
        };
        Self {
            depth: absent("1"),
            width: absent("1"),
            film: absent("1/m"),
            scale: Quantity::real(-4.0, "1"),
        }
    }
}

/// Shear over the flow rate through the route, `mu q / K` times that per gradient: largest, and mean over the wall.
fn shear(document: &RouteDocument<'_>, fluid: &Fluid) -> Shear {
    let route = document.route;
    let mut max: f64 = 0.0;
    let mut force = 0.0;
    for branch in route.branches() {
        for point in &branch.points {
            let flow = &route.flows[point.flow].flow;
            let per_rate = fluid.viscosity * branch.share / flow.conductance.value;
            max = max.max(per_rate * flow.wall_shear.max_per_gradient);
        }
        // The wall carries A dp between two sections; the mean of their areas stands for A.
        for pair in branch.points.windows(2) {
            let [a, b] = [pair[0], pair[1]].map(|p| route.flows[p.flow].flow.geometry.area);
            let drop = fluid.viscosity * branch.share * (pair[1].integral - pair[0].integral);
            force += branch.count as f64 * drop * 0.5 * (a + b);
        }
    }
    Shear {
        mean: Quantity::real(force / route.wall_area(), "Pa s/m^3"),
        max: Quantity::real(max, "Pa s/m^3"),
        percentiles: Vec::new(),
        percentiles_absent_because: "they are worked out for single sections",
    }
}

fn validity(document: &RouteDocument<'_>, fluid: &Fluid) -> Validity {
    let route = document.route;
    // Re = rho Q q Dh / (mu A), largest of all points, per flow rate.
    let per_rate = route
        .branches()
        .flat_map(|b| b.points.iter().map(move |p| (b.share, p.flow)))
        .map(|(share, index)| {
            let g = &route.flows[index].flow.geometry;
            share * g.hydraulic_diameter / (fluid.viscosity * g.area)
        })
        .fold(0.0, f64::max);
    let law = document.temperature_law;
    let highest = fluid.density.map(|rho| NOT_LAMINAR / (rho * per_rate));
    Validity {
        reynolds_high: Quantity::real(NOT_LAMINAR, "1"),
        flow_rate_high: Quantity::optional(
            highest,
            "m^3/s",
            "the density of the fluid is not known",
        ),
        entrance: "fully developed flow; entrances, steps, bends and junctions are not in the resistance",
        temperature_low: Quantity::optional(law.map(|l| l.low), "K", NO_TEMPERATURE),
        temperature_high: Quantity::optional(law.map(|l| l.high), "K", NO_TEMPERATURE),
        soft_walls: "rigid walls; soft materials widen under pressure",
    }
}
