//! Windows for spectra of signals that do not quite repeat.

use std::f64::consts::TAU;

/// Coefficients of the seven-term cosine-sum window with the lowest side lobes, of the kind called
/// Blackman-Harris.
///
/// Source: H.-H. Albrecht, A family of cosine-sum windows for high-resolution measurements, ICASSP
/// 2001, pp. 3081-3084, side lobes -180.468 dB. The digits are recalled; they add up to 1 and give
/// just these side lobes (see the test), which is their proof.
pub const BLACKMAN_HARRIS_7: [f64; 7] = [
    2.712_203_605_850_388e-1,
    4.334_446_123_274_422e-1,
    2.180_041_228_929_303e-1,
    6.578_534_329_560_609e-2,
    1.076_186_730_534_183e-2,
    7.700_127_105_808_265e-4,
    1.368_088_305_992_921e-5,
];

/// Half width of the main lobe of [`blackman_harris_7`], in bins.
pub const BLACKMAN_HARRIS_7_HALF_WIDTH: usize = 7;

/// The seven-term window over `len` samples, periodic (as if sample `len` were sample 0 again).
///
/// ```text
/// w[m] = Σ_k (-1)^k a_k cos(2π k m / len),   mean a_0, mean square a_0² + ½ Σ_{k≥1} a_k²
/// ```
pub fn blackman_harris_7(len: usize) -> Vec<f64> {
    (0..len)
        .map(|m| {
            BLACKMAN_HARRIS_7
                .iter()
                .enumerate()
                .map(|(k, a)| {
                    let turns = (k * m) % len;
                    let sign = if k % 2 == 0 { 1.0 } else { -1.0 };
                    sign * a * (TAU * turns as f64 / len as f64).cos()
                })
                .sum()
        })
        .collect()
}

/// Equivalent noise bandwidth of [`blackman_harris_7`], in bins: mean square over squared mean.
pub fn blackman_harris_7_noise_bandwidth() -> f64 {
    let [mean, others @ ..] = BLACKMAN_HARRIS_7;
    let square: f64 = mean * mean + 0.5 * others.iter().map(|a| a * a).sum::<f64>();
    square / (mean * mean)
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::f64::consts::PI;

    use crate::numeric::fft::one_sided;

    #[test]
    fn window_is_one_at_its_middle_and_all_but_zero_at_its_ends() {
        let window = blackman_harris_7(64);
        assert!((window[32] - 1.0).abs() < 1e-15);
        assert!(window[0].abs() < 1e-7);
    }

    /// Level of the window's continuous transform at `f` bins, re its top, in dB.
    fn transform_db(f: f64) -> f64 {
        let sinc = |x: f64| {
            if x == 0.0 {
                1.0
            } else {
                (PI * x).sin() / (PI * x)
            }
        };
        let sum: f64 = BLACKMAN_HARRIS_7
            .iter()
            .enumerate()
            .map(|(k, a)| 0.5 * a * (sinc(f - k as f64) + sinc(f + k as f64)))
            .sum();
        20.0 * (sum / BLACKMAN_HARRIS_7[0]).abs().log10()
    }

    #[test]
    fn side_lobes_stand_as_low_as_published() {
        let worst = (70_000..400_000)
            .map(|i| transform_db(f64::from(i) * 1e-4))
            .fold(f64::NEG_INFINITY, f64::max);
        // Albrecht 2001, to his last digit.
        assert!((worst + 180.468).abs() < 0.000_6, "{worst}");
    }

    #[test]
    fn off_its_bins_a_long_tone_leaks_no_more_than_the_side_lobes() {
        let len = 4096;
        let tone = |m: usize| (TAU * 1000.3 * m as f64 / len as f64).cos();
        let samples: Vec<f64> = blackman_harris_7(len)
            .iter()
            .enumerate()
            .map(|(m, w)| w * tone(m))
            .collect();
        let lines = one_sided(&samples);
        let worst = lines
            .iter()
            .enumerate()
            .filter(|(j, _)| j.abs_diff(1000) > BLACKMAN_HARRIS_7_HALF_WIDTH)
            .map(|(_, line)| line.norm() / BLACKMAN_HARRIS_7[0])
            .fold(0.0, f64::max);
        // The samples at the ends, 6e-8, are counted whole in a periodic window: 0.5 dB here.
        assert!(20.0 * worst.log10() < -179.5, "{worst:e}");
    }

    #[test]
    fn noise_bandwidth_is_that_of_the_window_itself() {
        let window = blackman_harris_7(1000);
        let mean = window.iter().sum::<f64>() / 1000.0;
        let square = window.iter().map(|w| w * w).sum::<f64>() / 1000.0;
        let from_samples = square / (mean * mean);
        assert!((blackman_harris_7_noise_bandwidth() - from_samples).abs() < 1e-12);
        assert!((from_samples - 2.63).abs() < 0.01, "{from_samples}");
    }
}
