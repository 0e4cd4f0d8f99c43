//! Invented SDF files, whole and spoilt.

use super::spoilt_bytes::spoilt;
use super::{HeightMap, MapProblem, SurfaceContent, SurfaceFormat, read_surface, surface_format};

const TEXT: &str = "aISO-1.0\r\nManufacID = invented\r\nCreateDate = 010120010000\r\n\
    ModDate = 010120010000\r\nNumPoints = 3\r\nNumProfiles = 2\r\nXscale = 2.0E-6\r\n\
    Yscale = 3.0E-6\r\nZscale = 1.0E-9\r\nZresolution = -1\r\nCompression = 0\r\nDataType = 6\r\n\
    CheckType = 0\r\n*\r\n10 20 BAD\r\n40 -50 60\r\n*\r\n< Operator > A. N. Other < / Operator >\r\n*\r\n";

fn map(bytes: &[u8]) -> (HeightMap, Vec<String>) {
    assert_eq!(surface_format(bytes), Some(SurfaceFormat::Sdf));
    let (content, warnings) = read_surface(bytes, SurfaceFormat::Sdf, None).unwrap();
    let SurfaceContent::Map(map) = content else {
        panic!("{content:?}")
    };
    (map, warnings.into_iter().map(|w| w.message).collect())
}

fn problem(bytes: &[u8]) -> MapProblem {
    read_surface(bytes, SurfaceFormat::Sdf, None).unwrap_err()
}

/// A binary file of 3 x 2 heights.
fn binary(magic: &str, data_type: u8, data: &[u8]) -> Vec<u8> {
    let mut bytes = magic.as_bytes().to_vec();
    bytes.extend_from_slice(b"invented\0 010120010000010120010000");
    if magic.ends_with("2.0") {
        bytes.extend(3_u32.to_le_bytes());
        bytes.extend(2_u32.to_le_bytes());
    } else {
        bytes.extend(3_u16.to_le_bytes());
        bytes.extend(2_u16.to_le_bytes());
    }
    for scale in [2e-6_f64, 3e-6, 1e-9, -1.0] {
        bytes.extend(scale.to_le_bytes());
    }
    bytes.extend([0, data_type, 0]);
    bytes.extend_from_slice(data);
    bytes
}

#[test]
fn text_with_missing_points_and_a_trailer() {
    let (map, defects) = map(TEXT.as_bytes());
    assert_eq!((map.size, map.spacing), ([3, 2], [2e-6, 3e-6]));
    assert!((map.height(1, 1) + 50e-9).abs() < 1e-20 && map.height(2, 0).is_nan());
    assert!(
        map.metadata
            .contains(&("Operator".into(), "A. N. Other".into()))
    );
    assert!(
        map.metadata
            .contains(&("ManufacID".into(), "invented".into()))
    );
    assert!(defects.is_empty(), "{defects:?}");
}

#[test]
fn headers_may_be_untidy() {
    let untidy = TEXT
        .replace("\r\n", "\n")
        .replace(
            "NumPoints = 3",
            "  numpoints=3\nColour = blue\nNum Points = 4",
        )
        .replace("Xscale = ", "XSCALE: ")
        .replace("CheckType = 0\n", "")
        .replace("DataType = 6\n", "DataType = 4\n")
        .replace("40 -50 60\n*\n", "40\n-128.5\n60\n")
        .replace("< Operator > A. N. Other < / Operator >\n*\n", "");
    let (map, defects) = map(untidy.as_bytes());
    assert_eq!(map.missing(), 1);
    assert!(map.metadata.contains(&("Colour".into(), "blue".into())));
    for part in [
        "`NumPoints` is in the header twice",
        "no `=`",
        "no `CheckType`",
        "does not list heights as 8-bit integer",
        "1 heights have fractions",
        "no line with `*`",
    ] {
        assert!(
            defects.iter().any(|d| d.contains(part)),
            "{part}: {defects:?}"
        );
    }
    let (_, defects) = super::sdf_tests::map(format!("{TEXT}more words\n").as_bytes());
    assert!(defects[0].contains("10 characters follow"), "{defects:?}");
}

#[test]
fn text_that_cannot_be_read_is_told_with_its_line() {
    let with = |from: &str, to: &str| problem(TEXT.replace(from, to).as_bytes());
    assert_eq!(
        with("40 -50 60\r\n*", "40\r\n*"),
        MapProblem::Truncated {
            found: 4,
            expected: 6,
            what: "heights"
        }
    );
    assert_eq!(
        with("40 -50 60", "40 -50 60 70"),
        MapProblem::TooMany {
            found: 7,
            expected: 6,
            what: "heights"
        }
    );
    assert_eq!(
        with("-50", "-5,0"),
        MapProblem::NotAHeight {
            line: 16,
            text: "-5,0".into()
        }
    );
    assert!(matches!(
        with("Zscale = 1.0E-9", "Zscale = 1,0E-9"),
        MapProblem::HeaderValue { .. }
    ));
    assert_eq!(
        with("Xscale", "Yours"),
        MapProblem::HeaderKeyMissing { key: "Xscale" }
    );
    assert!(matches!(
        with("Compression = 0", "Compression = 1"),
        MapProblem::Unsupported { .. }
    ));
    assert!(matches!(
        with("CheckType = 0", "CheckType = 1"),
        MapProblem::Unsupported { .. }
    ));
    assert!(matches!(
        with("DataType = 6", "DataType = 9"),
        MapProblem::HeaderValue { .. }
    ));
    assert!(matches!(
        with("ISO-1.0", "ISO-3.0"),
        MapProblem::SdfVersion { .. }
    ));
    assert!(matches!(
        with("ModDate = ", "words "),
        MapProblem::HeaderLine { line: 4, .. }
    ));
    assert!(matches!(
        with("NumPoints = 3", "NumPoints = 4000000000"),
        MapProblem::TooManyPoints { .. }
    ));
}

