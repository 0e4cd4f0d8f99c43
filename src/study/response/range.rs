//! The range of a parameter as a person writes it: `20..40um`, `20um..40um`, `-5..5%`, `85..90deg`, `0.01..0.05`.

use super::error::ResponseError;
use super::parameter::ParameterUnit;
use crate::study::wall_motion::Measure;
use crate::units::{UnitError, parse_angle, parse_fraction, parse_length};

/// A parameter with its range as written.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct RangeText {
    /// Name of the parameter; hyphens count as underscores.
    pub name: String,
    /// The range, for example `20..40um`.
    pub range: String,
}

impl RangeText {
    /// Reads `NAME=LOW..HIGH`.
    ///
    /// # Errors
    /// [`ResponseError::NotARange`] without `=` or `..`.
    ///
    /// # Examples
    /// ```
    /// use etchwise::study::RangeText;
    /// let depth = RangeText::read("depth=20..40um")?;
    /// assert_eq!((depth.name.as_str(), depth.range.as_str()), ("depth", "20..40um"));
    /// # Ok::<(), etchwise::study::ResponseError>(())
    /// ```
    pub fn read(text: &str) -> Result<Self, ResponseError> {
        let refused = || ResponseError::NotARange {
            text: text.to_owned(),
        };
        let (name, range) = text.rsplit_once('=').ok_or_else(refused)?;
        if name.trim().is_empty() || !range.contains("..") {
            return Err(refused());
        }
        Ok(Self {
            name: plain_name(name),
            range: range.trim().to_owned(),
        })
    }

    /// The two ends as texts, the unit of the high one added to a bare low one.
    fn ends(&self) -> Result<[String; 2], ResponseError> {
        let refused = || ResponseError::NotARange {
            text: format!("{}={}", self.name, self.range),
        };
        let (low, high) = self.range.split_once("..").ok_or_else(refused)?;
        let (low, high) = (low.trim(), high.trim());
        if low.is_empty() || high.is_empty() {
            return Err(refused());
        }
        let low = if low.parse::<f64>().is_ok() {
            format!("{low} {}", unit_of(high)).trim().to_owned()
        } else {
            low.to_owned()
        };
        Ok([low, high.to_owned()])
    }

    /// Both ends read alike, in order and finite.
    fn read_ends(
        &self,
        parse: impl Fn(&str) -> Result<f64, UnitError>,
        example: &'static str,
    ) -> Result<[f64; 2], ResponseError> {
        let texts = self.ends()?;
        let mut values = [0.0; 2];
        for (value, text) in values.iter_mut().zip(&texts) {
            *value = parse(text).map_err(|source| ResponseError::Unit {
                parameter: self.name.clone(),
                example,
                source,
            })?;
        }
        let [low, high] = values;
        let problem = if low > high {
            "is reversed"
        } else if low < high && (high - low) > 1e-9 * low.abs().max(high.abs()) {
            return Ok(values);
        } else {
            "is empty"
        };
        Err(ResponseError::EmptyRange {
            parameter: self.name.clone(),
            range: self.range.clone(),
            problem,
        })
    }

    /// The range of a parameter of a nominal kind, SI.
    pub(super) fn of_unit(&self, unit: ParameterUnit) -> Result<[f64; 2], ResponseError> {
        match unit {
            ParameterUnit::Length => self.read_ends(parse_length, "20..40um"),
            ParameterUnit::Angle => self.read_ends(parse_angle, "85..90deg"),
            ParameterUnit::One => self.read_ends(parse_fraction, "0.01..0.05"),
        }
    }

    /// The range of a wall motion, SI, and the unit it is in: a relative change with a reference length may also
    /// be written as a length.
    pub(super) fn of_motion(
        &self,
        measure: Measure,
        has_length: bool,
    ) -> Result<([f64; 2], ParameterUnit), ResponseError> {
        if measure != Measure::Relative {
            let unit = super::parameter::motion_unit(measure);
            return Ok((self.of_unit(unit)?, unit));
        }
        let example = if has_length { "-2..2um" } else { "-2..2%" };
        let [_, high] = self.ends()?;
        if ["%", "ppm"].contains(&unit_of(&high)) {
            let ends = self.read_ends(parse_fraction, example)?;
            return Ok((ends, ParameterUnit::One));
        }
        if has_length {
            let ends = self.read_ends(parse_length, example)?;
            return Ok((ends, ParameterUnit::Length));
        }
        Err(ResponseError::NotRelative {
            parameter: self.name.clone(),
            range: self.range.clone(),
        })
    }
}

/// A name with underscores where hyphens were typed; names of walls are kept as they are.
pub(super) fn plain_name(name: &str) -> String {
    let name = name.trim();
    if name.starts_with("wall ") {
        name.to_owned()
    } else {
        name.replace('-', "_")
    }
}

/// What follows the longest number at the start of a text.
fn unit_of(text: &str) -> &str {
    let ends = text.char_indices().map(|(at, c)| at + c.len_utf8());
    let mut unit = text;
    for end in ends {
        if let Some((number, rest)) = text.split_at_checked(end)
            && number.trim().parse::<f64>().is_ok()
        {
            unit = rest;
        }
    }
    unit.trim()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn range(text: &str) -> RangeText {
        RangeText::read(text).unwrap()
    }

    fn close(found: [f64; 2], expected: [f64; 2]) -> bool {
        found
            .iter()
            .zip(expected)
            .all(|(a, b)| (a - b).abs() <= 1e-12 * b.abs())
    }

    #[test]
    fn the_low_end_borrows_the_unit_of_the_high_one() {
        for text in ["d=20..40um", "d=20um..40um", "d = 20 um .. 0.04 mm"] {
            let found = range(text).of_unit(ParameterUnit::Length).unwrap();
            assert!(close(found, [20e-6, 40e-6]), "{text} {found:?}");
        }
        let [a, b] = range("a=85..90deg").of_unit(ParameterUnit::Angle).unwrap();
        assert!(close([a.to_degrees(), b.to_degrees()], [85.0, 90.0]));
        assert!(close(
            range("t=1e-3..2e-3").of_unit(ParameterUnit::One).unwrap(),
            [1e-3, 2e-3]
        ));
        assert_eq!(range("over-etch=0..1um").name, "over_etch");
        assert_eq!(range("wall a-b=0..1um").name, "wall a-b");
    }

    #[test]
    fn relative_changes_are_per_cent_or_lengths_but_no_bare_numbers() {
        let (ends, unit) = range("depth=-5..5%")
            .of_motion(Measure::Relative, true)
            .unwrap();
        assert_eq!(unit, ParameterUnit::One);
        assert!(close(ends, [-0.05, 0.05]));
        let (ends, unit) = range("depth=-2..2um")
            .of_motion(Measure::Relative, true)
            .unwrap();
        assert_eq!(unit, ParameterUnit::Length);
        assert!(close(ends, [-2e-6, 2e-6]));
        for (text, has_length) in [("depth=-2..2", true), ("scale=1..2um", false)] {
            assert!(
                range(text)
                    .of_motion(Measure::Relative, has_length)
                    .is_err()
            );
        }
    }

    #[test]
    fn ranges_that_are_none_are_refused() {
        for text in ["depth", "depth=20um", "=1..2um", ""] {
            assert!(RangeText::read(text).is_err(), "{text}");
        }
        for text in [
            "d=40..20um",
            "d=20..20um",
            "d=20..40",
            "d=..40um",
            "d=20um..",
            "d=1..infum",
            "d=nan..1um",
        ] {
            assert!(
                range(text).of_unit(ParameterUnit::Length).is_err(),
                "{text}"
            );
        }
    }
}
