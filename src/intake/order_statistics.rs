//! Medians, robust scatter and the mode of a set of heights.

/// Ratio of the standard deviation of normal scatter to its median absolute deviation.
pub(crate) const MAD_TO_SD: f64 = 1.4826;

/// The value below which `share` of the values lie; NaN where there is none. The order is lost.
pub(crate) fn quantile(values: &mut [f64], share: f64) -> f64 {
    let Some(last) = values.len().checked_sub(1) else {
        return f64::NAN;
    };
    let at = ((last as f64) * share.clamp(0.0, 1.0)).round() as usize;
    *values
        .select_nth_unstable_by(at.min(last), f64::total_cmp)
        .1
}

/// The median; NaN where there is no value. The order is lost.
pub(crate) fn median(values: &mut [f64]) -> f64 {
    quantile(values, 0.5)
}

/// Robust standard deviation about a centre: 1.4826 times the median distance from it. The values are lost.
pub(crate) fn scatter_about(values: &mut [f64], centre: f64) -> f64 {
    for value in values.iter_mut() {
        *value = (*value - centre).abs();
    }
    MAD_TO_SD * median(values)
}

/// At most about `count` of the values, evenly taken.
pub(crate) fn thinned(values: &[f64], count: usize) -> Vec<f64> {
    let stride = values.len().div_ceil(count.max(1)).max(1);
    values.iter().copied().step_by(stride).collect()
}

/// The half-sample mode: the place where sorted values lie closest.
///
/// Half of the values that span the shortest range are kept, again and again. Bickel and Fruehwirth (2006),
/// *On a fast, robust estimator of the mode*, Comput. Stat. Data Anal. 50, 3500; from memory.
pub(crate) fn half_sample_mode(sorted: &[f64]) -> f64 {
    let mut kept = sorted;
    while kept.len() > 3 {
        let half = kept.len().div_ceil(2);
        let shortest = kept
            .windows(half)
            .enumerate()
            .map(|(at, window)| (at, window[half - 1] - window[0]))
            .min_by(|a, b| a.1.total_cmp(&b.1));
        let Some((at, _)) = shortest else { break };
        kept = &kept[at..at + half];
    }
    kept.get(kept.len() / 2).copied().unwrap_or(f64::NAN)
}

/// Noise from sample to sample, m: robust scatter of second differences, divided by `sqrt(6)`.
///
/// Slopes drop out; heights that the instrument has smoothed give too small a value.
pub(crate) fn noise_of_neighbours(z: &[f64]) -> f64 {
    let stride = (z.len() / 200_000).max(1);
    let mut bends: Vec<f64> = z
        .windows(3)
        .step_by(stride)
        .map(|w| w[0] - 2.0 * w[1] + w[2])
        .collect();
    let scatter = scatter_about(&mut bends, 0.0) / 6.0_f64.sqrt();
    if scatter.is_finite() { scatter } else { 0.0 }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_mode_is_the_crowded_place_not_the_middle() {
        let mut values: Vec<f64> = (0..60).map(f64::from).collect();
        values.extend((0..40).map(|k| 58.0 + 0.01 * f64::from(k)));
        values.sort_by(f64::total_cmp);
        assert!((half_sample_mode(&values) - 58.2).abs() < 0.3);
        assert!(half_sample_mode(&[]).is_nan());
    }

    #[test]
    fn robust_scatter_of_normal_noise_is_its_standard_deviation() {
        let mut noise = crate::intake::trace::test_traces::Noise::new(1);
        let mut values: Vec<f64> = (0..20_001).map(|_| noise.normal()).collect();
        assert!((noise_of_neighbours(&values) - 1.0).abs() < 0.03);
        assert!((scatter_about(&mut values, 0.0) - 1.0).abs() < 0.03);
        assert!(median(&mut []).is_nan());
    }
}
