//! Random valid sections of every kind: sound outlines, area scaling, posts taken off the area.

use proptest::prelude::*;

use super::super::kinds;
use super::{assert_sound, outline};

/// A valid line of the kind from five numbers between 0 and 1; lengths times `scale` micrometres.
fn valid_line(kind: &str, r: [f64; 5], scale: f64) -> String {
    let um = |low: f64, high: f64, r: f64| format!("{}um", scale * (low * (high / low).powf(r)));
    let deg = |low: f64, high: f64, r: f64| format!("{}deg", low + (high - low) * r);
    let (w, h) = (um(1.0, 1000.0, r[0]), um(1.0, 1000.0, r[1]));
    let (wide, high) = (1000.0_f64.powf(r[0]), 1000.0_f64.powf(r[1]));
    let short = wide.min(high);
    let part = |most: f64, r: f64| format!("{}um", scale * most * r);
    match kind {
        "rectangle" | "stadium" | "ellipse" => format!("{kind} width={w} height={h}"),
        "trapezoid" => {
            let left = (5.0 + 170.0 * r[2]).to_radians();
            let right = (5.0 + 170.0 * r[3]).to_radians();
            let narrowing = 1.0 / left.tan() + 1.0 / right.tan();
            let depth = if narrowing > 0.0 {
                high.min(0.9 * wide / narrowing)
            } else {
                high
            };
            format!(
                "{kind} top_width={w} depth={}um left_angle={} right_angle={}",
                scale * depth,
                deg(5.0, 175.0, r[2]),
                deg(5.0, 175.0, r[3])
            )
        }
        "koh_groove" => format!("{kind} opening={w} depth={h}"),
        "isotropic_etch" => format!("{kind} mask_opening={w} depth={h}"),
        "rounded_rectangle" => format!(
            "{kind} width={w} height={h} radius={} radius_top_left={} radius_top_right={}",
            part(short / 2.0, r[2]),
            part(short / 2.0, r[3]),
            part(short / 2.0, r[4])
        ),
        "circle" => format!("{kind} diameter={w}"),
        "half_ellipse" | "parabolic_groove" => format!("{kind} width={w} depth={h}"),
        "circular_segment" => format!(
            "{kind} radius={w} depth={}",
            part(2.0 * wide, 0.01 + 0.98 * r[2])
        ),
        "circular_sector" => format!("{kind} radius={w} angle={}", deg(1.0, 359.0, r[1])),
        "triangle" => format!(
            "{kind} base={w} left_angle={} right_angle={}",
            deg(2.0, 120.0, r[1]),
            deg(2.0, 59.0, r[2])
        ),
        "triangle_height" => format!(
            "{kind} base={w} height={h} apex_offset={}",
            part(wide, 2.0 * r[2] - 1.0)
        ),
        "triangle_sides" => format!(
            "{kind} a={w} b={w} c={}",
            part(2.0 * wide, 0.01 + 0.98 * r[1])
        ),
        "regular_polygon" => format!("{kind} sides={} side={w}", 3 + (60.0 * r[1]) as u32),
        "drie_trench" => trench_line(r, scale),
        "gaussian_groove" => format!(
            "{kind} depth={h} width={w} truncation={}",
            0.001 + 0.4 * r[2]
        ),
        "annulus" => {
            let inner = 0.02 + 0.96 * r[1];
            format!(
                "{kind} outer_diameter={w} inner_diameter={} offset={}",
                part(wide, inner),
                part(wide * (1.0 - inner) / 2.0, 1.9 * r[2] - 0.95)
            )
        }
        "rhombus" => format!("{kind} side={w} acute_angle={}", deg(2.0, 90.0, r[1])),
        "bonded_halves" => format!(
            "{kind} lower=(rectangle width={w} height={h}) upper=(isotropic_etch mask_opening={} depth={}) offset={} gap={}",
            part(wide, r[2]),
            part(short, 0.1 + r[3]),
            part(wide, 2.0 * r[4] - 1.0),
            if r[2] > 0.5 {
                part(short, r[3])
            } else {
                "0um".to_owned()
            }
        ),
        _ => panic!("no random line for {kind}"),
    }
}

