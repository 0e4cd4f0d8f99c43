//! The interior of both bounds: stretches of whole cells with whole cells all around, row by row.
//!
//! Rows of nodal values come as slices, so that the sums are free of branches and run over several cells at a
//! time, in [`LANES`] partial sums. Cells of a long row are nearly alike, and so is the rounding of adding them;
//! sums are therefore closed after [`GROUP`] terms and then added up.

/// Cells worked on together.
const LANES: usize = 8;
/// Grid lines beside and between them.
const LINES: usize = LANES + 1;

/// Terms added up before they are added to the rest.
const GROUP: usize = 1024;

/// Sum of terms of one sign, in groups.
pub(super) fn sum_in_groups<const N: usize>(terms: impl Iterator<Item = [f64; N]>) -> [f64; N] {
    let (mut total, mut group) = ([0.0; N], [0.0; N]);
    let add = |sum: &mut [f64; N], term: &[f64; N]| {
        for (s, t) in sum.iter_mut().zip(term) {
            *s += t;
        }
    };
    for (k, term) in terms.enumerate() {
        if k % GROUP == 0 {
            add(&mut total, &group);
            group = [0.0; N];
        }
        add(&mut group, &term);
    }
    add(&mut total, &group);
    total
}

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
    let groups = (0..n).step_by(GROUP);
    sum_in_groups(groups.map(|from| {
        let to = (from + GROUP).min(n) + 3;
        group_of_squares(rows.map(|row| &row[from..to]))
    }))
}

fn group_of_squares(rows: [&[f64]; 4]) -> [f64; 2] {
    let [mut r0, mut r1, mut r2, mut r3] = rows;
    let mut sum = [[0.0; LANES]; 2];
    while let (Some(a), Some(b), Some(c), Some(d)) = (
        r0.first_chunk(),
        r1.first_chunk(),
        r2.first_chunk(),
        r3.first_chunk(),
    ) {
        add_squares(&mut sum, [a, b, c, d]);
        (r0, r1) = (&r0[LANES..], &r1[LANES..]);
        (r2, r3) = (&r2[LANES..], &r3[LANES..]);
    }
    let mut rest = [[0.0; LANES]; 2];
    add_squares(
        &mut rest,
        [&filled(r0), &filled(r1), &filled(r2), &filled(r3)],
    );
    let left = r0.len().saturating_sub(3);
    let of = |k: usize| sum[k].iter().sum::<f64>() + rest[k].iter().take(left).sum::<f64>();
    [of(0), 0.5 * of(1)]
}

fn add_squares(sum: &mut [[f64; LANES]; 2], [r0, r1, r2, r3]: [&[f64; LANES + 3]; 4]) {
    let [mut rise, mut bend, mut pair] = [[0.0; LINES]; 3];
    for l in 0..LINES {
        rise[l] = r2[l + 1] - r1[l + 1];
        pair[l] = r2[l + 1] + r1[l + 1];
        bend[l] = pair[l] - (r0[l + 1] + r3[l + 1]);
    }
    let [mut low, mut high] = [[0.0; LANES + 2]; 2];
    for l in 0..LANES + 2 {
        (low[l], high[l]) = (r1[l + 1] - r1[l], r2[l + 1] - r2[l]);
    }
    for l in 0..LANES {
        let bubbles = [
            low[l] - low[l + 2],
            bend[l + 1],
            high[l] - high[l + 2],
            bend[l],
        ];
        let [south, east, north, west] = bubbles;
        sum[0][l] +=
            (pair[l] + pair[l + 1]) * 0.25 + ((south + north) + (west + east)) * (1.0 / 48.0);
        sum[1][l] += twice_energy([low[l + 1], rise[l + 1], high[l + 1], rise[l]], bubbles);
    }
}

/// Twice the energy of a square or cell, from two numbers for each side: for squares its difference and 16 times its
/// bubble, for cells its flux and twice its variation.
///
/// Both energies are `(p^2 + p q + q^2) / 3 + tilt (p + q) / 24 + tilt^2 / 480 + (v^2 + v w + w^2) / 144` for two sides
/// across from each other, `p`, `q` their first numbers, `v`, `w` their second ones, and `tilt` the difference of the
/// other two sides' second numbers. Here `p^2 + p q + q^2 = (3 (p^2 + q^2) - (q - p)^2) / 2` leaves fewer products. The
/// sizes of all terms add up to a few times the energy at most, so the rounding is still that of a sum of one sign.
fn twice_energy([south, east, north, west]: [f64; 4], [s, e, n, w]: [f64; 4]) -> f64 {
    let (across, up) = (e - w, n - s);
    let steps = [north - south, east - west];
    (south * south + north * north)
        + (east * east + west * west)
        + ((s * s + n * n) + (e * e + w * w)) * (1.0 / 48.0)
        + (across * (south + north) + up * (east + west)) * (1.0 / 12.0)
        - (across * across + up * up) * (1.0 / 360.0)
        - (steps[0] * steps[0] + steps[1] * steps[1]) * (1.0 / 3.0)
}

