//! Dimensions of sections as in technical drawings: beside the area, with thin lines to what is measured.

use std::fmt::Write as _;

use super::check_axes::{Ranges, Reserve, is_place};
use super::check_dimensions::arrow;
use super::check_picture::{CurvePanel, Dimension, RegionKind};
use super::drawing::{Drawing, INK, TextSize};
use super::label_box::{Labels, half_size, text_on_paper};
use super::numbers::title;
use super::picture_layout::Layout;
use crate::geometry::Point;

/// Distance of rows of arrows, px.
const ROW: f64 = 24.0;
/// Distance of the first row or column from what is drawn, px.
const FIRST: f64 = 16.0;
/// Gap between a column of arrows and its text, px.
const TEXT_GAP: f64 = 10.0;
/// Most rows above, most below and most columns beside.
const MOST: usize = 5;
/// A dimension that leans less than this lies along an axis.
const LEAN: f64 = 0.02;
/// Longest text, characters.
const LONGEST_TEXT: usize = 40;

/// Dimensions by where they are drawn, the shorter nearer to the area.
pub(super) struct Outside<'a> {
    above: Vec<&'a Dimension>,
    below: Vec<&'a Dimension>,
    beside: Vec<&'a Dimension>,
    /// Those that are drawn in place.
    pub(super) others: Vec<&'a Dimension>,
    /// Of the sections; empty without one.
    areas: Ranges,
}

impl<'a> Outside<'a> {
    /// Sorts the dimensions of a panel; without areas all stay in place.
    pub(super) fn of(panel: &'a CurvePanel) -> Self {
        let mut areas = Ranges::new();
        let sections = panel.regions.iter().filter(|r| r.kind != RegionKind::Lid);
        for &p in sections.flat_map(|r| r.loops.iter().flatten()) {
            areas.add(p);
        }
        let mut sorted = Self {
            above: Vec::new(),
            below: Vec::new(),
            beside: Vec::new(),
            others: Vec::new(),
            areas,
        };
        let middle = 0.5 * (areas.low[1] + areas.high[1]);
        for dimension in &panel.dimensions {
            let (from, to) = (dimension.from, dimension.to);
            let [dx, dz] = [(to[0] - from[0]).abs(), (to[1] - from[1]).abs()];
            let fits = !areas.is_empty()
                && is_place(from)
                && is_place(to)
                && dimension.text.chars().count() <= LONGEST_TEXT;
            let list = if !fits {
                &mut sorted.others
            } else if dz <= LEAN * dx && from[1] >= middle {
                &mut sorted.above
            } else if dz <= LEAN * dx {
                &mut sorted.below
            } else if dx <= LEAN * dz {
                &mut sorted.beside
            } else {
                &mut sorted.others
            };
            list.push(dimension);
        }
        let length = |d: &&Dimension| (d.to[0] - d.from[0]).hypot(d.to[1] - d.from[1]);
        for list in [&mut sorted.above, &mut sorted.below, &mut sorted.beside] {
            list.sort_by(|a, b| length(a).total_cmp(&length(b)));
            sorted.others.extend(list.drain(list.len().min(MOST)..));
        }
        sorted
    }

    /// Room that they need.
    pub(super) fn reserve(&self) -> Reserve {
        let rows = |n: usize| match n {
            0 => 0.0,
            n => FIRST + ROW * n as f64,
        };
        Reserve {
            top: rows(self.above.len()),
            right: self.beside.iter().map(|d| column(d)).sum::<f64>(),
            bottom: rows(self.below.len()),
        }
    }

    /// Where the areas end at the right, m.
    pub(super) fn right_edge(&self) -> f64 {
        self.areas.high[0]
    }

    /// Draws the dimensions around what the ranges hold.
    pub(super) fn draw(
        &self,
        drawing: &mut Drawing,
        layout: &Layout,
        ranges: &Ranges,
        labels: &mut Labels,
    ) {
        let top = layout.page(ranges.high)[1];
        let bottom = layout.page(ranges.low)[1];
        for (index, dimension) in self.above.iter().enumerate() {
            let y = top - FIRST - ROW * index as f64;
            row(drawing, layout, dimension, y, labels);
        }
        for (index, dimension) in self.below.iter().enumerate() {
            let y = bottom + FIRST + ROW * index as f64;
            row(drawing, layout, dimension, y, labels);
        }
        let mut x = layout.page(self.areas.high)[0] + FIRST;
        for dimension in &self.beside {
            upright(drawing, layout, dimension, x, labels);
            x += column(dimension);
        }
    }
}

/// Width of a column with an upright arrow, px.
fn column(dimension: &Dimension) -> f64 {
    FIRST + TEXT_GAP + 2.0 * half_size(&title(&dimension.text))[0] + 6.0
}

/// Thin lines from the ends of a length to its arrow.
fn witnesses(drawing: &mut Drawing, pairs: [[Point; 2]; 2]) {
    drawing.lines(pairs.iter().map(|p| p.to_vec()).collect(), INK, 0.7);
}

/// A level arrow at height `y` (px) with its text in it, or beside it where it is short.
fn row(drawing: &mut Drawing, layout: &Layout, dimension: &Dimension, y: f64, labels: &mut Labels) {
    let (a, b) = (layout.page(dimension.from), layout.page(dimension.to));
    let (left, right) = if a[0] <= b[0] { (a, b) } else { (b, a) };
    let ends = [[left[0], y], [right[0], y]];
    witnesses(drawing, [[left, ends[0]], [right, ends[1]]]);
    labels.keep_clear(&arrow(drawing, ends));
    let text = title(&dimension.text);
    let _ = write!(drawing.description, " {text}.");
    let half = half_size(&text)[0];
    let border = f64::from(layout.at[0]) + layout.size[0];
    let x = if right[0] - left[0] > 2.0 * half + 36.0 {
        0.5 * (left[0] + right[0])
    } else if right[0] + 2.0 * half + 28.0 < border {
        right[0] + half + 26.0
    } else {
        left[0] - half - 26.0
    };
    labels.take([x, y], &text);
    text_on_paper(drawing, [x, y], &text);
}

/// An upright arrow at `x` (px) with its text to the right.
fn upright(
    drawing: &mut Drawing,
    layout: &Layout,
    dimension: &Dimension,
    x: f64,
    labels: &mut Labels,
) {
    let (a, b) = (layout.page(dimension.from), layout.page(dimension.to));
    let ends = [[x, a[1]], [x, b[1]]];
    witnesses(drawing, [[a, ends[0]], [b, ends[1]]]);
    labels.keep_clear(&arrow(drawing, ends));
    let text = title(&dimension.text);
    let _ = write!(drawing.description, " {text}.");
    let middle = [
        x + TEXT_GAP + 0.5 * TextSize::Small.width(&text),
        0.5 * (a[1] + b[1]),
    ];
    labels.take(middle, &text);
    text_on_paper(drawing, middle, &text);
}
