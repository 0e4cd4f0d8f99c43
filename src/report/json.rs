//! The JSON view: one object, SI units, no number without its unit, no NaN.
//!
//! Absence is `null` with a reason: inside a quantity as `absent_because`, for whole parts in the
//! object `absent_because` at the top. The order of keys is fixed and there is no time stamp; only
//! `solver.seconds` differs between two runs on the same input.

use std::collections::BTreeMap;

use serde::Serialize;

use super::document::{SolveDocument, SourceRecord};
use super::json_accuracy::AccuracyView;
use super::json_film::FilmView;
use super::json_reach::ReachView;
use super::json_values::{Bracketed, Number, Quantity, maybe, place, pretty};
use super::json_wall::Shear;
use super::reading_json::{AlternativeView, StepView};
use crate::flow::{Fluid, Identity, SectionFlow, ShortcutRow, SolverReport};
use crate::warning::Warning;

/// Name and version of this contract.
pub const SCHEMA: &str = "etchwise/1";

/// The document as pretty-printed JSON with a closing line feed.
///
/// # Errors
/// The error of the serialiser; it has no cause in the data, since keys are text and numbers finite.
pub fn to_json(document: &SolveDocument<'_>) -> Result<String, serde_json::Error> {
    pretty(&Root::new(document))
}

#[derive(Serialize)]
struct Root<'a> {
    schema: &'static str,
    tool_version: &'static str,
    name: &'a str,
    source: Option<Source<'a>>,
    section: Section,
    film: Option<FilmView>,
    conductance: Bracketed,
    conductance_finest_grid: Quantity,
    poiseuille: Poiseuille,
    peak_to_mean_velocity: Quantity,
    peak: Peak,
    momentum_factor: Quantity,
    kinetic_energy_factor: Quantity,
    wall_shear: Shear,
    grid: Grid,
    solver: Solver,
    bracket_relative_width: Quantity,
    accuracy: AccuracyView,
    reach: Option<ReachView<'a>>,
    identities: BTreeMap<&'static str, IdentityView>,
    fluid: Option<FluidView<'a>>,
    resistance_per_length: Quantity,
    length: Quantity,
    resistance: Quantity,
    operating_point: Option<PointView>,
    shortcuts: Option<Vec<ShortcutView<'a>>>,
    steps: Vec<StepView<'a>>,
    alternatives: Vec<AlternativeView<'a>>,
    warnings: Vec<WarningView>,
    absent_because: BTreeMap<&'static str, &'static str>,
}

impl<'a> Root<'a> {
    fn new(document: &SolveDocument<'a>) -> Self {
        let flow = document.flow;
        let no_fluid = "no fluid was given";
        let no_length = "no channel length was given";
        let resistance = document.resistance();
        let reason = if document.fluid.is_none() {
            no_fluid
        } else {
            no_length
        };
        // Bounds of what goes with 1/K.
        let inverse = |value: f64| {
            let proven = flow.bracket.as_ref().ok()?;
            let k = flow.conductance.value;
            Some((value * k / proven.high, value * k / proven.low))
        };
        Self {
            schema: SCHEMA,
            tool_version: env!("CARGO_PKG_VERSION"),
            name: document.section_name,
            source: document.source.map(Source::new),
            section: Section::new(flow),
            film: document.film.map(FilmView::new),
            conductance: Quantity::bracketed(flow),
            conductance_finest_grid: Quantity::real(flow.conductance_finest_grid, "m^4"),
            poiseuille: Poiseuille {
                fanning_dh: Quantity::real(flow.fanning_dh, "1").between(inverse(flow.fanning_dh)),
                darcy_dh: Quantity::real(flow.darcy_dh, "1").between(inverse(flow.darcy_dh)),
                fanning_sqrt_area: Quantity::real(flow.fanning_sqrt_area, "1")
                    .between(inverse(flow.fanning_sqrt_area)),
            },
            peak_to_mean_velocity: Quantity::estimate(flow.peak.to_mean, "1"),
            peak: Peak {
                phi: Quantity::real(flow.peak.phi, "m^2"),
                at: place(flow.peak.at),
            },
            momentum_factor: Quantity::estimate(flow.momentum_factor, "1"),
            kinetic_energy_factor: Quantity::estimate(flow.kinetic_energy_factor, "1"),
            wall_shear: Shear::new(document),
            grid: Grid::new(flow),
            solver: Solver::new(&flow.solver),
            accuracy: AccuracyView::new(flow),
            bracket_relative_width: match &flow.bracket {
                Ok(proven) => Quantity::real(proven.relative_width(), "1"),
                Err(error) => Quantity::optional(None, "1", &error.to_string()),
            },
            reach: document.reach.map(|r| ReachView::new(document, &r)),
            identities: flow
                .identities
                .iter()
                .map(|i| (i.name, IdentityView::new(i)))
                .collect(),
            fluid: document.fluid.map(FluidView::new),
            resistance_per_length: maybe(document.resistance_per_length(), "Pa s/m^4", no_fluid)
                .between(
                    document
                        .resistance_per_length()
                        .and_then(|r| inverse(r.value)),
                ),
            length: Quantity::optional(document.length, "m", no_length),
            resistance: maybe(resistance, "Pa s/m^3", reason)
                .between(resistance.and_then(|r| inverse(r.value))),
            operating_point: PointView::new(document),
            shortcuts: document
                .shortcuts
                .map(|rows| rows.iter().map(ShortcutView::new).collect()),
            steps: document.steps.iter().map(StepView::new).collect(),
            alternatives: document
                .alternatives
                .iter()
                .map(AlternativeView::new)
                .collect(),
            warnings: WarningView::all(document.all_warnings()),
            absent_because: absent_parts(document),
        }
    }
}

