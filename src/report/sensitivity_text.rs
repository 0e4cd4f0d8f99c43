//! The text view of the sensitivity study: one table of changes, what each moves, and the evidence.

use std::fmt::Write as _;

use super::numbers::{self, per_cent, significant, with_unit};
use super::sensitivity_document::{SensitivityDocument, Step};
use super::table::{Align, Table, paragraph};
use super::text::{TextOptions, finished, part, title, warnings};
use crate::study::{
    Check, FirstOrderRange, NoCheck, SECOND_ORDER_SHARE, Sensitivity, SensitivityStudy,
};

/// The document as text, ended by a line feed.
pub fn sensitivity_text(document: &SensitivityDocument<'_>, options: TextOptions) -> String {
    let mut parts = vec![
        title(document.section_name, document.source),
        conductance(document),
        changes(document),
        definitions(document),
        evidence(document),
    ];
    if options.verbose && document.study.check_grid.is_some() {
        parts.push(second_order(document));
    }
    parts.extend(warnings(&document.all_warnings()));
    finished(&parts, options)
}

fn conductance(document: &SensitivityDocument<'_>) -> String {
    let (k, g) = (document.flow.conductance, &document.flow.geometry);
    let length = |v: f64| with_unit(v, numbers::LENGTHS, 5);
    format!(
        "Conductance K {} m^4 (estimated error {}), width {}, depth {}\n",
        significant(k.value, 7),
        per_cent(k.relative()),
        length(g.width),
        length(g.height),
    )
}

/// A signed per cent value.
fn change(relative: f64) -> String {
    let percent = 100.0 * relative;
    let sign = if percent < 0.0 { "" } else { "+" };
    format!("{sign}{} %", significant(percent, 4))
}

fn with_step(value: f64, step: Step) -> String {
    format!("{} {}", significant(value, 2), step.unit)
}

fn changes(document: &SensitivityDocument<'_>) -> String {
    let heads = [
        "change",
        "by",
        "K",
        "R",
        "K, new solves",
        "off by",
        "+/-",
        "enough for K to",
        "for R to",
    ];
    let is_checked = document.study.check_grid.is_some();
    let heads = if is_checked { &heads[..] } else { &heads[..4] };
    let mut columns = vec![Align::Right; heads.len()];
    columns[0] = Align::Left;
    let mut table = Table::new(&columns);
    table.row(heads.iter().copied());
    for case in &document.study.cases {
        for (index, step) in Step::of(case).into_iter().enumerate() {
            table.row(change_row(case, step, index == 0));
        }
    }
    let mut explained = "Both change in proportion to a small change, and dlnR = -dlnK.".to_owned();
    if is_checked {
        let _ = write!(
            explained,
            " K, new solves: half the difference of two solves with the walls moved either way, and by how much \
             the prediction is off, with the estimated numerical error of the new solves (+/-). First order is \
             enough up to the change at which the second-order term is {} of the first-order one; `>`: at \
             least up to there, more cannot be said.",
            per_cent(SECOND_ORDER_SHARE)
        );
    } else {
        let why = unchecked_because(document.study);
        let _ = write!(
            explained,
            " Nothing was solved again ({why}), so where the second order matters is not known."
        );
    }
    format!(
        "{}{}",
        part(
            "First-order change of conductance K and resistance R",
            &table
        ),
        paragraph("  ", &explained)
    )
}

/// Why no case was checked, in brackets behind saying so.
fn unchecked_because(study: &SensitivityStudy) -> String {
    let reasons = study
        .cases
        .iter()
        .filter_map(|case| case.check.as_ref().err());
    match reasons.into_iter().next() {
        Some(NoCheck::NotAsked) | None => "--no-check".to_owned(),
        Some(reason) => reason.to_string(),
    }
}

