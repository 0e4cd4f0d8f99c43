//! Cuts across the groove of a height map.

use std::f64::consts::FRAC_PI_2;

use super::cut_lines::{CutFrame, LineMean, line_mean};
use super::groove_direction::{GrooveDirection, find_direction, normalised};
use super::levelling::{LandPlane, land_plane};
use super::map_blocks::MapBlocks;
use super::map_problem::MapProblem;
use super::surface::HeightMap;
use crate::geometry::Point;
use crate::intake::step::Step;
use crate::intake::trace::{Profile, RawTrace};
use crate::units::{format_length, format_percent, format_significant};
use crate::warning::{Code, Warning};

/// Blocks each way on which the direction is found, and the plane.
const DIRECTION_BLOCKS: usize = 512;
const PLANE_BLOCKS: usize = 256;
/// Fewest points each way for a direction, and with a stated one.
const LEAST_POINTS: usize = 8;
const LEAST_POINTS_STATED: usize = 2;
/// Smallest part of the points that must have heights.
const LEAST_FILLED: f64 = 0.1;
/// Fewest samples of a cut.
const LEAST_SAMPLES: f64 = 8.0;
/// Parts of the variance that parallel cuts must explain more along the groove than across it: below the
/// first there is no groove, below the second it is in doubt. Chosen here: isotropic roughness stays below
/// 0.2, a channel between lands comes to 0.8 and more.
const NO_GROOVE: f64 = 0.25;
const WEAK_GROOVE: f64 = 0.5;
/// Angle between cut and perpendicular that widens a section by 0.06 %, rad.
const NOTABLE_ANGLE: f64 = 2.0 * std::f64::consts::PI / 180.0;
/// Multiple of the standard uncertainty that a difference must have to count.
const COVERAGE: f64 = 4.0;
/// Slope that shortens lengths in the plane of the map by 0.1 %.
const NOTABLE_SLOPE: f64 = 0.05;

/// How to cut a map.
#[derive(Debug, Clone, PartialEq)]
pub struct CutOptions {
    /// Where to cut (`--station`): distances along the groove from the middle of the map, m. Without one,
    /// one mean cut over the middle of the map.
    pub stations: Vec<f64>,
    /// Groove length averaged for each cut (`--average`), m.
    pub average: Option<f64>,
    /// Direction of the groove against the x axis, anticlockwise (`--groove-direction`), rad; found where
    /// it is not stated.
    pub direction: Option<f64>,
    /// Whether a plane is taken off first (`--no-plane` turns it off).
    pub level: bool,
}

impl Default for CutOptions {
    fn default() -> Self {
        Self {
            stations: Vec::new(),
            average: None,
            direction: None,
            level: true,
        }
    }
}

/// One cut.
#[derive(Debug, Clone, PartialEq)]
pub struct MapCut {
    /// Distance along the groove from the middle of the map, m.
    pub station: f64,
    /// First and last point of the cut on the map, m from its first point.
    pub from: Point,
    /// Last point of the cut on the map.
    pub to: Point,
    /// Heights along it, m; positions from `from`; NaN where the map has none.
    pub trace: RawTrace,
    /// Groove length that was averaged, m; zero for a single line.
    pub average: f64,
    /// Parallel lines that were averaged.
    pub rows: usize,
    /// Samples of these lines that have no height and were left out.
    pub missing: usize,
    /// Spread between the lines: root mean square of their standard deviations at each place, m; `None`
    /// for a single line.
    pub spread: Option<f64>,
}

/// A levelled map with cuts across its groove.
#[derive(Debug, Clone, PartialEq)]
pub struct MapCuts {
    /// Plane that was taken off: `z = plane[0] + plane[1] x + plane[2] y` from the first point; zero without
    /// levelling.
    pub plane: [f64; 3],
    /// Root mean square distance of the lands from the plane, m; `None` without levelling.
    pub plane_residual: Option<f64>,
    /// Direction of the groove against the x axis, anticlockwise, above -pi/2 to pi/2, rad.
    pub direction: f64,
    /// Its standard uncertainty, rad; zero where the direction was stated.
    pub direction_uncertainty: f64,
    /// The cuts in the order of the stations.
    pub cuts: Vec<MapCut>,
    /// What was done.
    pub steps: Vec<Step>,
    /// What a reader of results must know.
    pub warnings: Vec<Warning>,
}

