//! Depth of a channel between two lands, as step standards are evaluated.
//!
//! ISO 5436-1 type A1 (from memory): over a groove of width `W`, the upper level is taken from `W/3` to `W`
//! outside each edge, so that rounded corners do not count, and the lower level over the middle third of
//! the groove. `z = a x + b + h d` is fitted by least squares with `d = +1` on the upper and `d = -1` on
//! the lower zones; the depth is `2 h`. Where the next channel is nearer than that, the land between is
//! used as far as it is level.

use nalgebra::{Matrix3, Vector3};

use super::profile::{Profile, Zone};
use super::trace_problem::FEWEST_IN_ZONE;

/// Depth of a channel.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct StepHeight {
    /// The channel, from edge to edge, m.
    pub groove: Zone,
    /// Depth of the middle third under the line through both lands, m.
    pub depth: f64,
    /// The two upper zones and the lower one, m.
    pub zones: [Zone; 3],
    /// Root mean square distance of the samples from the three fitted lines, m. On a floor that is not
    /// level it holds the shape of the floor.
    pub scatter: f64,
}

/// Depth of the channel between two edges of a trace; `None` where a zone has less than three samples.
///
/// - `profile`: positions and heights, m; samples without a height are left out
/// - `groove`: from edge to edge, m
/// - `lands`: level stretches, m, that the upper zones must not leave; may be empty
///
/// # Source
/// ISO 5436-1, type A1; from memory. The land is not levelled first: its slope is part of the fit.
///
/// # Examples
/// ```
/// use etchwise::intake::{Profile, Zone, step_height};
/// let x: Vec<f64> = (0..400).map(|k| 1e-6 * f64::from(k)).collect();
/// let z = x.iter().map(|x| 0.01 * x - if (150e-6..=250e-6).contains(x) { 30e-6 } else { 0.0 });
/// let profile = Profile { z: z.collect(), x };
/// let step = step_height(&profile, Zone { from: 150e-6, to: 250e-6 }, &[]).unwrap();
/// assert!((step.depth - 30e-6).abs() < 1e-12);
/// ```
pub fn step_height(profile: &Profile, groove: Zone, lands: &[Zone]) -> Option<StepHeight> {
    let width = groove.to - groove.from;
    if !(width > 0.0 && width.is_finite()) {
        return None;
    }
    let left = Zone {
        from: groove.from - width,
        to: groove.from - width / 3.0,
    };
    let right = Zone {
        from: groove.to + width / 3.0,
        to: groove.to + width,
    };
    let middle = 0.5 * (groove.from + groove.to);
    let floor = Zone {
        from: middle - width / 6.0,
        to: middle + width / 6.0,
    };
    let before = lands.iter().rev().find(|land| land.to <= middle);
    let after = lands.iter().find(|land| land.from >= middle);
    let zones = [
        kept_on(profile, left, before),
        kept_on(profile, right, after),
        floor,
    ];
    let mut samples = Vec::new();
    for (zone, side) in zones.iter().zip([1.0, 1.0, -1.0]) {
        let before = samples.len();
        let (first, last) = indices(profile, *zone);
        let heights = profile.x[first..last].iter().zip(&profile.z[first..last]);
        samples.extend(
            heights
                .filter(|(_, z)| z.is_finite())
                .map(|(&x, &z)| [(x - middle) / width, z, side]),
        );
        if samples.len() < before + FEWEST_IN_ZONE {
            return None;
        }
    }
    let (depth, scatter) = fitted(&samples)?;
    Some(StepHeight {
        groove,
        depth,
        zones,
        scatter,
    })
}

/// The part of an upper zone on its land, or the land where too little is left.
fn kept_on(profile: &Profile, zone: Zone, land: Option<&Zone>) -> Zone {
    let Some(land) = land else { return zone };
    let part = Zone {
        from: zone.from.max(land.from),
        to: zone.to.min(land.to),
    };
    let (first, last) = indices(profile, part);
    if last >= first + FEWEST_IN_ZONE {
        part
    } else {
        *land
    }
}

/// Samples within a zone, `first..last`, always within the profile.
pub(super) fn indices(profile: &Profile, zone: Zone) -> (usize, usize) {
    let count = profile.x.len().min(profile.z.len());
    let x = &profile.x[..count];
    let first = x.partition_point(|x| *x < zone.from);
    let last = x.partition_point(|x| *x <= zone.to);
    (first.min(last), last)
}

/// `2 h` and the root mean square residual.
fn fitted(samples: &[[f64; 3]]) -> Option<(f64, f64)> {
    let mut normal = Matrix3::zeros();
    let mut right = Vector3::zeros();
    for &[t, z, side] in samples {
        let row = Vector3::new(1.0, t, side);
        normal += row * row.transpose();
        right += row * z;
    }
    let found = normal.cholesky()?.solve(&right);
    let squares: f64 = samples
        .iter()
        .map(|&[t, z, side]| z - found.dot(&Vector3::new(1.0, t, side)))
        .map(|rest| rest * rest)
        .sum();
    let depth = 2.0 * found.z;
    depth
        .is_finite()
        .then(|| (depth, (squares / samples.len() as f64).sqrt()))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn groove(x: f64) -> f64 {
        let depth = if (x - 50e-6).abs() < 10e-6 { 5e-6 } else { 0.0 };
        0.02 * x - depth
    }

    #[test]
    fn the_upper_zones_stay_on_their_lands() {
        let x: Vec<f64> = (0..1001).map(|k| 1e-7 * f64::from(k)).collect();
        let z = x.iter().map(|x| if *x > 65e-6 { 1e-3 } else { groove(*x) });
        let profile = Profile { z: z.collect(), x };
        let zone = Zone {
            from: 40e-6,
            to: 60e-6,
        };
        let lands = [
            Zone {
                from: 0.0,
                to: 39e-6,
            },
            Zone {
                from: 61e-6,
                to: 64e-6,
            },
        ];
        let step = step_height(&profile, zone, &lands).unwrap();
        assert!((step.depth - 5e-6).abs() < 1e-15, "{step:?}");
        assert!(step.scatter < 1e-15);
        let astray = step_height(&profile, zone, &[]).unwrap();
        assert!((astray.depth - 5e-6).abs() > 1e-6);
    }

    #[test]
    fn too_few_samples_give_no_depth() {
        let profile = Profile {
            x: vec![0.0, 1.0],
            z: vec![0.0, f64::NAN],
        };
        for (from, to) in [
            (0.2, 0.8),
            (0.8, 0.2),
            (f64::NAN, 1.0),
            (0.0, f64::INFINITY),
        ] {
            assert!(step_height(&profile, Zone { from, to }, &[]).is_none());
        }
    }
}
