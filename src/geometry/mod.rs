//! Plane geometry of sections: outlines, their problems, nominal shapes. No files, no grid.

mod containment;
mod corners;
pub mod curves;
mod film;
mod inscribed_circle;
mod linear_pieces;
mod named_wall;
pub mod nominal;
mod outline;
mod outline_check;
mod segment_tree;
mod sweep;
mod transform;
mod validity;
mod wall_edges;

pub use containment::{Escape, EscapeKind};
pub use corners::{Corner, corners};
pub(crate) use corners::{facet_turning, turning_at};
pub use film::{Film, FilmError, FilmOn, FilmReport, Filmed, NEGLIGIBLE_LUMENS};
pub use inscribed_circle::{Circle, RADIUS_TOLERANCE, largest_inscribed_circle};
pub use named_wall::{
    DIRECTION_NAMES, FARTHEST, NamedWall, NamedWallError, WallStretch, wall_stretches,
};
pub use nominal::{
    KindInfo, NominalError, NominalSpec, NotBetween, ParameterInfo, Quantity, SpecValue, kinds,
    modifiers,
};
pub(crate) use outline::distance;
pub use outline::{Loop, Lumen, Outline, Point};
pub use segment_tree::{Bounds, NearestWall, SegmentTree};
pub use validity::{LISTED_PROBLEMS, Place, Problem, ProblemKind, Problems, Role, Severity};
