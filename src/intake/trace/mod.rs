//! Traces of a profilometer: from heights along a line to sections of channels.
//!
//! Reading gives a [`RawTrace`] in metres; correcting marks and bridges spikes and missing points and
//! levels it ([`CorrectedTrace`]); then grooves are found, the tip is taken into account, a lid is put on,
//! and each groove becomes a closed section ([`GrooveSection`]). Every step is recorded.

mod bridging;
mod closing;
mod corrected;
mod correction_options;
mod correction_records;
mod corrections;
#[cfg(test)]
mod corrections_tests;
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
mod lands;
#[cfg(test)]
mod lands_tests;
mod levelling;
mod lid;
#[cfg(test)]
mod lid_tests;
mod profile;
mod profile_filter;
#[cfg(test)]
mod refusals_tests;
mod repeat_alignment;
mod repeats;
mod robust_line;
mod scan;
mod section_notes;
mod section_options;
mod sections;
#[cfg(test)]
mod sections_tests;
mod shape_fits;
mod spikes;
mod step_height;
mod swings;
mod table_choice;
mod table_columns;
mod table_keys;
mod table_kind;
mod table_layout;
mod table_lines;
mod table_marks;
mod table_options;
mod table_plausibility;
mod table_positions;
mod table_problem;
mod table_trace;
mod table_units;
#[cfg(test)]
pub(in crate::intake) mod test_traces;
mod thinning;
mod tip;
mod trace_problem;
mod trench_numbers;
mod wall_curves;

pub use corrected::{Change, ChangeKind, CorrectedTrace};
pub use correction_options::{CorrectionOptions, Levelling, LineFit, MAX_BOW};
pub use corrections::correct;
pub use groove_problem::GrooveProblem;
pub use groove_section::{GrooveSection, LidAlternative, TipFlank};
pub use profile::{Profile, RawTrace, Zone};
pub use repeats::{RepeatPlace, Repeatability};
pub use section_options::{LidChoice, SectionOptions, THINNING, Tip};
pub use sections::{LANDS_DIFFER, SLIVER, sections};
pub use shape_fits::{IsotropicFit, KOH_ANGLE, KohFit};
pub use step_height::{StepHeight, step_height};
pub use table_kind::{TableKind, table_kind};
pub use table_options::{Decimal, TableOptions};
pub use table_problem::{TableAxis, TableProblem};
pub(crate) use table_trace::read_trace_table;
pub use table_trace::trace_from_bytes;
pub use trace_problem::TraceProblem;
pub use trench_numbers::{TrenchNumbers, WallNumbers};

/// What the reader of height maps in text shares with the reader of traces.
pub(in crate::intake) mod table {
    pub(in crate::intake) use super::table_choice::{AxisUnit, axis_unit, bare, missing_unit};
    pub(in crate::intake) use super::table_columns::Role;
    pub(in crate::intake) use super::table_keys::KeptLength;
    pub(in crate::intake) use super::table_kind::lists_points;
    pub(in crate::intake) use super::table_layout::Layout;
    pub(in crate::intake) use super::table_lines::{Line, fault};
    pub(in crate::intake) use super::table_marks::Numbers;
    pub(in crate::intake) use super::table_plausibility::check_span;
    pub(in crate::intake) use super::table_trace::{check_step, cut_warning, table_text};
}

#[cfg(test)]
mod table_robustness_tests;
#[cfg(test)]
mod table_tests;
