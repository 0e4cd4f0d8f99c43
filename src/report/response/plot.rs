//! One panel of a response picture: a map over two parameters with lines at round values, or a curve over one.

use super::document::ShownUnit;
use super::map::{Shown, axis_ticks};
use crate::geometry::Point;
use crate::report::check_axes::{GRID, draw_border};
use crate::report::colour_map::viridis;
use crate::report::contour::{Lattice, contour};
use crate::report::drawing::{Anchor, Colour, Drawing, INK, Item, PAPER, Raster, TextSize};
use crate::report::label_box::{Cover, Labels, text_on_paper};
use crate::report::picture_layout::{straightened, thinned};
use crate::study::ResponseParameter;

/// Places along each axis at which the formula is evaluated for a map.
pub(super) const MAP_NODES: usize = 161;
/// Half the size of the mark of a solved section, px.
const MARK: f64 = 2.6;
/// The curve.
const CURVE: Colour = [0, 90, 156];

/// A parameter along an axis, with its unit.
pub(super) type AxisOf<'a> = (&'a ResponseParameter, ShownUnit);

/// Where a panel is and what it is over.
pub(super) struct Panel<'a> {
    /// Upper left corner, px.
    pub(super) at: [f64; 2],
    /// Size, px.
    pub(super) size: [f64; 2],
    pub(super) x: AxisOf<'a>,
    pub(super) shown: &'a Shown,
}

