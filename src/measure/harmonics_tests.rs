use super::*;
use proptest::prelude::*;
use std::f64::consts::TAU;

/// Rounding of ratios of harmonics of a waveform of order one, a few hundred samples long.
const ROUNDING: f64 = 1e-12;

fn period(n: usize, wave: impl Fn(f64) -> f64) -> Vec<f64> {
    (0..n).map(|m| wave(TAU * m as f64 / n as f64)).collect()
}

fn report(samples: &[f64]) -> HarmonicReport {
    HarmonicAnalysis::of_period(samples)
        .unwrap()
        .report()
        .unwrap()
}

/// Smooth waveform with harmonics 1 to 5: five amplitudes and five phases.
fn mixture(n: usize, peaks: &[f64], phases: &[f64]) -> Vec<f64> {
    period(n, |t| {
        peaks
            .iter()
            .zip(phases)
            .enumerate()
            .map(|(i, (a, p))| a * ((i + 1) as f64 * t + p).cos())
            .sum()
    })
}

proptest! {
    #[test]
    fn every_amplitude_and_phase_put_in_comes_out(
        n in 21usize..800,
        peaks in prop::collection::vec(0.01..2.0f64, 5),
        phases in prop::collection::vec(-3.1..3.1f64, 5),
        dc in -300.0..300.0f64,
    ) {
        let samples: Vec<f64> = mixture(n, &peaks, &phases).iter().map(|x| x + dc).collect();
        let analysis = HarmonicAnalysis::of_period(&samples).unwrap();
        // The samples themselves are rounded at up to 300 V.
        let rounding = 1e-12;
        prop_assert!((analysis.dc() - dc).abs() < rounding);
        for i in 0..5 {
            let expected = Complex64::from_polar(peaks[i], phases[i]);
            prop_assert!((analysis.harmonic(i + 1).unwrap() - expected).norm() < rounding);
        }
        let rms = (peaks.iter().map(|a| a * a).sum::<f64>() / 2.0).sqrt();
        prop_assert!((analysis.rms() - rms).abs() < rounding);
        let above: f64 = peaks[1..].iter().map(|a| a * a).sum();
        let report = analysis.report().unwrap();
        let thd = 100.0 * above.sqrt() / peaks[0];
        prop_assert!((report.thd_percent - thd).abs() < 1e-8 * thd);
        // Band-limited to the fifth harmonic, so THD_R and the residual are one figure.
        prop_assert!((report.thd_total_percent - report.residual_percent).abs() < 1e-9);
    }

    #[test]
    fn figures_do_not_depend_on_level_or_on_where_the_period_is_cut(
        n in 21usize..500,
        shift in 0usize..500,
        scale in 1e-6..1e6f64,
        peaks in prop::collection::vec(0.01..2.0f64, 5),
        phases in prop::collection::vec(-3.1..3.1f64, 5),
    ) {
        let samples = mixture(n, &peaks, &phases);
        let mut moved: Vec<f64> = samples.iter().map(|x| x * scale).collect();
        moved.rotate_left(shift % n);
        let a = HarmonicAnalysis::of_period(&samples).unwrap();
        let b = HarmonicAnalysis::of_period(&moved).unwrap();
        for h in 2..=5 {
            let (ra, rb) = (a.relative(h).unwrap(), b.relative(h).unwrap());
            prop_assert!((ra - rb).norm() < 1e-10 * (1.0 + ra.norm()));
        }
        let (a, b) = (a.report().unwrap(), b.report().unwrap());
        prop_assert!((a.thd_percent / b.thd_percent - 1.0).abs() < 1e-10);
        prop_assert!((a.residual_percent / b.residual_percent - 1.0).abs() < 1e-10);
    }

    #[test]
    fn direct_correlation_and_the_whole_transform_agree(
        samples in prop::collection::vec(-1.0..1.0f64, 3..600),
        periods in 1usize..12,
    ) {
        let n = samples.len();
        prop_assume!(n > 2 * periods);
        let direct = HarmonicAnalysis::of_periods(&samples, periods, HIGHEST).unwrap();
        let count = direct.lines.amplitudes.len();
        let whole = transformed(&samples, direct.dc, periods, count);
        for (a, b) in direct.lines.amplitudes.iter().zip(&whole.amplitudes) {
            prop_assert!((a - b).norm() < ROUNDING);
        }
        prop_assert!((direct.lines.ac_mean_square - whole.ac_mean_square).abs() < ROUNDING);
        prop_assert!(
            (direct.lines.residual_mean_square - whole.residual_mean_square).abs() < ROUNDING
        );
    }

    #[test]
    fn several_periods_read_as_one(n in 21usize..200, periods in 1usize..6) {
        let one = mixture(n, &[1.0, 0.2, 0.1, 0.05, 0.02], &[0.1, 1.0, -2.0, 3.0, 0.5]);
        let many = one.repeat(periods);
        let one = HarmonicAnalysis::of_period(&one).unwrap();
        let many = HarmonicAnalysis::of_periods(&many, periods, HIGHEST).unwrap();
        for h in 1..=5 {
            let difference = one.harmonic(h).unwrap() - many.harmonic(h).unwrap();
            prop_assert!(difference.norm() < ROUNDING);
        }
    }
}

