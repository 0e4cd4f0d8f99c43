//! An outline drawn as SVG: closed paths, rectangles, circles, ellipses and polygons with a stated scale.
//!
//! The scale is the length of one user unit of the drawing, or width and height in mm, cm or in together
//! with a viewBox. `y` is turned upwards: a vertex lies at `(x, -y)` times the scale. Open paths are closed
//! as filling would close them, strokes are read along their centre line, and shapes that are not shown
//! (no fill and no stroke, `display` or `visibility` off) are left out and counted in the notes. Nesting
//! decides between lumens and islands. Paths are read
//! here in double precision and arcs stay arcs, because general readers of drawings work in single
//! precision and replace arcs by cubics, whose area is 3e-4 off.

use std::collections::BTreeMap;

use roxmltree::{Document, Node, ParsingOptions};

use super::curve_flatten::RELATIVE_CHORD_ERROR;
use super::limits::check_vertices;
use super::loop_nesting::{RawLoop, assemble};
use super::read_error::{Fault, ReadProblem};
use super::section::Content;
use super::svg_path::SubPath;
use super::svg_shapes::{BadAttribute, shape};
use super::svg_transform::Transform;
use crate::geometry::Point;
use crate::units::format_length;

const SVG_NAMESPACE: &str = "http://www.w3.org/2000/svg";
/// Deepest nesting of groups.
const DEEPEST: usize = 200;
/// Largest number of XML nodes.
const MOST_NODES: u32 = 2_000_000;
/// Largest relative difference between the scales from width and height.
const SCALE_TOLERANCE: f64 = 1e-3;
/// Elements without a wall of their own.
const SKIPPED: [&str; 16] = [
    "defs",
    "symbol",
    "clipPath",
    "mask",
    "marker",
    "pattern",
    "linearGradient",
    "radialGradient",
    "filter",
    "title",
    "desc",
    "metadata",
    "script",
    "style",
    "view",
    "cursor",
];
/// Properties that change what is shown and are not read.
const UNREAD_PROPERTIES: [&str; 6] = [
    "clip-path",
    "mask",
    "marker",
    "marker-start",
    "marker-mid",
    "marker-end",
];

/// Reads a drawing; `scale` is the length of one user unit in metres, where the caller gives it.
pub(crate) fn read(text: &str, scale: Option<f64>) -> Result<Content, Fault> {
    let options = ParsingOptions {
        allow_dtd: true,
        nodes_limit: MOST_NODES,
        ..ParsingOptions::default()
    };
    let document = Document::parse_with_options(text, options).map_err(|error| {
        let position = error.pos();
        let offset = offset_of(text, position.row, position.col);
        let message = error.to_string();
        Fault::at(text, offset, None, ReadProblem::Svg { message })
    })?;
    let root = document.root_element();
    if root.tag_name().name() != "svg" {
        let message = format!("the root element is `{}`", root.tag_name().name());
        return Err(at(text, root, ReadProblem::Svg { message }));
    }
    let view_box = view_box(text, root)?;
    let drawn = drawn_scale(text, root, view_box);
    let mut notes = Vec::new();
    let scale = match (scale, drawn) {
        (Some(scale), Ok(drawn)) => {
            if (drawn / scale - 1.0).abs() > SCALE_TOLERANCE {
                notes.push(format!(
                    "the drawing's own size gives {} per unit; the scale asked for was used",
                    format_length(drawn)
                ));
            }
            scale
        }
        (Some(scale), Err(_)) => scale,
        (None, drawn) => drawn?,
    };
    let mut walk = Walk {
        text,
        paths: Vec::new(),
        left_out: BTreeMap::new(),
    };
    walk.children(root, Inherited::default().with(text, root)?, 0)?;
    refuse_page_frame(text, root, view_box, &walk.paths)?;
    notes.extend(
        walk.left_out
            .iter()
            .map(|(what, count)| format!("{count} {what} left out")),
    );
    notes.push(format!(
        "scale {} per user unit; y turned upwards; curves within {RELATIVE_CHORD_ERROR:e} of the size",
        format_length(scale)
    ));
    let sorted = assemble(loops(&walk.paths, scale)?);
    Ok(Content {
        outline: Some(sorted.outline),
        loop_numbers: sorted.loop_numbers,
        factor: Some(scale),
        notes,
        ..Content::default()
    })
}

/// The loops in metres, `y` upwards.
fn loops(paths: &[SubPath], scale: f64) -> Result<Vec<RawLoop>, Fault> {
    let hull: Vec<Point> = paths.iter().flat_map(SubPath::hull).collect();
    let (low, high) = bounds(&hull).ok_or(ReadProblem::NoOutline)?;
    let size = (high[0] - low[0]).max(high[1] - low[1]);
    let chord_error = (size * RELATIVE_CHORD_ERROR).max(f64::MIN_POSITIVE);
    let mut total = 0;
    let mut loops = Vec::with_capacity(paths.len());
    for path in paths {
        let vertices = path.vertices(chord_error)?;
        total += vertices.len();
        check_vertices(total)?;
        let points: Vec<Point> = vertices
            .iter()
            .map(|p| [p[0] * scale, -p[1] * scale])
            .collect();
        if let Some([x, y]) = points.iter().find(|p| !p.iter().all(|c| c.is_finite())) {
            let text = format!("{x}, {y}");
            return Err(ReadProblem::NotFinite { text }.into());
        }
        loops.push(RawLoop {
            points,
            lumen: None,
        });
    }
    Ok(loops)
}

