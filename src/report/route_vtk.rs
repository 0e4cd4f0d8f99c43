//! A route in space for viewers: the fluid as hexahedra (`.vtu`), a series as a collection (`.pvd`).
//!
//! The section's own `x` and `y` are kept, `z` runs along the channel, metres. Every solved section is one plane: a
//! lattice over its bounding box, on which its field is read off (bilinear) and the fluid share of the cells is
//! exact. Hexahedra join nodes of the same place in the box of neighbouring planes, so between planes a viewer
//! shows straight interpolation, which is no solution; cells without fluid at both ends are left out. Where the section is
//! the same at both ends nothing is interpolated. Branches beside each other are set apart along `x`; equal ones
//! are shown once, with their number in `parallel`. The walls are in `route_wall_vtk.rs`.

use std::fmt::Write as _;

use vtkio::model::{
    Attributes, CellType, Cells, DataSet, IOBuffer, UnstructuredGridPiece, VertexNumbers,
};

use super::route_document::RouteDocument;
use super::vtk::{VtkError, array, check_finite, scalars, with_units, xml};
use crate::flow::DenseField;
use crate::geometry::{Outline, Point};
use crate::grid::{WallEdge, coverage};
use crate::study::{RouteBranch, RouteOperation};

/// Nodes of a plane, about.
const PLANE_NODES: f64 = 2600.0;
/// Nodes of a file, about; more planes are coarser.
const FILE_NODES: f64 = 4e6;
/// Nodes along one side of a plane, least and most.
const SIDE_NODES: [f64; 2] = [9.0, 321.0];
/// Fluid share below which a cell is solid: what rounding leaves of sums that cancel.
const LEAST_FRACTION: f64 = 1e-9;
/// Room between branches, in widths of the widest section.
const BRANCH_PITCH: f64 = 1.5;

/// Where a branch lies in space.
pub(super) struct Placed<'a> {
    pub(super) segment: usize,
    pub(super) branch_index: usize,
    pub(super) branch: &'a RouteBranch,
    /// Shift along `x` and begin along `z`, m.
    pub(super) offset: [f64; 2],
}

/// Every branch with its place: segments follow each other, branches side by side.
pub(super) fn placed<'a>(document: &RouteDocument<'a>) -> Vec<Placed<'a>> {
    let mut all = Vec::new();
    let mut z = 0.0;
    for (s, segment) in document.route.segments.iter().enumerate() {
        let widths = segment.branches.iter().flat_map(|b| &b.points);
        let widths = widths.map(|p| document.route.flows[p.flow].flow.geometry.width);
        let pitch = BRANCH_PITCH * widths.fold(0.0, f64::max);
        let middle = 0.5 * (segment.branches.len() as f64 - 1.0);
        for (b, branch) in segment.branches.iter().enumerate() {
            all.push(Placed {
                segment: s,
                branch_index: b,
                branch,
                offset: [(b as f64 - middle) * pitch, z],
            });
        }
        z += segment
            .branches
            .iter()
            .map(|b| b.length)
            .fold(0.0, f64::max);
    }
    all
}

/// The fluid of a route at one of its operating points as `.vtu` text.
///
/// Point data: `velocity` (axial, m/s), `phi` (m^2), `pressure` (Pa above the end of the route). Cell data:
/// `fluid_fraction` (0 to 1, mean of both ends), `segment` and `branch` (index), `parallel` (number of equal ones).
///
/// # Errors
/// [`VtkError`] when a section was solved without its field, or a value is not finite.
pub fn route_vtu(
    document: &RouteDocument<'_>,
    operation: &RouteOperation,
) -> Result<String, VtkError> {
    let planes: usize = document.route.branches().map(|b| b.points.len()).sum();
    let nodes = PLANE_NODES.min(FILE_NODES / planes.max(1) as f64);
    let mut mesh = Mesh::default();
    for place in placed(document) {
        mesh.add_branch(document, operation, &place, nodes)?;
    }
    mesh.text()
}

