//! Sections whose flow is known in closed form or as a fast series, for tests, shortcuts and users.
//!
//! Rectangle (Fourier series), circle, ellipse, equilateral triangle, concentric annulus, eccentric annulus
//! (bipolar series). Each gives area, wetted perimeter, conductance `K` and, where it is known in closed
//! form, the peak of `phi`; the equation is `-lap(phi) = 1`, `phi = 0` on the wall (`phi` in m^2).
//!
//! The sources are classics whose formulas are cited from memory; each formula was confirmed against
//! independent computed values (tests of this module and `tests/published`).

use std::f64::consts::PI;

/// Catalan's constant, `sum (-1)^k / (2k+1)^2`.
const CATALAN: f64 = 0.915_965_594_177_219;
/// `sum 1/n^5` over odd `n`, `(31/32) zeta(5)`.
const ODD_FIFTH_POWERS: f64 = 1.004_523_762_795_139_7;
/// Terms of a series that decays like `exp(-n pi)`: 15 odd terms leave less than `exp(-97)`.
const EXPONENTIAL_TERMS: u32 = 15;
/// Smallest gap over offset-free gap, `1 - offset / (outer - inner)`, that the annulus series takes.
const LEAST_GAP: f64 = 1e-8;

/// A section known in closed form.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ClosedForm {
    /// Flow area, m^2.
    pub area: f64,
    /// Wetted perimeter, m.
    pub wetted_perimeter: f64,
    /// Conductance `K`, m^4.
    pub conductance: f64,
    /// Largest `phi`, m^2; `None` where no closed form is known.
    pub peak_phi: Option<f64>,
}

/// Wall shear per pressure gradient at the middle of the sides of a rectangle, m.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct MidWallShear {
    /// At the middle of a long side, the largest of the section.
    pub long_side: f64,
    /// At the middle of a short side.
    pub short_side: f64,
}

/// Why a closed form was refused.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum ClosedFormError {
    /// A dimension is zero, negative or not a number.
    #[error("the {dimension} is {value} m; it must be above zero and finite")]
    Dimension {
        /// Which dimension.
        dimension: &'static str,
        /// The value as given, m.
        value: f64,
    },
    /// The inner wall does not lie inside the outer wall.
    #[error(
        "an inner wall of radius {inner} m, {offset} m off centre, does not lie inside an outer wall of \
         radius {outer} m"
    )]
    WallsMeet {
        /// Outer radius, m.
        outer: f64,
        /// Inner radius, m.
        inner: f64,
        /// Distance of the centres, m.
        offset: f64,
    },
}

impl ClosedForm {
    /// Hydraulic diameter `4 A / P`, m.
    pub fn hydraulic_diameter(&self) -> f64 {
        4.0 * self.area / self.wetted_perimeter
    }

    /// Fanning `f Re` on the hydraulic diameter, `Dh^2 A / (2 K)`.
    ///
    /// # Examples
    /// ```
    /// let tube = etchwise::flow::closed_form::circle(0.5e-3)?;
    /// assert!((tube.fanning_dh() - 16.0).abs() < 1e-12);
    /// # Ok::<(), etchwise::flow::closed_form::ClosedFormError>(())
    /// ```
    pub fn fanning_dh(&self) -> f64 {
        self.hydraulic_diameter().powi(2) * self.area / (2.0 * self.conductance)
    }

    /// Fanning `f Re` on `sqrt(A)`, `2 A^(5/2) / (P K)`.
    pub fn fanning_sqrt_area(&self) -> f64 {
        2.0 * self.area.powf(2.5) / (self.wetted_perimeter * self.conductance)
    }

    /// Peak over mean velocity, `phi_max A / K`.
    pub fn peak_to_mean(&self) -> Option<f64> {
        self.peak_phi.map(|phi| phi * self.area / self.conductance)
    }

    /// Mean wall shear per pressure gradient, `A / P`, m.
    pub fn mean_wall_shear(&self) -> f64 {
        self.area / self.wetted_perimeter
    }
}