/// Why whole parts are null.
fn absent_parts(document: &SolveDocument<'_>) -> BTreeMap<&'static str, &'static str> {
    let mut reasons = BTreeMap::new();
    if document.source.is_none() {
        reasons.insert(
            "source",
            "the section was built in code, not read from a file",
        );
    }
    if document.film.is_none() {
        reasons.insert("film", "no film was asked for");
    }
    if document.reach.is_none() {
        reasons.insert(
            "reach",
            "the section file gives no inner or outer section in [reach]",
        );
    }
    if document.fluid.is_none() {
        reasons.insert("fluid", "no fluid was given");
        reasons.insert("per_flow_rate", "no fluid was given");
    }
    if document.operating_point.is_none() {
        for part in ["operating_point", "at_operating_point"] {
            reasons.insert(part, "no pressure drop or flow rate was given");
        }
    }
    if document.shortcuts.is_none() {
        reasons.insert("shortcuts", "the shortcut formulas were not asked for");
    }
    reasons
}

#[derive(Serialize)]
pub(super) struct Source<'a> {
    path: &'a str,
    sha256: &'a str,
    kind: &'a str,
    notes: &'a [String],
}

impl<'a> Source<'a> {
    pub(super) fn new(source: SourceRecord<'a>) -> Self {
        Self {
            path: source.path,
            sha256: source.sha256,
            kind: source.kind,
            notes: source.notes,
        }
    }
}

#[derive(Serialize)]
struct Section {
    area: Quantity,
    wetted_perimeter: Quantity,
    hydraulic_diameter: Quantity,
    width: Quantity,
    height: Quantity,
    lumens: Quantity,
    islands: Quantity,
    vertices: Quantity,
}

impl Section {
    fn new(flow: &SectionFlow) -> Self {
        let g = &flow.geometry;
        Self {
            area: Quantity::real(g.area, "m^2"),
            wetted_perimeter: Quantity::real(g.wetted_perimeter, "m"),
            hydraulic_diameter: Quantity::real(g.hydraulic_diameter, "m"),
            width: Quantity::real(g.width, "m"),
            height: Quantity::real(g.height, "m"),
            lumens: Quantity::count(g.lumens),
            islands: Quantity::count(g.islands),
            vertices: Quantity::count(g.vertices),
        }
    }
}

#[derive(Serialize)]
struct Poiseuille {
    fanning_dh: Quantity,
    darcy_dh: Quantity,
    fanning_sqrt_area: Quantity,
}

#[derive(Serialize)]
struct Peak {
    phi: Quantity,
    at: [Number; 2],
}

#[derive(Serialize)]
pub(super) struct Grid {
    spacing: Quantity,
    fluid_nodes: Quantity,
    cells_across: Quantity,
    inscribed_diameter: Quantity,
}

impl Grid {
    pub(super) fn new(flow: &SectionFlow) -> Self {
        let g = &flow.grid;
        Self {
            spacing: Quantity::real(g.spacing, "m"),
            fluid_nodes: Quantity::count(g.fluid_nodes),
            cells_across: Quantity::real(g.cells_across, "1"),
            inscribed_diameter: Quantity::real(g.inscribed_diameter, "m"),
        }
    }
}

#[derive(Serialize)]
struct Solver {
    cycles: Quantity,
    residual: Quantity,
    converged: bool,
    seconds: Quantity,
    convergence_factor: Quantity,
    accelerated: bool,
    levels: Vec<Level>,
}

#[derive(Serialize)]
struct Level {
    spacing: Quantity,
    fluid_nodes: Quantity,
    wall_nodes: Quantity,
    cycles: Quantity,
    conductance: Quantity,
}

impl Solver {
    fn new(report: &SolverReport) -> Self {
        Self {
            cycles: Quantity::count(report.cycles),
            residual: Quantity::real(report.residual, "1"),
            converged: report.converged,
            seconds: Quantity::real(report.seconds, "s"),
            convergence_factor: Quantity::real(report.convergence_factor, "1"),
            accelerated: report.accelerated,
            levels: report
                .levels
                .iter()
                .map(|l| Level {
                    spacing: Quantity::real(l.spacing, "m"),
                    fluid_nodes: Quantity::count(l.fluid_nodes),
                    wall_nodes: Quantity::count(l.wall_nodes),
                    cycles: Quantity::count(l.cycles),
                    conductance: Quantity::real(l.conductance, "m^4"),
                })
                .collect(),
        }
    }
}

