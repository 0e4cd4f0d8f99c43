//! What can be wrong with a nominal section, with the parameter, its value, the limit and a remedy.

use std::fmt;

use super::Quantity;
use crate::geometry::Point;
use crate::geometry::curves::CurveError;
use crate::units::UnitError;

/// A value with its quantity, printed in a unit that fits: nm, um or mm; degrees; plain numbers.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Amount {
    /// The value, metres for a length, radians for an angle.
    pub value: f64,
    /// What it is.
    pub quantity: Quantity,
}

impl Amount {
    /// A length, m.
    pub(super) fn length(value: f64) -> Self {
        Self {
            value,
            quantity: Quantity::Length,
        }
    }
}

impl fmt::Display for Amount {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let (factor, unit) = match self.quantity {
            Quantity::Length => match self.value.abs() {
                v if v >= 1e-2 => (1e3, " mm"),
                v if v > 0.0 && v < 1e-7 => (1e9, " nm"),
                _ => (1e6, " um"),
            },
            Quantity::Angle => (180.0 / std::f64::consts::PI, " deg"),
            _ => (1.0, ""),
        };
        write!(f, "{}{unit}", six_digits(self.value * factor))
    }
}

/// A number with six significant digits, trailing zeros dropped.
fn six_digits(value: f64) -> String {
    if value != 0.0 && !(1e-4..1e9).contains(&value.abs()) {
        return format!("{value:.5e}");
    }
    let before_point = if value.abs() < 1.0 {
        1
    } else {
        value.abs().log10().floor() as usize + 1
    };
    let text = format!("{value:.*}", 6_usize.saturating_sub(before_point));
    if text.contains('.') {
        text.trim_end_matches('0').trim_end_matches('.').to_owned()
    } else {
        text
    }
}

