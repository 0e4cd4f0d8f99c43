//! What came of an instrument's file, for people.

use super::numbers::{self, one_line, per_cent, significant, to_ascii, with_unit};
use super::reading_document::{
    AlternativeRecord, ConductanceRecord, MeasureRecord, ReadingDocument, SectionRecord, StepRecord,
};
use super::table::{Align, Table, paragraph};
use super::text::{TextOptions, counted, part, title, value_table, warnings};

/// The document as text.
pub fn reading_text(document: &ReadingDocument<'_>, options: TextOptions) -> String {
    let mut parts = vec![head(document)];
    parts.extend(steps("From the file to the section", &document.steps));
    let alone = document.sections.len() == 1;
    if !alone {
        parts.push(overview(document));
    }
    for section in &document.sections {
        parts.extend(section_parts(section, alone));
    }
    let all: Vec<_> = document.warnings.iter().map(|&w| w.clone()).collect();
    parts.extend(warnings(&all));
    let text = parts.join("\n");
    if options.ascii { to_ascii(&text) } else { text }
}

/// The settings in force, one a line.
pub fn settings_text(settings: &[(String, String)]) -> String {
    let mut table = Table::new(&[Align::Left, Align::Left]);
    for (option, value) in settings {
        table.row([one_line(option), one_line(value)]);
    }
    part("Settings in force", &table)
}

/// The file and what it says besides.
fn head(document: &ReadingDocument<'_>) -> String {
    let only = match &document.sections[..] {
        [section] => section.name,
        _ => document.source.path,
    };
    let mut out = title(only, Some(document.source));
    let mut table = Table::new(&[Align::Left, Align::Left]);
    for (key, value) in document.metadata.iter().take(METADATA_SHOWN) {
        table.row([one_line(key), one_line(value)]);
    }
    if !document.metadata.is_empty() {
        out.push_str("  the file also says\n");
        out.push_str(&table.print(4));
    }
    if document.metadata.len() > METADATA_SHOWN {
        let more = document.metadata.len() - METADATA_SHOWN;
        out.push_str(&paragraph(
            "    ",
            &format!("and {more} more; --json lists them all"),
        ));
    }
    out
}

/// Entries of the file's own text that are shown.
const METADATA_SHOWN: usize = 12;

/// The steps, numbered.
pub(super) fn steps(heading: &str, steps: &[StepRecord<'_>]) -> Option<String> {
    if steps.is_empty() {
        return None;
    }
    let mut out = format!("{heading}\n");
    for (index, step) in steps.iter().enumerate() {
        let text = format!(
            "{}. {}: {}",
            index + 1,
            step.what.replace('_', " "),
            one_line(step.text)
        );
        out.push_str(&paragraph("  ", &text));
    }
    Some(out)
}

/// All sections in one table.
fn overview(document: &ReadingDocument<'_>) -> String {
    let mut table = Table::new(&[Align::Right, Align::Left, Align::Right, Align::Right]);
    table.row(["no.", "section", "area", "K"]);
    for section in &document.sections {
        let k = section.conductance.as_ref();
        table.row([
            section.number.to_string(),
            numbers::title(section.name),
            with_unit(section.outline.area(), numbers::AREAS, 5),
            k.map_or("not solved".to_owned(), |k| {
                format!("{} m^4", significant(k.value.value, 6))
            }),
        ]);
    }
    let count = counted(document.sections.len(), "section", "sections");
    part(&count, &table)
}

fn section_parts(section: &SectionRecord<'_>, alone: bool) -> Vec<String> {
    let mut parts = Vec::new();
    let name = if alone {
        "The section".to_owned()
    } else {
        format!(
            "Section {}: {}",
            section.number,
            numbers::title(section.name)
        )
    };
    parts.extend(steps(&format!("{name}, steps of its own"), &section.steps));
    parts.push(part(&name, &measures(section)));
    if let Some(k) = &section.conductance {
        parts.push(conductance(k, section.reach_reason));
    }
    if !section.alternatives.is_empty() {
        parts.push(alternatives(&section.alternatives));
    }
    parts.extend(warnings(section.warnings));
    parts
}

fn measures(section: &SectionRecord<'_>) -> Table {
    let mut table = value_table();
    let (low, high) = section.outline.bounds().unwrap_or_default();
    let length = |value: f64| with_unit(value, numbers::LENGTHS, 5);
    table.row([
        "area".to_owned(),
        with_unit(section.outline.area(), numbers::AREAS, 5),
    ]);
    table.row([
        "width, height".to_owned(),
        format!("{}, {}", length(high[0] - low[0]), length(high[1] - low[1])),
    ]);
    for measure in &section.measures {
        table.row([measure.label.to_owned(), measured(measure)]);
    }
    table
}

/// Lengths below this are rounding, m: a hundredth of an atom.
const LEAST_LENGTH: f64 = 1e-12;

/// A number with a unit of sensible size, or why there is none.
fn measured(measure: &MeasureRecord) -> String {
    let Some(value) = measure.value else {
        return format!("none: {}", measure.absent_because);
    };
    match measure.unit {
        "m" if value.abs() < LEAST_LENGTH => "0 m".to_owned(),
        "m" => with_unit(value, numbers::LENGTHS, 5),
        "m^2" => with_unit(value, numbers::AREAS, 5),
        "rad" => format!("{} deg", significant(value.to_degrees(), 5)),
        "1" => significant(value, 5),
        unit => format!("{} {unit}", significant(value, 5)),
    }
}

fn conductance(record: &ConductanceRecord, reason: Option<&str>) -> String {
    let mut table = value_table();
    let value = record.value;
    table.row([
        "K, best value".to_owned(),
        format!("{} m^4", significant(value.value, 6)),
    ]);
    if let Some([low, high]) = record.proven {
        let width = 2.0 * (high - low) / (high + low);
        table.row([
            "K, proven".to_owned(),
            range(low, high),
            format!("{} wide", per_cent(width)),
        ]);
    }
    if let Some([low, high]) = record.within_reach {
        let width = 2.0 * (high - low) / (high + low);
        table.row([
            "K within reach".to_owned(),
            range(low, high),
            format!("{} wide", per_cent(width)),
        ]);
    }
    let mut out = part("Conductance of the outline", &table);
    if record.within_reach.is_some() {
        let reason = reason.map_or_else(String::new, |text| {
            format!(" Reason: {}.", one_line(text).trim().trim_end_matches('.'))
        });
        let note = format!(
            "The proven range is about numerics, for the outline as given; within reach lies K for every wall that \
             the instrument could have seen so.{reason}"
        );
        out.push_str(&paragraph("  ", &note));
    }
    out
}

fn range(low: f64, high: f64) -> String {
    format!("{} to {} m^4", significant(low, 6), significant(high, 6))
}

/// What other assumptions would give.
pub(super) fn alternatives(rows: &[AlternativeRecord]) -> String {
    let mut table = Table::new(&[Align::Left, Align::Left, Align::Right]);
    for row in rows {
        let option = one_line(&row.option);
        match (&row.conductance, row.relative_change) {
            (Ok(k), Some(change)) => {
                let sign = if change < 0.0 { "-" } else { "+" };
                table.row([
                    option,
                    format!("K {} m^4", significant(k.value, 6)),
                    format!("{sign}{}", per_cent(change.abs())),
                ]);
            }
            (Ok(k), None) => table.row([option, format!("K {} m^4", significant(k.value, 6))]),
            (Err(reason), _) => table.row([option, format!("none: {}", one_line(reason))]),
        }
    }
    part("What other assumptions would give", &table)
}