/// Levels a map, finds the direction of its groove, and cuts at a right angle to it.
///
/// A cut along a row of a groove at the angle `a` against x would be `1 / sin(a)` times too wide; that is why
/// the direction comes first. The plane is fitted to the lands, so that grooves do not tilt it. Heights
/// along a cut are interpolated bilinearly, about as closely as the points of the map lie. Without stations
/// all lines of the largest rectangle across the middle of the map are averaged; missing samples are left
/// out of the mean.
///
/// # Errors
/// A map that is too small or too empty, one without a groove direction while none is stated, and stations
/// outside the map.
///
/// # Examples
/// ```
/// use etchwise::intake::{CutOptions, HeightMap, cut};
/// // A groove 40 um wide and 10 um deep at 30 degrees.
/// let size = [120, 100];
/// let heights = (0..size[0] * size[1]).map(|place| {
///     let (x, y) = ((place % size[0]) as f64 * 2e-6, (place / size[0]) as f64 * 2e-6);
///     let across: f64 = 0.5 * (x - 119e-6) - 0.75_f64.sqrt() * (y - 99e-6);
///     if across.abs() < 20e-6 { -10e-6 } else { 0.0 }
/// });
/// let map = HeightMap {
///     size,
///     spacing: [2e-6, 2e-6],
///     heights: heights.collect(),
///     ..HeightMap::default()
/// };
/// let cuts = cut(&map, &CutOptions::default())?;
/// assert!((cuts.direction.to_degrees() - 30.0).abs() < 0.1);
/// assert!(cuts.cuts[0].rows > 20);
/// # Ok::<(), etchwise::intake::MapProblem>(())
/// ```
pub fn cut(map: &HeightMap, options: &CutOptions) -> Result<MapCuts, MapProblem> {
    check(map, options)?;
    let mut steps = Vec::new();
    let mut warnings = Vec::new();
    let mut blocks = MapBlocks::of_map(map, DIRECTION_BLOCKS);
    let land = land_plane(&blocks.coarser(PLANE_BLOCKS));
    let plane = land.map_or([0.0; 3], |land| land.plane);
    blocks.take_off(plane);
    let found = {
        let enough = map.size.iter().all(|&count| count >= LEAST_POINTS);
        enough.then(|| find_direction(&blocks))
    };
    drop(blocks);
    let direction = decide_direction(options, found.as_ref(), &mut steps, &mut warnings)?;
    let taken_off = if options.level { plane } else { [0.0; 3] };
    tell_plane(options, land.as_ref(), &mut steps, &mut warnings);
    let frame = CutFrame::new(map, direction);
    let cuts = if options.stations.is_empty() {
        vec![one_cut(map, taken_off, &frame, None, options)?]
    } else {
        let stations = options.stations.iter();
        stations
            .map(|&station| one_cut(map, taken_off, &frame, Some(station), options))
            .collect::<Result<_, _>>()?
    };
    let uncertainty = match (options.direction, &found) {
        (None, Some(found)) => found.uncertainty,
        _ => 0.0,
    };
    Ok(MapCuts {
        plane: taken_off,
        plane_residual: land.filter(|_| options.level).map(|land| land.rms),
        direction,
        direction_uncertainty: uncertainty,
        cuts,
        steps,
        warnings,
    })
}

/// Refuses options and maps that nothing can be done with.
fn check(map: &HeightMap, options: &CutOptions) -> Result<(), MapProblem> {
    if let Some(metres) = options.average
        && !(metres.is_finite() && metres > 0.0)
    {
        return Err(MapProblem::AverageNotPositive { metres });
    }
    if options.direction.is_some_and(|angle| !angle.is_finite()) {
        return Err(MapProblem::DirectionNotFinite);
    }
    let needed = if options.direction.is_some() {
        LEAST_POINTS_STATED
    } else {
        LEAST_POINTS
    };
    if map.size.iter().any(|&count| count < needed) {
        return Err(MapProblem::TooSmall {
            along_x: map.size[0],
            along_y: map.size[1],
            needed,
        });
    }
    for (axis, &metres) in ["x", "y"].into_iter().zip(&map.spacing) {
        if !(metres.is_finite() && metres > 0.0) {
            return Err(MapProblem::SpacingNotPositive { axis, metres });
        }
    }
    let points = map.heights.len();
    let valid = points - map.missing();
    if (valid as f64) < (LEAST_FILLED * points as f64).max(4.0) {
        return Err(MapProblem::TooFewHeights { valid, points });
    }
    Ok(())
}

