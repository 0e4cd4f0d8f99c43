//! Panels of a height map: colours with a bar, points without height hatched, lines of traces.

use std::fmt::Write as _;

use super::check_axes::{
    Axis, draw_border, draw_frame, draw_ticks, is_place, scale_words, unit_of,
};
use super::check_curves::NARROW_ROOM;
use super::check_image::covered;
use super::check_legend::{CUT, HALO, Legend, Sample, missing_tone};
use super::check_page::Frame;
use super::check_picture::{Cut, MapPanel};
use super::colour_map::viridis;
use super::drawing::{Anchor, Drawing, INK, Item, PAPER, Raster, TextSize};
use super::label_box::{Cover, Labels, text_on_paper};
use super::numbers::{self, per_cent, title, with_unit};
use super::picture_layout::{Exaggeration, Layout};
use crate::geometry::Point;

/// Largest height of a map on the page, px.
const TALLEST: f64 = 440.0;
/// Room for the colour bar right of a map, px.
const BAR_ROOM: f64 = 150.0;
/// Width of the colour bar, px.
const BAR_WIDTH: f64 = 18.0;
/// Least height of the colour bar, px.
const LEAST_BAR: f64 = 110.0;
/// Share of the points at either end that may lie beyond the colours.
const BEYOND: f64 = 0.001;
/// Colours leave out the ends only where these make up a good part of the range.
const WORTH_LEAVING: f64 = 1.3;
/// Most lines of traces drawn.
const MOST_CUTS: usize = 60;

/// Heights that can be drawn, with their range.
struct Heights {
    /// Range of the colours, m.
    low: f64,
    high: f64,
    /// Smallest and largest height, m.
    all: [f64; 2],
    missing: usize,
}

impl Heights {
    fn of(panel: &MapPanel) -> Option<Self> {
        let mut finite: Vec<f32> = panel
            .heights
            .iter()
            .copied()
            .filter(|h| h.is_finite())
            .collect();
        let count = finite.len();
        let last = count.checked_sub(1)?;
        let beyond = (BEYOND * count as f64).floor() as usize;
        let mut at = |index: usize| {
            let (_, value, _) = finite.select_nth_unstable_by(index.min(last), f32::total_cmp);
            f64::from(*value)
        };
        let all = [at(0), at(last)];
        let inner = [at(beyond), at(last - beyond)];
        let is_worth =
            all[1] - all[0] > WORTH_LEAVING * (inner[1] - inner[0]) && inner[1] > inner[0];
        let [low, high] = if is_worth { inner } else { all };
        Some(Self {
            low,
            high,
            all,
            missing: panel.heights.len() - count,
        })
    }

    fn share(&self, height: f64) -> f64 {
        let extent = self.high - self.low;
        if extent > 0.0 {
            (height - self.low) / extent
        } else {
            0.5
        }
    }
}

/// Draws a panel below the heading; the error says why there is nothing to draw.
pub(super) fn draw_map(
    drawing: &mut Drawing,
    frame: &mut Frame,
    panel: &MapPanel,
) -> Result<(), String> {
    let [columns, rows] = panel.size;
    if columns == 0 || rows == 0 || columns.checked_mul(rows) != Some(panel.heights.len()) {
        let found = panel.heights.len();
        return Err(format!(
            "{found} heights are no map of {columns} x {rows} points"
        ));
    }
    let heights = Heights::of(panel).ok_or("no height in it is finite")?;
    let (mut layout, exaggeration) = placed(panel, frame.width - NARROW_ROOM - BAR_ROOM)
        .ok_or("the distance of its points is no length")?;
    let size = layout.size.map(|s| s as usize);
    caption(drawing, frame, panel, (exaggeration, size));
    frame.y += 28.0;
    layout.at = [
        (frame.left + NARROW_ROOM).round() as i32,
        frame.y.round() as i32,
    ];
    drawing.items.push(Item::Image {
        raster: colours(panel, &heights, size),
        at: layout.at,
        clip: Vec::new(),
    });
    let [left, top] = layout.at.map(f64::from);
    let low = layout.section([left, top + layout.size[1]]);
    let high = layout.section([left + layout.size[0], top]);
    let units = if exaggeration == Exaggeration::None {
        [unit_of(0.0, high[0].max(high[1])); 2]
    } else {
        high.map(|h| unit_of(0.0, h))
    };
    let x = Axis::new([low[0], high[0]], units[0], layout.scale[0], true);
    let y = Axis::new([low[1], high[1]], units[1], layout.scale[1], false);
    let mut legend = Legend::default();
    cuts(drawing, &layout, &panel.cuts, &mut legend);
    draw_frame(drawing, &layout);
    let bottom = top + layout.size[1];
    let end = draw_ticks(drawing, &layout, [&x, &y], bottom);
    let heading = [left - 10.0, top - 13.0];
    drawing.text(heading, Anchor::End, TextSize::Small, y.heading("y"));
    let middle = [left + 0.5 * layout.size[0], end + 14.0];
    drawing.text(middle, Anchor::Middle, TextSize::Small, x.heading("x"));
    let bar_end = colour_bar(
        drawing,
        &heights,
        [left + layout.size[0] + 26.0, top],
        layout.size[1],
    );
    frame.y = bar_end.max(end + 24.0);
    words(panel, &heights, &layout, &mut legend);
    let beside = left + layout.size[0] + BAR_ROOM;
    let room = frame.left + frame.width - beside;
    if room > 260.0 {
        frame.y = frame.y.max(legend.draw(drawing, [beside, top], room));
    } else {
        let width = frame.width - NARROW_ROOM;
        frame.y = legend.draw(drawing, [left, frame.y], width);
    }
    range(drawing, frame, &heights);
    Ok(())
}

