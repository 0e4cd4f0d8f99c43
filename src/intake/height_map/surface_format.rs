//! Which kind of surface file it is, by its content.

use super::container::holds_main_xml;

/// How a zip archive with entries begins.
const ZIP_MAGIC: &[u8] = b"PK\x03\x04";
/// Length of the first word of an SDF file.
const SDF_MAGIC_BYTES: usize = 8;

/// A kind of surface file.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
#[non_exhaustive]
pub enum SurfaceFormat {
    /// ISO 25178-72: a zip container with `main.xml`.
    X3p,
    /// ISO 25178-71 and its predecessor BCR, as text or binary.
    Sdf,
}

impl SurfaceFormat {
    /// The word for it in outputs.
    pub fn word(self) -> &'static str {
        match self {
            Self::X3p => "x3p",
            Self::Sdf => "sdf",
        }
    }
}

/// The kind of surface file, by content; `None` where it is none.
///
/// An x3p file is a zip archive with a `main.xml` in it (or, where the end of the archive is missing, with
/// that name somewhere in its bytes, so that reading can tell what is wrong). An SDF file begins with
/// `aISO-1.0`, `bISO-1.0`, `aISO-2.0`, `bISO-2.0`, `aBCR-1.0` or `bBCR-1.0`; other version numbers are
/// recognised here and refused by the reader.
///
/// # Examples
/// ```
/// use etchwise::intake::{SurfaceFormat, surface_format};
/// assert_eq!(surface_format(b"aISO-1.0\r\n"), Some(SurfaceFormat::Sdf));
/// assert_eq!(surface_format(b"x_um,z_um\n"), None);
/// ```
pub fn surface_format(bytes: &[u8]) -> Option<SurfaceFormat> {
    if bytes.starts_with(ZIP_MAGIC) {
        let x3p = holds_main_xml(bytes).unwrap_or_else(|| {
            bytes
                .windows(b"main.xml".len())
                .any(|part| part.eq_ignore_ascii_case(b"main.xml"))
        });
        return x3p.then_some(SurfaceFormat::X3p);
    }
    sdf_magic(bytes).map(|_| SurfaceFormat::Sdf)
}

/// The first word of an SDF file and the place behind it.
pub(super) fn sdf_magic(bytes: &[u8]) -> Option<(&str, usize)> {
    let start = if bytes.starts_with(b"\xef\xbb\xbf") {
        3
    } else {
        bytes.iter().take_while(|b| b.is_ascii_whitespace()).count()
    };
    let word = bytes.get(start..start + SDF_MAGIC_BYTES)?;
    let [form, family @ .., dash, major, point, minor] = word else {
        return None;
    };
    let fits = matches!(form.to_ascii_lowercase(), b'a' | b'b')
        && (family.eq_ignore_ascii_case(b"ISO") || family.eq_ignore_ascii_case(b"BCR"))
        && *dash == b'-'
        && major.is_ascii_digit()
        && *point == b'.'
        && minor.is_ascii_digit();
    let word = std::str::from_utf8(word).ok().filter(|_| fits)?;
    Some((word, start + SDF_MAGIC_BYTES))
}
