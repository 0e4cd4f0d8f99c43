//! The JSON view of a response table: SI, no number without its unit, no NaN, absence with a reason.

use std::collections::BTreeMap;

use serde::Serialize;

use super::document::ResponseDocument;
use super::formula::{POLYNOMIALS, formula_text, letter, scaled_text, scaling};
use crate::report::json::{FluidView, Source, WarningView};
use crate::report::json_values::{Bracketed, Number, Quantity, pretty};
use crate::study::{
    FitTerm, NUMERICAL_SHARE, ParameterScale, ResponseParameter, ResponsePoint, Trend, TrendCheck,
    slope_unit,
};

/// Name and version of this contract.
pub const RESPONSE_SCHEMA: &str = "etchwise-response/1";

/// The document as pretty-printed JSON with a closing line feed.
///
/// # Errors
/// The error of the serialiser; it has no cause in the data, since keys are text and numbers finite.
pub fn response_json(document: &ResponseDocument<'_>) -> Result<String, serde_json::Error> {
    pretty(&Root::new(document))
}

#[derive(Serialize)]
struct Root<'a> {
    schema: &'static str,
    tool_version: &'static str,
    name: &'a str,
    source: Option<Source<'a>>,
    fixed_parameters: BTreeMap<&'a str, &'a str>,
    fluid: Option<FluidView<'a>>,
    parameters: Vec<Parameter<'a>>,
    formula: Formula<'a>,
    errors: Errors,
    monotonicity: Vec<Monotonicity<'a>>,
    table_points_per_parameter: &'a [usize],
    table: Vec<Point>,
    fresh_points: Vec<Point>,
    settings: Settings,
    warnings: Vec<WarningView>,
    absent_because: BTreeMap<&'static str, &'static str>,
}

impl<'a> Root<'a> {
    fn new(document: &ResponseDocument<'a>) -> Self {
        let table = document.table;
        let mut absent_because = BTreeMap::new();
        if document.source.is_none() {
            absent_because.insert("source", "a nominal kind is no file");
        }
        if document.fluid.is_none() {
            absent_because.insert(
                "fluid",
                "no fluid was given; R' = mu / K with its viscosity mu",
            );
        }
        let fixed = document.fixed.iter();
        let pairs = || table.parameters.iter().zip(&table.trends);
        let point = |p| Point::new(document, p);
        Self {
            schema: RESPONSE_SCHEMA,
            tool_version: env!("CARGO_PKG_VERSION"),
            name: document.name,
            source: document.source.map(Source::new),
            fixed_parameters: fixed.map(|(n, v)| (n.as_str(), v.as_str())).collect(),
            fluid: document.fluid.map(FluidView::new),
            parameters: table
                .parameters
                .iter()
                .enumerate()
                .map(Parameter::new)
                .collect(),
            formula: Formula::new(document),
            errors: Errors::new(document),
            monotonicity: pairs().map(|(p, t)| Monotonicity::new(p, t)).collect(),
            table_points_per_parameter: &table.nodes,
            table: table.points.iter().map(point).collect(),
            fresh_points: table.fresh.iter().map(point).collect(),
            settings: Settings {
                fit_error: Quantity::real(document.options.fit_error, "1"),
                fresh_points: Quantity::count(document.options.fresh_points),
                numerical_error_aimed_at: Quantity::real(
                    NUMERICAL_SHARE * document.options.fit_error,
                    "1",
                ),
            },
            warnings: WarningView::all(document.all_warnings()),
            absent_because,
        }
    }
}

#[derive(Serialize)]
struct Parameter<'a> {
    name: &'a str,
    definition: &'a str,
    unit: &'static str,
    low: Number,
    high: Number,
    scaled_name: &'static str,
    variable: &'static str,
    variable_middle: Number,
    variable_half_width: Number,
    scaled_formula: String,
}

impl<'a> Parameter<'a> {
    fn new((axis, parameter): (usize, &'a ResponseParameter)) -> Self {
        let [middle, half] = scaling(parameter);
        Self {
            name: &parameter.name,
            definition: &parameter.definition,
            unit: parameter.unit.name(),
            low: Number::real(parameter.low),
            high: Number::real(parameter.high),
            scaled_name: letter(axis),
            variable: match parameter.scale() {
                ParameterScale::Logarithm => "logarithm",
                ParameterScale::Linear => "linear",
            },
            variable_middle: Number::real(middle),
            variable_half_width: Number::real(half),
            scaled_formula: scaled_text(axis, parameter),
        }
    }
}

#[derive(Serialize)]
struct Formula<'a> {
    text: String,
    polynomials: &'static str,
    valid: &'static str,
    quantity: &'static str,
    degrees: &'a [usize],
    terms: Vec<Term<'a>>,
    check_values: Vec<Number>,
    check_conductance: Quantity,
}

