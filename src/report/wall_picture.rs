//! The picture of the wall shear along the developed wall: all loops side by side on one axis of arc
//! length, the walls as a band below, corners marked, round ticks with units.
//!
//! At a singular corner the curve is cut off at the top of the plot, and a bar shows its mean over the
//! stated length on either side.

use super::document::SolveDocument;
use super::drawing::{Anchor, Colour, Drawing, INK, Item, PAPER, TextSize};
use super::line_style::dashed;
use super::numbers::{self, DYN_PER_CM2, significant, with_unit};
use super::picture::{MARGIN, PictureError, PictureFormat};
use super::picture_layout::{straightened, thinned};
use super::png::to_png;
use super::svg::to_svg;
use super::table::wrapped;
use super::text_wall::short_name;
use super::ticks;
use crate::flow::{CurvePoint, LoopCurve, PointKind, WallReport};
use crate::geometry::Point;

/// Width of the plot, px.
const PLOT_WIDTH: f64 = 1040.0;
/// Height of the plot, px.
const PLOT_HEIGHT: f64 = 420.0;
/// Room for the labels of the axes left and right of the plot, px.
const AXIS_ROOM: f64 = 96.0;
/// Gap between two loops, px.
const LOOP_GAP: f64 = 28.0;
/// Height of the band of walls, px.
const BAND_HEIGHT: f64 = 26.0;
/// Most ticks on the axis of shear.
const MOST_SHEAR_TICKS: usize = 8;
/// Most ticks of arc length over the whole width.
const MOST_LENGTH_TICKS: usize = 12;
/// Distance of convex corners, px, below which their squares touch and dips between them cannot be seen.
const CROWDED: f64 = 6.0;
/// Share of the largest value that the plot reaches beyond it.
const HEADROOM: f64 = 0.12;
/// The curve.
const CURVE: Colour = [0, 90, 156];
/// Lines of ticks.
const GRID: Colour = [214, 214, 214];
/// Tones of the band of walls; names and lines say the same.
const BANDS: [Colour; 4] = [
    [236, 241, 246],
    [206, 218, 230],
    [221, 229, 237],
    [191, 206, 221],
];
/// Marks of singular corners.
const SINGULAR: Colour = [176, 48, 0];

/// The picture as the bytes of a file.
///
/// # Errors
/// [`PictureError`] when there is nothing to draw or the encoder refuses.
pub fn wall_picture_bytes(
    document: &SolveDocument<'_>,
    report: &WallReport,
    format: PictureFormat,
) -> Result<Vec<u8>, PictureError> {
    let drawing = draw_wall(document, report)?;
    Ok(match format {
        PictureFormat::Png => to_png(&drawing)?,
        PictureFormat::Svg => to_svg(&drawing)?.into_bytes(),
    })
}

/// The picture as a drawing.
///
/// # Errors
/// [`PictureError::NoExtent`] without a wall that has length and shear.
pub fn draw_wall(
    document: &SolveDocument<'_>,
    report: &WallReport,
) -> Result<Drawing, PictureError> {
    let loops = &document.flow.wall_shear.curve.loops;
    let total: f64 = loops.iter().map(LoopCurve::length).sum();
    let largest = report.whole.max;
    if !(total.is_finite() && total > 0.0 && largest.is_finite() && largest > 0.0) {
        return Err(PictureError::NoExtent);
    }
    let mut plot = Plot::new(document, report, total);
    plot.heading();
    plot.frame();
    plot.walls();
    plot.mean();
    plot.curves();
    plot.corners();
    plot.notes();
    plot.drawing.height = (plot.y + MARGIN).ceil() as u32;
    Ok(plot.drawing)
}

/// A plot being filled; `y` is how far the page is filled.
struct Plot<'a> {
    document: &'a SolveDocument<'a>,
    report: &'a WallReport,
    drawing: Drawing,
    /// Px per metre of arc length.
    per_metre: f64,
    /// Where each loop begins, px.
    starts: Vec<f64>,
    /// Upper end of the plot, m of shear per gradient.
    top: f64,
    /// Shown value per metre of shear per gradient, and its unit.
    factor: f64,
    unit: String,
    /// Upper end of the plot, px.
    ceiling: f64,
    y: f64,
}

