//! Straight pieces of wall between two corners, and what a layer on them adds to the potential.
//!
//! With `g = ln r / (2 pi)`, `t` along a panel of length `L` and the place at the distance `d` behind it (on the side
//! it has on its right), `ln r` and `d / r^2` have closed integrals; from [`FAR`] lengths away their expansion about
//! the middle up to `L^2` stands for them, within 1e-4 of the change along the panel.

use std::f64::consts::{PI, TAU};

use crate::geometry::{Corner, Point, distance};
use crate::grid::Lattice;

use super::corner_law::LARGEST_ANGLE;
use super::wall_path::WallPath;

/// Ends of panels from a corner, spacings.
const GRADED: [f64; 11] = [0.0, 0.06, 0.12, 0.24, 0.4, 0.6, 0.9, 1.2, 1.6, 2.0, 2.5];
/// Length of the panels beyond, spacings.
const STEP: f64 = 0.5;
/// Places from a corner between which the factor of the powers is linear, spacings.
const PLACES: [f64; 4] = [0.0, 0.4, 1.6, 3.5];
/// Distance of the places beyond, spacings.
const PLACE_STEP: f64 = 2.0;
/// Panels whose ends are nearer to each other than this are one, spacings.
const SAME_END: f64 = 1e-3;
/// Distance from a corner up to which its power stands in the shear, spacings.
const POWER_REACH: f64 = 8.0;
/// Distance from the middle of a panel, in its lengths, from which the expansion about the middle is used.
const FAR: f64 = 4.0;

/// A stretch of wall from corner to corner, or a whole loop; lengths in spacings.
pub(super) struct LayerStretch {
    pub(super) loop_index: usize,
    /// Arc length of its start, m.
    pub(super) start: f64,
    pub(super) length: f64,
    /// Exponents of the shear at both ends.
    powers: [f64; 2],
    /// Distances from the start.
    places: Vec<f64>,
    /// Index of the first place among those of all stretches.
    first: usize,
}

impl LayerStretch {
    /// - `ends`: corners at the start and the end, `None` for a loop without any
    /// - `start`, `length`: m; `first`: index of its first place
    pub(super) fn new(
        loop_index: usize,
        ends: Option<[&Corner; 2]>,
        (start, length, spacing): (f64, f64, f64),
        first: usize,
    ) -> Self {
        let length = length / spacing;
        let power = |c: &Corner| (PI / c.fluid_angle().min(LARGEST_ANGLE) - 1.0).min(1.0);
        Self {
            loop_index,
            start,
            length,
            powers: ends.map_or([0.0; 2], |ends| ends.map(power)),
            places: breaks(length, &PLACES, PLACE_STEP),
            first,
        }
    }

    /// Index of the first place of the next stretch.
    pub(super) fn next_first(&self) -> usize {
        self.first + self.places.len()
    }

    /// The leading powers of both corners at a distance from the start.
    pub(super) fn weight(&self, s: f64) -> f64 {
        let near = |r: f64, p: f64| (r.min(POWER_REACH) / POWER_REACH).powf(p);
        near(s, self.powers[0]) * near(self.length - s, self.powers[1])
    }

    /// Mean of the weight between two distances; each power has its own mean.
    fn mean_weight(&self, from: f64, to: f64) -> f64 {
        let mean = |a: f64, b: f64, p: f64| {
            if 0.5 * (a + b) >= POWER_REACH {
                return 1.0;
            }
            let rise = b.powf(p + 1.0) - a.powf(p + 1.0);
            rise / ((p + 1.0) * (b - a)) / POWER_REACH.powf(p)
        };
        mean(from, to, self.powers[0]) * mean(self.length - to, self.length - from, self.powers[1])
    }

    /// The places before and after a distance from the start, with their shares.
    pub(super) fn shares(&self, s: f64) -> [(usize, f64); 2] {
        let last = self.places.len() - 1;
        let next = self.places.partition_point(|&p| p <= s).clamp(1, last);
        let (a, b) = (self.places[next - 1], self.places[next]);
        let t = (s - a) / (b - a);
        let index = self.first + next;
        [(index - 1, 1.0 - t), (index, t)]
    }

