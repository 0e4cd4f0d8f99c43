//! Corrections on invented traces: known channels under tilt, bow, drift, noise, spikes and gaps.

use super::test_traces::{
    Faults, Grooves, SHAPES, Shape, check_depths, codes, default_correct, mean_over, spoilt,
};
use super::{
    ChangeKind, CorrectionOptions, Levelling, LineFit, Profile, RawTrace, TraceProblem, Zone,
    correct,
};
use crate::warning::Code;

#[test]
fn depth_and_lands_come_out_under_tilt_and_noise_for_every_shape() {
    for shape in SHAPES {
        for count in [1, 6] {
            for (k, tilt) in [0.0, -0.0875, 0.0875].into_iter().enumerate() {
                let grooves = Grooves {
                    count,
                    ..Grooves::one(shape)
                };
                let faults = Faults {
                    tilt,
                    noise: 0.002 * grooves.depth,
                    ..Faults::default()
                };
                let trace = default_correct(&spoilt(&grooves, faults, 10 + k as u64));
                let case = format!("{shape:?} {count} {tilt}");
                assert_eq!(trace.lands.len(), count + 1, "{case}");
                assert_eq!(trace.step_heights.len(), count, "{case}");
                assert!(trace.changes.is_empty(), "{case}: {:?}", trace.changes);
                assert!(trace.warnings.is_empty(), "{case}: {:?}", trace.warnings);
                for land in &trace.lands {
                    // 200 samples and more on each land: 0.06 um / sqrt(200) = 4 nm.
                    assert!(mean_over(&trace.profile, *land).abs() < 20e-9, "{case}");
                }
                check_depths(&trace, &grooves, 0.003, &case);
            }
        }
    }
}

#[test]
fn bow_and_drift_up_to_the_depth_are_followed_from_land_to_land() {
    for shape in SHAPES {
        let grooves = Grooves {
            count: 15,
            ..Grooves::one(shape)
        };
        let faults = Faults {
            tilt: 0.02,
            bow: 20e-6,
            drift: 10e-6,
            noise: 0.002 * grooves.depth,
        };
        let trace = default_correct(&spoilt(&grooves, faults, 3));
        assert_eq!(trace.lands.len(), 16, "{shape:?}");
        assert_eq!(codes(&trace), [Code::ReferenceResidual], "{shape:?}");
        assert!(trace.polynomial.is_empty());
        // Between lands the drift bends, and the step says by how much.
        let levelling = trace.steps.iter().find(|s| s.what == "levelling").unwrap();
        let bend = levelling
            .numbers
            .iter()
            .find(|(key, _)| *key == "bend_m")
            .unwrap()
            .1;
        assert!(bend > 0.2e-6 && bend < 0.6e-6, "{bend}");
        check_depths(
            &trace,
            &grooves,
            0.002 + bend / grooves.depth,
            &format!("{shape:?}"),
        );
        let kept = CorrectionOptions {
            level: Levelling::Line,
            ..CorrectionOptions::default()
        };
        let line = correct(&spoilt(&grooves, faults, 3), &[], &kept).unwrap();
        assert!(line.reference_worst > 5e-6);
        assert_eq!(line.polynomial.len(), 2);
    }
}

#[test]
fn a_bow_is_taken_off_by_a_polynomial_of_its_degree() {
    let grooves = Grooves {
        count: 4,
        ..Grooves::one(Shape::Rectangle)
    };
    let faults = Faults {
        tilt: 0.01,
        bow: 8e-6,
        noise: 0.06e-6,
        ..Faults::default()
    };
    for fit in [LineFit::Robust, LineFit::LeastSquares] {
        let options = CorrectionOptions {
            bow: 2,
            fit,
            ..CorrectionOptions::default()
        };
        let trace = correct(&spoilt(&grooves, faults, 4), &[], &options).unwrap();
        assert!(trace.reference_worst < 0.02e-6, "{}", trace.reference_worst);
        let length = grooves.length();
        let expected = [0.0, 0.005 * length + 8e-6, 0.01 * length];
        for (found, expected) in trace.polynomial.iter().zip(expected) {
            assert!((found - expected).abs() < 0.03e-6, "{found} {expected}");
        }
        assert_eq!(trace.polynomial.len(), 3);
        check_depths(&trace, &grooves, 0.003, "bow");
        assert!(trace.warnings.is_empty());
    }
}