impl Panel<'_> {
    /// Page position of a value along x and a share of the height from below.
    fn place(&self, x: f64, up: f64) -> Point {
        let (parameter, _) = self.x;
        let across = (x - parameter.low) / (parameter.high - parameter.low);
        [
            self.at[0] + across * self.size[0],
            self.at[1] + (1.0 - up) * self.size[1],
        ]
    }

    /// Ticks, numbers and heading below.
    fn x_axis(&self, drawing: &mut Drawing) {
        let (parameter, unit) = self.x;
        let base = self.at[1] + self.size[1];
        for (value, label) in axis_ticks(parameter, unit) {
            let [x, _] = self.place(value, 0.0);
            drawing.lines(vec![vec![[x, base], [x, base + 6.0]]], INK, 1.0);
            drawing.text([x, base + 20.0], Anchor::Middle, TextSize::Small, label);
        }
        drawing.text(
            [self.at[0] + 0.5 * self.size[0], base + 42.0],
            Anchor::Middle,
            TextSize::Medium,
            unit.head(&parameter.name),
        );
    }

    /// Ticks and numbers at the left; `up` places a value, share of the height.
    fn y_ticks(&self, drawing: &mut Drawing, ticks: &[(f64, String)], up: impl Fn(f64) -> f64) {
        for (value, label) in ticks {
            let y = self.at[1] + (1.0 - up(*value)) * self.size[1];
            let left = self.at[0];
            drawing.lines(vec![vec![[left - 6.0, y], [left, y]]], INK, 1.0);
            let at = [left - 10.0, y + 5.0];
            drawing.text(at, Anchor::End, TextSize::Small, label.as_str());
        }
    }

    /// A map over a second parameter.
    ///
    /// - `values`: shown values, `MAP_NODES` along each axis, the second parameter running slowest
    /// - `marks`: solved sections, as pairs of parameter values
    pub(super) fn map(
        &self,
        drawing: &mut Drawing,
        y: AxisOf<'_>,
        values: &[f64],
        marks: &[[f64; 2]],
        has_y_axis: bool,
    ) {
        let shares: Vec<f64> = values.iter().map(|v| self.shown.share(*v)).collect();
        let lattice = Lattice {
            values: &shares,
            columns: MAP_NODES,
            rows: MAP_NODES,
        };
        self.colours(drawing, &lattice);
        let [left, top] = self.at;
        let [width, height] = self.size;
        let last = (MAP_NODES - 1) as f64;
        let on_page = |p: Point| {
            [
                left + p[0] / last * width,
                top + (1.0 - p[1] / last) * height,
            ]
        };
        let up = |v: f64| (v - y.0.low) / (y.0.high - y.0.low);
        let lines: Vec<(&str, Vec<Vec<Point>>)> = self
            .shown
            .levels
            .iter()
            .map(|(level, label)| {
                let lines = contour(&lattice, self.shown.share(*level));
                let lines = lines
                    .into_iter()
                    .map(|line| straightened(&thinned(line.into_iter().map(on_page))));
                (label.as_str(), lines.collect())
            })
            .collect();
        for (_, set) in &lines {
            drawing.lines(set.clone(), PAPER, 3.4);
            drawing.lines(set.clone(), INK, 1.4);
        }
        for mark in marks {
            solved_mark(drawing, self.place(mark[0], up(mark[1])));
        }
        self.labels(drawing, &lines);
        draw_border(drawing, self.at, self.size);
        self.x_axis(drawing);
        if has_y_axis {
            self.y_ticks(drawing, &axis_ticks(y.0, y.1), up);
        }
    }

    /// The colour of every pixel.
    fn colours(&self, drawing: &mut Drawing, lattice: &Lattice<'_>) {
        let [columns, rows] = self.size.map(|s| s as usize);
        let last = (MAP_NODES - 1) as f64;
        let mut rgb = Vec::with_capacity(3 * columns * rows);
        for row in 0..rows {
            for column in 0..columns {
                let x = (column as f64 + 0.5) / columns as f64 * last;
                let y = (1.0 - (row as f64 + 0.5) / rows as f64) * last;
                rgb.extend(viridis(lattice.bilinear(x, y)));
            }
        }
        drawing.items.push(Item::Image {
            raster: Raster { columns, rows, rgb },
            at: self.at.map(|v| v.round() as i32),
            clip: Vec::new(),
        });
    }

    /// A label on every line, where it covers no other.
    fn labels(&self, drawing: &mut Drawing, lines: &[(&str, Vec<Vec<Point>>)]) {
        let mut labels = Labels::new(self.at, self.size);
        for (text, set) in lines {
            let longest = set.iter().max_by_key(|line| line.len());
            let Some(line) = longest else { continue };
            for share in [0.5, 0.35, 0.65, 0.2, 0.8] {
                let Some(at) = along(line, share) else {
                    continue;
                };
                if let Some(middle) = labels.place(at, text, &[[0.0, 0.0]], Cover::Curves) {
                    text_on_paper(drawing, middle, text);
                    break;
                }
            }
        }
    }

    /// A curve over the one parameter, with the solved sections.
    ///
    /// - `curve`: values of the parameter with shown values
    /// - `marks`: the same of the solved sections
    pub(super) fn curve(&self, drawing: &mut Drawing, curve: &[[f64; 2]], marks: &[[f64; 2]]) {
        let (parameter, unit) = self.x;
        // A little room above and below.
        let up = |v: f64| 0.04 + 0.92 * self.shown.share(v);
        let [left, top] = self.at;
        let [width, height] = self.size;
        let levels = self.shown.levels.iter().map(|(v, _)| {
            let y = top + (1.0 - up(*v)) * height;
            vec![[left, y], [left + width, y]]
        });
        let upright = axis_ticks(parameter, unit).into_iter().map(|(v, _)| {
            let [x, _] = self.place(v, 0.0);
            vec![[x, top], [x, top + height]]
        });
        drawing.lines(levels.chain(upright).collect(), GRID, 1.0);
        let line = curve.iter().map(|[p, v]| self.place(*p, up(*v)));
        drawing.lines(vec![straightened(&thinned(line))], CURVE, 2.6);
        for [p, v] in marks {
            solved_mark(drawing, self.place(*p, up(*v)));
        }
        draw_border(drawing, self.at, self.size);
        self.x_axis(drawing);
        self.y_ticks(drawing, &self.shown.levels, up);
    }
}

/// A small square with a halo.
pub(super) fn solved_mark(drawing: &mut Drawing, [x, y]: Point) {
    let square = |half: f64| {
        vec![
            [x - half, y - half],
            [x + half, y - half],
            [x + half, y + half],
            [x - half, y + half],
        ]
    };
    for (half, fill) in [(MARK + 1.2, PAPER), (MARK, INK)] {
        drawing.items.push(Item::Area {
            loops: vec![square(half)],
            fill,
        });
    }
}

/// The place at a share of the length of a line.
fn along(line: &[Point], share: f64) -> Option<Point> {
    let length = |pair: &[Point]| (pair[1][0] - pair[0][0]).hypot(pair[1][1] - pair[0][1]);
    let total: f64 = line.windows(2).map(length).sum();
    let mut left = share * total;
    for pair in line.windows(2) {
        let here = length(pair);
        if left <= here && here > 0.0 {
            let s = left / here;
            let (a, b) = (pair[0], pair[1]);
            return Some([a[0] + s * (b[0] - a[0]), a[1] + s * (b[1] - a[1])]);
        }
        left -= here;
    }
    None
}
