//! Which loops are lumens and which are islands.
//!
//! By depth: a loop inside an even number of others bounds fluid, inside an odd number it is an island of
//! the smallest loop around it. Where a `lumen` label is given, the largest loop of a label is the outer
//! wall and the others are its islands. Loops that cross or touch are sorted by their first vertex;
//! finding such faults is the job of the outline's own check, not of this module.
//!
//! Edges are sorted into strips, once level and once upright, and a ray along the emptier strip from each
//! loop's first vertex meets only the edges of that strip, so that many loops stay near linear.

use std::collections::HashMap;

use robust::{Coord, orient2d};

use crate::geometry::{Loop, Lumen, Outline, Point};

/// Most strips used.
const MOST_STRIPS: usize = 4096;
/// Strips an edge lies in at most, on average; bounds the memory.
const ENTRIES_PER_EDGE: usize = 8;

/// A loop as read, with its lumen label where the file gives one.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct RawLoop {
    /// Vertices, metres.
    pub(crate) points: Vec<Point>,
    /// Label of its lumen.
    pub(crate) lumen: Option<String>,
}

/// Loops sorted into lumens and islands, each with its direction and first vertex as in the file.
#[derive(Debug)]
pub(crate) struct Sorted {
    pub(crate) outline: Outline,
    /// Number in the file, from 0, of each loop of the outline, in the order of [`Outline::loops`].
    pub(crate) loop_numbers: Vec<usize>,
}

/// A loop with its number in the file.
type Numbered = (usize, Loop);
/// Outer wall and islands of one lumen.
type Group = (Numbered, Vec<Numbered>);

/// Sorts loops into lumens and islands.
pub(crate) fn assemble(raw: Vec<RawLoop>) -> Sorted {
    let (mut labelled, mut plain) = (Vec::new(), Vec::new());
    for (number, one) in raw.into_iter().enumerate() {
        let wall = (number, Loop::new(one.points));
        match one.lumen {
            Some(label) => labelled.push((label, wall)),
            None => plain.push(wall),
        }
    }
    let mut groups = by_label(labelled);
    groups.extend(by_depth(plain));
    let mut loop_numbers = Vec::new();
    let lumens = groups
        .into_iter()
        .map(|((number, outer), islands)| {
            loop_numbers.push(number);
            let (numbers, islands): (Vec<usize>, Vec<Loop>) = islands.into_iter().unzip();
            loop_numbers.extend(numbers);
            Lumen { outer, islands }
        })
        .collect();
    Sorted {
        outline: Outline { lumens },
        loop_numbers,
    }
}

/// Loops of one label form a lumen; the one with the largest area is its outer wall.
fn by_label(labelled: Vec<(String, Numbered)>) -> Vec<Group> {
    let mut order: HashMap<String, usize> = HashMap::new();
    let mut groups: Vec<Vec<Numbered>> = Vec::new();
    for (label, wall) in labelled {
        let slot = *order.entry(label).or_insert(groups.len());
        match groups.get_mut(slot) {
            Some(group) => group.push(wall),
            None => groups.push(vec![wall]),
        }
    }
    groups
        .into_iter()
        .map(|mut walls| {
            let sizes = walls.iter().map(|(_, wall)| wall.signed_area().abs());
            let largest = sizes
                .enumerate()
                .fold((0, f64::NEG_INFINITY), |best, (i, size)| {
                    if size > best.1 { (i, size) } else { best }
                });
            let outer = walls.remove(largest.0);
            (outer, walls)
        })
        .collect()
}

/// Loops at even depth become lumens, loops at odd depth islands of the smallest loop around them.
fn by_depth(numbered: Vec<Numbered>) -> Vec<Group> {
    let (numbers, walls): (Vec<usize>, Vec<Loop>) = numbered.into_iter().unzip();
    let nests = nesting(&walls);
    let mut slot_of = vec![None; walls.len()];
    let mut lumens: Vec<Group> = Vec::new();
    let mut islands: Vec<(usize, Numbered)> = Vec::new();
    for (index, wall) in numbers.into_iter().zip(walls).enumerate() {
        let nest = nests.get(index).copied().unwrap_or_default();
        let around = nest.parent.filter(|parent| {
            nest.depth % 2 == 1 && nests.get(*parent).is_some_and(|p| p.depth % 2 == 0)
        });
        if let Some(parent) = around {
            islands.push((parent, wall));
        } else {
            if let Some(slot) = slot_of.get_mut(index) {
                *slot = Some(lumens.len());
            }
            lumens.push((wall, Vec::new()));
        }
    }
    for (parent, wall) in islands {
        let slot = slot_of.get(parent).copied().flatten();
        match slot.and_then(|slot| lumens.get_mut(slot)) {
            Some((_, islands)) => islands.push(wall),
            None => lumens.push((wall, Vec::new())),
        }
    }
    lumens
}

