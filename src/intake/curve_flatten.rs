//! Curves of a drawing as chords within a stated error.
//!
//! A curve `P(t)` over a parameter step `s` strays from its chord by at most `max abs(P'') s^2 / 8`. The
//! number of chords follows from the bound of `P''`: 2 `abs(P0 - 2 P1 + P2)` for a quadratic, 6 times the
//! larger second difference for a cubic, the larger semi-axis for an arc.

use super::limits::MAX_VERTICES;
use super::read_error::ReadProblem;
use super::svg_path::{Arc, Piece, SubPath};
use super::svg_transform::Transform;
use crate::geometry::Point;

/// Chord error as a fraction of the larger side of the drawing's bounding box.
pub(crate) const RELATIVE_CHORD_ERROR: f64 = 1e-7;

impl SubPath {
    /// The same path moved by a transform.
    pub(crate) fn transformed(&self, t: Transform) -> Self {
        let pieces = self.pieces.iter().map(|piece| match *piece {
            Piece::Line(p) => Piece::Line(t.point(p)),
            Piece::Quadratic(c, p) => Piece::Quadratic(t.point(c), t.point(p)),
            Piece::Cubic(c, d, p) => Piece::Cubic(t.point(c), t.point(d), t.point(p)),
            Piece::Arc(arc, p) => Piece::Arc(
                Arc {
                    centre: t.point(arc.centre),
                    u: t.vector(arc.u),
                    v: t.vector(arc.v),
                    ..arc
                },
                t.point(p),
            ),
        });
        Self {
            start: t.point(self.start),
            pieces: pieces.collect(),
        }
    }

    /// Points whose bounding box holds the path.
    pub(crate) fn hull(&self) -> Vec<Point> {
        let mut points = vec![self.start];
        for piece in &self.pieces {
            match *piece {
                Piece::Line(p) => points.push(p),
                Piece::Quadratic(c, p) => points.extend([c, p]),
                Piece::Cubic(c, d, p) => points.extend([c, d, p]),
                Piece::Arc(arc, p) => {
                    let reach = [arc.u[0].hypot(arc.v[0]), arc.u[1].hypot(arc.v[1])];
                    let [x, y] = arc.centre;
                    points.extend([
                        p,
                        [x - reach[0], y - reach[1]],
                        [x + reach[0], y + reach[1]],
                    ]);
                }
            }
        }
        points
    }

    /// Vertices of the path with chords within `chord_error`, at most the vertex limit.
    pub(crate) fn vertices(&self, chord_error: f64) -> Result<Vec<Point>, ReadProblem> {
        let mut points = vec![self.start];
        let mut from = self.start;
        for piece in &self.pieces {
            let count = chords(piece, from, chord_error);
            if points.len() + count > MAX_VERTICES {
                return Err(ReadProblem::TooManyVertices {
                    limit: MAX_VERTICES,
                });
            }
            for step in 1..count {
                points.push(piece.at(from, step as f64 / count as f64));
            }
            from = piece.end();
            points.push(from);
        }
        points.dedup();
        Ok(points)
    }
}

/// Chords needed for a piece.
fn chords(piece: &Piece, from: Point, chord_error: f64) -> usize {
    let bend =
        |a: Point, b: Point, c: Point| (a[0] - 2.0 * b[0] + c[0]).hypot(a[1] - 2.0 * b[1] + c[1]);
    let second_derivative = match *piece {
        Piece::Line(_) => 0.0,
        Piece::Quadratic(c, p) => 2.0 * bend(from, c, p),
        Piece::Cubic(c, d, p) => 6.0 * bend(from, c, d).max(bend(c, d, p)),
        Piece::Arc(arc, _) => arc.larger_axis() * arc.sweep * arc.sweep,
    };
    let count = (second_derivative / (8.0 * chord_error)).sqrt().ceil();
    if count.is_finite() {
        (count as usize).max(1)
    } else {
        1
    }
}

impl Piece {
    fn end(&self) -> Point {
        match *self {
            Self::Line(p) | Self::Quadratic(_, p) | Self::Cubic(_, _, p) | Self::Arc(_, p) => p,
        }
    }

    /// The point at a fraction of the piece.
    fn at(&self, from: Point, t: f64) -> Point {
        let s = 1.0 - t;
        let mix = |weights: [f64; 4], points: [Point; 4]| {
            let sum = |axis: usize| weights.iter().zip(points).map(|(w, p)| w * p[axis]).sum();
            [sum(0), sum(1)]
        };
        match *self {
            Self::Line(p) => mix([s, t, 0.0, 0.0], [from, p, p, p]),
            Self::Quadratic(c, p) => mix([s * s, 2.0 * s * t, t * t, 0.0], [from, c, p, p]),
            Self::Cubic(c, d, p) => mix(
                [s * s * s, 3.0 * s * s * t, 3.0 * s * t * t, t * t * t],
                [from, c, d, p],
            ),
            Self::Arc(arc, _) => arc.at(arc.start + t * arc.sweep),
        }
    }
}

impl Arc {
    fn at(&self, angle: f64) -> Point {
        let (sin, cos) = angle.sin_cos();
        [
            self.centre[0] + cos * self.u[0] + sin * self.v[0],
            self.centre[1] + cos * self.u[1] + sin * self.v[1],
        ]
    }

    /// Larger semi-axis: the larger singular value of the matrix with columns `u` and `v`.
    fn larger_axis(&self) -> f64 {
        let (u, v) = (self.u, self.v);
        let square = u[0] * u[0] + u[1] * u[1] + v[0] * v[0] + v[1] * v[1];
        let area = u[0] * v[1] - u[1] * v[0];
        let root = (square * square - 4.0 * area * area).max(0.0).sqrt();
        f64::midpoint(square, root).sqrt()
    }
}

#[cfg(test)]
mod tests {
    use crate::intake::svg_path::parse;

    #[test]
    fn chords_stay_within_the_error_and_are_not_too_many() {
        let circle = &parse("M1 0A1 1 0 0 1 -1 0A1 1 0 0 1 1 0Z").unwrap()[0];
        for error in [1e-3, 1e-5, 1e-7] {
            let points = circle.vertices(error).unwrap();
            let worst = points
                .windows(2)
                .map(|pair| {
                    let middle = [
                        f64::midpoint(pair[0][0], pair[1][0]),
                        f64::midpoint(pair[0][1], pair[1][1]),
                    ];
                    1.0 - middle[0].hypot(middle[1])
                })
                .fold(0.0, f64::max);
            assert!(
                worst <= error * 1.001 && worst > 0.5 * error,
                "{worst} {error}"
            );
        }
    }

    #[test]
    fn a_parabola_keeps_its_area() {
        // Area between the parabola y = x (1 - x) times 2 and its chord: computed by hand, 1/3.
        let path = &parse("M0 0Q0.5 1 1 0Z").unwrap()[0];
        let wall = crate::geometry::Loop::new(path.vertices(1e-7).unwrap());
        assert!((wall.signed_area().abs() - 1.0 / 3.0).abs() < 1e-7);
        let cubic = &parse("M0 0C0.33333333333333333 0.66666666666666667 0.66666666666666667 0.66666666666666667 1 0Z").unwrap()[0];
        let wall = crate::geometry::Loop::new(cubic.vertices(1e-7).unwrap());
        assert!((wall.signed_area().abs() - 1.0 / 3.0).abs() < 1e-7);
    }
}