/// The collection of the files of a series: `.pvd` text.
///
/// - `steps`: flow rate (m^3/s), names of the files of fluid and wall, relative to the collection
pub fn route_pvd(steps: &[(f64, String, String)]) -> String {
    let mut out = "<?xml version=\"1.0\"?>\n<VTKFile type=\"Collection\" version=\"0.1\" \
                   byte_order=\"LittleEndian\">\n<!-- timestep: flow rate in m^3/s -->\n<Collection>\n"
        .to_owned();
    for (rate, fluid, wall) in steps {
        for (part, file) in [fluid, wall].into_iter().enumerate() {
            let file = escaped(file);
            let _ = writeln!(
                out,
                "<DataSet timestep=\"{rate:?}\" group=\"\" part=\"{part}\" file=\"{file}\"/>"
            );
        }
    }
    out.push_str("</Collection>\n</VTKFile>\n");
    out
}

fn escaped(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in super::numbers::one_line(text).chars() {
        match c {
            '&' => out.push_str("&amp;"),
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '"' => out.push_str("&quot;"),
            c => out.push(c),
        }
    }
    out
}

#[derive(Default)]
struct Mesh {
    points: Vec<f64>,
    velocity: Vec<f64>,
    phi: Vec<f64>,
    pressure: Vec<f64>,
    connectivity: Vec<u64>,
    fraction: Vec<f64>,
    segment: Vec<u64>,
    branch: Vec<u64>,
    parallel: Vec<u64>,
}

/// One section on its lattice.
struct Plane {
    nodes: Vec<[f64; 3]>,
    phi: Vec<f64>,
    /// Share of each cell that is fluid.
    fraction: Vec<f64>,
    /// `u / phi`, 1/(m s).
    velocity: f64,
    pressure: f64,
}

impl Mesh {
    fn add_branch(
        &mut self,
        document: &RouteDocument<'_>,
        operation: &RouteOperation,
        place: &Placed<'_>,
        nodes: f64,
    ) -> Result<(), VtkError> {
        let flows = &document.route.flows;
        let points = &place.branch.points;
        let aspect = points
            .iter()
            .map(|p| flows[p.flow].flow.geometry.width / flows[p.flow].flow.geometry.height)
            .fold(0.0, f64::max);
        let [least, most] = SIDE_NODES;
        let rows = (nodes / aspect).sqrt().clamp(least, most).round();
        let columns = (nodes / rows).clamp(least, most).round() as usize;
        let size = [columns, rows as usize];
        let of_flow = operation.segments.get(place.segment);
        let of_flow = of_flow.and_then(|s| s.branches.get(place.branch_index));
        let mut planes = Vec::with_capacity(points.len());
        for (index, point) in points.iter().enumerate() {
            let solved = &flows[point.flow];
            let field = solved.field.as_ref().ok_or(VtkError::NoField)?;
            let z = place.offset[1] + point.position;
            let rate = of_flow.map_or(0.0, |o| o.flow_rate);
            let mut plane = plane(&solved.outline, field, size, [place.offset[0], z]);
            plane.velocity = rate / solved.flow.conductance.value;
            plane.pressure = of_flow
                .and_then(|o| o.points.get(index))
                .map_or(0.0, |at| at.pressure);
            planes.push(plane);
        }
        self.add_planes(&planes, size, place);
        Ok(())
    }

    /// Hexahedra between neighbouring planes; nodes that none needs are left out.
    fn add_planes(&mut self, planes: &[Plane], [columns, rows]: [usize; 2], place: &Placed<'_>) {
        let cells = |plane: usize, cell: usize| planes[plane].fraction[cell];
        let mut numbers: Vec<Vec<Option<u64>>> =
            planes.iter().map(|p| vec![None; p.nodes.len()]).collect();
        for step in 1..planes.len() {
            for j in 0..rows - 1 {
                for i in 0..columns - 1 {
                    let cell = j * (columns - 1) + i;
                    let fraction = 0.5 * (cells(step - 1, cell) + cells(step, cell));
                    if fraction <= LEAST_FRACTION {
                        continue;
                    }
                    let at = j * columns + i;
                    for plane in [step - 1, step] {
                        for node in [at, at + 1, at + columns + 1, at + columns] {
                            let number = *numbers[plane][node]
                                .get_or_insert_with(|| self.push_node(&planes[plane], node));
                            self.connectivity.push(number);
                        }
                    }
                    self.fraction.push(fraction);
                    self.segment.push(place.segment as u64);
                    self.branch.push(place.branch_index as u64);
                    self.parallel.push(place.branch.count as u64);
                }
            }
        }
    }

