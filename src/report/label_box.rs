//! Boxes of texts on a page, and places for them where they cover nothing.

use super::drawing::TextSize;
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
/// Distance of drawn points that texts keep clear of, px.
const STRIDE: f64 = 6.0;
/// Most drawn points that texts keep clear of.
const MOST_POINTS: usize = 30_000;

/// Texts within a frame, none over another, and over drawn lines only where there is no other place.
#[derive(Debug)]
pub(super) struct Labels {
    frame: LabelBox,
    texts: Vec<LabelBox>,
    /// Arrows and marks, which no text may cover.
    solid: Vec<Point>,
    /// Curves, which a text may cover if it must.
    soft: Vec<Point>,
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
            solid: Vec::new(),
            soft: Vec::new(),
        }
    }

    /// Keeps texts off lines where it can.
    pub(super) fn avoid(&mut self, lines: &[Vec<Point>]) {
        let room = MOST_POINTS.saturating_sub(self.soft.len());
        self.soft.extend(along(lines).take(room));
    }

    /// Keeps texts off lines.
    pub(super) fn keep_clear(&mut self, lines: &[Vec<Point>]) {
        let room = MOST_POINTS.saturating_sub(self.solid.len());
        self.solid.extend(along(lines).take(room));
    }

    /// The middle of a small text beside `at`: the first of `offsets` where it fits. An offset of one is half the
    /// size of the text and a gap.
    pub(super) fn place(&mut self, at: Point, text: &str, offsets: &[Point]) -> Option<Point> {
        let half = [0.5 * TextSize::Small.width(text) + 3.0, 8.0];
        let gap = 6.0;
        let boxes = || {
            offsets.iter().map(|o| LabelBox {
                middle: [
                    at[0] + o[0] * (half[0] + gap),
                    at[1] + o[1] * (half[1] + gap),
                ],
                half,
            })
        };
        let is_free = |b: &LabelBox| {
            self.frame.contains(b)
                && !self.texts.iter().any(|t| t.meets(b, FREE))
                && !self.solid.iter().any(|&p| b.holds(p, 1.0))
        };
        let found = boxes()
            .find(|b| is_free(b) && !self.soft.iter().any(|&p| b.holds(p, FREE)))
            .or_else(|| boxes().find(is_free))?;
        self.texts.push(found);
        Some(found.middle)
    }
}

/// Points along lines.
fn along(lines: &[Vec<Point>]) -> impl Iterator<Item = Point> + '_ {
    lines.iter().flat_map(|l| l.windows(2)).flat_map(|pair| {
        let (a, b) = (pair[0], pair[1]);
        let count = ((b[0] - a[0]).hypot(b[1] - a[1]) / STRIDE).ceil().max(1.0);
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
    fn texts_share_no_place_and_cover_a_curve_only_when_they_must() {
        let mut labels = Labels::new([0.0, 0.0], [200.0, 100.0]);
        labels.avoid(&[vec![[0.0, 40.0], [200.0, 40.0]]]);
        let offsets = [[0.0, -1.0], [0.0, 1.0], [0.0, -2.5]];
        let first = labels.place([100.0, 54.0], "abc", &offsets).unwrap();
        assert!(first[1] > 54.0, "the curve is above: {first:?}");
        let second = labels.place([100.0, 54.0], "abc", &offsets).unwrap();
        assert!((second[1] - first[1]).abs() > 16.0);
        labels.keep_clear(&[vec![[0.0, 20.0], [200.0, 20.0]]]);
        assert_eq!(labels.place([100.0, 54.0], "abc", &offsets), None);
        assert_eq!(labels.place([100.0, 50.0], &"x".repeat(99), &offsets), None);
    }
}