/// Refuses a dimension that is not a positive finite number.
fn positive(dimension: &'static str, value: f64) -> Result<f64, ClosedFormError> {
    if value.is_finite() && value > 0.0 {
        Ok(value)
    } else {
        Err(ClosedFormError::Dimension { dimension, value })
    }
}

/// Short and long side of a rectangle.
fn sides(width: f64, height: f64) -> Result<(f64, f64), ClosedFormError> {
    let width = positive("width", width)?;
    let height = positive("height", height)?;
    Ok((width.min(height), width.max(height)))
}

/// The odd numbers of the series with the sign `(-1)^k` of `n = 2k + 1`.
fn odd_numbers() -> impl Iterator<Item = (f64, f64)> {
    (0..EXPONENTIAL_TERMS).map(|k| {
        let sign = if k % 2 == 0 { 1.0 } else { -1.0 };
        (f64::from(2 * k + 1), sign)
    })
}

/// `1 - tanh(x)` without cancellation.
fn one_minus_tanh(x: f64) -> f64 {
    2.0 / ((2.0 * x).exp() + 1.0)
}

/// A rectangle.
///
/// With `h` the short and `w` the long side and sums over odd `n`:
/// `K = (w h^3 / 12) [1 - (192 h / (pi^5 w)) sum tanh(n pi w / 2h) / n^5]`,
/// `phi_max = (h^2 / 8) [1 - (32 / pi^3) sum (-1)^k sech(n pi w / 2h) / n^3]`.
/// The sum of `1 / n^5` is split off, so that what is left decays like `exp(-n pi w / h)`.
///
/// - `width`, `height`: m, either may be the longer
///
/// # Source
/// Boussinesq (1868); in the form of White, Viscous Fluid Flow (from memory).
/// # Accuracy
/// Rounding; within 1e-12 of 30-digit values, test `rectangles_equal_the_thirty_digit_series`.
/// # Errors
/// [`ClosedFormError::Dimension`] for a side that is not positive and finite.
/// # Examples
/// ```
/// let square = etchwise::flow::closed_form::rectangle(1.0, 1.0)?;
/// assert!((square.conductance - 0.035_144_253_738_788).abs() < 1e-14);
/// # Ok::<(), etchwise::flow::closed_form::ClosedFormError>(())
/// ```
pub fn rectangle(width: f64, height: f64) -> Result<ClosedForm, ClosedFormError> {
    let (h, w) = sides(width, height)?;
    let argument = PI * w / (2.0 * h);
    let ends = ODD_FIFTH_POWERS
        - odd_numbers()
            .map(|(n, _)| one_minus_tanh(n * argument) / n.powi(5))
            .sum::<f64>();
    let dip: f64 = odd_numbers()
        .map(|(n, sign)| sign / ((n * argument).cosh() * n.powi(3)))
        .sum();
    Ok(ClosedForm {
        area: w * h,
        wetted_perimeter: 2.0 * (w + h),
        conductance: w * h.powi(3) / 12.0 * (1.0 - 192.0 * h / (PI.powi(5) * w) * ends),
        peak_phi: Some(h * h / 8.0 * (1.0 - 32.0 / PI.powi(3) * dip)),
    })
}

/// Wall shear of a rectangle at the middle of its sides, per pressure gradient.
///
/// From the series of [`rectangle`]: long side `(h/2) [1 - (8/pi^2) sum sech(n pi w / 2h) / n^2]`, short
/// side `(4 h / pi^2) sum (-1)^k tanh(n pi w / 2h) / n^2`, `n` odd.
///
/// # Source
/// As [`rectangle`].
/// # Errors
/// [`ClosedFormError::Dimension`] for a side that is not positive and finite.
/// # Examples
/// ```
/// let shear = etchwise::flow::closed_form::rectangle_mid_wall_shear(1.0, 1.0)?;
/// assert!((shear.long_side - shear.short_side).abs() < 1e-14);
/// # Ok::<(), etchwise::flow::closed_form::ClosedFormError>(())
/// ```
pub fn rectangle_mid_wall_shear(width: f64, height: f64) -> Result<MidWallShear, ClosedFormError> {
    let (h, w) = sides(width, height)?;
    let argument = PI * w / (2.0 * h);
    let dip: f64 = odd_numbers()
        .map(|(n, _)| 1.0 / ((n * argument).cosh() * n * n))
        .sum();
    let ends = CATALAN
        - odd_numbers()
            .map(|(n, sign)| sign * one_minus_tanh(n * argument) / (n * n))
            .sum::<f64>();
    Ok(MidWallShear {
        long_side: 0.5 * h * (1.0 - 8.0 / (PI * PI) * dip),
        short_side: 4.0 * h / (PI * PI) * ends,
    })
}

