//! How wide the grey edge is, and the smallest and largest section it leaves room for.
//!
//! The contours at two levels between wall and fluid, 20 % and 80 % unless asked otherwise, enclose the strip
//! in which the wall may lie. Its area over the length of the wall is the width of the edge. An edge that is
//! perfectly sharp measures 1.0 pixels in this way, since each pixel is a mean over its square; only an edge
//! above [`GREY_EDGE`] pixels leaves more room than that, and makes a reach.

use super::contour::{Crossing, Walk, signed_area};
use super::grey::Grey;
use super::micrograph_section::PixelLoop;
use super::regions::{Level, Regions};
use super::wall_levels::Sides;

/// Width between 20 % and 80 % above which the edge is grey, pixels.
pub(super) const GREY_EDGE: f64 = 1.5;

/// The contours of the two levels.
#[derive(Debug)]
pub(super) struct Edge {
    /// Distance of the two contours, averaged along the wall, pixels.
    pub(super) width: f64,
    /// The same between 20 % and 80 %, whatever the levels are, for an even slope.
    pub(super) standard_width: f64,
    pub(super) inner: Vec<PixelLoop>,
    pub(super) outer: Vec<PixelLoop>,
}

/// Why the edge does not show in the picture.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum EdgeProblem {
    /// The level of the contour does not lie between the two.
    LevelOutside,
    /// At the outer level the section reaches the border of what is looked at.
    ReachesBorder,
    /// At the outer level the section runs together with another region.
    Joins,
    /// At the inner level nothing is left.
    Vanishes,
}

impl EdgeProblem {
    /// In words.
    pub(super) fn text(self) -> &'static str {
        match self {
            Self::LevelOutside => "the level of the contour does not lie between the two levels",
            Self::ReachesBorder => "at the outer level the section runs out into its surroundings",
            Self::Joins => "at the outer level the section runs together with another region",
            Self::Vanishes => "at the inner level nothing of the section is left",
        }
    }
}

/// Loops of a mask, those below a size left out.
pub(super) fn loops_above(
    grey: &Grey,
    mask: Vec<u8>,
    crossing: Crossing,
    least_area: f64,
) -> (Vec<PixelLoop>, Vec<PixelLoop>) {
    let all = Walk::new(grey, mask, crossing).loops();
    all.into_iter()
        .partition(|points| signed_area(points).abs() >= least_area)
}

/// Area enclosed by loops, islands taken off, pixels.
pub(super) fn net_area(loops: &[PixelLoop]) -> f64 {
    loops.iter().map(|points| signed_area(points)).sum()
}

/// The section whose edge is looked at.
#[derive(Debug, Clone, Copy)]
pub(super) struct Section<'a> {
    pub(super) grey: &'a Grey,
    pub(super) mask: &'a [u8],
    pub(super) level: Level,
    /// A pixel well inside.
    pub(super) inner_pixel: (usize, usize),
    /// Length of its walls, pixels.
    pub(super) perimeter: f64,
    /// Islands and lumens below this are left out, pixels.
    pub(super) least_area: f64,
}

/// Finds the contours at two shares of the way from wall to fluid, the outer one first.
pub(super) fn edge(
    section: &Section<'_>,
    sides: &Sides,
    shares: [f64; 2],
) -> Result<Edge, EdgeProblem> {
    let tone = section.level.tone;
    let [outer, inner] = shares.map(|share| Level {
        tone,
        counts: sides.at(share),
    });
    let half = section.level.counts;
    let is_between = (half - outer.counts) * (inner.counts - half) > 0.0;
    if !is_between {
        return Err(EdgeProblem::LevelOutside);
    }
    let inner_mask: Vec<u8> = section
        .mask
        .iter()
        .zip(&section.grey.values)
        .map(|(m, v)| m & u8::from(inner.is_fluid(*v)))
        .collect();
    let (inner_loops, _) = loops_above(
        section.grey,
        inner_mask,
        Crossing::Linear(inner.counts),
        section.least_area,
    );
    if !inner_loops.iter().any(|points| signed_area(points) > 0.0) {
        return Err(EdgeProblem::Vanishes);
    }
    let regions = Regions::find(section.grey, outer).map_err(|_| EdgeProblem::Joins)?;
    let (x, y) = section.inner_pixel;
    let label = regions.label_at(x, y).ok_or(EdgeProblem::LevelOutside)?;
    if regions.blob(label).is_none_or(|blob| blob.touches_border) {
        return Err(EdgeProblem::ReachesBorder);
    }
    let outer_mask = regions.mask(label);
    drop(regions);
    // Fluid at the contour's level that is no part of the section.
    let joined = outer_mask
        .iter()
        .zip(section.mask)
        .zip(&section.grey.values)
        .filter(|((o, m), v)| **o == 1 && **m == 0 && section.level.is_fluid(**v))
        .count();
    if joined as f64 > section.least_area {
        return Err(EdgeProblem::Joins);
    }
    let (outer_loops, _) = loops_above(
        section.grey,
        outer_mask,
        Crossing::Linear(outer.counts),
        section.least_area,
    );
    let width = (net_area(&outer_loops) - net_area(&inner_loops)) / section.perimeter;
    Ok(Edge {
        width,
        standard_width: width * 0.6 / (shares[1] - shares[0]),
        inner: inner_loops,
        outer: outer_loops,
    })
}
