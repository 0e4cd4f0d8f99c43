//! Panels of a micrograph with what was found in it.

use std::fmt::Write as _;

use super::check_axes::is_place;
use super::check_curves::{page_loops, with_left_out};
use super::check_dimensions::{draw_dimensions, tell_unplaced};
use super::check_legend::{CROP, HALO, Legend, Sample, bright_style, draw_seed};
use super::check_page::Frame;
use super::check_picture::{Dimension, ImagePanel, Region};
use super::drawing::{Anchor, Drawing, INK, Item, Raster, TextSize};
use super::label_box::Labels;
use super::line_style::closed;
use super::numbers::{self, with_unit};
use super::picture_furniture::bar_label;
use super::picture_layout::Layout;
use super::ticks::round_below;
use crate::geometry::Point;

/// Largest height of a picture on the page, px.
const TALLEST: f64 = 560.0;
/// Largest width, px; the words stand beside it where it is narrower.
const WIDEST: f64 = 800.0;
/// Gap between a picture and the words beside it, px.
const GAP: f64 = 28.0;
/// Most areas drawn.
pub(super) const MOST_REGIONS: usize = 60;
/// Most seeds drawn.
const MOST_SEEDS: usize = 200;

/// Draws a panel below the heading; the error says why there is nothing to draw.
pub(super) fn draw_image(
    drawing: &mut Drawing,
    frame: &mut Frame,
    panel: &ImagePanel,
) -> Result<(), String> {
    let [columns, rows] = panel.size;
    if columns == 0 || rows == 0 || columns.checked_mul(rows) != Some(panel.grey.len()) {
        let found = panel.grey.len();
        return Err(format!(
            "{found} grey values are no picture of {columns} x {rows} pixels"
        ));
    }
    let [across, up] = panel.pixel_size;
    let extent = [columns as f64 * across, rows as f64 * up];
    if !(across > 0.0 && up > 0.0 && is_place(extent) && is_place(panel.origin)) {
        return Err("the size of a pixel is no length".to_owned());
    }
    let widest = WIDEST.min(frame.width);
    let scale = (widest / extent[0]).min(TALLEST / extent[1]);
    if !scale.is_finite() {
        return Err("the size of a pixel is too small for a scale".to_owned());
    }
    let size = extent.map(|e| (e * scale).round().max(1.0));
    let scales = [size[0] / extent[0], size[1] / extent[1]];
    let mut layout = Layout::spanning(panel.origin, size, scales);
    let means = if columns as f64 > size[0] || rows as f64 > size[1] {
        ", drawn smaller by means"
    } else {
        ""
    };
    let length = |edge: f64| with_unit(edge, numbers::LENGTHS, 4);
    let edge = if (across / up - 1.0).abs() < 1e-9 {
        length(across)
    } else {
        format!("{} by {}", length(across), length(up))
    };
    let pixel = format!("{columns} x {rows} pixels of {edge}{means}");
    let _ = write!(drawing.description, " {pixel}.");
    frame.paragraph(drawing, &pixel, TextSize::Small);
    frame.y += 8.0;
    layout.at = [frame.left.round() as i32, frame.y.round() as i32];
    drawing.items.push(Item::Image {
        raster: shrunk(panel, size.map(|s| s as usize)),
        at: layout.at,
        clip: Vec::new(),
    });
    let [left, top] = layout.at.map(f64::from);
    let mut labels = Labels::new([left, top], size);
    let mut legend = Legend::default();
    outlines(
        drawing,
        &layout,
        &panel.outlines,
        (&mut labels, &mut legend),
    );
    crop(drawing, &layout, panel.crop, &mut legend);
    seeds(drawing, &layout, &panel.seeds, &mut legend);
    let dimensions: Vec<&Dimension> = panel.dimensions.iter().collect();
    let unplaced = draw_dimensions(drawing, &layout, &dimensions, &mut labels);
    let beside = frame.width - size[0] - GAP;
    frame.y = top + size[1] + 18.0;
    scale_bar(drawing, frame, scale, size[0]);
    if beside > 240.0 {
        let end = legend.draw(drawing, [left + size[0] + GAP, top], beside);
        frame.y = frame.y.max(end);
    } else {
        frame.y = legend.draw(drawing, [left, frame.y + 4.0], frame.width);
    }
    tell_unplaced(drawing, frame, &unplaced);
    Ok(())
}

