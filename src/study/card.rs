//! The card of a section: every coefficient that a network model needs, with its certainty and its limits.
//!
//! Everything is per length of channel and for one fluid at its reference temperature, SI:
//! `R' = mu / K`, inertance `rho beta / A` with the momentum factor `beta`, volume `A`, wall area `P`. The
//! sensitivities of `ln R` come from the shape derivative ([`super::sensitivity_study`]); a standard
//! uncertainty of `ln R` follows from stated uncertainties of the dimensions by the law of propagation of the
//! GUM (JCGM 100:2008, 5.1.2, independent inputs, first order). Numerical range, reach and uncertainty stay
//! apart.

use crate::flow::{
    ENTRANCE_SHARE, EntranceModel, Fluid, NOT_LAMINAR, SectionFlow, TemperatureLaw,
    TemperatureLawError, WallStatistics, entrance_length, excess_pressure_factor, pressure_limit,
};
use crate::measured::Estimate;

use super::{Measure, SensitivityStudy};

/// Name of the input that is the viscosity itself.
pub const VISCOSITY_INPUT: &str = "viscosity";

/// The card of one solved section.
#[derive(Debug, Clone, PartialEq)]
pub struct SectionCard {
    /// Resistance per length `mu / K`, Pa s/m^4.
    pub resistance_per_length: Estimate,
    /// Its proven range, Pa s/m^4.
    pub proven: Option<(f64, f64)>,
    /// Standard uncertainty of `ln R` from what was stated.
    pub uncertainty: Option<Uncertainty>,
    /// `R(T) / R(T0)`, or why there is none.
    pub temperature_law: Result<TemperatureLaw, TemperatureLawError>,
    /// Inertance per length `rho beta / A`, kg/m^5; `None` without a density.
    pub inertance_per_length: Option<Estimate>,
    /// Flow area over the width of the section, m.
    pub mean_depth: f64,
    /// Incremental pressure-drop coefficient `2 (Ke - Kd)`.
    pub incremental_pressure_drop: Estimate,
    /// Wall shear per flow rate, Pa s/m^3.
    pub wall_shear: ShearPerFlow,
    /// `dlnR` for a relative change of the depth, the width and the scale, and per metre of film.
    pub sensitivities: Vec<CardSensitivity>,
    /// Where the card stops holding.
    pub limits: CardLimits,
}

/// Wall shear per flow rate, Pa s/m^3.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ShearPerFlow {
    /// Mean over the wall.
    pub mean: f64,
    /// Largest value.
    pub max: f64,
    /// Percentiles by length of wall, as [`crate::flow::PERCENTILES`].
    pub percentiles: [f64; 5],
    /// Sides of re-entrant corners where a mean over a stated length stands for the unbounded shear.
    pub singular_sides: usize,
}

/// One sensitivity of `ln R`.
#[derive(Debug, Clone, PartialEq)]
pub struct CardSensitivity {
    /// Name of the case.
    pub name: &'static str,
    /// What exactly moves; empty where the section does not have the case.
    pub definition: String,
    /// Unit of the value.
    pub unit: &'static str,
    /// `dlnR` per unit of change with its estimated error, or why there is none.
    pub value: Result<Estimate, String>,
}

/// What the cards of a section are for: the limits of its model.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct CardLimits {
    /// Largest Reynolds number on the hydraulic diameter.
    pub reynolds_high: f64,
    /// Hydraulic diameter, m.
    pub hydraulic_diameter: f64,
    /// Flow rate at that Reynolds number, m^3/s; `None` without a density.
    pub flow_rate_high: Option<f64>,
    /// Share of a length that the entrance takes at the shortest lengths.
    pub entrance_share: f64,
    /// Shortest length in creeping flow, m.
    pub shortest_length_creeping: f64,
    /// Shortest length at the largest flow rate, m.
    pub shortest_length_at_flow_rate_high: f64,
    /// Largest pressure drop for which the properties of the fluid hold, Pa, where it is known.
    pub pressure_drop_high: Option<f64>,
}

/// A standard uncertainty that somebody states.
#[derive(Debug, Clone, PartialEq)]
pub struct StatedUncertainty {
    /// Case of the sensitivity study, or [`VISCOSITY_INPUT`].
    pub input: String,
    /// Its value.
    pub value: Stated,
}

/// Value of a stated uncertainty.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Stated {
    /// Relative, unit 1.
    Relative(f64),
    /// A length, m.
    Length(f64),
    /// An angle, rad.
    Angle(f64),
}

/// Standard uncertainty of `ln R`, first order, inputs independent.
#[derive(Debug, Clone, PartialEq)]
pub struct Uncertainty {
    /// Standard uncertainty of `ln R`, which is the relative one of `R`.
    pub of_log_resistance: f64,
    /// What each input adds.
    pub parts: Vec<UncertaintyPart>,
}

