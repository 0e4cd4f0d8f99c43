//! Nominal sections: from process parameters, as a person writes them, to an outline.
//!
//! A [`NominalSpec`] is a kind with named values; [`NominalSpec::outline`] makes its outline, [`kinds()`]
//! and [`modifiers`] are the one table of what can be written. Method: closed geometry, curves as
//! segments within [`super::curves::CHORD_TOLERANCE`].
//!
//! Axes and origins: `x` to the right, `y` upwards, the lid on top. A section with a flat lid (grooves,
//! rectangle, trapezoid, triangles, segment, rounded rectangle) has its origin in the middle of the lid
//! and lies below it, `y <= 0`. Closed shapes (circle, ellipse, stadium, polygon, rhombus, annulus) have
//! it at their centre, a sector at its apex, bonded halves in the middle of the lower half's opening.
//! Lengths are text with a unit, angles text with `deg` or `rad`; inside everything is metres and radians.

mod bonded;
mod drie;
mod error;
mod etched;
mod kinds;
mod lid;
mod parameters;
mod posts;
mod round;
mod rounded;
mod shape;
mod spec;
mod spec_between;
mod spec_text;
mod straight;
#[cfg(test)]
mod tests;

pub use error::{Amount, NominalError};
pub use kinds::{KindInfo, ParameterInfo, Quantity, kinds, modifiers, post_parameters};
pub use spec::{NominalSpec, SpecValue};
pub use spec_between::NotBetween;
