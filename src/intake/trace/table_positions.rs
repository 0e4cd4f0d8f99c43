//! Positions of a trace: their order, and their rebuilding where they are rounded too coarsely.
//!
//! Positions that only rise or only fall are used as given, however uneven. Where all of them lie within
//! the rounding of the written digits from evenly spaced ones, and their steps differ by more than 5 % of
//! the mean, the even ones are used instead, because slopes from rounded steps would be wrong. With steps
//! `s` and rounding `q` even positions `a + i s` explain `x_i` when `max(x_i - i s) - min(x_i - i s) <= q`.

use super::table_keys::{Declared, KeptLength};
use super::table_lines::shortened;
use super::table_problem::TableProblem;
use crate::intake::step::Step;
use crate::units::{format_length, format_percent};
use crate::warning::{Code, Warning};

/// Spread of steps, against the mean step, from which rounded positions are rebuilt.
const REBUILT_FROM_SPREAD: f64 = 0.05;
/// Fewest samples for a step fitted to the positions alone.
const FITTED_FROM_SAMPLES: usize = 12;
/// How far a fitted step may leave the band of the rounding, against its width.
const FIT_BAND: f64 = 1.5;
/// Difference of a declared length from the data that is worth a warning.
const LENGTH_TOLERANCE: f64 = 1e-3;
/// Difference of a declared distance of samples from the data that is worth a warning.
const STEP_TOLERANCE: f64 = 0.01;

/// Watches the order of positions while they are read.
#[derive(Debug, Default)]
pub(crate) struct OrderWatch {
    last: Option<f64>,
    last_written: String,
    falls: Option<bool>,
    /// Where the first repeated position is: offset and text.
    pub(crate) repeated: Option<(usize, String)>,
}

impl OrderWatch {
    /// Takes the next position; one that goes back is a problem.
    pub(crate) fn take(
        &mut self,
        x: f64,
        written: &str,
        offset: usize,
    ) -> Result<(), TableProblem> {
        if let Some(last) = self.last {
            if x - last == 0.0 {
                if self.repeated.is_none() {
                    self.repeated = Some((offset, shortened(written)));
                }
            } else if *self.falls.get_or_insert(x < last) != (x < last) {
                return Err(TableProblem::BackAndForth {
                    before: shortened(&self.last_written),
                    here: shortened(written),
                });
            }
        }
        self.last = Some(x);
        self.last_written.clear();
        self.last_written
            .push_str(written.get(..64).unwrap_or(written));
        Ok(())
    }

    /// Whether the positions fall.
    pub(crate) fn falls(&self) -> bool {
        self.falls == Some(true)
    }
}

/// Watches how finely positions are written.
#[derive(Debug, Default)]
pub(crate) struct RoundingWatch {
    /// Most digits after the mark among numbers without exponent.
    decimals: i32,
    /// Most significant digits among numbers with an exponent.
    significant: i32,
    has_exponent: bool,
}

impl RoundingWatch {
    /// Takes the next position as written.
    pub(crate) fn take(&mut self, written: &str) {
        let (digits, exponent) = match written.bytes().position(|b| matches!(b, b'e' | b'E')) {
            Some(at) => (written.get(..at).unwrap_or_default(), true),
            None => (written, false),
        };
        let after = digits
            .bytes()
            .rev()
            .position(|b| matches!(b, b'.' | b','))
            .unwrap_or(0);
        let after = i32::try_from(after).unwrap_or(i32::MAX);
        if exponent {
            self.has_exponent = true;
            self.significant = self.significant.max(after.saturating_add(1));
        } else {
            self.decimals = self.decimals.max(after);
        }
    }

    /// Width of the rounding, in the unit of the file; `largest` is the largest size of a position in it.
    pub(crate) fn quantum(&self, largest: f64) -> f64 {
        if self.has_exponent && largest > 0.0 {
            let exponent = largest.log10().floor() as i32;
            10.0_f64.powi(exponent.saturating_add(1).saturating_sub(self.significant))
        } else {
            10.0_f64.powi(-self.decimals.min(300))
        }
    }
}

/// Even positions that explain rounded ones.
#[derive(Debug, Clone, Copy, PartialEq)]
struct Even {
    origin: f64,
    step: f64,
    from: &'static str,
}

