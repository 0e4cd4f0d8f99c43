//! Triangles of a cut cell for the lower bound.
//!
//! The region of a cut cell is a polygon whose vertices are lattice nodes in the fluid and points of the wall,
//! where the velocity is zero. Any division into triangles between its vertices gives an admissible velocity,
//! linear on each; the one with the least energy against its volume is found by dynamic programming, among
//! ladders between the nodes and the wall where that is smooth (linear in its vertices, and hardly ever worse) or
//! has many vertices, else among all. A division whose triangles all turn anticlockwise covers a simple polygon
//! exactly once (the map from the abstract triangles keeps orientation and is one to one on the boundary), so
//! checking the signs of the areas is all the proof it needs.

use crate::geometry::Point;

/// Vertices up to which every division is considered.
const ALL_DIVISIONS: usize = 14;
/// Vertices up to which that is as quick as a ladder.
const FEW: usize = 5;
/// Tangent of the angle by which a smooth wall turns at a vertex at most.
const SMOOTH: f64 = 0.3;
/// Area below which a triangle counts as flat, square cells: far above the rounding of coordinates.
const FLAT: f64 = 1e-13;

/// A vertex of a polygon.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Vertex {
    /// Position, cells.
    pub(super) at: Point,
    /// The lattice node, by its row-by-row number; `None` on the wall, where the velocity is zero.
    pub(super) node: Option<usize>,
    /// Value there.
    pub(super) value: f64,
}

/// A triangle on which the velocity is linear; its energy is that of the three values.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Triangle {
    /// Nodes of its corners.
    pub(super) nodes: [Option<usize>; 3],
    /// Gradients of the three corner functions.
    gradients: [Point; 3],
    area: f64,
}

impl Triangle {
    fn new(corners: [Vertex; 3]) -> Self {
        let twice = 2.0 * area(corners.map(|c| c.at));
        let gradient = |k: usize| {
            let (from, to) = (corners[(k + 1) % 3].at, corners[(k + 2) % 3].at);
            [(from[1] - to[1]) / twice, (to[0] - from[0]) / twice]
        };
        Self {
            nodes: corners.map(|c| c.node),
            gradients: [gradient(0), gradient(1), gradient(2)],
            area: 0.5 * twice,
        }
    }

    /// Derivative of the volume with respect to one value.
    pub(super) fn weight(&self) -> f64 {
        self.area / 3.0
    }

    /// Integral of the product of the gradients of two corner functions.
    pub(super) fn product(&self, k: usize, l: usize) -> f64 {
        let ([x, y], [u, v]) = (self.gradients[k], self.gradients[l]);
        self.area * (x * u + y * v)
    }
}

fn area([a, b, c]: [Point; 3]) -> f64 {
    0.5 * ((b[0] - a[0]) * (c[1] - a[1]) - (b[1] - a[1]) * (c[0] - a[0]))
}

/// Divides polygons one after the other; keeps its memory between them.
#[derive(Debug, Default)]
pub(super) struct Division {
    polygon: Vec<Vertex>,
    /// Vertices of each triangle.
    triples: Vec<[usize; 3]>,
    /// Least cost of each part, and the choice that leads to it.
    best: Vec<(f64, usize)>,
    open: Vec<(usize, usize)>,
}

impl Division {
    /// Hands on the triangles that cover the part of a polygon where the velocity is not zero.
    ///
    /// - `polygon`: simple, anticlockwise
    ///
    /// `false`, and no triangle, where no division into anticlockwise triangles was found.
    pub(super) fn divide(
        &mut self,
        polygon: impl Iterator<Item = Vertex>,
        mut hand_on: impl FnMut(&Triangle),
    ) -> bool {
        self.polygon.clear();
        self.polygon.extend(polygon);
        if self.polygon.iter().all(|v| v.node.is_none()) {
            return true;
        }
        let n = self.polygon.len();
        let is_node = |k: usize| self.polygon[k % n].node.is_some();
        if let Some(first) = (0..n).find(|&k| is_node(k) && !is_node(k + n - 1)) {
            self.polygon.rotate_left(first);
        }
        if !self.find() {
            self.polygon = without_pockets(&self.polygon);
            if !self.find() {
                return false;
            }
        }
        for triple in &self.triples {
            let corners = triple.map(|k| self.polygon[k]);
            if corners.iter().any(|c| c.node.is_some()) {
                hand_on(&Triangle::new(corners));
            }
        }
        true
    }

