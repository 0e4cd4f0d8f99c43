//! The contour of the chosen region, at the level half-way between the greys beside its wall.

use super::contour::{Crossing, length, signed_area};
use super::grey::Grey;
use super::grey_edge::{Edge, EdgeProblem, GREY_EDGE, Section, edge, loops_above, net_area};
use super::micrograph_problem::MicrographProblem;
use super::micrograph_section::PixelLoop;
use super::options::{MicrographOptions, PixelBox, Threshold, Tone};
use super::region_choice::Chosen;
use super::regions::{Level, Regions};
use super::wall_levels::{
    FIRST_DISTANCE, LAST_DISTANCE, Sides, measure, share_of_jumps, width_by_slope,
};
use crate::intake::limits::MAX_VERTICES;

/// Passes in which level and width of the edge settle.
const PASSES: usize = 3;
/// Pixels about the region that are looked at.
const MARGIN: u32 = 100;
/// A level is half-way within this share of the contrast.
const HALF_WAY: f64 = 0.02;
/// Largest noise of neighbours over the contrast at which four pixels give the place of a sharp edge better
/// than two: they are free of the lattice, but carry the noise of four.
const QUIET: f64 = 0.045;

/// A region with its contour and what is known of its edge.
#[derive(Debug)]
pub(super) struct Traced {
    /// The contour's level.
    pub(super) level: Level,
    pub(super) sides: Sides,
    /// Loops that stay.
    pub(super) loops: Vec<PixelLoop>,
    /// Number and area of the islands that were filled, pixels.
    pub(super) filled: (usize, f64),
    /// Area inside, pixels.
    pub(super) area: f64,
    pub(super) edge: Result<Edge, EdgeProblem>,
    /// Share of edge pixels without a grey in between.
    pub(super) jumps: f64,
    /// Whether the edge is sharp and was placed by the sum of the greys across it.
    pub(super) by_areas: bool,
}

impl Traced {
    /// The edge if it is wide enough to matter.
    pub(super) fn grey_edge(&self) -> Option<&Edge> {
        self.edge
            .as_ref()
            .ok()
            .filter(|edge| edge.standard_width > GREY_EDGE)
    }
}

/// What one pass at a level gives.
struct Pass {
    mask: Vec<u8>,
    loops: Vec<PixelLoop>,
    filled: Vec<PixelLoop>,
    perimeter: f64,
}

/// Traces the chosen region.
///
/// - `least_area`: smaller islands are filled, pixels
pub(super) fn traced(
    grey: &Grey,
    chosen: &Chosen,
    options: &MicrographOptions,
    least_area: f64,
) -> Result<Traced, MicrographProblem> {
    let window = Window::about(grey, chosen);
    let grey = &window.grey;
    let (mut level, inner_pixel) = (chosen.level, window.inner_pixel);
    let first = pass_at(grey, level, inner_pixel, least_area)?;
    let mut pass = first.ok_or(MicrographProblem::NoRegion {
        tone: Some(level.tone),
        least: 1,
        cut_off: None,
    })?;
    let mut sides = class_sides(chosen);
    let mut found = Err(EdgeProblem::LevelOutside);
    let mut distance = FIRST_DISTANCE;
    let mut width = width_by_slope(grey, &pass.loops, sides.contrast());
    for _ in 0..PASSES {
        let wanted = (2.0 * width).ceil().clamp(0.0, f64::from(LAST_DISTANCE)) as u8;
        distance = distance.max(wanted);
        if let Some(measured) = measure(grey, &pass.mask, level, distance) {
            sides = measured;
        }
        if let Some([fluid, wall]) = chosen.stated {
            (sides.fluid, sides.wall) = (fluid, wall);
        }
        if options.threshold == Threshold::Otsu {
            let half = Level {
                counts: sides.at(0.5),
                ..level
            };
            if let Some(next) = pass_at(grey, half, inner_pixel, least_area)? {
                (level, pass) = (half, next);
            }
        }
        let section = Section {
            grey,
            mask: &pass.mask,
            level,
            inner_pixel,
            perimeter: pass.perimeter,
            least_area,
        };
        found = edge(&section, &sides, options.reach_levels);
        width = found.as_ref().map_or(0.0, |edge| edge.standard_width);
        // The slope gives the width to about a third.
        if 1.5 * width <= f64::from(distance) || distance == LAST_DISTANCE {
            break;
        }
    }
    let by_areas = is_for_areas(&found, &sides, level);
    if by_areas {
        let areas = Crossing::Areas {
            fluid: sides.fluid,
            wall: sides.wall,
        };
        pass = pass_of(grey, pass.mask, areas, least_area)?;
    }
    let jumps = share_of_jumps(grey, &pass.loops, &sides);
    window.move_back(&mut pass.loops);
    if let Ok(edge) = &mut found {
        window.move_back(&mut edge.inner);
        window.move_back(&mut edge.outer);
    }
    Ok(Traced {
        level,
        by_areas,
        jumps,
        sides,
        filled: (
            pass.filled.len(),
            pass.filled.iter().map(|l| signed_area(l).abs()).sum(),
        ),
        area: net_area(&pass.loops),
        loops: pass.loops,
        edge: found,
    })
}

