//! Reading a surface file: a map or a profile in metres, with every defect told.

use super::file_defects::FileDefects;
use super::map_problem::MapProblem;
use super::sdf::read_sdf;
use super::surface::{HeightMap, height_range};
use super::surface_format::SurfaceFormat;
use super::surface_size::{SurfaceSize, check_metres};
use super::x3p::read_x3p;
use crate::intake::step::Step;
use crate::intake::trace::RawTrace;
use crate::units::{format_length, format_percent};
use crate::warning::Warning;

/// What a surface file holds.
#[derive(Debug, Clone, PartialEq)]
pub enum SurfaceContent {
    /// Heights over an area.
    Map(HeightMap),
    /// Heights along a line: the file has one row.
    Profile(RawTrace),
}

impl SurfaceContent {
    fn steps_mut(&mut self) -> &mut Vec<Step> {
        match self {
            Self::Map(map) => &mut map.steps,
            Self::Profile(trace) => &mut trace.steps,
        }
    }

    fn heights(&self) -> &[f64] {
        match self {
            Self::Map(map) => &map.heights,
            Self::Profile(trace) => &trace.profile.z,
        }
    }

    /// Multiplies all lengths.
    fn scale(&mut self, factor: f64) {
        match self {
            Self::Map(map) => {
                map.spacing = map.spacing.map(|spacing| spacing * factor);
                map.heights.iter_mut().for_each(|z| *z *= factor);
            }
            Self::Profile(trace) => {
                let profile = &mut trace.profile;
                for length in profile.x.iter_mut().chain(&mut profile.z) {
                    *length *= factor;
                }
            }
        }
    }

    /// Size, spacing and span of heights.
    fn measure(&self) -> SurfaceSize {
        let [low, high] = height_range(self.heights()).unwrap_or_default();
        let (size, spacing) = match self {
            Self::Map(map) => (map.extent(), map.spacing[0].max(map.spacing[1])),
            Self::Profile(trace) => {
                let x = &trace.profile.x;
                let length = x
                    .last()
                    .zip(x.first())
                    .map_or(0.0, |(last, first)| last - first);
                let steps = x.len().saturating_sub(1).max(1) as f64;
                ([length, 0.0], length / steps)
            }
        };
        SurfaceSize {
            size,
            spacing,
            span: high - low,
        }
    }
}

/// Reads a surface file.
///
/// - `file_unit`: metres in one unit of the file, for files that are not in metres as the formats have it;
///   it also allows sizes that look wrong as metres
///
/// Defects of the file (check sums, odd names, wrong counts of bytes) are read over; each has a step
/// `file_defect` and a warning of that code.
///
/// # Errors
/// A file that is cut off or contradicts itself, is above the limits, has no height at all, or whose
/// lengths can hardly be metres while no unit is stated.
///
/// # Examples
/// ```
/// use etchwise::intake::{SurfaceContent, SurfaceFormat, read_surface};
/// let text = b"aISO-1.0\nManufacID = none\nNumPoints = 3\nNumProfiles = 2\nXscale = 2e-6\n\
///     Yscale = 2e-6\nZscale = 1e-6\nZresolution = 1e-9\nCompression = 0\nDataType = 7\n\
///     CheckType = 0\n*\n0.1 0.2 0.3\n0.1 BAD 0.3\n*\n";
/// let (content, warnings) = read_surface(text, SurfaceFormat::Sdf, None)?;
/// let SurfaceContent::Map(map) = content else { panic!("three by two points are a map") };
/// assert_eq!(map.size, [3, 2]);
/// assert!((map.height(2, 1) - 0.3e-6).abs() < 1e-18 && map.missing() == 1);
/// assert!(warnings.is_empty());
/// # Ok::<(), etchwise::intake::MapProblem>(())
/// ```
pub fn read_surface(
    bytes: &[u8],
    format: SurfaceFormat,
    file_unit: Option<f64>,
) -> Result<(SurfaceContent, Vec<Warning>), MapProblem> {
    if let Some(metres) = file_unit
        && !(metres.is_finite() && metres > 0.0)
    {
        return Err(MapProblem::UnitNotPositive { metres });
    }
    let mut defects = FileDefects::default();
    let mut content = match format {
        SurfaceFormat::X3p => read_x3p(bytes, &mut defects)?,
        SurfaceFormat::Sdf => read_sdf(bytes, &mut defects)?,
    };
    check_heights(&content)?;
    if let Some(metres) = file_unit {
        content.scale(metres);
        let text = format!(
            "lengths of the file taken as units of {} as stated; the format itself has metres",
            format_length(metres)
        );
        let step = Step::new("units", text).with(&[("file_unit_m", metres)]);
        content.steps_mut().push(step);
    } else {
        check_metres(&content.measure())?;
        let step = Step::new(
            "units",
            "lengths of the file taken as metres, as the format has it",
        );
        content.steps_mut().push(step);
    }
    let size_step = size_step(&content);
    let mut warnings = Vec::new();
    let steps = content.steps_mut();
    steps.push(size_step);
    defects.tell(steps, &mut warnings);
    Ok((content, warnings))
}

/// Spacings must be above zero and some heights there.
fn check_heights(content: &SurfaceContent) -> Result<(), MapProblem> {
    if let SurfaceContent::Map(map) = content {
        for (axis, &metres) in ["x", "y"].into_iter().zip(&map.spacing) {
            if !(metres.is_finite() && metres > 0.0) {
                return Err(MapProblem::SpacingNotPositive { axis, metres });
            }
        }
    }
    let heights = content.heights();
    if heights.iter().any(|z| z.is_finite()) {
        Ok(())
    } else {
        Err(MapProblem::NoHeights {
            points: heights.len(),
        })
    }
}

/// What was read.
fn size_step(content: &SurfaceContent) -> Step {
    let heights = content.heights();
    let missing = heights.iter().filter(|z| !z.is_finite()).count();
    let measured = content.measure();
    let range = height_range(heights).unwrap_or_default();
    let share = missing as f64 / heights.len().max(1) as f64;
    let what = match content {
        SurfaceContent::Map(map) => format!(
            "map of {} x {} points every {} and {}",
            map.size[0],
            map.size[1],
            format_length(map.spacing[0]),
            format_length(map.spacing[1])
        ),
        SurfaceContent::Profile(trace) => format!(
            "profile of {} points over {}",
            trace.profile.x.len(),
            format_length(measured.size[0])
        ),
    };
    let share = if missing == 0 {
        String::new()
    } else {
        format!(" ({})", format_percent(share, 2))
    };
    let text = format!(
        "{what}; heights from {} to {}, {missing} points missing{share}",
        format_length(range[0]),
        format_length(range[1]),
    );
    Step::new("surface", text).with(&[
        ("size_x_m", measured.size[0]),
        ("size_y_m", measured.size[1]),
        ("lowest_m", range[0]),
        ("highest_m", range[1]),
        ("missing", missing as f64),
    ])
}
