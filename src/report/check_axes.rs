//! Ranges, scales and ticks of a panel.

use super::drawing::{Anchor, Colour, Drawing, INK, TextSize};
use super::numbers::{self, Unit, with_unit};
use super::picture_layout::{Exaggeration, Layout};
use super::ticks::{self, round_above, round_below};
use crate::geometry::Point;

/// Lines of ticks.
pub(super) const GRID: Colour = [214, 214, 214];
/// Largest height of a plot with stretched heights, px.
const TALLEST: f64 = 420.0;
/// Largest height of a plot at equal scale, px.
const TALLEST_EQUAL: f64 = 460.0;
/// Least height of a plot, px.
const LEAST_HEIGHT: f64 = 140.0;
/// Least height of what it shows, px.
const LEAST_INNER: f64 = 60.0;
/// Coordinates from here on count as missing, m.
const FARTHEST: f64 = 1e9;
/// No axis shows less, m.
const LEAST_EXTENT: f64 = 1e-15;
/// Extents below this share of the largest value cannot be told from rounding.
const ROUNDING: f64 = 1e-9;
/// An axis far from zero, in units of its extent, is numbered from a round value nearby.
const FAR_FROM_ZERO: f64 = 2_000.0;
/// Least distance of two ticks along a vertical axis, px.
const TICK_DISTANCE: f64 = 34.0;

/// Whether a place can be drawn.
pub(super) fn is_place(p: Point) -> bool {
    p.iter().all(|v| v.is_finite() && v.abs() < FARTHEST)
}

/// Smallest and largest coordinates along each axis.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Ranges {
    pub(super) low: Point,
    pub(super) high: Point,
}

impl Ranges {
    pub(super) fn new() -> Self {
        Self {
            low: [f64::INFINITY; 2],
            high: [f64::NEG_INFINITY; 2],
        }
    }

    /// Takes a place in; what cannot be drawn is passed over.
    pub(super) fn add(&mut self, p: Point) {
        if is_place(p) {
            for (axis, value) in p.into_iter().enumerate() {
                self.low[axis] = self.low[axis].min(value);
                self.high[axis] = self.high[axis].max(value);
            }
        }
    }

    pub(super) fn is_empty(&self) -> bool {
        self.low[0] > self.high[0]
    }

    /// With an extent along both axes and a margin, as shares of the extent.
    pub(super) fn widened(mut self, margin: Point) -> Self {
        for (axis, share) in margin.into_iter().enumerate() {
            let (low, high) = (self.low[axis], self.high[axis]);
            let largest = low.abs().max(high.abs());
            let is_flat = high - low <= ROUNDING * largest;
            let more = if is_flat && largest == 0.0 {
                5e-7
            } else if is_flat {
                0.5 * largest
            } else {
                share * (high - low)
            };
            let more = more.max(0.5 * (LEAST_EXTENT - (high - low)));
            self.low[axis] -= more;
            self.high[axis] += more;
        }
        self
    }

    pub(super) fn extent(&self) -> Point {
        [self.high[0] - self.low[0], self.high[1] - self.low[1]]
    }
}

/// Room around what a plot shows, px.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub(super) struct Reserve {
    pub(super) top: f64,
    pub(super) right: f64,
    pub(super) bottom: f64,
}

/// A plot of given width over ranges of positions and heights and the room around them.
///
/// `None` where the numbers leave what doubles can hold.
pub(super) fn fitted(
    ranges: &Ranges,
    width: f64,
    equal: bool,
    reserve: Reserve,
) -> Option<(Layout, Exaggeration, Ranges)> {
    let width = width - reserve.right;
    let extent = ranges.extent();
    let [x, z] = extent;
    let equal = equal && Exaggeration::of(extent) == Exaggeration::None;
    let exaggeration = if equal {
        Exaggeration::None
    } else {
        let factor = round_below(TALLEST * x / (width * z))?;
        if (factor - 1.0).abs() < 1e-9 {
            Exaggeration::None
        } else if factor > 1.0 {
            Exaggeration::Height(factor)
        } else {
            Exaggeration::Width(1.0 / factor)
        }
    };
    let [wide, tall] = exaggeration.stretch();
    let tallest = if equal { TALLEST_EQUAL } else { TALLEST };
    let fit = (width / (x * wide)).min(tallest / (z * tall));
    let scale = [fit * wide, fit * tall];
    let least = (LEAST_HEIGHT - reserve.top - reserve.bottom).max(LEAST_INNER);
    let mut size = [width, (z * scale[1]).clamp(least, tallest).ceil()];
    let mut shown = *ranges;
    for axis in 0..2 {
        let more = 0.5 * (size[axis] / scale[axis] - extent[axis]);
        shown.low[axis] -= more;
        shown.high[axis] += more;
    }
    shown.low[1] -= reserve.bottom / scale[1];
    shown.high[1] += reserve.top / scale[1];
    shown.high[0] += reserve.right / scale[0];
    size[0] += reserve.right;
    size[1] += reserve.top + reserve.bottom;
    let is_sound = scale.iter().all(|s| s.is_finite() && *s > 0.0);
    is_sound.then(|| {
        (
            Layout::spanning(shown.low, size, scale),
            exaggeration,
            shown,
        )
    })
}

