//! The space between a lower and an upper curve as polygons, for several pairs of curves inside each other.
//!
//! A curve is a list of points whose `x` never falls; a vertical wall is two points at one `x`. All
//! curves of all layers are evaluated at the same positions: every vertex of any of them and every
//! crossing of a lower with its upper curve. There the layers are put in order (a rounding step decides in
//! favour of the layer outside), and between neighbouring positions every curve is straight, so each layer
//! lies inside the next exactly, not only within rounding. A lower curve at or above its upper curve is
//! solid; each stretch in between is a part of its own.
//!
//! Two parts that would share a point are cut back by a millionth of the spacing, so that they do not touch.

use crate::geometry::Point;

/// Positions closer than this fraction of the width are one.
const SAME_POSITION: f64 = 1e-10;
/// Openings below this fraction of the largest one are closed.
const CLOSED: f64 = 1e-10;
/// How far parts that touch are cut back, as a fraction of the spacing there.
const CUT_BACK: f64 = 1e-6;

/// A lower and an upper curve.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Layer {
    pub(super) lower: Vec<Point>,
    pub(super) upper: Vec<Point>,
}

/// One connected part of the space of a layer, anticlockwise.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Part {
    /// Smallest and largest `x`, m.
    pub(super) span: [f64; 2],
    /// Vertices at the places where the curves turn, and where some part of some layer begins or ends.
    pub(super) points: Vec<Point>,
    /// Vertices at every position: each layer inside the next exactly.
    pub(super) all_points: Vec<Point>,
    /// Area, m^2.
    pub(super) area: f64,
}

/// A value just left and just right of a position.
type Sides = [f64; 2];

/// The parts of each layer, outermost layer first, each from left to right.
pub(super) fn close(layers: &[Layer]) -> Vec<Vec<Part>> {
    let (layers, mut positions) = with_common_positions(layers);
    add_crossings(&layers, &mut positions);
    let arrangement = Arrangement::new(&layers, positions, &[]);
    let touching = arrangement.touching();
    if touching.is_empty() {
        return arrangement.parts();
    }
    let mut positions = arrangement.positions.clone();
    for &(_, at) in &touching {
        let (before, here, after) = (at - 1, at, at + 1);
        let x = &arrangement.positions;
        positions.push(x[here] - CUT_BACK * (x[here] - x[before]));
        positions.push(x[here] + CUT_BACK * (x[after] - x[here]));
    }
    sort(&mut positions);
    let pinches = touching
        .iter()
        .map(|&(layer, at)| (layer, arrangement.positions[at]));
    Arrangement::new(&layers, positions, &pinches.collect::<Vec<_>>()).parts()
}

fn sort(positions: &mut Vec<f64>) {
    positions.sort_by(f64::total_cmp);
    positions.dedup();
}

/// The layers with positions that are closer than rounding made one, and all positions.
fn with_common_positions(layers: &[Layer]) -> (Vec<Layer>, Vec<f64>) {
    let points = layers.iter().flat_map(|l| l.lower.iter().chain(&l.upper));
    let mut all: Vec<f64> = points.map(|p| p[0]).collect();
    sort(&mut all);
    let width = all.last().unwrap_or(&0.0) - all.first().unwrap_or(&0.0);
    let mut common: Vec<f64> = Vec::new();
    for x in all {
        match common.last() {
            Some(&last) if x - last <= SAME_POSITION * width => {}
            _ => common.push(x),
        }
    }
    let moved = |curve: &[Point]| -> Vec<Point> {
        let place = |x: f64| common.partition_point(|&c| c <= x).saturating_sub(1);
        let moved = |p: &Point| [common.get(place(p[0])).copied().unwrap_or(p[0]), p[1]];
        curve.iter().map(moved).collect()
    };
    let layers = layers.iter().map(|layer| Layer {
        lower: moved(&layer.lower),
        upper: moved(&layer.upper),
    });
    (layers.collect(), common)
}

