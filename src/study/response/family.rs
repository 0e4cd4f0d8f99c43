//! The sections of a response table: a nominal kind with some parameters free, or an outline whose walls move.

use std::collections::BTreeMap;

use super::error::{MOST_PARAMETERS, PointError, ResponseError};
use super::parameter::{
    ParameterUnit, ResponseParameter, motion_trend, nominal_trend, nominal_unit,
};
use super::range::{RangeText, plain_name};
use crate::geometry::{
    Film, FilmOn, NominalError, NominalSpec, Outline, ParameterInfo, SpecValue, WallStretch, kinds,
    largest_inscribed_circle, modifiers,
};
use crate::study::moved_outline::outline_moved_by;
use crate::study::wall_motion::WallMotion;
use crate::study::wall_motion_cases::{NoMotion, WallMotions, wall_motions};
use crate::units::spelling::nearest;

/// The name of the film, which is laid on as a film and not moved like a wall.
const FILM: &str = "film";
/// Share of the inscribed circle over which the direction of short edges is taken, as for the sensitivity.
const CHORDS_ACROSS: f64 = 128.0;

/// Sections by the values of their parameters.
#[derive(Debug, Clone, PartialEq)]
pub struct ResponseFamily {
    /// The parameters in the order in which they were given.
    pub parameters: Vec<ResponseParameter>,
    made: Made,
}

/// One section of a family.
pub(super) struct FamilyMember {
    pub(super) outline: Outline,
    /// What tiny lumens under a film, which are not in the outline, conduct at most, m^4.
    pub(super) conductance_left_out: f64,
}

impl FamilyMember {
    fn whole(outline: Outline) -> Self {
        Self {
            outline,
            conductance_left_out: 0.0,
        }
    }
}

/// How a section comes about.
#[derive(Debug, Clone, PartialEq)]
enum Made {
    /// A nominal kind with its fixed values.
    Nominal(NominalSpec),
    /// Walls of an outline moved.
    Moved {
        /// The unmoved outline.
        outline: Outline,
        /// One for each parameter; `None` for a film.
        motions: Vec<Option<WallMotion>>,
    },
}

impl ResponseFamily {
    /// A nominal kind.
    ///
    /// - `fixed`: kind and fixed values
    /// - `ranges`: the parameters that vary
    ///
    /// # Errors
    /// [`ResponseError`] for a range that is none, a parameter that the kind does not have or that cannot vary, one
    /// that is given twice or fixed as well, and more than three.
    pub fn nominal(fixed: NominalSpec, ranges: &[RangeText]) -> Result<Self, ResponseError> {
        check_count(ranges)?;
        let info = kinds().iter().find(|info| info.name == fixed.kind);
        let own = info.map_or(&[][..], |info| info.parameters);
        let all: Vec<&ParameterInfo> = own.iter().chain(modifiers()).collect();
        let parameters = ranges
            .iter()
            .map(|range| nominal_parameter(&fixed, range, &all))
            .collect::<Result<_, _>>()?;
        Ok(Self {
            parameters,
            made: Made::Nominal(fixed),
        })
    }

    /// An outline whose walls move.
    ///
    /// - `outline`: valid, m
    /// - `walls`: stretches of it with names
    /// - `ranges`: motions by the names of the sensitivity cases, with ranges of lengths, angles or per cent
    ///
    /// # Errors
    /// As [`ResponseFamily::nominal`], and for a motion that moves nothing here.
    pub fn moved(
        outline: &Outline,
        walls: &[WallStretch],
        ranges: &[RangeText],
    ) -> Result<Self, ResponseError> {
        check_count(ranges)?;
        let outline = outline.clone().oriented();
        let diameters = outline
            .lumens
            .iter()
            .map(|lumen| largest_inscribed_circle(lumen).map_or(0.0, |circle| 2.0 * circle.radius));
        let chord = diameters.fold(f64::INFINITY, f64::min) / CHORDS_ACROSS;
        let WallMotions { outline, cases } = wall_motions(&outline, walls, chord);
        let mut parameters = Vec::new();
        let mut motions = Vec::new();
        for range in ranges {
            let (parameter, motion) = moving_parameter(range, &cases)?;
            parameters.push(parameter);
            motions.push(motion);
        }
        Ok(Self {
            parameters,
            made: Made::Moved { outline, motions },
        })
    }

    /// Whether this is a nominal kind, and which.
    pub fn nominal_spec(&self) -> Option<&NominalSpec> {
        match &self.made {
            Made::Nominal(spec) => Some(spec),
            Made::Moved { .. } => None,
        }
    }

    /// The section at some values of the parameters, SI, in their order.
    ///
    /// # Errors
    /// [`PointError`] where there is no such section.
    pub fn outline(&self, values: &[f64]) -> Result<Outline, PointError> {
        Ok(self.member(values)?.outline)
    }

