//! Numbers for people: significant digits and units of a sensible size.
//!
//! Machine formats do not use this module; they carry full doubles in SI.

/// A unit with its size in SI.
pub(crate) type Unit = (&'static str, f64);

/// Lengths, largest first.
pub(crate) const LENGTHS: &[Unit] = &[("m", 1.0), ("mm", 1e-3), ("\u{b5}m", 1e-6), ("nm", 1e-9)];
/// Areas, largest first.
pub(crate) const AREAS: &[Unit] = &[
    ("m\u{b2}", 1.0),
    ("mm\u{b2}", 1e-6),
    ("\u{b5}m\u{b2}", 1e-12),
];
/// Velocities, largest first.
pub(crate) const VELOCITIES: &[Unit] = &[
    ("m/s", 1.0),
    ("mm/s", 1e-3),
    ("\u{b5}m/s", 1e-6),
    ("nm/s", 1e-9),
];
/// Flow rates, largest first.
pub(crate) const FLOW_RATES: &[Unit] = &[
    ("L/min", 1e-3 / 60.0),
    ("mL/min", 1e-6 / 60.0),
    ("\u{b5}L/min", 1e-9 / 60.0),
    ("nL/min", 1e-12 / 60.0),
    ("pL/min", 1e-15 / 60.0),
];
/// Pressures, largest first.
pub(crate) const PRESSURES: &[Unit] = &[("MPa", 1e6), ("kPa", 1e3), ("Pa", 1.0), ("mPa", 1e-3)];
/// Times, largest first.
pub(crate) const TIMES: &[Unit] = &[
    ("h", 3600.0),
    ("min", 60.0),
    ("s", 1.0),
    ("ms", 1e-3),
    ("\u{b5}s", 1e-6),
];
/// Pascals in one mbar.
pub(crate) const MBAR: f64 = 100.0;
/// Pascals in one dyn/cm^2.
pub(crate) const DYN_PER_CM2: f64 = 0.1;
/// Pa s/m^3 in one mbar min/uL: 100 Pa over (1e-9/60) m^3/s.
pub(crate) const MBAR_MIN_PER_UL: f64 = 6e12;

/// `value` with `digits` significant digits, in plain decimals between 1e-3 and 1e6, else with exponent.
///
/// A value that is not finite reads `not available`, so no output shows it as a number.
pub(crate) fn significant(value: f64, digits: usize) -> String {
    if !value.is_finite() {
        return "not available".to_owned();
    }
    let digits = digits.max(1);
    let scientific = format!("{value:.*e}", digits - 1);
    let exponent: i32 = scientific
        .split_once('e')
        .and_then(|(_, e)| e.parse().ok())
        .unwrap_or(0);
    if value == 0.0 || (-3..6).contains(&exponent) {
        let decimals = i32::try_from(digits)
            .ok()
            .and_then(|d| usize::try_from(d - 1 - exponent).ok())
            .unwrap_or(0);
        format!("{value:.decimals$}")
    } else {
        scientific
    }
}

/// The unit of `units` (largest first) in which `value` is at least one, else the smallest.
pub(crate) fn fitting_unit(value: f64, units: &[Unit]) -> Unit {
    units
        .iter()
        .find(|(_, size)| value.abs() >= size * (1.0 - 1e-9))
        .or(units.last())
        .copied()
        .unwrap_or(("", 1.0))
}

/// `value` in the unit that fits it, for example `100.0 um` with the micro sign.
pub(crate) fn with_unit(value: f64, units: &[Unit], digits: usize) -> String {
    let (name, size) = fitting_unit(value, units);
    format!("{} {name}", significant(value / size, digits))
}

/// A place in the section as `x 5.000 mm, y 5.000 um`; each unit fits the coordinate or the extent.
pub(crate) fn place(at: [f64; 2], extent: [f64; 2], digits: usize) -> String {
    let coordinate = |v: f64, extent: f64| {
        let (name, size) = fitting_unit(v.abs().max(extent), LENGTHS);
        let rounding = 1e-7 * extent;
        let v = if v.abs() < rounding { 0.0 } else { v };
        format!("{} {name}", significant(v / size, digits))
    };
    format!(
        "x {}, y {}",
        coordinate(at[0], extent[0]),
        coordinate(at[1], extent[1])
    )
}

/// A position in the unit that fits the length it is on.
pub(crate) fn length_on(position: f64, length: f64) -> String {
    let (name, size) = fitting_unit(position.abs().max(length), LENGTHS);
    format!("{} {name}", significant(position / size, 4))
}

/// A relative quantity in per cent with two digits, for example `0.0012 %`, plain down to a part in 1e10.
pub(crate) fn per_cent(relative: f64) -> String {
    let value = 100.0 * relative;
    let power = value.abs().log10().floor();
    if (-8.0..-3.0).contains(&power) {
        format!("{value:.decimals$} %", decimals = (1.0 - power) as usize)
    } else {
        format!("{} %", significant(value, 2))
    }
}

/// One line of text from a user: control characters become blanks, so that no name moves the cursor.
pub(crate) fn one_line(text: &str) -> String {
    text.chars()
        .map(|c| {
            if c.is_control() || is_direction_mark(c) {
                ' '
            } else {
                c
            }
        })
        .collect()
}

/// Longest title shown, characters.
const LONGEST_TITLE: usize = 240;

/// A name as a title: one line, cut where it is very long.
pub(crate) fn title(text: &str) -> String {
    let mut title = one_line(text);
    if let Some((cut, _)) = title.char_indices().nth(LONGEST_TITLE) {
        title.truncate(cut);
        title.push_str(" ...");
    }
    title
}

/// Invisible characters that reorder the text around them.
fn is_direction_mark(c: char) -> bool {
    matches!(c, '\u{200e}' | '\u{200f}' | '\u{202a}'..='\u{202e}' | '\u{2066}'..='\u{2069}' | '\u{2028}' | '\u{2029}')
}

/// The text in ASCII: units spelled out, everything else as `\u{..}`.
pub(crate) fn to_ascii(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '\u{b5}' | '\u{3bc}' => out.push('u'),
            '\u{b2}' => out.push_str("^2"),
            '\u{b3}' => out.push_str("^3"),
            '\u{b1}' => out.push_str("+/-"),
            '\u{b7}' => out.push('*'),
            '\u{d7}' => out.push('x'),
            '\u{b0}' => out.push_str("deg"),
            c if c.is_ascii() => out.push(c),
            c => out.extend(c.escape_unicode()),
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn digits_are_significant_ones_and_large_or_small_numbers_get_an_exponent() {
        assert_eq!(significant(0.0, 3), "0.00");
        assert_eq!(significant(14.22708, 6), "14.2271");
        assert_eq!(significant(9.9996, 4), "10.00");
        assert_eq!(significant(-0.001_234_56, 3), "-0.00123");
        assert_eq!(significant(0.000_3, 2), "3.0e-4");
        assert_eq!(significant(1.234_56e-19, 4), "1.235e-19");
        assert_eq!(significant(123_456.0, 3), "123456");
        assert_eq!(significant(f64::NAN, 3), "not available");
        assert_eq!(significant(f64::INFINITY, 3), "not available");
    }

    #[test]
    fn units_fit_the_value() {
        assert_eq!(with_unit(100e-6, LENGTHS, 4), "100.0 \u{b5}m");
        assert_eq!(with_unit(1e-6, LENGTHS, 2), "1.0 \u{b5}m");
        assert_eq!(with_unit(5e-9 / 60.0, FLOW_RATES, 2), "5.0 \u{b5}L/min");
        assert_eq!(with_unit(2e-13, LENGTHS, 2), "2.0e-4 nm");
        assert_eq!(
            place([5e-3, 1e-30], [1e-2, 1e-5], 4),
            "x 5.000 mm, y 0.000 \u{b5}m"
        );
        assert_eq!(with_unit(-2e4, PRESSURES, 2), "-20 kPa");
    }

    #[test]
    fn per_cent_stays_readable_for_small_errors() {
        assert_eq!(per_cent(2.1e-6), "0.00021 %");
        assert_eq!(per_cent(-3e-5), "-0.0030 %");
        assert_eq!(per_cent(0.123), "12 %");
        assert_eq!(per_cent(0.0), "0.0 %");
        assert_eq!(per_cent(4e-14), "4.0e-12 %");
        assert_eq!(per_cent(f64::NAN), "not available %");
    }

    #[test]
    fn ascii_output_has_no_other_character_and_names_cannot_move_the_cursor() {
        let text = to_ascii("4 \u{b5}m\u{b2} \u{b1} 1, caf\u{e9}");
        assert_eq!(text, "4 um^2 +/- 1, caf\\u{e9}");
        assert_eq!(one_line("a\u{1b}[2Jb\nc\u{202e}d"), "a [2Jb c d");
        assert_eq!(title("caf\u{e9}\n"), "caf\u{e9} ");
        let long = title(&"\u{b5}".repeat(1_000_000));
        assert_eq!(long.chars().count(), LONGEST_TITLE + 4);
    }
}
