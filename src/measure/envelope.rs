//! Peak and RMS of a take, their envelopes, and recovery after a burst.
//!
//! Give these the base rate, not the oversampled one: the detector keeps its time constants in
//! single precision, which at 48 kHz costs 0.1 % of a second-long one and grows with the rate.

use std::ops::Range;

use dasp::envelope::Detector;
use dasp::ring_buffer::Fixed;
use dasp::rms::Rms;
use thiserror::Error;

/// A window below this share of the loudest one is silent: the running sum of squares keeps the
/// rounding of what has passed through it, some 1e-16 of its power for each sample at worst.
const SILENT_SHARE: f64 = 1e-7;

/// Why a signal has no envelope or recovery.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum EnvelopeError {
    #[error("sample {index} is not a finite number")]
    NotFinite { index: usize },
    /// Window or time constant below one sample, or not a number.
    #[error("{name} of {seconds} s is not a usable time at {rate_hz} Hz")]
    BadTime {
        name: &'static str,
        seconds: f64,
        rate_hz: f64,
    },
    /// A whole window must fit before the burst and another after it.
    #[error(
        "a burst at samples {burst:?} of {samples} leaves no window of {window} before or after it"
    )]
    NoRoom {
        burst: Range<usize>,
        samples: usize,
        window: usize,
    },
    #[error("the probe before the burst is silent")]
    SilentProbe,
}

/// Level of a take.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TakeLevel {
    /// Largest magnitude, in the unit of the samples.
    pub peak_volts: f64,
    /// Root mean square, DC included, in the unit of the samples.
    pub rms_volts: f64,
    /// Mean, in the unit of the samples.
    pub dc_volts: f64,
    /// 20 log10(peak/RMS); `None` for silence.
    pub crest_db: Option<f64>,
}

/// Peak, RMS and mean of all of `samples`. No samples are silence.
///
/// ```
/// use forehear::measure::envelope::take_level;
///
/// let square = take_level(&[0.3, -0.3, 0.3, -0.3])?;
/// assert!((square.peak_volts - square.rms_volts).abs() < 1e-15);
/// # Ok::<(), forehear::measure::envelope::EnvelopeError>(())
/// ```
///
/// # Errors
/// [`EnvelopeError::NotFinite`].
pub fn take_level(samples: &[f64]) -> Result<TakeLevel, EnvelopeError> {
    check_finite(samples)?;
    let peak = samples
        .iter()
        .map(|&x| dasp::peak::full_wave(x))
        .fold(0.0, f64::max);
    let count = samples.len().max(1) as f64;
    let rms = (samples.iter().map(|x| x * x).sum::<f64>() / count).sqrt();
    Ok(TakeLevel {
        peak_volts: peak,
        rms_volts: rms,
        dc_volts: samples.iter().sum::<f64>() / count,
        crest_db: (rms > 0.0).then(|| 20.0 * (peak / rms).log10()),
    })
}

/// RMS of the last `window_s` seconds at every sample, as if silence came before the first.
///
/// One value a sample; a window of whole periods of a tone gives a flat line. After a loud passage
/// the running sum keeps a rounding of about 1e-16 of its power.
///
/// # Errors
/// [`EnvelopeError::NotFinite`], [`EnvelopeError::BadTime`] for a window below one sample.
pub fn rms_envelope(
    samples: &[f64],
    rate_hz: f64,
    window_s: f64,
) -> Result<Vec<f64>, EnvelopeError> {
    check_finite(samples)?;
    let window = window_samples(rate_hz, window_s)?;
    let mut rms = Rms::<f64, _>::new(Fixed::from(vec![0.0; window]));
    Ok(samples.iter().map(|&x| rms.next(x)).collect())
}

/// Full-wave peak envelope with exponential attack and release: the gap to |x| falls to 1/e
/// within `attack_s` rising, `release_s` falling. An attack of zero follows every peak at once.
///
/// # Errors
/// [`EnvelopeError::NotFinite`], [`EnvelopeError::BadTime`] for a negative time.
pub fn peak_envelope(
    samples: &[f64],
    rate_hz: f64,
    attack_s: f64,
    release_s: f64,
) -> Result<Vec<f64>, EnvelopeError> {
    check_finite(samples)?;
    let frames = |name, seconds: f64| {
        let frames = seconds * rate_hz;
        if frames.is_finite() && frames >= 0.0 {
            Ok(frames as f32)
        } else {
            Err(EnvelopeError::BadTime {
                name,
                seconds,
                rate_hz,
            })
        }
    };
    let attack = frames("attack", attack_s)?;
    let release = frames("release", release_s)?;
    let mut detector = Detector::peak(attack, release);
    Ok(samples.iter().map(|&x| detector.next(x)).collect())
}