/// The map on the page: each point stands for the cell around it.
fn placed(panel: &MapPanel, room: f64) -> Option<(Layout, Exaggeration)> {
    let [columns, rows] = panel.size.map(|n| n as f64);
    let [dx, dy] = panel.spacing;
    let extent = [columns * dx, rows * dy];
    if !(dx > 0.0 && dy > 0.0 && is_place(extent)) {
        return None;
    }
    let exaggeration = Exaggeration::of(extent);
    let [wide, tall] = exaggeration.stretch();
    let fit = (room / (extent[0] * wide)).min(TALLEST / (extent[1] * tall));
    let size = [extent[0] * fit * wide, extent[1] * fit * tall].map(|s| s.round().max(1.0));
    let scale = [size[0] / extent[0], size[1] / extent[1]];
    let is_sound = scale.iter().all(|s| s.is_finite());
    is_sound.then(|| {
        (
            Layout::spanning([-0.5 * dx, -0.5 * dy], size, scale),
            exaggeration,
        )
    })
}

fn caption(
    drawing: &mut Drawing,
    frame: &mut Frame,
    panel: &MapPanel,
    (exaggeration, size): (Exaggeration, [usize; 2]),
) {
    let [columns, rows] = panel.size;
    let [dx, dy] = panel.spacing.map(|s| with_unit(s, numbers::LENGTHS, 4));
    let mut text = format!("{columns} x {rows} points, {dx} apart along x and {dy} along y");
    if exaggeration != Exaggeration::None {
        let words = scale_words(exaggeration).replace("heights", "lengths along y");
        let words = words
            .replace("widths", "lengths along x")
            .replace("x:z", "x:y");
        let _ = write!(text, "; {words}");
    }
    if columns > size[0] || rows > size[1] {
        text.push_str("; each pixel shows the mean of the heights under it");
    }
    let _ = write!(drawing.description, " {text}.");
    frame.paragraph(drawing, &text, TextSize::Small);
}

/// The colour of every page pixel: of the mean of the heights it covers, or hatched where it covers none.
fn colours(panel: &MapPanel, heights: &Heights, [columns, rows]: [usize; 2]) -> Raster {
    let mut rgb = Vec::with_capacity(3 * columns * rows);
    for row in 0..rows {
        let [low, high] = covered(rows - 1 - row, rows, panel.size[1]);
        for column in 0..columns {
            let [left, right] = covered(column, columns, panel.size[0]);
            let (mut sum, mut count) = (0.0, 0_u64);
            for line in low..high {
                let start = line * panel.size[0];
                let values = panel
                    .heights
                    .get(start + left..start + right)
                    .unwrap_or(&[]);
                for height in values.iter().filter(|h| h.is_finite()) {
                    sum += f64::from(*height);
                    count += 1;
                }
            }
            rgb.extend(if count == 0 {
                missing_tone(column, row)
            } else {
                viridis(heights.share(sum / count as f64))
            });
        }
    }
    Raster { columns, rows, rgb }
}

