//! Every refusal names the parameter, the value, the limit and a remedy.

use std::collections::BTreeMap;

use super::super::{NominalError, NominalSpec, SpecValue};
use super::refusal;

/// A line, parts of its message and parts of its hint.
type Case = (
    &'static str,
    &'static [&'static str],
    &'static [&'static str],
);

fn assert_refused(cases: &[Case]) {
    for (line, message, hint) in cases {
        let error = refusal(line);
        for part in *message {
            assert!(error.to_string().contains(part), "{line}: {error}");
        }
        for part in *hint {
            assert!(error.hint().contains(part), "{line}: {}", error.hint());
        }
        assert!(!error.hint().is_empty());
    }
}

#[test]
fn words_that_are_not_known_come_with_the_nearest_and_the_list() {
    assert_refused(&[
        (
            "rectangel width=1um height=1um",
            &["`rectangel` is not a kind"],
            &["did you mean `rectangle`?", "koh_groove", "rhombus"],
        ),
        (
            "hexagram",
            &["`hexagram`"],
            &["the kinds are rectangle, trapezoid"],
        ),
        (
            "koh_groove opning=100um depth=40um",
            &["`koh_groove` has no parameter `opning`"],
            &[
                "did you mean `opening`?",
                "opening, depth, lid_sag, lid_bulge, posts",
            ],
        ),
        (
            "koh_groove depth=40um",
            &["needs `opening`"],
            &["opening = \"100 um\""],
        ),
    ]);
}

#[test]
fn values_without_a_unit_or_of_the_wrong_sort_are_refused() {
    assert_refused(&[
        (
            "circle diameter=100",
            &["`diameter` of `circle`", "`100` has no unit"],
            &["write a unit", "\"100 um\""],
        ),
        (
            "circle diameter=wide",
            &["does not start with a number"],
            &["\"100 um\""],
        ),
        ("circle diameter=3furlong", &["`furlong`"], &["diameter ="]),
        (
            "circular_sector radius=5um angle=90",
            &["`angle`", "`90` has no unit", "angle was expected"],
            &["write a unit", "\"90 deg\""],
        ),
        (
            "regular_polygon sides=5.5 side=1um",
            &["`sides`", "5.5"],
            &["sides = 6"],
        ),
        (
            "regular_polygon sides=many side=1um",
            &["`many`, not a whole number"],
            &["sides = 6"],
        ),
        (
            "rectangle width=1um height=1um posts=none",
            &["`none`, not a list"],
            &["posts = ["],
        ),
        (
            "bonded_halves lower=circle upper=(rectangle width=1um height=1um)",
            &["`lower`", "not a section"],
            &["lower = ("],
        ),
    ]);
    let bare = NominalSpec {
        kind: "circle".to_owned(),
        values: BTreeMap::from([("diameter".to_owned(), SpecValue::Number(100.0))]),
    };
    let error = bare.outline().unwrap_err();
    assert!(matches!(
        error,
        NominalError::BareNumber {
            parameter: "diameter",
            ..
        }
    ));
    assert!(error.to_string().contains("bare number 100"), "{error}");
    assert_eq!(error.hint(), "write for example diameter = \"100 um\"");
}

#[test]
fn sizes_that_are_not_positive_or_not_sensible_are_refused() {
    assert_refused(&[
        (
            "circle diameter=0um",
            &["`diameter` of `circle` is 0 um; it must be above 0 um"],
            &["above zero"],
        ),
        ("circle diameter=-3um", &["is -3 um"], &["above zero"]),
        ("circle diameter=1e-9um", &["at least", "atom"], &["unit"]),
        ("circle diameter=1e9m", &["at most"], &["unit"]),
        (
            "circle diameter=1e999um",
            &["`diameter` of `circle`", "`1e999um` is not a finite number"],
            &["diameter = \"100 um\""],
        ),
        (
            "rectangle width=1000m height=1e-3nm lid_bulge=400m",
            &["segments"],
            &["units"],
        ),
        (
            "regular_polygon sides=2 side=1um",
            &["is 2; it must be at least 3"],
            &["whole number"],
        ),
        (
            "regular_polygon sides=5000 side=1um",
            &["at most 1000"],
            &["whole number"],
        ),
        (
            "circular_sector radius=5um angle=360deg",
            &["below 360 deg"],
            &["angle"],
        ),
        (
            "circular_sector radius=5um angle=0rad",
            &["above 0 deg"],
            &["angle"],
        ),
        (
            "gaussian_groove depth=3um width=9um truncation=0",
            &["above 0"],
            &["plain number"],
        ),
        (
            "gaussian_groove depth=3um width=9um truncation=1e-300",
            &["`truncation`", "at least 1.00000e-9"],
            &["larger fraction"],
        ),
        (
            "gaussian_groove depth=3um width=9um truncation=0.6",
            &["below 0.5"],
            &["plain number"],
        ),
        (
            "rhombus side=5um acute_angle=100deg",
            &["at most 90 deg"],
            &["smaller"],
        ),
        (
            "isotropic_etch mask_opening=-1um depth=5um",
            &["at least 0 um"],
            &["sign"],
        ),
    ]);
}

