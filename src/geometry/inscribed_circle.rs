//! The largest circle that fits into a lumen, islands excluded.
//!
//! Method: quadtree branch and bound on the clearance (distance to the nearest wall, inside). For a
//! square cell the clearance has an upper bound from a few wall pieces: the distance to a wall point or
//! to a nearly straight stretch of wall is below a linear function over the cell plus a small rest, and
//! the largest value of the lowest of these functions is a small linear programme. Where it peaks the
//! clearance is sampled, which adds the next wall piece and finds better circles (cutting planes, Kelley
//! 1960, cited from memory). Thus the ridge between two long walls needs only cells of about the gap.
//!
//! Metres. Accuracy: 1e-6 relative, unless the search meets [`CELL_LIMIT`] first; the circle always
//! carries its own upper bound. Meant for a valid outline; for others the circle means nothing.

use super::outline::{Lumen, Point};
use super::segment_tree::{Bounds, NearestWall, SegmentTree};
use super::wall_edges::{WallEdges, orientation};
use std::cmp::Ordering;
use std::collections::BinaryHeap;

/// Relative gap between radius and upper bound at which the search ends.
pub const RADIUS_TOLERANCE: f64 = 1e-6;
/// Most cells that are examined.
pub const CELL_LIMIT: usize = 20_000;
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
/// Costs O(n log n) for `n` vertices plus at most [`CELL_LIMIT`] cells of a few nearest-wall queries.
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

