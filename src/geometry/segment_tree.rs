//! A packed tree of bounding boxes over wall edges: the nearest wall, and the edges in a box.
//!
//! A leaf holds up to eight edges that follow each other along a wall. The leaves are put in the order of
//! their centres along a Hilbert curve and grouped by eight, level by level; the boxes of all levels lie
//! in one flat list without pointers. Building costs O(n log n).
//! Source of the packing: Kamel and Faloutsos (1993), On packing R-trees, CIKM 93 (cited from memory).

use super::outline::{Outline, Point};
use super::wall_edges::orientation;
use std::cmp::Ordering;
use std::ops::ControlFlow;

/// Children of a node and edges of a leaf.
const FAN: usize = 8;
/// Bits of a Hilbert coordinate.
const HILBERT_BITS: u32 = 16;

/// Lower left and upper right corner.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Bounds {
    /// Smallest `x` and `y`.
    pub low: Point,
    /// Largest `x` and `y`.
    pub high: Point,
}

/// The wall point nearest to some place.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct NearestWall {
    /// Distance to it, m.
    pub distance: f64,
    /// The wall point, m.
    pub at: Point,
    /// Index of its edge in the list the tree was built from.
    pub edge: usize,
    /// Where on the edge: 0 at its start, 1 at its end, never outside.
    pub along: f64,
}

/// A tree over edges that answers nearest-wall and box queries.
#[derive(Debug, Clone)]
pub struct SegmentTree {
    segments: Vec<[Point; 2]>,
    /// First edge and number of edges of each leaf.
    leaves: Vec<(u32, u8)>,
    boxes: Vec<Bounds>,
    /// Start of each level in `boxes`, leaves first, and the end of the list.
    levels: Vec<usize>,
}

impl Bounds {
    /// Contains nothing; the start of a union.
    const EMPTY: Self = Self {
        low: [f64::INFINITY; 2],
        high: [f64::NEG_INFINITY; 2],
    };

    /// The box of two points.
    pub fn of(a: Point, b: Point) -> Self {
        Self {
            low: [a[0].min(b[0]), a[1].min(b[1])],
            high: [a[0].max(b[0]), a[1].max(b[1])],
        }
    }

    pub(crate) fn union(self, other: Self) -> Self {
        Self {
            low: [self.low[0].min(other.low[0]), self.low[1].min(other.low[1])],
            high: [
                self.high[0].max(other.high[0]),
                self.high[1].max(other.high[1]),
            ],
        }
    }

    /// Whether the two closed boxes have a point in common.
    pub(crate) fn meets(&self, other: &Self) -> bool {
        self.low[0] <= other.high[0]
            && other.low[0] <= self.high[0]
            && self.low[1] <= other.high[1]
            && other.low[1] <= self.high[1]
    }

    /// Square of the distance of a point from the box, 0 inside.
    pub(crate) fn distance_squared(&self, p: Point) -> f64 {
        let dx = (self.low[0] - p[0]).max(p[0] - self.high[0]).max(0.0);
        let dy = (self.low[1] - p[1]).max(p[1] - self.high[1]).max(0.0);
        dx * dx + dy * dy
    }
}

/// The best wall point so far, with squared distances.
struct Best {
    squared: f64,
    /// The search stops at a wall point at most this far.
    enough: f64,
    edge: usize,
    at: Point,
    along: f64,
    /// Boxes and edges looked at.
    work: usize,
}

impl SegmentTree {
    /// A tree over the given edges, metres.
    pub fn new(segments: &[[Point; 2]]) -> Self {
        Self::from_segments(segments.to_vec())
    }

    /// The same without a copy.
    pub(crate) fn from_segments(segments: Vec<[Point; 2]>) -> Self {
        let (mut leaves, mut leaf_boxes) = (Vec::new(), Vec::new());
        for (index, &[a, b]) in segments.iter().enumerate() {
            let bounds = Bounds::of(a, b);
            let follows =
                index > 0 && segments[index - 1][1].partial_cmp(&a) == Some(Ordering::Equal);
            match (leaves.last_mut(), leaf_boxes.last_mut()) {
                (Some((_, count)), Some(whole)) if follows && usize::from(*count) < FAN => {
                    *count += 1;
                    *whole = bounds.union(*whole);
                }
                _ => {
                    leaves.push((index as u32, 1_u8));
                    leaf_boxes.push(bounds);
                }
            }
        }
        let sequence = hilbert_order(&leaf_boxes);
        let (boxes, levels) = pack(sequence.iter().map(|&i| leaf_boxes[i]).collect());
        Self {
            segments,
            leaves: sequence.iter().map(|&i| leaves[i]).collect(),
            boxes,
            levels,
        }
    }

