//! Wall shear beside re-entrant corners that the grid hardly resolves, from Green's third identity.
//!
//! Beside such a corner slopes at the wall are wrong by their own size, while nodes two to six spacings away
//! are good. In a window around it, `u = phi - p` with `p = -(N . (x - x0))^2 / 2` is harmonic in the fluid,
//! and with `g = ln r / (2 pi)`
//!
//! `integral over the wall of [g (q + dp/dn) - p dg/dn] ds + h(x) = u(x)` in the fluid, `0` in the solid,
//!
//! where `q` is the wall shear and `h`, the part of everything outside the window, a harmonic polynomial.
//! `q` is the leading powers of the corners times a factor that is linear between a few places of each
//! stretch (module `layer_panel`); these factors and the polynomial are fitted by least squares to the nodes and to
//! the zero just behind the wall (module `layer_window`). So the wall as it is decides how the shear goes from corner
//! to corner, whatever bends and neighbours it has, and the nodes decide how large it is. Where a window has too much
//! wall or too few nodes, or the fit gives a shear that is not positive, the slopes stand.
//!
//! Source: the identity is Green's; asking for zero in the solid is the null-field method (P. C. Waterman
//! 1965), both from memory.

use std::collections::HashMap;
use std::f64::consts::TAU;

use rayon::iter::{IntoParallelRefIterator, ParallelIterator};

use crate::geometry::{Corner, Point, distance};
use crate::grid::{Lattice, Mask};
use crate::solve::Field;

use super::layer_panel::{LayerStretch, Panel};
use super::layer_window::{Frame, Window};
use super::wall_path::{WallPath, taken_round, way_forward};

/// Longest way between the first and the last corner of one window, spacings.
const GROUP: f64 = 7.0;
/// Farthest from a corner that shear is given, spacings.
const REACH: f64 = 5.0;
/// From the ends of what a window gives to the end of its wall, spacings.
const WALL_MARGIN: f64 = 8.0;
/// The same to the end of its nodes and of the corners whose grid error is fitted along, spacings.
const NODE_MARGIN: f64 = 6.0;
/// Nearest place to a corner at which shear is given, spacings.
const NEAREST: f64 = 0.02;
/// Distance along the sides of a corner that gives their directions, spacings.
const CHORD: f64 = 2.0;
/// Panels above which a window holds more wall than its nodes can tell apart.
const MOST_PANELS: usize = 400;
/// Width of the squares that panels and corners are sorted into, spacings.
const SQUARE: f64 = 16.0;

/// A corner as the layer sees it.
pub(super) struct LayerCorner {
    loop_index: usize,
    /// m.
    arc_length: f64,
    /// Place on the lattice, spacings.
    pub(super) at: Point,
    /// Direction of the side that leaves it, and fluid angle, radians.
    pub(super) first: f64,
    pub(super) angle: f64,
    is_re_entrant: bool,
    is_wanted: bool,
    /// Farthest that shear is given before and after it, spacings.
    reach: [f64; 2],
}

/// Things by their place on the lattice.
struct Squares(HashMap<[i64; 2], Vec<usize>>);

impl Squares {
    fn new(places: impl Iterator<Item = Point>) -> Self {
        let mut squares: HashMap<[i64; 2], Vec<usize>> = HashMap::new();
        for (index, place) in places.enumerate() {
            squares
                .entry(place.map(Self::square))
                .or_default()
                .push(index);
        }
        Self(squares)
    }

    fn square(coordinate: f64) -> i64 {
        (coordinate / SQUARE).floor() as i64
    }

    /// Indices of what lies within a distance of a place, in order; `None` where these are more than a number.
    fn near(
        &self,
        (centre, radius): (Point, f64),
        most: usize,
        lies: impl Fn(usize) -> bool,
    ) -> Option<Vec<usize>> {
        let range = |axis: usize| {
            let [low, high] = [-radius, radius].map(|r| Self::square(centre[axis] + r));
            low..=high
        };
        let squares = range(1).flat_map(|j| range(0).map(move |i| [i, j]));
        let all = squares.filter_map(|square| self.0.get(&square)).flatten();
        let inside = all.copied().filter(|&index| lies(index));
        let mut found: Vec<usize> = inside.take(most.saturating_add(1)).collect();
        found.sort_unstable();
        (found.len() <= most).then_some(found)
    }
}

/// The wall around corners as a layer of slopes.
struct WallLayer<'a> {
    solution: (&'a Lattice, &'a Mask, &'a Field),
    paths: &'a [&'a WallPath],
    stretches: Vec<LayerStretch>,
    panels: Vec<Panel>,
    panel_squares: Squares,
    corners: Vec<LayerCorner>,
    corner_squares: Squares,
}

