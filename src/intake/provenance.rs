//! Where a section came from: file, hash, kind, size, so that a result can be traced.

use std::fmt::Write as _;

use sha2::{Digest, Sha256};

/// The kinds of file a section is read from.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
#[non_exhaustive]
pub enum SectionKind {
    /// A section file (TOML).
    SectionFile,
    /// An outline in columns of text.
    OutlineText,
    /// An SVG drawing.
    OutlineSvg,
    /// A trace of a profilometer.
    Trace,
    /// A height map.
    HeightMap,
    /// A picture of a section.
    Micrograph,
}

impl SectionKind {
    /// Every kind, in the order of the help text.
    pub const ALL: [Self; 6] = [
        Self::SectionFile,
        Self::OutlineText,
        Self::OutlineSvg,
        Self::Trace,
        Self::HeightMap,
        Self::Micrograph,
    ];

    /// The word for it on the command line and in outputs.
    pub fn word(self) -> &'static str {
        match self {
            Self::SectionFile => "section",
            Self::OutlineText => "outline",
            Self::OutlineSvg => "svg",
            Self::Trace => "trace",
            Self::HeightMap => "map",
            Self::Micrograph => "image",
        }
    }

    /// The kind with this word.
    pub fn from_word(word: &str) -> Option<Self> {
        Self::ALL.into_iter().find(|kind| kind.word() == word)
    }
}

impl std::fmt::Display for SectionKind {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str(self.word())
    }
}

/// Where a section came from.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Provenance {
    /// Path as given, or `standard input`.
    pub path: String,
    /// SHA-256 of the bytes, 64 lower-case hexadecimal digits.
    pub sha256: String,
    /// What the content was read as.
    pub kind: SectionKind,
    /// Size of the file, bytes.
    pub bytes: u64,
    /// Encoding of the text: `UTF-8`, `UTF-16LE`, `UTF-16BE` or `Latin-1`; `binary`
    /// for files that are not plain text.
    pub encoding: &'static str,
    /// What a reader should know about how it was read.
    pub notes: Vec<String>,
}

/// SHA-256 in lower-case hexadecimal.
pub(crate) fn sha256_hex(bytes: &[u8]) -> String {
    let mut hex = String::with_capacity(64);
    for byte in Sha256::digest(bytes) {
        // Writing to a String cannot fail.
        let _ = write!(hex, "{byte:02x}");
    }
    hex
}

#[cfg(test)]
mod tests {
    use super::*;

    /// FIPS 180-4 example: the hash of "abc" (value from memory of the published example).
    #[test]
    fn the_hash_of_abc() {
        assert_eq!(
            sha256_hex(b"abc"),
            "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"
        );
    }

    #[test]
    fn words_name_kinds() {
        for kind in SectionKind::ALL {
            assert_eq!(SectionKind::from_word(kind.word()), Some(kind));
        }
        assert_eq!(SectionKind::from_word("picture"), None);
    }
}
