//! Invented x3p files, whole and spoilt.

use std::io::{Cursor, Write};

use md5::{Digest, Md5};
use zip::write::{SimpleFileOptions, ZipWriter};

use super::spoilt_bytes::spoilt;
use super::{
    HeightMap, MapProblem, SurfaceContent, SurfaceFormat, heights_csv, read_surface, surface_format,
};
use crate::warning::{Code, Warning};

const DATA: &str = "bindata/data.bin";

/// An axis of the description.
fn axis(name: &str, kind: char, number: char, increment: f64, offset: f64) -> String {
    format!(
        "<{name}><AxisType>{kind}</AxisType><DataType>{number}</DataType>\
         <Increment>{increment}</Increment><Offset>{offset}</Offset></{name}>"
    )
}

/// Even axes x and y, every 2 um and 3 um.
fn even() -> String {
    axis("CX", 'I', 'D', 2e-6, 0.0) + &axis("CY", 'I', 'D', 3e-6, 0.0)
}

fn matrix(x: usize, y: usize) -> String {
    format!(
        "<MatrixDimension><SizeX>{x}</SizeX><SizeY>{y}</SizeY><SizeZ>1</SizeZ></MatrixDimension>"
    )
}

/// Links to files of points, with their check sums.
fn link(data: &[u8], valid: Option<&[u8]>) -> String {
    let valid = valid.map_or_else(String::new, |valid| {
        format!(
            "<ValidPointsLink>bindata/valid.bin</ValidPointsLink>\
             <MD5ChecksumValidPoints>{}</MD5ChecksumValidPoints>",
            md5(valid)
        )
    });
    format!(
        "<DataLink><PointDataLink>{DATA}</PointDataLink>\
         <MD5ChecksumPointData>{}</MD5ChecksumPointData>{valid}</DataLink>",
        md5(data)
    )
}

fn md5(bytes: &[u8]) -> String {
    let digest = Md5::digest(bytes);
    digest.iter().fold(String::new(), |hex, byte| {
        hex + &String::from_utf8(vec![
            b"0123456789abcdef"[usize::from(byte >> 4)],
            b"0123456789abcdef"[usize::from(byte & 15)],
        ])
        .unwrap()
    })
}

fn main_xml(feature: &str, axes: &str, record3: &str) -> String {
    format!(
        "<?xml version=\"1.0\" encoding=\"UTF-8\"?>\
         <p:ISO5436_2 xmlns:p=\"http://www.opengps.eu/2008/ISO5436_2\"><Record1>\
         <Revision>ISO5436 - 2000</Revision><FeatureType>{feature}</FeatureType><Axes>{axes}</Axes>\
         </Record1><Record2><Date>2001-02-03</Date><Instrument><Model>invented</Model></Instrument>\
         </Record2><Record3>{record3}</Record3><Record4><ChecksumFile>md5checksum.hex</ChecksumFile>\
         </Record4></p:ISO5436_2>"
    )
}

fn zip(entries: &[(&str, &[u8])]) -> Vec<u8> {
    let mut writer = ZipWriter::new(Cursor::new(Vec::new()));
    for (name, bytes) in entries {
        writer
            .start_file(*name, SimpleFileOptions::default())
            .unwrap();
        writer.write_all(bytes).unwrap();
    }
    writer.finish().unwrap().into_inner()
}

/// A whole file with its check sum.
fn file(xml: &str, more: &[(&str, &[u8])]) -> Vec<u8> {
    let sum = format!("{} *main.xml\n", md5(xml.as_bytes()));
    let mut entries = vec![
        ("main.xml", xml.as_bytes()),
        ("md5checksum.hex", sum.as_bytes()),
    ];
    entries.extend_from_slice(more);
    zip(&entries)
}

fn read(bytes: &[u8]) -> Result<(SurfaceContent, Vec<Warning>), MapProblem> {
    assert_eq!(surface_format(bytes), Some(SurfaceFormat::X3p));
    read_surface(bytes, SurfaceFormat::X3p, None)
}

