//! The film and the reach bracket in the text.

use super::document::{ReachRecord, SolveDocument};
use super::numbers::{self, one_line, per_cent, significant, with_unit};
use super::table::paragraph;
use super::text::{counted, part, value_table};
use crate::geometry::{FilmOn, FilmReport};
use crate::study::ReachBound;

/// What a film left of the section.
pub(super) fn film(report: &FilmReport) -> String {
    let mut table = value_table();
    let [before, after] = report.area;
    let si = |values: [f64; 2], unit: &str| {
        let [before, after] = values.map(|v| significant(v, 6));
        format!("{before} before, {after} {unit} after")
    };
    let less = |[before, after]: [f64; 2]| {
        let change = after / before - 1.0;
        let word = if change > 0.0 { "more" } else { "less" };
        format!("{} {word}", per_cent(change.abs()))
    };
    table.row([
        "flow area".to_owned(),
        si([before, after], "m\u{b2}"),
        less([before, after]),
    ]);
    table.row([
        "wetted perimeter".to_owned(),
        si(report.perimeter, "m"),
        less(report.perimeter),
    ]);
    let counts = |[before, after]: [usize; 2]| format!("{before} before, {after} after");
    let mut fate = Vec::new();
    if report.lumens_split > 0 {
        fate.push(format!("{} split", report.lumens_split));
    }
    if report.lumens_vanished > 0 {
        fate.push(format!("{} closed", report.lumens_vanished));
    }
    table.row(["lumens".to_owned(), counts(report.lumens), fate.join(", ")]);
    table.row(["islands".to_owned(), counts(report.islands)]);
    table.row(["vertices now".to_owned(), report.vertices.to_string()]);
    let walls = match report.film.on {
        FilmOn::All => "all walls",
        FilmOn::Floor => "the floor",
        FilmOn::Lid => "the lid",
    };
    let heading = format!(
        "Film of {} on {walls}; everything below is of the section that remains",
        with_unit(report.film.thickness, numbers::LENGTHS, 4)
    );
    let mut out = part(&heading, &table);
    let nudge = report.thickness_used / report.film.thickness - 1.0;
    if nudge.abs() > 1e-12 {
        let note = format!(
            "The thickness used is off by {}: at exactly the one asked for, a neck closes or a part vanishes within rounding.",
            per_cent(nudge)
        );
        out.push_str(&paragraph("  ", &note));
    }
    if report.lumens_left_out > 0 {
        let note = format!(
            "Left out: {} of {} together, with a conductance of at most {} m^4, which is added to the proven high value.",
            counted(report.lumens_left_out, "tiny lumen", "tiny lumens"),
            with_unit(report.area_left_out, numbers::AREAS, 3),
            significant(report.conductance_left_out, 2)
        );
        out.push_str(&paragraph("  ", &note));
    }
    out
}

/// The reach bracket.
pub(super) fn reach(document: &SolveDocument<'_>, record: &ReachRecord<'_>) -> String {
    let reach = record.reach;
    let mut table = value_table();
    let side = |label: &str, bound: &ReachBound| {
        let label = if bound.is_given {
            format!("K, {label} section, proven")
        } else {
            format!("K, {label}: the section itself, proven")
        };
        let range = match &bound.bracket {
            Ok(proven) => range(proven.low, proven.high, "m^4"),
            Err(error) => format!("no proven range: {error}"),
        };
        let area = format!("A = {}", with_unit(bound.area, numbers::AREAS, 5));
        [label, range, area]
    };
    table.row(side("inner", &reach.inner));
    table.row(side("outer", &reach.outer));
    if let (Some(low), Some(high)) = (reach.low(), reach.high()) {
        let width = reach.relative_width().unwrap_or(f64::NAN);
        table.row([
            "K within reach".to_owned(),
            range(low, high, "m^4"),
            format!("{} wide", per_cent(width)),
        ]);
        let k = document.flow.conductance.value;
        let rows = [
            (
                "R' within reach",
                document.resistance_per_length(),
                "Pa s/m^4",
            ),
            ("R within reach", document.resistance(), "Pa s/m\u{b3}"),
        ];
        for (label, estimate, unit) in rows {
            if let Some(r) = estimate {
                let text = range(r.value * k / high, r.value * k / low, unit);
                table.row([label.to_owned(), text]);
            }
        }
    }
    let reason = record.reason.map_or_else(String::new, |text| {
        format!(
            " Reason given: {}.",
            one_line(text).trim().trim_end_matches('.')
        )
    });
    let note = format!(
        "Inner inside section inside outer is proven, so the true K lies within reach wherever the true wall lies \
         between the two. This is what the instrument could not see, not the numerical range above and not a \
         standard uncertainty.{reason}"
    );
    format!(
        "{}{}",
        part(
            "Reach: the smallest and the largest section it could be",
            &table
        ),
        paragraph("  ", &note)
    )
}

fn range(low: f64, high: f64, unit: &str) -> String {
    format!("{} to {} {unit}", significant(low, 6), significant(high, 6))
}
