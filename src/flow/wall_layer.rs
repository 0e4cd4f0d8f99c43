//! Wall shear beside re-entrant corners that the grid hardly resolves, from Green's third identity.
//!
//! Beside such a corner slopes at the wall are wrong by their own size, while nodes two to six spacings away
//! are good. In a window around a corner, `u = phi - p` with `p = -(N . (x - x0))^2 / 2` is harmonic in the fluid,
//! and with `g = ln r / (2 pi)`
//!
//! `integral over the wall of [g (q + dp/dn) - p dg/dn] ds + h(x) = u(x)` in the fluid, `0` in the solid,
//!
//! where `q` is the wall shear and `h`, the part of everything outside the window, is a harmonic polynomial.
//! `q` is the leading powers of the corners times a function that is linear between a few places of each
//! stretch; these values and the polynomial are fitted by least squares to the nodes and to the zero just behind
//! the wall. So the wall as it is decides how the shear goes from corner to corner, whatever bends and
//! neighbours it has, and the nodes decide how large it is.
//!
//! Source: the identity is Green's; asking for zero in the solid is the null-field method (P. C. Waterman
//! 1965), both from memory.

use std::f64::consts::{PI, TAU};

use nalgebra::{DMatrix, DVector};

use crate::geometry::{Corner, Point, distance};
use crate::grid::{Lattice, Mask};
use crate::solve::Field;

use super::wall_path::WallPath;

/// Ends of panels from a corner, spacings; beyond, one spacing each.
const GRADED: [f64; 11] = [0.0, 0.06,0.12, 0.24, 0.4,0.6, 0.9, 1.2,1.6, 2.0,2.5];
/// Places of the function from a corner, spacings; beyond, two spacings each. All are ends of panels.
const PLACES: [f64; 4] = [0.0, 0.4, 1.6, 3.5];
/// Distance from a corner up to which its power stands in the shear, spacings.
const POWER_REACH: f64 = 8.0;
/// Farthest from a corner that shear is given, spacings.

/// Longest way between corners of one window, spacings.

/// From the ends of what a window gives to the end of its wall, and of its nodes, spacings.


/// Distances of the nodes from the wall, spacings.


/// Nearest node to a re-entrant corner, spacings.

/// Depth behind the wall where zero is asked for: in spacings and as a share of the distance to a corner.


/// Degree of the harmonic polynomial.

/// Weight of a zero behind the wall against a node.

/// Weight that keeps values near that of the whole window.


/// A straight piece of the wall, in spacings.
struct Panel {
    ends: [Point; 2],
    /// Distances from the start of its stretch.
    from: f64,
    to: f64,
    /// Length of the stretch, infinite for what is no corner at an end.
    stretch: usize,
    /// Share of the shear at the places before and after.
    parts: [(usize, f64); 2],
}

struct Part {
    loop_index: usize,
    /// Arc length, m.
    start: f64,
    /// Spacings.
    length: f64,
    powers: [f64; 2],
    places: Vec<f64>,
    /// Index of the first place among all.
    first: usize,
}

impl Part {
    fn weight(&self, s: f64) -> f64 {
        let near = |r: f64, p: f64| (r.min(POWER_REACH) / POWER_REACH).powf(p);
        near(s, self.powers[0]) * near(self.length - s, self.powers[1])
    }

    /// Mean of the weight between two distances.
    fn mean_weight(&self, from: f64, to: f64) -> f64 {
        let mean = |a: f64, b: f64, p: f64| {
            let m = 0.5 * (a + b);
            if m >= POWER_REACH {
                return 1.0;
            }
            (b.powf(p + 1.0) - a.powf(p + 1.0)) / ((p + 1.0) * (b - a)) / POWER_REACH.powf(p)
        };
        mean(from, to, self.powers[0])
            * mean(self.length - to, self.length - from, self.powers[1])
    }

    /// The places before and after with their shares.
    fn shares(&self, s: f64) -> [(usize, f64); 2] {
        let next = self.places.partition_point(|&p| p <= s).clamp(1, self.places.len() - 1);
        let (a, b) = (self.places[next - 1], self.places[next]);
        let t = (s - a) / (b - a);
        [(self.first + next - 1, 1.0 - t), (self.first + next, t)]
    }
}

