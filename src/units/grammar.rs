//! The grammar of a quantity: a number, then a product of units.

use super::atoms::{self, Dimension};
use super::error::UnitError;
use super::scale::UnitScale;

/// Deepest nesting of parentheses in a unit.
const DEEPEST: usize = 8;
/// Largest power of one unit.
const LARGEST_POWER: i32 = 9;

/// A unit as read: its size and its dimension.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Unit {
    /// SI value.
    pub(super) scale: UnitScale,
    /// Exponents of metre, kilogram, second.
    pub(super) dimension: Dimension,
}

impl Unit {
    const ONE: Self = Self {
        scale: UnitScale::ONE,
        dimension: [0; 3],
    };

    fn times(self, other: Self, exponent: i32) -> Self {
        let mut dimension = self.dimension;
        for (sum, part) in dimension.iter_mut().zip(other.dimension) {
            *sum += part * exponent;
        }
        Self {
            scale: self.scale.times(other.scale, exponent),
            dimension,
        }
    }
}

/// Splits a quantity into its number, in the form `str::parse` reads, and its unit.
///
/// # Errors
/// [`UnitError`] when the text does not start with one finite number.
pub(super) fn split_number(text: &str) -> Result<(String, &str), UnitError> {
    let owned = || text.to_owned();
    if text.contains('\u{fffd}') {
        return Err(UnitError::DestroyedCharacter { text: owned() });
    }
    let trimmed = text.trim();
    let (sign, body) = split_sign(trimmed);
    let (mantissa, rest) = split_mantissa(body);
    if !mantissa.bytes().any(|b| b.is_ascii_digit()) {
        let word: String = body.chars().take(3).collect::<String>().to_lowercase();
        return Err(if word == "inf" || word == "nan" || word == "\u{221e}" {
            UnitError::NotFinite { text: owned() }
        } else {
            UnitError::NoNumber { text: owned() }
        });
    }
    let (exponent, rest) = split_exponent(rest);
    let rest = rest.trim();
    match rest.chars().next() {
        Some(',') => return Err(UnitError::DecimalComma { text: owned() }),
        Some('.') => return Err(UnitError::SecondPoint { text: owned() }),
        Some(c) if c.is_ascii_digit() => return Err(UnitError::NoNumber { text: owned() }),
        _ => {}
    }
    let number = format!("{sign}{mantissa}{exponent}");
    match number.parse::<f64>() {
        Ok(value) if value.is_finite() => Ok((number, rest)),
        _ => Err(UnitError::NotFinite { text: owned() }),
    }
}

/// A leading sign, the typographic minus included.
fn split_sign(text: &str) -> (&'static str, &str) {
    if let Some(rest) = text.strip_prefix(['-', '\u{2212}']) {
        ("-", rest.trim_start())
    } else {
        ("", text.strip_prefix('+').unwrap_or(text))
    }
}

/// Digits with at most one decimal point.
fn split_mantissa(text: &str) -> (&str, &str) {
    let mut point = false;
    let end = text
        .find(|c: char| {
            let first_point = c == '.' && !point;
            point |= c == '.';
            !(c.is_ascii_digit() || first_point)
        })
        .unwrap_or(text.len());
    text.split_at(end)
}

/// An exponent, `e-5` or `x10^-5`, as `e-5`; nothing when there is none.
fn split_exponent(text: &str) -> (String, &str) {
    let body = match text.strip_prefix(['e', 'E']) {
        Some(body) => Some(body),
        None => text
            .trim_start()
            .strip_prefix(['x', '\u{d7}', '*', '\u{b7}'])
            .and_then(|rest| rest.trim_start().strip_prefix("10^")),
    };
    let Some(body) = body else {
        return (String::new(), text);
    };
    let (sign, digits) = split_sign(body);
    let end = digits
        .find(|c: char| !c.is_ascii_digit())
        .unwrap_or(digits.len());
    let (digits, rest) = digits.split_at(end);
    if digits.is_empty() {
        return (String::new(), text);
    }
    (format!("e{sign}{digits}"), rest)
}

