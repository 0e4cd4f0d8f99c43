//! Connected regions of one tone.
//!
//! Pixels are connected through their sides, not their corners; contours part the fluid at saddles in the same
//! way. Rows are taken as runs, and runs that overlap in neighbouring rows are joined (union by the smaller
//! label with path halving), so that time and memory go with the number of runs.

use super::grey::Grey;
use super::options::Tone;

/// Most runs that are held: a picture with more is noise.
const MOST_RUNS: usize = 40_000_000;

/// Pixels that count as fluid: darker, or brighter, than a level in counts.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Level {
    pub(super) tone: Tone,
    pub(super) counts: f64,
}

impl Level {
    /// Whether a count is on the fluid's side.
    pub(super) fn is_fluid(self, count: u16) -> bool {
        match self.tone {
            Tone::Dark => f64::from(count) < self.counts,
            Tone::Bright => f64::from(count) > self.counts,
        }
    }
}

#[derive(Debug, Clone, Copy)]
struct Run {
    from: u32,
    to: u32,
    label: u32,
}

/// A region as found, pixels of the part used.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Blob {
    pub(super) label: u32,
    pub(super) pixels: u64,
    /// First and last column and row.
    pub(super) low: [u32; 2],
    pub(super) high: [u32; 2],
    /// Sums of the pixel centres.
    sums: [f64; 2],
    pub(super) touches_border: bool,
}

impl Blob {
    /// Its centroid.
    pub(super) fn centre(&self) -> [f64; 2] {
        self.sums.map(|sum| sum / self.pixels.max(1) as f64)
    }
}

/// All regions of one tone.
#[derive(Debug)]
pub(super) struct Regions {
    width: usize,
    runs: Vec<Run>,
    /// First run of each row, and the number of runs.
    starts: Vec<usize>,
    /// The regions, the largest first.
    pub(super) blobs: Vec<Blob>,
}

/// The picture has too many runs to be looked at.
#[derive(Debug)]
pub(super) struct TooManyRuns;

fn root(parents: &mut [u32], mut label: u32) -> u32 {
    loop {
        let parent = parents.get(label as usize).copied().unwrap_or(label);
        if parent == label {
            return label;
        }
        let above = parents.get(parent as usize).copied().unwrap_or(parent);
        if let Some(slot) = parents.get_mut(label as usize) {
            *slot = above;
        }
        label = above;
    }
}

fn join(parents: &mut [u32], a: u32, b: u32) {
    let (a, b) = (root(parents, a), root(parents, b));
    let (low, high) = (a.min(b), a.max(b));
    if let Some(slot) = parents.get_mut(high as usize) {
        *slot = low;
    }
}

impl Regions {
    /// Finds the regions of a level.
    pub(super) fn find(grey: &Grey, level: Level) -> Result<Self, TooManyRuns> {
        let mut runs: Vec<Run> = Vec::new();
        let mut starts = vec![0];
        let mut parents: Vec<u32> = Vec::new();
        let mut above = 0..0;
        for y in 0..grey.height {
            let first = runs.len();
            push_runs(grey.row(y), level, &mut runs);
            if runs.len() > MOST_RUNS {
                return Err(TooManyRuns);
            }
            let mut over = above.clone();
            for index in first..runs.len() {
                let label = index as u32;
                parents.push(label);
                let Some(&run) = runs.get(index) else {
                    continue;
                };
                // The run above that ends last may overlap the next run as well.
                while let Some(&upper) = runs.get(over.start).filter(|_| !over.is_empty()) {
                    if upper.from < run.to && run.from < upper.to {
                        join(&mut parents, label, over.start as u32);
                    }
                    if upper.to > run.to {
                        break;
                    }
                    over.start += 1;
                }
            }
            above = first..runs.len();
            starts.push(runs.len());
        }
        for (index, run) in runs.iter_mut().enumerate() {
            run.label = root(&mut parents, index as u32);
        }
        let blobs = blobs(&runs, &starts, [grey.width as u32, grey.height as u32]);
        Ok(Self {
            width: grey.width,
            runs,
            starts,
            blobs,
        })
    }

    /// Label of the region with a pixel.
    pub(super) fn label_at(&self, x: usize, y: usize) -> Option<u32> {
        let range = self.starts.get(y).copied()?..self.starts.get(y + 1).copied()?;
        let row = self.runs.get(range)?;
        let next = row.partition_point(|run| run.from as usize <= x);
        let run = row.get(next.checked_sub(1)?)?;
        (x < run.to as usize).then_some(run.label)
    }

    /// The region with a label.
    pub(super) fn blob(&self, label: u32) -> Option<&Blob> {
        self.blobs.iter().find(|blob| blob.label == label)
    }

    /// One for each pixel of a region, zero for all others, row by row.
    pub(super) fn mask(&self, label: u32) -> Vec<u8> {
        let mut mask = vec![0_u8; self.width * self.starts.len().saturating_sub(1)];
        for (row, range) in mask
            .chunks_mut(self.width.max(1))
            .zip(self.starts.windows(2))
        {
            let &[first, last] = range else { continue };
            for run in self.runs.get(first..last).unwrap_or_default() {
                if run.label == label
                    && let Some(part) = row.get_mut(run.from as usize..run.to as usize)
                {
                    part.fill(1);
                }
            }
        }
        mask
    }

