//! Neighbouring panels of the layer on the wall as one source, for places some way off.
//!
//! With complex places `y` on the panels, `c` in their middle and `z = x - c`,
//!
//! `ln(x - y) = ln z - sum over k of ((y - c) / z)^k / k`, and its slope along `n` at `y` is
//! `-n sum over k of (y - c)^(k-1) / z^k`.
//!
//! The integrals over the panels are the coefficients of one short series for each unknown and one for what is
//! known. From [`FAR`] radii away, what is left out after [`DEGREE`] powers is within 1e-4 of the potential of the
//! panels, as for a single panel. This is the expansion of the fast multipole method (L. Greengard and V. Rokhlin 1987,
//! from memory).

use std::f64::consts::TAU;
use std::ops::Range;

use crate::geometry::{Point, distance};

use super::layer_panel::{Panel, Potential};
use super::wall_quadrature::GAUSS_4;

/// Largest distance within a cluster from its first place, spacings.
const SPAN: f64 = 2.0;
/// Distance from the middle, in radii, from which the series stand for the panels.
const FAR: f64 = 2.5;
/// Powers of a series.
const DEGREE: usize = 8;
/// Numbers of a series: the factor of the logarithm, then both parts of each power's.
const TERMS: usize = 2 * DEGREE + 1;

/// A panel with what a window knows of it.
pub(super) struct Source<'a> {
    pub(super) panel: &'a Panel,
    /// Columns of its places with their shares.
    pub(super) columns: [(usize, f64); 2],
    /// The particular part at its start, its change along it, and its slope out of the fluid in the middle.
    pub(super) start: f64,
    pub(super) change: f64,
    pub(super) slope: f64,
}

impl Source<'_> {
    /// Adds its potential at a place to a row; returns what is known of it.
    pub(super) fn potential(&self, at: Point, row: &mut [f64]) -> f64 {
        let Potential { single, double } = self.panel.potential(at);
        for (column, share) in self.columns {
            row[column] += share * single;
        }
        self.start * double[0] + self.change * double[1] - single * self.slope
    }
}

/// Panels next to each other.
pub(super) struct Cluster {
    /// Their indices.
    pub(super) sources: Range<usize>,
    centre: Point,
    radius: f64,
}

