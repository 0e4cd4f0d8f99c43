//! A computed value with the estimate of its numerical error.
//!
//! The error of an [`Estimate`] is an estimate from a sequence of grids, not a proven bound and not a
//! standard uncertainty; every output says so.

/// A value with its estimated numerical error, both in the same unit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Estimate {
    /// Best value.
    pub value: f64,
    /// Estimated absolute error of `value` from the grid sequence, not negative.
    pub error: f64,
}

impl Estimate {
    /// Relative error, `error / abs(value)`; zero when both are zero.
    ///
    /// # Examples
    /// ```
    /// let k = etchwise::measured::Estimate { value: 2.0, error: 1e-4 };
    /// assert!((k.relative() - 5e-5).abs() < 1e-18);
    /// ```
    pub fn relative(&self) -> f64 {
        if self.error > 0.0 {
            self.error / self.value.abs()
        } else {
            0.0
        }
    }

    /// The same estimate multiplied by a positive factor.
    #[must_use]
    pub fn scaled(&self, factor: f64) -> Self {
        Self {
            value: self.value * factor,
            error: self.error * factor.abs(),
        }
    }
}
