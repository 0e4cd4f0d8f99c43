//! Synthetic traces of grooves for the tests of sections, lengths in micrometres where nothing else is said.

use super::corrected::CorrectedTrace;
use super::groove_section::GrooveSection;
use super::profile::{Profile, Zone};
use super::section_options::{SectionOptions, Tip};
use super::sections::sections;
use crate::warning::Code;

pub(super) const UM: f64 = 1e-6;

/// Height at a position on straight lines between corners, all in micrometres.
pub(super) fn on_corners(corners: &[[f64; 2]], x: f64) -> f64 {
    let pair = corners.windows(2).find(|pair| x <= pair[1][0]);
    let Some(pair) = pair else {
        return corners.last().unwrap()[1];
    };
    let ([a, from], [b, to]) = (pair[0], pair[1]);
    from + (x - a) / (b - a) * (to - from)
}

/// A trace of a height function from 0 on, micrometres, with its lands.
pub(super) fn trace(
    length: f64,
    step: f64,
    height: impl Fn(f64) -> f64,
    lands: &[[f64; 2]],
) -> CorrectedTrace {
    let count = (length / step).round() as usize;
    let x: Vec<f64> = (0..=count).map(|i| step * i as f64).collect();
    CorrectedTrace {
        profile: Profile {
            z: x.iter().map(|&x| UM * height(x)).collect(),
            x: x.iter().map(|x| UM * x).collect(),
        },
        lands: lands
            .iter()
            .map(|&[from, to]| Zone {
                from: UM * from,
                to: UM * to,
            })
            .collect(),
        ..CorrectedTrace::default()
    }
}

pub(super) fn cornered(corners: &[[f64; 2]], step: f64, lands: &[[f64; 2]]) -> CorrectedTrace {
    let length = corners.last().unwrap()[0];
    trace(length, step, |x| on_corners(corners, x), lands)
}

/// Two lands of 50 um with a groove of 100 um between.
pub(super) fn groove(height: impl Fn(f64) -> f64) -> CorrectedTrace {
    let height = |x: f64| {
        if (50.0..=150.0).contains(&x) {
            height(x - 50.0)
        } else {
            0.0
        }
    };
    trace(200.0, 0.5, height, &[[0.0, 48.0], [152.0, 200.0]])
}

/// The trace as a tip reads it.
pub(super) fn read_by(tip: Tip, mut trace: CorrectedTrace) -> CorrectedTrace {
    let surface = trace.profile.clone();
    let highest = |at: &f64| {
        let places = surface.x.iter().zip(&surface.z);
        let heights = places.map(|(x, z)| z - tip.height_at(x - at));
        heights.fold(f64::NEG_INFINITY, f64::max)
    };
    trace.profile.z = surface.x.iter().map(highest).collect();
    trace
}

pub(super) fn one(trace: &CorrectedTrace, options: &SectionOptions) -> GrooveSection {
    let mut all = sections(trace, options).unwrap();
    assert_eq!(all.len(), 1);
    all.remove(0)
}

pub(super) fn plain(trace: &CorrectedTrace) -> GrooveSection {
    one(trace, &SectionOptions::default())
}

pub(super) fn cone(radius: f64) -> Tip {
    Tip {
        radius: radius * UM,
        cone_angle: 60_f64.to_radians(),
    }
}

pub(super) fn assert_close(value: f64, expected: f64, relative: f64) {
    assert!(
        (value / expected - 1.0).abs() <= relative,
        "{value} {expected}"
    );
}

pub(super) fn codes(section: &GrooveSection) -> Vec<Code> {
    section.warnings.iter().map(|w| w.code).collect()
}
