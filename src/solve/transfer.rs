//! Between a grid and the next coarser one.
//!
//! Coarse node `(i, j)` is fine node `(2i, 2j)`, always of even colour. Odd fine nodes lie between two
//! coarse ones along a line and get the value linear along that line, which is zero where the wall cuts it:
//! with arms `a` and `b` towards two ends of values `p` and `q`, `(b p + a q) / (a + b)`. Even fine nodes
//! need no value, since the sweep that follows computes them from the odd ones. Restriction is the
//! transpose of that interpolation extended to the even nodes by the stencil; a sweep has just made the
//! residual of the odd nodes zero, so only even ones count. Away from walls that is full weighting.

use crate::grid::{ARM_DOWN, ARM_LEFT, ARM_RIGHT, ARM_UP, Colour, Mask, NO_NODE, Run, WallNode};

use super::row_set::Row;
use super::stencil::{opposite, weights};

/// Coarse nodes `coarse + k` whose nine fine nodes all have whole arms.
#[derive(Debug, Clone, Copy)]
struct RestrictSegment {
    coarse: u32,
    len: u32,
    centre: u32,
    down_left: u32,
    up_left: u32,
}

/// Odd fine nodes `fine + k` half way between coarse nodes `low + k` and `high + k`.
#[derive(Debug, Clone, Copy)]
struct ProlongSegment {
    fine: u32,
    len: u32,
    low: u32,
    high: u32,
}

/// A single weight.
#[derive(Debug, Clone, Copy)]
struct Entry {
    coarse: u32,
    fine: u32,
    weight: f64,
}

/// What is done to each row: stretches, then single weights.
#[derive(Debug, Clone)]
struct ByRow<T> {
    segments: Vec<T>,
    entries: Vec<Entry>,
    /// Where each row begins in both lists, and the totals at the end.
    starts: Vec<[u32; 2]>,
}

impl<T> ByRow<T> {
    /// - `entries`: about how many single weights there will be
    fn new(rows: usize, entries: usize) -> Self {
        let mut starts = Vec::with_capacity(rows + 1);
        starts.push([0; 2]);
        Self {
            segments: Vec::with_capacity(rows),
            entries: Vec::with_capacity(entries),
            starts,
        }
    }

    /// Ends a row.
    fn close(&mut self) {
        self.starts
            .push([self.segments.len() as u32, self.entries.len() as u32]);
    }

    fn row(&self, row: usize) -> (&[T], &[Entry]) {
        let [[s, e], [s_end, e_end]] = [self.starts[row], self.starts[row + 1]];
        (
            &self.segments[s as usize..s_end as usize],
            &self.entries[e as usize..e_end as usize],
        )
    }
}

/// The transfer between two grids; coarse values are row by row.
#[derive(Debug, Clone)]
pub(crate) struct Transfer {
    restriction: ByRow<RestrictSegment>,
    prolongation: ByRow<ProlongSegment>,
}

impl Transfer {
    pub(crate) fn new(fine: &Mask, coarse: &Mask) -> Self {
        let at_wall: usize = fine.wall.iter().map(Vec::len).sum();
        let mut transfer = Self {
            restriction: ByRow::new(coarse.rows(), 3 * at_wall),
            prolongation: ByRow::new(fine.rows(), 2 * at_wall),
        };
        transfer.plan_restriction(fine, coarse);
        for row in 0..fine.rows() as u32 {
            if row.is_multiple_of(2) {
                transfer.plan_row(fine, coarse, row);
            } else {
                transfer.plan_between_rows(fine, coarse, row);
            }
            transfer.prolongation.close();
        }
        transfer
    }

    /// One row of the coarse right side from the residual of the even fine nodes.
    ///
    /// - `even`: the residual in the fine rows below, at and above the coarse row
    /// - `first`: row-by-row index of the first coarse node of the row
    pub(crate) fn restrict_row(&self, row: usize, even: [Row; 3], first: u32, out: &mut [f64]) {
        out.fill(0.0);
        let (segments, entries) = self.restriction.row(row);
        for s in segments {
            let n = s.len as usize;
            let centre = even[1].from(s.centre, n);
            let below = even[0].from(s.down_left, n + 1);
            let above = even[2].from(s.up_left, n + 1);
            let (below_right, above_right) = (&below[1..][..n], &above[1..][..n]);
            let (below, above) = (&below[..n], &above[..n]);
            let target = &mut out[(s.coarse - first) as usize..][..n];
            for k in 0..n {
                let corners = (below[k] + below_right[k]) + (above[k] + above_right[k]);
                target[k] = centre[k] + 0.25 * corners;
            }
        }
        for e in entries {
            // The node is in one of the three rows; the others give zero.
            let value = even.map(|row| row.at(e.fine)).iter().sum::<f64>();
            out[(e.coarse - first) as usize] += e.weight * value;
        }
    }

