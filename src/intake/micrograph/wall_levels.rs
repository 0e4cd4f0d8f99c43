//! Grey levels of fluid and wall beside the section's edge, away from the edge's own greys.
//!
//! Pixels are sorted by their city-block distance from the edge; the medians of a band on either side are the two
//! levels. Half-way between them lies the wall: an edge pixel that is half fluid and half wall has that
//! grey, and a symmetric blur leaves the place of that grey on a straight edge unchanged.

use super::grey::Grey;
use super::levels::Histogram;
use super::micrograph_section::PixelLoop;
use super::regions::Level;
use crate::intake::order_statistics::MAD_TO_SD;

/// Distance of the bands from the edge without knowledge of its width, pixels.
pub(super) const FIRST_DISTANCE: u8 = 3;
/// Largest distance, pixels.
pub(super) const LAST_DISTANCE: u8 = 80;
/// Width of the bands, pixels.
const BAND: u8 = 9;
/// Fewest pixels of a band, unless there are no more.
const LEAST_IN_BAND: u64 = 64;

/// Levels beside the edge, in counts.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Sides {
    pub(super) fluid: f64,
    pub(super) wall: f64,
    /// Scatter of neighbouring pixels on either side: standard deviation of their differences.
    pub(super) noise: f64,
}

impl Sides {
    /// The level at a share of the way from wall (0) to fluid (1).
    pub(super) fn at(&self, share: f64) -> f64 {
        self.wall + share * (self.fluid - self.wall)
    }

    /// Fluid minus wall.
    pub(super) fn contrast(&self) -> f64 {
        (self.fluid - self.wall).abs()
    }
}

/// City-block distance of each pixel from the nearest one on the other side, at most 255.
fn distances(mask: &[u8], width: usize) -> Vec<u8> {
    let mut distance = vec![u8::MAX; mask.len()];
    let height = mask.len() / width;
    for y in 0..height {
        sweep_row(&mut distance, mask, width, y, y.checked_sub(1));
    }
    for y in (0..height).rev() {
        sweep_row(
            &mut distance,
            mask,
            width,
            y,
            Some(y + 1).filter(|below| *below < height),
        );
    }
    distance
}

/// Distances of a row from those of a neighbouring row and from each other, both ways.
fn sweep_row(distance: &mut [u8], mask: &[u8], width: usize, y: usize, from: Option<usize>) {
    let row_of = |y: usize| mask.get(y * width..(y + 1) * width).unwrap_or_default();
    let step = |same: bool, distance: u8| if same { distance.saturating_add(1) } else { 1 };
    let own_mask = row_of(y);
    if let Some(other) = from {
        let (low, high) = distance.split_at_mut(y.max(other) * width);
        let (own, near) = if other < y {
            (high.get_mut(..width), low.get(other * width..))
        } else {
            (low.get_mut(y * width..), high.get(..width))
        };
        let (own, near) = (own.unwrap_or_default(), near.unwrap_or_default());
        for (((d, n), m), k) in own.iter_mut().zip(near).zip(own_mask).zip(row_of(other)) {
            *d = (*d).min(step(m == k, *n));
        }
    }
    let own = distance
        .get_mut(y * width..(y + 1) * width)
        .unwrap_or_default();
    let mut last: Option<(u8, u8)> = None;
    for (d, &m) in own.iter_mut().zip(own_mask) {
        if let Some((before, k)) = last {
            *d = (*d).min(step(k == m, before));
        }
        last = Some((*d, m));
    }
    last = None;
    for (d, &m) in own.iter_mut().zip(own_mask).rev() {
        if let Some((before, k)) = last {
            *d = (*d).min(step(k == m, before));
        }
        last = Some((*d, m));
    }
}

/// Measures the levels in bands at a distance from the edge; `None` if a side has no pixels.
pub(super) fn measure(grey: &Grey, mask: &[u8], level: Level, distance: u8) -> Option<Sides> {
    let width = grey.width.max(1);
    let distances = distances(mask, width);
    let deepest = distances
        .iter()
        .zip(mask)
        .filter(|(_, m)| **m == 1)
        .map(|(d, _)| *d)
        .max()?;
    let most = |wanted: u8, deepest: u8| wanted.min(deepest.div_ceil(2)).max(1);
    let inner = most(distance, deepest);
    let pixels = || grey.values.iter().zip(mask).zip(&distances);
    let fluid = Histogram::of(
        pixels()
            .filter(|((_, m), d)| **m == 1 && **d >= inner)
            .map(|((v, _), _)| *v),
    );
    // Where walls are thin the band moves towards the edge until it holds enough pixels.
    let is_wall = |v: u16, m: u8| m == 0 && !level.is_fluid(v);
    let mut rings = [0_u64; 256];
    for ((v, m), d) in pixels() {
        if is_wall(*v, *m)
            && let Some(ring) = rings.get_mut(usize::from(*d))
        {
            *ring += 1;
        }
    }
    let band = |from: u8| from..=from.saturating_add(BAND);
    let holds = |from: u8| -> u64 {
        let from_to = band(from);
        let rings = rings.get(usize::from(*from_to.start())..=usize::from(*from_to.end()));
        rings.unwrap_or_default().iter().sum()
    };
    let from = (1..=distance)
        .rev()
        .find(|from| holds(*from) >= LEAST_IN_BAND);
    let band = band(from.unwrap_or(1));
    let wall = Histogram::of(
        pixels()
            .filter(|((v, m), d)| is_wall(**v, **m) && band.contains(*d))
            .map(|((v, _), _)| *v),
    );
    let noise = noise(grey, mask, &distances, inner);
    Some(Sides {
        fluid: fluid.quantile(0.5)?,
        wall: wall.quantile(0.5)?,
        noise,
    })
}

