//! Pictures: decoded pixels, parsed SVG, labels that fit.

use etchwise::report::{
    Anchor, Drawing, Item, PictureFormat, draw_velocity, picture_bytes, to_svg,
};

use crate::report_samples::{annulus, rectangle};
use crate::sample;

#[test]
fn the_png_shows_the_section_dark_at_the_wall_bright_at_the_peak_white_outside() {
    let sample = sample();
    let bytes = picture_bytes(
        &sample.full(),
        &sample.outline,
        &sample.field,
        PictureFormat::Png,
    )
    .unwrap();
    let picture = image::load_from_memory(&bytes).unwrap().to_rgb8();
    assert_eq!(picture.width(), 1200);
    let grey = |x: u32, y: u32| {
        picture
            .get_pixel(x, y)
            .0
            .iter()
            .map(|v| u32::from(*v))
            .sum::<u32>()
            / 3
    };
    assert_eq!(picture.get_pixel(5, 5).0, [255, 255, 255]);
    // The section is 1120 x 560 px and its upper edge the first dark row below the heading.
    let top = (110..250).find(|&y| grey(200, y) < 60).unwrap();
    assert!(grey(620, top + 285) > grey(620, top + 30) + 60);
    let centre = picture.get_pixel(630, top + 282).0;
    assert!(
        centre[0] > 230 && centre[1] > 200 && centre[2] < 80,
        "the top of viridis: {centre:?}"
    );
    let left = (0..60).find(|&x| grey(x, top + 280) < 60).unwrap();
    assert!((38..=41).contains(&left), "{left}");
    let found = bytes.windows(9).any(|w| w == b"rectangle");
    assert!(found, "the name is in the text chunk");
}

#[test]
fn the_svg_is_well_formed_accessible_and_holds_text_as_text() {
    let mut sample = annulus([0.0, 0.0], 80e-6, 30e-6, 20);
    sample.name = "A <b> & \"c\"".to_owned();
    let drawing = draw_velocity(&sample.full(), &sample.outline, &sample.field).unwrap();
    let text = to_svg(&drawing).unwrap();
    let tree = roxmltree::Document::parse(&text).unwrap();
    let root = tree.root_element();
    assert_eq!(root.attribute("role"), Some("img"));
    let first = |tag: &str| tree.descendants().find(|n| n.has_tag_name(tag)).unwrap();
    assert!(first("title").text().unwrap().contains("A <b> & \"c\""));
    assert!(first("desc").text().unwrap().contains("fastest point"));
    let words: Vec<&str> = tree
        .descendants()
        .filter(|n| n.has_tag_name("text"))
        .filter_map(|n| n.text())
        .collect();
    assert!(words.contains(&"A <b> & \"c\""));
    assert!(
        words
            .iter()
            .any(|w| w.starts_with("axial velocity in mm/s; contour lines every "))
    );
    assert!(words.contains(&"20 \u{b5}m"), "scale bar: {words:?}");
    for node in tree.descendants() {
        for name in ["x", "y", "width", "height", "stroke-width", "font-size"] {
            if let Some(value) = node.attribute(name) {
                let number: f64 = value.parse().unwrap_or(f64::NAN);
                assert!(number.is_finite(), "{name}={value:?}");
            }
        }
    }
}

/// Left, top, right and bottom of each text.
pub(crate) fn boxes(drawing: &Drawing) -> Vec<([f64; 4], &str)> {
    let place = |item| match item {
        &Item::Text {
            at,
            anchor,
            size,
            ref text,
            ..
        } => {
            let width = size.width(text);
            let left = at[0]
                - match anchor {
                    Anchor::Start => 0.0,
                    Anchor::Middle => width / 2.0,
                    Anchor::End => width,
                };
            let line = size.line_height();
            let edges = [left, at[1] - 0.7 * line, left + width, at[1] + 0.2 * line];
            Some((edges, text.as_str()))
        }
        _ => None,
    };
    drawing.items.iter().filter_map(place).collect()
}

#[test]
fn labels_neither_leave_the_page_nor_overlap() {
    let samples = [
        sample(),
        annulus([0.0, 0.0], 80e-6, 30e-6, 16),
        rectangle([0.0, 0.0], 1e-3, 10e-6, 8),
        rectangle([0.0, 0.0], 20e-6, 60e-6, 60),
    ];
    for sample in &samples {
        for document in [sample.bare(), sample.full()] {
            let drawing = draw_velocity(&document, &sample.outline, &sample.field).unwrap();
            let boxes = boxes(&drawing);
            assert!(boxes.len() > 8);
            for (n, (a, text)) in boxes.iter().enumerate() {
                let inside = a[0] >= 0.0 && a[1] >= 0.0 && a[2] <= f64::from(drawing.width);
                assert!(
                    inside && a[3] <= f64::from(drawing.height),
                    "`{text}` leaves the page"
                );
                for (b, other) in &boxes[..n] {
                    let apart = a[2] <= b[0] || b[2] <= a[0] || a[3] <= b[1] || b[3] <= a[1];
                    assert!(apart, "`{text}` overlaps `{other}`");
                }
            }
        }
    }
}

#[test]
fn an_extreme_section_says_how_it_is_stretched() {
    let sample = rectangle([0.0, 0.0], 1e-3, 10e-6, 8);
    let drawing = draw_velocity(&sample.bare(), &sample.outline, &sample.field).unwrap();
    assert!(
        drawing
            .description
            .contains("heights are stretched 20 times")
    );
    let equal = rectangle([0.0, 0.0], 100e-6, 10e-6, 8);
    let drawing = draw_velocity(&equal.bare(), &equal.outline, &equal.field).unwrap();
    assert!(!drawing.description.contains("stretched"));
}
