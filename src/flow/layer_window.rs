//! The fit of a layer on the wall to the nodes in a window (module `wall_layer`).
//!
//! Unknown are the factors of the shear at the places of the stretches, the harmonic polynomial
//! `sum of a_k Re z^k + b_k Im z^k` for what is outside, and for each re-entrant corner the error
//! `r^(-pi/omega) sin(pi theta/omega)` that it spreads over the nodes. Rows are the nodes of one colour of the
//! checkerboard and a place behind each panel.

use std::f64::consts::{PI, TAU};

use nalgebra::{DMatrix, DVector};

use crate::geometry::{Point, distance};
use crate::grid::{Lattice, Mask};
use crate::solve::Field;

use super::layer_cluster::{Cluster, Expansion, Source, clusters};
use super::layer_panel::Panel;
use super::wall_layer::LayerCorner;
use super::wall_path::taken_round;

/// Degree of the harmonic polynomial.
const DEGREE: usize = 5;
/// Distances of the nodes from the wall, spacings: nearer ones carry the error of the cut cells.
const NEAREST: f64 = 2.0;
const FARTHEST: f64 = 6.0;
/// Nearest node to a re-entrant corner, spacings.
const FROM_CORNER: f64 = 3.0;
/// Depth behind the wall where zero is asked for, spacings, and as a share of the distance to a corner.
const DEPTH: f64 = 0.5;
const DEPTH_SHARE: f64 = 0.4;
/// Panels per zero.
const PANELS_PER_ZERO: usize = 2;
/// Weight of a zero behind one spacing of wall against a node.
const ZERO_WEIGHT: f64 = 6.0;
/// Weight that keeps the factors near the typical shear, against a node.
const RIDGE: f64 = 1e-3;
/// The same for the other unknowns, as a share of their part in the normal equations.
const OTHER_RIDGE: f64 = 1e-8;
/// Nodes per unknown below which they are too few.
const LEAST_NODES: f64 = 0.5;

/// Where a window lies; spacings.
pub(super) struct Frame {
    pub(super) centre: Point,
    /// Mean normal of the wall that shear is wanted for.
    pub(super) normal: Point,
    /// Distance from the centre up to which the wall is part of the layer.
    pub(super) wall_radius: f64,
    /// The same for the nodes.
    pub(super) node_radius: f64,
}

impl Frame {
    fn off(&self, at: Point) -> f64 {
        (at[0] - self.centre[0]) * self.normal[0] + (at[1] - self.centre[1]) * self.normal[1]
    }

    /// A solution of `-lap(p) = 1`, squared spacings.
    fn particular(&self, at: Point) -> f64 {
        -0.5 * self.off(at).powi(2)
    }

    /// What is outside the window is a polynomial in the middle rather than at the edge.
    fn fade(&self, at: Point) -> f64 {
        let share = distance(at, self.centre) / self.wall_radius;
        (1.0 - share * share).max(0.0).powi(2)
    }
}

/// The wall and the corners around a few corners.
pub(super) struct Window<'a> {
    frame: &'a Frame,
    sources: Vec<Source<'a>>,
    clusters: Vec<Cluster>,
    /// Indices of the places, in order.
    places: Vec<usize>,
    corners: Vec<&'a LayerCorner>,
}

/// Weighted rows, one after the other, and their right sides.
struct Rows {
    width: usize,
    values: Vec<f64>,
    right: Vec<f64>,
}

impl Rows {
    fn add(&mut self, row: &[f64], right: f64, weight: f64) {
        self.values.extend(row.iter().map(|x| weight * x));
        self.right.push(weight * right);
    }

    /// The normal equations.
    fn normal(self) -> (DMatrix<f64>, DVector<f64>) {
        let rows = DMatrix::from_vec(self.width, self.right.len(), self.values);
        let right = &rows * DVector::from_vec(self.right);
        (&rows * rows.transpose(), right)
    }
}

