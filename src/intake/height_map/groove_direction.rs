//! The direction of the groove: where parallel cuts agree best.
//!
//! The start is the structure tensor, the mean outer product of the gradients (J. Bigun and G. H. Granlund,
//! Proc. 1st Int. Conf. Computer Vision (1987) 433-438, from memory): its weaker axis runs along the groove,
//! and uncorrelated noise adds to both axes alike. A scan of all directions on a coarse map makes sure that
//! the start is not a lesser optimum. The direction that leaves the least variance unexplained by one
//! repeated profile is then found on finer and finer maps, and last corrected by least squares on the slopes
//! of the profile, which also gives the uncertainty. The two halves of the map tell a curved groove.
//! An edge narrower than the distance of points has no place between them, so that a direction within a
//! point over the length of the map of its rows or columns can be off by as much, unseen by the
//! uncertainty.

use std::f64::consts::{FRAC_PI_2, PI};

use super::groove_profile::{FittedProfile, fit_profile};
use super::map_blocks::{HeightPoint, MapBlocks};

/// Blocks each way of the scan, of the first search, and of the last one.
const SCAN_BLOCKS: usize = 96;
const SEARCH_BLOCKS: usize = 256;
/// Step of the scan, rad.
const SCAN_STEP: f64 = PI / 180.0;
/// Distance of knots against that of blocks. Two blocks a piece keep the fit from favouring directions
/// along the rows of the map.
const KNOT_BLOCKS: f64 = 2.0;
/// Corrections by the slopes of the profile; they settle within three.
const CORRECTIONS: usize = 4;

/// The direction of a groove.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct GrooveDirection {
    /// Against the x axis, anticlockwise, above -pi/2 to pi/2, rad.
    pub(super) angle: f64,
    /// Standard uncertainty from the scatter of the stripes, rad.
    pub(super) uncertainty: f64,
    /// Direction by the structure tensor, rad, and how far its axes differ (0 to 1).
    pub(super) tensor_angle: f64,
    pub(super) coherence: f64,
    /// Part of the variance explained by parallel cuts along the groove, and across it.
    pub(super) along: f64,
    pub(super) across: f64,
    /// Change of direction from one end of the map to the other, rad, and its standard uncertainty.
    pub(super) turn: f64,
    pub(super) turn_uncertainty: f64,
}

/// Finds the direction on a map with its plane taken off.
pub(super) fn find_direction(blocks: &MapBlocks) -> GrooveDirection {
    let coarse = blocks.coarser(SCAN_BLOCKS);
    let middle = blocks.coarser(SEARCH_BLOCKS);
    let tensors = [structure_tensor(&coarse), structure_tensor(&middle)];
    let (tensor_angle, coherence) = if tensors[0].1 >= tensors[1].1 {
        tensors[0]
    } else {
        tensors[1]
    };
    let search = Search::new(&coarse);
    let scanned = (0..180).map(|degree| f64::from(degree) * SCAN_STEP);
    let start = scanned
        .chain([tensor_angle])
        .map(|angle| (search.unexplained(angle), angle))
        .min_by(|a, b| a.0.total_cmp(&b.0))
        .map_or(tensor_angle, |(_, angle)| angle);
    let start = search.refine(start, 1.5 * SCAN_STEP, 0.05 * SCAN_STEP);
    let search = Search::new(&middle);
    let angle = search.refine(start, 0.5 * SCAN_STEP, 0.01 * SCAN_STEP);
    let along = 1.0 - search.unexplained(angle);
    let across = 1.0 - search.unexplained(angle + FRAC_PI_2);
    let (turn, turn_uncertainty) = turn(&search, angle);
    let search = Search::new(blocks);
    let angle = search.refine(angle, 0.1 * SCAN_STEP, 0.005 * SCAN_STEP);
    let (angle, scatter) = search.corrected(angle);
    GrooveDirection {
        angle: normalised(angle),
        // The two halves differ by some four times the uncertainty of the whole where only noise parts
        // them: each has half the length and half the points.
        uncertainty: scatter.max(0.125 * turn.abs()),
        tensor_angle: normalised(tensor_angle),
        coherence,
        along,
        across,
        turn,
        turn_uncertainty,
    }
}

