//! Questions over one or many sections that each take several solves or their derivatives.

mod reach;

pub use reach::{Reach, ReachBound, ReachError, ReachSide, ReachSides};