    fn find(&mut self) -> bool {
        self.triples.clear();
        let n = self.polygon.len();
        if n > ALL_DIVISIONS {
            return self.ladder();
        }
        let is_done = n > FEW && is_smooth(&self.polygon) && self.ladder();
        is_done || self.best_division()
    }

    /// The division of least cost of a small polygon.
    fn best_division(&mut self) -> bool {
        let (polygon, n) = (&self.polygon, self.polygon.len());
        if n < 3 {
            return false;
        }
        // Cost of the part between vertices i and j, and where its triangle on that chord has its third corner.
        self.best.clear();
        self.best.resize(n * n, (f64::INFINITY, 0));
        let best = &mut self.best;
        for i in 0..n - 1 {
            best[i * n + i + 1].0 = 0.0;
        }
        // From here on all vertices are on the wall.
        let last_node = polygon.iter().rposition(|v| v.node.is_some());
        let solid_from = last_node.map_or(0, |node| node + 1);
        for gap in 2..n {
            for i in 0..n - gap {
                let j = i + gap;
                let costs = Costs::new(&polygon[i], &polygon[j]);
                let mut least = (f64::INFINITY, 0);
                for (k, third) in polygon.iter().enumerate().take(j).skip(i + 1) {
                    let parts = best[i * n + k].0 + best[k * n + j].0;
                    if parts.is_infinite() {
                        continue;
                    }
                    let whole = parts + costs.of(third);
                    if whole < least.0 {
                        least = (whole, k);
                        if i >= solid_from {
                            // Divisions without a node cost nothing, or are not possible.
                            break;
                        }
                    }
                }
                best[i * n + j] = least;
            }
        }
        if !best[n - 1].0.is_finite() {
            return false;
        }
        self.open.clear();
        self.open.push((0, n - 1));
        while let Some((i, j)) = self.open.pop() {
            if j - i < 2 {
                continue;
            }
            let k = best[i * n + j].1;
            self.triples.push([i, k, j]);
            self.open.extend([(i, k), (k, j)]);
        }
        true
    }

    /// The best division of a polygon of one stretch of nodes and one of wall into triangles that each touch both, or
    /// cut off one node from the rest.
    ///
    /// The polygon begins with the first node of its stretch.
    fn ladder(&mut self) -> bool {
        let polygon = &self.polygon;
        let nodes = polygon.iter().take_while(|v| v.node.is_some()).count();
        let wall = polygon.len() - nodes;
        if polygon[nodes..].iter().any(|v| v.node.is_some()) || wall < 2 {
            return false;
        }
        // Rung (i, j) joins wall vertex i, counted backwards from the end, to node j.
        let wall_at = |i: usize| polygon.len() - 1 - i;
        self.best.clear();
        self.best.resize(wall * nodes, (f64::INFINITY, 0));
        let best = &mut self.best;
        best[0].0 = 0.0;
        for i in 0..wall {
            for j in 0..nodes {
                let own =
                    |[a, b, c]: [usize; 3]| Costs::new(&polygon[a], &polygon[c]).of(&polygon[b]);
                let along_wall = i.checked_sub(1).map_or(f64::INFINITY, |i0| {
                    best[i0 * nodes + j].0 + own([wall_at(i), wall_at(i0), j])
                });
                let along_nodes = j.checked_sub(1).map_or(f64::INFINITY, |j0| {
                    best[i * nodes + j0].0 + own([wall_at(i), j0, j])
                });
                let across_nodes = j.checked_sub(2).map_or(f64::INFINITY, |j0| {
                    best[i * nodes + j0].0 + own([wall_at(i), j0, j]) + own([j0, j0 + 1, j])
                });
                if (i, j) != (0, 0) {
                    best[i * nodes + j] = least([along_nodes, along_wall, across_nodes]);
                }
            }
        }
        let (mut i, mut j) = (wall - 1, nodes - 1);
        if !best[i * nodes + j].0.is_finite() {
            return false;
        }
        while (i, j) != (0, 0) {
            match best[i * nodes + j].1 {
                0 => {
                    self.triples.push([wall_at(i), j - 1, j]);
                    j -= 1;
                }
                1 => {
                    self.triples.push([wall_at(i), wall_at(i - 1), j]);
                    i -= 1;
                }
                _ => {
                    self.triples
                        .extend([[wall_at(i), j - 2, j], [j - 2, j - 1, j]]);
                    j -= 2;
                }
            }
        }
        true
    }
}