/// An upright colour bar with numbers; returns where it ends.
fn colour_bar(drawing: &mut Drawing, heights: &Heights, [left, top]: Point, height: f64) -> f64 {
    let tall = height.max(LEAST_BAR).round();
    let (columns, rows) = (BAR_WIDTH as usize, tall as usize);
    let rgb = (0..rows)
        .flat_map(|row| viridis(1.0 - (row as f64 + 0.5) / tall).repeat(columns))
        .collect();
    drawing.items.push(Item::Image {
        raster: Raster { columns, rows, rgb },
        at: [left.round() as i32, top.round() as i32],
        clip: Vec::new(),
    });
    let left = left.round();
    let top = top.round();
    let right = left + BAR_WIDTH;
    let unit = unit_of(heights.low, heights.high);
    let extent = heights.high - heights.low;
    let (scale, axis);
    if extent > 0.0 {
        scale = tall / extent;
        axis = Axis::new([heights.low, heights.high], unit, scale, false);
        for (value, label) in axis.ticks() {
            let y = top + tall - (value - heights.low) * scale;
            drawing.lines(vec![vec![[right, y], [right + 6.0, y]]], INK, 1.0);
            drawing.text(
                [right + 10.0, y + 5.0],
                Anchor::Start,
                TextSize::Small,
                label,
            );
        }
        let words = axis.heading("height");
        drawing.text([left, top - 13.0], Anchor::Start, TextSize::Small, words);
    } else {
        let all = with_unit(heights.low, numbers::LENGTHS, 4);
        let at = [right + 10.0, top + 0.5 * tall + 5.0];
        drawing.text(at, Anchor::Start, TextSize::Small, all);
        drawing.text([left, top - 13.0], Anchor::Start, TextSize::Small, "height");
    }
    draw_border(drawing, [left, top], [BAR_WIDTH, tall]);
    top + tall + 14.0
}

/// Where the colours end before the heights do.
fn range(drawing: &mut Drawing, frame: &mut Frame, heights: &Heights) {
    let write = |v: f64| with_unit(v, numbers::LENGTHS, 4);
    let [low, high] = heights.all;
    let mut text = format!("Heights reach from {} to {}", write(low), write(high));
    if heights.low > low || heights.high < high {
        let _ = write!(
            text,
            "; the colours run from {} to {}, beyond which lie {} of the points at either end",
            write(heights.low),
            write(heights.high),
            per_cent(BEYOND),
        );
    }
    text.push('.');
    let _ = write!(drawing.description, " {text}");
    frame.paragraph(drawing, &text, TextSize::Small);
}

/// What the hatching, the lines and the arrow mean.
fn words(panel: &MapPanel, heights: &Heights, layout: &Layout, legend: &mut Legend) {
    if heights.missing > 0 {
        let share = heights.missing as f64 / panel.heights.len() as f64;
        let words = format!("no height: {} points, {}", heights.missing, per_cent(share));
        legend.add(Sample::Missing, words);
    }
    if let Some(angle) = panel.groove_direction.filter(|a| a.is_finite()) {
        let (sin, cos) = angle.sin_cos();
        let [dx, dy] = [cos * layout.scale[0], -sin * layout.scale[1]];
        let length = dx.hypot(dy);
        let direction = [dx / length, dy / length];
        let degrees = angle.to_degrees();
        let words = format!("direction of the grooves, {degrees:.2}\u{b0} from x");
        legend.add(Sample::Direction(direction), words);
    }
}

