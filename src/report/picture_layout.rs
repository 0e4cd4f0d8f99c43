//! Where the section lands on the page: equal scale, or a round exaggeration of the short axis.

use super::ticks::round_above;
use crate::geometry::{Loop, Outline, Point};

/// Largest size of the drawn section, px.
const LARGEST: [f64; 2] = [1120.0, 720.0];
/// Above this aspect ratio the short axis is exaggerated.
const LARGEST_EQUAL_ASPECT: f64 = 12.0;
/// Aspect ratio aimed at when exaggerating.
const EXAGGERATED_ASPECT: f64 = 6.0;
/// Vertices nearer than this to the last drawn one are left out, px.
const NEAREST_VERTEX: f64 = 0.1;
/// A contour point nearer than this to the chord of its neighbours is left out, px.
const FLATNESS: f64 = 0.05;
/// No contour chord is longer, so that few points need to be compared with it, px.
const LONGEST_CHORD: f64 = 40.0;

/// The map from the section plane (m, y upwards) to the page (px, y downwards).
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Layout {
    /// Lower left corner of the section, m.
    low: Point,
    /// Page position of its upper left corner, whole px.
    pub(super) at: [i32; 2],
    /// Size on the page, px.
    pub(super) size: [f64; 2],
    /// Pixels per metre along each axis.
    pub(super) scale: [f64; 2],
}

/// How many times one axis is stretched against the other.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Exaggeration {
    /// Equal scale.
    None,
    /// The height is drawn this many times larger.
    Height(f64),
    /// The width is drawn this many times larger.
    Width(f64),
}

impl Exaggeration {
    /// What a section of this size needs, m.
    pub(super) fn of([width, height]: [f64; 2]) -> Self {
        let factor = |aspect: f64| round_above(aspect / EXAGGERATED_ASPECT).unwrap_or(1.0);
        if width > LARGEST_EQUAL_ASPECT * height {
            Self::Height(factor(width / height))
        } else if height > LARGEST_EQUAL_ASPECT * width {
            Self::Width(factor(height / width))
        } else {
            Self::None
        }
    }

    /// The factors by which width and height are stretched.
    pub(super) fn stretch(self) -> [f64; 2] {
        match self {
            Self::None => [1.0, 1.0],
            Self::Height(f) => [1.0, f],
            Self::Width(f) => [f, 1.0],
        }
    }
}

impl Layout {
    /// Fits the outline; `None` when it has no extent along an axis.
    pub(super) fn of(outline: &Outline) -> Option<(Self, Exaggeration)> {
        let (low, high) = outline.bounds()?;
        let extent = [high[0] - low[0], high[1] - low[1]];
        if !extent.iter().all(|e| e.is_finite() && *e > 0.0) {
            return None;
        }
        let exaggeration = Exaggeration::of(extent);
        let stretch = exaggeration.stretch();
        let fit =
            (LARGEST[0] / (extent[0] * stretch[0])).min(LARGEST[1] / (extent[1] * stretch[1]));
        let scale = [fit * stretch[0], fit * stretch[1]];
        let layout = Self {
            low,
            at: [0, 0],
            size: [extent[0] * scale[0], extent[1] * scale[1]],
            scale,
        };
        Some((layout, exaggeration))
    }

    /// A plot from a lower left corner (m), with its size (px) and its scale (px per metre); its place is set later.
    pub(super) fn spanning(low: Point, size: [f64; 2], scale: [f64; 2]) -> Self {
        Self {
            low,
            at: [0, 0],
            size,
            scale,
        }
    }

    /// A point of the section on the page.
    pub(super) fn page(&self, p: Point) -> Point {
        [
            f64::from(self.at[0]) + (p[0] - self.low[0]) * self.scale[0],
            f64::from(self.at[1]) + self.size[1] - (p[1] - self.low[1]) * self.scale[1],
        ]
    }

    /// A point of the page in the section, m.
    pub(super) fn section(&self, p: Point) -> Point {
        [
            self.low[0] + (p[0] - f64::from(self.at[0])) / self.scale[0],
            self.low[1] + (f64::from(self.at[1]) + self.size[1] - p[1]) / self.scale[1],
        ]
    }

    /// A loop on the page, without vertices too near to tell apart.
    pub(super) fn page_loop(&self, wall: &Loop) -> Vec<Point> {
        thinned(wall.points.iter().map(|&p| self.page(p)))
    }
}

