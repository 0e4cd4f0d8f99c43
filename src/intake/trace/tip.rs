//! What a stylus tip could reach: the image of the tip taken back from a trace.
//!
//! A stylus reads `i(x) = max over u of s(x + u) - t(u)`: the surface `s` dilated by the tip, `t(u) >= 0` the
//! height of the tip above its apex. So `s <= i`. Taking the tip back is a grey-scale erosion,
//! `r(x) = min over u of i(x + u) + t(u)`, and `s <= r <= i`: nothing of the wall can lie above `r`, or the tip
//! would have been lifted. A channel is the space above the surface, so
//! - the section over `r` is the *smallest* that reads like this trace (the section over `i`, as read, is
//!   smaller still), and
//! - where the tip touched more than one place at once, `r` is the shape of the tip and the wall may lie
//!   anywhere below it.
//!
//! The tip at `p` bounds `r` over all `x` whose minimum comes from `p`. A stretch of many samples that comes
//! from one `p` is the tip's own shape: its ends were touched, its inside was not. Noise is taken
//! for surface: `r` lies lower than the true bound by about the noise, which is small beside a depth.
//!
//! `t` is convex, so the leftmost minima move to the right with `x`, and divide and conquer finds them in
//! O(n log n) whatever the tip. Heights between samples are not looked at, which leaves `r` too high by less
//! than one sample's slope, on the safe side.
//!
//! For a trace that was turned over afterwards this is done on the heights as measured: there the wall of the
//! channel was touched from inside it, and nothing of it can lie below the surface that comes out.
//!
//! Source: J. S. Villarrubia (1997), Algorithms for scanned probe microscope image simulation, surface
//! reconstruction, and tip estimation, J. Res. NIST 102, 425-454, doi:10.6028/jres.102.030 (his images are
//! of hills, so his certainty map marks what is known of hills; the formulas are cited from memory).

use rayon::iter::{IndexedParallelIterator, ParallelIterator};
use rayon::slice::ParallelSliceMut;

use super::profile::Profile;
use super::section_options::Tip;

/// Samples of a block that is searched on its own.
const BLOCK: usize = 8192;

/// A stretch from one tip position is the tip's shape when it has more samples than this,
const TOUCHED_SAMPLES: usize = 3;
/// and is longer than this fraction of the tip radius (11 degrees of the ball).
const TOUCHED_RADII: f64 = 0.2;

/// A trace with the tip taken back.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Reconstruction {
    /// Highest surface that reads like the trace, m, one for each sample.
    pub(super) height: Vec<f64>,
    /// Whether the stretch from each sample to the next is the shape of the ball.
    pub(super) is_tip_shape: Vec<bool>,
}

impl Tip {
    /// Height of the tip above its apex at a distance from its axis, m.
    ///
    /// `R - sqrt(R^2 - u^2)` up to `u = R cos(a/2)`, from there a straight line; `a` the full angle.
    pub fn height_at(&self, distance: f64) -> f64 {
        TipShape::new(*self).height(distance.abs())
    }

    /// The steepest flank it can show, rad against the level: a right angle less half the cone.
    pub fn steepest_flank(&self) -> f64 {
        std::f64::consts::FRAC_PI_2 - 0.5 * self.cone_angle
    }
}

/// The numbers of a tip's shape.
#[derive(Debug, Clone, Copy)]
struct TipShape {
    radius: f64,
    /// Where the cone begins: distance from the axis and height over the apex.
    begin: [f64; 2],
    slope: f64,
}

impl TipShape {
    fn new(tip: Tip) -> Self {
        let (sine, cosine) = (0.5 * tip.cone_angle).sin_cos();
        Self {
            radius: tip.radius,
            begin: [tip.radius * cosine, tip.radius * (1.0 - sine)],
            slope: cosine / sine,
        }
    }

    fn height(&self, u: f64) -> f64 {
        if u < self.begin[0] {
            // The same as R - sqrt(R^2 - u^2) without its cancellation.
            u * u / (self.radius + (self.radius * self.radius - u * u).sqrt())
        } else {
            self.begin[1] + (u - self.begin[0]) * self.slope
        }
    }

