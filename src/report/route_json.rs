//! The JSON view of a route: SI, no number without its unit, no NaN, absence with a reason.
//!
//! `schemas/route.schema.json` describes it (JSON Schema, draft 2020-12).

use std::collections::BTreeMap;

use serde::Serialize;

use super::json::{Source, WarningView};
use super::json_values::{Number, Quantity, pretty};
use super::route_document::RouteDocument;
use crate::measured::Estimate;
use crate::study::{
    BranchOperation, LawOfK, RouteBranch, RouteOperation, RouteSegment, SegmentSpread,
};

/// Name and version of this contract.
pub const ROUTE_SCHEMA: &str = "etchwise-route/1";
/// Its JSON Schema.
pub const ROUTE_JSON_SCHEMA: &str = include_str!("schemas/route.schema.json");

const NO_FLUID: &str = "no fluid was given";
const NO_FLOW: &str = "no flow rate and no pressure drop was given";
const NO_DENSITY: &str = "the density of the fluid is not known";
const NO_SPREAD: &str = "no spread was given";

/// The document as pretty-printed JSON with a closing line feed.
///
/// # Errors
/// The error of the serialiser; it has no cause in the data, since keys are text and numbers finite.
pub fn route_json(document: &RouteDocument<'_>) -> Result<String, serde_json::Error> {
    pretty(&Root::new(document))
}

#[derive(Serialize)]
struct Root<'a> {
    schema: &'static str,
    tool_version: &'static str,
    name: &'a str,
    source: Option<Source<'a>>,
    settings: BTreeMap<&'static str, &'a str>,
    sections: Vec<SectionView<'a>>,
    fluid: Option<FluidView<'a>>,
    integral: Quantity,
    resistance: Quantity,
    bounds_absent_because: Option<&'a str>,
    bounds_assume: &'static str,
    length: Quantity,
    volume: Quantity,
    wall_area: Quantity,
    inertance_per_density: Quantity,
    interpolation_effect: Vec<EffectView>,
    spread: Option<SpreadView>,
    operating_points: Vec<OperationView>,
    segments: Vec<SegmentView<'a>>,
    warnings: Vec<WarningView>,
    absent_because: BTreeMap<&'static str, &'static str>,
}

impl<'a> Root<'a> {
    fn new(document: &'a RouteDocument<'a>) -> Self {
        let route = document.route;
        let mut absent_because = BTreeMap::new();
        let mut absent = |is: bool, key, why| {
            if is {
                absent_because.insert(key, why);
            }
        };
        absent(
            document.source.is_none(),
            "source",
            "the route was built in code",
        );
        absent(document.fluid.is_none(), "fluid", NO_FLUID);
        absent(document.spread.is_none(), "spread", NO_SPREAD);
        absent(document.operations.is_empty(), "operating_points", NO_FLOW);
        let bounds = route.bounds.as_ref().ok().copied();
        let resistance = document.resistance().map_or_else(
            || Quantity::optional(None, "Pa s/m^3", NO_FLUID),
            |r| Quantity::estimate(r, "Pa s/m^3").between(document.resistance_bounds()),
        );
        Self {
            schema: ROUTE_SCHEMA,
            tool_version: env!("CARGO_PKG_VERSION"),
            name: document.name,
            source: document.source.map(Source::new),
            settings: document
                .settings
                .iter()
                .map(|(k, v)| (*k, v.as_str()))
                .collect(),
            sections: SectionView::all(document),
            fluid: document.fluid.map(FluidView::new),
            integral: Quantity::estimate(route.integral, "1/m^3").between(bounds),
            resistance,
            bounds_absent_because: route.bounds.as_ref().err().map(String::as_str),
            bounds_assume: "the wall moves one way only from each section to the next, up to shifts of whole sections",
            length: Quantity::real(route.length(), "m"),
            volume: Quantity::real(route.volume(), "m^3"),
            wall_area: Quantity::real(route.wall_area(), "m^2"),
            inertance_per_density: Quantity::real(route.inertance(), "1/m"),
            interpolation_effect: LawOfK::ALL
                .into_iter()
                .map(|law| EffectView {
                    interpolation: law.word(),
                    relative_change_of_resistance: Quantity::real(
                        route.integral_by(law) / route.integral.value - 1.0,
                        "1",
                    ),
                })
                .collect(),
            spread: document.spread.map(|spread| SpreadView {
                resistance: Quantity::real(spread.linear, "1"),
                resistance_by_draws: Quantity::real(spread.drawn, "1"),
                draws: Quantity::count(spread.draws),
            }),
            operating_points: document
                .operations
                .iter()
                .map(|o| OperationView::new(document, o))
                .collect(),
            segments: (0..route.segments.len())
                .filter_map(|index| SegmentView::new(document, index))
                .collect(),
            warnings: WarningView::all(document.all_warnings()),
            absent_because,
        }
    }
}

