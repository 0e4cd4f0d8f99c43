//! Wall shear beside a corner: the expansion of the solution in a wedge.
//!
//! Between two straight sides that meet at the fluid angle `omega`, the solution of `-lap(phi) = 1` is a
//! particular one plus the terms `c_k r^(k pi/omega) sin(k pi theta/omega)`, so on either side
//! `abs(dphi/dn) = p(r) + sum of c_k r^(k pi/omega - 1)`, with `p = (r/2) tan(omega)`, and
//! `-(2/pi) r ln r` at a right angle, `-(2/(3 pi)) r ln r` at three of them. The coefficients are fitted to
//! samples a few spacings away from a convex corner, where the grid resolves the expansion; those of a
//! re-entrant one come from the nodes around it (module `corner_field`). The error of the grid
//! itself looks like `r^(-pi/omega - 1)` beside a re-entrant corner and like `r^(pi/omega - 3)` beside an
//! obtuse or right one; that term is fitted along and taken off the samples.
//!
//! Source: the wedge expansion is that of V. A. Kondratiev (1967); the particular solution follows by
//! inserting it (both from memory).

use std::f64::consts::{FRAC_PI_2, PI};

use nalgebra::{DMatrix, DVector};

/// Largest exponent that is kept: beyond it the shear is as smooth as elsewhere on the wall.
const LARGEST_EXPONENT: f64 = 3.0;
/// The same at a re-entrant corner.
const LARGEST_SINGULAR: f64 = 2.0;
/// Leading exponent below which a convex corner is not acute; 1 at the right angle.
const RIGHT_ANGLE: f64 = 1.001;
/// Largest fluid angle, radians: a crack is no corner of a section.
pub(super) const LARGEST_ANGLE: f64 = 1.95 * PI;
/// Difference from a right angle, radians, below which the logarithm stands for the difference of powers.
const RESONANCE: f64 = 1e-4;

/// Shear beside a corner, for one of its sides.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct CornerLaw {
    /// Exponent of the leading power, `pi/omega - 1`.
    pub(crate) leading: f64,
    angle: f64,
    /// Its tangent.
    tangent: f64,
    /// Unit of length of the fit, m.
    unit: f64,
    /// Coefficients of the powers `k pi/omega - 1` and `k pi/omega` of `r / unit` for `k` = 1, 2, ..., in m.
    powers: Vec<[f64; 2]>,
    /// Coefficient of the grid's own error, m.
    of_grid: f64,
    /// Largest distance in the fit, m.
    reach: f64,
}

impl CornerLaw {
    /// The law of a convex corner fitted to samples on one side.
    ///
    /// - `angle`: on the fluid side, radians; `unit`: a length near that of the samples' distances, m
    /// - `samples`: distance from the corner, and shear, m
    pub(crate) fn fit(angle: f64, unit: f64, samples: &[(f64, f64)]) -> Self {
        let angle = angle.min(LARGEST_ANGLE);
        let first = PI / angle;
        let leading = first - 1.0;
        let mut law = Self {
            leading,
            angle,
            tangent: angle.tan(),
            unit,
            powers: Vec::new(),
            of_grid: 0.0,
            reach: samples.iter().fold(0.0, |reach, s| f64::max(reach, s.0)),
        };
        // In the order in which they are given up where samples are few.
        let mut exponents = vec![(1, leading)];
        exponents.extend(law.grid_exponent().map(|e| (0, e)));
        exponents.extend((2..=6).map(|k| (k, k as f64 * first - 1.0)));
        exponents.retain(|e| e.1 <= LARGEST_EXPONENT);
        exponents.truncate(samples.len() / 2);
        if exponents.is_empty() {
            return law;
        }
        let matrix = DMatrix::from_fn(samples.len(), exponents.len(), |row, column| {
            (samples[row].0 / unit).powf(exponents[column].1)
        });
        let wanted = DVector::from_fn(samples.len(), |row, _| {
            (samples[row].1 - law.particular(samples[row].0)) / unit
        });
        if let Ok(found) = matrix.svd(true, true).solve(&wanted, 1e-12) {
            for (&(k, _), &c) in exponents.iter().zip(found.iter()) {
                if k == 0 {
                    law.of_grid = c * unit;
                } else {
                    law.powers.resize(k, [0.0; 2]);
                    law.powers[k - 1][0] = c * unit;
                }
            }
        }
        law
    }

