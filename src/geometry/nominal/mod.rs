//! Nominal sections: a kind and its dimensions as an outline.

use std::collections::BTreeMap;

use super::Outline;

/// A nominal section: its kind and its dimensions.
#[derive(Debug, Clone, PartialEq)]
pub struct NominalSpec {
    /// Which shape.
    pub kind: String,
    /// Dimensions by name.
    pub values: BTreeMap<String, SpecValue>,
}

/// One dimension of a nominal section.
#[derive(Debug, Clone, PartialEq)]
pub enum SpecValue {
    /// Text with a unit, or a word.
    Text(String),
    /// A bare number.
    Number(f64),
    /// A section inside the section.
    Spec(NominalSpec),
    /// Several values.
    List(Vec<SpecValue>),
}

/// Why a nominal section has no outline.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum NominalError {
    /// The kind is not known.
    #[error("`{kind}` is not a kind of nominal section")]
    UnknownKind {
        /// The kind as given.
        kind: String,
    },
    /// A dimension is missing or not a length.
    #[error("`{name}` must be a length such as \"30 um\"")]
    Dimension {
        /// Name of the dimension.
        name: String,
    },
}

impl NominalError {
    /// What the user can do.
    pub fn hint(&self) -> String {
        match self {
            Self::UnknownKind { .. } => "known kinds: rectangle".to_owned(),
            Self::Dimension { name } => format!("write {name} = \"30 um\""),
        }
    }
}

impl NominalSpec {
    /// The outline in metres.
    ///
    /// # Errors
    /// [`NominalError`] for an unknown kind or a missing dimension.
    pub fn outline(&self) -> Result<Outline, NominalError> {
        if self.kind != "rectangle" {
            return Err(NominalError::UnknownKind {
                kind: self.kind.clone(),
            });
        }
        let (w, h) = (self.length("width")?, self.length("height")?);
        Ok(Outline::single(vec![
            [0.0, 0.0],
            [w, 0.0],
            [w, h],
            [0.0, h],
        ]))
    }

    fn length(&self, name: &str) -> Result<f64, NominalError> {
        match self.values.get(name) {
            Some(SpecValue::Text(text)) => crate::units::parse_length(text).ok(),
            _ => None,
        }
        .ok_or_else(|| NominalError::Dimension {
            name: name.to_owned(),
        })
    }
}
