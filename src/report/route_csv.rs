//! The CSV view of a route (RFC 4180): one header row, one row for each solved section along it.
//!
//! Columns of flow are those of the first flow rate or pressure drop, empty without one. `branches_1` is how many
//! equal ones a row stands for; flow and shear are those of one of them.

use super::csv::{CsvError, number, table};
use super::numbers::one_line;
use super::route_document::RouteDocument;

/// Names of the columns.
const HEADS: [&str; 26] = [
    "route",
    "segment",
    "branch",
    "branches_1",
    "station_1",
    "section",
    "position_m",
    "distance_m",
    "conductance_m4",
    "conductance_low_m4",
    "conductance_high_m4",
    "conductance_estimated_error_m4",
    "area_m2",
    "wetted_perimeter_m",
    "hydraulic_diameter_m",
    "integral_to_here_1_per_m3",
    "resistance_per_length_pa_s_per_m4",
    "resistance_to_here_pa_s_per_m3",
    "flow_rate_m3_per_s",
    "pressure_pa",
    "pressure_gradient_pa_per_m",
    "mean_velocity_m_per_s",
    "reynolds_dh_1",
    "wall_shear_mean_pa",
    "wall_shear_max_pa",
    "interpolation_to_next",
];

/// One row for each station and each section between stations.
///
/// # Errors
/// [`CsvError`] when the writer refuses, which no name or number causes.
pub fn route_csv(document: &RouteDocument<'_>) -> Result<String, CsvError> {
    let route = document.route;
    let mu = document.fluid.map(|fluid| fluid.viscosity);
    let mut rows = Vec::new();
    for (s, segment) in route.segments.iter().enumerate() {
        for (b, branch) in segment.branches.iter().enumerate() {
            let operation = document
                .operations
                .first()
                .and_then(|o| o.segments.get(s)?.branches.get(b));
            for (p, point) in branch.points.iter().enumerate() {
                let flow = &route.flows[point.flow].flow;
                let at = operation.and_then(|o| o.points.get(p));
                let local = at.map(|at| at.local);
                let proven = flow.bracket.as_ref().ok();
                let rule = point.station.and_then(|station| branch.ways.get(station));
                rows.push(vec![
                    one_line(document.name),
                    one_line(&segment.name),
                    one_line(&branch.name),
                    branch.count.to_string(),
                    point.station.map_or(String::new(), |n| (n + 1).to_string()),
                    one_line(document.section_label(point.flow)),
                    number(branch.begin + point.position),
                    number(point.position),
                    number(flow.conductance.value),
                    number(proven.map(|b| b.low)),
                    number(proven.map(|b| b.high)),
                    number(flow.conductance.error),
                    number(flow.geometry.area),
                    number(flow.geometry.wetted_perimeter),
                    number(flow.geometry.hydraulic_diameter),
                    number(point.integral),
                    number(mu.map(|mu| mu / flow.conductance.value)),
                    number(mu.map(|mu| mu * point.integral)),
                    number(operation.map(|o| o.flow_rate)),
                    number(at.map(|at| at.pressure)),
                    number(local.map(|l| l.pressure_gradient)),
                    number(local.map(|l| l.mean_velocity)),
                    number(local.and_then(|l| l.reynolds_dh)),
                    number(local.map(|l| l.wall_shear_mean)),
                    number(local.map(|l| l.wall_shear_max)),
                    rule.map_or(String::new(), |(way, _)| way.used.word().to_owned()),
                ]);
            }
        }
    }
    table(&HEADS, rows, document.name)
}
