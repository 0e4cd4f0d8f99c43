//! `draw`, and what it hands on to `solve` and `check`.

use crate::{Folder, assert_close, shape, value};

#[test]
fn a_drawn_section_solves_to_the_numbers_of_the_shipped_one() {
    let folder = Folder::new();
    let run = folder.line("draw rectangle --width 100um --height 40um --name mine -o r.toml");
    assert_eq!((run.status, run.out.as_str()), (0, ""));
    assert!(
        run.err.starts_with("wrote r.toml: area 4000"),
        "{}",
        run.err
    );
    let mine = folder.json("solve r.toml --json");
    let shipped = folder.json(&format!(
        "solve {} --json",
        shape("drawn/rectangle_100x40.toml")
    ));
    assert_eq!(mine["name"], "mine");
    for path in [
        "/conductance",
        "/poiseuille/fanning_dh",
        "/wall_shear/max_per_gradient",
    ] {
        assert_close(value(&mine, path), value(&shipped, path), 1e-14);
    }
}

#[test]
fn points_and_columns_hold_the_same_section() {
    let folder = Folder::new();
    let draw = "draw koh_groove --opening 100um --depth 40um --posts";
    let post = "circle diameter=9um x=3um y=-20um";
    let run = |more: &[&str]| {
        let words: Vec<&str> = draw
            .split(' ')
            .chain([post])
            .chain(more.iter().copied())
            .collect();
        let run = folder.run(&words);
        assert_eq!(run.status, 0, "{}", run.err);
    };
    run(&["-o", "nominal.toml"]);
    run(&["-o", "points.toml", "--points"]);
    run(&["-o", "points.csv"]);
    for name in ["nominal.toml", "points.toml", "points.csv"] {
        let check = folder.line(&format!("check {name}"));
        assert!(check.out.contains("no problems"), "{}", check.out);
    }
    let solve = |name: &str| {
        value(
            &folder.json(&format!("solve {name} --json --cells-across 32")),
            "/conductance",
        )
    };
    let nominal = solve("nominal.toml");
    assert_close(solve("points.toml"), nominal, 1e-9);
    assert_close(solve("points.csv"), nominal, 1e-9);
}

#[test]
fn machine_output_holds_the_outline_in_metres() {
    let folder = Folder::new();
    let record = folder.json("draw rectangle --width 100um --height 40um --json");
    assert_eq!(record["schema"], "etchwise-draw/1");
    assert_close(value(&record, "/area"), 4e-9, 1e-12);
    assert_close(value(&record, "/wetted_perimeter"), 280e-6, 1e-12);
    assert_eq!(record["lumens"][0]["outer"].as_array().unwrap().len(), 4);
}

#[test]
fn lists_of_posts_and_sections_in_sections() {
    let folder = Folder::new();
    let post = "circle diameter=5um x=0um y=-20um";
    let other = "circle diameter=5um x=20um y=-20um";
    let list = format!("[({post}), ({other})]");
    let rectangle = [
        "draw",
        "rectangle",
        "--width",
        "100um",
        "--height",
        "40um",
        "--posts",
    ];
    let one_by_one = folder.run(&[&rectangle[..], &[post, "--posts", other]].concat());
    let at_once = folder.run(&[&rectangle[..], &[&list]].concat());
    assert_eq!(one_by_one.status, 0, "{}", one_by_one.err);
    assert_eq!(one_by_one.out, at_once.out);
    let groove = "(koh_groove opening=100um depth=40um)";
    let halves =
        |lower: &str| folder.run(&["draw", "bonded_halves", "--lower", lower, "--upper", groove]);
    assert_eq!(halves(groove).status, 0);
    assert_eq!(
        halves(groove.trim_matches(['(', ')'])).out,
        halves(groove).out
    );
}

#[test]
fn what_cannot_be_drawn_is_refused_with_the_option_to_type() {
    let folder = Folder::new();
    for (line, parts) in [
        (
            "draw rectangel --width 1um",
            &["rectangel", "rectangle"][..],
        ),
        (
            "draw rectangle --width 1um --heigth 1um",
            &["--heigth", "--height"],
        ),
        (
            "draw rectangle --width 100um",
            &["needs `height`", "--height \"40 um\""],
        ),
        (
            "draw rectangle --width 100 --height 40um",
            &["`100` has no unit", "--width \"100 um\""],
        ),
        (
            "draw rectangle --width 100um --height 0um",
            &["`height`", "above 0 um"],
        ),
        (
            "draw rectangle --width 100um --height=-4um",
            &["`height`", "-4 um", "above 0 um"],
        ),
        (
            "draw rectangle --width NaNum --height 4um",
            &["not a finite number"],
        ),
        (
            "draw rectangle --width 1e999um --height 4um",
            &["not a finite number"],
        ),
        (
            "draw rectangle --width 9um --height 4um --lid-sag 4um",
            &["`lid_sag`", "below 4 um"],
        ),
        ("draw circle --diameter 1e9m", &["`diameter`", "at most"]),
        (
            "draw regular_polygon --sides 1e9 --side 1um",
            &["`sides`", "at most 1000"],
        ),
        (
            "draw regular_polygon --sides 2.5 --side 1um",
            &["`sides`", "--sides \"6\""],
        ),
        (
            "draw circular_sector --radius 5um --angle 90",
            &["`90` has no unit", "--angle \"90 deg\""],
        ),
        (
            "draw rectangle --width 9um --height 4um --posts [",
            &["column 2"],
        ),
        (
            "draw rectangle --width 9um --height 4um --posts circle",
            &["`diameter`"],
        ),
        ("draw bonded_halves --lower ((((( --upper x", &["column 2"]),
    ] {
        let run = folder.line(&format!("{line} -o out.toml"));
        run.assert_error(2, parts);
        assert!(folder.names().is_empty(), "{line}");
    }
    let deep = format!("{}circle", "bonded_halves lower=(".repeat(5000));
    folder
        .run(&[
            "draw",
            "bonded_halves",
            "--lower",
            &deep,
            "--upper",
            "circle diameter=3um",
        ])
        .assert_error(2, &["deep"]);
}
