//! Long curves as few points without hiding anything that a page can show.

use std::collections::BTreeMap;

use super::picture_layout::{straightened, thinned};
use crate::geometry::Point;

/// A curve of more points runs to and fro; only its extent in each column of pixels is drawn.
const MOST_CURVE_POINTS: usize = 8_000;
/// Most points of all loops of an area.
const MOST_LOOP_POINTS: usize = 12_000;
/// Most loops of an area.
const MOST_LOOPS: usize = 2_000;
/// Coarsest distance of loop points, px.
const COARSEST: f64 = 64.0;

/// Page points of consecutive samples within one column of pixels.
#[derive(Clone, Copy)]
struct Column {
    index: i64,
    first: (usize, Point),
    low: (usize, Point),
    high: (usize, Point),
    last: (usize, Point),
}

impl Column {
    fn new(index: i64, sample: (usize, Point)) -> Self {
        Self {
            index,
            first: sample,
            low: sample,
            high: sample,
            last: sample,
        }
    }

    fn add(&mut self, sample: (usize, Point)) {
        if sample.1[1] < self.low.1[1] {
            self.low = sample;
        }
        if sample.1[1] > self.high.1[1] {
            self.high = sample;
        }
        self.last = sample;
    }

    fn points(&self) -> Vec<Point> {
        let mut kept = [self.first, self.low, self.high, self.last];
        kept.sort_by_key(|(order, _)| *order);
        let mut points: Vec<(usize, Point)> = kept.to_vec();
        points.dedup_by_key(|(order, _)| *order);
        points.into_iter().map(|(_, p)| p).collect()
    }
}

/// The lines of a curve given by page points, `None` where it is broken.
///
/// Of the samples within one column of pixels the first, the lowest, the highest and the last stay, so a spike of
/// a single sample keeps its full height. A break within one column is not seen and not kept. A sample between two
/// breaks becomes a dot.
pub(super) fn column_extremes(points: impl Iterator<Item = Option<Point>>) -> Vec<Vec<Point>> {
    let mut lines: Vec<Vec<Point>> = Vec::new();
    let mut line: Vec<Point> = Vec::new();
    let mut open: Option<Column> = None;
    let mut broken = false;
    for (order, point) in points.enumerate() {
        let Some(p) = point else {
            broken = true;
            continue;
        };
        let index = p[0].floor() as i64;
        match &mut open {
            Some(column) if column.index == index => column.add((order, p)),
            _ => {
                line.extend(open.iter().flat_map(Column::points));
                if broken && !line.is_empty() {
                    lines.push(std::mem::take(&mut line));
                }
                open = Some(Column::new(index, (order, p)));
            }
        }
        broken = false;
    }
    line.extend(open.iter().flat_map(Column::points));
    lines.push(line);
    lines.retain(|l| !l.is_empty());
    if lines.iter().map(Vec::len).sum::<usize>() > MOST_CURVE_POINTS {
        lines = extents(&lines);
    }
    lines
        .iter()
        .map(|l| match l.as_slice() {
            &[p] => vec![p, [p[0] + 0.3, p[1]]],
            several => straightened(&thinned(several.iter().copied())),
        })
        .collect()
}

/// The extent in each column of pixels, as lines up and down.
fn extents(lines: &[Vec<Point>]) -> Vec<Vec<Point>> {
    let mut columns: BTreeMap<i64, [f64; 2]> = BTreeMap::new();
    for p in lines.iter().flatten() {
        let column = columns
            .entry(p[0].floor() as i64)
            .or_insert([f64::INFINITY, f64::NEG_INFINITY]);
        *column = [column[0].min(p[1]), column[1].max(p[1])];
    }
    let mut out: Vec<Vec<Point>> = Vec::new();
    let mut previous = None;
    for (index, [low, high]) in columns {
        let x = index as f64 + 0.5;
        if previous != Some(index - 1) {
            out.push(Vec::new());
        }
        if let Some(line) = out.last_mut() {
            line.extend([[x, low], [x, high]]);
        }
        previous = Some(index);
    }
    out
}