/// Why a nominal section could not be made. Who wrote the section can act; [`NominalError::hint`] says how.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum NominalError {
    /// The kind is not in the table.
    #[error("`{kind}` is not a kind of nominal section")]
    UnknownKind {
        /// The kind as written.
        kind: String,
        /// The nearest spelling, where one is near.
        nearest: Option<&'static str>,
        /// All kinds.
        known: String,
    },
    /// The kind has no such parameter.
    #[error("`{kind}` has no parameter `{parameter}`")]
    UnknownParameter {
        /// The kind.
        kind: &'static str,
        /// The parameter as written.
        parameter: String,
        /// The nearest spelling, where one is near.
        nearest: Option<&'static str>,
        /// All parameters of the kind and the modifiers.
        known: String,
    },
    /// A required parameter is missing.
    #[error("`{kind}` needs `{parameter}`: {meaning}")]
    Missing {
        /// The kind.
        kind: &'static str,
        /// The parameter.
        parameter: &'static str,
        /// What it means.
        meaning: &'static str,
        /// A value as it could be written.
        example: &'static str,
    },
    /// One of several parameters must be given, and just one.
    #[error("`{kind}` needs one of {parameters}, and {given} are given")]
    OneOf {
        /// The kind.
        kind: &'static str,
        /// The alternatives.
        parameters: &'static str,
        /// How many of them are given.
        given: usize,
    },
    /// Two parameters cannot go together.
    #[error("`{kind}` has both `{first}` and `{second}`: {reason}")]
    Contradiction {
        /// The kind.
        kind: &'static str,
        /// One parameter.
        first: &'static str,
        /// The other.
        second: &'static str,
        /// Why they cannot go together.
        reason: &'static str,
        /// What to do.
        remedy: &'static str,
    },
    /// A length or an angle is a bare number.
    #[error("`{parameter}` of `{kind}` is the bare number {value}; {quantity} needs a unit")]
    BareNumber {
        /// The kind.
        kind: &'static str,
        /// The parameter.
        parameter: &'static str,
        /// The number.
        value: f64,
        /// Length or angle.
        quantity: Quantity,
        /// A value as it could be written.
        example: &'static str,
    },
    /// A length or an angle could not be read.
    #[error("`{parameter}` of `{kind}`: {source}")]
    Unit {
        /// The kind.
        kind: &'static str,
        /// The parameter.
        parameter: &'static str,
        /// A value as it could be written.
        example: &'static str,
        /// What is wrong with the text.
        source: UnitError,
    },
    /// A text is not what the parameter takes.
    #[error("`{parameter}` of `{kind}` is {found}, not {quantity}")]
    NotReadable {
        /// The kind.
        kind: &'static str,
        /// The parameter.
        parameter: &'static str,
        /// What was written.
        found: String,
        /// What is expected.
        quantity: Quantity,
        /// A value as it could be written.
        example: &'static str,
    },
    /// A value is outside its limits.
    #[error("`{parameter}` of `{kind}` is {value}; it must be {relation} {limit}{reason}")]
    OutOfRange {
        /// The kind.
        kind: &'static str,
        /// The parameter.
        parameter: &'static str,
        /// Its value.
        value: Amount,
        /// How it must stand to the limit, such as `below`.
        relation: &'static str,
        /// The limit.
        limit: Amount,
        /// Where the limit comes from, beginning with a comma; may be empty.
        reason: &'static str,
        /// What to do.
        remedy: &'static str,
    },
    /// The kind has no flat lid on top, and one is needed.
    #[error("`{kind}` has no flat lid on top, which `{needed_by}` needs")]
    NoFlatLid {
        /// The kind.
        kind: &'static str,
        /// The modifier or parameter.
        needed_by: &'static str,
        /// Kinds that have one.
        with_lid: String,
    },
    /// A nested section is not one plain closed wall.
    #[error("`{kind}` cannot be a post: it is not one closed wall without islands")]
    NotAPost {
        /// The kind.
        kind: &'static str,
    },
    /// A post meets a wall or another post.
    #[error(
        "the post centred at x = {x}, y = {y} meets {obstacle} near x = {near_x}, y = {near_y}"
    )]
    PostMeets {
        /// Centre of the post, m.
        x: Amount,
        /// Centre of the post, m.
        y: Amount,
        /// What it meets.
        obstacle: &'static str,
        /// Where, m.
        near_x: Amount,
        /// Where, m.
        near_y: Amount,
    },
    /// A post is not inside the section.
    #[error(
        "the post centred at x = {x}, y = {y} is not inside the section, which spans x = {} to {} and y = {} to {}",
        Amount::length(.low[0]), Amount::length(.high[0]), Amount::length(.low[1]), Amount::length(.high[1])
    )]
    PostOutside {
        /// Centre of the post, m.
        x: Amount,
        /// Centre of the post, m.
        y: Amount,
        /// Lower left corner of the section's bounds, m.
        low: Point,
        /// Upper right corner of the section's bounds, m.
        high: Point,
    },
    /// Something is wrong in a nested section.
    #[error("in {place}: {source}")]
    Nested {
        /// The parameter that holds it, posts with their number from 1.
        place: String,
        /// What is wrong there.
        source: Box<NominalError>,
    },
    /// The posts before this one have more vertices together than are handled.
    #[error("the posts before it have more than {limit} vertices together")]
    TooManyVertices {
        /// The limit.
        limit: usize,
    },
    /// Sections are nested too deeply.
    #[error("sections are nested more than {limit} deep")]
    TooDeep {
        /// The limit.
        limit: usize,
    },
    /// A curve could not be turned into segments.
    #[error("`{kind}`: {source}")]
    Curve {
        /// The kind.
        kind: &'static str,
        /// What is wrong.
        source: CurveError,
    },
    /// The outline has no usable area.
    #[error("`{kind}` comes out with an area of {area:e} m^2")]
    NoArea {
        /// The kind.
        kind: &'static str,
        /// The area, m^2.
        area: f64,
    },
    /// A one-line section could not be read.
    #[error("column {column} of `{text}`: {problem}")]
    Syntax {
        /// The text.
        text: String,
        /// Column from 1, in characters.
        column: usize,
        /// What is wrong there.
        problem: &'static str,
    },
}

