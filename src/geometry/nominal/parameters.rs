//! The values of one section, checked and in SI: lengths in metres, angles in radians.

use std::collections::BTreeMap;

use super::error::Amount;
use super::kinds::{KindInfo, ParameterInfo, Quantity, kinds, modifiers};
use super::shape::Shape;
use super::{NominalError, NominalSpec, SpecValue};
use crate::geometry::curves::{CHORD_TOLERANCE, CurveError};
use crate::units::spelling::nearest;
use crate::units::{UnitError, parse_angle, parse_length};

/// Smallest and largest length accepted, m: an atom and a kilometre.
const LENGTH_LIMITS: [f64; 2] = [1e-12, 1e3];

/// The values of one section against the table of its kind.
#[derive(Debug, Clone, Copy)]
pub(super) struct Parameters<'a> {
    info: &'static KindInfo,
    values: &'a BTreeMap<String, SpecValue>,
    nesting: usize,
    fineness: f64,
}

impl<'a> Parameters<'a> {
    /// Finds the kind and refuses names that it does not have.
    pub(super) fn new(spec: &'a NominalSpec, nesting: usize) -> Result<Self, NominalError> {
        let info = kinds()
            .iter()
            .find(|info| info.name == spec.kind)
            .ok_or_else(|| unknown_kind(&spec.kind))?;
        let known: Vec<&'static str> = all_parameters(info).map(|p| p.name).collect();
        for name in spec.values.keys() {
            if !known.contains(&name.as_str()) {
                return Err(NominalError::UnknownParameter {
                    kind: info.name,
                    parameter: name.clone(),
                    nearest: nearest(name, &known),
                    known: known.join(", "),
                });
            }
        }
        Ok(Self {
            info,
            values: &spec.values,
            nesting,
            fineness: 1.0,
        })
    }

    /// Values of a table of its own, whose names have been sorted out already.
    pub(super) fn of(
        info: &'static KindInfo,
        values: &'a BTreeMap<String, SpecValue>,
        nesting: usize,
    ) -> Self {
        Self {
            info,
            values,
            nesting,
            fineness: 1.0,
        }
    }

    /// The same values with the chord error reduced by a factor of at most 1.
    pub(super) fn finer(mut self, fineness: f64) -> Self {
        self.fineness *= fineness;
        self
    }