#[test]
fn spikes_and_gaps_are_listed_bridged_and_do_not_move_the_depth() {
    let grooves = Grooves {
        count: 2,
        ..Grooves::one(Shape::Koh)
    };
    let faults = Faults {
        tilt: 0.05,
        noise: 0.06e-6,
        ..Faults::default()
    };
    let clean = default_correct(&spoilt(&grooves, faults, 8));
    let mut trace = spoilt(&grooves, faults, 8);
    let z = &mut trace.profile.z;
    z[100] += 5e-6;
    z[402] -= 3e-6;
    z[403] -= 2e-6;
    z[620] = f64::NAN;
    z[621] = f64::NAN;
    z[622] = f64::INFINITY;
    z[0] = f64::NAN;
    let found = default_correct(&trace);
    let listed: Vec<_> = found.changes.iter().map(|c| (c.kind, c.samples)).collect();
    assert_eq!(
        listed,
        [
            (ChangeKind::Spike, 1),
            (ChangeKind::Spike, 2),
            (ChangeKind::Missing, 3)
        ]
    );
    assert!((found.changes[0].size - 5e-6).abs() < 0.3e-6);
    assert!((found.changes[1].size + 3e-6).abs() < 0.3e-6);
    // Away from the walls and few: listed, no warning.
    assert_eq!(codes(&found), []);
    let list = found.steps.iter().filter(|s| s.what == "bridge");
    let places: Vec<_> = list.map(|s| s.numbers[0]).collect();
    assert_eq!(places.len(), 3);
    assert!(
        places
            .iter()
            .zip(&found.changes)
            .all(|(p, c)| *p == ("from_m", c.zone.from))
    );
    assert_eq!(found.profile.x.len(), trace.profile.x.len() - 1);
    assert_eq!(found.raw.x, found.profile.x);
    assert_eq!(found.reference.len(), found.profile.x.len());
    assert!(found.profile.z.iter().all(|z| z.is_finite()));
    assert!(found.raw.z[620].is_nan() && (found.raw.z[99] - trace.profile.z[100]).abs() < 1e-15);
    for (a, b) in found.step_heights.iter().zip(&clean.step_heights) {
        assert!((a.depth - b.depth).abs() < 0.02e-6);
    }
    let options = CorrectionOptions {
        keep_spikes: true,
        ..CorrectionOptions::default()
    };
    let kept = correct(&trace, &[], &options).unwrap();
    assert!(kept.changes.iter().all(|c| c.kind == ChangeKind::Missing));
    assert!(kept.profile.z[99] > 4e-6);
}

#[test]
fn a_gap_over_a_wall_or_most_of_a_channel_is_told() {
    let mut trace = spoilt(&Grooves::one(Shape::Rectangle), Faults::default(), 1);
    for z in &mut trace.profile.z[290..310] {
        *z = f64::NAN;
    }
    let found = default_correct(&trace);
    let warning = &found.warnings[0];
    assert_eq!(warning.code, Code::SamplesBridged);
    assert!(warning.numbers.contains(&("on_walls", 1.0)), "{warning:?}");
    for z in &mut trace.profile.z[310..450] {
        *z = f64::NAN;
    }
    let found = default_correct(&trace);
    let numbers = &found.warnings[0].numbers;
    assert!(numbers.contains(&("wide", 1.0)), "{numbers:?}");
}

#[test]
fn a_wider_grain_is_found_once_the_channel_is_known_and_a_wide_one_is_left() {
    let grooves = Grooves {
        spacing: 0.1e-6,
        ..Grooves::one(Shape::Isotropic)
    };
    let faults = Faults {
        noise: 0.02e-6,
        ..Faults::default()
    };
    let mut trace = spoilt(&grooves, faults, 2);
    for (from, count) in [(500, 12), (3500, 120)] {
        for z in &mut trace.profile.z[from..from + count] {
            *z += 2e-6;
        }
    }
    let found = default_correct(&trace);
    assert_eq!(found.changes.len(), 1, "{:?}", found.changes);
    assert_eq!(found.changes[0].samples, 12);
    let step = found.steps.iter().find(|s| s.what == "spikes").unwrap();
    assert!(step.text.contains("wider than 1.8"), "{}", step.text);
}

