//! How lines and areas differ: colour, width and dashes, and hatching.

use super::drawing::{Colour, Drawing, Item, PAPER};
use crate::geometry::Point;

/// Most dashes of one line; a longer line gets longer dashes.
const MOST_DASHES: f64 = 3_000.0;

/// The look of a line.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct LineStyle {
    pub(super) colour: Colour,
    /// Width, px.
    pub(super) width: f64,
    /// Lengths of dash and gap in turn, px; none for a full line.
    pub(super) dash: &'static [f64],
}

impl LineStyle {
    /// The lines with dashes cut out.
    fn cut(&self, lines: Vec<Vec<Point>>) -> Vec<Vec<Point>> {
        if self.dash.is_empty() {
            return lines;
        }
        lines.iter().flat_map(|l| dashed(l, self.dash)).collect()
    }

    /// Draws open lines.
    pub(super) fn draw(&self, drawing: &mut Drawing, lines: Vec<Vec<Point>>) {
        drawing.lines(self.cut(lines), self.colour, self.width);
    }

    /// Draws open lines on a wider line of another colour, so that they show on anything.
    pub(super) fn draw_on(&self, drawing: &mut Drawing, lines: Vec<Vec<Point>>, halo: Colour) {
        let lines = self.cut(lines);
        drawing.lines(lines.clone(), halo, self.width + 2.4);
        drawing.lines(lines, self.colour, self.width);
    }
}

/// Loops as open lines that end where they begin.
pub(super) fn closed(loops: &[Vec<Point>]) -> Vec<Vec<Point>> {
    loops
        .iter()
        .map(|l| l.iter().chain(l.first()).copied().collect())
        .collect()
}

/// A line as dashes: `pattern` holds lengths of dash and gap in turn, px.
pub(super) fn dashed(line: &[Point], pattern: &[f64]) -> Vec<Vec<Point>> {
    let length: f64 = line.windows(2).map(|w| distance(w[0], w[1])).sum();
    let period: f64 = pattern.iter().sum();
    let (Some(&first), true) = (line.first(), period > 0.0 && length.is_finite()) else {
        return vec![line.to_vec()];
    };
    let stretch = (length / period / MOST_DASHES).max(1.0);
    let mut lengths = pattern.iter().map(|l| l.max(0.1) * stretch).cycle();
    let mut left = lengths.next().unwrap_or(length);
    let mut on = true;
    let mut out = vec![vec![first]];
    for pair in line.windows(2) {
        let &[mut from, to] = pair else { continue };
        loop {
            let rest = distance(from, to);
            if rest <= left {
                left -= rest;
                break;
            }
            let share = left / rest;
            from = [
                from[0] + share * (to[0] - from[0]),
                from[1] + share * (to[1] - from[1]),
            ];
            if on {
                push(&mut out, from);
            } else {
                out.push(vec![from]);
            }
            on = !on;
            left = lengths.next().unwrap_or(length);
        }
        if on {
            push(&mut out, to);
        }
    }
    out.retain(|l| l.len() > 1);
    out
}

fn push(lines: &mut [Vec<Point>], p: Point) {
    if let Some(line) = lines.last_mut() {
        line.push(p);
    }
}

fn distance(a: Point, b: Point) -> f64 {
    (a[0] - b[0]).hypot(a[1] - b[1])
}

/// Lines rising to the right across an area, `spacing` px apart along x; inside is where loops around are odd in
/// number.
pub(super) fn hatched(loops: &[Vec<Point>], spacing: f64) -> Vec<Vec<Point>> {
    // On a rising line x + y is constant, since y runs downwards.
    let mut crossings: std::collections::BTreeMap<i64, Vec<f64>> =
        std::collections::BTreeMap::new();
    for points in loops {
        for (a, b) in points.iter().zip(points.iter().cycle().skip(1)) {
            let (sum_a, sum_b) = (a[0] + a[1], b[0] + b[1]);
            let (low, high) = (sum_a.min(sum_b), sum_a.max(sum_b));
            let begin = (low / spacing).ceil() as i64;
            let mut k = begin;
            // Half open, so that a vertex on a line counts once.
            while (k as f64) * spacing < high {
                let share = (k as f64 * spacing - sum_a) / (sum_b - sum_a);
                crossings
                    .entry(k)
                    .or_default()
                    .push(a[0] + share * (b[0] - a[0]));
                k += 1;
            }
        }
    }
    let mut out = Vec::new();
    for (k, mut places) in crossings {
        places.sort_by(f64::total_cmp);
        for pair in places.chunks_exact(2) {
            let &[from, to] = pair else { continue };
            let sum = k as f64 * spacing;
            out.push(vec![[from, sum - from], [to, sum - to]]);
        }
    }
    out
}

/// A filled triangle on paper whose tip is at `tip` and which points along `direction` (of length one).
pub(super) fn arrow_head(drawing: &mut Drawing, tip: Point, direction: Point, colour: Colour) {
    let (length, half) = (10.0, 3.6);
    let [dx, dy] = direction;
    let foot = [tip[0] - length * dx, tip[1] - length * dy];
    let corners = vec![
        tip,
        [foot[0] - half * dy, foot[1] + half * dx],
        [foot[0] + half * dy, foot[1] - half * dx],
    ];
    drawing.lines(closed(std::slice::from_ref(&corners)), PAPER, 1.8);
    drawing.items.push(Item::Area {
        loops: vec![corners],
        fill: colour,
    });
}

#[cfg(test)]
mod tests {
    use super::*;

    fn length(lines: &[Vec<Point>]) -> f64 {
        lines
            .iter()
            .flat_map(|l| l.windows(2))
            .map(|w| distance(w[0], w[1]))
            .sum()
    }

    #[test]
    fn dashes_cover_their_share_of_a_bent_line() {
        let line = [[0.0, 0.0], [100.0, 0.0], [100.0, 50.0]];
        let dashes = dashed(&line, &[6.0, 4.0]);
        assert_eq!(dashes.len(), 15);
        assert!((length(&dashes) - 90.0).abs() < 1e-9);
        assert_eq!(dashed(&[], &[6.0, 4.0]), vec![Vec::<Point>::new()]);
        assert!(dashed(&[[1.0, 1.0]], &[6.0, 4.0]).is_empty());
        let long: Vec<Point> = (0..100_000)
            .map(|i| [f64::from(i % 2) * 500.0, 0.0])
            .collect();
        assert!(dashed(&long, &[1.0, 1.0]).len() <= 3_001);
    }

    #[test]
    fn hatching_fills_the_area_and_leaves_the_hole() {
        let square = |low: f64, high: f64| vec![[low, low], [high, low], [high, high], [low, high]];
        let full = hatched(&[square(0.0, 40.0)], 8.0);
        // Line density is 1 / (8 / sqrt 2) per px, so length times that spacing is the area.
        let area = |lines: &[Vec<Point>]| length(lines) * 8.0 / 2_f64.sqrt();
        assert!(
            (area(&full) - 1600.0).abs() < 1e-6 * 1600.0,
            "{}",
            area(&full)
        );
        let holed = hatched(&[square(0.0, 40.0), square(12.0, 28.0)], 8.0);
        assert!((area(&holed) - (1600.0 - 256.0)).abs() < 1e-6 * 1600.0);
        assert!(hatched(&[vec![[3.0, 3.0]]], 8.0).is_empty());
    }
}