/// A circle: `K = pi R^4 / 8`, `phi_max = R^2 / 4`.
///
/// # Source
/// Hagen (1839) and Poiseuille (1840); textbook form.
/// # Errors
/// [`ClosedFormError::Dimension`] for a radius that is not positive and finite.
/// # Examples
/// ```
/// let tube = etchwise::flow::closed_form::circle(2.0)?;
/// assert!((tube.conductance - 2.0 * std::f64::consts::PI).abs() < 1e-12);
/// # Ok::<(), etchwise::flow::closed_form::ClosedFormError>(())
/// ```
pub fn circle(radius: f64) -> Result<ClosedForm, ClosedFormError> {
    let r = positive("radius", radius)?;
    Ok(ClosedForm {
        area: PI * r * r,
        wetted_perimeter: 2.0 * PI * r,
        conductance: PI * r.powi(4) / 8.0,
        peak_phi: Some(r * r / 4.0),
    })
}

/// An ellipse with half axes `a`, `b`: `K = pi a^3 b^3 / (4 (a^2 + b^2))`,
/// `phi_max = a^2 b^2 / (2 (a^2 + b^2))`; the perimeter is a complete elliptic integral.
///
/// - `width`, `height`: the whole axes, m
///
/// # Source
/// Saint-Venant (1855, torsion); in the form of White, Viscous Fluid Flow (from memory).
/// # Errors
/// [`ClosedFormError::Dimension`] for an axis that is not positive and finite.
/// # Examples
/// ```
/// let ellipse = etchwise::flow::closed_form::ellipse(2.0, 1.0)?;
/// assert!((ellipse.fanning_dh() - 16.82330).abs() < 5e-6);
/// # Ok::<(), etchwise::flow::closed_form::ClosedFormError>(())
/// ```
pub fn ellipse(width: f64, height: f64) -> Result<ClosedForm, ClosedFormError> {
    let (b, a) = sides(width, height).map(|(short, long)| (0.5 * short, 0.5 * long))?;
    let squares = a * a + b * b;
    Ok(ClosedForm {
        area: PI * a * b,
        wetted_perimeter: ellipse_perimeter(a, b),
        conductance: PI * (a * b).powi(3) / (4.0 * squares),
        peak_phi: Some((a * b).powi(2) / (2.0 * squares)),
    })
}

/// Perimeter of an ellipse with half axes `a >= b`, by the arithmetic-geometric mean.
///
/// `P = (2 pi / M) (a^2 - sum 2^(n-1) c_n^2)`, `c_0^2 = a^2 - b^2` (Gauss; from memory).
fn ellipse_perimeter(a: f64, b: f64) -> f64 {
    let (mut mean, mut geometric) = (a, b);
    let mut weight = 0.5;
    let mut sum = a * a - weight * (a * a - b * b);
    while (mean - geometric).abs() > f64::EPSILON * mean {
        let half_difference = 0.5 * (mean - geometric);
        let next = 0.5 * (mean + geometric);
        geometric = (mean * geometric).sqrt();
        mean = next;
        weight *= 2.0;
        sum -= weight * half_difference * half_difference;
        if weight > 1e3 {
            break;
        }
    }
    2.0 * PI / mean * sum
}