/// A re-entrant corner.
struct Singular {
    loop_index: usize,
    arc_length: f64,
    at: Point,
    /// Direction of the side that leaves it, and fluid angle, radians.
    first: f64,
    angle: f64,
    /// Distance along the wall to the corners before and after, spacings, and whether shear is given there too.
    gaps: [(f64, bool); 2],
    singular: bool,
}

/// Distances of the panels' ends, or of the places, along a stretch with or without corners at its ends.
fn breaks(length: f64, graded: &[f64], step: f64) -> Vec<f64> {
    let half = 0.5 * length;
    let mut first: Vec<f64> = graded.iter().copied().filter(|&r| r < 0.8 * half).collect();
    let last = first.last().copied().unwrap_or(0.0);
    let count = ((half - last) / step).round().max(1.0);
    for k in 1..=count as usize {
        first.push(last + (half - last) * k as f64 / count);
    }
    let back: Vec<f64> = first.iter().rev().skip(1).map(|r| length - r).collect();
    first.extend(back);
    first
}

/// The wall around re-entrant corners as a layer of slopes.
pub(super) struct WallLayer<'a> {
    lattice: &'a Lattice,
    mask: &'a Mask,
    phi: &'a Field,
    paths: &'a [&'a WallPath],
    parts: Vec<Part>,
    panels: Vec<Panel>,
    corners: Vec<Singular>,
}

impl<'a> WallLayer<'a> {
    /// - `wanted`: whether shear is to be given beside a corner, from the indices of loop and corner
    pub(super) fn new(
        (lattice, mask, phi): (&'a Lattice, &'a Mask, &'a Field),
        paths: &'a [&'a WallPath],
        corners: &[Vec<Corner>],
        wanted: &dyn Fn(usize, usize) -> bool,
    ) -> Self {
        let h = lattice.spacing;
        let mut layer = Self { lattice, mask, phi, paths, parts: Vec::new(), panels: Vec::new(), corners: Vec::new() };
        for (loop_index, (path, own)) in paths.iter().zip(corners).enumerate() {
            let total = path.length();
            let n = own.len();
            let gap = |k: usize| {
                let gap = own[(k + 1) % n].arc_length - own[k].arc_length;
                (if gap > 0.0 { gap } else { gap + total }) / h
            };
            if own.is_empty() {
                layer.add_part(loop_index, 0.0, total / h, [0.0; 2]);
            }
            for k in 0..n {
                let next = (k + 1) % n;
                let power = |c: &Corner| (PI / c.fluid_angle().min(1.95 * PI) - 1.0).min(1.0);
                layer.add_part(loop_index, own[k].arc_length, gap(k), [power(&own[k]), power(&own[next])]);
                {
                    let before = (k + n - 1) % n;
                    let at = layer.in_spacings(own[k].at);
                    let chord = |way: f64| {
                        let r = way.signum() * way.abs().min(0.5 * gap(if way > 0.0 { k } else { before }));
                        let p = layer.in_spacings(path.position(own[k].arc_length + r * h));
                        (p[1] - at[1]).atan2(p[0] - at[0])
                    };
                    let (first, last) = (chord(2.0), chord(-2.0));
                    layer.corners.push(Singular {
                        loop_index,
                        arc_length: own[k].arc_length,
                        at,
                        first,
                        angle: (last - first).rem_euclid(TAU),
                        singular: own[k].turning < 0.0,
                        gaps: [(gap(before), wanted(loop_index, before)), (gap(k), wanted(loop_index, next))],
                    });
                }
            }
        }
        layer
    }

    fn in_spacings(&self, at: Point) -> Point {
        [0, 1].map(|axis| (at[axis] - self.lattice.origin[axis]) / self.lattice.spacing)
    }