/// All sources in their order, cut into clusters.
pub(super) fn clusters(sources: &[Source<'_>]) -> Vec<Cluster> {
    let mut found = Vec::new();
    let mut first = 0;
    while let Some(source) = sources.get(first) {
        let start = source.panel.ends[0];
        let is_near = |s: &&Source<'_>| s.panel.ends.iter().all(|&p| distance(start, p) <= SPAN);
        let more = sources[first + 1..].iter().take_while(is_near).count();
        let end = first + 1 + more;
        found.push(Cluster::new(&sources[first..end], first..end));
        first = end;
    }
    found
}

impl Cluster {
    fn new(own: &[Source<'_>], sources: Range<usize>) -> Self {
        let (mut low, mut high) = ([f64::INFINITY; 2], [f64::NEG_INFINITY; 2]);
        let ends = || own.iter().flat_map(|source| source.panel.ends);
        for end in ends() {
            for axis in 0..2 {
                low[axis] = low[axis].min(end[axis]);
                high[axis] = high[axis].max(end[axis]);
            }
        }
        let centre = [0, 1].map(|axis| 0.5 * (low[axis] + high[axis]));
        Self {
            sources,
            centre,
            radius: ends().map(|end| distance(end, centre)).fold(0.0, f64::max),
        }
    }

    fn square_of_distance(&self, at: Point) -> f64 {
        (at[0] - self.centre[0]).powi(2) + (at[1] - self.centre[1]).powi(2)
    }

    /// Whether all its places are farther than a distance away.
    pub(super) fn is_beyond(&self, at: Point, distance: f64) -> bool {
        self.square_of_distance(at) > (distance + self.radius).powi(2)
    }
}

/// The series of a cluster.
pub(super) struct Expansion {
    centre: Point,
    /// Square of the distance from which they may be used.
    far: f64,
    /// What is known.
    known: [f64; TERMS],
    /// Columns and the series of each.
    columns: Vec<(usize, [f64; TERMS])>,
}

impl Expansion {
    /// - `own`: the sources of the cluster
    pub(super) fn new(cluster: &Cluster, own: &[Source<'_>]) -> Self {
        let mut expansion = Self {
            centre: cluster.centre,
            far: (FAR * cluster.radius).powi(2),
            known: [0.0; TERMS],
            columns: Vec::new(),
        };
        for source in own {
            expansion.add(source);
        }
        expansion
    }

    fn add(&mut self, source: &Source<'_>) {
        let panel = source.panel;
        // Integral of the logarithm, and of its slope times the particular part.
        let (mut single, mut double) = ([0.0; TERMS], [0.0; TERMS]);
        single[0] = panel.length / TAU;
        for (x, weight) in GAUSS_4 {
            let share = 0.5 * (1.0 + x);
            let weight = 0.5 * weight * panel.length / TAU;
            let value = weight * (source.start + source.change * share * panel.length);
            let [a, b] = panel.ends;
            let from_centre = [0, 1].map(|k| a[k] + share * (b[k] - a[k]) - self.centre[k]);
            let mut power = [1.0, 0.0];
            for k in 1..=DEGREE {
                let slope = times(panel.normal(), power);
                power = times(power, from_centre);
                for part in 0..2 {
                    double[2 * k - 1 + part] -= value * slope[part];
                    single[2 * k - 1 + part] -= weight * power[part] / k as f64;
                }
            }
        }
        for (known, (single, double)) in self.known.iter_mut().zip(single.iter().zip(double)) {
            *known += double - source.slope * single;
        }
        for (column, share) in source.columns {
            let series = self.series(column);
            for (sum, term) in series.iter_mut().zip(single) {
                *sum += share * term;
            }
        }
    }

    fn series(&mut self, column: usize) -> &mut [f64; TERMS] {
        let place = self.columns.iter().position(|own| own.0 == column);
        let place = place.unwrap_or_else(|| {
            self.columns.push((column, [0.0; TERMS]));
            self.columns.len() - 1
        });
        &mut self.columns[place].1
    }

    /// Adds its potential to a row where the place is far off; returns what is known of it.
    pub(super) fn potential(&self, at: Point, row: &mut [f64]) -> Option<f64> {
        let [x, y] = [0, 1].map(|axis| at[axis] - self.centre[axis]);
        let square = x * x + y * y;
        if square <= self.far {
            return None;
        }
        let inverse = [x / square, -y / square];
        let mut basis = [0.0; TERMS];
        basis[0] = 0.5 * square.ln();
        let mut power = [1.0, 0.0];
        for pair in basis[1..].chunks_exact_mut(2) {
            power = times(power, inverse);
            pair.copy_from_slice(&[power[0], -power[1]]);
        }
        for (column, series) in &self.columns {
            row[*column] += dot(series, &basis);
        }
        Some(dot(&self.known, &basis))
    }
}

/// The product of two complex numbers.
fn times(a: Point, b: Point) -> Point {
    [a[0] * b[0] - a[1] * b[1], a[0] * b[1] + a[1] * b[0]]
}

fn dot(a: &[f64; TERMS], b: &[f64; TERMS]) -> f64 {
    // Two sums side by side, which the compiler makes one vector of.
    let mut sums = [0.0; 2];
    for (a, b) in a[1..].chunks_exact(2).zip(b[1..].chunks_exact(2)) {
        sums[0] += a[0] * b[0];
        sums[1] += a[1] * b[1];
    }
    a[0] * b[0] + (sums[0] + sums[1])
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A bent wall of panels of changing lengths, each with columns, shares and a particular part of its own.
    fn wall() -> Vec<Panel> {
        let place = |k: u32| {
            let t = 0.4 * f64::from(k) + 0.1 * f64::from(k % 3);
            [t, 0.5 * (1.3 * t).sin()]
        };
        (0..20)
            .filter_map(|k| Panel::new(0, [0.0, 1.0], [place(k), place(k + 1)]))
            .collect()
    }

    fn sources(panels: &[Panel]) -> Vec<Source<'_>> {
        let of = |(k, panel)| {
            let part = k as f64;
            Source {
                panel,
                columns: [(k / 3, 1.0 - 0.04 * part), (k / 3 + 1, 0.04 * part)],
                start: part.cos(),
                change: part.sin(),
                slope: (2.0 * part).cos(),
            }
        };
        panels.iter().enumerate().map(of).collect()
    }

    #[test]
    fn clusters_hold_every_source_once_and_are_short() {
        let panels = wall();
        let sources = sources(&panels);
        let clusters = clusters(&sources);
        assert!(clusters.len() > 3);
        let held: Vec<usize> = clusters.iter().flat_map(|c| c.sources.clone()).collect();
        assert_eq!(held, (0..panels.len()).collect::<Vec<_>>());
        for cluster in &clusters {
            assert!(cluster.radius <= SPAN, "{}", cluster.radius);
            for panel in &panels[cluster.sources.clone()] {
                for end in panel.ends {
                    assert!(distance(end, cluster.centre) <= cluster.radius + 1e-12);
                    assert!(!cluster.is_beyond(end, 1e-9));
                }
            }
        }
    }

    #[test]
    fn series_far_off_are_the_potential_of_the_panels() {
        let panels = wall();
        let sources = sources(&panels);
        let mut used = 0;
        for cluster in clusters(&sources) {
            let own = &sources[cluster.sources.clone()];
            let expansion = Expansion::new(&cluster, own);
            assert!(expansion.potential(cluster.centre, &mut [0.0; 8]).is_none());
            for (away, tolerance) in [(1.01 * FAR, 1e-4), (8.0, 1e-6), (30.0, 1e-8)] {
                for turn in 0..16 {
                    let angle = TAU * f64::from(turn) / 16.0;
                    let r = away * cluster.radius;
                    let at = [
                        cluster.centre[0] + r * angle.cos(),
                        cluster.centre[1] + r * angle.sin(),
                    ];
                    let (mut fast, mut slow) = ([0.0; 8], [0.0; 8]);
                    let known: f64 = own
                        .iter()
                        .map(|source| source.potential(at, &mut slow))
                        .sum();
                    let found = expansion.potential(at, &mut fast);
                    let off = |a: f64, b: f64| assert!((a - b).abs() < tolerance, "{a} {b}");
                    off(found.unwrap_or(f64::NAN), known);
                    (0..8).for_each(|k| off(fast[k], slow[k]));
                    used += 1;
                }
            }
        }
        assert!(used > 100);
    }
}
