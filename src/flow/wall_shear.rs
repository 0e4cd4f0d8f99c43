//! Wall shear per pressure gradient, `abs(dphi/dn)`, where the lattice lines meet the wall.
//!
//! On the wall `phi = 0`, so its gradient is normal to the wall and the derivative along a lattice line is
//! `dphi/dn` times the component of the normal on that line. The derivative is that of the quadratic
//! through the wall and the two nodes (or the node and the opposite wall) behind it: second order. Only
//! lines that meet the wall at more than about 37 degrees are used; the lines of the other axis cover the
//! rest. The normal is that of the chord over one spacing of wall, not reaching past a corner.

use crate::geometry::{Corner, Loop, Outline, Point, corners};
use crate::grid::{ARM_DOWN, ARM_LEFT, ARM_UP, Colour, Lattice, Mask, NO_EDGE, NO_NODE, WallNode};
use crate::solve::Field;

use super::section_flow::{WallSample, WallShear};

/// Turning from which a vertex or a small arc counts as a corner.
pub(crate) const CORNER_TURNING: f64 = 10.0 * std::f64::consts::PI / 180.0;
/// Least component of the normal on the lattice line for a sample to be used.
const LEAST_COMPONENT: f64 = 0.6;

/// Arc lengths and corners of one loop.
struct Wall<'a> {
    outline: &'a Loop,
    first_edge: usize,
    arc: Vec<f64>,
    corners: Vec<Corner>,
}

/// All loops with the corners that a grid of the given spacing sees.
pub(crate) fn corners_of(outline: &Outline, spacing: f64) -> Vec<Vec<Corner>> {
    outline
        .loops()
        .map(|wall| corners(wall, spacing, CORNER_TURNING))
        .collect()
}

/// Samples, mean and maximum of the wall shear per gradient.
///
/// - `outline`: the outline the lattice was laid over, m
/// - `phi`: solution in lattice units on the finest grid
pub(crate) fn wall_shear(
    outline: &Outline,
    lattice: &Lattice,
    mask: &Mask,
    phi: &Field,
    corners: Vec<Vec<Corner>>,
) -> WallShear {
    let walls = walls(outline, lattice, corners);
    let mut samples = Vec::new();
    for colour in [Colour::Even, Colour::Odd] {
        let other = &phi.colour[colour.other() as usize];
        for w in &mask.wall[colour as usize] {
            let value = phi.colour[colour as usize][w.node as usize];
            for arm in 0..4 {
                if w.neighbour[arm] == NO_NODE && w.edge[arm] != NO_EDGE {
                    let slope = slope_at_wall(w, arm, value, other) * lattice.spacing;
                    samples.extend(sample(&walls, lattice, w, arm, slope));
                }
            }
        }
    }
    samples.sort_by(|a, b| {
        a.loop_index
            .cmp(&b.loop_index)
            .then(a.arc_length.total_cmp(&b.arc_length))
    });
    let largest = samples
        .iter()
        .max_by(|a, b| a.shear_per_gradient.total_cmp(&b.shear_per_gradient));
    WallShear {
        mean_per_gradient: outline.area() / outline.wetted_perimeter(),
        max_per_gradient: largest.map_or(0.0, |s| s.shear_per_gradient),
        max_at: largest.map_or([0.0; 2], |s| s.at),
        singular_corners: walls
            .iter()
            .flat_map(|wall| wall.corners.iter())
            .filter(|corner| corner.turning < 0.0)
            .map(|corner| corner.at)
            .collect(),
        samples,
    }
}

fn walls<'a>(outline: &'a Outline, lattice: &Lattice, corners: Vec<Vec<Corner>>) -> Vec<Wall<'a>> {
    outline
        .loops()
        .zip(corners)
        .enumerate()
        .map(|(index, (wall, corners))| {
            let mut arc = vec![0.0];
            let mut total = 0.0;
            for (a, b) in wall.edges() {
                total += (b[0] - a[0]).hypot(b[1] - a[1]);
                arc.push(total);
            }
            Wall {
                outline: wall,
                first_edge: lattice.loop_starts[index],
                arc,
                corners,
            }
        })
        .collect()
}

