//! SDF as text: `key = value` lines, `*`, heights, `*`, a trailer, `*`.

use super::file_defects::FileDefects;
use super::map_problem::MapProblem;
use super::sdf::{SdfHeader, SdfRecords, SdfVersion, number_type};
use super::sdf_binary::check_codes;
use super::stored_number::StoredNumber;
use super::x3p_description::shortened;

/// Most lines of a header.
const MOST_HEADER_LINES: usize = 1000;
/// Longest trailer that is kept, bytes.
const LONGEST_TRAILER: usize = 1 << 20;
/// Keys as the standard spells them.
const KEYS: [&str; 12] = [
    "ManufacID",
    "CreateDate",
    "ModDate",
    "NumPoints",
    "NumProfiles",
    "Xscale",
    "Yscale",
    "Zscale",
    "Zresolution",
    "Compression",
    "DataType",
    "CheckType",
];

/// Lines of a text with any mix of line ends, their numbers counted on from the file's first line.
struct Lines<'a> {
    rest: &'a str,
    number: usize,
}

impl<'a> Lines<'a> {
    fn next(&mut self) -> Option<&'a str> {
        if self.rest.is_empty() {
            return None;
        }
        self.number += 1;
        let end = self.rest.find(['\n', '\r']).unwrap_or(self.rest.len());
        let (line, tail) = self.rest.split_at_checked(end)?;
        self.rest = tail
            .strip_prefix("\r\n")
            .or_else(|| tail.strip_prefix(['\n', '\r']))
            .unwrap_or(tail);
        Some(line)
    }
}

/// Reads what follows the first word.
pub(super) fn read_text(
    bytes: &[u8],
    version: SdfVersion,
    defects: &mut FileDefects,
) -> Result<SdfRecords, MapProblem> {
    let text = String::from_utf8_lossy(bytes);
    let mut lines = Lines {
        rest: &text,
        number: 0,
    };
    let after_magic = lines.next().unwrap_or("");
    let comment = version == SdfVersion::Bcr && after_magic.trim_start().starts_with(';');
    if !after_magic.trim().is_empty() && !comment {
        return Err(MapProblem::HeaderLine {
            line: 1,
            text: shortened(after_magic.trim()),
        });
    }
    let fields = header_fields(&mut lines, version, defects)?;
    let header = header(fields, version, defects)?;
    let points = header.points()?;
    let (numbers, found, closed) = heights(&mut lines, &header, points)?;
    if found < points {
        return Err(MapProblem::Truncated {
            found,
            expected: points,
            what: "heights",
        });
    }
    if found > points {
        return Err(MapProblem::TooMany {
            found,
            expected: points,
            what: "heights",
        });
    }
    if !closed {
        defects.note("no line with `*` ends the heights");
    }
    let broken = numbers
        .iter()
        .filter(|z| z.is_finite() && z.fract() != 0.0)
        .count();
    if header.number.is_integer() && broken > 0 {
        defects.note(format!(
            "{broken} heights have fractions although DataType says {}; taken as written",
            header.number.name()
        ));
    }
    Ok(SdfRecords {
        header,
        numbers,
        trailer: trailer(&mut lines, defects),
        is_text: true,
    })
}

/// Whether a line is the star that ends a record.
fn is_star(line: &str) -> bool {
    line.trim() == "*"
}

/// A line without its comment; only BCR has comments.
fn without_comment(line: &str, version: SdfVersion) -> &str {
    if version == SdfVersion::Bcr {
        line.split(';').next().unwrap_or(line)
    } else {
        line
    }
}

/// Keys and values up to the first star; known keys in the spelling of the standard.
fn header_fields(
    lines: &mut Lines,
    version: SdfVersion,
    defects: &mut FileDefects,
) -> Result<Vec<(String, String)>, MapProblem> {
    let mut fields: Vec<(String, String)> = Vec::new();
    loop {
        let Some(line) = lines.next() else {
            return Err(MapProblem::Truncated {
                found: fields.len(),
                expected: KEYS.len(),
                what: "lines of the header, and no `*` ends it",
            });
        };
        let line = without_comment(line, version).trim();
        if is_star(line) {
            return Ok(fields);
        }
        if line.is_empty() {
            continue;
        }
        let bad_line = || MapProblem::HeaderLine {
            line: lines.number,
            text: shortened(line),
        };
        if fields.len() >= MOST_HEADER_LINES {
            return Err(bad_line());
        }
        let (key, value) = if let Some(pair) = line.split_once('=') {
            pair
        } else {
            let pair = line
                .split_once(':')
                .or_else(|| line.split_once(char::is_whitespace))
                .filter(|(key, _)| known_key(key).is_some())
                .ok_or_else(bad_line)?;
            defects.note(format!(
                "line {} of the header has no `=` between key and value",
                lines.number
            ));
            pair
        };
        let key = known_key(key).map_or_else(|| shortened(key.trim()), str::to_owned);
        if fields.iter().any(|(earlier, _)| *earlier == key) && KEYS.contains(&key.as_str()) {
            defects.note(format!("`{key}` is in the header twice; the first counts"));
            continue;
        }
        fields.push((key, shortened(value.trim())));
    }
}

