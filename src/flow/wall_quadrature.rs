//! Integrals of the wall shear and of its square along the wall.
//!
//! Every stretch between corners is cut at the pieces of the curve, at its kinks and, where a weight depends on the edge, at
//! the vertices of the outline; on each part the rule of Gauss with four points is used, with two or one on
//! parts far shorter than the spacing. Beside a corner, where shear to the power `n`
//! behaves like `r^a` with `a = n (pi/omega - 1) > -1`, it is used in `t = r^(1/m)` with
//! `m = 4/(a + 1)`: the integrand is then smooth.

use super::many::map_many;
use super::wall_curve::{LoopCurve, WallCurve, WallPlace};
use super::wall_path::taken_round;
use super::wall_stretch::Stretch;

/// Places and weights of Gauss's rules on -1 to 1.
pub(super) const GAUSS_4: [(f64, f64); 4] = [
    (-0.861_136_311_594_052_6, 0.347_854_845_137_453_85),
    (-0.339_981_043_584_856_26, 0.652_145_154_862_546_1),
    (0.339_981_043_584_856_26, 0.652_145_154_862_546_1),
    (0.861_136_311_594_052_6, 0.347_854_845_137_453_85),
];
pub(super) const GAUSS_2: [(f64, f64); 2] = [
    (-0.577_350_269_189_625_8, 1.0),
    (0.577_350_269_189_625_8, 1.0),
];
const GAUSS_1: [(f64, f64); 1] = [(0.0, 2.0)];
/// Length of a part, in spacings or as a share of the distance to the corner, below which two points do.
const TWO_POINTS: f64 = 0.25;
/// The same for one point.
const ONE_POINT: f64 = 0.05;

/// Where an integrand is evaluated.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Abscissa {
    /// Arc length from the first vertex of the loop, m.
    pub(crate) arc_length: f64,
    /// Edge of the outline.
    pub(crate) edge: usize,
    /// Shear to the power of the integral, times the weight of the rule; m^(power + 1).
    pub(crate) weighted: f64,
}

impl WallCurve {
    /// Integral of `weight * abs(dphi/dn)^power ds` over the whole wall.
    ///
    /// - `power`: 1 or 2
    /// - `weight`: smooth along each edge of the outline
    pub fn integrate(&self, power: i32, weight: impl Fn(&WallPlace) -> f64 + Sync) -> f64 {
        let whole = |(loop_index, curve): (usize, &LoopCurve)| {
            let sums = map_many(&curve.stretches, |stretch| {
                let mut sum = Sum::new(curve, loop_index, &weight);
                let ends = (0.0, stretch.length);
                curve.along(stretch, ends, power, true, &mut |abscissa| {
                    sum.add(abscissa);
                });
                sum.value
            });
            sums.iter().sum::<f64>()
        };
        self.loops.iter().enumerate().map(whole).sum()
    }

    /// The same along one loop from one arc length forward to another, m; past the first vertex where
    /// `to` is larger than the length of the loop. Zero for a loop that is not there.
    pub fn integrate_stretch(
        &self,
        loop_index: usize,
        from: f64,
        to: f64,
        power: i32,
        weight: impl Fn(&WallPlace) -> f64,
    ) -> f64 {
        let Some(curve) = self.loops.get(loop_index) else {
            return 0.0;
        };
        let mut sum = Sum::new(curve, loop_index, &weight);
        curve.visit((from, to), power, true, &mut |abscissa| sum.add(abscissa));
        sum.value
    }
}

/// A weighted sum along one loop.
struct Sum<'a, W> {
    curve: &'a LoopCurve,
    weight: &'a W,
    edge: usize,
    place: WallPlace,
    value: f64,
}

impl<'a, W: Fn(&WallPlace) -> f64> Sum<'a, W> {
    fn new(curve: &'a LoopCurve, loop_index: usize, weight: &'a W) -> Self {
        Self {
            curve,
            weight,
            edge: usize::MAX,
            place: WallPlace {
                loop_index,
                arc_length: 0.0,
                at: [0.0; 2],
                normal: [0.0; 2],
            },
            value: 0.0,
        }
    }

    fn add(&mut self, abscissa: Abscissa) {
        let path = &self.curve.path;
        if self.edge != abscissa.edge {
            self.edge = abscissa.edge;
            self.place.normal = path.edge_normal(self.edge);
        }
        self.place.arc_length = abscissa.arc_length;
        self.place.at = path.on_edge_at(self.edge, abscissa.arc_length);
        self.value += abscissa.weighted * (self.weight)(&self.place);
    }
}

impl LoopCurve {
    /// Integral of the shear from one arc length forward to another, m^2.
    pub(crate) fn integral(&self, from: f64, to: f64) -> f64 {
        let mut sum = 0.0;
        self.visit((from, to), 1, false, &mut |abscissa| {
            sum += abscissa.weighted;
        });
        sum
    }