/// Values of a curve at growing positions, left and right of each; `outside` off its ends. And where
/// it has vertices.
fn values(curve: &[Point], positions: &[f64], outside: f64) -> (Vec<Sides>, Vec<bool>) {
    let mut found = Vec::with_capacity(positions.len());
    let mut corners = Vec::with_capacity(positions.len());
    let mut next = 0;
    for &x in positions {
        let first = next;
        while curve.get(next).is_some_and(|p| p[0] <= x) {
            next += 1;
        }
        let here = curve[first..next].iter().find(|p| p[0] >= x);
        let last = next.checked_sub(1).map(|i| curve[i]);
        corners.push(here.is_some());
        let on_segment = match (last, curve.get(next)) {
            (Some(a), Some(b)) => a[1] + (x - a[0]) / (b[0] - a[0]) * (b[1] - a[1]),
            _ => outside,
        };
        found.push(match (here, last) {
            (Some(here), Some(last)) => [
                if first == 0 && curve[0][0] >= x {
                    outside
                } else {
                    here[1]
                },
                if next == curve.len() {
                    outside
                } else {
                    last[1]
                },
            ],
            _ => [on_segment; 2],
        });
    }
    (found, corners)
}

/// Adds the positions where a lower curve crosses its upper curve.
fn add_crossings(layers: &[Layer], positions: &mut Vec<f64>) {
    let mut crossings = Vec::new();
    for layer in layers {
        let (lower, _) = values(&layer.lower, positions, f64::INFINITY);
        let (upper, _) = values(&layer.upper, positions, f64::NEG_INFINITY);
        for (index, x) in positions.windows(2).enumerate() {
            let begin = upper[index][1] - lower[index][1];
            let end = upper[index + 1][0] - lower[index + 1][0];
            if begin.is_finite() && end.is_finite() && (begin > 0.0) != (end > 0.0) {
                let along = begin / (begin - end);
                if along > SAME_POSITION && along < 1.0 - SAME_POSITION {
                    crossings.push(x[0] + along * (x[1] - x[0]));
                }
            }
        }
    }
    positions.append(&mut crossings);
    sort(positions);
}

/// All curves at all positions, in order.
struct Arrangement {
    positions: Vec<f64>,
    lower: Vec<Vec<Sides>>,
    upper: Vec<Vec<Sides>>,
    /// Where the curves have vertices.
    lower_corners: Vec<Vec<bool>>,
    upper_corners: Vec<Vec<bool>>,
    /// Positions of each layer with shut stretches on both sides.
    shut: Vec<Vec<bool>>,
}

impl Arrangement {
    /// - `pinches`: layer and position of the pinches to shut, in it and the layers inside
    fn new(layers: &[Layer], positions: Vec<f64>, pinches: &[(usize, f64)]) -> Self {
        let mut shut = vec![vec![false; positions.len()]; layers.len()];
        for &(layer, x) in pinches {
            let at = positions.partition_point(|&p| p < x);
            for marks in shut.iter_mut().skip(layer) {
                marks[at] = true;
            }
        }
        let split = |curves: Vec<(Vec<Sides>, Vec<bool>)>| curves.into_iter().unzip();
        let lower = layers
            .iter()
            .map(|l| values(&l.lower, &positions, f64::INFINITY));
        let (lower, lower_corners) = split(lower.collect());
        let upper = layers
            .iter()
            .map(|l| values(&l.upper, &positions, f64::NEG_INFINITY));
        let (upper, upper_corners) = split(upper.collect());
        let mut arrangement = Self {
            positions,
            lower,
            upper,
            lower_corners,
            upper_corners,
            shut,
        };
        arrangement.put_in_order();
        arrangement
    }