#[test]
fn ridges_are_told_from_channels() {
    let grooves = Grooves {
        count: 5,
        width: 60e-6,
        ..Grooves::one(Shape::Koh)
    };
    let faults = Faults {
        tilt: 0.01,
        noise: 0.06e-6,
        ..Faults::default()
    };
    let mut master = spoilt(&grooves, faults, 1);
    for z in &mut master.profile.z {
        *z = -*z;
    }
    let as_is = default_correct(&master);
    assert!(codes(&as_is).contains(&Code::ChoiceMade));
    let advice = &as_is.warnings[0].advice;
    assert!(advice.contains("--invert"), "{advice}");
    let options = CorrectionOptions {
        invert: true,
        ..CorrectionOptions::default()
    };
    let turned = correct(&master, &[], &options).unwrap();
    assert!(
        turned.inverted && turned.warnings.is_empty(),
        "{:?}",
        turned.warnings
    );
    assert_eq!(turned.step_heights.len(), 5);
    check_depths(&turned, &grooves, 0.003, "turned");
    let single = Grooves::one(Shape::Koh);
    let mut master = spoilt(&single, faults, 1);
    for z in &mut master.profile.z {
        *z = -*z;
    }
    let problem = correct(&master, &[], &CorrectionOptions::default()).unwrap_err();
    assert!(matches!(problem, TraceProblem::NoGroove { ridges: 1, .. }));
    assert!(problem.hint().contains("--invert") && problem.is_ambiguous());
}

#[test]
fn shrinkage_scales_all_lengths() {
    let trace = spoilt(&Grooves::one(Shape::Koh), Faults::default(), 1);
    let plain = default_correct(&trace);
    let options = CorrectionOptions {
        shrinkage: [0.015, -0.02],
        ..CorrectionOptions::default()
    };
    let smaller = correct(&trace, &[], &options).unwrap();
    let pairs = [
        (plain.lands[1].from * 0.985, smaller.lands[1].from),
        (plain.profile.x[7] * 0.985, smaller.profile.x[7]),
        (
            plain.step_heights[0].depth * 1.02,
            smaller.step_heights[0].depth,
        ),
        (plain.raw.z[400] * 1.02, smaller.raw.z[400]),
    ];
    for (expected, found) in pairs {
        assert!(
            (expected - found).abs() < 1e-12 * expected.abs(),
            "{expected} {found}"
        );
    }
    assert_eq!(smaller.steps.last().unwrap().what, "shrinkage");
}

#[test]
fn stated_zones_and_lands_are_used_as_stated() {
    let mut trace = spoilt(
        &Grooves::one(Shape::Rectangle),
        Faults {
            tilt: 0.01,
            ..Faults::default()
        },
        1,
    );
    // The right shoulder lies 4 um lower.
    for (x, z) in trace.profile.x.iter().zip(&mut trace.profile.z) {
        if *x > 249.9e-6 {
            *z -= 4e-6;
        }
    }
    let through_both = default_correct(&trace);
    assert_eq!(codes(&through_both), [Code::LandsDiffer]);
    let (key, above) = through_both.warnings[0].numbers[0];
    assert!(
        key == "difference_m" && (above + 4e-6).abs() < 0.01e-6,
        "{above}"
    );
    let left = Zone {
        from: 10e-6,
        to: 140e-6,
    };
    let options = CorrectionOptions {
        level: Levelling::Zones(vec![left]),
        ..CorrectionOptions::default()
    };
    let on_left = correct(&trace, &[], &options).unwrap();
    assert_eq!(on_left.reference_zones, [left]);
    assert!((mean_over(&on_left.profile, on_left.lands[1]) + 4e-6).abs() < 1e-9);
    let lands = vec![
        left,
        Zone {
            from: 260e-6,
            to: 390e-6,
        },
    ];
    let options = CorrectionOptions {
        lands: Some(lands.clone()),
        ..CorrectionOptions::default()
    };
    assert_eq!(correct(&trace, &[], &options).unwrap().lands, lands);
    let outside = CorrectionOptions {
        level: Levelling::Zones(vec![Zone { from: 1.0, to: 2.0 }]),
        ..CorrectionOptions::default()
    };
    let problem = correct(&trace, &[], &outside).unwrap_err();
    assert!(
        matches!(problem, TraceProblem::ZoneOutside { .. }),
        "{problem}"
    );
    let none = CorrectionOptions {
        level: Levelling::None,
        ..CorrectionOptions::default()
    };
    let as_read = correct(&trace, &[], &none).unwrap();
    assert_eq!(as_read.profile, trace.profile);
    assert_eq!(as_read.lands.len(), 2);
}

