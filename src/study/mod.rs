//! Questions over one or many sections that each take several solves or their derivatives.

mod assumptions;
mod card;
mod facing;
mod moved_outline;
mod network;
mod reach;
mod resolve_check;
mod sensitivity;
mod wall_motion;
mod wall_motion_cases;

pub use assumptions::{Assumption, under_assumption};
pub use card::{
    CardError, CardLimits, CardRequest, CardSensitivity, SectionCard, ShearPerFlow, Stated,
    StatedUncertainty, Uncertainty, UncertaintyPart, VISCOSITY_INPUT,
};
pub use moved_outline::{MovedOutline, moved_outline};
pub use network::{
    BALANCE_TOLERANCE, BeyondLimit, CardExtent, ChannelState, DEFAULT_SAMPLES,
    EquivalentResistance, FEWEST_SAMPLES, MassBalance, NetCard, NetCardLimits, NetChannel, NetNode,
    NetOutput, Network, NetworkError, NetworkSolution, NetworkUncertainty, NodeCondition,
    NodeState, NormalSource, OutputUncertainty, SampleOptions, Sampled,
};
pub use reach::{Reach, ReachBound, ReachError, ReachSide, ReachSides};
pub use resolve_check::{Check, FirstOrderRange, NoCheck, SECOND_ORDER_SHARE};
pub use sensitivity::{
    Sensitivity, SensitivityOptions, SensitivityStudy, sensitivity_study, solve_for_sensitivity,
};
pub use wall_motion::{EdgeMotion, LinearField, Measure, WallMotion};
pub use wall_motion_cases::{NoMotion, WallMotions, wall_motions};