/// How a soft steady tone, the probe, comes back after a burst that shut the amplifier.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Recovery {
    /// RMS of the probe over the last window before the burst.
    pub before_rms: f64,
    /// Time from the end of the burst to the first window from which on every window's RMS lies
    /// within the tolerance of `before_rms`; `None` when the take ends before that.
    pub time_s: Option<f64>,
    /// Level of the softest window after the burst re `before_rms`, in dB; `None` when it is
    /// silent, or more than 140 dB below the burst.
    pub deepest_db: Option<f64>,
}

/// Recovery of a probe after a `burst` (a range of samples), within `tolerance_db` (1 dB as a
/// rule).
///
/// The RMS window should hold whole periods of the probe; recovery is told by windows that begin
/// after the burst, so one that is instant takes no time, and what is shorter than a window
/// is smeared over it. Give an output without DC: a bias that creeps back counts as signal.
///
/// # Errors
/// [`EnvelopeError`].
pub fn recovery(
    samples: &[f64],
    rate_hz: f64,
    burst: Range<usize>,
    window_s: f64,
    tolerance_db: f64,
) -> Result<Recovery, EnvelopeError> {
    let window = window_samples(rate_hz, window_s)?;
    let first = burst.end.saturating_add(window - 1);
    if burst.start < window || burst.end < burst.start || first >= samples.len() {
        return Err(EnvelopeError::NoRoom {
            burst,
            samples: samples.len(),
            window,
        });
    }
    let envelope = rms_envelope(samples, rate_hz, window_s)?;
    let before_rms = envelope[burst.start - 1];
    if before_rms <= 0.0 {
        return Err(EnvelopeError::SilentProbe);
    }
    let after = &envelope[first..];
    let level_db = |rms: f64| 20.0 * (rms / before_rms).log10();
    let last_outside = after
        .iter()
        .rposition(|&rms| level_db(rms).abs() > tolerance_db);
    let recovered = last_outside.map_or(0, |place| place + 1);
    let loudest = envelope.iter().fold(0.0_f64, |l, &x| l.max(x));
    let softest = after.iter().fold(f64::INFINITY, |l, &x| l.min(x));
    Ok(Recovery {
        before_rms,
        time_s: (recovered < after.len()).then(|| recovered as f64 / rate_hz),
        deepest_db: (softest > SILENT_SHARE * loudest).then(|| level_db(softest)),
    })
}

fn check_finite(samples: &[f64]) -> Result<(), EnvelopeError> {
    match samples.iter().position(|x| !x.is_finite()) {
        Some(index) => Err(EnvelopeError::NotFinite { index }),
        None => Ok(()),
    }
}

