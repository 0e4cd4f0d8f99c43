//! Best value and error estimate from a sequence of grids.
//!
//! The error of a smooth functional on these grids is `c h^2` plus smaller terms; a corner of fluid angle
//! `omega` adds `c h^(2 pi / omega)`, because the solution behaves like `r^(pi / omega)` there. That term
//! leads for a re-entrant corner and comes next for an obtuse one. Richardson extrapolation removes the
//! leading terms; the change from one extrapolated value to the next estimates what is left. An estimate, not a bound.
//!
//! # Source
//! L. F. Richardson (1911), Phil. Trans. R. Soc. A 210, 307, doi:10.1098/rsta.1911.0009.

use std::f64::consts::TAU;

use crate::measured::Estimate;

/// Share of the last change between extrapolated values that is taken as the error of the best one: the
/// terms left over fall at least like `h^2.5` (measured: `tests/convergence.rs`), so that the error is at
/// most 1/(2^2.5 - 1) of the change, here doubled.
const SHARE: f64 = 0.4;
/// Share of the change before the last one that is the least error: noise of `h^3` falls by 64 over two grids, and
/// the noise of the coarser grid is the larger part of it.
const EARLIER_SHARE: f64 = 0.05;
/// Share of the removed term that is added to the error, against accidents of both changes.
const REMOVED_SHARE: f64 = 0.003;
/// Parts of [`least_share`] by corner and by facet.
const LEAST_SHARE: [f64; 2] = [0.5, 0.75];
/// Exponent of a convex corner from which its own term is as small as the rest.
const NARROW_EXPONENT: f64 = 4.0;
/// Share of the removed term by which it varies where a re-entrant corner misses the nodes altogether.
const MISFIT_SHARE: f64 = 1.0;
/// Misfit from which only one term is removed, with an exponent half way to 2. Two terms are right where one corner is
/// on a node of every grid; where corners miss the nodes, or are many, each with a term of its own, what
/// is removed is noise that removing twice multiplies: over rough discs, grooves and stars the one term leaves half
/// to a quarter of the error of two (median and nine of ten).
pub(super) const LOOSE: f64 = 0.25;
/// Rounding and iteration error of a solved grid, relative.
const FLOOR: f64 = 2e-8;

/// Least estimated error as a share of the removed term `h^2`, without re-entrant corners: what is left over falls
/// faster than that term, but at few cells two changes can both be small by accident.
///
/// What is left is about a spacing's share of the removed term, more with every corner wider than a right angle, whose
/// own term comes next, and where curves are cut into facets of several spacings, each end of which is such a corner.
/// Set on 350 invented sections and tried on 350 others (ellipses, rounded and etched ones of 15 to 1000 vertices,
/// polygons, triangles, trapezoids, chamfered ones, turned or not; 22 grids of 10 to 281 cells; against 701 cells). Of
/// the 5700 estimates from grids alone on the others, these were below the true error, and at worst by:
///
/// | cells | without, % | with, % | without | with |
/// |---|---|---|---|---|
/// | 10 to 15 | 5.6 | 0.1 | 20 | 1.2 |
/// | 16 to 22 | 9.5 | 1.3 | 29 | 2.3 |
/// | 23 to 45 | 7.0 | 2.2 | 11 | 2.3 |
/// | 46 to 100 | 8.7 | 4.8 | 22 | 2.1 |
/// | 101 to 281 | 5.5 | 3.8 | 5.9 | 4.5 |
///
/// The median of the estimates rises by a fifth.
///
/// - `convex`: fluid angles of the convex corners, radians
/// - `facets`: turning per facet, radians, see `geometry::facet_turning`
/// - `cells_across`: spacings in the hydraulic diameter
pub(crate) fn least_share(
    convex: impl Iterator<Item = f64>,
    facets: f64,
    cells_across: f64,
) -> f64 {
    let wide: f64 = convex
        .map(|angle| (NARROW_EXPONENT - TAU / angle).clamp(0.0, 1.0))
        .sum();
    let share = (1.0 + LEAST_SHARE[0] * wide) / cells_across + LEAST_SHARE[1] * facets;
    share.min(1.0)
}

