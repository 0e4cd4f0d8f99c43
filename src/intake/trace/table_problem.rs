//! What can be wrong with the text of a trace.

/// What is wrong with the text of a trace.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum TableProblem {}

impl TableProblem {
    /// What the user can do, in one sentence.
    pub fn hint(&self) -> String {
        match *self {}
    }

    /// Whether a unit, a scale or a choice is missing or in doubt, rather than the file being wrong.
    pub fn is_ambiguous(&self) -> bool {
        match *self {}
    }
}
