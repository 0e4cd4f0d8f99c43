//! The direction of the groove: where parallel cuts agree best.
//!
//! The start is the structure tensor, the mean outer product of the gradients (J. Bigun and G. H. Granlund,
//! Proc. 1st Int. Conf. Computer Vision (1987) 433-438, from memory): its weaker axis runs along the groove,
//! and uncorrelated noise adds to both axes alike. A scan of all directions on a coarse map makes sure that
//! the start is not a lesser optimum. The direction that leaves the least variance unexplained by one
//! repeated profile is then found on finer and finer maps, and last the places of the profile in stripes
//! along the groove are put on a straight line: its slope corrects the direction, the scatter around it
//! gives the uncertainty, and its curvature tells a curved groove.

use std::f64::consts::{FRAC_PI_2, PI};

use super::groove_profile::{FittedProfile, StripeShift, fit_profile};
use super::map_blocks::{HeightPoint, MapBlocks};

/// Blocks each way of the scan, of the first search, and of the last one.
const SCAN_BLOCKS: usize = 96;
const SEARCH_BLOCKS: usize = 256;
/// Step of the scan, rad.
const SCAN_STEP: f64 = PI / 180.0;
/// Distance of knots against that of blocks. Two blocks a piece keep the fit from favouring directions
/// along the rows of the map.
const KNOT_BLOCKS: f64 = 2.0;
/// Stripes along the groove.
const STRIPES: usize = 16;
/// Corrections by the stripes; they settle within three.
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
    let search = Search::new(blocks);
    let mut angle = search.refine(angle, 0.1 * SCAN_STEP, 0.005 * SCAN_STEP);
    let mut line = StripeLine::default();
    for _ in 0..CORRECTIONS {
        let profile = search.profile(angle);
        line = StripeLine::through(&profile.shifts(&search.points, STRIPES));
        // A correction beyond the search's own range would mean that the stripes show no groove.
        angle += line.slope.clamp(-SCAN_STEP, SCAN_STEP);
    }
    GrooveDirection {
        angle: normalised(angle),
        uncertainty: line.slope_uncertainty,
        tensor_angle: normalised(tensor_angle),
        coherence,
        along,
        across,
        turn: line.turn,
        turn_uncertainty: line.turn_uncertainty,
    }
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

/// The line, and the parabola, through the places of the profile in stripes.
#[derive(Debug, Clone, Copy, Default)]
struct StripeLine {
    slope: f64,
    slope_uncertainty: f64,
    turn: f64,
    turn_uncertainty: f64,
}

impl StripeLine {
    /// Weighted least squares; the uncertainties are from the scatter around the parabola.
    fn through(shifts: &[StripeShift]) -> Self {
        let weight: f64 = shifts.iter().map(|s| s.weight).sum();
        let mean = |of: &dyn Fn(&StripeShift) -> f64| {
            shifts.iter().map(|s| s.weight * of(s)).sum::<f64>() / weight
        };
        let centre = mean(&|s| s.along);
        let second = mean(&|s| (s.along - centre).powi(2));
        let third = mean(&|s| (s.along - centre).powi(3));
        // Polynomials of degree one and two that are orthogonal under the weights.
        let linear = |s: &StripeShift| s.along - centre;
        let square = |s: &StripeShift| {
            let t = s.along - centre;
            t * t - third / second * t - second
        };
        let square_norm = mean(&|s| square(s).powi(2));
        if shifts.len() < 5 || second <= 0.0 || square_norm <= 0.0 || !weight.is_finite() {
            // Too few stripes for a scatter: nothing is known of the direction from them.
            return Self {
                slope_uncertainty: FRAC_PI_2,
                turn_uncertainty: FRAC_PI_2,
                ..Self::default()
            };
        }
        let offset = mean(&|s| s.shift);
        let slope = mean(&|s| s.shift * linear(s)) / second;
        let bend = mean(&|s| s.shift * square(s)) / square_norm;
        let residual = |s: &StripeShift| s.shift - offset - slope * linear(s) - bend * square(s);
        let scatter = mean(&|s| residual(s).powi(2));
        let count = shifts.len() as f64;
        let variance = scatter / (count - 3.0);
        let ends = [shifts.first(), shifts.last()].map(|s| s.map_or(0.0, |s| s.along));
        let length = ends[1] - ends[0];
        Self {
            slope: slope.atan(),
            slope_uncertainty: (variance / second).sqrt(),
            turn: (2.0 * bend * length).atan(),
            turn_uncertainty: 2.0 * length * (variance / square_norm).sqrt(),
        }
    }
}
