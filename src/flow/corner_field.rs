//! The law of a re-entrant corner from the nodes around it.
//!
//! Samples on the wall beside a re-entrant corner scatter and carry the error that the corner spreads over
//! the grid. The values at the nodes between three and twelve spacings away are many more and smoother: the
//! expansion of the solution in the wedge, `phi_p + sum of a_k r^(k pi/omega) sin(k pi theta/omega)`, is
//! fitted to them by least squares, with `r^(-pi/omega) sin(pi theta/omega)` for the error of the grid. The
//! particular part is `-r^2/4 + r^2 cos(2 theta - omega)/(4 cos omega)`, less its resonant term.

use std::f64::consts::{PI, TAU};

use nalgebra::{SMatrix, SVector};

use crate::geometry::{Corner, Point};
use crate::grid::{Lattice, Mask};
use crate::solve::Field;

use super::corner_law::CornerLaw;
use super::wall_path::WallPath;

/// Nodes nearer to the corner than this are not resolved, spacings.
const NEAREST: f64 = 3.0;
/// Nodes farther than this are left out, spacings.
const FARTHEST: f64 = 12.0;
/// Least radius of the fit, spacings.
const LEAST_RADIUS: f64 = 4.5;
/// Share of the distance to the next corner or wall that the fit may use.
const SHARE: f64 = 0.7;
/// Nodes nearer to a side than this do not show whether another wall is near, spacings.
const BESIDE: f64 = 1.0;
/// Distance of the nearer of two places that give the direction of a side, spacings.
const SHORT_CHORD: f64 = 2.0;
/// Largest change of the direction to the wall over the reach, radians.
const MOST_BENT: f64 = 0.35;
/// Farthest that a side may lie off its smooth description, spacings.
const ROUGH: f64 = 0.15;
/// Least sine of the fluid angle with which bent sides can be allowed for.
const LEAST_SINE: f64 = 0.2;
/// Change of the direction over the reach up to which a side is straight, radians.
const STRAIGHT: f64 = 0.02;
/// Powers of the expansion that are fitted, and one term for the grid.
const POWERS: usize = 6;
const TERMS: usize = POWERS + 1;
/// Difference from three right angles, radians, below which the logarithm stands in the particular part.
const RESONANCE: f64 = 1e-4;

/// A wedge with its corner at the origin of polar coordinates; the fluid from `theta` = 0 to `angle`. Its
/// sides may be bent a little.
struct Wedge {
    at: Point,
    /// Direction of the side that leaves the corner, radians.
    first: f64,
    /// Fluid angle at the corner, radians.
    angle: f64,
    /// Change of the direction to the wall along both sides, radians per spacing.
    bends: [f64; 2],
    spacing: f64,
}

/// Laws of the sides after and before a re-entrant corner; `None` where the grid is too coarse around it.
///
/// - `room`: wall without another corner on either side, m
pub(crate) fn corner_laws(
    (lattice, mask, phi): (&Lattice, &Mask, &Field),
    path: &WallPath,
    corner: &Corner,
    room: f64,
) -> Option<[CornerLaw; 2]> {
    let spacing = lattice.spacing;
    let reach = (SHARE * room / spacing).min(FARTHEST);
    if reach < LEAST_RADIUS {
        return None;
    }
    let wedge = Wedge::new(path, corner, reach, spacing);
    let bent = reach * wedge.bends[0].abs().max(wedge.bends[1].abs());
    let is_flat = wedge.angle.sin().abs() < LEAST_SINE;
    if wedge.angle <= PI || bent > MOST_BENT || (is_flat && bent > STRAIGHT) {
        return None;
    }
    if !wedge.describes(path, corner, reach) {
        return None;
    }
    let (values, radius) = wedge.nodes(lattice, mask, phi, reach);
    if radius < LEAST_RADIUS {
        return None;
    }
    let mut matrix = SMatrix::<f64, TERMS, TERMS>::zeros();
    let mut wanted = SVector::<f64, TERMS>::zeros();
    let mut count = 0;
    for (r, theta, value) in values.into_iter().filter(|v| v.0 <= radius) {
        let row = wedge.row(r, radius, theta);
        matrix += row * row.transpose();
        wanted += row * (value - wedge.particular(r, theta));
        count += 1;
    }
    if count < 4 * TERMS {
        return None;
    }
    let found = matrix.cholesky()?.solve(&wanted);
    // From the radius to the spacing as the unit of length.
    let step = PI / wedge.angle;
    let coefficient = |k: f64, a: f64| a * radius.powf(-k * step) * k * step * spacing;
    let side = |sign: f64| {
        let powers: Vec<[f64; 2]> = (1..=POWERS)
            .map(|k| {
                let flip = if k % 2 == 0 { sign } else { 1.0 };
                let k = k as f64;
                let exponent = k * step;
                let plain = flip * coefficient(k, found[k as usize]);
                let bent = plain * (exponent + 1.0) * wedge.bend_of_shear(sign);
                [plain, bent]
            })
            .collect();
        let of_grid = -found[0] * radius.powf(step) * step * spacing;
        CornerLaw::of_terms(wedge.angle, spacing, &powers, of_grid)
    };
    Some([side(1.0), side(-1.0)])
}