    /// Puts each layer inside the one before and closes what is open by less than rounding.
    fn put_in_order(&mut self) {
        let size = self.positions.iter().fold(0.0, |m: f64, x| m.max(x.abs()));
        let openings = self.lower.iter().flatten().zip(self.upper.iter().flatten());
        let opening = |(l, u): (&Sides, &Sides)| (u[0] - l[0]).max(u[1] - l[1]);
        let largest = openings
            .map(opening)
            .filter(|o| o.is_finite())
            .fold(0.0, f64::max);
        let closed = (CLOSED * largest).max(64.0 * f64::EPSILON * size);
        for at in 0..self.positions.len() {
            let mut around = [[f64::NEG_INFINITY; 2], [f64::INFINITY; 2]];
            for layer in 0..self.lower.len() {
                let (low, high) = (&mut self.lower[layer][at], &mut self.upper[layer][at]);
                for side in 0..2 {
                    low[side] = low[side].max(around[0][side]);
                    high[side] = high[side].min(around[1][side]);
                }
                // A jump of a rounding step is none.
                if (low[0] - low[1]).abs() <= closed {
                    *low = [low[0].max(low[1]); 2];
                }
                if (high[0] - high[1]).abs() <= closed {
                    *high = [high[0].min(high[1]); 2];
                }
                for side in 0..2 {
                    let (below, above) = (low[side], high[side]);
                    if above - below <= closed || !(above.is_finite() && below.is_finite()) {
                        let level = if above.is_finite() { above } else { below };
                        let level = if level.is_finite() { level } else { 0.0 };
                        low[side] = level.max(around[0][side]).min(around[1][side]);
                        high[side] = low[side];
                    }
                }
                around = [*low, *high];
            }
        }
    }

    /// Whether a layer is open between a position and the next.
    fn is_open(&self, layer: usize, at: usize) -> bool {
        let opening =
            |at: usize, side: usize| self.upper[layer][at][side] - self.lower[layer][at][side];
        let is_shut = self.shut[layer][at] || self.shut[layer][at + 1];
        opening(at, 1) + opening(at + 1, 0) > 0.0 && !is_shut
    }

    /// Lowest and highest common height left and right of a position; crossed where there is none.
    fn passage(&self, layer: usize, at: usize) -> (f64, f64) {
        let (low, high) = (self.lower[layer][at], self.upper[layer][at]);
        (low[0].max(low[1]), high[0].min(high[1]))
    }

    /// Positions of begin and end of each part of a layer.
    fn spans(&self, layer: usize) -> Vec<[usize; 2]> {
        let mut spans: Vec<[usize; 2]> = Vec::new();
        for at in 0..self.positions.len().saturating_sub(1) {
            if !self.is_open(layer, at) {
                continue;
            }
            let (low, high) = self.passage(layer, at);
            match spans.last_mut() {
                Some(last) if last[1] == at && low < high => last[1] = at + 1,
                _ => spans.push([at, at + 1]),
            }
        }
        spans
    }

    /// Layers and positions where two parts share a point.
    fn touching(&self) -> Vec<(usize, usize)> {
        let mut found = Vec::new();
        for layer in 0..self.lower.len() {
            for pair in self.spans(layer).windows(2) {
                let at = pair[0][1];
                let (low, high) = self.passage(layer, at);
                if at == pair[1][0] && low <= high {
                    found.push((layer, at));
                }
            }
        }
        found
    }

    fn parts(&self) -> Vec<Vec<Part>> {
        let spans: Vec<Vec<[usize; 2]>> = (0..self.lower.len()).map(|l| self.spans(l)).collect();
        let mut ends = vec![false; self.positions.len()];
        for &[begin, end] in spans.iter().flatten() {
            (ends[begin], ends[end]) = (true, true);
        }
        let layers = spans.iter().enumerate();
        layers
            .map(|(layer, spans)| {
                spans
                    .iter()
                    .map(|&span| self.part(layer, span, &ends))
                    .collect()
            })
            .collect()
    }

    fn part(&self, layer: usize, span: [usize; 2], ends: &[bool]) -> Part {
        let kept = |corners: &Vec<bool>| corners.iter().zip(ends).map(|(a, b)| *a || *b).collect();
        let lower_kept: Vec<bool> = kept(&self.lower_corners[layer]);
        let upper_kept: Vec<bool> = kept(&self.upper_corners[layer]);
        let ring = |keep: &dyn Fn(&Vec<bool>, usize) -> bool| {
            let mut points = self.chain(&self.lower[layer], span, &|at| keep(&lower_kept, at));
            let mut above = self.chain(&self.upper[layer], span, &|at| keep(&upper_kept, at));
            above.reverse();
            points.append(&mut above);
            points.dedup();
            while points.len() > 1 && points.first() == points.last() {
                points.pop();
            }
            without_level_vertices(&points)
        };
        let all_points = ring(&|_, _| true);
        let x = |at: usize| self.positions[at];
        let area = (span[0]..span[1]).map(|at| {
            let begin = self.upper[layer][at][1] - self.lower[layer][at][1];
            let end = self.upper[layer][at + 1][0] - self.lower[layer][at + 1][0];
            0.5 * (begin + end) * (x(at + 1) - x(at))
        });
        Part {
            span: span.map(x),
            points: ring(&|kept, at| kept[at]),
            all_points,
            area: area.sum(),
        }
    }