    /// A tree over all edges of an outline, in the order of its loops and their vertices.
    pub fn of_outline(outline: &Outline) -> Self {
        let segments: Vec<[Point; 2]> = outline
            .loops()
            .flat_map(|wall| wall.edges().map(|(a, b)| [a, b]))
            .collect();
        Self::from_segments(segments)
    }

    /// Number of edges.
    pub fn len(&self) -> usize {
        self.segments.len()
    }

    /// The box of all edges; `None` without edges.
    pub fn bounds(&self) -> Option<Bounds> {
        self.boxes.last().copied()
    }

    /// Whether there are no edges.
    pub fn is_empty(&self) -> bool {
        self.segments.is_empty()
    }

    /// The wall point nearest to `p`; `None` without edges or when `p` is not finite.
    ///
    /// # Examples
    /// ```
    /// use etchwise::geometry::{Outline, SegmentTree};
    /// let square = Outline::single(vec![[0.0, 0.0], [4.0, 0.0], [4.0, 4.0], [0.0, 4.0]]);
    /// let nearest = SegmentTree::of_outline(&square).nearest([1.0, 2.0]).unwrap();
    /// assert_eq!(nearest.at, [0.0, 2.0]);
    /// assert_eq!(nearest.distance, 1.0);
    /// ```
    pub fn nearest(&self, p: Point) -> Option<NearestWall> {
        self.nearest_or_within(p, -1.0, &mut 0)
    }

    /// The nearest wall point, or the first one met that is at most `enough` away; adds the number of
    /// boxes and edges looked at to `work`.
    pub(crate) fn nearest_or_within(
        &self,
        p: Point,
        enough: f64,
        work: &mut usize,
    ) -> Option<NearestWall> {
        let mut best = Best {
            squared: f64::INFINITY,
            enough: if enough > 0.0 { enough * enough } else { -1.0 },
            edge: usize::MAX,
            at: p,
            along: 0.0,
            work: 0,
        };
        if !self.is_empty() {
            self.descend(self.levels.len() - 2, 0, p, &mut best);
        }
        *work += best.work;
        (best.edge != usize::MAX).then(|| NearestWall {
            distance: (p[0] - best.at[0]).hypot(p[1] - best.at[1]),
            at: best.at,
            edge: best.edge,
            along: best.along,
        })
    }

    /// Calls `visit` with every edge whose box meets the closed box, until it breaks.
    pub fn visit_box<F>(&self, bounds: &Bounds, visit: &mut F) -> ControlFlow<()>
    where
        F: FnMut(usize) -> ControlFlow<()>,
    {
        self.visit_where(&|other| other.meets(bounds), visit)
    }

    /// Calls `visit` with every edge whose box is `wanted`, until it breaks; a box that is not wanted
    /// holds none that is.
    pub(crate) fn visit_where<W, F>(&self, wanted: &W, visit: &mut F) -> ControlFlow<()>
    where
        W: Fn(&Bounds) -> bool,
        F: FnMut(usize) -> ControlFlow<()>,
    {
        if self.is_empty() {
            return ControlFlow::Continue(());
        }
        self.visit_node(self.levels.len() - 2, 0, wanted, visit)
    }

    /// Whether a point lies inside the closed loops that the edges make up, by even-odd counting along a ray
    /// to the right, and how many edges were looked at; `None` on the wall. Exact.
    pub(crate) fn is_inside(&self, p: Point) -> (Option<bool>, usize) {
        let ray = Bounds {
            low: p,
            high: [f64::INFINITY, p[1]],
        };
        let (mut is_odd, mut visited) = (false, 0);
        let flow = self.visit_box(&ray, &mut |edge| {
            visited += 1;
            let [a, b] = self.segments[edge];
            let side = orientation(a, b, p);
            if side == Ordering::Equal && a[0].min(b[0]) <= p[0] {
                return ControlFlow::Break(());
            }
            let upwards = b[1] > p[1];
            if (a[1] > p[1]) != upwards {
                is_odd ^= (side == Ordering::Greater) == upwards;
            }
            ControlFlow::Continue(())
        });
        (flow.is_continue().then_some(is_odd), visited)
    }

