//! Fluid nodes of one grid of the hierarchy, in two colours, with the arms that the wall cuts.
//!
//! Only fluid nodes are stored. A row of fluid nodes without a wall between neighbours is a [`Run`].
//! Nodes are coloured by the parity of `i + j`; every neighbour of an even node is odd and the other way
//! round, and within a run the nodes of one colour and all four neighbours are contiguous in memory.
//! Nodes whose four arms are whole are listed as [`Segment`]s, the others one by one as [`WallNode`]s.
//!
//! A grid of stride `s` keeps every s-th line of the lattice, so its nodes are a subset of the finer
//! grid's and both see the same crossings: the wall never moves between grids. Arms end at the exact
//! crossing with the outline. A node closer to the wall than [`ON_WALL`] counts as wall.

use super::crossings::{LineCrossings, rounded_down};
use super::lattice::Lattice;
use super::runs::{Cut, collect_runs, in_order, nodes_at_vertices, nodes_on_wall, number, pins};

/// Distance in lattice units below which a node counts as lying on the wall.
pub(super) const ON_WALL: f64 = 1e-6;
/// Marks an arm that ends at a node taken out of the fluid, where no outline edge is known.
pub const NO_EDGE: u32 = u32::MAX;
/// Marks an arm that ends at the wall, so that it has no neighbour.
pub const NO_NODE: u32 = u32::MAX;
/// Index of the arm towards falling `i`.
pub const ARM_LEFT: usize = 0;
/// Index of the arm towards rising `i`.
pub const ARM_RIGHT: usize = 1;
/// Index of the arm towards falling `j`.
pub const ARM_DOWN: usize = 2;
/// Index of the arm towards rising `j`.
pub const ARM_UP: usize = 3;

/// Colour of a node: parity of `i + j`.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Colour {
    /// `i + j` even.
    Even = 0,
    /// `i + j` odd.
    Odd = 1,
}

impl Colour {
    /// The other colour.
    #[must_use]
    pub fn other(self) -> Self {
        match self {
            Self::Even => Self::Odd,
            Self::Odd => Self::Even,
        }
    }

    pub(super) fn of(i: u32, j: u32) -> Self {
        if (i + j).is_multiple_of(2) {
            Self::Even
        } else {
            Self::Odd
        }
    }
}

/// Fluid nodes next to each other in one row, with no wall between them.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Run {
    /// Column of the first node.
    pub first: u32,
    /// Number of nodes.
    pub len: u32,
    /// Row.
    pub row: u32,
    /// Storage index of the first node of each colour at or after `first`.
    pub base: [u32; 2],
    /// Storage index of the first node when all nodes are counted row by row.
    pub natural: u32,
}

impl Run {
    /// Colour and storage index of the node in column `i` of this run.
    pub fn node(&self, i: u32) -> (Colour, u32) {
        let colour = Colour::of(i, self.row);
        (colour, self.base[colour as usize] + (i - self.first) / 2)
    }

    /// One past the last column.
    pub fn end(&self) -> u32 {
        self.first + self.len
    }
}

/// Nodes of one colour in a row whose four arms are whole: `start + k` has the other-colour neighbours
/// `left + k`, `left + k + 1`, `down + k` and `up + k`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Segment {
    /// Storage index of the first node.
    pub start: u32,
    /// Number of nodes.
    pub len: u32,
    /// Other-colour index of the left neighbour of the first node.
    pub left: u32,
    /// Other-colour index of the lower neighbour of the first node.
    pub down: u32,
    /// Other-colour index of the upper neighbour of the first node.
    pub up: u32,
    /// Column of the first node; the next ones follow at distance two.
    pub i: u32,
    /// Row.
    pub j: u32,
}

/// A fluid node with at least one arm cut by the wall.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct WallNode {
    /// Storage index within its colour.
    pub node: u32,
    /// Other-colour index of the neighbour along each arm, [`NO_NODE`] where the wall cuts it.
    pub neighbour: [u32; 4],
    /// Own-colour index two steps along each arm, [`NO_NODE`] where the wall comes before.
    pub beyond: [u32; 4],
    /// Length of each arm in units of this grid's spacing; 1 where it is whole.
    pub arm: [f64; 4],
    /// Outline edge that ends each cut arm, [`NO_EDGE`] where none is known.
    pub edge: [u32; 4],
    /// Column.
    pub i: u32,
    /// Row.
    pub j: u32,
}

/// Where one row begins in the storage of each colour.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct RowStart {
    /// Storage index of its first node.
    pub node: [u32; 2],
    /// Index of its first segment.
    pub segment: [u32; 2],
    /// Index of its first wall node.
    pub wall: [u32; 2],
    /// Row-by-row index of its first node.
    pub natural: u32,
}