/// How deep a loop lies and the smallest loop around it.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
struct Nest {
    depth: usize,
    parent: Option<usize>,
}

/// Depth and parent of every loop.
fn nesting(walls: &[Loop]) -> Vec<Nest> {
    if walls.len() < 2 {
        return vec![Nest::default(); walls.len()];
    }
    let areas: Vec<f64> = walls.iter().map(|wall| wall.signed_area().abs()).collect();
    let strips = [false, true].map(|is_turned| Strips::new(walls, is_turned));
    let mut crossed: Vec<usize> = Vec::new();
    walls
        .iter()
        .enumerate()
        .map(|(index, wall)| {
            let Some(&point) = wall.points.first() else {
                return Nest::default();
            };
            let [level, upright] = &strips;
            let fewer = if level.edges_beside(point).len() <= upright.edges_beside(point).len() {
                level
            } else {
                upright
            };
            fewer.crossings(walls, point, &mut crossed);
            crossed.retain(|&other| other != index);
            crossed.sort_unstable();
            let mut nest = Nest::default();
            for same in crossed.chunk_by(|a, b| a == b) {
                let Some(&other) = same.first().filter(|_| same.len() % 2 == 1) else {
                    continue;
                };
                nest.depth += 1;
                let area = |i: usize| areas.get(i).copied().unwrap_or(f64::INFINITY);
                if nest.parent.is_none_or(|parent| area(other) < area(parent)) {
                    nest.parent = Some(other);
                }
            }
            nest
        })
        .collect()
}

/// Edges by strips across one axis, with as many loops beginning in each strip.
struct Strips {
    /// Whether `x` and `y` change places.
    is_turned: bool,
    /// Heights between strips, rising.
    borders: Vec<f64>,
    /// Loop and vertex of every edge that reaches into a strip.
    edges: Vec<Vec<(u32, u32)>>,
}

/// A point with `x` and `y` in their places or changed.
fn turned(point: Point, is_turned: bool) -> Point {
    let [x, y] = point;
    if is_turned { [y, x] } else { [x, y] }
}

/// First and last strip of an edge.
fn reach(borders: &[f64], a: Point, b: Point) -> (usize, usize) {
    let strip = |y: f64| borders.partition_point(|border| *border <= y);
    (strip(a[1].min(b[1])), strip(a[1].max(b[1])))
}

/// Borders that give each strip the same number of loops, fewer where edges would lie in too many strips.
fn strip_borders(walls: &[Loop], is_turned: bool) -> Vec<f64> {
    let starts = walls.iter().filter_map(|wall| wall.points.first());
    let mut heights: Vec<f64> = starts.map(|&p| turned(p, is_turned)[1]).collect();
    heights.sort_by(f64::total_cmp);
    heights.dedup();
    let edges: usize = walls.iter().map(|wall| wall.points.len()).sum();
    let mut count = heights.len().clamp(1, MOST_STRIPS);
    loop {
        let step = heights.len().div_ceil(count).max(1);
        let borders: Vec<f64> = heights.iter().copied().skip(step).step_by(step).collect();
        let entries: usize = walls
            .iter()
            .flat_map(Loop::edges)
            .map(|(a, b)| {
                let (first, last) = reach(&borders, turned(a, is_turned), turned(b, is_turned));
                last - first + 1
            })
            .sum();
        if count == 1 || entries <= ENTRIES_PER_EDGE * edges {
            return borders;
        }
        count /= 2;
    }
}

impl Strips {
    fn new(walls: &[Loop], is_turned: bool) -> Self {
        let borders = strip_borders(walls, is_turned);
        let mut edges = vec![Vec::new(); borders.len() + 1];
        for (index, wall) in walls.iter().enumerate() {
            for (vertex, (a, b)) in wall.edges().enumerate() {
                let (a, b) = (turned(a, is_turned), turned(b, is_turned));
                let (first, last) = reach(&borders, a, b);
                let is_level = a[1].to_bits() == b[1].to_bits();
                if !is_level && let Some(range) = edges.get_mut(first..=last) {
                    for strip in range {
                        strip.push((index as u32, vertex as u32));
                    }
                }
            }
        }
        Self {
            is_turned,
            borders,
            edges,
        }
    }

    /// Edges in the strip of a point.
    fn edges_beside(&self, point: Point) -> &[(u32, u32)] {
        let point = turned(point, self.is_turned);
        let (strip, _) = reach(&self.borders, point, point);
        self.edges.get(strip).map_or(&[], Vec::as_slice)
    }