fn change_row(case: &Sensitivity, step: Step, is_first: bool) -> Vec<String> {
    let mut cells = vec![
        case.name.clone(),
        format!("+1 {}", step.unit),
        change(case.relative * step.size),
        change(-case.relative * step.size),
    ];
    match &case.check {
        Ok(check) => {
            cells.push(change(check.first_order * step.size));
            let share =
                |value: Option<f64>| value.filter(|_| is_first).map_or(String::new(), per_cent);
            cells.push(share(case.check_difference()));
            cells.push(share(Some(check.first_order_error / case.gross)));
            let shown = |change: f64| with_step(change / step.size, step);
            let reaches = [check.reach_for_conductance(), check.reach_for_resistance()];
            cells.extend(reaches.map(|reach| match reach {
                FirstOrderRange::UpTo(change) => shown(change),
                FirstOrderRange::AtLeast(change) => format!("> {}", shown(change)),
            }));
        }
        Err(_) => cells.push(String::new()),
    }
    cells
}

fn definitions(document: &SensitivityDocument<'_>) -> String {
    let mut out =
        "What moves (walls face where their normal out of the fluid points, within 45 degrees)\n"
            .to_owned();
    for case in &document.study.cases {
        out.push_str(&paragraph(
            "  ",
            &format!("{}: {}", case.name, case.definition),
        ));
    }
    for none in &document.study.absent {
        out.push_str(&paragraph("  ", &format!("{}: {}", none.name, none.reason)));
    }
    out
}

fn evidence(document: &SensitivityDocument<'_>) -> String {
    let (study, grid) = (document.study, &document.flow.grid);
    let mut table = Table::new(&[Align::Left, Align::Left, Align::Left]);
    table.row([
        "depth and width together".to_owned(),
        format!("dlnK = {}", significant(study.stretch_sum, 6)),
        format!(
            "exactly 4; off by {}",
            per_cent(study.stretch_sum / 4.0 - 1.0)
        ),
    ]);
    let [x, y] = study.shift;
    table.row([
        "moving the whole section".to_owned(),
        format!("along x {}, along y {}", per_cent(x), per_cent(y)),
        "of an over-etch as large; exactly 0".to_owned(),
    ]);
    table.row([
        "grid of the prediction".to_owned(),
        format!(
            "{} cells across, {} fluid nodes",
            significant(grid.cells_across, 4),
            grid.fluid_nodes
        ),
    ]);
    let (solves, remark) = match study.check_grid {
        Some((cells, k)) => (
            format!(
                "{} cells across, K {} m^4",
                significant(cells, 4),
                significant(k, 7)
            ),
            "unmoved, on that grid".to_owned(),
        ),
        None => ("none".to_owned(), String::new()),
    };
    table.row(["grid of the new solves".to_owned(), solves, remark]);
    let mut out = part("Evidence", &table);
    for (reason, names) in unchecked(study) {
        let are = if names.len() == 1 { "is" } else { "are" };
        let told = format!("{} {are} not checked: {reason}.", names.join(", "));
        out.push_str(&paragraph("  ", &told));
    }
    out
}

/// Cases without a check where others have one, by the reason.
fn unchecked(study: &SensitivityStudy) -> Vec<(String, Vec<&str>)> {
    let mut found: Vec<(String, Vec<&str>)> = Vec::new();
    for case in study.cases.iter().filter(|_| study.check_grid.is_some()) {
        let Err(reason) = &case.check else { continue };
        let reason = reason.to_string();
        match found.iter_mut().find(|(known, _)| *known == reason) {
            Some((_, names)) => names.push(&case.name),
            None => found.push((reason, vec![&case.name])),
        }
    }
    found
}

/// The new solves in numbers.
fn second_order(document: &SensitivityDocument<'_>) -> String {
    let mut table = Table::new(&[Align::Left, Align::Right, Align::Right, Align::Right]);
    table.row(["change q", "step of the check", "a", "b"]);
    for case in &document.study.cases {
        let (Ok(check), Some(&step)) = (&case.check, Step::of(case).first()) else {
            continue;
        };
        let Check {
            first_order,
            second_order,
            ..
        } = check;
        table.row([
            case.name.clone(),
            with_step(check.step / step.size, step),
            format!(
                "{} per {}",
                significant(first_order * step.size, 5),
                step.unit
            ),
            format!(
                "{} per {}\u{b2}",
                significant(second_order * step.size * step.size, 3),
                step.unit
            ),
        ]);
    }
    part(
        "New solves: K(q) = K (1 + a q + b q\u{b2}/2), R(q) = R (1 - a q + (a\u{b2} - b/2) q\u{b2})",
        &table,
    )
}
