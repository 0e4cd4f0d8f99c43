//! What the header of a table says: keys and values, and the few keys that reading needs.

use super::table_lines::{TextLine, shortened};
use super::table_options::Decimal;
use super::table_units::{WrittenUnit, split_unit, written_unit};
use crate::intake::step::Step;
use crate::units::{UnitScale, format_length, parse_fraction};

/// Smallest and largest radius of a stylus tip taken from a file, m (common practice, no source).
const TIP_RADII_METRES: std::ops::RangeInclusive<f64> = 1e-9..=1e-3;

/// A key that reading needs.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Key {
    /// Length of the trace, or width of the map along x.
    Width,
    /// Height of the map along y.
    Height,
    /// Distance of neighbouring samples.
    Step,
    /// Number of samples.
    Count,
    /// Unit of positions.
    PositionUnit,
    /// Unit of heights.
    HeightUnit,
    /// Unit of both.
    Unit,
}

/// Keys in English, German, French, Spanish and Japanese, lower case.
const KEYS: [(Key, &[&str]); 7] = [
    (
        Key::Width,
        &[
            "width",
            "length",
            "scan length",
            "x length",
            "trace length",
            "breite",
            "l\u{e4}nge",
            "scanl\u{e4}nge",
            "messstrecke",
            "largeur",
            "longueur",
            "ancho",
            "anchura",
            "longitud",
            "\u{5e45}",
            "\u{9577}\u{3055}",
        ],
    ),
    (
        Key::Height,
        &[
            "height",
            "y length",
            "h\u{f6}he",
            "hauteur",
            "alto",
            "altura",
            "\u{9ad8}\u{3055}",
        ],
    ),
    (
        Key::Step,
        &[
            "resolution",
            "step",
            "x step",
            "dx",
            "spacing",
            "x spacing",
            "sample spacing",
            "sampling interval",
            "sample distance",
            "aufl\u{f6}sung",
            "schrittweite",
            "punktabstand",
            "r\u{e9}solution",
            "pas",
            "resoluci\u{f3}n",
            "paso",
            "\u{5206}\u{89e3}\u{80fd}",
            "\u{9593}\u{9694}",
        ],
    ),
    (
        Key::Count,
        &[
            "points",
            "number of points",
            "samples",
            "number of samples",
            "data points",
            "count",
            "punkte",
            "anzahl punkte",
            "anzahl der punkte",
            "nombre de points",
            "puntos",
            "n\u{fa}mero de puntos",
            "\u{70b9}\u{6570}",
        ],
    ),
    (
        Key::PositionUnit,
        &[
            "x unit",
            "x units",
            "lateral unit",
            "lateral units",
            "x einheit",
            "unit\u{e9} x",
            "unidad x",
            "x\u{5358}\u{4f4d}",
        ],
    ),
    (
        Key::HeightUnit,
        &[
            "value unit",
            "value units",
            "z unit",
            "z units",
            "height unit",
            "height units",
            "werteeinheit",
            "werteeinheiten",
            "z einheit",
            "unit\u{e9} z",
            "unit\u{e9} des valeurs",
            "unidad z",
            "unidades de valor",
            "z\u{5358}\u{4f4d}",
        ],
    ),
    (
        Key::Unit,
        &[
            "unit",
            "units",
            "einheit",
            "einheiten",
            "unit\u{e9}",
            "unit\u{e9}s",
            "unidad",
            "unidades",
            "\u{5358}\u{4f4d}",
        ],
    ),
];

/// Words for the stylus and its tip.
const STYLUS_WORDS: [&str; 11] = [
    "stylus",
    "tip",
    "tastspitze",
    "spitze",
    "taster",
    "palpeur",
    "pointe",
    "palpador",
    "punta",
    "\u{89e6}\u{91dd}",
    "\u{91dd}",
];
/// Words for a radius.
const RADIUS_WORDS: [&str; 5] = [
    "radius",
    "rayon",
    "radio",
    "\u{534a}\u{5f84}",
    "spitzenradius",
];
/// What may follow the unit of a distance of samples.
const PER_SAMPLE: [&str; 10] = [
    "/sample",
    "/samples",
    "/point",
    "/pt",
    "/pixel",
    "/px",
    "/punkt",
    " per sample",
    " per point",
    " per pixel",
];