    /// Every place where the integral from one arc length forward to another is evaluated, in order.
    ///
    /// - `by_edge`: whether the parts end at the vertices of the outline
    pub(crate) fn visit(
        &self,
        (from, to): (f64, f64),
        power: i32,
        by_edge: bool,
        visit: &mut impl FnMut(Abscissa),
    ) {
        let total = self.length();
        for turn in [-1.0, 0.0, 1.0] {
            let shift = turn * total;
            let first = self
                .stretches
                .partition_point(|stretch| stretch.start + stretch.length + shift <= from);
            for stretch in &self.stretches[first..] {
                let start = stretch.start + shift;
                if start >= to {
                    break;
                }
                let low = (from - start).max(0.0);
                let high = (to - start).min(stretch.length);
                if high > low {
                    self.along(stretch, (low, high), power, by_edge, visit);
                }
            }
        }
    }

    /// A part of a stretch, given by distances from its start.
    fn along(
        &self,
        stretch: &Stretch,
        (low, high): (f64, f64),
        power: i32,
        by_edge: bool,
        visit: &mut impl FnMut(Abscissa),
    ) {
        let vertices = self.path.vertices();
        let total = self.length();
        let mut edge = usize::MAX;
        for part in self.breaks(stretch, low, high, by_edge).windows(2) {
            let (a, b) = (part[0], part[1]);
            let middle = taken_round(stretch.start + 0.5 * (a + b), total);
            let offset = middle - 0.5 * (a + b);
            if by_edge {
                let holds = |k: usize| {
                    vertices.get(k).is_some_and(|&v| v <= middle)
                        && vertices.get(k + 1).is_some_and(|&v| v > middle)
                };
                // Mostly the same edge or the next one.
                if !holds(edge) {
                    edge = edge.wrapping_add(1);
                    if !holds(edge) {
                        edge = self.path.edge_at(middle);
                    }
                }
            }
            gauss(
                stretch,
                (a, b),
                power,
                self.spacing,
                |distance, to_end, w| {
                    let arc_length = distance + offset;
                    let value =
                        stretch.value_between(distance, to_end) * self.factor.at(arc_length);
                    visit(Abscissa {
                        arc_length,
                        edge,
                        weighted: w * value.powi(power),
                    });
                },
            );
        }
    }

    /// Ends of the parts between two distances from the start of a stretch.
    fn breaks(&self, stretch: &Stretch, low: f64, high: f64, by_edge: bool) -> Vec<f64> {
        let total = self.length();
        let count = stretch.pieces(self.spacing);
        let step = stretch.length / count as f64;
        let mut breaks = vec![low, high];
        let pieces = (low / step).floor() as usize..=count.min((high / step).ceil() as usize);
        breaks.extend(pieces.map(|k| step * k as f64));
        breaks.extend([stretch.zone[0], stretch.length - stretch.zone[1]]);
        breaks.extend(stretch.kinks());
        let vertices = self.path.vertices();
        for turn in [0.0, total] {
            let from = vertices.partition_point(|&v| v + turn <= stretch.start + low);
            let to = vertices.partition_point(|&v| v + turn < stretch.start + high);
            if by_edge && from < to {
                breaks.extend(vertices[from..to].iter().map(|v| v + turn - stretch.start));
            }
        }
        breaks.extend(
            self.factor
                .marks(stretch.start + low, stretch.start + high)
                .map(|s| s - stretch.start),
        );
        breaks.retain(|&b| (low..=high).contains(&b));
        breaks.sort_by(f64::total_cmp);
        breaks.dedup_by(|a, b| *a - *b <= 1e-14 * total);
        breaks
    }
}

/// Gauss's rule over a part of a stretch, in the variable that suits the corner next to it; `visit` takes the
/// distances from both ends of the stretch and the weight.
fn gauss(
    stretch: &Stretch,
    (a, b): (f64, f64),
    power: i32,
    spacing: f64,
    mut visit: impl FnMut(f64, f64, f64),
) {
    let middle = 0.5 * (a + b);
    let near_end = middle > 0.5 * stretch.length;
    let corner = stretch
        .leading
        .map(|leading| leading[usize::from(near_end)])
        .filter(|_| middle <= stretch.zone[0] || stretch.length - middle <= stretch.zone[1]);
    let Some(leading) = corner else {
        let half = 0.5 * (b - a);
        for &(x, w) in rule((b - a) / spacing) {
            let distance = middle + half * x;
            visit(distance, stretch.length - distance, w * half);
        }
        return;
    };
    let m = (4.0 / (f64::from(power) * leading + 1.0)).max(1.0);
    let (near, far) = if near_end {
        (stretch.length - b, stretch.length - a)
    } else {
        (a, b)
    };
    let (low, high) = (near.max(0.0).powf(1.0 / m), far.powf(1.0 / m));
    let (centre, half) = (0.5 * (low + high), 0.5 * (high - low));
    for &(x, w) in rule((far - near) / far.min(spacing)) {
        let t = centre + half * x;
        // Cheaper than a power, and as good for numbers that are not large.
        let r = (m * t.ln()).exp();
        let (distance, to_end) = if near_end {
            (stretch.length - r, r)
        } else {
            (r, stretch.length - r)
        };
        visit(distance, to_end, w * half * m * r / t);
    }
}