/// Arc lengths and shear per gradient beside the wanted corners by loop, sorted, m.
///
/// - `wanted`: whether shear is wanted beside each corner of each loop
/// - `typical`: shear per gradient that is typical of the section, m
pub(super) fn layer_samples(
    solution: (&Lattice, &Mask, &Field),
    paths: &[&WallPath],
    corners: &[Vec<Corner>],
    wanted: &[Vec<bool>],
    typical: f64,
) -> Vec<Vec<(f64, f64)>> {
    if !wanted.iter().flatten().any(|&wanted| wanted) {
        return vec![Vec::new(); paths.len()];
    }
    WallLayer::new(solution, paths, corners, wanted).samples(typical)
}

impl<'a> WallLayer<'a> {
    fn new(
        solution: (&'a Lattice, &'a Mask, &'a Field),
        paths: &'a [&'a WallPath],
        corners: &[Vec<Corner>],
        wanted: &[Vec<bool>],
    ) -> Self {
        let lattice = solution.0;
        let mut stretches: Vec<LayerStretch> = Vec::new();
        let mut panels = Vec::new();
        let mut layer_corners = Vec::new();
        for (loop_index, path) in paths.iter().enumerate() {
            let along = AlongLoop {
                path,
                corners: &corners[loop_index],
                wanted: &wanted[loop_index],
                lattice,
            };
            for (ends, start, length) in along.stretches() {
                let first = stretches.last().map_or(0, LayerStretch::next_first);
                let place = (start, length, lattice.spacing);
                let stretch = LayerStretch::new(loop_index, ends, place, first);
                panels.extend(stretch.panels(stretches.len(), path, lattice));
                stretches.push(stretch);
            }
            let count = along.corners.len();
            layer_corners.extend((0..count).map(|k| along.corner(loop_index, k)));
        }
        Self {
            solution,
            paths,
            stretches,
            panel_squares: Squares::new(panels.iter().map(Panel::middle)),
            panels,
            corner_squares: Squares::new(layer_corners.iter().map(|c| c.at)),
            corners: layer_corners,
        }
    }

    fn samples(&self, typical: f64) -> Vec<Vec<(f64, f64)>> {
        let spacing = self.solution.0.spacing;
        let groups = self.groups();
        let windows = groups.par_iter().map(|group| {
            let samples = self.window(group, typical / spacing).unwrap_or_default();
            (group[0].loop_index, samples)
        });
        let windows: Vec<(usize, Vec<(f64, f64)>)> = windows.collect();
        let mut found: Vec<Vec<(f64, f64)>> = vec![Vec::new(); self.paths.len()];
        for (loop_index, samples) in windows {
            let total = self.paths[loop_index].length();
            let samples = samples.into_iter();
            found[loop_index].extend(samples.map(|(s, v)| (taken_round(s, total), v * spacing)));
        }
        for own in &mut found {
            own.sort_by(|a, b| a.0.total_cmp(&b.0));
        }
        found
    }

    /// The wanted corners by windows; none is empty.
    fn groups(&self) -> Vec<Vec<&LayerCorner>> {
        let longest = GROUP * self.solution.0.spacing;
        let mut groups: Vec<Vec<&LayerCorner>> = Vec::new();
        for corner in self.corners.iter().filter(|c| c.is_wanted) {
            match groups.last_mut() {
                Some(group)
                    if group[0].loop_index == corner.loop_index
                        && corner.arc_length - group[0].arc_length <= longest =>
                {
                    group.push(corner);
                }
                _ => groups.push(vec![corner]),
            }
        }
        groups
    }

