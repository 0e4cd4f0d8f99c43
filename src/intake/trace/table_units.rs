//! Units of length as they stand in the column lines and headers of instruments.
//!
//! Besides the names of [`crate::units`]: full names with capitals and in other languages, and `kA`
//! (1000 angstrom, 1e-7 m), which older instruments write for heights.

use crate::units::{UnitScale, length_scale};

/// Full names in several languages, lower case, each with the unit it stands for.
const FULL_NAMES: [(&str, &str); 36] = [
    ("metre", "m"),
    ("metres", "m"),
    ("meter", "m"),
    ("meters", "m"),
    ("metro", "m"),
    ("metros", "m"),
    ("centimetre", "cm"),
    ("centimeter", "cm"),
    ("zentimeter", "cm"),
    ("millimetro", "mm"),
    ("mil\u{ed}metro", "mm"),
    ("mil\u{ed}metros", "mm"),
    ("millim\u{e8}tre", "mm"),
    ("millim\u{e8}tres", "mm"),
    ("\u{30df}\u{30ea}\u{30e1}\u{30fc}\u{30c8}\u{30eb}", "mm"),
    ("mikrometer", "um"),
    ("mikrometern", "um"),
    ("mikron", "um"),
    ("microm\u{e8}tre", "um"),
    ("microm\u{e8}tres", "um"),
    ("micr\u{f3}metro", "um"),
    ("micr\u{f3}metros", "um"),
    ("micra", "um"),
    ("micras", "um"),
    (
        "\u{30de}\u{30a4}\u{30af}\u{30ed}\u{30e1}\u{30fc}\u{30c8}\u{30eb}",
        "um",
    ),
    ("\u{30df}\u{30af}\u{30ed}\u{30f3}", "um"),
    ("\u{339b}", "um"),
    ("\u{339c}", "um"),
    ("nanom\u{e8}tre", "nm"),
    ("nanom\u{e8}tres", "nm"),
    ("nan\u{f3}metro", "nm"),
    ("nan\u{f3}metros", "nm"),
    ("\u{30ca}\u{30ce}\u{30e1}\u{30fc}\u{30c8}\u{30eb}", "nm"),
    ("\u{339a}", "nm"),
    ("\u{e5}ngstr\u{f6}m", "A"),
    ("\u{e5}ngstrom", "A"),
];

/// Metres in 1000 angstrom.
const KILOANGSTROM_METRES: f64 = 1e-7;
/// Units of other quantities that stand in column lines.
const OTHER_QUANTITIES: [&str; 19] = [
    "s", "sec", "ms", "min", "V", "mV", "N", "mN", "uN", "\u{b5}N", "mg", "g", "deg", "\u{b0}",
    "rad", "%", "C", "\u{b0}C", "Hz",
];
/// Longest word that may be a unit, bytes.
const LONGEST_UNIT: usize = 32;

