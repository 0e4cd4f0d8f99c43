//! The order in which nodes are eliminated, and which nodes are joined then.
//!
//! The node with the fewest neighbours left goes first (minimum degree; W. F. Tinney, J. W. Walker 1967,
//! Direct solutions of sparse network equations by optimally ordered triangular factorization, Proc. IEEE 55,
//! 1801, from memory); its neighbours are then joined with each other. Where hardly a pair is left
//! unjoined the rest is taken as fully joined, since finding that out pair by pair would be the longest part.
//! Only the pattern is looked at, so one structure serves any conductances, as samples need.

use super::NetworkError;

/// Share of joined pairs from which the rest counts as fully joined.
const NEARLY_ALL_JOINED: f64 = 0.6;

/// The pattern of a net after elimination. Nodes are numbered in the order in which they go; those of
/// given pressure, which stay, come last.
#[derive(Debug)]
pub(super) struct Structure {
    /// Nodes that are eliminated.
    pub(super) unknowns: usize,
    /// For each node as given its number in the order.
    pub(super) position: Vec<u32>,
    /// First link of each eliminated node, and one past the last.
    pub(super) offsets: Vec<usize>,
    /// For each link the other node, later in the order; rising for each node.
    pub(super) columns: Vec<u32>,
    /// Multiplications of one elimination, about.
    pub(super) work: u64,
}

impl Structure {
    /// - `unknowns`: nodes `0..unknowns` are eliminated, `unknowns..nodes` are kept
    /// - `pairs`: joined nodes, in any order, repetitions allowed; pairs of two kept nodes are left out
    /// - `most_links`: links that fit into memory
    ///
    /// # Errors
    /// [`NetworkError::TooLarge`] when more links come up.
    pub(super) fn new(
        unknowns: usize,
        nodes: usize,
        pairs: &[(u32, u32)],
        most_links: usize,
    ) -> Result<Self, NetworkError> {
        let mut left = Left::new(unknowns, nodes, pairs);
        let mut order = Vec::with_capacity(unknowns);
        let mut rows: Vec<Vec<u32>> = Vec::with_capacity(unknowns);
        let mut links = 0;
        while let Some(node) = left.next() {
            let remaining = unknowns - order.len();
            let row = std::mem::take(&mut left.adjacent[node as usize]);
            let free = row.partition_point(|&other| (other as usize) < unknowns);
            // Below a few dozen nodes there is nothing to gain.
            if remaining > 32 && free as f64 >= NEARLY_ALL_JOINED * remaining as f64 {
                left.adjacent[node as usize] = row;
                left.join_all(&mut order, &mut rows, most_links - links)?;
                break;
            }
            links += row.len();
            if links > most_links {
                return Err(NetworkError::TooLarge { links: most_links });
            }
            left.eliminate(node, &row);
            order.push(node);
            rows.push(row);
        }
        Ok(Self::numbered(unknowns, nodes, &order, rows))
    }

    /// The rows with nodes numbered in the order in which they go.
    fn numbered(unknowns: usize, nodes: usize, order: &[u32], rows: Vec<Vec<u32>>) -> Self {
        let mut position: Vec<u32> = (0..nodes as u32).collect();
        for (place, &node) in order.iter().enumerate() {
            position[node as usize] = place as u32;
        }
        let mut offsets = Vec::with_capacity(unknowns + 1);
        offsets.push(0);
        let mut columns = Vec::with_capacity(rows.iter().map(Vec::len).sum());
        for row in rows {
            let from = columns.len();
            columns.extend(row.into_iter().map(|node| position[node as usize]));
            columns[from..].sort_unstable();
            offsets.push(columns.len());
        }
        let mut found = Self {
            unknowns,
            position,
            offsets,
            columns,
            work: 0,
        };
        found.work = found.count_work();
        found
    }

    /// Links of a node.
    pub(super) fn links(&self, node: usize) -> std::ops::Range<usize> {
        self.offsets[node]..self.offsets[node + 1]
    }

    /// The link between two nodes as given, and whether it begins at the second; `None` where both are kept.
    pub(super) fn link(&self, from: usize, to: usize) -> Option<(usize, bool)> {
        let (from, to) = (self.position[from], self.position[to]);
        let (first, last) = (from.min(to), from.max(to));
        if first as usize >= self.unknowns {
            return None;
        }
        let range = self.links(first as usize);
        let row = &self.columns[range.clone()];
        let place = row.partition_point(|&column| column < last);
        Some((range.start + place, first != from))
    }

