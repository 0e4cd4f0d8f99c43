//! Affine transforms of an SVG drawing: the `transform` attribute.

use super::svg_path::Scanner;
use crate::geometry::Point;

/// `x' = a x + c y + e`, `y' = b x + d y + f`, as in the SVG recommendation.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Transform([f64; 6]);

impl Transform {
    /// Leaves everything where it is.
    pub(crate) const IDENTITY: Self = Self([1.0, 0.0, 0.0, 1.0, 0.0, 0.0]);

    /// A point moved by the transform.
    pub(crate) fn point(self, p: Point) -> Point {
        let [_, _, _, _, e, f] = self.0;
        let v = self.vector(p);
        [v[0] + e, v[1] + f]
    }

    /// A direction turned and stretched by the transform.
    pub(crate) fn vector(self, p: Point) -> Point {
        let [a, b, c, d, _, _] = self.0;
        [a * p[0] + c * p[1], b * p[0] + d * p[1]]
    }

    /// First `inner`, then this transform.
    pub(crate) fn after(self, inner: Self) -> Self {
        let [a, b, c, d, e, f] = inner.0;
        let (x, y) = (self.vector([a, b]), self.vector([c, d]));
        let origin = self.point([e, f]);
        Self([x[0], x[1], y[0], y[1], origin[0], origin[1]])
    }

    /// Reads a `transform` attribute; an error is the byte offset where reading stopped.
    pub(crate) fn parse(text: &str) -> Result<Self, usize> {
        let mut scanner = Scanner::new(text);
        let mut total = Self::IDENTITY;
        loop {
            scanner.skip_separators();
            if scanner.is_done() {
                return Ok(total);
            }
            let start = scanner.offset();
            let name = scanner.word();
            scanner.skip_separators();
            if !scanner.take(b'(') {
                return Err(scanner.offset());
            }
            let mut values = Vec::new();
            loop {
                scanner.skip_separators();
                if scanner.take(b')') {
                    break;
                }
                values.push(scanner.number().ok_or(scanner.offset())?);
            }
            total = total.after(Self::named(name, &values).ok_or(start)?);
        }
    }

    fn named(name: &str, values: &[f64]) -> Option<Self> {
        let rotation = |degrees: f64| {
            let (sin, cos) = degrees.to_radians().sin_cos();
            Self([cos, sin, -sin, cos, 0.0, 0.0])
        };
        let shift = |x: f64, y: f64| Self([1.0, 0.0, 0.0, 1.0, x, y]);
        Some(match (name, values) {
            ("matrix", &[a, b, c, d, e, f]) => Self([a, b, c, d, e, f]),
            ("translate", &[x]) => shift(x, 0.0),
            ("translate", &[x, y]) => shift(x, y),
            ("scale", &[s]) => Self([s, 0.0, 0.0, s, 0.0, 0.0]),
            ("scale", &[x, y]) => Self([x, 0.0, 0.0, y, 0.0, 0.0]),
            ("rotate", &[angle]) => rotation(angle),
            ("rotate", &[angle, x, y]) => shift(x, y).after(rotation(angle)).after(shift(-x, -y)),
            ("skewX", &[angle]) => Self([1.0, 0.0, angle.to_radians().tan(), 1.0, 0.0, 0.0]),
            ("skewY", &[angle]) => Self([1.0, angle.to_radians().tan(), 0.0, 1.0, 0.0, 0.0]),
            _ => return None,
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn transforms_apply_from_the_right() {
        let near = |a: Point, b: Point| (a[0] - b[0]).hypot(a[1] - b[1]) < 1e-12;
        let t = Transform::parse("translate(10,20) scale(2 3), rotate(90)").unwrap();
        assert!(near(t.point([1.0, 0.0]), [10.0, 23.0]));
        let t = Transform::parse("rotate(180 5 5)").unwrap();
        assert!(near(t.point([0.0, 0.0]), [10.0, 10.0]));
        let t = Transform::parse("matrix(1 2 3 4 5 6)").unwrap();
        assert!(near(t.point([1.0, 1.0]), [9.0, 12.0]));
        assert_eq!(Transform::parse("  "), Ok(Transform::IDENTITY));
        for bad in [
            "scale(",
            "scale()",
            "turn(3)",
            "scale 3",
            "translate(1 2 3)",
            "scale(x)",
        ] {
            assert!(Transform::parse(bad).is_err(), "{bad}");
        }
    }
}
