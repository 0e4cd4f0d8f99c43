//! A sweep over all wall edges: which of them are in contact, and how the loops lie in each other.
//!
//! Method of Shamos and Hoey: a vertical line passes from left to right and keeps the edges it meets
//! in order; two edges in contact become neighbours on the line before it reaches their contact. When
//! neighbours are in contact one of them is set aside and the sweep goes on, so that in the end the
//! edges not set aside have no contact with each other. The cost is O(n log n) whatever the shape, also
//! for long slanted edges whose boxes all overlap. All decisions are exact.
//! Source: Shamos and Hoey (1976), Geometric intersection problems, 17th Annual Symposium on
//! Foundations of Computer Science, 208-215 (cited from memory).

use super::outline::Point;
use super::wall_edges::{WallEdges, order, orientation};
use rayon::slice::ParallelSliceMut;
use std::cmp::Ordering;
use std::collections::BTreeSet;
use std::ops::Bound::{Excluded, Unbounded};

/// What the sweep found.
#[derive(Debug)]
pub(crate) struct SweepOutcome {
    /// Edges set aside: every contact involves at least one of them.
    pub(crate) set_aside: Vec<usize>,
    /// The smallest loop around each loop; meaningful only when nothing was set aside.
    pub(crate) parents: Vec<Option<usize>>,
    /// Pairs of edges that were tested for contact.
    pub(crate) pairs_tested: usize,
}

/// An edge on the sweep line, ordered from bottom to top.
#[derive(Debug, Clone, Copy)]
struct OnLine {
    left: Point,
    right: Point,
    edge: usize,
}

impl OnLine {
    /// Lowest and highest point.
    fn heights(&self) -> [f64; 2] {
        let (a, b) = (self.left[1], self.right[1]);
        if a < b { [a, b] } else { [b, a] }
    }
}

struct Sweep<'a> {
    edges: &'a WallEdges,
    line: BTreeSet<OnLine>,
    aside: Vec<bool>,
    /// Per loop once its leftmost vertex is reached: whether it turns anticlockwise.
    anticlockwise: Vec<Option<bool>>,
    outcome: SweepOutcome,
}

/// Sweeps over all edges; the edges in `aside` take no part.
pub(crate) fn sweep(edges: &WallEdges, aside: &[usize]) -> SweepOutcome {
    let mut vertices: Vec<(Point, u32)> = edges.start.iter().copied().zip(0..).collect();
    vertices.par_sort_unstable_by(|a, b| order(a.0, b.0).then(a.1.cmp(&b.1)));
    let mut state = Sweep {
        edges,
        line: BTreeSet::new(),
        aside: vec![false; edges.len()],
        anticlockwise: vec![None; edges.ranges.len()],
        outcome: SweepOutcome {
            set_aside: Vec::new(),
            parents: vec![None; edges.ranges.len()],
            pairs_tested: 0,
        },
    };
    for &edge in aside {
        state.set_aside(edge);
    }
    for pair in vertices.windows(2) {
        if order(pair[0].0, pair[1].0) == Ordering::Equal {
            let vertex = pair[1].1 as usize;
            state.set_aside(vertex);
            state.set_aside(edges.previous(vertex));
        }
    }
    for &(_, vertex) in &vertices {
        state.pass(vertex as usize);
    }
    state.outcome
}

