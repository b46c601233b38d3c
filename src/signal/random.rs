//! Random numbers that are the same everywhere.

/// SplitMix64: one number a step from a 64-bit counter.
///
/// G. L. Steele, D. Lea, C. H. Flood, "Fast splittable pseudorandom number generators", OOPSLA 2014, doi:10.1145/2660193.2660195,
/// with the mixing constants of its reference code (from memory, checked by the published first outputs for the seed 0).
#[derive(Clone, Debug)]
pub struct SplitMix64 {
    state: u64,
}

impl SplitMix64 {
    /// Starts at `seed`; every seed is as good as another.
    pub fn new(seed: u64) -> SplitMix64 {
        SplitMix64 { state: seed }
    }

    /// The next 64 bits.
    pub fn bits(&mut self) -> u64 {
        self.state = self.state.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut z = self.state;
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        z ^ (z >> 31)
    }

    /// Uniform in 0 (included) to 1 (excluded), in steps of 2^-53.
    pub fn uniform(&mut self) -> f64 {
        (self.bits() >> 11) as f64 / (1u64 << 53) as f64
    }

    /// Uniform between `low` and `high`.
    pub fn between(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * self.uniform()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_first_numbers_of_seed_zero_are_the_published_ones() {
        let mut random = SplitMix64::new(0);
        assert_eq!(random.bits(), 0xE220_A839_7B1D_CDAF);
        assert_eq!(random.bits(), 0x6E78_9E6A_A1B9_65F4);
        assert_eq!(random.bits(), 0x06C4_5D18_8009_454F);
    }

    #[test]
    fn uniform_numbers_have_the_mean_and_spread_of_their_kind() {
        let mut random = SplitMix64::new(7);
        let n = 100_000;
        let x: Vec<f64> = (0..n).map(|_| random.uniform()).collect();
        assert!(x.iter().all(|v| (0.0..1.0).contains(v)));
        let mean = x.iter().sum::<f64>() / f64::from(n);
        let variance = x.iter().map(|v| (v - mean).powi(2)).sum::<f64>() / f64::from(n);
        // Five standard errors: sqrt(1/12/n) and about sqrt(1/180/n).
        assert!((mean - 0.5).abs() < 0.005, "{mean}");
        assert!((variance - 1.0 / 12.0).abs() < 0.0012, "{variance}");
    }
}
