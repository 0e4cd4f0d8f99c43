//! No text makes the table readers panic: files cut at every byte, and random text.

use proptest::prelude::*;

use super::super::height_map::map_from_bytes;
use super::table_kind::table_kind;
use super::table_options::{Decimal, TableOptions};
use super::table_trace::trace_from_bytes;

/// Invented files in different dialects.
const DIALECTS: [&str; 9] = [
    "Scan Parameters\r\n\r\nStylus,Radius: 4.0 \u{b5}m\r\nLength,2.0 um\r\nResolution,0.500 um/sample\r\n\r\n\
     Scan Data\r\n\r\nLateral um,Raw Nanometer,\r\n0.0,10.25,,\r\n0.5,20.5,,\r\n1.0,-15,,\r\n1.5,3,,\r\n\r\r\n",
    "Breite: 1,5 \u{b5}m\nWeg [\u{b5}m];H\u{f6}he [nm]\n0;10,0\n0,5;20,0\n1,0;NaN\n1,5;12,5\n",
    "um nm\n4\n   1.0e+00,   1.0e+01\n   1.5e+00,   2.0e+01\n   2.0e+00,  -1.5e+01\n   2.5e+00,   1.0e+00\n",
    "index,x in \u{3bc}m,y in \u{3bc}m\n0,0,0.0123456789\n1,0.5,0.02\n2,1,-0.015\n3,1.5,***\n",
    "Resolution: 0.5 um\nHeight (nm)\n3\n10\n20\n-15\n",
    "\"x_um\",\"z_nm\"\n\"0,0\",\"10,25\"\n\"0,5\",\"20\"\n\"1\",\"-15\"\n",
    "# Breite: 9,0 \u{b5}m\n# H\u{f6}he: 400 nm\n# Value units: nm\n1 2.5 3\n4 NaN 6\n",
    "x_um\ty_um\tz_nm\n2\t0\t3.25\n0\t0\t1\n1\t0\t2\n0\t5\t4\n1\t5\tNaN\n2\t5\t1\n",
    ",0,2,4,6\n0,1,2,3,4\n5,5,6,7,8\n10,9,1,2,3\n",
];

/// Reads bytes in every way; an error must say what it is and what to do.
fn read_all(bytes: &[u8], options: &TableOptions) {
    let _ = table_kind(&String::from_utf8_lossy(bytes));
    let error = trace_from_bytes(bytes.to_vec(), "text", options).err();
    let of_map = map_from_bytes(bytes.to_vec(), "text", options).err();
    for error in error.into_iter().chain(of_map) {
        let shown = error.explain();
        assert!(
            shown.starts_with("error: ") && shown.contains("\nhelp: "),
            "{shown}"
        );
    }
}

fn some_options() -> [TableOptions; 4] {
    let plain = TableOptions::default();
    let units = TableOptions {
        unit: Some("um".to_owned()),
        x_step: Some(1e-6),
        y_step: Some(1e-6),
        ..TableOptions::default()
    };
    let comma = TableOptions {
        decimal: Some(Decimal::Comma),
        z_column: Some("2".to_owned()),
        ..units.clone()
    };
    let point = TableOptions {
        decimal: Some(Decimal::Point),
        allow_any_size: true,
        x_column: Some("x".to_owned()),
        ..units.clone()
    };
    [plain, units, comma, point]
}

#[test]
fn a_file_cut_at_any_byte_is_read_or_refused() {
    let mut files: Vec<Vec<u8>> = DIALECTS
        .iter()
        .map(|text| text.as_bytes().to_vec())
        .collect();
    let mut wide = vec![0xff, 0xfe];
    wide.extend(DIALECTS[3].encode_utf16().flat_map(u16::to_le_bytes));
    files.push(wide);
    for bytes in files {
        for end in 0..=bytes.len() {
            for options in some_options() {
                read_all(&bytes[..end], &options);
            }
        }
    }
}

proptest! {
    #[test]
    fn random_bytes_never_panic(bytes in proptest::collection::vec(any::<u8>(), 0..300)) {
        for options in some_options() {
            read_all(&bytes, &options);
        }
    }

    #[test]
    fn random_tables_never_panic(text in "([-0-9.,;eE+\t nNaAxyzumXZ#:\"\u{b5}\u{fffd}()_*]{0,12}[\n\r,; ]){0,30}") {
        for options in some_options() {
            read_all(text.as_bytes(), &options);
        }
    }

    #[test]
    fn random_rows_of_numbers_never_panic(
        rows in proptest::collection::vec(proptest::collection::vec(-1e3_f64..1e3, 0..5), 0..20),
        separator in prop::sample::select(vec![",", ";", "\t", " ", ", "]),
    ) {
        let lines: Vec<String> = rows
            .iter()
            .map(|row| row.iter().map(|v| format!("{v:.2}")).collect::<Vec<_>>().join(separator))
            .collect();
        for options in some_options() {
            read_all(lines.join("\n").as_bytes(), &options);
        }
    }

    /// Numbers in any dialect come back as they were written.
    #[test]
    fn samples_survive_every_dialect(
        heights in proptest::collection::vec(-9999_i32..9999, 3..40),
        marks in prop::sample::select(vec![(",", "."), (";", ","), ("\t", ","), (" ", "."), (" ", ","), (", ", ".")]),
    ) {
        let (separator, decimal) = marks;
        let mut text = format!("x_um{separator}z_nm\n");
        for (index, height) in heights.iter().enumerate() {
            let z = format!("{:.2}", f64::from(*height) / 100.0).replace('.', decimal);
            let x = format!("{index}.50").replace('.', decimal);
            text += &[x.as_str(), separator, &z, "\n"].concat();
        }
        let options = TableOptions { allow_any_size: true, ..TableOptions::default() };
        let (trace, _) = trace_from_bytes(text.into_bytes(), "text", &options).unwrap();
        for (index, height) in heights.iter().enumerate() {
            let wanted = f64::from(*height) * 1e-11;
            prop_assert!((trace.profile.z[index] - wanted).abs() < 1e-20);
            prop_assert!((trace.profile.x[index] - (index as f64 + 0.5) * 1e-6).abs() < 1e-18);
        }
    }
}
