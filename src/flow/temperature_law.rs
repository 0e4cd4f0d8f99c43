//! The resistance over temperature as a few coefficients, with the largest error of the fit.
//!
//! A resistance follows the viscosity, `R(T) / R(T0) = mu(T) / mu(T0)`, so one law serves every section:
//! `R(T) = R(T0) exp(c1 x + c2 x^2 + ...)` with `x = T0 / T - 1`. The logarithm of a liquid's viscosity is
//! nearly straight over `1 / T` (Andrade 1930, Nature 125, 309; from memory), so few terms are enough. Fitted
//! by least squares on Chebyshev points, which keeps the largest error close to the least possible one, and
//! measured on a grid of its own. Temperatures in K.

use nalgebra::{DMatrix, DVector};

use super::fluid::{Fluid, FluidError};

/// Most coefficients of a law.
pub const MOST_COEFFICIENTS: usize = 4;
/// Largest relative error up to which a coefficient less is enough.
pub const LAW_ERROR: f64 = 5e-4;
/// Points of the fit, and places between the ends at which its error is looked for.
const FIT_POINTS: usize = 32;
const CHECK_POINTS: usize = 1000;

/// `R(T) / R(T0)` of one fluid between two temperatures.
#[derive(Debug, Clone, PartialEq)]
pub struct TemperatureLaw {
    /// Reference temperature `T0`, K.
    pub reference: f64,
    /// Lowest temperature, K.
    pub low: f64,
    /// Highest temperature, K.
    pub high: f64,
    /// `c1`, `c2`, and so on, without a unit.
    pub coefficients: Vec<f64>,
    /// Largest relative error against the fluid's own formula between `low` and `high`.
    pub largest_relative_error: f64,
}

/// Why there is no law.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum TemperatureLawError {
    /// The viscosity is known at one temperature only.
    #[error("the viscosity of the fluid is known at one temperature only")]
    OneTemperature,
    /// The range has no width, or is turned round.
    #[error(
        "the temperatures {low} K to {high} K are no range: the second must be above the first"
    )]
    NoRange {
        /// Lowest temperature, K.
        low: f64,
        /// Highest temperature, K.
        high: f64,
    },
    /// The reference lies outside the range.
    #[error("the temperature of the fluid, {reference} K, is outside {low} K to {high} K")]
    ReferenceOutside {
        /// Reference temperature, K.
        reference: f64,
        /// Lowest temperature, K.
        low: f64,
        /// Highest temperature, K.
        high: f64,
    },
    /// The range leaves that of the fluid's formula.
    #[error(transparent)]
    Fluid(#[from] FluidError),
}

impl TemperatureLaw {
    /// The law of a fluid whose viscosity is known over temperature.
    ///
    /// - `fluid`: at the reference temperature
    /// - `range`: lowest and highest temperature, K; the reference lies between them
    ///
    /// The fewest coefficients whose largest error is at most [`LAW_ERROR`], else [`MOST_COEFFICIENTS`].
    ///
    /// # Accuracy
    /// Water, 5 to 60 C: three coefficients, 4.5e-4 against IAPWS SR6-08 (tests of this module).
    ///
    /// # Errors
    /// [`TemperatureLawError`] for a fluid given by its numbers, and for a range that is none or leaves that
    /// of the fluid's formula.
    ///
    /// # Examples
    /// ```
    /// use etchwise::flow::{Fluid, TemperatureLaw};
    /// let water = Fluid::water(298.15)?;
    /// let law = TemperatureLaw::of(&water, [278.15, 333.15])?;
    /// let exact = Fluid::water(310.15)?.viscosity / water.viscosity;
    /// assert!((law.factor(310.15) / exact - 1.0).abs() < 5e-4);
    /// # Ok::<(), Box<dyn std::error::Error>>(())
    /// ```
    pub fn of(fluid: &Fluid, range: [f64; 2]) -> Result<Self, TemperatureLawError> {
        let [low, high] = range;
        let reference = fluid
            .temperature
            .filter(|_| fluid.knows_temperatures())
            .ok_or(TemperatureLawError::OneTemperature)?;
        if low.partial_cmp(&high) != Some(std::cmp::Ordering::Less) {
            return Err(TemperatureLawError::NoRange { low, high });
        }
        if !(low..=high).contains(&reference) {
            return Err(TemperatureLawError::ReferenceOutside {
                reference,
                low,
                high,
            });
        }
        let logarithm = |temperature: f64| -> Result<f64, FluidError> {
            let other = fluid.at_temperature(temperature)?;
            Ok((other.viscosity / fluid.viscosity).ln())
        };
        let fitted = chebyshev_points(range)
            .map(|t| Ok((reference / t - 1.0, logarithm(t)?)))
            .collect::<Result<Vec<_>, FluidError>>()?;
        let checked = (0..=CHECK_POINTS)
            .map(|k| {
                let t = low + (high - low) * k as f64 / CHECK_POINTS as f64;
                Ok((t, logarithm(t)?))
            })
            .collect::<Result<Vec<_>, FluidError>>()?;
        let mut law = Self {
            reference,
            low,
            high,
            coefficients: Vec::new(),
            largest_relative_error: f64::INFINITY,
        };
        for terms in 1..=MOST_COEFFICIENTS {
            law.coefficients = least_squares(&fitted, terms);
            let error = |&(t, exact): &(f64, f64)| (law.factor(t).ln() - exact).exp_m1().abs();
            law.largest_relative_error = checked.iter().map(error).fold(0.0, f64::max);
            if law.largest_relative_error <= LAW_ERROR {
                break;
            }
        }
        Ok(law)
    }

