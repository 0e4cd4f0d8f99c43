//! The largest circle that fits into a lumen, islands excluded.
//!
//! Method: quadtree branch and bound on the clearance (distance to the nearest wall, inside). For a
//! square cell the clearance has an upper bound from a few wall pieces: the distance to a wall point or
//! to a nearly straight stretch of wall is below a linear function over the cell plus a small rest, and
//! the largest value of the lowest of these functions is a small linear programme. Where it peaks the
//! clearance is sampled, which adds the next wall piece and finds better circles (cutting planes, Kelley
//! 1960, cited from memory). Thus the ridge between two long walls needs only cells of about the gap.
//!
//! The first circles are those that touch the wall at sampled edges and grow until they touch it again
//! (shrinking balls, Ma, Bae and Choi 2012, cited from memory).
//!
//! Metres. Accuracy: 1e-6 relative, proven by the bound that every circle carries. The search ends
//! earlier, with a wider bound, at 200,000 cells or at 2 million boxes and edges looked at plus 8 for
//! each edge; this happens where a ridge is long and nearly level, as in a concentric annulus, a slot
//! longer than 10,000 gaps or a rough wall. Meant for a valid outline; for others the circle means nothing.

use super::linear_pieces::{Piece, highest};
use super::outline::{Lumen, Point, distance};
use super::segment_tree::{Bounds, NearestWall, SegmentTree};
use super::wall_edges::{WallEdges, orientation};
use std::cmp::Ordering;
use std::collections::BinaryHeap;
use std::ops::ControlFlow;

/// Relative gap between radius and upper bound at which the search ends.
pub const RADIUS_TOLERANCE: f64 = 1e-6;
/// Most cells that are examined.
const CELL_LIMIT: usize = 200_000;
/// Most boxes and edges that are looked at, whatever the outline, and more for each edge.
const WORK_LIMIT: usize = 2_000_000;
const WORK_LIMIT_PER_EDGE: usize = 8;
/// Edges at which first circles touch the wall.
const FIRST_CIRCLES: usize = 512;
/// Most steps of shrinking a circle.
const STEPS: usize = 30;
/// Smallest step uphill, in radii; below it the cells do the rest.
const SMALLEST_STEP: f64 = 1e-4;
/// Most wall pieces used to bound the clearance over one cell.
const PIECES: usize = 4;
/// Most vertices followed in each direction along a nearly straight stretch of wall.
const STRETCH: usize = 32;

/// A circle inside a lumen.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Circle {
    /// Its centre, m.
    pub centre: Point,
    /// Its radius, m.
    pub radius: f64,
    /// No circle in the lumen is larger than this, m, up to rounding; at least `radius`.
    pub radius_bound: f64,
}

/// The largest circle that fits into the lumen; `None` when the lumen encloses nothing.
///
/// Costs O(n log n) for `n` vertices plus a search of bounded work.
///
/// # Examples
/// ```
/// use etchwise::geometry::{Outline, largest_inscribed_circle};
/// let slot = Outline::single(vec![[0.0, 0.0], [9.0, 0.0], [9.0, 2.0], [0.0, 2.0]]);
/// let circle = largest_inscribed_circle(&slot.lumens[0]).unwrap();
/// assert!((circle.radius - 1.0).abs() < 1e-6);
/// ```
pub fn largest_inscribed_circle(lumen: &Lumen) -> Option<Circle> {
    Search::new(lumen)?.run().0
}

/// A square cell.
#[derive(Debug, Clone, Copy)]
struct Cell {
    centre: Point,
    half: f64,
    bound: f64,
}

struct Search {
    edges: WallEdges,
    tree: SegmentTree,
    root: Cell,
    best: Option<(Point, f64)>,
    work: usize,
    work_limit: usize,
}

