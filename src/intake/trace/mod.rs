//! Traces of a profilometer: from heights along a line to sections of channels.
//!
//! Reading gives a [`RawTrace`] in metres; correcting marks and bridges spikes and missing points and
//! levels it ([`CorrectedTrace`]); then grooves are found, the tip is taken into account, a lid is put on,
//! and each groove becomes a closed section ([`GrooveSection`]). Every step is recorded.

mod corrected;
mod groove_problem;
mod groove_section;
mod profile;
mod table_problem;
mod trace_problem;

pub use corrected::{Change, ChangeKind, CorrectedTrace};
pub use groove_problem::GrooveProblem;
pub use groove_section::{GrooveSection, LidAlternative};
pub use profile::{Profile, RawTrace, Zone};
pub use table_problem::TableProblem;
pub use trace_problem::TraceProblem;
