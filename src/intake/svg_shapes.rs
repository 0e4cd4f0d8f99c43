//! The basic shapes of an SVG drawing as closed pieces.

use std::f64::consts::{FRAC_PI_2, PI, TAU};

use roxmltree::Node;

use super::svg_path::{Arc, Piece, Scanner, SubPath, parse};
use crate::geometry::Point;

/// Drawing units per inch (CSS pixels).
const PIXELS_PER_INCH: f64 = 96.0;

/// An attribute that cannot be read: its name and the byte offset in its value.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(crate) struct BadAttribute {
    pub(crate) name: &'static str,
    pub(crate) offset: usize,
}

/// The closed pieces of a shape; `None` when the element is not a shape with an area.
pub(crate) fn shape(node: Node<'_, '_>) -> Option<Result<Vec<SubPath>, BadAttribute>> {
    Some(match node.tag_name().name() {
        "path" => {
            let data = node.attribute("d").unwrap_or_default();
            parse(data).map_err(|offset| BadAttribute { name: "d", offset })
        }
        "rect" => rectangle(node),
        "circle" => ellipse(node, "r", "r"),
        "ellipse" => ellipse(node, "rx", "ry"),
        "polygon" | "polyline" => polygon(node),
        _ => return None,
    })
}

/// A length in drawing units; percentages and font sizes are not read.
pub(crate) fn length(node: Node<'_, '_>, name: &'static str) -> Result<Option<f64>, BadAttribute> {
    let Some(text) = node.attribute(name) else {
        return Ok(None);
    };
    let bad = |offset| BadAttribute { name, offset };
    let mut scanner = Scanner::new(text);
    scanner.skip_separators();
    let number = scanner.number().ok_or_else(|| bad(scanner.offset()))?;
    let offset = scanner.offset();
    let per_unit = match text.get(offset..).unwrap_or_default().trim() {
        "" | "px" => 1.0,
        "in" => PIXELS_PER_INCH,
        "cm" => PIXELS_PER_INCH / 2.54,
        "mm" => PIXELS_PER_INCH / 25.4,
        "pt" => PIXELS_PER_INCH / 72.0,
        "pc" => PIXELS_PER_INCH / 6.0,
        _ => return Err(bad(offset)),
    };
    Ok(Some(number * per_unit))
}

fn required(node: Node<'_, '_>, name: &'static str) -> Result<f64, BadAttribute> {
    match length(node, name)? {
        Some(value) if value > 0.0 => Ok(value),
        _ => Err(BadAttribute { name, offset: 0 }),
    }
}

fn quarter(centre: Point, radii: [f64; 2], start: f64, end: Point) -> Piece {
    let arc = Arc {
        centre,
        u: [radii[0], 0.0],
        v: [0.0, radii[1]],
        start,
        sweep: FRAC_PI_2,
    };
    Piece::Arc(arc, end)
}

fn rectangle(node: Node<'_, '_>) -> Result<Vec<SubPath>, BadAttribute> {
    let x = length(node, "x")?.unwrap_or(0.0);
    let y = length(node, "y")?.unwrap_or(0.0);
    let (w, h) = (required(node, "width")?, required(node, "height")?);
    let (rx, ry) = (length(node, "rx")?, length(node, "ry")?);
    let rx = rx.or(ry).unwrap_or(0.0).clamp(0.0, w / 2.0);
    let ry = ry
        .or(length(node, "rx")?)
        .unwrap_or(0.0)
        .clamp(0.0, h / 2.0);
    let (right, bottom) = (x + w, y + h);
    let pieces = if rx == 0.0 || ry == 0.0 {
        vec![
            Piece::Line([right, y]),
            Piece::Line([right, bottom]),
            Piece::Line([x, bottom]),
        ]
    } else {
        let r = [rx, ry];
        vec![
            Piece::Line([right - rx, y]),
            quarter([right - rx, y + ry], r, -FRAC_PI_2, [right, y + ry]),
            Piece::Line([right, bottom - ry]),
            quarter([right - rx, bottom - ry], r, 0.0, [right - rx, bottom]),
            Piece::Line([x + rx, bottom]),
            quarter([x + rx, bottom - ry], r, FRAC_PI_2, [x, bottom - ry]),
            Piece::Line([x, y + ry]),
            quarter([x + rx, y + ry], r, PI, [x + rx, y]),
        ]
    };
    let start = if rx == 0.0 || ry == 0.0 {
        [x, y]
    } else {
        [x + rx, y]
    };
    Ok(vec![SubPath { start, pieces }])
}

fn ellipse(
    node: Node<'_, '_>,
    horizontal: &'static str,
    vertical: &'static str,
) -> Result<Vec<SubPath>, BadAttribute> {
    let centre = [
        length(node, "cx")?.unwrap_or(0.0),
        length(node, "cy")?.unwrap_or(0.0),
    ];
    let (rx, ry) = (required(node, horizontal)?, required(node, vertical)?);
    let start = [centre[0] + rx, centre[1]];
    let arc = Arc {
        centre,
        u: [rx, 0.0],
        v: [0.0, ry],
        start: 0.0,
        sweep: TAU,
    };
    let pieces = vec![Piece::Arc(arc, start)];
    Ok(vec![SubPath { start, pieces }])
}

fn polygon(node: Node<'_, '_>) -> Result<Vec<SubPath>, BadAttribute> {
    let mut scanner = Scanner::new(node.attribute("points").unwrap_or_default());
    let mut points = Vec::new();
    loop {
        scanner.skip_separators();
        if scanner.is_done() {
            break;
        }
        let mut coordinate = || {
            scanner.skip_separators();
            scanner.number().ok_or(BadAttribute {
                name: "points",
                offset: scanner.offset(),
            })
        };
        points.push([coordinate()?, coordinate()?]);
    }
    let Some((&start, rest)) = points.split_first() else {
        return Ok(Vec::new());
    };
    let pieces = rest.iter().map(|&p| Piece::Line(p)).collect();
    Ok(vec![SubPath { start, pieces }])
}