impl Search {
    fn new(lumen: &Lumen) -> Option<Self> {
        let mut edges = WallEdges::default();
        let islands = lumen.islands.iter().map(|island| (island, -1.0));
        for (wall, sign) in std::iter::once((&lumen.outer, 1.0)).chain(islands) {
            // The fluid has to lie left of every edge.
            if wall.signed_area() * sign < 0.0 {
                edges.push_loop(&wall.clone().reversed(), 1.0);
            } else {
                edges.push_loop(wall, 1.0);
            }
        }
        if lumen.outer.signed_area().abs() <= 0.0 {
            return None;
        }
        let tree = SegmentTree::from_segments(edges.segments());
        let Bounds { low, high } = tree.bounds()?;
        let half = 0.5 * (high[0] - low[0]).max(high[1] - low[1]);
        let centre = [0.5 * (low[0] + high[0]), 0.5 * (low[1] + high[1])];
        let bound = half;
        let work_limit = WORK_LIMIT + WORK_LIMIT_PER_EDGE * edges.len();
        (half.is_finite() && half > 0.0).then_some(Self {
            edges,
            tree,
            root: Cell {
                centre,
                half,
                bound,
            },
            best: None,
            work: 0,
            work_limit,
        })
    }

    /// The circle and the number of cells examined.
    fn run(mut self) -> (Option<Circle>, usize) {
        self.first_circles();
        self.climb();
        let mut cells = 1;
        let mut heap: BinaryHeap<Cell> = self.examine(self.root).into_iter().collect();
        while let Some(cell) = heap.peek().copied() {
            if cell.bound <= self.target() || cells >= CELL_LIMIT || self.work >= self.work_limit {
                break;
            }
            heap.pop();
            let half = 0.5 * cell.half;
            for (x, y) in [(-half, -half), (half, -half), (-half, half), (half, half)] {
                let centre = [cell.centre[0] + x, cell.centre[1] + y];
                heap.extend(self.examine(Cell {
                    centre,
                    half,
                    bound: cell.bound,
                }));
                cells += 1;
            }
        }
        let target = self.target();
        let circle = self.best.map(|(centre, radius)| Circle {
            centre,
            radius,
            radius_bound: heap.peek().map_or(target, |cell| cell.bound.max(target)),
        });
        (circle, cells)
    }

    /// At the longest edges and at some spread over all walls: the circle that touches there and
    /// somewhere else.
    fn first_circles(&mut self) {
        let count = self.edges.len();
        let mut chosen: Vec<usize> = (0..count).collect();
        if count > FIRST_CIRCLES {
            let length = |edge: usize| {
                let [a, b] = self.edges.ends(edge);
                distance(a, b)
            };
            let lengths: Vec<f64> = (0..count).map(length).collect();
            let longest_first = |e: &usize, f: &usize| lengths[*f].total_cmp(&lengths[*e]);
            chosen.select_nth_unstable_by(FIRST_CIRCLES / 8, longest_first);
            chosen.truncate(FIRST_CIRCLES / 8);
            // Multiples of the golden ratio meet no pattern of the wall in step.
            chosen.extend((0..FIRST_CIRCLES - chosen.len()).map(|sample| {
                let share = (sample as f64 * 0.618_033_988_749_895).fract();
                ((share * count as f64) as usize).min(count - 1)
            }));
        }
        for edge in chosen {
            if self.work > self.work_limit / 4 {
                return;
            }
            let [a, b] = self.edges.ends(edge);
            let length = (b[0] - a[0]).hypot(b[1] - a[1]);
            let normal = [(a[1] - b[1]) / length, (b[0] - a[0]) / length];
            let foot = [0.5 * (a[0] + b[0]), 0.5 * (a[1] + b[1])];
            self.shrink(foot, normal, 2.0 * self.root.half);
        }
    }

    /// Shrinks a circle that touches the wall at `foot` until no wall lies inside it.
    fn shrink(&mut self, foot: Point, normal: Point, start: f64) {
        let mut radius = start;
        for _ in 0..STEPS {
            if radius <= self.target() || self.work > self.work_limit / 2 {
                return;
            }
            let centre = [foot[0] + radius * normal[0], foot[1] + radius * normal[1]];
            let Some(near) = self.nearest(centre) else {
                return;
            };
            self.sample(centre, &near);
            let (x, y) = (near.at[0] - foot[0], near.at[1] - foot[1]);
            let smaller = 0.5 * (x * x + y * y) / (x * normal[0] + y * normal[1]);
            let is_smaller = smaller > 0.0 && smaller < radius * (1.0 - 1e-9);
            if near.distance >= radius * (1.0 - 1e-9) || !is_smaller {
                return;
            }
            radius = smaller;
        }
    }