/// Reads a unit such as `uL/min` or `kg/(m s^2)`; `None` when it is not in the grammar.
///
/// After a `/` no further factor may follow without parentheses, because readers differ on what it means.
pub(super) fn read_unit(text: &str) -> Option<Unit> {
    let normal: String = text
        .trim()
        .chars()
        .map(|c| match c {
            '\u{b5}' | '\u{3bc}' => 'u',
            '\u{b7}' | '\u{22c5}' | '.' | '\u{d7}' => '*',
            c if c.is_whitespace() => ' ',
            c => c,
        })
        .collect();
    let mut cursor = Cursor { rest: &normal };
    let unit = cursor.product(0)?;
    cursor.rest.is_empty().then_some(unit)
}

/// What is left to read of a unit.
struct Cursor<'a> {
    rest: &'a str,
}

impl Cursor<'_> {
    fn take(&mut self, wanted: char) -> bool {
        let rest = self.rest.strip_prefix(wanted);
        self.rest = rest.unwrap_or(self.rest);
        rest.is_some()
    }

    fn skip_spaces(&mut self) -> bool {
        let before = self.rest.len();
        self.rest = self.rest.trim_start();
        self.rest.len() < before
    }

    fn product(&mut self, depth: usize) -> Option<Unit> {
        let mut product = Unit::ONE;
        let mut divided = false;
        self.skip_spaces();
        let first = self.factor(depth)?;
        product = product.times(first, 1);
        loop {
            let space = self.skip_spaces();
            if self.rest.is_empty() || self.rest.starts_with(')') {
                return Some(product);
            }
            if self.take('/') {
                divided = true;
                self.skip_spaces();
                product = product.times(self.factor(depth)?, -1);
            } else if self.take('*') || space {
                if divided {
                    return None;
                }
                self.skip_spaces();
                product = product.times(self.factor(depth)?, 1);
            } else {
                return None;
            }
        }
    }

    fn factor(&mut self, depth: usize) -> Option<Unit> {
        if self.take('(') {
            if depth >= DEEPEST {
                return None;
            }
            let inner = self.product(depth + 1)?;
            return self.take(')').then_some(inner);
        }
        let end = self
            .rest
            .find(|c: char| !(c.is_alphabetic() || c == '\u{212b}'))
            .unwrap_or(self.rest.len());
        let (name, rest) = self.rest.split_at(end);
        let atom = atoms::find(name)?;
        self.rest = rest;
        let power = self.power()?;
        let unit = Unit {
            scale: atom.scale,
            dimension: atom.dimension,
        };
        Some(Unit::ONE.times(unit, power))
    }

    /// `^2`, `^-1`, `2` or superscripts; 1 when there is none.
    fn power(&mut self) -> Option<i32> {
        let caret = self.take('^');
        let end = self
            .rest
            .find(|c: char| !(c.is_ascii_digit() || c == '-' || superscript(c).is_some()))
            .unwrap_or(self.rest.len());
        let (digits, rest) = self.rest.split_at(end);
        if digits.is_empty() {
            return (!caret).then_some(1);
        }
        let plain: String = digits
            .chars()
            .map(|c| superscript(c).unwrap_or(c))
            .collect();
        self.rest = rest;
        let power: i32 = plain.parse().ok()?;
        (power != 0 && power.abs() <= LARGEST_POWER).then_some(power)
    }
}

/// The plain character of a superscript.
fn superscript(c: char) -> Option<char> {
    Some(match c {
        '\u{b9}' => '1',
        '\u{b2}' => '2',
        '\u{b3}' => '3',
        '\u{2074}' => '4',
        '\u{2075}' => '5',
        '\u{2076}' => '6',
        '\u{207b}' => '-',
        _ => return None,
    })
}
