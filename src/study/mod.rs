//! Questions over one or many sections that each take several solves or their derivatives.

mod assumptions;
mod card;
mod facing;
mod moved_outline;
mod network;
mod reach;
mod resolve_check;
mod response;
mod route;
mod sensitivity;
mod wall_motion;
mod wall_motion_cases;

pub use assumptions::{Assumption, under_assumption};
pub use card::{
    CardError, CardLimits, CardRequest, CardSensitivity, SectionCard, ShearPerFlow, Stated,
    StatedUncertainty, Uncertainty, UncertaintyPart, VISCOSITY_INPUT,
};
pub use moved_outline::{MovedOutline, moved_outline, outline_moved_by};
pub use network::{
    BALANCE_TOLERANCE, BeyondLimit, CardExtent, ChannelState, DEFAULT_SAMPLES,
    EquivalentResistance, FEWEST_SAMPLES, MassBalance, NetCard, NetCardLimits, NetChannel, NetNode,
    NetOutput, Network, NetworkError, NetworkSolution, NetworkUncertainty, NodeCondition,
    NodeState, NormalSource, OutputUncertainty, SampleOptions, Sampled,
};
pub use reach::{Reach, ReachBound, ReachError, ReachSide, ReachSides};
pub use resolve_check::{Check, FirstOrderRange, NoCheck, SECOND_ORDER_SHARE};
pub use response::{
    ChebyshevFit, DEFAULT_FIT_ERROR, DEFAULT_FRESH_POINTS, FIT_ERRORS, FRESH_POINTS, FitTerm,
    MOST_PARAMETERS, NUMERICAL_SHARE, ParameterScale, ParameterUnit, PointError, RangeText,
    ResponseError, ResponseErrors, ResponseFamily, ResponseOptions, ResponseParameter,
    ResponsePoint, ResponseTable, Trend, TrendCheck, fixed_values, kind_name, response_table,
    slope_unit,
};
pub use route::{
    Between, BranchDesign, BranchOperation, DRAWS, Interpolation, LawOfK, Nested, PointOperation,
    PointPlace, Route, RouteBranch, RouteDesign, RouteError, RouteFlow, RouteOperation,
    RouteOptions, RoutePoint, RouteSection, RouteSegment, RouteSpread, SHRINKING, SegmentDesign,
    SegmentOperation, SegmentSpread, ShareSpread, StationDesign, UsedRule, nested, route_spread,
    solve_route,
};
pub use sensitivity::{
    Sensitivity, SensitivityOptions, SensitivityStudy, sensitivity_study, solve_for_sensitivity,
};
pub use wall_motion::{EdgeMotion, LinearField, Measure, WallMotion};
pub use wall_motion_cases::{NoMotion, WallMotions, wall_motions};
