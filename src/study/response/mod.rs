//! Response tables: `K` over ranges of one to three parameters, and a formula for it with a stated error.
//!
//! Method: the section is solved on a tensor of Chebyshev points, `ln K` is fitted by a polynomial in the scaled
//! logarithms of the parameters (in the parameter itself where its range touches zero) by least squares, and the fit is
//! set against solves at *fresh* points that it never saw. Degrees rise, along the parameter that gains most, until the
//! largest relative difference is what was asked for; where a table is used up, points are added along the
//! parameter whose last coefficients are largest.
//!
//! Three errors, kept apart: the *fit error* (largest difference on table and fresh points), the *numerical error* (largest
//! estimated error of any `K` that went in, aimed at a tenth of the fit error), and the width of the *proven range*,
//! which every point of the table carries. The first two add up to the stated error; the third is proven, but at
//! the points of the table only. Fits hold inside the ranges and nowhere else.
//!
//! Points are solved in parallel and taken in order: the same bits on any number of threads.

mod error;
mod family;
mod fit;
mod parameter;
mod points;
mod range;
mod search;
mod trend;

pub use error::{MOST_PARAMETERS, PointError, ResponseError};
pub use family::{ResponseFamily, fixed_values};
pub use fit::{ChebyshevFit, FitTerm};
pub use parameter::{ParameterScale, ParameterUnit, ResponseParameter, Trend, kind_name};
pub use range::RangeText;
pub use trend::{TrendCheck, slope_unit};

use crate::flow::SectionFlow;
use crate::measured::Estimate;
use crate::warning::{Code, Warning};

use search::Search;

/// Share of the fit error at which the numerical error of each `K` is aimed.
pub const NUMERICAL_SHARE: f64 = 0.1;
/// Largest relative error of the fit by default.
pub const DEFAULT_FIT_ERROR: f64 = 1e-3;
/// Fit errors that can be asked for.
pub const FIT_ERRORS: [f64; 2] = [1e-6, 0.2];
/// Fresh points by default.
pub const DEFAULT_FRESH_POINTS: usize = 200;
/// Fewest and most fresh points.
pub const FRESH_POINTS: [usize; 2] = [10, 100_000];

/// What is asked of a table.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ResponseOptions {
    /// Largest relative difference between fit and solve on fresh points.
    pub fit_error: f64,
    /// Number of fresh points.
    pub fresh_points: usize,
}

impl Default for ResponseOptions {
    fn default() -> Self {
        Self {
            fit_error: DEFAULT_FIT_ERROR,
            fresh_points: DEFAULT_FRESH_POINTS,
        }
    }
}

/// One solved section.
#[derive(Debug, Clone, PartialEq)]
pub struct ResponsePoint {
    /// Values of the parameters, SI, in their order.
    pub values: Vec<f64>,
    /// `K` with its estimated error, m^4.
    pub conductance: Estimate,
    /// Proven range of `K`, m^4, or why there is none; fresh points have none.
    pub proven: Result<[f64; 2], String>,
    /// `K` of the fit, m^4.
    pub fitted: f64,
    /// Lumens and islands of the section.
    pub loops: [usize; 2],
}

impl ResponsePoint {
    /// `fit / K - 1`.
    pub fn relative_difference(&self) -> f64 {
        self.fitted / self.conductance.value - 1.0
    }

    /// Width of the proven range against its middle.
    pub fn proven_width(&self) -> Option<f64> {
        let [low, high] = self.proven.as_ref().ok()?;
        Some(2.0 * (high - low) / (high + low))
    }

    fn new(values: Vec<f64>, flow: &SectionFlow) -> Self {
        Self {
            values,
            conductance: flow.conductance,
            proven: match &flow.bracket {
                Ok(proven) => Ok([proven.low, proven.high]),
                Err(error) => Err(error.to_string()),
            },
            fitted: f64::NAN,
            loops: [flow.geometry.lumens, flow.geometry.islands],
        }
    }
}

