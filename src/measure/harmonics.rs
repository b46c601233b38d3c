//! Harmonics of a periodic waveform, and the distortion figures made of them.

use std::f64::consts::SQRT_2;

use rustfft::num_complex::Complex64;
use thiserror::Error;

use super::fourier_basis::{Basis, Lines};
use crate::numeric::fft::one_sided;

/// Highest harmonic in a [`HarmonicReport`]. Chosen: a tenth harmonic of a 1 kHz tone is still
/// within the band of a guitar loudspeaker, and a sum must say where it ends to be comparable.
pub const HIGHEST: usize = 10;

/// Samples up to which ten harmonics are correlated directly; above, the whole transform is taken.
/// Chosen by measurement.
const DIRECT_UP_TO: usize = 8192;

/// A line below this share of the largest sample is rounding, not signal: four units in the last
/// place. The rounding of the samples themselves spreads below it over all lines.
const ROUNDING: f64 = 4.0 * f64::EPSILON;

/// Why a waveform has no harmonic figures.
#[derive(Clone, Copy, Debug, PartialEq, Error)]
pub enum HarmonicsError {
    /// Two samples or fewer in a period cannot carry even the fundamental.
    #[error("{samples} samples for {periods} periods; more than two samples a period are needed")]
    TooShort { samples: usize, periods: usize },
    #[error("sample {index} is not a finite number")]
    NotFinite { index: usize },
    /// Nothing to relate the harmonics to.
    #[error("no fundamental: {fundamental_peak:e} peak beside a waveform reaching {largest:e}")]
    NoFundamental { fundamental_peak: f64, largest: f64 },
}

/// Fourier coefficients of a whole number of periods of a periodic waveform.
///
/// ```text
/// x(t) = DC + Σ A_n cos(n ω t + φ_n),   C_n = A_n exp(i φ_n) = (2/N) Σ_m x[m] exp(-2πi n k m / N)
/// ```
///
/// for k periods in N samples. Exact (no window, no leakage) when the waveform repeats after these
/// samples and holds nothing at or above half the sample rate; whatever stands above that has been
/// folded down before it came here. Amplitudes are peak, in the unit of the samples.
#[derive(Clone, Debug)]
pub struct HarmonicAnalysis {
    dc: f64,
    largest: f64,
    /// Only harmonics below half the sample rate.
    lines: Lines,
}

impl HarmonicAnalysis {
    /// Analysis of exactly one period, harmonics 1 to [`HIGHEST`].
    ///
    /// # Errors
    /// [`HarmonicsError::TooShort`] below three samples, [`HarmonicsError::NotFinite`].
    ///
    /// ```
    /// use forehear::measure::harmonics::HarmonicAnalysis;
    ///
    /// // The harmonics of x + 0.1 x² under a sine are those of the trigonometric identity.
    /// let period: Vec<f64> = (0..383)
    ///     .map(|m| (std::f64::consts::TAU * m as f64 / 383.0).sin())
    ///     .map(|x| x + 0.1 * x * x)
    ///     .collect();
    /// let report = HarmonicAnalysis::of_period(&period)?.report()?;
    /// assert!((report.thd_percent - 5.0).abs() < 1e-12);
    /// assert!((report.dc - 0.05).abs() < 1e-15);
    /// # Ok::<(), forehear::measure::harmonics::HarmonicsError>(())
    /// ```
    pub fn of_period(samples: &[f64]) -> Result<Self, HarmonicsError> {
        Self::of_periods(samples, 1, HIGHEST)
    }

    /// Analysis of exactly `periods` periods, harmonics 1 to `highest` as far as they lie below
    /// half the sample rate.
    ///
    /// # Errors
    /// As [`HarmonicAnalysis::of_period`]; zero periods are too short as well.
    pub fn of_periods(
        samples: &[f64],
        periods: usize,
        highest: usize,
    ) -> Result<Self, HarmonicsError> {
        let n = samples.len();
        if periods == 0 || n <= 2 * periods || highest == 0 {
            return Err(HarmonicsError::TooShort {
                samples: n,
                periods,
            });
        }
        let (sum, largest) = sum_and_largest(samples);
        if !sum.is_finite()
            && let Some(index) = samples.iter().position(|x| !x.is_finite())
        {
            return Err(HarmonicsError::NotFinite { index });
        }
        let dc = sum / n as f64;
        let count = highest.min((n - 1) / 2 / periods);
        let lines = if n <= DIRECT_UP_TO && count <= HIGHEST {
            Basis::get(n, periods, count).lines(samples, dc)
        } else {
            transformed(samples, dc, periods, count)
        };
        Ok(Self { dc, largest, lines })
    }

    /// Mean of the waveform.
    pub fn dc(&self) -> f64 {
        self.dc
    }

    /// Complex peak amplitude of harmonic `n` (1 is the fundamental); `None` for 0, above the
    /// highest asked for, and at or above half the sample rate. Its argument is the phase of the
    /// cosine at the first sample.
    pub fn harmonic(&self, n: usize) -> Option<Complex64> {
        self.lines.amplitudes.get(n.checked_sub(1)?).copied()
    }