    /// Name of the kind.
    pub(super) fn kind(&self) -> &'static str {
        self.info.name
    }

    /// How deep this section is nested.
    pub(super) fn nesting(&self) -> usize {
        self.nesting
    }

    /// Chord error for curves where `smaller` is the measure that the conductance hangs on, m.
    pub(super) fn chord_error(&self, smaller: f64) -> f64 {
        CHORD_TOLERANCE * self.fineness * smaller
    }

    /// The value as written, `None` when it was left out.
    pub(super) fn value(&self, name: &'static str) -> Option<&'a SpecValue> {
        self.values.get(name)
    }

    /// How many of these parameters are given.
    pub(super) fn count_given(&self, names: &[&'static str]) -> usize {
        names.iter().filter(|n| self.value(n).is_some()).count()
    }

    /// A length above 0, m.
    pub(super) fn length(&self, name: &'static str) -> Result<f64, NominalError> {
        let value = self.signed_length(name)?;
        self.check_above(name, value, LENGTH_LIMITS[0])
    }

    /// A length of 0 or more, m.
    pub(super) fn length_or_zero(&self, name: &'static str) -> Result<f64, NominalError> {
        let value = self.signed_length(name)?;
        if value < 0.0 {
            return Err(self.refuse(name, value, "at least", 0.0, ("", "give it without a sign")));
        }
        Ok(value)
    }

    /// A length above 0 that may be left out, m.
    pub(super) fn optional_length(&self, name: &'static str) -> Result<Option<f64>, NominalError> {
        self.value(name).map(|_| self.length(name)).transpose()
    }

    /// A length of either sign, m.
    pub(super) fn signed_length(&self, name: &'static str) -> Result<f64, NominalError> {
        let text = self.text(name)?;
        let value = parse_length(text).map_err(|source| self.not_measured(name, source))?;
        if !value.is_finite() || value.abs() > LENGTH_LIMITS[1] {
            let remedy = "check the number and its unit";
            return Err(self.refuse(name, value, "at most", LENGTH_LIMITS[1], ("", remedy)));
        }
        Ok(value)
    }

    /// An angle strictly between two limits, all in radians.
    pub(super) fn angle(
        &self,
        name: &'static str,
        above: f64,
        below: f64,
    ) -> Result<f64, NominalError> {
        let text = self.text(name)?;
        let value = parse_angle(text).map_err(|source| self.not_measured(name, source))?;
        let advice = ("", "check the angle and its unit (deg or rad)");
        if value.is_nan() || value <= above {
            return Err(self.refuse(name, value, "above", above, advice));
        }
        if value >= below {
            return Err(self.refuse(name, value, "below", below, advice));
        }
        Ok(value)
    }

    /// A whole number between two limits, both allowed.
    pub(super) fn count(
        &self,
        name: &'static str,
        least: u32,
        most: u32,
    ) -> Result<u32, NominalError> {
        let value = self.number(name)?;
        if value.fract() != 0.0 {
            return Err(self.not_readable(name, format!("{value}")));
        }
        let advice = ("", "write a whole number within the limits");
        if value < f64::from(least) {
            return Err(self.refuse(name, value, "at least", f64::from(least), advice));
        }
        if value > f64::from(most) {
            return Err(self.refuse(name, value, "at most", f64::from(most), advice));
        }
        Ok(value as u32)
    }

    /// A plain number strictly between 0 and `below`.
    pub(super) fn ratio(&self, name: &'static str, below: f64) -> Result<f64, NominalError> {
        let value = self.number(name)?;
        let advice = ("", "write a plain number within the limits");
        if value.is_nan() || value <= 0.0 {
            return Err(self.refuse(name, value, "above", 0.0, advice));
        }
        if value >= below {
            return Err(self.refuse(name, value, "below", below, advice));
        }
        Ok(value)
    }

    /// A section inside this one, as a shape.
    pub(super) fn nested(&self, name: &'static str) -> Result<Shape, NominalError> {
        match self.value(name) {
            Some(SpecValue::Spec(spec)) => {
                spec.shape(self.nesting + 1)
                    .map_err(|source| NominalError::Nested {
                        place: format!("`{name}`"),
                        source: Box::new(source),
                    })
            }
            Some(other) => Err(self.not_readable(name, describe(other))),
            None => Err(self.missing(name)),
        }
    }

    /// A value outside its limits; `advice` is where the limit comes from and what to do.
    pub(super) fn refuse(
        &self,
        name: &'static str,
        value: f64,
        relation: &'static str,
        limit: f64,
        advice: (&'static str, &'static str),
    ) -> NominalError {
        let quantity = self
            .parameter(name)
            .map_or(Quantity::Length, |p| p.quantity);
        NominalError::OutOfRange {
            kind: self.kind(),
            parameter: name,
            value: Amount { value, quantity },
            relation,
            limit: Amount {
                value: limit,
                quantity,
            },
            reason: advice.0,
            remedy: advice.1,
        }
    }

    /// A curve that could not be made.
    pub(super) fn curve_error(&self, source: CurveError) -> NominalError {
        NominalError::Curve {
            kind: self.kind(),
            source,
        }
    }

    /// A value of the wrong sort.
    pub(super) fn not_readable(&self, name: &'static str, found: String) -> NominalError {
        let info = self.parameter(name);
        NominalError::NotReadable {
            kind: self.kind(),
            parameter: name,
            found,
            quantity: info.map_or(Quantity::Length, |p| p.quantity),
            example: info.map_or("", |p| p.example),
        }
    }

    /// A required parameter that is missing.
    pub(super) fn missing(&self, name: &'static str) -> NominalError {
        let info = self.parameter(name);
        NominalError::Missing {
            kind: self.kind(),
            parameter: name,
            meaning: info.map_or("", |p| p.meaning),
            example: info.map_or("", |p| p.example),
        }
    }

    /// Refuses a length that is not above a limit that stands for zero.
    fn check_above(
        &self,
        name: &'static str,
        value: f64,
        smallest: f64,
    ) -> Result<f64, NominalError> {
        if value <= 0.0 {
            let advice = ("", "give a length above zero");
            return Err(self.refuse(name, value, "above", 0.0, advice));
        }
        if value < smallest {
            let advice = (", the size of an atom", "check the number and its unit");
            return Err(self.refuse(name, value, "at least", smallest, advice));
        }
        Ok(value)
    }

    /// The text of a length or angle, or its default.
    fn text(&self, name: &'static str) -> Result<&'a str, NominalError> {
        match self.value(name) {
            Some(SpecValue::Text(text)) => Ok(text),
            Some(&SpecValue::Number(value)) => {
                let info = self.parameter(name);
                Err(NominalError::BareNumber {
                    kind: self.kind(),
                    parameter: name,
                    value,
                    quantity: info.map_or(Quantity::Length, |p| p.quantity),
                    example: info.map_or("30 um", |p| p.example),
                })
            }
            Some(other) => Err(self.not_readable(name, describe(other))),
            None => self.default(name).ok_or_else(|| self.missing(name)),
        }
    }

    /// A plain number, or its default.
    fn number(&self, name: &'static str) -> Result<f64, NominalError> {
        let text = match self.value(name) {
            Some(&SpecValue::Number(value)) => {
                return if value.is_finite() {
                    Ok(value)
                } else {
                    Err(self.not_readable(name, format!("{value}")))
                };
            }
            Some(SpecValue::Text(text)) => text,
            Some(other) => return Err(self.not_readable(name, describe(other))),
            None => self.default(name).ok_or_else(|| self.missing(name))?,
        };
        text.trim()
            .parse()
            .ok()
            .filter(|v: &f64| v.is_finite())
            .ok_or_else(|| self.not_readable(name, format!("`{text}`")))
    }

    /// The error for a length or an angle that cannot be read.
    fn not_measured(&self, name: &'static str, source: UnitError) -> NominalError {
        NominalError::Unit {
            kind: self.kind(),
            parameter: name,
            example: self.parameter(name).map_or("30 um", |p| p.example),
            source,
        }
    }

    /// Default of a parameter.
    fn default(&self, name: &'static str) -> Option<&'static str> {
        self.parameter(name).and_then(|p| p.default)
    }

    /// Table entry of a parameter.
    fn parameter(&self, name: &'static str) -> Option<&'static ParameterInfo> {
        all_parameters(self.info).find(|p| p.name == name)
    }
}

/// The error for a kind that is not in the table.
pub(super) fn unknown_kind(kind: &str) -> NominalError {
    let known: Vec<&'static str> = kinds().iter().map(|info| info.name).collect();
    NominalError::UnknownKind {
        kind: kind.to_owned(),
        nearest: nearest(kind, &known),
        known: known.join(", "),
    }
}

/// What a value is, for a message.
pub(super) fn describe(value: &SpecValue) -> String {
    match value {
        SpecValue::Text(text) => format!("`{text}`"),
        SpecValue::Number(number) => format!("{number}"),
        SpecValue::Spec(spec) => format!("a section (`{}`)", spec.kind),
        SpecValue::List(members) => format!("a list of {}", members.len()),
    }
}

/// The parameters of a kind, then the modifiers.
fn all_parameters(info: &'static KindInfo) -> impl Iterator<Item = &'static ParameterInfo> {
    info.parameters.iter().chain(modifiers())
}
