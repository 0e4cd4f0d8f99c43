//! The bytes of a file and their text: reading within the limits, decoding, and places in the text.
//!
//! Encodings: UTF-8 and UTF-16 by their byte order marks, then UTF-8, then Latin-1. A line ends with LF,
//! CR LF, CR CR LF or a lone CR.

use std::fs::File;
use std::io::Read;
use std::path::Path;

use super::limits::{MAX_FILE_BYTES, check_file_size};
use super::read_error::{Place, ReadProblem};

/// Longest excerpt of a line shown with an error, characters.
const EXCERPT_CHARACTERS: usize = 76;

/// Bytes of a file, or of standard input for `-`, at most [`MAX_FILE_BYTES`].
pub(crate) fn read_bytes(path: &Path) -> Result<Vec<u8>, ReadProblem> {
    if path == Path::new("-") {
        return read_capped(std::io::stdin().lock());
    }
    let metadata = std::fs::metadata(path).map_err(|error| from_io(&error))?;
    if metadata.is_dir() {
        return Err(ReadProblem::IsFolder);
    }
    check_file_size(metadata.len(), MAX_FILE_BYTES)?;
    read_capped(File::open(path).map_err(|error| from_io(&error))?)
}

/// Reads to the end, but never past the limit (pipes and devices have no size to check first).
fn read_capped(input: impl Read) -> Result<Vec<u8>, ReadProblem> {
    let mut bytes = Vec::new();
    input
        .take(MAX_FILE_BYTES + 1)
        .read_to_end(&mut bytes)
        .map_err(|error| from_io(&error))?;
    check_file_size(bytes.len() as u64, MAX_FILE_BYTES)?;
    Ok(bytes)
}

fn from_io(error: &std::io::Error) -> ReadProblem {
    if error.kind() == std::io::ErrorKind::NotFound {
        ReadProblem::NotFound
    } else {
        ReadProblem::Io {
            reason: error.to_string(),
        }
    }
}

/// Text with the encoding it was decoded from, without its byte order mark.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(crate) struct SourceText {
    /// The text.
    pub(crate) text: String,
    /// Name of the encoding.
    pub(crate) encoding: &'static str,
}

impl SourceText {
    /// Decodes bytes.
    pub(crate) fn decode(bytes: Vec<u8>) -> Result<Self, ReadProblem> {
        if let Some(body) = bytes.strip_prefix(&[0xff, 0xfe]) {
            return Self::utf16(body, u16::from_le_bytes, "UTF-16LE");
        }
        if let Some(body) = bytes.strip_prefix(&[0xfe, 0xff]) {
            return Self::utf16(body, u16::from_be_bytes, "UTF-16BE");
        }
        if bytes.contains(&0) {
            return Err(ReadProblem::Binary);
        }
        let (text, encoding) = match String::from_utf8(bytes) {
            Ok(text) => (text, "UTF-8"),
            Err(error) => {
                let latin = error.into_bytes();
                (latin.iter().map(|&b| char::from(b)).collect(), "Latin-1")
            }
        };
        let text = match text.strip_prefix('\u{feff}') {
            Some(rest) => rest.to_owned(),
            None => text,
        };
        Ok(Self { text, encoding })
    }

    fn utf16(
        body: &[u8],
        word: fn([u8; 2]) -> u16,
        encoding: &'static str,
    ) -> Result<Self, ReadProblem> {
        let (pairs, odd) = body.as_chunks::<2>();
        let words: Vec<u16> = pairs.iter().map(|&pair| word(pair)).collect();
        let text = String::from_utf16(&words)
            .ok()
            .filter(|text| odd.is_empty() && !text.contains('\0'))
            .ok_or(ReadProblem::BrokenEncoding { encoding })?;
        Ok(Self { text, encoding })
    }
}

/// End of the line that starts at byte `start`, and start of the next line.
pub(crate) fn line_end(text: &str, start: usize) -> (usize, usize) {
    let bytes = text.as_bytes();
    let rest = bytes.get(start..).unwrap_or_default();
    let Some(length) = rest.iter().position(|b| matches!(b, b'\n' | b'\r')) else {
        return (bytes.len(), bytes.len());
    };
    let end = start + length;
    let next = match bytes.get(end..).unwrap_or_default() {
        [b'\r', b'\r', b'\n', ..] => end + 3,
        [b'\r', b'\n', ..] => end + 2,
        _ => end + 1,
    };
    (end, next)
}

/// The place of a byte offset in a text, with the line as an excerpt.
pub(crate) fn place_at(text: &str, offset: usize) -> Place {
    let (mut line, mut start) = (1, 0);
    let (mut end, mut next) = line_end(text, 0);
    while next <= offset && next < text.len() {
        line += 1;
        start = next;
        (end, next) = line_end(text, start);
    }
    let content = text.get(start..end).unwrap_or_default();
    let before = text
        .get(start..offset.clamp(start, end))
        .unwrap_or_default();
    let column = before.chars().count();
    let skipped = (column + 12).saturating_sub(EXCERPT_CHARACTERS);
    let excerpt: String = content
        .chars()
        .skip(skipped)
        .take(EXCERPT_CHARACTERS)
        .map(|c| if c.is_control() { ' ' } else { c })
        .collect();
    Place {
        line,
        column: column + 1,
        field: None,
        excerpt,
        caret: column - skipped,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn encodings_are_told_apart() {
        let decode = |bytes: &[u8]| SourceText::decode(bytes.to_vec());
        assert_eq!(decode(b"\xef\xbb\xbfx").unwrap().text, "x");
        let latin = decode(b"x [\xb5m]").unwrap();
        assert_eq!(
            (latin.text.as_str(), latin.encoding),
            ("x [\u{b5}m]", "Latin-1")
        );
        let little = decode(&[0xff, 0xfe, b'x', 0, 0xb5, 0]).unwrap();
        assert_eq!(
            (little.text.as_str(), little.encoding),
            ("x\u{b5}", "UTF-16LE")
        );
        let big = decode(&[0xfe, 0xff, 0, b'x']).unwrap();
        assert_eq!((big.text.as_str(), big.encoding), ("x", "UTF-16BE"));
        assert_eq!(decode(b"a\0b"), Err(ReadProblem::Binary));
        assert!(matches!(
            decode(&[0xff, 0xfe, b'x']),
            Err(ReadProblem::BrokenEncoding { .. })
        ));
    }

    #[test]
    fn every_line_end_counts_once() {
        let text = "a\nb\r\nc\r\r\nd\re";
        for (letter, line) in [('a', 1), ('b', 2), ('c', 3), ('d', 4), ('e', 5)] {
            let place = place_at(text, text.find(letter).unwrap());
            assert_eq!((place.line, place.column), (line, 1), "{letter}");
            assert_eq!(place.excerpt, letter.to_string());
        }
    }

    #[test]
    fn a_long_line_is_shown_around_the_place() {
        let text = format!("{}!{}", "\u{b5}".repeat(500), "y".repeat(500));
        let place = place_at(&text, text.find('!').unwrap());
        assert_eq!(place.column, 501);
        assert_eq!(place.excerpt.chars().nth(place.caret), Some('!'));
        assert!(place.excerpt.chars().count() <= EXCERPT_CHARACTERS);
    }
}
