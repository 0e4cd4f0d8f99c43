//! Reading SDF files: ISO 25178-71 (versions 1.0 and 2.0) and its predecessor BCR, as text and binary.
//!
//! Three records: a header of keys, the heights row by row, and a trailer of free text. Keys, field widths
//! and codes of number types are from memory of the standard and agree with the open reader that the
//! comparison script in `.ci` runs. Heights are `number * Zscale`, positions `index * Xscale` and
//! `index * Yscale`, in metres.

use super::file_defects::FileDefects;
use super::map_problem::MapProblem;
use super::sdf_binary::read_binary;
use super::sdf_text::read_text;
use super::stored_number::StoredNumber;
use super::surface::{HeightMap, checked_points};
use super::surface_content::SurfaceContent;
use super::surface_format::sdf_magic;
use super::x3p::turn_over;
use super::x3p_description::shortened;
use crate::intake::step::Step;
use crate::intake::trace::{Profile, RawTrace};
use crate::units::format_significant;

/// Version of the format.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum SdfVersion {
    Iso1,
    Iso2,
    Bcr,
}

impl SdfVersion {
    /// Number types that the version lists.
    fn lists(self, number: StoredNumber) -> bool {
        match self {
            Self::Bcr => true,
            Self::Iso2 => !matches!(
                number,
                StoredNumber::Unsigned8 | StoredNumber::Unsigned16 | StoredNumber::Unsigned32
            ),
            Self::Iso1 => matches!(
                number,
                StoredNumber::Signed16 | StoredNumber::Signed32 | StoredNumber::Float64
            ),
        }
    }

    fn name(self) -> &'static str {
        match self {
            Self::Iso1 => "ISO-1.0",
            Self::Iso2 => "ISO-2.0",
            Self::Bcr => "BCR-1.0",
        }
    }
}

/// What the header says.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct SdfHeader {
    pub(super) version: SdfVersion,
    pub(super) along_x: u64,
    pub(super) along_y: u64,
    /// Xscale, Yscale, Zscale.
    pub(super) scales: [f64; 3],
    pub(super) number: StoredNumber,
    pub(super) metadata: Vec<(String, String)>,
}

impl SdfHeader {
    /// Number of points within the limit.
    pub(super) fn points(&self) -> Result<usize, MapProblem> {
        checked_points(self.along_x, self.along_y)
    }
}

/// Heights as stored, with what follows them.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct SdfRecords {
    pub(super) header: SdfHeader,
    /// Stored numbers; NaN where the file has a word for a missing point.
    pub(super) numbers: Vec<f64>,
    pub(super) trailer: String,
    pub(super) is_text: bool,
}

/// Reads an SDF file; lengths come out in the unit of the file.
pub(super) fn read_sdf(
    bytes: &[u8],
    defects: &mut FileDefects,
) -> Result<SurfaceContent, MapProblem> {
    let unknown = || {
        let begin = bytes.get(..bytes.len().min(8)).unwrap_or_default();
        MapProblem::SdfVersion {
            magic: String::from_utf8_lossy(begin).into_owned(),
        }
    };
    let (magic, end) = sdf_magic(bytes).ok_or_else(unknown)?;
    let version = match magic.to_ascii_uppercase().get(1..) {
        Some("ISO-1.0") => SdfVersion::Iso1,
        Some("ISO-2.0") => SdfVersion::Iso2,
        Some("BCR-1.0") => SdfVersion::Bcr,
        _ => return Err(unknown()),
    };
    let is_text = magic.starts_with(['a', 'A']);
    if version != SdfVersion::Bcr && !magic.starts_with(['a', 'b']) {
        defects.note(format!(
            "the file begins with `{magic}`; the standard has a small letter"
        ));
    }
    if end != magic.len() {
        defects.note(format!(
            "blanks or a byte order mark stand before `{magic}`"
        ));
    }
    let rest = bytes.get(end..).unwrap_or_default();
    let records = if is_text {
        read_text(rest, version, defects)?
    } else {
        read_binary(rest, version, defects)?
    };
    arrange(records, defects)
}

/// The number type of a code.
pub(super) fn number_type(code: &str, version: SdfVersion) -> Option<StoredNumber> {
    use StoredNumber as N;
    let by_code = match code {
        "0" => N::Unsigned8,
        "1" => N::Unsigned16,
        "2" => N::Unsigned32,
        "3" => N::Float32,
        "4" => N::Signed8,
        "5" => N::Signed16,
        "6" => N::Signed32,
        "7" => N::Float64,
        _ if version == SdfVersion::Bcr => match code.to_ascii_uppercase().as_str() {
            "UCHAR" => N::Unsigned8,
            "UINTEGER" => N::Unsigned16,
            "ULONGINT" => N::Unsigned32,
            "FLOAT" => N::Float32,
            "CHAR" => N::Signed8,
            "INTEGER" => N::Signed16,
            "LONGINT" => N::Signed32,
            "DOUBLE" => N::Float64,
            _ => return None,
        },
        _ => return None,
    };
    Some(by_code)
}