impl<'a> Plot<'a> {
    fn new(document: &'a SolveDocument<'a>, report: &'a WallReport, total: f64) -> Self {
        let loops = &document.flow.wall_shear.curve.loops;
        let gaps = loops.len().saturating_sub(1) as f64;
        // Many loops share what a third of the width leaves for gaps.
        let gap = LOOP_GAP.min(PLOT_WIDTH / 3.0 / gaps.max(1.0));
        let per_metre = (PLOT_WIDTH - gap * gaps) / total;
        let mut starts = Vec::with_capacity(loops.len());
        let mut x = MARGIN + AXIS_ROOM;
        for along in loops {
            starts.push(x);
            x += along.length() * per_metre + gap;
        }
        let scale = document.shear_scale().factor;
        let units = if document.operating_point.is_some() {
            numbers::PRESSURES
        } else {
            numbers::LENGTHS
        };
        let (name, size) = numbers::fitting_unit(report.whole.max * scale, units);
        Self {
            document,
            report,
            drawing: Drawing {
                width: (PLOT_WIDTH + 2.0 * (MARGIN + AXIS_ROOM)) as u32,
                height: 0,
                title: String::new(),
                description: String::new(),
                items: Vec::new(),
            },
            per_metre,
            starts,
            top: (1.0 + HEADROOM) * report.whole.max,
            factor: scale / size,
            unit: name.to_owned(),
            ceiling: 0.0,
            y: MARGIN,
        }
    }

    fn paragraph(&mut self, text: &str, size: TextSize) {
        let room = (f64::from(self.drawing.width) - 2.0 * MARGIN) / size.advance();
        for line in wrapped(text, room.floor() as usize) {
            self.y += size.line_height();
            let at = [MARGIN, self.y - 5.0];
            self.drawing.text(at, Anchor::Start, size, line);
        }
    }

    fn heading(&mut self) {
        let name = numbers::title(self.document.section_name);
        let mean = self.report.whole.mean * self.factor;
        let largest = self.report.whole.max * self.factor;
        let what = match self.document.operating_point {
            Some(point) => format!(
                "Wall shear along the developed wall at {} over {}: mean {} {unit}, largest {} {unit}",
                with_unit(point.pressure_drop, numbers::PRESSURES, 4),
                with_unit(point.length, numbers::LENGTHS, 4),
                significant(mean, 4),
                significant(largest, 4),
                unit = self.unit,
            ),
            None => format!(
                "Wall shear over pressure gradient along the developed wall: mean {} {unit}, largest \
                 {} {unit} (times Pa/m gives {})",
                significant(mean, 4),
                significant(largest, 4),
                shear_of_length(&self.unit),
                unit = self.unit,
            ),
        };
        self.drawing.title = format!("wall shear in section {name}");
        self.drawing.description = format!("{name}: {what}.");
        self.paragraph(&name, TextSize::Large);
        self.y += 6.0;
        self.paragraph(&what, TextSize::Medium);
        self.y += 22.0;
        self.ceiling = self.y;
    }

    fn floor(&self) -> f64 {
        self.ceiling + PLOT_HEIGHT
    }

    /// Page place of an arc length and a shear per gradient.
    fn page(&self, index: usize, arc_length: f64, shear: f64) -> Point {
        [
            self.starts[index] + arc_length * self.per_metre,
            self.floor() - shear / self.top * PLOT_HEIGHT,
        ]
    }

    /// Ticks of both axes and the frame of every loop.
    fn frame(&mut self) {
        let (left, right) = (MARGIN + AXIS_ROOM, MARGIN + AXIS_ROOM + PLOT_WIDTH);
        let shown_top = self.top * self.factor;
        let (levels, step) = ticks::levels(shown_top, MOST_SHEAR_TICKS);
        let is_pressure = self.document.operating_point.is_some();
        for value in std::iter::once(0.0).chain(levels) {
            let y = self.floor() - value / shown_top * PLOT_HEIGHT;
            self.drawing
                .lines(vec![vec![[left, y], [right, y]]], GRID, 1.0);
            let label = ticks::label(value, step);
            self.drawing
                .text([left - 10.0, y + 5.0], Anchor::End, TextSize::Small, label);
            if is_pressure {
                let size = numbers::PRESSURES.iter().find(|u| u.0 == self.unit);
                let ratio = size.map_or(1.0, |u| u.1) / DYN_PER_CM2;
                let label = ticks::label(value * ratio, step * ratio);
                self.drawing.text(
                    [right + 10.0, y + 5.0],
                    Anchor::Start,
                    TextSize::Small,
                    label,
                );
            }
        }
        let head = self.ceiling - 8.0;
        let label = if is_pressure {
            format!("wall shear / {}", self.unit)
        } else {
            format!("shear per gradient / {}", self.unit)
        };
        self.drawing
            .text([MARGIN, head], Anchor::Start, TextSize::Small, label);
        if is_pressure {
            let at = [right + 10.0, head];
            self.drawing
                .text(at, Anchor::Start, TextSize::Small, "dyn/cm\u{b2}");
        }
        self.length_ticks();
    }

