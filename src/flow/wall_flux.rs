//! What flows into the wall, cell by cell, from the balance of the fluxes of `grad(phi)` and not from slopes
//! at the wall.
//!
//! Over the fluid part of a cell the wall receives `area + integral of dphi/dn over its sides in the fluid`.
//! Between whole cells the flux through a side is the difference of the nodal values, which the five-point
//! scheme balances; through a side that the wall meets it is the integral of the slopes along that side, of
//! which the one at the wall follows from the curve. Two cells at a side take the same value, so along the
//! wall only the sides at the ends of a stretch count, and all cells together receive the area.

use crate::geometry::Point;
use crate::grid::{Colour, EAST, Lattice, Mask, NO_EDGE, NO_NODE, NORTH, SOUTH, WallNode};
use crate::solve::Field;

use super::wall_cells::{Cell, Chain, SidePart, chains, regions};
use super::wall_path::WallPath;

/// Slopes along a side that are interpolated, at most.
const MOST_PLACES: usize = 3;
/// Distance, in spacings, below which two of them are one.
const SAME_PLACE: f64 = 0.2;
/// Half the length of a cell's side.
const HALF: f64 = 0.5;
/// Largest relative difference between all fluxes together and the area of the section.
const BALANCED: f64 = 1e-2;

/// What a stretch of wall receives.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct WallFlux {
    pub(super) loop_index: usize,
    /// Arc lengths, m; the second may lie past the first vertex.
    pub(super) from: f64,
    pub(super) to: f64,
    /// Integral of `abs(dphi/dn)` over it, m^2.
    pub(super) flux: f64,
}

/// A node with its arms where the wall cuts one.
struct Node<'a> {
    value: f64,
    colour: Colour,
    wall: Option<&'a WallNode>,
}

struct Balance<'a> {
    mask: &'a Mask,
    phi: &'a Field,
    /// Gradient of `phi` on the wall from loop and arc length, spacings.
    at_wall: &'a dyn Fn(usize, f64) -> Option<Point>,
}

/// The fluxes into the wall, unsorted; none where the cells do not close or do not balance.
///
/// - `area`: of the section, m^2
/// - `at_wall`: gradient of `phi` at a loop and arc length, m; `None` where it is not known
pub(super) fn wall_fluxes(
    (lattice, mask, phi): (&Lattice, &Mask, &Field),
    paths: &[&WallPath],
    area: f64,
    at_wall: &dyn Fn(usize, f64) -> Option<Point>,
) -> Vec<WallFlux> {
    let unit = lattice.spacing * lattice.spacing;
    let in_spacings = |loop_index: usize, arc_length: f64| {
        at_wall(loop_index, arc_length).map(|g| g.map(|c| c / lattice.spacing))
    };
    let balance = Balance {
        mask,
        phi,
        at_wall: &in_spacings,
    };
    let chains = chains(lattice, paths);
    let mut found = Vec::new();
    for in_cell in chains.chunk_by(|a, b| a.cell == b.cell) {
        let Some(regions) = regions(in_cell) else {
            return Vec::new();
        };
        for region in regions {
            let inflow: f64 = region
                .sides
                .iter()
                .map(|part| balance.inflow(in_cell[0].cell, part))
                .sum();
            let length: f64 = region.chains.iter().map(|c| c.to - c.from).sum();
            let density = unit * (region.area + inflow) / length;
            found.extend(region.chains.iter().map(|chain| WallFlux {
                loop_index: chain.loop_index,
                from: chain.from,
                to: chain.to,
                flux: density * (chain.to - chain.from),
            }));
        }
    }
    found.extend(balance.whole_cells(lattice, paths, &chains));
    let total: f64 = found.iter().map(|wall| wall.flux).sum();
    if !total.is_finite() || (total / area - 1.0).abs() >= BALANCED {
        return Vec::new();
    }
    // What the solver left unbalanced.
    for wall in &mut found {
        wall.flux *= area / total;
    }
    found
}

