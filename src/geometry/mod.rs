//! Plane geometry of sections: outlines, their problems, nominal shapes. No files, no grid.

mod corners;
pub mod curves;
mod inscribed_circle;
pub mod nominal;
mod outline;

pub use corners::{Corner, corners};
pub use inscribed_circle::{Circle, largest_inscribed_circle};
pub use nominal::{
    KindInfo, NominalError, NominalSpec, ParameterInfo, Quantity, SpecValue, kinds, modifiers,
};
pub use outline::{Loop, Lumen, Outline, Point};
