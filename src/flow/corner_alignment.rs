//! Where the lattice lines pass the re-entrant corners.
//!
//! The leading error of a re-entrant corner has the same exponent on every grid but a constant that
//! depends on where the lattice lines pass it, by about its own size. A corner on a node of every grid has
//! one constant, and extrapolation removes its error (measured: `tests/convergence.rs`). One corner is put
//! there by shifting the lattice. For several, the spacing is made up to an eighth smaller as well, so that
//! as many as possible fall on nodes: pairs on a common horizontal or vertical line, square posts, bonded
//! halves and crosses come out exactly.

use crate::geometry::{Corner, Outline};

/// Lattice lines between the places where a corner may fall: a node of the three finest grids.
const LINES: f64 = 4.0;
/// Most that the spacing is reduced.
const SMALLER: f64 = 1.125;
/// Corners looked at, sharpest first.
const MOST_CORNERS: usize = 12;
/// Spacings tried, about.
const MOST_SPACINGS: usize = 600;

/// A lattice fitted to the re-entrant corners.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Alignment {
    /// Spacing, m.
    pub(crate) spacing: f64,
    /// Offset of the lattice as in [`crate::grid::Lattice::new`].
    pub(crate) offset: [f64; 2],
    /// Largest share of a cell by which a corner misses its node, weighted by how sharp it is against the
    /// sharpest; 0 to 1.
    pub(crate) misfit: f64,
}

/// The lattice for a section at about a given spacing.
pub(crate) fn align(outline: &Outline, corners: &[Vec<Corner>], spacing: f64) -> Alignment {
    let mut sharp: Vec<&Corner> = corners
        .iter()
        .flatten()
        .filter(|corner| corner.turning < 0.0)
        .collect();
    sharp.sort_by(|a, b| a.turning.total_cmp(&b.turning));
    let (Some(&first), Some((low, _))) = (sharp.first(), outline.bounds()) else {
        return Alignment {
            spacing,
            offset: [0.0; 2],
            misfit: 0.0,
        };
    };
    let crowd = sharp.len() > MOST_CORNERS;
    sharp.truncate(MOST_CORNERS);
    let rest: Vec<([f64; 2], f64)> = sharp[1..]
        .iter()
        .map(|corner| {
            let away = [corner.at[0] - first.at[0], corner.at[1] - first.at[1]];
            (away, corner.turning / first.turning)
        })
        .collect();
    let spacing = candidates(&rest, spacing)
        .into_iter()
        // Rounded, so that equal ones are equal whatever the scale of the section.
        .map(|h| ((1e6 * total_misfit(&rest, h)).round(), h))
        .min_by(|a, b| a.0.total_cmp(&b.0).then(b.1.total_cmp(&a.1)))
        .map_or(spacing, |(_, h)| h);
    let offset = [0, 1].map(|axis| {
        let at = (first.at[axis] - low[axis]) / spacing;
        let shift = (at / LINES).ceil() * LINES - at;
        // Rounding must not put the corner a whole stretch further.
        if LINES - shift < 1e-9 { 0.0 } else { shift }
    });
    let misfit = rest
        .iter()
        .map(|&(away, weight)| weight * misfit(away, spacing))
        .fold(0.0, f64::max);
    Alignment {
        spacing,
        offset,
        misfit: if crowd { 1.0 } else { misfit },
    }
}

/// The spacing itself and the slightly smaller ones that put some corner exactly on a node.
fn candidates(rest: &[([f64; 2], f64)], spacing: f64) -> Vec<f64> {
    let mut found = vec![spacing];
    for length in rest.iter().flat_map(|(away, _)| away.map(f64::abs)) {
        let least = (length / (LINES * spacing) - 1e-9).ceil();
        let most = (SMALLER * length / (LINES * spacing)).floor();
        let mut count = least.max(1.0);
        while count <= most && found.len() < MOST_SPACINGS {
            found.push((length / (LINES * count)).min(spacing));
            count += 1.0;
        }
    }
    found
}

fn total_misfit(rest: &[([f64; 2], f64)], spacing: f64) -> f64 {
    rest.iter()
        .map(|&(away, weight)| weight * misfit(away, spacing))
        .sum()
}

/// Distance of a corner from the nearest node of the coarsest of three grids, in cells, at most 1.
fn misfit(away: [f64; 2], spacing: f64) -> f64 {
    let miss = |length: f64| {
        let lines = length / spacing;
        (lines - (lines / LINES).round() * LINES).abs()
    };
    let distance = miss(away[0]).max(miss(away[1])).min(1.0);
    // Rounding of vertices is no misfit.
    if distance < 1e-6 { 0.0 } else { distance }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_four_corners_of_a_square_post_all_fall_on_nodes() {
        let at = |x: f64, y: f64| Corner {
            arc_length: 0.0,
            at: [x, y],
            turning: -1.57,
        };
        let corners = [vec![at(3.1, 2.2), at(3.8, 2.2), at(3.8, 2.9), at(3.1, 2.9)]];
        let outline = Outline::single(vec![[0.0, 0.0], [7.0, 0.0], [7.0, 5.0], [0.0, 5.0]]);
        let fitted = align(&outline, &corners, 0.0131);
        assert!(fitted.misfit < 1e-6, "{fitted:?}");
        assert!(fitted.spacing <= 0.0131 && fitted.spacing > 0.0131 / SMALLER);
        let line = 3.1 / fitted.spacing + fitted.offset[0];
        assert!((line / LINES - (line / LINES).round()).abs() < 1e-9);
    }
}
