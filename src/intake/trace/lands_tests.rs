//! Lands where floors, cut-off ends and rounded shoulders mislead.

use super::test_traces::{Noise, raw};
use super::{CorrectedTrace, CorrectionOptions, Profile, TraceProblem, correct};
use crate::warning::Code;

/// Heights in micrometres every `step` micrometres.
fn trace(
    step: f64,
    samples: usize,
    height: impl Fn(f64) -> f64,
) -> Result<CorrectedTrace, TraceProblem> {
    let mut noise = Noise::new(4);
    let x: Vec<f64> = (0..samples).map(|k| step * k as f64).collect();
    let z = x
        .iter()
        .map(|&x| 1e-6 * (height(x) + 0.02 * noise.normal()));
    let profile = Profile {
        z: z.collect(),
        x: x.iter().map(|x| 1e-6 * x).collect(),
    };
    correct(&raw(profile), &[], &CorrectionOptions::default())
}

#[test]
fn a_speck_on_a_floor_makes_no_land_of_it() {
    // Four wide channels on a drifting part; the floor of the last has a speck, and the trace ends beside it.
    let found = trace(0.5, 8000, |x| {
        let within = (x + 100.0) % 1000.0;
        let floor = if within > 550.0 { -40.0 } else { 0.0 };
        let speck = if (3740.0..3748.0).contains(&x) {
            4.0
        } else {
            0.0
        };
        floor + speck + 1.5e-3 * x + 3.0 * (x / 2500.0).sin()
    })
    .unwrap();
    assert_eq!(found.step_heights.len(), 4, "{:?}", found.lands);
    for step in &found.step_heights {
        assert!((step.depth - 40e-6).abs() < 1e-6, "{step:?}");
    }
}

#[test]
fn a_lid_lies_on_the_crests_of_rounded_shoulders_and_this_is_said() {
    let found = trace(2.0, 500, |x| {
        let u: f64 = (x - 500.0) / 500.0;
        // Shoulders bend down from crests 300 um beside the middle.
        let shoulder = -14.0 * (u.abs() - 0.6).powi(2) / 0.16;
        shoulder - 30.0 / (1.0 + (u / 0.35).powi(40))
    })
    .unwrap();
    assert_eq!(found.lands.len(), 2);
    for land in &found.lands {
        let beside = (0.5 * (land.from + land.to) - 500e-6).abs();
        assert!((beside - 300e-6).abs() < 60e-6, "{land:?}");
    }
    let said = found.warnings.iter().find(|w| w.message.contains("crests"));
    assert_eq!(said.map(|w| w.code), Some(Code::ReferenceResidual));
}

#[test]
fn traces_that_do_not_repeat_each_other_are_refused() {
    let groove = |depth: f64| {
        let x: Vec<f64> = (0..600).map(|k| 0.5e-6 * f64::from(k)).collect();
        let z = x.iter().map(|x| {
            if (100e-6..200e-6).contains(x) {
                -depth
            } else {
                0.0
            }
        });
        raw(Profile {
            z: z.collect(),
            x: x.clone(),
        })
    };
    let options = CorrectionOptions::default();
    assert!(correct(&groove(30e-6), &[groove(30e-6)], &options).is_ok());
    let ramp: Vec<f64> = (0..600).map(|k| 0.5e-6 * f64::from(k)).collect();
    let ramp = raw(Profile {
        z: ramp.iter().map(|x| 0.5 * x).collect(),
        x: ramp,
    });
    assert!(correct(&groove(30e-6), &[ramp], &options).is_err());
}