/// Change of direction from end to end: twice that between the two halves of the map.
fn turn(search: &Search, angle: f64) -> (f64, f64) {
    let (sine, cosine) = angle.sin_cos();
    let place = |p: &HeightPoint| cosine * p[0] + sine * p[1];
    let mut points = search.points.clone();
    let middle = points.len() / 2;
    points.select_nth_unstable_by(middle, |a, b| place(a).total_cmp(&place(b)));
    let later = points.split_off(middle);
    let halves = [points, later].map(|points| {
        let half = Search {
            points,
            knot: search.knot,
        };
        let angle = half.refine(angle, 5.0 * SCAN_STEP, 0.02 * SCAN_STEP);
        half.corrected(angle)
    });
    let [(first, first_scatter), (second, second_scatter)] = halves;
    (
        2.0 * normalised(second - first),
        2.0 * first_scatter.hypot(second_scatter),
    )
}

/// An angle of a line between -pi/2 (not reached) and pi/2.
pub(super) fn normalised(angle: f64) -> f64 {
    let turned = angle.rem_euclid(PI);
    if turned > FRAC_PI_2 {
        turned - PI
    } else {
        turned
    }
}

/// Direction of the weaker axis of the structure tensor, and `(l1 - l2) / (l1 + l2)` of its eigenvalues.
fn structure_tensor(blocks: &MapBlocks) -> (f64, f64) {
    let mut sums = [0.0; 3];
    for row in 1..blocks.size[1].saturating_sub(1) {
        for column in 1..blocks.size[0].saturating_sub(1) {
            let gx = blocks.height(column + 1, row) - blocks.height(column - 1, row);
            let gy = blocks.height(column, row + 1) - blocks.height(column, row - 1);
            let (gx, gy) = (gx / blocks.spacing[0], gy / blocks.spacing[1]);
            if gx.is_finite() && gy.is_finite() {
                sums = [sums[0] + gx * gx, sums[1] + gx * gy, sums[2] + gy * gy];
            }
        }
    }
    let [xx, xy, yy] = sums;
    let difference = (xx - yy).hypot(2.0 * xy);
    // The strong axis lies at half this angle, the groove at a right angle to it.
    let angle = 0.5 * (2.0 * xy).atan2(xx - yy) + FRAC_PI_2;
    let coherence = if xx + yy > 0.0 {
        difference / (xx + yy)
    } else {
        0.0
    };
    (angle, coherence)
}

/// Search for the direction with the least unexplained variance.
struct Search {
    points: Vec<HeightPoint>,
    knot: f64,
}

impl Search {
    fn new(blocks: &MapBlocks) -> Self {
        Self {
            points: blocks.points(),
            knot: KNOT_BLOCKS * blocks.spacing[0].max(blocks.spacing[1]),
        }
    }

    fn profile(&self, angle: f64) -> FittedProfile {
        fit_profile(&self.points, angle, self.knot)
    }

    fn unexplained(&self, angle: f64) -> f64 {
        self.profile(angle).unexplained
    }

    /// A direction corrected by the slopes of the profile, and its standard uncertainty.
    fn corrected(&self, start: f64) -> (f64, f64) {
        let (mut angle, mut scatter) = (start, FRAC_PI_2);
        for _ in 0..CORRECTIONS {
            let Some((turn, uncertainty)) = self.profile(angle).turn(&self.points) else {
                return (start, FRAC_PI_2);
            };
            // A correction beyond a step of the scan means that there is no groove.
            angle += turn.clamp(-SCAN_STEP, SCAN_STEP);
            scatter = uncertainty;
        }
        (angle, scatter)
    }

    /// Golden section search around a start.
    fn refine(&self, start: f64, range: f64, tolerance: f64) -> f64 {
        let golden = 0.5 * (5.0_f64.sqrt() - 1.0);
        let (mut low, mut high) = (start - range, start + range);
        let mut inner = [high - golden * (high - low), low + golden * (high - low)];
        let mut values = inner.map(|angle| self.unexplained(angle));
        while high - low > tolerance {
            if values[0] < values[1] {
                high = inner[1];
                inner = [high - golden * (high - low), inner[0]];
                values = [self.unexplained(inner[0]), values[0]];
            } else {
                low = inner[0];
                inner = [inner[1], low + golden * (high - low)];
                values = [values[1], self.unexplained(inner[1])];
            }
        }
        0.5 * (low + high)
    }
}
