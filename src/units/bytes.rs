//! Amounts of memory.

use super::error::UnitError;
use super::grammar::split_number;
use super::quantity::finite;

/// Reads an amount of memory, `2GB`, `500 MB` or `1.5 GiB`, into bytes.
///
/// # Errors
/// [`UnitError`] when the number or the unit is missing or unknown.
///
/// # Examples
/// ```
/// assert_eq!(etchwise::units::parse_bytes("2 GB"), Ok(2e9));
/// assert!(etchwise::units::parse_bytes("2").is_err());
/// ```
pub fn parse_bytes(text: &str) -> Result<f64, UnitError> {
    let (number, unit) = split_number(text)?;
    let value = finite(number.parse().ok(), text)?;
    let factor = match unit {
        "B" => 1.0,
        "kB" => 1e3,
        "MB" => 1e6,
        "GB" => 1e9,
        "KiB" => 1024.0,
        "MiB" => 1024.0 * 1024.0,
        "GiB" => 1024.0 * 1024.0 * 1024.0,
        "" => {
            return Err(UnitError::NoUnit {
                text: text.to_owned(),
                quantity: "memory",
            });
        }
        _ => {
            return Err(UnitError::UnknownUnit {
                unit: unit.to_owned(),
                quantity: "memory",
                known: "B, kB, MB, GB, KiB, MiB, GiB".to_owned(),
            });
        }
    };
    Ok(value * factor)
}