    fn count_work(&self) -> u64 {
        let mut work = 0;
        for node in 0..self.unknowns {
            work += 1;
            for &other in &self.columns[self.links(node)] {
                work += 1;
                if (other as usize) < self.unknowns {
                    work += self.links(other as usize).len() as u64;
                }
            }
        }
        work
    }
}

/// The net that is left as nodes go.
struct Left {
    unknowns: usize,
    /// Neighbours that are left, sorted.
    adjacent: Vec<Vec<u32>>,
    is_gone: Vec<bool>,
    /// Nodes by their number of neighbours; one that has gained or lost some since waits elsewhere as well.
    waiting: Vec<Vec<u32>>,
    least: usize,
    /// The row at hand.
    merged: Vec<u32>,
}

impl Left {
    fn new(unknowns: usize, nodes: usize, pairs: &[(u32, u32)]) -> Self {
        let mut adjacent = vec![Vec::new(); nodes];
        for &(a, b) in pairs {
            for (row, other) in [(a, b), (b, a)] {
                if (row as usize) < unknowns {
                    adjacent[row as usize].push(other);
                }
            }
        }
        for row in &mut adjacent {
            row.sort_unstable();
            row.dedup();
        }
        let mut left = Self {
            unknowns,
            adjacent,
            is_gone: vec![false; unknowns],
            waiting: Vec::new(),
            least: 0,
            merged: Vec::new(),
        };
        for node in (0..unknowns).rev() {
            left.wait(node as u32);
        }
        left
    }

    fn wait(&mut self, node: u32) {
        let neighbours = self.adjacent[node as usize].len();
        if self.waiting.len() <= neighbours {
            self.waiting.resize(neighbours + 1, Vec::new());
        }
        self.waiting[neighbours].push(node);
        self.least = self.least.min(neighbours);
    }

    /// The node with the fewest neighbours.
    fn next(&mut self) -> Option<u32> {
        while let Some(list) = self.waiting.get_mut(self.least) {
            let Some(node) = list.pop() else {
                self.least += 1;
                continue;
            };
            let index = node as usize;
            if !self.is_gone[index] && self.adjacent[index].len() == self.least {
                return Some(node);
            }
        }
        None
    }

    /// Takes a node out and joins its neighbours, `row`, with each other.
    fn eliminate(&mut self, node: u32, row: &[u32]) {
        self.is_gone[node as usize] = true;
        let unknowns = self.unknowns;
        for &other in row.iter().filter(|&&other| (other as usize) < unknowns) {
            let own = std::mem::take(&mut self.adjacent[other as usize]);
            let mut merged = std::mem::take(&mut self.merged);
            merged.clear();
            let mut added = row.iter().copied().filter(|&a| a != other).peekable();
            for column in own.iter().copied().filter(|&column| column != node) {
                while let Some(before) = added.next_if(|&a| a < column) {
                    merged.push(before);
                }
                let _ = added.next_if_eq(&column);
                merged.push(column);
            }
            merged.extend(added);
            let mut own = own;
            own.clear();
            own.extend_from_slice(&merged);
            self.adjacent[other as usize] = own;
            self.merged = merged;
            self.wait(other);
        }
    }

    /// Takes all that are left as joined with each other and with every kept node that one of them touches.
    fn join_all(
        &self,
        order: &mut Vec<u32>,
        rows: &mut Vec<Vec<u32>>,
        most_links: usize,
    ) -> Result<(), NetworkError> {
        let rest: Vec<u32> = (0..self.unknowns)
            .filter(|&node| !self.is_gone[node])
            .map(|node| node as u32)
            .collect();
        let mut kept: Vec<u32> = rest
            .iter()
            .flat_map(|&node| self.adjacent[node as usize].iter().copied())
            .filter(|&other| other as usize >= self.unknowns)
            .collect();
        kept.sort_unstable();
        kept.dedup();
        let links = rest.len() * (rest.len().saturating_sub(1)) / 2 + rest.len() * kept.len();
        if links > most_links {
            return Err(NetworkError::TooLarge { links: most_links });
        }
        for (place, &node) in rest.iter().enumerate() {
            let later = rest.iter().skip(place + 1).copied();
            rows.push(later.chain(kept.iter().copied()).collect());
            order.push(node);
        }
        Ok(())
    }
}
