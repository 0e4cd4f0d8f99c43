//! The text view: what a person reads on a terminal or pastes into a report.
//!
//! Every value stands in SI and, where the trade uses one, in an engineering unit of sensible size.
//! Friction factors always say Fanning or Darcy, and hydraulic diameter or `sqrt(A)`. Wall-clock time is
//! printed in verbose text only, so that the default text of one input is always the same.

use super::document::{SolveDocument, SourceRecord};
use super::numbers::{self, per_cent, significant, with_unit};
use super::table::{Align, Table, paragraph};
use super::text_accuracy::accuracy;
use super::{reading_text, text_operation, text_reach, text_wall};
use crate::flow::{SectionFlow, SectionGeometry};
use crate::geometry::Point;
use crate::warning::Warning;

/// How to print the text.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct TextOptions {
    /// ASCII only: `um` for the micro sign, `^2` for the superscript.
    pub ascii: bool,
    /// With the table of grids, the identities in full and the time taken.
    pub verbose: bool,
}

/// Blanks before every line below a heading.
const INDENT: usize = 2;

/// The document as text, ended by a line feed.
pub fn to_text(document: &SolveDocument<'_>, options: TextOptions) -> String {
    let flow = document.flow;
    let mut parts = vec![title(document.section_name, document.source)];
    parts.extend(reading_text::steps(
        "From the file to the section",
        document.steps,
    ));
    parts.extend(document.film.map(text_reach::film));
    parts.extend([geometry(&flow.geometry), conductance(flow), accuracy(flow)]);
    parts.extend(document.reach.map(|r| text_reach::reach(document, &r)));
    if !document.alternatives.is_empty() {
        parts.push(reading_text::alternatives(document.alternatives));
    }
    parts.extend([friction(flow), velocity(flow)]);
    if document.operating_point.is_none() {
        parts.push(shear_per_gradient(flow));
    }
    parts.extend(text_operation::parts(document));
    parts.extend(text_wall::walls(document));
    parts.push(identities(flow, options.verbose));
    parts.push(evidence(flow, options.verbose));
    parts.extend(warnings(&document.all_warnings()));
    finished(&parts, options)
}

/// The parts of a text view, a blank line between them, in the characters asked for.
pub(super) fn finished(parts: &[String], options: TextOptions) -> String {
    let text = parts.join("\n");
    if options.ascii {
        numbers::to_ascii(&text)
    } else {
        text
    }
}

/// A table of label, SI value and engineering value.
pub(super) fn value_table() -> Table {
    Table::new(&[Align::Left, Align::Left, Align::Left])
}

/// A heading with its table below.
pub(super) fn part(heading: &str, table: &Table) -> String {
    format!("{heading}\n{}", table.print(INDENT))
}

/// Name of the section and the file it came from.
pub(super) fn title(section_name: &str, source: Option<SourceRecord<'_>>) -> String {
    let mut out = format!("Section {}\n", numbers::title(section_name));
    if let Some(source) = source {
        let path = numbers::one_line(source.path);
        let mut table = Table::new(&[Align::Left, Align::Left]);
        table.row([source.kind, path.as_str()]);
        table.row(["sha256", source.sha256]);
        out.push_str(&table.print(INDENT));
        for note in source.notes {
            out.push_str(&paragraph(
                "  ",
                &format!("note: {}", numbers::one_line(note)),
            ));
        }
    }
    out
}

fn geometry(g: &SectionGeometry) -> String {
    let length = |v: f64| with_unit(v, numbers::LENGTHS, 5);
    let si = |v: f64, unit: &str| format!("{} {unit}", significant(v, 6));
    let mut table = value_table();
    table.row([
        "flow area A".to_owned(),
        si(g.area, "m\u{b2}"),
        with_unit(g.area, numbers::AREAS, 5),
    ]);
    table.row([
        "wetted perimeter P".to_owned(),
        si(g.wetted_perimeter, "m"),
        length(g.wetted_perimeter),
    ]);
    table.row([
        "hydraulic diameter Dh = 4 A / P".to_owned(),
        si(g.hydraulic_diameter, "m"),
        length(g.hydraulic_diameter),
    ]);
    table.row(["width".to_owned(), si(g.width, "m"), length(g.width)]);
    table.row(["height".to_owned(), si(g.height, "m"), length(g.height)]);
    let counts = format!(
        "{}, {}, {}",
        counted(g.lumens, "lumen", "lumens"),
        counted(g.islands, "island", "islands"),
        counted(g.vertices, "vertex", "vertices"),
    );
    table.row(["outline".to_owned(), counts]);
    part("Geometry", &table)
}

