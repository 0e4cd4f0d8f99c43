//! Invented traces for tests.

use super::profile::{Profile, RawTrace, Zone};
use super::{CorrectedTrace, CorrectionOptions, correct};
use crate::warning::Code;

/// Repeatable normal noise.
pub(in crate::intake) struct Noise(u64);

impl Noise {
    pub(in crate::intake) fn new(seed: u64) -> Self {
        Self(seed.wrapping_mul(0x9e37_79b9_7f4a_7c15) | 1)
    }

    /// Even in 0 to 1: the high bits of a xorshift generator (Marsaglia 2003; from memory).
    pub(in crate::intake) fn even(&mut self) -> f64 {
        self.0 ^= self.0 << 13;
        self.0 ^= self.0 >> 7;
        self.0 ^= self.0 << 17;
        (self.0 >> 11) as f64 / (1_u64 << 53) as f64
    }

    /// Normal with standard deviation 1, by the method of Box and Muller.
    pub(in crate::intake) fn normal(&mut self) -> f64 {
        let radius = (-2.0 * self.even().max(1e-300).ln()).sqrt();
        radius * (std::f64::consts::TAU * self.even()).cos()
    }
}

/// Shape of a groove.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Shape {
    /// Upright walls, flat floor.
    Rectangle,
    /// Walls at 54.74 degrees.
    Koh,
    /// Quarter circles beside a flat floor half as wide as the opening less twice the depth allows.
    Isotropic,
    /// Two planes that meet.
    Vee,
}

/// Grooves of one shape in a row, with lands between and at both ends.
#[derive(Debug, Clone, Copy)]
pub(super) struct Grooves {
    pub(super) shape: Shape,
    pub(super) count: usize,
    pub(super) width: f64,
    pub(super) depth: f64,
    pub(super) land: f64,
    pub(super) spacing: f64,
}

impl Grooves {
    /// One groove, 100 um wide and 30 um deep, with lands of 150 um, read every 0.5 um.
    pub(super) fn one(shape: Shape) -> Self {
        Self {
            shape,
            count: 1,
            width: 100e-6,
            depth: 30e-6,
            land: 150e-6,
            spacing: 0.5e-6,
        }
    }

    pub(super) fn length(&self) -> f64 {
        self.count as f64 * (self.width + self.land) + self.land
    }

    /// Depth under the land at `x`.
    pub(super) fn depth_at(&self, x: f64) -> f64 {
        let pitch = self.width + self.land;
        let groove = ((x - self.land) / pitch).floor();
        if groove < 0.0 || groove >= self.count as f64 {
            return 0.0;
        }
        let inside = x - self.land - groove * pitch;
        let wall = inside.min(self.width - inside);
        if wall <= 0.0 {
            return 0.0;
        }
        match self.shape {
            Shape::Rectangle => self.depth,
            Shape::Koh => self.depth.min(wall * 2.0_f64.sqrt()),
            Shape::Vee => self.depth * 2.0 * wall / self.width,
            Shape::Isotropic => {
                let rest = (self.depth - wall).max(0.0);
                (self.depth * self.depth - rest * rest).sqrt()
            }
        }
    }

    /// The trace without any fault.
    pub(super) fn profile(&self) -> Profile {
        let count = (self.length() / self.spacing).round() as usize;
        let x: Vec<f64> = (0..=count).map(|k| k as f64 * self.spacing).collect();
        let z = x.iter().map(|x| -self.depth_at(*x)).collect();
        Profile { x, z }
    }
}

/// A trace with nothing else known.
pub(super) fn raw(profile: Profile) -> RawTrace {
    RawTrace {
        profile,
        ..RawTrace::default()
    }
}

pub(super) const SHAPES: [Shape; 4] = [Shape::Rectangle, Shape::Koh, Shape::Isotropic, Shape::Vee];

/// What spoils a trace.
#[derive(Debug, Clone, Copy, Default)]
pub(super) struct Faults {
    /// Slope, 1.
    pub(super) tilt: f64,
    /// Height of a parabola over the whole trace, m.
    pub(super) bow: f64,
    /// Amplitude of a wave and a half of drift over the whole trace, m.
    pub(super) drift: f64,
    /// Standard deviation of noise, m.
    pub(super) noise: f64,
}

pub(super) fn spoilt(grooves: &Grooves, faults: Faults, seed: u64) -> RawTrace {
    let mut noise = Noise::new(seed);
    let mut profile = grooves.profile();
    let length = grooves.length();
    for (x, z) in profile.x.iter().zip(&mut profile.z) {
        let u = x / length;
        *z += faults.tilt * x
            + 4.0 * faults.bow * u * (1.0 - u)
            + faults.drift * (3.0 * std::f64::consts::PI * u).sin()
            + faults.noise * noise.normal();
    }
    raw(profile)
}

pub(super) fn default_correct(raw: &RawTrace) -> CorrectedTrace {
    correct(raw, &[], &CorrectionOptions::default()).unwrap()
}

pub(super) fn codes(trace: &CorrectedTrace) -> Vec<Code> {
    trace.warnings.iter().map(|w| w.code).collect()
}

/// Mean height of the corrected trace over a zone.
pub(super) fn mean_over(profile: &Profile, zone: Zone) -> f64 {
    let inside = profile.x.iter().zip(&profile.z);
    let inside: Vec<f64> = inside
        .filter(|(x, _)| (zone.from..=zone.to).contains(*x))
        .map(|(_, z)| *z)
        .collect();
    inside.iter().sum::<f64>() / inside.len() as f64
}

/// The depth of the middle third, against the same measure on the clean trace.
pub(super) fn check_depths(trace: &CorrectedTrace, grooves: &Grooves, within: f64, case: &str) {
    for step in &trace.step_heights {
        let floor = step.zones[2];
        let clean = -mean_over(&grooves.profile(), floor);
        assert!(
            (step.depth - clean).abs() < within * grooves.depth,
            "{case}: {} for {clean}",
            step.depth
        );
    }
}