/// What one input adds to the uncertainty of `ln R`.
#[derive(Debug, Clone, PartialEq)]
pub struct UncertaintyPart {
    /// Name of the input.
    pub input: String,
    /// Its standard uncertainty as stated.
    pub stated: Stated,
    /// Standard uncertainty of `ln R` from it alone, with the sign of the sensitivity.
    pub of_log_resistance: f64,
}

/// Why there is no card.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum CardError {
    /// An uncertainty of something that the section does not have.
    #[error("the section has no `{input}` whose uncertainty could count; it has {known}")]
    NoSuchInput {
        /// Name as given.
        input: String,
        /// Names that there are.
        known: String,
    },
    /// Inputs so extreme that the resistance leaves the range of numbers.
    #[error(
        "the resistance per length comes out as {value} Pa s/m^4, outside the range of numbers"
    )]
    OutOfNumbers {
        /// The value.
        value: f64,
    },
    /// An uncertainty in the wrong kind of unit.
    #[error("the uncertainty of `{input}` must be {wanted}")]
    WrongMeasure {
        /// Name as given.
        input: String,
        /// What it may be.
        wanted: &'static str,
    },
}

impl CardError {
    /// What the user can do.
    pub fn hint(&self) -> String {
        match self {
            Self::NoSuchInput { .. } => "name one of these".to_owned(),
            Self::OutOfNumbers { .. } => {
                "check the unit of the viscosity and of the section".to_owned()
            }
            Self::WrongMeasure { input, wanted } => {
                let value = if wanted.contains("angle") {
                    "0.5deg"
                } else if wanted.contains("length") {
                    "0.3um"
                } else {
                    "1%"
                };
                format!("write for example {input}={value}")
            }
        }
    }
}

/// What a card is made for.
#[derive(Debug, Clone, Copy)]
pub struct CardRequest<'a> {
    /// The fluid at the reference temperature.
    pub fluid: &'a Fluid,
    /// Temperatures of the law, K.
    pub temperatures: [f64; 2],
    /// Standard uncertainties as stated.
    pub uncertainties: &'a [StatedUncertainty],
}

impl SectionCard {
    /// The card of a solved section.
    ///
    /// - `flow`, `walls`: the solved section and the shear of all its walls together
    /// - `study`: its sensitivities
    ///
    /// # Errors
    /// [`CardError`] for an uncertainty that the section has no use for.
    ///
    /// # Examples
    /// ```
    /// use etchwise::flow::{Fluid, SolveOptions, WallReport};
    /// use etchwise::geometry::Outline;
    /// use etchwise::study::{
    ///     CardRequest, SectionCard, SensitivityOptions, sensitivity_study, solve_for_sensitivity,
    /// };
    /// let a = 100e-6;
    /// let square = Outline::single(vec![[0.0, 0.0], [a, 0.0], [a, a], [0.0, a]]);
    /// let solved = solve_for_sensitivity(&square, &SolveOptions::default())?;
    /// let study = sensitivity_study(&solved, &[], SensitivityOptions::default());
    /// let walls = WallReport::new(solved.outline(), &solved.flow.wall_shear.curve, &[]);
    /// let water = Fluid::water(298.15)?;
    /// let request =
    ///     CardRequest { fluid: &water, temperatures: [278.15, 333.15], uncertainties: &[] };
    /// let card = SectionCard::new(&solved.flow, &walls.whole, &study, &request)?;
    /// let exact = water.viscosity / (0.0351442537388 * a.powi(4));
    /// assert!((card.resistance_per_length.value / exact - 1.0).abs() < 1e-5);
    /// # Ok::<(), Box<dyn std::error::Error>>(())
    /// ```
    pub fn new(
        flow: &SectionFlow,
        walls: &WallStatistics,
        study: &SensitivityStudy,
        request: &CardRequest<'_>,
    ) -> Result<Self, CardError> {
        let CardRequest {
            fluid,
            temperatures,
            uncertainties,
        } = *request;
        let k = flow.conductance;
        let value = fluid.viscosity / k.value;
        if !(value.is_finite() && value > 0.0) {
            return Err(CardError::OutOfNumbers { value });
        }
        let area = flow.geometry.area;
        let per_flow = |per_gradient: f64| per_gradient * value;
        let uncertainty = (!uncertainties.is_empty())
            .then(|| uncertainty(study, uncertainties))
            .transpose()?;
        let factors = [flow.momentum_factor, flow.kinetic_energy_factor];
        Ok(Self {
            resistance_per_length: Estimate {
                value,
                error: value * k.relative(),
            },
            proven: flow
                .bracket
                .as_ref()
                .ok()
                .map(|proven| (fluid.viscosity / proven.high, fluid.viscosity / proven.low)),
            uncertainty,
            temperature_law: TemperatureLaw::of(fluid, temperatures),
            inertance_per_length: fluid
                .density
                .map(|density| flow.momentum_factor.scaled(density / area)),
            mean_depth: area / flow.geometry.width,
            incremental_pressure_drop: Estimate {
                value: excess_pressure_factor(factors[0].value, factors[1].value),
                error: 2.0 * (factors[0].error + factors[1].error),
            },
            wall_shear: ShearPerFlow {
                mean: per_flow(flow.wall_shear.mean_per_gradient),
                max: per_flow(walls.max),
                percentiles: walls.percentiles.map(per_flow),
                singular_sides: walls.singular_sides,
            },
            sensitivities: sensitivities(flow, study),
            limits: CardLimits::new(flow, fluid),
        })
    }
}

