//! How the conductance goes between two stations.
//!
//! A shallow channel has `K = w h^3 / 12`: with a depth that changes evenly the cube root of `K` is straight, so that
//! is taken where only outlines are known. Exact alternatives: the fourth root, where all dimensions change
//! together; `K` itself, where the width does; `1/K`, the mean of the two resistances per length.

/// The rule asked for.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Default)]
pub enum Interpolation {
    /// Dimensions where both stations are nominal sections of one kind, else the cube root of `K`.
    #[default]
    Automatic,
    /// Dimensions in proportion, sections in between solved.
    Dimensions,
    /// A law for `K` itself.
    Law(LawOfK),
}

/// A law for `K` between two values.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum LawOfK {
    /// `K^(1/3)` straight.
    CubeRoot,
    /// `K^(1/4)` straight.
    FourthRoot,
    /// `K` straight.
    Conductance,
    /// `1/K` straight.
    Resistance,
}

impl Interpolation {
    /// Every rule.
    pub const ALL: [Self; 6] = [
        Self::Automatic,
        Self::Dimensions,
        Self::Law(LawOfK::CubeRoot),
        Self::Law(LawOfK::FourthRoot),
        Self::Law(LawOfK::Conductance),
        Self::Law(LawOfK::Resistance),
    ];

    /// The word for it in files and outputs.
    pub fn word(self) -> &'static str {
        match self {
            Self::Automatic => "automatic",
            Self::Dimensions => "dimensions",
            Self::Law(law) => law.word(),
        }
    }

    /// The rule with this word.
    pub fn from_word(word: &str) -> Option<Self> {
        Self::ALL.into_iter().find(|rule| rule.word() == word)
    }
}

impl LawOfK {
    /// Every law.
    pub const ALL: [Self; 4] = [
        Self::CubeRoot,
        Self::FourthRoot,
        Self::Conductance,
        Self::Resistance,
    ];

    /// The word for it in files and outputs.
    pub fn word(self) -> &'static str {
        match self {
            Self::CubeRoot => "cube_root",
            Self::FourthRoot => "fourth_root",
            Self::Conductance => "conductance",
            Self::Resistance => "resistance",
        }
    }

    /// What it says, for people.
    pub fn meaning(self) -> &'static str {
        match self {
            Self::CubeRoot => "K^(1/3) straight: the depth of a shallow channel changes evenly",
            Self::FourthRoot => "K^(1/4) straight: all dimensions change together",
            Self::Conductance => "K straight: the width changes evenly",
            Self::Resistance => "1/K straight: mean of the two resistances per length",
        }
    }

    /// `K` at a share of the way from `k0` to `k1`.
    pub fn conductance(self, k0: f64, k1: f64, share: f64) -> f64 {
        let mix = |a: f64, b: f64| a + share * (b - a);
        match self {
            Self::CubeRoot => mix(k0.cbrt(), k1.cbrt()).powi(3),
            Self::FourthRoot => mix(k0.sqrt().sqrt(), k1.sqrt().sqrt()).powi(4),
            Self::Conductance => mix(k0, k1),
            Self::Resistance => 1.0 / mix(1.0 / k0, 1.0 / k1),
        }
    }

    /// Integral of `1/K` from 0 to `share` of the way from `k0` to `k1`, closed form.
    ///
    /// # Examples
    /// ```
    /// use etchwise::study::LawOfK;
    /// for law in LawOfK::ALL {
    ///     assert!((law.inverse(2.0, 2.0, 1.0) - 0.5).abs() < 1e-15);
    /// }
    /// ```
    pub fn inverse(self, k0: f64, k1: f64, share: f64) -> f64 {
        let end = self.conductance(k0, k1, share);
        match self {
            Self::CubeRoot => {
                let (a, c) = (k0.cbrt(), end.cbrt());
                share * (1.0 / (a * a * c) + 1.0 / (a * c * c)) / 2.0
            }
            Self::FourthRoot => {
                let (a, c) = (k0.sqrt().sqrt(), end.sqrt().sqrt());
                let sum = 1.0 / (a * a * a * c) + 1.0 / (a * a * c * c) + 1.0 / (a * c * c * c);
                share * sum / 3.0
            }
            Self::Conductance => {
                let x = (end - k0) / k0;
                let mean = if x.abs() < 1e-6 {
                    1.0 - x / 2.0 + x * x / 3.0
                } else {
                    x.ln_1p() / x
                };
                share * mean / k0
            }
            Self::Resistance => share * 0.5 * (1.0 / k0 + 1.0 / end),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn closed_integrals_are_those_of_the_law() {
        for law in LawOfK::ALL {
            for (k0, k1) in [(1.0, 3.0), (5.0, 0.2), (1.0, 1.0 + 1e-7), (2.0, 2.0)] {
                for share in [1.0, 0.3] {
                    let n = 2000;
                    let middle = |i: u32| (f64::from(i) + 0.5) / f64::from(n) * share;
                    let sum: f64 = (0..n)
                        .map(|i| 1.0 / law.conductance(k0, k1, middle(i)))
                        .sum();
                    let expected = sum / f64::from(n) * share;
                    let found = law.inverse(k0, k1, share);
                    assert!((found / expected - 1.0).abs() < 1e-5, "{law:?} {k0} {k1}");
                }
            }
        }
    }

    #[test]
    fn words_name_rules() {
        for rule in Interpolation::ALL {
            assert_eq!(Interpolation::from_word(rule.word()), Some(rule));
        }
        assert_eq!(Interpolation::from_word("linear"), None);
    }
}
