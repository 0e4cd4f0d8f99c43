//! Field and wall files, read back by the library that wrote them and as raw text.

use etchwise::flow::CurvePoint;
use etchwise::report::{
    PictureError, PictureFormat, SolveDocument, VtkError, field_legacy_vtk, field_vti,
    picture_bytes, wall_vtp,
};
use vtkio::model::{Attribute, DataSet, ImageDataPiece, Piece, PolyDataPiece, VertexNumbers, Vtk};

use crate::report_samples::{Sample, annulus};
use crate::{close, sample};

fn image(text: &str) -> ImageDataPiece {
    let DataSet::ImageData { pieces, .. } = Vtk::parse_xml(text.as_bytes()).unwrap().data else {
        panic!("not an image");
    };
    match pieces.into_iter().next().unwrap() {
        Piece::Inline(piece) => *piece,
        _ => panic!("piece is not inline"),
    }
}

fn poly(text: &str) -> PolyDataPiece {
    let DataSet::PolyData { pieces, .. } = Vtk::parse_xml(text.as_bytes()).unwrap().data else {
        panic!("not poly data");
    };
    match pieces.into_iter().next().unwrap() {
        Piece::Inline(piece) => *piece,
        _ => panic!("piece is not inline"),
    }
}

fn values(attributes: &[Attribute], name: &str) -> Vec<f64> {
    let found = attributes.iter().find_map(|a| match a {
        Attribute::DataArray(array) if array.name == name => {
            Some(array.data.cast_into::<f64>().unwrap())
        }
        _ => None,
    });
    found.unwrap_or_else(|| panic!("no array {name}"))
}

/// The bytes of an inline binary array. The library counts no cells in a flat image, so its reader loses
/// cell data; VTK itself counts them, as `.ci/read_vtk.py` checks.
fn raw_bytes(xml: &str, name: &str) -> Vec<u8> {
    let (_, rest) = xml.split_once(&format!("Name=\"{name}\"")).unwrap();
    let text = rest
        .split_once('>')
        .unwrap()
        .1
        .split_once('<')
        .unwrap()
        .0
        .trim();
    let (mut bytes, mut word, mut bits) = (Vec::new(), 0_u32, 0);
    for c in text.bytes().filter(|c| *c != b'=') {
        let digit = match c {
            b'A'..=b'Z' => c - b'A',
            b'a'..=b'z' => c - b'a' + 26,
            b'0'..=b'9' => c - b'0' + 52,
            b'+' => 62,
            b'/' => 63,
            _ => panic!("not base 64"),
        };
        word = word << 6 | u32::from(digit);
        bits += 6;
        if bits >= 8 {
            bits -= 8;
            bytes.push((word >> bits & 255) as u8);
        }
    }
    let length = u64::from_le_bytes(bytes[..8].try_into().unwrap());
    assert_eq!(
        length as usize,
        bytes.len() - 8,
        "the header holds the number of bytes"
    );
    bytes.split_off(8)
}

fn attribute<'a>(xml: &'a str, name: &str) -> &'a str {
    let (_, rest) = xml.split_once(&format!(" {name}=\"")).unwrap();
    rest.split_once('"').unwrap().0
}

fn unit<'a>(xml: &'a str, array: &str) -> &'a str {
    let (_, rest) = xml.split_once(&format!("Name=\"{array}\"")).unwrap();
    let (element, _) = rest.split_once("</DataArray>").unwrap();
    let (_, unit) = element
        .split_once("<InformationKey name=\"UNITS_LABEL\" location=\"vtkDataArray\">")
        .unwrap();
    unit.strip_suffix("</InformationKey>").unwrap()
}

#[test]
fn the_field_file_holds_the_field_bit_for_bit_with_units_and_hidden_solid_cells() {
    let sample = sample();
    let text = field_vti(&sample.full(), &sample.field).unwrap();
    let piece = image(&text);
    assert_eq!(piece.extent.clone().into_dims(), [67, 35, 1]);
    assert_eq!(values(&piece.data.point, "phi"), sample.field.phi);
    let share: Vec<f64> = raw_bytes(&text, "fluid_fraction")
        .chunks(8)
        .map(|c| f64::from_le_bytes(c.try_into().unwrap()))
        .collect();
    assert_eq!(share, sample.field.fluid_fraction);
    let largest = values(&piece.data.point, "velocity")
        .into_iter()
        .fold(0.0, f64::max);
    close(largest, sample.point.peak_velocity, 1e-12);
    let over_mean = values(&piece.data.point, "velocity_over_mean")
        .into_iter()
        .fold(0.0, f64::max);
    close(over_mean, sample.flow.peak.to_mean.value, 1e-12);
    let ghosts = raw_bytes(&text, "vtkGhostType");
    assert_eq!(ghosts.len(), 66 * 34);
    assert_eq!(
        ghosts.iter().map(|g| usize::from(*g == 32)).sum::<usize>(),
        66 * 34 - 64 * 32
    );
    let origin: Vec<f64> = attribute(&text, "Origin")
        .split(' ')
        .map(|v| v.parse().unwrap())
        .collect();
    assert_eq!(&origin[..2], &sample.field.origin, "full doubles");
    let spacing: Vec<f64> = attribute(&text, "Spacing")
        .split(' ')
        .map(|v| v.parse().unwrap())
        .collect();
    assert_eq!(spacing, vec![sample.field.spacing; 3]);
    assert_eq!(unit(&text, "velocity"), "m/s");
    assert_eq!(unit(&text, "phi"), "m^2");
    assert_eq!(unit(&text, "fluid_fraction"), "1");
}

