//! Quantities the program reads, each with its dimension and its list of units.

use super::atoms::Dimension;
use super::error::UnitError;
use super::grammar::{read_unit, split_number};
use super::scale::UnitScale;

/// Absolute zero in degrees Celsius with the sign changed, K (definition of the Celsius scale).
const ZERO_CELSIUS_KELVIN: f64 = 273.15;

/// A kind of quantity that can be read with [`parse_quantity`].
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[non_exhaustive]
pub enum Quantity {
    /// Metres.
    Length,
    /// Pascals.
    Pressure,
    /// Cubic metres per second.
    FlowRate,
    /// Pascal seconds.
    Viscosity,
    /// Kilograms per cubic metre.
    Density,
    /// Pascals per metre.
    PressureGradient,
    /// Metres per second.
    Velocity,
    /// Seconds.
    Time,
}

impl Quantity {
    /// Its name in messages.
    pub fn name(self) -> &'static str {
        match self {
            Self::Length => "length",
            Self::Pressure => "pressure",
            Self::FlowRate => "flow rate",
            Self::Viscosity => "viscosity",
            Self::Density => "density",
            Self::PressureGradient => "pressure gradient",
            Self::Velocity => "velocity",
            Self::Time => "time",
        }
    }

    /// The units to name in messages.
    pub fn known_units(self) -> &'static str {
        match self {
            Self::Length => "m, cm, mm, um, nm, pm, A, in, mil, thou",
            Self::Pressure => "Pa, hPa, kPa, MPa, bar, mbar, psi, mmHg, atm",
            Self::FlowRate => "m^3/s, L/min, mL/min, mL/h, uL/min, uL/h, uL/s, nL/min, mm^3/s",
            Self::Viscosity => "Pa s, mPa s, uPa s, P, cP",
            Self::Density => "kg/m^3, g/cm^3, g/mL, kg/L",
            Self::PressureGradient => "Pa/m, kPa/m, kPa/mm, mbar/mm, psi/in",
            Self::Velocity => "m/s, mm/s, um/s",
            Self::Time => "s, ms, min, h",
        }
    }

    /// Exponents of metre, kilogram, second.
    fn dimension(self) -> Dimension {
        match self {
            Self::Length => [1, 0, 0],
            Self::Pressure => [-1, 1, -2],
            Self::FlowRate => [3, 0, -1],
            Self::Viscosity => [-1, 1, -1],
            Self::Density => [-3, 1, 0],
            Self::PressureGradient => [-2, 1, -2],
            Self::Velocity => [1, 0, -1],
            Self::Time => [0, 0, 1],
        }
    }

    fn unknown(self, unit: &str) -> UnitError {
        UnitError::UnknownUnit {
            unit: unit.to_owned(),
            quantity: self.name(),
            known: self.known_units().to_owned(),
        }
    }
}

/// Reads a quantity such as `5 uL/min` into SI.
///
/// # Errors
/// [`UnitError`] when the number or the unit is missing, unknown, of another kind, or not finite.
///
/// # Examples
/// ```
/// use etchwise::units::{Quantity, parse_quantity};
/// assert_eq!(parse_quantity("2 kPa/mm", Quantity::PressureGradient), Ok(2e6));
/// assert!(parse_quantity("2 kPa", Quantity::PressureGradient).is_err());
/// ```
pub fn parse_quantity(text: &str, quantity: Quantity) -> Result<f64, UnitError> {
    let (number, unit) = split_number(text)?;
    if unit.is_empty() {
        return Err(UnitError::NoUnit {
            text: text.to_owned(),
            quantity: quantity.name(),
        });
    }
    let scale = read_unit(unit)
        .filter(|read| read.dimension == quantity.dimension())
        .ok_or_else(|| quantity.unknown(unit))?
        .scale;
    finite(scale.read(&number, &mut String::new()), text)
}

/// Passes a finite value on.
pub(super) fn finite(value: Option<f64>, text: &str) -> Result<f64, UnitError> {
    value
        .filter(|v| v.is_finite())
        .ok_or_else(|| UnitError::NotFinite {
            text: text.to_owned(),
        })
}

/// The scale of a unit of length, `None` for an unknown spelling.
pub fn length_scale(unit: &str) -> Option<UnitScale> {
    read_unit(unit)
        .filter(|read| read.dimension == Quantity::Length.dimension())
        .map(|read| read.scale)
}

/// Metres per unit of length, `None` for an unknown spelling.
pub fn length_unit(unit: &str) -> Option<f64> {
    length_scale(unit).map(UnitScale::factor)
}

