//! First values of a grid from the solution of the next coarser one.
//!
//! Odd fine nodes lie between two coarse ones along a line and get the polynomial through up to four points of
//! that line: two to either side, where the wall ends the line the wall itself with value zero. Four points leave an error of
//! `h^4`, as small as that of the coarse solution's curvature, so that one or two cycles reach the
//! discretisation error; the linear interpolation of the corrections would leave `h^2` and need four to
//! six. Even fine nodes get their values from the sweep that follows.

use crate::grid::{ARM_DOWN, ARM_LEFT, ARM_RIGHT, ARM_UP, Colour, Mask, NO_NODE, WallNode};

/// Weights half way between the inner two of four equidistant points (common practice).
const INNER: f64 = 9.0 / 16.0;
/// See [`INNER`].
const OUTER: f64 = -1.0 / 16.0;
/// Weights half way between the first two of three equidistant points: near, middle, far.
const THREE: [f64; 3] = [3.0 / 8.0, 6.0 / 8.0, -1.0 / 8.0];

/// Sets the odd nodes of one fine row.
///
/// - `natural`: coarse values row by row
/// - `odd`: the row to write
pub(super) fn guess_row(fine: &Mask, coarse: &Mask, natural: &[f64], row: usize, odd: &mut [f64]) {
    let at = Guess {
        fine,
        coarse,
        natural,
        row: row as u32,
        first: fine.starts[row].node[Colour::Odd as usize],
    };
    if row.is_multiple_of(2) {
        at.along_row(odd);
    } else {
        at.between_rows(odd);
    }
    at.beside_walls(row, odd);
}

struct Guess<'a> {
    fine: &'a Mask,
    coarse: &'a Mask,
    natural: &'a [f64],
    row: u32,
    first: u32,
}

impl Guess<'_> {
    /// Nodes of a fine row that is also a coarse one: whole stretches, their ends by three points.
    fn along_row(&self, odd: &mut [f64]) {
        for run in self.fine.row(self.row) {
            // Odd columns with coarse nodes to both sides in the same run.
            let low = run.first.div_ceil(2);
            let high = (run.end() - 1) / 2;
            let Some(line) = self.coarse_line(low, self.row / 2, high) else {
                continue;
            };
            let n = line.len() - 1;
            let start = run.node(2 * low + 1).1 - self.first;
            let target = &mut odd[start as usize..][..n];
            if n == 1 {
                target[0] = 0.5 * (line[0] + line[1]);
                continue;
            }
            target[0] = THREE[0] * line[0] + THREE[1] * line[1] + THREE[2] * line[2];
            target[n - 1] = THREE[0] * line[n] + THREE[1] * line[n - 1] + THREE[2] * line[n - 2];
            let (a, b, c, d) = (line, &line[1..], &line[2..], &line[3.min(n)..]);
            let inner = n - 2;
            for (k, value) in target[1..=inner].iter_mut().enumerate() {
                *value = INNER * (b[k] + c[k]) + OUTER * (a[k] + d[k]);
            }
        }
    }

    /// Coarse values from column `low` to `high` of a row where they lie in one run and are two or more.
    fn coarse_line(&self, low: u32, row: u32, high: u32) -> Option<&[f64]> {
        let run = self.coarse.run_at(low, row)?;
        let from = (run.natural + low - run.first) as usize;
        (low < high && high < run.end()).then(|| &self.natural[from..=from + (high - low) as usize])
    }

    /// Nodes between two coarse rows, in stretches of which each has the same rows around it.
    fn between_rows(&self, odd: &mut [f64]) {
        let c = Colour::Odd as usize;
        let [at, next] = [
            self.fine.starts[self.row as usize],
            self.fine.starts[self.row as usize + 1],
        ];
        let j = self.row / 2;
        for s in &self.fine.segments[c][at.segment[c] as usize..next.segment[c] as usize] {
            let target = &mut odd[(s.start - self.first) as usize..][..s.len as usize];
            let mut k = 0;
            while k < s.len {
                let rows = [j.wrapping_sub(1), j, j + 1, j + 2];
                let lines = rows.map(|row| self.stretch(s.i / 2 + k, row, s.len - k));
                let n = lines.iter().map(|line| line.len).min().unwrap_or(1).max(1);
                let stretch = &mut target[k as usize..(k + n) as usize];
                between(lines.map(|line| line.values), stretch);
                k += n;
            }
        }
    }

    /// Coarse values from `(i, j)` on, or none, over at most `most` columns with the same answer.
    fn stretch(&self, i: u32, j: u32, most: u32) -> Stretch<'_> {
        let row = self.coarse.row(j);
        let after = row.partition_point(|run| run.first <= i);
        if let Some(run) = after.checked_sub(1).and_then(|k| row.get(k))
            && i < run.end()
        {
            let len = most.min(run.end() - i);
            let from = (run.natural + i - run.first) as usize;
            return Stretch {
                values: Some(&self.natural[from..from + len as usize]),
                len,
            };
        }
        let until = row.get(after).map_or(u32::MAX, |run| run.first);
        Stretch {
            values: None,
            len: most.min(until - i),
        }
    }

    /// Nodes with a cut arm and those between one and the wall: one by one.
    fn beside_walls(&self, row: usize, odd: &mut [f64]) {
        let c = Colour::Odd as usize;
        let [at, next] = [self.fine.starts[row], self.fine.starts[row + 1]];
        let arm = if row.is_multiple_of(2) {
            ARM_LEFT
        } else {
            ARM_DOWN
        };
        for w in &self.fine.wall[c][at.wall[c] as usize..next.wall[c] as usize] {
            odd[(w.node - self.first) as usize] = self.beside_wall(w, arm);
        }
    }

    /// Value of the polynomial along one line through the node: by the wall where an arm is cut.
    fn beside_wall(&self, w: &WallNode, arm: usize) -> f64 {
        let mut places = [0.0; 4];
        let mut values = [0.0; 4];
        let mut count = 0;
        for direction in [arm, arm ^ 1] {
            let sign = if direction == ARM_RIGHT || direction > ARM_DOWN {
                1.0
            } else {
                -1.0
            };
            let mut push = |place: f64, value: f64| {
                places[count] = sign * place;
                values[count] = value;
                count += 1;
            };
            if w.neighbour[direction] == NO_NODE {
                push(w.arm[direction], 0.0);
                continue;
            }
            let Some(near) = self.coarse_at(w, direction, 1) else {
                continue;
            };
            push(1.0, near);
            if w.beyond[direction] != NO_NODE
                && let Some(far) = self.coarse_at(w, direction, 3)
                && self.is_joined(w, direction)
            {
                push(3.0, far);
            }
        }
        interpolate(&places[..count], &values[..count])
    }

    /// Whether the line from the second to the third node away is free of walls.
    fn is_joined(&self, w: &WallNode, direction: usize) -> bool {
        let second = w.beyond[direction];
        let row = match direction {
            ARM_DOWN => w.j.wrapping_sub(2),
            ARM_UP => w.j + 2,
            _ => w.j,
        };
        self.fine
            .wall_node_in_row(Colour::Odd, second, row)
            .is_none_or(|wall| wall.neighbour[direction] != NO_NODE)
    }

    /// Coarse value `steps` fine nodes away along an arm.
    fn coarse_at(&self, w: &WallNode, direction: usize, steps: u32) -> Option<f64> {
        let back = |v: u32| v.checked_sub(steps);
        let [i, j] = match direction {
            ARM_LEFT => [back(w.i)?, w.j],
            ARM_RIGHT => [w.i + steps, w.j],
            ARM_DOWN => [w.i, back(w.j)?],
            _ => [w.i, w.j + steps],
        };
        let node = self.coarse.natural_at(i / 2, j / 2)?;
        self.natural.get(node as usize).copied()
    }
}