    /// Loops crossed by a ray from the point along its strip, once for each crossing.
    fn crossings(&self, walls: &[Loop], point: Point, crossed: &mut Vec<usize>) {
        crossed.clear();
        let edges = self.edges_beside(point);
        let point = turned(point, self.is_turned);
        for &(index, vertex) in edges {
            let wall = walls.get(index as usize).map(|w| w.points.as_slice());
            let points = wall.unwrap_or_default();
            let vertex = vertex as usize;
            let next = if vertex + 1 == points.len() {
                0
            } else {
                vertex + 1
            };
            let (Some(&a), Some(&b)) = (points.get(vertex), points.get(next)) else {
                continue;
            };
            let (a, b) = (turned(a, self.is_turned), turned(b, self.is_turned));
            if (a[1] > point[1]) != (b[1] > point[1]) && lies_right_of(point, a, b) {
                crossed.push(index as usize);
            }
        }
    }
}

/// Whether a point lies to the right of an edge that spans its height.
fn lies_right_of(point: Point, a: Point, b: Point) -> bool {
    if point[0] < a[0].min(b[0]) || point[0] > a[0].max(b[0]) {
        return point[0] > a[0];
    }
    let coord = |p: Point| Coord { x: p[0], y: p[1] };
    let (low, high) = if a[1] < b[1] { (a, b) } else { (b, a) };
    orient2d(coord(low), coord(high), coord(point)) < 0.0
}

#[cfg(test)]
mod tests {
    use super::*;

    fn square(x: f64, y: f64, half: f64) -> RawLoop {
        let points = vec![
            [x - half, y - half],
            [x + half, y - half],
            [x + half, y + half],
            [x - half, y + half],
        ];
        RawLoop {
            points,
            lumen: None,
        }
    }

    #[test]
    fn depth_decides_between_lumen_and_island() {
        let Sorted {
            outline,
            loop_numbers,
        } = assemble(vec![
            square(0.0, 0.0, 1.0),
            square(0.0, 0.0, 3.0),
            square(0.0, 0.0, 9.0),
            square(5.0, 5.0, 1.0),
            square(30.0, 0.0, 2.0),
        ]);
        assert_eq!(outline.lumens.len(), 3);
        let islands: Vec<usize> = outline.lumens.iter().map(|l| l.islands.len()).collect();
        assert_eq!(islands, [0, 2, 0]);
        assert_eq!(loop_numbers, [0, 2, 1, 3, 4]);
        assert!((outline.area() - (324.0 - 36.0 - 4.0 + 4.0 + 16.0)).abs() < 1e-9);
    }

    #[test]
    fn a_label_overrides_depth() {
        let label = |mut one: RawLoop, name: &str| {
            one.lumen = Some(name.to_owned());
            one
        };
        let Sorted {
            outline,
            loop_numbers,
        } = assemble(vec![
            label(square(0.0, 0.0, 1.0), "a"),
            label(square(0.0, 0.0, 3.0), "a"),
            label(square(0.0, 0.0, 0.5), "b"),
        ]);
        assert_eq!(outline.lumens.len(), 2);
        assert!((outline.lumens[0].outer.signed_area() - 36.0).abs() < 1e-12);
        assert_eq!(outline.lumens[0].islands.len(), 1);
        assert_eq!(loop_numbers, [1, 0, 2]);
    }

    #[test]
    fn many_posts_are_sorted_in_near_linear_time() {
        let mut raw = vec![square(150.0, 150.0, 1000.0)];
        for i in 0..300 {
            for j in 0..300 {
                raw.push(square(f64::from(i), f64::from(j), 0.3));
            }
        }
        let outline = assemble(raw).outline;
        assert_eq!(outline.lumens.len(), 1);
        assert_eq!(outline.lumens[0].islands.len(), 90_000);
    }

    #[test]
    fn long_rows_and_columns_of_posts_are_no_slower() {
        for turn in [false, true] {
            let mut raw = vec![square(0.0, 0.0, 2e6)];
            for i in 0..100_000 {
                let [x, y] = turned([f64::from(i), 0.0], turn);
                raw.push(square(x, y, 0.3));
            }
            let outline = assemble(raw).outline;
            assert_eq!(outline.lumens.len(), 1);
            assert_eq!(outline.lumens[0].islands.len(), 100_000);
        }
    }

    #[test]
    fn a_comb_of_tall_teeth_stays_small() {
        let mut points = vec![[200_000.0, -1.0], [0.0, -1.0]];
        for i in 0..100_000 {
            let x = f64::from(i);
            points.extend([[x, 0.0], [x + 0.5, 1000.0]]);
        }
        let comb = RawLoop {
            points,
            lumen: None,
        };
        let outline = assemble(vec![comb, square(1e6, 0.0, 10.0)]).outline;
        assert_eq!(outline.lumens.len(), 2);
    }

    #[test]
    fn degenerate_loops_do_not_break_it() {
        for points in [vec![], vec![[0.0, 0.0]], vec![[0.0, 0.0], [1.0, 0.0]]] {
            let one = RawLoop {
                points,
                lumen: None,
            };
            let outline = assemble(vec![one, square(0.0, 0.0, 1.0)]).outline;
            assert_eq!(outline.loops().count(), 2);
        }
    }
}