    fn add_part(&mut self, loop_index: usize, start: f64, length: f64, powers: [f64; 2]) {
        let h = self.lattice.spacing;
        let first = self.parts.last().map_or(0, |p| p.first + p.places.len());
        let part = Part { loop_index, start, length, powers, places: breaks(length, &PLACES, knob("HAT", 2.0)), first };
        let mut ends = breaks(length, &GRADED, knob("STEP", 0.5));
        ends.extend(&part.places);
        ends.sort_by(f64::total_cmp);
        ends.dedup_by(|a, b| *a - *b < 1e-3 * length.min(1.0));
        let stretch = self.parts.len();
        let path = self.paths[loop_index];
        let mut before = self.in_spacings(path.position(start));
        for pair in ends.windows(2) {
            let (from, to) = (pair[0], pair[1]);
            let after = self.in_spacings(path.position(start + to * h));
            let mean = part.mean_weight(from, to);
            let parts = part.shares(0.5 * (from + to)).map(|(k, share)| (k, share * mean));
            if distance(before, after) > 0.0 {
                self.panels.push(Panel { ends: [before, after], from, to, stretch, parts });
            }
            before = after;
        }
        self.parts.push(part);
    }

    /// Arc lengths and shear beside the wanted corners by loop, sorted, m.
    ///
    /// - `typical`: shear near an arc length of a loop, m
    pub(super) fn shear(&self, wanted: &dyn Fn(usize, f64) -> bool, typical: f64) -> Vec<Vec<(f64, f64)>> {
        let mut found: Vec<Vec<(f64, f64)>> = vec![Vec::new(); self.paths.len()];
        let chosen: Vec<&Singular> = self.corners.iter().filter(|c| wanted(c.loop_index, c.arc_length)).collect();
        let mut k = 0;
        while k < chosen.len() {
            let mut end = k + 1;
            let h = self.lattice.spacing;
            while end < chosen.len() && chosen[end].loop_index == chosen[k].loop_index
                && (chosen[end].arc_length - chosen[k].arc_length) / h <= knob("GROUP", 7.0) {
                end += 1;
            }
            let group = &chosen[k..end];
            if let Some(values) = self.window(group, typical / h) {
                let total = self.paths[group[0].loop_index].length();
                found[group[0].loop_index].extend(values.into_iter().map(|(s, v)| (s.rem_euclid(total), v * h)));
            }
            k = end;
        }
        for own in &mut found {
            own.sort_by(|a, b| a.0.total_cmp(&b.0));
        }
        found
    }

    /// Shear beside a few corners.
    fn window(&self, group: &[&Singular], typical: f64) -> Option<Vec<(f64, f64)>> {
        let h = self.lattice.spacing;
        let (first, last) = (group.first()?, group.last()?);
        let reach = |(gap, both): (f64, bool)| if both { knob("REACH", 5.0).min(0.5 * gap) } else { knob("REACH", 5.0).min(gap) };
        let (low, high) = (first.arc_length - reach(first.gaps[0]) * h, last.arc_length + reach(last.gaps[1]) * h);
        let path = self.paths[first.loop_index];
        let centre = self.in_spacings(path.position(0.5 * (low + high)));
        let half = [low, high, first.arc_length, last.arc_length].iter().map(|&s| distance(centre, self.in_spacings(path.position(s)))).fold(0.0, f64::max);
        let normal = path.chord_normal(low, high);
        let radius = half + knob("MARGIN", 8.0);
        let near = |p: Point, r: f64| distance(p, centre) <= r;
        let panels: Vec<&Panel> = self.panels.iter().filter(|p| near(p.ends[0], radius) && near(p.ends[1], radius)).collect();
        let mut columns: Vec<usize> = panels.iter().flat_map(|p| p.parts.map(|(k, _)| k)).collect();
        columns.sort_unstable();
        columns.dedup();
        let corners: Vec<&Singular> = self.corners.iter().filter(|c| c.singular && near(c.at, half + knob("NODE_MARGIN", 6.0))).collect();
        let window = Window { panels, columns, corners, centre, normal, radius, rows: half + knob("NODE_MARGIN", 6.0) };
        let values = window.solve(self, typical)?;
        // Shear at the ends and middles of the panels.
        let mut found = Vec::new();
        let total = path.length();
        for panel in &window.panels {
            let part = &self.parts[panel.stretch];
            if part.loop_index != first.loop_index { continue; }
            for s in [panel.from, 0.5 * (panel.from + panel.to)] {
                if s < 0.02 || part.length - s < 0.02 { continue; }
                let arc = part.start + s * h;
                let inside = [-total, 0.0, total].iter().any(|t| arc + t > low && arc + t <= high);
                if !inside { continue; }
                let mut g = 0.0;
                for (k, share) in part.shares(s) {
                    if share > 0.0 { g += share * values[window.columns.binary_search(&k).ok()?]; }
                }
                if !(g > 0.0) { return None; }
                found.push((arc, g * part.weight(s)));
            }
        }
        Some(found)
    }
}