    fn visit_node<W, F>(
        &self,
        level: usize,
        node: usize,
        wanted: &W,
        visit: &mut F,
    ) -> ControlFlow<()>
    where
        W: Fn(&Bounds) -> bool,
        F: FnMut(usize) -> ControlFlow<()>,
    {
        if !wanted(&self.boxes[self.levels[level] + node]) {
            return ControlFlow::Continue(());
        }
        for child in self.children(level, node) {
            if level > 0 {
                self.visit_node(level - 1, child, wanted, visit)?;
            } else {
                let [a, b] = self.segments[child];
                if wanted(&Bounds::of(a, b)) {
                    visit(child)?;
                }
            }
        }
        ControlFlow::Continue(())
    }

    /// Children of a node: nodes of the level below, or edges below a leaf.
    fn children(&self, level: usize, node: usize) -> std::ops::Range<usize> {
        if level == 0 {
            let (first, count) = self.leaves[node];
            return first as usize..first as usize + usize::from(count);
        }
        let below = self.levels[level] - self.levels[level - 1];
        node * FAN..(node * FAN + FAN).min(below)
    }

    fn descend(&self, level: usize, node: usize, p: Point, best: &mut Best) {
        best.work += FAN;
        if level == 0 {
            for edge in self.children(0, node) {
                let (at, along) = closest_on(self.segments[edge], p);
                let squared = (at[0] - p[0]).powi(2) + (at[1] - p[1]).powi(2);
                if squared < best.squared {
                    (best.squared, best.edge) = (squared, edge);
                    (best.at, best.along) = (at, along);
                }
            }
            return;
        }
        let mut nodes = [(f64::INFINITY, 0_usize); FAN];
        let mut count = 0;
        for child in self.children(level, node) {
            let squared = self.boxes[self.levels[level - 1] + child].distance_squared(p);
            if squared < best.squared {
                let mut slot = count;
                while slot > 0 && nodes[slot - 1].0 > squared {
                    nodes[slot] = nodes[slot - 1];
                    slot -= 1;
                }
                nodes[slot] = (squared, child);
                count += 1;
            }
        }
        for &(squared, child) in &nodes[..count] {
            if squared >= best.squared || best.squared <= best.enough {
                return;
            }
            self.descend(level - 1, child, p, best);
        }
    }
}

/// The order of boxes along the Hilbert curve through their centres.
fn hilbert_order(boxes: &[Bounds]) -> Vec<usize> {
    let whole = boxes.iter().fold(Bounds::EMPTY, |b, &c| b.union(c));
    let side = (whole.high[0] - whole.low[0]).max(whole.high[1] - whole.low[1]);
    let to_cell = f64::from((1_u32 << HILBERT_BITS) - 1) / side.max(f64::MIN_POSITIVE);
    let key = |(index, b): (usize, &Bounds)| {
        let cell = |k: usize| ((0.5 * (b.low[k] + b.high[k]) - whole.low[k]) * to_cell) as u32;
        (hilbert_index(cell(0), cell(1)), index)
    };
    let mut keys: Vec<(u32, usize)> = boxes.iter().enumerate().map(key).collect();
    keys.sort_unstable();
    keys.into_iter().map(|(_, index)| index).collect()
}

/// Boxes of all levels, leaves first, and where each level starts.
fn pack(mut boxes: Vec<Bounds>) -> (Vec<Bounds>, Vec<usize>) {
    let mut levels = vec![0, boxes.len()];
    while let [.., from, to] = levels[..]
        && to - from > 1
    {
        let parents: Vec<Bounds> = boxes[from..to]
            .chunks(FAN)
            .map(|group| group.iter().fold(Bounds::EMPTY, |b, &c| b.union(c)))
            .collect();
        boxes.extend(parents);
        levels.push(boxes.len());
    }
    (boxes, levels)
}