/// Most pixels whose noise is looked at.
const NOISE_PIXELS: usize = 2_000_000;

/// Scatter of the differences of neighbours along rows, away from the edge: 1.4826 times their median size, the
/// standard deviation for a Gaussian; the larger of both sides.
fn noise(grey: &Grey, mask: &[u8], distances: &[u8], from: u8) -> f64 {
    let width = grey.width.max(1);
    let every = mask.len().div_ceil(NOISE_PIXELS).max(1);
    let side = |inside: u8| {
        let rows = mask.chunks(width).zip(distances.chunks(width)).enumerate();
        let differences = rows.step_by(every).flat_map(|(y, (mask, distances))| {
            let row = grey.row(y).windows(2).zip(mask.windows(2)).zip(distances);
            row.filter_map(move |((v, m), d)| match (v, m) {
                ([a, b], [m, n])
                    if *m == inside && *n == inside && *d > from && *d < LAST_DISTANCE =>
                {
                    Some(a.abs_diff(*b))
                }
                _ => None,
            })
        });
        let histogram = Histogram::of(differences);
        MAD_TO_SD * histogram.quantile(0.5).unwrap_or(0.0)
    };
    side(0).max(side(1))
}

/// The two pixels between which a crossing lies, by the coordinate that is not half-way in a pixel.
fn pair(grey: &Grey, [x, y]: [f64; 2]) -> [u16; 2] {
    let is_centre = |c: f64| (c - c.floor() - 0.5).abs() < 1e-9;
    let at = |x: f64, y: f64| grey.at(x.max(0.0) as usize, y.max(0.0) as usize);
    if is_centre(x) {
        [at(x, y - 0.5), at(x, y + 0.5)]
    } else {
        [at(x - 0.5, y), at(x + 0.5, y)]
    }
}

/// Share of the contour's crossings that jump from one level to the other without a grey in between.
pub(super) fn share_of_jumps(grey: &Grey, loops: &[PixelLoop], sides: &Sides) -> f64 {
    /// A grey is a level itself within this share of the contrast.
    const LEVEL_SHARE: f64 = 0.1;
    let jumps = |v: u16, level: f64| (f64::from(v) - level).abs() <= LEVEL_SHARE * sides.contrast();
    let is_jump = |[a, b]: [u16; 2]| {
        jumps(a, sides.fluid) && jumps(b, sides.wall)
            || jumps(b, sides.fluid) && jumps(a, sides.wall)
    };
    let points = || loops.iter().flatten();
    let count = points().filter(|p| is_jump(pair(grey, **p))).count();
    count as f64 / points().count().max(1) as f64
}

/// Width of the edge between 20 % and 80 % from the slope of the greys at the contour, for a first look, pixels.
pub(super) fn width_by_slope(grey: &Grey, loops: &[PixelLoop], contrast: f64) -> f64 {
    let slope = |p: &[f64; 2]| {
        let at = |dx: f64, dy: f64| {
            f64::from(grey.at((p[0] + dx).max(0.0) as usize, (p[1] + dy).max(0.0) as usize))
        };
        0.5 * (at(1.0, 0.0) - at(-1.0, 0.0)).hypot(at(0.0, 1.0) - at(0.0, -1.0))
    };
    let (mut sum, mut count) = (0.0, 0.0);
    for p in loops.iter().flatten() {
        sum += slope(p);
        count += 1.0;
    }
    let width = 0.6 * contrast * count / sum;
    if width.is_finite() { width } else { 1.0 }
}

#[cfg(test)]
mod tests {
    use super::super::options::Tone;
    use super::*;

    #[test]
    fn distances_are_those_of_a_rook() {
        let width = 7;
        let mut mask = vec![0_u8; 49];
        mask[24] = 1;
        let found = distances(&mask, width);
        for (i, &d) in found.iter().enumerate() {
            let (x, y) = ((i % 7).abs_diff(3), (i / 7).abs_diff(3));
            assert_eq!(usize::from(d), (x + y).max(1));
        }
    }

    #[test]
    fn levels_are_those_away_from_the_edge() {
        let (width, height) = (60, 60);
        let mut values = Vec::new();
        let mut mask = Vec::new();
        for i in 0..width * height {
            let x = i % width;
            // A dark stripe with blurred edges at columns 10 and 50.
            let beyond = (x as f64 - 29.5).abs() - 20.0;
            values.push((1000.0 + 9000.0 / (1.0 + (-beyond / 0.7).exp())) as u16);
            mask.push(u8::from(beyond < 0.0));
        }
        let grey = Grey {
            width,
            height,
            values,
            offset: 0.0,
            unit: 1.0,
            full_scale: [0.0, 65535.0],
            step: 1.0,
        };
        let level = Level {
            tone: Tone::Dark,
            counts: 5500.0,
        };
        let sides = measure(&grey, &mask, level, 6).unwrap();
        assert!(
            (sides.fluid - 1000.0).abs() < 5.0 && (sides.wall - 10_000.0).abs() < 15.0,
            "{sides:?}"
        );
        assert!((sides.at(0.5) - 5500.0).abs() < 10.0);
        let loops = vec![vec![[10.0, 30.5], [50.0, 31.5]]];
        assert!(share_of_jumps(&grey, &loops, &sides) < 0.1);
        let width = width_by_slope(&grey, &loops, sides.contrast());
        assert!((1.5..2.5).contains(&width), "{width}");
    }
}
