//! Numbers for people: significant digits, prefixes, a space before the unit.

/// Exponents for which a number is written without a power of ten.
const PLAIN_EXPONENTS: std::ops::RangeInclusive<i32> = -3..=5;
/// Prefixes and their exponents, large to small.
const PREFIXES: [(&str, i32); 8] = [
    ("G", 9),
    ("M", 6),
    ("k", 3),
    ("", 0),
    ("m", -3),
    ("\u{b5}", -6),
    ("n", -9),
    ("p", -12),
];
/// Units that take a prefix; all others, such as `Pa s/m^4`, get a power of ten.
const TAKES_PREFIX: [&str; 7] = ["m", "s", "Pa", "Pa s", "Pa/m", "m/s", "N"];
/// What is printed for a value that is not finite.
const NO_VALUE: &str = "n/a";

/// A value rounded to significant digits: the rounded value and its decimal exponent.
fn rounded(value: f64, digits: usize) -> (f64, i32) {
    let text = format!("{value:.*e}", digits.clamp(1, 17) - 1);
    let exponent = text
        .split_once('e')
        .and_then(|(_, e)| e.parse().ok())
        .unwrap_or(0);
    (text.parse().unwrap_or(value), exponent)
}

/// A rounded value without a power of ten.
fn plain(value: f64, exponent: i32, digits: usize) -> String {
    let digits = i32::try_from(digits).unwrap_or(17);
    let after_point = usize::try_from(digits - 1 - exponent).unwrap_or(0);
    format!("{value:.after_point$}")
}

/// A number to `digits` significant digits, with a power of ten when it is very large or small.
///
/// # Examples
/// ```
/// use etchwise::units::format_significant;
/// assert_eq!(format_significant(0.0351442537, 4), "0.03514");
/// assert_eq!(format_significant(1.23456e12, 4), "1.235\u{d7}10^12");
/// ```
pub fn format_significant(value: f64, digits: usize) -> String {
    if !value.is_finite() {
        return NO_VALUE.to_owned();
    }
    if value == 0.0 {
        return "0".to_owned();
    }
    let (round, exponent) = rounded(value, digits);
    if PLAIN_EXPONENTS.contains(&exponent) {
        return plain(round, exponent, digits);
    }
    let mantissa = format!("{value:.*e}", digits.clamp(1, 17) - 1);
    let mantissa = mantissa.split('e').next().unwrap_or_default();
    format!("{mantissa}\u{d7}10^{exponent}")
}

/// A value in SI with its unit: a prefix where the unit takes one, else a power of ten.
///
/// # Examples
/// ```
/// use etchwise::units::format_si;
/// assert_eq!(format_si(0.00089, "Pa s", 3), "890 \u{b5}Pa s");
/// assert_eq!(format_si(2.5e15, "Pa s/m^4", 3), "2.50\u{d7}10^15 Pa s/m^4");
/// ```
pub fn format_si(value: f64, unit: &str, digits: usize) -> String {
    if TAKES_PREFIX.contains(&unit)
        && let Some(text) = with_prefix(value, unit, digits, &PREFIXES)
    {
        return text;
    }
    let space = if unit.is_empty() { "" } else { " " };
    format!("{}{space}{unit}", format_significant(value, digits))
}

/// A value with the prefix that puts one to three digits before the point.
fn with_prefix(value: f64, unit: &str, digits: usize, prefixes: &[(&str, i32)]) -> Option<String> {
    if !value.is_finite() || value == 0.0 {
        return None;
    }
    let (round, exponent) = rounded(value, digits);
    let &(prefix, power) = prefixes.iter().find(|(_, power)| *power <= exponent)?;
    if exponent - power > 3 {
        return None;
    }
    let shown = super::UnitScale::new(1.0, -power).apply(round);
    Some(format!(
        "{} {prefix}{unit}",
        plain(shown, exponent - power, digits)
    ))
}

/// A length to four significant digits: `30.00 µm`.
///
/// # Examples
/// ```
/// use etchwise::units::format_length;
/// assert_eq!(format_length(30e-6), "30.00 \u{b5}m");
/// assert_eq!(format_length(999.96e-6), "1.000 mm");
/// ```
pub fn format_length(metres: f64) -> String {
    format_si(metres, "m", 4)
}