fn map(bytes: &[u8]) -> (HeightMap, Vec<String>) {
    let (content, warnings) = read(bytes).unwrap();
    let SurfaceContent::Map(map) = content else {
        panic!("{content:?}")
    };
    assert!(warnings.iter().all(|w| w.code == Code::FileDefect));
    (map, warnings.into_iter().map(|w| w.message).collect())
}

fn doubles(values: &[f64]) -> Vec<u8> {
    values.iter().flat_map(|v| v.to_le_bytes()).collect()
}

/// A file of doubles with the axes and record 3 given.
fn simple() -> (String, Vec<u8>) {
    let data = doubles(&[1e-6, 2e-6, 3e-6, 4e-6, f64::NAN, 6e-6]);
    let axes = even() + &axis("CZ", 'A', 'D', 1.0, 0.0);
    let xml = main_xml("SUR", &axes, &(matrix(3, 2) + &link(&data, None)));
    (xml, data)
}

#[test]
fn a_matrix_of_doubles() {
    let (xml, data) = simple();
    let (map, defects) = map(&file(&xml, &[(DATA, &data)]));
    assert_eq!((map.size, map.spacing), ([3, 2], [2e-6, 3e-6]));
    assert_eq!((map.height(2, 0), map.height(0, 1)), (3e-6, 4e-6));
    assert!(map.height(1, 1).is_nan() && map.missing() == 1);
    assert!(defects.is_empty(), "{defects:?}");
    assert!(
        map.metadata
            .contains(&("Instrument/Model".into(), "invented".into()))
    );
    assert!(heights_csv(&map).starts_with("9.9999999999999995e-7,"));
    assert!(map.steps.iter().any(|s| s.text.contains("1 missing")));
}

#[test]
fn integers_and_short_floats_with_increment_offset_and_valid_points() {
    let stored: [i32; 6] = [-3, 0, 5, 7, 9, -32000];
    let wanted = |increment: f64, offset: f64| stored.map(|n| f64::from(n) * increment + offset);
    let kinds: [(char, Vec<u8>); 3] = [
        (
            'I',
            stored
                .iter()
                .flat_map(|&n| (n as i16).to_le_bytes())
                .collect(),
        ),
        ('L', stored.iter().flat_map(|n| n.to_le_bytes()).collect()),
        (
            'F',
            stored
                .iter()
                .flat_map(|&n| (n as f32).to_le_bytes())
                .collect(),
        ),
    ];
    // The lowest bit is the first point; the fifth point is not valid.
    let valid = [0b0010_1111_u8];
    for (number, data) in kinds {
        let axes = even() + &axis("CZ", 'A', number, 1e-9, 5e-6);
        let xml = main_xml("SUR", &axes, &(matrix(3, 2) + &link(&data, Some(&valid))));
        let bytes = file(&xml, &[(DATA, &data), ("bindata/valid.bin", &valid)]);
        let (map, defects) = map(&bytes);
        for (at, wanted) in wanted(1e-9, 5e-6).into_iter().enumerate() {
            let height = map.heights[at];
            if at == 4 {
                assert!(height.is_nan());
            } else {
                assert!((height - wanted).abs() < 1e-20, "{number} {at}: {height}");
            }
        }
        assert!(defects.is_empty(), "{defects:?}");
    }
}

#[test]
fn data_lists_in_xml() {
    let axes = even() + &axis("CZ", 'A', 'I', 1e-9, -5e-7);
    let list = "<DataList><Datum>1</Datum><Datum/><Datum> 3 </Datum><Datum>4</Datum></DataList>";
    let (map, _) = map(&file(&main_xml("SUR", &axes, &(matrix(2, 2) + list)), &[]));
    assert!((map.height(0, 1) - (3e-9 - 5e-7)).abs() < 1e-20 && map.height(1, 0).is_nan());
    let short = "<DataList><Datum>1</Datum></DataList>";
    assert!(matches!(
        read(&file(&main_xml("SUR", &axes, &(matrix(2, 2) + short)), &[])),
        Err(MapProblem::Truncated {
            found: 1,
            expected: 4,
            ..
        })
    ));
    let odd =
        "<DataList><Datum>1;2</Datum><Datum>1</Datum><Datum>1</Datum><Datum>1</Datum></DataList>";
    assert!(matches!(
        read(&file(&main_xml("SUR", &axes, &(matrix(2, 2) + odd)), &[])),
        Err(MapProblem::ElementValue { .. })
    ));
}

