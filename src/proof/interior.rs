//! The interior of both bounds: stretches of whole cells with whole cells all around, row by row.
//!
//! Rows of nodal values come as slices, so that the sums are free of branches and run over several cells at a
//! time. [`LANES`] partial sums are kept and added at the end.

use super::cell_energy::whole_energy;
use super::square_energy::Square;

/// Cells worked on together.
const LANES: usize = 8;

/// What the cubic through four equally spaced values has in the middle beyond the mean of the inner two.
pub(super) fn bubble([a, b, c, d]: [f64; 4]) -> f64 {
    (b + c - a - d) / 16.0
}

/// Integrals of `v` and `abs(grad v)^2` over the squares between two rows of nodes.
///
/// - `rows`: values of four rows, the squares between the middle two; from one node before the first
///   square to two after the start of the last, of equal length
pub(super) fn squares(rows: [&[f64]; 4]) -> [f64; 2] {
    let n = rows[0].len().saturating_sub(3);
    let (mut volume, mut energy) = ([0.0; LANES], [0.0; LANES]);
    for k in (0..n).step_by(LANES) {
        let group = some_squares(rows.map(|row| part(row, k)));
        let width = LANES.min(n - k);
        add(&mut volume, &group[0], width);
        add(&mut energy, &group[1], width);
    }
    [volume.iter().sum(), energy.iter().sum()]
}

fn some_squares([r0, r1, r2, r3]: [[f64; LANES + 3]; 4]) -> [[f64; LANES]; 2] {
    let up: [f64; LANES + 1] =
        std::array::from_fn(|l| bubble([r0[l + 1], r1[l + 1], r2[l + 1], r3[l + 1]]));
    let across = |r: &[f64; LANES + 3]| -> [f64; LANES] {
        std::array::from_fn(|l| bubble([r[l], r[l + 1], r[l + 2], r[l + 3]]))
    };
    let (south, north) = (across(&r1), across(&r2));
    let mut found = [[0.0; LANES]; 2];
    for l in 0..LANES {
        let square = Square {
            corners: [r1[l + 1], r1[l + 2], r2[l + 2], r2[l + 1]],
            bubbles: [south[l], up[l + 1], north[l], up[l]],
        };
        found[0][l] = square.volume();
        found[1][l] = square.energy();
    }
    found
}

/// Integral of `abs(s)^2` over the cells around the nodes of a row, and the flux out of the last one to the
/// east: the balance of each cell decides its east side.
///
/// - `rows`: values of three rows, the cells around the nodes of the middle one; from one node before the
///   first cell's to one after the last one's, of equal length
/// - `west`: flux through the west side of the first cell
pub(super) fn cells(rows: [&[f64]; 3], west: f64) -> (f64, f64) {
    let n = rows[0].len().saturating_sub(2);
    let mut energy = [0.0; LANES];
    let mut flux = west;
    for k in (0..n).step_by(LANES) {
        let (group, sides) = some_cells(rows.map(|row| part(row, k)), flux);
        let width = LANES.min(n - k);
        add(&mut energy, &group, width);
        flux = sides[width];
    }
    (energy.iter().sum(), flux)
}

fn some_cells(
    [below, centre, above]: [[f64; LANES + 2]; 3],
    west: f64,
) -> ([f64; LANES], [f64; LANES + 1]) {
    let south: [f64; LANES + 2] = std::array::from_fn(|l| centre[l] - below[l]);
    let north: [f64; LANES + 2] = std::array::from_fn(|l| above[l] - centre[l]);
    let step: [f64; LANES] = std::array::from_fn(|l| 1.0 + (north[l + 1] - south[l + 1]));
    let up: [f64; LANES + 1] =
        std::array::from_fn(|l| 0.5 * ((above[l + 1] - above[l]) - (below[l + 1] - below[l])));
    let mut sides = [west; LANES + 1];
    for l in 0..LANES {
        sides[l + 1] = sides[l] - step[l];
    }
    let mut energy = [0.0; LANES];
    for l in 0..LANES {
        let along = [
            0.5 * (south[l + 2] - south[l]),
            up[l + 1],
            0.5 * (north[l + 2] - north[l]),
            up[l],
        ];
        energy[l] = whole_energy([south[l + 1], sides[l + 1], north[l + 1], sides[l]], along);
    }
    (energy, sides)
}

/// `N` values of a row from place `k` on, zero beyond its end.
fn part<const N: usize>(row: &[f64], k: usize) -> [f64; N] {
    let rest = &row[k..];
    if let Some(whole) = rest.first_chunk() {
        return *whole;
    }
    let mut filled = [0.0; N];
    filled[..rest.len()].copy_from_slice(rest);
    filled
}

/// Adds the first `width` values of a group.
fn add(sum: &mut [f64; LANES], group: &[f64; LANES], width: usize) {
    if width == LANES {
        for (s, g) in sum.iter_mut().zip(group) {
            *s += g;
        }
    } else {
        for (s, g) in sum.iter_mut().zip(group).take(width) {
            *s += g;
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Rows of values without any order.
    fn rough<const ROWS: usize>(n: usize) -> [Vec<f64>; ROWS] {
        let value = |row: usize, k: usize| ((row * 37 + k * 11) as f64).sin() + 0.1 * k as f64;
        std::array::from_fn(|row| (0..n).map(|k| value(row, k)).collect())
    }

    #[test]
    fn a_stretch_of_squares_is_the_sum_of_its_squares() {
        for n in 0..40 {
            let r = rough::<4>(n + 3);
            let (mut volume, mut energy) = (0.0, 0.0);
            for k in 1..=n {
                let across = |row: usize| bubble(std::array::from_fn(|m| r[row][k - 1 + m]));
                let up = |k: usize| bubble(std::array::from_fn(|row| r[row][k]));
                let square = Square {
                    corners: [r[1][k], r[1][k + 1], r[2][k + 1], r[2][k]],
                    bubbles: [across(1), up(k + 1), across(2), up(k)],
                };
                volume += square.volume();
                energy += square.energy();
            }
            let found = squares([&r[0], &r[1], &r[2], &r[3]]);
            assert!((found[0] - volume).abs() <= 1e-13 * volume.abs(), "{n}");
            assert!((found[1] - energy).abs() <= 1e-13 * energy, "{n}");
        }
    }

    #[test]
    fn a_stretch_of_cells_is_the_sum_of_its_cells() {
        for n in 0..40 {
            let r = rough::<3>(n + 2);
            let mut west = 0.7;
            let mut energy = 0.0;
            for k in 1..=n {
                let (south, north) = (r[1][k] - r[0][k], r[2][k] - r[1][k]);
                let east = west - 1.0 - (north - south);
                let rise = |k: usize, row: usize| r[row + 1][k] - r[row][k];
                let run = |k: usize, row: usize| r[row][k + 1] - r[row][k];
                let along = [
                    0.5 * (rise(k + 1, 0) - rise(k - 1, 0)),
                    0.5 * (run(k, 2) - run(k, 0)),
                    0.5 * (rise(k + 1, 1) - rise(k - 1, 1)),
                    0.5 * (run(k - 1, 2) - run(k - 1, 0)),
                ];
                energy += whole_energy([south, east, north, west], along);
                west = east;
            }
            let (sum, last) = cells([&r[0], &r[1], &r[2]], 0.7);
            assert!((sum - energy).abs() <= 1e-13 * energy, "{n}");
            assert!((last - west).abs() <= 1e-12, "{n}");
        }
    }
}
