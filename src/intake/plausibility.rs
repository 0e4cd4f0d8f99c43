//! The plausibility stop: a section between 10 nm and 50 mm across, or the unit is in doubt.

use super::read_error::ReadProblem;
use crate::geometry::Outline;
use crate::units::length_unit;

/// Smallest section size taken without asking, m.
const SMALLEST_SIZE_METRES: f64 = 10e-9;
/// Largest section size taken without asking, m.
const LARGEST_SIZE_METRES: f64 = 50e-3;
/// Sizes that make a unit likely, m.
const LIKELY_SIZES_METRES: std::ops::RangeInclusive<f64> = 1e-6..=10e-3;
/// Units tried for the likely one, the commonest first.
const LIKELY_UNITS: [&str; 4] = ["um", "mm", "nm", "m"];

/// Refuses a section of implausible size and names the likely unit.
///
/// - `unit`: the unit of the coordinates, where there was one
/// - `factor`: metres per unit of the numbers in the file
pub(crate) fn check_size(
    outline: &Outline,
    unit: Option<&str>,
    factor: Option<f64>,
) -> Result<(), ReadProblem> {
    // Vertices that are not finite are for the check of the outline.
    let mut finite = outline
        .loops()
        .flat_map(|wall| &wall.points)
        .filter(|p| p.iter().all(|c| c.is_finite()));
    let Some(&first) = finite.next() else {
        return Ok(());
    };
    let (low, high) = finite.fold((first, first), |(low, high), p| {
        (
            [low[0].min(p[0]), low[1].min(p[1])],
            [high[0].max(p[0]), high[1].max(p[1])],
        )
    });
    let (width, height) = (high[0] - low[0], high[1] - low[1]);
    let size = width.max(height);
    if size == 0.0 || (SMALLEST_SIZE_METRES..=LARGEST_SIZE_METRES).contains(&size) {
        return Ok(());
    }
    let likely = factor.and_then(|factor| {
        LIKELY_UNITS.into_iter().find(|name| {
            length_unit(name)
                .is_some_and(|metres| LIKELY_SIZES_METRES.contains(&(size / factor * metres)))
        })
    });
    Err(ReadProblem::ImplausibleSize {
        width,
        height,
        unit: unit.map(str::to_owned),
        likely,
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn stop(size: f64, factor: f64) -> Option<&'static str> {
        let outline = Outline::single(vec![[0.0, 0.0], [size, 0.0], [size, size]]);
        match check_size(&outline, Some("mm"), Some(factor)) {
            Err(ReadProblem::ImplausibleSize { likely, .. }) => likely,
            other => panic!("{other:?}"),
        }
    }

    #[test]
    fn the_likely_unit_is_named() {
        assert_eq!(stop(100.0, 1.0), Some("um"));
        assert_eq!(stop(100e-3, 1e-3), Some("um"));
        assert_eq!(stop(0.1e-9, 1e-9), Some("mm"));
        assert_eq!(stop(1e9, 1.0), None);
        let plausible = Outline::single(vec![[0.0, 0.0], [1e-4, 0.0], [1e-4, 1e-4]]);
        assert_eq!(check_size(&plausible, None, None), Ok(()));
    }
}