    /// Ticks of arc length, from zero on each loop.
    fn length_ticks(&mut self) {
        let loops = &self.document.flow.wall_shear.curve.loops;
        let longest = loops.iter().map(LoopCurve::length).fold(0.0, f64::max);
        let (name, size) = numbers::fitting_unit(longest, numbers::LENGTHS);
        let whole = PLOT_WIDTH / self.per_metre / size;
        let Some(step) = ticks::round_above(whole / MOST_LENGTH_TICKS as f64) else {
            return;
        };
        let base = self.floor() + BAND_HEIGHT;
        for (index, along) in loops.iter().enumerate() {
            let length = along.length() / size;
            let count = (length / step * (1.0 + 1e-9)).floor() as usize;
            for k in 0..=count {
                let value = step * k as f64;
                let [x, _] = self.page(index, value * size, 0.0);
                self.drawing
                    .lines(vec![vec![[x, base], [x, base + 6.0]]], INK, 1.0);
                let label = ticks::label(value, step);
                let at = [x, base + 20.0];
                self.drawing
                    .text(at, Anchor::Middle, TextSize::Small, label);
            }
            let (low, high) = (
                self.page(index, 0.0, 0.0),
                self.page(index, along.length(), 0.0),
            );
            let sides = vec![
                vec![[low[0], base], [low[0], self.ceiling]],
                vec![[high[0], base], [high[0], self.ceiling]],
                vec![low, high],
            ];
            self.drawing.lines(sides, INK, 1.0);
            if loops.len() > 1 && TextSize::Small.width("loop 00") < high[0] - low[0] {
                let at = [0.5 * (low[0] + high[0]), self.ceiling - 8.0];
                let label = format!("loop {}", index + 1);
                self.drawing
                    .text(at, Anchor::Middle, TextSize::Small, label);
            }
        }
        self.y = base + 44.0;
        let at = [MARGIN + AXIS_ROOM + 0.5 * PLOT_WIDTH, self.y - 4.0];
        let label = format!("arc length / {name}");
        self.drawing
            .text(at, Anchor::Middle, TextSize::Small, label);
        self.y += 14.0;
    }

    /// The band of walls below the axis.
    fn walls(&mut self) {
        let (top, bottom) = (self.floor(), self.floor() + BAND_HEIGHT);
        for part in &self.report.parts {
            let from = self.page(part.loop_index, part.from, 0.0)[0];
            let to = self.page(part.loop_index, part.to, 0.0)[0];
            let fill = BANDS[part.wall % BANDS.len()];
            let area = vec![[from, top], [to, top], [to, bottom], [from, bottom]];
            self.drawing.items.push(Item::Area {
                loops: vec![area],
                fill,
            });
            self.drawing
                .lines(vec![vec![[from, top], [from, bottom]]], INK, 0.8);
            let name = self
                .report
                .walls
                .get(part.wall)
                .map(|w| short_name(&w.name));
            let name = name.unwrap_or_default();
            if TextSize::Small.width(&name) + 6.0 < to - from {
                let at = [0.5 * (from + to), bottom - 8.0];
                self.drawing.text(at, Anchor::Middle, TextSize::Small, name);
            }
        }
    }

    /// The mean as a broken line.
    fn mean(&mut self) {
        let (left, right) = (MARGIN + AXIS_ROOM, MARGIN + AXIS_ROOM + PLOT_WIDTH);
        let y = self.floor() - self.report.whole.mean / self.top * PLOT_HEIGHT;
        self.drawing
            .lines(dashed(&[[left, y], [right, y]], &[9.0, 6.0]), INK, 1.2);
    }

    fn curves(&mut self) {
        let loops = &self.document.flow.wall_shear.curve.loops;
        for (index, along) in loops.iter().enumerate() {
            let mut lines: Vec<Vec<Point>> = Vec::new();
            for line in self.pieces(index, along) {
                lines.push(straightened(&thinned(line.into_iter())));
            }
            self.drawing.lines(lines, CURVE, 2.2);
        }
    }