/// Best value for spacing zero.
///
/// - `values`: finest grid first, each grid twice the spacing of the one before
/// - `exponent`: `2 pi / omega` of the widest corner, where that is below about 4
/// - `misfit`: how far re-entrant corners miss the nodes of the grids, 0 to 1; the constant of their term
///   then varies from grid to grid by about that share of itself
/// - `least_share`: see there; without re-entrant corners
pub(crate) fn extrapolate(
    values: &[f64],
    exponent: Option<f64>,
    misfit: f64,
    least_share: f64,
) -> Estimate {
    let with_error = |value: f64, error: f64| Estimate {
        value,
        error: error.abs() + FLOOR * value.abs(),
    };
    match (values, exponent) {
        ([], _) => Estimate {
            value: 0.0,
            error: 0.0,
        },
        ([only], _) => with_error(*only, *only),
        ([fine, coarse], _) => {
            let best = remove(*fine, *coarse, exponent.map_or(2.0, |p| p.min(2.0)));
            with_error(best, best - fine)
        }
        ([fine, middle, coarse, rest @ ..], _) => {
            let leading = exponent.unwrap_or(2.0);
            let leading = leading.min(2.0);
            let (first, second) = (
                remove(*fine, *middle, leading),
                remove(*middle, *coarse, leading),
            );
            let (best, error) = match exponent {
                Some(p) if p <= 2.0 => {
                    let twice = remove(first, second, 2.0);
                    let error =
                        (twice - first).abs() + MISFIT_SHARE * misfit * (first - fine).abs();
                    let best = if misfit > LOOSE {
                        remove(*fine, *middle, 0.5 * (p + 2.0))
                    } else {
                        twice
                    };
                    (best, error)
                }
                _ => {
                    let earlier = rest.first().map_or(0.0, |coarser| {
                        (second - remove(*coarse, *coarser, leading)).abs()
                    });
                    let change = (SHARE * (first - second).abs()).max(EARLIER_SHARE * earlier);
                    let removed = (first - fine).abs();
                    (
                        first,
                        (change + REMOVED_SHARE * removed).max(least_share * removed),
                    )
                }
            };
            if in_order(*fine - middle, *middle - coarse, leading) {
                with_error(best, error)
            } else {
                // The grids are not yet, or no longer, where the error follows its law.
                with_error(best, error.max((best - fine).abs()))
            }
        }
    }
}

/// Whether two successive changes fall about as `h^p` to `h^2` would have it, or are rounding.
fn in_order(last: f64, before: f64, p: f64) -> bool {
    let ratio = before / last;
    before == 0.0 || (0.6 * p.exp2()..=8.0).contains(&ratio)
}

/// Removes the term `h^p` from two values whose spacings differ by two.
fn remove(fine: f64, coarse: f64, p: f64) -> f64 {
    fine + (fine - coarse) / (p.exp2() - 1.0)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn both_leading_terms_of_a_re_entrant_corner_are_removed_exactly() {
        let p = 4.0 / 3.0;
        let at = |h: f64| 5.0 + 0.7 * h.powf(p) - 0.3 * h * h;
        let values = [at(0.1), at(0.2), at(0.4)];
        assert!((extrapolate(&values, Some(p), 0.0, 0.0).value - 5.0).abs() < 1e-12);
        let smooth = |h: f64| 5.0 - 0.3 * h * h;
        let best = extrapolate(&[smooth(0.1), smooth(0.2), smooth(0.4)], None, 0.0, 0.0);
        assert!((best.value - 5.0).abs() < 1e-12);
        assert!(best.error < 2e-5);
        let careful = extrapolate(&[smooth(0.1), smooth(0.2), smooth(0.4)], None, 0.0, 0.1);
        assert!((careful.error - 0.1 * 0.003).abs() < 2e-7);
    }

    #[test]
    fn the_least_share_falls_with_the_spacing_and_rises_with_wide_corners_and_facets() {
        let right = std::f64::consts::FRAC_PI_2;
        let of = |angles: &[f64], facets: f64, cells: f64| {
            least_share(angles.iter().copied(), facets, cells)
        };
        assert!((of(&[right; 4], 0.0, 50.0) - 0.02).abs() < 1e-14);
        assert!((of(&[right, TAU / 3.5], 0.0, 50.0) - 0.025).abs() < 1e-14);
        assert!((of(&[3.1; 2], 0.04, 50.0) - 0.07).abs() < 1e-14);
        assert!((of(&[], 0.0, 0.5) - 1.0).abs() < 1e-14);
    }
}
