//! A smooth function known at Chebyshev points: its polynomial, and integrals of what is made of it.

/// Panels of the Gauss rule over the whole way.
const PANELS: usize = 24;
/// Abscissae on -1 to 1 and weights of the Gauss-Legendre rule of four points (textbook).
const GAUSS: [(f64, f64); 4] = [
    (-0.861_136_311_594_052_6, 0.347_854_845_137_453_85),
    (-0.339_981_043_584_856_26, 0.652_145_154_862_546_1),
    (0.339_981_043_584_856_26, 0.652_145_154_862_546_1),
    (0.861_136_311_594_052_6, 0.347_854_845_137_453_85),
];

/// The Chebyshev points of order `n`, `n + 1` of them, ends included, rising from 0 to 1.
pub(super) fn chebyshev_points(n: usize) -> Vec<f64> {
    (0..=n)
        .map(|j| 0.5 - 0.5 * (std::f64::consts::PI * j as f64 / n as f64).cos())
        .collect()
}

/// The polynomial through the values at the Chebyshev points, barycentric form (Salzer 1972, from memory).
pub(super) fn polynomial(values: &[f64], share: f64) -> f64 {
    let n = values.len() - 1;
    let (mut top, mut bottom) = (0.0, 0.0);
    for (j, (point, value)) in chebyshev_points(n).into_iter().zip(values).enumerate() {
        let distance = share - point;
        if distance.abs() < 1e-14 {
            return *value;
        }
        let half = if j == 0 || j == n { 0.5 } else { 1.0 };
        let sign = if j % 2 == 0 { 1.0 } else { -1.0 };
        let weight = half * sign / distance;
        top += weight * value;
        bottom += weight;
    }
    top / bottom
}

/// Integral of `f` of the polynomial from 0 to `share`.
pub(super) fn integral(values: &[f64], share: f64, f: impl Fn(f64) -> f64) -> f64 {
    let width = share / PANELS as f64;
    let mut sum = 0.0;
    for panel in 0..PANELS {
        let middle = (panel as f64 + 0.5) * width;
        for (at, weight) in GAUSS {
            sum += weight * f(polynomial(values, middle + 0.5 * width * at));
        }
    }
    0.5 * width * sum
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_polynomial_is_met_and_its_powers_are_integrated() {
        let points = chebyshev_points(4);
        assert_eq!((points[0], points[4]), (0.0, 1.0));
        let straight: Vec<f64> = points.iter().map(|s| 1.0 + s).collect();
        assert!((polynomial(&straight, 0.123) - 1.123).abs() < 1e-14);
        // Integral of (1 + s)^-3 from 0 to 1 is 3/8.
        let found = integral(&straight, 1.0, |c| c.powi(-3));
        assert!((found - 0.375).abs() < 1e-12, "{found}");
        let half = integral(&straight, 0.5, |c| c.powi(-3));
        assert!((half - 0.5 * (1.0 - 1.0 / 2.25)).abs() < 1e-12);
    }
}