/// A pressure to four significant digits with its prefix: `30.00 kPa`.
pub fn format_pressure(pascals: f64) -> String {
    format_si(pascals, "Pa", 4)
}

/// A flow rate to four significant digits in litres per minute with a prefix: `5.000 µL/min`.
pub fn format_flow_rate(cubic_metres_per_second: f64) -> String {
    let per_minute = cubic_metres_per_second * 60.0 * 1e3;
    with_prefix(per_minute, "L/min", 4, &PREFIXES[3..])
        .unwrap_or_else(|| format_si(cubic_metres_per_second, "m^3/s", 4))
}

/// A fraction as a percentage: `0.0123` to two digits is `1.2 %`.
pub fn format_percent(fraction: f64, digits: usize) -> String {
    format!("{} %", format_significant(fraction * 100.0, digits))
}

/// The same text in ASCII: `um` for the micro sign, `x` for the multiplication sign.
pub fn to_ascii(text: &str) -> String {
    text.chars()
        .map(|c| match c {
            '\u{b5}' | '\u{3bc}' => 'u',
            '\u{d7}' => 'x',
            '\u{b7}' => '*',
            '\u{2212}' => '-',
            '\u{a0}' | '\u{202f}' => ' ',
            c if c.is_ascii() => c,
            _ => '?',
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::units::{parse_flow_rate, parse_length};

    #[test]
    fn lengths_take_the_fitting_prefix() {
        for (metres, text) in [
            (3e-5, "30.00 \u{b5}m"),
            (1.0, "1.000 m"),
            (0.5, "500.0 mm"),
            (9.9994e-4, "999.9 \u{b5}m"),
            (9.9996e-4, "1.000 mm"),
            (-2.5e-9, "-2.500 nm"),
            (1e-12, "1.000 pm"),
            (0.0, "0 m"),
            (1e-15, "1.000\u{d7}10^-15 m"),
            (f64::NAN, "n/a m"),
        ] {
            assert_eq!(format_length(metres), text);
        }
    }

    #[test]
    fn numbers_keep_their_significant_digits() {
        assert_eq!(format_significant(123_456.0, 3), "123000");
        assert_eq!(format_significant(1_234_567.0, 3), "1.23\u{d7}10^6");
        assert_eq!(format_significant(0.001_234, 2), "0.0012");
        assert_eq!(format_significant(9.996, 3), "10.0");
        assert_eq!(format_significant(-0.000_123_4, 3), "-1.23\u{d7}10^-4");
        assert_eq!(format_significant(f64::INFINITY, 3), "n/a");
        assert_eq!(format_significant(14.227, 0), "10");
        assert_eq!(format_percent(0.012_34, 2), "1.2 %");
    }

    #[test]
    fn prefixes_only_where_the_unit_takes_one() {
        assert_eq!(format_si(8.9e-4, "Pa s", 3), "890 \u{b5}Pa s");
        assert_eq!(format_si(2e-18, "m^4", 3), "2.00\u{d7}10^-18 m^4");
        assert_eq!(format_si(14.227, "", 4), "14.23");
        assert_eq!(format_pressure(3e4), "30.00 kPa");
        assert_eq!(format_flow_rate(5e-9 / 60.0), "5.000 \u{b5}L/min");
        assert_eq!(format_flow_rate(1e-30), "1.000\u{d7}10^-30 m^3/s");
        assert_eq!(to_ascii("1.0\u{d7}10^-6 \u{b5}m"), "1.0x10^-6 um");
    }

    #[test]
    fn what_is_printed_can_be_read() {
        for metres in [3e-5, 1.234e-12, 0.5, 9.9996e-4, 1e-15, 12.0] {
            for text in [format_length(metres), to_ascii(&format_length(metres))] {
                let back = parse_length(&text).unwrap();
                assert!((back / metres - 1.0).abs() < 5e-4, "{text}");
            }
        }
        let back = parse_flow_rate(&format_flow_rate(8.3e-11)).unwrap();
        assert!((back / 8.3e-11 - 1.0).abs() < 5e-4);
    }
}
