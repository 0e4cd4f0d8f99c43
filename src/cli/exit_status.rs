//! The exit status is a contract: documented in help and README, one test each.

use std::process::ExitCode;

/// How a run ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum ExitStatus {
    /// Done, and accepted where a limit was set.
    Done = 0,
    /// Done, outside the limit; for `check`: problems found.
    OutsideLimit = 1,
    /// Wrong usage.
    Usage = 2,
    /// Input unreadable, or its unit or scale ambiguous; output not writable.
    Unreadable = 3,
    /// Outside the model's validity.
    OutsideValidity = 4,
    /// Not solved to the asked accuracy.
    NotSolved = 5,
}

impl ExitStatus {
    /// What to say where a result was given and does not hold as asked.
    pub(super) fn why_no_result(self) -> Option<&'static str> {
        match self {
            Self::OutsideValidity => {
                Some("status 4: outside the model's validity; the warnings in the result say why")
            }
            Self::NotSolved => {
                Some("status 5: not solved to the asked accuracy; the result says what was reached")
            }
            _ => None,
        }
    }
}

impl From<ExitStatus> for ExitCode {
    fn from(status: ExitStatus) -> Self {
        Self::from(status as u8)
    }
}
