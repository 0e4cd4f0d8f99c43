//! Best value where corners are wide: from the proven ranges of two grids.
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
}
