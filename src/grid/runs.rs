//! Rows of fluid nodes from the crossings of the lattice rows, and nodes that lie on the wall.

use super::crossings::{LineCrossings, rounded_down, rounded_up};
use super::lattice::Lattice;
use super::mask::{ARM_LEFT, ARM_RIGHT, Colour, ON_WALL, Run};

/// An arm cut by the wall, before grouping by node.
#[derive(Debug, Clone, Copy)]
pub(super) struct Cut {
    pub(super) run: u32,
    pub(super) i: u32,
    pub(super) direction: u8,
    pub(super) arm: f64,
    pub(super) edge: u32,
}

/// Cuts in order of run, column, direction, arm and edge. They come nearly in order within their runs, so these are
/// counted and the few cuts of each sorted.
pub(super) fn in_order(cuts: &[Cut], runs: usize) -> Vec<Cut> {
    let mut next = vec![0_u32; runs + 1];
    for cut in cuts {
        next[cut.run as usize + 1] += 1;
    }
    for run in 0..runs {
        next[run + 1] += next[run];
    }
    let mut sorted = cuts.to_vec();
    for &cut in cuts {
        let place = &mut next[cut.run as usize];
        sorted[*place as usize] = cut;
        *place += 1;
    }
    for of_run in sorted.chunk_by_mut(|a, b| a.run == b.run) {
        of_run.sort_by(|a, b| {
            let places = (a.i, a.direction).cmp(&(b.i, b.direction));
            let arms = places.then_with(|| a.arm.total_cmp(&b.arm));
            arms.then_with(|| a.edge.cmp(&b.edge))
        });
    }
    sorted
}

/// Nodes that a column crossing puts on the wall, as (row, column, edge).
pub(super) fn nodes_on_wall(columns: &LineCrossings, stride: u32) -> Vec<(u32, u32, u32)> {
    let mut nodes = Vec::new();
    let step = f64::from(stride);
    for line in (0..columns.lines()).step_by(stride as usize) {
        for crossing in columns.line(line) {
            let nearest = rounded_down(crossing.at / step + 0.5);
            if (crossing.at - nearest * step).abs() < ON_WALL {
                nodes.push((nearest as u32, line as u32 / stride, crossing.edge));
            }
        }
    }
    nodes
}

/// Nodes on a vertex of the outline, as (row, column, edge): a corner that juts into the fluid may miss the lines
/// through its node by rounding, on both sides, and yet lie on it.
pub(super) fn nodes_at_vertices(lattice: &Lattice, stride: u32) -> Vec<(u32, u32, u32)> {
    let (step, share) = (f64::from(stride), 1.0 / f64::from(stride));
    let near = |v: f64| {
        // Rounds down, since nothing here is far below zero.
        let nearest = (v * share + 0.5) as u32;
        ((v - f64::from(nearest) * step).abs() < ON_WALL).then_some(nearest)
    };
    let vertices = lattice.edges.iter().enumerate();
    vertices
        .filter_map(|(index, edge)| {
            Some((near(edge.start[1])?, near(edge.start[0])?, index as u32))
        })
        .collect()
}

/// For each island that no line of this grid crosses, the node nearest to it.
pub(super) fn pins(
    lattice: &Lattice,
    rows: &LineCrossings,
    columns: &LineCrossings,
    stride: u32,
) -> Vec<(u32, u32)> {
    if !lattice.is_island.iter().any(|&island| island) {
        return Vec::new();
    }
    let mut seen = vec![false; lattice.is_island.len()];
    for crossings in [rows, columns] {
        for line in (0..crossings.lines()).step_by(stride as usize) {
            for crossing in crossings.line(line) {
                seen[lattice.edges[crossing.edge as usize].loop_index as usize] = true;
            }
        }
    }
    let step = f64::from(stride);
    (0..seen.len())
        .filter(|&index| lattice.is_island[index] && !seen[index])
        .map(|index| {
            let at = lattice.edges[lattice.loop_starts[index]].start;
            ((at[0] / step).round() as u32, (at[1] / step).round() as u32)
        })
        .collect()
}

/// Runs of every row with the cuts at their ends.
pub(super) fn collect_runs(
    rows: &LineCrossings,
    stride: u32,
    removed: &[(u32, u32, u32)],
    cuts: &mut Vec<Cut>,
) -> (Vec<Run>, Vec<u32>) {
    let scale = 1.0 / f64::from(stride);
    let margin = ON_WALL * scale;
    let lines = rows.lines() / stride as usize + 1;
    let (mut runs, mut row_start) = (Vec::with_capacity(lines), Vec::with_capacity(lines + 1));
    row_start.push(0);
    let mut next_removed = 0;
    for (j, line) in (0..rows.lines()).step_by(stride as usize).enumerate() {
        let from = next_removed + removed[next_removed..].partition_point(|r| (r.0 as usize) < j);
        next_removed = from + removed[from..].partition_point(|r| r.0 as usize == j);
        let gone = &removed[from..next_removed];
        for [left, right] in rows.line(line).as_chunks().0 {
            let first = rounded_up(left.at * scale + margin).max(0.0);
            let last = rounded_down(right.at * scale - margin);
            if last < first {
                continue;
            }
            let (first, end) = (first as u32, last as u32 + 1);
            let arms = [f64::from(first) - left.at * scale, right.at * scale - last];
            let skip = gone.partition_point(|r| r.1 < first);
            let inside = gone[skip..].iter().take_while(|r| r.1 < end);
            let mut start = (first, arms[0], left.edge);
            for &(_, i, edge) in inside {
                push_run(&mut runs, cuts, j as u32, start, (i, 1.0, edge));
                start = (i + 1, 1.0, edge);
            }
            push_run(&mut runs, cuts, j as u32, start, (end, arms[1], right.edge));
        }
        row_start.push(runs.len() as u32);
    }
    (runs, row_start)
}

/// Adds the run from `start.0` to before `end.0`; each end carries its arm length and edge.
fn push_run(
    runs: &mut Vec<Run>,
    cuts: &mut Vec<Cut>,
    row: u32,
    start: (u32, f64, u32),
    end: (u32, f64, u32),
) {
    if start.0 >= end.0 {
        return;
    }
    for (i, direction, arm, edge) in [
        (start.0, ARM_LEFT, start.1, start.2),
        (end.0 - 1, ARM_RIGHT, end.1, end.2),
    ] {
        cuts.push(Cut {
            run: runs.len() as u32,
            i,
            direction: direction as u8,
            arm,
            edge,
        });
    }
    runs.push(Run {
        first: start.0,
        len: end.0 - start.0,
        row,
        base: [0; 2],
        natural: 0,
    });
}

/// Gives every node its storage index; returns the number of nodes of each colour.
pub(super) fn number(runs: &mut [Run]) -> [usize; 2] {
    let mut next = [0_u32; 2];
    for run in runs.iter_mut() {
        run.base = next;
        run.natural = next[0] + next[1];
        let first = Colour::of(run.first, run.row) as usize;
        next[first] += run.len.div_ceil(2);
        next[1 - first] += run.len / 2;
    }
    [next[0] as usize, next[1] as usize]
}
