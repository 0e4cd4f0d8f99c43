//! Lengths with arrows and numbers.

use std::fmt::Write as _;

use super::check_axes::is_place;
use super::check_page::Frame;
use super::check_picture::Dimension;
use super::drawing::{Drawing, INK, PAPER, TextSize};
use super::label_box::{Cover, Labels, half_size, text_on_paper};
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
/// A text nearer than this to its arrow needs no line, px.
const NEAR: f64 = 12.0;
/// Most lengths of one panel.
const MOST_DIMENSIONS: usize = 60;
/// Longest text beside an arrow, characters.
const LONGEST_TEXT: usize = 60;

/// Draws arrows where the lengths are, with numbers beside; returns the texts for which there was no room.
pub(super) fn draw_dimensions(
    drawing: &mut Drawing,
    layout: &Layout,
    dimensions: &[&Dimension],
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
            let ends_here = [layout.page(dimension.from), layout.page(dimension.to)];
            labels.keep_clear(&arrow(drawing, ends_here));
            ends.push((ends_here, text));
        } else {
            unplaced.push(text);
        }
    }
    // Words come when all arrows are there, so that they cover none.
    for (ends, text) in ends {
        if !number(drawing, ends, &text, labels) {
            unplaced.push(text);
        }
    }
    unplaced
}

/// Draws an arrow line with strokes at its ends, on paper so that it shows on anything; returns its lines.
pub(super) fn arrow(drawing: &mut Drawing, [from, to]: [Point; 2]) -> Vec<Vec<Point>> {
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
    let mut lines = if is_short {
        vec![
            vec![along(from, -TAIL), along(from, -6.0)],
            vec![along(to, 6.0), along(to, TAIL)],
            vec![from, to],
        ]
    } else {
        vec![vec![along(from, 6.0), along(to, -6.0)]]
    };
    lines.extend([cap(from), cap(to)]);
    drawing.lines(lines.clone(), PAPER, 3.2);
    let side = if is_short { -1.0 } else { 1.0 };
    arrow_head(drawing, from, [-side * dx, -side * dy], INK);
    arrow_head(drawing, to, [side * dx, side * dy], INK);
    drawing.lines(lines.clone(), INK, 1.4);
    lines
}

/// The number beside an arrow, or farther away on a thin line; `false` without room.
fn number(drawing: &mut Drawing, [from, to]: [Point; 2], text: &str, labels: &mut Labels) -> bool {
    if text.trim().is_empty() {
        return true;
    }
    if text.chars().count() > LONGEST_TEXT {
        return false;
    }
    let is_upright = (to[1] - from[1]).abs() > (to[0] - from[0]).abs();
    let along = |share: f64| {
        [
            from[0] + share * (to[0] - from[0]),
            from[1] + share * (to[1] - from[1]),
        ]
    };
    let (near, far, outward): (&[Point], &[Point], &[Point]) = if is_upright {
        (
            &[[1.0, 0.0], [-1.0, 0.0]],
            &[[2.2, 0.0], [-2.2, 0.0], [3.0, 0.0], [-3.0, 0.0]],
            &[[0.0, -1.8], [0.0, 1.8]],
        )
    } else {
        (
            &[[0.0, -1.0], [0.0, 1.0]],
            &[[0.0, -2.4], [0.0, 2.4], [0.0, -4.0], [0.0, 4.0]],
            &[
                [1.3, 0.0],
                [-1.3, 0.0],
                [1.3, 0.9],
                [-1.3, 0.9],
                [1.3, -0.9],
                [-1.3, -0.9],
            ],
        )
    };
    let on_it: &[Point] = &[0.5, 0.3, 0.7, 0.15, 0.85].map(along);
    let tries: [(&[Point], &[Point], Cover); 6] = [
        (on_it, near, Cover::Nothing),
        (on_it, far, Cover::Nothing),
        (&[to, from], outward, Cover::Nothing),
        (on_it, near, Cover::Curves),
        (on_it, far, Cover::Curves),
        (&[to, from], outward, Cover::Curves),
    ];
    let found = tries.into_iter().find_map(|(starts, offsets, cover)| {
        starts
            .iter()
            .find_map(|&start| Some((start, labels.place(start, text, offsets, cover)?)))
    });
    let Some((start, middle)) = found else {
        return false;
    };
    leader(drawing, start, middle, text);
    text_on_paper(drawing, middle, text);
    true
}

/// A thin line from an arrow to the border of its text, unless that is near.
fn leader(drawing: &mut Drawing, start: Point, middle: Point, text: &str) {
    let half = half_size(text);
    let end =
        [0, 1].map(|axis| start[axis].clamp(middle[axis] - half[axis], middle[axis] + half[axis]));
    if (end[0] - start[0]).hypot(end[1] - start[1]) > NEAR {
        drawing.lines(vec![vec![start, end]], INK, 0.8);
    }
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