/// An equilateral triangle: `K = sqrt(3) s^4 / 320`, `phi_max = s^2 / 36`.
///
/// # Source
/// Boussinesq (1868); in the form of White, Viscous Fluid Flow (from memory).
/// # Errors
/// [`ClosedFormError::Dimension`] for a side that is not positive and finite.
/// # Examples
/// ```
/// let triangle = etchwise::flow::closed_form::equilateral_triangle(1.0)?;
/// assert!((triangle.fanning_dh() - 40.0 / 3.0).abs() < 1e-12);
/// # Ok::<(), etchwise::flow::closed_form::ClosedFormError>(())
/// ```
pub fn equilateral_triangle(side: f64) -> Result<ClosedForm, ClosedFormError> {
    let s = positive("side", side)?;
    Ok(ClosedForm {
        area: 3.0_f64.sqrt() / 4.0 * s * s,
        wetted_perimeter: 3.0 * s,
        conductance: 3.0_f64.sqrt() * s.powi(4) / 320.0,
        peak_phi: Some(s * s / 36.0),
    })
}

/// A concentric annulus, `ro` outer and `ri` inner radius:
/// `K = (pi/8) [ro^4 - ri^4 - (ro^2 - ri^2)^2 / ln(ro/ri)]`.
///
/// Evaluated as `(pi m^2 / 2) sinh(s) (s cosh(s) - sinh(s)) / s` with `m = ro ri`, `s = ln(ro/ri)`, which
/// keeps its digits for a narrow gap.
///
/// # Source
/// Textbook form (White, Viscous Fluid Flow; from memory).
/// # Errors
/// [`ClosedFormError`] for a radius that is not positive and finite, or when the walls meet.
/// # Examples
/// ```
/// let annulus = etchwise::flow::closed_form::concentric_annulus(1.0, 0.5)?;
/// assert!((annulus.fanning_dh() - 23.812_540).abs() < 5e-7);
/// # Ok::<(), etchwise::flow::closed_form::ClosedFormError>(())
/// ```
pub fn concentric_annulus(outer: f64, inner: f64) -> Result<ClosedForm, ClosedFormError> {
    let ro = positive("outer radius", outer)?;
    let ri = positive("inner radius", inner)?;
    if ri >= ro {
        return Err(ClosedFormError::WallsMeet {
            outer,
            inner,
            offset: 0.0,
        });
    }
    let m = ro * ri;
    let s = ((ro - ri) / ri).ln_1p();
    let bracket = s_cosh_minus_sinh(s);
    // phi_max = (rm^2 / 4) (d - ln(1 + d)) at rm^2 = m sinh(s) / s, with 1 + d = ro^2 / rm^2.
    let excess = bracket / s.sinh() + s;
    Ok(ClosedForm {
        area: PI * (ro - ri) * (ro + ri),
        wetted_perimeter: 2.0 * PI * (ro + ri),
        conductance: 0.5 * PI * m * m * s.sinh() * bracket / s,
        peak_phi: Some(0.25 * m * s.sinh() / s * (excess - excess.ln_1p())),
    })
}

/// `s cosh(s) - sinh(s)` without cancellation at small `s`: `sum 2k s^(2k+1) / (2k+1)!`.
fn s_cosh_minus_sinh(s: f64) -> f64 {
    if s > 1.0 {
        return s * s.cosh() - s.sinh();
    }
    let mut power = s;
    let mut sum = 0.0;
    for k in 1..12_u32 {
        let n = f64::from(2 * k);
        power *= s * s / (n * (n + 1.0));
        sum += n * power;
    }
    sum
}