fn bounds(points: &[Point]) -> Option<(Point, Point)> {
    let &first = points.first()?;
    Some(points.iter().fold((first, first), |(low, high), p| {
        (
            [low[0].min(p[0]), low[1].min(p[1])],
            [high[0].max(p[0]), high[1].max(p[1])],
        )
    }))
}

/// A background rectangle would turn every channel into an island of the page.
fn refuse_page_frame(
    text: &str,
    root: Node<'_, '_>,
    view_box: Option<[f64; 4]>,
    paths: &[SubPath],
) -> Result<(), Fault> {
    let (Some([x, y, w, h]), true) = (view_box, paths.len() > 1) else {
        return Ok(());
    };
    let near = 1e-6 * w.max(h);
    let frame = |path: &SubPath| {
        bounds(&path.hull()).is_some_and(|(low, high)| {
            low[0] <= x + near
                && low[1] <= y + near
                && high[0] >= x + w - near
                && high[1] >= y + h - near
        })
    };
    if paths.iter().any(frame) {
        let what = "a shape as large as the page around other shapes (a background?)".to_owned();
        return Err(at(text, root, ReadProblem::SvgUnsupported { what }));
    }
    Ok(())
}

/// Byte offset of a row and column (both from 1) of the XML reader.
fn offset_of(text: &str, row: u32, column: u32) -> usize {
    let start = match row {
        0 | 1 => 0,
        row => text
            .match_indices('\n')
            .nth(row as usize - 2)
            .map_or(text.len(), |(at, _)| at + 1),
    };
    let line = text.get(start..).unwrap_or_default();
    let within = line.char_indices().nth(column.saturating_sub(1) as usize);
    within.map_or(text.len(), |(at, _)| start + at)
}

fn at(text: &str, node: Node<'_, '_>, problem: ReadProblem) -> Fault {
    Fault::at(text, node.range().start, None, problem)
}

/// A fault in the value of an attribute.
fn in_attribute(text: &str, node: Node<'_, '_>, bad: &BadAttribute) -> Fault {
    let range = node.attribute_node(bad.name).map(|a| a.range_value());
    let start = range.map_or(node.range().start, |range| {
        (range.start + bad.offset).min(range.end)
    });
    let problem = ReadProblem::SvgAttribute {
        name: bad.name,
        element: node.tag_name().name().to_owned(),
    };
    Fault::at(text, start, None, problem)
}

/// The viewBox: x, y, width, height.
fn view_box(text: &str, root: Node<'_, '_>) -> Result<Option<[f64; 4]>, Fault> {
    let Some(value) = root.attribute("viewBox") else {
        return Ok(None);
    };
    let mut scanner = super::svg_path::Scanner::new(value);
    let mut box_of = [0.0; 4];
    let name = "viewBox";
    for slot in &mut box_of {
        scanner.skip_separators();
        let offset = scanner.offset();
        *slot = scanner
            .number()
            .ok_or_else(|| in_attribute(text, root, &BadAttribute { name, offset }))?;
    }
    let offset = scanner.offset();
    if box_of[2] <= 0.0
        || box_of[3] <= 0.0
        || !value.get(offset..).unwrap_or_default().trim().is_empty()
    {
        return Err(in_attribute(text, root, &BadAttribute { name, offset }));
    }
    Ok(Some(box_of))
}

/// Metres per user unit from the drawing's own size.
fn drawn_scale(text: &str, root: Node<'_, '_>, view_box: Option<[f64; 4]>) -> Result<f64, Fault> {
    let size = |name: &str| physical(root.attribute(name)?);
    let (Some([_, _, w, h]), Some(width), Some(height)) = (view_box, size("width"), size("height"))
    else {
        return Err(at(text, root, ReadProblem::SvgNoScale));
    };
    let (horizontal, vertical) = (width / w, height / h);
    if (horizontal / vertical - 1.0).abs() > SCALE_TOLERANCE {
        return Err(at(
            text,
            root,
            ReadProblem::SvgTwoScales {
                horizontal,
                vertical,
            },
        ));
    }
    Ok(horizontal.min(vertical))
}

/// A physical length of SVG in metres; `None` for pixels, percentages and everything else.
fn physical(text: &str) -> Option<f64> {
    let mut scanner = super::svg_path::Scanner::new(text);
    scanner.skip_separators();
    let number = scanner.number()?;
    let per_unit = match text.get(scanner.offset()..)?.trim() {
        "mm" => 1e-3,
        "cm" => 1e-2,
        "in" => 25.4e-3,
        _ => return None,
    };
    (number > 0.0).then_some(number * per_unit)
}

