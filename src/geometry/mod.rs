//! Plane geometry of sections: outlines, their problems, nominal shapes. No files, no grid.

pub mod nominal;
mod outline;

pub use outline::{Loop, Lumen, Outline, Point};
