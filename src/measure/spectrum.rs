//! Spectrum of a long render of a coherent tone, and the aliases in it.

use rustfft::num_complex::Complex64;
use thiserror::Error;

use crate::numeric::fft::one_sided;
use crate::numeric::window::{
    BLACKMAN_HARRIS_7, BLACKMAN_HARRIS_7_HALF_WIDTH, blackman_harris_7,
    blackman_harris_7_noise_bandwidth,
};

/// How a stretch of signal is cut out for its spectrum.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Window {
    /// Exact when the stretch repeats: every line stands in one bin. A signal that still settles
    /// leaks over all bins and is then mistaken for aliases.
    Rectangular,
    /// Seven-term Blackman-Harris. A line spreads over seven bins to each side, and what does not
    /// repeat leaks less.
    BlackmanHarris7,
}

impl Window {
    /// Level below which a line re the fundamental says nothing, in dBc.
    ///
    /// Rectangular: rounding of the transform, -260 dBc at 65 536 samples, a little more for longer
    /// ones. Blackman-Harris: its side lobes, -180 dBc. Neither counts what the signal itself
    /// brings.
    pub fn floor_dbc(self) -> f64 {
        match self {
            Window::Rectangular => -260.0,
            Window::BlackmanHarris7 => -180.0,
        }
    }

    /// Bins to each side of a line that belong to it.
    fn half_width(self) -> usize {
        match self {
            Window::Rectangular => 0,
            Window::BlackmanHarris7 => BLACKMAN_HARRIS_7_HALF_WIDTH - 1,
        }
    }

    fn noise_bandwidth(self) -> f64 {
        match self {
            Window::Rectangular => 1.0,
            Window::BlackmanHarris7 => blackman_harris_7_noise_bandwidth(),
        }
    }
}

/// Why a spectrum gives no figure.
#[derive(Clone, Copy, Debug, PartialEq, Error)]
pub enum SpectrumError {
    #[error("sample {index} is not a finite number")]
    NotFinite { index: usize },
    /// The tone must lie strictly between DC and half the rate, and share no factor with the
    /// length: otherwise its aliases fall on its harmonics and hide there.
    #[error("a tone of {bin} periods in {samples} samples hides its own aliases")]
    NotCoherent { samples: usize, bin: usize },
    /// The harmonics' main lobes leave no room between them.
    #[error("a windowed tone needs more than {least} periods, has {bin}")]
    TooLow { bin: usize, least: usize },
    #[error("no fundamental in bin {bin}")]
    NoFundamental { bin: usize },
    /// Two tones whose products of low order fall together cannot be told apart.
    #[error(
        "tones in bins {first} and {second} of {samples} samples: products fall together or outside"
    )]
    ProductsCoincide {
        samples: usize,
        first: usize,
        second: usize,
    },
}

/// One-sided amplitude spectrum: a sine that repeats in the stretch shows its peak in one bin,
/// whatever the window.
#[derive(Clone, Debug)]
pub struct Spectrum {
    lines: Vec<Complex64>,
    samples: usize,
    rate_hz: f64,
}

impl Spectrum {
    /// Spectrum of all of `samples`. With a window the mean is taken out first, and bin 0 is empty.
    ///
    /// # Errors
    /// [`SpectrumError::NotFinite`].
    pub fn of(samples: &[f64], rate_hz: f64, window: Window) -> Result<Self, SpectrumError> {
        if let Some(index) = samples.iter().position(|x| !x.is_finite()) {
            return Err(SpectrumError::NotFinite { index });
        }
        let lines = match window {
            Window::Rectangular => one_sided(samples),
            Window::BlackmanHarris7 => {
                let mean = samples.iter().sum::<f64>() / samples.len().max(1) as f64;
                let weighted: Vec<f64> = blackman_harris_7(samples.len())
                    .iter()
                    .zip(samples)
                    .map(|(w, x)| w * (x - mean) / BLACKMAN_HARRIS_7[0])
                    .collect();
                one_sided(&weighted)
            }
        };
        Ok(Self {
            lines,
            samples: samples.len(),
            rate_hz,
        })
    }

    /// Frequency of a bin, in hertz.
    pub fn frequency_hz(&self, bin: usize) -> f64 {
        bin as f64 * self.rate_hz / self.samples as f64
    }

    /// Bins from DC up to half the rate.
    pub fn bins(&self) -> usize {
        self.lines.len()
    }

    /// Peak amplitude in a bin, in the unit of the samples; `None` above half the rate.
    pub fn peak(&self, bin: usize) -> Option<f64> {
        self.lines.get(bin).map(|line| line.norm())
    }
}

