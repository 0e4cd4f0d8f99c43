//! From the bytes of a picture to its section, step by step.

use super::micrograph_problem::MicrographProblem;
use super::micrograph_section::{Levels, MicrographSection, PixelLoop};
use super::notes::Notes;
use super::options::{MicrographOptions, Threshold};
use super::outline_of_loops::{Built, Placement, outlines};
use super::prepare::prepared;
use super::region_choice::{Part, choose};
use super::section_contour::traced;
use crate::geometry::Outline;
use crate::intake::section_reach::{Reach, ReachSection};
use crate::units::{format_length, format_percent, format_significant};

/// Islands below this are filled unless asked otherwise, pixels.
const SMALLEST_ISLAND: f64 = 30.0;
/// Tolerance of fewer vertices unless asked otherwise, pixels.
const TOLERANCE: f64 = 0.05;
/// Sizes of a section taken without asking, m.
const SIZES: std::ops::RangeInclusive<f64> = 10e-9..=50e-3;

/// Reads a picture of a channel's section.
///
/// # Errors
/// [`MicrographProblem`] when the picture cannot be decoded or is above a limit, when its scale is missing or in
/// doubt, when it was tilted, or when it has no wall, none that is closed, or several.
///
/// # Examples
/// ```
/// use etchwise::intake::micrograph::{MicrographOptions, read_micrograph};
/// // A dark disc of radius 20 pixels, each grey the mean over its pixel, as a plain bitmap.
/// let grey = |x: f64, y: f64| (200.0 * (x.hypot(y) - 19.5).clamp(0.0, 1.0)) as u8;
/// let side = 64_u32;
/// let mut bytes = b"BM\0\0\0\0\0\0\0\0".to_vec();
/// for number in [1078, 40, side, side] {
///     bytes.extend(number.to_le_bytes());
/// }
/// bytes.extend([1, 0, 8, 0]);
/// bytes.extend([0; 24]);
/// bytes.extend((0..=255_u8).flat_map(|v| [v, v, v, 0]));
/// for i in 0..side * side {
///     bytes.push(grey(f64::from(i % side) - 31.5, f64::from(i / side) - 31.5));
/// }
/// let options = MicrographOptions { scale: Some(1e-6), ..MicrographOptions::default() };
/// let section = read_micrograph(&bytes, &options).unwrap();
/// let exact = std::f64::consts::PI * 20e-6_f64.powi(2);
/// assert!((section.outline.area() / exact - 1.0).abs() < 2e-3);
/// ```
pub fn read_micrograph(
    bytes: &[u8],
    options: &MicrographOptions,
) -> Result<MicrographSection, MicrographProblem> {
    let picture = prepared(bytes, options)?;
    let grey = &picture.grey;
    let metres_per_pixel = picture.metres_per_pixel;
    let pixel_area = metres_per_pixel[0] * metres_per_pixel[1];
    let part = Part {
        grey,
        crop: picture.crop,
        size: picture.size,
        pixel_area,
    };
    let chosen = choose(&part, options)?;
    let least_area = options
        .smallest_island
        .map_or(SMALLEST_ISLAND, |area| area / pixel_area);
    let traced = traced(grey, &chosen, options, least_area)?;
    let placement = Placement {
        crop: picture.crop,
        metres_per_pixel,
    };
    let tolerance = options.simplify.map_or(TOLERANCE, |metres| {
        metres / metres_per_pixel[0].max(metres_per_pixel[1])
    });
    check_simplify(options, &traced.loops, tolerance)?;
    let sides = traced
        .grey_edge()
        .map(|edge| [edge.inner.as_slice(), edge.outer.as_slice()]);
    let built = outlines(&placement, &traced.loops, sides, tolerance);
    check_size(&built.section.outline, options.allow_any_size)?;
    let mut notes = Notes {
        grey,
        options,
        metres_per_pixel,
        steps: picture.steps,
        warnings: picture.warnings,
    };
    notes.steps.extend(chosen.steps.iter().cloned());
    notes.warnings.extend(chosen.warnings.iter().cloned());
    notes.levels(&chosen, &traced);
    notes.islands(&traced);
    notes.edge(&traced, built.reach.is_some());
    notes.quality(&traced);
    notes.vertices(&traced, &built);
    let (steps, warnings) = (notes.steps, notes.warnings);
    let is_otsu = options.threshold == Threshold::Otsu;
    let levels = Levels {
        otsu: is_otsu.then(|| grey.to_file(chosen.classes.threshold)),
        contour: grey.to_file(traced.level.counts),
        fluid: grey.to_file(traced.sides.fluid),
        wall: grey.to_file(traced.sides.wall),
        reach: options
            .reach_levels
            .map(|share| grey.to_file(traced.sides.at(share))),
    };
    let edge_width = traced.edge.as_ref().ok().map(|edge| edge.width);
    let (reach, [inner_contours, outer_contours]) = reach_of(built.reach, options, edge_width);
    Ok(MicrographSection {
        outline: built.section.outline,
        reach,
        metres_per_pixel,
        scale_candidates: picture.candidates,
        size: picture.size,
        preview: picture.preview,
        crop: picture.crop,
        fluid: traced.level.tone,
        levels,
        histogram: chosen.histogram.summary(&chosen.classes, grey),
        regions: chosen.list,
        region: chosen.number,
        contours: built.section.loops,
        inner_contours,
        outer_contours,
        edge_width,
        steps,
        warnings,
        metadata: picture.metadata,
    })
}