impl<'a> Formula<'a> {
    fn new(document: &ResponseDocument<'a>) -> Self {
        let fit = &document.table.fit;
        let (middle, k) = document.table.middle();
        Self {
            text: formula_text(document),
            polynomials: POLYNOMIALS,
            valid: "inside the ranges of the parameters only, ends included; outside it says nothing",
            quantity: "ln(K / m^4), the sum of coefficient times the product of T(exponent) of each scaled parameter",
            degrees: &fit.degrees,
            terms: fit.terms.iter().map(Term::new).collect(),
            check_values: middle.into_iter().map(Number::real).collect(),
            check_conductance: Quantity::real(k, "m^4"),
        }
    }
}

#[derive(Serialize)]
struct Term<'a> {
    exponents: &'a [usize],
    coefficient: Quantity,
}

impl<'a> Term<'a> {
    fn new(term: &'a FitTerm) -> Self {
        Self {
            exponents: &term.degrees,
            coefficient: Quantity::real(term.coefficient, "1"),
        }
    }
}

#[derive(Serialize)]
struct Errors {
    fit_error_asked: Quantity,
    fit_error_met: bool,
    fit_error_fresh_largest: Quantity,
    fit_error_fresh_root_mean_square: Quantity,
    fit_error_table_largest: Quantity,
    numerical_error_largest: Quantity,
    stated_error: Quantity,
    proven_width_table_largest: Quantity,
}

impl Errors {
    fn new(document: &ResponseDocument<'_>) -> Self {
        let errors = &document.table.errors;
        let one = |value| Quantity::real(value, "1");
        Self {
            fit_error_asked: one(errors.asked),
            fit_error_met: errors.is_met(),
            fit_error_fresh_largest: one(errors.fresh),
            fit_error_fresh_root_mean_square: one(errors.fresh_mean_square),
            fit_error_table_largest: one(errors.table),
            numerical_error_largest: one(errors.numerical),
            stated_error: one(errors.stated()),
            proven_width_table_largest: Quantity::optional(
                errors.proven_width,
                "1",
                "a point of the table has no proven range",
            ),
        }
    }
}

#[derive(Serialize)]
struct Monotonicity<'a> {
    parameter: &'a str,
    expected: Option<&'static str>,
    because: &'static str,
    found: Option<&'static str>,
    holds: Option<bool>,
    slope_of: String,
    slope_low: Quantity,
    slope_high: Quantity,
    places: usize,
    wrong_places: usize,
    largest_fall: Quantity,
    table_pairs: usize,
    wrong_table_pairs: usize,
}

impl<'a> Monotonicity<'a> {
    fn new(parameter: &'a ResponseParameter, trend: &TrendCheck) -> Self {
        let unit = slope_unit(parameter);
        Self {
            parameter: &parameter.name,
            expected: trend.expected.map(Trend::word),
            because: trend.because,
            found: trend.found.map(Trend::word),
            holds: trend.expected.map(|_| trend.holds()),
            slope_of: match parameter.scale() {
                ParameterScale::Logarithm => format!("dlnK/dln({})", parameter.name),
                ParameterScale::Linear => format!("dlnK/d({})", parameter.name),
            },
            slope_low: Quantity::real(trend.slopes[0], unit),
            slope_high: Quantity::real(trend.slopes[1], unit),
            places: trend.places,
            wrong_places: trend.wrong_places,
            largest_fall: Quantity::real(trend.largest_fall, "1"),
            table_pairs: trend.pairs,
            wrong_table_pairs: trend.wrong_pairs,
        }
    }
}

/// Values are in the units of the parameters, in their order.
#[derive(Serialize)]
struct Point {
    values: Vec<Number>,
    conductance: Bracketed,
    conductance_fit: Quantity,
    relative_difference: Quantity,
    #[serde(skip_serializing_if = "Option::is_none")]
    resistance_per_length: Option<Quantity>,
}

impl Point {
    fn new(document: &ResponseDocument<'_>, point: &ResponsePoint) -> Self {
        let bounds = point.proven.as_ref().ok().map(|[low, high]| (*low, *high));
        let mu = document.fluid.map(|fluid| fluid.viscosity);
        // The larger conductance is the smaller resistance.
        let resistance = mu.map(|mu| {
            let quantity = Quantity::real(mu / point.conductance.value, "Pa s/m^4");
            quantity.between(bounds.map(|(low, high)| (mu / high, mu / low)))
        });
        Self {
            values: point.values.iter().map(|&v| Number::real(v)).collect(),
            conductance: Bracketed::new(
                point.conductance,
                bounds,
                point.proven.as_ref().err().cloned(),
            ),
            conductance_fit: Quantity::real(point.fitted, "m^4"),
            relative_difference: Quantity::real(point.relative_difference(), "1"),
            resistance_per_length: resistance,
        }
    }
}

#[derive(Serialize)]
struct Settings {
    fit_error: Quantity,
    fresh_points: Quantity,
    numerical_error_aimed_at: Quantity,
}
