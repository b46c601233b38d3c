//! Discrete Fourier transform of real samples, scaled to amplitudes.

use std::cell::RefCell;

use rustfft::FftPlanner;
use rustfft::num_complex::Complex64;

thread_local! {
    /// Plans are made once for each length; a planner is cheap to ask and costly to make anew.
    static PLANNER: RefCell<FftPlanner<f64>> = RefCell::new(FftPlanner::new());
}

/// One-sided lines of `samples`, as complex peak amplitudes.
///
/// ```text
/// line[0]   = (1/N) Σ x[m]                                  the mean, real
/// line[j]   = (2/N) Σ x[m] exp(-2πi j m / N)                0 < j < N/2
/// line[N/2] = (1/N) Σ x[m] (-1)^m                           for even N only
/// x[m]      = Re Σ line[j] exp(2πi j m / N)
/// ```
///
/// There are ⌊N/2⌋ + 1 lines, in the unit of the samples. A line's argument is the phase of its
/// cosine at the first sample. No samples give no lines. Any length will do; products of small
/// primes are fastest.
///
/// ```
/// use forehear::numeric::fft::one_sided;
///
/// let lines = one_sided(&[3.0, 1.0, -1.0, 1.0]); // 1 + 2 cos(2πm/4)
/// assert!((lines[0].re - 1.0).abs() < 1e-15);
/// assert!((lines[1].norm() - 2.0).abs() < 1e-15);
/// ```
pub fn one_sided(samples: &[f64]) -> Vec<Complex64> {
    let n = samples.len();
    if n == 0 {
        return Vec::new();
    }
    let mut lines: Vec<Complex64> = samples.iter().map(|&x| Complex64::new(x, 0.0)).collect();
    let plan = PLANNER.with(|planner| planner.borrow_mut().plan_fft_forward(n));
    plan.process(&mut lines);
    lines.truncate(n / 2 + 1);
    let scale = 2.0 / n as f64;
    for line in &mut lines {
        *line *= scale;
    }
    lines[0] *= 0.5;
    if n.is_multiple_of(2) {
        lines[n / 2] *= 0.5;
    }
    lines
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    /// Rounding of a transform of up to a few hundred samples of order one.
    const ROUNDING: f64 = 1e-13;

    proptest! {
        #[test]
        fn power_in_time_is_power_in_lines(samples in prop::collection::vec(-1.0..1.0f64, 1..300)) {
            let n = samples.len();
            let lines = one_sided(&samples);
            let time: f64 = samples.iter().map(|x| x * x).sum::<f64>() / n as f64;
            let frequency: f64 = lines
                .iter()
                .enumerate()
                .map(|(j, line)| {
                    let is_unpaired = j == 0 || 2 * j == n;
                    line.norm_sqr() * if is_unpaired { 1.0 } else { 0.5 }
                })
                .sum();
            prop_assert!((time - frequency).abs() < ROUNDING);
        }
    }

    #[test]
    fn no_samples_give_no_lines() {
        assert!(one_sided(&[]).is_empty());
    }
}