#[derive(Serialize)]
struct SectionView<'a> {
    label: &'a str,
    sha256: Option<&'a str>,
    conductance: Quantity,
    area: Quantity,
    wetted_perimeter: Quantity,
}

impl<'a> SectionView<'a> {
    fn all(document: &'a RouteDocument<'a>) -> Vec<Self> {
        let sections = document.design.sections.iter().zip(&document.route.flows);
        sections
            .enumerate()
            .map(|(index, (section, solved))| {
                let flow = &solved.flow;
                let record = document.sections.get(index);
                let proven = flow.bracket.as_ref().ok().map(|b| (b.low, b.high));
                Self {
                    label: &section.label,
                    sha256: record.and_then(|r| r.sha256.as_deref()),
                    conductance: Quantity::estimate(flow.conductance, "m^4").between(proven),
                    area: Quantity::real(flow.geometry.area, "m^2"),
                    wetted_perimeter: Quantity::real(flow.geometry.wetted_perimeter, "m"),
                }
            })
            .collect()
    }
}

#[derive(Serialize)]
struct FluidView<'a> {
    name: &'a str,
    source: &'a str,
    temperature: Quantity,
    viscosity: Quantity,
    density: Quantity,
}

impl<'a> FluidView<'a> {
    fn new(fluid: &'a crate::flow::Fluid) -> Self {
        Self {
            name: &fluid.name,
            source: &fluid.source,
            temperature: Quantity::optional(fluid.temperature, "K", "it was not given"),
            viscosity: Quantity::real(fluid.viscosity, "Pa s"),
            density: Quantity::optional(fluid.density, "kg/m^3", NO_DENSITY),
        }
    }
}

#[derive(Serialize)]
struct EffectView {
    interpolation: &'static str,
    relative_change_of_resistance: Quantity,
}

#[derive(Serialize)]
struct SpreadView {
    resistance: Quantity,
    resistance_by_draws: Quantity,
    draws: Quantity,
}

#[derive(Serialize)]
struct OperationView {
    flow_rate: Quantity,
    pressure_drop: Quantity,
    residence_time: Quantity,
    wall_shear_max: Quantity,
    wall_shear_max_at: Option<PlaceView>,
    reynolds_dh_max: Quantity,
    entrance_share_max: Quantity,
    entrance_pressure: Quantity,
}

#[derive(Serialize)]
struct PlaceView {
    segment: String,
    branch: String,
    station: Option<usize>,
    position: Quantity,
}

impl OperationView {
    fn new(document: &RouteDocument<'_>, operation: &RouteOperation) -> Self {
        let route = document.route;
        let place = operation.shear_at;
        let bounds = route.bounds.as_ref().ok().map(|(low, high)| {
            let per = operation.pressure_drop / route.integral.value;
            (low * per, high * per)
        });
        let pressure = Quantity::real(operation.pressure_drop, "Pa");
        let rate = Quantity::real(operation.flow_rate, "m^3/s");
        let (flow_rate, pressure_drop) = match operation.drive {
            crate::flow::Drive::FlowRate(_) => (rate, pressure.between(bounds)),
            crate::flow::Drive::PressureDrop(drop) => {
                let inverse = |b: f64| operation.flow_rate * drop / b;
                let bounds = bounds.map(|(low, high)| (inverse(high), inverse(low)));
                (rate.between(bounds), pressure)
            }
        };
        let at = document.branch(place).map(|branch| PlaceView {
            segment: route.segments[place.segment].name.clone(),
            branch: branch.name.clone(),
            station: branch
                .points
                .get(place.point)
                .and_then(|p| Some(p.station? + 1)),
            position: Quantity::optional(document.position(place), "m", "no such place"),
        });
        Self {
            flow_rate,
            pressure_drop,
            residence_time: Quantity::real(operation.residence_time, "s"),
            wall_shear_max: Quantity::real(operation.shear_max, "Pa"),
            wall_shear_max_at: at,
            reynolds_dh_max: Quantity::optional(operation.reynolds_max, "1", NO_DENSITY),
            entrance_share_max: Quantity::optional(operation.entrance_share, "1", NO_DENSITY),
            entrance_pressure: Quantity::optional(operation.entrance_pressure, "Pa", NO_DENSITY),
        }
    }
}

