//! Every reader against files: good ones are read to the right section, bad ones give the message beside
//! them, and nothing that can be in a file makes the program panic.

#![expect(
    clippy::disallowed_methods,
    clippy::unwrap_used,
    clippy::panic,
    reason = "tests read and write files of their own and may fail loudly"
)]

use std::fmt::Write as _;
use std::fs;
use std::path::{Path, PathBuf};
use std::time::Instant;

use etchwise::intake::{
    MAX_FILE_BYTES, ReadErrorKind, ReadOptions, ReadProblem, Section, SectionKind, read_section,
    section_from_bytes, to_toml,
};
use proptest::prelude::*;

/// Files in `tests/intake/good`.
const GOOD_FILES: usize = 19;
/// Files in `tests/intake/bad`, not counting the messages beside them.
const BAD_FILES: usize = 73;

fn files(folder: &str) -> Vec<PathBuf> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("tests/intake")
        .join(folder);
    let mut paths: Vec<PathBuf> = fs::read_dir(folder)
        .unwrap()
        .map(|entry| entry.unwrap().path())
        .filter(|path| path.extension().is_none_or(|e| e != "expected"))
        .collect();
    paths.sort();
    paths
}

fn name_of(path: &Path) -> String {
    path.file_name().unwrap().to_string_lossy().into_owned()
}

fn from_text(text: &str) -> Section {
    let options = ReadOptions::default();
    section_from_bytes(text.as_bytes().to_vec(), "text", &options)
        .unwrap_or_else(|error| panic!("{}", error.explain()))
}

fn with_unit(text: &str, unit: &str) -> Result<Section, etchwise::intake::ReadError> {
    let options = ReadOptions {
        unit: Some(unit.to_owned()),
        ..ReadOptions::default()
    };
    section_from_bytes(text.as_bytes().to_vec(), "text", &options)
}

/// All good files hold a rectangle of 100 by 50 um, some with a post of 20 by 10 um or a second rectangle.
#[test]
fn good_files_are_read_to_the_right_section() {
    let paths = files("good");
    assert_eq!(paths.len(), GOOD_FILES);
    for path in paths {
        let name = name_of(&path);
        let section = read_section(&path, &ReadOptions::default())
            .unwrap_or_else(|error| panic!("{}", error.explain()));
        let (lumens, islands): (u32, u32) = match name.as_str() {
            "blank-line-island.csv" | "spreadsheet-blank-rows.csv" | "physical-size.svg" => (1, 1),
            "loop-column.csv" | "lumen-column.csv" | "section.toml" => (2, 1),
            _ => (1, 0),
        };
        let area = f64::from(lumens) * 5000e-12 - f64::from(islands) * 200e-12;
        let found = &section.outline.lumens;
        let posts: usize = found.iter().map(|lumen| lumen.islands.len()).sum();
        assert_eq!(
            (found.len(), posts),
            (lumens as usize, islands as usize),
            "{name}"
        );
        assert!(
            (section.outline.area() / area - 1.0).abs() < 1e-12,
            "{name}"
        );
        for wall in section.outline.loops() {
            assert_eq!(wall.points.len(), 4, "{name}");
        }
        assert_eq!(
            found[0].outer.signed_area() < 0.0,
            name.contains("clockwise") || path.extension() == Some("svg".as_ref()),
            "{name}: loops keep their direction, mirrored with y in a drawing"
        );
        assert_eq!(section.provenance.bytes, fs::metadata(&path).unwrap().len());
        assert_eq!(section.provenance.sha256.len(), 64);
        assert_eq!(section.nominal.is_some(), name == "nominal.toml");
        assert!(section.warnings.is_empty(), "{name}");
    }
}

#[test]
fn bad_files_give_the_message_beside_them() {
    let paths = files("bad");
    assert_eq!(paths.len(), BAD_FILES);
    let mut wrong = String::new();
    for path in paths {
        let name = name_of(&path);
        let bytes = fs::read(&path).unwrap();
        let Err(error) = section_from_bytes(bytes, &name, &ReadOptions::default()) else {
            panic!("{name} was read");
        };
        let family = match error.exit_kind() {
            ReadErrorKind::AmbiguousUnit => "ambiguous unit",
            _ => "unreadable",
        };
        let found = format!("{}({family})\n", error.explain());
        let beside = path.with_file_name(format!("{name}.expected"));
        let expected = fs::read_to_string(beside).unwrap_or_default();
        if found != expected {
            let _ = writeln!(wrong, "== {name}\n{found}-- expected\n{expected}");
        }
    }
    assert!(wrong.is_empty(), "{wrong}");
}

