//! What is done against noise, on request only: a median over a square, or a Gaussian.
//!
//! A median keeps straight edges in place and rounds corners within its radius (Huang, Yang, Tang 1979, "A
//! fast two-dimensional median filtering algorithm", doi:10.1109/TASSP.1979.1163188, from memory). A
//! Gaussian of standard deviation s moves a wall of radius r by about s^2/(2 r) towards its centre. At
//! the border the outermost pixels are repeated.

use rayon::prelude::*;

use super::grey::Grey;
use super::options::Denoise;
use crate::intake::step::Step;

/// Largest radius of a median, pixels.
const LARGEST_RADIUS: u32 = 10;
/// Largest standard deviation of a Gaussian, pixels.
const LARGEST_SIGMA: f64 = 20.0;
/// Standard deviations from the middle of a Gaussian to its end.
const GAUSSIAN_REACH: f64 = 4.0;

impl Denoise {
    /// Whether its radius or deviation is within the limits.
    pub(super) fn is_in_range(self) -> bool {
        match self {
            Self::None => true,
            Self::Median(radius) => (1..=LARGEST_RADIUS).contains(&radius),
            Self::Gaussian(sigma) => sigma > 0.0 && sigma <= LARGEST_SIGMA,
        }
    }
}

/// The picture with less noise, and the step that says so.
pub(super) fn denoised(grey: Grey, denoise: Denoise) -> (Grey, Option<Step>) {
    match denoise {
        Denoise::Median(radius) if denoise.is_in_range() => {
            let text = format!(
                "each pixel replaced by the median of {0} x {0} pixels about it, as asked",
                2 * radius + 1
            );
            let step = Step::new("denoise", text).with(&[("radius_px", f64::from(radius))]);
            (median(&grey, radius as usize), Some(step))
        }
        Denoise::Gaussian(sigma) if denoise.is_in_range() => {
            let text = format!("blurred with a Gaussian of {sigma} pixels, as asked");
            let step = Step::new("denoise", text).with(&[("sigma_px", sigma)]);
            (gaussian(grey.refined(), sigma), Some(step))
        }
        _ => (grey, None),
    }
}

/// Median over a square.
fn median(grey: &Grey, radius: usize) -> Grey {
    let (width, height) = (grey.width, grey.height);
    let mut values = vec![0_u16; grey.values.len()];
    values
        .par_chunks_mut(width.max(1))
        .enumerate()
        .for_each(|(y, out)| {
            let rows: Vec<&[u16]> = (0..=2 * radius)
                .map(|k| grey.row((y + k).saturating_sub(radius).min(height - 1)))
                .collect();
            let mut square = Vec::with_capacity((2 * radius + 1) * (2 * radius + 1));
            for (x, value) in out.iter_mut().enumerate() {
                square.clear();
                for row in &rows {
                    if let Some(inside) = x
                        .checked_sub(radius)
                        .and_then(|from| row.get(from..=x + radius))
                    {
                        square.extend_from_slice(inside);
                    } else {
                        let column = |k: usize| (x + k).saturating_sub(radius).min(width - 1);
                        square.extend((0..=2 * radius).filter_map(|k| row.get(column(k)).copied()));
                    }
                }
                let middle = square.len() / 2;
                if middle < square.len() {
                    *value = *square.select_nth_unstable(middle).1;
                }
            }
        });
    Grey { values, ..*grey }
}

/// Weights of a Gaussian from its middle outwards, their two-sided sum one.
fn weights(sigma: f64) -> Vec<f32> {
    let reach = (GAUSSIAN_REACH * sigma).ceil().max(1.0) as usize;
    let raw: Vec<f64> = (0..=reach)
        .map(|i| (-0.5 * (i as f64 / sigma).powi(2)).exp())
        .collect();
    let total: f64 = 2.0 * raw.iter().sum::<f64>() - raw.first().copied().unwrap_or(0.0);
    raw.iter().map(|w| (w / total) as f32).collect()
}