/// Key and value of a line of text; the value of a line without a separator is empty.
pub(crate) fn key_and_value(line: TextLine<'_>) -> (String, String) {
    let mark = |c: char| matches!(c, ',' | ';' | '\t' | ':' | '=');
    let clean = |part: &str| {
        part.trim_matches(|c: char| c.is_whitespace() || matches!(c, ',' | ';' | '"'))
            .to_owned()
    };
    match line.content.split_once(mark) {
        Some((key, value)) if !key.trim().is_empty() => (clean(key), clean(value)),
        _ => (clean(line.content), String::new()),
    }
}

/// A length a header gives.
#[derive(Debug, Clone, PartialEq)]
pub(crate) enum KeptLength {
    /// In metres, with the distance by which its last digit may be rounded.
    Metres(f64, f64),
    /// Its unit was destroyed; the value as written.
    Destroyed(String),
}

/// What reading needs from a header.
#[derive(Debug, Clone, Default, PartialEq)]
pub(crate) struct Declared {
    /// Length or width.
    pub(crate) width: Option<KeptLength>,
    /// Height along y.
    pub(crate) height: Option<KeptLength>,
    /// Distance of samples.
    pub(crate) step: Option<KeptLength>,
    /// Number of samples.
    pub(crate) count: Option<usize>,
    /// Unit of positions: as written, with its scale.
    pub(crate) position_unit: Option<(String, UnitScale)>,
    /// Unit of heights.
    pub(crate) height_unit: Option<(String, UnitScale)>,
    /// Whether both units come from a single key.
    pub(crate) is_unit_shared: bool,
    /// Whether the header speaks of a scan along a line: a stylus, a distance of samples.
    pub(crate) is_scan: bool,
}

impl Declared {
    /// Looks through keys and values; the first of a kind counts.
    pub(crate) fn of(metadata: &[(String, String)], decimal: Decimal) -> Self {
        let mut found = Self::default();
        let mut unit = None;
        for (key, value) in metadata {
            found.is_scan |= mentions(key, &STYLUS_WORDS) && !value.is_empty();
            let (name, key_unit) = split_unit(key);
            let bracket = match key_unit {
                WrittenUnit::Length(word, _) => Some(word),
                _ => None,
            };
            let length = || kept_length(value, bracket, decimal);
            let known = key_of(key).or_else(|| bracket.and_then(|_| key_of(name)));
            match known {
                Some(Key::Width) => keep(&mut found.width, length()),
                Some(Key::Height) => keep(&mut found.height, length()),
                Some(Key::Step) => keep(&mut found.step, length()),
                Some(Key::Count) => keep(&mut found.count, value.trim().parse().ok()),
                Some(Key::PositionUnit) => keep(&mut found.position_unit, unit_of(value)),
                Some(Key::HeightUnit) => keep(&mut found.height_unit, unit_of(value)),
                Some(Key::Unit) => keep(&mut unit, unit_of(value)),
                None => {}
            }
        }
        found.is_scan |= found.step.is_some();
        found.is_unit_shared =
            unit.is_some() && found.position_unit.is_none() && found.height_unit.is_none();
        keep(&mut found.position_unit, unit.clone());
        keep(&mut found.height_unit, unit);
        found
    }
}

fn keep<T>(place: &mut Option<T>, value: Option<T>) {
    if place.is_none() {
        *place = value;
    }
}

/// The key a text is.
fn key_of(text: &str) -> Option<Key> {
    const LONGEST_KEY: usize = 64;
    if text.len() > LONGEST_KEY {
        return None;
    }
    let plain = text.to_lowercase().replace(['_', '-', '.'], " ");
    let plain = plain.trim();
    KEYS.iter()
        .find(|(_, names)| names.contains(&plain))
        .map(|(key, _)| *key)
}

/// Whether a line is a key for a unit and its value, such as `Z units,nm`, and names no columns.
pub(crate) fn is_unit_key(line: TextLine<'_>) -> bool {
    let (key, value) = key_and_value(line);
    let unit_key = matches!(
        key_of(&key),
        Some(Key::PositionUnit | Key::HeightUnit | Key::Unit)
    );
    unit_key && unit_of(&value).is_some()
}

/// A unit as the value of a key.
fn unit_of(value: &str) -> Option<(String, UnitScale)> {
    let bare = value.trim().trim_matches(['(', ')', '[', ']']);
    match written_unit(bare) {
        WrittenUnit::Length(word, scale) => Some((word.to_owned(), scale)),
        _ => None,
    }
}