    /// The curve of a loop on the page, cut where it leaves the plot.
    fn pieces(&self, index: usize, along: &LoopCurve) -> Vec<Vec<Point>> {
        let mut points = drawn(&along.points, CROWDED / self.per_metre);
        // Without a corner on the first vertex the curve has no point there.
        if points.first().is_some_and(|p| p.0 > 0.0) {
            let value = along.shear_at(0.0);
            points.insert(0, (0.0, value));
            points.push((along.length(), value));
        } else if points.last().is_some_and(|p| p.0 < along.length()) {
            points.push((along.length(), along.shear_at(0.0)));
        }
        let mut pieces = vec![Vec::new()];
        for pair in points.windows(2) {
            let (a, b) = (pair[0], pair[1]);
            let inside = [a, b].map(|p| p.1 <= self.top);
            let on_top = || {
                let share = if a.1.is_finite() && b.1.is_finite() {
                    (self.top - a.1) / (b.1 - a.1)
                } else {
                    f64::from(u8::from(b.1.is_finite()))
                };
                self.page(index, a.0 + share * (b.0 - a.0), self.top)
            };
            let Some(open) = pieces.last_mut() else {
                continue;
            };
            match inside {
                [true, true] => {
                    open.extend([self.page(index, a.0, a.1), self.page(index, b.0, b.1)]);
                }
                [true, false] => open.extend([self.page(index, a.0, a.1), on_top()]),
                [false, true] => {
                    pieces.push(vec![on_top(), self.page(index, b.0, b.1)]);
                }
                [false, false] => {}
            }
        }
        pieces.retain(|piece| piece.len() > 1);
        pieces
    }

    /// Marks of corners: a small square for a convex one, a triangle and two bars for a singular one.
    fn corners(&mut self) {
        let curve = &self.document.flow.wall_shear.curve;
        let base = self.floor();
        for (index, along) in curve.loops.iter().enumerate() {
            for point in along
                .points
                .iter()
                .filter(|p| p.kind == PointKind::ConvexCorner)
            {
                let [x, _] = self.page(index, point.arc_length, 0.0);
                let square = vec![
                    [x - 3.0, base - 3.0],
                    [x + 3.0, base - 3.0],
                    [x + 3.0, base + 3.0],
                    [x - 3.0, base + 3.0],
                ];
                self.drawing.items.push(Item::Area {
                    loops: vec![square],
                    fill: INK,
                });
            }
        }
        for corner in &self.report.singular_corners {
            let total = curve.loops[corner.loop_index].length();
            let reach = curve.singular_length;
            for (k, side) in [-1.0, 1.0].into_iter().enumerate() {
                let at_start = corner.arc_length <= 0.0;
                let place = if k == 0 && at_start {
                    total
                } else {
                    corner.arc_length
                };
                let from = self.page(corner.loop_index, place, corner.means[k]);
                let to = self.page(corner.loop_index, place + side * reach, corner.means[k]);
                self.drawing.lines(vec![vec![from, to]], PAPER, 6.0);
                self.drawing.lines(vec![vec![from, to]], SINGULAR, 3.5);
                let x = from[0];
                self.drawing.items.push(Item::Area {
                    loops: vec![vec![
                        [x, self.ceiling],
                        [x - 6.0, self.ceiling + 11.0],
                        [x + 6.0, self.ceiling + 11.0],
                    ]],
                    fill: SINGULAR,
                });
            }
        }
    }

    fn notes(&mut self) {
        let curve = &self.document.flow.wall_shear.curve;
        let start = curve.loops.first().map_or([0.0; 2], |l| l.position(0.0));
        let geometry = &self.document.flow.geometry;
        self.paragraph(
            &format!(
                "Arc length runs with the fluid on the left, anticlockwise along an outer loop and \
                 clockwise round an island, from its first vertex (loop 1: {}). Broken line: the mean.",
                numbers::place(start, [geometry.width, geometry.height], 4)
            ),
            TextSize::Small,
        );
        let convex = curve
            .loops
            .iter()
            .flat_map(|l| &l.points)
            .any(|p| p.kind == PointKind::ConvexCorner);
        if convex {
            let mut note = "Squares: convex corners, where the shear is zero.".to_owned();
            let crowded = |l: &LoopCurve| drawn(&l.points, CROWDED / self.per_metre).len();
            if curve.loops.iter().any(|l| crowded(l) < l.points.len()) {
                note.push_str(" Between corners that touch here only the largest value is drawn.");
            }
            self.paragraph(&note, TextSize::Small);
        }
        if !self.report.singular_corners.is_empty() {
            let note = format!(
                "Triangles: re-entrant corners. The shear of a sharp one has no bound; the curve is cut \
                 off at {} {}. Bars: the mean over {} (0.05 Dh), or half the way to the next corner if that \
                 is less, on either side.",
                significant(self.top * self.factor, 4),
                self.unit,
                with_unit(curve.singular_length, numbers::LENGTHS, 4),
            );
            self.drawing.description.push(' ');
            self.drawing.description.push_str(&note);
            self.paragraph(&note, TextSize::Small);
        }
    }
}

