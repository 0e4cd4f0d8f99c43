//! Whether the fit rises and falls where physics says so: its derivative on a dense grid, and the table itself.

use super::ResponsePoint;
use super::fit::{ChebyshevFit, indices};
use super::parameter::{ParameterScale, ResponseParameter, Trend};

/// Places along each axis of the dense grid, by the number of parameters.
const DENSE: [usize; 3] = [1001, 101, 31];

/// What the fit and the table do along one parameter.
#[derive(Debug, Clone, PartialEq)]
pub struct TrendCheck {
    /// What `K` must do; `None` where nothing general holds.
    pub expected: Option<Trend>,
    /// Why.
    pub because: &'static str,
    /// What the fit does all over the ranges; `None` where it does both.
    pub found: Option<Trend>,
    /// Smallest and largest `dlnK / dln p` of the fit on the dense grid, or `dlnK / dp` where the fit is in the
    /// parameter itself.
    pub slopes: [f64; 2],
    /// Places of the dense grid.
    pub places: usize,
    /// Those at which the sign of the slope is not the expected one.
    pub wrong_places: usize,
    /// Largest relative fall of the fitted `K` against the expected trend along the parameter.
    pub largest_fall: f64,
    /// Values of the parameters where the slope is most against it; empty where it is nowhere.
    pub worst_at: Vec<f64>,
    /// Neighbours in the table along this parameter.
    pub pairs: usize,
    /// Those of which `K` goes against the expected trend by more than their numerical errors.
    pub wrong_pairs: usize,
}

impl TrendCheck {
    /// Whether fit and table do what they must, as far as there is something that they must do.
    pub fn holds(&self) -> bool {
        self.wrong_places == 0 && self.wrong_pairs == 0
    }
}

/// Checks every parameter.
///
/// - `points`: the table, the last parameter running fastest, with `nodes` points along each
pub(super) fn trends(
    parameters: &[ResponseParameter],
    fit: &ChebyshevFit,
    points: &[ResponsePoint],
    nodes: &[usize],
) -> Vec<TrendCheck> {
    let count = DENSE[parameters.len().clamp(1, 3) - 1];
    let shape = vec![count; parameters.len()];
    let scaled = |k: usize| 2.0 * k as f64 / (count - 1) as f64 - 1.0;
    let dense: Vec<(f64, Vec<f64>)> = indices(&shape)
        .map(|index| {
            let place: Vec<f64> = index.iter().map(|&k| scaled(k)).collect();
            fit.value_and_slopes(&place)
        })
        .collect();
    let place = |flat: usize| -> Vec<f64> {
        let index = indices(&shape).nth(flat).unwrap_or_default();
        let pairs = index.iter().zip(parameters);
        pairs.map(|(&k, p)| p.value_at(scaled(k))).collect()
    };
    parameters
        .iter()
        .enumerate()
        .map(|(axis, parameter)| {
            let scaling = parameter.scaling_slope();
            let slopes = || dense.iter().map(|(_, slopes)| slopes[axis] * scaling);
            let [low, high] = slopes().fold([f64::INFINITY, f64::NEG_INFINITY], |[a, b], s| {
                [a.min(s), b.max(s)]
            });
            let sign = parameter.expected.map_or(0.0, Trend::sign);
            let wrong: Vec<(usize, f64)> = slopes()
                .map(|s| sign * s)
                .enumerate()
                .filter(|(_, s)| *s < 0.0)
                .collect();
            let worst = wrong.iter().min_by(|a, b| a.1.total_cmp(&b.1));
            let values: Vec<f64> = dense.iter().map(|(v, _)| sign * v).collect();
            let (pairs, wrong_pairs) = table_pairs(points, nodes, axis, sign);
            TrendCheck {
                expected: parameter.expected,
                because: parameter.expected_because,
                found: match (low > 0.0, high < 0.0) {
                    (true, _) => Some(Trend::Rises),
                    (_, true) => Some(Trend::Falls),
                    _ => None,
                },
                slopes: [low, high],
                places: dense.len(),
                wrong_places: wrong.len(),
                largest_fall: largest_fall(&values, &shape, axis),
                worst_at: worst.map(|(flat, _)| place(*flat)).unwrap_or_default(),
                pairs,
                wrong_pairs,
            }
        })
        .collect()
}

/// Unit of a slope of `ln K` along a parameter.
pub fn slope_unit(parameter: &ResponseParameter) -> &'static str {
    match (parameter.scale(), parameter.unit.name()) {
        (ParameterScale::Linear, "m") => "1/m",
        (ParameterScale::Linear, "rad") => "1/rad",
        _ => "1",
    }
}

/// Largest fall of a value below what it was before along an axis, relative, from logarithms.
fn largest_fall(values: &[f64], shape: &[usize], axis: usize) -> f64 {
    let step: usize = shape[axis + 1..].iter().product();
    let length = shape[axis];
    let mut largest = 0.0_f64;
    for start in 0..values.len() {
        if !(start / step).is_multiple_of(length) {
            continue;
        }
        let mut highest = f64::NEG_INFINITY;
        for k in 0..length {
            let value = values[start + k * step];
            highest = highest.max(value);
            largest = largest.max(highest - value);
        }
    }
    -(-largest).exp_m1()
}

/// Neighbours along an axis, and those that go against the trend by more than their errors.
fn table_pairs(
    points: &[ResponsePoint],
    nodes: &[usize],
    axis: usize,
    sign: f64,
) -> (usize, usize) {
    let step: usize = nodes[axis + 1..].iter().product();
    let (mut pairs, mut wrong) = (0, 0);
    for (flat, point) in points.iter().enumerate() {
        if (flat / step) % nodes[axis] + 1 == nodes[axis] {
            continue;
        }
        let Some(next) = points.get(flat + step) else {
            continue;
        };
        pairs += 1;
        let rise = sign * (next.conductance.value - point.conductance.value);
        wrong += usize::from(rise < -(next.conductance.error + point.conductance.error));
    }
    (pairs, wrong)
}
