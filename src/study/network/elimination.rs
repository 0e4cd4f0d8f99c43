//! Direct solution of a net of conductances by star-mesh transformation.
//!
//! A node `k` with conductances `g_ki` to its neighbours, `s_k` their sum, is taken out, and `g_ki g_kj / s_k`
//! added between each pair of them. No diagonal is kept and nothing is subtracted, as in the algorithm of
//! Grassmann, Taksar and Heyman (1985), Regenerative analysis and steady state distributions for Markov
//! chains, Operations Research 33, 1107 (from memory), so every conductance comes out to a few roundings for
//! each node, however far apart they are. On the way back differences of pressure are carried, not pressures:
//!
//! `p_k - p_i = (q_k + sum over j of g_kj (p_j - p_i)) / s_k`
//!
//! where `q_k` flows in. `j` and `i` were joined when `k` went, so `p_j - p_i` is there already. A channel
//! without much resistance thus gets its flow to rounding, though the pressures at its ends are equal in all
//! their digits.

use super::structure::Structure;

/// Conductances of a net after elimination.
#[derive(Debug, Clone)]
pub(super) struct Eliminated {
    /// Of each link at the time when its first node goes, m^3/(s Pa).
    conductances: Vec<f64>,
    /// Their sum for each node that goes.
    sums: Vec<f64>,
    /// Between the two kept nodes, where there are exactly two.
    pub(super) between: f64,
}

/// Pressures that belong to some inflows.
#[derive(Debug, Clone)]
pub(super) struct Pressures {
    /// First node less second node of each link, Pa.
    pub(super) differences: Vec<f64>,
    /// At every node in the order of elimination, Pa; the kept ones last.
    pub(super) nodes: Vec<f64>,
}

impl Eliminated {
    /// - `conductances`: of each link, zero where nothing joins the two nodes
    /// - `between`: conductance straight between the two kept nodes, where there are exactly two
    pub(super) fn new(structure: &Structure, mut conductances: Vec<f64>, between: f64) -> Self {
        let n = structure.unknowns;
        let kept = structure.position.len() - n;
        let mut sums = Vec::with_capacity(n);
        let mut between = between;
        for node in 0..n {
            let range = structure.links(node);
            let (done, later) = conductances.split_at_mut(range.end);
            let own = &done[range.clone()];
            let row = &structure.columns[range.clone()];
            let sum: f64 = own.iter().sum();
            sums.push(sum);
            for (place, (&other, &towards)) in row.iter().zip(own).enumerate() {
                if other as usize >= n {
                    if kept == 2 && place + 2 == row.len() {
                        between += towards / sum * own[place + 1];
                    }
                    break;
                }
                let share = towards / sum;
                let target = structure.links(other as usize);
                let into = &mut later[target.start - range.end..target.end - range.end];
                let rest = &row[place + 1..];
                if into.len() == rest.len() {
                    // The same nodes in the same order, since one list holds the other.
                    for (g, &more) in into.iter_mut().zip(&own[place + 1..]) {
                        *g += share * more;
                    }
                } else {
                    let columns = &structure.columns[target];
                    let mut at = 0;
                    for (&column, &more) in rest.iter().zip(&own[place + 1..]) {
                        at += columns[at..].iter().take_while(|&&c| c < column).count();
                        into[at] += share * more;
                    }
                }
            }
        }
        Self {
            conductances,
            sums,
            between,
        }
    }

    /// Whether every node still had a way out: false where a conductance has left the range of numbers.
    pub(super) fn is_sound(&self) -> bool {
        self.sums.iter().all(|s| s.is_finite() && *s > 0.0)
    }

    /// Pressures alone, in the order of elimination, the kept ones last: far cheaper in meshed nets than with differences,
    /// which lose digits where two pressures are nearly equal.
    pub(super) fn plain_pressures(
        &self,
        structure: &Structure,
        inflows: Vec<f64>,
        kept: &[f64],
    ) -> Vec<f64> {
        let n = structure.unknowns;
        let inflows = self.passed_on(structure, inflows);
        let mut found = vec![0.0; n];
        found.extend_from_slice(kept);
        for node in (0..n).rev() {
            let range = structure.links(node);
            let row = structure.columns[range.clone()].iter();
            let sum: f64 = row
                .zip(&self.conductances[range])
                .map(|(&other, g)| g * found[other as usize])
                .sum();
            found[node] = (inflows[node] + sum) / self.sums[node];
        }
        found
    }

