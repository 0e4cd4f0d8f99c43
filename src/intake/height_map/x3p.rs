//! Reading x3p files: ISO 25178-72 and its predecessor ISO 5436-2.
//!
//! Coordinates are `offset + increment * number` along each axis. Matrices run fastest along x, then along
//! y, both rising unless an increment is negative. The layout is from files of the open reference library of
//! the format and from memory of the standard.

use super::container::Container;
use super::file_defects::FileDefects;
use super::listed_points::{MAX_LISTED_POINTS, grid_of_points};
use super::map_problem::MapProblem;
use super::stored_number::StoredNumber;
use super::surface::{HeightMap, checked_points};
use super::surface_content::SurfaceContent;
use super::x3p_description::{Axis, Description, Dimension, Feature, read_description};
use super::x3p_points::{Columns, check_md5, read_points};
use crate::intake::source_text::SourceText;
use crate::intake::step::Step;
use crate::intake::trace::{Profile, RawTrace};
use crate::units::format_length;
use crate::units::format_significant;

/// Largest `main.xml`, bytes.
const MAX_XML_BYTES: u64 = 64 << 20;
/// Largest file with a check sum that is looked at, bytes.
const MAX_CHECKSUM_BYTES: u64 = 1 << 16;
/// Name of the file with the check sum of `main.xml`.
const CHECKSUM_FILE: &str = "md5checksum.hex";

/// Reads an x3p file; lengths come out in the unit of the file.
pub(super) fn read_x3p(
    bytes: &[u8],
    defects: &mut FileDefects,
) -> Result<SurfaceContent, MapProblem> {
    let mut container = Container::open(bytes, defects)?;
    let main = container.main_xml(MAX_XML_BYTES)?;
    let digest = md5_of(&main);
    let text = SourceText::decode(main).map_err(|problem| MapProblem::Xml {
        message: problem.to_string(),
    })?;
    let description = read_description(&text.text, defects)?;
    drop(text);
    check_main(&mut container, &description, &digest, defects)?;
    let (size, count) = size_and_count(&description)?;
    let columns = read_points(&mut container, &description, count, defects)?;
    let mut steps = vec![storage_step(&description, &columns)];
    if description.rotated {
        steps.push(Step::new(
            "placement",
            "the file states a rotation of the surface in space; heights are taken as stored, across \
             the file's own x and y",
        ));
    }
    arrange(description, size, columns, steps, defects)
}

fn md5_of(bytes: &[u8]) -> [u8; 16] {
    use md5::Digest;
    md5::Md5::digest(bytes).into()
}

/// Compares `main.xml` with its check sum.
fn check_main(
    container: &mut Container,
    description: &Description,
    digest: &[u8],
    defects: &mut FileDefects,
) -> Result<(), MapProblem> {
    let name = description.checksum_file.as_deref().unwrap_or_else(|| {
        defects.note(format!(
            "main.xml names no file with its check sum; {CHECKSUM_FILE} is looked for"
        ));
        CHECKSUM_FILE
    });
    let Some(at) = container.find(name, defects) else {
        defects.note("the container holds no check sum of main.xml".to_owned());
        return Ok(());
    };
    let stated = container.read_whole(at, MAX_CHECKSUM_BYTES)?;
    let stated = String::from_utf8_lossy(&stated);
    let first = stated
        .trim_start_matches('\u{feff}')
        .split_whitespace()
        .next();
    check_md5("description main.xml", first, digest, defects);
    Ok(())
}

/// Points along x and y, and in all.
fn size_and_count(description: &Description) -> Result<([usize; 2], usize), MapProblem> {
    let (along_x, along_y) = match description.dimension {
        Dimension::Matrix([along_x, along_y, layers]) => {
            if layers > 1 {
                return Err(MapProblem::Layers { layers });
            }
            if layers == 0 {
                return Err(MapProblem::NoPoints { along_x, along_y });
            }
            (along_x, along_y)
        }
        Dimension::List(points) => (points, 1),
    };
    let count = checked_points(along_x, along_y)?;
    let scattered = description.axes.iter().take(2).any(|axis| axis.absolute);
    if scattered && count > MAX_LISTED_POINTS {
        return Err(MapProblem::TooManyPoints {
            limit: MAX_LISTED_POINTS,
            along_x,
            along_y,
        });
    }
    Ok(([along_x as usize, along_y as usize], count))
}

/// How the numbers are stored.
fn storage_step(description: &Description, columns: &Columns) -> Step {
    let z = &description.axes[2];
    let kind = match description.feature {
        Feature::Surface => "surface",
        Feature::Profile => "profile",
        Feature::PointCloud => "point cloud",
    };
    let count = columns.axes[2].len();
    let missing = columns.axes[2].iter().filter(|z| z.is_nan()).count();
    let text = format!(
        "x3p {kind} of {count} points; heights stored as {} times {} plus {}; {missing} missing ({} \
         marked by the file, the others not a number)",
        z.number.name(),
        format_significant(z.increment, 6),
        format_significant(z.offset, 6),
        columns.marked
    );
    Step::new("storage", text).with(&[
        ("points", count as f64),
        ("missing", missing as f64),
        ("height_increment", z.increment),
        ("height_offset", z.offset),
    ])
}

