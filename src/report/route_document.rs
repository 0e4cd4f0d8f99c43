//! The one document behind every output of `route`.

use super::document::{SourceRecord, pressure_caution};
use super::numbers;
use crate::flow::{Fluid, TemperatureLaw};
use crate::measured::Estimate;
use crate::study::{PointPlace, Route, RouteBranch, RouteDesign, RouteOperation, RouteSpread};
use crate::warning::{Code, Warning};

/// Where a section of a route came from.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct RouteSectionRecord {
    /// Its file as written, or its kind.
    pub label: String,
    /// SHA-256 of its file; `None` for dimensions in the route file.
    pub sha256: Option<String>,
}

/// Everything an output of `route` may show.
#[derive(Debug, Clone, Copy)]
pub struct RouteDocument<'a> {
    /// The route file; `None` for a route built in code.
    pub source: Option<SourceRecord<'a>>,
    /// Name of the route.
    pub name: &'a str,
    /// What was solved.
    pub design: &'a RouteDesign,
    /// Where its sections came from, in the order of the design.
    pub sections: &'a [RouteSectionRecord],
    /// The solved route.
    pub route: &'a Route,
    /// The fluid, when one was given.
    pub fluid: Option<&'a Fluid>,
    /// `R(T) / R(T0)` of the fluid, for the card; `None` where it is not known.
    pub temperature_law: Option<&'a TemperatureLaw>,
    /// The route at each flow rate or pressure drop, in the order given.
    pub operations: &'a [RouteOperation],
    /// The spread between branches, when one was given.
    pub spread: Option<&'a RouteSpread>,
    /// Settings that hold, in words.
    pub settings: &'a [(&'static str, String)],
    /// Warnings of the reading and of the request.
    pub warnings: &'a [Warning],
}

impl RouteDocument<'_> {
    /// Resistance `mu` times the integral of `dx / K`, Pa s/m^3; `None` without a fluid.
    pub fn resistance(&self) -> Option<Estimate> {
        self.fluid
            .map(|fluid| self.route.integral.scaled(fluid.viscosity))
    }

    /// Proven low and high resistance, Pa s/m^3; `None` without a fluid or a proof.
    pub fn resistance_bounds(&self) -> Option<(f64, f64)> {
        let (low, high) = *self.route.bounds.as_ref().ok()?;
        let mu = self.fluid?.viscosity;
        Some((mu * low, mu * high))
    }

    /// All warnings: of the sections, of the request, of the flow, and the caution where a pressure is shown.
    pub fn all_warnings(&self) -> Vec<Warning> {
        let mut all: Vec<Warning> = Vec::new();
        for (section, solved) in self.design.sections.iter().zip(&self.route.flows) {
            let named = |w: &Warning| Warning {
                message: format!("Section {}: {}", section.label, w.message),
                ..w.clone()
            };
            all.extend(solved.flow.warnings.iter().map(named));
        }
        all.extend(self.warnings.iter().cloned());
        if let Some(fluid) = self.fluid {
            for operation in self.operations {
                for warning in operation.warnings(self.route, fluid) {
                    if !all.contains(&warning) {
                        all.push(warning);
                    }
                }
            }
        }
        let mut ways = self.route.branches().flat_map(|b| &b.ways);
        if let Some((way, _)) = ways.find(|(way, _)| !way.is_converged) {
            all.push(Warning {
                code: Code::AccuracyNotReached,
                message: format!(
                    "The integral of 1/K between two stations has not settled with {} sections between them \
                     (estimated error {}).",
                    way.nodes.len(),
                    numbers::per_cent(way.mean_inverse.relative())
                ),
                advice: "Put a station where the section changes most.".to_owned(),
                numbers: vec![("relative_error", way.mean_inverse.relative())],
            });
        }
        let has_caution = all.iter().any(|w| w.code == Code::Caution);
        if !self.operations.is_empty() && !has_caution {
            all.push(pressure_caution());
        }
        all
    }

    /// Branch of a place.
    pub(super) fn branch(&self, place: PointPlace) -> Option<&RouteBranch> {
        let segment = self.route.segments.get(place.segment)?;
        segment.branches.get(place.branch)
    }

    /// Position of a place as the route file counts, m.
    pub(super) fn position(&self, place: PointPlace) -> Option<f64> {
        let branch = self.branch(place)?;
        Some(branch.begin + branch.points.get(place.point)?.position)
    }

    /// A place in words.
    pub(super) fn place(&self, place: PointPlace) -> String {
        let segment = self.route.segments.get(place.segment);
        let name = segment.map_or("", |s| s.name.as_str());
        let mut out = format!("segment {}", numbers::title(name));
        let Some(branch) = self.branch(place) else {
            return out;
        };
        if !branch.name.is_empty() {
            out.push_str(", branch ");
            out.push_str(&numbers::title(&branch.name));
        }
        if let Some(point) = branch.points.get(place.point) {
            let station = point.station.map_or_else(
                || "between stations".to_owned(),
                |station| format!("station {}", station + 1),
            );
            let reach = branch.begin.abs() + branch.length;
            let at = numbers::length_on(branch.begin + point.position, reach);
            out.extend([", ", &station, ", at ", &at]);
        }
        out
    }

    /// Label of the section at a point: that of its station, or what stands between two.
    pub(super) fn section_label(&self, flow: usize) -> &str {
        let section = self.design.sections.get(flow);
        section.map_or("between", |section| section.label.as_str())
    }
}