    fn push_node(&mut self, plane: &Plane, node: usize) -> u64 {
        self.points.extend(plane.nodes[node]);
        self.phi.push(plane.phi[node]);
        self.velocity.push(plane.phi[node] * plane.velocity);
        self.pressure.push(plane.pressure);
        self.phi.len() as u64 - 1
    }

    fn text(self) -> Result<String, VtkError> {
        check_finite("velocity", self.velocity.iter().copied())?;
        check_finite("pressure", self.pressure.iter().copied())?;
        check_finite("position", self.points.iter().copied())?;
        let count = self.fraction.len();
        let data = Attributes {
            point: vec![
                scalars("velocity", IOBuffer::F64(self.velocity)),
                array("phi", 1, IOBuffer::F64(self.phi)),
                array("pressure", 1, IOBuffer::F64(self.pressure)),
            ],
            cell: vec![
                scalars("fluid_fraction", IOBuffer::F64(self.fraction)),
                array("segment", 1, IOBuffer::U64(self.segment)),
                array("branch", 1, IOBuffer::U64(self.branch)),
                array("parallel", 1, IOBuffer::U64(self.parallel)),
            ],
        };
        let piece = UnstructuredGridPiece {
            points: IOBuffer::F64(self.points),
            cells: Cells {
                cell_verts: VertexNumbers::XML {
                    connectivity: self.connectivity,
                    offsets: (1..=count as u64).map(|n| 8 * n).collect(),
                },
                types: vec![CellType::Hexahedron; count],
            },
            data,
        };
        let units = [
            ("velocity", "m/s"),
            ("phi", "m^2"),
            ("pressure", "Pa"),
            ("fluid_fraction", "1"),
            ("segment", "1"),
            ("branch", "1"),
            ("parallel", "1"),
        ];
        Ok(with_units(&xml(DataSet::inline(piece))?, &units))
    }
}

/// A section on the lattice of its bounding box; velocity and pressure are still to be set.
fn plane(
    outline: &Outline,
    field: &DenseField,
    [columns, rows]: [usize; 2],
    [shift, z]: [f64; 2],
) -> Plane {
    let (low, high) = outline.bounds().unwrap_or_default();
    let step = [
        (high[0] - low[0]) / (columns - 1) as f64,
        (high[1] - low[1]) / (rows - 1) as f64,
    ];
    let mut nodes = Vec::with_capacity(columns * rows);
    let mut phi = Vec::with_capacity(columns * rows);
    for j in 0..rows {
        for i in 0..columns {
            let at = [low[0] + i as f64 * step[0], low[1] + j as f64 * step[1]];
            nodes.push([at[0] + shift, at[1], z]);
            // The border of the box is wall or beyond.
            let is_border = i == 0 || j == 0 || i == columns - 1 || j == rows - 1;
            phi.push(if is_border { 0.0 } else { read_off(field, at) });
        }
    }
    let place = |p: Point| {
        let cells = [(columns - 1) as f64, (rows - 1) as f64];
        [0, 1].map(|k| ((p[k] - low[k]) / step[k]).clamp(0.0, cells[k]))
    };
    let edges = outline.loops().enumerate().flat_map(|(loop_index, wall)| {
        wall.edges()
            .map(move |(start, end)| (loop_index, start, end))
    });
    let edges = edges.map(|(loop_index, start, end)| WallEdge {
        start: place(start),
        end: place(end),
        loop_index: loop_index as _,
    });
    Plane {
        fraction: coverage(edges, columns - 1, rows - 1),
        nodes,
        phi,
        velocity: 0.0,
        pressure: 0.0,
    }
}

/// The field at a place, bilinear between its nodes.
fn read_off(field: &DenseField, at: Point) -> f64 {
    let last = [field.nodes_x - 1, field.nodes_y - 1];
    let along: [(usize, f64); 2] = [0, 1].map(|k| {
        let place = ((at[k] - field.origin[k]) / field.spacing).clamp(0.0, last[k] as f64);
        let cell = (place as usize).min(last[k].saturating_sub(1));
        (cell, place - cell as f64)
    });
    let [(i, s), (j, t)] = along;
    let node = |i: usize, j: usize| field.phi[j * field.nodes_x + i];
    let low = (1.0 - s) * node(i, j) + s * node(i + 1, j);
    let high = (1.0 - s) * node(i, j + 1) + s * node(i + 1, j + 1);
    (1.0 - t) * low + t * high
}