/// The picture at the resolution of the page: each page pixel is the mean of what it covers, or the nearest pixel
/// where it covers less than one.
fn shrunk(panel: &ImagePanel, [columns, rows]: [usize; 2]) -> Raster {
    let mut rgb = Vec::with_capacity(3 * columns * rows);
    for row in 0..rows {
        let [low, high] = covered(row, rows, panel.size[1]);
        for column in 0..columns {
            let [left, right] = covered(column, columns, panel.size[0]);
            let (mut sum, mut count) = (0_u64, 0_u64);
            for line in low..high {
                let start = line * panel.size[0];
                let values = panel.grey.get(start + left..start + right).unwrap_or(&[]);
                sum += values.iter().map(|&v| u64::from(v)).sum::<u64>();
                count += values.len() as u64;
            }
            let grey = (sum / count.max(1)) as u8;
            rgb.extend([grey; 3]);
        }
    }
    Raster { columns, rows, rgb }
}

/// The pixels of a row of `many` that pixel `index` of `few` covers; at least one.
pub(super) fn covered(index: usize, few: usize, many: usize) -> [usize; 2] {
    let at = |i: usize| (i as u128 * many as u128 / few.max(1) as u128) as usize;
    let low = at(index).min(many.saturating_sub(1));
    [low, at(index + 1).clamp(low + 1, many.max(low + 1))]
}

/// A place on the page, held within the picture.
fn held(layout: &Layout, [x, y]: Point) -> Point {
    let [left, top] = layout.at.map(f64::from);
    [
        x.clamp(left, left + layout.size[0]),
        y.clamp(top, top + layout.size[1]),
    ]
}

fn outlines(
    drawing: &mut Drawing,
    layout: &Layout,
    regions: &[Region],
    (labels, legend): (&mut Labels, &mut Legend),
) {
    let mut ordered: Vec<&Region> = regions.iter().take(MOST_REGIONS).collect();
    ordered.sort_by_key(|r| r.kind);
    for region in ordered {
        let (loops, left_out) = page_loops(layout, &region.loops);
        let loops: Vec<Vec<Point>> = loops
            .iter()
            .map(|l| l.iter().map(|&p| held(layout, p)).collect())
            .collect();
        let lines = closed(&loops);
        labels.avoid(&lines);
        let style = bright_style(region.kind);
        style.draw_on(drawing, lines, HALO);
        legend.add(
            Sample::Bright(style),
            with_left_out(&region.label, left_out),
        );
    }
}

fn crop(drawing: &mut Drawing, layout: &Layout, crop: Option<[Point; 2]>, legend: &mut Legend) {
    let Some([a, b]) = crop.filter(|c| c.iter().all(|&p| is_place(p))) else {
        return;
    };
    let [a, b] = [a, b].map(|p| held(layout, layout.page(p)));
    let corners = vec![a, [b[0], a[1]], b, [a[0], b[1]]];
    CROP.draw_on(drawing, closed(&[corners]), HALO);
    legend.add(Sample::Bright(CROP), "part that was looked at");
}

fn seeds(drawing: &mut Drawing, layout: &Layout, seeds: &[Point], legend: &mut Legend) {
    let on_page = seeds.iter().filter(|p| is_place(**p)).take(MOST_SEEDS);
    for &seed in on_page {
        draw_seed(drawing, held(layout, layout.page(seed)));
        legend.add(Sample::Seed, "place inside, from which it was found");
    }
}

/// A scale bar below the picture.
fn scale_bar(drawing: &mut Drawing, frame: &mut Frame, scale: f64, width: f64) {
    let Some(length) = round_below(0.3 * width.max(240.0) / scale) else {
        return;
    };
    let (from, to, y) = (frame.left + 1.0, frame.left + 1.0 + length * scale, frame.y);
    let caps = vec![
        vec![[from, y], [to, y]],
        vec![[from, y - 5.0], [from, y + 5.0]],
        vec![[to, y - 5.0], [to, y + 5.0]],
    ];
    drawing.lines(caps, INK, 2.5);
    let at = [to + 12.0, y + 5.0];
    drawing.text(at, Anchor::Start, TextSize::Medium, bar_label(length));
    frame.y += 16.0;
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_page_pixel_is_the_mean_of_what_it_covers() {
        let panel = ImagePanel {
            size: [4, 2],
            grey: vec![0, 100, 200, 200, 100, 0, 200, 200],
            ..ImagePanel::default()
        };
        assert_eq!(shrunk(&panel, [2, 1]).rgb, [50, 50, 50, 200, 200, 200]);
        let same = shrunk(&panel, [4, 2]);
        let grey: Vec<u8> = same.rgb.chunks(3).map(|p| p[0]).collect();
        assert_eq!(grey, panel.grey);
        let wide = shrunk(&panel, [8, 2]);
        assert_eq!(wide.rgb[..9], [0, 0, 0, 0, 0, 0, 100, 100, 100]);
        assert_eq!(covered(3, 4, 1), [0, 1]);
    }
}
