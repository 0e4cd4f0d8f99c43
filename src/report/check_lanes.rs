//! Stretches of positions: one lane below the plot for each kind, and a tint behind the curves.

use super::check_legend::{band_name, band_tones};
use super::check_picture::{Band, BandKind};
use super::drawing::{Anchor, Drawing, INK, Item, TextSize};
use super::numbers::title;
use super::picture_layout::Layout;
use crate::geometry::Point;

/// Height of a lane, px.
const LANE: f64 = 19.0;
/// Height of a stretch in its lane, px.
const BAR: f64 = 15.0;
/// Least width of a stretch on the page, px.
const LEAST_WIDTH: f64 = 2.0;
/// A narrower stretch has no border, px.
const BORDERED: f64 = 8.0;
/// All kinds, from the top.
const KINDS: [BandKind; 5] = [
    BandKind::Groove,
    BandKind::Land,
    BandKind::Reference,
    BandKind::TipShape,
    BandKind::Bridged,
];

/// A stretch on the page, px.
struct Stretch<'a> {
    from: f64,
    to: f64,
    label: &'a str,
}

/// The stretches of one kind that can be drawn, from left to right.
fn stretches<'a>(layout: &Layout, bands: &'a [Band], kind: BandKind) -> Vec<Stretch<'a>> {
    let left = f64::from(layout.at[0]);
    let right = left + layout.size[0];
    let mut found: Vec<Stretch<'a>> = bands
        .iter()
        .filter(|b| b.kind == kind && b.from.is_finite() && b.to.is_finite())
        .map(|b| {
            let [low, high] = [b.from.min(b.to), b.from.max(b.to)];
            let from = layout.page([low, 0.0])[0].clamp(left, right - LEAST_WIDTH);
            let to = layout.page([high, 0.0])[0].clamp(from + LEAST_WIDTH, right);
            Stretch {
                from,
                to,
                label: &b.label,
            }
        })
        .collect();
    found.sort_by(|a, b| a.from.total_cmp(&b.from).then(a.to.total_cmp(&b.to)));
    found
}

/// Page extents of stretches, those that touch joined.
fn joined(stretches: &[Stretch<'_>]) -> Vec<[f64; 2]> {
    let mut out: Vec<[f64; 2]> = Vec::new();
    for stretch in stretches {
        match out.last_mut() {
            Some(last) if stretch.from <= last[1] + 0.5 => last[1] = last[1].max(stretch.to),
            _ => out.push([stretch.from, stretch.to]),
        }
    }
    out
}

fn rectangle([from, to]: [f64; 2], [top, bottom]: [f64; 2]) -> Vec<Point> {
    vec![[from, top], [to, top], [to, bottom], [from, bottom]]
}

/// Tints the plot behind everything where stretches are.
pub(super) fn draw_tints(drawing: &mut Drawing, layout: &Layout, bands: &[Band]) {
    let top = f64::from(layout.at[1]);
    let bottom = top + layout.size[1];
    for kind in [
        BandKind::Land,
        BandKind::Reference,
        BandKind::TipShape,
        BandKind::Bridged,
    ] {
        let Some(fill) = band_tones(kind).1 else {
            continue;
        };
        let loops: Vec<Vec<Point>> = joined(&stretches(layout, bands, kind))
            .into_iter()
            .map(|extent| rectangle(extent, [top, bottom]))
            .collect();
        if !loops.is_empty() {
            drawing.items.push(Item::Area { loops, fill });
        }
    }
}

/// Draws a lane for each kind of stretch from `top` downwards; returns where they end.
pub(super) fn draw_lanes(drawing: &mut Drawing, layout: &Layout, bands: &[Band], top: f64) -> f64 {
    let left = f64::from(layout.at[0]);
    let right = left + layout.size[0];
    let mut y = top;
    for kind in KINDS {
        let found = stretches(layout, bands, kind);
        if found.is_empty() {
            continue;
        }
        let (bar, base) = ([y + 3.0, y + 3.0 + BAR], y + 15.5);
        let loops = joined(&found)
            .into_iter()
            .map(|extent| rectangle(extent, bar))
            .collect();
        drawing.items.push(Item::Area {
            loops,
            fill: band_tones(kind).0,
        });
        borders(drawing, &found, bar);
        words(drawing, &found, kind, base);
        let name = format!("{} ({})", band_name(kind), found.len());
        drawing.text([left - 10.0, base], Anchor::End, TextSize::Small, name);
        y += LANE;
    }
    if y > top {
        y += 4.0;
        drawing.lines(
            vec![
                vec![[left, top], [left, y]],
                vec![[left, y], [right, y]],
                vec![[right, y], [right, top]],
            ],
            INK,
            1.0,
        );
    }
    y
}

/// Ends of the wider stretches as thin lines.
fn borders(drawing: &mut Drawing, found: &[Stretch<'_>], [top, bottom]: [f64; 2]) {
    let ends: Vec<Vec<Point>> = found
        .iter()
        .filter(|s| s.to - s.from >= BORDERED)
        .flat_map(|s| [s.from, s.to])
        .map(|x| vec![[x, top], [x, bottom]])
        .collect();
    drawing.lines(ends, INK, 0.8);
}

/// Words in stretches that hold them.
fn words(drawing: &mut Drawing, found: &[Stretch<'_>], kind: BandKind, base: f64) {
    // Dark bars are too narrow for words; the notes list what was bridged.
    if kind == BandKind::Bridged {
        return;
    }
    let mut free_from = f64::NEG_INFINITY;
    for stretch in found {
        let text = title(stretch.label);
        let width = TextSize::Small.width(&text);
        let middle = 0.5 * (stretch.from + stretch.to);
        let fits = width + 4.0 <= stretch.to - stretch.from && middle - 0.5 * width > free_from;
        if !text.trim().is_empty() && fits {
            drawing.text([middle, base], Anchor::Middle, TextSize::Small, text);
            free_from = middle + 0.5 * width + 4.0;
        }
    }
}