#[derive(Serialize)]
struct IdentityView {
    formula: &'static str,
    computed: Number,
    expected: Number,
    relative_difference: Quantity,
    tolerance: Number,
    holds: bool,
}

impl IdentityView {
    fn new(identity: &Identity) -> Self {
        Self {
            formula: identity.formula,
            computed: Number::real(identity.computed),
            expected: Number::real(identity.expected),
            relative_difference: Quantity::real(identity.relative_difference, "1"),
            tolerance: Number::real(identity.tolerance),
            holds: identity.holds,
        }
    }
}

#[derive(Serialize)]
pub(super) struct FluidView<'a> {
    name: &'a str,
    temperature: Quantity,
    viscosity: Quantity,
    density: Quantity,
    source: &'a str,
}

impl<'a> FluidView<'a> {
    pub(super) fn new(f: &'a Fluid) -> Self {
        Self {
            name: &f.name,
            temperature: Quantity::optional(f.temperature, "K", "no temperature was given"),
            viscosity: Quantity::real(f.viscosity, "Pa s"),
            density: Quantity::optional(f.density, "kg/m^3", "no density was given"),
            source: &f.source,
        }
    }
}

#[derive(Serialize)]
struct PointView {
    length: Quantity,
    flow_rate: Quantity,
    pressure_drop: Quantity,
    pressure_gradient: Quantity,
    mean_velocity: Quantity,
    peak_velocity: Quantity,
    reynolds_dh: Quantity,
    wall_shear_max: Quantity,
    wall_shear_mean: Quantity,
    residence_time: Quantity,
    entrance_length: Quantity,
}

impl PointView {
    fn new(document: &SolveDocument<'_>) -> Option<Self> {
        let no_density = "the density of the fluid is not known";
        let flow = document.flow;
        document.operating_point.map(|p| {
            let with_flow =
                |value: f64, unit| Quantity::real(value, unit).between(p.flow_bounds(flow, value));
            let with_pressure = |value: f64, unit| {
                Quantity::real(value, unit).between(p.pressure_bounds(flow, value))
            };
            // The time goes with one over the flow rate.
            let times = p
                .flow_bounds(flow, 1.0)
                .map(|(low, high)| (p.residence_time / high, p.residence_time / low));
            let reynolds = p.reynolds_dh.and_then(|value| p.flow_bounds(flow, value));
            Self {
                length: Quantity::real(p.length, "m"),
                flow_rate: with_flow(p.flow_rate, "m^3/s"),
                pressure_drop: with_pressure(p.pressure_drop, "Pa"),
                pressure_gradient: with_pressure(p.pressure_gradient, "Pa/m"),
                mean_velocity: with_flow(p.mean_velocity, "m/s"),
                peak_velocity: Quantity::real(p.peak_velocity, "m/s"),
                reynolds_dh: Quantity::optional(p.reynolds_dh, "1", no_density).between(reynolds),
                wall_shear_max: Quantity::real(p.wall_shear_max, "Pa"),
                wall_shear_mean: with_pressure(p.wall_shear_mean, "Pa"),
                residence_time: Quantity::real(p.residence_time, "s").between(times),
                entrance_length: Quantity::optional(p.entrance_length, "m", no_density),
            }
        })
    }
}

#[derive(Serialize)]
struct ShortcutView<'a> {
    name: &'static str,
    source: &'static str,
    range: &'static str,
    conductance: Quantity,
    resistance_error: Quantity,
    remark: &'a str,
}

impl<'a> ShortcutView<'a> {
    fn new(row: &'a ShortcutRow) -> Self {
        let reason = "the formula does not apply to this section; see remark";
        Self {
            name: row.name,
            source: row.source,
            range: row.range,
            conductance: Quantity::optional(row.conductance, "m^4", reason),
            resistance_error: Quantity::optional(row.resistance_error, "1", reason),
            remark: &row.remark,
        }
    }
}

#[derive(Serialize)]
pub(super) struct WarningView {
    code: &'static str,
    message: String,
    advice: String,
    #[serde(flatten)]
    numbers: BTreeMap<&'static str, Number>,
}

impl WarningView {
    pub(super) fn all(warnings: Vec<Warning>) -> Vec<Self> {
        warnings.into_iter().map(Self::new).collect()
    }

    pub(super) fn new(warning: Warning) -> Self {
        Self {
            code: warning.code.as_str(),
            message: warning.message,
            advice: warning.advice,
            numbers: warning
                .numbers
                .into_iter()
                .map(|(key, value)| (key, Number::real(value)))
                .collect(),
        }
    }
}