/// A length as the value of a key, with its unit or in the unit of the key; `None` for anything else.
fn kept_length(value: &str, key_unit: Option<&str>, decimal: Decimal) -> Option<KeptLength> {
    const LONGEST_VALUE: usize = 64;
    let value = value.trim();
    if value.len() > LONGEST_VALUE {
        return None;
    }
    let bare = PER_SAMPLE
        .iter()
        .find_map(|suffix| value.strip_suffix(suffix))
        .unwrap_or(value);
    let end = bare
        .find(|c: char| !(c.is_ascii_digit() || matches!(c, '.' | ',' | '-' | '+' | 'e' | 'E')))
        .unwrap_or(bare.len());
    let (number, unit) = bare.split_at(end);
    let plain = match decimal {
        _ if !number.contains(',') => number.to_owned(),
        Decimal::Comma => number.replace(',', "."),
        Decimal::Point => one_decimal_comma(number)?,
    };
    if !plain.starts_with(|c: char| c.is_ascii_digit() || c == '.') {
        return None;
    }
    let unit = unit.trim();
    let scale = match written_unit(if unit.is_empty() { key_unit? } else { unit }) {
        WrittenUnit::Length(_, scale) => scale,
        WrittenUnit::Destroyed(_) => return Some(KeptLength::Destroyed(value.to_owned())),
        _ => return None,
    };
    let metres = scale.read(&plain, &mut String::new())?;
    let digits = plain.split_once('.').map_or(0, |(_, part)| {
        part.bytes().take_while(u8::is_ascii_digit).count()
    });
    let rounding = scale.apply(10.0_f64.powi(-i32::try_from(digits).unwrap_or(0)) / 2.0);
    (metres.is_finite() && metres > 0.0).then_some(KeptLength::Metres(metres, rounding))
}

/// A comma in a header whose table has decimal points: `12,34` can only be a decimal comma, `1,234` not.
fn one_decimal_comma(number: &str) -> Option<String> {
    let (whole, part) = number.split_once(',')?;
    let sure = part.len() != 3 || whole.starts_with('0');
    (sure && !part.contains([',', '.']) && !whole.contains('.')).then(|| number.replace(',', "."))
}

/// Whether a text holds one of some words.
fn mentions(text: &str, words: &[&str]) -> bool {
    const LONGEST: usize = 200;
    if text.len() > LONGEST {
        return false;
    }
    let lower = text.to_lowercase();
    words.iter().any(|word| {
        if word.is_ascii() && word.len() < 5 {
            lower
                .split(|c: char| !c.is_alphanumeric())
                .any(|w| w == *word)
        } else {
            lower.contains(word)
        }
    })
}

/// The radius of the stylus tip, m, where the header says it, and the step that tells of it.
pub(crate) fn tip_radius(
    metadata: &[(String, String)],
    decimal: Decimal,
) -> (Option<f64>, Option<Step>) {
    for (key, value) in metadata {
        let is_stylus = mentions(key, &STYLUS_WORDS);
        let named_in_value = value
            .split([',', ';'])
            .find(|part| mentions(part, &RADIUS_WORDS))
            .filter(|_| is_stylus);
        let (radius, key_unit) = match named_in_value {
            Some(part) => (
                part.split_once([':', '=']).map_or_else(
                    || part.trim_start_matches(|c: char| !c.is_ascii_digit()),
                    |(_, length)| length,
                ),
                None,
            ),
            None if is_stylus && mentions(key, &RADIUS_WORDS) => (value.as_str(), {
                match split_unit(key).1 {
                    WrittenUnit::Length(word, _) => Some(word),
                    _ => None,
                }
            }),
            None => continue,
        };
        return tip_step(radius, kept_length(radius, key_unit, decimal).as_ref());
    }
    (None, None)
}