/// Arc length and shear of the points that are drawn. Between convex corners closer than `crowded` that is the largest
/// value alone: a digitised round corner would be a solid block of lines up from zero and down again.
fn drawn(points: &[CurvePoint], crowded: f64) -> Vec<(f64, f64)> {
    let shear = |p: &CurvePoint| match p.kind {
        PointKind::SingularCorner => f64::INFINITY,
        _ => p.shear_per_gradient,
    };
    let stretches: Vec<&[CurvePoint]> = points
        .split_inclusive(|p| p.kind == PointKind::ConvexCorner)
        .collect();
    let mut found: Vec<(f64, f64)> = Vec::with_capacity(points.len());
    let mut corner: Option<f64> = None;
    let mut after_crowd = false;
    for stretch in stretches {
        let Some(last) = stretch.last() else { continue };
        let is_bounded = last.kind == PointKind::ConvexCorner;
        let is_crowded =
            is_bounded && corner.is_some_and(|start| last.arc_length - start < crowded);
        if is_crowded {
            let inner = &stretch[..stretch.len() - 1];
            let largest = inner.iter().max_by(|a, b| shear(a).total_cmp(&shear(b)));
            found.extend(largest.map(|p| (p.arc_length, shear(p))));
        } else {
            if after_crowd {
                // The corner where the crowd ends is a zero of this stretch.
                found.extend(corner.map(|s| (s, 0.0)));
            }
            found.extend(stretch.iter().map(|p| (p.arc_length, shear(p))));
        }
        after_crowd = is_crowded;
        corner = is_bounded.then_some(last.arc_length);
    }
    found
}

/// What a shear per gradient in a unit of length becomes when multiplied by Pa/m.
fn shear_of_length(unit: &str) -> String {
    format!("{}Pa", unit.strip_suffix('m').unwrap_or_default())
}

#[cfg(test)]
mod tests {
    use super::*;

    fn point(arc_length: f64, shear: f64, kind: PointKind) -> CurvePoint {
        CurvePoint {
            arc_length,
            at: [arc_length, 0.0],
            normal: [0.0, -1.0],
            shear_per_gradient: shear,
            kind,
        }
    }

    #[test]
    fn between_crowded_corners_only_the_largest_value_is_drawn() {
        let corner = |s| point(s, 0.0, PointKind::ConvexCorner);
        let on = |s, v| point(s, v, PointKind::Regular);
        let along = [
            corner(0.0),
            on(5.0, 9.0),
            corner(10.0),
            on(10.2, 3.0),
            on(10.5, 4.0),
            corner(11.0),
            on(11.5, 5.0),
            corner(12.0),
            on(17.0, 8.0),
            corner(22.0),
        ];
        let ends = [(0.0, 0.0), (5.0, 9.0), (10.0, 0.0)];
        let others = [(12.0, 0.0), (17.0, 8.0), (22.0, 0.0)];
        let expected = [&ends[..], &[(10.5, 4.0), (11.5, 5.0)], &others].concat();
        assert_eq!(drawn(&along, 2.0), expected);
        let all: Vec<(f64, f64)> = along
            .iter()
            .map(|p| (p.arc_length, p.shear_per_gradient))
            .collect();
        assert_eq!(drawn(&along, 0.5), all);
    }

    #[test]
    fn a_singular_corner_is_drawn_without_bound_and_ends_no_crowd() {
        let along = [
            point(0.0, 0.0, PointKind::ConvexCorner),
            point(0.5, 7.0, PointKind::SingularCorner),
            point(1.0, 0.0, PointKind::ConvexCorner),
        ];
        assert_eq!(drawn(&along, 2.0), [(0.0, 0.0), (0.5, f64::INFINITY)]);
        assert_eq!(drawn(&along, 0.1)[1], (0.5, f64::INFINITY));
    }
}