/// Reads a length such as `120 um` into metres.
///
/// # Errors
/// [`UnitError`] when the number or the unit is missing or unknown.
///
/// # Examples
/// ```
/// use etchwise::units::parse_length;
/// assert_eq!(parse_length("30um"), Ok(3e-5));
/// assert_eq!(parse_length("3e-5 m"), Ok(3e-5));
/// assert!(parse_length("30").is_err());
/// ```
pub fn parse_length(text: &str) -> Result<f64, UnitError> {
    parse_quantity(text, Quantity::Length)
}

/// Reads a pressure such as `30 kPa` into pascals.
///
/// # Errors
/// [`UnitError`] when the number or the unit is missing or unknown.
pub fn parse_pressure(text: &str) -> Result<f64, UnitError> {
    parse_quantity(text, Quantity::Pressure)
}

/// Reads a flow rate such as `5 uL/min` into cubic metres per second.
///
/// # Errors
/// [`UnitError`] when the number or the unit is missing or unknown.
pub fn parse_flow_rate(text: &str) -> Result<f64, UnitError> {
    parse_quantity(text, Quantity::FlowRate)
}

/// Reads a dynamic viscosity such as `0.89 mPa s` into pascal seconds.
///
/// # Errors
/// [`UnitError`] when the number or the unit is missing or unknown.
pub fn parse_viscosity(text: &str) -> Result<f64, UnitError> {
    parse_quantity(text, Quantity::Viscosity)
}

/// Reads a density such as `0.998 g/mL` into kilograms per cubic metre.
///
/// # Errors
/// [`UnitError`] when the number or the unit is missing or unknown.
pub fn parse_density(text: &str) -> Result<f64, UnitError> {
    parse_quantity(text, Quantity::Density)
}

/// Reads a temperature, `25 C` or `298.15 K`, into kelvin.
///
/// # Errors
/// [`UnitError`] when the number or the unit is missing or unknown, or below absolute zero.
pub fn parse_temperature(text: &str) -> Result<f64, UnitError> {
    let (number, unit) = split_number(text)?;
    let value = finite(number.parse().ok(), text)?;
    let kelvin = match unit {
        "K" => value,
        "C" | "degC" | "\u{b0}C" | "\u{b0} C" | "\u{2103}" => value + ZERO_CELSIUS_KELVIN,
        "" => {
            return Err(UnitError::NoUnit {
                text: text.to_owned(),
                quantity: "temperature",
            });
        }
        _ => {
            return Err(UnitError::UnknownUnit {
                unit: unit.to_owned(),
                quantity: "temperature",
                known: "C, degC, K".to_owned(),
            });
        }
    };
    if kelvin < 0.0 {
        return Err(UnitError::BelowAbsoluteZero {
            text: text.to_owned(),
        });
    }
    Ok(kelvin)
}

/// Reads an angle, `54.74 deg` or `0.5 rad`, into radians.
///
/// # Errors
/// [`UnitError`] when the number or the unit is missing or unknown.
pub fn parse_angle(text: &str) -> Result<f64, UnitError> {
    let (number, unit) = split_number(text)?;
    let value = finite(number.parse().ok(), text)?;
    match unit {
        "deg" | "\u{b0}" | "degree" | "degrees" => Ok(value.to_radians()),
        "rad" => Ok(value),
        "mrad" => Ok(value / 1e3),
        "" => Err(UnitError::NoUnit {
            text: text.to_owned(),
            quantity: "angle",
        }),
        _ => Err(UnitError::UnknownUnit {
            unit: unit.to_owned(),
            quantity: "angle",
            known: "deg, rad, mrad".to_owned(),
        }),
    }
}

/// Reads a fraction, `0.1%`, `0.1 %`, `200 ppm` or the bare number `0.001`.
///
/// # Errors
/// [`UnitError`] when there is no number or another unit follows.
pub fn parse_fraction(text: &str) -> Result<f64, UnitError> {
    let (number, unit) = split_number(text)?;
    let value = finite(number.parse().ok(), text)?;
    match unit {
        "" => Ok(value),
        "%" => Ok(value / 1e2),
        "ppm" => Ok(value / 1e6),
        _ => Err(UnitError::UnknownUnit {
            unit: unit.to_owned(),
            quantity: "fraction",
            known: "%, ppm, or a bare number".to_owned(),
        }),
    }
}

#[cfg(test)]
#[path = "quantity_tests.rs"]
mod tests;
