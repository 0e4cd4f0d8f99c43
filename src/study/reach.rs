//! The reach bracket: the conductance of a section whose wall is known only to lie between two others.
//!
//! Conductance grows with the section: `K(inner) <= K <= K(outer)` when inner lies in the section and the
//! section in outer. (The velocity of the inner section, continued by zero, is a trial velocity of the
//! section, so by the Ritz bound `K` is at least the inner conductance.) That both do is proven
//! exactly before anything is solved, by [`Outline::proven_inside`]. Between the proven low value of the
//! inner section and the proven high value of the outer one lies the true `K`, whatever the section is
//! between the two. It says what the instrument could not see; it is neither the proven range of the
//! outline as given, which is about numerics, nor a standard uncertainty.

use crate::flow::{FlowError, SectionFlow, SolveOptions, solve_outline};
use crate::geometry::{Escape, Outline};
use crate::measured::Estimate;
use crate::proof::{Bracket, ProofError};

/// The smallest and the largest section it could be.
#[derive(Debug, Clone, Copy, Default)]
pub struct ReachSides<'a> {
    /// The smallest; `None` for the section itself.
    pub inner: Option<&'a Outline>,
    /// The largest; `None` for the section itself.
    pub outer: Option<&'a Outline>,
    /// What tiny lumens left out of the outer section have at most, m^4; added to its high value.
    pub conductance_left_out: f64,
}

/// Conductance of one of the two sections.
#[derive(Debug, Clone, PartialEq)]
pub struct ReachBound {
    /// Whether it was given; otherwise it is the section itself.
    pub is_given: bool,
    /// Flow area, m^2.
    pub area: f64,
    /// Best value, m^4.
    pub conductance: Estimate,
    /// Proven range, m^4, or why there is none.
    pub bracket: Result<Bracket, ProofError>,
    /// Whether its solver reached its residual, and the search its tolerance.
    pub is_converged: bool,
}

/// What is proven of a section between two others.
#[derive(Debug, Clone, PartialEq)]
pub struct Reach {
    /// The smallest section.
    pub inner: ReachBound,
    /// The largest section.
    pub outer: ReachBound,
}

/// Which of the two sections.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum ReachSide {
    /// The smallest.
    Inner,
    /// The largest.
    Outer,
}

/// Why there is no reach bracket.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum ReachError {
    /// The inner section is not inside the section.
    #[error("reach: the inner section is not inside the section: {0}")]
    InnerEscapes(Escape),
    /// The section is not inside the outer section.
    #[error("reach: the section is not inside the outer section: {0}")]
    SectionEscapes(Escape),
    /// One of the sections was not solved.
    #[error("reach, {}: {error}", match side { ReachSide::Inner => "inner section", ReachSide::Outer => "outer section" })]
    Flow {
        /// Which one.
        side: ReachSide,
        /// Why.
        error: FlowError,
    },
}

impl ReachError {
    /// What the user can do.
    pub fn hint(&self) -> String {
        match self {
            Self::InnerEscapes(_) => {
                "correct the outline there; walls in common are allowed, but a vertex that should lie on a \
                 slanted wall must not lie beyond it by rounding: take it a little inwards"
                    .to_owned()
            }
            Self::SectionEscapes(_) => {
                "correct the outline there; walls in common are allowed, but a vertex that should lie on a \
                 slanted wall must not lie within it by rounding: take it a little outwards"
                    .to_owned()
            }
            Self::Flow { error, .. } => error.hint(),
        }
    }
}

impl ReachSides<'_> {
    /// Proves that the inner section is inside the section and the section inside the outer one.
    ///
    /// # Errors
    /// [`ReachError`] with the place where a wall is in the way.
    pub fn prove_around(&self, section: &Outline) -> Result<(), ReachError> {
        if let Some(inner) = self.inner {
            inner
                .proven_inside(section)
                .map_err(ReachError::InnerEscapes)?;
        }
        if let Some(outer) = self.outer {
            section
                .proven_inside(outer)
                .map_err(ReachError::SectionEscapes)?;
        }
        Ok(())
    }
}

impl Reach {
    /// Proves the order of the sections and solves those that were given.
    ///
    /// - `section`, `flow`: the section itself, valid, and its solution
    ///
    /// # Errors
    /// [`ReachError`] when a section is not inside the next, or not solved.
    ///
    /// # Examples
    /// ```
    /// use etchwise::flow::{SolveOptions, solve_outline};
    /// use etchwise::geometry::Outline;
    /// use etchwise::study::{Reach, ReachSides};
    /// let depth = |h: f64| Outline::single(vec![[0.0, 0.0], [1e-4, 0.0], [1e-4, h], [0.0, h]]);
    /// let (low, section, high) = (depth(49e-6), depth(50e-6), depth(51e-6));
    /// let options = SolveOptions::default();
    /// let flow = solve_outline(&section, &options)?.flow;
    /// let sides = ReachSides { inner: Some(&low), outer: Some(&high), conductance_left_out: 0.0 };
    /// let reach = Reach::new(&section, &flow, &sides, &options).unwrap();
    /// let k = flow.conductance.value;
    /// assert!(reach.low().unwrap() < 0.97 * k && reach.high().unwrap() > 1.03 * k);
    /// # Ok::<(), etchwise::flow::FlowError>(())
    /// ```
    pub fn new(
        section: &Outline,
        flow: &SectionFlow,
        sides: &ReachSides<'_>,
        options: &SolveOptions,
    ) -> Result<Self, ReachError> {
        sides.prove_around(section)?;
        let solved = |outline: Option<&Outline>, side: ReachSide| match outline {
            None => Ok(ReachBound::new(flow, false)),
            Some(outline) => {
                let conductance_left_out = match side {
                    ReachSide::Inner => 0.0,
                    ReachSide::Outer => sides.conductance_left_out,
                };
                let options = SolveOptions {
                    conductance_left_out,
                    ..*options
                };
                solve_outline(outline, &options)
                    .map(|solved| ReachBound::new(&solved.flow, true))
                    .map_err(|error| ReachError::Flow { side, error })
            }
        };
        let inner = solved(sides.inner, ReachSide::Inner)?;
        let outer = solved(sides.outer, ReachSide::Outer)?;
        Ok(Self { inner, outer })
    }

    /// Proven low value of the inner section, m^4.
    pub fn low(&self) -> Option<f64> {
        self.inner.bracket.as_ref().ok().map(|b| b.low)
    }

    /// Proven high value of the outer section, m^4.
    pub fn high(&self) -> Option<f64> {
        self.outer.bracket.as_ref().ok().map(|b| b.high)
    }

    /// Distance of the two against their middle.
    pub fn relative_width(&self) -> Option<f64> {
        let (low, high) = (self.low()?, self.high()?);
        Some(Bracket { low, high }.relative_width())
    }

    /// Whether both solvers reached their residuals, and both searches their tolerance.
    pub fn is_converged(&self) -> bool {
        self.inner.is_converged && self.outer.is_converged
    }
}

impl ReachBound {
    fn new(flow: &SectionFlow, is_given: bool) -> Self {
        Self {
            is_given,
            area: flow.geometry.area,
            conductance: flow.conductance,
            bracket: flow.bracket,
            is_converged: flow.solver.converged && flow.accuracy.is_met,
        }
    }
}
