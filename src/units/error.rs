//! What can be wrong with a quantity written as text, and what to do about it.

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
    /// The number is infinite, not a number, or beyond the range of a double.
    #[error("`{text}` is not a finite number")]
    NotFinite {
        /// The text as given.
        text: String,
    },
    /// The number holds a comma, which may be a decimal mark or a thousands separator.
    #[error("`{text}` holds a comma, which is not read in a number")]
    DecimalComma {
        /// The text as given.
        text: String,
    },
    /// The number holds a second decimal point.
    #[error("`{text}` has more than one decimal point")]
    SecondPoint {
        /// The text as given.
        text: String,
    },
    /// There is a number but no unit.
    #[error("`{text}` has no unit; a {quantity} was expected")]
    NoUnit {
        /// The text as given.
        text: String,
        /// Which quantity was expected.
        quantity: &'static str,
    },
    /// A character of the unit was destroyed by a change of encoding (U+FFFD).
    #[error("`{text}`: a character of the unit was destroyed by a change of encoding")]
    DestroyedCharacter {
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
        /// Units that are known, separated by commas.
        known: String,
    },
    /// A temperature below absolute zero.
    #[error("`{text}` is below absolute zero (0 K = -273.15 C)")]
    BelowAbsoluteZero {
        /// The text as given.
        text: String,
    },
}

impl UnitError {
    /// What the user can do, in one sentence.
    pub fn hint(&self) -> String {
        match self {
            Self::NoNumber { .. } => "write the number first, then the unit: `30 um`".to_owned(),
            Self::NotFinite { .. } => "give a finite number".to_owned(),
            Self::DecimalComma { .. } => {
                "use a decimal point and no thousands separator: `1.5 mm`".to_owned()
            }
            Self::SecondPoint { .. } => "use one decimal point and no thousands separator".to_owned(),
            Self::NoUnit { quantity, .. } => {
                format!("write the unit after the number, such as `{}`", example(quantity))
            }
            Self::DestroyedCharacter { .. } => {
                "say which unit it was: write `um` for micrometres, `A` for angstrom, `deg` for degrees"
                    .to_owned()
            }
            Self::UnknownUnit { unit, known, .. } => near_miss(unit, known),
            Self::BelowAbsoluteZero { .. } => {
                "check the sign and whether the unit is C or K".to_owned()
            }
        }
    }
}

/// A well-formed text for a quantity.
fn example(quantity: &str) -> &'static str {
    match quantity {
        "pressure" => "30 kPa",
        "flow rate" => "5 uL/min",
        "viscosity" => "1 mPa s",
        "density" => "998 kg/m^3",
        "temperature" => "25 C",
        "angle" => "54.74 deg",
        "pressure gradient" => "2 kPa/mm",
        "velocity" => "1 mm/s",
        "time" => "3 s",
        "memory" => "2 GB",
        _ => "30 um",
    }
}

/// Advice for an unknown unit: the same letters in another case, or the list.
fn near_miss(unit: &str, known: &str) -> String {
    let wanted = unit.to_lowercase();
    let found = known
        .split(", ")
        .find(|name| name.to_lowercase() == wanted && *name != unit);
    match found {
        Some(name) => format!("case matters in units: did you mean `{name}`?"),
        None => "use one of the known units".to_owned(),
    }
}