    /// Adds the interpolated coarse values to the odd fine nodes of one row.
    ///
    /// - `first`: storage index of the first odd node of the row
    pub(crate) fn prolong_row(&self, row: usize, coarse: &[f64], first: u32, odd: &mut [f64]) {
        let (segments, entries) = self.prolongation.row(row);
        for s in segments {
            let n = s.len as usize;
            let low = &coarse[s.low as usize..][..n];
            let high = &coarse[s.high as usize..][..n];
            let target = &mut odd[(s.fine - first) as usize..][..n];
            for k in 0..n {
                target[k] += 0.5 * (low[k] + high[k]);
            }
        }
        for e in entries {
            odd[(e.fine - first) as usize] += e.weight * coarse[e.coarse as usize];
        }
    }

    fn plan_restriction(&mut self, fine: &Mask, coarse: &Mask) {
        let near_wall = near_wall(fine, coarse);
        for row in 0..coarse.rows() as u32 {
            for run in coarse.row(row) {
                self.plan_restricted_run(fine, run, &near_wall);
            }
            self.restriction.close();
        }
    }

    fn plan_restricted_run(&mut self, fine: &Mask, run: &Run, near_wall: &[bool]) {
        let flags = &near_wall[run.natural as usize..(run.natural + run.len) as usize];
        let mut offset = 0;
        for stretch in flags.chunk_by(|a, b| a == b) {
            let i = run.first + offset;
            let len = stretch.len() as u32;
            offset += len;
            let segment = (stretch.first() == Some(&false))
                .then(|| restrict_segment(fine, run.natural + i - run.first, i, run.row, len))
                .flatten();
            if let Some(segment) = segment {
                self.restriction.segments.push(segment);
            } else {
                for k in 0..len {
                    self.restrict_near_wall(
                        fine,
                        run.natural + i + k - run.first,
                        [i + k, run.row],
                    );
                }
            }
        }
    }

    /// Weights of the even fine nodes around one coarse node near a wall.
    fn restrict_near_wall(&mut self, fine: &Mask, coarse: u32, at: [u32; 2]) {
        let (i, j) = (2 * at[0], 2 * at[1]);
        if let Some((_, node)) = fine.node_at(i, j) {
            self.restriction.entries.push(Entry {
                coarse,
                fine: node,
                weight: 1.0,
            });
        }
        for (to_column, x) in [(ARM_RIGHT, i.checked_sub(1)), (ARM_LEFT, Some(i + 1))] {
            for (to_row, y) in [(ARM_UP, j.checked_sub(1)), (ARM_DOWN, Some(j + 1))] {
                let (Some(x), Some(y)) = (x, y) else { continue };
                let Some((colour, node)) = fine.node_at(x, y) else {
                    continue;
                };
                let wall = fine.wall_node_in_row(colour, node, y);
                let (weight, diagonal) = wall.map_or(([1.0; 4], 4.0), weights);
                let across = line_weight(fine, [i, y], to_row);
                let along = line_weight(fine, [x, j], to_column);
                let total = (weight[to_column] * across + weight[to_row] * along) / diagonal;
                if total > 0.0 {
                    self.restriction.entries.push(Entry {
                        coarse,
                        fine: node,
                        weight: total,
                    });
                }
            }
        }
    }

    /// Odd fine nodes in a row of coarse nodes.
    fn plan_row(&mut self, fine: &Mask, coarse: &Mask, row: u32) {
        for run in fine.row(row) {
            let first = run.first | 1;
            if first >= run.end() {
                continue;
            }
            let inner = if run.first.is_multiple_of(2) {
                first
            } else {
                first + 2
            };
            let last = (run.end() - 1).saturating_sub(1) | 1;
            let inner_end = if last + 1 < run.end() { last + 2 } else { last };
            let len = inner_end.saturating_sub(inner) / 2;
            let whole = (len > 0)
                .then(|| line_of(coarse, inner / 2, row / 2, len + 1))
                .flatten();
            if let (Some(low), Some((_, node))) = (whole, fine.node_at(inner, row)) {
                self.prolongation.segments.push(ProlongSegment {
                    fine: node,
                    len,
                    low,
                    high: low + 1,
                });
            }
            let done = if whole.is_some() {
                inner..inner + 2 * len
            } else {
                first..first
            };
            for i in (first..done.start).chain(done.end..run.end()).step_by(2) {
                self.prolong_single(fine, coarse, [i, row], ARM_LEFT);
            }
        }
    }

