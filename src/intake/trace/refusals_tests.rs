//! What corrections refuse, repeats, and traces that no instrument writes.

use super::test_traces::{Faults, Grooves, Noise, Shape, raw, spoilt};
use super::{CorrectionOptions, Levelling, Profile, RawTrace, TraceProblem, correct};

#[test]
fn one_level_is_no_channel_whatever_its_bow() {
    let flat = Grooves {
        depth: 0.0,
        ..Grooves::one(Shape::Rectangle)
    };
    for (bow, drift) in [(0.0, 0.0), (20e-6, 0.0), (0.0, 5e-6), (-20e-6, 0.0)] {
        for seed in 0..20 {
            let faults = Faults {
                tilt: 0.03,
                bow,
                drift,
                noise: 0.1e-6,
            };
            let problem = correct(
                &spoilt(&flat, faults, seed),
                &[],
                &CorrectionOptions::default(),
            )
            .map(|found| found.lands);
            assert!(
                matches!(
                    problem,
                    Err(TraceProblem::NoChannel { .. }
                        | TraceProblem::NoLand { .. }
                        | TraceProblem::RoundLands { .. })
                ),
                "{bow} {drift} {seed}: {problem:?}"
            );
        }
    }
    let options = CorrectionOptions {
        level: Levelling::Ends,
        ..CorrectionOptions::default()
    };
    let faults = Faults {
        noise: 0.1e-6,
        ..Faults::default()
    };
    let trace = spoilt(&flat, faults, 1);
    let levelled = correct(&trace, &[], &options).unwrap();
    assert!(levelled.lands.is_empty() && levelled.step_heights.is_empty());
}

#[test]
fn options_out_of_range_are_refused() {
    let trace = spoilt(&Grooves::one(Shape::Koh), Faults::default(), 1);
    let base = CorrectionOptions::default;
    let bad = [
        CorrectionOptions {
            shrinkage: [0.6, 0.0],
            ..base()
        },
        CorrectionOptions {
            shrinkage: [0.0, f64::NAN],
            ..base()
        },
        CorrectionOptions { bow: 0, ..base() },
        CorrectionOptions { bow: 6, ..base() },
        CorrectionOptions {
            bow: 2,
            level: Levelling::Local,
            ..base()
        },
        CorrectionOptions {
            spike_size: Some(-1.0),
            ..base()
        },
        CorrectionOptions {
            cutoff: Some(f64::NAN),
            ..base()
        },
        CorrectionOptions {
            lands: Some(vec![]),
            ..base()
        },
    ];
    for options in bad {
        let problem = correct(&trace, &[], &options).unwrap_err();
        assert!(!problem.hint().is_empty() && !problem.to_string().is_empty());
    }
}

#[test]
fn repeats_in_either_direction_are_found_and_averaged() {
    let grooves = Grooves {
        count: 4,
        ..Grooves::one(Shape::Koh)
    };
    let noisy = |seed, drift| {
        let faults = Faults {
            tilt: 0.003,
            drift,
            noise: 0.1e-6,
            ..Faults::default()
        };
        spoilt(&grooves, faults, seed)
    };
    let first = noisy(1, 0.0);
    // Channels of different depth and width tell the direction.
    let uneven = |trace: &mut RawTrace| {
        for (x, z) in trace.profile.x.iter().zip(&mut trace.profile.z) {
            if *x > 800e-6 && grooves.depth_at(*x) > 0.0 {
                *z -= 0.15 * grooves.depth_at(*x);
            }
        }
    };
    let mut first = first;
    uneven(&mut first);
    let mut second = noisy(2, 0.1e-6);
    uneven(&mut second);
    for x in &mut second.profile.x {
        *x += 12.3e-6;
    }
    let mut third = noisy(3, -0.1e-6);
    uneven(&mut third);
    third.profile.z[333] += 10e-6;
    let end = grooves.length();
    third.profile.x = third.profile.x.iter().rev().map(|x| end - x).collect();
    third.profile.z.reverse();
    let found = correct(&first, &[second, third], &CorrectionOptions::default()).unwrap();
    let agreement = found.repeatability.clone().unwrap();
    assert_eq!(agreement.traces, 3);
    let [forwards, backwards] = agreement.places.as_slice() else {
        unreachable!("two repeats");
    };
    assert!(
        !forwards.is_reversed && backwards.is_reversed,
        "{agreement:?}"
    );
    assert!(
        (forwards.shift + 12.3e-6).abs() < 0.1e-6,
        "{}",
        forwards.shift
    );
    assert!(backwards.shift.abs() < 0.1e-6, "{}", backwards.shift);
    // Straight lines between samples take some noise away.
    let sd = agreement.reading_robust_sd;
    assert!((0.07e-6..0.115e-6).contains(&sd), "{sd}");
    let depth_sd = agreement.depth_sd.unwrap();
    assert!(depth_sd < 0.08e-6, "{depth_sd}");
    assert!(found.warnings.is_empty(), "{:?}", found.warnings);
    // Three traces scatter less than one.
    let alone = correct(&first, &[], &CorrectionOptions::default()).unwrap();
    assert!(found.noise_sd < 0.75 * alone.noise_sd);
    assert!(found.changes.is_empty());
    let mut noise = Noise::new(4);
    let other = Profile {
        z: first
            .profile
            .x
            .iter()
            .map(|_| 1e-6 * noise.normal())
            .collect(),
        x: first.profile.x.clone(),
    };
    let problem = correct(&first, &[raw(other)], &CorrectionOptions::default()).map(|t| t.lands);
    assert!(
        matches!(problem, Err(TraceProblem::RepeatDiffers { number: 1, .. })),
        "{problem:?}"
    );
}