    /// Root mean square of the waveform without its mean.
    pub fn rms(&self) -> f64 {
        self.lines.ac_mean_square.sqrt()
    }

    /// Harmonic `n` over the fundamental, as a complex ratio with the origin of time moved to a
    /// positive peak of the fundamental's cosine:
    ///
    /// ```text
    /// x(t) = DC + H1 [cos t + Σ |r_n| cos(n t + ψ_n)],   ψ_n = φ_n - n φ_1
    /// ```
    ///
    /// Independent of scale, polarity-true, and independent of where the period was cut.
    /// `None` where there is no fundamental or no such harmonic.
    pub fn relative(&self, n: usize) -> Option<Complex64> {
        let fundamental = self.fundamental().ok()?;
        let harmonic = self.harmonic(n)?;
        let unit = fundamental / fundamental.norm();
        Some(harmonic * unit.conj().powu(n as u32) / fundamental.norm())
    }

    /// Signed harmonic `n` in percent of the fundamental: its magnitude, with the sign of cos ψ_n
    /// (see [`HarmonicAnalysis::relative`]).
    ///
    /// Positive second: the positive half is the taller and sharper one. Positive third: both
    /// halves are sharper; negative third: both are flattened, as by compression.
    pub fn signed_percent(&self, n: usize) -> Option<f64> {
        let ratio = self.relative(n)?;
        Some(100.0 * ratio.norm().copysign(ratio.re))
    }

    /// Total harmonic distortion to the fundamental, THD_F = √(Σ U_n²)/U_1 for n = 2..=`highest`,
    /// as a ratio. Harmonics that were not analyzed are not counted.
    pub fn thd(&self, highest: usize) -> Option<f64> {
        self.weighted(highest, |_| 1.0)
    }

    /// √(Σ (w(n) U_n)²)/U_1 for n = 2..=`highest`, as a ratio.
    fn weighted(&self, highest: usize, weight: impl Fn(f64) -> f64) -> Option<f64> {
        let fundamental = self.fundamental().ok()?;
        let sum: f64 = self
            .lines
            .amplitudes
            .iter()
            .take(highest)
            .enumerate()
            .skip(1)
            .map(|(i, a)| weight((i + 1) as f64).powi(2) * a.norm_sqr())
            .sum();
        Some((sum / fundamental.norm_sqr()).sqrt())
    }

    fn fundamental(&self) -> Result<Complex64, HarmonicsError> {
        let fundamental = self.lines.amplitudes[0];
        if fundamental.norm() > ROUNDING * self.largest {
            Ok(fundamental)
        } else {
            Err(HarmonicsError::NoFundamental {
                fundamental_peak: fundamental.norm(),
                largest: self.largest,
            })
        }
    }

    /// The usual figures.
    ///
    /// # Errors
    /// [`HarmonicsError::NoFundamental`] for silence, DC, or a waveform without its first harmonic.
    pub fn report(&self) -> Result<HarmonicReport, HarmonicsError> {
        let fundamental = self.fundamental()?;
        let fundamental_peak = fundamental.norm();
        let above_rounding = |n: usize| {
            let peak = self.harmonic(n)?.norm();
            (peak > ROUNDING * self.largest).then_some(peak)
        };
        let ratio = |weight: fn(f64) -> f64| self.weighted(HIGHEST, weight).unwrap_or(0.0);
        let thd = ratio(|_| 1.0);
        Ok(HarmonicReport {
            fundamental_peak,
            dc: self.dc,
            rms: self.rms(),
            harmonics_dbc: std::array::from_fn(|i| {
                above_rounding(i + 2).map(|peak| 20.0 * (peak / fundamental_peak).log10())
            }),
            phases_deg: std::array::from_fn(|i| {
                let n = i + 2;
                above_rounding(n)?;
                let cosine_deg = self.relative(n)?.arg().to_degrees();
                Some(wrap_degrees(cosine_deg - 90.0 * (n as f64 - 1.0)))
            }),
            signed_percent: std::array::from_fn(|i| {
                above_rounding(i + 2)?;
                self.signed_percent(i + 2)
            }),
            thd_percent: 100.0 * thd,
            thd_total_percent: 100.0 * thd / thd.hypot(1.0),
            residual_percent: 100.0
                * (self.lines.residual_mean_square / self.lines.ac_mean_square).sqrt(),
            weighted_rma_percent: 100.0 * ratio(|n| n / 2.0),
            weighted_shorter_percent: 100.0 * ratio(|n| n * n / 4.0),
        })
    }
}

