//! Fluxes through the sides of cells from the nodal values: first guesses for the band at the wall.

use crate::grid::{Colour, EAST, Mask, NO_NODE, NORTH, SOUTH, WEST, WallNode};
use crate::solve::Field;

use super::numbering::Numbering;

/// The nodal values and where they are.
pub(super) struct NodalFlux<'a> {
    mask: &'a Mask,
    pub(super) phi: &'a Field,
    /// Places of the wall nodes of each colour in the lists of the mask.
    wall: [Numbering; 2],
}

/// A fluid node: column, row, colour and storage index.
type Node = (i64, i64, Colour, u32);

impl<'a> NodalFlux<'a> {
    pub(super) fn new(mask: &'a Mask, phi: &'a Field) -> Self {
        let wall = [0, 1].map(|colour| {
            let nodes = mask.wall[colour].iter().map(|wall| wall.node as usize);
            Numbering::new(mask.count[colour], nodes)
        });
        Self { mask, phi, wall }
    }

    fn wall_node(&self, colour: Colour, node: u32) -> Option<&WallNode> {
        let place = self.wall[colour as usize].of(node as usize)?;
        self.mask.wall[colour as usize].get(place as usize)
    }

    fn node(&self, i: i64, j: i64) -> Option<Node> {
        let (column, row) = (u32::try_from(i).ok()?, u32::try_from(j).ok()?);
        let (colour, node) = self.mask.node_at(column, row)?;
        Some((i, j, colour, node))
    }

    fn value_of(&self, (_, _, colour, node): Node) -> Option<f64> {
        self.phi.colour[colour as usize].get(node as usize).copied()
    }

    /// Value of node `(i, j)`, `None` outside the fluid.
    pub(super) fn value(&self, i: i64, j: i64) -> Option<f64> {
        self.value_of(self.node(i, j)?)
    }

    /// Derivative of `phi` half a cell beyond a node towards a side: that of the unequal-arm quadratic.
    fn slope_at_side(&self, node: Node, side: usize) -> Option<f64> {
        let (i, j, colour, index) = node;
        let centre = self.value_of(node)?;
        let axis = usize::from(side == SOUTH || side == NORTH);
        let (arms, ends) = if let Some(wall) = self.wall_node(colour, index) {
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
        Some(if side == EAST || side == NORTH {
            first + 0.5 * second
        } else {
            first - 0.5 * second
        })
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
        let (low, high) = (self.node(a, b), self.node(a + along.0, b + along.1));
        if let (Some(low), Some(high)) = (low, high) {
            return Some(self.value_of(high)? - self.value_of(low)?);
        }
        let (forward, backward) = if along.0 == 1 {
            (EAST, WEST)
        } else {
            (NORTH, SOUTH)
        };
        let ahead = low.and_then(|node| self.slope_at_side(node, forward));
        ahead.or_else(|| self.slope_at_side(high?, backward))
    }

    /// First guess for a side of a cell, from whatever nodes are near.
    pub(super) fn guess(&self, i: i64, j: i64, side: usize) -> f64 {
        if let Some(here) = self.near_nodes(i, j, side) {
            return here;
        }
        let [_, across, _] = Self::pair(i, j, side);
        let step = |k: i64| self.near_nodes(i + k * across.0, j + k * across.1, side);
        let (mut sum, mut count) = (0.0, 0.0);
        for k in [1, -1] {
            if let Some(near) = step(k) {
                sum += step(2 * k).map_or(near, |far| 2.0 * near - far);
                count += 1.0;
            }
        }
        if count > 0.0 { sum / count } else { 0.0 }
    }
}
