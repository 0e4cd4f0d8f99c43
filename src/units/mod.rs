//! Quantities at the border: text with a unit to SI and back. SI everywhere inside.
//!
//! A small closed grammar: a number, then a unit built from the listed unit names with `*`, `·`, a space,
//! `/`, parentheses, `^` and superscripts. Case matters (`mPa` is not `MPa`), nothing is guessed, and a
//! missing unit is an error. Decimal prefixes are applied to the written digits, so `30 um` is the double
//! nearest to 3e-5 m.

mod atoms;
mod bytes;
mod error;
mod format;
mod grammar;
mod quantity;
mod scale;
pub(crate) mod spelling;

pub use bytes::parse_bytes;
pub use error::UnitError;
pub use format::{
    format_flow_rate, format_length, format_percent, format_pressure, format_si,
    format_significant, to_ascii,
};
pub use quantity::{
    Quantity, length_scale, length_unit, parse_angle, parse_density, parse_flow_rate,
    parse_fraction, parse_length, parse_pressure, parse_quantity, parse_temperature,
    parse_viscosity,
};
pub use scale::UnitScale;