/// Scales heights, takes missing points out and puts rows in order.
fn arrange(records: SdfRecords, defects: &mut FileDefects) -> Result<SurfaceContent, MapProblem> {
    let SdfRecords {
        header,
        mut numbers,
        trailer,
        is_text,
    } = records;
    if !header.version.lists(header.number) {
        defects.note(format!(
            "{} does not list heights as {}; read all the same",
            header.version.name(),
            header.number.name()
        ));
    }
    let [x_scale, y_scale, z_scale] = header.scales;
    if !z_scale.is_finite() || z_scale == 0.0 {
        return Err(MapProblem::HeaderValue {
            key: "Zscale".to_owned(),
            text: z_scale.to_string(),
            needed: "a finite number other than zero",
        });
    }
    let (named, reserved, rule) = take_out_missing(&mut numbers, &header, z_scale);
    let mut steps = vec![
        Step::new(
            "storage",
            format!(
                "SDF {} {}: {} x {} heights as {}, times Zscale {}; missing points: {named} without a \
                 number, {reserved} with {rule}",
                header.version.name(),
                if is_text { "as text" } else { "binary" },
                header.along_x,
                header.along_y,
                header.number.name(),
                format_significant(z_scale, 6),
            ),
        )
        .with(&[
            ("points", numbers.len() as f64),
            ("missing", (named + reserved) as f64),
            ("height_increment", z_scale),
        ]),
    ];
    if is_text && header.version != SdfVersion::Bcr && reserved > 0 {
        defects.note(format!(
            "{reserved} heights are {}, which the standard keeps for missing points; text has `BAD` for \
             them; taken as missing",
            header.number.lowest()
        ));
    }
    let mut metadata = header.metadata;
    metadata.extend(trailer_fields(&trailer));
    let mut map = HeightMap {
        size: [header.along_x as usize, header.along_y as usize],
        spacing: [x_scale.abs(), y_scale.abs()],
        heights: numbers,
        metadata,
        steps: Vec::new(),
    };
    if header.version == SdfVersion::Bcr && map.size[1] > 1 {
        steps.push(Step::new(
            "order",
            "BCR-1.0 does not say where its first row lies; taken as the row of largest y (common \
             practice, no source), so rows were turned round: wrong, it would only mirror the map",
        ));
        let columns = map.size[0].max(1);
        reverse_rows(&mut map.heights, columns);
    }
    map.steps = steps;
    turn_over(&mut map, [x_scale < 0.0, y_scale < 0.0]);
    Ok(as_profile(map))
}

/// Reverses the order of rows.
fn reverse_rows(heights: &mut [f64], columns: usize) {
    heights.reverse();
    for row in heights.chunks_mut(columns) {
        row.reverse();
    }
}

/// Scales stored numbers and makes missing ones NaN: how many had no number, how many the reserved one,
/// and which that is.
fn take_out_missing(
    numbers: &mut [f64],
    header: &SdfHeader,
    z_scale: f64,
) -> (usize, usize, String) {
    let number = header.number;
    // The nominal maxima of BCR lie slightly below the largest floating point numbers.
    let (reserved_from, reserved_to, rule) = match (header.version, number) {
        (SdfVersion::Bcr, StoredNumber::Float32) => (3.4e38, f64::INFINITY, "3.4e38 or more"),
        (SdfVersion::Bcr, StoredNumber::Float64) => (1.7e308, f64::INFINITY, "1.7e308 or more"),
        (SdfVersion::Bcr, _) => (number.highest(), number.highest(), "the highest number"),
        _ => (number.lowest(), number.lowest(), "the lowest number"),
    };
    // The unsigned types have no lowest number to spare.
    let unsigned = number.is_integer() && number.lowest() == 0.0;
    let has_reserved = header.version == SdfVersion::Bcr || !unsigned;
    let (mut named, mut reserved) = (0, 0);
    for value in numbers {
        if has_reserved && (reserved_from..=reserved_to).contains(value) {
            reserved += 1;
            *value = f64::NAN;
        } else {
            *value *= z_scale;
            if !value.is_finite() {
                named += 1;
                *value = f64::NAN;
            }
        }
    }
    let rule = if number.is_integer() && has_reserved {
        format!("{rule} of the type ({reserved_from})")
    } else if has_reserved {
        format!("{rule} of the type")
    } else {
        "a reserved number (the type has none)".to_owned()
    };
    (named, reserved, rule)
}

/// One row or one column becomes a profile.
fn as_profile(mut map: HeightMap) -> SurfaceContent {
    let axis = match map.size {
        [_, 1] => 0,
        [1, _] => 1,
        _ => return SurfaceContent::Map(map),
    };
    if axis == 1 {
        map.steps.push(Step::new(
            "profile",
            "one column of heights: read as a profile along y",
        ));
    }
    let spacing = map.spacing[axis];
    let x = (0..map.heights.len()).map(|at| at as f64 * spacing);
    SurfaceContent::Profile(RawTrace {
        profile: Profile {
            x: x.collect(),
            z: map.heights,
        },
        metadata: map.metadata,
        tip_radius: None,
        steps: map.steps,
    })
}

/// Fields of a trailer: `< Name > value < / Name >` or `Name = value`, and other lines as they are.
fn trailer_fields(trailer: &str) -> Vec<(String, String)> {
    let mut fields = Vec::new();
    for line in trailer.lines().map(str::trim) {
        if line.is_empty() || fields.len() >= 500 {
            continue;
        }
        let tag = line.strip_prefix('<').and_then(|rest| rest.split_once('>'));
        let (key, value) = match (tag, line.split_once('=')) {
            (Some((name, rest)), _) => {
                let value = rest.rsplit_once('<').map_or(rest, |(value, _)| value);
                (name, value)
            }
            (None, Some((name, value))) => (name, value),
            (None, None) => ("trailer", line),
        };
        fields.push((shortened(key.trim()), shortened(value.trim())));
    }
    fields
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn fields_of_a_trailer_in_three_forms() {
        let text =
            "< Operator > A. N. Other < / Operator >\r\n<Part>p</Part>\nSite = 3\nfree words\n";
        let fields = trailer_fields(text);
        let fields: Vec<(&str, &str)> = fields
            .iter()
            .map(|(key, value)| (key.as_str(), value.as_str()))
            .collect();
        assert_eq!(
            fields,
            [
                ("Operator", "A. N. Other"),
                ("Part", "p"),
                ("Site", "3"),
                ("trailer", "free words")
            ]
        );
    }
}
