//! The look of everything in a check picture, and legends that show it.

use super::check_picture::{BandKind, CurveKind, MarkKind, RegionKind};
use super::drawing::{Anchor, Colour, Drawing, INK, Item, PAPER, Raster, TextSize};
use super::line_style::{LineStyle, arrow_head, closed, hatched};
use super::picture::broken;
use crate::geometry::Point;

/// Width of a sample, px.
const SAMPLE: f64 = 38.0;
/// Gap between a sample and its words, px.
const GAP: f64 = 8.0;
/// Gap between two entries, px.
const BETWEEN: f64 = 26.0;
/// Height of a line of entries, px.
const ROW: f64 = 21.0;
/// Distance of hatching lines, px.
pub(super) const HATCH: f64 = 9.0;
/// Hatching of lids.
pub(super) const HATCHING: LineStyle = style([120, 120, 120], 1.0, &[]);
/// Border of what lies on a grey picture.
pub(super) const HALO: Colour = [0, 0, 0];
/// Border of the part of a picture that was looked at.
pub(super) const CROP: LineStyle = style(PAPER, 1.6, &[2.0, 5.0]);
/// Lines along which traces were taken.
pub(super) const CUT: LineStyle = style(PAPER, 1.8, &[12.0, 4.0]);
/// Tones of points of a map without height: paper and stripe.
const MISSING: [Colour; 2] = [[226, 226, 226], [150, 150, 150]];

const fn style(colour: Colour, width: f64, dash: &'static [f64]) -> LineStyle {
    LineStyle {
        colour,
        width,
        dash,
    }
}

/// How a line of a kind is drawn; kinds differ by dashes or width as well as by colour.
pub(super) fn curve_style(kind: CurveKind) -> LineStyle {
    match kind {
        CurveKind::Measured => style([112, 112, 112], 1.4, &[]),
        CurveKind::Repeat => style([0, 130, 110], 0.8, &[]),
        CurveKind::Corrected => style([0, 90, 156], 2.2, &[]),
        CurveKind::Reference => style([176, 48, 0], 1.8, &[11.0, 6.0]),
        CurveKind::Bridge => style([150, 0, 110], 3.0, &[0.5, 6.0]),
        CurveKind::Lid => style(INK, 2.4, &[14.0, 5.0, 2.0, 5.0]),
        CurveKind::Alternative => style([120, 80, 0], 1.4, &[4.0, 5.0]),
        CurveKind::InnerReach => region_style(RegionKind::InnerReach).1,
        CurveKind::OuterReach => region_style(RegionKind::OuterReach).1,
    }
}

/// Fill and border of an area.
pub(super) fn region_style(kind: RegionKind) -> (Option<Colour>, LineStyle) {
    match kind {
        RegionKind::OuterReach => (
            Some([249, 226, 205]),
            style([150, 66, 0], 1.5, &[13.0, 4.0, 2.0, 4.0]),
        ),
        RegionKind::Section => (Some([214, 229, 243]), style(INK, 2.4, &[])),
        RegionKind::InnerReach => (Some([178, 206, 232]), style([0, 98, 84], 1.5, &[7.0, 4.0])),
        RegionKind::Lid => (None, style([90, 90, 90], 1.2, &[])),
    }
}

/// Border of an area on a grey picture, drawn on [`HALO`].
pub(super) fn bright_style(kind: RegionKind) -> LineStyle {
    match kind {
        RegionKind::Section => style([255, 221, 51], 2.2, &[]),
        RegionKind::InnerReach => style([112, 224, 255], 1.6, &[7.0, 5.0]),
        RegionKind::OuterReach => style([255, 158, 94], 1.6, &[13.0, 5.0, 2.0, 5.0]),
        RegionKind::Lid => style(PAPER, 1.2, &[]),
    }
}

/// Tone of a stretch in its lane and, for those that matter for levelling, behind the curves.
pub(super) fn band_tones(kind: BandKind) -> (Colour, Option<Colour>) {
    match kind {
        BandKind::Groove => ([191, 212, 233], None),
        BandKind::Land => ([203, 203, 203], Some([246, 246, 246])),
        BandKind::Reference => ([240, 190, 150], Some([253, 241, 230])),
        BandKind::TipShape => ([181, 160, 205], Some([243, 238, 248])),
        BandKind::Bridged => ([150, 0, 110], Some([248, 229, 242])),
    }
}