/// The fluid nodes of one grid.
#[derive(Debug, Clone)]
pub struct Mask {
    /// Lattice lines per line of this grid: 1 on the finest.
    pub stride: u32,
    /// Runs in storage order.
    pub runs: Vec<Run>,
    /// Index of the first run of each row, and the total at the end.
    pub row_start: Vec<u32>,
    /// Number of nodes of each colour.
    pub count: [usize; 2],
    /// Segments of each colour in storage order.
    pub segments: [Vec<Segment>; 2],
    /// Wall nodes of each colour in storage order.
    pub wall: [Vec<WallNode>; 2],
    /// Most even nodes in a row.
    pub longest_row: u32,
    /// Where each row begins, and the totals at the end.
    pub starts: Vec<RowStart>,
    /// Nodes turned into wall because an island would otherwise be invisible on this grid.
    pub pinned: Vec<(u32, u32)>,
}

impl Mask {
    /// The grid of a given stride.
    ///
    /// - `stride`: lattice lines per grid line, a power of two
    ///
    /// An island that no line of this grid crosses keeps one node as wall ([`Mask::pinned`]), so that no
    /// island is lost altogether.
    pub fn new(
        lattice: &Lattice,
        rows: &LineCrossings,
        columns: &LineCrossings,
        stride: u32,
    ) -> Self {
        let mut removed = nodes_on_wall(columns, stride);
        removed.extend(nodes_at_vertices(lattice, stride));
        let pinned = pins(lattice, rows, columns, stride);
        removed.extend(pinned.iter().map(|&(i, j)| (j, i, NO_EDGE)));
        removed.sort_unstable();
        removed.dedup_by_key(|r| (r.0, r.1));
        // A crossing of a row cuts one arm, of a column mostly two.
        let most_cuts = (rows.count() + 2 * columns.count()) / stride as usize + 16;
        let mut cuts = Vec::with_capacity(most_cuts);
        let (mut runs, row_start) = collect_runs(rows, stride, &removed, &mut cuts);
        let count = number(&mut runs);
        let mut mask = Self {
            stride,
            runs,
            row_start,
            count,
            segments: [Vec::new(), Vec::new()],
            wall: [Vec::new(), Vec::new()],
            longest_row: 0,
            starts: Vec::new(),
            pinned,
        };
        mask.cut_columns(columns, &mut cuts);
        mask.cut_uncovered(&mut cuts);
        mask.classify(&in_order(&cuts, mask.runs.len()));
        mask
    }

    /// Number of fluid nodes.
    pub fn nodes(&self) -> usize {
        self.count[0] + self.count[1]
    }

    /// Sorts the values of one row, given node by node, into the two colours.
    pub(crate) fn split_row(&self, row: usize, values: &[f64], targets: &mut [&mut [f64]; 2]) {
        let start = self.starts[row];
        for run in &self.runs[self.row_start[row] as usize..self.row_start[row + 1] as usize] {
            let from = (run.natural - start.natural) as usize;
            let source = &values[from..from + run.len as usize];
            for (step, column) in [run.first, run.first + 1].into_iter().enumerate() {
                if column >= run.end() {
                    continue;
                }
                let (colour, node) = run.node(column);
                let c = colour as usize;
                let target = &mut targets[c][(node - start.node[c]) as usize..];
                for (value, &s) in target.iter_mut().zip(source[step..].iter().step_by(2)) {
                    *value = s;
                }
            }
        }
    }

    /// Memory, bytes.
    pub fn bytes(&self) -> usize {
        let lists = [0, 1].map(|colour| {
            size_of_val(&self.segments[colour][..]) + size_of_val(&self.wall[colour][..])
        });
        lists.iter().sum::<usize>()
            + size_of_val(&self.runs[..])
            + size_of_val(&self.row_start[..])
            + size_of_val(&self.starts[..])
    }

    /// Number of rows of this grid.
    pub fn rows(&self) -> usize {
        self.row_start.len() - 1
    }

    /// Runs of one row.
    pub fn row(&self, j: u32) -> &[Run] {
        match self.row_start.get(j as usize..j as usize + 2) {
            Some(&[start, end]) => &self.runs[start as usize..end as usize],
            _ => &[],
        }
    }

    /// The run that holds node `(i, j)`.
    pub fn run_at(&self, i: u32, j: u32) -> Option<&Run> {
        let row = self.row(j);
        let after = row.partition_point(|run| run.first <= i);
        let run = row.get(after.checked_sub(1)?)?;
        (i < run.end()).then_some(run)
    }

    /// Colour and storage index of node `(i, j)`.
    pub fn node_at(&self, i: u32, j: u32) -> Option<(Colour, u32)> {
        self.run_at(i, j).map(|run| run.node(i))
    }

