//! The plausibility stop of traces and height maps: their ranges, or the unit is in doubt.
//!
//! Limits: the longest stylus scans are about 300 mm, the deepest grooves some millimetres, noise of good
//! instruments below 0.1 nm (common practice, no source); the limits lie outside these.

use std::ops::RangeInclusive;

use super::table_problem::{TableAxis, TableProblem};
use crate::units::length_unit;

/// Range of positions taken without asking, m.
const POSITIONS_METRES: RangeInclusive<f64> = 100e-9..=500e-3;
/// Range of heights taken without asking, m.
const HEIGHTS_METRES: RangeInclusive<f64> = 0.1e-9..=50e-3;
/// Units tried for the likely one.
const LIKELY_UNITS: [&str; 4] = ["um", "mm", "nm", "m"];

fn limits(axis: TableAxis) -> RangeInclusive<f64> {
    match axis {
        TableAxis::Positions => POSITIONS_METRES,
        TableAxis::Heights => HEIGHTS_METRES,
    }
}

/// The one common unit in which a range of bare numbers is plausible; `None` when there are several.
pub(crate) fn likely_unit(axis: TableAxis, span: f64) -> Option<&'static str> {
    let mut plausible = LIKELY_UNITS.into_iter().filter(|name| {
        length_unit(name).is_some_and(|metres| limits(axis).contains(&(span * metres)))
    });
    let first = plausible.next();
    first.filter(|_| plausible.next().is_none())
}

/// Refuses an implausible range; a range of zero is left to others.
///
/// - `span`: the range, m
/// - `unit`, `factor`: the unit used and metres per unit
pub(crate) fn check_span(
    axis: TableAxis,
    span: f64,
    unit: &str,
    factor: f64,
) -> Result<(), TableProblem> {
    let limits = limits(axis);
    if span == 0.0 || limits.contains(&span) {
        return Ok(());
    }
    Err(TableProblem::Implausible {
        axis,
        span,
        smallest: *limits.start(),
        largest: *limits.end(),
        unit: unit.to_owned(),
        likely: likely_unit(axis, span / factor),
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn only_a_single_plausible_unit_is_named() {
        assert_eq!(likely_unit(TableAxis::Positions, 4e-5), Some("m"));
        assert_eq!(likely_unit(TableAxis::Heights, 1.5e-8), Some("m"));
        assert_eq!(likely_unit(TableAxis::Positions, 1500.0), None);
        assert_eq!(likely_unit(TableAxis::Positions, 1e30), None);
        let stop = check_span(TableAxis::Positions, 1500.0, "m", 1.0);
        assert!(matches!(stop, Err(TableProblem::Implausible { .. })));
        assert_eq!(check_span(TableAxis::Positions, 1.5e-3, "um", 1e-6), Ok(()));
        assert_eq!(check_span(TableAxis::Heights, 0.0, "um", 1e-6), Ok(()));
    }
}
