//! Height maps in text: matrices, lists of points, and what they must not be.

#![expect(clippy::float_cmp, reason = "written digits are rounded once")]

use super::*;
use crate::intake::read_error::ReadProblem;

fn read(
    text: &str,
    change: impl Fn(&mut TableOptions),
) -> Result<(HeightMap, Vec<Warning>), TableProblem> {
    let mut options = TableOptions::default();
    change(&mut options);
    read_map_table(text, &options).map_err(|fault| match *fault.problem {
        ReadProblem::Table { source } => source,
        other => panic!("{other:?}"),
    })
}

fn map(text: &str) -> HeightMap {
    read(text, |_| {}).unwrap().0
}

const AREA: &str = "# Breite: 9,0 \u{b5}m\n# H\u{f6}he: 400 nm\n# Value units: nm\n";

#[test]
fn a_matrix_with_its_size_in_the_header() {
    let map = map(&format!("{AREA}1 2 3\n4 NaN 6\n"));
    assert_eq!((map.size, map.spacing), ([3, 2], [3e-6, 0.2e-6]));
    assert_eq!(map.heights[0], 1e-9);
    assert!(map.heights[4].is_nan());
    assert_eq!(map.heights[5], 6e-9);
    assert_eq!(map.metadata.len(), 3);
    assert!(map.steps.iter().any(|step| step.what == "missing"));
}

#[test]
fn a_matrix_with_steps_asked_for() {
    let text = "1,5;2,5;3,5\n4,5;5,5;6,5\n";
    let problem = read(text, |o| o.unit = Some("um".to_owned())).unwrap_err();
    assert!(matches!(
        problem,
        TableProblem::NoSpacing { direction: "x", .. }
    ));
    let given = |o: &mut TableOptions| {
        o.z_unit = Some("um".to_owned());
        (o.x_step, o.y_step) = (Some(1e-6), Some(2e-6));
    };
    let (map, _) = read(text, given).unwrap();
    assert_eq!((map.size, map.spacing), ([3, 2], [1e-6, 2e-6]));
    assert_eq!(map.heights[1], 2.5e-6);
    let no_unit = read(text, |o| (o.x_step, o.y_step) = (Some(1e-6), Some(2e-6)));
    assert!(matches!(no_unit, Err(TableProblem::MissingUnit { .. })));
    let bad = read(text, |o| o.y_step = Some(0.0));
    assert!(matches!(bad, Err(TableProblem::StepNotPositive { .. })));
}

#[test]
fn positions_along_the_edges_are_axes() {
    let text = ",0,2,4,6\n0,1,2,3,4\n5,5,6,7,8\n10,9,1,2,3\n";
    let (map, _) = read(text, |o| o.unit = Some("um".to_owned())).unwrap();
    assert_eq!((map.size, map.spacing), ([4, 3], [2e-6, 5e-6]));
    assert_eq!(map.heights[4], 5e-6);
    // A missing height in the corner over uneven rows is a missing height.
    let text = ",0,2,9\n0,1,2,3\n5,5,6,7\n10,9,1,2\n";
    let given = |o: &mut TableOptions| {
        o.z_unit = Some("um".to_owned());
        (o.x_step, o.y_step) = (Some(1e-6), Some(1e-6));
    };
    assert_eq!(read(text, given).unwrap().0.size, [4, 4]);
}

#[test]
fn points_in_any_order() {
    let text = "x_um,y_um,z_nm\n2,0,3\n0,0,1\n1,0,2\n0,5,4\n1,5,NaN\n";
    let map = map(text);
    assert_eq!((map.size, map.spacing), ([3, 2], [1e-6, 5e-6]));
    assert_eq!(&map.heights[..4], [1e-9, 2e-9, 3e-9, 4e-9]);
    assert!(map.heights[4].is_nan() && map.heights[5].is_nan());
    let rounded = "0 0 1\n0.33 0 2\n0.67 0 3\n1 0 4\n0 1 5\n0.33 1 6\n0.67 1 7\n1 1 8\n";
    let (map, _) = read(rounded, |o| o.unit = Some("um".to_owned())).unwrap();
    assert_eq!(map.size, [4, 2]);
    assert!((map.spacing[0] / 1e-6 - 1.0 / 3.0).abs() < 1e-12);
}

#[test]
fn what_a_map_must_not_be() {
    let named = |rows: &str| read(&format!("x_um,y_um,z_nm\n{rows}"), |_| {}).unwrap_err();
    assert_eq!(
        named("0,0,1\n1,0,2\n0,1,3\n1,1,4\n1,1,5\n"),
        TableProblem::RepeatedPoint
    );
    assert_eq!(
        named("0,0,1\n1,0,2\n0,1,3\n,1,4\n"),
        TableProblem::PointWithoutPlace
    );
    assert!(matches!(
        named("0,0,1\n1,0,2\n2.5,1,3\n7,1,4\n0.1,3,5\n3.3,4,5\n"),
        TableProblem::NotALattice { .. }
    ));
    assert!(matches!(
        named("0,0,1\n0,1,2\n0,2,3\n"),
        TableProblem::NotALattice { direction: "x", .. }
    ));
    let matrix = |rows: &str| read(&format!("{AREA}{rows}"), |_| {}).unwrap_err();
    assert_eq!(
        matrix("1 2 3\n4 5\n6 7 8\n"),
        TableProblem::RowLength {
            found: 2,
            expected: 3
        }
    );
    assert_eq!(
        matrix("NaN 1 2\nNaN x 3\n4 5 6\n"),
        TableProblem::TextWithin {
            text: "NaN x 3".to_owned()
        }
    );
    assert!(matches!(
        matrix("1 2 3\n"),
        TableProblem::TooFewSamples { .. }
    ));
    assert!(matches!(
        matrix("1e9 2 3\n4 5 6\n"),
        TableProblem::Implausible { .. }
    ));
    let destroyed = "# Width: 9 \u{fffd}m\n# Height: 3 um\n# Value units: nm\n1 2 3\n4 5 6\n";
    let problem = read(destroyed, |_| {}).unwrap_err();
    assert!(problem.hint().contains("--x-step") && problem.is_ambiguous());
    assert!(read(destroyed, |o| o.x_step = Some(1e-6)).is_ok());
}
