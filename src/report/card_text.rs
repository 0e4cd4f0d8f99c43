//! The text view of cards: one table over all sections, then what each number means.

use std::fmt::Write as _;

use super::card_document::{CardDocument, CardRecord};
use super::numbers::{self, per_cent, significant, with_unit};
use super::table::{Align, Table, paragraph};
use super::text::{TextOptions, finished, part, title, warnings};
use crate::flow::PERCENTILES;
use crate::study::{Stated, UncertaintyPart};

/// Zero of the Celsius scale, K.
const CELSIUS: f64 = 273.15;

/// The document as text, ended by a line feed.
pub fn card_text(document: &CardDocument<'_>, options: TextOptions) -> String {
    let mut parts = Vec::new();
    if document.cards.len() > 1 {
        parts.push(overview(document));
    }
    for record in document.cards {
        parts.extend(card(record));
    }
    if !document.failed.is_empty() {
        let mut text = String::from("No card from\n");
        for failed in document.failed {
            let first = failed.reason.lines().next().unwrap_or("");
            let _ = writeln!(text, "  {}: {first}", numbers::one_line(failed.path));
        }
        parts.push(text);
    }
    finished(&parts, options)
}

/// One line a card.
fn overview(document: &CardDocument<'_>) -> String {
    let mut table = Table::new(&[
        Align::Left,
        Align::Right,
        Align::Right,
        Align::Right,
        Align::Right,
        Align::Right,
    ]);
    table.row([
        "section",
        "R' Pa s/m^4",
        "proven width",
        "u(R')/R'",
        "area um^2",
        "inertance kg/m^5",
    ]);
    for record in document.cards {
        let card = record.card;
        let r = card.resistance_per_length.value;
        let width = card.proven.map(|(low, high)| (high - low) / r);
        let uncertainty = card.uncertainty.as_ref().map(|u| u.of_log_resistance);
        let inertance = card.inertance_per_length;
        table.row([
            numbers::one_line(record.name),
            significant(r, 6),
            width.map_or("-".to_owned(), per_cent),
            uncertainty.map_or("-".to_owned(), per_cent),
            significant(record.flow.geometry.area * 1e12, 6),
            inertance.map_or("-".to_owned(), |i| significant(i.value, 5)),
        ]);
    }
    part("Cards", &table)
}

fn card(record: &CardRecord<'_>) -> Vec<String> {
    let mut parts = vec![
        title(record.name, record.source),
        fluid(record),
        resistance(record),
        law(record),
        coefficients(record),
        limits(record),
    ];
    parts.extend(warnings(&record.all_warnings()));
    parts
}

fn fluid(record: &CardRecord<'_>) -> String {
    let fluid = record.fluid;
    let mut text = format!(
        "Fluid {}, viscosity {} mPa s",
        numbers::one_line(&fluid.name),
        significant(fluid.viscosity * 1e3, 6)
    );
    if let Some(temperature) = fluid.temperature {
        let _ = write!(text, ", at {} C", significant(temperature - CELSIUS, 4));
    }
    if let Some(density) = fluid.density {
        let _ = write!(text, ", density {} kg/m^3", significant(density, 6));
    }
    text.push('\n');
    text
}

fn resistance(record: &CardRecord<'_>) -> String {
    let card = record.card;
    let r = card.resistance_per_length;
    let mut table = Table::new(&[Align::Left, Align::Left]);
    table.row([
        "R' = mu / K".to_owned(),
        format!(
            "{} Pa s/m^4 (estimated error {})",
            significant(r.value, 7),
            per_cent(r.relative())
        ),
    ]);
    let range = |(low, high): (f64, f64)| {
        format!(
            "{} to {} Pa s/m^4 ({})",
            significant(low, 7),
            significant(high, 7),
            per_cent((high - low) / r.value)
        )
    };
    table.row([
        "proven for the outline as given".to_owned(),
        card.proven
            .map_or("no range, see K in `solve`".to_owned(), range),
    ]);
    if let Some(bounds) = record.resistance_reach() {
        table.row(["reach of the instrument".to_owned(), range(bounds)]);
    }
    match &card.uncertainty {
        Some(found) => {
            table.row([
                "standard uncertainty".to_owned(),
                format!("{} of R', from", per_cent(found.of_log_resistance)),
            ]);
            for part in &found.parts {
                table.row([String::new(), contribution(part)]);
            }
        }
        None => table.row([
            "standard uncertainty".to_owned(),
            "none: nothing was stated; for example --uncertainty depth=0.3um".to_owned(),
        ]),
    }
    part("Resistance per length", &table)
}