    /// The leading power alone, through the mean of the samples: all that can be had of a corner that the
    /// grid hardly resolves.
    pub(crate) fn power(angle: f64, unit: f64, samples: &[(f64, f64)]) -> Self {
        let law = Self::of_terms(angle, unit, &[], 0.0);
        let basis = |r: f64| (r / unit).powf(law.leading);
        let (sum, of_basis) = samples.iter().fold((0.0, 0.0), |sum, &(r, v)| {
            (sum.0 + v - law.particular(r), sum.1 + basis(r))
        });
        if of_basis <= 0.0 {
            return law;
        }
        Self {
            powers: vec![[sum / of_basis, 0.0]],
            ..law
        }
    }

    /// The leading powers of a corner fitted to shear close to it that is free of the grid's error.
    pub(crate) fn through(angle: f64, unit: f64, samples: &[(f64, f64)]) -> Self {
        let law = Self::of_terms(angle, unit, &[], 0.0);
        let step = law.leading + 1.0;
        let exponents = [step - 1.0, step, 2.0 * step - 1.0];
        let count = exponents.len().min(samples.len());
        let weight = |r: f64| r.powf(-law.leading.min(0.0));
        let matrix = DMatrix::from_fn(samples.len(), count, |row, column| {
            let r = samples[row].0 / unit;
            weight(r) * r.powf(exponents[column])
        });
        let wanted = DVector::from_fn(samples.len(), |row, _| {
            let (r, v) = samples[row];
            weight(r / unit) * (v - law.particular(r))
        });
        let Ok(found) = matrix.svd(true, true).solve(&wanted, 1e-9) else {
            return Self::power(angle, unit, samples);
        };
        let at = |k: usize| found.get(k).copied().unwrap_or(0.0);
        Self {
            powers: vec![[at(0), at(1)], [at(2), 0.0]],
            ..law
        }
    }

    /// The law with known powers.
    ///
    /// - `powers`: coefficients of the powers `k pi/omega - 1` and `k pi/omega` of `r / unit`, m; those that are
    ///   as smooth as the wall elsewhere are left out
    /// - `of_grid`: coefficient of the grid's own error, m
    pub(crate) fn of_terms(angle: f64, unit: f64, powers: &[[f64; 2]], of_grid: f64) -> Self {
        let law = Self::fit(angle, unit, &[]);
        let kept = |exponent: f64, c: f64| {
            if exponent <= LARGEST_SINGULAR { c } else { 0.0 }
        };
        let powers = (1..).zip(powers).map(|(k, [plain, bent])| {
            let exponent = f64::from(k) * (law.leading + 1.0);
            [kept(exponent - 1.0, *plain), kept(exponent, *bent)]
        });
        let mut powers: Vec<[f64; 2]> = powers.collect();
        while powers.last().is_some_and(|c| c.iter().all(|&c| c == 0.0)) {
            powers.pop();
        }
        Self {
            powers,
            of_grid,
            ..law
        }
    }

    /// The law with the distance over which the grid's own error fades, m.
    pub(crate) fn with_reach(self, reach: f64) -> Self {
        Self { reach, ..self }
    }

    /// Exponent of the error that the grid makes around the corner: that of the whole solution at a
    /// re-entrant corner, that of the five-point scheme at a convex one that is not acute.
    fn grid_exponent(&self) -> Option<f64> {
        if self.leading < 0.0 {
            Some(-self.leading - 2.0)
        } else {
            (self.leading < RIGHT_ANGLE).then_some(self.leading - 2.0)
        }
    }

