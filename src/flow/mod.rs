//! From the solved field to hydraulics: conductance, friction factors, shear, operating point.

mod field;
mod fluid;
mod operating_point;
mod section_flow;
mod shortcuts;

pub use field::DenseField;
pub use fluid::Fluid;
pub use operating_point::OperatingPoint;
pub use section_flow::{
    GridReport, Identity, LevelReport, Peak, SectionFlow, SectionGeometry, SolverReport,
    WallSample, WallShear,
};
pub use shortcuts::ShortcutRow;
