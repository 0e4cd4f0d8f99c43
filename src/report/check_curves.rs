//! Panels of heights over positions.

use std::collections::BTreeSet;
use std::fmt::Write as _;

use super::check_axes::{
    Axis, Ranges, draw_frame, draw_grid, draw_ticks, fitted, is_place, scale_words, unit_of,
};
use super::check_dimensions::{draw_dimensions, tell_unplaced};
use super::check_image::MOST_REGIONS;
use super::check_lanes::{draw_lanes, draw_tints};
use super::check_legend::{
    Legend, Sample, curve_style, draw_mark, draw_regions, mark_lines, region_style,
};
use super::check_outside::Outside;
use super::check_page::Frame;
use super::check_picture::{Curve, CurveKind, CurvePanel, Mark, MarkKind, RegionKind};
use super::curve_thinning::{column_extremes, few_points};
use super::drawing::{Anchor, Drawing, TextSize};
use super::label_box::{Cover, Labels};
use super::line_style::closed;
use super::numbers::title;
use super::picture_layout::{Exaggeration, Layout};
use crate::geometry::Point;

/// Room for numbers and names of lanes left of a plot, px.
const AXIS_ROOM: f64 = 124.0;
/// Room for numbers left of a plot that has no lanes, px.
pub(super) const NARROW_ROOM: f64 = 72.0;
/// Room right of a plot, px.
const RIGHT_ROOM: f64 = 20.0;
/// Marks nearer than this to another of their kind are left out, px.
const NEAREST_MARK: f64 = 4.0;
/// Most words beside marks.
const MOST_MARK_LABELS: usize = 40;
/// Most curves of one panel.
const MOST_CURVES: usize = 60;

/// Draws a panel below the heading; the error says why there is nothing to draw.
pub(super) fn draw_curves(
    drawing: &mut Drawing,
    frame: &mut Frame,
    panel: &CurvePanel,
) -> Result<(), String> {
    let ranges = ranges_of(panel).ok_or("no place in it has finite coordinates")?;
    // A section needs no lanes and is not compared with the traces above it.
    let room = if panel.bands.is_empty() && !panel.regions.is_empty() {
        NARROW_ROOM
    } else {
        AXIS_ROOM
    };
    let width = (frame.width - room - RIGHT_ROOM).floor();
    let outside = Outside::of(panel);
    let (mut layout, exaggeration, shown) = fit_with_dimensions(panel, &ranges, width, &outside)
        .ok_or("its extent is beyond all numbers")?;
    let words = scale_words(exaggeration);
    let _ = write!(drawing.description, " {words}.");
    frame.paragraph(drawing, &words, TextSize::Small);
    frame.y += 28.0;
    layout.at = [(frame.left + room).round() as i32, frame.y.round() as i32];
    let (x_unit, z_unit) = units(panel, &ranges);
    let x = Axis::new([shown.low[0], shown.high[0]], x_unit, layout.scale[0], true);
    let z = Axis::new(
        [shown.low[1], shown.high[1]],
        z_unit,
        layout.scale[1],
        false,
    );

    draw_tints(drawing, &layout, &panel.bands);
    draw_grid(drawing, &layout, [&x, &z]);
    let [left, top] = layout.at.map(f64::from);
    let mut labels = Labels::new([left, top], layout.size);
    let mut legend = Legend::default();
    regions(drawing, &layout, panel, (&mut labels, &mut legend));
    curves(drawing, &layout, &panel.curves, (&mut labels, &mut legend));
    borders(drawing, &layout, panel);
    draw_frame(drawing, &layout);
    marks(drawing, &layout, &panel.marks, (&mut labels, &mut legend));
    outside.draw(drawing, &layout, &ranges, &mut labels);
    let unplaced = draw_dimensions(drawing, &layout, &outside.others, &mut labels);
    mark_labels(drawing, &layout, &panel.marks, &mut labels);

    let floor = top + layout.size[1];
    let base = draw_lanes(drawing, &layout, &panel.bands, floor);
    let end = draw_ticks(drawing, &layout, [&x, &z], base);
    let z_words = z.heading(&title(&panel.z_label));
    drawing.text(
        [frame.left, top - 13.0],
        Anchor::Start,
        TextSize::Small,
        z_words,
    );
    let x_words = x.heading(&title(&panel.x_label));
    let middle = [left + 0.5 * layout.size[0], end + 14.0];
    drawing.text(middle, Anchor::Middle, TextSize::Small, x_words);
    let (legend_left, legend_width) = if panel.half_width {
        (frame.left, frame.width)
    } else {
        (left, layout.size[0])
    };
    frame.y = legend.draw(drawing, [legend_left, end + 24.0], legend_width) + 4.0;
    tell_unplaced(drawing, frame, &unplaced);
    Ok(())
}

