//! Tones: coherent sines, pairs, bursts.

use super::Signal;
use std::f64::consts::{PI, TAU};

/// The bin nearest to `nominal_hz` whose tone repeats only after the whole of `frames`, and its frequency.
///
/// f = k rate / frames with k odd and gcd(k, frames) = 1: a whole number of cycles fits the frame, so no window is needed, and
/// no two samples are taken at the same phase, so that aliases of harmonics do not fall on harmonics unless they must. (A tone
/// that divides the rate hides its own aliases.) Of two equally near bins the lower one is taken.
///
/// # Panics
/// When `frames` < 3, or the frequency is not above 0 and below half the rate.
///
/// ```
/// use forehear::signal::coherent_bin;
/// let (k, f) = coherent_bin(1000.0, 48_000.0, 48_000);
/// assert_eq!((k, f), (1001, 1001.0));
/// ```
pub fn coherent_bin(nominal_hz: f64, rate: f64, frames: usize) -> (usize, f64) {
    assert!(frames >= 3, "a tone needs three samples a period");
    assert!(
        nominal_hz > 0.0 && nominal_hz < rate / 2.0,
        "a tone lies between 0 and half the rate, not at {nominal_hz} of {rate} Hz"
    );
    let ideal = nominal_hz * frames as f64 / rate;
    let is_good = |k: usize| k % 2 == 1 && gcd(k, frames) == 1;
    // k = 1 is always good, so the search ends.
    let below = (1..=ideal.floor() as usize).rev().find(|&k| is_good(k));
    let top = (frames - 1) / 2;
    let above = (ideal.floor() as usize + 1..=top).find(|&k| is_good(k));
    let k = match (below, above) {
        (Some(b), Some(a)) if a as f64 - ideal < ideal - b as f64 => a,
        (Some(b), _) => b,
        (None, Some(a)) => a,
        (None, None) => unreachable!("bin 1 lies below half of three frames or more"),
    };
    (k, k as f64 * rate / frames as f64)
}

fn gcd(mut a: usize, mut b: usize) -> usize {
    while b != 0 {
        (a, b) = (b, a % b);
    }
    a
}

/// Sample n of a sine with `k` cycles in `period` samples: sin(2 pi k n / period + phase), periodic to the last bit.
fn coherent_sample(k: usize, period: usize, n: usize, phase_rad: f64) -> f64 {
    let turns = (k as u128 * n as u128 % period as u128) as f64 / period as f64;
    (TAU * turns + phase_rad).sin()
}

/// A sine of `cycles` in every `period` samples, `frames` long: peak sin(2 pi cycles n / period).
///
/// # Panics
/// When `period` is 0.
pub fn coherent_tone(cycles: usize, period: usize, peak: f64, rate: f64, frames: usize) -> Signal {
    assert!(period > 0, "a period has samples");
    let samples = (0..frames)
        .map(|n| peak * coherent_sample(cycles, period, n, 0.0))
        .collect();
    Signal { samples, rate }
}

/// A sine: peak sin(2 pi f t + phase).
pub fn tone(frequency_hz: f64, peak: f64, phase_rad: f64, rate: f64, frames: usize) -> Signal {
    let samples = (0..frames)
        .map(|n| peak * turning(frequency_hz, rate, n, phase_rad))
        .collect();
    Signal { samples, rate }
}

/// sin(2 pi f n / rate + phase), the whole turns taken off before the sine so that late samples are as exact as early ones.
fn turning(frequency_hz: f64, rate: f64, n: usize, phase_rad: f64) -> f64 {
    let turns = frequency_hz * n as f64 / rate;
    (TAU * turns.fract() + phase_rad).sin()
}

/// Two sines added, each (hertz, peak), both with phase 0. The sum's peak comes near the sum of the peaks.
pub fn two_tone(tones: [(f64, f64); 2], rate: f64, frames: usize) -> Signal {
    let samples = (0..frames)
        .map(|n| {
            tones
                .iter()
                .map(|&(f, peak)| peak * turning(f, rate, n, 0.0))
                .sum()
        })
        .collect();
    Signal { samples, rate }
}

/// Bursts of a sine, each with raised-cosine edges.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Bursts {
    pub frequency_hz: f64,
    /// Peak inside a burst.
    pub peak: f64,
    /// From the start of a burst's rise to the end of its fall, in seconds.
    pub on_s: f64,
    /// Silence after each burst, in seconds.
    pub off_s: f64,
    /// Length of each edge, in seconds; at most half of `on_s`.
    pub edge_s: f64,
    pub count: usize,
}

