//! Drawings that are read and drawings that are refused.

use super::{RELATIVE_CHORD_ERROR, ReadProblem, read};

fn drawing(root: &str, body: &str) -> String {
    format!("<svg xmlns=\"http://www.w3.org/2000/svg\" {root}>{body}</svg>")
}

fn area(body: &str) -> f64 {
    let content = read(&drawing("", body), Some(1e-6)).unwrap();
    content.outline.unwrap().area() / 1e-12
}

fn problem(root: &str, body: &str, scale: Option<f64>) -> ReadProblem {
    *read(&drawing(root, body), scale).unwrap_err().problem
}

#[test]
fn shapes_keep_their_exact_area() {
    let pi = std::f64::consts::PI;
    for (body, exact) in [
        ("<rect x='1' y='2' width='30' height='10'/>", 300.0),
        (
            "<rect width='30' height='10' rx='2'/>",
            300.0 - (4.0 - pi) * 4.0,
        ),
        (
            "<rect width='30' height='10' rx='2' ry='3'/>",
            300.0 - (4.0 - pi) * 6.0,
        ),
        ("<circle cx='5' cy='5' r='50'/>", pi * 2500.0),
        ("<ellipse cx='5' cy='5' rx='50' ry='5'/>", pi * 250.0),
        ("<polygon points='0,0 10,0 10,10'/>", 50.0),
        (
            "<polyline points='0 0 10 0 10 10' fill='none' stroke='red'/>",
            50.0,
        ),
        ("<path d='M0 0h10v10h-10z'/>", 100.0),
        ("<path d='M0 0h10v10h-10'/>", 100.0),
        (
            "<path d='M10 0A10 10 0 1 1-10 0A10 10 0 1 1 10 0Z M5 0A5 5 0 1 0-5 0A5 5 0 1 0 5 0Z'/>",
            pi * 75.0,
        ),
        (
            "<g transform='scale(2) rotate(30)'><circle r='3' transform='skewX(20)'/></g>",
            pi * 36.0,
        ),
        ("<rect width='1mm' height='96'/>", 96.0 * 96.0 / 25.4),
    ] {
        let read = area(body);
        assert!(
            (read / exact - 1.0).abs() < 4e-7,
            "{body}: {read} against {exact}"
        );
    }
}

/// Arcs are kept as arcs: vertices on the circle itself, chords within the stated error of it.
#[test]
fn vertices_of_a_circle_lie_on_it_and_chords_stray_no_more_than_stated() {
    for body in [
        "<circle cx='60' cy='60' r='50'/>",
        "<path d='M110 60A50 50 0 0 1 10 60A50 50 0 0 1 110 60'/>",
        "<ellipse transform='translate(60 60) scale(10 5)' rx='5' ry='10'/>",
    ] {
        let content = read(&drawing("", body), Some(1e-6)).unwrap();
        let outline = content.outline.unwrap();
        let from_centre = |p: [f64; 2]| (p[0] / 1e-6 - 60.0).hypot(p[1] / 1e-6 + 60.0);
        for (a, b) in outline.lumens[0].outer.edges() {
            assert!((from_centre(a) - 50.0).abs() < 1e-10, "{body}: {a:?}");
            let middle = [0.5 * (a[0] + b[0]), 0.5 * (a[1] + b[1])];
            let inside = 50.0 - from_centre(middle);
            assert!(inside < 100.0 * RELATIVE_CHORD_ERROR, "{body}: {inside}");
        }
        assert!((outline.area() / (std::f64::consts::PI * 2.5e-9) - 1.0).abs() < 4e-7);
    }
}

/// Computed reference: the area under a cubic from the cross products of its control points, which for a
/// quarter of radius 1 with handles `k` is `1/2 + 3 k/5 - 3 k^2/20` (Green's theorem).
#[test]
fn four_cubics_keep_the_area_of_the_cubics_not_of_the_circle() {
    let k = 0.552_284_749_8;
    let handle = 50.0 * k;
    let data = format!(
        "M50 0C50 {handle} {handle} 50 0 50C-{handle} 50 -50 {handle} -50 0\
         C-50 -{handle} -{handle} -50 0 -50C{handle} -50 50 -{handle} 50 0Z"
    );
    let exact = 4.0 * 2500.0 * (0.5 + 0.6 * k - 0.15 * k * k);
    let read = area(&format!("<path d='{data}'/>"));
    assert!((read / exact - 1.0).abs() < 4e-7, "{read} against {exact}");
}

