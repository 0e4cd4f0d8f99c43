//! First-order predictions set against new solves of the moved outline.
//!
//! Two solves, at plus and minus a step `s`, on grids with as many cells across in the same place as the
//! unmoved section: `K(q) = K (1 + a q + b q^2/2)` with `a = (K+ - K-)/(2 s K)` and
//! `b = (K+ - 2 K + K-)/(s^2 K)`. From `b` follows where first order stops being enough.

use crate::flow::{FlowError, SolveOptions, solve_outline};
use crate::geometry::Outline;

use super::moved_outline::moved_outline;
use super::wall_motion::WallMotion;

/// Share of the first-order term at which the second-order term is said to matter.
pub const SECOND_ORDER_SHARE: f64 = 0.1;
/// Largest motion of the wall in the check, times the diameter of the largest circle that fits into the
/// smallest lumen.
const STEP: f64 = 4e-3;
/// How often a step that the outline does not allow is quartered.
const SMALLER_STEPS: i32 = 3;

/// What the new solves say.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Check {
    /// Step, in units of the change.
    pub step: f64,
    /// `a`: relative change of `K` per unit of change from the central difference.
    pub first_order: f64,
    /// `b`: second derivative of `K` over `K`, per unit of change squared.
    pub second_order: f64,
    /// Change at which the second-order term is [`SECOND_ORDER_SHARE`] of the first-order one.
    pub first_order_up_to: f64,
}

impl Check {
    /// The same limit for the resistance, `R (1 - a q + (a^2 - b/2) q^2)`.
    pub fn first_order_up_to_for_resistance(&self) -> f64 {
        let (a, b) = (self.first_order, self.second_order);
        (SECOND_ORDER_SHARE * a / (a * a - 0.5 * b)).abs()
    }
}

/// Why there is no check.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum NoCheck {
    /// It was not asked for.
    #[error("the check was not asked for")]
    NotAsked,
    /// The moved outline is not one.
    #[error("the outline crosses itself when its walls move by the step of the check")]
    Outline,
    /// The moved outline was not solved.
    #[error("the moved section was not solved: {0}")]
    NotSolved(#[from] FlowError),
    /// The solver stopped before its residual was reached.
    #[error("the solver stopped early on the moved section")]
    Unfinished,
}

/// The unmoved section of a check.
pub(super) struct Base<'a> {
    pub(super) outline: &'a Outline,
    pub(super) options: SolveOptions,
    /// `K` with these options, m^4.
    pub(super) conductance: f64,
    /// Diameter of the largest circle that fits into the smallest lumen, m.
    pub(super) diameter: f64,
}

impl Base<'_> {
    /// Solves the section moved either way.
    pub(super) fn check(&self, motion: &WallMotion) -> Result<Check, NoCheck> {
        let largest = STEP * self.diameter / motion.largest_speed(self.outline);
        let mut step = largest;
        let [minus, plus] = loop {
            match [-step, step].map(|change| moved_outline(self.outline, motion, change)) {
                [Ok(minus), Ok(plus)] => break [minus, plus],
                _ if step > largest * 4_f64.powi(-SMALLER_STEPS) * 1.5 => step /= 4.0,
                _ => return Err(NoCheck::Outline),
            }
        };
        let (minus, plus) = rayon::join(|| self.solve(&minus), || self.solve(&plus));
        let (minus, plus) = (minus?, plus?);
        let k = self.conductance;
        let first_order = (plus - minus) / (2.0 * step * k);
        let second_order = (plus - 2.0 * k + minus) / (step * step * k);
        Ok(Check {
            step,
            first_order,
            second_order,
            first_order_up_to: (2.0 * SECOND_ORDER_SHARE * first_order / second_order).abs(),
        })
    }

    fn solve(&self, outline: &Outline) -> Result<f64, NoCheck> {
        let flow = solve_outline(outline, &self.options)?.flow;
        if flow.solver.converged {
            Ok(flow.conductance.value)
        } else {
            Err(NoCheck::Unfinished)
        }
    }
}
