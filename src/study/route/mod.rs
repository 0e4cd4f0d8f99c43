//! A channel along its length: stations joined to segments, segments in series, branches beside each other.
//!
//! `R = mu * integral of dx / K(x)`. Between two stations `K` is interpolated by a stated rule
//! ([`Interpolation`]): where both are nominal sections of one kind, their dimensions change in proportion
//! and the sections in between are solved; otherwise the cube root of `K` is taken as straight. The effect of
//! the other rules is worked out beside it. Where the one section is proven to lie inside the other, `K`
//! between them lies between the proven low value of the smaller and the proven high value of the larger one,
//! provided the wall moves one way only between the two. Branches beside each other add their `1/R`.
//! Sudden steps, bends and junctions have no resistance of their own here (none at vanishing Reynolds number
//! beyond about a diameter of length each). SI throughout. Tests: `tests/route.rs`.

mod between;
mod branch;
mod design;
mod interpolation;
mod nesting;
mod operation;
mod sampled;
mod spread;

pub use between::{Between, UsedRule};
pub use branch::{Route, RouteBranch, RouteFlow, RoutePoint, RouteSegment, solve_route};
pub use design::{
    BranchDesign, RouteDesign, RouteError, RouteOptions, RouteSection, SegmentDesign, StationDesign,
};
pub use interpolation::{Interpolation, LawOfK};
pub use nesting::{Nested, SHRINKING, nested};
pub use operation::{
    BranchOperation, PointOperation, PointPlace, RouteOperation, SegmentOperation,
};
pub use spread::{DRAWS, RouteSpread, SegmentSpread, ShareSpread, route_spread};
