//! What can be wrong with a trace when its channels become sections.

/// What is wrong with a trace when its channels become sections.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum GrooveProblem {}

impl GrooveProblem {
    /// What the user can do, in one sentence.
    pub fn hint(&self) -> String {
        match *self {}
    }

    /// Whether a unit, a scale or a choice is missing or in doubt, rather than the file being wrong.
    pub fn is_ambiguous(&self) -> bool {
        match *self {}
    }
}