/// The plot with the room that dimensions outside the areas need.
fn fit_with_dimensions(
    panel: &CurvePanel,
    ranges: &Ranges,
    width: f64,
    outside: &Outside<'_>,
) -> Option<(Layout, Exaggeration, Ranges)> {
    let mut reserve = outside.reserve();
    let right = std::mem::take(&mut reserve.right);
    let first = fitted(ranges, width, panel.equal_scale, reserve)?;
    // What lies right of the areas may have room enough.
    let free = (first.2.high[0] - outside.right_edge()) * first.0.scale[0];
    reserve.right = (right - free.max(0.0)).clamp(0.0, 0.5 * width);
    if reserve.right > 0.0 {
        fitted(ranges, width, panel.equal_scale, reserve)
    } else {
        Some(first)
    }
}

/// What has to be seen; `None` without any place.
fn ranges_of(panel: &CurvePanel) -> Option<Ranges> {
    let mut ranges = Ranges::new();
    let of_curves = panel.curves.iter().flat_map(|c| &c.points);
    let of_regions = panel.regions.iter().flat_map(|r| r.loops.iter().flatten());
    let of_marks = panel.marks.iter().map(|m| &m.at);
    let of_dimensions = panel.dimensions.iter().flat_map(|d| [&d.from, &d.to]);
    for &p in of_curves
        .chain(of_regions)
        .chain(of_marks)
        .chain(of_dimensions)
    {
        ranges.add(p);
    }
    if ranges.is_empty() {
        return None;
    }
    let height = ranges.low[1];
    for band in &panel.bands {
        ranges.add([band.from, height]);
        ranges.add([band.to, height]);
    }
    let aside = if panel.regions.is_empty() { 0.0 } else { 0.02 };
    Some(ranges.widened([aside, 0.1]))
}

/// Units of both axes; at equal scale they are one.
fn units(panel: &CurvePanel, ranges: &Ranges) -> (super::numbers::Unit, super::numbers::Unit) {
    let x = unit_of(ranges.low[0], ranges.high[0]);
    let z = unit_of(ranges.low[1], ranges.high[1]);
    let extent = ranges.extent();
    let is_alike = extent[0] < 200.0 * extent[1] && extent[1] < 200.0 * extent[0];
    if panel.equal_scale && is_alike {
        let one = if x.1 < z.1 { x } else { z };
        (one, one)
    } else {
        (x, z)
    }
}

type Told<'a> = (&'a mut Labels, &'a mut Legend);

fn regions(drawing: &mut Drawing, layout: &Layout, panel: &CurvePanel, (labels, legend): Told<'_>) {
    let mut ordered: Vec<_> = panel.regions.iter().take(MOST_REGIONS).collect();
    ordered.sort_by_key(|r| r.kind);
    for region in ordered {
        let (loops, left_out) = page_loops(layout, &region.loops);
        labels.avoid(&closed(&loops));
        draw_regions(drawing, region.kind, &loops);
        let words = with_left_out(&region.label, left_out);
        legend.add(Sample::Region(region.kind), words);
    }
}

/// Draws the borders again above the curves, so that none hides another.
fn borders(drawing: &mut Drawing, layout: &Layout, panel: &CurvePanel) {
    for kind in [
        RegionKind::Section,
        RegionKind::OuterReach,
        RegionKind::InnerReach,
    ] {
        for region in panel
            .regions
            .iter()
            .take(MOST_REGIONS)
            .filter(|r| r.kind == kind)
        {
            let (loops, _) = page_loops(layout, &region.loops);
            region_style(kind).1.draw(drawing, closed(&loops));
        }
    }
}