/// Lines that are no harmonics of a test tone.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct AliasReport {
    /// Level of the worst line re the fundamental; `None` when no line stands above the floor.
    pub worst_dbc: Option<f64>,
    /// Its frequency.
    pub worst_hz: Option<f64>,
    /// Power of all of them together re the fundamental's, unweighted; `None` when it is nil.
    pub total_dbc: Option<f64>,
    /// Level that can be told from the method itself: see [`Window::floor_dbc`].
    pub floor_dbc: f64,
    /// The fundamental's peak amplitude, in the unit of the samples.
    pub fundamental_peak: f64,
    /// The fundamental's frequency.
    pub fundamental_hz: f64,
}

/// Greatest common divisor.
fn common_factor(a: usize, b: usize) -> usize {
    if b == 0 { a } else { common_factor(b, a % b) }
}

/// Worst line from above DC to `limit_hz` that is no harmonic of the tone in bin `bin`, re the
/// fundamental.
///
/// `samples` are a settled response to a sine with exactly `bin` periods in them. A harmonic n that
/// lies above half the rate folds to bin |n k - j N|; as k and N share no factor, folded harmonics
/// miss the true ones up to orders near N. With [`Window::Rectangular`] anything that does not
/// repeat counts as an alias too, so the figure errs to the bad side. With
/// [`Window::BlackmanHarris7`] lines within six bins of a harmonic, or of DC, are not seen.
///
/// # Errors
/// [`SpectrumError`].
///
/// ```
/// use forehear::measure::spectrum::{Window, alias_level};
///
/// // Cubed without oversampling: 3 x 97 periods in 512 samples fold to bin 221.
/// let cubed: Vec<f64> = (0..512)
///     .map(|m| (std::f64::consts::TAU * 97.0 * m as f64 / 512.0).sin().powi(3))
///     .collect();
/// let aliases = alias_level(&cubed, 97, 24_000.0, 48_000.0, Window::Rectangular)?;
/// assert!((aliases.worst_dbc.unwrap() - 20.0 * (1.0f64 / 3.0).log10()).abs() < 1e-9);
/// assert!((aliases.worst_hz.unwrap() - 48_000.0 * 221.0 / 512.0).abs() < 1e-9);
/// # Ok::<(), forehear::measure::spectrum::SpectrumError>(())
/// ```
pub fn alias_level(
    samples: &[f64],
    bin: usize,
    limit_hz: f64,
    rate_hz: f64,
    window: Window,
) -> Result<AliasReport, SpectrumError> {
    let n = samples.len();
    if bin == 0 || 2 * bin >= n || common_factor(n, bin) != 1 {
        return Err(SpectrumError::NotCoherent { samples: n, bin });
    }
    let half_width = window.half_width();
    let least = 2 * half_width + 1;
    if half_width > 0 && bin <= least {
        return Err(SpectrumError::TooLow { bin, least });
    }
    let spectrum = Spectrum::of(samples, rate_hz, window)?;
    let fundamental_peak = spectrum.lines[bin].norm();
    let largest = samples.iter().fold(0.0_f64, |l, x| l.max(x.abs()));
    if fundamental_peak <= 4.0 * f64::EPSILON * largest {
        return Err(SpectrumError::NoFundamental { bin });
    }
    let mut worst: Option<(usize, f64)> = None;
    let mut power = 0.0;
    for (j, line) in spectrum.lines.iter().enumerate() {
        let beside = j % bin;
        let is_harmonic = beside <= half_width || bin - beside <= half_width;
        if is_harmonic || spectrum.frequency_hz(j) > limit_hz {
            continue;
        }
        let peak = line.norm();
        power += peak * peak;
        if worst.is_none_or(|(_, w)| peak > w) {
            worst = Some((j, peak));
        }
    }
    let floor_dbc = window.floor_dbc();
    let above_floor = |ratio: f64| {
        let level = 20.0 * ratio.log10();
        (level > floor_dbc).then_some(level)
    };
    let worst = worst.and_then(|(j, peak)| Some((j, above_floor(peak / fundamental_peak)?)));
    Ok(AliasReport {
        worst_dbc: worst.map(|(_, level)| level),
        worst_hz: worst.map(|(j, _)| spectrum.frequency_hz(j)),
        total_dbc: above_floor((power / window.noise_bandwidth()).sqrt() / fundamental_peak),
        floor_dbc,
        fundamental_peak,
        fundamental_hz: spectrum.frequency_hz(bin),
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;
    use std::f64::consts::TAU;

    const RATE: f64 = 48_000.0;

    fn tone(n: usize, bin: usize, wave: impl Fn(f64) -> f64) -> Vec<f64> {
        (0..n)
            .map(|m| wave(TAU * ((m * bin) % n) as f64 / n as f64))
            .collect()
    }

    fn with_line(mut samples: Vec<f64>, bin: usize, peak: f64) -> Vec<f64> {
        let n = samples.len();
        for (x, line) in samples
            .iter_mut()
            .zip(tone(n, bin, |t| peak * (t + 0.4).cos()))
        {
            *x += line;
        }
        samples
    }

    proptest! {
        #[test]
        fn planted_line_is_found_at_its_level(
            level_dbc in -160.0..-20.0f64,
            line in 20usize..1800,
            scale in 1e-3..1e3f64,
        ) {
            let bin = 101;
            let beside = line % bin;
            prop_assume!(beside > 6 && bin - beside > 6);
            let peak = 10f64.powf(level_dbc / 20.0);
            let clean = tone(4096, bin, |t| t.sin() + 0.3 + 0.1 * (3.0 * t).sin());
            let samples: Vec<f64> = with_line(clean, line, peak)
                .iter()
                .map(|x| x * scale)
                .collect();
            for window in [Window::Rectangular, Window::BlackmanHarris7] {
                let found = alias_level(&samples, bin, 24_000.0, RATE, window).unwrap();
                prop_assert!((found.worst_dbc.unwrap() - level_dbc).abs() < 1e-2);
                prop_assert!((found.worst_hz.unwrap() - line as f64 * RATE / 4096.0).abs() < 1e-9);
                // Alone, its power is all the power there is, unless a harmonic's lobe hides part.
                if beside > 12 && bin - beside > 12 {
                    prop_assert!((found.total_dbc.unwrap() - level_dbc).abs() < 0.01);
                }
                prop_assert!((found.fundamental_peak / scale - 1.0).abs() < 1e-9);
            }
        }
    }

    #[test]
    fn clean_tone_has_no_aliases_above_either_floor() {
        let samples = tone(65_536, 1361, |t| {
            0.5 * t.sin() + 0.1 * (5.0 * t).cos() + 1.0
        });
        for window in [Window::Rectangular, Window::BlackmanHarris7] {
            let report = alias_level(&samples, 1361, 20_000.0, RATE, window).unwrap();
            assert_eq!(report.worst_dbc, None, "{window:?}");
            assert_eq!(report.worst_hz, None);
        }
    }

    #[test]
    fn lines_above_the_limit_do_not_count() {
        let samples = with_line(tone(4096, 101, f64::sin), 1750, 0.01);
        let line_hz = 1750.0 * RATE / 4096.0;
        let of = |limit| alias_level(&samples, 101, limit, RATE, Window::Rectangular).unwrap();
        assert!(of(line_hz + 1.0).worst_dbc.is_some());
        assert!(of(line_hz - 1.0).worst_dbc.is_none());
    }

    #[test]
    fn drift_leaks_less_through_the_window() {
        // A bias that still moves by a ten-thousandth of the tone.
        let n = 4096;
        let samples: Vec<f64> = tone(n, 101, f64::sin)
            .iter()
            .enumerate()
            .map(|(m, x)| x + 1e-4 * (-3.0 * m as f64 / n as f64).exp())
            .collect();
        let of = |window| alias_level(&samples, 101, 20_000.0, RATE, window).unwrap();
        let plain = of(Window::Rectangular).worst_dbc.unwrap();
        assert!(plain > -120.0);
        assert!(
            of(Window::BlackmanHarris7)
                .worst_dbc
                .is_none_or(|level| level < plain - 30.0)
        );
    }

    #[test]
    fn tone_that_hides_its_aliases_is_refused() {
        // 1 kHz at 48 kHz: the classic.
        let samples = tone(48_000, 1000, f64::sin);
        let refused = alias_level(&samples, 1000, 20_000.0, RATE, Window::Rectangular);
        assert_eq!(
            refused,
            Err(SpectrumError::NotCoherent {
                samples: 48_000,
                bin: 1000
            })
        );
        let of = |samples: &[f64], bin, window| alias_level(samples, bin, 20_000.0, RATE, window);
        assert!(of(&samples, 0, Window::Rectangular).is_err());
        assert!(of(&samples, 24_001, Window::Rectangular).is_err());
        let low = of(&tone(4096, 13, f64::sin), 13, Window::BlackmanHarris7);
        assert_eq!(low, Err(SpectrumError::TooLow { bin: 13, least: 13 }));
        let silent = of(&[0.0; 4096], 101, Window::Rectangular);
        assert_eq!(silent, Err(SpectrumError::NoFundamental { bin: 101 }));
        let broken = of(&[f64::NAN; 4096], 101, Window::Rectangular);
        assert_eq!(broken, Err(SpectrumError::NotFinite { index: 0 }));
    }
}