impl Balance<'_> {
    fn node(&self, i: i64, j: i64) -> Option<Node<'_>> {
        let (i, j) = (u32::try_from(i).ok()?, u32::try_from(j).ok()?);
        let (colour, node) = self.mask.node_at(i, j)?;
        Some(Node {
            value: *self.phi.colour[colour as usize].get(node as usize)?,
            colour,
            wall: self.mask.wall_node(colour, node),
        })
    }

    /// What the whole cells at the wall do not balance, on the wall next to each.
    fn whole_cells(&self, lattice: &Lattice, paths: &[&WallPath], cut: &[Chain]) -> Vec<WallFlux> {
        let unit = lattice.spacing * lattice.spacing;
        let mut found = Vec::new();
        for w in self.mask.wall.iter().flatten() {
            let cell = (i64::from(w.i), i64::from(w.j));
            let is_cut = cut
                .binary_search_by(|c| (c.cell.1, c.cell.0).cmp(&(cell.1, cell.0)))
                .is_ok();
            let nearest = (0..4)
                .filter(|&arm| w.neighbour[arm] == NO_NODE && w.edge[arm] != NO_EDGE)
                .min_by(|&a, &b| w.arm[a].total_cmp(&w.arm[b]));
            let (false, Some(arm)) = (is_cut, nearest) else {
                continue;
            };
            let inflow: f64 = (0..4)
                .map(|side| self.inflow(cell, &SidePart::whole(side)))
                .sum();
            let edge = w.edge[arm] as usize;
            let mut at = [f64::from(w.i), f64::from(w.j)];
            at[arm / 2] += if arm % 2 == 0 {
                -w.arm[arm]
            } else {
                w.arm[arm]
            };
            let place = lattice.edges.get(edge).and_then(|wall| {
                let loop_index = wall.loop_index as usize;
                let own = edge - lattice.loop_starts[loop_index];
                let arc = paths.get(loop_index)?.on_edge(own, lattice.position(at))?;
                Some((loop_index, arc))
            });
            found.extend(place.map(|(loop_index, arc)| WallFlux {
                loop_index,
                from: arc,
                to: arc,
                flux: unit * (1.0 + inflow),
            }));
        }
        found
    }

    /// Integral of the outward slope over a part of a side.
    fn inflow(&self, (i, j): Cell, part: &SidePart) -> f64 {
        let axis = usize::from(part.side == SOUTH || part.side == NORTH);
        if part.side == EAST || part.side == NORTH {
            self.flux(axis, (i, j), part)
        } else if axis == 0 {
            -self.flux(axis, (i - 1, j), part)
        } else {
            -self.flux(axis, (i, j - 1), part)
        }
    }

    /// Integral of the slope along an axis over a part of the side between a node and the next one.
    fn flux(&self, axis: usize, (i, j): Cell, part: &SidePart) -> f64 {
        let [low, high] = part.ends;
        let beside = |k: i64| {
            if axis == 0 {
                self.slope(0, i, j + k)
            } else {
                self.slope(1, i + k, j)
            }
        };
        let centre = if low <= 0.0 && high >= 0.0 {
            beside(0)
        } else {
            None
        };
        if let (Some((slope, true)), [None, None]) = (centre, part.walls) {
            return slope * (high - low);
        }
        let mut places = [(0.0, 0.0); MOST_PLACES];
        let mut count = 0;
        let mut add = |at: f64, value: f64| {
            let near = places[..count]
                .iter()
                .any(|p: &(f64, f64)| (p.0 - at).abs() < SAME_PLACE);
            if count < MOST_PLACES && !near {
                places[count] = (at, value);
                count += 1;
            }
        };
        for end in 0..2 {
            if let Some((loop_index, arc)) = part.walls[end]
                && let Some(gradient) = (self.at_wall)(loop_index, arc)
            {
                add(part.ends[end], gradient[axis]);
            }
        }
        if let Some((slope, _)) = centre {
            add(0.0, slope);
        }
        for (end, k) in [(0, -1), (1, 1)] {
            if part.walls[end].is_none()
                && let Some((slope, _)) = beside(k)
            {
                add(k as f64, slope);
            }
        }
        integral(&places[..count], low, high)
    }

    /// Slope along an axis in the middle between a node and the next one, and whether both are fluid with no
    /// wall between; `None` in the solid.
    fn slope(&self, axis: usize, i: i64, j: i64) -> Option<(f64, bool)> {
        let (low, high) = if axis == 0 {
            (self.node(i, j), self.node(i + 1, j))
        } else {
            (self.node(i, j), self.node(i, j + 1))
        };
        let (back, forth) = (2 * axis, 2 * axis + 1);
        if let (Some(low), Some(high)) = (&low, &high)
            && low.wall.is_none_or(|w| w.neighbour[forth] != NO_NODE)
        {
            return Some((high.value - low.value, true));
        }
        let ahead = low.and_then(|node| self.beside_wall(&node, forth));
        let behind = high.and_then(|node| self.beside_wall(&node, back));
        ahead
            .or(behind.map(|slope| -slope))
            .map(|slope| (slope, false))
    }

    /// Slope half a spacing along a cut arm of a node, in its direction.
    fn beside_wall(&self, node: &Node, arm: usize) -> Option<f64> {
        let wall = node.wall?;
        let ahead = wall.arm[arm];
        if wall.neighbour[arm] != NO_NODE || ahead < HALF {
            return None;
        }
        let other = &self.phi.colour[node.colour.other() as usize];
        let back = wall.arm[arm ^ 1];
        let behind = other.get(wall.neighbour[arm ^ 1] as usize).copied();
        let before = (node.value - behind.unwrap_or(0.0)) / back;
        let after = -node.value / ahead;
        let second = 2.0 * (after - before) / (ahead + back);
        Some((before * ahead + after * back) / (ahead + back) + HALF * second)
    }
}

/// Integral of the polynomial through up to three places.
fn integral(places: &[(f64, f64)], low: f64, high: f64) -> f64 {
    let (middle, half) = (0.5 * (low + high), 0.5 * (high - low));
    let value = |x: f64| -> f64 {
        places
            .iter()
            .enumerate()
            .map(|(k, &(at, value))| {
                let others = places.iter().enumerate().filter(|&(m, _)| m != k);
                others.fold(value, |product, (_, &(y, _))| product * (x - y) / (at - y))
            })
            .sum()
    };
    // Gauss's rule with two points is exact for them.
    let step = half / 3.0_f64.sqrt();
    half * (value(middle - step) + value(middle + step))
}
