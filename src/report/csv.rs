//! The CSV view (RFC 4180): one header row, one data row a section, names that end in the unit.
//!
//! The header is the same for every section, so rows of many runs can be stacked; what is absent is an
//! empty field. Numbers are the shortest text that reads back to the same double, with a decimal point.

use super::document::SolveDocument;
use super::numbers::one_line;
use crate::flow::{OperatingPoint, SectionFlow};
use crate::study::Reach;

/// Why the CSV text could not be built.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum CsvError {
    /// The writer refused a record.
    #[error("the CSV row of section `{section}` could not be built: {source}")]
    Record {
        /// Name of the section.
        section: String,
        /// What the CSV writer says.
        source: csv::Error,
    },
    /// The buffer could not be taken back.
    #[error("the CSV text could not be finished: {reason}")]
    Unfinished {
        /// What the CSV writer says.
        reason: String,
    },
}

/// One header row and one data row for each document.
///
/// # Errors
/// [`CsvError`] when the writer refuses, which no section name or number causes.
pub fn to_csv(documents: &[SolveDocument<'_>]) -> Result<String, CsvError> {
    let mut names = Vec::new();
    let mut rows = Vec::new();
    for document in documents {
        let (heads, values): (Vec<&str>, Vec<String>) = fields(document).into_iter().unzip();
        names = heads;
        rows.push(values);
    }
    let section = documents.first().map_or("", |d| d.section_name);
    table(&names, rows, section)
}

/// A header row and data rows as text; `section` is named in errors.
pub(super) fn table(
    heads: &[&str],
    rows: impl IntoIterator<Item = Vec<String>>,
    section: &str,
) -> Result<String, CsvError> {
    let mut writer = csv::WriterBuilder::new()
        .terminator(csv::Terminator::CRLF)
        .from_writer(Vec::new());
    let refused = |source| CsvError::Record {
        section: section.to_owned(),
        source,
    };
    if !heads.is_empty() {
        writer.write_record(heads).map_err(refused)?;
    }
    for row in rows {
        writer.write_record(&row).map_err(refused)?;
    }
    let unfinished = |reason: String| CsvError::Unfinished { reason };
    let bytes = writer.into_inner().map_err(|e| unfinished(e.to_string()))?;
    String::from_utf8(bytes).map_err(|e| unfinished(e.to_string()))
}

/// A field: column name and text.
type Field = (&'static str, String);

/// A number as text; empty when absent or not finite.
pub(super) fn number(value: impl Into<Option<f64>>) -> String {
    value
        .into()
        .filter(|v| v.is_finite())
        .map(|v| format!("{v:?}"))
        .unwrap_or_default()
}

fn fields(document: &SolveDocument<'_>) -> Vec<Field> {
    let source = document.source;
    let fluid = document.fluid;
    let codes: Vec<&str> = document
        .all_warnings()
        .iter()
        .map(|w| w.code.as_str())
        .collect();
    let resistance_per_length = document.resistance_per_length();
    let resistance = document.resistance();
    let mut all = vec![
        ("section", one_line(document.section_name)),
        (
            "source_path",
            source.map_or(String::new(), |s| one_line(s.path)),
        ),
        ("source_sha256", source.map_or("", |s| s.sha256).to_owned()),
        ("source_kind", source.map_or("", |s| s.kind).to_owned()),
    ];
    all.extend(film_fields(document));
    all.extend(section_fields(document.flow));
    all.extend(reach_fields(document));
    all.extend([
        ("fluid", fluid.map_or(String::new(), |f| f.name.clone())),
        ("temperature_k", number(fluid.and_then(|f| f.temperature))),
        ("viscosity_pa_s", number(fluid.map(|f| f.viscosity))),
        ("density_kg_per_m3", number(fluid.and_then(|f| f.density))),
        (
            "resistance_per_length_pa_s_per_m4",
            number(resistance_per_length.map(|r| r.value)),
        ),
        ("length_m", number(document.length)),
        (
            "resistance_pa_s_per_m3",
            number(resistance.map(|r| r.value)),
        ),
        (
            "resistance_estimated_error_pa_s_per_m3",
            number(resistance.map(|r| r.error)),
        ),
    ]);
    all.extend(point_fields(document.operating_point));
    all.push(("warnings", codes.join(" ")));
    all
}

fn film_fields(document: &SolveDocument<'_>) -> Vec<Field> {
    let film = document.film;
    vec![
        ("film_thickness_m", number(film.map(|f| f.film.thickness))),
        ("film_on", film.map_or("", |f| f.film.on.word()).to_owned()),
        ("area_before_film_m2", number(film.map(|f| f.area[0]))),
    ]
}

fn reach_fields(document: &SolveDocument<'_>) -> Vec<Field> {
    let reach = document.reach.map(|record| record.reach);
    let (low, high) = (reach.and_then(Reach::low), reach.and_then(Reach::high));
    // Bounds of R go with 1/K.
    let k = document.flow.conductance.value;
    let resistance = |bound: Option<f64>| Some(document.resistance()?.value * k / bound?);
    vec![
        ("conductance_reach_low_m4", number(low)),
        ("conductance_reach_high_m4", number(high)),
        ("resistance_reach_low_pa_s_per_m3", number(resistance(high))),
        ("resistance_reach_high_pa_s_per_m3", number(resistance(low))),
    ]
}

fn section_fields(flow: &SectionFlow) -> Vec<Field> {
    let g = &flow.geometry;
    vec![
        ("area_m2", number(g.area)),
        ("wetted_perimeter_m", number(g.wetted_perimeter)),
        ("hydraulic_diameter_m", number(g.hydraulic_diameter)),
        ("width_m", number(g.width)),
        ("height_m", number(g.height)),
        ("lumens_1", g.lumens.to_string()),
        ("islands_1", g.islands.to_string()),
        ("vertices_1", g.vertices.to_string()),
        ("conductance_m4", number(flow.conductance.value)),
        (
            "conductance_low_m4",
            number(flow.bracket.as_ref().ok().map(|b| b.low)),
        ),
        (
            "conductance_high_m4",
            number(flow.bracket.as_ref().ok().map(|b| b.high)),
        ),
        (
            "conductance_estimated_error_m4",
            number(flow.conductance.error),
        ),
        ("fanning_f_re_dh_1", number(flow.fanning_dh)),
        ("darcy_f_re_dh_1", number(flow.darcy_dh)),
        ("fanning_f_re_sqrt_area_1", number(flow.fanning_sqrt_area)),
        ("peak_to_mean_velocity_1", number(flow.peak.to_mean.value)),
        ("peak_x_m", number(flow.peak.at[0])),
        ("peak_y_m", number(flow.peak.at[1])),
        ("momentum_factor_1", number(flow.momentum_factor.value)),
        (
            "kinetic_energy_factor_1",
            number(flow.kinetic_energy_factor.value),
        ),
        (
            "wall_shear_mean_per_gradient_m",
            number(flow.wall_shear.mean_per_gradient),
        ),
        (
            "wall_shear_max_per_gradient_m",
            number(flow.wall_shear.max_per_gradient),
        ),
        ("wall_shear_max_x_m", number(flow.wall_shear.max_at[0])),
        ("wall_shear_max_y_m", number(flow.wall_shear.max_at[1])),
        ("grid_spacing_m", number(flow.grid.spacing)),
        ("fluid_nodes_1", flow.grid.fluid_nodes.to_string()),
        ("cells_across_1", number(flow.grid.cells_across)),
        ("solver_cycles_1", flow.solver.cycles.to_string()),
        ("solver_residual_1", number(flow.solver.residual)),
        ("solver_converged", flow.solver.converged.to_string()),
    ]
}

fn point_fields(point: Option<&OperatingPoint>) -> Vec<Field> {
    vec![
        ("flow_rate_m3_per_s", number(point.map(|p| p.flow_rate))),
        ("pressure_drop_pa", number(point.map(|p| p.pressure_drop))),
        (
            "pressure_gradient_pa_per_m",
            number(point.map(|p| p.pressure_gradient)),
        ),
        (
            "mean_velocity_m_per_s",
            number(point.map(|p| p.mean_velocity)),
        ),
        (
            "peak_velocity_m_per_s",
            number(point.map(|p| p.peak_velocity)),
        ),
        ("reynolds_dh_1", number(point.and_then(|p| p.reynolds_dh))),
        (
            "wall_shear_mean_pa",
            number(point.map(|p| p.wall_shear_mean)),
        ),
        ("wall_shear_max_pa", number(point.map(|p| p.wall_shear_max))),
        ("residence_time_s", number(point.map(|p| p.residence_time))),
        (
            "entrance_length_m",
            number(point.and_then(|p| p.entrance_length)),
        ),
    ]
}