    /// Distance from the axis where the tip is this high.
    fn distance(&self, height: f64) -> f64 {
        if height <= self.begin[1] {
            self.begin[0]
        } else {
            self.begin[0] + (height - self.begin[1]) / self.slope
        }
    }
}

/// The highest surface that reads like the profile, and where it is the shape of the ball.
///
/// The profile is checked: finite, growing positions.
pub(super) fn take_back(profile: &Profile, tip: Tip) -> Reconstruction {
    let (x, z) = (&profile.x, &profile.z);
    let shape = TipShape::new(tip);
    let (low, high) = z
        .iter()
        .fold((f64::INFINITY, f64::NEG_INFINITY), |(l, h), &v| {
            (l.min(v), h.max(v))
        });
    let reach = shape.distance((high - low).max(0.0));
    let samples_in_reach = widest(x, reach);
    let block = BLOCK.max(2 * samples_in_reach).min(x.len().max(1));
    let mut from = vec![(0.0, 0_usize); x.len()];
    from.par_chunks_mut(block)
        .enumerate()
        .for_each(|(index, rows)| {
            let first = index * block;
            let search = Search { x, z, shape, first };
            let begin = x.partition_point(|&p| p < x[first] - reach);
            let end = x.partition_point(|&p| p <= x[first + rows.len() - 1] + reach);
            search.rows(rows, 0, begin, end);
        });
    // A height that the tip leaves as it is comes from its own sample, whatever the rounding of a tie.
    let tie = 1e-12 * (high - low).max(0.0);
    for (index, (height, position)) in from.iter_mut().enumerate() {
        if z[index] <= *height + tie {
            (*height, *position) = (z[index], index);
        }
    }
    let is_tip_shape = tip_shape(x, &from, tip.radius);
    Reconstruction {
        height: from.into_iter().map(|(height, _)| height).collect(),
        is_tip_shape,
    }
}

/// Most samples within a distance on either side of one.
fn widest(x: &[f64], distance: f64) -> usize {
    let mut end = 0;
    let mut most = 0;
    for (index, &at) in x.iter().enumerate() {
        while end < x.len() && x[end] <= at + distance {
            end += 1;
        }
        most = most.max(end - index);
    }
    most
}

/// Which stretches between neighbouring samples belong to one tip position.
fn tip_shape(x: &[f64], from: &[(f64, usize)], radius: f64) -> Vec<bool> {
    let mut marks = vec![false; x.len().saturating_sub(1)];
    let mut begin = 0;
    for index in 1..=from.len() {
        if index < from.len() && from[index].1 == from[begin].1 {
            continue;
        }
        let samples = index - begin;
        let length = x[index - 1] - x[begin];
        if samples > TOUCHED_SAMPLES && length > TOUCHED_RADII * radius {
            marks[begin..index - 1].fill(true);
        }
        begin = index;
    }
    marks
}

/// The minima of a block.
struct Search<'a> {
    x: &'a [f64],
    z: &'a [f64],
    shape: TipShape,
    /// Index of the block's first sample.
    first: usize,
}

