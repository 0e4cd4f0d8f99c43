//! Drawings that are read and drawings that are refused.

use std::fmt::Write as _;

use super::{ReadProblem, read};

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

/// The general reader's outline of a circle is worse by orders of magnitude: why arcs are read here.
#[test]
fn arcs_are_more_exact_than_their_cubics() {
    let text = drawing(
        "width='120' height='120'",
        "<circle cx='60' cy='60' r='50'/>",
    );
    let tree = usvg::Tree::from_str(&text, &usvg::Options::default()).unwrap();
    let usvg::Node::Path(path) = &tree.root().children()[0] else {
        panic!("a path");
    };
    let mut data = String::new();
    for segment in path.data().segments() {
        use usvg::tiny_skia_path::PathSegment as Segment;
        let _ = match segment {
            Segment::MoveTo(p) => write!(data, "M{} {}", p.x, p.y),
            Segment::LineTo(p) => write!(data, "L{} {}", p.x, p.y),
            Segment::CubicTo(a, b, p) => {
                write!(data, "C{} {} {} {} {} {}", a.x, a.y, b.x, b.y, p.x, p.y)
            }
            Segment::QuadTo(a, p) => write!(data, "Q{} {} {} {}", a.x, a.y, p.x, p.y),
            Segment::Close => write!(data, "Z"),
        };
    }
    let exact = std::f64::consts::PI * 2500.0;
    let theirs = (area(&format!("<path d='{data}'/>")) / exact - 1.0).abs();
    let ours = (area("<circle cx='60' cy='60' r='50'/>") / exact - 1.0).abs();
    println!("relative area error: cubics {theirs:.1e}, arcs {ours:.1e}");
    assert!(theirs > 1e-5 && theirs < 1e-3, "{theirs}");
    assert!(ours < 4e-7, "{ours}");
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