/// Whether both sides of a corner stay near a straight or gently bent line over a distance, m.
pub(crate) fn is_wedge(path: &WallPath, corner: &Corner, reach: f64, spacing: f64) -> bool {
    let reach = reach / spacing;
    reach > 2.0 * SHORT_CHORD
        && Wedge::new(path, corner, reach, spacing).describes(path, corner, reach)
}

impl Wedge {
    fn new(path: &WallPath, corner: &Corner, reach: f64, spacing: f64) -> Self {
        // Direction at the corner and its change with the distance, from two chords.
        let side = |way: f64| {
            let chord = |r: f64| {
                let p = path.position(corner.arc_length + way * r * spacing);
                (p[1] - corner.at[1]).atan2(p[0] - corner.at[0])
            };
            let near = chord(SHORT_CHORD);
            let turn = (chord(reach) - near + PI).rem_euclid(TAU) - PI;
            let slope = turn / (reach - SHORT_CHORD);
            (near - SHORT_CHORD * slope, slope)
        };
        let (first, last) = (side(1.0), side(-1.0));
        Self {
            at: corner.at,
            first: first.0,
            angle: (last.0 - first.0).rem_euclid(TAU),
            bends: [first.1, last.1],
            spacing,
        }
    }

    /// Whether both sides stay near their smooth description.
    fn describes(&self, path: &WallPath, corner: &Corner, reach: f64) -> bool {
        let steps = (2.0 * reach).floor() as usize;
        (1..=steps).all(|k| {
            let r = 0.5 * k as f64;
            let sides = [(1.0, 0.0, self.bends[0]), (-1.0, self.angle, self.bends[1])];
            sides.iter().all(|(way, angle, bend)| {
                let p = path.position(corner.arc_length + way * r * self.spacing);
                let found = (p[1] - self.at[1]).atan2(p[0] - self.at[0]);
                let off = found - (self.first + angle + bend * r);
                let off = (off + PI).rem_euclid(TAU) - PI;
                off.abs() * r < ROUGH
            })
        })
    }

    /// What bent sides add to a power: for `sin(a theta)` the sine and the cosine of `(a + 1) theta` with
    /// these factors times `a r`, so that the sum vanishes on both sides to first order.
    fn bending(&self) -> [f64; 2] {
        let (sine, cosine) = self.angle.sin_cos();
        let [first, last] = self.bends;
        [(first * cosine - last) / sine, -first]
    }

    /// Shear that bent sides add to a power `r^(a - 1)`, as a factor of `(a + 1) r`, on the first side for
    /// a positive sign, on the other for a negative one.
    fn bend_of_shear(&self, sign: f64) -> f64 {
        let [sine, cosine] = self.bending();
        if sign > 0.0 {
            sine
        } else {
            sine * self.angle.cos() - cosine * self.angle.sin()
        }
    }

