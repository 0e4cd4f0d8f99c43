//! Means of square blocks of points: a height map at a coarser spacing, missing points left out.

use super::surface::HeightMap;

/// Smallest part of a block that must have heights.
const LEAST_FILLED: f64 = 0.5;

/// Heights at block centres; NaN where most of a block is missing.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct MapBlocks {
    pub(super) size: [usize; 2],
    pub(super) spacing: [f64; 2],
    /// Centre of the first block.
    pub(super) origin: [f64; 2],
    pub(super) heights: Vec<f64>,
}

/// A point with its height.
pub(super) type HeightPoint = [f64; 3];

impl MapBlocks {
    /// Blocks of a map, at most `most` each way.
    pub(super) fn of_map(map: &HeightMap, most: usize) -> Self {
        means(map.size, map.spacing, [0.0; 2], &map.heights, most)
    }

    /// Blocks of these blocks, at most `most` each way.
    pub(super) fn coarser(&self, most: usize) -> Self {
        means(self.size, self.spacing, self.origin, &self.heights, most)
    }

    /// Takes a plane `c + bx x + by y` off.
    pub(super) fn take_off(&mut self, plane: [f64; 3]) {
        let columns = self.size[0].max(1);
        for (place, z) in self.heights.iter_mut().enumerate() {
            let x = self.origin[0] + (place % columns) as f64 * self.spacing[0];
            let y = self.origin[1] + (place / columns) as f64 * self.spacing[1];
            *z -= plane[0] + plane[1] * x + plane[2] * y;
        }
    }

    /// Height of a block; NaN outside.
    pub(super) fn height(&self, column: usize, row: usize) -> f64 {
        if column >= self.size[0] {
            return f64::NAN;
        }
        let height = self.heights.get(row * self.size[0] + column);
        height.copied().unwrap_or(f64::NAN)
    }

    /// Blocks with a height, with their centres.
    pub(super) fn points(&self) -> Vec<HeightPoint> {
        let columns = self.size[0].max(1);
        let numbered = self.heights.iter().enumerate();
        numbered
            .filter(|(_, z)| z.is_finite())
            .map(|(place, &z)| {
                let x = self.origin[0] + (place % columns) as f64 * self.spacing[0];
                let y = self.origin[1] + (place / columns) as f64 * self.spacing[1];
                [x, y, z]
            })
            .collect()
    }
}

/// Means of blocks of equal numbers of points each way; the last ones may be smaller, and are left out
/// where they are, since their centres would lie off the grid.
fn means(
    size: [usize; 2],
    spacing: [f64; 2],
    origin: [f64; 2],
    heights: &[f64],
    most: usize,
) -> MapBlocks {
    let side = size[0].max(size[1]).div_ceil(most.max(1)).max(1);
    // A narrow map keeps at least its one row of blocks.
    let sides = size.map(|count| side.min(count.max(1)));
    let blocks = [size[0] / sides[0], size[1] / sides[1]];
    let mut means = Vec::with_capacity(blocks[0].saturating_mul(blocks[1]));
    let mut sums = vec![(0.0, 0_u32); blocks[0]];
    let least = LEAST_FILLED * (sides[0] * sides[1]) as f64;
    let mut rows = heights.chunks_exact(size[0].max(1));
    for _ in 0..blocks[1] {
        sums.fill((0.0, 0));
        for row in rows.by_ref().take(sides[1]) {
            for (sum, part) in sums.iter_mut().zip(row.chunks_exact(sides[0])) {
                for z in part.iter().filter(|z| z.is_finite()) {
                    sum.0 += z;
                    sum.1 += 1;
                }
            }
        }
        means.extend(sums.iter().map(|&(sum, count)| {
            if f64::from(count) >= least && count > 0 {
                sum / f64::from(count)
            } else {
                f64::NAN
            }
        }));
    }
    MapBlocks {
        size: blocks,
        spacing: [0, 1].map(|axis| spacing[axis] * sides[axis] as f64),
        origin: [0, 1].map(|axis| origin[axis] + 0.5 * (sides[axis] - 1) as f64 * spacing[axis]),
        heights: means,
    }
}
