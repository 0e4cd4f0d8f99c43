//! Field and wall files for viewers: `.vti` (image data), `.vtp` (polylines), legacy `.vtk`.
//!
//! Point data are smooth nodal values, cell data belong to the cells between nodes. Cells without fluid
//! carry `vtkGhostType` 32 (hidden cell) and their nodes hold zero, since integrators skip hidden cells
//! but cell-to-point averaging does not. Coordinates are metres, `z = 0`; units travel as the
//! `UNITS_LABEL` key of each array. Doubles throughout: the writer library keeps origin and spacing in
//! single precision, so both are put into the finished text.

use std::fmt::Write as _;

use vtkio::model::{
    Attribute, Attributes, ByteOrder, DataArray, DataSet, Extent, IOBuffer, ImageDataPiece,
    PolyDataPiece, Version, VertexNumbers, Vtk,
};

use super::document::SolveDocument;
use super::numbers::one_line;
use crate::flow::{CurvePoint, DenseField, LoopCurve, PointKind};

/// Hidden cell in `vtkGhostType`.
const HIDDEN_CELL: u8 = 32;

/// Why a field file could not be built.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum VtkError {
    /// The field does not hold as many values as its lattice has nodes or cells.
    #[error("array `{array}` of the field holds {found} values where {expected} are needed")]
    Length {
        /// Which array.
        array: &'static str,
        /// Values found.
        found: usize,
        /// Values needed.
        expected: usize,
    },
    /// The lattice is too small or too large for the format.
    #[error(
        "a lattice of {nodes_x} x {nodes_y} nodes cannot be exported; from 2 to 2147483647 along each axis are possible"
    )]
    Lattice {
        /// Nodes along x.
        nodes_x: usize,
        /// Nodes along y.
        nodes_y: usize,
    },
    /// A value is not finite.
    #[error(
        "array `{array}` holds a value that is not finite at index {index}; the section was not solved there"
    )]
    NotFinite {
        /// Which array.
        array: &'static str,
        /// Where in it.
        index: usize,
    },
    /// There are no wall samples.
    #[error("the result holds no wall samples, so there is no wall to export")]
    NoWall,
    /// A section of a route was solved without keeping its field.
    #[error("a section was solved without its field, so there is nothing to export")]
    NoField,
    /// The writer library refused.
    #[error("the file for the viewer could not be built: {reason}")]
    Writer {
        /// What the library says.
        reason: String,
    },
}

/// The velocity field as `.vti` text.
///
/// Point data: `velocity` (axial; m/s with an operating point, m/s per Pa/m with a fluid alone, else to
/// be multiplied by `G/mu`), `velocity_over_mean`, `phi` (m^2). Cell data: `fluid_fraction` (0 to 1),
/// `vtkGhostType`.
///
/// # Errors
/// [`VtkError`] when the field is inconsistent, not finite or too large.
pub fn field_vti(document: &SolveDocument<'_>, field: &DenseField) -> Result<String, VtkError> {
    check_field(field)?;
    let lattice = || VtkError::Lattice {
        nodes_x: field.nodes_x,
        nodes_y: field.nodes_y,
    };
    let last = |nodes: usize| i32::try_from(nodes - 1).map_err(|_| lattice());
    let extent = Extent::Ranges([0..=last(field.nodes_x)?, 0..=last(field.nodes_y)?, 0..=0]);
    let scale = document.velocity_scale();
    let times = |factor: f64| IOBuffer::F64(field.phi.iter().map(|p| p * factor).collect());
    let ghosts = field
        .fluid_fraction
        .iter()
        .map(|&f| if f > 0.0 { 0 } else { HIDDEN_CELL });
    let data = Attributes {
        point: vec![
            scalars("velocity", times(scale.factor)),
            array("velocity_over_mean", 1, times(1.0 / document.mean_phi())),
            array("phi", 1, IOBuffer::F64(field.phi.clone())),
        ],
        cell: vec![
            scalars(
                "fluid_fraction",
                IOBuffer::F64(field.fluid_fraction.clone()),
            ),
            array("vtkGhostType", 1, IOBuffer::U8(ghosts.collect())),
        ],
    };
    let piece = ImageDataPiece { extent, data };
    let units = [
        ("velocity", scale.unit),
        ("velocity_over_mean", "1"),
        ("phi", "m^2"),
        ("fluid_fraction", "1"),
    ];
    let text = with_units(&xml(DataSet::inline(piece))?, &units);
    let [x, y] = field.origin;
    let h = field.spacing;
    let text = with_attribute(&text, "Origin", &format!("{x:?} {y:?} 0"))?;
    with_attribute(&text, "Spacing", &format!("{h:?} {h:?} {h:?}"))
}

