//! Files with some bits changed, for tests: what looks random is the same on every run.

/// Copies of a file with three bytes changed in each.
pub(super) fn spoilt(whole: &[u8], copies: usize) -> impl Iterator<Item = Vec<u8>> + '_ {
    let mut random: u64 = 1;
    (0..copies).map(move |_| {
        let mut spoilt = whole.to_vec();
        for _ in 0..3 {
            random = random
                .wrapping_mul(6_364_136_223_846_793_005)
                .wrapping_add(99);
            let place = (random >> 20) as usize % spoilt.len();
            spoilt[place] ^= (random >> 12) as u8 | 1;
        }
        spoilt
    })
}