impl Sweep<'_> {
    /// Takes the sweep line over one vertex: edges that end there leave, edges that start there enter.
    fn pass(&mut self, vertex: usize) {
        let both = [self.edges.previous(vertex), vertex].map(|edge| self.on_line(edge));
        let here = self.edges.start[vertex];
        let ends_here = |e: &OnLine| order(e.right, here) == Ordering::Equal;
        if !both.iter().any(|e| self.aside[e.edge]) {
            let [first, second] = both;
            match [ends_here(&first), ends_here(&second)] {
                [true, false] => return self.go_on(&first, second),
                [false, true] => return self.go_on(&second, first),
                _ => {}
            }
        }
        for edge in both.iter().filter(|e| ends_here(e)) {
            if !self.aside[edge.edge] {
                self.leave(edge);
            }
        }
        let loop_index = self.edges.loop_of[vertex] as usize;
        if self.anticlockwise[loop_index].is_none() {
            self.place_loop(loop_index, vertex, &both[1]);
        }
        for edge in both.iter().filter(|e| !ends_here(e)) {
            if !self.aside[edge.edge] {
                self.enter(*edge);
            }
        }
    }

    fn on_line(&self, edge: usize) -> OnLine {
        let [a, b] = self.edges.ends(edge);
        let (left, right) = if order(b, a) == Ordering::Less {
            (b, a)
        } else {
            (a, b)
        };
        OnLine { left, right, edge }
    }

    fn below(&self, edge: &OnLine) -> Option<OnLine> {
        self.line
            .range((Unbounded, Excluded(edge)))
            .next_back()
            .copied()
    }

    fn above(&self, edge: &OnLine) -> Option<OnLine> {
        self.line.range((Excluded(edge), Unbounded)).next().copied()
    }

    fn touch(&mut self, first: &OnLine, second: &OnLine) -> bool {
        self.outcome.pairs_tested += 1;
        self.edges.touch(first.edge, second.edge)
    }

    fn set_aside(&mut self, edge: usize) {
        if !std::mem::replace(&mut self.aside[edge], true) {
            self.outcome.set_aside.push(edge);
        }
    }

    fn enter(&mut self, edge: OnLine) {
        for neighbour in [self.below(&edge), self.above(&edge)].into_iter().flatten() {
            if self.touch(&neighbour, &edge) {
                self.set_aside(edge.edge);
                return;
            }
        }
        self.line.insert(edge);
    }

    fn leave(&mut self, edge: &OnLine) {
        self.line.remove(edge);
        if let Some(below) = self.below(edge) {
            self.close(&below, edge);
        }
    }

    /// Tests the edges on both sides of where one was taken out.
    fn close(&mut self, below: &OnLine, taken_out: &OnLine) {
        while let Some(above) = self.above(taken_out) {
            if !self.touch(below, &above) {
                return;
            }
            self.line.remove(&above);
            self.set_aside(above.edge);
        }
    }

    /// One edge ends where another begins, which takes its place between the same neighbours.
    fn go_on(&mut self, ending: &OnLine, beginning: OnLine) {
        self.line.remove(ending);
        let neighbours = [self.below(ending), self.above(ending)];
        for neighbour in neighbours.into_iter().flatten() {
            if self.touch(&neighbour, &beginning) {
                self.set_aside(beginning.edge);
                if let [Some(below), Some(_)] = neighbours {
                    self.close(&below, ending);
                }
                return;
            }
        }
        self.line.insert(beginning);
    }

    /// At the leftmost vertex of a loop: its direction of travel, and the loop it lies in, from the
    /// wall just below.
    fn place_loop(&mut self, loop_index: usize, vertex: usize, outgoing: &OnLine) {
        let before = self.edges.start[self.edges.previous(vertex)];
        let [here, after] = self.edges.ends(vertex);
        let turn = orientation(before, here, after);
        self.anticlockwise[loop_index] = Some(turn == Ordering::Greater);
        let Some(below) = self.below(outgoing) else {
            return;
        };
        let other = self.edges.loop_of[below.edge] as usize;
        let [start, end] = self.edges.ends(below.edge);
        let rightwards = order(start, end) == Ordering::Less;
        self.outcome.parents[loop_index] = if self.anticlockwise[other] == Some(rightwards) {
            Some(other)
        } else {
            self.outcome.parents[other]
        };
    }
}

impl Ord for OnLine {
    /// Bottom to top where the sweep line meets both edges; decided at the later of the left ends.
    fn cmp(&self, other: &Self) -> Ordering {
        if self.edge == other.edge {
            return Ordering::Equal;
        }
        // The sweep line meets both, so heights that do not overlap decide.
        let ([low, high], [other_low, other_high]) = (self.heights(), other.heights());
        if high < other_low {
            return Ordering::Less;
        }
        if other_high < low {
            return Ordering::Greater;
        }
        let side = match order(self.left, other.left) {
            Ordering::Equal => Ordering::Equal,
            Ordering::Less => orientation(self.left, self.right, other.left).reverse(),
            Ordering::Greater => orientation(other.left, other.right, self.left),
        };
        side.then_with(|| orientation(self.left, self.right, other.right).reverse())
            .then_with(|| self.edge.cmp(&other.edge))
    }
}