impl<'a> Window<'a> {
    pub(super) fn new(
        frame: &'a Frame,
        panels: Vec<&'a Panel>,
        corners: Vec<&'a LayerCorner>,
    ) -> Self {
        let all = panels.iter().flat_map(|p| p.shares.map(|(place, _)| place));
        let mut places: Vec<usize> = all.collect();
        places.sort_unstable();
        places.dedup();
        let column = |place: usize| places.partition_point(|&p| p < place);
        let source = |panel: &'a Panel| {
            let normal = panel.normal();
            let along = frame.normal[0] * normal[0] + frame.normal[1] * normal[1];
            let [start, end] = panel.ends.map(|at| frame.particular(at));
            Source {
                panel,
                columns: panel.shares.map(|(place, share)| (column(place), share)),
                start,
                change: (end - start) / panel.length,
                slope: -frame.off(panel.middle()) * along,
            }
        };
        let sources: Vec<Source<'a>> = panels.into_iter().map(source).collect();
        Self {
            frame,
            clusters: clusters(&sources),
            sources,
            places,
            corners,
        }
    }

    pub(super) fn panels(&self) -> impl Iterator<Item = &'a Panel> {
        self.sources.iter().map(|source| source.panel)
    }

    /// The factor of the shear between two places; `None` where they are no part of the window.
    pub(super) fn factor(&self, factors: &[f64], shares: [(usize, f64); 2]) -> Option<f64> {
        let mut sum = 0.0;
        for (place, share) in shares.into_iter().filter(|&(_, share)| share > 0.0) {
            sum += share * factors.get(self.places.binary_search(&place).ok()?)?;
        }
        Some(sum)
    }

    /// Factors of the shear at the places; `None` with too few nodes for the wall.
    ///
    /// - `from_corner`: distance of a panel from the nearer corner along the wall
    /// - `typical`: shear that the factors keep near where nothing else decides, spacings
    pub(super) fn factors(
        &self,
        (_, mask, phi): (&Lattice, &Mask, &Field),
        from_corner: impl Fn(&Panel) -> f64,
        typical: f64,
    ) -> Option<Vec<f64>> {
        let (own, width) = (self.places.len(), self.width());
        let mut rows = Rows {
            width,
            values: Vec::new(),
            right: Vec::new(),
        };
        let mut row = vec![0.0; width];
        let nodes = self.nodes(mask, phi);
        if (nodes.len() as f64) < LEAST_NODES * width as f64 {
            return None;
        }
        let expand = |cluster| Expansion::new(cluster, self.sources_of(cluster));
        let expansions: Vec<Expansion> = self.clusters.iter().map(expand).collect();
        for (at, value) in nodes {
            let known = self.fill(&expansions, at, &mut row);
            self.fill_errors(at, &mut row);
            let right = known + value - self.frame.particular(at);
            rows.add(&row, right, self.frame.fade(at));
        }
        for panel in self.panels().step_by(PANELS_PER_ZERO) {
            let depth = DEPTH.min(DEPTH_SHARE * from_corner(panel));
            let (middle, normal) = (panel.middle(), panel.normal());
            let at = [0, 1].map(|axis| middle[axis] + depth * normal[axis]);
            let known = self.fill(&expansions, at, &mut row);
            let weight = ZERO_WEIGHT * panel.length.sqrt() * self.frame.fade(at);
            rows.add(&row, known, weight);
        }
        let (mut matrix, mut right) = rows.normal();
        for k in 0..width {
            if k < own {
                matrix[(k, k)] += RIDGE * RIDGE;
                right[k] += RIDGE * RIDGE * typical;
            } else {
                matrix[(k, k)] += OTHER_RIDGE * matrix[(k, k)].max(OTHER_RIDGE);
            }
        }
        let found = matrix.cholesky()?.solve(&right);
        Some(found.iter().take(own).copied().collect())
    }

    /// Number of unknowns.
    fn width(&self) -> usize {
        self.places.len() + 2 * DEGREE + 1 + self.corners.len()
    }

    /// Places of the nodes and their values, squared spacings.
    fn nodes(&self, mask: &Mask, phi: &Field) -> Vec<(Point, f64)> {
        let Frame {
            centre,
            node_radius: radius,
            ..
        } = *self.frame;
        let range = |axis: usize| {
            let low = (centre[axis] - radius).ceil().max(0.0) as u32;
            low..=(centre[axis] + radius).floor().max(0.0) as u32
        };
        let places = range(1).flat_map(|j| range(0).map(move |i| (i, j)));
        let even = places.filter(|(i, j)| (i + j) % 2 == 0);
        even.filter_map(|(i, j)| {
            let at = [f64::from(i), f64::from(j)];
            if distance(at, centre) > radius {
                return None;
            }
            let (colour, node) = mask.node_at(i, j)?;
            let value = phi.colour[colour as usize].get(node as usize)?;
            let is_near = |c: &&LayerCorner| distance(c.at, at) < FROM_CORNER;
            if self.corners.iter().any(is_near) {
                return None;
            }
            self.is_good_distance(at).then_some((at, *value))
        })
        .collect()
    }

    /// Whether a node lies neither too near to the wall nor too far from it.
    fn is_good_distance(&self, at: Point) -> bool {
        let mut is_within_reach = false;
        for cluster in &self.clusters {
            if cluster.is_beyond(at, FARTHEST) {
                continue;
            }
            for source in self.sources_of(cluster) {
                let square = source.panel.square_of_distance(at);
                if square < NEAREST * NEAREST {
                    return false;
                }
                is_within_reach |= square <= FARTHEST * FARTHEST;
            }
        }
        is_within_reach
    }

    fn sources_of(&self, cluster: &Cluster) -> &[Source<'a>] {
        self.sources.get(cluster.sources.clone()).unwrap_or(&[])
    }

    /// The part of the layer and of the polynomial in the potential at a place; returns what is known of it.
    ///
    /// - `expansions`: of the clusters
    fn fill(&self, expansions: &[Expansion], at: Point, row: &mut [f64]) -> f64 {
        row.fill(0.0);
        let mut known = 0.0;
        for (cluster, expansion) in self.clusters.iter().zip(expansions) {
            if let Some(far) = expansion.potential(at, row) {
                known += far;
                continue;
            }
            for source in self.sources_of(cluster) {
                known += source.potential(at, row);
            }
        }
        let frame = self.frame;
        let z = [0, 1].map(|axis| (at[axis] - frame.centre[axis]) / frame.wall_radius);
        let polynomial = &mut row[self.places.len()..];
        let mut power = [1.0, 0.0];
        polynomial[0] = 1.0;
        for pair in polynomial[1..=2 * DEGREE].chunks_exact_mut(2) {
            power = [
                power[0] * z[0] - power[1] * z[1],
                power[0] * z[1] + power[1] * z[0],
            ];
            pair.copy_from_slice(&power);
        }
        known
    }

    /// The errors that re-entrant corners spread over the nodes.
    fn fill_errors(&self, at: Point, row: &mut [f64]) {
        let errors = &mut row[self.places.len() + 2 * DEGREE + 1..];
        for (error, corner) in errors.iter_mut().zip(&self.corners) {
            let (x, y) = (at[0] - corner.at[0], at[1] - corner.at[1]);
            let step = PI / corner.angle;
            let theta = taken_round(y.atan2(x) - corner.first, TAU);
            if theta < corner.angle {
                *error = x.hypot(y).powf(-step) * (step * theta).sin();
            }
        }
    }
}
