//! The film in the JSON view: what it left of the section. All other keys are of what remains.

use serde::Serialize;

use super::json_values::Quantity;
use crate::geometry::FilmReport;

#[derive(Serialize)]
pub(super) struct FilmView {
    thickness: Quantity,
    thickness_used: Quantity,
    on: &'static str,
    area_before: Quantity,
    area_after: Quantity,
    wetted_perimeter_before: Quantity,
    wetted_perimeter_after: Quantity,
    lumens_before: Quantity,
    lumens_after: Quantity,
    lumens_vanished: Quantity,
    lumens_split: Quantity,
    lumens_left_out: Quantity,
    area_left_out: Quantity,
    conductance_left_out_at_most: Quantity,
    islands_before: Quantity,
    islands_after: Quantity,
    vertices: Quantity,
}

impl FilmView {
    pub(super) fn new(report: &FilmReport) -> Self {
        let [area_before, area_after] = report.area.map(|a| Quantity::real(a, "m^2"));
        let [perimeter_before, perimeter_after] = report.perimeter.map(|p| Quantity::real(p, "m"));
        let [lumens_before, lumens_after] = report.lumens.map(Quantity::count);
        let [islands_before, islands_after] = report.islands.map(Quantity::count);
        Self {
            thickness: Quantity::real(report.film.thickness, "m"),
            thickness_used: Quantity::real(report.thickness_used, "m"),
            on: report.film.on.word(),
            area_before,
            area_after,
            wetted_perimeter_before: perimeter_before,
            wetted_perimeter_after: perimeter_after,
            lumens_before,
            lumens_after,
            lumens_vanished: Quantity::count(report.lumens_vanished),
            lumens_split: Quantity::count(report.lumens_split),
            lumens_left_out: Quantity::count(report.lumens_left_out),
            area_left_out: Quantity::real(report.area_left_out, "m^2"),
            conductance_left_out_at_most: Quantity::real(report.conductance_left_out, "m^4"),
            islands_before,
            islands_after,
            vertices: Quantity::count(report.vertices),
        }
    }
}
