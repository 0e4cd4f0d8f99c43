//! What a route is made of, before anything is solved.

use super::interpolation::Interpolation;
use crate::flow::{FlowError, SolveOptions};
use crate::geometry::nominal::{NominalError, NominalSpec};
use crate::geometry::{NotBetween, Outline};

/// Relative accuracy of the integral of `1/K` between stations whose dimensions are interpolated.
const INTEGRAL_TOLERANCE: f64 = 2e-6;

/// A channel: segments in series.
#[derive(Debug, Clone, PartialEq)]
pub struct RouteDesign {
    /// In the direction of flow.
    pub segments: Vec<SegmentDesign>,
    /// Every section once.
    pub sections: Vec<RouteSection>,
}

/// A section of the route.
#[derive(Debug, Clone, PartialEq)]
pub struct RouteSection {
    /// Its file or kind, for outputs.
    pub label: String,
    /// Valid, metres.
    pub outline: Outline,
    /// Its nominal dimensions, where it has them.
    pub nominal: Option<NominalSpec>,
}

/// Branches beside each other.
#[derive(Debug, Clone, PartialEq)]
pub struct SegmentDesign {
    /// Name.
    pub name: String,
    /// At least one.
    pub branches: Vec<BranchDesign>,
}

/// A branch, or several equal ones.
#[derive(Debug, Clone, PartialEq)]
pub struct BranchDesign {
    /// Name; empty for the only one of its segment.
    pub name: String,
    /// How many equal ones there are, at least one.
    pub count: usize,
    /// How `K` goes between stations.
    pub interpolation: Interpolation,
    /// Relative standard uncertainty of `K` of each, independent of the others.
    pub spread: Option<f64>,
    /// At least two, positions rising.
    pub stations: Vec<StationDesign>,
}

/// A place with a section.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct StationDesign {
    /// Position, m.
    pub position: f64,
    /// Index into [`RouteDesign::sections`].
    pub section: usize,
}

/// How a route is solved.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct RouteOptions {
    /// How every section is solved.
    pub solve: SolveOptions,
    /// Relative change of the integral of `1/K` at which no more sections are put between two stations.
    pub integral_tolerance: f64,
    /// Sections to put between two stations at least where dimensions are interpolated, at most 63: more make the
    /// proven range narrower.
    pub least_between: usize,
    /// Nodes of the field that is kept of every section, for files; `None` keeps none.
    pub field_nodes: Option<usize>,
}

impl Default for RouteOptions {
    fn default() -> Self {
        Self {
            solve: SolveOptions::default(),
            integral_tolerance: INTEGRAL_TOLERANCE,
            least_between: 1,
            field_nodes: None,
        }
    }
}

/// Why a route was not solved.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum RouteError {
    /// There is nothing to solve.
    #[error("the route has no segment, a segment no branch, or a branch fewer than two stations")]
    Empty,
    /// A station names a section that is not there, or positions do not rise.
    #[error("segment `{segment}`: station {station} is out of order, or its section is missing")]
    Station {
        /// Name of the segment.
        segment: String,
        /// Number of the station, from 1.
        station: usize,
    },
    /// A section was not solved.
    #[error("section `{section}`: {error}")]
    Flow {
        /// Its label.
        section: String,
        /// Why.
        error: FlowError,
    },
    /// Dimensions were to be interpolated where they cannot be.
    #[error(
        "segment `{segment}`: dimensions cannot be interpolated from station {station} to the next: {reason}"
    )]
    NotBetween {
        /// Name of the segment.
        segment: String,
        /// Number of the first of the two stations, from 1.
        station: usize,
        /// Why.
        reason: String,
    },
}

impl RouteError {
    /// What the user can do.
    pub fn hint(&self) -> String {
        match self {
            Self::Empty => "give every branch a length, and a section or stations".to_owned(),
            Self::Station { .. } => "list stations in the direction of flow".to_owned(),
            Self::Flow { error, .. } => error.hint(),
            Self::NotBetween { .. } => {
                "give both stations as nominal sections of one kind with the same parameters, or leave \
                 `interpolation` out"
                    .to_owned()
            }
        }
    }
}

/// Why there are no dimensions in between.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub(super) enum NoDimensions {
    /// One of them is an outline.
    #[error("not both are nominal sections")]
    Outline,
    /// They do not match.
    #[error("{0}")]
    NotBetween(NotBetween),
    /// A section in between cannot be drawn.
    #[error("a section in between cannot be drawn: {0}")]
    Drawing(NominalError),
}