#[test]
fn scale_comes_from_the_caller_or_from_the_size_of_the_drawing() {
    let body = "<rect x='10' y='20' width='50' height='25'/>";
    let root = "width='1mm' height='2mm' viewBox='0 0 100 200'";
    let content = read(&drawing(root, body), None).unwrap();
    let outline = content.outline.unwrap();
    assert!((outline.area() / (0.5e-3 * 0.25e-3) - 1.0).abs() < 1e-12);
    let (low, high) = outline.bounds().unwrap();
    assert!(
        (low[1] + 45e-5).abs() < 1e-15 && (high[1] + 20e-5).abs() < 1e-15,
        "y upwards"
    );
    let content = read(&drawing(root, body), Some(1e-6)).unwrap();
    assert!(
        content.notes[0].contains("10.00 \u{b5}m per unit"),
        "{:?}",
        content.notes
    );
    assert_eq!(problem("", body, None), ReadProblem::SvgNoScale);
    assert_eq!(
        problem("width='1mm' height='1mm'", body, None),
        ReadProblem::SvgNoScale
    );
    let pixels = "width='100' height='200' viewBox='0 0 100 200'";
    assert_eq!(problem(pixels, body, None), ReadProblem::SvgNoScale);
    let two = "width='1mm' height='1mm' viewBox='0 0 100 200'";
    assert!(matches!(
        problem(two, body, None),
        ReadProblem::SvgTwoScales { .. }
    ));
}

#[test]
fn what_is_not_shown_is_left_out_and_counted() {
    let body = "<rect fill='none' width='90' height='90'/><text>a</text><line x2='5'/>\
                <g style='display:none'><circle r='5'/></g><defs><circle r='7'/></defs>\
                <g visibility='hidden'><circle r='8'/></g><rect x='5' width='4' height='5'/>";
    let content = read(&drawing("", body), Some(1e-6)).unwrap();
    assert!((content.outline.unwrap().area() / 20e-12 - 1.0).abs() < 1e-12);
    let notes = content.notes.join("; ");
    for part in [
        "1 `text`",
        "1 `line`",
        "2 shapes that are not shown",
        "1 elements that are not",
    ] {
        assert!(notes.contains(part), "{notes}");
    }
}

#[test]
fn what_changes_the_meaning_is_refused() {
    for body in [
        "<use href='#a'/>",
        "<svg><circle r='5'/></svg>",
        "<circle r='5' clip-path='url(#a)'/>",
        "<g style='mask:url(#a)'><circle r='5'/></g>",
        "<path marker-end='url(#a)' d='M0 0h1v1z'/>",
        "<style>.a{display:none}</style><circle r='5'/>",
        "<circle r='5' style='transform:scale(2)'/>",
    ] {
        let found = problem("", body, Some(1e-6));
        assert!(
            matches!(found, ReadProblem::SvgUnsupported { .. }),
            "{body}: {found:?}"
        );
    }
    let page = "<rect width='100' height='100' fill='white'/><circle cx='50' cy='50' r='5'/>";
    let found = problem("viewBox='0 0 100 100'", page, Some(1e-6));
    assert!(
        matches!(found, ReadProblem::SvgUnsupported { .. }),
        "{found:?}"
    );
    let deep = format!("{}{}", "<g>".repeat(300), "</g>".repeat(300));
    assert!(matches!(
        problem("", &deep, Some(1e-6)),
        ReadProblem::SvgUnsupported { .. }
    ));
    for body in [
        "<rect width='10%' height='4'/>",
        "<circle r='-5'/>",
        "<path d='M0 0L5'/>",
    ] {
        let found = problem("", body, Some(1e-6));
        assert!(
            matches!(found, ReadProblem::SvgAttribute { .. }),
            "{body}: {found:?}"
        );
    }
    assert_eq!(problem("", "", Some(1e-6)), ReadProblem::NoOutline);
}