/// Name of a kind of stretch.
pub(super) fn band_name(kind: BandKind) -> &'static str {
    match kind {
        BandKind::Groove => "grooves",
        BandKind::Land => "lands",
        BandKind::Reference => "reference",
        BandKind::TipShape => "tip shape",
        BandKind::Bridged => "bridged",
    }
}

/// Whether a pixel without height is on a stripe.
pub(super) fn missing_tone(column: usize, row: usize) -> Colour {
    let [plain, stripe] = MISSING;
    if (column + row) % 6 < 2 {
        stripe
    } else {
        plain
    }
}

/// What stands before the words of a legend entry.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Sample {
    Line(LineStyle),
    /// A line on a grey picture.
    Bright(LineStyle),
    Region(RegionKind),
    Mark(MarkKind),
    /// A place from which the inside was found.
    Seed,
    /// A point of a map without height.
    Missing,
    /// A direction, as a vector on the page.
    Direction(Point),
}

impl Sample {
    /// Draws the sample in a box from `left` around the height `y`, px.
    fn draw(&self, drawing: &mut Drawing, left: f64, y: f64) {
        let right = left + SAMPLE;
        let line = vec![vec![[left + 1.0, y], [right - 1.0, y]]];
        let swatch = vec![vec![
            [left + 1.0, y - 7.0],
            [right - 1.0, y - 7.0],
            [right - 1.0, y + 7.0],
            [left + 1.0, y + 7.0],
        ]];
        let middle = [left + 0.5 * SAMPLE, y];
        match *self {
            Self::Line(style) => style.draw(drawing, line),
            Self::Bright(style) => style.draw_on(drawing, line, HALO),
            Self::Region(kind) => draw_regions(drawing, kind, &swatch),
            Self::Mark(kind) => draw_mark(drawing, kind, middle),
            Self::Seed => draw_seed(drawing, middle),
            Self::Missing => drawing.items.push(Item::Image {
                raster: missing_swatch(SAMPLE as usize - 2, 14),
                at: [left.round() as i32 + 1, y.round() as i32 - 7],
                clip: Vec::new(),
            }),
            Self::Direction([dx, dy]) => {
                let end = |side: f64| [middle[0] + side * 15.0 * dx, middle[1] + side * 15.0 * dy];
                drawing.lines(vec![vec![end(-0.8), end(0.8)]], INK, 1.8);
                arrow_head(drawing, end(1.0), [dx, dy], INK);
                arrow_head(drawing, end(-1.0), [-dx, -dy], INK);
            }
        }
    }

    /// Room above and below a line of entries beyond the usual, px.
    fn extra(&self) -> f64 {
        match self {
            Self::Direction([_, dy]) => (15.0 * dy.abs() - 6.0).max(0.0),
            _ => 0.0,
        }
    }
}

/// Hatching of points without height.
fn missing_swatch(columns: usize, rows: usize) -> Raster {
    let rgb = (0..rows)
        .flat_map(|row| (0..columns).flat_map(move |column| missing_tone(column, row)))
        .collect();
    Raster { columns, rows, rgb }
}

/// Fills areas and draws their borders.
pub(super) fn draw_regions(drawing: &mut Drawing, kind: RegionKind, loops: &[Vec<Point>]) {
    let (fill, border) = region_style(kind);
    match fill {
        Some(fill) => drawing.items.push(Item::Area {
            loops: loops.to_vec(),
            fill,
        }),
        None => HATCHING.draw(drawing, hatched(loops, HATCH)),
    }
    border.draw(drawing, closed(loops));
}

/// A mark with a white border.
pub(super) fn draw_mark(drawing: &mut Drawing, kind: MarkKind, at: Point) {
    let lines = mark_lines(kind, at);
    drawing.lines(lines.clone(), PAPER, 4.4);
    let colour = match kind {
        MarkKind::Spike => [150, 0, 110],
        MarkKind::Edge | MarkKind::Place => INK,
    };
    drawing.lines(lines, colour, 1.8);
}

/// A cross for a spike, a T for an edge, a small square for any other place.
pub(super) fn mark_lines(kind: MarkKind, [x, y]: Point) -> Vec<Vec<Point>> {
    let r = 4.5;
    match kind {
        MarkKind::Spike => vec![
            vec![[x - r, y - r], [x + r, y + r]],
            vec![[x - r, y + r], [x + r, y - r]],
        ],
        MarkKind::Edge => vec![
            vec![[x, y - 9.0], [x, y + 9.0]],
            vec![[x - r, y - 9.0], [x + r, y - 9.0]],
        ],
        MarkKind::Place => closed(&[vec![
            [x - r, y - r],
            [x + r, y - r],
            [x + r, y + r],
            [x - r, y + r],
        ]]),
    }
}