/// Derivative of `phi` along an arm at its wall end, pointing into the fluid; lattice units.
fn slope_at_wall(w: &WallNode, arm: usize, value: f64, other: &[f64]) -> f64 {
    let opposite = arm ^ 1;
    let near = w.arm[arm];
    let far = near + w.arm[opposite];
    let beyond = other
        .get(w.neighbour[opposite] as usize)
        .copied()
        .unwrap_or(0.0);
    value * far / (near * (far - near)) - beyond * near / (far * (far - near))
}

fn sample(
    walls: &[Wall],
    lattice: &Lattice,
    w: &WallNode,
    arm: usize,
    slope: f64,
) -> Option<WallSample> {
    let edge = w.edge[arm] as usize;
    let loop_index = lattice.edges.get(edge)?.loop_index as usize;
    let wall = walls.get(loop_index)?;
    // The stride of the finest grid is one.
    let mut at = [f64::from(w.i), f64::from(w.j)];
    match arm {
        ARM_LEFT => at[0] -= w.arm[arm],
        ARM_DOWN => at[1] -= w.arm[arm],
        ARM_UP => at[1] += w.arm[arm],
        _ => at[0] += w.arm[arm],
    }
    let at = lattice.position(at);
    let start = *wall.outline.points.get(edge - wall.first_edge)?;
    let arc_length = wall.arc[edge - wall.first_edge] + (at[0] - start[0]).hypot(at[1] - start[1]);
    let normal = wall.normal(arc_length, lattice.spacing)?;
    let component = if arm < ARM_DOWN { normal[0] } else { normal[1] };
    (component.abs() >= LEAST_COMPONENT).then(|| WallSample {
        loop_index,
        arc_length,
        at,
        normal,
        shear_per_gradient: (slope / component).abs(),
    })
}

impl Wall<'_> {
    /// Unit normal out of the fluid, from the chord over one spacing that stays between corners.
    fn normal(&self, arc_length: f64, spacing: f64) -> Option<Point> {
        let total = *self.arc.last()?;
        let (mut low, mut high) = (arc_length - 0.5 * spacing, arc_length + 0.5 * spacing);
        let next = self
            .corners
            .partition_point(|corner| corner.arc_length <= arc_length);
        if let (Some(first), Some(last)) = (self.corners.first(), self.corners.last()) {
            let before = match next.checked_sub(1) {
                Some(index) => self.corners[index].arc_length,
                None => last.arc_length - total,
            };
            let after = self
                .corners
                .get(next)
                .map_or(first.arc_length + total, |corner| corner.arc_length);
            low = low.max(before);
            high = high.min(after);
        }
        let (a, b) = if high - low > 1e-3 * spacing {
            (self.position(low), self.position(high))
        } else {
            let edge = self.edge_at(arc_length);
            let n = self.outline.points.len();
            (
                self.outline.points[edge],
                self.outline.points[(edge + 1) % n],
            )
        };
        let (x, y) = (b[0] - a[0], b[1] - a[1]);
        let length = x.hypot(y);
        (length > 0.0).then(|| [y / length, -x / length])
    }

    fn edge_at(&self, arc_length: f64) -> usize {
        let after = self.arc.partition_point(|&a| a <= arc_length);
        after.saturating_sub(1).min(self.outline.points.len() - 1)
    }

    fn position(&self, arc_length: f64) -> Point {
        let total = self.arc[self.arc.len() - 1];
        let s = arc_length.rem_euclid(total);
        let edge = self.edge_at(s);
        let n = self.outline.points.len();
        let (a, b) = (
            self.outline.points[edge],
            self.outline.points[(edge + 1) % n],
        );
        let length = self.arc[edge + 1] - self.arc[edge];
        let t = if length > 0.0 {
            (s - self.arc[edge]) / length
        } else {
            0.0
        };
        [a[0] + t * (b[0] - a[0]), a[1] + t * (b[1] - a[1])]
    }
}