/// Rebuilds rising positions where rounding explains their unevenness.
///
/// - `quantum`: width of the rounding, m
pub(crate) fn rebuild(x: &mut [f64], quantum: f64, declared: &Declared) -> Option<(Step, Warning)> {
    let (first, last) = (*x.first()?, *x.last()?);
    let intervals = x.len().checked_sub(1).filter(|n| *n > 0)? as f64;
    let mean = (last - first) / intervals;
    let (low, high) = x
        .windows(2)
        .map(|pair| pair[1] - pair[0])
        .fold((f64::INFINITY, 0.0_f64), |(low, high), d| {
            (low.min(d), high.max(d))
        });
    if mean <= 0.0 || high - low <= REBUILT_FROM_SPREAD * mean {
        return None;
    }
    let even = even_positions(x, quantum, declared)?;
    let mut largest = 0.0_f64;
    for (index, position) in x.iter_mut().enumerate() {
        let rebuilt = index as f64 * even.step + even.origin;
        largest = largest.max((rebuilt - *position).abs());
        *position = rebuilt;
    }
    let text = format!(
        "positions are written to {} while samples are {} apart (steps from {} to {}); they were rebuilt evenly \
         from {}, moving by at most {}",
        format_length(quantum),
        format_length(even.step),
        format_length(low),
        format_length(high),
        even.from,
        format_length(largest)
    );
    let numbers = [
        ("step_m", even.step),
        ("rounding_m", quantum),
        ("largest_move_m", largest),
    ];
    let warning = Warning {
        code: Code::PositionsRebuilt,
        message: text.clone(),
        advice: "export positions with more decimals to be free of it".to_owned(),
        numbers: numbers.to_vec(),
    };
    Some((Step::new("positions", text).with(&numbers), warning))
}

/// The step that explains the positions: from the header first, then fitted to them.
fn even_positions(x: &[f64], quantum: f64, declared: &Declared) -> Option<Even> {
    let count = x.len() as f64;
    let metres = |length: &Option<KeptLength>| match length {
        Some(KeptLength::Metres(metres, _)) => Some(*metres),
        _ => None,
    };
    let length = metres(&declared.width);
    let candidates = [
        (
            length.map(|l| l / count),
            "the declared length and the number of samples",
        ),
        (
            length.map(|l| l / (count - 1.0)),
            "the declared length and the number of steps",
        ),
        (metres(&declared.step), "the declared distance of samples"),
    ];
    let largest = x.iter().fold(0.0_f64, |most, x| most.max(x.abs()));
    let slack = quantum * 1e-6 + 8.0 * f64::EPSILON * largest;
    for (step, from) in candidates {
        let Some(step) = step else {
            continue;
        };
        let (low, high) = offsets(x, step);
        if high - low <= quantum + slack {
            let first = x.first().copied().unwrap_or_default();
            // The first position stays as written where the rounding allows it.
            let (lowest, highest) = (high - quantum / 2.0, low + quantum / 2.0);
            let origin = if (lowest - slack..=highest + slack).contains(&first) {
                first
            } else {
                first.max(lowest).min(highest)
            };
            return Some(Even { origin, step, from });
        }
    }
    if x.len() < FITTED_FROM_SAMPLES {
        return None;
    }
    let step = fitted_step(x);
    let (low, high) = offsets(x, step);
    (step > 0.0 && high - low <= FIT_BAND * quantum).then_some(Even {
        origin: f64::midpoint(low, high),
        step,
        from: "a straight line through them",
    })
}

/// Smallest and largest `x_i - i s`.
fn offsets(x: &[f64], step: f64) -> (f64, f64) {
    x.iter()
        .enumerate()
        .map(|(index, x)| x - index as f64 * step)
        .fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), o| {
            (low.min(o), high.max(o))
        })
}

/// Slope of the least-squares line of positions over their number.
fn fitted_step(x: &[f64]) -> f64 {
    let count = x.len() as f64;
    let middle = (count - 1.0) / 2.0;
    let weighted: f64 = x
        .iter()
        .enumerate()
        .map(|(index, x)| (index as f64 - middle) * x)
        .sum();
    weighted * 12.0 / (count * (count * count - 1.0))
}

/// Warnings where the header and the data differ in length, distance of samples or their number.
pub(crate) fn compare(
    x: &[f64],
    samples: usize,
    count: Option<usize>,
    declared: &Declared,
) -> Vec<Warning> {
    let mut warnings = Vec::new();
    let (Some(first), Some(last)) = (x.first(), x.last()) else {
        return warnings;
    };
    let span = last - first;
    let step = span / (x.len().max(2) - 1) as f64;
    if let Some(KeptLength::Metres(length, rounding)) = declared.width {
        let tolerance = (LENGTH_TOLERANCE * length).max(2.0 * step) + rounding;
        if (length - span).abs() > tolerance {
            warnings.push(differs(
                &format!(
                    "the header gives a length of {}, the data run over {}",
                    format_length(length),
                    format_length(span)
                ),
                [("declared_m", length), ("found_m", span)],
            ));
        }
    }
    if let Some(KeptLength::Metres(declared_step, rounding)) = declared.step {
        let off = (declared_step - step).abs();
        if off > STEP_TOLERANCE * declared_step + rounding {
            warnings.push(differs(
                &format!(
                    "the header gives samples {} apart, in the data they are {} apart on average ({} off)",
                    format_length(declared_step),
                    format_length(step),
                    format_percent(off / declared_step, 2)
                ),
                [("declared_m", declared_step), ("found_m", step)],
            ));
        }
    }
    if let Some(count) = count
        && count != samples
    {
        warnings.push(differs(
            &format!("the file says {count} samples, it holds {samples}"),
            [("declared", count as f64), ("found", samples as f64)],
        ));
    }
    warnings
}

