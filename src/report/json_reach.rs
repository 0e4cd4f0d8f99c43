//! The reach bracket in the JSON view.

use serde::Serialize;

use super::document::{ReachRecord, SolveDocument};
use super::json_values::{Bracketed, Quantity, maybe};
use crate::study::ReachBound;

#[derive(Serialize)]
pub(super) struct ReachView<'a> {
    /// The best value for the section as given, between the bounds of its neighbours.
    conductance: Bracketed,
    relative_width: Quantity,
    resistance_per_length: Quantity,
    resistance: Quantity,
    inner: SideView,
    outer: SideView,
    #[serde(skip_serializing_if = "Option::is_none")]
    reason: Option<&'a str>,
}

#[derive(Serialize)]
struct SideView {
    is_given: bool,
    area: Quantity,
    conductance: Bracketed,
}

const NO_BOUND: &str = "an inner or outer section has no proven range; see its conductance";

impl<'a> ReachView<'a> {
    pub(super) fn new(document: &SolveDocument<'a>, record: &ReachRecord<'a>) -> Self {
        let reach = record.reach;
        let bounds = reach.low().zip(reach.high());
        let inverse = |value: f64| {
            let k = document.flow.conductance.value;
            bounds.map(|(low, high)| (value * k / high, value * k / low))
        };
        let per_length = document.resistance_per_length();
        let resistance = document.resistance();
        Self {
            conductance: Bracketed::new(
                document.flow.conductance,
                bounds,
                bounds.is_none().then(|| NO_BOUND.to_owned()),
            ),
            relative_width: Quantity::optional(reach.relative_width(), "1", NO_BOUND),
            resistance_per_length: maybe(per_length, "Pa s/m^4", "no fluid was given")
                .between(per_length.and_then(|r| inverse(r.value))),
            resistance: maybe(resistance, "Pa s/m^3", "no fluid or no length was given")
                .between(resistance.and_then(|r| inverse(r.value))),
            inner: SideView::new(&reach.inner),
            outer: SideView::new(&reach.outer),
            reason: record.reason,
        }
    }
}

impl SideView {
    fn new(bound: &ReachBound) -> Self {
        let (bounds, reason) = match &bound.bracket {
            Ok(proven) => (Some((proven.low, proven.high)), None),
            Err(error) => (None, Some(error.to_string())),
        };
        Self {
            is_given: bound.is_given,
            area: Quantity::real(bound.area, "m^2"),
            conductance: Bracketed::new(bound.conductance, bounds, reason),
        }
    }
}
