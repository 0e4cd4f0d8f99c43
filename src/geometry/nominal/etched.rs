//! Grooves with curved sides: isotropic wet etch, laser-written Gaussian, parabola.

use std::f64::consts::{FRAC_PI_2, PI};

use super::NominalError;
use super::parameters::Parameters;
use super::shape::{Shape, Wall};
use crate::geometry::curves::{arc, parametric};

/// Largest fraction at which a Gaussian may be closed; above, the profile is a parabola in all but name.
const LARGEST_TRUNCATION: f64 = 0.5;
/// Smallest fraction of the depth at which a Gaussian groove may end: below it the tail has no height.
const SMALLEST_TRUNCATION: f64 = 1e-9;

/// Flat floor as wide as the mask opening, quarter circles of radius `depth` about the mask edges.
pub(super) fn isotropic_etch(p: &Parameters<'_>) -> Result<Shape, NominalError> {
    let (mask, depth) = (p.length_or_zero("mask_opening")?, p.length("depth")?);
    let edge = mask / 2.0;
    let side = |centre: f64, start: f64| {
        arc([centre, 0.0], depth, start, FRAC_PI_2, p.chord_error(depth))
            .map_err(|source| p.curve_error(source))
    };
    let mut wall = Wall::from([-edge - depth, 0.0], depth);
    wall.curve_to(&side(-edge, PI)?, [-edge, -depth]);
    wall.line_to([edge, -depth]);
    wall.curve_to(&side(edge, PI + FRAC_PI_2)?, [edge + depth, 0.0]);
    Ok(Shape::groove(p.kind(), wall))
}

/// `y = -D (exp(-8 x^2 / width^2) - f)` with `D = depth / (1 - f)`, closed by the lid where it reaches 0.
pub(super) fn gaussian_groove(p: &Parameters<'_>) -> Result<Shape, NominalError> {
    let (depth, width) = (p.length("depth")?, p.length("width")?);
    let fraction = p.ratio("truncation", LARGEST_TRUNCATION)?;
    if fraction < SMALLEST_TRUNCATION {
        let advice = ("", "tails this thin carry no flow: use a larger fraction");
        return Err(p.refuse(
            "truncation",
            fraction,
            "at least",
            SMALLEST_TRUNCATION,
            advice,
        ));
    }
    let full_depth = depth / (1.0 - fraction);
    let edge = width * (-fraction.ln() / 8.0).sqrt();
    let profile = |x: f64| {
        let t = x / width;
        [x, -full_depth * ((-8.0 * t * t).exp() - fraction)]
    };
    under_lid(p, profile, edge, depth)
}

/// `y = -depth (1 - (2 x / width)^2)`.
pub(super) fn parabolic_groove(p: &Parameters<'_>) -> Result<Shape, NominalError> {
    let (width, depth) = (p.length("width")?, p.length("depth")?);
    let profile = |x: f64| {
        let t = 2.0 * x / width;
        [x, -depth * (1.0 - t * t)]
    };
    under_lid(p, profile, width / 2.0, depth)
}

/// The profile between `-edge` and `edge`, where the lid meets it.
fn under_lid(
    p: &Parameters<'_>,
    profile: impl Fn(f64) -> [f64; 2],
    edge: f64,
    depth: f64,
) -> Result<Shape, NominalError> {
    let smaller = depth.min(2.0 * edge);
    let curve = parametric(profile, (-edge, edge), p.chord_error(smaller))
        .map_err(|source| p.curve_error(source))?;
    let mut wall = Wall::from([-edge, 0.0], smaller);
    wall.curve_to(&curve, [edge, 0.0]);
    Ok(Shape::groove(p.kind(), wall))
}