    /// Its panels.
    ///
    /// - `stretch`: its index; `path`: of its loop
    pub(super) fn panels(&self, stretch: usize, path: &WallPath, lattice: &Lattice) -> Vec<Panel> {
        let mut ends = breaks(self.length, &GRADED, STEP);
        ends.extend(&self.places);
        ends.sort_by(f64::total_cmp);
        ends.dedup_by(|a, b| *a - *b < SAME_END * self.length.min(1.0));
        let at = |s: f64| lattice.coordinates(path.position(self.start + s * lattice.spacing));
        let panel = |pair: &[f64]| {
            let [from, to] = [pair[0], pair[1]];
            let mean = self.mean_weight(from, to);
            let shares = self.shares(0.5 * (from + to));
            Panel::new(stretch, [from, to], [at(from), at(to)])
                .map(|panel| panel.carrying(shares.map(|(k, share)| (k, share * mean))))
        };
        ends.windows(2).filter_map(panel).collect()
    }
}

/// Distances from the start: the graded ones from both ends and equal steps in the middle.
fn breaks(length: f64, graded: &[f64], step: f64) -> Vec<f64> {
    let half = 0.5 * length;
    let near = graded.iter().copied().filter(|&r| r < 0.8 * half);
    let mut first: Vec<f64> = near.collect();
    let last = first.last().copied().unwrap_or(0.0);
    let count = ((half - last) / step).round().max(1.0) as usize;
    first.extend((1..=count).map(|k| last + (half - last) * k as f64 / count as f64));
    let back: Vec<f64> = first.iter().rev().skip(1).map(|r| length - r).collect();
    first.extend(back);
    first
}

/// A straight piece of the wall, in spacings, with the fluid on its left.
#[derive(Clone, Copy)]
pub(super) struct Panel {
    /// Index of its stretch.
    pub(super) stretch: usize,
    /// Distances of its ends from the start of the stretch.
    pub(super) span: [f64; 2],
    pub(super) ends: [Point; 2],
    pub(super) length: f64,
    tangent: Point,
    /// Mean shear on it as shares of the factors at two places.
    pub(super) shares: [(usize, f64); 2],
}

/// Integrals over a panel for one place.
pub(super) struct Potential {
    /// Of `g`.
    pub(super) single: f64,
    /// Of `dg/dn` and of `t dg/dn`, with the normal out of the fluid and `t` from the start of the panel.
    pub(super) double: [f64; 2],
}

impl Panel {
    /// `None` without length.
    pub(super) fn new(stretch: usize, span: [f64; 2], ends: [Point; 2]) -> Option<Self> {
        let length = distance(ends[0], ends[1]);
        (length > 0.0).then(|| Self {
            stretch,
            span,
            ends,
            length,
            tangent: [0, 1].map(|axis| (ends[1][axis] - ends[0][axis]) / length),
            shares: [(0, 0.0); 2],
        })
    }

    fn carrying(self, shares: [(usize, f64); 2]) -> Self {
        Self { shares, ..self }
    }

    pub(super) fn middle(&self) -> Point {
        let [a, b] = self.ends;
        [0.5 * (a[0] + b[0]), 0.5 * (a[1] + b[1])]
    }

    /// Unit normal out of the fluid.
    pub(super) fn normal(&self) -> Point {
        [self.tangent[1], -self.tangent[0]]
    }

    /// The nearer of the squared distances of its ends and its middle from a place.
    pub(super) fn square_of_distance(&self, at: Point) -> f64 {
        let square = |p: Point| (p[0] - at[0]).powi(2) + (p[1] - at[1]).powi(2);
        let [a, b] = self.ends;
        square(a).min(square(b)).min(square(self.middle()))
    }

    pub(super) fn potential(&self, at: Point) -> Potential {
        let start = [self.ends[0][0] - at[0], self.ends[0][1] - at[1]];
        let normal = self.normal();
        let d = start[0] * normal[0] + start[1] * normal[1];
        let from = start[0] * self.tangent[0] + start[1] * self.tangent[1];
        let middle = from + 0.5 * self.length;
        let square = d * d + middle * middle;
        if square > FAR * FAR * self.length * self.length {
            self.far_potential(d, middle, square)
        } else {
            self.near_potential(d, from)
        }
    }

