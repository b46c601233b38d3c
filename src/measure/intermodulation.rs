//! Products of two tones sounding together.

use super::spectrum::{Spectrum, SpectrumError, Window};

/// A low strong tone and a high weak one: how far the low one modulates the high one.
///
/// ```text
/// m2 = (U_{H-L} + U_{H+L})/U_H,   m3 = (U_{H-2L} + U_{H+2L})/U_H,   d = √(m2² + m3²)
/// ```
///
/// SMPTE RP 120-1983 takes 60 Hz and 7 kHz at 4:1, DIN 45403 250 Hz and 8 kHz at 4:1. In percent.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LowHigh {
    pub second_percent: f64,
    pub third_percent: f64,
    pub total_percent: f64,
}

/// Two tones of equal level: the tones that appear at their differences.
///
/// ```text
/// d2 = U_{f2-f1}/(U_f1 + U_f2),   d3 = (U_{2f1-f2} + U_{2f2-f1})/(U_f1 + U_f2)
/// ```
///
/// The twin-tone method (CCIF, now ITU-R). For a played interval the difference tone f2 - f1 lies
/// below both notes; its level says whether the chord stays clear. In percent.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TwinTone {
    pub second_percent: f64,
    pub third_percent: f64,
}

/// Modulation of the tone in bin `high` by the tone in bin `low`, in settled periodic `samples`
/// that hold a whole number of periods of both.
///
/// # Errors
/// [`SpectrumError`]: no tone in bin `high`, products that fall together or outside the spectrum.
pub fn low_high(samples: &[f64], low: usize, high: usize) -> Result<LowHigh, SpectrumError> {
    let coincide = SpectrumError::ProductsCoincide {
        samples: samples.len(),
        first: low,
        second: high,
    };
    // Below 4 L a side tone would fall on the low tone or its second harmonic.
    if low == 0 || high <= 4 * low || 2 * (high + 2 * low) >= samples.len() {
        return Err(coincide);
    }
    let peak = lines(samples)?;
    let of_high = peak(high);
    if of_high <= 0.0 {
        return Err(SpectrumError::NoFundamental { bin: high });
    }
    let second = (peak(high - low) + peak(high + low)) / of_high;
    let third = (peak(high - 2 * low) + peak(high + 2 * low)) / of_high;
    Ok(LowHigh {
        second_percent: 100.0 * second,
        third_percent: 100.0 * third,
        total_percent: 100.0 * second.hypot(third),
    })
}

/// Difference tones of the tones in bins `lower` and `upper`, in settled periodic `samples` that
/// hold a whole number of periods of both.
///
/// An exact fifth, 2:3, puts f2 - f1 and 2 f1 - f2 into one bin and is refused: take bins a little
/// beside it, as a tempered one has anyway.
///
/// # Errors
/// [`SpectrumError`]: no tones, products that fall together or outside the spectrum.
pub fn twin_tone(samples: &[f64], lower: usize, upper: usize) -> Result<TwinTone, SpectrumError> {
    let coincide = SpectrumError::ProductsCoincide {
        samples: samples.len(),
        first: lower,
        second: upper,
    };
    if lower == 0 || upper <= lower || 4 * upper >= 2 * lower + samples.len() {
        return Err(coincide);
    }
    let difference = upper - lower;
    let below = (2 * lower).abs_diff(upper);
    let above = 2 * upper - lower;
    let products = [difference, below, above, lower, upper, 2 * lower, 2 * upper];
    let is_alone = |bin: usize| bin > 0 && products.iter().filter(|&&p| p == bin).count() == 1;
    if ![difference, below, above].into_iter().all(is_alone) {
        return Err(coincide);
    }
    let peak = lines(samples)?;
    let tones = peak(lower) + peak(upper);
    if tones <= 0.0 {
        return Err(SpectrumError::NoFundamental { bin: lower });
    }
    Ok(TwinTone {
        second_percent: 100.0 * peak(difference) / tones,
        third_percent: 100.0 * (peak(below) + peak(above)) / tones,
    })
}

/// Peak amplitude by bin.
fn lines(samples: &[f64]) -> Result<impl Fn(usize) -> f64, SpectrumError> {
    // Only bins are asked for, so the rate does not matter.
    let spectrum = Spectrum::of(samples, 1.0, Window::Rectangular)?;
    Ok(move |bin| spectrum.peak(bin).unwrap_or(0.0))
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::f64::consts::TAU;

    fn two_tones(n: usize, tones: [(usize, f64); 2], curve: impl Fn(f64) -> f64) -> Vec<f64> {
        (0..n)
            .map(|m| {
                let angle = |bin| TAU * (m * bin % n) as f64 / n as f64;
                curve(
                    tones
                        .iter()
                        .map(|&(bin, peak)| peak * angle(bin).sin())
                        .sum(),
                )
            })
            .collect()
    }

    #[test]
    fn straight_line_makes_no_products() {
        let clean = two_tones(4096, [(25, 0.8), (800, 0.2)], |x| 3.0 * x);
        assert!(low_high(&clean, 25, 800).unwrap().total_percent < 1e-10);
        let clean = two_tones(4096, [(100, 0.5), (149, 0.5)], |x| -x);
        let found = twin_tone(&clean, 100, 149).unwrap();
        assert!(found.second_percent < 1e-10 && found.third_percent < 1e-10);
    }

    #[test]
    fn products_grow_with_level_as_their_order_says() {
        let curve = |x: f64| x + 0.02 * x * x + 0.01 * x.powi(3);
        let of = |level: f64| {
            let samples = two_tones(4096, [(100, level), (149, level)], curve);
            twin_tone(&samples, 100, 149).unwrap()
        };
        let (soft, loud) = (of(0.001), of(0.002));
        assert!((loud.second_percent / soft.second_percent - 2.0).abs() < 1e-4);
        assert!((loud.third_percent / soft.third_percent - 4.0).abs() < 1e-4);
    }

    #[test]
    fn exact_fifth_and_tones_too_close_to_the_ends_are_refused() {
        let samples = two_tones(4096, [(100, 0.5), (150, 0.5)], |x| x);
        for (lower, upper) in [(100, 150), (100, 200), (0, 10), (150, 100), (100, 1100)] {
            let refused = twin_tone(&samples, lower, upper);
            assert!(
                matches!(refused, Err(SpectrumError::ProductsCoincide { .. })),
                "{lower} {upper}"
            );
        }
        for (low, high) in [(0, 800), (200, 800), (25, 2000)] {
            let refused = low_high(&samples, low, high);
            assert!(
                matches!(refused, Err(SpectrumError::ProductsCoincide { .. })),
                "{low} {high}"
            );
        }
    }

    #[test]
    fn silence_has_no_products() {
        let refused = SpectrumError::NoFundamental { bin: 100 };
        assert_eq!(twin_tone(&[0.0; 4096], 100, 149), Err(refused));
        let refused = SpectrumError::NoFundamental { bin: 800 };
        assert_eq!(low_high(&[0.0; 4096], 25, 800), Err(refused));
    }
}
