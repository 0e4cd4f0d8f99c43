//! From the solved field to hydraulics: conductance, friction factors, shear, operating point.

mod chords;
pub mod closed_form;
mod entrance;
mod field;
mod fluid;
mod operating_point;
mod section_flow;
mod shortcuts;
mod validity_range;

pub use entrance::{EntranceModel, entrance_length, excess_pressure_factor};
pub use field::DenseField;
pub use fluid::{Fluid, FluidError};
pub use operating_point::{Drive, OperatingPoint, OperatingPointError};
pub use section_flow::{
    GridReport, Identity, LevelReport, Peak, SectionFlow, SectionGeometry, SolverReport,
    WallSample, WallShear,
};
pub use shortcuts::{ShortcutRow, shortcuts};
pub use validity_range::{outside_validity, validity_warnings};
