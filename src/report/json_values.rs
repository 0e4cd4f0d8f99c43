//! Numbers of the JSON views: a value, its unit, its bounds, its error, or why there is none.

use serde::Serialize;

use crate::flow::SectionFlow;
use crate::geometry::Point;
use crate::measured::Estimate;

/// A value as pretty-printed JSON with a closing line feed.
pub(super) fn pretty(value: &impl Serialize) -> Result<String, serde_json::Error> {
    let mut text = serde_json::to_string_pretty(value)?;
    text.push('\n');
    Ok(text)
}

/// A number or null.
#[derive(Serialize)]
#[serde(untagged)]
pub(super) enum Number {
    Real(f64),
    Count(usize),
    Absent,
}

/// One number with its unit.
#[derive(Serialize)]
pub(super) struct Quantity {
    pub(super) value: Number,
    pub(super) unit: &'static str,
    #[serde(skip_serializing_if = "Option::is_none")]
    pub(super) low: Option<Number>,
    #[serde(skip_serializing_if = "Option::is_none")]
    pub(super) high: Option<Number>,
    #[serde(skip_serializing_if = "Option::is_none")]
    pub(super) estimated_error: Option<Number>,
    /// Standard uncertainty.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub(super) u: Option<Number>,
    #[serde(skip_serializing_if = "Option::is_none")]
    pub(super) absent_because: Option<String>,
}

/// A number with its unit and its proven bracket.
#[derive(Serialize)]
pub(super) struct Bracketed {
    #[serde(flatten)]
    pub(super) quantity: Quantity,
    #[serde(skip_serializing_if = "Option::is_none")]
    pub(super) bracket_absent_because: Option<String>,
}

impl Number {
    pub(super) fn real(value: f64) -> Self {
        if value.is_finite() {
            Self::Real(value)
        } else {
            Self::Absent
        }
    }
}

impl Quantity {
    pub(super) fn real(value: f64, unit: &'static str) -> Self {
        Self {
            value: Number::real(value),
            unit,
            low: None,
            high: None,
            estimated_error: None,
            u: None,
            absent_because: (!value.is_finite())
                .then(|| "the computed value is not finite".to_owned()),
        }
    }

    pub(super) fn optional(value: Option<f64>, unit: &'static str, reason: &str) -> Self {
        value.map_or(
            Self {
                value: Number::Absent,
                unit,
                low: None,
                high: None,
                estimated_error: None,
                u: None,
                absent_because: Some(reason.to_owned()),
            },
            |v| Self::real(v, unit),
        )
    }

    pub(super) fn count(value: usize) -> Self {
        Self {
            value: Number::Count(value),
            unit: "1",
            low: None,
            high: None,
            estimated_error: None,
            u: None,
            absent_because: None,
        }
    }

    pub(super) fn estimate(estimate: Estimate, unit: &'static str) -> Self {
        Self {
            estimated_error: Some(Number::real(estimate.error)),
            ..Self::real(estimate.value, unit)
        }
    }

    /// The same with its standard uncertainty, where one is known.
    pub(super) fn with_u(self, u: Option<f64>) -> Self {
        Self {
            u: u.map(Number::real),
            ..self
        }
    }

    /// The same with the proven bounds that follow from those of the conductance.
    pub(super) fn between(self, bounds: Option<(f64, f64)>) -> Self {
        match bounds {
            Some((low, high)) if !matches!(self.value, Number::Absent) => Self {
                low: Some(Number::real(low)),
                high: Some(Number::real(high)),
                ..self
            },
            _ => self,
        }
    }

    /// The conductance with its proven bounds, null with the reason where there are none.
    pub(super) fn bracketed(flow: &SectionFlow) -> Bracketed {
        match &flow.bracket {
            Ok(proven) => Bracketed::new(flow.conductance, Some((proven.low, proven.high)), None),
            Err(error) => Bracketed::new(flow.conductance, None, Some(error.to_string())),
        }
    }
}

impl Bracketed {
    /// A conductance with its bounds, or null and the reason.
    pub(super) fn new(
        conductance: Estimate,
        bounds: Option<(f64, f64)>,
        bracket_absent_because: Option<String>,
    ) -> Self {
        let quantity = Quantity::estimate(conductance, "m^4");
        let quantity = if bounds.is_some() {
            quantity.between(bounds)
        } else {
            Quantity {
                low: Some(Number::Absent),
                high: Some(Number::Absent),
                ..quantity
            }
        };
        Self {
            quantity,
            bracket_absent_because,
        }
    }
}

/// A point as two numbers in metres.
pub(super) fn place(at: Point) -> [Number; 2] {
    at.map(Number::real)
}

/// An estimate that may be missing.
pub(super) fn maybe(
    estimate: Option<Estimate>,
    unit: &'static str,
    reason: &'static str,
) -> Quantity {
    estimate.map_or_else(
        || Quantity::optional(None, unit, reason),
        |e| Quantity::estimate(e, unit),
    )
}
