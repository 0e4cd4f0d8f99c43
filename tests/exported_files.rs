//! Every exported format is read back by an independent reader and compared with the result it shows.

#![expect(
    clippy::unwrap_used,
    clippy::panic,
    reason = "helpers of tests stop the test"
)]

mod report_samples;

use std::collections::BTreeSet;
use std::fs;
use std::path::Path;

use etchwise::report::{
    OutputFile, PictureError, PictureFormat, SolveDocument, TextOptions, VtkError, WriteError,
    check_target, draw_velocity, field_legacy_vtk, field_vti, picture_bytes, to_csv, to_json,
    to_svg, to_text, wall_vtp, write_file, write_files,
};
use report_samples::{Sample, annulus, rectangle, warning};
use serde_json::Value;
use vtkio::model::{Attribute, DataSet, ImageDataPiece, Piece, PolyDataPiece, VertexNumbers, Vtk};

/// 100 um by 50 um, corner off the origin.
fn sample() -> Sample {
    rectangle([3e-3, -2e-3], 100e-6, 50e-6, 32)
}

fn close(a: f64, b: f64, tolerance: f64) {
    assert!(
        (a - b).abs() <= tolerance * b.abs(),
        "{a} against {b}, relative tolerance {tolerance}"
    );
}

// Field files.

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
        ghosts.iter().filter(|g| **g == 32).count(),
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

