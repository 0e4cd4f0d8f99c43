//! How a number in some unit becomes SI: an exact power of ten and an exact ratio.

use std::fmt::Write as _;

/// The SI value of one unit, kept as `numerator / denominator * 10^power`.
///
/// Decimal prefixes stay a power of ten, so that they can be applied to written digits without rounding.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct UnitScale {
    numerator: f64,
    denominator: f64,
    power: i32,
}

/// Largest power of ten that is an exact double.
const LARGEST_EXACT_POWER: i32 = 22;

impl UnitScale {
    /// SI unit itself.
    pub(super) const ONE: Self = Self::new(1.0, 0);

    /// A unit worth `numerator * 10^power` in SI.
    pub(super) const fn new(numerator: f64, power: i32) -> Self {
        Self {
            numerator,
            denominator: 1.0,
            power,
        }
    }

    /// A unit worth `factor` SI units, such as a pixel size in metres.
    pub fn from_factor(factor: f64) -> Self {
        Self::new(factor, 0)
    }

    /// Product with another unit raised to a small whole power.
    pub(super) fn times(self, other: Self, exponent: i32) -> Self {
        let size = other.numerator.powi(exponent.abs());
        let over = other.denominator.powi(exponent.abs());
        let (up, down) = if exponent < 0 {
            (over, size)
        } else {
            (size, over)
        };
        Self {
            numerator: self.numerator * up,
            denominator: self.denominator * down,
            power: self.power + other.power * exponent,
        }
    }

    /// SI value of one unit.
    pub fn factor(self) -> f64 {
        self.apply(1.0)
    }

    /// SI value of `value` units; for powers of ten rounded once.
    pub fn apply(self, value: f64) -> f64 {
        let scaled = match self.power {
            0 => value,
            p if (-LARGEST_EXACT_POWER..0).contains(&p) => value / 10.0_f64.powi(-p),
            p => value * 10.0_f64.powi(p),
        };
        scaled * self.numerator / self.denominator
    }

    /// SI value of a number as written, `None` when it is not a number.
    ///
    /// A plain power of ten is moved into the exponent before the digits are read, so the result is the
    /// double nearest to the written decimal. `buffer` is scratch space that callers reuse.
    pub(crate) fn read(self, number: &str, buffer: &mut String) -> Option<f64> {
        let scaled: f64 = if self.power == 0 {
            number.parse().ok()?
        } else {
            let (digits, exponent) = match number.split_once(['e', 'E']) {
                Some((digits, written)) => (digits, written.parse::<i32>().ok()?),
                None => (number, 0),
            };
            if digits.bytes().any(|b| !is_plain_digit(b)) {
                // Words that `parse` takes for numbers, such as `inf` and `nan`.
                return number.parse().ok();
            }
            buffer.clear();
            buffer.push_str(digits);
            buffer.push('e');
            match exponent.saturating_add(self.power) {
                -3 => buffer.push_str("-3"),
                -6 => buffer.push_str("-6"),
                -9 => buffer.push_str("-9"),
                // Writing to a String cannot fail.
                other => drop(write!(buffer, "{other}")),
            }
            buffer.parse().ok()?
        };
        Some(scaled * self.numerator / self.denominator)
    }
}

/// Digits, sign and point: what a number without exponent is made of.
fn is_plain_digit(byte: u8) -> bool {
    matches!(byte, b'0'..=b'9' | b'.' | b'-' | b'+')
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn written_digits_are_rounded_once() {
        let micrometre = UnitScale::new(1.0, -6);
        let mut buffer = String::new();
        for text in [
            "30",
            "0.1",
            "12.345678901234567",
            "-7.3",
            "29.999999999999996",
        ] {
            let exact: f64 = format!("{text}e-6").parse().unwrap();
            let read = micrometre.read(text, &mut buffer).unwrap();
            assert_eq!(read.to_bits(), exact.to_bits(), "{text}");
        }
        assert_eq!(micrometre.read("3e1", &mut buffer), Some(3e-5));
        assert_eq!(micrometre.read("x", &mut buffer), None);
    }

    #[test]
    fn quotients_keep_their_ratio() {
        let per_minute = UnitScale::new(1.0, -9).times(UnitScale::new(60.0, 0), -1);
        assert!((per_minute.apply(6.0) / 1e-10 - 1.0).abs() < 1e-15);
    }
}
