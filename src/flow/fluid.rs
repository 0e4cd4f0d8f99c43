//! The fluid of an operating point: viscosity and density with the place they come from.
//!
//! Three ways in: water by temperature (IAPWS SR6-08, at 1e5 Pa), dry air by temperature and pressure
//! (Sutherland's law and the ideal gas law), or viscosity and density as given. Nothing is extrapolated:
//! outside its range a formula is an error. SI throughout: K, Pa, Pa s, kg/m^3.

/// A Newtonian fluid at one temperature.
#[derive(Debug, Clone, PartialEq)]
pub struct Fluid {
    /// Name for people.
    pub name: String,
    /// Temperature, K, when known.
    pub temperature: Option<f64>,
    /// Dynamic viscosity, Pa s.
    pub viscosity: f64,
    /// Density, kg/m^3, when known.
    pub density: Option<f64>,
    /// Where the properties come from.
    pub source: String,
}

/// Why a fluid was refused.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum FluidError {
    /// A property is zero, negative or not a number.
    #[error("the {quantity} of the fluid is {value} {unit}; it must be above zero and finite")]
    NotPositive {
        /// Which property.
        quantity: &'static str,
        /// The value as given.
        value: f64,
        /// Its unit.
        unit: &'static str,
    },
    /// The properties are known at one temperature only.
    #[error("the properties of the fluid were given as numbers, at one temperature only")]
    OneTemperature,
    /// A formula was asked outside its range.
    #[error(
        "{fluid}: the {quantity} {value} {unit} is outside {low} to {high} {unit} of {formula}"
    )]
    OutOfRange {
        /// Which fluid.
        fluid: &'static str,
        /// Which input.
        quantity: &'static str,
        /// The value as given.
        value: f64,
        /// Lower end of the range.
        low: f64,
        /// Upper end of the range.
        high: f64,
        /// Unit of value and range.
        unit: &'static str,
        /// The formula whose range it is.
        formula: &'static str,
    },
}

impl FluidError {
    /// What the user can do.
    pub fn hint(&self) -> String {
        match self {
            Self::NotPositive { quantity, .. } => {
                format!("give a {quantity} above zero, with its unit")
            }
            Self::OneTemperature => {
                "give viscosity and density at the temperature itself".to_owned()
            }
            Self::OutOfRange { quantity, .. } => format!(
                "check the unit of the {quantity}, or give viscosity and density of the fluid yourself"
            ),
        }
    }
}

/// Source text of water; also how a [`Fluid`] is known to be water.
const WATER_SOURCE: &str =
    "IAPWS SR6-08(2011), liquid water at 0.1 MPa (viscosity and density formulas)";
/// Temperatures between which IAPWS SR6-08 holds, K.
const WATER_RANGE: [f64; 2] = [253.15, 383.15];
/// Melting temperature of ice at 1e5 Pa, K, to the digits used here.
pub(crate) const WATER_FREEZES: f64 = 273.15;
/// Boiling temperature of water at 1e5 Pa, K (99.6 C; from memory, IAPWS-95).
pub(crate) const WATER_BOILS: f64 = 372.76;

/// Source text of dry air; also how a [`Fluid`] is known to be air.
const AIR_SOURCE: &str = "Sutherland's law with the constants of the U.S. Standard Atmosphere 1976; \
                          ideal gas density, R = 287.05 J/(kg K)";
/// Specific gas constant of dry air, J/(kg K), U.S. Standard Atmosphere 1976 (from memory).
const AIR_GAS_CONSTANT: f64 = 287.05;
/// Ratio of the specific heats of air near room temperature (textbook value, from memory).
const AIR_HEAT_RATIO: f64 = 1.4;
/// Factor of Sutherland's law for air, kg/(m s K^(1/2)).
const SUTHERLAND_FACTOR: f64 = 1.458e-6;
/// Sutherland temperature of air, K.
const SUTHERLAND_TEMPERATURE: f64 = 110.4;
/// Temperatures taken for air, K: Sutherland's law is within about 2 % there (from memory).
const AIR_TEMPERATURES: [f64; 2] = [200.0, 1000.0];
/// Pressures taken for air, Pa: the ideal gas law and a viscosity free of pressure are within about 1 % at
/// room temperature (from memory); far below, the gas is too thin for a continuum in any channel.
const AIR_PRESSURES: [f64; 2] = [1.0, 1e6];
/// Density below which a fluid given by its numbers is treated as a gas in cautions, kg/m^3: no liquid
/// used in channels is lighter (liquid hydrogen, the lightest but helium, has about 70; from memory).
const GAS_DENSITY: f64 = 50.0;

