//! A nominal section between two others of the same kind: every dimension in between, in proportion.

use std::collections::BTreeMap;

use super::kinds::{Quantity, kinds, modifiers, post_parameters};
use super::{NominalSpec, SpecValue};
use crate::units::{parse_angle, parse_length};

/// Why two nominal sections have none in between.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[non_exhaustive]
pub enum NotBetween {
    /// They are of different kinds.
    #[error("one is of kind `{first}`, the other of kind `{second}`")]
    Kinds {
        /// Kind of the first.
        first: String,
        /// Kind of the second.
        second: String,
    },
    /// Only one of them gives the parameter.
    #[error("only one of them gives `{parameter}`")]
    OneSided {
        /// The parameter.
        parameter: String,
    },
    /// A parameter that has nothing in between.
    #[error("`{parameter}` differs and has nothing in between")]
    Discrete {
        /// The parameter.
        parameter: String,
    },
}

impl NominalSpec {
    /// The section at a share of the way to another of the same kind: lengths, angles and ratios change in
    /// proportion, everything else must be equal.
    ///
    /// - `share`: 0 for this section, 1 for the other
    ///
    /// # Errors
    /// [`NotBetween`] when the kinds or the parameters given differ, or a count does.
    ///
    /// # Examples
    /// ```
    /// use etchwise::geometry::NominalSpec;
    /// let shallow: NominalSpec = "rectangle width=1mm height=20um".parse()?;
    /// let deep: NominalSpec = "rectangle width=1mm height=40um".parse()?;
    /// let middle = shallow.between(&deep, 0.5).unwrap().outline()?;
    /// assert!((middle.area() / 30e-9 - 1.0).abs() < 1e-12);
    /// # Ok::<(), etchwise::geometry::NominalError>(())
    /// ```
    pub fn between(&self, other: &Self, share: f64) -> Result<Self, NotBetween> {
        if self.kind != other.kind {
            return Err(NotBetween::Kinds {
                first: self.kind.clone(),
                second: other.kind.clone(),
            });
        }
        let missing = |a: &Self, b: &Self| {
            let mut names = a.values.keys();
            names.find(|name| !b.values.contains_key(*name)).cloned()
        };
        if let Some(parameter) = missing(self, other).or_else(|| missing(other, self)) {
            return Err(NotBetween::OneSided { parameter });
        }
        let mut values = BTreeMap::new();
        for (name, value) in &self.values {
            let Some(to) = other.values.get(name) else {
                continue;
            };
            let quantity = quantity(&self.kind, name);
            let between = between(value, to, share, quantity).map_err(|e| e.named(name))?;
            values.insert(name.clone(), between);
        }
        Ok(Self {
            kind: self.kind.clone(),
            values,
        })
    }
}

impl NotBetween {
    /// The same with the name of the parameter that holds it, where it has none yet.
    fn named(self, name: &str) -> Self {
        match self {
            Self::Discrete { parameter } if parameter.is_empty() => Self::Discrete {
                parameter: name.to_owned(),
            },
            other => other,
        }
    }
}

/// What a parameter is, where the kind has it.
fn quantity(kind: &str, name: &str) -> Option<Quantity> {
    let own = kinds().iter().find(|info| info.name == kind);
    let own = own.map_or(&[][..], |info| info.parameters);
    let mut all = own.iter().chain(modifiers()).chain(post_parameters());
    all.find(|info| info.name == name).map(|info| info.quantity)
}

fn between(
    from: &SpecValue,
    to: &SpecValue,
    share: f64,
    quantity: Option<Quantity>,
) -> Result<SpecValue, NotBetween> {
    if from == to {
        return Ok(from.clone());
    }
    let discrete = || NotBetween::Discrete {
        parameter: String::new(),
    };
    let mix = |a: f64, b: f64| a + share * (b - a);
    match (from, to) {
        (SpecValue::Text(a), SpecValue::Text(b)) => {
            if let (Ok(a), Ok(b)) = (parse_length(a), parse_length(b)) {
                return Ok(SpecValue::Text(format!("{:?} m", mix(a, b))));
            }
            match (parse_angle(a), parse_angle(b)) {
                (Ok(a), Ok(b)) => Ok(SpecValue::Text(format!("{:?} rad", mix(a, b)))),
                _ => Err(discrete()),
            }
        }
        (SpecValue::Number(a), SpecValue::Number(b)) if quantity == Some(Quantity::Ratio) => {
            Ok(SpecValue::Number(mix(*a, *b)))
        }
        (SpecValue::Spec(a), SpecValue::Spec(b)) => a.between(b, share).map(SpecValue::Spec),
        (SpecValue::List(a), SpecValue::List(b)) if a.len() == b.len() => a
            .iter()
            .zip(b)
            .map(|(a, b)| between(a, b, share, None))
            .collect::<Result<_, _>>()
            .map(SpecValue::List),
        _ => Err(discrete()),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn spec(text: &str) -> NominalSpec {
        text.parse().unwrap()
    }

    #[test]
    fn lengths_and_angles_change_in_proportion() {
        let from = spec("trapezoid top_width=100um depth=40um left_angle=80deg right_angle=80deg");
        let to = spec("trapezoid top_width=120um depth=20um left_angle=60deg right_angle=80deg");
        let area = |s: &NominalSpec| s.outline().unwrap().area();
        let quarter = from.between(&to, 0.25).unwrap();
        let by_hand =
            spec("trapezoid top_width=105um depth=35um left_angle=75deg right_angle=80deg");
        assert!((area(&quarter) / area(&by_hand) - 1.0).abs() < 1e-12);
        assert!((area(&from.between(&to, 1.0).unwrap()) / area(&to) - 1.0).abs() < 1e-12);
    }

    #[test]
    fn kinds_counts_and_parameters_must_agree() {
        let hexagon = spec("regular_polygon sides=6 side=20um");
        let octagon = spec("regular_polygon sides=8 side=20um");
        assert_eq!(
            hexagon.between(&octagon, 0.5).unwrap_err(),
            NotBetween::Discrete {
                parameter: "sides".to_owned()
            }
        );
        let flats = spec("regular_polygon sides=6 across_flats=20um");
        assert!(matches!(
            hexagon.between(&flats, 0.5).unwrap_err(),
            NotBetween::OneSided { .. }
        ));
        let circle = spec("circle diameter=20um");
        assert!(matches!(
            hexagon.between(&circle, 0.5).unwrap_err(),
            NotBetween::Kinds { .. }
        ));
    }
}