/// Sum and largest magnitude, in eight partial results.
fn sum_and_largest(samples: &[f64]) -> (f64, f64) {
    let (blocks, rest) = samples.as_chunks::<8>();
    let (mut sums, mut largest) = ([0.0; 8], [0.0_f64; 8]);
    for block in blocks {
        for lane in 0..8 {
            sums[lane] += block[lane];
            largest[lane] = largest[lane].max(block[lane].abs());
        }
    }
    let sum = sums.iter().sum::<f64>() + rest.iter().sum::<f64>();
    let largest = largest
        .iter()
        .chain(rest)
        .fold(0.0_f64, |l, x| l.max(x.abs()));
    (sum, largest)
}

/// The same as [`Basis::lines`] by the whole transform.
fn transformed(samples: &[f64], dc: f64, periods: usize, count: usize) -> Lines {
    let n = samples.len();
    let centered: Vec<f64> = samples.iter().map(|x| x - dc).collect();
    let lines = one_sided(&centered);
    // Parseval: the residual is a sum of lines, so nothing cancels.
    let mean_square = |j: usize| {
        let is_unpaired = 2 * j == n;
        lines[j].norm_sqr() * if is_unpaired { 1.0 } else { 0.5 }
    };
    let residual: f64 = (1..lines.len())
        .filter(|&j| j != periods)
        .map(mean_square)
        .sum();
    Lines {
        amplitudes: (1..=count).map(|h| lines[h * periods]).collect(),
        ac_mean_square: residual + mean_square(periods),
        residual_mean_square: residual,
    }
}

/// The same angle in (-180, 180].
fn wrap_degrees(angle: f64) -> f64 {
    let wrapped = angle.rem_euclid(360.0);
    if wrapped > 180.0 {
        wrapped - 360.0
    } else {
        wrapped
    }
}

/// Harmonic figures of a periodic waveform.
///
/// U_n is the RMS (or, in ratios, the peak) amplitude of harmonic n; sums run over n = 2..10. The
/// definitions follow IEC 60268-3 in kind (distortion as a ratio of harmonics, taken at a stated
/// level and load); which of the two usual denominators a figure has is in its name, and its number
/// of harmonics is fixed here. They are those of a periodic waveform without noise.
#[derive(Clone, Debug, PartialEq)]
pub struct HarmonicReport {
    /// U_1 as a peak amplitude, in the unit of the samples.
    pub fundamental_peak: f64,
    /// Mean, in the unit of the samples.
    pub dc: f64,
    /// Root mean square without the mean, in the unit of the samples.
    pub rms: f64,
    /// H2 to H10 as 20 log10(U_n/U_1). `None` at or above half the sample rate, and below the
    /// rounding of the samples (about -300 dB re the largest of them, DC included).
    pub harmonics_dbc: [Option<f64>; HIGHEST - 1],
    /// Phase of H2 to H10 relative to the fundamental's, sine convention, degrees in (-180, 180]:
    ///
    /// ```text
    /// x(t) = DC + Σ A_n sin(n ω t + θ_n),   phase_n = θ_n - n θ_1
    /// ```
    ///
    /// In the cosine convention of [`HarmonicAnalysis::relative`] it is ψ_n = phase_n + 90 (n - 1).
    pub phases_deg: [Option<f64>; HIGHEST - 1],
    /// H2 to H10, signed, in percent of the fundamental: see [`HarmonicAnalysis::signed_percent`].
    pub signed_percent: [Option<f64>; HIGHEST - 1],
    /// THD_F = √(Σ U_n²)/U_1, in percent.
    pub thd_percent: f64,
    /// THD_R = √(Σ U_n²)/√(U_1² + Σ U_n²), in percent: the denominator of IEC 60268-3.
    /// THD_R = THD_F/√(1 + THD_F²) as ratios.
    pub thd_total_percent: f64,
    /// Everything but DC and fundamental over everything but DC, RMS, in percent. In the manner of
    /// AES17's THD+N, but for an ideal notch and no band limit: harmonics above the tenth, and
    /// whatever is not harmonic, count too.
    pub residual_percent: f64,
    /// √(Σ (n/2 U_n)²)/U_1, in percent: weighting of the RMA (US), 1937.
    pub weighted_rma_percent: f64,
    /// √(Σ (n²/4 U_n)²)/U_1, in percent: weighting of D. E. L. Shorter, Electronic Engineering,
    /// 1950.
    pub weighted_shorter_percent: f64,
}

impl HarmonicReport {
    /// Level of harmonic `n`, 2 to 10, in dB re the fundamental.
    pub fn dbc(&self, n: usize) -> Option<f64> {
        *self.harmonics_dbc.get(n.checked_sub(2)?)?
    }

    /// Signed harmonic `n`, 2 to 10, in percent of the fundamental.
    pub fn signed(&self, n: usize) -> Option<f64> {
        *self.signed_percent.get(n.checked_sub(2)?)?
    }

    /// Root mean square of the fundamental alone, in the unit of the samples.
    pub fn fundamental_rms(&self) -> f64 {
        self.fundamental_peak / SQRT_2
    }
}

#[cfg(test)]
#[path = "harmonics_tests.rs"]
mod tests;