#[test]
fn the_filter_says_what_it_changed_and_nothing_else_smooths() {
    let faults = Faults {
        noise: 0.06e-6,
        ..Faults::default()
    };
    let trace = spoilt(&Grooves::one(Shape::Rectangle), faults, 1);
    let plain = default_correct(&trace);
    for ((z, raw), reference) in plain
        .profile
        .z
        .iter()
        .zip(&plain.raw.z)
        .zip(&plain.reference)
    {
        assert!((z - (raw - reference)).abs() < 1e-18);
    }
    let options = CorrectionOptions {
        cutoff: Some(8e-6),
        ..CorrectionOptions::default()
    };
    let filtered = correct(&trace, &[], &options).unwrap();
    let step = filtered.steps.iter().find(|s| s.what == "filter").unwrap();
    let worst = step
        .numbers
        .iter()
        .find(|(key, _)| *key == "worst_m")
        .unwrap()
        .1;
    // Half of an upright wall is lost at its edge.
    assert!((12e-6..15.5e-6).contains(&worst), "{worst}");
    for cutoff in [1e-6, 1.0] {
        let options = CorrectionOptions {
            cutoff: Some(cutoff),
            ..CorrectionOptions::default()
        };
        let problem = correct(&trace, &[], &options).unwrap_err();
        assert!(matches!(problem, TraceProblem::Cutoff { .. }));
    }
}

#[test]
fn a_straight_trace_is_refused_in_plain_words() {
    let x: Vec<f64> = (0..=400).map(|k| 1e-6 * f64::from(k)).collect();
    let refused = |slope: f64, step: f64, options: &CorrectionOptions| {
        let heights = x.iter().map(|x| 7.5e-6 + slope * x);
        let rounded = heights.map(|z| {
            if step > 0.0 {
                step * (z / step).round()
            } else {
                z
            }
        });
        let profile = Profile {
            z: rounded.collect(),
            x: x.clone(),
        };
        let raw = RawTrace {
            profile,
            ..RawTrace::default()
        };
        correct(&raw, &[], options).unwrap_err()
    };
    let stated = CorrectionOptions {
        level: Levelling::None,
        ..CorrectionOptions::default()
    };
    for options in [&CorrectionOptions::default(), &stated] {
        for (slope, step, words) in [
            (0.0, 0.0, "all heights of the trace are the same"),
            (
                0.02,
                0.0,
                "one straight line that rises by 8.000 µm over 400.0 µm",
            ),
            (-0.02, 0.0, "falls by 8.000 µm"),
            (0.0137, 1e-8, "one straight line that rises by 5.480 µm"),
            (0.001, 1e-8, "one straight line that rises by 400.0 nm"),
        ] {
            let problem = refused(slope, step, options);
            assert!(problem.to_string().contains(words), "{problem}");
            assert!(problem.hint().contains("--z-column says"));
        }
    }
}

#[test]
fn clean_channels_without_any_scatter_are_levelled() {
    for tilt in [0.0, 0.01, -0.07] {
        let mut profile = Grooves {
            count: 5,
            ..Grooves::one(Shape::Rectangle)
        }
        .profile();
        for (x, z) in profile.x.iter().zip(&mut profile.z) {
            *z += tilt * x;
        }
        let raw = RawTrace {
            profile,
            ..RawTrace::default()
        };
        let found = default_correct(&raw);
        assert_eq!(found.step_heights.len(), 5);
        for step in &found.step_heights {
            assert!((step.depth - 30e-6).abs() < 1e-9, "{tilt} {step:?}");
        }
    }
}
