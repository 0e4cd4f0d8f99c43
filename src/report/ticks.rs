//! Round values for axes, contours and scale bars: 1, 2 or 5 times a power of ten.

/// The largest round value not above `limit`; `None` unless `limit` is positive and finite.
pub(crate) fn round_below(limit: f64) -> Option<f64> {
    if !limit.is_finite() || limit <= 0.0 {
        return None;
    }
    let power = limit.log10().floor() as i32;
    [(5.0, power), (2.0, power), (1.0, power), (5.0, power - 1)]
        .into_iter()
        .map(|(digit, p)| decimal(digit, p))
        .find(|v| *v <= limit * (1.0 + 1e-12))
}

/// The smallest round value not below `limit`; `None` unless `limit` is positive and finite.
pub(crate) fn round_above(limit: f64) -> Option<f64> {
    if !limit.is_finite() || limit <= 0.0 {
        return None;
    }
    let power = limit.log10().floor() as i32;
    [(1.0, power), (2.0, power), (5.0, power), (1.0, power + 1)]
        .into_iter()
        .map(|(digit, p)| decimal(digit, p))
        .find(|v| *v >= limit * (1.0 - 1e-12))
}

/// A level nearer than this share to the top would only trace noise around the peak.
const NEAREST_TO_TOP: f64 = 0.97;

/// Multiples of a round step above 0 and clearly below `top`, at most `most` of them, with the step.
pub(crate) fn levels(top: f64, most: usize) -> (Vec<f64>, f64) {
    let Some(step) = round_above(top / (most + 1) as f64) else {
        return (Vec::new(), 0.0);
    };
    let count = (NEAREST_TO_TOP * top / step).floor() as usize;
    ((1..=count).map(|i| i as f64 * step).collect(), step)
}

/// A value of a tick with as many decimals as its step needs.
pub(crate) fn label(value: f64, step: f64) -> String {
    let decimals = if step > 0.0 {
        (-step.log10().floor()).clamp(0.0, 12.0) as usize
    } else {
        0
    };
    format!("{value:.decimals$}")
}

/// `digit` times ten to `power`, exact in decimals where a double can be.
fn decimal(digit: f64, power: i32) -> f64 {
    if power < 0 {
        digit / 10_f64.powi(-power)
    } else {
        digit * 10_f64.powi(power)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn steps_are_one_two_five() {
        assert_eq!(round_below(0.9), Some(0.5));
        assert_eq!(round_below(1.0), Some(1.0));
        assert_eq!(round_below(37e-6), Some(20e-6));
        assert_eq!(round_above(0.21), Some(0.5));
        assert_eq!(round_above(1001.0), Some(2000.0));
        assert_eq!(round_above(0.0), None);
        assert_eq!(round_below(f64::NAN), None);
    }

    #[test]
    fn levels_lie_inside_and_are_not_too_many() {
        for top in [2.096_f64, 1.0, 0.37, 9.99, 1e-7, 4321.0] {
            let (values, step) = levels(top, 10);
            assert!(values.len() >= 3 && values.len() <= 10, "{top}: {values:?}");
            assert!(values.iter().all(|v| *v > 0.0 && *v < top), "{top} {step}");
        }
        assert!(levels(f64::INFINITY, 10).0.is_empty());
    }

    #[test]
    fn labels_show_the_step_exactly() {
        assert_eq!(label(0.6, 0.2), "0.6");
        assert_eq!(label(1.0, 0.5), "1.0");
        assert_eq!(label(40.0, 20.0), "40");
        assert_eq!(label(0.15, 0.05), "0.15");
    }
}