impl PartialOrd for OnLine {
    fn partial_cmp(&self, other: &Self) -> Option<Ordering> {
        Some(self.cmp(other))
    }
}

impl PartialEq for OnLine {
    fn eq(&self, other: &Self) -> bool {
        self.edge == other.edge
    }
}

impl Eq for OnLine {}

#[cfg(test)]
mod tests {
    use super::super::outline::Loop;
    use super::*;
    use proptest::prelude::*;

    fn edges_of(loops: &[Vec<Point>]) -> WallEdges {
        let mut edges = WallEdges::default();
        for points in loops {
            edges.push_loop(&Loop::new(points.clone()), 1.0);
        }
        edges
    }

    fn spikes(edges: &WallEdges) -> Vec<usize> {
        (0..edges.len()).filter(|&i| edges.is_spike(i)).collect()
    }

    /// Small whole coordinates make touching, overlapping and shared vertices frequent.
    fn coarse_loops() -> impl Strategy<Value = Vec<Vec<Point>>> {
        let point = (0..9_i32, 0..9_i32).prop_map(|(x, y)| [f64::from(x), f64::from(y)]);
        proptest::collection::vec(proptest::collection::vec(point, 3..8), 1..4)
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(2000))]
        #[test]
        fn every_contact_involves_an_edge_set_aside(loops in coarse_loops()) {
            let edges = edges_of(&loops);
            prop_assume!(edges.ranges.iter().all(|r| r.len() >= 3));
            let outcome = sweep(&edges, &spikes(&edges));
            let mut any = !spikes(&edges).is_empty();
            for e in 0..edges.len() {
                for f in e + 1..edges.len() {
                    if edges.touch(e, f) {
                        any = true;
                        let aside = &outcome.set_aside;
                        prop_assert!(aside.contains(&e) || aside.contains(&f), "{e} {f}");
                    }
                }
            }
            prop_assert_eq!(any, !outcome.set_aside.is_empty());
        }
    }

    #[test]
    fn a_slanted_comb_with_long_edges_costs_a_few_tests_an_edge() {
        let teeth = 2000;
        let mut points: Vec<Point> = vec![[0.0, 0.0]];
        for i in 0..teeth {
            let x = f64::from(i);
            points.extend([
                [x, 1000.0],
                [x + 0.4, 1000.0],
                [x + 0.4, 1.0],
                [x + 1.0, 1.0],
            ]);
        }
        points.push([f64::from(teeth), 0.0]);
        for p in &mut points {
            *p = [0.8 * p[0] - 0.6 * p[1], 0.6 * p[0] + 0.8 * p[1]];
        }
        let edges = edges_of(&[points]);
        let outcome = sweep(&edges, &[]);
        assert!(outcome.set_aside.is_empty());
        assert!(outcome.pairs_tested <= 3 * edges.len());
    }

    #[test]
    fn nesting_is_read_from_the_wall_below() {
        let square = |x: f64, y: f64, r: f64| {
            vec![
                [x - r, y - r],
                [x + r, y - r],
                [x + r, y + r],
                [x - r, y + r],
            ]
        };
        let mut turned = square(0.0, 0.0, 5.0);
        turned.reverse();
        let loops = [
            square(2.0, 0.0, 1.0),
            square(0.0, 0.0, 10.0),
            turned,
            square(-2.0, 0.0, 1.0),
            square(0.0, 8.0, 1.0),
            square(30.0, 0.0, 1.0),
        ];
        let outcome = sweep(&edges_of(&loops), &[]);
        assert!(outcome.set_aside.is_empty());
        let expected = [Some(2), None, Some(1), Some(2), Some(1), None];
        assert_eq!(outcome.parents, expected);
    }
}