/// The wall as `.vtp` text: one closed polyline through the points of the curve of each loop.
///
/// Point data: `wall_shear` (Pa with an operating point, else Pa per Pa/m), `sensitivity` (relative change
/// of `K` per length of outward motion and length of wall that moves, 1/m^2), `normal` (unit vector out of
/// the fluid), `arc_length` (m, along its loop), `loop` (index), `wall` (index into the walls in the order of
/// the text and of JSON, where they were worked out), `corner` (0 none, 1 convex, 2 singular). A corner is
/// there twice, once for either side; at a singular one the shear is the mean over a stated length.
///
/// # Errors
/// [`VtkError`] without points or with one that is not finite.
pub fn wall_vtp(document: &SolveDocument<'_>) -> Result<String, VtkError> {
    let loops = &document.flow.wall_shear.curve.loops;
    let points: Vec<&CurvePoint> = loops.iter().flat_map(|l| &l.points).collect();
    if points.is_empty() {
        return Err(VtkError::NoWall);
    }
    check_finite("wall_shear", points.iter().map(|p| p.shear_per_gradient))?;
    check_finite("wall position", points.iter().map(|p| p.at[0] + p.at[1]))?;
    check_finite("normal", points.iter().map(|p| p.normal[0] + p.normal[1]))?;
    check_finite("arc_length", points.iter().map(|p| p.arc_length))?;
    let scale = document.shear_scale();
    let real = |value: &dyn Fn(&CurvePoint) -> f64| {
        IOBuffer::F64(points.iter().map(|p| value(p)).collect())
    };
    let plane = |value: fn(&CurvePoint) -> [f64; 2]| {
        let triple = |p: &&CurvePoint| [value(p)[0], value(p)[1], 0.0];
        IOBuffer::F64(points.iter().flat_map(triple).collect())
    };
    let k = document.flow.conductance.value;
    let mut data = vec![
        scalars("wall_shear", real(&|p| p.shear_per_gradient * scale.factor)),
        array(
            "sensitivity",
            1,
            real(&|p| p.shear_per_gradient.powi(2) / k),
        ),
        Attribute::DataArray(DataArray::vectors("normal").with_data(plane(|p| p.normal))),
        array("arc_length", 1, real(&|p| p.arc_length)),
        array("loop", 1, IOBuffer::U64(loop_indices(loops).collect())),
        array(
            "corner",
            1,
            IOBuffer::U64(points.iter().map(|p| corner_number(p)).collect()),
        ),
    ];
    if let Some(report) = document.walls {
        let walls = loops.iter().enumerate().flat_map(|(index, along)| {
            along
                .walls_of_points(report, index)
                .into_iter()
                .map(|w| w as u64)
        });
        data.push(array("wall", 1, IOBuffer::U64(walls.collect())));
    }
    let piece = PolyDataPiece {
        points: plane(|p| p.at),
        lines: Some(closed_lines(loops)),
        data: Attributes {
            point: data,
            cell: Vec::new(),
        },
        ..PolyDataPiece::default()
    };
    let units = [
        ("wall_shear", scale.unit),
        ("sensitivity", "1/m^2"),
        ("normal", "1"),
        ("arc_length", "m"),
        ("loop", "1"),
        ("corner", "1"),
        ("wall", "1"),
    ];
    Ok(with_units(&xml(DataSet::inline(piece))?, &units))
}

/// The index of its loop for every point.
fn loop_indices(loops: &[LoopCurve]) -> impl Iterator<Item = u64> + '_ {
    let numbered = loops.iter().enumerate();
    numbered.flat_map(|(index, l)| std::iter::repeat_n(index as u64, l.points.len()))
}

fn corner_number(point: &CurvePoint) -> u64 {
    match point.kind {
        PointKind::Regular => 0,
        PointKind::ConvexCorner => 1,
        PointKind::SingularCorner => 2,
    }
}

/// The velocity field as legacy `.vtk` text, for readers without `.vti`.
///
/// One FIELD block for points (`velocity`, `phi`) and one for cells (`fluid_fraction`); units stand in
/// the title line, since the format has no other place every reader keeps.
///
/// # Errors
/// [`VtkError`] when the field is inconsistent or not finite.
pub fn field_legacy_vtk(
    document: &SolveDocument<'_>,
    field: &DenseField,
) -> Result<String, VtkError> {
    check_field(field)?;
    let scale = document.velocity_scale();
    let unit = scale.unit;
    let name: String = one_line(document.section_name)
        .chars()
        .filter(char::is_ascii)
        .take(100)
        .collect();
    let [x, y] = field.origin;
    let (h, nodes, cells) = (field.spacing, field.phi.len(), field.fluid_fraction.len());
    let mut out = format!(
        "# vtk DataFile Version 3.0\n{name}; SI: coordinates m, phi m^2, velocity {unit}\nASCII\n\
         DATASET STRUCTURED_POINTS\nDIMENSIONS {} {} 1\nORIGIN {x:?} {y:?} 0\nSPACING {h:?} {h:?} {h:?}\n",
        field.nodes_x, field.nodes_y
    );
    let _ = write!(out, "POINT_DATA {nodes}\nFIELD point_fields 2\n");
    ascii_array(
        &mut out,
        "velocity",
        field.phi.iter().map(|p| p * scale.factor),
    );
    ascii_array(&mut out, "phi", field.phi.iter().copied());
    let _ = write!(out, "CELL_DATA {cells}\nFIELD cell_fields 1\n");
    ascii_array(
        &mut out,
        "fluid_fraction",
        field.fluid_fraction.iter().copied(),
    );
    Ok(out)
}