/// Whole samples in a window; the detector counts them in single precision, exact to 2^24.
fn window_samples(rate_hz: f64, seconds: f64) -> Result<usize, EnvelopeError> {
    let frames = (seconds * rate_hz).round();
    if (1.0..=16_777_216.0).contains(&frames) {
        Ok(frames as usize)
    } else {
        Err(EnvelopeError::BadTime {
            name: "window",
            seconds,
            rate_hz,
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;
    use std::f64::consts::{SQRT_2, TAU};

    const RATE: f64 = 48_000.0;

    fn probe(frames: usize, peak: impl Fn(f64) -> f64) -> Vec<f64> {
        (0..frames)
            .map(|m| m as f64 / RATE)
            .map(|t| peak(t) * (TAU * 1000.0 * t).sin())
            .collect()
    }

    proptest! {
        #[test]
        fn running_rms_is_the_rms_of_every_window(
            samples in prop::collection::vec(-10.0..10.0f64, 1..200),
            window in 1usize..40,
        ) {
            let envelope = rms_envelope(&samples, 1.0, window as f64).unwrap();
            for (i, value) in envelope.iter().enumerate() {
                let held = &samples[(i + 1).saturating_sub(window)..=i];
                let plain = held.iter().map(|x| x * x).sum::<f64>() / window as f64;
                prop_assert!((value * value - plain).abs() < 1e-11);
            }
        }

        #[test]
        fn peak_is_never_below_rms_nor_rms_below_mean(
            samples in prop::collection::vec(-10.0..10.0f64, 1..100),
        ) {
            let level = take_level(&samples).unwrap();
            prop_assert!(level.peak_volts >= level.rms_volts * (1.0 - 1e-12));
            prop_assert!(level.rms_volts >= level.dc_volts.abs() * (1.0 - 1e-12));
        }
    }

    #[test]
    fn sine_has_a_crest_of_three_decibels() {
        let level = take_level(&probe(4800, |_| 0.2)).unwrap();
        assert!((level.rms_volts - 0.2 / SQRT_2).abs() < 1e-12);
        assert!((level.crest_db.unwrap() - 20.0 * SQRT_2.log10()).abs() < 1e-9);
        let silence = take_level(&[]).unwrap();
        assert_eq!((silence.peak_volts, silence.crest_db), (0.0, None));
    }

    #[test]
    fn peak_envelope_falls_to_one_over_e_in_its_release_time() {
        let mut samples = vec![0.0; 9600];
        samples[0] = 1.0;
        let envelope = peak_envelope(&samples, RATE, 0.0, 0.1).unwrap();
        assert_eq!(envelope[0], 1.0);
        // Single-precision coefficient: a tenth of a percent of the exponent.
        assert!((envelope[4800] - (-1f64).exp()).abs() < 1e-3);
    }

    /// A probe that comes back exponentially, like a coupling capacitor that discharges: within
    /// 1 dB once depth exp(-t/tau) < 1 - 10^(-1/20).
    #[test]
    fn exponential_recovery_takes_the_time_its_equation_says() {
        let (burst, tau, depth) = (24_000..28_800, 0.2, 0.8);
        let burst_end_s = burst.end as f64 / RATE;
        let samples = probe(96_000, |t| {
            if t < 0.5 {
                0.01
            } else if t < burst_end_s {
                1.0
            } else {
                0.01 * (1.0 - depth * (-(t - burst_end_s) / tau).exp())
            }
        });
        let window_s = 0.002;
        let found = recovery(&samples, RATE, burst, window_s, 1.0).unwrap();
        let expected = tau * (depth / (1.0 - 10f64.powf(-0.05))).ln();
        let time_s = found.time_s.unwrap();
        assert!((time_s - expected).abs() < window_s, "{time_s} {expected}");
        assert!((found.before_rms - 0.01 / SQRT_2).abs() < 1e-9);
        // At the bottom the probe is at 1 - depth, but for what the window averages over.
        assert!((found.deepest_db.unwrap() - 20.0 * 0.2f64.log10()).abs() < 0.3);
    }

    #[test]
    fn amplifier_without_memory_recovers_at_once() {
        let samples = probe(48_000, |t| if (0.4..0.5).contains(&t) { 1.0 } else { 0.01 });
        let found = recovery(&samples, RATE, 19_200..24_000, 0.002, 1.0).unwrap();
        assert_eq!(found.time_s, Some(0.0));
    }

    #[test]
    fn probe_that_never_comes_back_has_no_time() {
        let samples = probe(48_000, |t| if t < 0.5 { 0.01 } else { 0.005 });
        let found = recovery(&samples, RATE, 24_000..24_480, 0.002, 1.0).unwrap();
        assert_eq!(found.time_s, None);
        assert!((found.deepest_db.unwrap() + 6.02).abs() < 0.01);
        // Cut off altogether.
        let samples = probe(48_000, |t| if t < 0.5 { 0.01 } else { 0.0 });
        let found = recovery(&samples, RATE, 24_000..24_480, 0.002, 1.0).unwrap();
        assert_eq!((found.time_s, found.deepest_db), (None, None));
    }

    #[test]
    fn impossible_requests_are_refused() {
        let samples = probe(4800, |_| 0.01);
        let no_room = |burst| {
            let refused = recovery(&samples, RATE, burst, 0.01, 1.0);
            assert!(
                matches!(refused, Err(EnvelopeError::NoRoom { .. })),
                "{refused:?}"
            );
        };
        no_room(100..1000);
        no_room(1000..4700);
        no_room(1000..usize::MAX);
        let silent = recovery(&[0.0; 4800], RATE, 1000..2000, 0.01, 1.0);
        assert_eq!(silent, Err(EnvelopeError::SilentProbe));
        assert!(rms_envelope(&samples, RATE, 0.0).is_err());
        assert!(rms_envelope(&samples, RATE, f64::NAN).is_err());
        assert!(peak_envelope(&samples, RATE, -1.0, 0.1).is_err());
        let broken = EnvelopeError::NotFinite { index: 1 };
        assert_eq!(take_level(&[0.0, f64::INFINITY]), Err(broken));
    }
}
