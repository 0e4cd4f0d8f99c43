//! Widths of a section: the length of fluid along a horizontal line, exact for the polygon.

use crate::geometry::{Outline, Point};

/// From which side a horizontal line comes close to its height.
///
/// At the height of a vertex or of a flat lid the width jumps; the limit from one side is what is meant by
/// "the width at the top" (from below) and "the width at the bottom" (from above).
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Side {
    /// Limit from smaller `y`.
    Below,
    /// Limit from larger `y`.
    Above,
}

/// The fluid along one horizontal line.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Chord {
    /// Summed length in fluid, m.
    pub(crate) length: f64,
    /// Number of separate pieces longer than nothing.
    pub(crate) pieces: usize,
}

/// The chord at height `y`, as the limit from one side; even-odd over all loops.
pub(crate) fn chord(outline: &Outline, y: f64, side: Side) -> Chord {
    let mut crossings: Vec<f64> = outline
        .loops()
        .flat_map(crate::geometry::Loop::edges)
        .filter_map(|(a, b)| crossing(a, b, y, side))
        .collect();
    crossings.sort_by(f64::total_cmp);
    let lengths = crossings.chunks_exact(2).filter_map(|pair| match pair {
        [left, right] => Some(right - left),
        _ => None,
    });
    lengths.fold(
        Chord {
            length: 0.0,
            pieces: 0,
        },
        |sum, length| Chord {
            length: sum.length + length,
            pieces: sum.pieces + usize::from(length > 0.0),
        },
    )
}

/// Where an edge meets the line, when it does; an edge along the line never does.
fn crossing(a: Point, b: Point, y: f64, side: Side) -> Option<f64> {
    let (low, high) = if a[1] < b[1] { (a, b) } else { (b, a) };
    let meets = match side {
        Side::Below => low[1] < y && y <= high[1],
        Side::Above => low[1] <= y && y < high[1],
    };
    meets.then(|| {
        let share = (y - low[1]) / (high[1] - low[1]);
        low[0] * (1.0 - share) + high[0] * share
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn trapezoid() -> Outline {
        Outline::single(vec![[0.0, 0.0], [2.0, 0.0], [3.0, 1.0], [-1.0, 1.0]])
    }

    #[test]
    fn a_trapezoid_has_exact_widths_at_lid_middle_and_bottom() {
        let outline = trapezoid();
        let length = |y, side| chord(&outline, y, side).length;
        assert!((length(1.0, Side::Below) - 4.0).abs() < 1e-15);
        assert!((length(0.5, Side::Below) - 3.0).abs() < 1e-15);
        assert!((length(0.0, Side::Above) - 2.0).abs() < 1e-15);
        assert!(length(1.0, Side::Above) < 1e-15);
        assert!(length(0.0, Side::Below) < 1e-15);
    }

    #[test]
    fn a_step_in_the_wall_gives_both_widths() {
        let outline = Outline::single(vec![
            [0.0, 0.0],
            [1.0, 0.0],
            [1.0, 1.0],
            [3.0, 1.0],
            [3.0, 2.0],
            [0.0, 2.0],
        ]);
        assert!((chord(&outline, 1.0, Side::Below).length - 1.0).abs() < 1e-15);
        assert!((chord(&outline, 1.0, Side::Above).length - 3.0).abs() < 1e-15);
    }

    #[test]
    fn two_legs_make_two_pieces() {
        let outline = Outline::single(vec![
            [0.0, 0.0],
            [1.0, 0.0],
            [1.0, 1.0],
            [2.0, 1.0],
            [2.0, 0.0],
            [3.0, 0.0],
            [3.0, 2.0],
            [0.0, 2.0],
        ]);
        let low = chord(&outline, 0.5, Side::Below);
        assert_eq!(low.pieces, 2);
        assert!((low.length - 2.0).abs() < 1e-15);
        assert_eq!(chord(&outline, 1.5, Side::Below).pieces, 1);
    }

    #[test]
    fn a_triangle_ends_in_a_point() {
        let outline = Outline::single(vec![[0.0, 0.0], [2.0, 0.0], [1.0, 1.0]]);
        let top = chord(&outline, 1.0, Side::Below);
        assert_eq!(top.pieces, 0);
        assert!(top.length.abs() < 1e-15);
    }
}
