//! The picture of the wall shear along the developed wall: all loops side by side on one axis of arc
//! length, the walls as a band below, corners marked, round ticks with units.
//!
//! At a singular corner the curve is cut off at the top of the plot, and a bar shows its mean over the
//! stated length on either side. Where such corners crowd the mean over a length that can be seen stands for all that
//! (module `wall_crowds`).

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
use super::wall_crowds::{Crowd, crowds, largest_shown, leaves_out, lines};
use crate::flow::{LoopCurve, PointKind, SingularCorner, WallReport};
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
/// Distance of corners, px, below which re-entrant ones are a crowd: their marks touch.
const CROWDED_SINGULAR: f64 = 12.0;
/// Length on either side over which the mean is drawn there, px.
const REACH: f64 = 12.0;
/// Thickness of the line over a crowd, px.
const CROWD_LINE: f64 = 5.0;
/// Widest part of a wall, px, that is drawn without lines at its ends.
const NARROW_WALL: f64 = 3.0;
/// Widest loop, px, that is drawn without sides and ticks.
const NARROW_LOOP: f64 = 16.0;
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
    plot.crowd_lines();
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
    /// Crowds of re-entrant corners of each loop.
    crowds: Vec<Vec<Crowd>>,
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
        let crowds: Vec<Vec<Crowd>> = loops
            .iter()
            .map(|along| crowds(&along.points, CROWDED_SINGULAR / per_metre, along.length()))
            .collect();
        let largest = if crowds.iter().all(Vec::is_empty) {
            report.whole.max
        } else {
            largest_shown(&document.flow.wall_shear.curve, &crowds, REACH / per_metre)
        };
        let (name, size) = numbers::fitting_unit(largest * scale, units);
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
            crowds,
            top: (1.0 + HEADROOM) * largest,
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
        let label = self.axis_name();
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
            let [low, high] = [0.0, along.length()].map(|s| self.page(index, s, 0.0));
            self.drawing.lines(vec![vec![low, high]], INK, 1.0);
            if high[0] - low[0] > NARROW_LOOP {
                self.loop_ticks(index, along.length(), (size, step));
            }
        }
        self.y = base + 44.0;
        let at = [MARGIN + AXIS_ROOM + 0.5 * PLOT_WIDTH, self.y - 4.0];
        let label = format!("arc length / {name}");
        self.drawing
            .text(at, Anchor::Middle, TextSize::Small, label);
        self.y += 14.0;
    }

    /// Ticks, sides and name of a loop.
    ///
    /// - `size`: of the unit, m; `step`: between ticks, in that unit
    fn loop_ticks(&mut self, index: usize, length: f64, (size, step): (f64, f64)) {
        let base = self.floor() + BAND_HEIGHT;
        let count = (length / size / step * (1.0 + 1e-9)).floor() as usize;
        for k in 0..=count {
            let value = step * k as f64;
            let [x, _] = self.page(index, value * size, 0.0);
            self.drawing
                .lines(vec![vec![[x, base], [x, base + 6.0]]], INK, 1.0);
            let (label, at) = (ticks::label(value, step), [x, base + 20.0]);
            self.drawing
                .text(at, Anchor::Middle, TextSize::Small, label);
        }
        let [low, high] = [0.0, length].map(|s| self.page(index, s, 0.0)[0]);
        let sides = [low, high].map(|x| vec![[x, base], [x, self.ceiling]]);
        self.drawing.lines(sides.to_vec(), INK, 1.0);
        let name = format!("loop {}", index + 1);
        let middle = 0.5 * (low + high);
        let half = 0.5 * TextSize::Small.width(&name);
        // The name of the axis comes first.
        let axis = MARGIN + TextSize::Small.width(&self.axis_name());
        let is_room = 2.0 * half < high - low && middle - half > axis + LOOP_GAP / 2.0;
        if self.starts.len() > 1 && is_room {
            let at = [middle, self.ceiling - 8.0];
            self.drawing.text(at, Anchor::Middle, TextSize::Small, name);
        }
    }

    fn axis_name(&self) -> String {
        let what = match self.document.operating_point {
            Some(_) => "wall shear",
            None => "shear per gradient",
        };
        format!("{what} / {}", self.unit)
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
            if to - from > NARROW_WALL {
                self.drawing
                    .lines(vec![vec![[from, top], [from, bottom]]], INK, 0.8);
            }
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
        let (near, reach) = (CROWDED / self.per_metre, REACH / self.per_metre);
        lines(along, &self.crowds[index], near, reach)
            .iter()
            .flat_map(|line| self.cut(index, line))
            .collect()
    }

    /// A line on the page, cut where it leaves the plot.
    fn cut(&self, index: usize, points: &[(f64, f64)]) -> Vec<Vec<Point>> {
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
        for square in self.squares() {
            self.drawing.items.push(Item::Area {
                loops: vec![square],
                fill: INK,
            });
        }
        for corner in &self.report.singular_corners {
            if self.is_crowded(corner.loop_index, corner.arc_length) {
                continue;
            }
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

    /// The marks of convex corners.
    fn squares(&self) -> Vec<Vec<Point>> {
        let base = self.floor();
        let loops = &self.document.flow.wall_shear.curve.loops;
        let places = loops.iter().enumerate().flat_map(|(index, along)| {
            let corners = along.points.iter().filter(move |p| {
                p.kind == PointKind::ConvexCorner && !self.is_crowded(index, p.arc_length)
            });
            corners.map(move |p| self.page(index, p.arc_length, 0.0)[0])
        });
        let ends = [[-3.0, -3.0], [3.0, -3.0], [3.0, 3.0], [-3.0, 3.0]];
        places
            .map(|x| ends.map(|[dx, dy]| [x + dx, base + dy]).to_vec())
            .collect()
    }

    fn is_crowded(&self, index: usize, arc_length: f64) -> bool {
        self.crowds[index].iter().any(|c| c.holds(arc_length))
    }

    /// A line along the top over every crowd.
    fn crowd_lines(&mut self) {
        let mut areas = Vec::new();
        for (index, own) in self.crowds.iter().enumerate() {
            for crowd in own {
                let [left, right] = [crowd.from, crowd.to].map(|s| self.page(index, s, 0.0)[0]);
                let (top, bottom) = (self.ceiling, self.ceiling + CROWD_LINE);
                areas.push(vec![
                    [left, top],
                    [right, top],
                    [right, bottom],
                    [left, bottom],
                ]);
            }
        }
        if !areas.is_empty() {
            self.drawing.items.push(Item::Area {
                loops: areas,
                fill: SINGULAR,
            });
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
        self.convex_note();
        self.singular_notes();
    }

    fn convex_note(&mut self) {
        let loops = &self.document.flow.wall_shear.curve.loops;
        let is_drawn = loops.iter().enumerate().any(|(index, along)| {
            along
                .points
                .iter()
                .any(|p| p.kind == PointKind::ConvexCorner && !self.is_crowded(index, p.arc_length))
        });
        if !is_drawn {
            return;
        }
        let mut note = "Squares: convex corners, where the shear is zero.".to_owned();
        let near = CROWDED / self.per_metre;
        let mut of_loops = loops.iter().zip(&self.crowds);
        if of_loops.any(|(along, own)| leaves_out(along, own, near)) {
            note.push_str(" Between corners that touch here only the largest value is drawn.");
        }
        self.paragraph(&note, TextSize::Small);
    }

    fn singular_notes(&mut self) {
        let all = &self.report.singular_corners;
        let is_crowded = |c: &&SingularCorner| self.is_crowded(c.loop_index, c.arc_length);
        let crowded = all.iter().filter(is_crowded).count();
        let mut notes = Vec::new();
        if crowded < all.len() {
            notes.push(format!(
                "Triangles: re-entrant corners. The shear of a sharp one has no bound; the curve is cut \
                 off at {} {}. Bars: the mean over {} (0.05 Dh), or half the way to the next corner if that \
                 is less, on either side.",
                significant(self.top * self.factor, 4),
                self.unit,
                with_unit(
                    self.document.flow.wall_shear.curve.singular_length,
                    numbers::LENGTHS,
                    4
                ),
            ));
        }
        if crowded > 0 {
            notes.push(format!(
                "Below the thick line at the top {crowded} re-entrant corners stand too close together to be \
                 drawn: the curve is a mean over up to {} to either side there, weighted with a triangle. The \
                 largest value above is a mean beside one corner and may not be seen here.",
                with_unit(REACH / self.per_metre, numbers::LENGTHS, 3),
            ));
        }
        for note in notes {
            self.drawing.description.push(' ');
            self.drawing.description.push_str(&note);
            self.paragraph(&note, TextSize::Small);
        }
    }
}

/// What a shear per gradient in a unit of length becomes when multiplied by Pa/m.
fn shear_of_length(unit: &str) -> String {
    format!("{}Pa", unit.strip_suffix('m').unwrap_or_default())
}
