//! The highest point of the lower envelope of a few linear functions over a square.
//!
//! A linear programme in three unknowns (offset and height); with at most four functions it is solved by
//! trying every corner of the feasible body. Any length unit.

use super::outline::Point;

/// A linear function over a cell: `value + slope . offset from its centre`.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Piece {
    /// Value at the centre of the cell.
    pub(crate) value: f64,
    /// Slope along `x` and `y`.
    pub(crate) slope: Point,
}

/// The largest value of the lowest of the pieces over the cell, and where: a linear programme in three
/// unknowns, solved by trying every corner of the feasible body.
pub(crate) fn highest(pieces: &[Piece], half: f64) -> (f64, Point) {
    let lowest = |p: Point| {
        let values = pieces
            .iter()
            .map(|f| f.value + f.slope[0] * p[0] + f.slope[1] * p[1]);
        values.fold(f64::INFINITY, f64::min)
    };
    let mut best = (f64::NEG_INFINITY, [0.0; 2]);
    let mut try_point = |p: Point| {
        if p[0].abs() <= half && p[1].abs() <= half {
            let value = lowest(p);
            if value > best.0 {
                best = (value, p);
            }
        }
    };
    for (x, y) in [(-half, -half), (half, -half), (-half, half), (half, half)] {
        try_point([x, y]);
    }
    for (i, f) in pieces.iter().enumerate() {
        for (j, g) in pieces.iter().enumerate().skip(i + 1) {
            // On the line v + a x + b y = 0 both are equal.
            let line = difference(f, g);
            for side in [-half, half] {
                try_point([side, -(line.value + line.slope[0] * side) / line.slope[1]]);
                try_point([-(line.value + line.slope[1] * side) / line.slope[0], side]);
            }
            for k in &pieces[j + 1..] {
                let second = difference(f, k);
                let ([a, b], [c, d]) = (line.slope, second.slope);
                let determinant = a * d - b * c;
                try_point([
                    (b * second.value - d * line.value) / determinant,
                    (c * line.value - a * second.value) / determinant,
                ]);
            }
        }
    }
    best
}

fn difference(f: &Piece, g: &Piece) -> Piece {
    Piece {
        value: f.value - g.value,
        slope: [f.slope[0] - g.slope[0], f.slope[1] - g.slope[1]],
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    proptest! {
        #[test]
        fn no_point_of_the_square_is_higher(
            list in proptest::collection::vec((0.0..1.0_f64, -1.0..1.0_f64, -1.0..1.0_f64), 1..5),
            half in 0.1..2.0_f64,
            samples in proptest::collection::vec((-1.0..1.0_f64, -1.0..1.0_f64), 100),
        ) {
            let pieces: Vec<Piece> =
                list.iter().map(|&(value, x, y)| Piece { value, slope: [x, y] }).collect();
            let lowest = |p: Point| {
                let values = pieces.iter().map(|f| f.value + f.slope[0] * p[0] + f.slope[1] * p[1]);
                values.fold(f64::INFINITY, f64::min)
            };
            let (height, at) = highest(&pieces, half);
            prop_assert!((lowest(at) - height).abs() < 1e-14);
            for (x, y) in samples {
                prop_assert!(lowest([half * x, half * y]) <= height + 1e-12);
            }
        }
    }

    #[test]
    fn two_opposite_walls_are_highest_half_way() {
        let up = Piece {
            value: 1.0,
            slope: [0.6, 0.8],
        };
        let down = Piece {
            value: 2.0,
            slope: [-0.6, -0.8],
        };
        assert!((highest(&[up, down], 3.0).0 - 1.5).abs() < 1e-15);
    }
}
