//! Quantities at the border: text with a unit to SI and back. SI everywhere inside.

/// Why a quantity could not be read.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum UnitError {
    /// There is no number at the start of the text.
    #[error("`{text}` does not start with a number")]
    NoNumber {
        /// The text as given.
        text: String,
    },
    /// There is a number but no unit.
    #[error("`{text}` has no unit")]
    NoUnit {
        /// The text as given.
        text: String,
    },
    /// The unit is not known for this kind of quantity.
    #[error("`{unit}` is not a unit of {quantity}; known: {known}")]
    UnknownUnit {
        /// The unit as given.
        unit: String,
        /// Which quantity was expected.
        quantity: &'static str,
        /// Units that are known.
        known: String,
    },
}

/// Metres per unit of length, `None` for an unknown spelling.
pub fn length_unit(unit: &str) -> Option<f64> {
    match unit {
        "m" => Some(1.0),
        "mm" => Some(1e-3),
        "um" | "\u{b5}m" | "\u{3bc}m" => Some(1e-6),
        "nm" => Some(1e-9),
        _ => None,
    }
}

/// Reads a length such as `120 um` into metres.
///
/// # Errors
/// [`UnitError`] when the number or the unit is missing or unknown.
pub fn parse_length(text: &str) -> Result<f64, UnitError> {
    let trimmed = text.trim();
    let split = trimmed
        .find(|c: char| c.is_alphabetic() && c != 'e' && c != 'E')
        .unwrap_or(trimmed.len());
    let (number, unit) = trimmed.split_at(split);
    let value: f64 = number.trim().parse().map_err(|_| UnitError::NoNumber {
        text: text.to_owned(),
    })?;
    let unit = unit.trim();
    if unit.is_empty() {
        return Err(UnitError::NoUnit {
            text: text.to_owned(),
        });
    }
    let factor = length_unit(unit).ok_or_else(|| UnitError::UnknownUnit {
        unit: unit.to_owned(),
        quantity: "length",
        known: "m, mm, um, nm".to_owned(),
    })?;
    Ok(value * factor)
}