/// The direction stated or found, with what speaks against it.
fn decide_direction(
    options: &CutOptions,
    found: Option<&GrooveDirection>,
    steps: &mut Vec<Step>,
    warnings: &mut Vec<Warning>,
) -> Result<f64, MapProblem> {
    if let Some(found) = found {
        steps.push(direction_step(found));
    }
    if let Some(stated) = options.direction {
        let stated = normalised(stated);
        let text = format!(
            "groove direction {} degrees against x, as stated",
            format_significant(stated.to_degrees(), 6)
        );
        steps.push(Step::new("direction", text).with(&[("direction_rad", stated)]));
        if let Some(found) = found.filter(|found| found.along - found.across >= WEAK_GROOVE) {
            let off = normalised(stated - found.angle);
            if off.abs() > NOTABLE_ANGLE.max(COVERAGE * found.uncertainty) {
                warnings.push(oblique_stated(stated, found.angle, off));
            }
        }
        return Ok(stated);
    }
    let none = MapProblem::NoDirection {
        along: found.map_or(0.0, |found| found.along),
        across: found.map_or(0.0, |found| found.across.max(0.0)),
    };
    let clear = found.filter(|found| found.along - found.across >= NO_GROOVE);
    let found = clear.ok_or(none)?;
    if found.along - found.across < WEAK_GROOVE || found.uncertainty > NOTABLE_ANGLE {
        warnings.push(Warning {
            code: Code::ObliqueCut,
            message: format!(
                "the groove direction, {} degrees with a standard uncertainty of {}, is not sure: \
                 parallel cuts explain {} of the heights along it and {} across it",
                format_significant(found.angle.to_degrees(), 4),
                format_significant(found.uncertainty.to_degrees(), 2),
                format_percent(found.along, 2),
                format_percent(found.across, 2)
            ),
            advice: "state it by --groove-direction, or crop the map to one straight channel"
                .to_owned(),
            numbers: vec![
                ("direction_rad", found.angle),
                ("direction_uncertainty_rad", found.uncertainty),
            ],
        });
    }
    let turns = found.turn.abs() > COVERAGE * found.turn_uncertainty;
    if turns && found.turn.abs() > 0.5 * NOTABLE_ANGLE {
        warnings.push(Warning {
            code: Code::ObliqueCut,
            message: format!(
                "the groove is curved: its direction turns by {} degrees from one end of the map to the \
                 other; cuts at a right angle to the mean direction are oblique by up to half of that",
                format_significant(found.turn.to_degrees(), 2)
            ),
            advice: "cut near the middle with --station 0 and a short --average, or measure a shorter map"
                .to_owned(),
            numbers: vec![("turn_rad", found.turn)],
        });
    }
    Ok(found.angle)
}

/// How the direction was found.
fn direction_step(found: &GrooveDirection) -> Step {
    let degrees = |angle: f64, digits| format_significant(angle.to_degrees(), digits);
    let text = format!(
        "groove direction {} degrees against x (standard uncertainty {}) by the best agreement of \
         parallel cuts, which explain {} of the heights ({} across the groove); the structure tensor gave \
         {} degrees (coherence {}); the direction turns by {} degrees along the map (standard uncertainty \
         {})",
        degrees(found.angle, 6),
        degrees(found.uncertainty, 2),
        format_percent(found.along, 3),
        format_percent(found.across.max(0.0), 2),
        degrees(found.tensor_angle, 4),
        format_significant(found.coherence, 2),
        degrees(found.turn, 2),
        degrees(found.turn_uncertainty, 2)
    );
    Step::new("direction", text).with(&[
        ("found_direction_rad", found.angle),
        ("direction_uncertainty_rad", found.uncertainty),
        ("explained_along", found.along),
        ("explained_across", found.across),
        ("tensor_direction_rad", found.tensor_angle),
        ("coherence", found.coherence),
        ("turn_rad", found.turn),
        ("turn_uncertainty_rad", found.turn_uncertainty),
    ])
}

/// A stated direction that the heights contradict.
fn oblique_stated(stated: f64, found: f64, off: f64) -> Warning {
    let wider = if off.abs() < FRAC_PI_2 - 1e-3 {
        format!(
            "widths come out {} too large",
            format_percent(1.0 / off.cos() - 1.0, 2)
        )
    } else {
        "cuts run along the groove".to_owned()
    };
    Warning {
        code: Code::ObliqueCut,
        message: format!(
            "the groove direction stated, {} degrees, is {} degrees off the one that the heights show, {}: \
             {wider}",
            format_significant(stated.to_degrees(), 4),
            format_significant(off.abs().to_degrees(), 3),
            format_significant(found.to_degrees(), 4)
        ),
        advice: "leave --groove-direction out, or check the sense of the angle: it counts anticlockwise from \
                 the x axis"
            .to_owned(),
        numbers: vec![("direction_rad", stated), ("found_direction_rad", found)],
    }
}