/// The standard's spelling of a key, whatever its case and blanks.
fn known_key(key: &str) -> Option<&'static str> {
    let bare: String = key.chars().filter(|c| c.is_alphanumeric()).collect();
    KEYS.into_iter()
        .find(|known| known.eq_ignore_ascii_case(&bare))
}

fn header(
    fields: Vec<(String, String)>,
    version: SdfVersion,
    defects: &mut FileDefects,
) -> Result<SdfHeader, MapProblem> {
    let value = |key: &'static str| {
        let found = fields.iter().find(|(name, _)| name == key);
        found.map(|(_, value)| value.as_str())
    };
    let needed = |key: &'static str| value(key).ok_or(MapProblem::HeaderKeyMissing { key });
    let bad = |key: &str, text: &str, needed: &'static str| MapProblem::HeaderValue {
        key: key.to_owned(),
        text: text.to_owned(),
        needed,
    };
    let count = |key: &'static str| {
        let text = needed(key)?;
        text.parse().map_err(|_| bad(key, text, "a whole number"))
    };
    let scale = |key: &'static str| {
        let text = needed(key)?;
        let number = text.parse::<f64>().ok().filter(|v| v.is_finite());
        number.ok_or_else(|| bad(key, text, "a finite number with a decimal point"))
    };
    let code = |key: &'static str, defects: &mut FileDefects| match value(key) {
        Some(text) if version == SdfVersion::Bcr => {
            let none = text.eq_ignore_ascii_case("null") || text.eq_ignore_ascii_case("none");
            if none { "0" } else { text }.to_owned()
        }
        Some(text) => text.to_owned(),
        None => {
            defects.note(format!("the header has no `{key}`; taken as 0"));
            "0".to_owned()
        }
    };
    check_codes(&code("Compression", defects), &code("CheckType", defects))?;
    let number = if let Some(text) = value("DataType") {
        number_type(text, version).ok_or_else(|| bad("DataType", text, "a code from 0 to 7"))?
    } else {
        defects.note("the header has no `DataType`; numbers are taken as written");
        StoredNumber::Float64
    };
    let (along_x, along_y) = (count("NumPoints")?, count("NumProfiles")?);
    let scales = [scale("Xscale")?, scale("Yscale")?, scale("Zscale")?];
    Ok(SdfHeader {
        version,
        along_x,
        along_y,
        scales,
        number,
        metadata: fields
            .into_iter()
            .filter(|(key, _)| is_metadata(key))
            .collect(),
    })
}

/// Keys that are kept for people; the others are in the map itself.
fn is_metadata(key: &str) -> bool {
    !KEYS.contains(&key) || ["ManufacID", "CreateDate", "ModDate", "Zresolution"].contains(&key)
}

/// Numbers up to the next star: at most `points` of them, how many there are, and whether a star came.
fn heights(
    lines: &mut Lines,
    header: &SdfHeader,
    points: usize,
) -> Result<(Vec<f64>, usize, bool), MapProblem> {
    let mut numbers = Vec::with_capacity(points.min(lines.rest.len() / 2 + 1));
    let mut found = 0;
    while let Some(line) = lines.next() {
        let mut line = without_comment(line, header.version).trim();
        let star = line.ends_with('*');
        if star {
            line = line.trim_end_matches('*');
        }
        for token in line.split_ascii_whitespace() {
            let number = if token.eq_ignore_ascii_case("BAD") {
                f64::NAN
            } else {
                token.parse().map_err(|_| MapProblem::NotAHeight {
                    line: lines.number,
                    text: token.chars().take(40).collect(),
                })?
            };
            found += 1;
            if found <= points {
                numbers.push(number);
            }
        }
        if star {
            return Ok((numbers, found, true));
        }
    }
    Ok((numbers, found, false))
}

/// The trailer up to its star; text behind that is named.
fn trailer(lines: &mut Lines, defects: &mut FileDefects) -> String {
    let mut trailer = String::new();
    while let Some(line) = lines.next() {
        if is_star(line) {
            let after = lines
                .rest
                .trim_matches(|c: char| c.is_whitespace() || c == '\0');
            if !after.is_empty() {
                defects.note(format!(
                    "{} characters follow the end of the trailer; passed over",
                    after.chars().count()
                ));
            }
            return trailer;
        }
        if trailer.len() + line.len() > LONGEST_TRAILER {
            defects.note("the trailer is longer than 1 MiB; the rest was passed over");
            return trailer;
        }
        trailer.push_str(line);
        trailer.push('\n');
    }
    trailer
}