/// What an element takes over from the elements around it.
#[derive(Debug, Clone, Copy)]
struct Inherited {
    transform: Transform,
    no_fill: bool,
    no_stroke: bool,
    is_hidden: bool,
}

impl Default for Inherited {
    fn default() -> Self {
        Self {
            transform: Transform::IDENTITY,
            no_fill: false,
            no_stroke: true,
            is_hidden: false,
        }
    }
}

/// A property from the style attribute or the attribute of its name.
fn property<'a>(node: Node<'a, '_>, name: &str) -> Option<&'a str> {
    let style = node.attribute("style").unwrap_or_default();
    let styled = style.split(';').rev().find_map(|part| {
        let (key, value) = part.split_once(':')?;
        (key.trim() == name).then(|| value.trim())
    });
    styled.or_else(|| node.attribute(name).map(str::trim))
}

impl Inherited {
    fn with(self, text: &str, node: Node<'_, '_>) -> Result<Self, Fault> {
        for name in UNREAD_PROPERTIES {
            if property(node, name).is_some_and(|value| value != "none") {
                let what = format!("`{name}`");
                return Err(at(text, node, ReadProblem::SvgUnsupported { what }));
            }
        }
        if node
            .attribute("style")
            .is_some_and(|s| s.contains("transform"))
        {
            let what = "a transform in a style".to_owned();
            return Err(at(text, node, ReadProblem::SvgUnsupported { what }));
        }
        let mut next = self;
        let none = |name: &str, before: bool| property(node, name).map_or(before, |v| v == "none");
        next.no_fill = none("fill", self.no_fill);
        next.no_stroke = none("stroke", self.no_stroke);
        next.is_hidden = property(node, "visibility")
            .map_or(self.is_hidden, |v| matches!(v, "hidden" | "collapse"));
        if let Some(value) = node.attribute("transform") {
            let inner = Transform::parse(value).map_err(|offset| {
                let name = "transform";
                in_attribute(text, node, &BadAttribute { name, offset })
            })?;
            next.transform = self.transform.after(inner);
        }
        Ok(next)
    }
}

/// The walk through the elements.
struct Walk<'a> {
    text: &'a str,
    paths: Vec<SubPath>,
    /// What was left out, and how often.
    left_out: BTreeMap<String, usize>,
}

impl Walk<'_> {
    fn children(
        &mut self,
        parent: Node<'_, '_>,
        inherited: Inherited,
        depth: usize,
    ) -> Result<(), Fault> {
        if depth > DEEPEST {
            let what = format!("groups nested more than {DEEPEST} deep");
            return Err(at(self.text, parent, ReadProblem::SvgUnsupported { what }));
        }
        for node in parent.children().filter(Node::is_element) {
            let namespace = node.tag_name().namespace();
            if namespace.is_none_or(|name| name == SVG_NAMESPACE) {
                self.element(node, inherited, depth)?;
            }
        }
        Ok(())
    }

    fn element(
        &mut self,
        node: Node<'_, '_>,
        inherited: Inherited,
        depth: usize,
    ) -> Result<(), Fault> {
        let tag = node.tag_name().name();
        if tag == "style" {
            return self.style(node);
        }
        if SKIPPED.contains(&tag) {
            return Ok(());
        }
        if property(node, "display") == Some("none") {
            self.leave_out("elements that are not shown");
            return Ok(());
        }
        match tag {
            "g" | "a" => {
                let inner = inherited.with(self.text, node)?;
                self.children(node, inner, depth + 1)
            }
            "use" | "svg" | "switch" | "foreignObject" => {
                let what = format!("the element `{tag}`");
                Err(at(self.text, node, ReadProblem::SvgUnsupported { what }))
            }
            _ => self.shape(node, inherited),
        }
    }

    fn shape(&mut self, node: Node<'_, '_>, inherited: Inherited) -> Result<(), Fault> {
        let tag = node.tag_name().name();
        let Some(paths) = shape(node) else {
            self.leave_out(&format!("`{tag}` elements"));
            return Ok(());
        };
        let state = inherited.with(self.text, node)?;
        let unpainted = state.no_fill && state.no_stroke && node.attribute("class").is_none();
        if unpainted || state.is_hidden {
            self.leave_out("shapes that are not shown");
            return Ok(());
        }
        let paths = paths.map_err(|bad| in_attribute(self.text, node, &bad))?;
        self.paths
            .extend(paths.iter().map(|path| path.transformed(state.transform)));
        Ok(())
    }

    /// Style sheets may colour, but not move or hide.
    fn style(&self, node: Node<'_, '_>) -> Result<(), Fault> {
        let sheet = node.text().unwrap_or_default();
        for word in [
            "transform",
            "display",
            "visibility",
            "clip-path",
            "mask",
            "marker",
        ] {
            if sheet.contains(word) {
                let what = format!("`{word}` in a style sheet");
                return Err(at(self.text, node, ReadProblem::SvgUnsupported { what }));
            }
        }
        Ok(())
    }

    fn leave_out(&mut self, what: &str) {
        *self.left_out.entry(what.to_owned()).or_insert(0) += 1;
    }
}

#[cfg(test)]
#[path = "outline_svg_tests.rs"]
mod tests;