    /// Row-by-row index of node `(i, j)`.
    pub fn natural_at(&self, i: u32, j: u32) -> Option<u32> {
        self.run_at(i, j).map(|run| run.natural + i - run.first)
    }

    /// The wall node with a given storage index, `None` for a node with four whole arms.
    pub fn wall_node(&self, colour: Colour, node: u32) -> Option<&WallNode> {
        let wall = &self.wall[colour as usize];
        let index = wall.binary_search_by_key(&node, |w| w.node).ok()?;
        wall.get(index)
    }

    /// The same where its row is known, whose few wall nodes are quickly searched.
    pub(crate) fn wall_node_in_row(
        &self,
        colour: Colour,
        node: u32,
        row: u32,
    ) -> Option<&WallNode> {
        let c = colour as usize;
        let [at, next] = self.starts.get(row as usize..)?.first_chunk()?;
        let wall = self.wall[c].get(at.wall[c] as usize..next.wall[c] as usize)?;
        let index = wall.binary_search_by_key(&node, |w| w.node).ok()?;
        wall.get(index)
    }

    /// Cuts from the crossings of the lattice columns.
    fn cut_columns(&self, columns: &LineCrossings, cuts: &mut Vec<Cut>) {
        let scale = 1.0 / f64::from(self.stride);
        for line in (0..columns.lines()).step_by(self.stride as usize) {
            let i = line as u32 / self.stride;
            for crossing in columns.line(line) {
                let at = crossing.at * scale;
                let below = rounded_down(at);
                let mut push = |row: f64, direction: usize, arm: f64| {
                    if row < 0.0 {
                        return;
                    }
                    let j = row as u32;
                    let index = self.run_index(i, j);
                    if let Some(run) = index {
                        cuts.push(Cut {
                            run,
                            i,
                            direction: direction as u8,
                            arm,
                            edge: crossing.edge,
                        });
                    }
                };
                push(below, ARM_UP, at - below);
                push(below + 1.0, ARM_DOWN, below + 1.0 - at);
                // A crossing on a node takes that node out of the fluid; the arms of both its
                // neighbours end there.
                let nearest = rounded_down(at + 0.5);
                if (at - nearest).abs() < ON_WALL * scale {
                    push(nearest - 1.0, ARM_UP, 1.0);
                    push(nearest + 1.0, ARM_DOWN, 1.0);
                }
            }
        }
        // A crossing on a node's own row belongs to a node taken out of the fluid, or to rounding: such
        // an arm would have no length.
        cuts.retain(|cut| cut.arm > 0.0);
    }

    fn run_index(&self, i: u32, j: u32) -> Option<u32> {
        let start = *self.row_start.get(j as usize)?;
        let row = self.row(j);
        let after = row.partition_point(|run| run.first <= i);
        let position = after.checked_sub(1)?;
        (i < row[position].end()).then_some(start + position as u32)
    }

    /// Cuts of length one towards neighbours that are not fluid although no crossing was seen on the
    /// way: nodes on the wall, and rounding.
    fn cut_uncovered(&self, cuts: &mut Vec<Cut>) {
        for (index, run) in self.runs.iter().enumerate() {
            for (direction, row) in [
                (ARM_DOWN, run.row.checked_sub(1)),
                (ARM_UP, Some(run.row + 1)),
            ] {
                let mut i = run.first;
                let neighbours = row.map_or(&[][..], |j| self.row(j));
                let skip = neighbours.partition_point(|n| n.end() <= run.first);
                let mut push = |until: u32, i: &mut u32| {
                    while *i < until {
                        cuts.push(Cut {
                            run: index as u32,
                            i: *i,
                            direction: direction as u8,
                            arm: 1.0,
                            edge: NO_EDGE,
                        });
                        *i += 1;
                    }
                };
                for neighbour in &neighbours[skip..] {
                    if neighbour.first >= run.end() {
                        break;
                    }
                    push(neighbour.first, &mut i);
                    i = i.max(neighbour.end());
                }
                push(run.end(), &mut i);
            }
        }
    }

    /// Sorts nodes into segments and wall nodes, row by row.
    fn classify(&mut self, cuts: &[Cut]) {
        let mut next_cut = 0;
        let rows = self.rows();
        self.starts.reserve(rows + 1);
        for colour in 0..2 {
            self.segments[colour].reserve(2 * self.runs.len());
            self.wall[colour].reserve(cuts.len() / 2);
        }
        for row in 0..rows {
            let [first, end] = [self.row_start[row], self.row_start[row + 1]];
            self.open_row(first as usize);
            for index in first as usize..end as usize {
                next_cut = self.classify_run(index, cuts, next_cut);
            }
        }
        self.open_row(self.runs.len());
        let even = |pair: &[RowStart]| pair[1].node[0] - pair[0].node[0];
        self.longest_row = self.starts.windows(2).map(even).max().unwrap_or(0);
        for colour in [Colour::Even, Colour::Odd] {
            let mut wall = std::mem::take(&mut self.wall[colour as usize]);
            for node in &mut wall {
                node.beyond = self.two_steps(node, colour);
            }
            self.wall[colour as usize] = wall;
        }
    }