    /// The same with what a film left out of it.
    pub(super) fn member(&self, values: &[f64]) -> Result<FamilyMember, PointError> {
        match &self.made {
            Made::Nominal(spec) => {
                let mut spec = spec.clone();
                for (parameter, &value) in self.parameters.iter().zip(values) {
                    let written = match parameter.unit {
                        ParameterUnit::One => SpecValue::Number(value),
                        unit => SpecValue::Text(format!("{value:?} {}", unit.name())),
                    };
                    spec.values.insert(parameter.name.clone(), written);
                }
                Ok(FamilyMember::whole(spec.outline()?))
            }
            Made::Moved { outline, motions } => {
                let (mut changes, mut film) = (Vec::new(), 0.0);
                for ((parameter, motion), &value) in self.parameters.iter().zip(motions).zip(values)
                {
                    match motion {
                        None => film = value,
                        Some(motion) => changes.push((motion, change(parameter, motion, value))),
                    }
                }
                moved(outline, &changes, film)
            }
        }
    }

    /// The values of the parameters in words, for messages.
    pub fn place(&self, values: &[f64]) -> String {
        let words = self.parameters.iter().zip(values).map(|(parameter, &v)| {
            let (factor, unit) = match parameter.unit {
                ParameterUnit::Length => (1e6, " um"),
                ParameterUnit::Angle => (1_f64.to_degrees(), " deg"),
                ParameterUnit::One => (1.0, ""),
            };
            // Six digits, without zeros that say nothing.
            let shown = format!("{:.5e}", v * factor).parse().unwrap_or(v * factor);
            format!("{} = {shown}{unit}", parameter.name)
        });
        words.collect::<Vec<_>>().join(", ")
    }
}

fn check_count(ranges: &[RangeText]) -> Result<(), ResponseError> {
    match ranges.len() {
        0 => return Err(ResponseError::NothingVaried),
        count if count > MOST_PARAMETERS => return Err(ResponseError::TooMany { count }),
        _ => {}
    }
    for (k, range) in ranges.iter().enumerate() {
        if ranges[..k].iter().any(|other| other.name == range.name) {
            return Err(ResponseError::Twice {
                parameter: range.name.clone(),
            });
        }
    }
    Ok(())
}

fn nominal_parameter(
    fixed: &NominalSpec,
    range: &RangeText,
    all: &[&ParameterInfo],
) -> Result<ResponseParameter, ResponseError> {
    let Some(info) = all.iter().find(|info| info.name == range.name) else {
        let varied: Vec<&'static str> = all
            .iter()
            .filter(|info| nominal_unit(info.quantity).is_some())
            .map(|info| info.name)
            .collect();
        return Err(ResponseError::UnknownParameter {
            owner: format!("`{}`", fixed.kind),
            parameter: range.name.clone(),
            nearest: nearest(&range.name, &varied).map(str::to_owned),
            known: varied.join(", "),
        });
    };
    let unit = nominal_unit(info.quantity).ok_or_else(|| ResponseError::NotAMeasure {
        parameter: range.name.clone(),
        quantity: info.quantity.to_string(),
    })?;
    if fixed.values.contains_key(info.name) {
        return Err(ResponseError::FixedAndVaried {
            parameter: range.name.clone(),
        });
    }
    let [low, high] = range.of_unit(unit)?;
    let (expected, expected_because) = nominal_trend(&fixed.kind, info.name);
    Ok(ResponseParameter {
        name: range.name.clone(),
        definition: info.meaning.to_owned(),
        unit,
        low,
        high,
        expected,
        expected_because,
    })
}

fn moving_parameter(
    range: &RangeText,
    cases: &[Result<WallMotion, NoMotion>],
) -> Result<(ResponseParameter, Option<WallMotion>), ResponseError> {
    let present: Vec<&str> = cases.iter().flatten().map(|m| m.name.as_str()).collect();
    let known = present.join(", ");
    let found = cases.iter().find(|case| match case {
        Ok(motion) => motion.name == range.name,
        Err(none) => none.name == range.name,
    });
    let motion = match found {
        Some(Ok(motion)) => motion,
        Some(Err(none)) => {
            return Err(ResponseError::NoMotion {
                parameter: none.name.clone(),
                reason: none.reason.clone(),
                known,
            });
        }
        None => {
            return Err(ResponseError::UnknownParameter {
                owner: "an outline".to_owned(),
                parameter: range.name.clone(),
                nearest: nearest(&range.name, &present).map(str::to_owned),
                known,
            });
        }
    };
    let has_length = motion.reference_length.is_some();
    let ([low, high], unit) = range.of_motion(motion.measure, has_length)?;
    let is_film = motion.name == FILM;
    if is_film && low < 0.0 {
        return Err(ResponseError::NegativeFilm {
            range: range.range.clone(),
        });
    }
    let (expected, expected_because) = motion_trend(&motion.name);
    let parameter = ResponseParameter {
        name: motion.name.clone(),
        definition: format!("change from the section as given: {}", motion.definition),
        unit,
        low,
        high,
        expected,
        expected_because,
    };
    Ok((parameter, (!is_film).then(|| motion.clone())))
}