#[test]
fn a_written_section_reads_back_the_same() {
    for path in files("good") {
        let section = read_section(&path, &ReadOptions::default()).unwrap();
        let again = from_text(&written(&section));
        assert_eq!(again.outline, section.outline, "{}", written(&section));
        assert_eq!(again.name, section.name);
        assert_eq!(again.nominal, section.nominal);
        assert_eq!(again.extras, section.extras);
        assert_eq!(written(&again), written(&section));
    }
}

#[test]
fn the_unit_asked_for_counts_only_where_the_file_has_none() {
    let bare = "0,0\n100,0\n100,50.5\n";
    let section = with_unit(bare, "um").unwrap();
    assert!((section.outline.area() / 2525e-12 - 1.0).abs() < 1e-12);
    let headed = format!("x_um,y\n{bare}");
    assert!(with_unit(&headed, "um").is_ok());
    let error = with_unit(&headed, "nm").unwrap_err();
    assert!(matches!(*error.problem, ReadProblem::UnitConflict { .. }));
    assert_eq!(error.exit_kind(), ReadErrorKind::AmbiguousUnit);
    let toml = "[[lumen]]\nouter = [[0, 0], [100, 0], [100, 50.5]]\n";
    assert_eq!(with_unit(toml, "um").unwrap().outline, section.outline);
    let error = with_unit(&format!("unit = \"mm\"\n{toml}"), "um").unwrap_err();
    assert!(matches!(*error.problem, ReadProblem::UnitConflict { .. }));
    let svg = "<svg xmlns='http://www.w3.org/2000/svg'><path d='M0 0h100v-50.5z'/></svg>";
    let drawn = with_unit(svg, "um").unwrap();
    assert!((drawn.outline.area() / section.outline.area() - 1.0).abs() < 1e-12);
}

/// One column with decimal commas looks like two columns: with a unit given there is nothing else to stop it.
#[test]
fn pairs_that_may_be_decimals_are_refused_even_with_a_unit() {
    let error = with_unit("12,50\n13,25\n14,75\n", "um").unwrap_err();
    assert!(matches!(
        *error.problem,
        ReadProblem::AmbiguousDecimal { .. }
    ));
    assert_eq!(error.exit_kind(), ReadErrorKind::AmbiguousUnit);
    for clear in [
        "0,0\n100,0\n100,50\n",
        "12,50\n13,25\n-14,75\n",
        "12,50\n13,2.5\n9,75\n",
    ] {
        assert!(with_unit(clear, "um").is_ok(), "{clear}");
    }
}

#[test]
fn the_size_stop_can_be_lifted_and_the_kind_can_be_given() {
    let large = b"x_m,y_m\n0,0\n100,0\n100,50\n".to_vec();
    let mut options = ReadOptions::default();
    let error = section_from_bytes(large.clone(), "t", &options).unwrap_err();
    assert!(matches!(
        *error.problem,
        ReadProblem::ImplausibleSize {
            likely: Some("um"),
            ..
        }
    ));
    options.allow_any_size = true;
    assert!(section_from_bytes(large.clone(), "t", &options).is_ok());
    options.as_kind = Some(SectionKind::SectionFile);
    let error = section_from_bytes(large, "t", &options).unwrap_err();
    assert!(matches!(*error.problem, ReadProblem::Toml { .. }));
}

#[test]
fn a_scale_must_be_positive_and_finite() {
    let svg = b"<svg xmlns='http://www.w3.org/2000/svg'><circle r='5'/></svg>".to_vec();
    for scale in [0.0, -1e-6, f64::NAN, f64::INFINITY] {
        let options = ReadOptions {
            svg_scale: Some(scale),
            allow_any_size: true,
            ..ReadOptions::default()
        };
        let error = section_from_bytes(svg.clone(), "t", &options).unwrap_err();
        assert!(matches!(
            *error.problem,
            ReadProblem::ScaleNotPositive { .. }
        ));
    }
    for unit in ["0 um", "-1 um", "nan um", "0.1"] {
        assert!(with_unit("0 0\n1 0\n1 1\n", unit).is_err(), "{unit}");
    }
}