impl Bursts {
    /// The bursts one after the other, each followed by its silence; each starts at phase 0.
    ///
    /// Edge: w(t) = (1 - cos(pi t / edge)) / 2, whose spectrum falls by 18 dB an octave; mirrored at the end.
    ///
    /// # Panics
    /// When the edges overlap or a length is negative.
    pub fn signal(&self, rate: f64) -> Signal {
        assert!(
            self.edge_s >= 0.0 && self.off_s >= 0.0 && 2.0 * self.edge_s <= self.on_s,
            "both edges fit into a burst, and lengths are not negative"
        );
        let on = (self.on_s * rate).round() as usize;
        let off = (self.off_s * rate).round() as usize;
        let one = (0..on).map(|n| {
            let edge = |frames: f64| {
                if frames >= self.edge_s * rate {
                    1.0
                } else {
                    (1.0 - (PI * frames / (self.edge_s * rate)).cos()) / 2.0
                }
            };
            self.peak
                * turning(self.frequency_hz, rate, n, 0.0)
                * edge(n as f64)
                * edge((on - n) as f64)
        });
        let one: Vec<f64> = one.chain(std::iter::repeat_n(0.0, off)).collect();
        Signal {
            samples: one.repeat(self.count),
            rate,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn coherent_bins_are_odd_share_no_factor_and_are_the_nearest() {
        for frames in [3, 4, 5, 100, 384, 4096, 48_000, 65_536, 99_999] {
            for nominal in [82.4, 220.0, 1000.0, 4110.0, 15_000.0] {
                let (k, f) = coherent_bin(nominal, 48_000.0, frames);
                assert!(k % 2 == 1 && gcd(k, frames) == 1 && 2 * k < frames);
                assert!((f - k as f64 * 48_000.0 / frames as f64).abs() < 1e-9);
                let nearest = (1..frames.div_ceil(2))
                    .filter(|&j| j % 2 == 1 && gcd(j, frames) == 1)
                    .map(|j| (j as f64 * 48_000.0 / frames as f64 - nominal).abs())
                    .fold(f64::INFINITY, f64::min);
                assert!(((f - nominal).abs() - nearest).abs() < 1e-9);
            }
        }
    }

    #[test]
    fn a_coherent_tone_repeats_to_the_last_bit() {
        let x = coherent_tone(85, 4096, 0.2, 48_000.0, 3 * 4096).samples;
        assert_eq!(x[..4096], x[4096..8192]);
        assert_eq!(x[..4096], x[8192..]);
        let y = tone(85.0 * 48_000.0 / 4096.0, 0.2, 0.0, 48_000.0, 3 * 4096).samples;
        for (a, b) in x.iter().zip(&y) {
            assert!((a - b).abs() < 1e-12);
        }
    }

    #[test]
    fn two_tones_are_the_sum_of_their_tones() {
        let both = two_tone([(330.0, 0.1), (440.0, 0.3)], 48_000.0, 1000).samples;
        let a = tone(330.0, 0.1, 0.0, 48_000.0, 1000).samples;
        let b = tone(440.0, 0.3, 0.0, 48_000.0, 1000).samples;
        for n in 0..1000 {
            assert!((both[n] - a[n] - b[n]).abs() < 1e-15);
        }
    }

    #[test]
    fn bursts_rise_hold_fall_and_pause() {
        let bursts = Bursts {
            frequency_hz: 1000.0,
            peak: 0.5,
            on_s: 0.05,
            off_s: 0.075,
            edge_s: 0.005,
            count: 4,
        };
        let signal = bursts.signal(48_000.0);
        assert_eq!(signal.samples.len(), 4 * 6000);
        let one = &signal.samples[..6000];
        assert_eq!(one[0], 0.0);
        assert!(one[2400..].iter().all(|&x| x == 0.0));
        let peak = |x: &[f64]| x.iter().fold(0.0f64, |m, v| m.max(v.abs()));
        assert!((peak(&one[240..2160]) - 0.5).abs() < 1e-12);
        // Half way up the edge the envelope is one half.
        assert!((peak(&one[108..132]) - 0.25).abs() < 0.05);
        assert_eq!(signal.samples[..6000], signal.samples[18_000..]);
    }
}