/// Blurs along the rows, then along the columns.
fn gaussian(grey: Grey, sigma: f64) -> Grey {
    let weights = weights(sigma);
    let along_rows = blurred_rows(&grey, &weights);
    drop(grey);
    blurred_columns(&along_rows, &weights)
}

fn blurred_rows(grey: &Grey, weights: &[f32]) -> Grey {
    let reach = weights.len() - 1;
    let mut values = vec![0_u16; grey.values.len()];
    values
        .par_chunks_mut(grey.width.max(1))
        .enumerate()
        .for_each(|(y, out)| {
            let row = grey.row(y);
            let (Some(&first), Some(&last)) = (row.first(), row.last()) else {
                return;
            };
            let mut padded = vec![f32::from(first); reach];
            padded.extend(row.iter().map(|&v| f32::from(v)));
            padded.resize(row.len() + 2 * reach, f32::from(last));
            for (value, window) in out.iter_mut().zip(padded.windows(2 * reach + 1)) {
                let (before, from_middle) = window.split_at(reach);
                let right = from_middle.iter().zip(weights);
                let left = before.iter().rev().zip(weights.iter().skip(1));
                let sum: f32 = right.chain(left).map(|(v, w)| v * w).sum();
                *value = sum.round() as u16;
            }
        });
    Grey { values, ..*grey }
}

fn blurred_columns(grey: &Grey, weights: &[f32]) -> Grey {
    let mut values = vec![0_u16; grey.values.len()];
    values
        .par_chunks_mut(grey.width.max(1))
        .enumerate()
        .for_each(|(y, out)| {
            let mut sums = vec![0.0_f32; grey.width];
            let mut add = |row: &[u16], w: f32| {
                for (sum, &v) in sums.iter_mut().zip(row) {
                    *sum += w * f32::from(v);
                }
            };
            for (k, &w) in weights.iter().enumerate() {
                add(grey.row((y + k).min(grey.height - 1)), w);
                if k > 0 {
                    add(grey.row(y.saturating_sub(k)), w);
                }
            }
            for (value, sum) in out.iter_mut().zip(&sums) {
                *value = sum.round() as u16;
            }
        });
    Grey { values, ..*grey }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn grey(width: usize, values: Vec<u16>) -> Grey {
        Grey {
            width,
            height: values.len() / width,
            values,
            offset: 0.0,
            unit: 1.0,
            full_scale: [0.0, 255.0],
            step: 1.0,
        }
    }

    #[test]
    fn a_median_takes_single_pixels_away_and_keeps_edges() {
        let mut values: Vec<u16> = (0..81).map(|i| if i % 9 < 4 { 10 } else { 200 }).collect();
        let clean = values.clone();
        values[9 * 4 + 2] = 255;
        values[9 * 6 + 7] = 0;
        assert_eq!(median(&grey(9, values), 1).values, clean);
    }

    #[test]
    fn a_gaussian_keeps_the_sum_and_has_its_deviation() {
        let (n, sigma) = (41_usize, 2.0_f64);
        let mut values = vec![0_u16; n * n];
        values[20 * n + 20] = 60_000;
        let out = gaussian(grey(n, values), sigma);
        let moment = |power: i32| -> f64 {
            (0..n * n)
                .map(|i| f64::from(out.values[i]) * ((i % n) as f64 - 20.0).powi(power))
                .sum()
        };
        assert!((moment(0) / 60_000.0 - 1.0).abs() < 0.01, "{}", moment(0));
        let deviation = (moment(2) / moment(0)).sqrt();
        assert!((deviation / sigma - 1.0).abs() < 0.02, "{deviation}");
    }

    #[test]
    fn small_pictures_do_not_break_it() {
        for (width, count) in [(1, 1), (1, 3), (3, 3)] {
            for denoise in [Denoise::Median(3), Denoise::Gaussian(5.0)] {
                let (out, _) = denoised(grey(width, vec![7; count]), denoise);
                assert!(
                    out.values
                        .iter()
                        .all(|&v| (out.to_file(f64::from(v)) - 7.0).abs() < 0.01)
                );
            }
        }
    }
}
