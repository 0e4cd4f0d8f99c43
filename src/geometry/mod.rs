//! Plane geometry of sections: outlines, their problems, nominal shapes. No files, no grid.

mod corners;
mod inscribed_circle;
mod outline;

pub use corners::{Corner, corners};
pub use inscribed_circle::{Circle, largest_inscribed_circle};
pub use outline::{Loop, Lumen, Outline, Point};