#[test]
fn missing_files_folders_and_huge_files_are_refused_before_reading() {
    let options = ReadOptions::default();
    let folder = tempfile::tempdir().unwrap();
    let problem = |path: &Path| *read_section(path, &options).unwrap_err().problem;
    assert_eq!(
        problem(&folder.path().join("none.csv")),
        ReadProblem::NotFound
    );
    assert_eq!(problem(folder.path()), ReadProblem::IsFolder);
    let huge = folder.path().join("huge.csv");
    // A sparse file of 10 GB.
    let file = fs::File::create(&huge).unwrap();
    file.set_len(10_000_000_000).unwrap();
    let start = Instant::now();
    assert_eq!(
        problem(&huge),
        ReadProblem::FileTooLarge {
            bytes: 10_000_000_000,
            limit: MAX_FILE_BYTES
        }
    );
    assert!(start.elapsed().as_millis() < 1000);
}

fn circle(count: usize) -> impl Iterator<Item = (f64, f64)> {
    (0..count).map(move |i| {
        let angle = std::f64::consts::TAU * i as f64 / count as f64;
        (50.0 * angle.cos(), 50.0 * angle.sin())
    })
}

#[test]
fn a_million_vertices_in_columns_are_read_in_about_a_second() {
    let mut text = String::from("x_um,y_um\n");
    for (x, y) in circle(1_000_000) {
        let _ = writeln!(text, "{x:.9},{y:.9}");
    }
    let start = Instant::now();
    let section = from_text(&text);
    let seconds = start.elapsed().as_secs_f64();
    println!("1000000 vertices, {} bytes: {seconds:.2} s", text.len());
    assert_eq!(section.outline.lumens[0].outer.points.len(), 1_000_000);
    let exact = std::f64::consts::PI * 2500e-12;
    assert!((section.outline.area() / exact - 1.0).abs() < 1e-6);
    assert!(seconds < 5.0, "{seconds} s");
}

#[test]
fn a_hundred_thousand_vertices_in_a_section_file_are_read_in_about_a_second() {
    let mut text = String::from("unit = \"um\"\n[[lumen]]\nouter = [\n");
    for (x, y) in circle(100_000) {
        let _ = writeln!(text, "  [{x:.9}, {y:.9}],");
    }
    text.push_str("]\n");
    let start = Instant::now();
    let section = from_text(&text);
    let seconds = start.elapsed().as_secs_f64();
    println!("100000 vertices, {} bytes: {seconds:.2} s", text.len());
    assert_eq!(section.outline.lumens[0].outer.points.len(), 100_000);
    assert!(seconds < 5.0, "{seconds} s");
    let start = Instant::now();
    let again = from_text(&written(&section));
    println!(
        "written and read again: {:.2} s",
        start.elapsed().as_secs_f64()
    );
    assert_eq!(again.outline, section.outline);
}

#[test]
fn too_many_vertices_are_refused() {
    let mut text = String::from("x_um,y_um\n");
    for i in 0..4_000_001 {
        let _ = writeln!(text, "{},{}", i % 7, i % 5);
    }
    let error = section_from_bytes(text.into_bytes(), "text", &ReadOptions::default()).unwrap_err();
    assert!(matches!(
        *error.problem,
        ReadProblem::TooManyVertices { .. }
    ));
    assert_eq!(error.place.as_ref().unwrap().line, 4_000_002);
}

fn try_all(bytes: &[u8]) {
    let kinds = [
        None,
        Some(SectionKind::SectionFile),
        Some(SectionKind::OutlineText),
        Some(SectionKind::OutlineSvg),
    ];
    for as_kind in kinds {
        for (unit, svg_scale) in [(None, None), (Some("um".to_owned()), Some(1e-6))] {
            let options = ReadOptions {
                as_kind,
                unit,
                svg_scale,
                allow_any_size: true,
                ..ReadOptions::default()
            };
            let keep = ReadOptions {
                keep_non_finite: true,
                ..options.clone()
            };
            if let Ok(section) = section_from_bytes(bytes.to_vec(), "bytes", &keep) {
                let loops = section.outline.loops().count();
                let mut numbers = section.loop_numbers.clone();
                numbers.sort_unstable();
                assert!(numbers.into_iter().eq(0..loops));
                let points = || section.outline.loops().flat_map(|w| &w.points);
                let is_finite = points().flatten().all(|c| c.is_finite());
                assert!(is_finite || section.outline.problems().has_errors());
            }
            match section_from_bytes(bytes.to_vec(), "bytes", &options) {
                Ok(section) => {
                    let points = || section.outline.loops().flat_map(|w| &w.points);
                    assert!(points().all(|p| p[0].is_finite() && p[1].is_finite()));
                    assert!(points().next().is_some());
                }
                Err(error) => assert!(error.explain().contains("help: ")),
            }
        }
    }
}