/// One array of a FIELD block, one value a line.
fn ascii_array(out: &mut String, name: &str, values: impl ExactSizeIterator<Item = f64>) {
    let _ = writeln!(out, "{name} 1 {} double", values.len());
    for value in values {
        let _ = writeln!(out, "{value:?}");
    }
}

fn check_field(field: &DenseField) -> Result<(), VtkError> {
    let (nodes_x, nodes_y) = (field.nodes_x, field.nodes_y);
    if nodes_x < 2 || nodes_y < 2 {
        return Err(VtkError::Lattice { nodes_x, nodes_y });
    }
    for (array, found, expected) in [
        ("phi", field.phi.len(), nodes_x * nodes_y),
        (
            "fluid_fraction",
            field.fluid_fraction.len(),
            (nodes_x - 1) * (nodes_y - 1),
        ),
    ] {
        if found != expected {
            return Err(VtkError::Length {
                array,
                found,
                expected,
            });
        }
    }
    let [x, y] = field.origin;
    check_finite("origin and spacing", [x, y, field.spacing])?;
    check_finite("phi", field.phi.iter().copied())?;
    check_finite("fluid_fraction", field.fluid_fraction.iter().copied())
}

pub(super) fn check_finite(
    array: &'static str,
    values: impl IntoIterator<Item = f64>,
) -> Result<(), VtkError> {
    match values.into_iter().position(|v| !v.is_finite()) {
        Some(index) => Err(VtkError::NotFinite { array, index }),
        None => Ok(()),
    }
}

/// The active scalars of their kind.
pub(super) fn scalars(name: &str, data: IOBuffer) -> Attribute {
    Attribute::DataArray(DataArray::scalars(name, 1).with_data(data))
}

pub(super) fn array(name: &str, components: u32, data: IOBuffer) -> Attribute {
    Attribute::DataArray(DataArray::new(name, components).with_data(data))
}

/// One closed polyline for each loop with points.
fn closed_lines(loops: &[LoopCurve]) -> VertexNumbers {
    let (mut connectivity, mut offsets) = (Vec::new(), Vec::new());
    let mut start = 0_u64;
    for along in loops.iter().filter(|l| !l.points.is_empty()) {
        let end = start + along.points.len() as u64;
        connectivity.extend(start..end);
        connectivity.push(start);
        offsets.push(connectivity.len() as u64);
        start = end;
    }
    VertexNumbers::XML {
        connectivity,
        offsets,
    }
}

/// The data set as XML, little-endian inline binary.
pub(super) fn xml(data: DataSet) -> Result<String, VtkError> {
    let refused = |reason: String| VtkError::Writer { reason };
    let vtk = Vtk {
        version: Version::new_xml(1, 0),
        title: String::new(),
        byte_order: ByteOrder::LittleEndian,
        file_path: None,
        data,
    };
    let mut bytes = b"<?xml version=\"1.0\"?>\n".to_vec();
    vtk.write_xml(&mut bytes)
        .map_err(|e| refused(format!("{e:?}")))?;
    String::from_utf8(bytes).map_err(|e| refused(e.to_string()))
}

/// The text with the unit of each named array put before the end of its element.
pub(super) fn with_units(xml: &str, units: &[(&str, &str)]) -> String {
    let closing = "</DataArray>";
    let mut out = String::with_capacity(xml.len() + 120 * units.len());
    for piece in xml.split_inclusive(closing) {
        let unit = units
            .iter()
            .find(|(name, _)| piece.contains(&format!("Name=\"{name}\"")));
        match (piece.strip_suffix(closing), unit) {
            (Some(body), Some((_, unit))) => {
                out.push_str(body);
                out.push_str("<InformationKey name=\"UNITS_LABEL\" location=\"vtkDataArray\">");
                out.push_str(unit);
                out.push_str("</InformationKey>");
                out.push_str(closing);
            }
            _ => out.push_str(piece),
        }
    }
    out
}

/// The text with the value of the first attribute of that name replaced.
fn with_attribute(xml: &str, name: &str, value: &str) -> Result<String, VtkError> {
    let missing = || VtkError::Writer {
        reason: format!("the writer left out the attribute {name}"),
    };
    let mark = format!(" {name}=\"");
    let (before, rest) = xml.split_once(&mark).ok_or_else(missing)?;
    let (_, after) = rest.split_once('"').ok_or_else(missing)?;
    Ok(format!("{before}{mark}{value}\"{after}"))
}