/// The state of a gas whose laws are known.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct GasState {
    /// Absolute pressure at which the density was taken, Pa.
    pub(crate) pressure: f64,
    /// Speed of sound, m/s.
    pub(crate) sound_speed: f64,
    /// Mean free path, m.
    pub(crate) mean_free_path: f64,
}

impl Fluid {
    /// Liquid water at 1e5 Pa by its temperature.
    ///
    /// Viscosity `mu = 280.68 t^-1.9 + 511.45 t^-7.7 + 61.131 t^-19.6 + 0.45903 t^-40` in uPa s with
    /// `t = T / 300 K`; density from the companion formula for the specific volume.
    ///
    /// - `temperature`: K, 253.15 to 383.15; below 273.15 and above 372.76 the liquid is
    ///   metastable, which [`super::validity_warnings`] says
    ///
    /// # Source
    /// IAPWS (2011), Revised Supplementary Release on Properties of Liquid Water at 1e5 Pa, SR6-08(2011);
    /// coefficients read in a public implementation, checked against the release's own table of values.
    ///
    /// # Errors
    /// [`FluidError::OutOfRange`] outside the temperatures above or when not a number.
    ///
    /// # Examples
    /// ```
    /// let water = etchwise::flow::Fluid::water(298.15)?;
    /// assert!((water.viscosity - 889.996774e-6).abs() < 1e-12);
    /// # Ok::<(), etchwise::flow::FluidError>(())
    /// ```
    pub fn water(temperature: f64) -> Result<Self, FluidError> {
        let [low, high] = WATER_RANGE;
        // Ends given in degrees Celsius are off by rounding.
        let rounding = 1e-9;
        if !(temperature >= low - rounding && temperature <= high + rounding) {
            return Err(FluidError::OutOfRange {
                fluid: "water",
                quantity: "temperature",
                value: temperature,
                low,
                high,
                unit: "K",
                formula: "IAPWS SR6-08(2011)",
            });
        }
        Ok(Self {
            name: "water".to_owned(),
            temperature: Some(temperature),
            viscosity: water_viscosity(temperature),
            density: Some(water_density(temperature)),
            source: WATER_SOURCE.to_owned(),
        })
    }

    /// Dry air by temperature and absolute pressure.
    ///
    /// Viscosity `mu = 1.458e-6 T^(3/2) / (T + 110.4)` in Pa s, density `p / (287.05 T)`.
    ///
    /// - `temperature`: K, 200 to 1000
    /// - `pressure`: absolute, Pa, 1 to 1e6
    ///
    /// # Source
    /// Sutherland's law with the constants of the U.S. Standard Atmosphere 1976 (formula read in a public
    /// implementation); gas constant and ranges from memory.
    ///
    /// # Errors
    /// [`FluidError::OutOfRange`] outside these ranges or when not a number.
    ///
    /// # Examples
    /// ```
    /// let air = etchwise::flow::Fluid::dry_air(288.15, 101_325.0)?;
    /// assert!((air.viscosity - 1.789380e-5).abs() < 5e-12);
    /// # Ok::<(), etchwise::flow::FluidError>(())
    /// ```
    pub fn dry_air(temperature: f64, pressure: f64) -> Result<Self, FluidError> {
        let check = |quantity, value: f64, range: [f64; 2], unit, formula| {
            if (range[0]..=range[1]).contains(&value) {
                return Ok(());
            }
            Err(FluidError::OutOfRange {
                fluid: "dry air",
                quantity,
                value,
                low: range[0],
                high: range[1],
                unit,
                formula,
            })
        };
        check(
            "temperature",
            temperature,
            AIR_TEMPERATURES,
            "K",
            "Sutherland's law as used here",
        )?;
        check(
            "absolute pressure",
            pressure,
            AIR_PRESSURES,
            "Pa",
            "the ideal gas law as used here",
        )?;
        Ok(Self {
            name: "dry air".to_owned(),
            temperature: Some(temperature),
            viscosity: SUTHERLAND_FACTOR * temperature * temperature.sqrt()
                / (temperature + SUTHERLAND_TEMPERATURE),
            density: Some(pressure / (AIR_GAS_CONSTANT * temperature)),
            source: AIR_SOURCE.to_owned(),
        })
    }

