//! Best value and the proven ranges: where corners are wide, from the ranges of two grids; elsewhere, held against one.
//!
//! Both ends of the range come nearer to the true value in the same way as the spacing shrinks, whatever law the
//! corners give it: the true value divides the range in a share that hardly changes from one grid to the next. Two
//! ranges `[low, high]` and `[low', high']` then give share and value, `K = low + w (low - low') / (w' - w)` with
//! the widths `w` and `w'`. No exponent is needed, and it does not matter how the lines pass a corner.
//! The energy of the grids, extrapolated with the exponent of the widest corner, is the second witness: where both agree
//! it is the better one.
//!
//! # Accuracy
//! At 128 cells: regular polygons of 5 to 20 sides within 2.7e-6, sectors and L shapes within 6e-6 before the
//! witness; stars with several re-entrant corners 1e-6 to 2e-5 at 96 cells, where the energy alone was up to 9e-5 off
//! (`tests/convergence.rs`, `tests/invariants.rs`).

use crate::measured::Estimate;
use crate::proof::Bracket;

/// Least ratio of the widths at which the law can be seen.
const LEAST_RATIO: f64 = 1.3;
/// Shares of the range in which the value may lie; beyond, the ranges do not follow one law.
const SHARES: [f64; 2] = [0.1, 0.9];
/// Difference between the witnesses, in half widths, up to which they agree.
const AGREEMENT: f64 = 0.05;
/// Part of the half width that is added to that difference as the estimated error.
const RESERVE: f64 = 0.1;
/// Part of the half width that is the estimated error where they do not agree: with re-entrant corners, and
/// without. Seen were 0.43 and 0.12.
const APART: [f64; 2] = [0.5, 0.25];
/// Half widths up to which an estimated error leaves an extrapolated value its place, with re-entrant corners and
/// without, see [`within`].
const LEAST_SURE: [f64; 2] = [1.0, 2.0];
/// Place, in half widths from the middle, of a value that was extrapolated to outside of the range.
const OUTSIDE: f64 = 0.5;

/// The best value and its estimated error; `None` where the ranges do not follow one law.
///
/// - `extrapolated`: the other witness
/// - `proven`, `coarse`: ranges of a grid and of one with twice its spacing
pub(super) fn from_ranges(
    extrapolated: Estimate,
    proven: Bracket,
    coarse: Bracket,
    is_re_entrant: bool,
) -> Option<Estimate> {
    let (width, coarse_width) = (proven.high - proven.low, coarse.high - coarse.low);
    let share = (proven.low - coarse.low) / (coarse_width - width);
    if coarse_width < LEAST_RATIO * width || !(SHARES[0]..=SHARES[1]).contains(&share) {
        return None;
    }
    let half = 0.5 * width;
    let value = proven.low + share * width;
    let difference = (extrapolated.value - value).abs();
    if difference <= AGREEMENT * half {
        return Some(Estimate {
            value: extrapolated.value.clamp(proven.low, proven.high),
            error: difference + RESERVE * half,
        });
    }
    let part = if is_re_entrant { APART[0] } else { APART[1] };
    Some(Estimate {
        value,
        error: part * half,
    })
}

/// The best value is never outside the proven range, nor its error larger than that allows; a value much less sure
/// than the middle gives way to it.
///
/// Without re-entrant corners the estimate is careful: with one to two half widths estimated, the extrapolated value is
/// 0.18 of one off and the middle 0.47, from four on it is 0.58 and 0.82; a value outside, which is certainly wrong but
/// errs to the right side, is brought half way back to the middle, where it is 0.2 off (medians over rectangles,
/// triangles, ellipses, etched and rounded sections, 12 to 256 cells).
///
/// - `is_re_entrant`: there are re-entrant corners: nearly flat ones next to them can make the extrapolated values
///   agree by accident, so that the middle is called as a second witness (`tests/invariants.rs` keeps such a
///   star: eight vertices, 48 cells, best value 8.4e-5 off, estimated 1e-6)
pub(super) fn within(extrapolated: Estimate, proven: Bracket, is_re_entrant: bool) -> Estimate {
    let Estimate { value, mut error } = extrapolated;
    let half = 0.5 * (proven.high - proven.low);
    let middle = proven.low + half;
    let away = value - middle;
    let mut least_sure = LEAST_SURE[1];
    if is_re_entrant {
        error = error.max(away.abs());
        least_sure = LEAST_SURE[0];
    }
    if error > least_sure * half {
        return Estimate {
            value: middle,
            error: half,
        };
    }
    if away.abs() > half {
        return Estimate {
            value: middle + (OUTSIDE * half).copysign(away),
            error: half,
        };
    }
    Estimate {
        value,
        error: error.min(half + away.abs()),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn range(k: f64, below: f64, above: f64) -> Bracket {
        Bracket {
            low: k - below,
            high: k + above,
        }
    }

    #[test]
    fn a_common_law_gives_the_value_exactly_and_its_absence_none() {
        let far = Estimate {
            value: 1.1,
            error: 0.2,
        };
        let found =
            from_ranges(far, range(1.0, 0.02, 0.01), range(1.0, 0.05, 0.025), true).unwrap();
        assert!((found.value - 1.0).abs() < 1e-14);
        assert!((found.error - 0.5 * 0.015).abs() < 1e-14);
        assert!(from_ranges(far, range(1.0, 0.02, 0.01), range(1.0, 0.02, 0.015), true).is_none());
        assert!(from_ranges(far, range(1.0, 0.02, 0.01), range(1.0, 0.02, 0.1), true).is_none());
    }

    #[test]
    fn a_witness_that_agrees_is_believed() {
        let near = Estimate {
            value: 1.0005,
            error: 0.1,
        };
        let found =
            from_ranges(near, range(1.0, 0.02, 0.01), range(1.0, 0.05, 0.025), false).unwrap();
        assert!((found.value - 1.0005).abs() < 1e-15);
        assert!(found.error > 0.0005 && found.error < 0.0025);
    }
    #[test]
    fn a_value_stays_inside_the_range_with_an_error_that_the_range_allows() {
        let proven = range(1.0, 0.01, 0.01);
        let best = |value: f64, error: f64, is_re_entrant: bool| {
            let best = within(Estimate { value, error }, proven, is_re_entrant);
            [best.value - 1.0, best.error].map(|x| (1e6 * x).round() as i32)
        };
        assert_eq!(best(1.004, 0.001, false), [4000, 1000]);
        assert_eq!(best(1.004, 0.018, false), [4000, 14_000]);
        assert_eq!(best(1.004, 0.001, true), [4000, 4000]);
        assert_eq!(best(1.004, 0.03, false), [0, 10_000]);
        assert_eq!(best(1.02, 0.001, false), [5000, 10_000]);
        assert_eq!(best(0.9, 0.001, false), [-5000, 10_000]);
        assert_eq!(best(1.02, 0.001, true), [0, 10_000]);
    }
}