/// The errors of a table, all relative.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ResponseErrors {
    /// Fit error asked for.
    pub asked: f64,
    /// Largest difference between fit and solve on fresh points.
    pub fresh: f64,
    /// Root of the mean square of these differences.
    pub fresh_mean_square: f64,
    /// Largest difference on the points of the table.
    pub table: f64,
    /// Largest estimated numerical error of a `K` in the table or at a fresh point.
    pub numerical: f64,
    /// Largest width of a proven range in the table; `None` where a point has none.
    pub proven_width: Option<f64>,
}

impl ResponseErrors {
    /// Fit error: the larger of the differences on fresh points and in the table.
    pub fn fit(&self) -> f64 {
        self.fresh.max(self.table)
    }

    /// Stated error of the formula: fit error plus numerical error.
    pub fn stated(&self) -> f64 {
        self.fit() + self.numerical
    }

    /// Whether the fit is as good as asked.
    pub fn is_met(&self) -> bool {
        self.fit() <= self.asked
    }
}

/// A response table with its formula.
#[derive(Debug, Clone, PartialEq)]
pub struct ResponseTable {
    /// The parameters.
    pub parameters: Vec<ResponseParameter>,
    /// Points of the table along each parameter.
    pub nodes: Vec<usize>,
    /// The table, the last parameter running fastest.
    pub points: Vec<ResponsePoint>,
    /// The fresh points in the order of their sequence.
    pub fresh: Vec<ResponsePoint>,
    /// The fit of `ln(K / m^4)` in the scaled parameters.
    pub fit: ChebyshevFit,
    /// How good it is.
    pub errors: ResponseErrors,
    /// What it does along each parameter.
    pub trends: Vec<TrendCheck>,
    /// What to know.
    pub warnings: Vec<Warning>,
}

impl ResponseTable {
    /// `K` of the formula, m^4; `None` outside the ranges, where it says nothing.
    ///
    /// - `values`: of the parameters, SI, in their order
    pub fn conductance(&self, values: &[f64]) -> Option<f64> {
        // Ends typed in other units than they were given in may be off by rounding.
        let rounding = 1e-12;
        let inside = |p: &ResponseParameter, v: f64| {
            let slack = rounding * p.low.abs().max(p.high.abs());
            (p.low - slack..=p.high + slack).contains(&v)
        };
        let pairs = || self.parameters.iter().zip(values.iter().copied());
        if values.len() != self.parameters.len() || !pairs().all(|(p, v)| inside(p, v)) {
            return None;
        }
        let scaled: Vec<f64> = pairs().map(|(p, v)| p.scaled(v)).collect();
        Some(self.fit.value(&scaled).exp())
    }

    /// The middle of the ranges and what the formula gives there: something to check a copy of it by.
    pub fn middle(&self) -> (Vec<f64>, f64) {
        let scaled = vec![0.0; self.parameters.len()];
        let values = self.parameters.iter().map(|p| p.value_at(0.0)).collect();
        (values, self.fit.value(&scaled).exp())
    }
}

/// The table of a family of sections and its formula.
///
/// # Errors
/// [`ResponseError::Point`] for the first place in the ranges at which there is no section or no solution. A fit that is
/// not as good as asked is no error: see [`ResponseErrors::is_met`].
///
/// # Examples
/// ```
/// use etchwise::geometry::NominalSpec;
/// use etchwise::study::{RangeText, ResponseFamily, ResponseOptions, response_table};
/// let fixed: NominalSpec = "rectangle height=40um".parse().expect("a section");
/// let family = ResponseFamily::nominal(fixed, &[RangeText::read("width=80..160um")?])?;
/// let options = ResponseOptions { fresh_points: 10, ..ResponseOptions::default() };
/// let table = response_table(&family, options)?;
/// let found = table.conductance(&[100e-6]).expect("inside the range");
/// // K of a rectangle of 100 um by 40 um: the Fourier series.
/// assert!((found / 3.989_841_195e-19 - 1.0).abs() < 1e-3);
/// assert_eq!(table.conductance(&[200e-6]), None);
/// # Ok::<(), etchwise::study::ResponseError>(())
/// ```
pub fn response_table(
    family: &ResponseFamily,
    options: ResponseOptions,
) -> Result<ResponseTable, ResponseError> {
    let search = Search::new(family, options)?;
    let found = search.run()?;
    let trends = trend::trends(&family.parameters, &found.fit, &found.points, &found.nodes);
    let mut table = ResponseTable {
        parameters: family.parameters.clone(),
        nodes: found.nodes,
        points: found.points,
        fresh: found.fresh,
        fit: found.fit,
        errors: found.errors,
        trends,
        warnings: Vec::new(),
    };
    table.warnings = warnings(family, &table);
    Ok(table)
}

