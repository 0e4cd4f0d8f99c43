//! Plane geometry of sections: outlines, their problems, nominal shapes. No files, no grid.

mod outline;

pub use outline::{Loop, Lumen, Outline, Point};
