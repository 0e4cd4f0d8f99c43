//! Trench of a deep reactive ion etch: taper, bow, scallops and a rounded foot.
//!
//! The right wall is built from the lid down and mirrored. Its mean half width at depth `z` is
//! `h(z) = top_width/2 - z cot(taper) + 4 bow (z/d)(1 - z/d)`, `d` the depth. Scallops are circular arcs
//! from cusp to cusp, the cusps on the mean wall; the foot is an arc tangent to the mean wall and the floor.

use std::f64::consts::{FRAC_PI_2, PI};

use super::NominalError;
use super::parameters::Parameters;
use super::shape::{Shape, Wall};
use crate::geometry::Point;
use crate::geometry::curves::{arc, parametric};

/// Most scallops on one wall.
const MOST_SCALLOPS: f64 = 5000.0;

/// The mean wall.
#[derive(Debug, Clone, Copy)]
struct MeanWall {
    half_top: f64,
    depth: f64,
    cotangent: f64,
    bow: f64,
}

impl MeanWall {
    /// Half width at depth `z`, m.
    fn half_width(&self, z: f64) -> f64 {
        let t = z / self.depth;
        self.half_top - z * self.cotangent + 4.0 * self.bow * t * (1.0 - t)
    }

    /// Its derivative by depth.
    fn slope(&self, z: f64) -> f64 {
        4.0 * self.bow * (1.0 - 2.0 * z / self.depth) / self.depth - self.cotangent
    }

    /// The point at depth `z` on the right wall.
    fn point(&self, z: f64) -> Point {
        [self.half_width(z), -z]
    }
}

/// Where the foot touches the mean wall and the floor.
#[derive(Debug, Clone, Copy)]
struct Foot {
    radius: f64,
    contact_depth: f64,
    centre: Point,
}

/// The trench as a whole.
pub(super) fn drie_trench(p: &Parameters<'_>) -> Result<Shape, NominalError> {
    let (top, depth) = (p.length("top_width")?, p.length("depth")?);
    let taper = p.angle("taper", 0.0, PI)?;
    let mean = MeanWall {
        half_top: top / 2.0,
        depth,
        cotangent: taper.cos() / taper.sin(),
        bow: p.length_or_zero("bow")?,
    };
    if mean.half_width(depth) <= 1e-9 * top {
        let advice = (
            ", where the walls meet",
            "reduce the depth, steepen the taper or widen the top",
        );
        let limit = mean.half_top / mean.cotangent;
        return Err(p.refuse("depth", depth, "below", limit, advice));
    }
    let smaller = top.min(2.0 * mean.half_width(depth)).min(depth);
    let foot = foot(p, mean)?;
    let mut right = Wall::from(mean.point(0.0), smaller);
    let scalloped = scallops(p, &mut right, mean, foot.contact_depth)?;
    let chord_error = p.chord_error(smaller);
    if mean.bow > 0.0 && scalloped < foot.contact_depth {
        let range = (scalloped, foot.contact_depth);
        let curve = parametric(|z| mean.point(z), range, chord_error)
            .map_err(|source| p.curve_error(source))?;
        right.curve_to(&curve, mean.point(foot.contact_depth));
    } else {
        right.line_to(mean.point(foot.contact_depth));
    }
    if foot.radius > 0.0 {
        // From the inward normal at the wall to the downward one at the floor, clockwise.
        let from = mean.point(foot.contact_depth);
        let start = (from[1] - foot.centre[1]).atan2(from[0] - foot.centre[0]);
        let curve = arc(
            foot.centre,
            foot.radius,
            start,
            -FRAC_PI_2 - start,
            chord_error,
        )
        .map_err(|source| p.curve_error(source))?;
        right.curve_to(&curve, [foot.centre[0], -depth]);
    }
    let right = right.into_points();
    let mut wall = Wall::from([-mean.half_top, 0.0], smaller);
    for q in right.iter().skip(1) {
        wall.line_to([-q[0], q[1]]);
    }
    for &q in right.iter().rev() {
        wall.line_to(q);
    }
    Ok(Shape::groove(p.kind(), wall))
}

