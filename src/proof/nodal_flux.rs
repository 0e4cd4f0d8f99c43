//! Fluxes through the sides of cells from the nodal values: first guesses for the band at the wall.

use crate::grid::{Colour, EAST, Mask, NO_NODE, NORTH, SOUTH, WEST, WallNode};
use crate::solve::Field;

/// The nodal values and where they are.
pub(super) struct NodalFlux<'a> {
    pub(super) mask: &'a Mask,
    pub(super) phi: &'a Field,
}

impl NodalFlux<'_> {
    /// Value of node `(i, j)`, `None` outside the fluid.
    pub(super) fn value(&self, i: i64, j: i64) -> Option<f64> {
        let (i, j) = (u32::try_from(i).ok()?, u32::try_from(j).ok()?);
        self.phi.at(self.mask, i, j)
    }

    /// Derivative of `phi` at a side of the cell of fluid node `(i, j)`, along the axis of the side.
    fn slope_at_side(&self, i: i64, j: i64, side: usize) -> Option<f64> {
        let centre = self.value(i, j)?;
        let (low, high) =
            self.differences(i, j, centre, usize::from(side == SOUTH || side == NORTH))?;
        Some(if side == EAST || side == NORTH {
            high
        } else {
            low
        })
    }

    /// Derivatives of the unequal-arm quadratic half a cell below and above a node along one axis.
    fn differences(&self, i: i64, j: i64, centre: f64, axis: usize) -> Option<(f64, f64)> {
        let (ui, uj) = (u32::try_from(i).ok()?, u32::try_from(j).ok()?);
        let (colour, node) = self.mask.node_at(ui, uj)?;
        let (arms, ends) = if let Some(wall) = self.mask.wall_node(colour, node) {
            self.wall_ends(wall, colour, axis)
        } else {
            let step = if axis == 0 { (1, 0) } else { (0, 1) };
            let low = self.value(i - step.0, j - step.1)?;
            let high = self.value(i + step.0, j + step.1)?;
            ([1.0, 1.0], [low, high])
        };
        let (below, above) = ((centre - ends[0]) / arms[0], (ends[1] - centre) / arms[1]);
        let second = 2.0 * (above - below) / (arms[0] + arms[1]);
        let first = (below * arms[1] + above * arms[0]) / (arms[0] + arms[1]);
        Some((first - 0.5 * second, first + 0.5 * second))
    }

    fn wall_ends(&self, wall: &WallNode, colour: Colour, axis: usize) -> ([f64; 2], [f64; 2]) {
        let other = &self.phi.colour[colour.other() as usize];
        let end = |arm: usize| {
            if wall.neighbour[arm] == NO_NODE {
                0.0
            } else {
                other
                    .get(wall.neighbour[arm] as usize)
                    .copied()
                    .unwrap_or(0.0)
            }
        };
        let low = 2 * axis;
        ([wall.arm[low], wall.arm[low + 1]], [end(low), end(low + 1)])
    }

    /// Value of a side without fluid, from the two sides before it in line.
    pub(super) fn beyond(&self, i: i64, j: i64, side: usize) -> Option<f64> {
        let opposite = (side + 2) % 4;
        let (di, dj) = match opposite {
            EAST => (1, 0),
            NORTH => (0, 1),
            WEST => (-1, 0),
            _ => (0, -1),
        };
        let near = self.near_nodes(i, j, opposite)?;
        Some(2.0 * near - self.near_nodes(i + di, j + dj, opposite)?)
    }

    /// Axis of a side and the other axis as steps, and the lower or left node of the pair it lies between.
    fn pair(i: i64, j: i64, side: usize) -> [(i64, i64); 3] {
        let (along, across) = if side == EAST || side == WEST {
            ((1, 0), (0, 1))
        } else {
            ((0, 1), (1, 0))
        };
        let forward = if side == EAST || side == NORTH { 0 } else { -1 };
        [
            along,
            across,
            (i + forward * along.0, j + forward * along.1),
        ]
    }

    /// Value of a side from the two nodes it lies between, or from either of them and its arms.
    fn near_nodes(&self, i: i64, j: i64, side: usize) -> Option<f64> {
        let [along, _, (a, b)] = Self::pair(i, j, side);
        let (low, high) = (self.value(a, b), self.value(a + along.0, b + along.1));
        if let (Some(low), Some(high)) = (low, high) {
            return Some(high - low);
        }
        let (forward, backward) = if along.0 == 1 {
            (EAST, WEST)
        } else {
            (NORTH, SOUTH)
        };
        let ahead = self.slope_at_side(a, b, forward);
        let behind = self.slope_at_side(a + along.0, b + along.1, backward);
        match (ahead, behind) {
            (Some(x), Some(y)) => Some(0.5 * (x + y)),
            (one, other) => one.or(other),
        }
    }

    /// First guess for a side of a cell, from whatever nodes are near.
    pub(super) fn guess(&self, i: i64, j: i64, side: usize) -> f64 {
        if let Some(here) = self.near_nodes(i, j, side) {
            return here;
        }
        let [_, across, _] = Self::pair(i, j, side);
        let step = |k: i64| self.near_nodes(i + k * across.0, j + k * across.1, side);
        let beside: Vec<f64> = [1, -1]
            .into_iter()
            .filter_map(|k| match (step(k), step(2 * k)) {
                (Some(near), Some(far)) => Some(2.0 * near - far),
                (near, _) => near,
            })
            .collect();
        if beside.is_empty() {
            0.0
        } else {
            beside.iter().sum::<f64>() / beside.len() as f64
        }
    }
}