/// Whether the wall turns by small angles only: elsewhere triangles in its pockets are worth their search.
fn is_smooth(polygon: &[Vertex]) -> bool {
    let walls = polygon
        .windows(3)
        .filter(|three| three.iter().all(|v| v.node.is_none()));
    walls
        .map(|three| [three[0].at, three[1].at, three[2].at])
        .all(|[a, b, c]| {
            let (before, after) = ([b[0] - a[0], b[1] - a[1]], [c[0] - b[0], c[1] - b[1]]);
            let turn = before[0] * after[1] - before[1] * after[0];
            turn.abs() <= SMOOTH * (before[0] * after[0] + before[1] * after[1])
        })
}

/// The least of some costs, and which one it is.
fn least(costs: [f64; 3]) -> (f64, usize) {
    let [a, b, c] = costs;
    if b <= a && b <= c {
        (b, 1)
    } else if a <= c {
        (a, 0)
    } else {
        (c, 2)
    }
}

/// The polygon without the pockets of its wall: where three successive wall points turn left, the middle one
/// is cut off with a triangle on which the velocity is zero.
///
/// - `polygon`: begins with a node
fn without_pockets(polygon: &[Vertex]) -> Vec<Vertex> {
    let mut kept: Vec<Vertex> = Vec::with_capacity(polygon.len());
    for &vertex in polygon {
        while let [.., before, last] = kept[..] {
            let on_wall = [before, last, vertex].iter().all(|v| v.node.is_none());
            if !(on_wall && area([before.at, last.at, vertex.at]) >= 0.0) {
                break;
            }
            kept.pop();
        }
        kept.push(vertex);
    }
    kept
}

/// Energy against volume of the triangles on one edge of a polygon.
struct Costs<'a> {
    from: &'a Vertex,
    /// The other end against the first one.
    step: Point,
    rise: f64,
    has_node: bool,
}

impl<'a> Costs<'a> {
    fn new(from: &'a Vertex, to: &Vertex) -> Self {
        Self {
            from,
            step: [to.at[0] - from.at[0], to.at[1] - from.at[1]],
            rise: to.value - from.value,
            has_node: from.node.is_some() || to.node.is_some(),
        }
    }