#[test]
fn point_clouds_on_a_grid_become_maps_and_others_are_refused() {
    let axes = axis("CX", 'A', 'D', 1.0, 1e-3)
        + &axis("CY", 'A', 'D', 1.0, 0.0)
        + &axis("CZ", 'A', 'D', 1.0, 0.0);
    let cloud = |points: &[[f64; 3]]| {
        let data = doubles(points.as_flattened());
        let record =
            format!("<ListDimension>{}</ListDimension>", points.len()) + &link(&data, None);
        file(&main_xml("PCL", &axes, &record), &[(DATA, &data)])
    };
    // Six of the eight places of a grid, in no order, a fiftieth of the spacing off.
    let points = [
        [4e-6, 2e-6, 1e-9],
        [0.0, 0.0, 2e-9],
        [6.04e-6, 0.0, 3e-9],
        [2e-6, 2e-6, 4e-9],
        [0.04e-6, 2e-6, 5e-9],
        [6e-6, 2e-6, 6e-9],
        [4e-6, 0.0, f64::NAN],
    ];
    let (map, _) = map(&cloud(&points));
    assert_eq!(map.size, [4, 2]);
    assert!((map.spacing[0] - 2e-6).abs() < 0.02e-6 && (map.spacing[1] - 2e-6).abs() < 1e-15);
    assert_eq!(
        (map.height(0, 0), map.height(3, 0), map.height(3, 1)),
        (2e-9, 3e-9, 6e-9)
    );
    assert_eq!(map.missing(), 2);
    let scattered: Vec<[f64; 3]> = (0..40)
        .map(|at| {
            let t = f64::from(at);
            [1e-5 * (t * 0.618).fract(), 1e-5 * (t * 0.755).fract(), 1e-9]
        })
        .collect();
    let problem = read(&cloud(&scattered)).unwrap_err();
    assert!(matches!(problem, MapProblem::NotAGrid { .. }), "{problem}");
    assert!(problem.hint().contains("matrix"));
}

#[test]
fn profiles_with_even_and_with_stated_positions() {
    let heights = doubles(&[1e-6, 2e-6, 3e-6]);
    let axes = even() + &axis("CZ", 'A', 'D', 1.0, 0.0);
    let xml = main_xml("PRF", &axes, &(matrix(3, 1) + &link(&heights, None)));
    let (content, _) = read(&file(&xml, &[(DATA, &heights)])).unwrap();
    let SurfaceContent::Profile(trace) = content else {
        panic!("one row is a profile")
    };
    assert_eq!(trace.profile.x, [0.0, 2e-6, 4e-6]);
    // Falling, uneven positions beside the heights.
    let pairs = doubles(&[9e-6, 1e-6, 5e-6, 2e-6, 4e-6, 3e-6]);
    let axes = axis("CX", 'A', 'D', 1.0, 0.0)
        + &axis("CY", 'I', 'D', 1.0, 0.0)
        + &axis("CZ", 'A', 'D', 1.0, 0.0);
    let xml = main_xml("PRF", &axes, &(matrix(3, 1) + &link(&pairs, None)));
    let (content, _) = read(&file(&xml, &[(DATA, &pairs)])).unwrap();
    let SurfaceContent::Profile(trace) = content else {
        panic!("one row is a profile")
    };
    assert_eq!(trace.profile.x, [4e-6, 5e-6, 9e-6]);
    assert_eq!(trace.profile.z, [3e-6, 2e-6, 1e-6]);
}

