//! A trace: heights along a line.

use crate::intake::step::Step;

/// Heights along a line, metres.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Profile {
    /// Positions, m, finite and increasing.
    pub x: Vec<f64>,
    /// Heights upwards, m, one for each position; NaN where the instrument gave none.
    pub z: Vec<f64>,
}

/// A stretch of a trace, m.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Zone {
    /// Where it begins, m.
    pub from: f64,
    /// Where it ends, m, above `from`.
    pub to: f64,
}

/// A trace as the instrument wrote it, in metres.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct RawTrace {
    /// Positions and heights.
    pub profile: Profile,
    /// What the file says besides, key and value as written, in its order.
    pub metadata: Vec<(String, String)>,
    /// Radius of the stylus tip where the file says it, m.
    pub tip_radius: Option<f64>,
    /// How it was read: units, columns, rebuilt positions, missing points.
    pub steps: Vec<Step>,
}