    /// Odd fine nodes in a row between two rows of coarse nodes.
    fn plan_between_rows(&mut self, fine: &Mask, coarse: &Mask, row: u32) {
        let odd = Colour::Odd as usize;
        let [at, next] = [fine.starts[row as usize], fine.starts[row as usize + 1]];
        for s in &fine.segments[odd][at.segment[odd] as usize..next.segment[odd] as usize] {
            let (i, j) = (s.i / 2, (row - 1) / 2);
            let low = line_of(coarse, i, j, s.len);
            let high = line_of(coarse, i, j + 1, s.len);
            if let (Some(low), Some(high)) = (low, high) {
                self.prolongation.segments.push(ProlongSegment {
                    fine: s.start,
                    len: s.len,
                    low,
                    high,
                });
            } else {
                for k in 0..s.len {
                    self.prolong_single(fine, coarse, [s.i + 2 * k, row], ARM_DOWN);
                }
            }
        }
        for w in &fine.wall[odd][at.wall[odd] as usize..next.wall[odd] as usize] {
            self.prolong_single(fine, coarse, [w.i, row], ARM_DOWN);
        }
    }

    /// One odd fine node from its coarse neighbours along `arm` and the opposite arm.
    fn prolong_single(&mut self, fine: &Mask, coarse: &Mask, at: [u32; 2], arm: usize) {
        let Some((colour, node)) = fine.node_at(at[0], at[1]) else {
            return;
        };
        let wall = fine.wall_node_in_row(colour, node, at[1]);
        for direction in [arm, opposite(arm)] {
            let weight = wall.map_or(0.5, |wall| share(wall, direction));
            let end = match direction {
                ARM_LEFT => [at[0].wrapping_sub(1), at[1]],
                ARM_RIGHT => [at[0] + 1, at[1]],
                ARM_DOWN => [at[0], at[1].wrapping_sub(1)],
                _ => [at[0], at[1] + 1],
            };
            if weight > 0.0
                && let Some(coarse_node) = coarse.natural_at(end[0] / 2, end[1] / 2)
            {
                self.prolongation.entries.push(Entry {
                    coarse: coarse_node,
                    fine: node,
                    weight,
                });
            }
        }
    }
}

/// Coarse nodes with a wall node among their nine fine ones, row by row.
fn near_wall(fine: &Mask, coarse: &Mask) -> Vec<bool> {
    let mut near_wall = vec![false; coarse.nodes()];
    for w in fine.wall.iter().flatten() {
        for j in around(w.j) {
            for i in around(w.i) {
                if let Some(node) = coarse.natural_at(i, j) {
                    near_wall[node as usize] = true;
                }
            }
        }
    }
    near_wall
}

/// Coarse indices whose three fine indices include `fine`.
fn around(fine: u32) -> std::ops::RangeInclusive<u32> {
    fine / 2..=fine.div_ceil(2)
}

/// The segment of `len` coarse nodes from `(i, j)` if all fine rows involved are contiguous.
fn restrict_segment(fine: &Mask, coarse: u32, i: u32, j: u32, len: u32) -> Option<RestrictSegment> {
    let rows = [2 * j, (2 * j).checked_sub(1)?, 2 * j + 1];
    let left = (2 * i).checked_sub(1)?;
    let mut node = [0; 3];
    for ((index, row), from) in node.iter_mut().zip(rows).zip([2 * i, left, left]) {
        let run = fine.run_at(from, row)?;
        if 2 * (i + len - 1) + u32::from(row != 2 * j) >= run.end() {
            return None;
        }
        *index = run.node(from).1;
    }
    Some(RestrictSegment {
        coarse,
        len,
        centre: node[0],
        down_left: node[1],
        up_left: node[2],
    })
}

/// Row-by-row index of `len` neighbouring nodes from `(i, j)`, `None` if they are not all in one run.
fn line_of(mask: &Mask, i: u32, j: u32, len: u32) -> Option<u32> {
    let run = mask.run_at(i, j)?;
    (i + len <= run.end()).then_some(run.natural + i - run.first)
}

/// Weight of the neighbour along `direction` in the value linear along that line.
fn line_weight(mask: &Mask, at: [u32; 2], direction: usize) -> f64 {
    let Some((colour, node)) = mask.node_at(at[0], at[1]) else {
        return 0.0;
    };
    let wall = mask.wall_node_in_row(colour, node, at[1]);
    wall.map_or(0.5, |wall| share(wall, direction))
}

/// The same at a wall node.
fn share(wall: &WallNode, direction: usize) -> f64 {
    if wall.neighbour[direction] == NO_NODE {
        return 0.0;
    }
    let away = wall.arm[opposite(direction)];
    away / (wall.arm[direction] + away)
}
