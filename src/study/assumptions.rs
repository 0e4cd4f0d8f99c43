//! What the conductance would be under other assumptions about the section.
//!
//! A trace or a picture often leaves something open: on which land the lid lies, say. Each reading gives
//! an outline; solved alike, they show how much the choice moves the result.

use crate::flow::{FlowError, SolveOptions, solve_outline};
use crate::geometry::Outline;
use crate::measured::Estimate;

/// The conductance under one assumption.
#[derive(Debug, Clone, PartialEq)]
pub struct Assumption {
    /// Conductance, m^4, or why there is none.
    pub conductance: Result<Estimate, FlowError>,
    /// Conductance over that of the section as taken, less 1.
    pub relative_change: Option<f64>,
}

/// Solves the section as it would be under another assumption.
///
/// - `outline`: the section under it, m
/// - `taken`: conductance of the section as taken, m^4
/// - `options`: as for the section as taken
///
/// # Examples
/// ```
/// use etchwise::flow::{SolveOptions, solve_outline};
/// use etchwise::geometry::Outline;
/// use etchwise::study::under_assumption;
/// let plate = |height: f64| {
///     Outline::single(vec![[0.0, 0.0], [1e-4, 0.0], [1e-4, height], [0.0, height]])
/// };
/// let options = SolveOptions { cells_across: Some(32.0), ..SolveOptions::default() };
/// let taken = solve_outline(&plate(1e-5), &options).unwrap().flow.conductance;
/// let other = under_assumption(&plate(1.1e-5), taken, &options);
/// assert!((other.relative_change.unwrap() - 0.322).abs() < 2e-3);
/// ```
pub fn under_assumption(outline: &Outline, taken: Estimate, options: &SolveOptions) -> Assumption {
    let conductance = solve_outline(outline, options).map(|solved| solved.flow.conductance);
    let relative_change = conductance.as_ref().ok().and_then(|k| {
        let change = k.value / taken.value - 1.0;
        change.is_finite().then_some(change)
    });
    Assumption {
        conductance,
        relative_change,
    }
}
