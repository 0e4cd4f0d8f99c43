//! Every shape that comes with the program: solved, with plausible numbers, and every file read back.

use std::fs;
use std::path::Path;

use serde_json::Value;
use vtkio::Vtk;
use vtkio::model::{DataSet, Piece};

use crate::{Folder, assert_close, shapes, value};

/// Fewest shapes that come with the program.
const FEWEST_SHAPES: usize = 16;

/// What holds for any section.
fn assert_plausible(record: &Value, name: &str) {
    let of = |path: &str| value(record, path);
    let (area, k) = (of("/section/area"), of("/conductance"));
    // Of all sections of one area the circle has the largest conductance (Saint-Venant 1856, proved by
    // Polya 1948; from memory).
    let circle = area * area / (8.0 * std::f64::consts::PI);
    let error = record["conductance"]["estimated_error"].as_f64().unwrap();
    assert!(k > 0.0 && k <= circle + error, "{name}: K = {k:e}");
    assert!(error / k < 1e-3, "{name}: relative error {}", error / k);
    let width = of("/bracket_relative_width");
    assert!(
        width <= 1e-3 && record["accuracy"]["met"] == true,
        "{name}: {width}"
    );
    let friction = of("/poiseuille/fanning_dh");
    assert!((5.0..30.0).contains(&friction), "{name}: f Re = {friction}");
    let peak = of("/peak_to_mean_velocity");
    assert!((1.4..4.0).contains(&peak), "{name}: {peak}");
    let (momentum, energy) = (of("/momentum_factor"), of("/kinetic_energy_factor"));
    assert!(1.0 < momentum && momentum < energy, "{name}");
    let mean = of("/wall_shear/mean_per_gradient");
    assert_close(mean, area / of("/section/wetted_perimeter"), 0.05);
    assert!(of("/wall_shear/max_per_gradient") > mean, "{name}");
    assert_eq!(record["solver"]["converged"], true, "{name}");
}

fn read_table(text: &str) -> Vec<(String, String)> {
    let mut reader = csv::Reader::from_reader(text.as_bytes());
    let heads = reader.headers().unwrap().clone();
    let rows: Vec<csv::StringRecord> = reader.records().map(Result::unwrap).collect();
    assert_eq!(rows.len(), 1);
    heads
        .iter()
        .zip(&rows[0])
        .map(|(h, v)| (h.to_owned(), v.to_owned()))
        .collect()
}

fn read_fields(folder: &Folder, name: &str) {
    let field = Vtk::import(folder.path("s.vti")).unwrap();
    let DataSet::ImageData { pieces, .. } = field.data else {
        unreachable!("{name}: the field is an image")
    };
    let Some(Piece::Inline(image)) = pieces.into_iter().next() else {
        unreachable!("{name}: the piece is inline")
    };
    assert!(image.data.point.len() >= 2, "{name}: velocity and phi");
    let wall = Vtk::import(folder.path("s.vtp")).unwrap();
    let DataSet::PolyData { pieces, .. } = wall.data else {
        unreachable!("{name}: the wall is lines")
    };
    assert_eq!(pieces.len(), 1, "{name}");
    let legacy = folder.read("s.vtk");
    assert!(legacy.starts_with("# vtk DataFile Version"), "{name}");
    assert!(
        !legacy.contains("nan") && !legacy.contains("inf "),
        "{name}"
    );
}

fn read_pictures(folder: &Folder, name: &str) {
    let png = image::load_from_memory(&fs::read(folder.path("s.png")).unwrap()).unwrap();
    assert!(png.width() >= 300 && png.height() >= 100, "{name}");
    let text = folder.read("s.svg");
    let svg = roxmltree::Document::parse(&text).unwrap();
    assert!(svg.root_element().has_tag_name("svg"), "{name}");
    let words: Vec<&str> = svg.descendants().filter_map(|n| n.text()).collect();
    assert!(words.iter().any(|w| w.contains("K = ")), "{name}");
}

#[test]
fn every_shape_solves_and_all_its_files_read_back() {
    let paths = shapes();
    assert!(paths.len() >= FEWEST_SHAPES, "{}", paths.len());
    for path in &paths {
        let name = path.file_name().unwrap().to_string_lossy().into_owned();
        let folder = Folder::new();
        let file = path.to_string_lossy();
        let record = folder.json(&format!(
            "solve {file} --json --vtk s --legacy-vtk --picture s.png --picture s.svg"
        ));
        assert_plausible(&record, &name);
        read_fields(&folder, &name);
        read_pictures(&folder, &name);
        let run = folder.run(&["solve", &file, "--csv"]);
        assert_eq!((run.status, run.err.as_str()), (0, ""), "{name}");
        let row = read_table(&run.out);
        let cell = |head: &str| {
            let found = row.iter().find(|(h, _)| h == head);
            found.map_or(f64::NAN, |(_, v)| v.parse().unwrap())
        };
        assert_close(
            cell("conductance_m4"),
            value(&record, "/conductance"),
            1e-12,
        );
        assert_close(cell("area_m2"), value(&record, "/section/area"), 1e-12);
        let text = folder.run(&["solve", &file]);
        assert_eq!((text.status, text.err.as_str()), (0, ""), "{name}");
        assert!(
            !text.out.contains("NaN") && !text.out.contains("inf "),
            "{name}"
        );
    }
}

/// Each shape begins with a comment that says what it is; made ones say that they are invented.
#[test]
fn every_shape_says_what_it_is() {
    for path in shapes() {
        let text = fs::read_to_string(&path).unwrap();
        let head: String = text
            .lines()
            .take(6)
            .collect::<Vec<_>>()
            .join(" ")
            .to_lowercase();
        assert!(
            head.contains('#') || head.contains("<!--"),
            "{}",
            path.display()
        );
        let is_made =
            path.parent() == Some(&Path::new(env!("CARGO_MANIFEST_DIR")).join("shapes/made"));
        assert!(!is_made || head.contains("invented"), "{}", path.display());
    }
}
