//! The closed outline of a section: lumens, each with one outer loop and any number of islands.
//!
//! Coordinates are in metres, `x` to the right, `y` upwards. A loop is stored open: the closing vertex
//! is not repeated. Integrals over a loop are exact for the polygon (Green's theorem) and are taken
//! about its first vertex, so that an outline far from the origin loses no digits.

/// A point or vector in the section plane, `[x, y]` in metres.
pub type Point = [f64; 2];

/// One closed polygon; the edge from the last vertex to the first is implied.
#[derive(Debug, Clone, PartialEq)]
pub struct Loop {
    /// Vertices in order, metres, the closing vertex not repeated.
    pub points: Vec<Point>,
}

/// One connected flow passage: an outer loop and the islands (posts) inside it.
#[derive(Debug, Clone, PartialEq)]
pub struct Lumen {
    /// The outer wall.
    pub outer: Loop,
    /// Solid islands inside the outer wall.
    pub islands: Vec<Loop>,
}

/// A whole section: one or more lumens.
#[derive(Debug, Clone, PartialEq)]
pub struct Outline {
    /// The lumens, in input order.
    pub lumens: Vec<Lumen>,
}

/// Distance of two points, m.
#[expect(
    clippy::imprecise_flops,
    reason = "five times as fast, and squares of lengths in metres neither overflow nor vanish"
)]
pub(crate) fn distance(a: Point, b: Point) -> f64 {
    let (x, y) = (b[0] - a[0], b[1] - a[1]);
    (x * x + y * y).sqrt()
}

impl Loop {
    /// A loop from vertices; a repeated closing vertex is dropped.
    pub fn new(mut points: Vec<Point>) -> Self {
        while points.len() > 1 && points.first() == points.last() {
            points.pop();
        }
        Self { points }
    }

    /// Edges as pairs of end points, in order, the closing edge last.
    pub fn edges(&self) -> impl Iterator<Item = (Point, Point)> + '_ {
        let closing = self.points.last().zip(self.points.first());
        let pairs = self.points.array_windows();
        let open = pairs.map(|&[a, b]| (a, b));
        open.chain(closing.map(|(&a, &b)| (a, b)))
    }

    /// Area with sign: positive when the loop turns anticlockwise, m^2.
    pub fn signed_area(&self) -> f64 {
        let Some(&o) = self.points.first() else {
            return 0.0;
        };
        let from = |p: Point| [p[0] - o[0], p[1] - o[1]];
        self.edges().fold(0.0, |area, (a, b)| {
            let (a, b) = (from(a), from(b));
            area + 0.5 * (a[0] * b[1] - b[0] * a[1])
        })
    }

    /// Length of the loop, m.
    pub fn length(&self) -> f64 {
        self.edges().map(|(a, b)| distance(a, b)).sum()
    }

    /// Signed area and signed first moments about the first vertex.
    fn signed_area_and_moments(&self) -> (f64, [f64; 2]) {
        let Some(&o) = self.points.first() else {
            return (0.0, [0.0; 2]);
        };
        let (mut area, mut moment) = (0.0, [0.0; 2]);
        for (a, b) in self.edges() {
            let (ax, ay) = (a[0] - o[0], a[1] - o[1]);
            let (bx, by) = (b[0] - o[0], b[1] - o[1]);
            let cross = ax * by - bx * ay;
            area += 0.5 * cross;
            moment[0] += (ax + bx) * cross / 6.0;
            moment[1] += (ay + by) * cross / 6.0;
        }
        (area, moment)
    }

    /// The loop with its direction of travel reversed, same first vertex.
    pub(super) fn reversed(mut self) -> Self {
        if let Some(rest) = self.points.get_mut(1..) {
            rest.reverse();
        }
        self
    }
}

impl Outline {
    /// A section of one lumen without islands.
    pub fn single(points: Vec<Point>) -> Self {
        Self {
            lumens: vec![Lumen {
                outer: Loop::new(points),
                islands: Vec::new(),
            }],
        }
        .oriented()
    }

    /// The same section with outer loops anticlockwise and islands clockwise.
    #[must_use]
    pub fn oriented(mut self) -> Self {
        for lumen in &mut self.lumens {
            let outer = std::mem::replace(&mut lumen.outer, Loop { points: Vec::new() });
            lumen.outer = if outer.signed_area() < 0.0 {
                outer.reversed()
            } else {
                outer
            };
            for island in &mut lumen.islands {
                let taken = std::mem::replace(island, Loop { points: Vec::new() });
                *island = if taken.signed_area() > 0.0 {
                    taken.reversed()
                } else {
                    taken
                };
            }
        }
        self
    }