/// The rule for a part of a given length against the length over which the curve changes.
fn rule(length: f64) -> &'static [(f64, f64)] {
    if length >= TWO_POINTS {
        &GAUSS_4
    } else if length >= ONE_POINT {
        &GAUSS_2
    } else {
        &GAUSS_1
    }
}

#[cfg(test)]
mod tests {
    use super::super::section_flow::WallSample;
    use super::*;
    use crate::geometry::{Outline, Point, corners};

    /// Curve of an outline whose shear is known, from samples on its edges.
    fn curve(outline: &Outline, spacing: f64, shear: impl Fn(Point) -> f64) -> WallCurve {
        let mut samples = Vec::new();
        for (loop_index, wall) in outline.loops().enumerate() {
            let mut arc = 0.0;
            for (a, b) in wall.edges() {
                let length = (b[0] - a[0]).hypot(b[1] - a[1]);
                let count = (length / spacing).floor() as usize;
                for k in 0..count {
                    let t = (k as f64 + 0.5) / count as f64;
                    let at = [a[0] + t * (b[0] - a[0]), a[1] + t * (b[1] - a[1])];
                    samples.push(WallSample {
                        loop_index,
                        arc_length: arc + t * length,
                        at,
                        normal: [0.0; 2],
                        shear_per_gradient: shear(at),
                    });
                }
                arc += length;
            }
        }
        let corners: Vec<_> = outline
            .loops()
            .map(|wall| corners(wall, spacing, 0.2))
            .collect();
        WallCurve::new(outline, &corners, &samples, spacing)
    }

    #[test]
    fn the_shear_of_an_equilateral_triangle_integrates_exactly() {
        // Closed form: parabolic along each side of length 2, 3/4 of the height in the middle times 2/3.
        let root = 3.0_f64.sqrt();
        let triangle = Outline::single(vec![[-1.0, 0.0], [1.0, 0.0], [0.0, root]]);
        let shear = |p: Point| {
            let from_middle = [[0.0, 0.0], [0.5, 0.5 * root], [-0.5, 0.5 * root]]
                .iter()
                .map(|m| (p[0] - m[0]).hypot(p[1] - m[1]))
                .fold(f64::INFINITY, f64::min);
            0.25 * root * (1.0 - from_middle * from_middle)
        };
        let curve = curve(&triangle, 0.02, shear);
        let mean = curve.integrate(1, |_| 1.0);
        assert!((mean / root - 1.0).abs() < 1e-7, "{mean}");
        // Rellich's identity with K = side^4 sqrt(3) / 320, about a corner.
        let rellich = curve.integrate(2, |p| p.at[0] * p.normal[0] + p.at[1] * p.normal[1]);
        assert!(
            (rellich / (4.0 * 16.0 * root / 320.0) - 1.0).abs() < 1e-7,
            "{rellich}"
        );
        let halves = curve.integrate_stretch(0, 1.0, 5.0, 1, |_| 1.0)
            + curve.integrate_stretch(0, 5.0, 7.0, 1, |_| 1.0);
        assert!((halves / root - 1.0).abs() < 1e-7);
    }

    #[test]
    fn the_power_of_a_re_entrant_corner_is_integrated_up_to_the_corner() {
        // A wedge of 270 degrees with both sides of length one, closed far away.
        let wedge = Outline::single(vec![
            [1.0, 0.0],
            [1.0, 1.0],
            [-1.0, 1.0],
            [-1.0, -1.0],
            [0.0, -1.0],
            [0.0, 0.0],
        ]);
        // The particular part belongs to every solution with this corner. Without nodes around it only the
        // leading power is known, through samples one to four spacings away.
        let particular = 2.0 / (3.0 * std::f64::consts::PI);
        let shear = |p: Point| {
            let r = p[0].hypot(p[1]);
            r.powf(-1.0 / 3.0) - particular * r * r.ln()
        };
        let curve = curve(&wedge, 0.01, shear);
        let (r, log) = (0.4_f64, 0.4_f64.ln());
        let one = 1.5 * r.powf(2.0 / 3.0) - particular * r * r * (0.5 * log - 0.25);
        let both = curve.integrate_stretch(0, 7.0 - r, 7.0 + r, 1, |_| 1.0);
        assert!((both / (2.0 * one) - 1.0).abs() < 5e-4, "{both}");
        let cross = r.powf(5.0 / 3.0) * (0.6 * log - 0.36);
        let last = particular.powi(2) * r.powi(3) / 3.0 * (log * log - 2.0 * log / 3.0 + 2.0 / 9.0);
        let square = 3.0 * r.cbrt() - 2.0 * particular * cross + last;
        let both = curve.integrate_stretch(0, 7.0 - r, 7.0 + r, 2, |_| 1.0);
        assert!((both / (2.0 * square) - 1.0).abs() < 5e-3, "{both}");
    }
}