/// A count with its noun.
pub(super) fn counted(count: usize, one: &str, many: &str) -> String {
    format!("{count} {}", if count == 1 { one } else { many })
}

fn conductance(flow: &SectionFlow) -> String {
    let k = flow.conductance;
    let mut table = value_table();
    table.row([
        "K, best value".to_owned(),
        format!("{} m^4", significant(k.value, 7)),
    ]);
    table.row([
        "estimated error of K".to_owned(),
        format!("{} m^4", significant(k.error, 2)),
        format!("{} of K", per_cent(k.relative())),
    ]);
    let proof = match &flow.bracket {
        Ok(proven) => {
            table.row([
                "K, proven".to_owned(),
                format!(
                    "{} to {} m^4",
                    significant(proven.low, 6),
                    significant(proven.high, 6)
                ),
                format!("{} wide", per_cent(proven.relative_width())),
            ]);
            "The proven range holds for the outline as given, whatever the grid; resistance and friction \
             factors share its relative width."
                .to_owned()
        }
        Err(error) => {
            format!("No proven range: {error}; a finer grid (--cells-across) may give one.")
        }
    };
    table.row([
        "K on the finest grid alone".to_owned(),
        format!("{} m^4", significant(flow.conductance_finest_grid, 7)),
    ]);
    let levels = counted(flow.solver.levels.len(), "grid", "grids");
    let note = format!(
        "{proof} The error of the best value is an estimate from a sequence of {levels} and what is proven on \
         them, not a bound and not a standard uncertainty. K goes with length^4, so 1 % of scale is 4 % of K."
    );
    format!(
        "{}{}",
        part("Conductance K = integral of phi over the section", &table),
        paragraph("  ", &note)
    )
}

fn friction(flow: &SectionFlow) -> String {
    let mut table = value_table();
    let rows = [
        ("Fanning f Re on Dh, Dh\u{b2} A / (2 K)", flow.fanning_dh),
        ("Darcy f Re on Dh, four times that", flow.darcy_dh),
        (
            "Fanning f Re on sqrt(A), 2 A^(5/2) / (P K)",
            flow.fanning_sqrt_area,
        ),
    ];
    for (label, value) in rows {
        table.row([label.to_owned(), significant(value, 6)]);
    }
    format!(
        "{}{}",
        part(
            "Friction factor times Reynolds number (Poiseuille number)",
            &table
        ),
        paragraph(
            "  ",
            "All three hold the perimeter, so on a digitised outline they are as good as its sampling; K is not affected."
        )
    )
}

fn velocity(flow: &SectionFlow) -> String {
    let peak = flow.peak;
    let mut table = value_table();
    let factor = |label: &str, e: crate::measured::Estimate| {
        [
            label.to_owned(),
            significant(e.value, 6),
            format!("estimated error {}", significant(e.error, 2)),
        ]
    };
    table.row(factor("peak over mean velocity", peak.to_mean));
    table.row(factor("momentum factor", flow.momentum_factor));
    table.row(factor("kinetic-energy factor", flow.kinetic_energy_factor));
    table.row(["peak at".to_owned(), place(flow, peak.at)]);
    part("Velocity profile", &table)
}

/// Shear for 1 kPa/m, since without an operating point no gradient is known.
fn shear_per_gradient(flow: &SectionFlow) -> String {
    let kilopascal_per_metre = 1e3;
    let shear = &flow.wall_shear;
    let mut table = value_table();
    for (label, value) in [
        ("mean, exactly A / P", shear.mean_per_gradient),
        ("largest", shear.max_per_gradient),
    ] {
        let pascal = value * kilopascal_per_metre;
        table.row([
            label.to_owned(),
            format!("{} Pa", significant(pascal, 5)),
            format!(
                "{} dyn/cm\u{b2}",
                significant(pascal / numbers::DYN_PER_CM2, 5)
            ),
        ]);
    }
    table.row(shear_place(flow));
    part(
        "Wall shear at a pressure gradient of 1 kPa/m (proportional to it)",
        &table,
    )
}