/// Levels of fluid and wall from the means of the two classes, for a beginning.
fn class_sides(chosen: &Chosen) -> Sides {
    let [low, high] = chosen.classes.means;
    let (fluid, wall) = match chosen.level.tone {
        Tone::Dark => (low, high),
        Tone::Bright => (high, low),
    };
    Sides {
        fluid,
        wall,
        noise: 0.0,
    }
}

/// Whether the greys across the edge give its place better than two pixels do.
fn is_for_areas(edge: &Result<Edge, EdgeProblem>, sides: &Sides, level: Level) -> bool {
    let contrast = sides.contrast();
    let is_sharp = |edge: &Edge| edge.standard_width <= GREY_EDGE;
    edge.as_ref().is_ok_and(is_sharp)
        && sides.noise <= QUIET * contrast
        && (level.counts - sides.at(0.5)).abs() < HALF_WAY * contrast
}

/// The picture about a region, wide enough for its edge.
struct Window {
    grey: Grey,
    offset: [f64; 2],
    /// A pixel well inside the region.
    inner_pixel: (usize, usize),
}

impl Window {
    fn about(grey: &Grey, chosen: &Chosen) -> Self {
        let (width, height) = (grey.width as u32, grey.height as u32);
        let blob = chosen.regions.blob(chosen.label);
        let (low, high) = blob.map_or(([0, 0], [width, height]), |blob| (blob.low, blob.high));
        let [x, y] = low.map(|c| c.saturating_sub(MARGIN));
        let right = high[0].saturating_add(MARGIN + 1).min(width);
        let bottom = high[1].saturating_add(MARGIN + 1).min(height);
        let part = PixelBox {
            x,
            y,
            width: right - x,
            height: bottom - y,
        };
        let (column, row) = chosen.regions.inner_pixel(chosen.label).unwrap_or((0, 0));
        Self {
            grey: grey.part(part),
            offset: [f64::from(x), f64::from(y)],
            inner_pixel: (
                column.saturating_sub(x as usize),
                row.saturating_sub(y as usize),
            ),
        }
    }

    /// Loops from pixels of the window to those of the part used.
    fn move_back(&self, loops: &mut [PixelLoop]) {
        for point in loops.iter_mut().flatten() {
            *point = [point[0] + self.offset[0], point[1] + self.offset[1]];
        }
    }
}

/// The contour of a mask.
fn pass_of(
    grey: &Grey,
    mask: Vec<u8>,
    crossing: Crossing,
    least_area: f64,
) -> Result<Pass, MicrographProblem> {
    let (loops, filled) = loops_above(grey, mask.clone(), crossing, least_area);
    let vertices: usize = loops.iter().map(Vec::len).sum();
    if vertices > MAX_VERTICES {
        return Err(MicrographProblem::TooNoisy);
    }
    Ok(Pass {
        mask,
        perimeter: loops.iter().map(|l| length(l)).sum(),
        loops,
        filled,
    })
}

/// The contour at a new level of the region with a pixel; `None` where it is no closed region any more.
fn pass_at(
    grey: &Grey,
    level: Level,
    (x, y): (usize, usize),
    least_area: f64,
) -> Result<Option<Pass>, MicrographProblem> {
    let regions = Regions::find(grey, level).map_err(|_| MicrographProblem::TooNoisy)?;
    let label = regions.label_at(x, y);
    let closed = label.filter(|l| regions.blob(*l).is_some_and(|blob| !blob.touches_border));
    let mask = closed.map(|label| regions.mask(label));
    drop(regions);
    let crossing = Crossing::Linear(level.counts);
    mask.map(|mask| pass_of(grey, mask, crossing, least_area))
        .transpose()
}