/// Page points without those too near to the last one kept; the last point always stays.
pub(super) fn thinned(points: impl Iterator<Item = Point>) -> Vec<Point> {
    let mut kept: Vec<Point> = Vec::new();
    let mut last = None;
    for p in points {
        let near = |q: &Point| distance(p, *q) < NEAREST_VERTEX;
        last = kept.last().is_some_and(near).then_some(p);
        if last.is_none() {
            kept.push(p);
        }
    }
    kept.extend(last);
    kept
}

/// Page points without those that lie on the chord of their neighbours, to a fraction of a pixel.
pub(super) fn straightened(points: &[Point]) -> Vec<Point> {
    let (Some(&first), Some(&last)) = (points.first(), points.last()) else {
        return Vec::new();
    };
    let mut kept = vec![first];
    let (mut anchor, mut skipped) = (first, Vec::new());
    for pair in points.windows(2).skip(1) {
        let &[here, next] = pair else { continue };
        skipped.push(here);
        let chord = distance(anchor, next);
        let off = |p: &Point| {
            let cross = (p[0] - anchor[0]) * (next[1] - anchor[1])
                - (p[1] - anchor[1]) * (next[0] - anchor[0]);
            cross.abs() > FLATNESS * chord
        };
        if chord > LONGEST_CHORD || skipped.iter().any(off) {
            kept.push(here);
            anchor = here;
            skipped.clear();
        }
    }
    if points.len() > 1 {
        kept.push(last);
    }
    kept
}

fn distance(a: Point, b: Point) -> f64 {
    (a[0] - b[0]).hypot(a[1] - b[1])
}

#[cfg(test)]
mod tests {
    use super::*;

    fn rectangle(w: f64, h: f64) -> Outline {
        Outline::single(vec![
            [1.0, 2.0],
            [1.0 + w, 2.0],
            [1.0 + w, 2.0 + h],
            [1.0, 2.0 + h],
        ])
    }

    #[test]
    fn moderate_sections_have_equal_scale_and_map_back() {
        let (layout, exaggeration) = Layout::of(&rectangle(2e-4, 1e-4)).unwrap();
        assert_eq!(exaggeration, Exaggeration::None);
        let [a, b] = layout.scale;
        assert!((a / b - 1.0).abs() < 1e-12);
        let page = layout.page([1.0 + 1e-4, 2.0 + 1e-4]);
        assert!(page[1].abs() < 1e-6, "the top is at the top: {page:?}");
        let back = layout.section(page);
        assert!((back[0] - 1.0 - 1e-4).abs() < 1e-12 && (back[1] - 2.0 - 1e-4).abs() < 1e-12);
    }

    #[test]
    fn straight_runs_lose_their_points_and_curves_keep_their_shape() {
        let line: Vec<Point> = (0..=1000).map(|i| [f64::from(i) * 0.1, 5.0]).collect();
        let short = straightened(&line);
        assert!(short.len() <= 5, "{}", short.len());
        assert_eq!((short.first(), short.last()), (line.first(), line.last()));
        let circle: Vec<Point> = (0..=3600)
            .map(|i| (f64::from(i) * 0.1).to_radians())
            .map(|t| [100.0 * t.cos(), 100.0 * t.sin()])
            .collect();
        let short = straightened(&circle);
        assert!(short.len() < 1000);
        for pair in short.windows(2) {
            let middle = [
                0.5 * (pair[0][0] + pair[1][0]),
                0.5 * (pair[0][1] + pair[1][1]),
            ];
            assert!((middle[0].hypot(middle[1]) - 100.0).abs() < 0.06);
        }
        assert_eq!(straightened(&[[1.0, 2.0]]), vec![[1.0, 2.0]]);
    }

    #[test]
    fn extreme_sections_are_stretched_by_a_round_factor_along_the_short_axis() {
        let (layout, exaggeration) = Layout::of(&rectangle(1e-2, 1e-5)).unwrap();
        assert_eq!(exaggeration, Exaggeration::Height(200.0));
        assert!((layout.size[0] / layout.size[1] - 5.0).abs() < 1e-6);
        let (_, tall) = Layout::of(&rectangle(1e-5, 2e-4)).unwrap();
        assert_eq!(tall, Exaggeration::Width(5.0));
        assert!(Layout::of(&rectangle(1.0, 0.0)).is_none());
    }
}
