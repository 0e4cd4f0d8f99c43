//! What a response picture shows: resistance or conductance on a logarithmic scale, with round values.

use super::document::{ResponseDocument, ShownUnit};
use crate::report::numbers::significant;
use crate::report::ticks::{self, round_above};
use crate::study::ResponseParameter;

/// Fewest and most round values aimed at.
const LEVELS: [usize; 2] = [5, 11];
/// Ticks along an axis, about.
const TICKS: f64 = 6.0;

/// The quantity shown, with the range it takes.
pub(super) struct Shown {
    /// Name and unit, the power of ten in it.
    pub(super) heading: String,
    /// Short name for titles.
    pub(super) name: &'static str,
    /// `mu` where the resistance is shown.
    viscosity: Option<f64>,
    /// Size of the unit, SI.
    unit: f64,
    /// Smallest and largest value, in the unit.
    pub(super) range: [f64; 2],
    /// Round values with their labels, rising.
    pub(super) levels: Vec<(f64, String)>,
}

impl Shown {
    /// Resistance where there is a fluid, else conductance.
    ///
    /// - `conductances`: all that are drawn, m^4
    pub(super) fn new(
        document: &ResponseDocument<'_>,
        conductances: impl Iterator<Item = f64>,
    ) -> Option<Self> {
        let viscosity = document.fluid.map(|fluid| fluid.viscosity);
        let si = |k: f64| viscosity.map_or(k, |mu| mu / k);
        let [low, high] = conductances.map(si).fold(
            [f64::INFINITY, f64::NEG_INFINITY],
            |[low, high]: [f64; 2], v| [low.min(v), high.max(v)],
        );
        if !(low.is_finite() && high.is_finite() && low > 0.0 && high > low) {
            return None;
        }
        let power = high.log10().floor() as i32;
        let unit = 10_f64.powi(power);
        let range = [low / unit, high / unit];
        let (name, si_unit) = match viscosity {
            Some(_) => ("resistance per length R' = mu / K", "Pa s/m^4"),
            None => ("conductance K", "m^4"),
        };
        Some(Self {
            heading: format!("{name} in 1e{power} {si_unit}"),
            name,
            viscosity,
            unit,
            range,
            levels: round_values(range),
        })
    }

    /// A conductance as it is shown.
    pub(super) fn value(&self, conductance: f64) -> f64 {
        self.viscosity.map_or(conductance, |mu| mu / conductance) / self.unit
    }

    /// Place of a shown value between the smallest (0) and the largest (1), by logarithm.
    pub(super) fn share(&self, value: f64) -> f64 {
        let [low, high] = self.range;
        (value / low).ln() / (high / low).ln()
    }
}

/// Round values strictly inside a range: 1, 2, 5 over decades, closer ones over less, even steps over little.
fn round_values([low, high]: [f64; 2]) -> Vec<(f64, String)> {
    let sets: [&[f64]; 3] = [
        &[1.0],
        &[1.0, 2.0, 5.0],
        &[1.0, 1.5, 2.0, 3.0, 4.0, 5.0, 6.0, 8.0],
    ];
    let inside = |v: f64| v > low * (1.0 + 1e-9) && v < high * (1.0 - 1e-9);
    let mut chosen: Vec<(f64, String)> = Vec::new();
    for set in sets {
        let (first, last) = (low.log10().floor() as i32, high.log10().ceil() as i32);
        let values = (first..=last).flat_map(|p| set.iter().map(move |m| m * 10_f64.powi(p)));
        let values: Vec<f64> = values.filter(|v| inside(*v)).collect();
        if values.len() > LEVELS[1] {
            break;
        }
        chosen = values
            .into_iter()
            .map(|v| (v, format!("{}", short(v))))
            .collect();
        if chosen.len() >= LEVELS[0] {
            return chosen;
        }
    }
    let Some(step) = round_above((high - low) / 9.0).filter(|_| high < 8.0 * low) else {
        return chosen;
    };
    let first = (low / step).ceil() as i64;
    let steps = (first..first + 24).map(|k| k as f64 * step);
    let even: Vec<(f64, String)> = steps
        .filter(|v| inside(*v))
        .map(|v| (v, ticks::label(v, step)))
        .collect();
    if even.len() >= chosen.len() {
        even
    } else {
        chosen
    }
}

/// A round value without the dust of powers of ten.
fn short(value: f64) -> f64 {
    significant(value, 3).parse().unwrap_or(value)
}

/// Round values along an axis, SI, with their labels in the unit.
pub(super) fn axis_ticks(parameter: &ResponseParameter, unit: ShownUnit) -> Vec<(f64, String)> {
    let [low, high] = [parameter.low, parameter.high].map(|v| v / unit.size);
    let Some(step) = round_above((high - low) / TICKS) else {
        return Vec::new();
    };
    let slack = 1e-9 * (high - low);
    let first = ((low - slack) / step).ceil() as i64;
    (first..first + 24)
        .map(|k| k as f64 * step)
        .take_while(|v| *v <= high + slack)
        .map(|v| (v * unit.size, ticks::label(v, step)))
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn round_values_are_few_but_not_too_few_over_any_range() {
        for (low, high) in [
            (1.0, 1.02),
            (0.9, 1.3),
            (1.0, 2.5),
            (1.2, 9.0),
            (0.3, 7.0),
            (0.01, 9.0),
            (1e-5, 8.0),
        ] {
            let levels = round_values([low, high]);
            assert!((3..=13).contains(&levels.len()), "{low} {high}: {levels:?}");
            for (value, label) in &levels {
                assert!(*value > low && *value < high);
                let read: f64 = label.parse().unwrap();
                assert!((read / value - 1.0).abs() < 1e-9, "{label} {value}");
            }
            for pair in levels.windows(2) {
                assert!(pair[0].0 < pair[1].0 && pair[0].1 != pair[1].1);
            }
        }
    }
}