#[test]
fn the_wall_file_holds_one_closed_line_a_loop_with_shear_and_normals() {
    let sample = annulus([1e-3, 0.0], 80e-6, 30e-6, 20);
    let text = wall_vtp(&sample.full()).unwrap();
    let piece = poly(&text);
    let samples = &sample.flow.wall_shear.samples;
    let shear = values(&piece.data.point, "wall_shear");
    assert_eq!(shear.len(), samples.len());
    for (value, sample_at) in shear.iter().zip(samples) {
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
    sample.flow.wall_shear.samples.clear();
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

// JSON.

fn json(document: &SolveDocument<'_>) -> Value {
    serde_json::from_str(&to_json(document).unwrap()).unwrap()
}

fn number(value: &Value, path: &str) -> f64 {
    value
        .pointer(path)
        .and_then(|v| v["value"].as_f64())
        .unwrap_or_else(|| panic!("no number at {path}"))
}

#[test]
fn json_keeps_the_contract_with_units_and_every_digit() {
    let sample = sample();
    let all = json(&sample.full());
    assert_eq!(all["schema"], "etchwise/1");
    assert_eq!(all["source"]["path"], "sections/sample.toml");
    let flow = &sample.flow;
    for (path, expected, unit) in [
        ("/section/area", flow.geometry.area, "m^2"),
        (
            "/section/wetted_perimeter",
            flow.geometry.wetted_perimeter,
            "m",
        ),
        (
            "/section/hydraulic_diameter",
            flow.geometry.hydraulic_diameter,
            "m",
        ),
        ("/section/width", flow.geometry.width, "m"),
        ("/section/height", flow.geometry.height, "m"),
        ("/section/lumens", 1.0, "1"),
        ("/section/islands", 0.0, "1"),
        ("/conductance", flow.conductance.value, "m^4"),
        ("/poiseuille/fanning_dh", flow.fanning_dh, "1"),
        ("/poiseuille/darcy_dh", flow.darcy_dh, "1"),
        ("/poiseuille/fanning_sqrt_area", flow.fanning_sqrt_area, "1"),
        ("/peak_to_mean_velocity", flow.peak.to_mean.value, "1"),
        ("/peak/phi", flow.peak.phi, "m^2"),
        ("/momentum_factor", flow.momentum_factor.value, "1"),
        (
            "/kinetic_energy_factor",
            flow.kinetic_energy_factor.value,
            "1",
        ),
        (
            "/wall_shear/mean_per_gradient",
            flow.wall_shear.mean_per_gradient,
            "m",
        ),
        (
            "/wall_shear/max_per_gradient",
            flow.wall_shear.max_per_gradient,
            "m",
        ),
        ("/grid/spacing", flow.grid.spacing, "m"),
        ("/grid/fluid_nodes", flow.grid.fluid_nodes as f64, "1"),
        ("/grid/cells_across", flow.grid.cells_across, "1"),
        ("/solver/cycles", 2.0, "1"),
        ("/solver/residual", flow.solver.residual, "1"),
        ("/solver/seconds", flow.solver.seconds, "s"),
        ("/fluid/temperature", 293.15, "K"),
        ("/fluid/viscosity", 1.0016e-3, "Pa s"),
        ("/fluid/density", 998.2, "kg/m^3"),
        (
            "/resistance_per_length",
            1.0016e-3 / flow.conductance.value,
            "Pa s/m^4",
        ),
        (
            "/resistance",
            1.0016e-3 / flow.conductance.value * 0.02,
            "Pa s/m^3",
        ),
        (
            "/operating_point/flow_rate",
            sample.point.flow_rate,
            "m^3/s",
        ),
        ("/operating_point/pressure_drop", 1000.0, "Pa"),
        (
            "/operating_point/mean_velocity",
            sample.point.mean_velocity,
            "m/s",
        ),
        (
            "/operating_point/reynolds_dh",
            sample.point.reynolds_dh.unwrap(),
            "1",
        ),
        (
            "/operating_point/wall_shear_max",
            sample.point.wall_shear_max,
            "Pa",
        ),
        (
            "/operating_point/wall_shear_mean",
            sample.point.wall_shear_mean,
            "Pa",
        ),
        (
            "/operating_point/residence_time",
            sample.point.residence_time,
            "s",
        ),
        (
            "/operating_point/entrance_length",
            sample.point.entrance_length.unwrap(),
            "m",
        ),
    ] {
        assert_eq!(number(&all, path).to_bits(), expected.to_bits(), "{path}");
        assert_eq!(all.pointer(path).unwrap()["unit"], unit, "{path}");
    }
    assert_eq!(all["solver"]["converged"], true);
    assert_eq!(all["identities"]["rellich"]["holds"], true);
    assert_eq!(
        all["shortcuts"][1]["resistance_error"]["value"],
        Value::Null
    );
    assert_eq!(all["warnings"][0]["code"], "caution");
}

#[test]
fn json_says_why_something_is_absent() {
    let sample = sample();
    let bare = json(&sample.bare());
    for part in ["source", "fluid", "operating_point", "shortcuts"] {
        assert_eq!(bare[part], Value::Null);
        assert!(bare["absent_because"][part].is_string(), "{part}");
    }
    for quantity in [
        "resistance_per_length",
        "resistance",
        "bracket_relative_width",
    ] {
        assert_eq!(bare[quantity]["value"], Value::Null);
        assert!(bare[quantity]["absent_because"].is_string(), "{quantity}");
    }
    let k = &bare["conductance"];
    assert_eq!((&k["low"], &k["high"]), (&Value::Null, &Value::Null));
    assert!(k["bracket_absent_because"].is_string());
    assert_eq!(
        k["estimated_error"].as_f64(),
        Some(sample.flow.conductance.error)
    );
}

#[test]
fn json_never_holds_a_number_that_is_not_finite_and_warnings_carry_their_numbers() {
    let mut sample = sample();
    sample.flow.wall_shear.max_per_gradient = f64::INFINITY;
    sample.flow.peak.at = [f64::NAN, 0.0];
    sample.flow.momentum_factor.error = f64::NAN;
    sample.flow.warnings.push(warning());
    let text = to_json(&sample.full()).unwrap();
    let all: Value = serde_json::from_str(&text).unwrap();
    assert_eq!(all["wall_shear"]["max_per_gradient"]["value"], Value::Null);
    assert!(all["wall_shear"]["max_per_gradient"]["absent_because"].is_string());
    assert_eq!(all["peak"]["at"][0], Value::Null);
    assert_eq!(all["momentum_factor"]["estimated_error"], Value::Null);
    assert_eq!(all["warnings"][0]["angle_deg"], 270.0);
    assert_eq!(all["warnings"][0]["shear_pa"], Value::Null);
    assert_eq!(
        text,
        to_json(&sample.full()).unwrap(),
        "same input, same bytes"
    );
}

// CSV.

#[test]
fn csv_has_unit_ended_names_and_reads_back_exactly_whatever_the_name() {
    let mut sample = sample();
    sample.name = "die 3, \"north\"\nwafer".to_owned();
    let text = to_csv(&[sample.full(), sample.bare()]).unwrap();
    assert!(text.ends_with("\r\n"));
    let mut reader = csv::Reader::from_reader(text.as_bytes());
    let names: Vec<String> = reader
        .headers()
        .unwrap()
        .iter()
        .map(str::to_owned)
        .collect();
    let rows: Vec<csv::StringRecord> = reader.records().map(Result::unwrap).collect();
    assert_eq!(rows.len(), 2);
    let words: BTreeSet<&str> = [
        "section",
        "source_path",
        "source_sha256",
        "source_kind",
        "fluid",
        "solver_converged",
        "warnings",
    ]
    .into();
    let units = [
        "_m",
        "_m2",
        "_m4",
        "_1",
        "_k",
        "_pa",
        "_pa_s",
        "_s",
        "_kg_per_m3",
        "_m_per_s",
        "_m3_per_s",
        "_pa_per_m",
        "_pa_s_per_m3",
        "_pa_s_per_m4",
    ];
    for name in names.iter().filter(|n| !words.contains(n.as_str())) {
        assert!(
            units.iter().any(|u| name.ends_with(u)),
            "{name} does not end in a unit"
        );
    }
    let cell = |row: usize, name: &str| &rows[row][names.iter().position(|n| n == name).unwrap()];
    assert_eq!(cell(0, "section"), sample.name);
    let k: f64 = cell(0, "conductance_m4").parse().unwrap();
    assert_eq!(k.to_bits(), sample.flow.conductance.value.to_bits());
    let r: f64 = cell(0, "resistance_pa_s_per_m3").parse().unwrap();
    close(r, 1.0016e-3 * 0.02 / k, 1e-14);
    assert_eq!(cell(0, "warnings"), "caution");
    assert_eq!(cell(1, "resistance_pa_s_per_m3"), "");
    assert_eq!(cell(1, "warnings"), "");
    assert_eq!(
        names.iter().collect::<BTreeSet<_>>().len(),
        names.len(),
        "no name twice"
    );
}

// Text.

#[test]
fn the_text_of_a_full_document_is_the_golden_one() {
    let text = to_text(&sample().full(), TextOptions::default());
    let golden = include_str!("exported/rectangle.txt");
    for (n, (line, expected)) in text.lines().zip(golden.lines()).enumerate() {
        assert_eq!(
            line,
            expected,
            "line {} of tests/exported/rectangle.txt",
            n + 1
        );
    }
    assert_eq!(text.lines().count(), golden.lines().count());
}

#[test]
fn ascii_text_is_ascii_and_says_the_same() {
    let mut sample = sample();
    sample.name = "caf\u{e9}\u{1b}[31m".to_owned();
    let unicode = to_text(&sample.full(), TextOptions::default());
    let ascii = to_text(
        &sample.full(),
        TextOptions {
            ascii: true,
            verbose: false,
        },
    );
    assert!(ascii.is_ascii());
    assert!(
        !unicode.contains('\u{1b}'),
        "names cannot control the terminal"
    );
    assert!(unicode.contains("66.667 \u{b5}m") && ascii.contains("66.667 um"));
    assert_eq!(unicode.lines().count(), ascii.lines().count());
}

#[test]
fn text_without_a_fluid_has_shear_per_gradient_and_no_caution() {
    let mut sample = sample();
    let text = to_text(&sample.bare(), TextOptions::default());
    assert!(text.contains("Wall shear at a pressure gradient of 1 kPa/m"));
    assert!(!text.contains("Operating point") && !text.contains("caution"));
    assert!(!text.contains("0.042 s"), "time is for verbose text only");
    let verbose = to_text(
        &sample.bare(),
        TextOptions {
            ascii: false,
            verbose: true,
        },
    );
    assert!(
        verbose.contains("0.042 s")
            && verbose.contains("from best K")
            && verbose.contains("rellich")
    );
    sample.flow.identities[1].holds = false;
    sample.flow.warnings.push(warning());
    sample.flow.wall_shear.singular_corners.push([0.0, 0.0]);
    let text = to_text(&sample.bare(), TextOptions::default());
    assert!(
        text.contains("FAILS")
            && text.contains("! shear_singular")
            && text.contains("unbounded at 1 re-entrant")
    );
}

// Pictures.

#[test]
fn the_png_shows_the_section_dark_at_the_wall_bright_at_the_peak_white_outside() {
    let sample = sample();
    let bytes = picture_bytes(
        &sample.full(),
        &sample.outline,
        &sample.field,
        PictureFormat::Png,
    )
    .unwrap();
    let picture = image::load_from_memory(&bytes).unwrap().to_rgb8();
    assert_eq!(picture.width(), 1200);
    let grey = |x: u32, y: u32| {
        picture
            .get_pixel(x, y)
            .0
            .iter()
            .map(|v| u32::from(*v))
            .sum::<u32>()
            / 3
    };
    assert_eq!(picture.get_pixel(5, 5).0, [255, 255, 255]);
    // The section is 1120 x 560 px and its upper edge the first dark row below the heading.
    let top = (110..250).find(|&y| grey(200, y) < 60).unwrap();
    assert!(grey(620, top + 285) > grey(620, top + 30) + 60);
    let centre = picture.get_pixel(630, top + 282).0;
    assert!(
        centre[0] > 230 && centre[1] > 200 && centre[2] < 80,
        "the top of viridis: {centre:?}"
    );
    let left = (0..60).find(|&x| grey(x, top + 280) < 60).unwrap();
    assert!((38..=41).contains(&left), "{left}");
    let found = bytes.windows(9).any(|w| w == b"rectangle");
    assert!(found, "the name is in the text chunk");
}

#[test]
fn the_svg_is_well_formed_accessible_and_holds_text_as_text() {
    let mut sample = annulus([0.0, 0.0], 80e-6, 30e-6, 20);
    sample.name = "A <b> & \"c\"".to_owned();
    let drawing = draw_velocity(&sample.full(), &sample.outline, &sample.field).unwrap();
    let text = to_svg(&drawing).unwrap();
    let tree = usvg::roxmltree::Document::parse(&text).unwrap();
    let root = tree.root_element();
    assert_eq!(root.attribute("role"), Some("img"));
    let first = |tag: &str| tree.descendants().find(|n| n.has_tag_name(tag)).unwrap();
    assert!(first("title").text().unwrap().contains("A <b> & \"c\""));
    assert!(first("desc").text().unwrap().contains("fastest point"));
    let words: Vec<&str> = tree
        .descendants()
        .filter(|n| n.has_tag_name("text"))
        .filter_map(|n| n.text())
        .collect();
    assert!(words.contains(&"A <b> & \"c\""));
    assert!(
        words
            .iter()
            .any(|w| w.starts_with("axial velocity in mm/s; contour lines every "))
    );
    assert!(words.contains(&"20 \u{b5}m"), "scale bar: {words:?}");
    assert!(usvg::Tree::from_str(&text, &usvg::Options::default()).is_ok());
}

#[test]
fn labels_neither_leave_the_page_nor_overlap() {
    use etchwise::report::{Anchor, Item};
    let samples = [
        sample(),
        annulus([0.0, 0.0], 80e-6, 30e-6, 16),
        rectangle([0.0, 0.0], 1e-3, 10e-6, 8),
        rectangle([0.0, 0.0], 20e-6, 60e-6, 60),
    ];
    for sample in &samples {
        for document in [sample.bare(), sample.full()] {
            let drawing = draw_velocity(&document, &sample.outline, &sample.field).unwrap();
            let mut boxes: Vec<([f64; 4], &str)> = Vec::new();
            for item in &drawing.items {
                let Item::Text {
                    at,
                    anchor,
                    size,
                    text,
                    ..
                } = item
                else {
                    continue;
                };
                let width = size.width(text);
                let left = at[0]
                    - match anchor {
                        Anchor::Start => 0.0,
                        Anchor::Middle => width / 2.0,
                        Anchor::End => width,
                    };
                let (top, bottom) = (
                    at[1] - 0.7 * size.line_height(),
                    at[1] + 0.2 * size.line_height(),
                );
                let now = [left, top, left + width, bottom];
                assert!(
                    left >= 0.0 && now[2] <= f64::from(drawing.width),
                    "{text} leaves the page"
                );
                assert!(
                    top >= 0.0 && bottom <= f64::from(drawing.height),
                    "{text} leaves the page"
                );
                for (other, label) in &boxes {
                    let apart = now[2] <= other[0]
                        || other[2] <= now[0]
                        || now[3] <= other[1]
                        || other[3] <= now[1];
                    assert!(apart, "`{text}` overlaps `{label}`");
                }
                boxes.push((now, text));
            }
            assert!(boxes.len() > 8);
        }
    }
}

#[test]
fn an_extreme_section_says_how_it_is_stretched() {
    let sample = rectangle([0.0, 0.0], 1e-3, 10e-6, 8);
    let drawing = draw_velocity(&sample.bare(), &sample.outline, &sample.field).unwrap();
    assert!(
        drawing
            .description
            .contains("heights are stretched 20 times")
    );
    let equal = rectangle([0.0, 0.0], 100e-6, 10e-6, 8);
    let drawing = draw_velocity(&equal.bare(), &equal.outline, &equal.field).unwrap();
    assert!(!drawing.description.contains("stretched"));
}

// Writing.

fn names_in(folder: &Path) -> Vec<String> {
    let mut names: Vec<String> = fs::read_dir(folder)
        .unwrap()
        .map(|e| e.unwrap().file_name().into_string().unwrap())
        .collect();
    names.sort();
    names
}

#[test]
fn a_file_is_replaced_whole_and_nothing_is_left_beside_it() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("out.json");
    write_file(&path, b"first and longer", &[]).unwrap();
    check_target(&path, &[]).unwrap();
    assert_eq!(
        fs::read(&path).unwrap(),
        b"first and longer",
        "the check changes nothing"
    );
    write_file(&path, b"second", &[]).unwrap();
    assert_eq!(fs::read(&path).unwrap(), b"second");
    assert_eq!(names_in(folder.path()), ["out.json"]);
}

#[test]
fn an_input_is_never_overwritten_by_whatever_name() {
    let folder = tempfile::tempdir().unwrap();
    let input = folder.path().join("section.toml");
    fs::write(&input, "kept").unwrap();
    let hard = folder.path().join("hard.toml");
    fs::hard_link(&input, &hard).unwrap();
    for target in [input.clone(), folder.path().join("./section.toml"), hard] {
        for error in [
            check_target(&target, &[&input]).unwrap_err(),
            write_file(&target, b"lost", &[&input]).unwrap_err(),
        ] {
            assert!(matches!(error, WriteError::IsInput { .. }), "{error}");
            assert!(error.to_string().contains(&*target.to_string_lossy()));
        }
    }
    assert_eq!(fs::read(&input).unwrap(), b"kept");
}

#[test]
fn targets_that_cannot_be_written_are_refused_up_front_with_path_and_reason() {
    let folder = tempfile::tempdir().unwrap();
    let missing = folder.path().join("none/out.csv");
    assert!(matches!(
        check_target(&missing, &[]),
        Err(WriteError::NoFolder { .. })
    ));
    assert!(matches!(
        check_target(folder.path(), &[]),
        Err(WriteError::IsFolder { .. })
    ));
    let file = folder.path().join("file");
    fs::write(&file, "x").unwrap();
    let below = check_target(&file.join("out.csv"), &[]).unwrap_err();
    assert!(below.to_string().contains("out.csv"), "{below}");
    let mut permissions = fs::metadata(&file).unwrap().permissions();
    permissions.set_readonly(true);
    fs::set_permissions(&file, permissions).unwrap();
    assert!(matches!(
        write_file(&file, b"y", &[]),
        Err(WriteError::ReadOnly { .. })
    ));
    assert_eq!(fs::read(&file).unwrap(), b"x");
    assert_eq!(names_in(folder.path()), ["file"]);
}

#[test]
fn files_that_belong_together_are_written_all_or_none() {
    let folder = tempfile::tempdir().unwrap();
    let good = folder.path().join("a.vti");
    let bad = folder.path().join("none/a.vtp");
    let files = |second: &'static [u8]| {
        [
            OutputFile {
                path: &good,
                bytes: b"field",
            },
            OutputFile {
                path: &bad,
                bytes: second,
            },
        ]
    };
    assert!(write_files(&files(b"wall"), &[]).is_err());
    assert!(names_in(folder.path()).is_empty());
    let twice = [
        OutputFile {
            path: &good,
            bytes: b"1",
        },
        OutputFile {
            path: &good,
            bytes: b"2",
        },
    ];
    assert!(matches!(
        write_files(&twice, &[]),
        Err(WriteError::NamedTwice { .. })
    ));
    assert!(names_in(folder.path()).is_empty());
    fs::create_dir(folder.path().join("none")).unwrap();
    write_files(&files(b"wall"), &[]).unwrap();
    assert_eq!(fs::read(&bad).unwrap(), b"wall");
}

#[cfg(unix)]
#[test]
fn devices_are_written_directly_links_are_followed_and_permissions_kept() {
    use std::os::unix::fs::{PermissionsExt, symlink};
    write_file("/dev/null".as_ref(), b"gone", &[]).unwrap();
    let folder = tempfile::tempdir().unwrap();
    let (real, link) = (
        folder.path().join("real.svg"),
        folder.path().join("link.svg"),
    );
    fs::write(&real, "old").unwrap();
    fs::set_permissions(&real, fs::Permissions::from_mode(0o640)).unwrap();
    symlink(&real, &link).unwrap();
    write_file(&link, b"new", &[]).unwrap();
    assert!(fs::symlink_metadata(&link).unwrap().is_symlink());
    assert_eq!(fs::read(&real).unwrap(), b"new");
    assert_eq!(
        fs::metadata(&real).unwrap().permissions().mode() & 0o777,
        0o640
    );
}
