//! The stored numbers of an x3p file, from its binary files or its data list.

use std::fmt::Write as _;

use md5::{Digest, Md5};

use super::container::Container;
use super::file_defects::FileDefects;
use super::map_problem::MapProblem;
use super::x3p_description::{Axis, Description, Links, Points, shortened};

/// Coordinates of points in the unit of the file; the columns of incremental axes are empty.
#[derive(Debug, Clone, Default, PartialEq)]
pub(super) struct Columns {
    /// x, y and z.
    pub(super) axes: [Vec<f64>; 3],
    /// Points that the file of valid points or an empty datum marks as missing.
    pub(super) marked: usize,
}

/// Reads the numbers of `count` points.
pub(super) fn read_points(
    container: &mut Container,
    description: &Description,
    count: usize,
    defects: &mut FileDefects,
) -> Result<Columns, MapProblem> {
    match &description.points {
        Points::Listed(items) => listed(items, &description.axes, count),
        Points::Linked(links) => linked(container, links, &description.axes, count, defects),
    }
}

/// The numbers of a data list: the absolute axes, or all three, divided by semicolons.
fn listed(items: &[String], axes: &[Axis; 3], count: usize) -> Result<Columns, MapProblem> {
    check_count(items.len(), count)?;
    let absolute: Vec<usize> = stored_axes(axes);
    let mut columns = Columns::default();
    for item in items {
        let mut point = [f64::NAN; 3];
        if item.is_empty() {
            columns.marked += 1;
        } else {
            let fields: Vec<&str> = item.split(';').map(str::trim).collect();
            let bad = || MapProblem::ElementValue {
                element: "Datum".to_owned(),
                text: shortened(item),
                needed: "one number for each absolute axis",
            };
            let places: &[usize] = match fields.len() {
                length if length == absolute.len() => &absolute,
                3 => &[0, 1, 2],
                _ => return Err(bad()),
            };
            for (&place, field) in places.iter().zip(&fields) {
                let value: f64 = field.parse().map_err(|_| bad())?;
                if let Some(slot) = point.get_mut(place) {
                    *slot = value;
                }
            }
        }
        for &place in &absolute {
            columns.push(place, point[place], &axes[place]);
        }
    }
    Ok(columns)
}

/// The numbers of a binary file: one record a point, the absolute axes in the order x, y, z.
fn linked(
    container: &mut Container,
    links: &Links,
    axes: &[Axis; 3],
    count: usize,
    defects: &mut FileDefects,
) -> Result<Columns, MapProblem> {
    let at = container
        .find(&links.points, defects)
        .ok_or_else(|| MapProblem::EntryMissing {
            name: shortened(&links.points),
        })?;
    let stored = stored_axes(axes);
    let record: usize = stored.iter().map(|&axis| axes[axis].number.bytes()).sum();
    let mut columns = Columns::default();
    let mut hash = Md5::new();
    let mut rest: Vec<u8> = Vec::new();
    let mut points = 0;
    container.stream(at, u64::MAX, |chunk| {
        hash.update(chunk);
        // Records may lie across two chunks.
        let mut bytes = chunk;
        if !rest.is_empty() {
            let lacking = (record - rest.len()).min(bytes.len());
            let (head, tail) = bytes.split_at(lacking);
            rest.extend_from_slice(head);
            bytes = tail;
            if rest.len() < record {
                return true;
            }
            columns.push_records(&rest, record, &stored, axes);
            points += 1;
            rest.clear();
        }
        let whole = bytes.len() / record * record;
        let (records, left) = bytes.split_at(whole);
        points += whole / record;
        if points <= count {
            columns.push_records(records, record, &stored, axes);
        }
        rest.extend_from_slice(left);
        points <= count
    })?;
    if points == count && !rest.is_empty() {
        defects.note(format!(
            "{} bytes follow the last point in the file of points",
            rest.len()
        ));
    }
    if points > count {
        return Err(MapProblem::TooMany {
            found: points,
            expected: count,
            what: "points",
        });
    }
    check_count(points, count)?;
    check_md5(
        "points",
        links.points_md5.as_deref(),
        &hash.finalize(),
        defects,
    );
    if let Some(valid) = &links.valid {
        mark_missing(container, valid, links, count, &mut columns, defects)?;
    }
    Ok(columns)
}

