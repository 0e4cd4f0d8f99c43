//! Lengths with arrows and numbers.

use std::fmt::Write as _;

use super::check_axes::is_place;
use super::check_page::Frame;
use super::check_picture::Dimension;
use super::drawing::{Anchor, Drawing, INK, Item, PAPER, TextSize};
use super::label_box::Labels;
use super::line_style::arrow_head;
use super::numbers::title;
use super::picture_layout::Layout;
use crate::geometry::Point;

/// Shorter lengths get arrows from outside, px.
const OUTSIDE: f64 = 26.0;
/// Length of an arrow from outside, px.
const TAIL: f64 = 20.0;
/// Half the length of the stroke at each end, px.
const CAP: f64 = 6.0;
/// Most lengths of one panel.
const MOST_DIMENSIONS: usize = 60;
/// Longest text beside an arrow, characters.
const LONGEST_TEXT: usize = 60;

/// Draws arrows and numbers; returns the texts for which there was no room.
pub(super) fn draw_dimensions(
    drawing: &mut Drawing,
    layout: &Layout,
    dimensions: &[Dimension],
    labels: &mut Labels,
) -> Vec<String> {
    let mut unplaced = Vec::new();
    let mut ends = Vec::new();
    for (index, dimension) in dimensions.iter().enumerate() {
        let text = title(&dimension.text);
        if index < MOST_DIMENSIONS {
            let _ = write!(drawing.description, " {text}.");
        }
        let can_be_drawn = is_place(dimension.from) && is_place(dimension.to);
        if can_be_drawn && index < MOST_DIMENSIONS {
            let (from, to) = (layout.page(dimension.from), layout.page(dimension.to));
            arrow(drawing, from, to, labels);
            ends.push((from, to, text));
        } else {
            unplaced.push(text);
        }
    }
    // Words come when all arrows are there, so that they cover none.
    for (from, to, text) in ends {
        if !number(drawing, [from, to], &text, labels) {
            unplaced.push(text);
        }
    }
    unplaced
}

/// One arrow line with strokes at its ends.
fn arrow(drawing: &mut Drawing, from: Point, to: Point, labels: &mut Labels) {
    let length = (to[0] - from[0]).hypot(to[1] - from[1]);
    let [dx, dy] = if length > 1e-6 {
        [(to[0] - from[0]) / length, (to[1] - from[1]) / length]
    } else {
        [1.0, 0.0]
    };
    let along = |p: Point, by: f64| [p[0] + by * dx, p[1] + by * dy];
    let cap = |p: Point| {
        vec![
            [p[0] - CAP * dy, p[1] + CAP * dx],
            [p[0] + CAP * dy, p[1] - CAP * dx],
        ]
    };
    let is_short = length < OUTSIDE;
    let shafts = if is_short {
        vec![
            vec![along(from, -TAIL), along(from, -6.0)],
            vec![along(to, 6.0), along(to, TAIL)],
            vec![from, to],
        ]
    } else {
        vec![vec![along(from, 6.0), along(to, -6.0)]]
    };
    let mut lines = shafts;
    lines.extend([cap(from), cap(to)]);
    labels.keep_clear(&lines);
    drawing.lines(lines.clone(), PAPER, 4.0);
    drawing.lines(lines, INK, 1.4);
    let side = if is_short { -1.0 } else { 1.0 };
    arrow_head(drawing, from, [-side * dx, -side * dy], INK);
    arrow_head(drawing, to, [side * dx, side * dy], INK);
}

/// The number beside an arrow; `false` without room.
fn number(drawing: &mut Drawing, [from, to]: [Point; 2], text: &str, labels: &mut Labels) -> bool {
    if text.chars().count() > LONGEST_TEXT {
        return false;
    }
    let is_upright = (to[1] - from[1]).abs() > (to[0] - from[0]).abs();
    let sides: &[Point] = if is_upright {
        &[[1.0, 0.0], [-1.0, 0.0]]
    } else {
        &[[0.0, -1.0], [0.0, 1.0]]
    };
    let at = |share: f64| {
        [
            from[0] + share * (to[0] - from[0]),
            from[1] + share * (to[1] - from[1]),
        ]
    };
    let beyond: &[Point] = if is_upright {
        &[[0.0, -1.8], [0.0, 1.8], [1.0, -2.2], [-1.0, -2.2]]
    } else {
        &[[1.4, 0.0], [-1.4, 0.0], [0.0, -2.2], [0.0, 2.2]]
    };
    let found = [0.5, 0.3, 0.7, 0.15, 0.85]
        .iter()
        .find_map(|&share| labels.place(at(share), text, sides))
        .or_else(|| labels.place(to, text, beyond))
        .or_else(|| labels.place(from, text, beyond));
    let Some([x, y]) = found else { return false };
    let half = 0.5 * TextSize::Small.width(text) + 3.0;
    drawing.items.push(Item::Area {
        loops: vec![vec![
            [x - half, y - 8.0],
            [x + half, y - 8.0],
            [x + half, y + 8.0],
            [x - half, y + 8.0],
        ]],
        fill: PAPER,
    });
    drawing.text([x, y + 5.0], Anchor::Middle, TextSize::Small, text);
    true
}

/// Names the lengths whose numbers found no room.
pub(super) fn tell_unplaced(drawing: &mut Drawing, frame: &mut Frame, unplaced: &[String]) {
    if !unplaced.is_empty() {
        let shown: Vec<&str> = unplaced.iter().take(20).map(String::as_str).collect();
        let more = match unplaced.len().saturating_sub(20) {
            0 => String::new(),
            n => format!("; and {n} more"),
        };
        let words = format!(
            "Not written beside their arrows: {}{more}.",
            shown.join("; ")
        );
        frame.paragraph(drawing, &words, TextSize::Small);
    }
}
