//! Grey values of a picture, with their relation to the numbers of the file.

use super::micrograph_section::Preview;
use super::options::PixelBox;

/// Widest preview, pixels.
const PREVIEW_WIDTH: u32 = 2000;

/// A grey picture; rows from the top.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Grey {
    pub(super) width: usize,
    pub(super) height: usize,
    /// Counts, row by row.
    pub(super) values: Vec<u16>,
    /// Value of the file for the count 0.
    pub(super) offset: f64,
    /// Value of the file for one count.
    pub(super) unit: f64,
    /// Values of the file at full scale: black and white.
    pub(super) full_scale: [f64; 2],
    /// Smallest difference of two values of the file; zero where they are no whole numbers.
    pub(super) step: f64,
}

impl Grey {
    /// Row `y`, empty below the last one.
    pub(super) fn row(&self, y: usize) -> &[u16] {
        let start = y.saturating_mul(self.width);
        self.values
            .get(start..start.saturating_add(self.width))
            .unwrap_or_default()
    }

    /// Count of a pixel; zero outside.
    pub(super) fn at(&self, x: usize, y: usize) -> u16 {
        if x < self.width {
            self.row(y).get(x).copied().unwrap_or(0)
        } else {
            0
        }
    }

    /// The value of the file for a count.
    pub(super) fn to_file(&self, count: f64) -> f64 {
        self.offset + self.unit * count
    }

    /// The count for a value of the file.
    pub(super) fn counts_of(&self, value: f64) -> f64 {
        (value - self.offset) / self.unit
    }

    /// The part in a box that lies inside.
    pub(super) fn part(&self, crop: PixelBox) -> Self {
        let (x, width) = (crop.x as usize, crop.width as usize);
        let mut values = Vec::with_capacity(width.saturating_mul(crop.height as usize));
        for y in crop.y..crop.y.saturating_add(crop.height) {
            let row = self.row(y as usize);
            values.extend_from_slice(row.get(x..x.saturating_add(width)).unwrap_or_default());
        }
        Self {
            width,
            height: crop.height as usize,
            values,
            ..*self
        }
    }

    /// The same picture with finer counts, so that means of 8-bit values keep their fractions.
    pub(super) fn refined(mut self) -> Self {
        let largest = self.values.iter().copied().max().unwrap_or(0).max(1);
        let factor = (u16::MAX / largest).min(256);
        for value in &mut self.values {
            *value *= factor;
        }
        self.unit /= f64::from(factor);
        self
    }

    /// A small picture for a look: means over squares, stretched from the darkest to the brightest pixel.
    pub(super) fn preview(&self) -> Preview {
        let factor = (self.width as u32).div_ceil(PREVIEW_WIDTH).max(1);
        let side = factor as usize;
        let (width, height) = (self.width.div_ceil(side), self.height.div_ceil(side));
        let low = self.values.iter().copied().min().unwrap_or(0);
        let high = self.values.iter().copied().max().unwrap_or(0);
        let span = f64::from(high - low).max(1.0);
        let mut grey = Vec::with_capacity(width * height);
        for j in 0..height {
            let mut sums = vec![(0_u64, 0_u64); width];
            for y in j * side..((j + 1) * side).min(self.height) {
                for (sum, square) in sums.iter_mut().zip(self.row(y).chunks(side)) {
                    sum.0 += square.iter().map(|&v| u64::from(v)).sum::<u64>();
                    sum.1 += square.len() as u64;
                }
            }
            grey.extend(sums.iter().map(|&(sum, count)| {
                let mean = sum as f64 / count.max(1) as f64;
                ((mean - f64::from(low)) / span * 255.0).round() as u8
            }));
        }
        Preview {
            width: width as u32,
            height: height as u32,
            factor,
            grey,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_preview_is_small_and_stretched() {
        let grey = Grey {
            width: 4001,
            height: 5,
            values: (0..5).flat_map(|_| (0..4001).map(|x| 100 + x)).collect(),
            offset: 0.0,
            unit: 1.0,
            full_scale: [0.0, 65535.0],
            step: 1.0,
        };
        let preview = grey.preview();
        assert_eq!(
            (preview.width, preview.height, preview.factor),
            (1334, 2, 3)
        );
        assert_eq!(preview.grey.len(), 2668);
        assert_eq!((preview.grey[0], preview.grey[1333]), (0, 255));
    }

    #[test]
    fn finer_counts_keep_the_values_of_the_file() {
        let grey = Grey {
            width: 2,
            height: 1,
            values: vec![0, 255],
            offset: 3.0,
            unit: 2.0,
            full_scale: [0.0, 255.0],
            step: 1.0,
        };
        let fine = grey.clone().refined();
        assert_eq!(fine.values, [0, 65280]);
        assert!((fine.to_file(65280.0) - grey.to_file(255.0)).abs() < 1e-9);
        assert!((fine.counts_of(513.0) - 65280.0).abs() < 1e-9);
    }
}