/// A map or a profile from the columns.
fn arrange(
    description: Description,
    size: [usize; 2],
    columns: Columns,
    mut steps: Vec<Step>,
    defects: &mut FileDefects,
) -> Result<SurfaceContent, MapProblem> {
    let [x, y, z] = columns.axes;
    let [axis_x, axis_y, _] = description.axes;
    let one_row = size[1] == 1 && description.feature != Feature::PointCloud && !axis_y.absolute;
    if description.feature == Feature::Profile && size[1] > 1 {
        defects.note(format!(
            "the file calls itself a profile (PRF) but holds {} rows; it is read as a map",
            size[1]
        ));
    }
    let is_profile = description.feature == Feature::Profile && size[1] == 1;
    if one_row || is_profile {
        let x = if axis_x.absolute {
            x
        } else {
            positions(size[0], axis_x.increment, axis_x.offset)
        };
        return profile(x, z, description.metadata, steps).map(SurfaceContent::Profile);
    }
    if size[0] == 1 && !axis_x.absolute && !axis_y.absolute {
        let y = positions(size[1], axis_y.increment, axis_y.offset);
        steps.push(Step::new(
            "profile",
            "one column of heights: read as a profile along y",
        ));
        return profile(y, z, description.metadata, steps).map(SurfaceContent::Profile);
    }
    if !axis_x.absolute && !axis_y.absolute {
        if matches!(description.dimension, Dimension::List(_)) {
            return Err(MapProblem::NotAGrid {
                reason: "a list of points with neither positions nor a matrix".to_owned(),
            });
        }
        let mut map = HeightMap {
            size,
            spacing: [axis_x.increment.abs(), axis_y.increment.abs()],
            heights: z,
            metadata: description.metadata,
            steps,
        };
        turn_over(&mut map, [axis_x.increment < 0.0, axis_y.increment < 0.0]);
        return Ok(SurfaceContent::Map(map));
    }
    // Positions of an incremental axis beside an absolute one follow from the place in the matrix.
    let filled = |column: Vec<f64>, axis: usize| {
        if description.axes[axis].absolute {
            return column;
        }
        let (increment, offset) = (
            description.axes[axis].increment,
            description.axes[axis].offset,
        );
        let index = |point: usize| {
            if axis == 0 {
                point % size[0]
            } else {
                point / size[0]
            }
        };
        (0..z.len())
            .map(|point| offset + increment * index(point) as f64)
            .collect()
    };
    let (x, y) = (filled(x, 0), filled(y, 1));
    from_points([&x, &y, &z], &description.axes, description.metadata, steps)
}

/// A map (or a profile) from points with their positions.
fn from_points(
    columns: [&[f64]; 3],
    axes: &[Axis; 3],
    metadata: Vec<(String, String)>,
    mut steps: Vec<Step>,
) -> Result<SurfaceContent, MapProblem> {
    let rounding = [axes[0], axes[1]].map(|axis| match axis.number {
        StoredNumber::Float32 => f64::from(f32::EPSILON),
        _ => f64::EPSILON,
    });
    let grid = grid_of_points(columns, rounding)?;
    let text = format!(
        "{} points given one by one lie on a grid of {} x {} places, at most {} of the spacing off \
         theirs",
        columns[2].len(),
        grid.size[0],
        grid.size[1],
        format_significant(grid.largest_offset, 2)
    );
    steps
        .push(Step::new("grid", text).with(&[("largest_offset_in_spacings", grid.largest_offset)]));
    for (axis, other) in [(0, 1), (1, 0)] {
        if grid.size[other] == 1 {
            let at = positions(grid.size[axis], grid.spacing[axis], grid.origin[axis]);
            return profile(at, grid.heights, metadata, steps).map(SurfaceContent::Profile);
        }
    }
    Ok(SurfaceContent::Map(HeightMap {
        size: grid.size,
        spacing: grid.spacing,
        heights: grid.heights,
        metadata,
        steps,
    }))
}

fn positions(count: usize, increment: f64, offset: f64) -> Vec<f64> {
    (0..count)
        .map(|index| offset + increment * index as f64)
        .collect()
}

/// A profile with rising positions; points without a position are left out.
fn profile(
    x: Vec<f64>,
    z: Vec<f64>,
    metadata: Vec<(String, String)>,
    mut steps: Vec<Step>,
) -> Result<RawTrace, MapProblem> {
    let count = x.len();
    let (mut x, mut z): (Vec<f64>, Vec<f64>) =
        x.into_iter().zip(z).filter(|(x, _)| x.is_finite()).unzip();
    if x.len() < count {
        let text = format!("{} points without a position left out", count - x.len());
        steps.push(Step::new("positions", text));
    }
    if x.first() > x.last() {
        x.reverse();
        z.reverse();
        steps.push(Step::new(
            "positions",
            "positions fall along the file; turned round",
        ));
    }
    let stuck = x.windows(2).position(|pair| pair[0] >= pair[1]);
    if let Some(point) = stuck {
        return Err(MapProblem::PositionsNotRising { point: point + 2 });
    }
    Ok(RawTrace {
        profile: Profile { x, z },
        metadata,
        tip_radius: None,
        steps,
    })
}

/// Puts columns and rows in the order of rising x and y.
pub(super) fn turn_over(map: &mut HeightMap, falling: [bool; 2]) {
    let columns = map.size[0].max(1);
    if falling[0] {
        for row in map.heights.chunks_mut(columns) {
            row.reverse();
        }
        map.steps.push(Step::new(
            "order",
            "x falls along the file; columns turned round",
        ));
    }
    if falling[1] {
        let rows = map.heights.len() / columns;
        for low in 0..rows / 2 {
            let (head, tail) = map.heights.split_at_mut((rows - 1 - low) * columns);
            let lower = head.get_mut(low * columns..(low + 1) * columns);
            if let (Some(lower), Some(upper)) = (lower, tail.get_mut(..columns)) {
                lower.swap_with_slice(upper);
            }
        }
        let spacing = format_length(map.spacing[1]);
        map.steps.push(Step::new(
            "order",
            format!("y falls along the file; rows (every {spacing}) turned round"),
        ));
    }
}