#[test]
fn sizes_that_contradict_one_another_are_refused_with_the_limit() {
    assert_refused(&[
        (
            "trapezoid top_width=100um depth=60um left_angle=45deg right_angle=45deg",
            &["`depth`", "is 60 um", "below 50 um", "walls meet"],
            &["reduce the depth"],
        ),
        (
            "rounded_rectangle width=100um height=40um radius=21um",
            &["`radius`", "is 21 um", "at most 20 um"],
            &["reduce the radius"],
        ),
        (
            "rounded_rectangle width=100um height=40um radius_top_left=30um radius_bottom_left=15um",
            &["`radius_top_left`", "at most 25 um"],
            &["reduce the radius"],
        ),
        (
            "rounded_rectangle width=100um height=40um radius=25um radius_top_left=5um radius_top_right=5um \
             radius_bottom_right=5um lid_sag=1um",
            &["`lid_sag`"],
            &["kinds with a flat lid"],
        ),
        (
            "rounded_rectangle width=100um height=40um",
            &["needs `radius`"],
            &["\"8 um\""],
        ),
        (
            "circular_segment radius=5um width=3um depth=1um",
            &["one of", "2 are given"],
            &["just one"],
        ),
        (
            "circular_segment depth=1um",
            &["one of", "0 are given"],
            &["just one"],
        ),
        (
            "circular_segment radius=5um depth=10um",
            &["below 10 um", "diameter"],
            &["circle"],
        ),
        (
            "regular_polygon sides=5",
            &["one of"],
            &["`side` and `across_flats`"],
        ),
        (
            "triangle base=5um left_angle=100deg right_angle=80deg",
            &["`right_angle`", "below 80 deg"],
            &["180 deg"],
        ),
        (
            "triangle_sides a=5um b=2um c=3um",
            &["`a`", "below 5 um"],
            &["shorter"],
        ),
    ]);
}

#[test]
fn circles_that_touch_and_trenches_that_close_are_refused_with_the_limit() {
    assert_refused(&[
        (
            "annulus outer_diameter=50um inner_diameter=50um",
            &["`inner_diameter`", "below 50 um"],
            &["smaller"],
        ),
        (
            "annulus outer_diameter=100um inner_diameter=50um offset=-25um",
            &["`offset`", "above -25 um", "touch"],
            &["towards the centre"],
        ),
        (
            "drie_trench top_width=10um depth=120um taper=80deg",
            &["`depth`", "below 28.3564 um"],
            &["taper"],
        ),
        (
            "drie_trench top_width=10um depth=20um foot_radius=6um",
            &["`foot_radius`", "below 5 um"],
            &["radius"],
        ),
        (
            "drie_trench top_width=10um depth=20um scallop_pitch=1um",
            &["`scallop_pitch`", "`scallop_depth`"],
            &["both"],
        ),
        (
            "drie_trench top_width=10um depth=20um scallop_pitch=1um scallop_depth=0.5um",
            &["`scallop_depth`", "below 0.5 um"],
            &["pitch"],
        ),
        (
            "drie_trench top_width=10um depth=20um scallop_pitch=1nm scallop_depth=0.1nm",
            &["`scallop_pitch`", "at least 4 nm"],
            &["mean wall"],
        ),
        (
            "drie_trench top_width=10um depth=20um scallop_pitch=25um scallop_depth=1um",
            &["at most 20 um"],
            &["pitch"],
        ),
    ]);
}

