//! The contour of a region at a grey level, below the pixel size.
//!
//! Marching squares on the lattice of pixel centres: where two neighbours lie on either side of the level, the
//! wall crosses between them by linear interpolation, and crossings are joined round each pixel. At a saddle,
//! where two fluid pixels meet at a corner only, the fluid is parted; regions are joined in the same way, so
//! a region and its contour never disagree. For the same reason contours of two levels never cross.
//!
//! Linear interpolation between means over pixels is off by up to 0.09 pixels at edges that are sharper than a
//! pixel, to either side in turn along the wall: areas come out right, but the perimeter 0.25 % long. There the
//! greys of four pixels across the edge are added up instead ([`Crossing::Areas`]).
//!
//! # Source
//! Lorensen, Cline (1987), "Marching cubes", SIGGRAPH 21, 163-169, doi:10.1145/37401.37422, in the
//! plane (from memory). Place of an edge from the sum of greys: Tabatabai, Mitchell (1984), "Edge location to
//! subpixel values in digital imagery", IEEE Transactions on Pattern Analysis and Machine Intelligence 6, 188-201,
//! doi:10.1109/TPAMI.1984.4767502 (moments of the same greys; from memory).
//! # Accuracy
//! See the tests of discs, ellipses and rectangles in `contour_tests`.

use super::grey::Grey;
use super::micrograph_section::PixelLoop;

/// Smallest distance of a crossing from a pixel centre, pixels: keeps crossings apart.
const LEAST_SHARE: f64 = 1e-3;

/// Steps to the right, down, left and up; a side of a pixel is one of these four.
const STEPS: [[isize; 2]; 4] = [[1, 0], [0, 1], [-1, 0], [0, -1]];
/// The side by which every loop is found first: each loop has one.
const LEFT: usize = 2;

/// Pixels of a region: bit 0 of each byte; the other bits mark sides that were walked along.
#[derive(Debug)]
pub(super) struct Walk<'a> {
    grey: &'a Grey,
    marks: Vec<u8>,
    crossing: Crossing,
}

/// How the place of the wall between two pixels is found.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Crossing {
    /// Where straight lines between the greys of the pixels meet a level, in counts.
    Linear(f64),
    /// For edges as sharp as pixels are, between levels of fluid and wall in counts: each pixel holds as much of
    /// the fluid as its grey says, so that four pixels across the edge give its place exactly, wherever it
    /// lies on the lattice; where four do not span the edge, as [`Crossing::Linear`] half-way.
    Areas {
        /// Level of the fluid.
        fluid: f64,
        /// Level of the wall.
        wall: f64,
    },
}

/// The two outer ones of the four pixels are pure within this share of the contrast.
const PURE: f64 = 0.1;

impl<'a> Walk<'a> {
    /// - `mask`: one for each pixel of the region, zero for others, as the rows of the picture; all
    ///   neighbours of the region must lie beyond the level, and none of its pixels on the picture's border
    /// - `crossing`: how the wall is found between two pixels
    pub(super) fn new(grey: &'a Grey, mask: Vec<u8>, crossing: Crossing) -> Self {
        Self {
            grey,
            marks: mask,
            crossing,
        }
    }

    /// All loops in pixels, origin at the top left corner, y downwards; the region lies to the right of the
    /// way as drawn on the screen, so outer loops have positive area in these coordinates.
    pub(super) fn loops(&mut self) -> Vec<PixelLoop> {
        let mut loops = Vec::new();
        let (bit, width) = (2 << LEFT, self.grey.width);
        for y in 0..self.grey.height {
            let mut is_before = false;
            for x in 0..width {
                let mark = self.marks.get(y * width + x).copied().unwrap_or(0);
                let is_inside = mark & 1 == 1;
                if is_inside && !is_before && mark & bit == 0 {
                    loops.push(self.walk([x, y], LEFT));
                }
                is_before = is_inside;
            }
        }
        loops
    }

    fn mark(&self, [x, y]: [usize; 2]) -> u8 {
        if x < self.grey.width {
            let index = y.saturating_mul(self.grey.width).saturating_add(x);
            self.marks.get(index).copied().unwrap_or(0)
        } else {
            0
        }
    }