fn knob(name: &str, default: f64) -> f64 {
    use std::sync::{Mutex, OnceLock};
    static M: OnceLock<Mutex<std::collections::HashMap<String, f64>>> = OnceLock::new();
    let m = M.get_or_init(|| Mutex::new(std::collections::HashMap::new()));
    *m.lock().unwrap().entry(name.to_owned()).or_insert_with(|| std::env::var(name).ok().and_then(|v| v.parse().ok()).unwrap_or(default))
}

struct Window<'a> {
    panels: Vec<&'a Panel>,
    columns: Vec<usize>,
    corners: Vec<&'a Singular>,
    centre: Point,
    normal: Point,
    radius: f64,
    rows: f64,
}

struct Rows {
    count: usize,
    matrix: DMatrix<f64>,
    right: DVector<f64>,
}

impl Window<'_> {
    fn particular(&self, at: Point) -> f64 {
        let d = self.off(at);
        -0.5 * d * d
    }

    fn off(&self, at: Point) -> f64 {
        (at[0] - self.centre[0]) * self.normal[0] + (at[1] - self.centre[1]) * self.normal[1]
    }

    fn solve(&self, layer: &WallLayer, typical: f64) -> Option<Vec<f64>> {
        let own = self.columns.len();
        let count = own + 2 * (knob("DEGREE", 5.0) as usize) + 1 + self.corners.len();
        let mut system = Rows { count: 0, matrix: DMatrix::zeros(count, count), right: DVector::zeros(count) };
        let mut row = vec![0.0; count];
        // Behind the wall.
        for panel in &self.panels {
            let part = &layer.parts[panel.stretch];
            let s = 0.5 * (panel.from + panel.to);
            let depth = knob("DEPTH", 0.5).min(knob("DEPTH_SHARE", 0.4) * s.min(part.length - s));
            let [a, b] = panel.ends;
            let length = distance(a, b);
            let n = [(b[1] - a[1]) / length, (a[0] - b[0]) / length];
            let at = [0.5 * (a[0] + b[0]) + depth * n[0], 0.5 * (a[1] + b[1]) + depth * n[1]];
            if let Some((known, _)) = self.fill(at, &mut row, false) {
                let weight = knob("ZERO_WEIGHT", 5.0) * length.sqrt() * self.fade(at) ;
                system.add(&row, known, weight);
            }
        }
        let range = |axis: usize| {
            let low = (self.centre[axis] - self.rows).ceil().max(0.0) as u32;
            low..=(self.centre[axis] + self.rows).floor().max(0.0) as u32
        };
        let mut nodes = 0;
        for j in range(1) {
            for i in range(0) {
                let at = [f64::from(i), f64::from(j)];
                if ((i + j) % 2 == 1 && knob("CHECK", 1.0) > 0.5) || distance(at, self.centre) > self.rows { continue; }
                let Some((colour, node)) = layer.mask.node_at(i, j) else { continue };
                let Some(&value) = layer.phi.colour[colour as usize].get(node as usize) else { continue };
                if self.corners.iter().any(|c| distance(c.at, at) < knob("FROM_CORNER", 3.0)) { continue; }
                if let Some((known, nearest)) = self.fill(at, &mut row, true) {
                    if nearest < knob("NEAREST", 2.0) || nearest > knob("FARTHEST", 6.0) { continue; }
                    system.add(&row, known + value - self.particular(at), self.fade(at));
                    nodes += 1;
                }
            }
        }
        if nodes < count / 2 { return None; }
        let scale = knob("RIDGE", 1e-3) * knob("RIDGE", 1e-3);
        for k in 0..count {
            let diagonal = system.matrix[(k, k)];
            if k < own {
                system.matrix[(k, k)] += scale;
                system.right[k] += scale * typical;
            } else {
                system.matrix[(k, k)] += 1e-8 * diagonal.max(1e-8);
            }
        }
        let found = system.matrix.cholesky()?.solve(&system.right);
        Some(found.iter().take(own).copied().collect())
    }

    fn fade(&self, at: Point) -> f64 {
        let share = distance(at, self.centre) / self.radius;
        (1.0 - share * share).max(0.0).powi(2)
    }

    /// One row and what is known of it; also the distance from the nearest end of a panel.
    fn fill(&self, at: Point, row: &mut [f64], in_fluid: bool) -> Option<(f64, f64)> {
        row.fill(0.0);
        let own = self.columns.len();
        let mut known = 0.0;
        let mut nearest = f64::INFINITY;
        let mut cached = ([f64::NAN; 2], 0.0);
        let mut column = 0;
        for panel in &self.panels {
            let [a, b] = panel.ends;
            let (u, v) = ([a[0] - at[0], a[1] - at[1]], [b[0] - at[0], b[1] - at[1]]);
            let tangent = [b[0] - a[0], b[1] - a[1]];
            let length = tangent[0].hypot(tangent[1]);
            let t = [tangent[0] / length, tangent[1] / length];
            let n = [t[1], -t[0]];
            let d = u[0] * n[0] + u[1] * n[1];
            let (ta, tb) = (u[0] * t[0] + u[1] * t[1], v[0] * t[0] + v[1] * t[1]);
            let squares = [u[0] * u[0] + u[1] * u[1], v[0] * v[0] + v[1] * v[1]];
            nearest = nearest.min(squares[0]).min(squares[1]);
            let log_a = if cached.0 == a { cached.1 } else { squares[0].ln() };
            let log_b = squares[1].ln();
            cached = (b, log_b);
            let angle = (d * (tb - ta)).atan2(d * d + ta * tb);
            let single = (0.5 * (tb * log_b - ta * log_a) - length + d * angle) / TAU;
            let (pa, pb) = (self.particular(a), self.particular(b));
            let slope = (pb - pa) / length;
            let double = ((pa - slope * ta) * angle + slope * d * 0.5 * (log_b - log_a)) / TAU;
            let middle = [0.5 * (a[0] + b[0]), 0.5 * (a[1] + b[1])];
            let normal = -self.off(middle) * (self.normal[0] * n[0] + self.normal[1] * n[1]);
            known += double - single * normal;
            for (k, share) in panel.parts {
                while self.columns[column] < k { column += 1; }
                while self.columns[column] > k { column -= 1; }
                row[column] += share * single;
            }
        }
        let z = [(at[0] - self.centre[0]) / self.radius, (at[1] - self.centre[1]) / self.radius];
        let mut power = [1.0, 0.0];
        row[own] = 1.0;
        for k in 0..(knob("DEGREE", 5.0) as usize) {
            power = [power[0] * z[0] - power[1] * z[1], power[0] * z[1] + power[1] * z[0]];
            row[own + 1 + 2 * k] = power[0];
            row[own + 2 + 2 * k] = power[1];
        }
        if in_fluid {
            for (k, c) in self.corners.iter().enumerate() {
                let (x, y) = (at[0] - c.at[0], at[1] - c.at[1]);
                let step = PI / c.angle;
                let theta = (y.atan2(x) - c.first).rem_euclid(TAU);
                if theta < c.angle && knob("DUAL", 1.0) > 0.5 {
                    row[own + 2 * (knob("DEGREE", 5.0) as usize) + 1 + k] = x.hypot(y).powf(-step) * (step * theta).sin();
                }
            }
        }
        known.is_finite().then(|| (known, nearest.sqrt()))
    }
}

impl Rows {
    fn add(&mut self, row: &[f64], value: f64, weight: f64) {
        let w = weight * weight;
        self.count += 1;
        for (k, &x) in row.iter().enumerate() {
            if x != 0.0 {
                let wx = w * x;
                self.right[k] += wx * value;
                let mut column = self.matrix.column_mut(k);
                for (m, &y) in row.iter().enumerate().skip(k) {
                    column[m] += wx * y;
                }
            }
        }
    }
}