/// Where the largest shear is, and whether the shear has a bound.
pub(super) fn shear_place(flow: &SectionFlow) -> [String; 3] {
    let corners = flow.wall_shear.singular_corners.len();
    let note = if corners == 0 {
        String::new()
    } else {
        format!(
            "no bound at {}: mean over up to {} beside it",
            counted(corners, "re-entrant corner", "re-entrant corners"),
            with_unit(flow.wall_shear.curve.singular_length, numbers::LENGTHS, 3)
        )
    };
    [
        "largest at".to_owned(),
        place(flow, flow.wall_shear.max_at),
        note,
    ]
}

/// A place in the section.
pub(super) fn place(flow: &SectionFlow, at: Point) -> String {
    numbers::place(at, [flow.geometry.width, flow.geometry.height], 5)
}

fn identities(flow: &SectionFlow, verbose: bool) -> String {
    if flow.identities.is_empty() {
        return "Identities of the exact solution\n  none was checked\n".to_owned();
    }
    let mut table = Table::new(&[
        Align::Left,
        Align::Left,
        Align::Right,
        Align::Right,
        Align::Left,
    ]);
    table.row(["", "identity", "off by", "allowed", ""]);
    for identity in &flow.identities {
        let sign = if identity.holds { "holds" } else { "FAILS" };
        table.row([
            identity.name.to_owned(),
            identity.formula.to_owned(),
            per_cent(identity.relative_difference),
            per_cent(identity.tolerance),
            sign.to_owned(),
        ]);
    }
    if verbose || flow.identities.iter().any(|i| !i.holds) {
        return part(
            "Identities of the exact solution, checked on the computed one",
            &table,
        );
    }
    let worst = flow
        .identities
        .iter()
        .map(|i| i.relative_difference.abs())
        .fold(0.0, f64::max);
    format!(
        "Identities of the exact solution, checked on the computed one\n  all {} hold, the worst to {}\n",
        flow.identities.len(),
        per_cent(worst)
    )
}

fn evidence(flow: &SectionFlow, verbose: bool) -> String {
    let (grid, solver) = (&flow.grid, &flow.solver);
    let length = |v: f64| with_unit(v, numbers::LENGTHS, 4);
    let mut table = Table::new(&[Align::Left, Align::Left]);
    table.row([
        "grid".to_owned(),
        format!(
            "{} spacing, {} fluid nodes",
            length(grid.spacing),
            grid.fluid_nodes
        ),
    ]);
    table.row([
        "across".to_owned(),
        format!(
            "{} cells across the largest circle that fits into the smallest lumen ({})",
            significant(grid.cells_across, 4),
            length(grid.inscribed_diameter),
        ),
    ]);
    let verdict = if solver.converged {
        "reached what was asked"
    } else {
        "NOT as small as asked"
    };
    let extra = if solver.accelerated {
        ", with Krylov acceleration"
    } else {
        ""
    };
    table.row([
        "solver".to_owned(),
        format!(
            "{}{extra}, residual {} (rms of 1 + lap(phi), weighted with phi), {verdict}",
            counted(solver.cycles, "cycle", "cycles"),
            significant(solver.residual, 2),
        ),
    ]);
    let mut out = part("Evidence", &table);
    if verbose {
        out.push_str(&hierarchy(flow));
    }
    out
}

fn hierarchy(flow: &SectionFlow) -> String {
    let mut table = Table::new(&[Align::Right; 6]);
    table.row([
        "spacing",
        "fluid nodes",
        "wall nodes",
        "cycles",
        "K / m^4",
        "from best K",
    ]);
    for level in &flow.solver.levels {
        table.row([
            with_unit(level.spacing, numbers::LENGTHS, 4),
            level.fluid_nodes.to_string(),
            level.wall_nodes.to_string(),
            level.cycles.to_string(),
            significant(level.conductance, 8),
            per_cent(level.conductance / flow.conductance.value - 1.0),
        ]);
    }
    format!(
        "{}  mean reduction of the residual by one cycle {}, time {} s\n",
        table.print(INDENT),
        significant(flow.solver.convergence_factor, 2),
        significant(flow.solver.seconds, 2),
    )
}

/// The warnings, if there are any.
pub(super) fn warnings(all: &[Warning]) -> Option<String> {
    if all.is_empty() {
        return None;
    }
    let mut out = "Warnings and cautions\n".to_owned();
    for warning in all {
        let text = format!(
            "{}: {}",
            warning.code.as_str(),
            numbers::one_line(&warning.message)
        );
        out.push_str(&paragraph("  ! ", &text));
        out.push_str(&paragraph("    ", &numbers::one_line(&warning.advice)));
    }
    Some(out)
}
