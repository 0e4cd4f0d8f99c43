//! From contours in pixels to outlines in metres, with fewer vertices and without crossings.

use super::micrograph_section::PixelLoop;
use super::options::PixelBox;
use super::simplify::simplified;
use crate::geometry::Outline;
use crate::intake::loop_nesting::{RawLoop, assemble};

/// Shares of the tolerance that are tried until walls neither cross nor leave each other; at zero the contours
/// stay as they are, and those cannot cross.
const TOLERANCE_SHARES: [f64; 4] = [1.0, 0.25, 0.0625, 0.0];

/// Where the part used lies, and the size of its pixels.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Placement {
    pub(super) crop: PixelBox,
    pub(super) metres_per_pixel: [f64; 2],
}

/// An outline with its loops in pixels of the whole picture.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Built {
    pub(super) outline: Outline,
    pub(super) loops: Vec<PixelLoop>,
}

impl Placement {
    /// An outline from loops in pixels of the part used.
    fn build(&self, loops: &[PixelLoop], tolerance: f64) -> Built {
        let [scale_x, scale_y] = self.metres_per_pixel;
        let height = f64::from(self.crop.height);
        let few: Vec<PixelLoop> = loops.iter().map(|l| simplified(l, tolerance)).collect();
        let raw = few
            .iter()
            .map(|points| RawLoop {
                points: points
                    .iter()
                    .map(|&[x, y]| [x * scale_x, (height - y) * scale_y])
                    .collect(),
                lumen: None,
            })
            .collect();
        let offset = [f64::from(self.crop.x), f64::from(self.crop.y)];
        let moved = |points: PixelLoop| {
            let shift = |[x, y]: [f64; 2]| [x + offset[0], y + offset[1]];
            points.into_iter().map(shift).collect()
        };
        Built {
            outline: assemble(raw).outline.oriented(),
            loops: few.into_iter().map(moved).collect(),
        }
    }
}

fn is_sound(outline: &Outline) -> bool {
    let problems = outline.problems();
    problems.list.is_empty() && problems.loops_left_out == 0
}

/// The section, and the smallest and largest one where both are given.
#[derive(Debug)]
pub(super) struct Outlines {
    pub(super) section: Built,
    /// Inner and outer.
    pub(super) reach: Option<[Built; 2]>,
    /// Tolerance of the fewer vertices, pixels.
    pub(super) tolerance: f64,
}

/// Builds the outlines with the largest tolerance that leaves them sound and one inside the other.
///
/// - `reach`: loops of the inner and the outer section
pub(super) fn outlines(
    placement: &Placement,
    section: &[PixelLoop],
    reach: Option<[&[PixelLoop]; 2]>,
    tolerance: f64,
) -> Outlines {
    for share in TOLERANCE_SHARES {
        let tolerance = share * tolerance;
        let built = placement.build(section, tolerance);
        if !is_sound(&built.outline) {
            continue;
        }
        let Some(loops) = reach else {
            return Outlines {
                section: built,
                reach: None,
                tolerance,
            };
        };
        let sides = loops.map(|loops| placement.build(loops, tolerance));
        let [inner, outer] = &sides;
        if is_sound(&inner.outline)
            && is_sound(&outer.outline)
            && inner.outline.proven_inside(&built.outline).is_ok()
            && built.outline.proven_inside(&outer.outline).is_ok()
        {
            return Outlines {
                section: built,
                reach: Some(sides),
                tolerance,
            };
        }
    }
    if reach.is_some() {
        return outlines(placement, section, None, tolerance);
    }
    Outlines {
        section: placement.build(section, 0.0),
        reach: None,
        tolerance: 0.0,
    }
}
