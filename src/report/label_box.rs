//! Boxes of texts on a page, and places for them where they cover nothing.

use std::collections::BTreeSet;

use super::drawing::{Anchor, Drawing, Item, PAPER, TextSize};
use crate::geometry::Point;

/// An upright box, px.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct LabelBox {
    pub(super) middle: Point,
    pub(super) half: Point,
}

impl LabelBox {
    /// Whether a point lies in the box or nearer to it than `free` px along both axes.
    pub(super) fn holds(&self, p: Point, free: f64) -> bool {
        (0..2).all(|axis| (p[axis] - self.middle[axis]).abs() < self.half[axis] + free)
    }

    /// Whether two boxes are nearer than `free` px along both axes.
    pub(super) fn meets(&self, other: &Self, free: f64) -> bool {
        (0..2).all(|axis| {
            let apart = (self.middle[axis] - other.middle[axis]).abs();
            apart < self.half[axis] + other.half[axis] + free
        })
    }

    /// Whether the whole of another box is inside.
    fn contains(&self, other: &Self) -> bool {
        (0..2).all(|axis| {
            let apart = (self.middle[axis] - other.middle[axis]).abs();
            apart + other.half[axis] <= self.half[axis]
        })
    }
}

/// Free space around a text, px.
const FREE: f64 = 3.0;
/// Edge of the squares of the page that lines are noted in, px.
const CELL: f64 = 4.0;
/// Most steps along one set of lines.
const MOST_STEPS: usize = 400_000;

/// What a text may cover.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Cover {
    /// Nothing.
    Nothing,
    /// Curves, but neither arrows nor marks nor texts.
    Curves,
}

/// Texts within a frame, none over another, and over drawn lines only where there is no other place.
#[derive(Debug)]
pub(super) struct Labels {
    frame: LabelBox,
    texts: Vec<LabelBox>,
    /// Arrows and marks, which no text may cover.
    solid: Cells,
    /// Curves, which a text may cover if it must.
    soft: Cells,
}

/// Squares of the page through which lines run.
#[derive(Debug, Default)]
struct Cells(BTreeSet<[i32; 2]>);

impl Cells {
    fn add(&mut self, lines: &[Vec<Point>], within: &LabelBox) {
        let inside = along(lines)
            .take(MOST_STEPS)
            .filter(|&p| within.holds(p, CELL));
        self.0.extend(inside.map(cell));
    }

    /// Whether a line runs through a box or nearer to it than `free` px.
    fn meet(&self, text: &LabelBox, free: f64) -> bool {
        let corner = |side: f64| {
            cell([
                text.middle[0] + side * (text.half[0] + free),
                text.middle[1] + side * (text.half[1] + free),
            ])
        };
        let ([left, top], [right, bottom]) = (corner(-1.0), corner(1.0));
        (left..=right).any(|x| self.0.range([x, top]..=[x, bottom]).next().is_some())
    }
}

fn cell(p: Point) -> [i32; 2] {
    p.map(|v| (v / CELL).floor() as i32)
}

impl Labels {
    /// Labels within a frame from its upper left corner, px.
    pub(super) fn new(at: Point, size: Point) -> Self {
        Self {
            frame: LabelBox {
                middle: [at[0] + 0.5 * size[0], at[1] + 0.5 * size[1]],
                half: [0.5 * size[0], 0.5 * size[1]],
            },
            texts: Vec::new(),
            solid: Cells::default(),
            soft: Cells::default(),
        }
    }

    /// Keeps texts off lines where it can.
    pub(super) fn avoid(&mut self, lines: &[Vec<Point>]) {
        self.soft.add(lines, &self.frame);
    }

    /// Keeps texts off lines.
    pub(super) fn keep_clear(&mut self, lines: &[Vec<Point>]) {
        self.solid.add(lines, &self.frame);
    }

    /// Takes a place for a small text that is put there in any case.
    pub(super) fn take(&mut self, middle: Point, text: &str) {
        let half = half_size(text);
        self.texts.push(LabelBox { middle, half });
    }

    /// The middle of a small text beside `at`: the first of `offsets` where it fits. An offset of one is half the
    /// size of the text and a gap.
    pub(super) fn place(
        &mut self,
        at: Point,
        text: &str,
        offsets: &[Point],
        cover: Cover,
    ) -> Option<Point> {
        let half = half_size(text);
        let gap = 6.0;
        let mut boxes = offsets.iter().map(|o| LabelBox {
            middle: [
                at[0] + o[0] * (half[0] + gap),
                at[1] + o[1] * (half[1] + gap),
            ],
            half,
        });
        let is_free = |b: &LabelBox| {
            self.frame.contains(b)
                && !self.texts.iter().any(|t| t.meets(b, FREE))
                && !self.solid.meet(b, 0.0)
        };
        let is_clear = |b: &LabelBox| cover == Cover::Curves || !self.soft.meet(b, 1.0);
        let found = boxes.find(|b| is_free(b) && is_clear(b))?;
        self.texts.push(found);
        Some(found.middle)
    }
}

/// Half the size of a small text on paper, px.
pub(super) fn half_size(text: &str) -> Point {
    [0.5 * TextSize::Small.width(text) + 3.0, 8.0]
}

/// Draws a small text on paper around its middle.
pub(super) fn text_on_paper(drawing: &mut Drawing, middle: Point, text: &str) {
    let ([x, y], [w, h]) = (middle, half_size(text));
    drawing.items.push(Item::Area {
        loops: vec![vec![
            [x - w, y - h],
            [x + w, y - h],
            [x + w, y + h],
            [x - w, y + h],
        ]],
        fill: PAPER,
    });
    drawing.text([x, y + 5.0], Anchor::Middle, TextSize::Small, text);
}

/// Points along lines.
fn along(lines: &[Vec<Point>]) -> impl Iterator<Item = Point> + '_ {
    lines.iter().flat_map(|l| l.windows(2)).flat_map(|pair| {
        let (a, b) = (pair[0], pair[1]);
        let count = ((b[0] - a[0]).hypot(b[1] - a[1]) / CELL).ceil().max(1.0);
        (0..=count as usize).map(move |k| {
            let share = k as f64 / count;
            [a[0] + share * (b[0] - a[0]), a[1] + share * (b[1] - a[1])]
        })
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn texts_share_no_place_and_cover_a_curve_only_where_they_may() {
        let mut labels = Labels::new([0.0, 0.0], [200.0, 100.0]);
        labels.avoid(&[vec![[0.0, 40.0], [200.0, 40.0]]]);
        let mut place = |text: &str, offsets: &[Point], cover| {
            labels.place([100.0, 54.0], text, offsets, cover)
        };
        let offsets = [[0.0, -1.0], [0.0, 1.0]];
        let first = place("abc", &offsets, Cover::Nothing).unwrap();
        assert!(first[1] > 54.0, "the curve is above: {first:?}");
        assert_eq!(place("abc", &offsets, Cover::Nothing), None);
        let second = place("abc", &offsets, Cover::Curves).unwrap();
        assert!((second[1] - first[1]).abs() > 16.0);
        assert_eq!(place("abc", &offsets, Cover::Curves), None);
        assert_eq!(place(&"x".repeat(99), &[[0.0, -3.0]], Cover::Curves), None);
    }
}