/// Loops on a page with few enough points, and the number of loops left out.
pub(super) fn few_points(mut loops: Vec<Vec<Point>>) -> (Vec<Vec<Point>>, usize) {
    loops.retain(|l| l.len() > 1);
    let left_out = loops.len().saturating_sub(MOST_LOOPS);
    loops.truncate(MOST_LOOPS);
    loops = loops
        .iter()
        .map(|l| straightened(&thinned(l.iter().copied())))
        .collect();
    let mut distance = 0.25;
    while distance < COARSEST && loops.iter().map(Vec::len).sum::<usize>() > MOST_LOOP_POINTS {
        for points in &mut loops {
            *points = apart(points, distance);
        }
        distance *= 2.0;
    }
    // What is left fills the area again and again; no thinning keeps its shape.
    let every = loops.iter().map(Vec::len).sum::<usize>() / MOST_LOOP_POINTS + 1;
    if every > 1 {
        for points in &mut loops {
            *points = points.iter().copied().step_by(every).collect();
        }
    }
    (loops, left_out)
}

/// Points at least `distance` from the one before, px.
fn apart(points: &[Point], distance: f64) -> Vec<Point> {
    let mut kept: Vec<Point> = Vec::new();
    for &p in points {
        let far = |q: &Point| (p[0] - q[0]).hypot(p[1] - q[1]) >= distance;
        if kept.last().is_none_or(far) {
            kept.push(p);
        }
    }
    kept
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_spike_of_one_sample_in_a_million_keeps_its_height() {
        let points = (0..1_000_000_u32).map(|i| {
            let noise = f64::from(i.wrapping_mul(2_654_435_761) >> 22) * 1e-3;
            let y = if i == 543_210 { -77.0 } else { 100.0 + noise };
            Some([f64::from(i) * 1e-3, y])
        });
        let lines = column_extremes(points);
        assert_eq!(lines.len(), 1);
        assert!(lines[0].len() <= 4_000, "{}", lines[0].len());
        let top = lines[0].iter().map(|p| p[1]).fold(f64::INFINITY, f64::min);
        assert!((top - -77.0).abs() < 1e-12);
        let foot = lines[0].iter().map(|p| p[1]).fold(0.0, f64::max);
        assert!(foot > 101.0 && foot <= 101.03);
    }

    #[test]
    fn breaks_stay_where_they_can_be_seen_and_single_samples_become_dots() {
        let line = column_extremes(
            [
                Some([0.0, 1.0]),
                Some([3.0, 1.0]),
                None,
                Some([9.0, 2.0]),
                None,
            ]
            .into_iter(),
        );
        assert_eq!(line.len(), 2);
        assert_eq!(line[1].len(), 2);
        let dense = (0..1_000_000).map(|i| (i % 2 == 0).then(|| [f64::from(i) * 1e-3, 5.0]));
        let lines = column_extremes(dense);
        assert!(lines.iter().map(Vec::len).sum::<usize>() < 4_000);
        assert!(column_extremes([None, None].into_iter()).is_empty());
    }

    #[test]
    fn a_curve_that_runs_to_and_fro_is_drawn_by_its_extent() {
        let points =
            (0..300_000_u32).map(|i| Some([f64::from(i * 7919 % 900), f64::from(i % 300)]));
        let lines = column_extremes(points);
        let count: usize = lines.iter().map(Vec::len).sum();
        assert!(count <= 2_000, "{count}");
        let top = lines.iter().flatten().map(|p| p[1]).fold(0.0, f64::max);
        assert!(top > 290.0);
    }

    #[test]
    fn loops_of_any_size_become_few_points() {
        let jagged: Vec<Point> = (0..400_000)
            .map(|i| [f64::from(i % 1000), f64::from(i / 1000 % 400)])
            .collect();
        let (loops, left_out) = few_points(vec![jagged; 3]);
        assert_eq!((loops.len(), left_out), (3, 0));
        assert!(loops.iter().map(Vec::len).sum::<usize>() <= MOST_LOOP_POINTS);
        let many = vec![vec![[0.0, 0.0], [1.0, 0.0], [1.0, 1.0]]; 5_000];
        let (loops, left_out) = few_points(many);
        assert_eq!((loops.len(), left_out), (MOST_LOOPS, 3_000));
    }
}