/// The reach with its reason, and its contours.
fn reach_of(
    built: Option<[Built; 2]>,
    options: &MicrographOptions,
    edge_width: Option<f64>,
) -> (Option<Reach>, [Vec<PixelLoop>; 2]) {
    let Some([inner, outer]) = built else {
        return (None, [Vec::new(), Vec::new()]);
    };
    let [low, high] = options.reach_levels.map(|share| format_percent(share, 3));
    let section = |outline: Outline| ReachSection {
        outline,
        nominal: None,
    };
    let reach = Reach {
        inner: Some(section(inner.outline)),
        outer: Some(section(outer.outline)),
        reason: Some(format!(
            "the edge in the picture is grey, {} pixels wide between {low} and {high} of the way from wall to \
             fluid",
            format_significant(edge_width.unwrap_or(0.0), 3)
        )),
    };
    (Some(reach), [inner.loops, outer.loops])
}

/// Largest `--simplify`, as a fraction of the smaller side of the section: beyond that it is the tolerance
/// that makes the section.
const SIMPLIFY_LIMIT: f64 = 0.02;

/// Refuses a stated tolerance, here in pixels, that is not small against the section.
fn check_simplify(
    options: &MicrographOptions,
    loops: &[PixelLoop],
    tolerance: f64,
) -> Result<(), MicrographProblem> {
    let Some(stated) = options.simplify else {
        return Ok(());
    };
    let side = |axis: usize| {
        let places = loops.iter().flatten().map(|point| point[axis]);
        let (low, high) = places.fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), p| {
            (low.min(p), high.max(p))
        });
        high - low
    };
    if tolerance <= SIMPLIFY_LIMIT * side(0).min(side(1)) {
        return Ok(());
    }
    Err(MicrographProblem::OptionRange {
        option: "--simplify",
        value: format_length(stated),
        range: "at most a fiftieth of the smaller side of the section",
    })
}

/// Refuses a section of implausible size.
fn check_size(outline: &Outline, allows_any: bool) -> Result<(), MicrographProblem> {
    let Some((low, high)) = outline.bounds() else {
        return Ok(());
    };
    let (width, height) = (high[0] - low[0], high[1] - low[1]);
    if allows_any || SIZES.contains(&width.max(height)) {
        return Ok(());
    }
    Err(MicrographProblem::ImplausibleSize { width, height })
}
