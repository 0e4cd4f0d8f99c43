//! Plane geometry of sections: outlines, their problems, nominal shapes. No files, no grid.

pub mod curves;
pub mod nominal;
mod outline;

pub use nominal::{NominalError, NominalSpec, SpecValue};
pub use outline::{Loop, Lumen, Outline, Point};