/// An eccentric annulus: an inner wall of radius `b`, its centre `c` off that of the outer wall, radius `a`.
///
/// ```text
/// K = (pi/8) [a^4 - b^4 - 4 c^2 M^2 / (beta - alpha)
///             - 8 c^2 M^2 sum n exp(-n (beta + alpha)) / sinh(n (beta - alpha))]
/// sinh(alpha) = M/a, sinh(beta) = M/b, 4 c^2 M^2 = (a-c-b) (a-c+b) (a+c-b) (a+c+b)
/// ```
///
/// - `outer`, `inner`: radii, m; `offset`: distance of the centres, m, not negative, less than their
///   difference
///
/// # Source
/// Piercy, Hooper and Winney (1933), Phil. Mag. 15; Snyder and Goldstein (1965), A.I.Ch.E. J. 11; in the form
/// of White, Viscous Fluid Flow (all from memory).
/// # Accuracy
/// Rounding, magnified by about `((a + b) / (a - b))^3` for a narrow gap.
/// # Errors
/// [`ClosedFormError`] for a radius that is not positive and finite, an offset that is negative or not
/// finite, or when the walls meet (a gap below 1e-8 of the mean gap counts as that).
/// # Examples
/// ```
/// let annulus = etchwise::flow::closed_form::eccentric_annulus(1.0, 0.5, 0.25)?;
/// assert!((annulus.fanning_dh() - 17.670_902).abs() < 1e-6);
/// # Ok::<(), etchwise::flow::closed_form::ClosedFormError>(())
/// ```
pub fn eccentric_annulus(
    outer: f64,
    inner: f64,
    offset: f64,
) -> Result<ClosedForm, ClosedFormError> {
    let concentric = concentric_annulus(outer, inner)?;
    if !(offset.is_finite() && offset >= 0.0) {
        return Err(ClosedFormError::Dimension {
            dimension: "offset of the centres",
            value: offset,
        });
    }
    let (a, b, c) = (outer, inner, offset);
    // A smaller offset changes K by less than rounding (the change goes with the square of the offset).
    if c <= 1e-9 * (a - b) {
        return Ok(concentric);
    }
    if c >= (a - b) * (1.0 - LEAST_GAP) {
        return Err(ClosedFormError::WallsMeet {
            outer,
            inner,
            offset,
        });
    }
    let square = 0.25 * (a - c - b) * (a - c + b) * (a + c - b) * (a + c + b);
    let m = square.sqrt() / c;
    let (alpha, beta) = ((m / a).asinh(), (m / b).asinh());
    let series = bipolar_series(alpha, beta);
    let bracket = a.powi(4) - b.powi(4) - 4.0 * square / (beta - alpha) - 8.0 * square * series;
    Ok(ClosedForm {
        conductance: PI / 8.0 * bracket,
        peak_phi: None,
        ..concentric
    })
}