/// Takes out the points that the file of valid points does not mark, lowest bit first as in the sample
/// files of the open reference library of the format.
fn mark_missing(
    container: &mut Container,
    link: &str,
    links: &Links,
    count: usize,
    columns: &mut Columns,
    defects: &mut FileDefects,
) -> Result<(), MapProblem> {
    let Some(at) = container.find(link, defects) else {
        defects.note(format!(
            "the file of valid points `{}` is not in the container; only points without a number \
             count as missing",
            shortened(link)
        ));
        return Ok(());
    };
    let bits = container.read_whole(at, u64::MAX)?;
    let needed = count.div_ceil(8);
    if bits.len() < needed {
        return Err(MapProblem::Truncated {
            found: bits.len(),
            expected: needed,
            what: "bytes in the file of valid points",
        });
    }
    check_md5(
        "valid points",
        links.valid_md5.as_deref(),
        &Md5::digest(&bits),
        defects,
    );
    for point in 0..count {
        let byte = bits.get(point / 8).copied().unwrap_or(0);
        if byte >> (point % 8) & 1 == 0 {
            columns.marked += 1;
            for column in &mut columns.axes {
                if let Some(slot) = column.get_mut(point) {
                    *slot = f64::NAN;
                }
            }
        }
    }
    Ok(())
}

impl Columns {
    /// Adds one stored number of an axis as a coordinate.
    fn push(&mut self, place: usize, value: f64, axis: &Axis) {
        if let Some(column) = self.axes.get_mut(place) {
            column.push(coordinate(value, axis));
        }
    }

    /// Adds whole records.
    fn push_records(&mut self, bytes: &[u8], record: usize, stored: &[usize], axes: &[Axis; 3]) {
        let mut start = 0;
        for &place in stored {
            let axis = &axes[place];
            let end = start + axis.number.bytes();
            let numbers = bytes.chunks_exact(record).map(|record| {
                let field = record.get(start..end).unwrap_or_default();
                coordinate(axis.number.decode(field), axis)
            });
            if let Some(column) = self.axes.get_mut(place) {
                column.extend(numbers);
            }
            start = end;
        }
    }
}

/// The coordinate of a stored number; NaN where it is not finite.
fn coordinate(value: f64, axis: &Axis) -> f64 {
    let coordinate = value * axis.increment + axis.offset;
    if coordinate.is_finite() {
        coordinate
    } else {
        f64::NAN
    }
}

/// Axes whose numbers are stored: the absolute ones. A z axis is stored whatever it is called.
fn stored_axes(axes: &[Axis; 3]) -> Vec<usize> {
    (0..3)
        .filter(|&place| place == 2 || axes[place].absolute)
        .collect()
}

fn check_count(found: usize, expected: usize) -> Result<(), MapProblem> {
    let what = "points";
    match found.cmp(&expected) {
        std::cmp::Ordering::Less => Err(MapProblem::Truncated {
            found,
            expected,
            what,
        }),
        std::cmp::Ordering::Greater => Err(MapProblem::TooMany {
            found,
            expected,
            what,
        }),
        std::cmp::Ordering::Equal => Ok(()),
    }
}

/// Notes a check sum that is absent or does not fit.
pub(super) fn check_md5(
    what: &str,
    stated: Option<&str>,
    digest: &[u8],
    defects: &mut FileDefects,
) {
    let mut actual = String::new();
    for byte in digest {
        // Writing to a String cannot fail.
        let _ = write!(actual, "{byte:02x}");
    }
    match stated.map(str::trim) {
        None | Some("") => defects.note(format!("the file states no MD5 check sum of its {what}")),
        Some(stated) if stated.eq_ignore_ascii_case(&actual) => {}
        Some(stated) => defects.note(format!(
            "the MD5 check sum of the {what} is {actual}, the file states {}: something was changed \
             after it was written",
            stated.chars().take(40).collect::<String>()
        )),
    }
}