#[test]
fn files_cut_off_or_damaged_anywhere_never_panic() {
    for path in files("good").into_iter().chain(files("bad")) {
        let bytes = fs::read(&path).unwrap();
        for end in 0..bytes.len() {
            try_all(&bytes[..end]);
            let mut damaged = bytes.clone();
            for value in [0, b'[', b'"', b',', 0xff, b'9'] {
                damaged[end] = value;
                if end % 3 == 0 {
                    try_all(&damaged);
                }
            }
        }
    }
}

#[test]
fn deep_nesting_and_long_lines_never_panic() {
    for text in [
        "[".repeat(100_000),
        format!("a = {}", "[".repeat(100_000)),
        "<g>".repeat(100_000),
        format!("<svg>{}", "<g>".repeat(100_000)),
        format!(
            "<svg>{}{}</svg>",
            "<g>".repeat(50_000),
            "</g>".repeat(50_000)
        ),
        "\r".repeat(1_000_000),
        "1,".repeat(500_000),
        "1 ".repeat(500_000),
        format!("x_um,y_um\n{}", "9".repeat(1_000_000)),
        format!(
            "<svg><path d=\"M0 0{}\"/></svg>",
            "q1 1e300 2e300 0".repeat(2000)
        ),
        format!("<svg><path d=\"M0 0{}\"/></svg>", "q1 1 2 0".repeat(20_000)),
    ] {
        try_all(text.as_bytes());
    }
}

proptest! {
    #[test]
    fn arbitrary_bytes_never_panic(bytes in proptest::collection::vec(any::<u8>(), 0..400)) {
        try_all(&bytes);
    }

    #[test]
    fn arbitrary_tables_never_panic(text in "(x_um[,; \t]y_mm(,loop)?)?([-0-9.,;eE \t\r\n#xnaif\u{b5}]{0,60}\n){0,6}") {
        try_all(text.as_bytes());
    }

    #[test]
    fn arbitrary_drawings_never_panic(data in "M[-0-9.eE, MmLlHhVvCcSsQqTtAaZz]{0,60}", transform in "(matrix|scale|rotate|skewX)\\([-0-9.e, ]{0,16}\\)|scale\\([1-9]e30[0-7]\\)") {
        let text = format!(
            "<svg xmlns='http://www.w3.org/2000/svg'><path transform='{transform}' d='{data}'/></svg>"
        );
        try_all(text.as_bytes());
    }

    #[test]
    fn written_sections_read_back_to_the_same_bits(
        points in proptest::collection::vec((-1e-3_f64..1e-3, -1e-3_f64..1e-3), 3..40),
        name in "\\PC{0,12}",
    ) {
        let mut section = from_text("x_um,y_um\n0,0\n100,0\n100,50\n");
        let points = points.into_iter().map(|(x, y)| [x, y]).collect();
        section.outline = etchwise::geometry::Outline::single(points);
        section.name = Some(name);
        let again = from_text(&written(&section));
        prop_assert_eq!(again.outline, section.outline);
        prop_assert_eq!(again.name, section.name);
    }
}

/// The section as the text of a section file.
fn written(section: &Section) -> String {
    to_toml(
        section.name.as_deref(),
        &section.outline,
        section.nominal.as_ref(),
        &section.extras,
    )
}

#[test]
fn named_walls_are_read_along_the_oriented_outline() {
    // Drawn clockwise; stretches still run with the fluid on the left.
    let section = from_text(
        "unit = \"um\"\n[[lumen]]\nouter = [[0, 0], [0, 50], [100, 50], [100, 0]]\n\
         islands = [[[40, 20], [60, 20], [60, 30], [40, 30]]]\n\
         [[wall]]\nname = \"heated\"\nfrom = [\"0.02 mm\", 0]\nto = [100, 10]\n\
         [[wall]]\nname = \"post\"\nloop = 2\n",
    );
    let [heated, post] = section.walls.as_slice() else {
        panic!("{:?}", section.walls);
    };
    assert_eq!((heated.name.as_str(), heated.loop_index), ("heated", 0));
    assert!((heated.from - 20e-6).abs() < 1e-15 && (heated.to - 110e-6).abs() < 1e-15);
    assert_eq!((post.name.as_str(), post.loop_index), ("post", 1));
    assert!(post.from == 0.0 && (post.to - 60e-6).abs() < 1e-15);
}