/// The point of a segment nearest to `p`, and where on the segment it is.
fn closest_on([a, b]: [Point; 2], p: Point) -> (Point, f64) {
    let (dx, dy) = (b[0] - a[0], b[1] - a[1]);
    let along = ((p[0] - a[0]) * dx + (p[1] - a[1]) * dy) / (dx * dx + dy * dy);
    if along >= 1.0 {
        (b, 1.0)
    } else if along > 0.0 {
        ([a[0] + along * dx, a[1] + along * dy], along)
    } else {
        (a, 0.0)
    }
}

/// Position of a cell along the Hilbert curve of `2^16` by `2^16` cells.
fn hilbert_index(x: u32, y: u32) -> u32 {
    let last = (1 << HILBERT_BITS) - 1;
    let (mut x, mut y) = (x.min(last), y.min(last));
    let mut index = 0;
    let mut side = 1 << (HILBERT_BITS - 1);
    while side > 0 {
        let (right, up) = (u32::from(x & side > 0), u32::from(y & side > 0));
        index = index << 2 | ((3 * right) ^ up);
        if up == 0 {
            if right == 1 {
                (x, y) = (last - x, last - y);
            }
            (x, y) = (y, x);
        }
        side >>= 1;
    }
    index
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn segments() -> impl Strategy<Value = Vec<[Point; 2]>> {
        let number = || -1.0..1.0_f64;
        proptest::collection::vec(
            (number(), number(), number(), number(), 0.0..1.0_f64)
                .prop_map(|(x, y, u, v, s)| [[x, y], [x + s * u, y + s * v]]),
            1..200,
        )
    }

    proptest! {
        #[test]
        fn nearest_agrees_with_the_full_scan(list in segments(), x in -2.0..2.0_f64, y in -2.0..2.0_f64) {
            let found = SegmentTree::new(&list).nearest([x, y]).unwrap();
            let distance = |s: &[Point; 2]| {
                let (at, _) = closest_on(*s, [x, y]);
                (at[0] - x).hypot(at[1] - y)
            };
            let smallest = list.iter().map(distance).fold(f64::INFINITY, f64::min);
            prop_assert!((found.distance - smallest).abs() <= 1e-15);
            prop_assert!((distance(&list[found.edge]) - smallest).abs() <= 1e-15);
        }

        #[test]
        fn box_queries_agree_with_the_full_scan(list in segments(), x in -1.0..1.0_f64, y in -1.0..1.0_f64, w in 0.0..1.0_f64) {
            let bounds = Bounds::of([x, y], [x + w, y + 0.5 * w]);
            let mut found = Vec::new();
            let flow = SegmentTree::new(&list).visit_box(&bounds, &mut |edge| {
                found.push(edge);
                ControlFlow::Continue(())
            });
            prop_assert!(flow.is_continue());
            found.sort_unstable();
            let expected: Vec<usize> = (0..list.len())
                .filter(|&i| Bounds::of(list[i][0], list[i][1]).meets(&bounds))
                .collect();
            prop_assert_eq!(found, expected);
        }
    }

    #[test]
    fn neighbours_on_the_curve_are_neighbours_in_the_plane() {
        let step = 1 << (HILBERT_BITS - 4);
        let mut cells: Vec<(u32, u32, u32)> = (0..16)
            .flat_map(|x| (0..16).map(move |y| (x, y)))
            .map(|(x, y)| (hilbert_index(x * step, y * step), x, y))
            .collect();
        cells.sort_unstable();
        for pair in cells.windows(2) {
            assert_eq!(
                pair[0].1.abs_diff(pair[1].1) + pair[0].2.abs_diff(pair[1].2),
                1
            );
        }
    }

    #[test]
    fn an_empty_tree_has_no_nearest_wall() {
        let tree = SegmentTree::new(&[]);
        assert!(tree.is_empty() && tree.nearest([0.0, 0.0]).is_none());
        let bounds = Bounds::of([0.0, 0.0], [1.0, 1.0]);
        let flow = tree.visit_box(&bounds, &mut |_| ControlFlow::Break(()));
        assert!(flow.is_continue());
    }
}