/// Finds the depth `z` with `z + r h'(z)/sqrt(1 + h'(z)^2) = d - r`, where a circle of radius `r` standing
/// on the floor touches the mean wall.
fn foot(p: &Parameters<'_>, mean: MeanWall) -> Result<Foot, NominalError> {
    let radius = p.length_or_zero("foot_radius")?;
    let depth = mean.depth;
    if radius <= 0.0 {
        return Ok(Foot {
            radius,
            contact_depth: depth,
            centre: [mean.half_width(depth), -depth],
        });
    }
    // The largest circle that touches floor and wall without passing the axis, the lid or the bow's curvature.
    let touch = |r: f64| {
        let excess = |z: f64| {
            let slope = mean.slope(z);
            z + r * slope / 1.0_f64.hypot(slope) - (depth - r)
        };
        let (mut low, mut high) = (0.0, depth);
        for _ in 0..200 {
            let middle = f64::midpoint(low, high);
            if excess(middle) < 0.0 {
                low = middle;
            } else {
                high = middle;
            }
        }
        let z = f64::midpoint(low, high);
        let slope = mean.slope(z);
        let centre = [mean.half_width(z) - r / 1.0_f64.hypot(slope), r - depth];
        let fits = excess(0.0) < 0.0 && centre[0] > 0.0 && r < curvature_radius(mean);
        fits.then_some(Foot {
            radius: r,
            contact_depth: z,
            centre,
        })
    };
    touch(radius).ok_or_else(|| {
        let (mut fits, mut fails) = (0.0, radius);
        for _ in 0..100 {
            let middle = f64::midpoint(fits, fails);
            if touch(middle).is_some() {
                fits = middle;
            } else {
                fails = middle;
            }
        }
        let advice = (", what floor and wall leave", "reduce the radius");
        p.refuse("foot_radius", radius, "below", fits, advice)
    })
}

/// Smallest radius of curvature that a parabola of this bow can have, m.
fn curvature_radius(mean: MeanWall) -> f64 {
    if mean.bow > 0.0 {
        mean.depth * mean.depth / (8.0 * mean.bow)
    } else {
        f64::INFINITY
    }
}

/// Adds whole scallops from the lid down to at most `bottom`; returns the depth of the last cusp.
fn scallops(
    p: &Parameters<'_>,
    right: &mut Wall,
    mean: MeanWall,
    bottom: f64,
) -> Result<f64, NominalError> {
    let pitch = p.length_or_zero("scallop_pitch")?;
    let sag = p.length_or_zero("scallop_depth")?;
    if pitch <= 0.0 && sag <= 0.0 {
        return Ok(0.0);
    }
    if pitch <= 0.0 || sag <= 0.0 {
        let (zero, other) = if sag <= 0.0 {
            ("scallop_depth", "scallop_pitch")
        } else {
            ("scallop_pitch", "scallop_depth")
        };
        return Err(NominalError::Contradiction {
            kind: p.kind(),
            first: other,
            second: zero,
            reason: "scallops need a pitch and a depth, and one of them is zero or left out",
            remedy: "give both above zero, or neither",
        });
    }
    if pitch > bottom * (1.0 + 1e-12) {
        let advice = (
            ", the height of the wall above the foot",
            "reduce the pitch, or leave the scallops out",
        );
        return Err(p.refuse("scallop_pitch", pitch, "at most", bottom, advice));
    }
    let count = (bottom / pitch * (1.0 + 1e-12)).floor();
    if count > MOST_SCALLOPS {
        let advice = (
            ", which gives 5000 scallops",
            "scallops this fine do not show in the flow: leave them out and set the mean wall",
        );
        return Err(p.refuse(
            "scallop_pitch",
            pitch,
            "at least",
            bottom / MOST_SCALLOPS,
            advice,
        ));
    }
    let cusp = |i: usize| mean.point((i as f64 * pitch).min(bottom));
    for i in 0..count as usize {
        scallop(p, right, (cusp(i), cusp(i + 1)), sag)?;
    }
    Ok((count * pitch).min(bottom))
}

/// One arc from cusp to cusp, outwards by `sag`; it must not rise above its upper or sink below its lower cusp.
fn scallop(
    p: &Parameters<'_>,
    right: &mut Wall,
    (upper, lower): (Point, Point),
    sag: f64,
) -> Result<(), NominalError> {
    let (dx, dy) = (lower[0] - upper[0], lower[1] - upper[1]);
    let chord = dx.hypot(dy);
    // Angle of the chord below the outward horizontal, and half the arc's angle.
    let fall = (-dy).atan2(dx);
    let half = 2.0 * (2.0 * sag / chord).atan();
    let largest = FRAC_PI_2.min(fall).min(PI - fall);
    if half >= largest {
        let advice = (
            ", where the scallop would turn level at a cusp",
            "reduce the scallop depth or enlarge the pitch",
        );
        let limit = chord / 2.0 * (largest / 2.0).tan();
        return Err(p.refuse("scallop_depth", sag, "below", limit, advice));
    }
    let radius = chord / (2.0 * half.sin());
    let outward = [-dy / chord, dx / chord];
    let back = sag - radius;
    let centre = [
        f64::midpoint(upper[0], lower[0]) + back * outward[0],
        f64::midpoint(upper[1], lower[1]) + back * outward[1],
    ];
    let start = (upper[1] - centre[1]).atan2(upper[0] - centre[0]);
    let chord_error = p.chord_error(right.smaller());
    let curve = arc(centre, radius, start, -2.0 * half, chord_error)
        .map_err(|source| p.curve_error(source))?;
    right.curve_to(&curve, lower);
    Ok(())
}