/// The unit written with a column or a value.
#[derive(Debug, Clone, PartialEq)]
pub(crate) enum WrittenUnit<'a> {
    /// There is none.
    None,
    /// A unit of length.
    Length(&'a str, UnitScale),
    /// A character of it was destroyed.
    Destroyed(&'a str),
    /// A unit of another quantity.
    OtherQuantity(&'a str),
    /// Something between brackets that is no unit known here.
    Unknown(&'a str),
}

/// The scale of a unit of length in any spelling of instruments.
pub(crate) fn instrument_length(word: &str) -> Option<UnitScale> {
    let word = word.trim();
    if word.is_empty() || word.len() > LONGEST_UNIT {
        return None;
    }
    if matches!(word, "kA" | "k\u{c5}" | "k\u{212b}") {
        return Some(UnitScale::from_factor(KILOANGSTROM_METRES));
    }
    if let Some(scale) = length_scale(word) {
        return Some(scale);
    }
    let lower = word.to_lowercase();
    if lower.chars().count() < 4 && lower.is_ascii() {
        return None;
    }
    let full = FULL_NAMES.iter().find(|(name, _)| *name == lower);
    length_scale(full.map_or(lower.as_str(), |(_, unit)| unit))
}

/// What a word that stands where a unit stands is.
pub(crate) fn written_unit(word: &str) -> WrittenUnit<'_> {
    let word = word.trim();
    if word.is_empty() {
        WrittenUnit::None
    } else if is_destroyed(word) {
        WrittenUnit::Destroyed(word)
    } else if let Some(scale) = instrument_length(word) {
        WrittenUnit::Length(word, scale)
    } else if OTHER_QUANTITIES.contains(&word) {
        WrittenUnit::OtherQuantity(word)
    } else {
        WrittenUnit::Unknown(word)
    }
}

/// Whether a character of a unit was destroyed: U+FFFD, or a question mark before `m`.
fn is_destroyed(word: &str) -> bool {
    word.contains('\u{fffd}') || word == "?m" || word == "\u{c2}\u{b5}m"
}

/// The unit at the end of a column name, and the name without it.
///
/// Forms: `x (um)`, `x [um]`, `x in um`, `x/um`, `x_um`, `x, um`, `Lateral um`, and a unit alone.
pub(crate) fn split_unit(field: &str) -> (&str, WrittenUnit<'_>) {
    let field = field.trim().trim_matches('"').trim();
    if let Some((name, unit)) = bracketed(field) {
        let written = written_unit(unit);
        // `z (um) [nm]` does not say which of the two it is.
        if let Some((bare, other)) = bracketed(name)
            && let (WrittenUnit::Length(_, a), WrittenUnit::Length(_, b)) =
                (&written, written_unit(other))
            && a.factor().total_cmp(&b.factor()).is_ne()
        {
            let both = field.get(bare.len()..).unwrap_or(field).trim();
            return (bare, WrittenUnit::Unknown(both));
        }
        return (name, written);
    }
    let parted = |c: char| c.is_whitespace() || matches!(c, '_' | '/' | ':' | ',' | '.' | '-');
    let alone = written_unit(field);
    let is_one_word = !field.contains(parted);
    if !matches!(alone, WrittenUnit::Unknown(_) | WrittenUnit::Destroyed(_))
        || (is_one_word && matches!(alone, WrittenUnit::Destroyed(_)))
    {
        return ("", alone);
    }
    let Some((at, mark)) = field.char_indices().rev().find(|&(_, c)| parted(c)) else {
        return (field, WrittenUnit::None);
    };
    let word = field.get(at + mark.len_utf8()..).unwrap_or_default();
    let before = field.get(..at).unwrap_or_default();
    let name = before.trim_end_matches(|c: char| parted(c));
    let in_words = ["in", "en"]
        .iter()
        .find_map(|joint| name.strip_suffix(joint)?.strip_suffix(char::is_whitespace));
    match written_unit(word) {
        // A letter A without brackets is the name of a channel as often as angstrom, and `in` is a word.
        WrittenUnit::Length("A", _) if mark != '/' && in_words.is_none() => {
            (field, WrittenUnit::None)
        }
        WrittenUnit::Length("in", _) if mark.is_whitespace() && in_words.is_none() => {
            (field, WrittenUnit::None)
        }
        // `z_min` is a smallest height, not one in minutes.
        WrittenUnit::OtherQuantity(_) | WrittenUnit::Unknown(_) | WrittenUnit::None => {
            (field, WrittenUnit::None)
        }
        unit => (in_words.unwrap_or(name).trim_end(), unit),
    }
}

/// Name and text between the last pair of brackets at the end of a field.
fn bracketed(field: &str) -> Option<(&str, &str)> {
    let (open, inner) = match field.chars().last()? {
        ')' => ('(', field.strip_suffix(')')?),
        ']' => ('[', field.strip_suffix(']')?),
        _ => return None,
    };
    let (name, unit) = inner.rsplit_once(open)?;
    let name = name.trim_end_matches(|c: char| c.is_whitespace() || matches!(c, '_' | '/' | ':'));
    Some((name, unit.trim()))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn units_in_the_forms_of_instruments() {
        for (field, name, metres) in [
            ("Lateral um", "Lateral", 1e-6),
            ("Raw Nanometer", "Raw", 1e-9),
            ("x in \u{b5}m", "x", 1e-6),
            ("X_(microns)", "X", 1e-6),
            ("distance_um", "distance", 1e-6),
            ("Position [mm]", "Position", 1e-3),
            ("Z/\u{3bc}m", "Z", 1e-6),
            ("H\u{f6}he (Mikrometer)", "H\u{f6}he", 1e-6),
            ("Hauteur, microm\u{e8}tres", "Hauteur", 1e-6),
            ("Height (kA)", "Height", 1e-7),
            ("z (\u{c5})", "z", 1e-10),
            ("x_in", "x", 0.0254),
            ("um", "", 1e-6),
            ("[nm]", "", 1e-9),
            ("Millimetre", "", 1e-3),
            ("Z Angstroms", "Z", 1e-10),
        ] {
            let (base, unit) = split_unit(field);
            assert_eq!(base, name, "{field}");
            let WrittenUnit::Length(_, scale) = unit else {
                panic!("{field}: {unit:?}");
            };
            assert!((scale.factor() / metres - 1.0).abs() < 1e-12, "{field}");
        }
    }

    #[test]
    fn what_is_no_unit_of_length() {
        let unit = |field| split_unit(field).1;
        assert_eq!(unit("Channel A"), WrittenUnit::None);
        assert_eq!(unit("Channel_A"), WrittenUnit::None);
        assert_eq!(unit("z_min"), WrittenUnit::None);
        assert_eq!(unit("Raw"), WrittenUnit::None);
        assert_eq!(unit("built in"), WrittenUnit::None);
        assert_eq!(unit("Time (s)"), WrittenUnit::OtherQuantity("s"));
        assert_eq!(unit("Height (raw)"), WrittenUnit::Unknown("raw"));
        assert_eq!(unit("z (UM)"), WrittenUnit::Unknown("UM"));
        assert_eq!(unit("x [\u{fffd}m]"), WrittenUnit::Destroyed("\u{fffd}m"));
        assert_eq!(unit("Lateral ?m"), WrittenUnit::Destroyed("?m"));
        assert_eq!(instrument_length("KA"), None);
    }
}