#[derive(Serialize)]
struct SegmentView<'a> {
    name: &'a str,
    integral: Quantity,
    resistance: Quantity,
    bounds_absent_because: Option<&'a str>,
    spread: Quantity,
    pressure_begin: Quantity,
    pressure_end: Quantity,
    branches: Vec<BranchView<'a>>,
}

impl<'a> SegmentView<'a> {
    fn new(document: &'a RouteDocument<'a>, index: usize) -> Option<Self> {
        let segment: &RouteSegment = document.route.segments.get(index)?;
        let operation = document
            .operations
            .first()
            .and_then(|o| o.segments.get(index));
        let spread = document.spread.and_then(|s| s.segments.get(index));
        let bounds = segment.bounds.as_ref().ok().copied();
        let mu = document.fluid.map(|f| f.viscosity);
        let resistance = mu.map_or_else(
            || Quantity::optional(None, "Pa s/m^3", NO_FLUID),
            |mu| {
                Quantity::estimate(segment.integral.scaled(mu), "Pa s/m^3")
                    .between(bounds.map(|(low, high)| (mu * low, mu * high)))
            },
        );
        let pressure =
            |k: usize| Quantity::optional(operation.map(|o| o.pressures[k]), "Pa", NO_FLOW);
        Some(Self {
            name: &segment.name,
            integral: Quantity::estimate(segment.integral, "1/m^3").between(bounds),
            resistance,
            bounds_absent_because: segment.bounds.as_ref().err().map(String::as_str),
            spread: Quantity::optional(spread.map(|s| s.linear), "1", NO_SPREAD),
            pressure_begin: pressure(0),
            pressure_end: pressure(1),
            branches: segment
                .branches
                .iter()
                .enumerate()
                .map(|(b, branch)| {
                    let of_flow = operation.and_then(|o| o.branches.get(b));
                    BranchView::new(document, branch, of_flow, spread.map(|s| (s, b)))
                })
                .collect(),
        })
    }
}

#[derive(Serialize)]
struct BranchView<'a> {
    name: &'a str,
    count: Quantity,
    begin: Quantity,
    length: Quantity,
    integral: Quantity,
    bounds_absent_because: Option<&'a str>,
    volume: Quantity,
    wall_area: Quantity,
    flow_share: Quantity,
    flow_share_spread: Quantity,
    flow_share_spread_by_draws: Quantity,
    spread_of_conductance: Quantity,
    flow_rate: Quantity,
    residence_time: Quantity,
    entrance_share: Quantity,
    stretches: Vec<StretchView<'a>>,
    points: Vec<PointView<'a>>,
}

