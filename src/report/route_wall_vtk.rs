//! The walls of a route in space (`.vtp`): quadrilaterals between the loops of neighbouring sections.
//!
//! Loops are joined by their share of arc length, from corner to corner where both have as many corners, else
//! from the corner farthest up and to the right. Where two sections differ in lumens or islands each wall is
//! drawn straight on to half way. Quadrilaterals turn their front out of the fluid. Axes as in `route_vtk.rs`.

use vtkio::model::{Attributes, DataSet, IOBuffer, PolyDataPiece, VertexNumbers};

use super::route_document::RouteDocument;
use super::route_vtk::{Placed, placed};
use super::vtk::{VtkError, array, check_finite, scalars, with_units, xml};
use crate::flow::{LoopCurve, PointKind};
use crate::geometry::{Outline, Point};
use crate::study::{RouteFlow, RouteOperation, RoutePoint};

/// Pieces around a loop, about.
const PIECES: usize = 160;
/// Corners of a loop beyond which it is rough, and joined as a whole.
const MOST_CORNERS: usize = 24;

/// The walls of a route at one of its operating points as `.vtp` text.
///
/// Point data: `wall_shear` (Pa), `pressure` (Pa above the end of the route). Cell data: `segment` and `branch`
/// (index).
///
/// # Errors
/// [`VtkError`] without walls or with a value that is not finite.
pub fn route_wall_vtp(
    document: &RouteDocument<'_>,
    operation: &RouteOperation,
) -> Result<String, VtkError> {
    let mut walls = Walls::default();
    for place in placed(document) {
        let of_flow = operation.segments.get(place.segment);
        let of_flow = of_flow.and_then(|s| s.branches.get(place.branch_index));
        let section = |index: usize| -> Option<End<'_>> {
            let point: &RoutePoint = place.branch.points.get(index)?;
            let at = of_flow.and_then(|o| o.points.get(index));
            Some(End {
                solved: &document.route.flows[point.flow],
                z: place.offset[1] + point.position,
                shift: place.offset[0],
                gradient: at.map_or(0.0, |at| at.local.pressure_gradient),
                pressure: at.map_or(0.0, |at| at.pressure),
            })
        };
        for index in 1..place.branch.points.len() {
            if let (Some(from), Some(to)) = (section(index - 1), section(index)) {
                walls.join(&from, &to, &place);
            }
        }
    }
    walls.text()
}

/// A section at its place.
struct End<'a> {
    solved: &'a RouteFlow,
    z: f64,
    shift: f64,
    gradient: f64,
    pressure: f64,
}

impl End<'_> {
    /// The same section at another place along the channel.
    fn moved(&self, z: f64, pressure: f64) -> Self {
        Self {
            z,
            pressure,
            ..*self
        }
    }

    fn curves(&self) -> &[LoopCurve] {
        &self.solved.flow.wall_shear.curve.loops
    }
}

#[derive(Default)]
struct Walls {
    points: Vec<f64>,
    shear: Vec<f64>,
    pressure: Vec<f64>,
    connectivity: Vec<u64>,
    segment: Vec<u64>,
    branch: Vec<u64>,
}

impl Walls {
    fn join(&mut self, from: &End<'_>, to: &End<'_>, place: &Placed<'_>) {
        let is_alike = shape(&from.solved.outline) == shape(&to.solved.outline);
        if is_alike {
            for (a, b) in from.curves().iter().zip(to.curves()) {
                let rings = rings(a, b);
                self.strip([(from, a), (to, b)], &rings, place);
            }
            return;
        }
        let middle = 0.5 * (from.z + to.z);
        let pressure = 0.5 * (from.pressure + to.pressure);
        for (begin, end) in [
            (from, &from.moved(middle, pressure)),
            (&to.moved(middle, pressure), to),
        ] {
            for curve in begin.curves() {
                let rings = rings(curve, curve);
                self.strip([(begin, curve), (end, curve)], &rings, place);
            }
        }
    }