/// Integral of `abs(s)^2` over the cells around the nodes of a row, and the flux out of the last one to the
/// east: the balance of each cell decides its east side.
///
/// - `rows`: values of three rows, the cells around the nodes of the middle one; from one node before the
///   first cell's to one after the last one's, of equal length
/// - `west`: flux through the west side of the first cell
pub(super) fn cells(rows: [&[f64]; 3], west: f64) -> (f64, f64) {
    let n = rows[0].len().saturating_sub(2);
    let mut flux = west;
    let groups = (0..n).step_by(GROUP);
    let [energy] = sum_in_groups(groups.map(|from| {
        let to = (from + GROUP).min(n) + 2;
        let (energy, east) = group_of_cells(rows.map(|row| &row[from..to]), flux);
        flux = east;
        [energy]
    }));
    (energy, flux)
}

fn group_of_cells(rows: [&[f64]; 3], west: f64) -> (f64, f64) {
    let [mut below, mut centre, mut above] = rows;
    let mut sum = [0.0; LANES];
    let mut flux = west;
    while let (Some(a), Some(b), Some(c)) = (
        below.first_chunk(),
        centre.first_chunk(),
        above.first_chunk(),
    ) {
        flux = add_cells(&mut sum, [a, b, c], flux)[LANES];
        (below, centre, above) = (&below[LANES..], &centre[LANES..], &above[LANES..]);
    }
    let mut rest = [0.0; LANES];
    let group = [&filled(below), &filled(centre), &filled(above)];
    let sides = add_cells(&mut rest, group, flux);
    let left = below.len().saturating_sub(2);
    let energy = sum.iter().sum::<f64>() + rest.iter().take(left).sum::<f64>();
    (0.5 * energy, sides[left])
}

/// Adds the energy of some cells; returns the fluxes through their vertical sides.
fn add_cells(
    sum: &mut [f64; LANES],
    [below, centre, above]: [&[f64; LANES + 2]; 3],
    west: f64,
) -> [f64; LINES] {
    let [mut souths, mut norths, mut across] = [[0.0; LANES + 2]; 3];
    for l in 0..LANES + 2 {
        (souths[l], norths[l]) = (centre[l] - below[l], above[l] - centre[l]);
        across[l] = above[l] - below[l];
    }
    let mut sides = [west; LINES];
    for l in 0..LANES {
        sides[l + 1] = sides[l] - (1.0 + (norths[l + 1] - souths[l + 1]));
    }
    for l in 0..LANES {
        let (south, north) = (souths[l + 1], norths[l + 1]);
        let (s, n) = (souths[l + 2] - souths[l], norths[l + 2] - norths[l]);
        let (w, e) = (across[l + 1] - across[l], across[l + 2] - across[l + 1]);
        sum[l] += twice_energy([south, sides[l + 1], north, sides[l]], [s, e, n, w]);
    }
    sides
}

/// The last values of a row, filled up with zeros.
fn filled<const N: usize>(rest: &[f64]) -> [f64; N] {
    let mut values = [0.0; N];
    for (value, &r) in values.iter_mut().zip(rest) {
        *value = r;
    }
    values
}

#[cfg(test)]
mod tests {
    use super::super::cell_energy::whole_energy;
    use super::super::square_energy::Square;
    use super::*;

    #[test]
    fn a_long_sum_of_equal_terms_is_as_good_as_their_product() {
        let n = 3_000_000;
        let [sum] = sum_in_groups(std::iter::repeat_n([0.1], n));
        assert!((sum / (0.1 * n as f64) - 1.0).abs() < 3e-13, "{sum:e}");
    }

    /// Rows of values without any order.
    fn rough<const ROWS: usize>(n: usize) -> [Vec<f64>; ROWS] {
        let value = |row: usize, k: usize| ((row * 37 + k * 11) as f64).sin() + 0.1 * k as f64;
        std::array::from_fn(|row| (0..n).map(|k| value(row, k)).collect())
    }

    #[test]
    fn a_stretch_of_squares_is_the_sum_of_its_squares() {
        for n in (0..40).chain([2 * GROUP + 5]) {
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
        for n in (0..40).chain([2 * GROUP + 5]) {
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