/// Loops on the page, with few enough points, and the number of those left out.
pub(super) fn page_loops(layout: &Layout, loops: &[Vec<Point>]) -> (Vec<Vec<Point>>, usize) {
    let on_page = loops
        .iter()
        .map(|l| {
            l.iter()
                .filter(|p| is_place(**p))
                .map(|&p| layout.page(p))
                .collect()
        })
        .collect();
    few_points(on_page)
}

/// Words of a legend entry, with the number of loops that are not drawn.
pub(super) fn with_left_out(label: &str, left_out: usize) -> String {
    let label = title(label);
    if left_out == 0 {
        label
    } else {
        format!("{label} ({left_out} more loops are not drawn)")
    }
}

fn curves(drawing: &mut Drawing, layout: &Layout, curves: &[Curve], (labels, legend): Told<'_>) {
    for curve in curves.iter().take(MOST_CURVES) {
        let on_page = curve
            .points
            .iter()
            .map(|&p| is_place(p).then(|| layout.page(p)));
        let lines = column_extremes(on_page);
        let mut words = title(&curve.label);
        if lines.is_empty() {
            let _ = write!(words, " (no height in it is finite)");
        }
        labels.avoid(&lines);
        let style = curve_style(curve.kind);
        style.draw(drawing, lines);
        legend.add(Sample::Line(style), words);
    }
    if curves.len() > MOST_CURVES {
        let more = curves.len() - MOST_CURVES;
        let style = curve_style(CurveKind::Repeat);
        legend.add(
            Sample::Line(style),
            format!("{more} more curves are not drawn"),
        );
    }
}

/// Draws marks, of those that would cover one another only the first.
fn marks(drawing: &mut Drawing, layout: &Layout, marks: &[Mark], (labels, legend): Told<'_>) {
    let mut taken: BTreeSet<(MarkKind, i64, i64)> = BTreeSet::new();
    for mark in marks.iter().filter(|m| is_place(m.at)) {
        let at = layout.page(mark.at);
        let cell = at.map(|v| (v / NEAREST_MARK).floor() as i64);
        if taken.insert((mark.kind, cell[0], cell[1])) {
            draw_mark(drawing, mark.kind, at);
            labels.keep_clear(&mark_lines(mark.kind, at));
        }
    }
    for kind in [MarkKind::Spike, MarkKind::Edge, MarkKind::Place] {
        let count = marks.iter().filter(|m| m.kind == kind).count();
        let name = match kind {
            MarkKind::Spike => "spikes",
            MarkKind::Edge => "edges",
            MarkKind::Place => "places",
        };
        if count > 0 {
            legend.add(Sample::Mark(kind), format!("{name} ({count})"));
        }
    }
}

/// Words beside marks, as far as there is room.
fn mark_labels(drawing: &mut Drawing, layout: &Layout, marks: &[Mark], labels: &mut Labels) {
    let named = marks
        .iter()
        .filter(|m| is_place(m.at) && !m.label.trim().is_empty());
    for mark in named.take(MOST_MARK_LABELS) {
        let at = layout.page(mark.at);
        let text = title(&mark.label);
        if let Some([x, y]) = mark_place(labels, at, &text) {
            drawing.text([x, y + 5.0], Anchor::Middle, TextSize::Small, text);
        }
    }
}

/// A place beside a mark, clear of curves where there is one.
fn mark_place(labels: &mut Labels, at: Point, text: &str) -> Option<Point> {
    let offsets = [
        [1.2, 0.0],
        [0.0, -1.2],
        [-1.2, 0.0],
        [1.1, -1.0],
        [-1.1, -1.0],
        [0.0, 1.2],
        [1.1, 1.0],
        [-1.1, 1.0],
    ];
    labels
        .place(at, text, &offsets, Cover::Nothing)
        .or_else(|| labels.place(at, text, &offsets, Cover::Curves))
}
