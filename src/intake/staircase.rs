//! Notices outlines that follow pixel edges, whose perimeter is not that of the wall.

use crate::geometry::Outline;
use crate::warning::{Code, Warning};

/// Loops shorter than this may well be drawn with square corners.
const FEWEST_VERTICES: usize = 64;

/// The warning for an outline with a long loop made of horizontal and vertical edges only.
pub(crate) fn warning(outline: &Outline, is_nominal: bool) -> Option<Warning> {
    let stairs = |wall: &&crate::geometry::Loop| {
        wall.points.len() >= FEWEST_VERTICES
            && wall
                .edges()
                .all(|(a, b)| a[0].to_bits() == b[0].to_bits() || a[1].to_bits() == b[1].to_bits())
    };
    let wall = outline.loops().find(stairs).filter(|_| !is_nominal)?;
    let count = wall.points.len();
    Some(Warning {
        code: Code::PerimeterSampling,
        message: format!(
            "a loop of {count} vertices has only horizontal and vertical edges, like the edges of \
             pixels: its perimeter can be up to 27 % longer than the wall's on slopes"
        ),
        advice: "trace the wall below the pixel size, or rely on values on the square root of the \
                 area"
            .to_owned(),
        numbers: vec![("vertices", count as f64)],
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn only_long_staircases_are_noticed() {
        let stairs = |steps: u32| {
            let mut points = vec![[0.0, 0.0], [f64::from(steps), 0.0]];
            for i in 0..steps {
                let (x, y) = (f64::from(steps - i), f64::from(i + 1));
                points.extend([[x, y], [x - 1.0, y]]);
            }
            points.remove(1);
            Outline::single(points)
        };
        let mut long = stairs(40);
        long.lumens[0].outer.points.insert(1, [40.0, 0.0]);
        assert!(warning(&long, false).is_some());
        assert!(warning(&long, true).is_none());
        let short = Outline::single(vec![[0.0, 0.0], [1.0, 0.0], [1.0, 1.0], [0.0, 1.0]]);
        assert!(warning(&short, false).is_none());
    }
}