    /// All loops: each lumen's outer loop, then its islands.
    pub fn loops(&self) -> impl Iterator<Item = &Loop> {
        self.lumens
            .iter()
            .flat_map(|lumen| std::iter::once(&lumen.outer).chain(&lumen.islands))
    }

    /// Flow area, m^2, exact for the polygon.
    pub fn area(&self) -> f64 {
        self.lumens
            .iter()
            .map(|lumen| {
                let islands: f64 = lumen.islands.iter().map(|i| i.signed_area().abs()).sum();
                lumen.outer.signed_area().abs() - islands
            })
            .sum()
    }

    /// Length of all walls, m.
    pub fn wetted_perimeter(&self) -> f64 {
        self.loops().map(Loop::length).sum()
    }

    /// Lower left and upper right corner of the bounding box, m; `None` without vertices.
    pub fn bounds(&self) -> Option<(Point, Point)> {
        let &first = self.loops().find_map(|wall| wall.points.first())?;
        let (mut low, mut high) = (first, first);
        for p in self.loops().flat_map(|wall| &wall.points) {
            for axis in 0..2 {
                low[axis] = low[axis].min(p[axis]);
                high[axis] = high[axis].max(p[axis]);
            }
        }
        Some((low, high))
    }

    /// Centroid of the flow area, m.
    pub fn centroid(&self) -> Point {
        let (mut area, mut moment) = (0.0, [0.0; 2]);
        let reference = self.bounds().map_or([0.0; 2], |(low, _)| low);
        for (wall, sign) in self.signed_loops() {
            let Some(&o) = wall.points.first() else {
                continue;
            };
            let (a, m) = wall.signed_area_and_moments();
            let flip = sign * a.signum();
            area += flip * a;
            moment[0] += flip * (m[0] + a * (o[0] - reference[0]));
            moment[1] += flip * (m[1] + a * (o[1] - reference[1]));
        }
        [
            reference[0] + moment[0] / area,
            reference[1] + moment[1] / area,
        ]
    }

    /// Polar second moment of area about the centroid, m^4, exact for the polygon.
    pub fn polar_moment(&self) -> f64 {
        let c = self.centroid();
        let mut total = 0.0;
        for (wall, sign) in self.signed_loops() {
            let mut sum = 0.0;
            for (a, b) in wall.edges() {
                let (ax, ay) = (a[0] - c[0], a[1] - c[1]);
                let (bx, by) = (b[0] - c[0], b[1] - c[1]);
                let cross = ax * by - bx * ay;
                let square = ax * ax + ax * bx + bx * bx + ay * ay + ay * by + by * by;
                sum += cross * square / 12.0;
            }
            total += sign * sum * wall.signed_area().signum();
        }
        total
    }

    /// Loops with +1 for an outer loop and -1 for an island.
    fn signed_loops(&self) -> impl Iterator<Item = (&Loop, f64)> {
        self.lumens.iter().flat_map(|lumen| {
            std::iter::once((&lumen.outer, 1.0)).chain(lumen.islands.iter().map(|i| (i, -1.0)))
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_square_with_a_square_island_has_exact_integrals() {
        let square = |c: f64, r: f64| {
            Loop::new(vec![
                [c - r, c - r],
                [c - r, c + r],
                [c + r, c + r],
                [c + r, c - r],
                [c - r, c - r],
            ])
        };
        let outline = Outline {
            lumens: vec![Lumen {
                outer: square(5.0, 2.0),
                islands: vec![square(5.0, 1.0)],
            }],
        }
        .oriented();
        assert_eq!(outline.lumens[0].outer.points.len(), 4);
        assert!(outline.lumens[0].outer.signed_area() > 0.0);
        assert!(outline.lumens[0].islands[0].signed_area() < 0.0);
        assert!((outline.area() - 12.0).abs() < 1e-12);
        assert!((outline.wetted_perimeter() - 24.0).abs() < 1e-12);
        assert!((outline.centroid()[0] - 5.0).abs() < 1e-12);
        let exact = (4.0_f64.powi(4) - 2.0_f64.powi(4)) / 6.0;
        assert!((outline.polar_moment() - exact).abs() < 1e-10);
    }
}
