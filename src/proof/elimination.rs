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
    /// - `pairs`: each pair of unknowns that are coupled, with the entry; several for the same pair add up
    pub(super) fn new(mut diagonal: Vec<f64>, pairs: &[(u32, u32, f64)]) -> Self {
        let n = diagonal.len();
        let mut rows = Rows::new(n, pairs);
        let mut waiting: Vec<Vec<u32>> = Vec::new();
        let mut least = 0;
        for unknown in (0..n).rev() {
            wait(
                &mut waiting,
                &mut least,
                rows.row(unknown).len(),
                unknown as u32,
            );
        }
        let mut found = Self {
            steps: Vec::with_capacity(n),
            entries: Vec::with_capacity(2 * n),
        };
        let mut is_done = vec![false; n];
        let mut row = Vec::new();
        while least < waiting.len() {
            let Some(unknown) = waiting[least].pop() else {
                least += 1;
                continue;
            };
            let index = unknown as usize;
            // One that has gained or lost neighbours since waits elsewhere as well.
            if is_done[index] || rows.row(index).len() != least {
                continue;
            }
            is_done[index] = true;
            row.clear();
            row.extend_from_slice(rows.row(index));
            let pivot = diagonal[index];
            for &(other, entry) in &row {
                let share = entry / pivot;
                diagonal[other as usize] -= share * entry;
                let neighbours = rows.subtract(other as usize, &row, share, unknown);
                wait(&mut waiting, &mut least, neighbours, other);
            }
            found.entries.extend_from_slice(&row);
            found.steps.push(Step {
                unknown,
                pivot,
                end: found.entries.len(),
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

/// Entries off the diagonal of every row, sorted by column, in one array.
struct Rows {
    /// First entry, number of entries, and room for more.
    places: Vec<[u32; 3]>,
    entries: Vec<(u32, f64)>,
    /// The row at hand.
    merged: Vec<(u32, f64)>,
}

impl Rows {
    fn new(n: usize, pairs: &[(u32, u32, f64)]) -> Self {
        let mut next = vec![0_u32; n + 1];
        for &(a, b, _) in pairs {
            next[a as usize + 1] += 1;
            next[b as usize + 1] += 1;
        }
        for k in 0..n {
            next[k + 1] += next[k];
        }
        let mut places: Vec<[u32; 3]> = next
            .windows(2)
            .map(|pair| [pair[0], pair[1] - pair[0], pair[1] - pair[0]])
            .collect();
        let mut entries = vec![(0, 0.0); 2 * pairs.len()];
        for &(a, b, entry) in pairs {
            for (row, column) in [(a, b), (b, a)] {
                entries[next[row as usize] as usize] = (column, entry);
                next[row as usize] += 1;
            }
        }
        for place in &mut places {
            let row = &mut entries[place[0] as usize..][..place[1] as usize];
            row.sort_by_key(|entry| entry.0);
            let mut kept = 0;
            for k in 1..row.len() {
                if row[k].0 == row[kept].0 {
                    row[kept].1 += row[k].1;
                } else {
                    kept += 1;
                    row[kept] = row[k];
                }
            }
            place[1] = place[1].min(kept as u32 + 1);
        }
        Self {
            places,
            entries,
            merged: Vec::new(),
        }
    }

    fn row(&self, index: usize) -> &[(u32, f64)] {
        let [from, len, _] = self.places[index];
        &self.entries[from as usize..][..len as usize]
    }

    /// Takes `share` times another row, that of `gone`, from a row, and `gone` out of it; returns the number
    /// of entries left.
    fn subtract(&mut self, index: usize, other: &[(u32, f64)], share: f64, gone: u32) -> usize {
        let [from, len, room] = self.places[index];
        if other.len() == 1 {
            // A branch with nothing behind it.
            let own = &mut self.entries[from as usize..][..len as usize];
            let at = own.partition_point(|entry| entry.0 < gone);
            own[at..].rotate_left(1);
            self.places[index][1] -= 1;
            return len as usize - 1;
        }
        let mut merged = std::mem::take(&mut self.merged);
        merged.clear();
        let own = self.entries[from as usize..][..len as usize]
            .iter()
            .copied();
        let mut added = other
            .iter()
            .copied()
            .filter(|a| a.0 as usize != index)
            .peekable();
        for (column, value) in own.filter(|entry| entry.0 != gone) {
            while let Some((before, entry)) = added.next_if(|a| a.0 < column) {
                merged.push((before, -share * entry));
            }
            let same = added.next_if(|a| a.0 == column).map_or(0.0, |a| a.1);
            merged.push((column, value - share * same));
        }
        merged.extend(added.map(|(column, entry)| (column, -share * entry)));
        let len = merged.len();
        if len <= room as usize {
            self.entries[from as usize..][..len].copy_from_slice(&merged);
            self.places[index][1] = len as u32;
        } else {
            self.places[index] = [self.entries.len() as u32, len as u32, len as u32];
            self.entries.extend_from_slice(&merged);
        }
        self.merged = merged;
        len
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
        let mut entries = Vec::new();
        for (k, (a, b)) in pairs.into_iter().enumerate() {
            let entry = -1.0 - 0.3 * (k as f64).sin();
            for (a, b) in [(a, b), (b, a)] {
                dense[(a, b)] += entry;
                diagonal[a] -= entry;
            }
            entries.push((a as u32, b as u32, entry));
        }
        for (k, d) in diagonal.iter().enumerate() {
            dense[(k, k)] = *d;
        }
        let right = nalgebra::DVector::from_fn(n, |k, _| (1.0 + k as f64).cos());
        let exact = dense.lu().solve(&right).unwrap();
        let mut x = right.as_slice().to_vec();
        Elimination::new(diagonal, &entries).solve(&mut x);
        for (a, b) in x.iter().zip(exact.iter()) {
            assert!((a - b).abs() < 1e-12 * exact.amax(), "{a} {b}");
        }
    }
}