    /// A fluid with viscosity and, when known, density as given.
    ///
    /// - `viscosity`: dynamic, Pa s, above zero
    /// - `density`: kg/m^3, above zero; without it there is no Reynolds number and no entrance length
    ///
    /// # Errors
    /// [`FluidError::NotPositive`] for a value that is zero, negative or not finite.
    ///
    /// # Examples
    /// ```
    /// use etchwise::flow::Fluid;
    /// assert!(Fluid::custom(1.2e-3, Some(1010.0)).is_ok());
    /// assert!(Fluid::custom(0.0, None).is_err());
    /// ```
    pub fn custom(viscosity: f64, density: Option<f64>) -> Result<Self, FluidError> {
        let fluid = Self {
            name: "fluid with given properties".to_owned(),
            temperature: None,
            viscosity,
            density,
            source: "given by the user".to_owned(),
        };
        fluid.validate()?;
        Ok(fluid)
    }

    /// Checks that viscosity, density and temperature are above zero and finite.
    ///
    /// # Errors
    /// [`FluidError::NotPositive`] with the first property that is not.
    pub fn validate(&self) -> Result<(), FluidError> {
        let properties = [
            ("viscosity", Some(self.viscosity), "Pa s"),
            ("density", self.density, "kg/m^3"),
            ("temperature", self.temperature, "K"),
        ];
        for (quantity, value, unit) in properties {
            match value {
                Some(value) if !(value.is_finite() && value > 0.0) => {
                    return Err(FluidError::NotPositive {
                        quantity,
                        value,
                        unit,
                    });
                }
                _ => {}
            }
        }
        Ok(())
    }

    /// Whether the viscosity is known over temperature.
    pub fn knows_temperatures(&self) -> bool {
        self.is_water() || self.source == AIR_SOURCE
    }

    /// The same fluid at another temperature; a gas at the same pressure.
    ///
    /// - `temperature`: K, within the range of the fluid's formula
    ///
    /// # Errors
    /// [`FluidError::OutOfRange`] outside that range, [`FluidError::OneTemperature`] for a fluid given by its
    /// numbers.
    pub fn at_temperature(&self, temperature: f64) -> Result<Self, FluidError> {
        if self.is_water() {
            return Self::water(temperature);
        }
        let state = self.gas_state().ok_or(FluidError::OneTemperature)?;
        Self::dry_air(temperature, state.pressure)
    }

    /// Whether the properties are those of [`Fluid::water`].
    pub(crate) fn is_water(&self) -> bool {
        self.source == WATER_SOURCE
    }

    /// Whether it is air, or so light that it can only be a gas.
    pub(crate) fn is_gas(&self) -> bool {
        self.source == AIR_SOURCE || self.density.is_some_and(|density| density < GAS_DENSITY)
    }

    /// Pressure, speed of sound and mean free path, known for [`Fluid::dry_air`] only.
    ///
    /// `c = sqrt(1.4 R T)`; `lambda = (mu / p) sqrt(pi R T / 2)`, the mean free path of kinetic theory
    /// written with the viscosity (from memory).
    pub(crate) fn gas_state(&self) -> Option<GasState> {
        if self.source != AIR_SOURCE {
            return None;
        }
        let thermal = AIR_GAS_CONSTANT * self.temperature?;
        let pressure = self.density? * thermal;
        Some(GasState {
            pressure,
            sound_speed: (AIR_HEAT_RATIO * thermal).sqrt(),
            mean_free_path: self.viscosity / pressure
                * (std::f64::consts::FRAC_PI_2 * thermal).sqrt(),
        })
    }
}

/// Viscosity of liquid water at 1e5 Pa, Pa s; IAPWS SR6-08(2011).
fn water_viscosity(temperature: f64) -> f64 {
    let t = temperature / 300.0;
    let terms = [
        (280.68, -1.9),
        (511.45, -7.7),
        (61.131, -19.6),
        (0.459_03, -40.0),
    ];
    1e-6 * terms
        .iter()
        .map(|&(factor, power)| factor * t.powf(power))
        .sum::<f64>()
}

