//! From the solved field to hydraulics: conductance, friction factors, shear, operating point.

mod field;
mod section_flow;

pub use field::DenseField;
pub use section_flow::{
    GridReport, Identity, LevelReport, Peak, SectionFlow, SectionGeometry, SolverReport,
    WallSample, WallShear,
};
