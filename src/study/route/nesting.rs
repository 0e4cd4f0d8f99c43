//! Which of two stations lies inside the other, proven.

use crate::geometry::Outline;

/// Share by which the smaller section is shrunk about its centroid where the proof fails by rounding alone.
///
/// Its proven low value then counts times `(1 - SHRINKING)^4`, which is exact.
pub const SHRINKING: f64 = 1e-7;

/// Factor on the proven low conductance of `small`, given that it lies inside `large`: 1, or that of the slightly
/// shrunk section.
///
/// `K(small) >= K(shrunk) = (1 - s)^4 K(small)`, and a section around the shrunk one has at least as much.
///
/// # Errors
/// Why `small` is not inside `large`, in words with the place.
pub fn nested(small: &Outline, large: &Outline) -> Result<f64, String> {
    let Err(escape) = small.proven_inside(large) else {
        return Ok(1.0);
    };
    let [x, y] = small.centroid();
    let shrunk = small
        .clone()
        .shifted([-x, -y])
        .scaled(1.0 - SHRINKING)
        .shifted([x, y]);
    // The shift back rounds by 1e-16 of the coordinates; SHRINKING is far above that.
    match shrunk.proven_inside(large) {
        Ok(()) => Ok((1.0 - 2.0 * SHRINKING).powi(4)),
        Err(_) => Err(escape.to_string()),
    }
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
}