impl Search<'_> {
    /// Minimum and its place for the samples from `offset` of the block on, looking from `begin` to before
    /// `end`: that of the middle sample parts the others.
    fn rows(&self, rows: &mut [(f64, usize)], offset: usize, begin: usize, end: usize) {
        let middle = rows.len() / 2;
        let (before, rest) = rows.split_at_mut(middle);
        let Some((row, after)) = rest.split_first_mut() else {
            return;
        };
        let at = self.x[self.first + offset + middle];
        let mut best = (f64::INFINITY, begin);
        for place in begin..end {
            let height = self.z[place] + self.shape.height((self.x[place] - at).abs());
            if height < best.0 {
                best = (height, place);
            }
        }
        *row = best;
        self.rows(before, offset, begin, best.1 + 1);
        self.rows(after, offset + middle + 1, best.1, end);
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn image(x: &[f64], surface: &[f64], tip: Tip) -> Vec<f64> {
        let highest = |at: &f64| {
            let heights = x
                .iter()
                .zip(surface)
                .map(|(p, s)| s - tip.height_at(p - at));
            heights.fold(f64::NEG_INFINITY, f64::max)
        };
        x.iter().map(highest).collect()
    }

    fn slow(x: &[f64], read: &[f64], tip: Tip) -> Vec<f64> {
        let lowest = |at: &f64| {
            let heights = x.iter().zip(read).map(|(p, i)| i + tip.height_at(p - at));
            heights.fold(f64::INFINITY, f64::min)
        };
        x.iter().map(lowest).collect()
    }

    #[test]
    fn the_tip_is_a_ball_that_touches_its_cone() {
        let tip = Tip {
            radius: 2e-6,
            cone_angle: 60_f64.to_radians(),
        };
        assert!((tip.height_at(0.0)).abs() < 1e-30);
        assert!((tip.height_at(1e-6) - (2.0 - 3_f64.sqrt()) * 1e-6).abs() < 1e-20);
        let begin = 3_f64.sqrt() * 1e-6;
        let slope = |u: f64| (tip.height_at(u + 1e-10) - tip.height_at(u)) / 1e-10;
        assert!((slope(begin - 2e-10) / 3_f64.sqrt() - 1.0).abs() < 1e-3);
        assert!((slope(begin + 1e-7) / 3_f64.sqrt() - 1.0).abs() < 1e-6);
        assert!((tip.steepest_flank().to_degrees() - 60.0).abs() < 1e-12);
    }

    #[test]
    fn a_step_read_by_a_ball_is_sharp_again_and_its_foot_is_marked() {
        let tip = Tip {
            radius: 5e-6,
            cone_angle: 60_f64.to_radians(),
        };
        let x: Vec<f64> = (0..400).map(|i| f64::from(i) * 0.25e-6).collect();
        let wall = |&p: &f64| {
            if (30.1e-6..=79.9e-6).contains(&p) {
                -10e-6
            } else {
                0.0
            }
        };
        let surface: Vec<f64> = x.iter().map(wall).collect();
        let read = image(&x, &surface, tip);
        let profile = Profile {
            x: x.clone(),
            z: read.clone(),
        };
        let back = take_back(&profile, tip);
        let edge = x.iter().position(|&p| p > 29.9e-6).unwrap();
        // As read, the ball has begun to sink one sample past the edge only little; taken back, it fell by
        // the cone.
        assert!(read[edge + 1] > -0.01e-6 && back.height[edge + 1] < -0.3e-6);
        assert!((back.height[edge]).abs() < 1e-15);
        assert!(back.is_tip_shape[edge + 2] && !back.is_tip_shape[edge - 2]);
        let middle = x.iter().position(|&p| p >= 55e-6).unwrap();
        assert!(!back.is_tip_shape[middle]);
        for i in 0..x.len() {
            assert!(surface[i] <= back.height[i] + 1e-18 && back.height[i] <= read[i]);
        }
    }

    #[test]
    fn a_sharp_cone_leaves_its_own_image_as_it_is() {
        let tip = Tip {
            radius: 0.0,
            cone_angle: 60_f64.to_radians(),
        };
        let x: Vec<f64> = (0..300).map(|i| f64::from(i) * 0.37e-6).collect();
        let surface: Vec<f64> = x
            .iter()
            .map(|&p| if p > 30e-6 && p < 75e-6 { -12e-6 } else { 0.0 })
            .collect();
        let read = image(&x, &surface, tip);
        let back = take_back(&Profile { x, z: read.clone() }, tip);
        assert_eq!(back.height, read);
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(100))]
        #[test]
        fn the_fast_search_finds_the_same_heights_as_trying_all(
            steps in proptest::collection::vec((0.1..2.0_f64, -8.0..8.0_f64), 2..300),
            radius in 0.0..20.0_f64,
            angle in 10.0..150.0_f64,
        ) {
            let tip = Tip { radius: radius * 1e-6, cone_angle: angle.to_radians() };
            let mut at = 0.0;
            let mut profile = Profile::default();
            for (step, height) in steps {
                at += step * 1e-6;
                profile.x.push(at);
                profile.z.push(height * 1e-6);
            }
            let back = take_back(&profile, tip);
            for (fast, slow) in back.height.iter().zip(slow(&profile.x, &profile.z, tip)) {
                prop_assert!((fast - slow).abs() <= 2e-17, "{fast} {slow}");
            }
        }
    }
}