    /// Arc lengths, m, and shear, spacings, beside a few neighbouring corners.
    fn window(&self, group: &[&LayerCorner], typical: f64) -> Option<Vec<(f64, f64)>> {
        let lattice = self.solution.0;
        let spacing = lattice.spacing;
        let (first, last) = (group.first()?, group.last()?);
        let path = self.paths[first.loop_index];
        let low = first.arc_length - first.reach[0] * spacing;
        let high = last.arc_length + last.reach[1] * spacing;
        let at = |s: f64| lattice.coordinates(path.position(s));
        let centre = at(0.5 * (low + high));
        let half = [low, high, first.arc_length, last.arc_length]
            .map(|s| distance(centre, at(s)))
            .into_iter()
            .fold(0.0, f64::max);
        let frame = Frame {
            centre,
            normal: path.chord_normal(low, high),
            wall_radius: half + WALL_MARGIN,
            node_radius: half + NODE_MARGIN,
        };
        let window = Window::new(
            &frame,
            self.panels_near(&frame)?,
            self.corners_near(&frame)?,
        );
        let behind = |panel: &Panel| {
            let s = 0.5 * (panel.span[0] + panel.span[1]);
            s.min(self.stretches[panel.stretch].length - s)
        };
        let factors = window.factors(self.solution, behind, typical)?;
        let total = path.length();
        let mut found = Vec::new();
        for panel in window.panels() {
            let stretch = &self.stretches[panel.stretch];
            if stretch.loop_index != first.loop_index {
                continue;
            }
            for s in [panel.span[0], 0.5 * (panel.span[0] + panel.span[1])] {
                let arc_length = stretch.start + s * spacing;
                let is_inside = [-total, 0.0, total]
                    .iter()
                    .any(|turn| arc_length + turn > low && arc_length + turn <= high);
                if !is_inside || s.min(stretch.length - s) < NEAREST {
                    continue;
                }
                let factor = window.factor(&factors, stretch.shares(s))?;
                if !(factor > 0.0 && factor.is_finite()) {
                    return None;
                }
                found.push((arc_length, factor * stretch.weight(s)));
            }
        }
        Some(found)
    }

    /// `None` where the window holds more wall than its nodes can tell apart.
    fn panels_near(&self, frame: &Frame) -> Option<Vec<&Panel>> {
        let is_inside = |at: Point| distance(at, frame.centre) <= frame.wall_radius;
        let lies = |index: usize| self.panels[index].ends.into_iter().all(is_inside);
        let circle = (frame.centre, frame.wall_radius);
        let near = self.panel_squares.near(circle, MOST_PANELS, lies)?;
        Some(near.into_iter().map(|index| &self.panels[index]).collect())
    }

    /// Re-entrant corners; `None` where they are more than panels may be.
    fn corners_near(&self, frame: &Frame) -> Option<Vec<&LayerCorner>> {
        let lies = |index: usize| {
            let corner = &self.corners[index];
            corner.is_re_entrant && distance(corner.at, frame.centre) <= frame.node_radius
        };
        let circle = (frame.centre, frame.node_radius);
        let near = self.corner_squares.near(circle, MOST_PANELS, lies)?;
        Some(near.into_iter().map(|index| &self.corners[index]).collect())
    }
}

/// A loop with its corners.
struct AlongLoop<'a> {
    path: &'a WallPath,
    corners: &'a [Corner],
    wanted: &'a [bool],
    lattice: &'a Lattice,
}

impl<'a> AlongLoop<'a> {
    /// From a corner to the next, m.
    fn gap(&self, index: usize) -> f64 {
        let next = &self.corners[(index + 1) % self.corners.len()];
        let from = self.corners[index].arc_length;
        way_forward(from, next.arc_length, self.path.length())
    }

    /// Corners at the ends, start and length of every stretch, m.
    fn stretches(&self) -> Vec<(Option<[&'a Corner; 2]>, f64, f64)> {
        let (corners, count) = (self.corners, self.corners.len());
        if corners.is_empty() {
            return vec![(None, 0.0, self.path.length())];
        }
        (0..count)
            .map(|k| {
                let ends = [&corners[k], &corners[(k + 1) % count]];
                (Some(ends), ends[0].arc_length, self.gap(k))
            })
            .collect()
    }

    fn corner(&self, loop_index: usize, index: usize) -> LayerCorner {
        let spacing = self.lattice.spacing;
        let count = self.corners.len();
        let (before, after) = ((index + count - 1) % count, (index + 1) % count);
        let gaps = [self.gap(before), self.gap(index)].map(|gap| gap / spacing);
        let corner = &self.corners[index];
        let at = self.lattice.coordinates(corner.at);
        let direction = |way: f64, gap: f64| {
            let r = way * CHORD.min(0.5 * gap) * spacing;
            let position = self.path.position(corner.arc_length + r);
            let p = self.lattice.coordinates(position);
            (p[1] - at[1]).atan2(p[0] - at[0])
        };
        let (first, last) = (direction(1.0, gaps[1]), direction(-1.0, gaps[0]));
        // Two wanted corners share the wall between them.
        let reach = |gap: f64, is_shared: bool| {
            let room = if is_shared { 0.5 * gap } else { gap };
            REACH.min(room)
        };
        LayerCorner {
            loop_index,
            arc_length: corner.arc_length,
            at,
            first,
            angle: (last - first).rem_euclid(TAU),
            is_re_entrant: corner.turning < 0.0,
            is_wanted: self.wanted[index],
            reach: [
                reach(gaps[0], self.wanted[before]),
                reach(gaps[1], self.wanted[after]),
            ],
        }
    }
}