/// The ratio of the scales in words.
pub(super) fn scale_words(exaggeration: Exaggeration) -> String {
    let number = |f: f64| {
        if f < 1e6 {
            ticks::label(f.round(), 1.0)
        } else {
            format!("{f:.0e}")
        }
    };
    match exaggeration {
        Exaggeration::None => "equal scale, x:z = 1:1".to_owned(),
        Exaggeration::Height(f) => {
            let f = number(f);
            format!("heights are stretched {f} times, x:z = 1:{f}")
        }
        Exaggeration::Width(f) => {
            let f = number(f);
            format!("widths are stretched {f} times, x:z = {f}:1")
        }
    }
}

/// The unit for an axis.
pub(super) fn unit_of(low: f64, high: f64) -> Unit {
    let largest = low.abs().max(high.abs());
    let extent = high - low;
    let value = if largest > FAR_FROM_ZERO * extent {
        extent
    } else {
        largest
    };
    numbers::fitting_unit(value, numbers::LENGTHS)
}

/// Numbering of one axis.
pub(super) struct Axis {
    /// What the numbers count from, m.
    offset: f64,
    /// The round value that `offset` is a multiple of, m.
    grain: f64,
    unit: Unit,
    /// Distance of ticks, in units.
    step: f64,
    first: i64,
    last: i64,
}

impl Axis {
    /// Ticks from `low` to `high` (m) at `scale` px per metre; labels of a level axis need room side by side.
    pub(super) fn new([low, high]: Point, unit: Unit, scale: f64, level: bool) -> Self {
        let extent = high - low;
        let largest = low.abs().max(high.abs());
        let grain = round_above(extent).unwrap_or(1.0);
        let offset = if largest > FAR_FROM_ZERO * extent {
            (low / grain).floor() * grain
        } else {
            0.0
        };
        let size = unit.1;
        let mut axis = Self {
            offset,
            grain,
            unit,
            step: 1.0,
            first: 0,
            last: -1,
        };
        let mut least = TICK_DISTANCE / scale / size;
        for _ in 0..12 {
            let Some(step) = round_above(least) else {
                return axis;
            };
            axis.step = step;
            axis.first = ((low - offset) / size / step - 1e-9).ceil() as i64;
            axis.last = ((high - offset) / size / step + 1e-9).floor() as i64;
            let widest = axis
                .ticks()
                .map(|(_, label)| TextSize::Small.width(&label))
                .fold(0.0, f64::max);
            if !level || step * size * scale > widest + 24.0 {
                break;
            }
            least = 1.5 * step;
        }
        axis
    }

    /// Places (m) and numbers.
    pub(super) fn ticks(&self) -> impl Iterator<Item = (f64, String)> + '_ {
        let last = self.last.min(self.first.saturating_add(200));
        (self.first..=last).map(|k| {
            let value = k as f64 * self.step;
            (
                self.offset + value * self.unit.1,
                ticks::label(value, self.step),
            )
        })
    }

    /// What the axis shows, with its unit.
    pub(super) fn heading(&self, name: &str) -> String {
        if self.offset == 0.0 {
            format!("{name} / {}", self.unit.0)
        } else {
            let digits = 1.0
                + (self.offset.abs() / self.grain)
                    .log10()
                    .ceil()
                    .clamp(0.0, 14.0);
            let digits = digits as usize;
            let sign = if self.offset < 0.0 { '+' } else { '-' };
            let from = with_unit(self.offset.abs(), numbers::LENGTHS, digits);
            format!("({name} {sign} {from}) / {}", self.unit.0)
        }
    }
}

/// Draws the lines of ticks, which lie below everything else.
pub(super) fn draw_grid(drawing: &mut Drawing, layout: &Layout, [x, z]: [&Axis; 2]) {
    let [left, top] = layout.at.map(f64::from);
    let [width, height] = layout.size;
    let mut lines = Vec::new();
    for (value, _) in x.ticks() {
        let at = layout.page([value, 0.0])[0];
        lines.push(vec![[at, top], [at, top + height]]);
    }
    for (value, _) in z.ticks() {
        let at = layout.page([0.0, value])[1];
        lines.push(vec![[left, at], [left + width, at]]);
    }
    drawing.lines(lines, GRID, 1.0);
}