    /// The closed integrals; `from`: of the start along the panel, as seen from the place.
    fn near_potential(&self, d: f64, from: f64) -> Potential {
        let to = from + self.length;
        let [at_from, at_to] = [from, to].map(|t| (d * d + t * t).ln());
        let angle = (d * self.length).atan2(d * d + from * to);
        let single = 0.5 * (to * at_to - from * at_from) - self.length + d * angle;
        Potential {
            single: single / TAU,
            double: [
                angle / TAU,
                (0.5 * d * (at_to - at_from) - from * angle) / TAU,
            ],
        }
    }

    /// The integrands' values in the middle and their second derivatives there.
    fn far_potential(&self, d: f64, middle: f64, square: f64) -> Potential {
        let length = self.length;
        let inverse = 1.0 / square;
        let bend = length * length / 24.0 * inverse * inverse;
        let (across, along) = (d * d, middle * middle);
        let single = length * (0.5 * square.ln() + bend * (across - along));
        let angle = d * length * (inverse + bend * inverse * (6.0 * along - 2.0 * across));
        let moment = 0.5 * length * angle - 4.0 * bend * d * middle * length;
        Potential {
            single: single / TAU,
            double: [angle / TAU, moment / TAU],
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn panel() -> Panel {
        let panel = Panel::new(0, [0.0, 0.5], [[1.0, 2.0], [1.3, 2.4]]);
        panel.unwrap_or_else(|| unreachable!("it has a length"))
    }

    #[test]
    fn integrals_over_a_panel_are_those_of_a_fine_sum() {
        let panel = panel();
        for at in [
            [1.2, 2.1],
            [0.6, 2.2],
            [4.0, -1.0],
            [1.9, 4.4],
            [-20.0, 3.0],
        ] {
            let count = 200_000;
            let step = panel.length / f64::from(count);
            let mut sums = [0.0; 3];
            for k in 0..count {
                let t = (f64::from(k) + 0.5) * step;
                let x = panel.ends[0][0] + t * panel.tangent[0] - at[0];
                let y = panel.ends[0][1] + t * panel.tangent[1] - at[1];
                let square = x * x + y * y;
                let normal = panel.normal();
                let slope = (x * normal[0] + y * normal[1]) / square;
                sums[0] += 0.5 * square.ln() * step / TAU;
                sums[1] += slope * step / TAU;
                sums[2] += t * slope * step / TAU;
            }
            let found = panel.potential(at);
            let all = [found.single, found.double[0], found.double[1]];
            for (found, sum) in all.iter().zip(sums) {
                assert!((found - sum).abs() < 1e-5, "{at:?}: {found} {sum}");
            }
        }
    }

    #[test]
    fn breaks_are_in_order_and_end_with_the_stretch() {
        for length in [0.05, 0.9, 3.0, 14.0, 101.3] {
            for (graded, step) in [(&GRADED[..], STEP), (&PLACES[..], PLACE_STEP)] {
                let all = breaks(length, graded, step);
                assert!(all.windows(2).all(|pair| pair[0] < pair[1]), "{all:?}");
                assert!(all[0].abs() < 1e-12);
                assert!((all[all.len() - 1] - length).abs() < 1e-12 * length);
            }
        }
    }

    #[test]
    fn a_weight_has_the_powers_of_both_corners() {
        let corner = |turning: f64| Corner {
            arc_length: 0.0,
            at: [0.0; 2],
            turning,
        };
        let (re_entrant, convex) = (corner(-0.5 * PI), corner(0.5 * PI));
        let ends = Some([&re_entrant, &convex]);
        let stretch = LayerStretch::new(0, ends, (0.0, 10.0, 1.0), 7);
        let ratio = stretch.weight(0.002) / stretch.weight(0.001);
        assert!((ratio - 2.0_f64.powf(-1.0 / 3.0)).abs() < 1e-3, "{ratio}");
        let ratio = stretch.weight(9.998) / stretch.weight(9.999);
        assert!((ratio - 2.0).abs() < 1e-3, "{ratio}");
        let shares = stretch.shares(0.2);
        assert_eq!(shares.map(|s| s.0), [7, 8]);
        assert!((shares[0].1 - 0.5).abs() < 1e-12);
    }
}