    /// Inflows with those of the nodes before, which pass theirs on when they go.
    fn passed_on(&self, structure: &Structure, mut inflows: Vec<f64>) -> Vec<f64> {
        let n = structure.unknowns;
        for node in 0..n {
            if inflows[node] == 0.0 {
                continue;
            }
            let range = structure.links(node);
            let share = inflows[node] / self.sums[node];
            for (&other, &g) in structure.columns[range.clone()]
                .iter()
                .zip(&self.conductances[range])
            {
                if (other as usize) < n {
                    inflows[other as usize] += g * share;
                }
            }
        }
        inflows
    }

    /// Pressures for given inflows and pressures of the kept nodes.
    ///
    /// - `inflows`: of each node in the order of elimination, m^3/s
    /// - `kept`: pressures of the kept nodes, Pa
    pub(super) fn pressures(
        &self,
        structure: &Structure,
        inflows: Vec<f64>,
        kept: &[f64],
    ) -> Pressures {
        let n = structure.unknowns;
        let inflows = self.passed_on(structure, inflows);
        // Pressures are means of those around; with the lowest at zero means do not cancel.
        let lowest = kept.iter().copied().fold(f64::INFINITY, f64::min);
        let lowest = if lowest.is_finite() { lowest } else { 0.0 };
        let mut found = Pressures {
            differences: vec![0.0; structure.columns.len()],
            nodes: vec![0.0; n],
        };
        found.nodes.extend(kept.iter().map(|p| p - lowest));
        let mut sums = Vec::new();
        for node in (0..n).rev() {
            self.go_back(structure, node, inflows[node], &mut found, &mut sums);
        }
        for p in &mut found.nodes[..n] {
            *p += lowest;
        }
        found.nodes.truncate(n);
        found.nodes.extend_from_slice(kept);
        found
    }

    /// Differences on the links of one node and its pressure, when all later ones are known.
    fn go_back(
        &self,
        structure: &Structure,
        node: usize,
        inflow: f64,
        found: &mut Pressures,
        sums: &mut Vec<f64>,
    ) {
        let n = structure.unknowns;
        let range = structure.links(node);
        let row = &structure.columns[range.clone()];
        let own = &self.conductances[range.clone()];
        sums.clear();
        sums.resize(row.len(), inflow);
        let (done, later) = found.differences.split_at_mut(range.end);
        let mut pressure = inflow;
        for (place, (&other, &towards)) in row.iter().zip(own).enumerate() {
            pressure += towards * found.nodes[other as usize];
            let (before, after) = sums.split_at_mut(place + 1);
            let mut own_sum = 0.0;
            let rest = row[place + 1..].iter().zip(&own[place + 1..]).zip(after);
            if other as usize >= n {
                for ((&column, &g), sum) in rest {
                    let difference = found.nodes[other as usize] - found.nodes[column as usize];
                    *sum += towards * difference;
                    own_sum += g * difference;
                }
            } else {
                let target = structure.links(other as usize);
                let known = &later[target.start - range.end..target.end - range.end];
                let columns = &structure.columns[target];
                let is_same = columns.len() + place + 1 == row.len();
                let mut at = 0;
                for ((&column, &g), sum) in rest {
                    if !is_same {
                        at += columns[at..].iter().take_while(|&&c| c < column).count();
                    }
                    let difference = known[at];
                    at += 1;
                    *sum += towards * difference;
                    own_sum += g * difference;
                }
            }
            if let Some(sum) = before.last_mut() {
                *sum -= own_sum;
            }
        }
        found.nodes[node] = pressure / self.sums[node];
        for (difference, sum) in done[range].iter_mut().zip(sums.iter()) {
            *difference = sum / self.sums[node];
        }
    }
}
