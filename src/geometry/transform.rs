//! Moving a section: shift, rotation, scaling, mirror images.
//!
//! Metres and radians, `x` to the right, `y` upwards. Every result is oriented again: outer loops
//! anticlockwise, islands clockwise. Coordinates are rounded once an operation.

use super::outline::{Outline, Point};

impl Outline {
    /// The section moved by `offset`, m.
    #[must_use]
    pub fn shifted(self, offset: Point) -> Self {
        self.map_points(|p| [p[0] + offset[0], p[1] + offset[1]])
    }

    /// The section turned anticlockwise by `angle`, rad, about `centre`, m.
    #[must_use]
    pub fn rotated(self, angle: f64, centre: Point) -> Self {
        let (sine, cosine) = angle.sin_cos();
        self.map_points(|p| {
            let (x, y) = (p[0] - centre[0], p[1] - centre[1]);
            [
                centre[0] + cosine * x - sine * y,
                centre[1] + sine * x + cosine * y,
            ]
        })
    }

    /// The section with every coordinate times `factor`, about the origin.
    ///
    /// - `factor`: above zero; conductance goes with its fourth power. Zero or a value that is not
    ///   finite leaves no section, which [`Outline::problems`] says of the result.
    ///
    /// # Examples
    /// ```
    /// use etchwise::geometry::Outline;
    /// let square = Outline::single(vec![[0.0, 0.0], [1.0, 0.0], [1.0, 1.0], [0.0, 1.0]]);
    /// assert_eq!(square.scaled(3.0).area(), 9.0);
    /// ```
    #[must_use]
    pub fn scaled(self, factor: f64) -> Self {
        self.map_points(|p| [factor * p[0], factor * p[1]])
    }

    /// The mirror image about the vertical line through `axis_x`, m: left becomes right.
    #[must_use]
    pub fn mirrored_left_right(self, axis_x: f64) -> Self {
        self.map_points(|p| [axis_x + (axis_x - p[0]), p[1]])
    }

    /// The mirror image about the horizontal line through `axis_y`, m: top becomes bottom.
    #[must_use]
    pub fn mirrored_top_bottom(self, axis_y: f64) -> Self {
        self.map_points(|p| [p[0], axis_y + (axis_y - p[1])])
    }

    /// The section with every vertex moved by `change`, oriented again.
    fn map_points(mut self, change: impl Fn(Point) -> Point) -> Self {
        for lumen in &mut self.lumens {
            for wall in std::iter::once(&mut lumen.outer).chain(&mut lumen.islands) {
                for point in &mut wall.points {
                    *point = change(*point);
                }
            }
        }
        self.oriented()
    }
}

#[cfg(test)]
mod tests {
    use super::super::outline::{Loop, Lumen};
    use super::*;

    fn section() -> Outline {
        let wall = |points: &[Point]| Loop::new(points.to_vec());
        Outline {
            lumens: vec![Lumen {
                outer: wall(&[[0.0, 0.0], [6.0, 0.0], [5.0, 4.0], [0.0, 3.0]]),
                islands: vec![wall(&[[1.0, 1.0], [2.0, 1.0], [1.5, 2.0]])],
            }],
        }
        .oriented()
    }

    fn assert_close(a: Point, b: Point) {
        assert!((a[0] - b[0]).hypot(a[1] - b[1]) < 1e-14, "{a:?} {b:?}");
    }

    #[test]
    fn centroid_area_and_orientation_follow_each_transform() {
        let c = section().centroid();
        let cases = [
            (
                section().shifted([2.0, -7.0]),
                [c[0] + 2.0, c[1] - 7.0],
                1.0,
            ),
            (
                section().rotated(std::f64::consts::FRAC_PI_2, [1.0, 1.0]),
                [2.0 - c[1], c[0]],
                1.0,
            ),
            (section().scaled(0.5), [0.5 * c[0], 0.5 * c[1]], 0.25),
            (section().mirrored_left_right(4.0), [8.0 - c[0], c[1]], 1.0),
            (
                section().mirrored_top_bottom(-1.0),
                [c[0], -2.0 - c[1]],
                1.0,
            ),
        ];
        for (moved, centroid, area) in cases {
            assert_close(moved.centroid(), centroid);
            assert!((moved.area() - area * section().area()).abs() < 1e-13);
            assert!(moved.lumens[0].outer.signed_area() > 0.0);
            assert!(moved.lumens[0].islands[0].signed_area() < 0.0);
        }
    }

    #[test]
    fn a_rotation_turns_anticlockwise_about_its_centre() {
        let turned = section().rotated(std::f64::consts::FRAC_PI_2, [6.0, 0.0]);
        assert_close(turned.lumens[0].outer.points[0], [6.0, -6.0]);
        assert_close(turned.lumens[0].outer.points[1], [6.0, 0.0]);
    }

    #[test]
    fn two_mirror_images_give_the_section_back() {
        let twice = section().mirrored_left_right(2.0).mirrored_left_right(2.0);
        assert_eq!(twice, section());
    }
}
