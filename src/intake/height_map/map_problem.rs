//! What can be wrong with a height map.

/// What is wrong with a height map.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum MapProblem {}

impl MapProblem {
    /// What the user can do, in one sentence.
    pub fn hint(&self) -> String {
        match *self {}
    }

    /// Whether a unit, a scale or a choice is missing or in doubt, rather than the file being wrong.
    pub fn is_ambiguous(&self) -> bool {
        match *self {}
    }
}