/// Density of liquid water at 1e5 Pa, kg/m^3; IAPWS SR6-08(2011).
///
/// Specific volume `v = (R Tr / p0) [a5 + sum a_i alpha^n_i + sum b_i beta^m_i]` with
/// `alpha = Tr / (593 K - T)`, `beta = Tr / (T - 232 K)`, `Tr = 10 K`, `R = 461.51805 J/(kg K)`.
fn water_density(temperature: f64) -> f64 {
    let alpha = 10.0 / (593.0 - temperature);
    let beta = 10.0 / (temperature - 232.0);
    let in_alpha = [
        (1.937_631_57e-2, 0),
        (6.744_584_46e3, 4),
        (-2.225_216_04e5, 5),
        (1.002_312_47e8, 7),
        (-1.635_521_18e9, 8),
        (8.322_996_58e9, 9),
    ];
    let in_beta = [
        (5.785_452_92e-3, 1),
        (-1.531_956_65e-2, 2),
        (3.113_378_59e-2, 3),
        (-4.235_462_41e-2, 4),
        (3.387_135_07e-2, 5),
        (-1.199_467_61e-2, 6),
    ];
    let sum = |base: f64, terms: &[(f64, i32)]| -> f64 {
        terms
            .iter()
            .map(|&(factor, power)| factor * base.powi(power))
            .sum()
    };
    1e5 / (461.518_05 * 10.0) / (sum(alpha, &in_alpha) + sum(beta, &in_beta))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn water_reproduces_the_table_of_its_release() {
        // IAPWS SR6-08(2011), Table 8: T in K, density in kg/m^3, viscosity in uPa s.
        let table = [
            (260.0, 997.068_360, 3_058.360_75),
            (298.15, 997.047_013, 889.996_774),
            (375.0, 957.009_710, 276.207_245),
        ];
        for (temperature, density, viscosity) in table {
            let water = Fluid::water(temperature).unwrap();
            assert!(
                (water.density.unwrap() - density).abs() < 5.1e-7,
                "{temperature}"
            );
            assert!(
                (water.viscosity * 1e6 - viscosity).abs() < 5.1e-6,
                "{temperature}"
            );
        }
    }

    #[test]
    fn water_outside_its_range_is_an_error_with_the_range() {
        for temperature in [253.14, 383.16, 25.0, f64::NAN, f64::INFINITY] {
            let error = Fluid::water(temperature).unwrap_err();
            assert!(error.to_string().contains("253.15 to 383.15 K"), "{error}");
        }
        assert!(Fluid::water(273.15 - 20.0).is_ok() && Fluid::water(273.15 + 110.0).is_ok());
    }

    #[test]
    fn air_reproduces_the_standard_atmosphere() {
        // Computed from the formula as read (15, 20, 25 C); density at 15 C is the sea level value
        // 1.2250 kg/m^3 of the U.S. Standard Atmosphere 1976 (from memory).
        for (celsius, viscosity) in [
            (15.0, 1.789_380e-5),
            (20.0, 1.813_406e-5),
            (25.0, 1.837_234e-5),
        ] {
            let air = Fluid::dry_air(273.15 + celsius, 101_325.0).unwrap();
            assert!((air.viscosity - viscosity).abs() < 5.1e-12);
        }
        let air = Fluid::dry_air(288.15, 101_325.0).unwrap();
        assert!((air.density.unwrap() - 1.2250).abs() < 5e-5);
    }

    #[test]
    fn the_mean_free_path_of_air_at_20_c_is_65_nm() {
        // 65.07 nm: computed reference, same formula in independent code.
        let state = Fluid::dry_air(293.15, 101_325.0)
            .unwrap()
            .gas_state()
            .unwrap();
        assert!((state.mean_free_path * 1e9 - 65.07).abs() < 5e-3);
        assert!((state.pressure / 101_325.0 - 1.0).abs() < 1e-14);
        assert!((state.sound_speed - 343.2).abs() < 0.1);
    }

    #[test]
    fn air_outside_its_range_is_refused() {
        assert!(Fluid::dry_air(20.0, 101_325.0).is_err());
        let error = Fluid::dry_air(293.15, 0.0).unwrap_err();
        assert!(error.to_string().contains("absolute pressure"));
        assert!(Fluid::dry_air(293.15, f64::NAN).is_err());
    }

    #[test]
    fn given_properties_must_be_positive_and_finite() {
        for bad in [0.0, -1e-3, f64::NAN, f64::INFINITY] {
            let error = Fluid::custom(bad, None).unwrap_err();
            assert!(error.to_string().contains("viscosity"));
            assert!(!error.hint().is_empty());
            let error = Fluid::custom(1e-3, Some(bad)).unwrap_err();
            assert!(error.to_string().contains("density"));
        }
    }

    #[test]
    fn only_light_fluids_count_as_gas() {
        assert!(Fluid::custom(1.8e-5, Some(1.2)).unwrap().is_gas());
        assert!(!Fluid::custom(1e-3, Some(998.0)).unwrap().is_gas());
        assert!(!Fluid::custom(1e-3, None).unwrap().is_gas());
        assert!(Fluid::water(300.0).unwrap().is_water());
    }
}