    /// Own-colour index two steps along each arm of a wall node of the given colour.
    fn two_steps(&self, node: &WallNode, colour: Colour) -> [u32; 4] {
        let (i, j) = (node.i, node.j);
        let ends = [
            (i.wrapping_sub(2), j),
            (i + 2, j),
            (i, j.wrapping_sub(2)),
            (i, j + 2),
        ];
        std::array::from_fn(|arm| {
            let next = node.neighbour[arm];
            if next == NO_NODE {
                return NO_NODE;
            }
            let row = [j, j, j.wrapping_sub(1), j + 1][arm];
            match self.wall_node_in_row(colour.other(), next, row) {
                Some(wall) => wall.neighbour[arm],
                None => self
                    .node_at(ends[arm].0, ends[arm].1)
                    .map_or(NO_NODE, |(_, index)| index),
            }
        })
    }

    /// Notes where the row begins whose first run has a given index.
    fn open_row(&mut self, run: usize) {
        let total = [self.count[0] as u32, self.count[1] as u32];
        let node = self.runs.get(run).map_or(total, |run| run.base);
        self.starts.push(RowStart {
            node,
            segment: [self.segments[0].len() as u32, self.segments[1].len() as u32],
            wall: [self.wall[0].len() as u32, self.wall[1].len() as u32],
            natural: node[0] + node[1],
        });
    }

    /// Sorts the nodes of one run; takes its cuts and returns the index of the next one.
    fn classify_run(&mut self, index: usize, cuts: &[Cut], from: usize) -> usize {
        let run = self.runs[index];
        let (mut i, mut next_cut) = (run.first, from);
        while next_cut < cuts.len() && cuts[next_cut].run as usize == index {
            let at = cuts[next_cut].i;
            let end = next_cut
                + cuts[next_cut..]
                    .iter()
                    .take_while(|c| c.run as usize == index && c.i == at)
                    .count();
            self.add_segments(run, i, at);
            self.add_wall_node(run, at, &cuts[next_cut..end]);
            i = at + 1;
            next_cut = end;
        }
        self.add_segments(run, i, run.end());
        next_cut
    }

    /// Segments for the nodes `from..to` of a run, all with whole arms.
    fn add_segments(&mut self, run: Run, from: u32, to: u32) {
        let mut i = from;
        while i < to {
            let (Some(below), Some(above)) = (
                run.row
                    .checked_sub(1)
                    .and_then(|j| self.run_at(i, j))
                    .copied(),
                self.run_at(i, run.row + 1).copied(),
            ) else {
                // Every node without a neighbour below or above has a cut there.
                return;
            };
            let end = to.min(below.end()).min(above.end());
            for start in [i, i + 1] {
                if start >= end {
                    continue;
                }
                let (colour, node) = run.node(start);
                self.segments[colour as usize].push(Segment {
                    start: node,
                    len: (end - start).div_ceil(2),
                    left: run.node(start - 1).1,
                    down: below.node(start).1,
                    up: above.node(start).1,
                    i: start,
                    j: run.row,
                });
            }
            i = end;
        }
    }

    fn add_wall_node(&mut self, run: Run, i: u32, cuts: &[Cut]) {
        let (colour, node) = run.node(i);
        let mut arm = [1.0; 4];
        let mut edge = [NO_EDGE; 4];
        let mut is_cut = [false; 4];
        for cut in cuts {
            let direction = cut.direction as usize;
            if !is_cut[direction] {
                is_cut[direction] = true;
                arm[direction] = cut.arm.min(1.0);
                edge[direction] = cut.edge;
            }
        }
        let vertical = |direction: usize, row: Option<u32>| {
            if is_cut[direction] {
                return NO_NODE;
            }
            row.and_then(|j| self.node_at(i, j))
                .map_or(NO_NODE, |(_, n)| n)
        };
        let neighbour = [
            if is_cut[ARM_LEFT] {
                NO_NODE
            } else {
                run.node(i - 1).1
            },
            if is_cut[ARM_RIGHT] {
                NO_NODE
            } else {
                run.node(i + 1).1
            },
            vertical(ARM_DOWN, run.row.checked_sub(1)),
            vertical(ARM_UP, Some(run.row + 1)),
        ];
        self.wall[colour as usize].push(WallNode {
            node,
            neighbour,
            beyond: [NO_NODE; 4],
            arm,
            edge,
            i,
            j: run.row,
        });
    }
}