#[test]
fn taller_positive_half_has_a_positive_second() {
    let sharp_above = report(&period(384, |t| t.cos() + 0.1 * (2.0 * t).cos()));
    assert!((sharp_above.signed(2).unwrap() - 10.0).abs() < ROUNDING * 100.0);
    let sharp_below = report(&period(384, |t| t.cos() - 0.1 * (2.0 * t).cos()));
    assert!((sharp_below.signed(2).unwrap() + 10.0).abs() < ROUNDING * 100.0);
    // Upside down, the halves change places.
    let inverted = report(&period(384, |t| -t.cos() - 0.1 * (2.0 * t).cos()));
    assert!((inverted.signed(2).unwrap() + 10.0).abs() < ROUNDING * 100.0);
}

#[test]
fn compression_has_a_negative_third_whatever_the_polarity() {
    for polarity in [1.0, -1.0] {
        let soft = report(&period(383, |t| polarity * (3.0 * t.sin()).tanh()));
        assert!(soft.signed(3).unwrap() < -10.0);
        assert!(
            soft.dbc(2).is_none(),
            "an odd curve makes no even harmonics"
        );
    }
}

#[test]
fn phases_are_those_of_sines_counted_from_the_fundamental() {
    let samples = period(383, |t| {
        (t + 0.7).sin()
            + 0.1 * (2.0 * (t + 0.7) + 30f64.to_radians()).sin()
            + 0.05 * (3.0 * (t + 0.7) - 170f64.to_radians()).sin()
            + 0.01 * (4.0 * (t + 0.7) + 180f64.to_radians()).sin()
    });
    let phases = report(&samples).phases_deg;
    assert!((phases[0].unwrap() - 30.0).abs() < 1e-9);
    assert!((phases[1].unwrap() + 170.0).abs() < 1e-9);
    assert!((phases[2].unwrap().abs() - 180.0).abs() < 1e-9);
    assert_eq!(phases[3], None);
}

#[test]
fn phase_range_is_open_below_and_closed_above() {
    assert_eq!(wrap_degrees(180.0), 180.0);
    assert_eq!(wrap_degrees(-180.0), 180.0);
    assert_eq!(wrap_degrees(-540.0), 180.0);
    assert_eq!(wrap_degrees(-179.0), -179.0);
    assert_eq!(wrap_degrees(360.0), 0.0);
}

#[test]
fn distortion_of_a_part_in_a_billion_is_still_seen() {
    let samples = period(384, |t| t.sin() + 1e-9 * (12.0 * t).sin());
    let report = report(&samples);
    assert!((report.residual_percent / 1e-7 - 1.0).abs() < 1e-5);
    assert!(
        report.thd_percent < 1e-12,
        "the twelfth is not counted in THD"
    );
}

#[test]
fn pure_sine_has_no_harmonics_and_no_phases() {
    let report = report(&period(383, |t| 0.2 * (t + 1.0).sin()));
    assert_eq!(report.harmonics_dbc, [None; 9]);
    assert_eq!(report.phases_deg, [None; 9]);
    assert!((report.fundamental_rms() - 0.1 * SQRT_2).abs() < ROUNDING);
}

#[test]
fn harmonics_above_half_the_rate_are_missing_not_zero() {
    let report = report(&period(9, |t| t.sin() + 0.1 * (4.0 * t).sin()));
    assert!((report.dbc(4).unwrap() + 20.0).abs() < ROUNDING * 100.0);
    assert_eq!(report.dbc(5), None);
    // Eight samples hold the fourth at half the rate, where its phase is lost.
    let analysis = HarmonicAnalysis::of_period(&period(8, f64::sin)).unwrap();
    assert!(analysis.harmonic(3).is_some() && analysis.harmonic(4).is_none());
    assert_eq!(analysis.harmonic(0), None);
}

#[test]
fn weights_are_one_at_the_second_and_grow() {
    let report = report(&mixture(384, &[1.0, 0.1, 0.05, 0.02], &[0.0; 4]));
    let rma = (0.1f64.powi(2) + (1.5 * 0.05f64).powi(2) + (2.0 * 0.02f64).powi(2)).sqrt();
    let shorter = (0.1f64.powi(2) + (2.25 * 0.05f64).powi(2) + (4.0 * 0.02f64).powi(2)).sqrt();
    assert!((report.weighted_rma_percent - 100.0 * rma).abs() < 1e-10);
    assert!((report.weighted_shorter_percent - 100.0 * shorter).abs() < 1e-10);
}

#[test]
fn waveforms_without_figures_say_why() {
    let too_short = HarmonicsError::TooShort {
        samples: 2,
        periods: 1,
    };
    assert_eq!(
        HarmonicAnalysis::of_period(&[1.0, -1.0]).unwrap_err(),
        too_short
    );
    assert!(HarmonicAnalysis::of_period(&[]).is_err());
    assert!(HarmonicAnalysis::of_periods(&[1.0; 30], 0, 10).is_err());
    for bad in [f64::NAN, f64::INFINITY] {
        let samples = [0.0, 1.0, bad, 2.0];
        assert_eq!(
            HarmonicAnalysis::of_period(&samples).unwrap_err(),
            HarmonicsError::NotFinite { index: 2 }
        );
    }
    for lifeless in [
        vec![0.0; 384],
        vec![250.0; 383],
        period(384, |t| (2.0 * t).sin()),
    ] {
        let refused = HarmonicAnalysis::of_period(&lifeless).unwrap().report();
        assert!(matches!(refused, Err(HarmonicsError::NoFundamental { .. })));
    }
}
