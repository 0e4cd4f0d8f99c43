//! Traces and options of any kind end in sound sections or an error.

use proptest::prelude::*;

use super::corrected::CorrectedTrace;
use super::groove_problem::GrooveProblem;
use super::groove_section::GrooveSection;
use super::groove_traces_tests::{UM, cone, read_by};
use super::profile::{Profile, Zone};
use super::section_options::{LidChoice, SectionOptions, Tip};
use super::sections::sections;
use crate::geometry::Outline;

/// Everything a caller relies on, for any trace.
fn assert_sound(section: &GrooveSection) {
    let valid = |outline: &Outline| assert!(outline.is_valid(), "{}", outline.problems());
    valid(&section.outline);
    assert!(section.outline.area() > 0.0 && section.zone.from < section.zone.to);
    assert!(section.lid.x.windows(2).all(|x| x[0] < x[1]));
    assert_eq!(section.surface.x.len(), section.is_touched.len());
    for alternative in &section.lid_alternatives {
        alternative.outline.iter().for_each(valid);
    }
    if let Some(reach) = &section.reach {
        assert!(reach.inner.is_some() || reach.outer.is_some());
        if let Some(outer) = &reach.outer {
            valid(&outer.outline);
            section.outline.proven_inside(&outer.outline).unwrap();
        }
        if let Some(inner) = &reach.inner {
            valid(&inner.outline);
            inner.outline.proven_inside(&section.outline).unwrap();
        }
    }
}

/// Options of every kind.
fn any_options() -> impl Strategy<Value = SectionOptions> {
    let tip = proptest::option::of((0.0..20.0_f64, 5.0..170.0_f64));
    let walls = proptest::option::of(5.0..90.0_f64);
    let lid = (0..4_usize, -3.0..3.0_f64, -3.0..3.0_f64, any::<bool>());
    (tip, walls, lid, proptest::option::of(0.0..0.5_f64)).prop_map(|(tip, walls, lid, simplify)| {
        SectionOptions {
            tip: tip.map(|(radius, angle)| Tip {
                radius: radius * UM,
                cone_angle: angle.to_radians(),
            }),
            walls: walls.map(f64::to_radians),
            lid: LidChoice::ALL[lid.0],
            lid_gap: if lid.3 { lid.1 * UM } else { 0.0 },
            lid_sag: if lid.3 { 0.0 } else { lid.2 * UM },
            simplify: simplify.map(|s| s * UM),
            ..SectionOptions::default()
        }
    })
}

/// Heights of any kind: rounded (so that samples lie on each other's levels), with lands at zero and without.
fn any_trace() -> impl Strategy<Value = CorrectedTrace> {
    let heights = proptest::collection::vec(-30..4_i32, 4..80);
    let noise = proptest::collection::vec(-1.0..1.0_f64, 100);
    let kind = (any::<bool>(), any::<bool>());
    (heights, noise, 0.0..0.3_f64, 0.0..2.0_f64, kind).prop_map(
        |(heights, noise, size, step, (by_tip, inverted))| {
            let lands = if by_tip { 10 } else { 4 };
            let mut z = vec![0.0; lands];
            z.extend(heights.iter().map(|&h| f64::from(h.min(0)) + step));
            z.extend(vec![step; lands]);
            let spacing = |i: usize| i as f64 * 1.3 + 1e-4 * (i as f64).sqrt();
            let x: Vec<f64> = (0..z.len()).map(|i| spacing(i) * UM).collect();
            for (height, noise) in z.iter_mut().zip(noise.iter().cycle()) {
                *height = (*height + size * noise) * UM;
            }
            let zone = |from: usize, to: usize| Zone {
                from: x[from],
                to: x[to],
            };
            let lands = vec![zone(0, lands - 1), zone(z.len() - lands, z.len() - 1)];
            let trace = CorrectedTrace {
                lands,
                profile: Profile { x: x.clone(), z },
                inverted,
                ..CorrectedTrace::default()
            };
            if by_tip {
                read_by(cone(3.0), trace)
            } else {
                trace
            }
        },
    )
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(300))]
    #[test]
    fn every_section_of_a_hostile_trace_is_valid_and_nested(trace in any_trace(), options in any_options()) {
        match sections(&trace, &options) {
            Ok(all) => all.iter().for_each(assert_sound),
            Err(problem) => {
                prop_assert!(!matches!(problem, GrooveProblem::Polygon { .. }), "{problem}");
                prop_assert!(!problem.hint().is_empty());
            }
        }
    }

    #[test]
    fn two_hostile_halves_give_valid_sections(
        lower in any_trace(), upper in any_trace(), options in any_options(), offset in -40.0..40.0_f64,
    ) {
        let options = SectionOptions {
            lid_trace: Some(Box::new(upper)),
            lid_offset: offset * UM,
            lid_sag: 0.0,
            ..options
        };
        match sections(&lower, &options) {
            Ok(all) => all.iter().for_each(assert_sound),
            Err(problem) => prop_assert!(!matches!(problem, GrooveProblem::Polygon { .. }), "{problem}"),
        }
    }

    #[test]
    fn any_heights_and_lands_at_all_end_in_a_section_or_an_error(
        z in proptest::collection::vec(-1.0..1.0_f64, 0..60),
        lands in proptest::collection::vec((-10.0..70.0_f64, -10.0..70.0_f64), 0..5),
        kind in 0..4_u8,
    ) {
        let x: Vec<f64> = (0..z.len()).map(|i| i as f64 * UM).collect();
        let z: Vec<f64> = z.iter().enumerate().map(|(i, &z)| UM * match kind {
            0 => z,
            1 => if i % 2 == 0 { 0.0 } else { -1.0 },
            2 => i as f64,
            _ => z.round(),
        }).collect();
        let lands = lands.iter().map(|&(from, to)| Zone { from: from * UM, to: to * UM }).collect();
        let trace = CorrectedTrace { lands, profile: Profile { x, z }, ..CorrectedTrace::default() };
        if let Ok(all) = sections(&trace, &SectionOptions::default()) {
            all.iter().for_each(assert_sound);
        }
    }
}