/// A linear function over a cell: value at its centre and slope.
#[derive(Debug, Clone, Copy)]
struct Piece {
    value: f64,
    slope: Point,
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
        let tree = SegmentTree::new(&edges.segments());
        let Bounds { low, high } = tree.bounds()?;
        let half = 0.5 * (high[0] - low[0]).max(high[1] - low[1]);
        let centre = [0.5 * (low[0] + high[0]), 0.5 * (low[1] + high[1])];
        let bound = half;
        (half.is_finite() && half > 0.0).then_some(Self {
            edges,
            tree,
            root: Cell {
                centre,
                half,
                bound,
            },
            best: None,
        })
    }

    /// The circle and the number of cells examined.
    fn run(mut self) -> (Option<Circle>, usize) {
        let mut cells = 1;
        let mut heap: BinaryHeap<Cell> = self.examine(self.root).into_iter().collect();
        while let Some(cell) = heap.peek().copied() {
            if cell.bound <= self.target() || cells >= CELL_LIMIT {
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

    /// Clearances up to this are as good as the best one.
    fn target(&self) -> f64 {
        self.best.map_or(0.0, |(_, r)| r * (1.0 + RADIUS_TOLERANCE))
    }

    /// The cell with its upper bound; `None` when it holds nothing better than the best so far.
    fn examine(&mut self, cell: Cell) -> Option<Cell> {
        let reach = cell.half * std::f64::consts::SQRT_2;
        let enough = self.target() - reach;
        let near = self.tree.nearest_or_within(cell.centre, enough)?;
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
            let near = self.tree.nearest(at)?;
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
        let is_inside = self.is_inside(p, near);
        if is_inside && self.best.is_none_or(|(_, r)| near.distance > r) {
            self.best = Some((p, near.distance));
        }
        is_inside
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

/// The largest value of the lowest of the pieces over the cell, and where: a linear programme in three
/// unknowns, solved by trying every corner of the feasible body.
fn highest(pieces: &[Piece], half: f64) -> (f64, Point) {
    let lowest = |p: Point| {
        let values = pieces
            .iter()
            .map(|f| f.value + f.slope[0] * p[0] + f.slope[1] * p[1]);
        values.fold(f64::INFINITY, f64::min)
    };
    let mut best = (f64::NEG_INFINITY, [0.0; 2]);
    let mut try_point = |p: Point| {
        if p[0].abs() <= half && p[1].abs() <= half {
            let value = lowest(p);
            if value > best.0 {
                best = (value, p);
            }
        }
    };
    for (x, y) in [(-half, -half), (half, -half), (-half, half), (half, half)] {
        try_point([x, y]);
    }
    for (i, f) in pieces.iter().enumerate() {
        for (j, g) in pieces.iter().enumerate().skip(i + 1) {
            // On the line v + a x + b y = 0 both are equal.
            let line = difference(f, g);
            for side in [-half, half] {
                try_point([side, -(line.value + line.slope[0] * side) / line.slope[1]]);
                try_point([-(line.value + line.slope[1] * side) / line.slope[0], side]);
            }
            for k in &pieces[j + 1..] {
                let second = difference(f, k);
                let ([a, b], [c, d]) = (line.slope, second.slope);
                let determinant = a * d - b * c;
                try_point([
                    (b * second.value - d * line.value) / determinant,
                    (c * line.value - a * second.value) / determinant,
                ]);
            }
        }
    }
    best
}

fn difference(f: &Piece, g: &Piece) -> Piece {
    Piece {
        value: f.value - g.value,
        slope: [f.slope[0] - g.slope[0], f.slope[1] - g.slope[1]],
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
mod tests {
    use super::super::outline::{Loop, Outline};
    use super::*;
    use proptest::prelude::*;
    use std::f64::consts::{PI, TAU};

    fn lumen(outline: Outline) -> Lumen {
        outline.lumens.into_iter().next().unwrap()
    }

    fn rectangle(width: f64, height: f64) -> Outline {
        Outline::single(vec![
            [0.0, 0.0],
            [width, 0.0],
            [width, height],
            [0.0, height],
        ])
    }

    fn circle_points(radius: f64, centre: Point, n: usize) -> Vec<Point> {
        (0..n)
            .map(|i| {
                let angle = TAU * i as f64 / n as f64;
                [
                    centre[0] + radius * angle.cos(),
                    centre[1] + radius * angle.sin(),
                ]
            })
            .collect()
    }

    /// Checks the radius and returns the number of cells.
    #[track_caller]
    fn assert_radius(lumen: &Lumen, radius: f64) -> usize {
        let (circle, cells) = Search::new(lumen).unwrap().run();
        let circle = circle.unwrap();
        let error = circle.radius / radius - 1.0;
        assert!(
            error.abs() < 1.1e-6,
            "{circle:?}, expected {radius}, {cells} cells"
        );
        assert!(circle.radius_bound >= radius * (1.0 - 1e-12));
        assert!(
            circle.radius_bound <= radius * (1.0 + 1.1e-6),
            "{circle:?} {cells} cells"
        );
        cells
    }

    #[test]
    fn long_rectangles_in_any_direction_need_few_cells() {
        for angle in [0.0, 0.1, 0.5, PI / 4.0, 1.3] {
            let slot = lumen(rectangle(1e-3, 1e-6).rotated(angle, [3e-4, 1e-4]));
            let cells = assert_radius(&slot, 0.5e-6);
            assert!(cells < CELL_LIMIT, "{cells} cells at {angle}");
        }
    }

    #[test]
    fn a_triangle_gives_its_incircle() {
        let triangle = Outline::single(vec![[0.0, 0.0], [4.0, 0.0], [0.0, 3.0]]);
        assert_radius(&lumen(triangle.rotated(0.3, [0.0; 2])), 1.0);
    }

    #[test]
    fn an_eccentric_annulus_gives_half_its_widest_gap_and_a_concentric_one_half_its_gap() {
        // Inscribed polygons: the gap lies between the vertex circles and the edge circles.
        for (offset, gap) in [(0.2, 0.7), (0.0, 0.5)] {
            let n = 4000;
            let ring = Lumen {
                outer: Loop::new(circle_points(1.0, [0.0; 2], n)),
                islands: vec![Loop::new(circle_points(0.5, [-offset, 0.0], n))],
            };
            let (circle, _) = Search::new(&ring).unwrap().run();
            let circle = circle.unwrap();
            let slack = 1.0 - (PI / n as f64).cos() + 1e-6;
            assert!((circle.radius - 0.5 * gap).abs() < slack, "{circle:?}");
            assert!(
                circle.radius_bound < circle.radius * (1.0 + 1e-5),
                "{circle:?}"
            );
        }
    }

    #[test]
    fn a_wall_of_many_vertices_costs_no_more_cells() {
        let n = 100_000;
        let points = (0..n).map(|i| {
            let angle = TAU * f64::from(i) / f64::from(n);
            let r = 1e-4 * (1.0 + 0.01 * (40.0 * angle).cos());
            [r * angle.cos(), r * angle.sin()]
        });
        let wavy = lumen(Outline::single(points.collect()));
        assert!(assert_radius(&wavy, 0.99e-4) < 500);
    }

    #[test]
    fn a_lumen_without_inside_has_no_circle() {
        for points in [
            vec![],
            vec![[1.0, 1.0]],
            vec![[0.0, 0.0], [1.0, 0.0]],
            vec![[f64::NAN; 2]; 4],
        ] {
            assert_eq!(
                largest_inscribed_circle(&lumen(Outline::single(points))),
                None
            );
        }
    }

    proptest! {
        #[test]
        fn no_sampled_point_is_farther_from_the_wall(
            radii in proptest::collection::vec(0.2..1.0_f64, 3..40),
            samples in proptest::collection::vec((0.0..1.0_f64, 0.0..TAU), 50),
        ) {
            let n = radii.len() as f64;
            let star: Vec<Point> = radii.iter().enumerate().map(|(i, r)| {
                let angle = TAU * i as f64 / n;
                [r * angle.cos(), r * angle.sin()]
            }).collect();
            let star = lumen(Outline::single(star));
            let circle = largest_inscribed_circle(&star).unwrap();
            prop_assert!(circle.radius_bound <= circle.radius * (1.0 + 2.0 * RADIUS_TOLERANCE));
            let search = Search::new(&star).unwrap();
            let at_centre = search.tree.nearest(circle.centre).unwrap();
            prop_assert!((at_centre.distance - circle.radius).abs() < 1e-12);
            prop_assert!(is_inside_by_counting(&star, circle.centre));
            for (r, angle) in samples {
                let p = [r * angle.cos(), r * angle.sin()];
                let near = search.tree.nearest(p).unwrap();
                let is_inside = is_inside_by_counting(&star, p);
                prop_assert_eq!(is_inside, search.is_inside(p, &near));
                prop_assert!(!is_inside || near.distance <= circle.radius_bound * (1.0 + 1e-12));
            }
        }
    }

    fn is_inside_by_counting(lumen: &Lumen, p: Point) -> bool {
        let crossed = lumen.outer.edges().filter(|(a, b)| {
            (a[1] > p[1]) != (b[1] > p[1])
                && p[0] < a[0] + (p[1] - a[1]) * (b[0] - a[0]) / (b[1] - a[1])
        });
        crossed.count() % 2 == 1
    }
}
