//! What one grid says: conductance, moments of the velocity, and the peak. Lattice units.
//!
//! The conductance is taken from the energy, `K` = integral of `abs(grad phi)^2`, summed along the lattice
//! lines: a link of length `a` between values `p` and `q` adds `(p - q)^2 / a`. Lines end exactly at the
//! wall, so nothing has to be known of cut areas and thin walls between fluid nodes need no special care.
//! Along a slanted wall the sum over lines is the trapezoidal rule for a smooth function; the plain sum of
//! `phi` would have a kink there and an error that jumps as the grid moves.

use crate::grid::{Colour, Mask, NO_NODE, WallNode};
use crate::solve::{Field, weights};

/// Integrals over the section from one grid, in units of the lattice spacing.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub(crate) struct GridIntegrals {
    /// Integral of `abs(grad phi)^2`, spacing^4.
    pub(crate) conductance: f64,
    /// Integral of `phi`, spacing^4, by plain summation.
    pub(crate) sum: f64,
    /// Integral of `phi^2`, spacing^6.
    pub(crate) square: f64,
    /// Integral of `phi^3`, spacing^8.
    pub(crate) cube: f64,
}

impl GridIntegrals {
    pub(crate) fn new(mask: &Mask, phi: &Field) -> Self {
        let size = f64::from(mask.stride);
        let mut total = Self {
            conductance: links(mask, phi) + cut_arms(mask, phi),
            ..Self::default()
        };
        let cell = size * size;
        for values in &phi.colour {
            // Row-sized pieces keep the rounding of long sums small.
            for piece in values.chunks(1024) {
                let (mut first, mut second, mut third) = (0.0, 0.0, 0.0);
                for &v in piece {
                    first += v;
                    second += v * v;
                    third += v * v * v;
                }
                total.sum += first * cell;
                total.square += second * cell;
                total.cube += third * cell;
            }
        }
        total
    }
}

/// Energy of the whole links: every link joins an even node to an odd one. With it, twice the sum of `phi`
/// times the residual, which is what the energy lacks where the iteration was stopped early.
///
/// For `A e = r` the energy of `phi + e` exceeds that of `phi` by twice the sum of `e`, but for its square; the sum of
/// `e` is `phi . r`, because `phi` is the response to a uniform source. So the error of `K` goes with the square
/// of what the iteration left. Only even nodes have a residual: a sweep over the odd ones came last.
fn links(mask: &Mask, phi: &Field) -> f64 {
    let [even, odd] = &phi.colour;
    let source = f64::from(mask.stride).powi(2);
    let mut total = 0.0;
    for s in &mask.segments[Colour::Even as usize] {
        let n = s.len as usize;
        let centre = &even[s.start as usize..][..n];
        let row = &odd[s.left as usize..][..=n];
        let (west, east) = (&row[..n], &row[1..][..n]);
        let below = &odd[s.down as usize..][..n];
        let above = &odd[s.up as usize..][..n];
        let (mut sum, mut missed) = (0.0, 0.0);
        for k in 0..n {
            let c = centre[k];
            let (w, e, d, u) = (c - west[k], c - east[k], c - below[k], c - above[k]);
            sum += (w * w + e * e) + (d * d + u * u);
            missed += c * (source - ((w + e) + (d + u)));
        }
        total += sum + 2.0 * missed;
    }
    for w in &mask.wall[Colour::Even as usize] {
        let value = even[w.node as usize];
        let (weight, diagonal) = weights(w);
        let mut residual = source - diagonal * value;
        for (&n, weight) in w.neighbour.iter().zip(weight) {
            if n != NO_NODE {
                let neighbour = odd[n as usize];
                residual += weight * neighbour;
                total += (value - neighbour).powi(2);
            }
        }
        let stands_for = 0.25 * (w.arm[0] + w.arm[1]) * (w.arm[2] + w.arm[3]);
        total += 2.0 * value * residual * stands_for;
    }
    total
}

/// Energy of the cut arms of both colours.
///
/// A link of length `a` on which `phi` is quadratic carries `a^3 phi''^2 / 12` more energy than its end
/// values show. Whole links all miss the same share, which extrapolation removes; a cut arm must miss the
/// share of its length too, so the difference `(a - a^3) phi''^2 / 12` is taken off.
fn cut_arms(mask: &Mask, phi: &Field) -> f64 {
    let mut total = 0.0;
    for colour in [Colour::Even, Colour::Odd] {
        let other = &phi.colour[colour.other() as usize];
        for w in &mask.wall[colour as usize] {
            let value = phi.colour[colour as usize][w.node as usize];
            let curvature = second_differences(w, value, other);
            for (arm, &n) in w.neighbour.iter().enumerate() {
                if n == NO_NODE {
                    let a = w.arm[arm];
                    let missed = (a - a.powi(3)) / 12.0 * curvature[arm / 2].powi(2);
                    total += value * value / a - missed;
                }
            }
            let own = &phi.colour[colour as usize];
            total -= truncation(w, value, curvature, own, other);
        }
    }
    total
}

/// What the truncation error of the unequal arms of one wall node adds to the energy.
///
/// With arms `a` and `b` the second difference is off by `t = (b - a) phi''' / 3`, one order worse than
/// elsewhere and different at every node. A source `t` adds `2 t phi` times the length `(a + b) / 2` that
/// the node stands for, because `phi` is also the response of the conductance to a source.
fn truncation(w: &WallNode, value: f64, curvature: [f64; 2], own: &[f64], other: &[f64]) -> f64 {
    let at = |values: &[f64], node: u32| values.get(node as usize).copied();
    let mut sum = 0.0;
    for low in [0, 2] {
        // The long way: from the wall through this node to the two behind it.
        let inward = if w.neighbour[low] == NO_NODE {
            low + 1
        } else {
            low
        };
        let outward = inward ^ 1;
        let (Some(next), Some(beyond)) =
            (at(other, w.neighbour[inward]), at(own, w.beyond[inward]))
        else {
            continue;
        };
        if w.neighbour[outward] != NO_NODE {
            continue;
        }
        let a = w.arm[outward];
        let behind = value + beyond - 2.0 * next;
        // Second differences stand for the places (1 - a)/3 and 1 along the way.
        let third = (behind - curvature[low / 2]) / (1.0 - (1.0 - a) / 3.0);
        sum += (1.0 - a * a) / 3.0 * third * value;
    }
    sum
}

/// Second differences of `phi` along x and y at a wall node, from its unequal arms.
pub(crate) fn second_differences(w: &WallNode, value: f64, other: &[f64]) -> [f64; 2] {
    let at = |arm: usize| other.get(w.neighbour[arm] as usize).copied().unwrap_or(0.0);
    [0, 2].map(|low| {
        let (a, b) = (w.arm[low], w.arm[low + 1]);
        2.0 * (at(low) / (a * (a + b)) + at(low + 1) / (b * (a + b)) - value / (a * b))
    })
}
