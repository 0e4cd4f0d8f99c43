//! First-order predictions set against new solves of the moved outline.
//!
//! Two solves, at plus and minus a step `s`, on grids with as many cells across in the same place as the
//! unmoved section: `K(q) = K (1 + a q + b q^2/2)` with `a = (K+ - K-)/(2 s K)` and
//! `b = (K+ - 2 K + K-)/(s^2 K)`. From `b` follows where first order stops being enough.

use crate::flow::{FlowError, SolveOptions, solve_outline};
use crate::geometry::{Outline, largest_inscribed_circle};

use super::moved_outline::moved_outline;
use super::wall_motion::WallMotion;

/// Share of the first-order term at which the second-order term is said to matter.
pub const SECOND_ORDER_SHARE: f64 = 0.1;
/// Largest motion of the wall in the check, times the diameter of the largest circle that fits into the
/// smallest lumen: the root of the relative error of `K`, which balances that error against the third-order
/// term, within these limits.
const STEPS: [f64; 2] = [4e-3, 1.5e-2];
/// Share of that below which a step that the outline does not allow is not quartered again.
const SMALLEST_SHARE: f64 = 0.02;
/// Highest step in a smooth wall, in spacings of the grid: higher ones look like corners.
const HIGHEST_STEP: f64 = 0.2;

/// What the new solves say.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Check {
    /// Step, in units of the change.
    pub step: f64,
    /// `a`: relative change of `K` per unit of change from the central difference.
    pub first_order: f64,
    /// `b`: second derivative of `K` over `K`, per unit of change squared.
    pub second_order: f64,
    /// Estimated numerical error of `a`.
    pub first_order_error: f64,
    /// Estimated numerical error of `b`.
    pub second_order_error: f64,
    /// Change that moves the wall by half the inscribed circle's diameter: beyond it two terms say nothing.
    pub largest_change: f64,
}

/// Up to which change the first order is enough.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum FirstOrderRange {
    /// At this change the second-order term is [`SECOND_ORDER_SHARE`] of the first-order one.
    UpTo(f64),
    /// At least up to this change: [`Check::largest_change`], or what can be said where the second-order term
    /// is lost in the numerical error of the new solves.
    AtLeast(f64),
}

impl Check {
    /// Up to which change `K (1 + a q)` is enough.
    pub fn reach_for_conductance(&self) -> FirstOrderRange {
        self.reach(0.5 * self.second_order)
    }

    /// Up to which change `R (1 - a q)` is enough, from `R (1 - a q + (a^2 - b/2) q^2)`.
    pub fn reach_for_resistance(&self) -> FirstOrderRange {
        self.reach(self.first_order.powi(2) - 0.5 * self.second_order)
    }

    /// The reach from the coefficient of `q^2`.
    fn reach(&self, quadratic: f64) -> FirstOrderRange {
        let limit = |quadratic: f64| (SECOND_ORDER_SHARE * self.first_order / quadratic).abs();
        let (size, error) = (quadratic.abs(), 0.5 * self.second_order_error);
        if size <= 2.0 * error {
            FirstOrderRange::AtLeast(limit(size + error).min(self.largest_change))
        } else if limit(size) > self.largest_change {
            FirstOrderRange::AtLeast(self.largest_change)
        } else {
            FirstOrderRange::UpTo(limit(size))
        }
    }
}

/// Why there is no check.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum NoCheck {
    /// It was not asked for.
    #[error("the check was not asked for")]
    NotAsked,
    /// The time allowed does not suffice.
    #[error("the new solves would end after --max-seconds")]
    Time,
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
    pub(super) cells_across: f64,
    /// `K` on that grid, m^4.
    pub(super) conductance: f64,
    /// Diameter of the largest circle that fits into the smallest lumen, m.
    pub(super) diameter: f64,
    /// Estimated relative error of `K`.
    pub(super) relative_error: f64,
    /// What its solve took, s.
    pub(super) seconds: f64,
}

impl Base<'_> {
    /// Solves the section moved either way.
    pub(super) fn check(&self, motion: &WallMotion) -> Result<Check, NoCheck> {
        let share = self.relative_error.sqrt().clamp(STEPS[0], STEPS[1]);
        let whole = self.diameter / motion.largest_speed(self.outline);
        let largest = share * whole;
        let mut step = largest;
        let [minus, plus] = loop {
            match [-step, step].map(|change| moved_outline(self.outline, motion, change)) {
                [Ok(minus), Ok(plus)] => {
                    // Both ways have steps of one height.
                    let allowed = HIGHEST_STEP * self.spacing() / plus.highest_step;
                    if allowed >= 0.99 {
                        break [minus.outline, plus.outline];
                    }
                    step *= allowed;
                }
                _ if step > largest * SMALLEST_SHARE => step /= 4.0,
                _ => return Err(NoCheck::Outline),
            }
        };
        let (minus, plus) = rayon::join(|| self.solve(&minus), || self.solve(&plus));
        let (minus, plus) = (minus?, plus?);
        let k = self.conductance;
        let first_order = (plus - minus) / (2.0 * step * k);
        let second_order = (plus - 2.0 * k + minus) / (step * step * k);
        // A similar section on a similar grid has the same relative error.
        let relative_error = if motion.is_similarity() {
            0.0
        } else {
            self.relative_error
        };
        Ok(Check {
            step,
            first_order,
            second_order,
            first_order_error: relative_error / step,
            second_order_error: 4.0 * relative_error / (step * step),
            largest_change: 0.5 * whole,
        })
    }

    /// Node distance asked for, m.
    fn spacing(&self) -> f64 {
        self.diameter / self.cells_across
    }

    /// `K` of a moved section, m^4.
    ///
    /// The spacing goes with the square root of the area, not with the inscribed circle, which may jump from
    /// one place to another: the grid then changes as smoothly as the section.
    fn solve(&self, outline: &Outline) -> Result<f64, NoCheck> {
        let diameter = inscribed_diameter(outline);
        let spacing = self.spacing() * (outline.area() / self.outline.area()).sqrt();
        let options = SolveOptions {
            cells_across: Some(diameter / spacing),
            ..SolveOptions::default()
        };
        let flow = solve_outline(outline, &options)?.flow;
        if flow.solver.converged {
            Ok(flow.conductance.value)
        } else {
            Err(NoCheck::Unfinished)
        }
    }
}

/// Diameter of the largest circle that fits into the smallest lumen, m.
fn inscribed_diameter(outline: &Outline) -> f64 {
    let lumens = outline.lumens.iter();
    lumens
        .map(|lumen| largest_inscribed_circle(lumen).map_or(0.0, |circle| 2.0 * circle.radius))
        .fold(f64::INFINITY, f64::min)
}