    /// `R(T) / R(T0)`.
    ///
    /// - `temperature`: K; the law says nothing outside `low` to `high`
    pub fn factor(&self, temperature: f64) -> f64 {
        let x = self.reference / temperature - 1.0;
        let sum = self
            .coefficients
            .iter()
            .rev()
            .fold(0.0, |sum, c| (sum + c) * x);
        sum.exp()
    }

    /// The law in words of arithmetic.
    pub fn formula(&self) -> String {
        let term = |k: usize| match k {
            1 => "c1 x".to_owned(),
            _ => format!("c{k} x^{k}"),
        };
        let terms: Vec<String> = (1..=self.coefficients.len()).map(term).collect();
        format!("R(T) = R(T0) exp({}), x = T0/T - 1", terms.join(" + "))
    }
}

/// Chebyshev points of a range.
fn chebyshev_points([low, high]: [f64; 2]) -> impl Iterator<Item = f64> {
    (0..FIT_POINTS).map(move |k| {
        let angle = std::f64::consts::PI * (k as f64 + 0.5) / FIT_POINTS as f64;
        0.5 * (low + high) - 0.5 * (high - low) * angle.cos()
    })
}

/// Coefficients of `x`, `x^2`, and so on.
fn least_squares(points: &[(f64, f64)], terms: usize) -> Vec<f64> {
    // Column by column: x, x^2, and so on.
    let powers = (1..)
        .take(terms)
        .flat_map(|power| points.iter().map(move |p| p.0.powi(power)));
    let matrix = DMatrix::from_iterator(points.len(), terms, powers);
    let right = DVector::from_iterator(points.len(), points.iter().map(|p| p.1));
    matrix
        .svd(true, true)
        .solve(&right, f64::EPSILON)
        .map_or_else(
            |_| vec![0.0; terms],
            |found| found.iter().copied().collect(),
        )
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn water_from_5_to_60_c_needs_three_coefficients_for_a_twentieth_of_a_per_cent() {
        for celsius in [20.0, 25.0, 37.0] {
            let water = Fluid::water(273.15 + celsius).unwrap();
            let law = TemperatureLaw::of(&water, [278.15, 333.15]).unwrap();
            assert_eq!(law.coefficients.len(), 3);
            assert!(law.largest_relative_error <= 5e-4);
            // Against the release's formula at places that are neither fitted nor checked.
            for k in 0..777 {
                let t = 278.15 + 55.0 * (f64::from(k) + 0.31) / 777.0;
                let exact = Fluid::water(t).unwrap().viscosity / water.viscosity;
                let error = (law.factor(t) / exact - 1.0).abs();
                assert!(
                    error <= law.largest_relative_error * (1.0 + 1e-3),
                    "{t}: {error}"
                );
            }
        }
    }

    #[test]
    fn a_wide_range_takes_four_coefficients_and_says_its_error() {
        let water = Fluid::water(298.15).unwrap();
        let law = TemperatureLaw::of(&water, [273.15, 363.15]).unwrap();
        assert_eq!(law.coefficients.len(), 4);
        // Computed with independent code: 2.25e-4.
        assert!((law.largest_relative_error / 2.25e-4 - 1.0).abs() < 0.02);
        let widest = TemperatureLaw::of(&water, [253.2, 383.1]).unwrap();
        assert!(widest.largest_relative_error > LAW_ERROR);
    }

    #[test]
    fn air_follows_its_own_law() {
        let air = Fluid::dry_air(293.15, 101_325.0).unwrap();
        let law = TemperatureLaw::of(&air, [273.15, 373.15]).unwrap();
        assert!(law.largest_relative_error < LAW_ERROR);
        assert!(law.factor(350.0) > 1.0);
    }

    #[test]
    fn what_has_no_law_says_why() {
        let oil = Fluid::custom(0.05, Some(900.0)).unwrap();
        let range = [278.15, 333.15];
        assert_eq!(
            TemperatureLaw::of(&oil, range),
            Err(TemperatureLawError::OneTemperature)
        );
        let water = Fluid::water(298.15).unwrap();
        for (range, words) in [
            ([333.15, 278.15], "no range"),
            ([f64::NAN, 300.0], "no range"),
            ([300.0, 320.0], "outside"),
            ([250.0, 320.0], "IAPWS"),
        ] {
            let error = TemperatureLaw::of(&water, range).unwrap_err().to_string();
            assert!(error.contains(words), "{error}");
        }
    }
}