    /// Whether the neighbour of a pixel on one side belongs to the region.
    fn is_inside(&self, pixel: [usize; 2], side: usize) -> bool {
        neighbour(pixel, side).is_some_and(|p| self.mark(p) & 1 == 1)
    }

    /// Grey value of the pixel a number of steps from another; `None` outside the picture.
    fn value(&self, [x, y]: [usize; 2], side: usize, steps: isize) -> Option<f64> {
        let [dx, dy] = STEPS.get(side).copied()?;
        let x = x.checked_add_signed(dx * steps)?;
        let y = y.checked_add_signed(dy * steps)?;
        (x < self.grey.width && y < self.grey.height).then(|| f64::from(self.grey.at(x, y)))
    }

    /// Where the wall lies between a pixel of the region and its neighbour.
    fn crossing(&self, pixel: [usize; 2], side: usize) -> [f64; 2] {
        let [before, inside, outside, beyond] =
            [-1, 0, 1, 2].map(|steps| self.value(pixel, side, steps));
        let linear = |level: f64| match (inside, outside) {
            (Some(a), Some(b)) => (a - level) / (a - b),
            _ => f64::NAN,
        };
        let share = match (self.crossing, [before, inside, outside, beyond]) {
            (Crossing::Areas { fluid, wall }, [Some(a), Some(b), Some(c), Some(d)]) => {
                let [a, b, c, d] = [a, b, c, d].map(|v| (v - wall) / (fluid - wall));
                if (a - 1.0).abs() <= PURE && d.abs() <= PURE {
                    a + b + c + d - 1.5
                } else {
                    linear(f64::midpoint(fluid, wall))
                }
            }
            (Crossing::Areas { fluid, wall }, _) => linear(f64::midpoint(fluid, wall)),
            (Crossing::Linear(level), _) => linear(level),
        };
        let share = if share.is_finite() {
            share.clamp(LEAST_SHARE, 1.0 - LEAST_SHARE)
        } else {
            0.5
        };
        let step = STEPS.get(side).copied().unwrap_or_default();
        [0, 1].map(|axis| pixel[axis] as f64 + 0.5 + share * step[axis] as f64)
    }

    /// Follows one loop from a side that belongs to it.
    fn walk(&mut self, start: [usize; 2], first: usize) -> PixelLoop {
        let mut points = Vec::new();
        let (mut pixel, mut side) = (start, first);
        loop {
            let index = pixel[1] * self.grey.width + pixel[0];
            match self.marks.get_mut(index) {
                Some(mark) if *mark & (2 << side) == 0 => *mark |= 2 << side,
                _ => return points,
            }
            points.push(self.crossing(pixel, side));
            // Onwards along the side, the outside on the left as drawn on the screen.
            let onward = (side + 1) % 4;
            let Some(next) = neighbour(pixel, onward).filter(|p| self.mark(*p) & 1 == 1) else {
                side = onward;
                continue;
            };
            if self.is_inside(next, side) {
                if let Some(corner) = neighbour(next, side) {
                    pixel = corner;
                    side = (side + 3) % 4;
                }
            } else {
                pixel = next;
            }
        }
    }
}

/// The neighbour on a side; `None` beyond the first row or column.
fn neighbour([x, y]: [usize; 2], side: usize) -> Option<[usize; 2]> {
    let [dx, dy] = STEPS.get(side).copied()?;
    Some([x.checked_add_signed(dx)?, y.checked_add_signed(dy)?])
}

/// Area of a loop, pixels squared, positive for outer loops.
pub(super) fn signed_area(points: &[[f64; 2]]) -> f64 {
    let Some(&o) = points.first() else {
        return 0.0;
    };
    let next = points.iter().cycle().skip(1);
    points
        .iter()
        .zip(next)
        .map(|(a, b)| 0.5 * ((a[0] - o[0]) * (b[1] - o[1]) - (b[0] - o[0]) * (a[1] - o[1])))
        .sum()
}

/// Length of a loop, pixels.
pub(super) fn length(points: &[[f64; 2]]) -> f64 {
    let next = points.iter().cycle().skip(1);
    points
        .iter()
        .zip(next)
        .map(|(a, b)| (b[0] - a[0]).hypot(b[1] - a[1]))
        .sum()
}
