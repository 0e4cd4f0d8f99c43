//! From the solved field to hydraulics: conductance, friction factors, shear, operating point.

mod extrapolation;
mod field;
mod grid_integrals;
mod identities;
mod peak;
mod section_flow;
mod solve_outline;
mod wall_shear;

pub use field::DenseField;
pub use section_flow::{
    GridReport, Identity, LevelReport, Peak, SectionFlow, SectionGeometry, SolverReport,
    WallSample, WallShear,
};
pub use solve_outline::{
    DEFAULT_ACCURACY, FlowError, SolveOptions, SolvedSection, solve_outline,
};
