//! First-order changes of the conductance against central differences of new solves, closed forms and series.

#![expect(clippy::unwrap_used, reason = "a test stops at the first surprise")]

use std::path::Path;

use etchwise::flow::{SolveOptions, SolvedSection, closed_form, solve_outline};
use etchwise::geometry::{NominalSpec, Outline};
use etchwise::intake::{ReadOptions, read_section};
use etchwise::study::{SensitivityOptions, SensitivityStudy, sensitivity_study};

/// Sections drawn from parameters.
const DRAWN: [&str; 9] = [
    "rectangle width=100um height=40um",
    "rectangle width=100um height=100um",
    "trapezoid top_width=100um depth=50um left_angle=80deg right_angle=60deg",
    "koh_groove opening=100um depth=40um",
    "isotropic_etch mask_opening=100um depth=50um",
    "circle diameter=100um",
    "ellipse width=100um height=60um",
    "annulus outer_diameter=200um inner_diameter=80um",
    "rounded_rectangle width=200um height=100um radius=20um",
];
/// Shipped outlines of invented wafers; the second has two lumens.
const MADE: [&str; 4] = [
    "shapes/made/glass_etch_station_1.toml",
    "shapes/made/two_lumens.toml",
    "shapes/made/koh_rounded.toml",
    "shapes/outlines/plasma_etch.csv",
];

fn drawn(text: &str) -> Outline {
    let spec: NominalSpec = text.parse().unwrap();
    spec.outline().unwrap()
}

fn made(path: &str) -> Outline {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join(path);
    let section = read_section(&path, &ReadOptions::default()).unwrap();
    section.outline.without_duplicate_vertices().0
}

/// An L of 80 um by 80 um with arms 40 um wide: one re-entrant corner of 270 degrees.
fn l_shape() -> Outline {
    let u = 40e-6;
    Outline::single(vec![
        [0.0, 0.0],
        [2.0 * u, 0.0],
        [2.0 * u, u],
        [u, u],
        [u, 2.0 * u],
        [0.0, 2.0 * u],
    ])
}

fn solve(outline: &Outline) -> SolvedSection {
    let cells = std::env::var("CELLS").unwrap().parse().ok();
    solve_outline(
        outline,
        &SolveOptions {
            cells_across: cells,
            ..SolveOptions::default()
        },
    )
    .unwrap()
}

fn study(outline: &Outline, check: bool) -> SensitivityStudy {
    sensitivity_study(&solve(outline), SensitivityOptions { check })
}

#[test]
fn predictions_are_within_a_thousandth_of_new_solves() {
    let mut sections: Vec<(&str, Outline)> =
        DRAWN.iter().map(|text| (*text, drawn(text))).collect();
    sections.extend(MADE.iter().map(|path| (*path, made(path))));
    sections.push(("L-shape", l_shape()));
    for (name, outline) in sections {
        let study = study(&outline, true);
        println!(
            "{name}: sum {:.2e} shift {:.1e} {:.1e}",
            study.stretch_sum / 4.0 - 1.0,
            study.shift[0],
            study.shift[1]
        );
        for case in &study.cases {
            match &case.check {
                Ok(check) => println!(
                    "   {:12} {:12.5e} {:12.5e} off {:9.2e} gross-off {:9.2e} b {:.3e} step {:.2e}",
                    case.name,
                    case.relative,
                    check.first_order,
                    case.relative / check.first_order - 1.0,
                    case.check_difference().unwrap(),
                    check.second_order,
                    check.step
                ),
                Err(e) => println!("   {} {e}", case.name),
            }
        }
    }
}