fn contribution(part: &UncertaintyPart) -> String {
    let stated = match part.stated {
        Stated::Relative(share) => per_cent(share),
        Stated::Length(length) => with_unit(length, numbers::LENGTHS, 3),
        Stated::Angle(angle) => format!("{} deg", significant(angle.to_degrees(), 3)),
    };
    format!(
        "  {} {stated}: {}",
        part.input,
        per_cent(part.of_log_resistance.abs())
    )
}

fn law(record: &CardRecord<'_>) -> String {
    let law = match &record.card.temperature_law {
        Ok(law) => law,
        Err(error) => return format!("Resistance over temperature: none, {error}\n"),
    };
    let mut table = Table::new(&[Align::Left, Align::Left]);
    table.row(["T0".to_owned(), format!("{} K", law.reference)]);
    for (k, c) in law.coefficients.iter().enumerate() {
        table.row([format!("c{}", k + 1), format!("{c:.9}")]);
    }
    table.row([
        "holds from".to_owned(),
        format!(
            "{} C to {} C, largest error {}",
            significant(law.low - CELSIUS, 4),
            significant(law.high - CELSIUS, 4),
            per_cent(law.largest_relative_error)
        ),
    ]);
    part(
        &format!("Resistance over temperature: {}", law.formula()),
        &table,
    )
}

fn coefficients(record: &CardRecord<'_>) -> String {
    let (card, flow) = (record.card, record.flow);
    let mut table = Table::new(&[Align::Left, Align::Right, Align::Left]);
    let mut row = |name: &str, value: String, unit: &str| {
        table.row([name.to_owned(), value, unit.to_owned()]);
    };
    let inertance = card.inertance_per_length;
    row(
        "inertance rho beta / A",
        inertance.map_or("no density".to_owned(), |i| significant(i.value, 6)),
        "kg/m^5",
    );
    row("volume A", significant(flow.geometry.area, 7), "m^2");
    row(
        "wall area P",
        significant(flow.geometry.wetted_perimeter, 7),
        "m",
    );
    row("mean depth A / width", significant(card.mean_depth, 6), "m");
    row(
        "incremental pressure drop 2 (Ke - Kd)",
        significant(card.incremental_pressure_drop.value, 5),
        "",
    );
    let shear = card.wall_shear;
    row(
        "wall shear per flow rate, mean",
        significant(shear.mean, 6),
        "Pa s/m^3",
    );
    row("  largest", significant(shear.max, 6), "Pa s/m^3");
    for (percent, value) in PERCENTILES.into_iter().zip(shear.percentiles) {
        let name = format!("  not above, on {percent:.0} % of the wall");
        row(&name, significant(value, 6), "Pa s/m^3");
    }
    for one in &card.sensitivities {
        let (change, unit) = match one.unit {
            "1/m" => ("\u{b5}m", 1e-6),
            _ => ("%", 0.01),
        };
        let value = match &one.value {
            Ok(v) => format!("{} %", significant(100.0 * v.value * unit, 4)),
            Err(_) => "none".to_owned(),
        };
        row(&format!("R' for +1 {change} of {}", one.name), value, "");
    }
    part("Per length of channel", &table)
}

fn limits(record: &CardRecord<'_>) -> String {
    let limits = &record.card.limits;
    let length = |v: f64| with_unit(v, numbers::LENGTHS, 3);
    let mut text = format!(
        "Holds for Re up to {:.0} on Dh = {}",
        limits.reynolds_high,
        length(limits.hydraulic_diameter)
    );
    if let Some(rate) = limits.flow_rate_high {
        let _ = write!(text, ", {}", with_unit(rate, numbers::FLOW_RATES, 3));
    }
    let _ = write!(
        text,
        "; for lengths from {} in creeping flow, {} at that Re, where the entrance takes {:.0} %",
        length(limits.shortest_length_creeping),
        length(limits.shortest_length_at_flow_rate_high),
        100.0 * limits.entrance_share
    );
    if let Some(drop) = limits.pressure_drop_high {
        let _ = write!(
            text,
            "; for pressure drops up to {}",
            with_unit(drop, numbers::PRESSURES, 3)
        );
    }
    text.push_str("; for rigid walls.");
    paragraph("", &text)
}
