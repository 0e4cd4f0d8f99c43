//! Traces of a profilometer: from heights along a line to sections of channels.
//!
//! Reading gives a [`RawTrace`] in metres; correcting marks and bridges spikes and missing points and
//! levels it ([`CorrectedTrace`]); then grooves are found, the tip is taken into account, a lid is put on,
//! and each groove becomes a closed section ([`GrooveSection`]). Every step is recorded.

mod corrected;
mod groove_problem;
mod groove_section;
mod profile;
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
mod trace_problem;

pub use corrected::{Change, ChangeKind, CorrectedTrace};
pub use groove_problem::GrooveProblem;
pub use groove_section::{GrooveSection, LidAlternative};
pub use profile::{Profile, RawTrace, Zone};
pub use table_kind::{TableKind, table_kind};
pub use table_options::{Decimal, TableOptions};
pub use table_problem::{TableAxis, TableProblem};
pub use table_trace::trace_from_bytes;
pub use trace_problem::TraceProblem;

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
