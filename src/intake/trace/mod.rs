//! Traces of a profilometer: from heights along a line to sections of channels.
//!
//! Reading gives a [`RawTrace`] in metres; correcting marks and bridges spikes and missing points and
//! levels it ([`CorrectedTrace`]); then grooves are found, the tip is taken into account, a lid is put on,
//! and each groove becomes a closed section ([`GrooveSection`]). Every step is recorded.

mod bridging;
mod corrected;
mod correction_options;
mod correction_records;
mod corrections;
#[cfg(test)]
mod corrections_tests;
mod groove_problem;
mod groove_section;
mod lands;
mod levelling;
mod order_statistics;
mod profile;
mod profile_filter;
#[cfg(test)]
mod refusals_tests;
mod repeat_alignment;
mod repeats;
mod robust_line;
mod scan;
mod spikes;
mod step_height;
mod swings;
mod table_problem;
#[cfg(test)]
mod test_traces;
mod trace_problem;

pub use corrected::{Change, ChangeKind, CorrectedTrace};
pub use correction_options::{CorrectionOptions, Levelling, LineFit, MAX_BOW};
pub use corrections::correct;
pub use groove_problem::GrooveProblem;
pub use groove_section::{GrooveSection, LidAlternative};
pub use profile::{Profile, RawTrace, Zone};
pub use repeats::{RepeatPlace, Repeatability};
pub use step_height::{StepHeight, step_height};
pub use table_problem::TableProblem;
pub use trace_problem::TraceProblem;