    /// Distance in spacings and angle of the nodes in the annulus with their values in squared spacings,
    /// and the radius up to which there is no other wall.
    fn nodes(
        &self,
        lattice: &Lattice,
        mask: &Mask,
        phi: &Field,
        reach: f64,
    ) -> (Vec<(f64, f64, f64)>, f64) {
        let centre = lattice.coordinates(self.at);
        let range = |axis: usize| {
            let low = (centre[axis] - reach).ceil().max(0.0) as u32;
            low..=(centre[axis] + reach).floor().max(0.0) as u32
        };
        let mut radius = reach;
        let mut values = Vec::new();
        for j in range(1) {
            for i in range(0) {
                let (x, y) = (f64::from(i) - centre[0], f64::from(j) - centre[1]);
                let r = x.hypot(y);
                if r > reach {
                    continue;
                }
                let [low, high] = [r * self.bends[0], self.angle + r * self.bends[1]];
                // Between the two bent sides, of which the first may lie below zero.
                let theta = (y.atan2(x) - self.first - low).rem_euclid(TAU) + low;
                if theta > high {
                    continue;
                }
                if let Some((colour, node)) = mask.node_at(i, j) {
                    let value = phi.colour[colour as usize].get(node as usize);
                    if let Some(&value) = value.filter(|_| r >= NEAREST) {
                        values.push((r, theta, value));
                    }
                } else if r * (theta - low).min(high - theta).min(1.0) > BESIDE {
                    radius = radius.min(SHARE * r);
                }
            }
        }
        (values, radius)
    }

    /// The term of the grid and the powers, at a distance in spacings, as shares of their size at a radius.
    fn row(&self, r: f64, radius: f64, theta: f64) -> SVector<f64, TERMS> {
        let step = PI / self.angle;
        let [sine, cosine] = self.bending();
        SVector::from_fn(|k, _| {
            let exponent = if k == 0 { -step } else { k as f64 * step };
            let next = (exponent + 1.0) * theta;
            let bent = exponent * r * (sine * next.sin() + cosine * next.cos());
            (r / radius).powf(exponent) * ((exponent * theta).sin() + bent)
        })
    }

    /// The particular part whose shear is that of [`CornerLaw`], at a distance in spacings.
    fn particular(&self, r: f64, theta: f64) -> f64 {
        let square = r * r;
        let (sine, cosine) = (2.0 * theta).sin_cos();
        if (self.angle - 1.5 * PI).abs() < RESONANCE {
            let resonant = sine / 2.0 - r.ln() * sine - theta * cosine;
            return square * (0.25 * (cosine - 1.0) + resonant / (3.0 * PI));
        }
        let step = 3.0 * PI / self.angle;
        let wave = (2.0 * theta - self.angle).cos() / (4.0 * self.angle.cos());
        let removed = 0.5 * self.angle.tan() / step * r.powf(step) * (step * theta).sin();
        square * (wave - 0.25) - removed
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_particular_part_vanishes_on_both_sides_and_solves_the_equation() {
        for degrees in [200.0_f64, 260.0, 270.0, 300.0] {
            let wedge = Wedge {
                at: [0.0; 2],
                first: 0.0,
                bends: [0.0; 2],
                angle: degrees.to_radians(),
                spacing: 1.0,
            };
            for r in [0.5, 3.0, 11.0] {
                assert!(wedge.particular(r, 0.0).abs() < 1e-9 * r * r);
                assert!(
                    wedge.particular(r, wedge.angle).abs() < 1e-9 * r * r,
                    "{degrees} {r}"
                );
            }
            let at = |x: f64, y: f64| wedge.particular(x.hypot(y), y.atan2(x).rem_euclid(TAU));
            let (x, y, h) = (-1.3, 0.9, 1e-3);
            let sum = at(x + h, y) + at(x - h, y) + at(x, y + h) + at(x, y - h);
            let laplacian = (sum - 4.0 * at(x, y)) / (h * h);
            assert!((laplacian + 1.0).abs() < 1e-5, "{degrees}: {laplacian}");
            // Its slope on the first side is the particular part of the law.
            let slope = wedge.particular(2.0, 1e-6) / 2e-6;
            let law = CornerLaw::of_terms(wedge.angle, 1.0, &[], 0.0).value(2.0);
            assert!((slope - law).abs() < 1e-4, "{degrees}: {slope} {law}");
        }
    }
}
