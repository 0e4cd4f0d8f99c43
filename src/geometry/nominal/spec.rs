//! A nominal section as a person writes it: a kind and named values.

use std::collections::BTreeMap;

use super::parameters::Parameters;
use super::shape::Shape;
use super::{NominalError, bonded, drie, etched, lid, posts, round, rounded, straight};
use crate::geometry::Outline;

/// Deepest nesting of sections in sections.
pub(super) const DEEPEST_NESTING: usize = 8;

/// A nominal section as written by a person: kind plus named values.
///
/// Also read from one line by [`std::str::FromStr`]: the kind, then `name=value` with a section inside in
/// round brackets and a list of sections in square brackets.
///
/// # Examples
/// ```
/// use etchwise::geometry::NominalSpec;
/// let groove: NominalSpec = "koh_groove opening=100um depth=40um".parse()?;
/// let area = groove.outline()?.area();
/// assert!((area - 40e-6 * (100e-6 - 40e-6 / 2.0_f64.sqrt())).abs() < 1e-18);
/// # Ok::<(), etchwise::geometry::NominalError>(())
/// ```
#[derive(Debug, Clone, PartialEq)]
pub struct NominalSpec {
    /// Name of the kind, as in [`super::kinds()`].
    pub kind: String,
    /// Values by parameter name.
    pub values: BTreeMap<String, SpecValue>,
}

/// One value of a nominal section.
#[derive(Debug, Clone, PartialEq)]
pub enum SpecValue {
    /// Text: a length or angle with its unit, or a number as text.
    Text(String),
    /// A plain number: a count or a ratio, never a length or angle.
    Number(f64),
    /// A section inside the section.
    Spec(NominalSpec),
    /// Several values.
    List(Vec<SpecValue>),
}

impl NominalSpec {
    /// The outline, metres, outer loops anticlockwise and islands clockwise.
    ///
    /// # Errors
    /// [`NominalError`] names the parameter, its value, the limit and the remedy.
    ///
    /// # Accuracy
    /// Curves within [`crate::geometry::curves::CHORD_TOLERANCE`]; areas within 1e-6 of the closed forms
    /// (tests of this module).
    pub fn outline(&self) -> Result<Outline, NominalError> {
        let shape = self.shape(0)?;
        let area = shape.outline.area();
        if !(area.is_finite() && area > 0.0) {
            let kind = Parameters::new(self, 0)?.kind();
            return Err(NominalError::NoArea { kind, area });
        }
        Ok(shape.outline.oriented())
    }

    /// The shape with modifiers applied, at a nesting depth.
    pub(super) fn shape(&self, nesting: usize) -> Result<Shape, NominalError> {
        if nesting > DEEPEST_NESTING {
            return Err(NominalError::TooDeep {
                limit: DEEPEST_NESTING,
            });
        }
        let parameters = Parameters::new(self, nesting)?;
        let flat = plain_shape(&parameters)?;
        let arched = match lid::arch(&parameters, &flat)? {
            None => flat,
            Some(arch) => {
                let finer = parameters.finer(arch.fineness);
                arch.apply(plain_shape(&finer)?)
            }
        };
        posts::place(&parameters, arched)
    }
}

/// The kind's shape without modifiers.
fn plain_shape(p: &Parameters<'_>) -> Result<Shape, NominalError> {
    match p.kind() {
        "rectangle" => straight::rectangle(p),
        "trapezoid" => straight::trapezoid(p),
        "koh_groove" => straight::koh_groove(p),
        "triangle" => straight::triangle(p),
        "triangle_height" => straight::triangle_height(p),
        "triangle_sides" => straight::triangle_sides(p),
        "regular_polygon" => straight::regular_polygon(p),
        "rhombus" => straight::rhombus(p),
        "rounded_rectangle" => rounded::rounded_rectangle(p),
        "stadium" => rounded::stadium(p),
        "circle" => round::circle(p),
        "ellipse" => round::ellipse(p),
        "half_ellipse" => round::half_ellipse(p),
        "circular_segment" => round::circular_segment(p),
        "circular_sector" => round::circular_sector(p),
        "annulus" => round::annulus(p),
        "isotropic_etch" => etched::isotropic_etch(p),
        "gaussian_groove" => etched::gaussian_groove(p),
        "parabolic_groove" => etched::parabolic_groove(p),
        "drie_trench" => drie::drie_trench(p),
        "bonded_halves" => bonded::bonded_halves(p),
        _ => Err(super::parameters::unknown_kind(p.kind())),
    }
}