impl CardLimits {
    fn new(flow: &SectionFlow, fluid: &Fluid) -> Self {
        let hydraulic_diameter = flow.geometry.hydraulic_diameter;
        // Re = rho Q Dh / (mu A) = 4 rho Q / (mu P).
        let flow_rate = |density: f64| {
            NOT_LAMINAR * fluid.viscosity * flow.geometry.wetted_perimeter / (4.0 * density)
        };
        let shortest = |reynolds: f64| {
            entrance_length(EntranceModel::default(), hydraulic_diameter, reynolds) / ENTRANCE_SHARE
        };
        Self {
            reynolds_high: NOT_LAMINAR,
            hydraulic_diameter,
            flow_rate_high: fluid.density.map(flow_rate),
            entrance_share: ENTRANCE_SHARE,
            shortest_length_creeping: shortest(0.0),
            shortest_length_at_flow_rate_high: shortest(NOT_LAMINAR),
            pressure_drop_high: pressure_limit(fluid),
        }
    }
}

/// Relative error of integrals over the wall, from the identities that must hold for them.
fn wall_error(flow: &SectionFlow, study: &SensitivityStudy) -> f64 {
    let rellich = flow.identities.iter().find(|i| i.name == "rellich");
    let rellich = rellich.map_or(0.0, |identity| identity.relative_difference.abs());
    rellich.max((study.stretch_sum / 4.0 - 1.0).abs())
}

fn sensitivities(flow: &SectionFlow, study: &SensitivityStudy) -> Vec<CardSensitivity> {
    let error = wall_error(flow, study);
    ["depth", "width", "film", "scale"]
        .into_iter()
        .map(|name| {
            let case = study.case(name);
            let absent = || {
                let none = study.absent.iter().find(|none| none.name == name);
                none.map_or_else(
                    || "the section does not have this case".to_owned(),
                    |none| none.reason.clone(),
                )
            };
            CardSensitivity {
                name,
                definition: case.map_or_else(String::new, |case| case.definition.clone()),
                unit: match case.map(|case| case.measure) {
                    Some(Measure::Length) => "1/m",
                    Some(Measure::Angle) => "1/rad",
                    Some(Measure::Relative) | None => "1",
                },
                value: case.ok_or_else(absent).map(|case| Estimate {
                    value: -case.relative,
                    error: error * case.gross,
                }),
            }
        })
        .collect()
}

fn uncertainty(
    study: &SensitivityStudy,
    stated: &[StatedUncertainty],
) -> Result<Uncertainty, CardError> {
    let parts = stated
        .iter()
        .map(|one| part(study, one))
        .collect::<Result<Vec<_>, _>>()?;
    let square: f64 = parts.iter().map(|p| p.of_log_resistance.powi(2)).sum();
    Ok(Uncertainty {
        of_log_resistance: square.sqrt(),
        parts,
    })
}

fn part(
    study: &SensitivityStudy,
    stated: &StatedUncertainty,
) -> Result<UncertaintyPart, CardError> {
    let StatedUncertainty { input, value } = stated;
    let wrong = |wanted| CardError::WrongMeasure {
        input: input.clone(),
        wanted,
    };
    let of_log_resistance = if input == VISCOSITY_INPUT {
        match value {
            Stated::Relative(share) => *share,
            _ => return Err(wrong("a share, since R goes with the viscosity")),
        }
    } else {
        let case = study
            .case(input)
            .ok_or_else(|| no_such_input(study, input))?;
        match (case.measure, *value) {
            (Measure::Relative, Stated::Relative(change))
            | (Measure::Length, Stated::Length(change))
            | (Measure::Angle, Stated::Angle(change)) => -case.relative * change,
            (Measure::Relative, Stated::Length(change)) => {
                let per_metre = case.per_metre().ok_or_else(|| wrong("a share"))?;
                -per_metre * change
            }
            (Measure::Relative, _) => return Err(wrong("a share or a length")),
            (Measure::Length, _) => return Err(wrong("a length")),
            (Measure::Angle, _) => return Err(wrong("an angle")),
        }
    };
    Ok(UncertaintyPart {
        input: input.clone(),
        stated: *value,
        of_log_resistance,
    })
}

fn no_such_input(study: &SensitivityStudy, input: &str) -> CardError {
    let mut known: Vec<&str> = study.cases.iter().map(|case| case.name.as_str()).collect();
    known.push(VISCOSITY_INPUT);
    CardError::NoSuchInput {
        input: input.to_owned(),
        known: known.join(", "),
    }
}
