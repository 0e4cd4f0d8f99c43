//! Repeatable random numbers: the same seed gives the same numbers on every machine.
//!
//! `SplitMix64` (G. L. Steele, D. Lea, C. H. Flood 2014, Fast splittable pseudorandom number generators, OOPSLA, 453;
//! constants from memory, checked by the published first outputs of its reference code for seed 0), and the pairs of
//! Box and Muller (1958), A note on the generation of random normal deviates, Ann. Math. Stat. 29, 610 (from memory).

/// 2^-53: one unit in the last place of a number below one.
const UNIT: f64 = 1.0 / 9_007_199_254_740_992.0;

/// A source of independent numbers from the standard normal distribution.
///
/// # Examples
/// ```
/// use etchwise::study::NormalSource;
/// let (mut a, mut b) = (NormalSource::new(7), NormalSource::new(7));
/// assert_eq!(a.normal(), b.normal());
/// ```
#[derive(Debug, Clone)]
pub struct NormalSource {
    state: u64,
    /// Second of a pair that is not used yet.
    waiting: Option<f64>,
}

impl NormalSource {
    /// A source with a seed.
    pub fn new(seed: u64) -> Self {
        Self {
            state: seed,
            waiting: None,
        }
    }

    /// The next 64 bits.
    pub fn bits(&mut self) -> u64 {
        self.state = self.state.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.state;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        z ^ (z >> 31)
    }

    /// The next number of the standard normal distribution.
    pub fn normal(&mut self) -> f64 {
        if let Some(second) = self.waiting.take() {
            return second;
        }
        // Above zero up to one, so that the logarithm is finite.
        let radius = (-2.0 * (((self.bits() >> 11) + 1) as f64 * UNIT).ln()).sqrt();
        let angle = std::f64::consts::TAU * ((self.bits() >> 11) as f64 * UNIT);
        self.waiting = Some(radius * angle.sin());
        radius * angle.cos()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_first_bits_of_seed_zero_are_those_of_the_reference_code() {
        // Outputs of the reference code for seed 0, from memory.
        let mut source = NormalSource::new(0);
        assert_eq!(source.bits(), 0xe220_a839_7b1d_cdaf);
        assert_eq!(source.bits(), 0x6e78_9e6a_a1b9_65f4);
        assert_eq!(source.bits(), 0x06c4_5d18_8009_454f);
    }

    #[test]
    fn normal_numbers_have_the_moments_of_their_distribution() {
        let mut source = NormalSource::new(1);
        let count = 200_000;
        let mut sums = [0.0; 4];
        for _ in 0..count {
            let x = source.normal();
            for (power, sum) in (1..).zip(&mut sums) {
                *sum += x.powi(power);
            }
        }
        let moments = sums.map(|sum| sum / f64::from(count));
        // Five standard deviations of each mean: variances of x^k are 1, 2, 15, 96.
        for ((found, exact), variance) in moments
            .into_iter()
            .zip([0.0, 1.0, 0.0, 3.0])
            .zip([1.0, 2.0, 15.0, 96.0_f64])
        {
            let limit = 5.0 * (variance / f64::from(count)).sqrt();
            assert!((found - exact).abs() < limit, "{moments:?}");
        }
    }
}