struct Stretch<'a> {
    values: Option<&'a [f64]>,
    len: u32,
}

/// Half way between the middle two of four rows, of which some may be missing.
fn between(rows: [Option<&[f64]>; 4], target: &mut [f64]) {
    let n = target.len();
    let three = |rows: [&[f64]; 3], target: &mut [f64]| {
        for k in 0..n {
            target[k] = THREE[0] * rows[0][k] + THREE[1] * rows[1][k] + THREE[2] * rows[2][k];
        }
    };
    match rows.map(|row| row.map(|row| &row[..n])) {
        [Some(a), Some(b), Some(c), Some(d)] => {
            for k in 0..n {
                target[k] = INNER * (b[k] + c[k]) + OUTER * (a[k] + d[k]);
            }
        }
        [None, Some(b), Some(c), Some(d)] => three([b, c, d], target),
        [Some(a), Some(b), Some(c), None] => three([c, b, a], target),
        [_, b, c, _] => {
            for (k, value) in target.iter_mut().enumerate() {
                let at = |row: Option<&[f64]>| row.map_or(0.0, |row| row[k]);
                *value = 0.5 * (at(b) + at(c));
            }
        }
    }
}

/// Value at zero of the polynomial through some points.
fn interpolate(places: &[f64], values: &[f64]) -> f64 {
    let mut sum = 0.0;
    for (k, (&place, &value)) in places.iter().zip(values).enumerate() {
        let mut weight = 1.0;
        for (other, &elsewhere) in places.iter().enumerate() {
            if other != k {
                weight *= elsewhere / (elsewhere - place);
            }
        }
        sum += weight * value;
    }
    sum
}

#[cfg(test)]
mod tests {
    use super::interpolate;

    #[test]
    fn cubics_are_met_by_four_points_and_parabolas_by_three() {
        let cubic = |x: f64| 2.0 - x + 0.5 * x * x - 0.25 * x * x * x;
        let places = [-3.0, -1.0, 1.0, 3.0];
        assert!((interpolate(&places, &places.map(cubic)) - 2.0).abs() < 1e-14);
        let parabola = |x: f64| (x + 0.3) * (4.0 - x);
        let places = [-0.3, 1.0, 3.0];
        assert!((interpolate(&places, &places.map(parabola)) - 1.2).abs() < 1e-14);
    }
}
