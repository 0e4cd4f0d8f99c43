//! What stands below the section in a picture: scale bars, colour bar, legend of the markers.

use std::fmt::Write as _;

use super::colour_map::viridis;
use super::drawing::{Anchor, Drawing, INK, Item, PAPER, Raster, TextSize};
use super::numbers::{self, significant};
use super::picture::{DARK_SHARE, MARGIN, Page};
use super::picture_layout::Exaggeration;
use super::ticks::{self, round_below};
use crate::geometry::Point;

/// Height of the colour bar, px.
const BAR_HEIGHT: f64 = 22.0;
/// Length of a vertical scale bar at most, px.
const VERTICAL_BAR: f64 = 60.0;

impl Page<'_> {
    /// One scale bar, or one along each axis with the exaggeration printed.
    pub(super) fn scale_bars(&mut self) {
        let [sx, sy] = self.layout.scale;
        let bars = matches!(self.exaggeration, Exaggeration::None);
        let Some(across) = round_below(0.25 * self.inner.min(self.layout.size[0].max(240.0)) / sx)
        else {
            return;
        };
        let up = round_below(VERTICAL_BAR / sy).filter(|_| !bars);
        let height = up.map_or(8.0, |u| (u * sy).max(8.0));
        let base = self.y + height;
        let end = MARGIN + across * sx;
        let caps = vec![
            vec![[MARGIN, base], [end, base]],
            vec![[MARGIN, base - 5.0], [MARGIN, base + 5.0]],
            vec![[end, base - 5.0], [end, base + 5.0]],
        ];
        self.drawing.lines(caps, INK, 2.5);
        let mut text = [end + 12.0, base + 5.0];
        let label = bar_label(across);
        self.drawing
            .text(text, Anchor::Start, TextSize::Medium, &label);
        if let Some(up) = up {
            text[0] += TextSize::Medium.width(&label) + 48.0;
            let x = text[0];
            let caps = vec![
                vec![[x, base], [x, base - up * sy]],
                vec![[x - 5.0, base], [x + 5.0, base]],
                vec![[x - 5.0, base - up * sy], [x + 5.0, base - up * sy]],
            ];
            self.drawing.lines(caps, INK, 2.5);
            self.drawing.text(
                [x + 12.0, base + 5.0],
                Anchor::Start,
                TextSize::Medium,
                bar_label(up),
            );
        }
        self.y = base + 14.0;
        let note = match self.exaggeration {
            Exaggeration::None => return,
            Exaggeration::Height(f) => {
                format!("Not to equal scale: heights are stretched {f} times.")
            }
            Exaggeration::Width(f) => {
                format!("Not to equal scale: widths are stretched {f} times.")
            }
        };
        let _ = write!(self.drawing.description, " {note}");
        self.paragraph(&note, TextSize::Medium, MARGIN);
        self.y += 4.0;
    }

    pub(super) fn colour_bar(&mut self) {
        let shown = &self.shown;
        let heading = if shown.unit.is_empty() {
            format!(
                "{}; {} every {}",
                shown.quantity,
                shown.marks,
                ticks::label(shown.step, shown.step)
            )
        } else {
            let step = shown.with_unit(&ticks::label(shown.step, shown.step));
            format!(
                "{} in {}; {} every {step}",
                shown.quantity, shown.unit, shown.marks
            )
        };
        self.y += 14.0;
        self.paragraph(&heading, TextSize::Medium, MARGIN);
        self.y += 6.0;
        let (columns, rows) = (self.inner as usize, BAR_HEIGHT as usize);
        let row: Vec<u8> = (0..columns)
            .flat_map(|c| viridis((c as f64 + 0.5) / columns as f64))
            .collect();
        self.drawing.items.push(Item::Image {
            raster: Raster {
                columns,
                rows,
                rgb: row.repeat(rows),
            },
            at: [MARGIN as i32, self.y.round() as i32],
            clip: Vec::new(),
        });
        let top = self.y.round();
        let bottom = top + BAR_HEIGHT;
        self.bar_ticks(top, bottom);
        let right = MARGIN + self.inner;
        let frame = vec![vec![
            [MARGIN, top],
            [right, top],
            [right, bottom],
            [MARGIN, bottom],
            [MARGIN, top],
        ]];
        self.drawing.lines(frame, INK, 1.2);
        self.y = bottom + 8.0 + TextSize::Small.line_height();
    }

    /// Marks and labels at the contour values, and the peak value where it does not collide.
    fn bar_ticks(&mut self, top: f64, bottom: f64) {
        let shown = &self.shown;
        let place = |v: f64| MARGIN + self.inner * v / shown.top;
        let base = bottom + 6.0 + 12.0;
        let size = TextSize::Small;
        let mut labels = vec![(MARGIN, Anchor::Start, "0".to_owned())];
        let peak = significant(shown.top, 4);
        let right = MARGIN + self.inner;
        let free_to = right - size.width(&peak) - 10.0;
        let mut marks = Vec::new();
        for &level in &shown.levels {
            let x = place(level);
            let dark = level < DARK_SHARE * shown.top;
            marks.push((x, dark));
            let text = ticks::label(level, shown.step);
            if x + 0.5 * size.width(&text) < free_to {
                labels.push((x, Anchor::Middle, text));
            }
        }
        labels.push((right, Anchor::End, peak));
        for (x, dark) in marks {
            let colour = if dark { PAPER } else { INK };
            self.drawing
                .lines(vec![vec![[x, top], [x, bottom]]], colour, 1.2);
            self.drawing
                .lines(vec![vec![[x, bottom], [x, bottom + 5.0]]], INK, 1.2);
        }
        for (x, anchor, text) in labels {
            self.drawing.text([x, base], anchor, size, text);
        }
    }

    /// What the markers mean, with their numbers.
    pub(super) fn legend(&mut self) {
        let flow = self.document.flow;
        let extent = [flow.geometry.width, flow.geometry.height];
        let place = |p: Point| numbers::place(p, extent, 4);
        let peak = self.shown.with_unit(&significant(self.shown.top, 4));
        let times = if self.shown.unit.is_empty() {
            " times the mean"
        } else {
            ""
        };
        let peak = format!("fastest point: {peak}{times}, at {}", place(flow.peak.at));
        let shear = match self.document.operating_point {
            Some(point) => format!(
                "{} Pa ({} dyn/cm\u{b2})",
                significant(point.wall_shear_max, 4),
                significant(point.wall_shear_max / numbers::DYN_PER_CM2, 4)
            ),
            None => format!(
                "{} times the mean",
                significant(
                    flow.wall_shear.max_per_gradient / flow.wall_shear.mean_per_gradient,
                    4
                )
            ),
        };
        let bound = if flow.wall_shear.singular_corners.is_empty() {
            ""
        } else {
            " (no bound at sharp re-entrant corners; the mean over up to 0.05 Dh beside each is what counts)"
        };
        let shear = format!(
            "largest wall shear: {shear}{bound}, at {}",
            place(flow.wall_shear.max_at)
        );
        let _ = write!(self.drawing.description, " {peak}; {shear}.");
        self.y += 10.0;
        peak_mark(&mut self.drawing, [MARGIN + 9.0, self.y + 10.0]);
        self.paragraph(&peak, TextSize::Medium, MARGIN + 28.0);
        self.y += 4.0;
        shear_mark(&mut self.drawing, [MARGIN + 9.0, self.y + 10.0]);
        self.paragraph(&shear, TextSize::Medium, MARGIN + 28.0);
    }
}

/// Length of a scale bar in the unit that fits it.
pub(super) fn bar_label(length: f64) -> String {
    let (unit, size) = numbers::fitting_unit(length, numbers::LENGTHS);
    let value = length / size;
    format!("{} {unit}", ticks::label(value, value))
}

/// An upright cross with a halo, so that it shows on any colour.
pub(super) fn peak_mark(drawing: &mut Drawing, [x, y]: Point) {
    let arms = || {
        vec![
            vec![[x - 8.0, y], [x + 8.0, y]],
            vec![[x, y - 8.0], [x, y + 8.0]],
        ]
    };
    drawing.lines(arms(), PAPER, 5.0);
    drawing.lines(arms(), INK, 2.0);
}

/// A white diamond with a dark border.
pub(super) fn shear_mark(drawing: &mut Drawing, [x, y]: Point) {
    let diamond = vec![[x - 7.0, y], [x, y - 7.0], [x + 7.0, y], [x, y + 7.0]];
    drawing.items.push(Item::Area {
        loops: vec![diamond.clone()],
        fill: PAPER,
    });
    drawing.items.push(Item::Lines {
        lines: vec![diamond],
        closed: true,
        colour: INK,
        width: 2.0,
        opacity: 1.0,
    });
}