#[test]
fn falling_axes_are_turned_round() {
    let (_, data) = simple();
    let axes = axis("CX", 'I', 'D', -2e-6, 0.0)
        + &axis("CY", 'I', 'D', -3e-6, 0.0)
        + &axis("CZ", 'A', 'D', 1.0, 0.0);
    let xml = main_xml("SUR", &axes, &(matrix(3, 2) + &link(&data, None)));
    let (map, _) = map(&file(&xml, &[(DATA, &data)]));
    assert_eq!((map.height(0, 0), map.height(2, 1)), (6e-6, 1e-6));
    assert_eq!((map.size, map.spacing), ([3, 2], [2e-6, 3e-6]));
}

#[test]
fn defects_are_read_over_and_named() {
    let (xml, data) = simple();
    let spoilt = xml
        .replace("p:ISO5436_2", "Surface")
        .replace("xmlns:p=\"http://www.opengps.eu/2008/ISO5436_2\"", "")
        .replace(&md5(&data), &"0".repeat(32));
    let bytes = zip(&[
        ("__MACOSX/._main.xml", b"x"),
        ("set/main.xml", spoilt.as_bytes()),
        ("set/md5checksum.hex", b"11112222333344445555666677778888"),
        ("set/BinData/DATA.bin", &data),
    ]);
    let (map, defects) = map(&bytes);
    assert_eq!(map.size, [3, 2]);
    for part in [
        "__MACOSX",
        "folder `set`",
        "`Surface` instead of `ISO5436_2`",
        "no namespace",
        "check sum of the description",
        "check sum of the points",
        "holds it as `set/BinData/DATA.bin`",
    ] {
        assert!(
            defects.iter().any(|d| d.contains(part)),
            "{part}: {defects:?}"
        );
        let steps = map.steps.iter().filter(|s| s.what == "file_defect");
        assert!(steps.into_iter().any(|s| s.text.contains(part)), "{part}");
    }
    let (_, defects) = super::x3p_tests::map(&zip(&[("main.xml", xml.as_bytes()), (DATA, &data)]));
    assert!(defects[0].contains("no check sum"), "{defects:?}");
}

#[test]
fn millimetres_are_refused_with_the_likely_unit_and_read_with_it() {
    let data = doubles(&[0.01, 0.02, 0.03, 0.04, 0.05, 0.06]);
    let axes = axis("CX", 'I', 'D', 0.02, 0.0)
        + &axis("CY", 'I', 'D', 0.02, 0.0)
        + &axis("CZ", 'A', 'D', 1.0, 0.0);
    let bytes = file(
        &main_xml("SUR", &axes, &(matrix(3, 2) + &link(&data, None))),
        &[(DATA, &data)],
    );
    let problem = read(&bytes).unwrap_err();
    assert!(
        problem.is_ambiguous() && problem.hint().contains("--unit mm"),
        "{problem}"
    );
    let (content, _) = read_surface(&bytes, SurfaceFormat::X3p, Some(1e-3)).unwrap();
    let SurfaceContent::Map(map) = content else {
        panic!("a map")
    };
    assert!((map.spacing[0] - 20e-6).abs() < 1e-18 && (map.height(0, 0) - 10e-6).abs() < 1e-18);
    assert!(matches!(
        read_surface(&bytes, SurfaceFormat::X3p, Some(0.0)),
        Err(MapProblem::UnitNotPositive { .. })
    ));
}

