//! The velocity of the lower bound on a whole square: bilinear in its corners, with one bubble on each side.
//!
//! `v = a (1-x)(1-y) + b x (1-y) + c x y + d (1-x) y + 4 x (1-x) (S (1-y) + N y) + 4 y (1-y) (W (1-x) + E x)`:
//! on a side a parabola through its two corners and its middle, so that squares with a common side agree
//! there. All integrals are exact.

/// A square: corner values anticlockwise from the lower left, bubbles south, east, north, west.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Square {
    pub(super) corners: [f64; 4],
    pub(super) bubbles: [f64; 4],
}

impl Square {
    /// Integral of `v`.
    pub(super) fn volume(&self) -> f64 {
        let [a, b, c, d] = self.corners;
        let [south, east, north, west] = self.bubbles;
        ((a + c) + (b + d)) * 0.25 + ((south + north) + (east + west)) * (1.0 / 3.0)
    }

    /// Integral of `abs(grad v)^2`.
    pub(super) fn energy(&self) -> f64 {
        let [a, b, c, d] = self.corners;
        let [south, east, north, west] = self.bubbles;
        let part = |low: f64, high: f64, tilt: f64, p: f64, q: f64| {
            (low * low + low * high + high * high) * (1.0 / 3.0)
                + 2.0 / 3.0 * tilt * (low + high)
                + 8.0 / 15.0 * tilt * tilt
                + 16.0 / 9.0 * (p * p + p * q + q * q)
        };
        part(b - a, c - d, east - west, south, north)
            + part(d - a, c - b, north - south, west, east)
    }

    /// Half the derivative of the energy with respect to one corner value.
    pub(super) fn half_slope(&self, corner: usize) -> f64 {
        let v = |k: usize| self.corners[(corner + k) % 4];
        let [south, east, north, west] = self.bubbles;
        let along_x = if corner == 1 || corner == 2 {
            1.0
        } else {
            -1.0
        };
        let along_y = if corner >= 2 { 1.0 } else { -1.0 };
        2.0 / 3.0 * v(0) - (v(1) + v(3)) / 6.0 - v(2) / 3.0
            + (along_x * (east - west) + along_y * (north - south)) / 3.0
    }
}

/// Half the second derivative of the energy with respect to one corner value.
pub(super) const STIFFNESS: f64 = 2.0 / 3.0;
/// Half the second derivatives of the energy with respect to two corner values.
pub(super) const COUPLINGS: [[f64; 4]; 4] = {
    const BESIDE: f64 = -1.0 / 6.0;
    const ACROSS: f64 = -1.0 / 3.0;
    [
        [STIFFNESS, BESIDE, ACROSS, BESIDE],
        [BESIDE, STIFFNESS, BESIDE, ACROSS],
        [ACROSS, BESIDE, STIFFNESS, BESIDE],
        [BESIDE, ACROSS, BESIDE, STIFFNESS],
    ]
};

#[cfg(test)]
mod tests {
    use super::*;

    const SQUARE: Square = Square {
        corners: [0.3, -0.7, 1.1, 0.4],
        bubbles: [0.2, -0.1, 0.05, 0.3],
    };

    fn value(s: &Square, x: f64, y: f64) -> f64 {
        let [a, b, c, d] = s.corners;
        let [south, east, north, west] = s.bubbles;
        a * (1.0 - x) * (1.0 - y)
            + b * x * (1.0 - y)
            + c * x * y
            + d * (1.0 - x) * y
            + 4.0 * x * (1.0 - x) * (south * (1.0 - y) + north * y)
            + 4.0 * y * (1.0 - y) * (west * (1.0 - x) + east * x)
    }

    #[test]
    fn the_integrals_agree_with_fine_sums() {
        let (n, e) = (400, 1e-5);
        let (mut volume, mut energy) = (0.0, 0.0);
        for i in 0..n {
            for j in 0..n {
                let x = (f64::from(i) + 0.5) / f64::from(n);
                let y = (f64::from(j) + 0.5) / f64::from(n);
                let dx = (value(&SQUARE, x + e, y) - value(&SQUARE, x - e, y)) / (2.0 * e);
                let dy = (value(&SQUARE, x, y + e) - value(&SQUARE, x, y - e)) / (2.0 * e);
                volume += value(&SQUARE, x, y);
                energy += dx * dx + dy * dy;
            }
        }
        let cells = f64::from(n * n);
        assert!((volume / cells - SQUARE.volume()).abs() < 1e-5);
        assert!((energy / cells - SQUARE.energy()).abs() < 1e-4);
    }

    #[test]
    fn the_slopes_are_those_of_the_energy() {
        for corner in 0..4 {
            let mut moved = SQUARE;
            moved.corners[corner] += 0.5;
            let change = moved.energy() - SQUARE.energy();
            let foreseen = SQUARE.half_slope(corner) + 0.25 * STIFFNESS;
            assert!((change - foreseen).abs() < 1e-12, "{corner}");
        }
    }

    #[test]
    fn the_couplings_are_the_changes_of_the_slopes() {
        for (corner, row) in COUPLINGS.iter().enumerate() {
            for (other, coupling) in row.iter().enumerate() {
                let mut moved = SQUARE;
                moved.corners[other] += 0.5;
                let change = moved.half_slope(corner) - SQUARE.half_slope(corner);
                assert!((change - 0.5 * coupling).abs() < 1e-12, "{corner} {other}");
            }
        }
    }
}
