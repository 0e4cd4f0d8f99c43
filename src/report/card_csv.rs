//! The CSV view of cards (RFC 4180): one header row, one row a card, every number's head ends in its unit.

use super::card_document::{CardDocument, CardRecord};
use super::csv::{CsvError, number, table};
use super::numbers::one_line;
use crate::flow::{MOST_COEFFICIENTS, PERCENTILES};

/// A column: its head and the field of one card.
type Field = (String, String);

/// One row for each card; files that gave none have no row.
///
/// # Errors
/// [`CsvError`] when the writer refuses, which no section name or number causes.
pub fn card_csv(document: &CardDocument<'_>) -> Result<String, CsvError> {
    let mut heads = Vec::new();
    let mut rows = Vec::new();
    for record in document.cards {
        let (names, values): (Vec<String>, Vec<String>) = fields(record).into_iter().unzip();
        heads = names;
        rows.push(values);
    }
    let heads: Vec<&str> = heads.iter().map(String::as_str).collect();
    let name = document.cards.first().map_or("", |record| record.name);
    table(&heads, rows, name)
}

fn fields(record: &CardRecord<'_>) -> Vec<Field> {
    let source = record.source;
    let text = |head: &str, value: &str| (head.to_owned(), one_line(value));
    let mut all = vec![
        text("name", record.name),
        text("kind", "section"),
        text("source_path", source.map_or("", |s| s.path)),
        text("source_sha256", source.map_or("", |s| s.sha256)),
        text("tool_version", env!("CARGO_PKG_VERSION")),
        text("fluid", &record.fluid.name),
    ];
    let mut push = |head: &str, value: Option<f64>| all.push((head.to_owned(), number(value)));
    push("temperature_k", record.fluid.temperature);
    push("viscosity_pa_s", Some(record.fluid.viscosity));
    push("density_kg_per_m3", record.fluid.density);
    resistance(record, &mut push);
    law(record, &mut push);
    rest(record, &mut push);
    let codes: Vec<&str> = record
        .all_warnings()
        .iter()
        .map(|warning| warning.code.as_str())
        .collect();
    all.push(("warnings".to_owned(), codes.join(" ")));
    all
}

/// Takes the head of a column and its number.
type Push<'a> = dyn FnMut(&str, Option<f64>) + 'a;

fn resistance(record: &CardRecord<'_>, push: &mut Push<'_>) {
    let (flow, card) = (record.flow, record.card);
    let bracket = flow.bracket.as_ref().ok();
    push("conductance_m4", Some(flow.conductance.value));
    push("conductance_low_m4", bracket.map(|b| b.low));
    push("conductance_high_m4", bracket.map(|b| b.high));
    let r = card.resistance_per_length;
    let reach = record.resistance_reach();
    let uncertainty = card.uncertainty.as_ref().map(|u| u.of_log_resistance);
    for (head, value) in [
        ("value", Some(r.value)),
        ("low", card.proven.map(|p| p.0)),
        ("high", card.proven.map(|p| p.1)),
        ("estimated_error", Some(r.error)),
        ("u", uncertainty.map(|u| u * r.value)),
        ("reach_low", reach.map(|p| p.0)),
        ("reach_high", reach.map(|p| p.1)),
    ] {
        let middle = if head == "value" {
            String::new()
        } else {
            format!("_{head}")
        };
        push(&format!("resistance_per_length{middle}_pa_s_per_m4"), value);
    }
    push("u_of_log_resistance_1", uncertainty);
}

fn law(record: &CardRecord<'_>, push: &mut Push<'_>) {
    let law = record.card.temperature_law.as_ref().ok();
    for k in 0..MOST_COEFFICIENTS {
        let coefficient = law.map(|law| law.coefficients.get(k).copied().unwrap_or(0.0));
        push(&format!("temperature_law_c{}_1", k + 1), coefficient);
    }
    push("temperature_law_reference_k", law.map(|l| l.reference));
    push("temperature_law_low_k", law.map(|l| l.low));
    push("temperature_law_high_k", law.map(|l| l.high));
    push(
        "temperature_law_largest_relative_error_1",
        law.map(|l| l.largest_relative_error),
    );
}

fn rest(record: &CardRecord<'_>, push: &mut Push<'_>) {
    let (flow, card) = (record.flow, record.card);
    let inertance = card.inertance_per_length;
    push("inertance_per_length_kg_per_m5", inertance.map(|i| i.value));
    push("volume_per_length_m2", Some(flow.geometry.area));
    push(
        "wall_area_per_length_m",
        Some(flow.geometry.wetted_perimeter),
    );
    push("mean_depth_m", Some(card.mean_depth));
    push("momentum_factor_1", Some(flow.momentum_factor.value));
    push(
        "kinetic_energy_factor_1",
        Some(flow.kinetic_energy_factor.value),
    );
    push(
        "incremental_pressure_drop_1",
        Some(card.incremental_pressure_drop.value),
    );
    let shear = card.wall_shear;
    push(
        "wall_shear_mean_per_flow_rate_pa_s_per_m3",
        Some(shear.mean),
    );
    push("wall_shear_max_per_flow_rate_pa_s_per_m3", Some(shear.max));
    for (percent, value) in PERCENTILES.into_iter().zip(shear.percentiles) {
        push(
            &format!("wall_shear_p{percent:.0}_per_flow_rate_pa_s_per_m3"),
            Some(value),
        );
    }
    for one in &card.sensitivities {
        let unit = if one.unit == "1/m" { "1_per_m" } else { "1" };
        let value = one.value.as_ref().ok().map(|v| v.value);
        push(&format!("dln_resistance_per_{}_{unit}", one.name), value);
    }
    let limits = &card.limits;
    push("reynolds_high_1", Some(limits.reynolds_high));
    push("hydraulic_diameter_m", Some(limits.hydraulic_diameter));
    push("flow_rate_high_m3_per_s", limits.flow_rate_high);
    push(
        "shortest_length_creeping_m",
        Some(limits.shortest_length_creeping),
    );
    push(
        "shortest_length_at_flow_rate_high_m",
        Some(limits.shortest_length_at_flow_rate_high),
    );
    push("pressure_drop_high_pa", limits.pressure_drop_high);
}
