//! The arched lid: a circular arc in place of the flat lid, hanging in (sag) or standing out (bulge).

use std::f64::consts::FRAC_PI_2;

use super::NominalError;
use super::kinds::kinds;
use super::parameters::Parameters;
use super::shape::Shape;
use crate::geometry::Point;
use crate::geometry::curves::{arc, distance_to_segment};

/// Kinds whose top is a flat lid.
pub(super) const WITH_FLAT_LID: &[&str] = &[
    "rectangle",
    "trapezoid",
    "koh_groove",
    "isotropic_etch",
    "rounded_rectangle",
    "half_ellipse",
    "circular_segment",
    "triangle",
    "triangle_height",
    "triangle_sides",
    "drie_trench",
    "gaussian_groove",
    "parabolic_groove",
];

/// Smallest factor by which a sagging lid makes the chord error finer.
const FINEST: f64 = 1e-3;

/// The arc of a lid.
#[derive(Debug)]
pub(super) struct Arch {
    /// Inner vertices from the right end to the left, m.
    inner: Vec<Point>,
    /// Height left under the middle of the lid against the height before, at most 1.
    pub(super) fineness: f64,
}

impl Arch {
    /// The shape with this lid.
    pub(super) fn apply(self, mut shape: Shape) -> Shape {
        if let Some(lumen) = shape.outline.lumens.first_mut() {
            lumen.outer.points.extend(self.inner);
        }
        shape.flat_lid = false;
        shape
    }
}

/// The arch that `lid_sag` or `lid_bulge` asks for, `None` for a flat lid.
pub(super) fn arch(p: &Parameters<'_>, flat: &Shape) -> Result<Option<Arch>, NominalError> {
    let (sag, bulge) = (p.length_or_zero("lid_sag")?, p.length_or_zero("lid_bulge")?);
    if sag > 0.0 && bulge > 0.0 {
        return Err(NominalError::Contradiction {
            kind: p.kind(),
            first: "lid_sag",
            second: "lid_bulge",
            reason: "a lid cannot hang in and stand out at once",
            remedy: "give one of them",
        });
    }
    if sag <= 0.0 && bulge <= 0.0 {
        return Ok(None);
    }
    let name = if sag > 0.0 { "lid_sag" } else { "lid_bulge" };
    let Some((left, right)) = flat.lid() else {
        return Err(no_flat_lid(p.kind(), name));
    };
    let width = right[0] - left[0];
    let lowest = flat.wall().iter().map(|q| q[1]).fold(0.0, f64::min);
    if sag > 0.0 && !clears(flat, width, sag) {
        let limit = largest_sag(flat, width, sag);
        let advice = (
            ", where the lid meets the wall",
            "reduce the sag or deepen the section",
        );
        return Err(p.refuse(name, sag, "below", limit, advice));
    }
    if bulge > width / 2.0 {
        let advice = (
            ", half the lid's width, where the arch is a half circle",
            "reduce the bulge",
        );
        return Err(p.refuse(name, bulge, "at most", width / 2.0, advice));
    }
    let rise = sag.max(bulge);
    let fineness = (1.0 + sag / lowest).clamp(FINEST, 1.0);
    let chord_error = p.chord_error(fineness * width.min(-lowest));
    let half = 2.0 * (2.0 * rise / width).atan();
    let radius = radius(width, rise);
    let middle = f64::midpoint(left[0], right[0]);
    let curve = if sag > 0.0 {
        let centre = [middle, radius - rise];
        arc(centre, radius, half - FRAC_PI_2, -2.0 * half, chord_error)
    } else {
        let centre = [middle, rise - radius];
        arc(centre, radius, FRAC_PI_2 - half, 2.0 * half, chord_error)
    }
    .map_err(|source| p.curve_error(source))?;
    let inner = match curve.as_slice() {
        [_, inner @ .., _] => inner.to_vec(),
        _ => Vec::new(),
    };
    Ok(Some(Arch { inner, fineness }))
}

/// The error for a kind without a flat lid.
pub(super) fn no_flat_lid(kind: &'static str, needed_by: &'static str) -> NominalError {
    let with_lid: Vec<&str> = kinds()
        .iter()
        .map(|info| info.name)
        .filter(|name| WITH_FLAT_LID.contains(name))
        .collect();
    NominalError::NoFlatLid {
        kind,
        needed_by,
        with_lid: with_lid.join(", "),
    }
}

/// Radius of an arc of this width and rise, m.
fn radius(width: f64, rise: f64) -> f64 {
    width * width / (8.0 * rise) + rise / 2.0
}

/// Whether a lid hanging in by `sag` stays clear of the wall but for its ends.
///
/// The lid is an arc of a disc above the section; the wall must stay out of that disc.
fn clears(flat: &Shape, width: f64, sag: f64) -> bool {
    let wall = flat.wall();
    let (Some((left, _)), true) = (flat.lid(), sag < width / 2.0) else {
        return false;
    };
    let radius = radius(width, sag);
    let centre = [left[0] + width / 2.0, radius - sag];
    let leaves = |end: Point, next: Point| {
        (next[0] - end[0]) * (end[0] - centre[0]) + (next[1] - end[1]) * (end[1] - centre[1]) > 0.0
    };
    let [first, second, .., before_last, last] = wall else {
        // A triangle: two edges, each from an end of the lid.
        return match wall {
            [first, apex, last] => leaves(*first, *apex) && leaves(*last, *apex),
            _ => false,
        };
    };
    if !leaves(*first, *second) || !leaves(*last, *before_last) {
        return false;
    }
    let between = wall.get(1..wall.len() - 1).unwrap_or(&[]);
    between.windows(2).all(|pair| match pair {
        [a, b] => distance_to_segment(centre, *a, *b) > radius,
        _ => true,
    })
}

/// The largest sag below `failing` that clears, by bisection.
fn largest_sag(flat: &Shape, width: f64, failing: f64) -> f64 {
    let (mut fits, mut fails) = (0.0, failing);
    for _ in 0..60 {
        let middle = f64::midpoint(fits, fails);
        if clears(flat, width, middle) {
            fits = middle;
        } else {
            fails = middle;
        }
    }
    fits
}