impl NominalError {
    /// What to try, one sentence.
    pub fn hint(&self) -> String {
        match self {
            Self::UnknownKind { nearest, known, .. } => spelling(*nearest, "the kinds are", known),
            Self::UnknownParameter { nearest, known, .. } => {
                spelling(*nearest, "it takes", known)
            }
            Self::Missing {
                parameter, example, ..
            }
            | Self::NotReadable {
                parameter, example, ..
            }
            | Self::BareNumber {
                parameter, example, ..
            } => format!("write for example {parameter} = {}", quoted(example)),
            Self::Unit {
                parameter,
                example,
                source,
                ..
            } => match source {
                UnitError::NoUnit { .. } => {
                    format!("write a unit: for example {parameter} = {}", quoted(example))
                }
                _ => format!("write for example {parameter} = {}", quoted(example)),
            },
            Self::OneOf { parameters, .. } => format!("give just one of {parameters}"),
            Self::Contradiction { remedy, .. } | Self::OutOfRange { remedy, .. } => {
                (*remedy).to_owned()
            }
            Self::NoFlatLid { with_lid, .. } => {
                format!("kinds with a flat lid: {with_lid}; with lid_sag or lid_bulge it is flat no more")
            }
            Self::NotAPost { .. } => {
                "use a circle, rectangle, ellipse, regular_polygon or rhombus as post".to_owned()
            }
            Self::PostMeets { .. } => "move the post or make it smaller".to_owned(),
            Self::PostOutside { .. } => {
                "x and y are the post's centre in the section's own coordinates: with a flat lid the \
                 origin is in the middle of the lid and the section lies at negative y"
                    .to_owned()
            }
            Self::Nested { source, .. } => source.hint(),
            Self::TooManyVertices { .. } => {
                "use fewer posts, posts with straight sides, or an outline whose curves are coarser"
                    .to_owned()
            }
            Self::TooDeep { .. } => "write the inner sections out as an outline".to_owned(),
            Self::Curve { .. } => {
                "the largest and the smallest length are too far apart: check their units".to_owned()
            }
            Self::NoArea { .. } => "check the lengths and their units".to_owned(),
            Self::Syntax { .. } => {
                "write the kind and then name=value, as in `koh_groove opening=100um depth=40um`; \
                 a section inside goes in ( ) and a list of them in [ ]"
                    .to_owned()
            }
        }
    }
}

/// `did you mean` where a spelling is near, then the list.
fn spelling(nearest: Option<&'static str>, lead: &str, known: &str) -> String {
    match nearest {
        Some(near) => format!("did you mean `{near}`? {lead} {known}"),
        None => format!("{lead} {known}"),
    }
}

/// Quotation marks round a text with a unit, none round a number, list or table.
fn quoted(example: &str) -> String {
    if example.parse::<f64>().is_ok() || example.starts_with(['(', '[']) {
        example.to_owned()
    } else {
        format!("\"{example}\"")
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn amounts_print_in_a_unit_that_fits_with_six_digits_at_most() {
        let length = |v| Amount::length(v).to_string();
        assert_eq!(length(70.710_678e-6), "70.7107 um");
        assert_eq!(length(30e-6), "30 um");
        assert_eq!(length(-2.5e-8), "-25 nm");
        assert_eq!(length(0.0), "0 um");
        assert_eq!(length(0.123_456_78), "123.457 mm");
        assert_eq!(length(1e-13), "0.0001 nm");
        let angle = Amount {
            value: std::f64::consts::FRAC_PI_2,
            quantity: Quantity::Angle,
        };
        assert_eq!(angle.to_string(), "90 deg");
    }
}