    /// Moves the best circle uphill: tries circles through points around its centre, at half the distance
    /// whenever none is larger.
    fn climb(&mut self) {
        let mut share = 0.5;
        while share > SMALLEST_STEP && self.work < self.work_limit / 2 {
            let Some((centre, radius)) = self.best else {
                return;
            };
            for eighth in 0..8 {
                let (sine, cosine) = (std::f64::consts::FRAC_PI_4 * f64::from(eighth)).sin_cos();
                let step = share * radius;
                let at = [centre[0] + step * cosine, centre[1] + step * sine];
                if let Some(near) = self.nearest(at)
                    && near.distance > 0.0
                    && self.sample(at, &near)
                {
                    let away = |k: usize| (at[k] - near.at[k]) / near.distance;
                    self.shrink(near.at, [away(0), away(1)], 2.0 * radius);
                }
            }
            let is_larger = self
                .best
                .is_some_and(|(_, r)| r > radius * (1.0 + RADIUS_TOLERANCE));
            share = if is_larger {
                (2.0 * share).min(0.5)
            } else {
                0.5 * share
            };
        }
    }

    fn nearest(&mut self, p: Point) -> Option<NearestWall> {
        self.tree.nearest_or_within(p, -1.0, &mut self.work)
    }

    /// Clearances up to this are as good as the best one.
    fn target(&self) -> f64 {
        self.best.map_or(0.0, |(_, r)| r * (1.0 + RADIUS_TOLERANCE))
    }

    /// The cell with its upper bound; `None` when it holds nothing better than the best so far.
    fn examine(&mut self, cell: Cell) -> Option<Cell> {
        let reach = cell.half * std::f64::consts::SQRT_2;
        let enough = self.target() - reach;
        let near = self
            .tree
            .nearest_or_within(cell.centre, enough, &mut self.work)?;
        if near.distance <= enough {
            return None;
        }
        let is_inside = self.sample(cell.centre, &near);
        let signed = if is_inside {
            near.distance
        } else {
            -near.distance
        };
        let mut bound = cell.bound.min(signed + reach);
        if bound <= self.target() {
            return None;
        }
        let mut pieces = Vec::with_capacity(PIECES);
        pieces.extend(self.piece(&cell, &near));
        while is_inside && !pieces.is_empty() {
            let (peak, offset) = highest(&pieces, cell.half);
            bound = bound.min(peak);
            if bound <= self.target() {
                return None;
            }
            let at = [cell.centre[0] + offset[0], cell.centre[1] + offset[1]];
            let near = self.nearest(at)?;
            self.sample(at, &near);
            if bound <= self.target() {
                return None;
            }
            // A wall as far as the bound lowers it no more: the cell has to be divided.
            if pieces.len() == PIECES || near.distance >= peak {
                break;
            }
            let Some(piece) = self.piece(&cell, &near) else {
                break;
            };
            pieces.push(piece);
        }
        Some(Cell { bound, ..cell })
    }

    /// Keeps the circle about `p` when it is the largest so far; whether `p` is inside.
    fn sample(&mut self, p: Point, near: &NearestWall) -> bool {
        let root = &self.root;
        let is_in_box = (0..2).all(|k| (p[k] - root.centre[k]).abs() <= root.half);
        let is_inside = is_in_box && self.is_inside(p, near);
        if is_inside && self.best.is_none_or(|(_, r)| near.distance > r) {
            // Where two walls run into a point, the nearest of them is a matter of rounding, so that a
            // circle counts only if a ray says the same.
            if !self.is_inside_by_ray(p) {
                return false;
            }
            self.best = Some((p, near.distance));
        }
        is_inside
    }

    /// Whether a ray to the right meets the wall an odd number of times; exact.
    fn is_inside_by_ray(&self, p: Point) -> bool {
        let ray = Bounds {
            low: p,
            high: [self.root.centre[0] + 2.0 * self.root.half, p[1]],
        };
        let mut inside = false;
        let _ = self.tree.visit_box(&ray, &mut |edge| {
            let [a, b] = self.edges.ends(edge);
            if (a[1] > p[1]) != (b[1] > p[1]) {
                let upwards = b[1] > a[1];
                let left = orientation(a, b, p) == Ordering::Greater;
                inside ^= left == upwards;
            }
            ControlFlow::Continue(())
        });
        inside
    }

