//! Polynomials of several variables on a tensor of Chebyshev points, by least squares.
//!
//! `f(t1, t2, ...) = sum of c T_i(t1) T_j(t2) ...` with the Chebyshev polynomials `T_0 = 1`, `T_1 = t`,
//! `T_(n+1) = 2 t T_n - T_(n-1)` and every `t` between -1 and 1. On a tensor of points the least-squares problem
//! falls apart into one small one along each axis, which nalgebra solves by its singular values.
//! Coefficients that together change the value by less than a stated bound are left out: no `T` is above 1.

use nalgebra::DMatrix;

use super::error::ResponseError;

/// One term.
#[derive(Debug, Clone, PartialEq)]
pub struct FitTerm {
    /// Degree of the Chebyshev polynomial of each variable.
    pub degrees: Vec<usize>,
    /// Its coefficient.
    pub coefficient: f64,
}

/// A polynomial in Chebyshev form.
#[derive(Debug, Clone, PartialEq)]
pub struct ChebyshevFit {
    /// Highest degree of each variable.
    pub degrees: Vec<usize>,
    /// The terms, the last variable running fastest.
    pub terms: Vec<FitTerm>,
}

/// Values on a tensor of points.
#[derive(Debug, Clone, Copy)]
pub(super) struct Tensor<'a> {
    /// Points along each axis, -1 to 1.
    pub(super) axes: &'a [Vec<f64>],
    /// The values, the last axis running fastest.
    pub(super) values: &'a [f64],
}

impl ChebyshevFit {
    /// The least-squares fit of given degrees, each below the number of points along its axis.
    ///
    /// - `slack`: largest change of the value by terms that are left out
    pub(super) fn new(
        tensor: Tensor<'_>,
        degrees: &[usize],
        slack: f64,
    ) -> Result<Self, ResponseError> {
        let mut values = tensor.values.to_vec();
        let mut shape: Vec<usize> = tensor.axes.iter().map(Vec::len).collect();
        for (axis, (points, &degree)) in tensor.axes.iter().zip(degrees).enumerate() {
            let basis = DMatrix::from_fn(points.len(), degree + 1, |i, n| {
                chebyshev(points[i], degree)[n][0]
            });
            let solver = basis
                .pseudo_inverse(1e-12)
                .map_err(|reason| ResponseError::Fit { reason })?;
            values = along(&values, &shape, axis, &solver);
            shape[axis] = degree + 1;
        }
        let mut terms: Vec<FitTerm> = indices(&shape)
            .zip(values)
            .map(|(degrees, coefficient)| FitTerm {
                degrees,
                coefficient,
            })
            .collect();
        leave_out(&mut terms, slack);
        Ok(Self {
            degrees: degrees.to_vec(),
            terms,
        })
    }

    /// The value at a scaled place.
    pub fn value(&self, scaled: &[f64]) -> f64 {
        self.value_and_slopes(scaled).0
    }

    /// The value and its derivative along each scaled variable.
    pub fn value_and_slopes(&self, scaled: &[f64]) -> (f64, Vec<f64>) {
        let bases: Vec<Vec<[f64; 2]>> = scaled
            .iter()
            .zip(&self.degrees)
            .map(|(&t, &degree)| chebyshev(t, degree))
            .collect();
        let mut value = 0.0;
        let mut slopes = vec![0.0; scaled.len()];
        for term in &self.terms {
            let factors = || bases.iter().zip(&term.degrees).map(|(basis, &n)| basis[n]);
            value += term.coefficient * factors().map(|[v, _]| v).product::<f64>();
            for (axis, slope) in slopes.iter_mut().enumerate() {
                let product: f64 = factors()
                    .enumerate()
                    .map(|(k, [v, d])| if k == axis { d } else { v })
                    .product();
                *slope += term.coefficient * product;
            }
        }
        (value, slopes)
    }

    /// Largest coefficient among the terms with the highest two degrees of a variable.
    pub(super) fn tail(&self, axis: usize) -> f64 {
        self.terms
            .iter()
            .filter(|term| term.degrees[axis] + 1 >= self.degrees[axis])
            .map(|term| term.coefficient.abs())
            .fold(0.0, f64::max)
    }
}