/// `sum n exp(-n (beta + alpha)) / sinh(n (beta - alpha))`, until the terms no longer count.
fn bipolar_series(alpha: f64, beta: f64) -> f64 {
    let mut sum = 0.0;
    let mut n = 1.0;
    loop {
        // exp(-n (beta + alpha)) / sinh(n (beta - alpha)) = 2 exp(-2 n beta) / (1 - exp(-2 n (beta - alpha)))
        let term = -2.0 * n * (-2.0 * n * beta).exp() / (-2.0 * n * (beta - alpha)).exp_m1();
        sum += term;
        if term <= 1e-17 * sum || term <= f64::MIN_POSITIVE {
            return sum;
        }
        n += 1.0;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn close(value: f64, reference: f64, relative: f64) {
        assert!(
            (value / reference - 1.0).abs() < relative,
            "{value} against {reference}: {:.2e}",
            value / reference - 1.0
        );
    }

    #[test]
    fn rectangles_equal_the_thirty_digit_series() {
        // Computed reference: the plain Fourier series summed with 30 digits, printed to 11 to 14.
        let table = [
            (1.0, 0.035_144_253_738_788, 2.096_256_014_684),
            (0.5, 0.057_170_419_28, 1.991_796_3),
            (0.1, 0.078_081_259_364, 1.600_895_8),
            (0.01, 0.082_808_125_936, 1.509_513_7),
        ];
        for (aspect, conductance, peak) in table {
            for (w, h) in [(1.0 / aspect, 1.0), (1.0, 1.0 / aspect)] {
                let section = rectangle(w, h).unwrap();
                close(section.conductance * aspect, conductance, 1e-10);
                close(section.peak_to_mean().unwrap(), peak, 3e-8);
            }
        }
        close(
            rectangle(1.0, 1.0).unwrap().conductance,
            0.035_144_253_738_788_43,
            1e-14,
        );
    }

    #[test]
    fn mid_wall_shear_of_rectangles_equals_the_thirty_digit_series() {
        // Computed reference as above: (h/w, long side, short side) over the perimeter mean.
        let table = [
            (1.0, 1.350_629, 1.350_629),
            (0.5, 1.395_09, 1.109_148),
            (0.2, 1.199_245, 0.890_944_2),
            (0.01, 1.01, 0.749_878_3),
        ];
        for (aspect, long, short) in table {
            let mean = rectangle(1.0 / aspect, 1.0).unwrap().mean_wall_shear();
            let shear = rectangle_mid_wall_shear(1.0 / aspect, 1.0).unwrap();
            close(shear.long_side / mean, long, 4e-7);
            close(shear.short_side / mean, short, 4e-7);
        }
    }

    #[test]
    fn a_narrow_annulus_tends_to_parallel_plates_without_losing_digits() {
        for gap in [1e-2, 1e-4, 1e-6] {
            let section = concentric_annulus(1.0, 1.0 - gap).unwrap();
            // First correction of the plate value 24 is gap^2 / 60 relative (series of the formula in s).
            close(section.fanning_dh(), 24.0, gap * gap / 10.0 + 1e-9);
            close(section.peak_to_mean().unwrap(), 1.5, gap * gap + 1e-6);
        }
    }

    #[test]
    fn an_annulus_with_a_thin_core_has_its_known_peak() {
        // Peak from the velocity law phi = (ro^2 - r^2)/4 - (ro^2 - ri^2) ln(ro/r) / (4 ln(ro/ri)).
        let (ro, ri) = (1.0_f64, 0.2_f64);
        let phi = |r: f64| {
            (ro * ro - r * r) / 4.0 - (ro * ro - ri * ri) * (ro / r).ln() / (4.0 * (ro / ri).ln())
        };
        let largest = (0..=100_000)
            .map(|i| phi(ri + (ro - ri) * f64::from(i) / 1e5))
            .fold(0.0, f64::max);
        let section = concentric_annulus(ro, ri).unwrap();
        close(section.peak_phi.unwrap(), largest, 1e-8);
    }

    #[test]
    fn an_eccentric_annulus_joins_the_concentric_one() {
        let concentric = concentric_annulus(1.0, 0.3).unwrap().conductance;
        for offset in [0.0, 1e-12, 1e-6] {
            let eccentric = eccentric_annulus(1.0, 0.3, offset).unwrap().conductance;
            close(eccentric, concentric, 1e-10);
        }
        let touching = eccentric_annulus(1.0, 0.5, 0.5 * (1.0 - 1e-7))
            .unwrap()
            .conductance;
        let near = eccentric_annulus(1.0, 0.5, 0.5 * (1.0 - 1e-6))
            .unwrap()
            .conductance;
        close(touching, near, 1e-5);
    }

    #[test]
    fn impossible_dimensions_are_refused() {
        for bad in [0.0, -1.0, f64::NAN, f64::INFINITY] {
            assert!(rectangle(bad, 1.0).is_err() && rectangle(1.0, bad).is_err());
            assert!(rectangle_mid_wall_shear(1.0, bad).is_err());
            assert!(circle(bad).is_err() && ellipse(1.0, bad).is_err());
            assert!(equilateral_triangle(bad).is_err());
            assert!(concentric_annulus(bad, 0.1).is_err());
            assert!(concentric_annulus(1.0, bad).is_err());
        }
        assert!(concentric_annulus(1.0, 1.0).is_err());
        for bad in [-0.1, 0.5, 0.7, f64::NAN] {
            assert!(eccentric_annulus(1.0, 0.5, bad).is_err());
        }
    }

    #[test]
    fn the_perimeter_of_an_ellipse_reaches_its_limits() {
        close(ellipse(2.0, 2.0).unwrap().wetted_perimeter, 2.0 * PI, 1e-15);
        close(ellipse(2.0, 1e-9).unwrap().wetted_perimeter, 4.0, 1e-12);
        // E(sqrt(3)/2) = 1.211056027568459 (Abramowitz and Stegun table 17.1, from memory).
        close(
            ellipse(2.0, 1.0).unwrap().wetted_perimeter,
            4.0 * 1.211_056_027_568_459,
            1e-14,
        );
    }
}
