//! Rectangles with round corners or round ends.

use std::f64::consts::{FRAC_PI_2, PI};

use super::NominalError;
use super::parameters::Parameters;
use super::shape::{Shape, Wall};
use crate::geometry::Point;
use crate::geometry::curves::arc;

/// Corner radii are allowed to exceed their side by this fraction, the rounding of decimal text.
const ROUNDING: f64 = 1e-12;

/// Four corner radii: top left, top right, bottom left, bottom right, m.
struct Corners {
    top_left: f64,
    top_right: f64,
    bottom_left: f64,
    bottom_right: f64,
}

/// Rectangle with four corner radii; a flat lid if both upper corners are sharp.
pub(super) fn rounded_rectangle(p: &Parameters<'_>) -> Result<Shape, NominalError> {
    let (width, height) = (p.length("width")?, p.length("height")?);
    let corners = corners(p, width, height)?;
    let (right, smaller) = (width / 2.0, width.min(height));
    let (tl, tr) = (corners.top_left, corners.top_right);
    let (bl, br) = (corners.bottom_left, corners.bottom_right);
    let sharp_top = tl.max(tr) <= 0.0;

    let mut wall = Wall::from([-right, -tl], smaller);
    wall.line_to([-right, bl - height]);
    let centre = [bl - right, bl - height];
    corner(p, &mut wall, (centre, bl), PI, [bl - right, -height])?;
    wall.line_to([right - br, -height]);
    let centre = [right - br, br - height];
    corner(
        p,
        &mut wall,
        (centre, br),
        PI + FRAC_PI_2,
        [right, br - height],
    )?;
    wall.line_to([right, -tr]);
    if sharp_top {
        return Ok(Shape::groove(p.kind(), wall));
    }
    corner(
        p,
        &mut wall,
        ([right - tr, -tr], tr),
        0.0,
        [right - tr, 0.0],
    )?;
    wall.line_to([tl - right, 0.0]);
    corner(
        p,
        &mut wall,
        ([tl - right, -tl], tl),
        FRAC_PI_2,
        [-right, -tl],
    )?;
    Ok(Shape::closed(p.kind(), wall))
}

/// Reads the radii and checks that two of them fit on each side.
fn corners(p: &Parameters<'_>, width: f64, height: f64) -> Result<Corners, NominalError> {
    const NAMES: [&str; 4] = [
        "radius_top_left",
        "radius_top_right",
        "radius_bottom_left",
        "radius_bottom_right",
    ];
    if p.value("radius").is_none() && p.count_given(&NAMES) == 0 {
        return Err(p.missing("radius"));
    }
    let common = p.length_or_zero("radius")?;
    let one = |name: &'static str| match p.value(name) {
        Some(_) => p.length_or_zero(name),
        None => Ok(common),
    };
    let [tl, tr, bl, br] = NAMES.map(one);
    let (tl, tr, bl, br) = (tl?, tr?, bl?, br?);
    let [n_tl, n_tr, n_bl, n_br] = NAMES;
    for (first, second, side) in [
        ((n_tl, tl), (n_tr, tr), width),
        ((n_bl, bl), (n_br, br), width),
        ((n_tl, tl), (n_bl, bl), height),
        ((n_tr, tr), (n_br, br), height),
    ] {
        if first.1 + second.1 <= side * (1.0 + ROUNDING) {
            continue;
        }
        // Name the larger radius that was written by itself, else the common one.
        let (large, small) = if first.1 >= second.1 {
            (first, second)
        } else {
            (second, first)
        };
        let remedy = "reduce the radius; for round ends use kind stadium";
        return Err(if p.value(large.0).is_some() {
            let limit = (side - small.1).max(0.0);
            let reason = ", what the side leaves beside the other corner";
            p.refuse(large.0, large.1, "at most", limit, (reason, remedy))
        } else if p.value(small.0).is_some() {
            let limit = (side - small.1).max(0.0);
            let reason = ", what the side leaves beside the other corner";
            p.refuse("radius", common, "at most", limit, (reason, remedy))
        } else {
            let reason = ", half the shorter side";
            let limit = width.min(height) / 2.0;
            p.refuse("radius", common, "at most", limit, (reason, remedy))
        });
    }
    Ok(Corners {
        top_left: tl,
        top_right: tr,
        bottom_left: bl,
        bottom_right: br,
    })
}

/// A quarter circle from the direction `start`, anticlockwise, to `end`; nothing but `end` for radius 0.
fn corner(
    p: &Parameters<'_>,
    wall: &mut Wall,
    (centre, radius): (Point, f64),
    start: f64,
    end: Point,
) -> Result<(), NominalError> {
    if radius > 0.0 {
        let curve = arc(
            centre,
            radius,
            start,
            FRAC_PI_2,
            p.chord_error(wall.smaller()),
        )
        .map_err(|source| p.curve_error(source))?;
        wall.curve_to(&curve, end);
    } else {
        wall.line_to(end);
    }
    Ok(())
}

/// Half circles on the short sides; a circle when width and height are equal.
pub(super) fn stadium(p: &Parameters<'_>) -> Result<Shape, NominalError> {
    let (width, height) = (p.length("width")?, p.length("height")?);
    let smaller = width.min(height);
    let radius = smaller / 2.0;
    let (dx, dy) = ((width - smaller) / 2.0, (height - smaller) / 2.0);
    let mut wall = Wall::from([-dx - radius, dy], smaller);
    wall.line_to([-dx - radius, -dy]);
    corner(p, &mut wall, ([-dx, -dy], radius), PI, [-dx, -dy - radius])?;
    wall.line_to([dx, -dy - radius]);
    corner(
        p,
        &mut wall,
        ([dx, -dy], radius),
        PI + FRAC_PI_2,
        [dx + radius, -dy],
    )?;
    wall.line_to([dx + radius, dy]);
    corner(p, &mut wall, ([dx, dy], radius), 0.0, [dx, dy + radius])?;
    wall.line_to([-dx, dy + radius]);
    corner(
        p,
        &mut wall,
        ([-dx, dy], radius),
        FRAC_PI_2,
        [-dx - radius, dy],
    )?;
    Ok(Shape::closed(p.kind(), wall))
}