    /// Points of a curve from begin to end, with both ends of its vertical stretches.
    fn chain(
        &self,
        curve: &[Sides],
        [begin, end]: [usize; 2],
        keep: &dyn Fn(usize) -> bool,
    ) -> Vec<Point> {
        let mut points = Vec::new();
        let places = self.positions.iter().zip(curve).enumerate();
        for (at, (&x, sides)) in places.take(end + 1).skip(begin) {
            if at > begin && (at == end || keep(at)) {
                points.push([x, sides[0]]);
            }
            if at < end && (at == begin || keep(at)) {
                points.push([x, sides[1]]);
            }
        }
        points
    }
}

/// The ring without vertices on level or upright stretches, which changes nothing at all.
fn without_level_vertices(points: &[Point]) -> Vec<Point> {
    let count = points.len();
    let is_between = |index: usize| {
        let [a, b, c] = [index + count - 1, index, index + 1].map(|i| points[i % count]);
        let same = |axis: usize| {
            a[axis].to_bits() == b[axis].to_bits() && b[axis].to_bits() == c[axis].to_bits()
        };
        let inside = |axis: usize| (a[axis] < b[axis]) == (b[axis] < c[axis]);
        (same(1) && inside(0)) || (same(0) && inside(1))
    };
    let kept = (0..count).filter(|&index| !is_between(index));
    kept.map(|index| points[index]).collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geometry::Outline;

    fn outline(parts: &[Part]) -> Outline {
        let all = parts.iter().map(|p| Outline::single(p.points.clone()));
        Outline {
            lumens: all.flat_map(|o| o.lumens).collect(),
        }
    }

    #[test]
    fn parts_that_would_share_a_point_are_cut_apart() {
        let upper = vec![[0.0, 0.0], [8.0, 0.0]];
        let lower = vec![[0.0, 0.0], [2.0, -3.0], [4.0, 0.0], [6.0, -3.0], [8.0, 0.0]];
        let found = close(&[Layer { lower, upper }]);
        assert_eq!(found[0].len(), 2);
        let both = outline(&found[0]);
        assert!(both.is_valid(), "{}", both.problems());
        assert!((both.area() - 12.0).abs() < 1e-4);
    }

    #[test]
    fn a_curve_through_the_lid_leaves_exact_parts_on_both_sides() {
        let upper = vec![[0.0, 0.0], [8.0, 0.0]];
        let lower = vec![[0.0, 0.0], [0.0, -2.0], [4.0, 2.0], [8.0, -2.0], [8.0, 0.0]];
        let found = close(&[Layer { lower, upper }]);
        let spans: Vec<[f64; 2]> = found[0].iter().map(|p| p.span).collect();
        assert_eq!(spans, [[0.0, 2.0], [6.0, 8.0]]);
        assert_eq!(found[0][0].points, [[0.0, -2.0], [2.0, 0.0], [0.0, 0.0]]);
    }

    #[test]
    fn layers_that_differ_by_rounding_lie_in_each_other_exactly() {
        let walls = |foot: f64| {
            vec![
                [0.1, 0.3],
                [0.1 + foot, -0.7],
                [0.9, -0.7 - foot],
                [1.3, 0.3],
            ]
        };
        let layer = |foot: f64| Layer {
            lower: walls(foot),
            upper: vec![[0.1, 0.1], [1.3, 0.07]],
        };
        let found = close(&[layer(0.1), layer(0.1 + 1e-16), layer(0.1)]);
        let all: Vec<Outline> = found.iter().map(|parts| outline(parts)).collect();
        assert!(all[2].proven_inside(&all[1]).is_ok());
        assert!(all[1].proven_inside(&all[0]).is_ok());
    }
}