#[test]
fn the_unit_of_velocity_and_shear_follows_what_is_known() {
    let sample = sample();
    let bare = sample.bare();
    assert_eq!(
        unit(&field_vti(&bare, &sample.field).unwrap(), "velocity"),
        "m/s per (Pa/m)/(Pa s)"
    );
    assert_eq!(unit(&wall_vtp(&bare).unwrap(), "wall_shear"), "Pa per Pa/m");
    let fluid = SolveDocument {
        fluid: Some(&sample.fluid),
        ..bare
    };
    let text = field_vti(&fluid, &sample.field).unwrap();
    assert_eq!(unit(&text, "velocity"), "m/s per Pa/m");
    let largest = values(&image(&text).data.point, "velocity")
        .into_iter()
        .fold(0.0, f64::max);
    close(
        largest,
        sample.flow.peak.phi / sample.fluid.viscosity,
        1e-12,
    );
}

/// All points of the curve.
fn points(sample: &Sample) -> Vec<&CurvePoint> {
    let loops = &sample.flow.wall_shear.curve.loops;
    loops.iter().flat_map(|l| &l.points).collect()
}

#[test]
fn the_wall_file_holds_one_closed_line_a_loop_with_shear_and_normals() {
    let sample = annulus([1e-3, 0.0], 80e-6, 30e-6, 20);
    let text = wall_vtp(&sample.full()).unwrap();
    let piece = poly(&text);
    let samples: Vec<&CurvePoint> = points(&sample);
    let shear = values(&piece.data.point, "wall_shear");
    assert_eq!(shear.len(), samples.len());
    for (value, sample_at) in shear.iter().zip(&samples) {
        close(
            *value,
            sample_at.shear_per_gradient * sample.point.pressure_gradient,
            1e-15,
        );
    }
    let points = piece.points.cast_into::<f64>().unwrap();
    assert_eq!(&points[..3], &[samples[0].at[0], samples[0].at[1], 0.0]);
    let Some(VertexNumbers::XML {
        connectivity,
        offsets,
    }) = piece.lines
    else {
        panic!("no lines");
    };
    let ends: Vec<usize> = offsets.iter().map(|&o| o as usize).collect();
    assert_eq!(ends.len(), 2);
    assert_eq!(connectivity[0], connectivity[ends[0] - 1]);
    assert_eq!(connectivity[ends[0]], connectivity[ends[1] - 1]);
    assert_eq!(connectivity.len(), samples.len() + 2);
    let normals = values(&piece.data.point, "normal");
    assert!(
        normals
            .chunks(3)
            .all(|n| (n[0].hypot(n[1]) - 1.0).abs() < 1e-12 && n[2] == 0.0)
    );
    assert_eq!(unit(&text, "wall_shear"), "Pa");
    assert_eq!(unit(&text, "arc_length"), "m");
    assert_eq!(values(&piece.data.point, "loop").last(), Some(&1.0));
    assert_eq!(unit(&text, "wall"), "1");
    let walls = values(&piece.data.point, "wall");
    assert!((0..4).all(|wall| walls.contains(&f64::from(wall))));
    assert!(
        values(&piece.data.point, "corner")
            .iter()
            .all(|&c| c == 0.0)
    );
}

#[test]
fn a_field_that_does_not_fit_its_lattice_or_is_not_finite_is_refused_by_name_and_place() {
    let mut sample = sample();
    sample.field.phi[70] = f64::NAN;
    for error in [
        field_vti(&sample.bare(), &sample.field).unwrap_err(),
        field_legacy_vtk(&sample.bare(), &sample.field).unwrap_err(),
    ] {
        assert!(
            matches!(
                error,
                VtkError::NotFinite {
                    array: "phi",
                    index: 70
                }
            ),
            "{error}"
        );
    }
    let refused = picture_bytes(
        &sample.bare(),
        &sample.outline,
        &sample.field,
        PictureFormat::Png,
    );
    assert!(matches!(refused, Err(PictureError::Field { .. })));
    sample.field.phi.pop();
    let error = field_vti(&sample.bare(), &sample.field).unwrap_err();
    assert!(
        error
            .to_string()
            .contains("2344 values where 2345 are needed"),
        "{error}"
    );
    sample.flow.wall_shear.curve.loops.clear();
    assert!(matches!(wall_vtp(&sample.bare()), Err(VtkError::NoWall)));
}

#[test]
fn the_legacy_file_has_one_field_block_for_points_and_one_for_cells() {
    let sample = sample();
    let text = field_legacy_vtk(&sample.full(), &sample.field).unwrap();
    let lines: Vec<&str> = text.lines().collect();
    assert!(lines[1].len() < 256 && lines[1].contains("velocity m/s"));
    assert_eq!(lines[4], "DIMENSIONS 67 35 1");
    assert_eq!(text.matches("\nFIELD ").count(), 2);
    let start = lines.iter().position(|l| l.starts_with("phi 1 ")).unwrap() + 1;
    let phi: Vec<f64> = lines[start..start + 67 * 35]
        .iter()
        .map(|l| l.parse().unwrap())
        .collect();
    assert_eq!(phi, sample.field.phi);
}