/// `T_n(t)` and its derivative for `n` from 0 to `degree`.
fn chebyshev(t: f64, degree: usize) -> Vec<[f64; 2]> {
    let mut found = vec![[1.0, 0.0], [t, 1.0]];
    for n in 1..degree {
        let [[v1, d1], [v, d]] = [found[n - 1], found[n]];
        found.push([2.0 * t * v - v1, 2.0 * v + 2.0 * t * d - d1]);
    }
    found.truncate(degree + 1);
    found
}

/// All indices of a tensor, the last axis running fastest.
pub(super) fn indices(shape: &[usize]) -> impl Iterator<Item = Vec<usize>> + use<> {
    let shape = shape.to_vec();
    (0..shape.iter().product::<usize>()).map(move |flat| {
        let mut rest = flat;
        let mut index = vec![0; shape.len()];
        for (axis, &length) in shape.iter().enumerate().rev() {
            index[axis] = rest % length;
            rest /= length;
        }
        index
    })
}

/// A matrix applied along one axis of a tensor.
fn along(values: &[f64], shape: &[usize], axis: usize, matrix: &DMatrix<f64>) -> Vec<f64> {
    let inner: usize = shape[axis + 1..].iter().product();
    let outer: usize = shape[..axis].iter().product();
    let (old, new) = (shape[axis], matrix.nrows());
    let mut found = vec![0.0; outer * new * inner];
    for o in 0..outer {
        for row in 0..new {
            for i in 0..inner {
                found[(o * new + row) * inner + i] = (0..old)
                    .map(|k| matrix[(row, k)] * values[(o * old + k) * inner + i])
                    .sum();
            }
        }
    }
    found
}

/// Drops the smallest terms whose sizes add up to at most `slack`; the constant stays.
fn leave_out(terms: &mut Vec<FitTerm>, slack: f64) {
    let mut sizes: Vec<f64> = terms.iter().map(|t| t.coefficient.abs()).collect();
    sizes.sort_by(f64::total_cmp);
    let mut sum = 0.0;
    let mut limit = -1.0;
    for size in sizes {
        sum += size;
        if sum > slack {
            break;
        }
        limit = size;
    }
    terms.retain(|term| term.coefficient.abs() > limit || term.degrees.iter().all(|&n| n == 0));
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::study::response::points::chebyshev_points;

    fn fitted(degrees: &[usize], slack: f64, f: impl Fn(&[f64]) -> f64) -> ChebyshevFit {
        let axes: Vec<Vec<f64>> = degrees.iter().map(|d| chebyshev_points(d + 3)).collect();
        let shape: Vec<usize> = axes.iter().map(Vec::len).collect();
        let values: Vec<f64> = indices(&shape)
            .map(|index| {
                let place: Vec<f64> = index.iter().zip(&axes).map(|(&i, axis)| axis[i]).collect();
                f(&place)
            })
            .collect();
        let tensor = Tensor {
            axes: &axes,
            values: &values,
        };
        ChebyshevFit::new(tensor, degrees, slack).unwrap()
    }

    #[test]
    fn a_polynomial_of_three_variables_comes_back_with_its_derivatives() {
        let f = |p: &[f64]| 2.0 + p[0].powi(3) * p[1] - 4.0 * p[2] * p[2] * p[0];
        let fit = fitted(&[3, 2, 2], 0.0, f);
        let place = [0.3, -0.7, 0.45];
        let (value, slopes) = fit.value_and_slopes(&place);
        assert!((value - f(&place)).abs() < 1e-12, "{value}");
        let expected = [
            3.0 * 0.09 * -0.7 - 4.0 * 0.45 * 0.45,
            0.027,
            -8.0 * 0.45 * 0.3,
        ];
        for (found, expected) in slopes.iter().zip(expected) {
            assert!((found - expected).abs() < 1e-12, "{slopes:?}");
        }
    }

    #[test]
    fn small_terms_are_left_out_within_the_stated_bound() {
        let f = |p: &[f64]| (0.5 * p[0]).exp() * (1.0 + 1e-3 * p[1]);
        let all = fitted(&[8, 3], 0.0, f);
        let few = fitted(&[8, 3], 1e-4, f);
        assert!(few.terms.len() < all.terms.len() / 2, "{few:?}");
        for place in [[-1.0, 1.0], [0.2, 0.4], [1.0, -0.9]] {
            let off = few.value(&place) - all.value(&place);
            assert!(off.abs() <= 1e-4, "{off}");
        }
    }
}