/// An upright cross in a ring that shows on any grey.
pub(super) fn draw_seed(drawing: &mut Drawing, [x, y]: Point) {
    let r = 7.0;
    let ring: Vec<Point> = (0..=24)
        .map(|k| f64::from(k) * std::f64::consts::TAU / 24.0)
        .map(|t| [x + r * t.cos(), y + r * t.sin()])
        .collect();
    let lines = vec![
        ring,
        vec![[x - 3.0, y], [x + 3.0, y]],
        vec![[x, y - 3.0], [x, y + 3.0]],
    ];
    drawing.lines(lines.clone(), HALO, 4.4);
    drawing.lines(lines, PAPER, 1.8);
}

/// Samples with words.
#[derive(Debug, Default)]
pub(super) struct Legend {
    entries: Vec<(Sample, String)>,
}

impl Legend {
    /// Adds an entry unless it is there.
    pub(super) fn add(&mut self, sample: Sample, words: impl Into<String>) {
        let entry = (sample, words.into());
        if !self.entries.contains(&entry) {
            self.entries.push(entry);
        }
    }

    /// Draws the entries in lines of `width` px from `left` and `top`; returns where they end.
    pub(super) fn draw(&self, drawing: &mut Drawing, [left, top]: Point, width: f64) -> f64 {
        let size = TextSize::Small;
        let room = ((width - SAMPLE - GAP) / size.advance()).floor() as usize;
        let mut y = top;
        let mut x = left;
        let mut row = 0.0_f64;
        for (sample, words) in &self.entries {
            let lines = broken(words, room);
            let longest = lines.iter().map(|l| size.width(l)).fold(0.0, f64::max);
            let needed = SAMPLE + GAP + longest;
            if x > left && x + needed > left + width {
                (x, y, row) = (left, y + row, 0.0);
            }
            let middle = y + 0.5 * ROW + sample.extra();
            sample.draw(drawing, x, middle);
            for (k, line) in lines.iter().enumerate() {
                let base = middle + 5.0 + size.line_height() * k as f64;
                drawing.text([x + SAMPLE + GAP, base], Anchor::Start, size, line);
            }
            let more = size.line_height() * lines.len().saturating_sub(1) as f64;
            row = row.max(ROW + more.max(sample.extra()) + sample.extra());
            x += needed + BETWEEN;
        }
        y + row
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn no_two_kinds_differ_by_colour_alone() {
        let curves = [
            CurveKind::Measured,
            CurveKind::Repeat,
            CurveKind::Corrected,
            CurveKind::Reference,
            CurveKind::Bridge,
            CurveKind::Lid,
            CurveKind::Alternative,
            CurveKind::InnerReach,
            CurveKind::OuterReach,
        ];
        let regions = [
            RegionKind::OuterReach,
            RegionKind::Section,
            RegionKind::InnerReach,
            RegionKind::Lid,
        ];
        let shapes: [Vec<LineStyle>; 3] = [
            curves.map(curve_style).to_vec(),
            regions.map(|r| region_style(r).1).to_vec(),
            regions.map(bright_style).to_vec(),
        ];
        for styles in shapes {
            for (index, a) in styles.iter().enumerate() {
                for b in styles.iter().skip(index + 1) {
                    let is_wider = (a.width - b.width).abs() >= 0.5;
                    assert!(is_wider || a.dash != b.dash, "{a:?} {b:?}");
                }
            }
        }
    }

    #[test]
    fn entries_wrap_within_the_width() {
        let mut drawing = Drawing {
            width: 400,
            height: 400,
            title: String::new(),
            description: String::new(),
            items: Vec::new(),
        };
        let mut legend = Legend::default();
        for name in ["one", "two two two two two", "three", "x"] {
            legend.add(Sample::Seed, name.repeat(9));
            legend.add(Sample::Seed, name.repeat(9));
        }
        assert_eq!(legend.entries.len(), 4);
        let end = legend.draw(&mut drawing, [10.0, 10.0], 200.0);
        assert!(end > 10.0 + 4.0 * ROW);
        for item in &drawing.items {
            if let Item::Text { at, text, .. } = item {
                assert!(at[0] + TextSize::Small.width(text) <= 210.0, "{text}");
                assert!(at[1] < end);
            }
        }
    }
}