/// Draws ticks with numbers: heights at the left, positions below `base` (px); returns where the numbers end.
pub(super) fn draw_ticks(
    drawing: &mut Drawing,
    layout: &Layout,
    [x, z]: [&Axis; 2],
    base: f64,
) -> f64 {
    let left = f64::from(layout.at[0]);
    for (value, label) in z.ticks() {
        let at = layout.page([0.0, value])[1];
        drawing.lines(vec![vec![[left - 6.0, at], [left, at]]], INK, 1.0);
        drawing.text([left - 10.0, at + 5.0], Anchor::End, TextSize::Small, label);
    }
    for (value, label) in x.ticks() {
        let at = layout.page([value, 0.0])[0];
        drawing.lines(vec![vec![[at, base], [at, base + 6.0]]], INK, 1.0);
        drawing.text([at, base + 20.0], Anchor::Middle, TextSize::Small, label);
    }
    base + 24.0
}

/// Draws the border of a plot.
pub(super) fn draw_frame(drawing: &mut Drawing, layout: &Layout) {
    let [left, top] = layout.at.map(f64::from);
    draw_border(drawing, [left, top], layout.size);
}

/// Draws a border around a rectangle of the page.
pub(super) fn draw_border(drawing: &mut Drawing, [left, top]: Point, [width, height]: [f64; 2]) {
    let [right, bottom] = [left + width, top + height];
    let corners = vec![
        [left, top],
        [right, top],
        [right, bottom],
        [left, bottom],
        [left, top],
    ];
    drawing.lines(vec![corners], INK, 1.0);
}

#[cfg(test)]
mod tests {
    use super::*;

    fn ranges(low: Point, high: Point) -> Ranges {
        Ranges { low, high }
    }

    #[test]
    fn stretches_are_round_and_the_plot_fills_its_width() {
        let wide = ranges([0.0, -20e-6], [10e-3, 2e-6]);
        let (layout, exaggeration, _) = fitted(&wide, 960.0, false, Reserve::default()).unwrap();
        assert_eq!(exaggeration, Exaggeration::Height(100.0));
        assert!((layout.scale[1] / layout.scale[0] - 100.0).abs() < 1e-9);
        assert!((layout.size[0] - 960.0).abs() < 1e-9);
        assert_eq!(
            scale_words(exaggeration),
            "heights are stretched 100 times, x:z = 1:100"
        );
        let (layout, exaggeration, shown) = fitted(
            &ranges([0.0, 0.0], [1e-4, 1e-4]),
            960.0,
            true,
            Reserve::default(),
        )
        .unwrap();
        assert_eq!(exaggeration, Exaggeration::None);
        assert!((layout.scale[0] / layout.scale[1] - 1.0).abs() < 1e-12);
        assert!(shown.low[0] < 0.0 && shown.high[0] > 1e-4);
        let (_, deep, _) = fitted(
            &ranges([0.0, 0.0], [1e-6, 1e-4]),
            960.0,
            true,
            Reserve::default(),
        )
        .unwrap();
        assert!(matches!(deep, Exaggeration::Width(f) if f > 10.0));
    }

    #[test]
    fn extents_from_a_nanometre_to_a_metre_give_few_and_different_ticks() {
        for exponent in -9..=0 {
            for centre in [0.0, 1e-3, -1.0] {
                let half = 0.5 * 10_f64.powi(exponent);
                let low = centre - half;
                let high = centre + half;
                let unit = unit_of(low, high);
                let axis = Axis::new([low, high], unit, 960.0 / (high - low), true);
                let ticks: Vec<(f64, String)> = axis.ticks().collect();
                assert!(
                    (2..=30).contains(&ticks.len()),
                    "1e{exponent} about {centre}: {ticks:?}"
                );
                for pair in ticks.windows(2) {
                    assert_ne!(pair[0].1, pair[1].1, "1e{exponent} about {centre}");
                }
                assert!(axis.heading("height").chars().count() < 44);
            }
        }
        let axis = Axis::new([0.499_999, 0.500_001], ("\u{b5}m", 1e-6), 4e8, true);
        assert_eq!(axis.heading("x"), "(x - 499.995 mm) / \u{b5}m");
    }

    #[test]
    fn no_extent_is_widened_and_hostile_numbers_are_passed_over() {
        let mut flat = Ranges::new();
        flat.add([1.0, 0.0]);
        flat.add([f64::NAN, 5.0]);
        flat.add([1e300, -1e300]);
        assert!((flat.low[0] - 1.0).abs() < 1e-12 && flat.high[0] < 1.1);
        let wide = flat.widened([0.0, 0.1]);
        assert!(wide.extent().iter().all(|e| *e > 0.0));
        assert!(fitted(&wide, 960.0, false, Reserve::default()).is_some());
        let mut tiny = Ranges::new();
        tiny.add([1e-300, 0.0]);
        tiny.add([2e-300, 1.0]);
        let tiny = tiny.widened([0.0, 0.1]);
        assert!(tiny.extent()[0] >= LEAST_EXTENT);
        assert!(fitted(&tiny, 960.0, true, Reserve::default()).is_some());
    }
}