#[test]
fn contradictions_and_limits_are_told() {
    let (xml, data) = simple();
    let told = |xml: &str, data: &[u8]| read(&file(xml, &[(DATA, data)])).unwrap_err();
    assert!(matches!(
        told(&xml, &data[..20]),
        MapProblem::Truncated {
            found: 2,
            expected: 6,
            ..
        }
    ));
    assert!(matches!(
        told(&xml, &data.repeat(2)),
        MapProblem::TooMany { expected: 6, .. }
    ));
    assert!(matches!(
        told(&xml.replace("<SizeX>3<", "<SizeX>99999999999<"), &data),
        MapProblem::TooManyPoints { .. }
    ));
    assert!(matches!(
        told(
            &xml.replace("<SizeX>3<", "<SizeX>18446744073709551615<"),
            &data
        ),
        MapProblem::TooManyPoints { .. }
    ));
    assert!(matches!(
        told(&xml.replace("<SizeX>3<", "<SizeX>0<"), &data),
        MapProblem::NoPoints { .. }
    ));
    assert_eq!(
        told(&xml.replace("<SizeZ>1<", "<SizeZ>2<"), &data),
        MapProblem::Layers { layers: 2 }
    );
    let entities = xml.replace("?><p:", "?><!DOCTYPE p [<!ENTITY a \"b\">]><p:");
    assert_eq!(told(&entities, &data), MapProblem::XmlDeclaresTypes);
    assert!(matches!(
        told(
            &xml.replace("<Increment>0.000002<", "<Increment>nothing<"),
            &data
        ),
        MapProblem::ElementValue { .. }
    ));
    assert!(matches!(
        told(&xml.replace("</Record3>", ""), &data),
        MapProblem::Xml { .. }
    ));
    assert!(matches!(
        told(&xml.replace(DATA, "elsewhere"), &data),
        MapProblem::EntryMissing { .. }
    ));
    let nothing = doubles(&[f64::NAN; 6]);
    assert_eq!(told(&xml, &nothing), MapProblem::NoHeights { points: 6 });
}

#[test]
fn what_unpacks_beyond_measure_is_stopped() {
    // 120 MB of zeros: a map of 4000 x 3750 doubles as packed by a bomb.
    let axes = even() + &axis("CZ", 'A', 'D', 1.0, 0.0);
    let record = format!(
        "{}<DataLink><PointDataLink>{DATA}</PointDataLink></DataLink>",
        matrix(4000, 3750)
    );
    let bytes = file(
        &main_xml("SUR", &axes, &record),
        &[(DATA, &vec![0; 4000 * 3750 * 8])],
    );
    assert!(bytes.len() < 1 << 20);
    assert!(matches!(read(&bytes), Err(MapProblem::EntryRatio { .. })));
}

#[test]
fn deep_and_odd_xml_does_no_harm() {
    let deep = "<a>".repeat(200_000) + &"</a>".repeat(200_000);
    let _ = read(&zip(&[("main.xml", deep.as_bytes())]));
    for text in ["", "<", "\u{0}", "<a/>", "<p:ISO5436_2/>"] {
        assert!(read(&zip(&[("main.xml", text.as_bytes())])).is_err());
    }
}

#[test]
fn cut_and_flipped_files_never_panic() {
    let (xml, data) = simple();
    let whole = file(&xml, &[(DATA, &data)]);
    for end in 0..whole.len() {
        assert!(
            read_surface(&whole[..end], SurfaceFormat::X3p, None).is_err(),
            "{end}"
        );
        let _ = surface_format(&whole[..end]);
    }
    for spoilt in spoilt(&whole, 1500) {
        let _ = read_surface(&spoilt, SurfaceFormat::X3p, Some(1.0));
    }
    // The description alone, so that the container's own check sum does not catch it first.
    let mut random: u64 = 1;
    for at in 0..xml.len() {
        let cut = xml.get(..at).unwrap_or("");
        assert!(read(&file(cut, &[(DATA, &data)])).is_err(), "{at}");
        let mut spoilt = xml.clone().into_bytes();
        random = random
            .wrapping_mul(6_364_136_223_846_793_005)
            .wrapping_add(99);
        spoilt[at] ^= (random >> 12) as u8 | 1;
        let spoilt = String::from_utf8_lossy(&spoilt);
        let _ = read_surface(
            &file(&spoilt, &[(DATA, &data)]),
            SurfaceFormat::X3p,
            Some(1.0),
        );
    }
}