#[test]
fn binary_types_and_their_marks_of_missing_points() {
    let values = [10_i32, 20, 30, 40, 50];
    macro_rules! data {
        ($number:ty, $mark:expr) => {{
            let mut data: Vec<u8> = Vec::new();
            for value in values {
                data.extend((value as $number).to_le_bytes());
            }
            let mark: $number = $mark;
            data.extend(mark.to_le_bytes());
            data
        }};
    }
    let iso = [
        (4, data!(i8, i8::MIN)),
        (5, data!(i16, i16::MIN)),
        (6, data!(i32, i32::MIN)),
        (3, data!(f32, f32::MIN)),
        (7, data!(f64, f64::MIN)),
        (7, data!(f64, f64::NAN)),
    ];
    for magic in ["bISO-1.0", "bISO-2.0"] {
        for (code, data) in &iso {
            let (map, _) = map(&binary(magic, *code, data));
            assert!((map.height(0, 1) - 40e-9).abs() < 1e-20, "{magic} {code}");
            assert!(
                map.height(2, 1).is_nan() && map.missing() == 1,
                "{magic} {code}"
            );
        }
    }
    let bcr = [
        (0, data!(u8, u8::MAX)),
        (1, data!(u16, u16::MAX)),
        (2, data!(u32, u32::MAX)),
        (3, data!(f32, 3.401e38)),
        (4, data!(i8, i8::MAX)),
        (5, data!(i16, i16::MAX)),
        (6, data!(i32, i32::MAX)),
        (7, data!(f64, 1.7e308)),
    ];
    for (code, data) in &bcr {
        let (map, defects) = map(&binary("bBCR-1.0", *code, data));
        // The first row is that of largest y.
        assert!((map.height(0, 1) - 10e-9).abs() < 1e-20, "{code}");
        assert!((map.height(1, 0) - 50e-9).abs() < 1e-20, "{code}");
        assert!(map.height(2, 0).is_nan() && map.missing() == 1, "{code}");
        assert!(defects.is_empty(), "{defects:?}");
    }
}

#[test]
fn bcr_text_has_comments_and_names() {
    let text = TEXT
        .replace("aISO-1.0", "ABCR-1.0 ; a comment")
        .replace("DataType = 6", "DataType = LONGINT ; whole")
        .replace("Compression = 0", "Compression = null")
        .replace("BAD", "2147483647");
    let (map, defects) = map(text.as_bytes());
    assert!((map.height(0, 0) - 40e-9).abs() < 1e-20 && map.height(2, 1).is_nan());
    assert!(defects.is_empty(), "{defects:?}");
}

#[test]
fn binary_ends_are_told() {
    let data: Vec<u8> = (0..6_i16).flat_map(i16::to_le_bytes).collect();
    let whole = binary("bISO-1.0", 5, &data);
    assert_eq!(
        problem(&whole[..whole.len() - 3]),
        MapProblem::Truncated {
            found: 4,
            expected: 6,
            what: "heights"
        }
    );
    assert!(matches!(
        problem(&whole[..60]),
        MapProblem::Truncated {
            found: 60,
            expected: 81,
            ..
        }
    ));
    let mut trailed = whole.clone();
    trailed.extend_from_slice(b"Operator = A. N. Other\r\n");
    let (told, defects) = map(&trailed);
    assert!(
        told.metadata
            .contains(&("Operator".into(), "A. N. Other".into()))
    );
    assert!(defects.is_empty(), "{defects:?}");
    let mut garbage = whole;
    garbage.extend([1, 2, 255]);
    let (_, defects) = map(&garbage);
    assert!(defects[0].contains("3 bytes follow"), "{defects:?}");
}

#[test]
fn one_row_is_a_profile() {
    let row = TEXT
        .replace("NumProfiles = 2", "NumProfiles = 1")
        .replace("40 -50 60\r\n", "");
    let (content, _) = read_surface(row.as_bytes(), SurfaceFormat::Sdf, None).unwrap();
    let SurfaceContent::Profile(trace) = content else {
        panic!("one row is a profile")
    };
    assert_eq!(trace.profile.x, [0.0, 2e-6, 4e-6]);
    assert!(trace.profile.z[2].is_nan());
}

#[test]
fn only_surface_files_are_recognised() {
    for magic in ["bISO-1.0", "aISO-2.0", "aBCR-1.0", "bBCR-1.0", "  aISO-1.0"] {
        assert_eq!(surface_format(magic.as_bytes()), Some(SurfaceFormat::Sdf));
    }
    for other in [
        "",
        "aISO-1",
        "cISO-1.0",
        "x_um,z_um",
        "PK\u{3}\u{4}rest",
        "aISO_1.0",
    ] {
        assert_eq!(surface_format(other.as_bytes()), None, "{other}");
    }
}

#[test]
fn cut_and_flipped_files_never_panic() {
    let data: Vec<u8> = (0..6_i16).flat_map(i16::to_le_bytes).collect();
    for whole in [TEXT.as_bytes().to_vec(), binary("bISO-2.0", 5, &data)] {
        for end in 0..whole.len() {
            let _ = read_surface(&whole[..end], SurfaceFormat::Sdf, None);
            let _ = surface_format(&whole[..end]);
        }
        for spoilt in spoilt(&whole, 2000) {
            let _ = read_surface(&spoilt, SurfaceFormat::Sdf, Some(1.0));
        }
    }
}