fn warnings(family: &ResponseFamily, table: &ResponseTable) -> Vec<Warning> {
    let percent = |share: f64| format!("{:.2} %", 100.0 * share);
    let mut found = Vec::new();
    let errors = &table.errors;
    if !errors.is_met() {
        found.push(Warning {
            code: Code::FitNotReached,
            message: format!(
                "the fit is within {} of the solves, and {} was asked for; the best one is shown",
                percent(errors.fit()),
                percent(errors.asked)
            ),
            advice: "narrow the ranges, or allow more with --fit-error".to_owned(),
            numbers: vec![("reached", errors.fit()), ("asked", errors.asked)],
        });
    }
    if errors.numerical > NUMERICAL_SHARE * errors.asked {
        found.push(Warning {
            code: Code::AccuracyNotReached,
            message: format!(
                "the estimated numerical error of the conductance is up to {:.4} %, above a tenth of the fit error",
                100.0 * errors.numerical
            ),
            advice: "it is in the stated error; allow a larger --fit-error if it matters".to_owned(),
            numbers: vec![
                ("reached", errors.numerical),
                ("asked", NUMERICAL_SHARE * errors.asked),
            ],
        });
    }
    for (parameter, trend) in table.parameters.iter().zip(&table.trends) {
        found.extend(trend_warning(family, parameter, trend, errors));
    }
    found.extend(shape_warning(family, table));
    found
}

/// Says where the fit or the table goes against what physics asks for.
fn trend_warning(
    family: &ResponseFamily,
    parameter: &ResponseParameter,
    trend: &TrendCheck,
    errors: &ResponseErrors,
) -> Option<Warning> {
    let expected = trend.expected.filter(|_| !trend.holds())?;
    let within = if trend.largest_fall <= errors.stated() {
        "which is within its stated error"
    } else {
        "which is more than its stated error"
    };
    let place = family.place(&trend.worst_at);
    let at = if place.is_empty() {
        String::new()
    } else {
        format!(", most at {place}")
    };
    Some(Warning {
        code: Code::NotMonotone,
        message: format!(
            "K {} with {}, but the fit does not at {} of {} places{at}; it goes the other way by up to {:.1e} of K, \
             {within}. In the table {} of {} pairs do not",
            expected.word(),
            parameter.name,
            trend.wrong_places,
            trend.places,
            trend.largest_fall,
            trend.wrong_pairs,
            trend.pairs
        ),
        advice: "do not search the formula for an extreme there; narrow the range, or ask for a smaller --fit-error"
            .to_owned(),
        numbers: vec![
            ("wrong_places", trend.wrong_places as f64),
            ("places", trend.places as f64),
            ("largest_fall", trend.largest_fall),
        ],
    })
}

/// Says that lumens or islands come and go within the ranges.
fn shape_warning(family: &ResponseFamily, table: &ResponseTable) -> Option<Warning> {
    let first = table.points.first()?;
    let other = table
        .points
        .iter()
        .chain(&table.fresh)
        .find(|p| p.loops != first.loops)?;
    let words = |p: &ResponsePoint| {
        format!(
            "{} and {} at {}",
            counted(p.loops[0], "lumen"),
            counted(p.loops[1], "island"),
            family.place(&p.values)
        )
    };
    Some(Warning {
        code: Code::ShapeChanges,
        message: format!(
            "the section changes its kind within the ranges: {}, {}. K has a kink where it does",
            words(first),
            words(other)
        ),
        advice: "make one table for each side, if the fit is not as good as wanted".to_owned(),
        numbers: Vec::new(),
    })
}

fn counted(count: usize, one: &str) -> String {
    format!("{count} {one}{}", if count == 1 { "" } else { "s" })
}
