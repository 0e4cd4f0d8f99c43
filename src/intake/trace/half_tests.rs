//! Flanks that show the tip: bounds, stated walls, suspicion, masters.

use super::groove_traces_tests::{
    UM, assert_close, codes, cone, groove, one, plain, read_by, trace,
};
use super::section_options::{SectionOptions, Tip};
use crate::warning::Code;

#[test]
fn upright_walls_read_by_a_cone_are_restored_and_bracketed() {
    let truth = groove(|x| if x > 0.0 && x < 100.0 { -50.0 } else { 0.0 });
    for radius in [0.0, 2.0, 12.5] {
        let read = read_by(cone(radius), truth.clone());
        let with = |walls: Option<f64>| {
            let options = SectionOptions {
                tip: Some(cone(radius)),
                walls,
                ..SectionOptions::default()
            };
            one(&read, &options)
        };
        let section = with(None);
        assert_eq!(codes(&section), [Code::FlankIsTip]);
        assert_eq!(section.flanks.len(), 2, "{radius}");
        let outer = section
            .reach
            .as_ref()
            .unwrap()
            .outer
            .as_ref()
            .unwrap()
            .outline
            .area();
        assert_close(outer, 5000.0 * UM * UM, 1e-9);
        assert!(section.outline.area() < 4000.0 * UM * UM);
        let upright = with(Some(std::f64::consts::FRAC_PI_2));
        assert_close(upright.outline.area(), 5000.0 * UM * UM, 1e-6);
        let inner = upright.reach.as_ref().unwrap().inner.as_ref().unwrap();
        assert_close(inner.outline.area(), section.outline.area(), 1e-9);
        let slanted = with(Some(80_f64.to_radians()));
        let expected = 5000.0 - 50.0 * 50.0 / 80_f64.to_radians().tan();
        assert_close(slanted.outline.area(), expected * UM * UM, 1e-6);
        // Nothing is restored to flatter than was read.
        let flat = with(Some(40_f64.to_radians()));
        assert_close(flat.outline.area(), section.outline.area(), 1e-9);
    }
}

#[test]
fn an_unknown_tip_is_suspected_where_both_flanks_are_straight_and_alike() {
    let truth = groove(|x| if x > 0.0 && x < 100.0 { -50.0 } else { 0.0 });
    let section = plain(&read_by(cone(0.0), truth.clone()));
    assert_eq!(codes(&section), [Code::FlankIsTip]);
    assert!(section.warnings[0].message.contains("straight and alike"));
    let outer = section.reach.unwrap().outer.unwrap().outline.area();
    assert!(
        (5000.0 * (1.0 - 1e-9)..5400.0).contains(&(outer / UM / UM)),
        "{outer}"
    );
}

#[test]
fn a_master_read_by_a_cone_is_bracketed_from_the_other_side() {
    for radius in [0.0, 2.0, 12.5] {
        // A ridge of 100 um by 50 um, read, then turned over.
        let ridge = trace(
            400.0,
            0.5,
            |x| {
                if (150.0..=250.0).contains(&x) {
                    50.0
                } else {
                    0.0
                }
            },
            &[[0.0, 100.0], [300.0, 400.0]],
        );
        let mut read = read_by(cone(radius), ridge);
        read.inverted = true;
        read.profile.z.iter_mut().for_each(|z| *z = -*z);
        let with = |tip: Option<Tip>, walls: Option<f64>| {
            let options = SectionOptions {
                tip,
                walls,
                ..SectionOptions::default()
            };
            one(&read, &options)
        };
        let section = with(Some(cone(radius)), None);
        assert_eq!(codes(&section), [Code::FlankIsTip]);
        let reach = section.reach.as_ref().unwrap();
        assert!(reach.outer.is_none());
        let inner = reach.inner.as_ref().unwrap().outline.area() / UM / UM;
        assert_close(inner, 5000.0, 1e-6);
        assert!(section.outline.area() > 6000.0 * UM * UM);
        let upright = with(Some(cone(radius)), Some(std::f64::consts::FRAC_PI_2));
        assert_close(upright.outline.area(), 5000.0 * UM * UM, 1e-6);
        let outer = upright.reach.unwrap().outer.unwrap().outline.area();
        assert_close(outer, section.outline.area(), 1e-9);
        let slanted = with(Some(cone(radius)), Some(80_f64.to_radians()));
        let expected = 5000.0 + 50.0 * 50.0 / 80_f64.to_radians().tan();
        assert_close(slanted.outline.area(), expected * UM * UM, 1e-6);
        let unknown = with(None, None);
        if radius < 3.0 {
            let inner = unknown.reach.unwrap().inner.unwrap().outline.area() / UM / UM;
            assert!(inner <= 5000.0 * (1.0 + 1e-9) && inner > 4000.0, "{inner}");
        }
    }
}

#[test]
fn a_tip_touched_the_size_that_was_measured() {
    let truth = groove(|x| if x > 0.0 && x < 100.0 { -50.0 } else { 0.0 });
    let mut read = read_by(cone(2.0), truth);
    for x in &mut read.profile.x {
        *x *= 0.9;
    }
    for z in &mut read.profile.z {
        *z *= 1.1;
    }
    for land in &mut read.lands {
        (land.from, land.to) = (0.9 * land.from, 0.9 * land.to);
    }
    read.shrinkage = [0.1, -0.1];
    let options = SectionOptions {
        tip: Some(cone(2.0)),
        ..SectionOptions::default()
    };
    let section = one(&read, &options);
    let outer = section.reach.unwrap().outer.unwrap().outline.area();
    assert_close(outer, 0.99 * 5000.0 * UM * UM, 1e-6);
}

#[test]
fn a_floor_that_no_tip_touched_has_no_largest_section() {
    let truth = groove(|x| if x > 30.0 && x < 70.0 { -80.0 } else { 0.0 });
    for radius in [0.0, 5.0] {
        let options = SectionOptions {
            tip: Some(cone(radius)),
            walls: Some(std::f64::consts::FRAC_PI_2),
            ..SectionOptions::default()
        };
        let section = one(&read_by(cone(radius), truth.clone()), &options);
        assert!(section.reach.is_none());
        assert!(section.flanks.iter().any(|f| f.is_bottomless));
        assert!(section.warnings[0].message.contains("no floor was touched"));
        assert!(
            section
                .steps
                .iter()
                .any(|s| s.text.contains("were not drawn"))
        );
    }
}