    /// Whether a point lies in the fluid, from the wall nearest to it.
    fn is_inside(&self, p: Point, near: &NearestWall) -> bool {
        let [a, b] = self.edges.ends(near.edge);
        let (before, corner, after) = if near.along <= 0.0 {
            (self.edges.start[self.edges.previous(near.edge)], a, b)
        } else if near.along >= 1.0 {
            (a, b, self.edges.ends(self.edges.next(near.edge))[1])
        } else {
            return orientation(a, b, p) == Ordering::Greater;
        };
        // Nearest to a corner: only a re-entrant one is nearest from inside.
        match orientation(before, corner, after) {
            Ordering::Less => true,
            Ordering::Greater => false,
            Ordering::Equal => orientation(before, corner, p) == Ordering::Greater,
        }
    }

    /// A linear function that is nowhere in the cell below the distance to the wall near `near`.
    fn piece(&self, cell: &Cell, near: &NearestWall) -> Option<Piece> {
        let reach = cell.half * std::f64::consts::SQRT_2;
        let (x, y) = (cell.centre[0] - near.at[0], cell.centre[1] - near.at[1]);
        let distance = x.hypot(y);
        // sqrt((d + s)^2 + q^2) <= d + s + q^2 / (2 (d + s)) with s and q at most the reach.
        let from_point = (distance > reach).then(|| Piece {
            value: distance + 0.5 * reach * reach / (distance - reach),
            slope: [x / distance, y / distance],
        });
        let from_stretch = self.stretch_piece(cell, near.edge);
        match (from_point, from_stretch) {
            (Some(point), Some((stretch, rest))) => {
                let is_tighter = rest < point.value - distance;
                Some(if is_tighter { stretch } else { point })
            }
            (point, stretch) => point.or(stretch.map(|(piece, _)| piece)),
        }
    }

    /// The distance to the line of an edge, plus how far the wall recedes behind that line over the
    /// length that the cell sees; `None` when the wall leaves before, or crosses the cell.
    fn stretch_piece(&self, cell: &Cell, edge: usize) -> Option<(Piece, f64)> {
        let [a, b] = self.edges.ends(edge);
        let length = (b[0] - a[0]).hypot(b[1] - a[1]);
        let along = [(b[0] - a[0]) / length, (b[1] - a[1]) / length];
        let normal = [-along[1], along[0]];
        let to_line = |p: Point| {
            let (x, y) = (p[0] - a[0], p[1] - a[1]);
            (x * along[0] + y * along[1], x * normal[0] + y * normal[1])
        };
        let (middle, height) = to_line(cell.centre);
        let width = cell.half * (along[0].abs() + along[1].abs());
        if height < width {
            return None;
        }
        // A wall that bends towards the cell, but not into it, is only nearer than the line.
        let loss = |deviation: f64| {
            if deviation > height - width {
                f64::INFINITY
            } else {
                -deviation
            }
        };
        let (mut low, mut high, mut rest) = (0.0_f64, length, 0.0_f64);
        let mut forward = self.edges.next(edge);
        for _ in 0..STRETCH {
            if high >= middle + width {
                break;
            }
            forward = self.edges.next(forward);
            let (t, deviation) = to_line(self.edges.start[forward]);
            high = high.max(t);
            rest = rest.max(loss(deviation));
        }
        let mut backward = edge;
        for _ in 0..STRETCH {
            if low <= middle - width {
                break;
            }
            backward = self.edges.previous(backward);
            let (t, deviation) = to_line(self.edges.start[backward]);
            low = low.min(t);
            rest = rest.max(loss(deviation));
        }
        (low <= middle - width && high >= middle + width && rest.is_finite()).then_some((
            Piece {
                value: height + rest,
                slope: normal,
            },
            rest,
        ))
    }
}

impl Ord for Cell {
    fn cmp(&self, other: &Self) -> Ordering {
        self.bound.total_cmp(&other.bound)
    }
}

impl PartialOrd for Cell {
    fn partial_cmp(&self, other: &Self) -> Option<Ordering> {
        Some(self.cmp(other))
    }
}

impl PartialEq for Cell {
    fn eq(&self, other: &Self) -> bool {
        self.cmp(other) == Ordering::Equal
    }
}

impl Eq for Cell {}

#[cfg(test)]
mod tests;
