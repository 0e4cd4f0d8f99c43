//! A height map: heights on a rectangular grid.

use crate::intake::step::Step;

/// Heights on a rectangular grid, metres.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct HeightMap {
    /// Points along x and along y.
    pub size: [usize; 2],
    /// Distance of neighbours along x and along y, m.
    pub spacing: [f64; 2],
    /// Heights upwards, m, row by row along x, rows in the order of rising y; NaN where missing.
    pub heights: Vec<f64>,
    /// What the file says besides, key and value as written, in its order.
    pub metadata: Vec<(String, String)>,
    /// How it was read, with every defect of the file by name.
    pub steps: Vec<Step>,
}