/// A change in the unit of the motion.
fn change(parameter: &ResponseParameter, motion: &WallMotion, value: f64) -> f64 {
    match (parameter.unit, motion.reference_length) {
        (ParameterUnit::Length, Some(length)) => value / length,
        _ => value,
    }
}

/// Walls moved, and a film laid on what they leave.
fn moved(
    outline: &Outline,
    changes: &[(&WallMotion, f64)],
    film: f64,
) -> Result<FamilyMember, PointError> {
    let outline = if changes.iter().any(|(_, change)| *change != 0.0) {
        outline_moved_by(outline, changes)
            .map_err(|_| PointError::Crossed)?
            .outline
    } else {
        outline.clone()
    };
    if film > 0.0 {
        let film = Film {
            thickness: film,
            on: FilmOn::All,
        };
        let filmed = film.applied_to(&outline)?;
        return Ok(FamilyMember {
            outline: filmed.outline,
            conductance_left_out: filmed.report.conductance_left_out,
        });
    }
    Ok(FamilyMember::whole(outline))
}

/// Fixed values of a nominal kind from texts `NAME=VALUE`; sections and lists in their brackets.
///
/// # Errors
/// [`NominalError`] for a value that cannot be read, a name that the kind does not have, and one given twice.
pub fn fixed_values<'a>(
    kind: &str,
    texts: impl IntoIterator<Item = &'a str>,
) -> Result<NominalSpec, NominalError> {
    let mut values = BTreeMap::new();
    for text in texts {
        let problem = |column, problem| NominalError::Syntax {
            text: text.to_owned(),
            column,
            problem,
        };
        let (name, value) = text
            .split_once('=')
            .ok_or_else(|| problem(1, "`=` is expected after the name of a parameter"))?;
        let bracketed = value.trim_start().starts_with(['(', '[']);
        let value = if bracketed {
            value.parse()?
        } else {
            SpecValue::Text(value.trim().to_owned())
        };
        if values.insert(plain_name(name), value).is_some() {
            return Err(problem(1, "this parameter was given before"));
        }
    }
    let spec = NominalSpec {
        kind: kind.to_owned(),
        values,
    };
    check_names(&spec)?;
    Ok(spec)
}

/// Refuses names that the kind does not have, before anything is varied.
fn check_names(spec: &NominalSpec) -> Result<(), NominalError> {
    match spec.outline() {
        Err(error @ (NominalError::UnknownParameter { .. } | NominalError::UnknownKind { .. })) => {
            Err(error)
        }
        _ => Ok(()),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_a_film_cuts_off_and_leaves_out_stays_known() {
        // A pocket of 0.2 um behind a neck of 0.1 um, on a channel of 100 by 40 um; micrometres.
        let pocket = [
            [0.0, 0.0],
            [100.0, 0.0],
            [100.0, 40.0],
            [50.05, 40.0],
            [50.05, 41.0],
            [50.1, 41.0],
            [50.1, 41.2],
            [49.9, 41.2],
            [49.9, 41.0],
            [49.95, 41.0],
            [49.95, 40.0],
            [0.0, 40.0],
        ];
        let outline = Outline::single(pocket.map(|p| p.map(|x| x * 1e-6)).to_vec());
        let ranges = [RangeText::read("film=0.01..0.06um").unwrap()];
        let family = ResponseFamily::moved(&outline, &[], &ranges).unwrap();
        let open = family.member(&[0.01e-6]).unwrap();
        assert_eq!(open.conductance_left_out.to_bits(), 0.0_f64.to_bits());
        let closed = family.member(&[0.06e-6]).unwrap();
        assert_eq!(closed.outline.lumens.len(), 1);
        // 0.08 by 0.14 um less what is below two arcs about the corners of the neck; K is at most A^2 / (8 pi).
        let t = 0.06e-6_f64;
        let under = |u: f64| 0.5 * (u * (t * t - u * u).sqrt() + t * t * (u / t).asin());
        let area = 0.08e-6 * 0.14e-6 - 2.0 * (under(0.05e-6) - under(0.01e-6));
        let most = area * area / (8.0 * std::f64::consts::PI);
        assert!((closed.conductance_left_out / most - 1.0).abs() < 2e-3);
    }
}
