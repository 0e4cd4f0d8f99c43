//! Traces of a profilometer: from heights along a line to sections of channels.
//!
//! Reading gives a [`RawTrace`] in metres; correcting marks and bridges spikes and missing points and
//! levels it ([`CorrectedTrace`]); then grooves are found, the tip is taken into account, a lid is put on,
//! and each groove becomes a closed section ([`GrooveSection`]). Every step is recorded.

mod closing;
mod corrected;
mod flanks;
mod groove_problem;
mod groove_section;
#[cfg(test)]
mod groove_traces_tests;
mod grooves;
mod half;
#[cfg(test)]
mod half_tests;
#[cfg(test)]
mod hostile_traces_tests;
mod lid;
#[cfg(test)]
mod lid_tests;
mod profile;
mod section_notes;
mod section_options;
mod sections;
#[cfg(test)]
mod sections_tests;
mod shape_fits;
mod table_problem;
mod thinning;
mod tip;
mod trace_problem;
mod trench_numbers;
mod wall_curves;

pub use corrected::{Change, ChangeKind, CorrectedTrace};
pub use groove_problem::GrooveProblem;
pub use groove_section::{GrooveSection, LidAlternative, TipFlank};
pub use profile::{Profile, RawTrace, Zone};
pub use section_options::{LidChoice, SectionOptions, THINNING, Tip};
pub use sections::{LANDS_DIFFER, SLIVER, sections};
pub use shape_fits::{IsotropicFit, KOH_ANGLE, KohFit};
pub use table_problem::TableProblem;
pub use trace_problem::TraceProblem;
pub use trench_numbers::{TrenchNumbers, WallNumbers};