    /// Cost of the triangle from the first end to a vertex to the other end; infinite where it is flat or turned
    /// over.
    fn of(&self, third: &Vertex) -> f64 {
        let [dx, dy] = self.step;
        let (x, y) = (third.at[0] - self.from.at[0], third.at[1] - self.from.at[1]);
        let twice = x * dy - y * dx;
        if !self.has_node && third.node.is_none() {
            return if 0.5 * twice > -FLAT {
                0.0
            } else {
                f64::INFINITY
            };
        }
        if 0.5 * twice <= FLAT {
            return f64::INFINITY;
        }
        let rise = third.value - self.from.value;
        // The gradient times twice the area.
        let gradient = [rise * dy - self.rise * y, self.rise * x - rise * dx];
        let sum = 3.0 * self.from.value + self.rise + rise;
        (gradient[0] * gradient[0] + gradient[1] * gradient[1]) / (2.0 * twice) - twice * sum / 3.0
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn triangulate(polygon: Vec<Vertex>) -> Option<Vec<Triangle>> {
        let mut triangles = Vec::new();
        let is_divided = Division::default().divide(polygon.into_iter(), |t| triangles.push(*t));
        is_divided.then_some(triangles)
    }

    impl Triangle {
        /// Integral of the squared gradient.
        fn energy(&self, values: [f64; 3]) -> f64 {
            let products = (0..9).map(|k| (k / 3, k % 3));
            products
                .map(|(k, l)| values[k] * values[l] * self.product(k, l))
                .sum()
        }
    }

    fn wall(at: Point) -> Vertex {
        Vertex {
            at,
            node: None,
            value: 0.0,
        }
    }

    fn node(at: Point, number: usize, value: f64) -> Vertex {
        Vertex {
            at,
            node: Some(number),
            value,
        }
    }

    #[test]
    fn a_half_square_under_a_slanted_wall_holds_the_linear_velocity_exactly() {
        // v = 0.6 - y + 0.1 x vanishes on the wall from (0, 0.6) to (1, 0.7).
        let polygon = vec![
            node([0.0, 0.0], 0, 0.6),
            node([1.0, 0.0], 1, 0.7),
            wall([1.0, 0.7]),
            wall([0.5, 0.65]),
            wall([0.0, 0.6]),
        ];
        let values = [0.6, 0.7];
        let triangles = triangulate(polygon).unwrap();
        let of = |t: &Triangle| t.nodes.map(|n| n.map_or(0.0, |n: usize| values[n]));
        let energy: f64 = triangles.iter().map(|t| t.energy(of(t))).sum();
        let covered: f64 = triangles.iter().map(|t| t.area).sum();
        assert!((covered - 0.65).abs() < 1e-14);
        assert!((energy - 1.01 * 0.65).abs() < 1e-14);
    }

    #[test]
    fn many_wall_points_towards_the_fluid_and_away_from_it() {
        for bend in [0.2, -0.2] {
            let arc = (0..=60).map(|k| {
                let x = 1.0 - f64::from(k) / 60.0;
                wall([x, 0.6 + 4.0 * bend * x * (1.0 - x)])
            });
            let polygon: Vec<Vertex> = [node([0.0, 0.0], 0, 0.6), node([1.0, 0.0], 1, 0.6)]
                .into_iter()
                .chain(arc)
                .collect();
            let triangles = triangulate(polygon).unwrap();
            let covered: f64 = triangles.iter().map(|t| t.area).sum();
            let exact = 0.6 + bend * 2.0 / 3.0 * (1.0 - 1.0 / 3600.0);
            assert!((covered - exact).abs() < 1e-12, "{bend}: {covered} {exact}");
            assert!(triangles.iter().all(|t| t.area > 0.0));
        }
    }

    #[test]
    fn a_ladder_is_nearly_as_good_as_the_best_division_along_a_round_wall() {
        // The wall passes from the east side to the north side, so that three nodes are left.
        let arc = (0..7).map(|k| {
            let t = f64::from(k) / 6.0 * std::f64::consts::FRAC_PI_2;
            wall([0.7 + 0.3 * t.cos(), 0.7 + 0.3 * t.sin()])
        });
        let nodes = [
            node([0.0, 0.0], 0, 0.05),
            node([1.0, 0.0], 1, 0.09),
            node([0.0, 1.0], 3, 0.09),
        ];
        let mut division = Division {
            polygon: [nodes[2], nodes[0], nodes[1]]
                .into_iter()
                .chain(arc)
                .collect(),
            ..Division::default()
        };
        let cost = |division: &Division| -> f64 {
            let triples = division.triples.iter();
            let each = triples.map(|t| t.map(|k| division.polygon[k]));
            each.map(|[a, b, c]| Costs::new(&a, &c).of(&b)).sum()
        };
        assert!(division.ladder());
        let of_ladder = cost(&division);
        assert_eq!(division.triples.len(), division.polygon.len() - 2);
        let three = |t: &[usize; 3]| t.iter().all(|&k| k < 3);
        assert!(division.triples.iter().any(three), "{:?}", division.triples);
        division.triples.clear();
        assert!(division.best_division());
        let least = cost(&division);
        assert!(
            least < 0.0 && of_ladder < 0.97 * least,
            "{of_ladder} {least}"
        );
    }

    #[test]
    fn a_polygon_that_turns_the_wrong_way_has_no_division() {
        let turned = vec![node([0.0, 0.0], 0, 1.0), wall([0.0, 1.0]), wall([1.0, 0.0])];
        assert!(triangulate(turned).is_none());
    }
}
