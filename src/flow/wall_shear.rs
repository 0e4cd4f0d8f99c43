//! Wall shear per pressure gradient, `abs(dphi/dn)`, where the lattice lines meet the wall.
//!
//! On the wall `phi = 0`, so its gradient is normal to the wall and the derivative along a lattice line is
//! `dphi/dn` times the component of the normal on that line. The derivative is that of the cubic through the
//! wall and three places behind it. Only
//! lines that meet the wall at more than about 37 degrees are used; the lines of the other axis cover the
//! rest. The normal is that of the chord over one spacing of wall, not reaching past a corner.

use crate::geometry::{Corner, Outline, Point, corners};
use crate::grid::{ARM_DOWN, ARM_LEFT, ARM_UP, Colour, Lattice, Mask, NO_EDGE, NO_NODE, WallNode};
use crate::solve::Field;

use super::corner_field::{corner_laws, is_wedge};
use super::corner_law::CornerLaw;
use super::many::map_many;
use super::section_flow::{WallSample, WallShear};
use super::wall_curve::{ShearSources, WallCurve};
use super::wall_flux::wall_fluxes;
use super::wall_layer::layer_samples;
use super::wall_path::{WallPath, taken_round, way_forward};
use super::wall_stretch::{LAW_REACH, LAW_SHARE, SHORT};

/// Turning from which a vertex or a small arc counts as a corner.
pub(crate) const CORNER_TURNING: f64 = 10.0 * std::f64::consts::PI / 180.0;
/// Least component of the normal on the lattice line for a sample to be used.
const LEAST_COMPONENT: f64 = 0.6;
/// Places on a line that are looked at.
const PLACES: usize = 4;
/// Arm, in spacings, below which a node is too close to the wall for the slope.
const TOO_CLOSE: f64 = 0.02;
/// Distance from a re-entrant corner, in spacings, below which there is no sample.
const AT_CORNER: f64 = 0.5;

/// A loop with its corners.
struct Wall<'a> {
    path: WallPath,
    first_edge: usize,
    corners: &'a [Corner],
}

/// All loops with the corners that a grid of the given spacing sees.
pub(crate) fn corners_of(outline: &Outline, spacing: f64) -> Vec<Vec<Corner>> {
    outline
        .loops()
        .map(|wall| corners(wall, spacing, CORNER_TURNING))
        .collect()
}