impl<'a> BranchView<'a> {
    fn new(
        document: &'a RouteDocument<'a>,
        branch: &'a RouteBranch,
        operation: Option<&BranchOperation>,
        spread: Option<(&SegmentSpread, usize)>,
    ) -> Self {
        let bounds = branch.bounds.as_ref().ok().copied();
        let share = spread.and_then(|(s, b)| s.shares.get(b));
        let of_flow = |value: Option<f64>, unit| Quantity::optional(value, unit, NO_FLOW);
        let entrance = operation.map(|o| o.entrance_share);
        Self {
            name: &branch.name,
            count: Quantity::count(branch.count),
            begin: Quantity::real(branch.begin, "m"),
            length: Quantity::real(branch.length, "m"),
            integral: Quantity::estimate(branch.integral, "1/m^3").between(bounds),
            bounds_absent_because: branch.bounds.as_ref().err().map(String::as_str),
            volume: Quantity::real(branch.volume, "m^3"),
            wall_area: Quantity::real(branch.wall_area, "m^2"),
            flow_share: Quantity::real(branch.share, "1"),
            flow_share_spread: Quantity::optional(share.map(|s| s.linear), "1", NO_SPREAD),
            flow_share_spread_by_draws: Quantity::optional(share.map(|s| s.drawn), "1", NO_SPREAD),
            spread_of_conductance: Quantity::optional(branch.spread, "1", NO_SPREAD),
            flow_rate: of_flow(operation.map(|o| o.flow_rate), "m^3/s"),
            residence_time: of_flow(operation.map(|o| o.residence_time), "s"),
            entrance_share: Quantity::optional(
                entrance.flatten(),
                "1",
                if entrance.is_none() {
                    NO_FLOW
                } else {
                    NO_DENSITY
                },
            ),
            stretches: branch
                .ways
                .iter()
                .map(|(way, length)| StretchView {
                    length: Quantity::real(*length, "m"),
                    interpolation: way.used.word(),
                    dimensions_absent_because: way.why.as_deref(),
                    integral: Quantity::estimate(scaled(way.mean_inverse, *length), "1/m^3")
                        .between(
                            way.bounds
                                .as_ref()
                                .ok()
                                .map(|(a, b)| (a * length, b * length)),
                        ),
                    bounds_absent_because: way.bounds.as_ref().err().map(String::as_str),
                    sections: Quantity::count(way.nodes.len()),
                })
                .collect(),
            points: PointView::all(document, branch, operation),
        }
    }
}

fn scaled(estimate: Estimate, length: f64) -> Estimate {
    estimate.scaled(length)
}

#[derive(Serialize)]
struct StretchView<'a> {
    length: Quantity,
    interpolation: &'static str,
    dimensions_absent_because: Option<&'a str>,
    integral: Quantity,
    bounds_absent_because: Option<&'a str>,
    sections: Quantity,
}

#[derive(Serialize)]
struct PointView<'a> {
    station: Option<usize>,
    section: &'a str,
    position: Quantity,
    conductance: Quantity,
    area: Quantity,
    integral_to_here: Quantity,
    pressure: Quantity,
    mean_velocity: Quantity,
    reynolds_dh: Quantity,
    wall_shear_mean: Quantity,
    wall_shear_max: Quantity,
    wall_shear_max_at: [Number; 2],
}

impl<'a> PointView<'a> {
    fn all(
        document: &'a RouteDocument<'a>,
        branch: &RouteBranch,
        operation: Option<&BranchOperation>,
    ) -> Vec<Self> {
        let points = branch.points.iter().enumerate();
        points
            .map(|(index, point)| {
                let flow = &document.route.flows[point.flow].flow;
                let at = operation.and_then(|o| o.points.get(index));
                let local = at.map(|at| at.local);
                let of_flow = |value: Option<f64>, unit| Quantity::optional(value, unit, NO_FLOW);
                Self {
                    station: point.station.map(|station| station + 1),
                    section: document.section_label(point.flow),
                    position: Quantity::real(branch.begin + point.position, "m"),
                    conductance: Quantity::estimate(flow.conductance, "m^4")
                        .between(flow.bracket.as_ref().ok().map(|b| (b.low, b.high))),
                    area: Quantity::real(flow.geometry.area, "m^2"),
                    integral_to_here: Quantity::real(point.integral, "1/m^3"),
                    pressure: of_flow(at.map(|at| at.pressure), "Pa"),
                    mean_velocity: of_flow(local.map(|l| l.mean_velocity), "m/s"),
                    reynolds_dh: Quantity::optional(
                        local.and_then(|l| l.reynolds_dh),
                        "1",
                        if local.is_some() { NO_DENSITY } else { NO_FLOW },
                    ),
                    wall_shear_mean: of_flow(local.map(|l| l.wall_shear_mean), "Pa"),
                    wall_shear_max: of_flow(local.map(|l| l.wall_shear_max), "Pa"),
                    wall_shear_max_at: super::json_values::place(flow.wall_shear.max_at),
                }
            })
            .collect()
    }
}