#[test]
fn an_arched_lid_needs_a_flat_one_and_room() {
    assert_refused(&[
        (
            "circle diameter=10um lid_sag=1um",
            &["`circle` has no flat lid", "`lid_sag`"],
            &["rectangle", "drie_trench"],
        ),
        (
            "rectangle width=100um height=40um lid_sag=1um lid_bulge=1um",
            &["both"],
            &["one of them"],
        ),
        (
            "rectangle width=100um height=40um lid_sag=41um",
            &["below 40 um", "meets the wall"],
            &["sag"],
        ),
        (
            "rectangle width=40um height=100um lid_sag=30um",
            &["below 20 um"],
            &["sag"],
        ),
        (
            "rectangle width=40um height=100um lid_bulge=21um",
            &["at most 20 um"],
            &["bulge"],
        ),
        // A V of half angle 45 deg: the arc leaves the lid's end steeper than the wall at tan(22.5 deg) of half the lid.
        (
            "triangle base=100um left_angle=45deg right_angle=45deg lid_sag=21um",
            &["below 20.7107 um"],
            &["sag"],
        ),
        (
            "bonded_halves lower=(circle diameter=3um) upper=(rectangle width=1um height=1um)",
            &["in `lower`", "`circle` has no flat lid"],
            &["rectangle"],
        ),
        (
            "bonded_halves lower=(rectangle width=9um height=9um) upper=(rectangle width=9um height=0um)",
            &["in `upper`", "`height`"],
            &["above zero"],
        ),
        (
            "bonded_halves lower=(rectangle width=9um height=9um lid_sag=1um) upper=(rectangle width=9um height=9um)",
            &["in `lower`", "no flat lid"],
            &["lid_sag"],
        ),
        (
            "bonded_halves lower=(rectangle width=9um height=9um) upper=(rectangle width=9um height=9um) offset=9um",
            &["`offset`", "just touch"],
            &["gap"],
        ),
    ]);
}

#[test]
fn posts_outside_on_the_wall_or_on_one_another_are_refused() {
    assert_refused(&[
        (
            "rectangle width=100um height=40um posts=[(circle diameter=4um x=0um y=20um)]",
            &[
                "`posts`, number 1",
                "x = 0 um, y = 20 um is not inside",
                "-40 um to 0 um",
            ],
            &["negative y"],
        ),
        (
            "rectangle width=100um height=40um posts=[(circle diameter=4um x=0um y=-2um)]",
            &["meets the wall"],
            &["move the post"],
        ),
        (
            "rectangle width=100um height=40um posts=[(rectangle width=4um height=4um x=48um y=-20um)]",
            &["meets the wall"],
            &["move the post"],
        ),
        (
            "rectangle width=100um height=40um posts=[(circle diameter=4um x=0um y=-20um) (circle diameter=4um x=3um y=-20um)]",
            &["number 2", "another post"],
            &["move the post"],
        ),
        (
            "rectangle width=100um height=40um posts=[(circle diameter=4um x=0um y=-20um) (circle diameter=9um x=0um y=-20um)]",
            &["another post"],
            &["move the post"],
        ),
        (
            "annulus outer_diameter=100um inner_diameter=50um posts=[(circle diameter=4um x=0um y=0um)]",
            &["an island"],
            &["move the post"],
        ),
        (
            "rectangle width=100um height=40um posts=[(circle diameter=4um y=-20um)]",
            &["`post` needs `x`"],
            &["x = \"0 um\""],
        ),
        (
            "rectangle width=100um height=40um posts=[(circle diametre=4um x=0um y=-20um)]",
            &["number 1", "`diametre`"],
            &["`diameter`"],
        ),
        (
            "rectangle width=100um height=40um posts=[(annulus outer_diameter=4um inner_diameter=2um x=0um y=-20um)]",
            &["cannot be a post"],
            &["circle"],
        ),
    ]);
}

#[test]
fn sections_nested_without_end_are_refused() {
    let mut spec = NominalSpec {
        kind: "rectangle".to_owned(),
        values: BTreeMap::new(),
    };
    for _ in 0..50 {
        spec = NominalSpec {
            kind: "bonded_halves".to_owned(),
            values: BTreeMap::from([("lower".to_owned(), SpecValue::Spec(spec))]),
        };
    }
    let mut error = spec.outline().unwrap_err();
    while let NominalError::Nested { source, .. } = error {
        error = *source;
    }
    assert!(matches!(error, NominalError::TooDeep { .. }));
}

#[test]
fn more_posts_than_can_be_handled_are_refused_soon() {
    let posts: Vec<String> = (0..1000)
        .map(|i| format!("(circle diameter=3um x={}um y=-20um)", i * 4))
        .collect();
    let line = format!(
        "rectangle width=9mm height=40um posts=[{}]",
        posts.join(" ")
    );
    let error = refusal(&line);
    assert!(error.to_string().contains("number 807"), "{error}");
    assert!(error.to_string().contains("4000000 vertices"), "{error}");
    assert!(error.hint().contains("fewer posts"));
}