/// The plane that was taken off, or not.
fn tell_plane(
    options: &CutOptions,
    land: Option<&LandPlane>,
    steps: &mut Vec<Step>,
    warnings: &mut Vec<Warning>,
) {
    let Some(land) = land.filter(|_| options.level) else {
        steps.push(Step::new("levelling", "no plane taken off the map"));
        return;
    };
    let [_, slope_x, slope_y] = land.plane;
    let how = if land.fitted {
        "fitted to the lands"
    } else {
        "with the slope of most of the surface, since the lands are too narrow for a plane of their own"
    };
    let text = format!(
        "plane {how} taken off: it rises by {} along x and {} along y; {} of the surface lie around \
         it, {} root mean square off it; it lies at the uppermost level that much of the surface has",
        format_percent(slope_x, 3),
        format_percent(slope_y, 3),
        format_percent(land.share, 2),
        format_length(land.rms)
    );
    steps.push(Step::new("levelling", text).with(&[
        ("plane_height_m", land.plane[0]),
        ("plane_slope_x", slope_x),
        ("plane_slope_y", slope_y),
        ("plane_residual_m", land.rms),
        ("plane_share", land.share),
    ]));
    let slope = slope_x.hypot(slope_y);
    if slope > NOTABLE_SLOPE {
        warnings.push(Warning {
            code: Code::ObliqueCut,
            message: format!(
                "the surface lies tilted by {} degrees; lengths along the tilt are measured {} too short",
                format_significant(slope.atan().to_degrees(), 3),
                format_percent(1.0 - 1.0 / slope.hypot(1.0), 2)
            ),
            advice: "level the sample on the instrument and measure again".to_owned(),
            numbers: vec![("slope", slope)],
        });
    }
}

/// One cut, at a station or over the middle of the map.
fn one_cut(
    map: &HeightMap,
    plane: [f64; 3],
    frame: &CutFrame,
    station: Option<f64>,
    options: &CutOptions,
) -> Result<MapCut, MapProblem> {
    let average = match (station, options.average) {
        (_, Some(length)) => length,
        (Some(_), None) => 0.0,
        (None, None) => 2.0 * frame.widest_half_length(),
    };
    let place = station.unwrap_or(0.0);
    let outside = || {
        let reach = (frame.farthest() - 0.5 * average).max(0.0);
        MapProblem::StationOutside {
            station: place,
            average,
            from: -reach,
            to: reach,
        }
    };
    let (first, last) = (place - 0.5 * average, place + 0.5 * average);
    let (from, to) = frame.on_map_between(first, last).ok_or_else(outside)?;
    let samples = (to - from) / frame.step_across + 1e-6;
    let least = LEAST_SAMPLES.min(map.size[0].min(map.size[1]) as f64) - 1.0;
    if samples < least {
        return Err(outside());
    }
    let samples = samples.floor();
    // Both ends lose the same remainder.
    let start = 0.5 * (from + to - samples * frame.step_across);
    let distances: Vec<f64> = (0..=samples as usize)
        .map(|at| start + at as f64 * frame.step_across)
        .collect();
    let rows = (average / frame.step_along).round();
    let stations: Vec<f64> = if rows < 1.0 {
        vec![place]
    } else {
        let row = |at: usize| first + average * at as f64 / rows;
        (0..=rows as usize).map(row).collect()
    };
    let mean = line_mean(map, plane, frame, &stations, &distances);
    let ends = [distances.first(), distances.last()]
        .map(|distance| frame.point(place, distance.copied().unwrap_or(0.0)));
    let mut trace_steps = map.steps.clone();
    trace_steps.push(cut_step(&mean, frame, place, average));
    let positions = (0..distances.len()).map(|at| at as f64 * frame.step_across);
    Ok(MapCut {
        station: place,
        from: ends[0],
        to: ends[1],
        trace: RawTrace {
            profile: Profile {
                x: positions.collect(),
                z: mean.heights,
            },
            metadata: map.metadata.clone(),
            tip_radius: None,
            steps: trace_steps,
        },
        average,
        rows: mean.rows,
        missing: mean.missing,
        spread: mean.spread,
    })
}

/// How a cut was made.
fn cut_step(mean: &LineMean, frame: &CutFrame, place: f64, average: f64) -> Step {
    let gaps = mean.heights.iter().filter(|z| !z.is_finite()).count();
    let spread = mean.spread.map_or_else(String::new, |spread| {
        format!(
            ", standard deviation between them {}",
            format_length(spread)
        )
    });
    let text = format!(
        "cut at a right angle to the groove, station {} from the middle of the map, {} samples every {} \
         interpolated bilinearly; mean of {} lines over {} of groove{spread}; {} samples of the lines \
         missing and left out (at least {} lines behind each mean), {gaps} places without a height",
        format_length(place),
        mean.heights.len(),
        format_length(frame.step_across),
        mean.rows,
        format_length(average),
        mean.missing,
        mean.fewest
    );
    Step::new("cut", text).with(&[
        ("station_m", place),
        ("average_m", average),
        ("rows", mean.rows as f64),
        ("missing_samples", mean.missing as f64),
        ("missing_places", gaps as f64),
        ("spread_m", mean.spread.unwrap_or(0.0)),
    ])
}