/// A valid deep-reactive-ion trench.
fn trench_line(r: [f64; 5], scale: f64) -> String {
    let wide = 1000.0_f64.powf(r[0]);
    let w = format!("{}um", scale * wide);
    let part = |most: f64, r: f64| format!("{}um", scale * most * r);
    let deg = |low: f64, high: f64, r: f64| format!("{}deg", low + (high - low) * r);
    let kind = "drie_trench";
    let depth = wide * 10.0_f64.powf(2.0 * r[1] - 1.0);
    let pitch = depth / (2.0 + 40.0 * r[3]);
    format!(
        "{kind} top_width={w} depth={}um taper={} bow={} scallop_pitch={}um scallop_depth={}um foot_radius={}",
        scale * depth,
        deg(88.0, 91.0, r[2]),
        part(0.05 * depth.min(wide), r[4]),
        scale * pitch,
        scale * pitch * 0.3 * (0.01 + r[4]),
        part(0.2 * depth.min(wide), r[0])
    )
}

/// Whether the section may be given an arched lid.
fn has_flat_lid(kind: &str) -> bool {
    super::super::lid::WITH_FLAT_LID.contains(&kind) && kind != "rounded_rectangle"
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(24))]

    #[test]
    fn random_sections_are_sound_and_their_area_scales_with_the_square(
        r in prop::array::uniform5(0.0..1.0_f64),
        scale in 0.1..10.0_f64,
    ) {
        for info in kinds() {
            let line = valid_line(info.name, r, 1.0);
            let made = outline(&line);
            assert_sound(&made, &line);
            let scaled = outline(&valid_line(info.name, r, scale));
            let ratio = scaled.area() / made.area() / (scale * scale);
            prop_assert!((ratio - 1.0).abs() < 1e-6, "{}: {}", line, ratio);
        }
    }

    #[test]
    fn arched_lids_keep_sections_sound_and_are_refused_only_with_a_limit_that_works(
        r in prop::array::uniform5(0.01..1.0_f64),
        sag in 0.0..0.4_f64,
    ) {
        for info in kinds().iter().filter(|info| has_flat_lid(info.name)) {
            let line = valid_line(info.name, r, 1.0);
            let flat = outline(&line);
            let ends = flat.lumens[0].outer.points.clone();
            let lid = ends.last().unwrap()[0] - ends[0][0];
            for (name, more) in [("lid_sag", false), ("lid_bulge", true)] {
                let arched = format!("{line} {name}={}um", sag * lid * 1e6);
                match arched.parse::<super::super::NominalSpec>().unwrap().outline() {
                    Ok(made) => {
                        assert_sound(&made, &arched);
                        prop_assert!(more == (made.area() > flat.area()) || sag < 1e-6);
                    }
                    Err(super::super::NominalError::OutOfRange { limit, .. }) if !more => {
                        let fits = format!("{line} {name}={}um", limit.value * 1e6 * 0.999);
                        assert_sound(&outline(&fits), &fits);
                    }
                    Err(error) => prop_assert!(false, "{}: {}", arched, error),
                }
            }
        }
    }

    #[test]
    fn a_post_takes_its_area_off_the_section(
        x in -40.0..40.0_f64,
        y in -30.0..-10.0_f64,
        size in 0.1..9.0_f64,
        turn in 0.0..180.0_f64,
    ) {
        let line = format!(
            "rectangle width=100um height=40um posts=[(rhombus side={size}um acute_angle=50deg x={x}um y={y}um rotation={turn}deg)]"
        );
        let made = outline(&line);
        assert_sound(&made, &line);
        let expected = 4000.0 - size * size * 50.0_f64.to_radians().sin();
        prop_assert!((made.area() * 1e12 / expected - 1.0).abs() < 1e-9);
    }
}

#[test]
fn a_kind_takes_an_arched_lid_just_when_the_list_of_flat_lids_has_it() {
    for info in kinds() {
        let line = format!(
            "{} lid_bulge=1nm",
            valid_line(info.name, [0.7, 0.6, 0.5, 0.4, 0.3], 1.0)
        );
        let refused = line
            .parse::<super::super::NominalSpec>()
            .unwrap()
            .outline()
            .err();
        let listed = has_flat_lid(info.name);
        assert_eq!(refused.is_none(), listed, "{line}: {refused:?}");
        if let Some(error) = refused {
            assert!(
                matches!(error, super::super::NominalError::NoFlatLid { .. }),
                "{error}"
            );
        }
    }
}
