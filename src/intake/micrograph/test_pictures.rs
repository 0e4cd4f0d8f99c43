//! Invented pictures for tests: shapes with known size, each pixel the mean over its square.

use std::io::Cursor;

use image::{ImageBuffer, ImageEncoder, Luma};

use super::micrograph_section::MicrographSection;
use super::options::MicrographOptions;
use super::read::read_micrograph;

/// A picture of 16 bits with dark fluid (10 000) in a bright wall (50 000).
#[derive(Clone)]
pub(super) struct Drawn {
    pub(super) width: usize,
    pub(super) height: usize,
    /// 0 for fluid to 1 for wall.
    pub(super) wall: Vec<f64>,
}

/// Samples along one side of a pixel.
const SAMPLES: u32 = 16;

impl Drawn {
    /// Pixels are means of `is_fluid` over their squares.
    pub(super) fn new(width: usize, height: usize, is_fluid: impl Fn(f64, f64) -> bool) -> Self {
        let mut wall = Vec::with_capacity(width * height);
        for i in 0..width * height {
            let (x, y) = ((i % width) as f64, (i / width) as f64);
            let corners = [(0.0, 0.0), (1.0, 0.0), (0.0, 1.0), (1.0, 1.0), (0.5, 0.5)];
            let inside = corners
                .iter()
                .filter(|c| is_fluid(x + c.0, y + c.1))
                .count();
            wall.push(match inside {
                0 => 1.0,
                5 => 0.0,
                _ => {
                    let at = |k: u32| (f64::from(k) + 0.5) / f64::from(SAMPLES);
                    let hits = (0..SAMPLES * SAMPLES)
                        .filter(|k| is_fluid(x + at(k % SAMPLES), y + at(k / SAMPLES)))
                        .count();
                    1.0 - hits as f64 / f64::from(SAMPLES * SAMPLES)
                }
            });
        }
        Self {
            width,
            height,
            wall,
        }
    }

    /// A disc about a point.
    pub(super) fn disc(size: usize, centre: [f64; 2], radius: f64) -> Self {
        Self::new(size, size, |x, y| {
            (x - centre[0]).hypot(y - centre[1]) < radius
        })
    }

    /// Blurred with a Gaussian; borders repeated.
    pub(super) fn blurred(mut self, sigma: f64) -> Self {
        let reach = (4.0 * sigma).ceil() as isize;
        let weights: Vec<f64> = (-reach..=reach)
            .map(|k| (-0.5 * (k as f64 / sigma).powi(2)).exp())
            .collect();
        let total: f64 = weights.iter().sum();
        for (step, count) in [(1, self.width), (self.width, self.height)] {
            let old = self.wall.clone();
            for (i, value) in self.wall.iter_mut().enumerate() {
                let place = (i / step) % count;
                *value = (-reach..=reach)
                    .zip(&weights)
                    .map(|(k, w)| {
                        let to = place.saturating_add_signed(k).min(count - 1);
                        w * old[i - place * step + to * step]
                    })
                    .sum::<f64>()
                    / total;
            }
        }
        self
    }

    /// With nearly Gaussian noise of a standard deviation, share of the contrast.
    pub(super) fn noisy(mut self, deviation: f64) -> Self {
        let mut state = 12_345_u64;
        let mut next = || {
            state = state
                .wrapping_mul(6_364_136_223_846_793_005)
                .wrapping_add(1_442_695_040_888_963_407);
            (state >> 11) as f64 / (1_u64 << 53) as f64
        };
        for value in &mut self.wall {
            let sum: f64 = (0..12).map(|_| next()).sum();
            *value += deviation * (sum - 6.0);
        }
        self
    }

    fn count(share: f64) -> u16 {
        (10_000.0 + 40_000.0 * share).round().clamp(0.0, 65_535.0) as u16
    }

    /// As a 16-bit PNG.
    pub(super) fn png(&self) -> Vec<u8> {
        let raw: Vec<u16> = self.wall.iter().map(|w| Self::count(*w)).collect();
        let buffer =
            ImageBuffer::<Luma<u16>, _>::from_raw(self.width as u32, self.height as u32, raw);
        let mut bytes = Cursor::new(Vec::new());
        buffer
            .unwrap()
            .write_to(&mut bytes, image::ImageFormat::Png)
            .unwrap();
        bytes.into_inner()
    }

    /// As an 8-bit picture of another format.
    pub(super) fn eight_bit(&self, format: image::ImageFormat) -> Vec<u8> {
        let raw: Vec<u8> = self
            .wall
            .iter()
            .map(|w| (Self::count(*w) >> 8) as u8)
            .collect();
        let (width, height) = (self.width as u32, self.height as u32);
        let mut bytes = Cursor::new(Vec::new());
        if format == image::ImageFormat::Jpeg {
            image::codecs::jpeg::JpegEncoder::new_with_quality(&mut bytes, 98)
                .write_image(&raw, width, height, image::ExtendedColorType::L8)
                .unwrap();
        } else {
            image::write_buffer_with_format(
                &mut bytes,
                &raw,
                width,
                height,
                image::ExtendedColorType::L8,
                format,
            )
            .unwrap();
        }
        bytes.into_inner()
    }
}

/// One micrometre a pixel.
pub(super) fn micrometre() -> MicrographOptions {
    MicrographOptions {
        scale: Some(1e-6),
        ..MicrographOptions::default()
    }
}

/// Reads a picture drawn, one micrometre a pixel.
pub(super) fn read(drawn: &Drawn) -> MicrographSection {
    read_micrograph(&drawn.png(), &micrometre()).unwrap()
}