    /// The middle of the longest run of a region: a pixel well inside it.
    pub(super) fn inner_pixel(&self, label: u32) -> Option<(usize, usize)> {
        let mut best: Option<(u32, usize, usize)> = None;
        for (y, range) in self.starts.windows(2).enumerate() {
            let &[first, last] = range else { continue };
            for run in self.runs.get(first..last).unwrap_or_default() {
                let length = run.to - run.from;
                if run.label == label && best.is_none_or(|(longest, ..)| length > longest) {
                    best = Some((length, (run.from + length / 2) as usize, y));
                }
            }
        }
        best.map(|(_, x, y)| (x, y))
    }
}

/// Appends the runs of a row.
fn push_runs(row: &[u16], level: Level, runs: &mut Vec<Run>) {
    let mut from = None;
    for (x, &count) in row.iter().enumerate() {
        match (level.is_fluid(count), from) {
            (true, None) => from = Some(x as u32),
            (false, Some(start)) => {
                runs.push(Run {
                    from: start,
                    to: x as u32,
                    label: 0,
                });
                from = None;
            }
            _ => {}
        }
    }
    if let Some(start) = from {
        runs.push(Run {
            from: start,
            to: row.len() as u32,
            label: 0,
        });
    }
}

/// Sums the runs of each label, the largest region first.
fn blobs(runs: &[Run], starts: &[usize], size: [u32; 2]) -> Vec<Blob> {
    let mut slots: Vec<u32> = vec![u32::MAX; runs.len()];
    let mut blobs: Vec<Blob> = Vec::new();
    for (y, range) in starts.windows(2).enumerate() {
        let &[first, last] = range else { continue };
        let y = y as u32;
        for run in runs.get(first..last).unwrap_or_default() {
            let Some(slot) = slots.get_mut(run.label as usize) else {
                continue;
            };
            if *slot == u32::MAX {
                *slot = blobs.len() as u32;
                blobs.push(Blob {
                    label: run.label,
                    pixels: 0,
                    low: [run.from, y],
                    high: [run.to - 1, y],
                    sums: [0.0; 2],
                    touches_border: false,
                });
            }
            let Some(blob) = blobs.get_mut(*slot as usize) else {
                continue;
            };
            let length = f64::from(run.to - run.from);
            blob.pixels += u64::from(run.to - run.from);
            blob.low[0] = blob.low[0].min(run.from);
            blob.high[0] = blob.high[0].max(run.to - 1);
            blob.high[1] = y;
            blob.sums[0] += length * f64::midpoint(f64::from(run.from), f64::from(run.to));
            blob.sums[1] += length * (f64::from(y) + 0.5);
            blob.touches_border |= run.from == 0 || run.to == size[0] || y == 0 || y + 1 == size[1];
        }
    }
    blobs.sort_by_key(|blob| (std::cmp::Reverse(blob.pixels), blob.label));
    blobs
}

#[cfg(test)]
mod tests {
    use super::*;

    fn picture(rows: &[&str]) -> Grey {
        Grey {
            width: rows[0].len(),
            height: rows.len(),
            values: rows
                .iter()
                .flat_map(|row| row.bytes().map(|b| if b == b'#' { 10 } else { 200 }))
                .collect(),
            offset: 0.0,
            unit: 1.0,
            full_scale: [0.0, 255.0],
            step: 1.0,
        }
    }

    const DARK: Level = Level {
        tone: Tone::Dark,
        counts: 100.0,
    };

    #[test]
    fn regions_are_joined_through_sides_only() {
        let grey = picture(&[
            "..........", //
            ".#.#.###..",
            ".#.#...#..",
            ".###.#.#..",
            "....#..#.#",
            "...###.#..",
            "..........",
        ]);
        let regions = Regions::find(&grey, DARK).unwrap();
        let sizes: Vec<u64> = regions.blobs.iter().map(|b| b.pixels).collect();
        assert_eq!(sizes, [7, 7, 4, 1, 1]);
        let touching = regions.blobs.iter().filter(|b| b.touches_border).count();
        assert_eq!(touching, 1);
        let label = regions.label_at(1, 1).unwrap();
        assert_eq!(regions.label_at(3, 1), Some(label));
        assert_ne!(regions.label_at(4, 4), Some(label));
        assert_eq!(regions.label_at(2, 1), None);
        assert_eq!(regions.label_at(99, 1), None);
        assert_eq!(regions.label_at(1, 99), None);
        let mask = regions.mask(label);
        assert_eq!(mask.iter().map(|&m| u64::from(m)).sum::<u64>(), 7);
        let (x, y) = regions.inner_pixel(label).unwrap();
        assert_eq!((x, y), (2, 3));
        let blob = regions.blob(label).unwrap();
        assert_eq!((blob.low, blob.high), ([1, 1], [3, 3]));
        assert!((blob.centre()[0] - 2.5).abs() < 1e-12);
    }

    #[test]
    fn a_comb_is_one_region_whichever_way_up() {
        let rows = ["#.#.#.#.#", "#.#.#.#.#", "#########"];
        let turned: Vec<&str> = rows.iter().rev().copied().collect();
        for rows in [rows.to_vec(), turned] {
            assert_eq!(Regions::find(&picture(&rows), DARK).unwrap().blobs.len(), 1);
        }
    }
}
