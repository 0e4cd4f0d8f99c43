//! Which of two stations lies inside the other, proven.

use crate::geometry::{Outline, Point};

/// Share by which the smaller section is shrunk about its centroid where the proof fails by rounding, or by the chords of
/// round walls that two sections have in common, alone.
///
/// Its proven low value then counts times `(1 - SHRINKING)^4`, which is exact.
pub const SHRINKING: f64 = 1e-6;

/// One section lies inside another.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Nested {
    /// Factor on the proven low conductance of the smaller: 1, or that of the slightly shrunk section.
    pub factor: f64,
    /// By how much the smaller was shifted within its plane to lie inside, m.
    pub shift: Point,
}

/// Proves that `small` lies inside `large`: as given, slightly shrunk, or shifted within its plane as well.
///
/// `K(small) >= K(shrunk) = (1 - s)^4 K(small)`, and a section around the shrunk one has at least as much; a shift
/// changes no conductance. Shifts tried: lids level and centroids above each other; centroids on each other.
///
/// # Errors
/// Why `small` is not inside `large`, in words with the place, as given.
pub fn nested(small: &Outline, large: &Outline) -> Result<Nested, String> {
    let Err(escape) = small.proven_inside(large) else {
        return Ok(Nested {
            factor: 1.0,
            shift: [0.0; 2],
        });
    };
    let ([x, y], [to_x, to_y]) = (small.centroid(), large.centroid());
    let top = |outline: &Outline| outline.bounds().map_or(0.0, |(_, high)| high[1]);
    let level = [to_x - x, top(large) - top(small)];
    let centred = [to_x - x, to_y - y];
    let shrunk = small.clone().shifted([-x, -y]).scaled(1.0 - SHRINKING);
    for shift in [[0.0; 2], level, centred] {
        // Shifts round by 1e-16 of the coordinates; SHRINKING is far above that.
        let moved = shrunk.clone().shifted([x + shift[0], y + shift[1]]);
        if moved.proven_inside(large).is_ok() {
            return Ok(Nested {
                factor: (1.0 - 2.0 * SHRINKING).powi(4),
                shift,
            });
        }
    }
    Err(escape.to_string())
}

#[cfg(test)]
mod tests {
    use super::*;

    fn groove(depth: f64) -> Outline {
        let text = format!("koh_groove opening=100um depth={depth:?}um");
        let spec: crate::geometry::NominalSpec = text.parse().unwrap();
        spec.outline().unwrap()
    }

    #[test]
    fn sections_with_slanted_walls_in_common_are_nested() {
        for k in 1..=20 {
            let (small, large) = (groove(20.0 + f64::from(k)), groove(41.3));
            assert!(nested(&small, &large).is_ok(), "{k}");
            assert!(nested(&large, &small).is_err(), "{k}");
        }
    }

    #[test]
    fn a_section_drawn_elsewhere_is_shifted_into_its_neighbour() {
        let away = groove(20.0).shifted([1e-3, 2e-3]);
        let found = nested(&away, &groove(30.0)).unwrap();
        assert!((found.shift[0] + 1e-3).abs() < 1e-9 && found.factor < 1.0);
        let same = nested(&groove(20.0), &groove(20.0)).unwrap();
        assert!((same.factor - 1.0).abs() < 1e-15);
    }

    #[test]
    fn round_walls_in_common_with_chords_of_their_own_do_not_matter() {
        let outline = |text: &str| {
            let spec: crate::geometry::NominalSpec = text.parse().unwrap();
            spec.outline().unwrap()
        };
        let annulus = outline("annulus outer_diameter=100um inner_diameter=40um");
        let circle = outline("circle diameter=100um");
        assert!(nested(&annulus, &circle).is_ok());
        assert!(nested(&circle, &annulus).is_err());
    }
}
