//! The plausibility stop: whether the lengths of a surface file can be metres.

use super::map_problem::MapProblem;
use crate::units::length_unit;

/// Largest size of a map taken without asking, m.
const LARGEST_MAP: f64 = 50e-3;
/// Largest length of a profile taken without asking, m: the drives of stylus instruments reach some 0.2 m
/// (common practice, no source).
const LARGEST_PROFILE: f64 = 0.2;
/// Smallest size taken without asking, m.
const SMALLEST: f64 = 10e-9;
/// Distances of neighbouring points taken without asking, m.
const SPACINGS: std::ops::RangeInclusive<f64> = 1e-9..=1e-3;
/// Spans of heights taken without asking, m; the noise of instruments alone is above the smallest.
const SPANS: std::ops::RangeInclusive<f64> = 10e-12..=5e-3;
/// Units tried for the likely one, the commonest first.
const LIKELY_UNITS: [&str; 3] = ["mm", "um", "nm"];
/// What makes a unit likely, m.
const LIKELY_SIZES: std::ops::RangeInclusive<f64> = 1e-6..=LARGEST_MAP;
const LIKELY_SPACINGS: std::ops::RangeInclusive<f64> = 10e-9..=100e-6;

/// Lengths of a surface, taken as metres.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct SurfaceSize {
    /// Along x and along y; zero where there is one row only.
    pub(super) size: [f64; 2],
    /// The larger distance of neighbouring points.
    pub(super) spacing: f64,
    /// Highest less lowest height.
    pub(super) span: f64,
}

/// Refuses lengths that can hardly be metres, and names the likely unit.
pub(super) fn check_metres(surface: &SurfaceSize) -> Result<(), MapProblem> {
    let largest = surface.size[0].max(surface.size[1]);
    let is_profile = surface.size[0] == 0.0 || surface.size[1] == 0.0;
    let limit = if is_profile {
        LARGEST_PROFILE
    } else {
        LARGEST_MAP
    };
    let likely = LIKELY_UNITS.into_iter().find(|name| {
        length_unit(name).is_some_and(|metres| {
            LIKELY_SIZES.contains(&(largest * metres))
                && LIKELY_SPACINGS.contains(&(surface.spacing * metres))
                && SPANS.contains(&(surface.span * metres))
        })
    });
    let is_thin = surface.size.iter().any(|&s| s > 0.0 && s < SMALLEST);
    if !(SMALLEST..=limit).contains(&largest) || is_thin || !SPACINGS.contains(&surface.spacing) {
        return Err(MapProblem::ImplausibleSize {
            size: surface.size,
            spacing: surface.spacing,
            likely,
        });
    }
    // All heights alike is an invented surface, not a wrong unit.
    if surface.span != 0.0 && !SPANS.contains(&surface.span) {
        return Err(MapProblem::ImplausibleHeights {
            span: surface.span,
            size: surface.size,
            likely,
        });
    }
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;

    fn likely(size: f64, spacing: f64, span: f64) -> Option<&'static str> {
        let surface = SurfaceSize {
            size: [size, size / 2.0],
            spacing,
            span,
        };
        match check_metres(&surface) {
            Err(
                MapProblem::ImplausibleSize { likely, .. }
                | MapProblem::ImplausibleHeights { likely, .. },
            ) => likely,
            other => panic!("{other:?}"),
        }
    }

    #[test]
    fn the_likely_unit_is_named() {
        assert_eq!(likely(0.8, 0.0275, 0.03), Some("mm"));
        assert_eq!(likely(800.0, 2.0, 30.0), Some("um"));
        assert_eq!(likely(8e5, 2e3, 3e4), Some("nm"));
        // Positions in metres with heights of another unit: no one unit helps.
        assert_eq!(likely(1e-3, 1e-6, 26.0), None);
        // Heights scaled down twice.
        assert_eq!(likely(478e-6, 645e-9, 6e-13), None);
        // One side far too small.
        let thin = SurfaceSize {
            size: [1e-3, 1e-300],
            spacing: 2e-6,
            span: 30e-6,
        };
        assert!(check_metres(&thin).is_err());
        let plausible = SurfaceSize {
            size: [1e-3, 1e-3],
            spacing: 2e-6,
            span: 30e-6,
        };
        assert_eq!(check_metres(&plausible), Ok(()));
    }
}