    /// Quadrilaterals around one loop.
    fn strip(&mut self, ends: [(&End<'_>, &LoopCurve); 2], rings: &[[f64; 2]], place: &Placed<'_>) {
        let first = self.shear.len() as u64;
        for ring in rings {
            for ((end, curve), &arc) in ends.iter().zip(ring) {
                let [x, y] = curve.position(arc);
                self.points.extend([x + end.shift, y, end.z]);
                let top = end.solved.flow.wall_shear.max_per_gradient;
                // Beside a singular corner the curve has no bound.
                let shear = curve.shear_at(arc).clamp(0.0, top);
                self.shear.push(end.gradient * shear);
                self.pressure.push(end.pressure);
            }
        }
        let count = rings.len() as u64;
        for k in 0..count {
            let (this, next) = (first + 2 * k, first + 2 * ((k + 1) % count));
            self.connectivity.extend([this, next, next + 1, this + 1]);
            self.segment.push(place.segment as u64);
            self.branch.push(place.branch_index as u64);
        }
    }

    fn text(self) -> Result<String, VtkError> {
        if self.shear.is_empty() {
            return Err(VtkError::NoWall);
        }
        check_finite("wall_shear", self.shear.iter().copied())?;
        check_finite("pressure", self.pressure.iter().copied())?;
        check_finite("wall position", self.points.iter().copied())?;
        let count = self.segment.len() as u64;
        let piece = PolyDataPiece {
            points: IOBuffer::F64(self.points),
            polys: Some(VertexNumbers::XML {
                connectivity: self.connectivity,
                offsets: (1..=count).map(|n| 4 * n).collect(),
            }),
            data: Attributes {
                point: vec![
                    scalars("wall_shear", IOBuffer::F64(self.shear)),
                    array("pressure", 1, IOBuffer::F64(self.pressure)),
                ],
                cell: vec![
                    array("segment", 1, IOBuffer::U64(self.segment)),
                    array("branch", 1, IOBuffer::U64(self.branch)),
                ],
            },
            ..PolyDataPiece::default()
        };
        let units = [
            ("wall_shear", "Pa"),
            ("pressure", "Pa"),
            ("segment", "1"),
            ("branch", "1"),
        ];
        Ok(with_units(&xml(DataSet::inline(piece))?, &units))
    }
}

/// Islands of each lumen.
fn shape(outline: &Outline) -> Vec<usize> {
    outline.lumens.iter().map(|l| l.islands.len()).collect()
}

/// Arc lengths on two loops that belong together, in order around them.
fn rings(a: &LoopCurve, b: &LoopCurve) -> Vec<[f64; 2]> {
    let (mut knots_a, mut knots_b) = (knots(a), knots(b));
    if knots_a.len() != knots_b.len() || knots_a.len() > MOST_CORNERS {
        knots_a.truncate(1);
        knots_b.truncate(1);
    }
    let (length_a, length_b) = (a.length(), b.length());
    let count = knots_a.len();
    let stretch = |knots: &[f64], k: usize, whole: f64| {
        let next = knots[(k + 1) % count];
        let way = (next - knots[k]).rem_euclid(whole);
        if count == 1 { whole } else { way }
    };
    let mut rings = Vec::new();
    for k in 0..count {
        let ways = [
            stretch(&knots_a, k, length_a),
            stretch(&knots_b, k, length_b),
        ];
        let share = (ways[0] / length_a).max(ways[1] / length_b);
        let pieces = (share * PIECES as f64).ceil().max(1.0) as usize;
        for piece in 0..pieces {
            let part = piece as f64 / pieces as f64;
            rings.push([
                (knots_a[k] + part * ways[0]).rem_euclid(length_a),
                (knots_b[k] + part * ways[1]).rem_euclid(length_b),
            ]);
        }
    }
    rings
}

/// Arc lengths of the corners of a loop, from the one farthest up and to the right; that place alone where the loop
/// has none.
fn knots(curve: &LoopCurve) -> Vec<f64> {
    let (mut low, mut high) = ([f64::INFINITY; 2], [f64::NEG_INFINITY; 2]);
    for point in &curve.points {
        for k in 0..2 {
            low[k] = low[k].min(point.at[k]);
            high[k] = high[k].max(point.at[k]);
        }
    }
    let rank = |p: Point| {
        let along = |k: usize| (p[k] - low[k]) / (high[k] - low[k]).max(f64::MIN_POSITIVE);
        along(0) + along(1)
    };
    let is_corner = |p: &&crate::flow::CurvePoint| p.kind != PointKind::Regular;
    let has_corners = curve.points.iter().any(|p| is_corner(&p));
    let mut found: Vec<(f64, f64)> = Vec::new();
    for point in curve.points.iter().filter(|p| !has_corners || is_corner(p)) {
        // A corner is entered twice.
        if found.last().is_none_or(|last| last.0 < point.arc_length) {
            found.push((point.arc_length, rank(point.at)));
        }
    }
    let best = (0..found.len()).max_by(|&i, &j| found[i].1.total_cmp(&found[j].1));
    found.rotate_left(best.unwrap_or(0));
    let mut arcs: Vec<f64> = found.into_iter().map(|(arc, _)| arc).collect();
    if !has_corners {
        arcs.truncate(1);
    }
    if arcs.is_empty() {
        arcs.push(0.0);
    }
    arcs
}