/// Samples of the wall shear per gradient, by loop and arc length.
///
/// - `outline`: the outline the lattice was laid over, m
/// - `phi`: solution in lattice units on the finest grid
pub(crate) fn wall_samples(
    outline: &Outline,
    (lattice, mask, phi): (&Lattice, &Mask, &Field),
    corners: &[Vec<Corner>],
) -> Vec<WallSample> {
    let walls = walls(outline, lattice, corners);
    let mut samples = Vec::new();
    for colour in [Colour::Even, Colour::Odd] {
        for w in &mask.wall[colour as usize] {
            for arm in 0..4 {
                if w.neighbour[arm] == NO_NODE && w.edge[arm] != NO_EDGE {
                    let slope = slope_at_wall((mask, phi), colour, w, arm) * lattice.spacing;
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
    samples
}

/// Mean and samples, still without the curve and what is read from it.
pub(crate) fn without_curve(
    outline: &Outline,
    corners: &[Vec<Corner>],
    samples: Vec<WallSample>,
) -> WallShear {
    let perimeter = outline.wetted_perimeter();
    WallShear {
        mean_per_gradient: outline.area() / perimeter,
        max_per_gradient: 0.0,
        max_at: [0.0; 2],
        singular_corners: corners
            .iter()
            .flatten()
            .filter(|corner| corner.turning < 0.0)
            .map(|corner| corner.at)
            .collect(),
        samples,
        curve: WallCurve {
            loops: Vec::new(),
            singular_length: 0.0,
        },
    }
}

/// The curve through the samples, and the integral of it over the wall before it is balanced, m^2.
pub(crate) fn wall_curve(
    outline: &Outline,
    (lattice, mask, phi): (&Lattice, &Mask, &Field),
    corners: &[Vec<Corner>],
    samples: &[WallSample],
) -> (WallCurve, f64) {
    let walls = walls(outline, lattice, corners);
    let paths: Vec<&WallPath> = walls.iter().map(|wall| &wall.path).collect();
    let laws: Vec<Vec<_>> = walls
        .iter()
        .map(|wall| wall.laws((lattice, mask, phi)))
        .collect();
    let wanted: Vec<Vec<bool>> = walls
        .iter()
        .zip(&laws)
        .map(|(wall, laws)| wall.needs_layer(laws, lattice.spacing))
        .collect();
    let typical = outline.area() / outline.wetted_perimeter();
    let layer = layer_samples((lattice, mask, phi), &paths, corners, &wanted, typical);
    let sources = ShearSources {
        samples,
        layer: &layer,
        laws: &laws,
    };
    let curve = WallCurve::from_sources(outline, corners, &sources, lattice.spacing);
    let at_wall = |loop_index: usize, arc_length: f64| -> Option<Point> {
        let wall: &Wall = walls.get(loop_index)?;
        let s = taken_round(arc_length, wall.path.length());
        let normal = wall.normal(s, lattice.spacing)?;
        let shear = curve.loops.get(loop_index)?.shear_at(s);
        shear.is_finite().then(|| normal.map(|c| -shear * c))
    };
    let fluxes = wall_fluxes((lattice, mask, phi), &paths, outline.area(), &at_wall);
    let (balanced, plain) = curve.balanced(&fluxes);
    (balanced.with_points(), plain)
}

fn walls<'a>(outline: &Outline, lattice: &Lattice, corners: &'a [Vec<Corner>]) -> Vec<Wall<'a>> {
    outline
        .loops()
        .zip(corners)
        .enumerate()
        .map(|(index, (wall, corners))| Wall {
            path: WallPath::new(wall),
            first_edge: lattice.loop_starts[index],
            corners,
        })
        .collect()
}

/// Derivative of `phi` along a cut arm at its wall end, pointing into the fluid; lattice units.
///
/// The derivative there of the polynomial through the wall and the next three places on the line: nodes, or
/// the opposite wall. A node very close to the wall is passed over: what it holds depends on details of the
/// wall far below the spacing.
fn slope_at_wall(grid: (&Mask, &Field), colour: Colour, w: &WallNode, arm: usize) -> f64 {
    let mut places = [(0.0, 0.0); PLACES];
    let count = places_along(grid, colour, w, arm, &mut places);
    let first = usize::from(w.arm[arm] < TOO_CLOSE && count > 2);
    let used = &places[first..count.min(first + PLACES - 1)];
    used.iter()
        .enumerate()
        .map(|(k, (x, value))| {
            let others = used.iter().enumerate().filter(|(m, _)| *m != k);
            others.fold(value / x, |product, (_, (y, _))| product * y / (y - x))
        })
        .sum()
}

/// Distances from the wall and values of the next nodes along a line, as far as the opposite wall, which
/// ends them with a zero.
fn places_along(
    (mask, phi): (&Mask, &Field),
    colour: Colour,
    w: &WallNode,
    arm: usize,
    places: &mut [(f64, f64); PLACES],
) -> usize {
    let opposite = arm ^ 1;
    let mut distance = w.arm[arm];
    let (mut colour, mut node) = (colour, w.node);
    let (mut i, mut j) = (w.i, w.j);
    for k in 0..PLACES {
        let values = &phi.colour[colour as usize];
        places[k] = (distance, values.get(node as usize).copied().unwrap_or(0.0));
        let wall = mask.wall_node(colour, node);
        let length = wall.map_or(1.0, |wall| wall.arm[opposite]);
        match opposite {
            ARM_LEFT => i = i.wrapping_sub(1),
            ARM_DOWN => j = j.wrapping_sub(1),
            ARM_UP => j += 1,
            _ => i += 1,
        }
        distance += length;
        let next = match wall {
            Some(wall) => Some(wall.neighbour[opposite]).filter(|&n| n != NO_NODE),
            None => mask.node_at(i, j).map(|(_, index)| index),
        };
        let Some(next) = next else {
            if let Some(end) = places.get_mut(k + 1) {
                *end = (distance, 0.0);
                return k + 2;
            }
            return k + 1;
        };
        (colour, node) = (colour.other(), next);
    }
    PLACES
}

fn sample(
    walls: &[Wall<'_>],
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
    let arc_length = wall.path.on_edge(edge - wall.first_edge, at)?;
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
    /// Wall from every corner to the next, m.
    fn gaps(&self) -> Vec<f64> {
        let next = self.corners.iter().cycle().skip(1);
        let gap = |(corner, next): (&Corner, &Corner)| {
            way_forward(corner.arc_length, next.arc_length, self.path.length())
        };
        self.corners.iter().zip(next).map(gap).collect()
    }

    /// Laws of the re-entrant corners from the nodes around them.
    fn laws(&self, solution: (&Lattice, &Mask, &Field)) -> Vec<Option<[CornerLaw; 2]>> {
        let gaps = self.gaps();
        let before = gaps.last().into_iter().chain(&gaps);
        let rooms = gaps.iter().zip(before).map(|(a, b)| a.min(*b));
        let cases: Vec<(&Corner, f64)> = self.corners.iter().zip(rooms).collect();
        map_many(&cases, |&(corner, room)| {
            let is_re_entrant = corner.turning < 0.0;
            is_re_entrant
                .then(|| corner_laws(solution, &self.path, corner, room))
                .flatten()
        })
    }

    /// Whether the shear beside each corner has to come from the layer, as no law describes it.
    fn needs_layer(&self, laws: &[Option<[CornerLaw; 2]>], spacing: f64) -> Vec<bool> {
        let (gaps, count) = (self.gaps(), self.corners.len());
        let is_beside =
            |corner: usize, gap: f64| gap < SHORT * spacing && self.corners[corner].turning < 0.0;
        let needs = |k: usize| {
            let (before, after) = ((k + count - 1) % count, (k + 1) % count);
            let room = gaps[before].min(gaps[k]);
            if self.corners[k].turning < 0.0 {
                return laws[k].is_none() || room < SHORT * spacing;
            }
            let reach = (LAW_SHARE * room).min(LAW_REACH * spacing);
            is_beside(before, gaps[before])
                || is_beside(after, gaps[k])
                || !is_wedge(&self.path, &self.corners[k], reach, spacing)
        };
        (0..count).map(needs).collect()
    }

    /// Unit normal out of the fluid, from the chord over one spacing that stays between corners; `None` so
    /// close to a re-entrant corner that the grid does not see the wall's direction.
    fn normal(&self, arc_length: f64, spacing: f64) -> Option<Point> {
        let total = self.path.length();
        let (mut low, mut high) = (arc_length - 0.5 * spacing, arc_length + 0.5 * spacing);
        let next = self
            .corners
            .partition_point(|corner| corner.arc_length <= arc_length);
        if let (Some(first), Some(last)) = (self.corners.first(), self.corners.last()) {
            let (before, place_before) = match next.checked_sub(1) {
                Some(index) => (&self.corners[index], self.corners[index].arc_length),
                None => (last, last.arc_length - total),
            };
            let (after, place_after) = match self.corners.get(next) {
                Some(corner) => (corner, corner.arc_length),
                None => (first, first.arc_length + total),
            };
            let at_singular = |corner: &Corner, distance: f64| {
                corner.turning < 0.0 && distance < AT_CORNER * spacing
            };
            if at_singular(before, arc_length - place_before)
                || at_singular(after, place_after - arc_length)
            {
                return None;
            }
            low = low.max(place_before);
            high = high.min(place_after);
        }
        if high - low > 1e-3 * spacing {
            Some(self.path.chord_normal(low, high))
        } else {
            Some(self.path.edge_normal(self.path.edge_at(arc_length)))
        }
    }
}
