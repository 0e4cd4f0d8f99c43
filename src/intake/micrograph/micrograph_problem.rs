//! What can be wrong with a picture.

/// What is wrong with a picture.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum MicrographProblem {}

impl MicrographProblem {
    /// What the user can do, in one sentence.
    pub fn hint(&self) -> String {
        match *self {}
    }

    /// Whether a unit, a scale or a choice is missing or in doubt, rather than the file being wrong.
    pub fn is_ambiguous(&self) -> bool {
        match *self {}
    }
}