fn tip_step(written: &str, length: Option<&KeptLength>) -> (Option<f64>, Option<Step>) {
    let shown = shortened(written.trim());
    let unknown = |why: &str| {
        let text = format!(
            "the file gives the radius of the stylus tip as `{shown}`; {why}, so the radius counts as not known"
        );
        (None, Some(Step::new("tip", text)))
    };
    match length {
        Some(&KeptLength::Metres(metres, _)) if TIP_RADII_METRES.contains(&metres) => {
            let text = format!(
                "the file gives the radius of the stylus tip as {}",
                format_length(metres)
            );
            let step = Step::new("tip", text).with(&[("tip_radius_m", metres)]);
            (Some(metres), Some(step))
        }
        Some(KeptLength::Metres(..)) => unknown("no tip is that size"),
        Some(KeptLength::Destroyed(_)) => {
            unknown("a character of its unit was destroyed by a change of encoding")
        }
        None if parse_fraction(written).is_ok() => unknown("it has no unit"),
        None => unknown("it is no length that can be read"),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn header(lines: &[&str]) -> Vec<(String, String)> {
        lines
            .iter()
            .map(|content| {
                key_and_value(TextLine {
                    offset: 0,
                    content,
                    is_comment: false,
                })
            })
            .collect()
    }

    fn metres(length: Option<&KeptLength>) -> Option<f64> {
        match length {
            Some(&KeptLength::Metres(metres, _)) => Some(metres),
            _ => None,
        }
    }

    #[test]
    fn keys_in_several_languages() {
        for (width, height) in [
            ("Width: 12.5 \u{b5}m", "Height: 2500 nm"),
            ("Breite: 12,5 \u{b5}m", "H\u{f6}he: 2500 nm"),
            ("Largeur = 12,5 microns", "Hauteur = 2500 nm"),
            ("Anchura;12,5 um", "Altura;2500 nm"),
            ("\u{5e45}\t12.5 um", "\u{9ad8}\u{3055}\t2.5 um"),
            ("Length (um),12.5", "y_length [nm],2500"),
        ] {
            let found = Declared::of(&header(&[width, height]), Decimal::Point);
            assert_eq!(metres(found.width.as_ref()), Some(12.5e-6), "{width}");
            assert_eq!(metres(found.height.as_ref()), Some(2.5e-6), "{height}");
        }
        let scan = header(&[
            "Scan Parameters",
            "Resolution,0.156 um/sample",
            "Points,42",
            "Value units: m",
            "Unit: mm",
        ]);
        let found = Declared::of(&scan, Decimal::Point);
        assert_eq!(found.step, Some(KeptLength::Metres(0.156e-6, 0.0005e-6)));
        assert_eq!((found.count, found.is_scan), (Some(42), true));
        assert_eq!(found.height_unit.unwrap().0, "m");
        assert_eq!(found.position_unit.unwrap().0, "mm");
    }

    #[test]
    fn what_is_no_length_is_left_alone() {
        for line in [
            "Length: 12.5",
            "Length: 1,234 um",
            "Length: long",
            "Length: -3 um",
            "Length: 3 V",
            "Height: 512 x 512",
        ] {
            let found = Declared::of(&header(&[line]), Decimal::Point);
            assert_eq!((found.width, found.height), (None, None), "{line}");
        }
        let found = Declared::of(&header(&["Length,9.0 \u{fffd}m"]), Decimal::Point);
        assert!(matches!(found.width, Some(KeptLength::Destroyed(_))));
    }

    #[test]
    fn the_tip_where_the_header_says_it() {
        let radius = |line: &str| tip_radius(&header(&[line]), Decimal::Point);
        for (line, metres) in [
            ("Stylus,Radius: 2.5 \u{b5}m", 2.5e-6),
            ("Stylus radius: 700 nm", 700e-9),
            ("Tip radius (um);5", 5e-6),
            ("Spitzenradius: 2,5 \u{b5}m", 2.5e-6),
            ("Rayon de la pointe = 2 \u{b5}m", 2e-6),
            ("Stylus,type B, radius 12.5 um", 12.5e-6),
        ] {
            assert_eq!(radius(line).0, Some(metres), "{line}");
        }
        for line in [
            "Stylus,Radius: 2.5 \u{fffd}m",
            "Tip radius: 2.5",
            "Tip radius: blunt",
            "Tip radius: 2 m",
        ] {
            let (value, step) = radius(line);
            assert_eq!(value, None, "{line}");
            assert!(step.unwrap().text.contains("not known"), "{line}");
        }
        for line in [
            "Radius of curvature: 3 mm",
            "Stylus,fine",
            "Strip: radius 3 um",
        ] {
            assert_eq!(radius(line), (None, None), "{line}");
        }
    }
}
