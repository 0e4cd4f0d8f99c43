//! From the solved field to hydraulics: conductance, friction factors, shear, operating point.

mod accuracy;
mod assemble;
mod attempt;
mod chords;
pub mod closed_form;
mod corner_alignment;
mod corner_field;
mod corner_law;
mod entrance;
mod extrapolation;
mod field;
mod fluid;
mod grid_integrals;
mod identities;
mod layer_cluster;
mod layer_panel;
mod layer_window;
mod many;
mod nearby;
mod operating_point;
mod peak;
mod range_extrapolation;
mod section_flow;
mod shortcuts;
mod solve_cost;
mod solve_outline;
mod solve_warnings;
mod solved_grids;
mod tangents;
mod temperature_law;
mod validity_range;
mod wall_balance;
mod wall_cells;
mod wall_curve;
mod wall_flux;
mod wall_layer;
mod wall_path;
mod wall_quadrature;
mod wall_shear;
mod wall_statistics;
mod wall_stretch;
mod width_source;

pub use accuracy::{Accuracy, Cost, DEFAULT_TOLERANCE, Goal, LEAST_TOLERANCE, Stop};
pub use entrance::{EntranceModel, entrance_length, excess_pressure_factor};
pub use field::DenseField;
pub use fluid::{Fluid, FluidError};
pub use nearby::NearbySections;
pub use operating_point::{Drive, OperatingPoint, OperatingPointError};
pub use section_flow::{
    GridReport, Identity, LevelReport, Peak, SectionFlow, SectionGeometry, SolverReport,
    WallSample, WallShear,
};
pub use shortcuts::{ShortcutRow, shortcuts};
pub use solve_cost::{LevelCost, SolveCost, StageCost};
pub use solve_outline::{DEFAULT_MEMORY, FlowError, SolveOptions, SolvedSection, solve_outline};
pub use temperature_law::{LAW_ERROR, MOST_COEFFICIENTS, TemperatureLaw, TemperatureLawError};
pub use validity_range::{
    ENTRANCE_SHARE, NOT_LAMINAR, outside_validity, pressure_limit, validity_warnings,
};
pub use wall_curve::{CurvePoint, LoopCurve, PointKind, SINGULAR_LENGTH, WallCurve, WallPlace};
pub use wall_statistics::{
    PERCENTILES, SingularCorner, WHOLE_WALL, WallPart, WallReport, WallStatistics,
};
pub use width_source::{WidthCause, WidthSource};
