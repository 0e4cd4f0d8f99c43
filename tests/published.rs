//! Values from papers, handbooks and independent computations, one data file a source.
//!
//! Each file of `tests/published` has a `[source]` head and `[[check]]` rows with the value as printed. The
//! tolerance of a row is derived: half a unit in the last printed decimal, plus what the method under test
//! says of its own error. A source recalled from memory counts only where an independent value confirms it
//! to the last digit; what is not confirmed sits in a quarantine file, and that is checked too.

#![expect(
    clippy::unwrap_used,
    clippy::panic,
    reason = "a test stops at the first broken data file"
)]

#[path = "published/closed_forms.rs"]
mod closed_forms;
#[path = "published/data.rs"]
mod data;
#[path = "published/fluids.rs"]
mod fluids;
#[path = "published/sections.rs"]
mod sections;

use data::{Seen, all_files};

/// Every file with its number of rows: a file that is lost, added or cut short fails here.
const FILES: [(&str, usize); 17] = [
    ("bruus_2008.toml", 4),
    ("computed_etched.toml", 74),
    ("computed_round.toml", 64),
    ("computed_straight.toml", 86),
    ("computed_velocity_factors.toml", 22),
    ("computed_water.toml", 18),
    ("cornish_1928.toml", 1),
    ("exact_annulus.toml", 57),
    ("exact_ellipse.toml", 23),
    ("exact_rectangle.toml", 80),
    ("iapws_sr6_08.toml", 6),
    ("quarantine_memory.toml", 15),
    ("quarantine_printed.toml", 7),
    ("shah_london_1978.toml", 40),
    ("sutherland_air.toml", 3),
    ("timoshenko_sectors.toml", 3),
    ("torsion_handbook.toml", 23),
];

#[test]
fn every_expected_file_is_there_with_all_its_rows() {
    let found: Vec<(String, usize)> = all_files()
        .into_iter()
        .map(|file| {
            assert_eq!(file.source.rows, file.checks.len(), "{}: rows", file.name);
            (file.name, file.checks.len())
        })
        .collect();
    let expected: Vec<(String, usize)> = FILES.iter().map(|&(n, r)| (n.to_owned(), r)).collect();
    assert_eq!(found, expected);
}

#[test]
fn every_source_is_named() {
    for file in all_files() {
        let source = &file.source;
        for text in [
            &source.authors,
            &source.title,
            &source.publication,
            &source.place,
        ] {
            assert!(!text.trim().is_empty(), "{}: empty head entry", file.name);
        }
        if let Some(year) = source.year {
            assert!((1800..=2100).contains(&year), "{}: year {year}", file.name);
        } else {
            assert!(
                source.publication.contains("not printed") || file.is_quarantine(),
                "{}: no year",
                file.name
            );
        }
    }
}

#[test]
fn recalled_values_count_only_where_an_independent_value_confirms_them() {
    for file in all_files() {
        let recalled = matches!(file.source.seen, Seen::Memory | Seen::Abstract);
        for check in &file.checks {
            let Some(recomputed) = check.recomputed else {
                assert!(
                    !recalled && !file.is_quarantine(),
                    "{}: {} has no independent value",
                    file.name,
                    check.label()
                );
                continue;
            };
            // A hair above half a unit: 0.2995 prints as 0.300 or 0.299.
            let confirmed = (check.value - recomputed).abs() <= check.half_digit() * (1.0 + 1e-6);
            assert_eq!(
                confirmed,
                !file.is_quarantine(),
                "{}: {}: {} against {recomputed}",
                file.name,
                check.label(),
                check.value
            );
        }
    }
}

#[test]
fn every_exception_made_for_a_row_is_explained_in_the_row() {
    for file in all_files() {
        for check in &file.checks {
            let finer = check.cells_across.is_some_and(|cells| cells > 128.0);
            assert_eq!(check.cells_across.is_some(), finer, "{}", check.label());
            if check.below_grid || finer {
                assert!(check.note.is_some(), "{}: no note", check.label());
            }
            let turns_inwards = check.kind == "circular_sector"
                && check.parameter("angle") > std::f64::consts::PI * (1.0 + 1e-12);
            assert_eq!(check.re_entrant, turns_inwards, "{}", check.label());
        }
    }
}