    /// What the grid adds to samples at a distance from the corner, m; fades out over the reach of the fit.
    pub(crate) fn grid_error(&self, distance: f64) -> f64 {
        let share = distance / self.reach;
        match self.grid_exponent() {
            Some(exponent) if share < 1.0 => {
                let fade = (1.0 - share * share).powi(2);
                fade * self.of_grid * (distance / self.unit).powf(exponent)
            }
            _ => 0.0,
        }
    }

    /// Shear at a distance from the corner, m; without bound towards a re-entrant corner.
    pub(crate) fn value(&self, distance: f64) -> f64 {
        let first = self.powers.first().map_or(0.0, |c| c[0]);
        if distance <= 0.0 {
            return if self.leading < 0.0 && first != 0.0 {
                f64::INFINITY * first
            } else {
                0.0
            };
        }
        let x = distance / self.unit;
        let logarithm = x.ln();
        let leading = (self.leading * logarithm).exp();
        let step = leading * x;
        let sum = self
            .powers
            .iter()
            .rev()
            .fold(0.0, |sum, [plain, bent]| sum * step + (plain + bent * x));
        self.particular_at(x, logarithm) + leading * sum
    }

    /// The part that no power of the expansion makes up, m.
    fn particular(&self, distance: f64) -> f64 {
        if distance <= 0.0 {
            return 0.0;
        }
        let x = distance / self.unit;
        self.particular_at(x, x.ln())
    }

    /// The same from the distance in units of the fit, and its logarithm.
    fn particular_at(&self, x: f64, logarithm: f64) -> f64 {
        let odd = if self.angle < PI { 1.0 } else { 3.0 };
        let resonant = odd * FRAC_PI_2;
        if (self.angle - resonant).abs() < RESONANCE {
            return -self.unit * x * logarithm / resonant;
        }
        let exponent = odd * PI / self.angle - 1.0;
        let tangent = 0.5 * self.tangent * self.unit;
        if exponent > LARGEST_EXPONENT {
            return tangent * x;
        }
        // The power belongs to the expansion and keeps the sum of both moderate near the right angle.
        -tangent * x * ((exponent - 1.0) * logarithm).exp_m1()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_law_of_a_known_wedge_comes_back() {
        for (degrees, c) in [(90.0_f64, 0.3), (60.0, 0.2), (120.0, 0.7), (150.0, 0.4)] {
            let angle = degrees.to_radians();
            let exact = |r: f64| {
                let powers = [(1.0, c), (3.0, 0.1)].map(|(k, c)| {
                    let exponent = k * PI / angle - 1.0;
                    if exponent <= LARGEST_EXPONENT {
                        c * r.powf(exponent)
                    } else {
                        0.0
                    }
                });
                CornerLaw::fit(angle, 1.0, &[]).particular(r) + powers[0] + powers[1]
            };
            let samples: Vec<(f64, f64)> = (4..24)
                .map(|k| 0.5 * f64::from(k))
                .map(|r| (r, exact(r)))
                .collect();
            let law = CornerLaw::fit(angle, 1.0, &samples);
            for r in [0.01, 0.3, 1.0, 5.0] {
                let off = law.value(r) / exact(r) - 1.0;
                assert!(off.abs() < 2e-2, "{degrees} deg at {r}: {off:e}");
            }
        }
    }

    #[test]
    fn the_particular_part_is_continuous_through_the_right_angles() {
        for (quarter, odd) in [(1.0, 1.0), (3.0, 3.0)] {
            let at = |off: f64| CornerLaw::fit(quarter * FRAC_PI_2 + off, 1.0, &[]).particular(0.4);
            let exact = -0.4 * 0.4_f64.ln() * 2.0 / (odd * PI);
            for off in [-1.1e-4, 0.0, 1.1e-4] {
                assert!((at(off) / exact - 1.0).abs() < 2e-3, "{quarter} {off}");
            }
        }
    }
}