/// Lines of traces, with the strip that was averaged.
fn cuts(drawing: &mut Drawing, layout: &Layout, cuts: &[Cut], legend: &mut Legend) {
    let [left, top] = layout.at.map(f64::from);
    let mut labels = Labels::new([left, top], layout.size);
    let mut named = Vec::new();
    let can_be_drawn = |c: &&Cut| is_place(c.from) && is_place(c.to) && c.width.is_finite();
    for cut in cuts.iter().filter(can_be_drawn).take(MOST_CUTS) {
        let [dx, dy] = [cut.to[0] - cut.from[0], cut.to[1] - cut.from[1]];
        let length = dx.hypot(dy);
        let half = 0.5 * cut.width.abs();
        let aside = if length > 0.0 {
            [-half * dy / length, half * dx / length]
        } else {
            [0.0, 0.0]
        };
        let shifted = |side: f64| {
            let shift = |p: Point| layout.page([p[0] + side * aside[0], p[1] + side * aside[1]]);
            within(layout, shift(cut.from), shift(cut.to))
        };
        if half * layout.scale[0].max(layout.scale[1]) > 1.5 {
            let edges: Vec<Vec<Point>> = [-1.0, 1.0].into_iter().filter_map(shifted).collect();
            drawing.lines(edges.clone(), HALO, 2.6);
            drawing.lines(edges, PAPER, 1.0);
            let strip = "strip over which heights were averaged";
            let thin = super::line_style::LineStyle {
                width: 1.0,
                dash: &[],
                ..CUT
            };
            legend.add(Sample::Bright(thin), strip);
        }
        if let Some(line) = shifted(0.0) {
            labels.keep_clear(std::slice::from_ref(&line));
            CUT.draw_on(drawing, vec![line.clone()], HALO);
            legend.add(Sample::Bright(CUT), "line of a trace");
            named.push((line, title(&cut.label)));
        }
    }
    for (line, text) in named {
        cut_label(drawing, &line, &text, &mut labels);
    }
    if cuts.len() > MOST_CUTS {
        let more = cuts.len() - MOST_CUTS;
        legend.add(
            Sample::Bright(CUT),
            format!("{more} more lines are not drawn"),
        );
    }
}

/// A word on paper beside the begin or the end of a line, as far as there is room.
fn cut_label(drawing: &mut Drawing, line: &[Point], text: &str, labels: &mut Labels) {
    let offsets = [
        [1.0, -1.2],
        [1.0, 1.2],
        [-1.0, -1.2],
        [-1.0, 1.2],
        [0.0, -1.2],
        [0.0, 1.2],
    ];
    let ends = [line.first(), line.last()];
    if text.trim().is_empty() {
        return;
    }
    let found = ends
        .into_iter()
        .flatten()
        .find_map(|&end| labels.place(end, text, &offsets, Cover::Curves));
    if let Some(middle) = found {
        text_on_paper(drawing, middle, text);
    }
}

/// The part of a line within the map: Liang and Barsky (1984), A new concept and method for line clipping, ACM
/// Transactions on Graphics 3(1), 1-22, doi:10.1145/357332.357333, from memory.
fn within(layout: &Layout, from: Point, to: Point) -> Option<Vec<Point>> {
    let (mut enter, mut leave) = (0.0_f64, 1.0_f64);
    for axis in 0..2 {
        let low = f64::from(layout.at[axis]);
        let high = low + layout.size[axis];
        let change = to[axis] - from[axis];
        if change.abs() < 1e-9 {
            if from[axis] < low || from[axis] > high {
                return None;
            }
            continue;
        }
        let (a, b) = ((low - from[axis]) / change, (high - from[axis]) / change);
        enter = enter.max(a.min(b));
        leave = leave.min(a.max(b));
    }
    let at = |t: f64| {
        [
            from[0] + t * (to[0] - from[0]),
            from[1] + t * (to[1] - from[1]),
        ]
    };
    (enter <= leave).then(|| vec![at(enter), at(leave)])
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lines_are_cut_at_the_border_of_the_map() {
        let layout = Layout::spanning([0.0, 0.0], [100.0, 50.0], [1.0, 1.0]);
        let line = within(&layout, [-50.0, 25.0], [150.0, 25.0]).unwrap();
        assert_eq!(line, vec![[0.0, 25.0], [100.0, 25.0]]);
        assert!(within(&layout, [-50.0, 60.0], [150.0, 60.0]).is_none());
        assert!(within(&layout, [-10.0, 5.0], [20.0, -30.0]).is_none());
    }

    #[test]
    fn single_outliers_do_not_spoil_the_colours() {
        let mut heights: Vec<f32> = (0_u16..10_000).map(|i| f32::from(i % 100) * 1e-8).collect();
        heights[77] = 1e-3;
        heights[78] = f32::NAN;
        let panel = MapPanel {
            size: [100, 100],
            spacing: [1e-6; 2],
            heights,
            ..MapPanel::default()
        };
        let found = Heights::of(&panel).unwrap();
        assert_eq!(found.missing, 1);
        assert!(found.high < 1.1e-6 && found.all[1] > 9e-4);
        assert!((found.share(found.low)).abs() < 1e-12);
    }
}