#[test]
fn hostile_traces_do_not_panic() {
    let line: Vec<f64> = (0..200).map(f64::from).collect();
    let mut noise = Noise::new(1);
    let mut profiles = vec![
        Profile::default(),
        Profile {
            x: vec![0.0, 1.0],
            z: vec![0.0, 1.0],
        },
        Profile {
            x: line.clone(),
            z: vec![f64::NAN; 200],
        },
        Profile {
            x: line.clone(),
            z: vec![3.0; 200],
        },
        Profile {
            x: line.clone(),
            z: vec![1e300; 200],
        },
        Profile {
            x: line.clone(),
            z: vec![0.0; 10],
        },
        Profile {
            x: vec![0.0; 200],
            z: line.clone(),
        },
        Profile {
            x: line.iter().map(|x| 1e-300 * x).collect(),
            z: line.clone(),
        },
        Profile {
            x: vec![f64::NAN; 200],
            z: line.clone(),
        },
    ];
    for _ in 0..40 {
        let z = (0..200).map(|_| {
            let even = noise.even();
            if even < 0.2 {
                f64::NAN
            } else {
                (even * 20.0).powi(3)
            }
        });
        profiles.push(Profile {
            z: z.collect(),
            x: line.clone(),
        });
    }
    for profile in profiles {
        for level in [
            Levelling::Lands,
            Levelling::Local,
            Levelling::Ends,
            Levelling::None,
        ] {
            for bow in [1, 5] {
                let options = CorrectionOptions {
                    level: level.clone(),
                    bow,
                    cutoff: Some(5.0),
                    ..CorrectionOptions::default()
                };
                let trace = raw(profile.clone());
                for repeats in [vec![], vec![trace.clone()]] {
                    match correct(&trace, &repeats, &options) {
                        Ok(found) => assert!(found.profile.z.iter().all(|z| z.is_finite())),
                        Err(problem) => assert!(!problem.to_string().is_empty()),
                    }
                }
            }
        }
    }
}

#[test]
fn a_million_samples_of_noise_have_no_channel() {
    let mut noise = Noise::new(9);
    let x: Vec<f64> = (0..1_000_000).map(|k| 1e-7 * f64::from(k)).collect();
    let z = x.iter().map(|_| 1e-8 * noise.normal()).collect();
    let problem = correct(&raw(Profile { x, z }), &[], &CorrectionOptions::default());
    assert!(
        matches!(problem, Err(TraceProblem::NoChannel { .. })),
        "{problem:?}"
    );
}

#[test]
fn ledges_on_the_wall_of_a_channel_that_is_cut_off_are_no_lands() {
    // Invented: a wide channel of 50 um, cut off on the left, with ledges of 20 um behind ripples of 4.7 um.
    let ledges = [-17.5, -44.7, -31.7, -9.3, 5.8];
    let height = |x: f64| {
        let ledge = ((x / 100.0) as usize).min(4);
        let part = x - 100.0 * ledge as f64;
        let (here, next) = (ledges[ledge], ledges[(ledge + 1).min(4)]);
        if part < 20.0 || ledge == 4 {
            return here;
        }
        let turn = std::f64::consts::PI * (part - 20.0) / 80.0;
        here + (next - here) * 0.5 * (1.0 - turn.cos()) - 4.7 * turn.sin()
    };
    let mut refused = 0;
    for seed in 0..12 {
        let mut noise = Noise::new(seed);
        let x: Vec<f64> = (0..220).map(|k| 2.0 * f64::from(k)).collect();
        let z = x
            .iter()
            .map(|&x| 1e-6 * (height(x) + 0.05 * noise.normal()));
        let profile = Profile {
            z: z.collect(),
            x: x.iter().map(|x| 1e-6 * x).collect(),
        };
        let trace = RawTrace {
            profile,
            ..RawTrace::default()
        };
        match correct(&trace, &[], &CorrectionOptions::default()) {
            Err(problem @ TraceProblem::UnevenLands { step, depth }) => {
                assert!(step > 20e-6 && depth < 10e-6, "{problem}");
                assert!(problem.is_ambiguous() && problem.hint().contains("--level local"));
                let local = CorrectionOptions {
                    level: Levelling::Local,
                    ..CorrectionOptions::default()
                };
                assert!(correct(&trace, &[], &local).is_ok());
                refused += 1;
            }
            // Seen as the wide channel instead.
            Ok(found) => assert!(found.lands.len() < 4, "{seed}: {:?}", found.lands),
            Err(other) => panic!("{seed}: {other}"),
        }
    }
    assert!(refused > 3, "{refused}");
}