fn differs(message: &str, numbers: [(&'static str, f64); 2]) -> Warning {
    Warning {
        code: Code::FileDefect,
        message: format!("{message}; the data are used"),
        advice: "check that the scan ran to its end and that the file is complete".to_owned(),
        numbers: numbers.to_vec(),
    }
}

#[cfg(test)]
mod tests {
    #![expect(clippy::float_cmp, reason = "exact powers of ten and equal positions")]

    use super::*;

    fn declared(width: Option<f64>, step: Option<f64>) -> Declared {
        let kept = |metres: f64| KeptLength::Metres(metres, 0.0);
        Declared {
            width: width.map(kept),
            step: step.map(kept),
            ..Declared::default()
        }
    }

    /// Positions `0.37 i` written to 0.1.
    fn rounded(count: usize, step: f64) -> Vec<f64> {
        (0..count)
            .map(|i| (i as f64 * step * 10.0).round() / 10.0)
            .collect()
    }

    #[test]
    fn rounded_positions_become_even() {
        for declared in [
            declared(Some(370.0), None),
            declared(Some(369.63), None),
            declared(None, Some(0.37)),
            declared(None, None),
            declared(Some(500.0), Some(0.4)),
        ] {
            let mut x = rounded(1000, 0.37);
            let (step, warning) = rebuild(&mut x, 0.1, &declared).unwrap();
            assert_eq!(warning.code, Code::PositionsRebuilt);
            assert!(step.text.contains("rebuilt"));
            for (index, x) in x.iter().enumerate() {
                assert!((x - index as f64 * 0.37).abs() < 0.02, "{index}: {x}");
            }
        }
    }

    #[test]
    fn repeated_positions_by_rounding_are_parted() {
        let mut x = rounded(500, 0.03);
        assert!(x.windows(2).any(|pair| pair[0] == pair[1]));
        rebuild(&mut x, 0.1, &declared(None, Some(0.03))).unwrap();
        assert!(x.windows(2).all(|pair| pair[0] < pair[1]));
    }

    #[test]
    fn uneven_and_finely_written_positions_stay() {
        let mut uneven: Vec<f64> = (0..100)
            .map(|i| f64::from(i) + f64::from(i % 3) * 0.2)
            .collect();
        let before = uneven.clone();
        assert_eq!(
            rebuild(&mut uneven, 0.1, &declared(Some(100.0), Some(1.0))),
            None
        );
        assert_eq!(uneven, before);
        let mut even: Vec<f64> = (0..100).map(|i| f64::from(i) * 0.5).collect();
        assert_eq!(rebuild(&mut even, 0.1, &declared(None, None)), None);
        let mut few = vec![0.0, 1.0, 3.0, 4.0];
        assert_eq!(rebuild(&mut few, 1.0, &declared(None, None)), None);
    }

    #[test]
    fn the_rounding_is_read_from_the_digits() {
        let quantum = |texts: &[&str], largest: f64| {
            let mut watch = RoundingWatch::default();
            for text in texts {
                watch.take(text);
            }
            watch.quantum(largest)
        };
        assert_eq!(quantum(&["0", "0.5", "1"], 1.0), 0.1);
        assert_eq!(quantum(&["0,25", "0,5"], 0.5), 0.01);
        assert_eq!(quantum(&["10", "20"], 20.0), 1.0);
        let fine = quantum(&["0", "1.25e-07", "5.0000001e-05"], 5e-5);
        assert!((fine / 1e-12 - 1.0).abs() < 1e-9);
    }

    #[test]
    fn order_is_watched() {
        let run = |values: &[f64]| {
            let mut watch = OrderWatch::default();
            for value in values {
                watch.take(*value, &value.to_string(), 0)?;
            }
            Ok::<_, TableProblem>((watch.falls(), watch.repeated.is_some()))
        };
        assert_eq!(run(&[0.0, 1.0, 2.0]), Ok((false, false)));
        assert_eq!(run(&[2.0, 1.0, 1.0, 0.0]), Ok((true, true)));
        assert!(matches!(
            run(&[0.0, 1.0, 0.5]),
            Err(TableProblem::BackAndForth { .. })
        ));
    }

    #[test]
    fn header_and_data_are_compared() {
        let x: Vec<f64> = (0..=100).map(|i| f64::from(i) * 1e-6).collect();
        let warn = |declared: &Declared, count| compare(&x, 101, count, declared).len();
        assert_eq!(warn(&declared(Some(1e-4), Some(1e-6)), Some(101)), 0);
        assert_eq!(warn(&declared(Some(1.01e-4), Some(1.001e-6)), None), 0);
        assert_eq!(warn(&declared(Some(2e-4), Some(2e-6)), Some(99)), 3);
    }
}
