//! Direct solution of sparse symmetric positive definite systems.
//!
//! Unknowns are eliminated one by one, the one with the fewest neighbours left first (minimum degree; W. F.
//! Tinney, J. W. Walker 1967, Direct solutions of sparse network equations by optimally ordered triangular
//! factorization, Proc. IEEE 55, 1801, from memory). Along a wall the cells form chains with short branches,
//! so hardly anything fills in and the cost is that of reading the system.

/// A factorised system.
pub(super) struct Elimination {
    steps: Vec<Step>,
    /// Neighbours at the time of each step, and the entries towards them.
    entries: Vec<(u32, f64)>,
}

struct Step {
    unknown: u32,
    pivot: f64,
    /// One past its last entry.
    end: usize,
}

impl Elimination {
    /// - `diagonal`: entries of the diagonal
    /// - `rows`: entries off the diagonal of each row, both halves; several for the same column add up
    pub(super) fn new(mut diagonal: Vec<f64>, mut rows: Vec<Vec<(u32, f64)>>) -> Self {
        for row in &mut rows {
            row.sort_by_key(|entry| entry.0);
            row.dedup_by(|later, first| {
                let is_same = later.0 == first.0;
                if is_same {
                    first.1 += later.1;
                }
                is_same
            });
        }
        let mut waiting: Vec<Vec<u32>> = Vec::new();
        let mut least = 0;
        for unknown in (0..rows.len()).rev() {
            wait(
                &mut waiting,
                &mut least,
                rows[unknown].len(),
                unknown as u32,
            );
        }
        let mut found = Self {
            steps: Vec::with_capacity(rows.len()),
            entries: Vec::with_capacity(2 * rows.len()),
        };
        let mut is_done = vec![false; rows.len()];
        let mut merged = Vec::new();
        while least < waiting.len() {
            let Some(unknown) = waiting[least].pop() else {
                least += 1;
                continue;
            };
            let index = unknown as usize;
            // One that has gained or lost neighbours since waits elsewhere as well.
            if is_done[index] || rows[index].len() != least {
                continue;
            }
            is_done[index] = true;
            let row = std::mem::take(&mut rows[index]);
            let pivot = diagonal[index];
            for &(other, entry) in &row {
                let share = entry / pivot;
                diagonal[other as usize] -= share * entry;
                let target = &mut rows[other as usize];
                merge(target, &row, share, [unknown, other], &mut merged);
                std::mem::swap(target, &mut merged);
                wait(&mut waiting, &mut least, target.len(), other);
            }
            found.entries.extend(row);
            let end = found.entries.len();
            found.steps.push(Step {
                unknown,
                pivot,
                end,
            });
        }
        found
    }

    /// Solves for a right side, in place.
    pub(super) fn solve(&self, values: &mut [f64]) {
        let mut from = 0;
        for step in &self.steps {
            let value = values[step.unknown as usize] / step.pivot;
            for &(other, entry) in &self.entries[from..step.end] {
                values[other as usize] -= entry * value;
            }
            from = step.end;
        }
        let mut end = self.entries.len();
        for (index, step) in self.steps.iter().enumerate().rev() {
            let start = index.checked_sub(1).map_or(0, |k| self.steps[k].end);
            let known = self.entries[start..end].iter();
            let sum: f64 = known
                .map(|&(other, entry)| entry * values[other as usize])
                .sum();
            let value = &mut values[step.unknown as usize];
            *value = (*value - sum) / step.pivot;
            end = start;
        }
    }
}

/// Puts an unknown among those with the given number of neighbours.
fn wait(waiting: &mut Vec<Vec<u32>>, least: &mut usize, neighbours: usize, unknown: u32) {
    if waiting.len() <= neighbours {
        waiting.resize(neighbours + 1, Vec::new());
    }
    waiting[neighbours].push(unknown);
    *least = neighbours.min(*least);
}

/// `target - share * row` without the columns in `left_out`, both sorted by column.
fn merge(
    target: &[(u32, f64)],
    row: &[(u32, f64)],
    share: f64,
    left_out: [u32; 2],
    merged: &mut Vec<(u32, f64)>,
) {
    merged.clear();
    let mut added = row.iter().copied().peekable();
    for &(column, value) in target {
        while let Some((other, entry)) = added.next_if(|a| a.0 < column) {
            if !left_out.contains(&other) {
                merged.push((other, -share * entry));
            }
        }
        let same = added.next_if(|a| a.0 == column).map_or(0.0, |a| a.1);
        if !left_out.contains(&column) {
            merged.push((column, value - share * same));
        }
    }
    for (other, entry) in added {
        if !left_out.contains(&other) {
            merged.push((other, -share * entry));
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_ring_with_branches_and_a_net_is_solved_as_by_a_dense_factor() {
        let n = 60;
        let mut pairs: Vec<(usize, usize)> = (0..20).map(|k| (k, (k + 1) % 20)).collect();
        pairs.extend((0..15).map(|k| (k, 20 + k)));
        // A net of five by five, joined to the ring by one entry; one entry is given twice.
        for k in 0..25 {
            pairs.extend((k % 5 < 4).then_some((35 + k, 36 + k)));
            pairs.extend((k < 20).then_some((35 + k, 40 + k)));
        }
        pairs.extend([(3, 47), (3, 47)]);
        let mut dense = nalgebra::DMatrix::<f64>::zeros(n, n);
        let mut diagonal = vec![0.5; n];
        let mut rows = vec![Vec::new(); n];
        for (k, (a, b)) in pairs.into_iter().enumerate() {
            let entry = -1.0 - 0.3 * (k as f64).sin();
            for (a, b) in [(a, b), (b, a)] {
                dense[(a, b)] += entry;
                diagonal[a] -= entry;
                rows[a].push((b as u32, entry));
            }
        }
        for (k, d) in diagonal.iter().enumerate() {
            dense[(k, k)] = *d;
        }
        let right = nalgebra::DVector::from_fn(n, |k, _| (1.0 + k as f64).cos());
        let exact = dense.lu().solve(&right).unwrap();
        let mut x = right.as_slice().to_vec();
        Elimination::new(diagonal, rows).solve(&mut x);
        for (a, b) in x.iter().zip(exact.iter()) {
            assert!((a - b).abs() < 1e-12 * exact.amax(), "{a} {b}");
        }
    }
}
