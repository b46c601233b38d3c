//! Measurements against closed forms and standards. The source stands beside every figure:
//! *derived* (from the Fourier series or identity named), *standard*, or *recalled* (no text at
//! hand).

use forehear::measure::harmonics::{HarmonicAnalysis, HarmonicReport};
use forehear::measure::intermodulation::{low_high, twin_tone};
use forehear::measure::loudness::{Loudness, loudness};
use forehear::numeric::root::bracketed_root;
use std::f64::consts::{PI, SQRT_2, TAU};

/// Samples in a period of a waveform with corners: what folds down is below (π n/65536)²/6 of
/// harmonic n, 1e-8 for the tenth and 6e-7 for the 39th.
const FINE: usize = 65_536;

/// One period, sampled between the corners at 0 and π.
fn period(n: usize, wave: impl Fn(f64) -> f64) -> Vec<f64> {
    (0..n)
        .map(|m| wave(TAU * (m as f64 + 0.5) / n as f64))
        .collect()
}

fn analysis(samples: &[f64], highest: usize) -> HarmonicAnalysis {
    HarmonicAnalysis::of_periods(samples, 1, highest).expect("a finite period")
}

fn report(samples: &[f64]) -> HarmonicReport {
    analysis(samples, 10).report().expect("a fundamental")
}

/// THD_F over all harmonics there are, in percent, from the residual over total.
fn thd_of_all(report: &HarmonicReport) -> f64 {
    let over_total = report.residual_percent / 100.0;
    100.0 * over_total / (1.0 - over_total * over_total).sqrt()
}

#[track_caller]
fn assert_near(found: f64, expected: f64, tolerance: f64) {
    assert!(
        (found - expected).abs() <= tolerance,
        "{found} instead of {expected} ± {tolerance}"
    );
}

fn polynomial<const N: usize>(a: [f64; N]) -> impl Fn(f64) -> f64 {
    move |x| a.iter().rev().fold(0.0, |sum, a| (sum + a) * x)
}

// ---- Power series. Derived: identities of powers of sines.

#[test]
fn harmonics_of_a_power_series_are_those_of_the_identities() {
    let [a1, a2, a3, a4, a5] = [1.0, 0.1, 0.05, 0.02, 0.01];
    let curve = polynomial([a1, a2, a3, a4, a5]);
    for level in [0.1, 0.5, 1.0, 2.0] {
        let x = |k: i32| f64::powi(level, k);
        let expected = [
            a1 * x(1) + 0.75 * a3 * x(3) + 0.625 * a5 * x(5),
            a2 * x(2) / 2.0 + a4 * x(4) / 2.0,
            a3 * x(3) / 4.0 + 5.0 / 16.0 * a5 * x(5),
            a4 * x(4) / 8.0,
            a5 * x(5) / 16.0,
        ];
        let found = analysis(&period(384, |t| curve(level * t.sin())), 10);
        for (n, expected) in (1..).zip(expected) {
            assert_near(found.harmonic(n).unwrap().norm(), expected, 1e-14);
        }
        assert_near(found.dc(), a2 * x(2) / 2.0 + 3.0 / 8.0 * a4 * x(4), 1e-14);
    }
    // The same as numbers, derived: H1..H5 and DC at a level of 1.
    let found = analysis(&period(384, |t| curve(t.sin())), 10);
    let printed = [1.043_750, 0.060_000, 0.015_625, 0.002_500, 0.000_625];
    for (n, printed) in (1..).zip(printed) {
        assert_near(found.harmonic(n).unwrap().norm(), printed, 1e-14);
    }
    assert_near(found.dc(), 0.0575, 1e-14);
}

/// Derived: an expanding curve sharpens the half it expands, and its even harmonics are in phase
/// with the fundamental's positive peak; the odd term sharpens both.
#[test]
fn positive_coefficients_give_positive_second_and_third_in_cosine_phase() {
    let found = report(&period(384, |t| polynomial([1.0, 0.1, 0.05])(t.sin())));
    let h1 = 1.0375;
    assert_near(found.signed(2).unwrap(), 5.0 / h1, 1e-10);
    assert_near(found.signed(3).unwrap(), 1.25 / h1, 1e-10);
    // x² = ½ - ½ cos 2θ and ½ sin(2θ - 90°); x³ = ¾ sin θ + ¼ sin(3θ + 180°).
    assert_near(found.phases_deg[0].unwrap(), -90.0, 1e-9);
    assert_near(found.phases_deg[1].unwrap().abs(), 180.0, 1e-9);
}

/// Derived: the n-th harmonic of x^n grows by n dB a dB, n - 1 re the fundamental.
#[test]
fn second_and_third_grow_by_one_and_two_decibels_a_decibel() {
    let curve = polynomial([1.0, 0.1, 0.05]);
    let of = |level: f64| report(&period(384, |t| curve(level * t.sin())));
    let (soft, louder) = (of(0.001), of(0.001 * 10f64.powf(0.05)));
    assert_near(louder.dbc(2).unwrap() - soft.dbc(2).unwrap(), 1.0, 1e-4);
    assert_near(louder.dbc(3).unwrap() - soft.dbc(3).unwrap(), 2.0, 1e-4);
}

/// Derived: T_n(cos θ) = cos nθ, T_2 = 2x² - 1 to T_5 = 16x⁵ - 20x³ + 5x.
#[test]
fn chebyshev_polynomials_give_one_harmonic_each() {
    let chebyshev: [fn(f64) -> f64; 4] = [
        |x| 2.0 * x * x - 1.0,
        |x| 4.0 * x.powi(3) - 3.0 * x,
        |x| 8.0 * x.powi(4) - 8.0 * x * x + 1.0,
        |x| 16.0 * x.powi(5) - 20.0 * x.powi(3) + 5.0 * x,
    ];
    for (n, polynomial) in (2..).zip(chebyshev) {
        let found = analysis(&period(383, |t| polynomial(t.cos())), 10);
        for h in 1..=10 {
            let expected = if h == n { 1.0 } else { 0.0 };
            assert_near(found.harmonic(h).unwrap().norm(), expected, 1e-14);
        }
    }
}

/// Derived: harmonics 1, 0.1, 0.05, 0.02. IEC 60268-3 takes the n-th order over the total.
#[test]
fn both_denominators_of_a_given_series() {
    let wave =
        |t: f64| t.sin() + 0.1 * (2.0 * t).sin() + 0.05 * (3.0 * t).sin() + 0.02 * (4.0 * t).sin();
    let found = report(&period(384, wave));
    assert_near(found.thd_percent, 11.3578, 0.000_05);
    assert_near(found.thd_total_percent, 11.2853, 0.000_05);
    let second_over_total = 100.0 * 0.1 / (SQRT_2 * found.rms);
    assert_near(second_over_total, 9.9361, 0.000_05);
}

/// Derived: THD_R = THD_F/√(1 + THD_F²); 10 % reads 9.95 % to the total, 48.3 % reads 43.5 %.
#[test]
fn ratio_to_the_total_is_the_smaller_one() {
    for (to_fundamental, to_total) in [(10.0, 9.95), (48.3, 43.5)] {
        let found = report(&period(384, |t| {
            t.sin() + to_fundamental / 100.0 * (3.0 * t).sin()
        }));
        assert_near(found.thd_percent, to_fundamental, 1e-10);
        assert_near(
            found.thd_total_percent,
            to_total,
            if to_total < 10.0 { 0.005 } else { 0.05 },
        );
    }
}

// ---- Two tones. Formulas as in SMPTE RP 120-1983 and the twin-tone method; figures derived by
// expanding the power series under two sines.

fn two_tones(n: usize, tones: [(usize, f64); 2], curve: impl Fn(f64) -> f64) -> Vec<f64> {
    let sine = |bin: usize, m: usize| (TAU * (m * bin % n) as f64 / n as f64).sin();
    (0..n)
        .map(|m| curve(tones.iter().map(|&(bin, peak)| peak * sine(bin, m)).sum()))
        .collect()
}

#[test]
fn low_and_high_tone_modulate_as_the_series_says() {
    let curve = polynomial([1.0, 0.02, 0.01]);
    // 60 Hz and 7 kHz at 4:1, in bins of 20 Hz of a rate of 48 kHz.
    let found = low_high(&two_tones(2400, [(3, 0.8), (350, 0.2)], curve), 3, 350).unwrap();
    let gain = 1.0 + 0.01 * (0.75 * 0.2 * 0.2 + 1.5 * 0.8 * 0.8);
    assert_near(found.second_percent, 100.0 * 2.0 * 0.02 * 0.8 / gain, 1e-10);
    assert_near(
        found.third_percent,
        100.0 * 1.5 * 0.01 * 0.8 * 0.8 / gain,
        1e-10,
    );
    assert_near(found.second_percent, 3.1686, 0.000_05);
    assert_near(found.third_percent, 0.9506, 0.000_05);
    assert_near(found.total_percent, 3.3081, 0.000_05);
}

#[test]
fn twin_tones_differ_as_the_series_says() {
    let curve = polynomial([1.0, 0.02, 0.01]);
    // 19 and 20 kHz in bins of 50 Hz of a rate of 48 kHz; sums fold to other bins.
    let found = twin_tone(&two_tones(960, [(380, 0.5), (400, 0.5)], curve), 380, 400).unwrap();
    let gain = 1.0 + 2.25 * 0.01 * 0.25;
    assert_near(
        found.second_percent,
        100.0 * 0.02 * 0.5 / (2.0 * gain),
        1e-10,
    );
    assert_near(
        found.third_percent,
        100.0 * 0.75 * 0.01 * 0.25 / gain,
        1e-10,
    );
    assert_near(found.second_percent, 0.4972, 0.000_05);
    assert_near(found.third_percent, 0.1865, 0.000_05);
}

// ---- Waveforms. Derived: their Fourier series and mean squares.

#[test]
fn square_wave_has_odd_harmonics_falling_as_one_over_n() {
    let samples = period(FINE, |t| t.sin().signum());
    let found = report(&samples);
    assert_near(
        thd_of_all(&found),
        100.0 * (PI * PI / 8.0 - 1.0).sqrt(),
        1e-5,
    );
    assert_near(thd_of_all(&found), 48.343, 0.000_5);
    assert_near(found.residual_percent, 43.524, 0.000_5);
    assert_near(-found.signed(3).unwrap(), 100.0 / 3.0, 1e-5);
    assert_near(found.signed(5).unwrap(), 20.0, 1e-5);
    assert_eq!(found.dbc(2), None);
    // Counted only up to a harmonic it reads less; the report counts to the tenth.
    assert_near(found.thd_percent, 42.9, 0.05);
    let long = analysis(&samples, 39);
    for (highest, printed) in [(9, 42.9), (19, 45.7), (39, 47.0)] {
        let sum: f64 = (3..=highest)
            .step_by(2)
            .map(|n| f64::from(n).powi(-2))
            .sum();
        let found = 100.0 * long.thd(highest as usize).unwrap();
        assert_near(found, 100.0 * sum.sqrt(), 1e-4);
        assert_near(found, printed, 0.05);
    }
}

#[test]
fn triangle_wave_has_odd_harmonics_falling_as_one_over_n_squared() {
    let found = report(&period(FINE, |t| t.sin().asin()));
    assert_near(
        thd_of_all(&found),
        100.0 * (PI.powi(4) / 96.0 - 1.0).sqrt(),
        1e-5,
    );
    assert_near(thd_of_all(&found), 12.115, 0.000_5);
    assert_near(found.residual_percent, 12.03, 0.005);
    // Pointed halves: the third is in phase at the peak.
    assert_near(found.signed(3).unwrap(), 100.0 / 9.0, 1e-5);
    assert_eq!(found.dbc(2), None);
}

#[test]
fn sawtooth_has_all_harmonics_falling_as_one_over_n() {
    let found = report(&period(FINE, |t| t / PI - 1.0));
    assert_near(
        thd_of_all(&found),
        100.0 * (PI * PI / 6.0 - 1.0).sqrt(),
        1e-5,
    );
    assert_near(thd_of_all(&found), 80.308, 0.000_5);
    assert_near(found.residual_percent, 62.62, 0.005);
    for n in 2..=10 {
        assert_near(found.dbc(n).unwrap(), -20.0 * (n as f64).log10(), 1e-6);
    }
}

#[test]
fn half_wave_rectified_sine() {
    let peak = 3.0;
    let found = report(&period(FINE, |t| (peak * t.sin()).max(0.0)));
    assert_near(
        thd_of_all(&found),
        100.0 * (1.0 - 8.0 / (PI * PI)).sqrt(),
        1e-5,
    );
    assert_near(thd_of_all(&found), 43.524, 0.000_5);
    assert_near(found.dc, peak / PI, 1e-8);
    assert_near(found.fundamental_peak, peak / 2.0, 1e-8);
    assert_near(found.signed(2).unwrap(), 400.0 / (3.0 * PI), 1e-5);
    assert_near(found.signed(2).unwrap(), 42.441, 0.000_5);
    assert_near(found.signed(4).unwrap(), -400.0 / (15.0 * PI), 1e-5);
    assert_near(-found.signed(4).unwrap(), 8.488, 0.000_5);
}

fn clipped(c: f64) -> HarmonicReport {
    report(&period(FINE, |t| t.sin().clamp(-c, c)))
}

/// Derived: the series of a sine clipped at ±c, with p = arcsin c.
#[test]
fn symmetrically_clipped_sine() {
    let table = [
        (0.9, [0.962_614, 0.031_635, 0.022_018, 0.011_508], 4.220),
        (0.7, [0.811_880, 0.108_204, 0.019_909, 0.016_039], 13.759),
        (0.5, [0.608_998, 0.137_832, 0.027_566, 0.009_845], 23.294),
        (0.2, [0.252_940, 0.079_841, 0.042_795, 0.025_531], 37.927),
    ];
    for (c, printed, thd) in table {
        let p = f64::asin(c);
        let first = 2.0 / PI * (p + c * (1.0 - c * c).sqrt());
        let series = |n: f64| {
            let sides = ((n - 1.0) * p).sin() / (2.0 * (n - 1.0))
                - ((n + 1.0) * p).sin() / (2.0 * (n + 1.0));
            4.0 / PI * (sides + c * (n * p).cos() / n)
        };
        let mean_square = (p - 0.5 * (2.0 * p).sin()) / PI + c * c * (1.0 - 2.0 * p / PI);
        let found = analysis(&period(FINE, |t| t.sin().clamp(-c, c)), 10);
        for (n, printed) in [1, 3, 5, 7].into_iter().zip(printed) {
            let derived = if n == 1 { first } else { series(n as f64) };
            let peak = found.harmonic(n).unwrap().norm();
            assert_near(peak, derived.abs(), 1e-8);
            assert_near(peak, printed, 5e-7);
        }
        let found = found.report().unwrap();
        assert_near(found.rms * found.rms, mean_square, 1e-8);
        let derived = 100.0 * (2.0 * mean_square / (first * first) - 1.0).sqrt();
        assert_near(thd_of_all(&found), derived, 1e-4);
        assert_near(thd_of_all(&found), thd, 0.000_5);
    }
}

/// Derived: the level of symmetrical clipping that gives a THD, counting all harmonics; and how
/// far the sine is then above the clipping level.
#[test]
fn clip_level_for_a_given_thd() {
    let table = [
        (0.1, 0.995_79, 0.037),
        (1.0, 0.971_49, 0.251),
        (3.0, 0.926_22, 0.666),
        (5.0, 0.883_45, 1.076),
        (10.0, 0.778_65, 2.173),
        (20.0, 0.569_04, 4.897),
    ];
    for (thd, printed_c, printed_db) in table {
        let c = bracketed_root(|c| thd_of_all(&clipped(c)) - thd, 0.3, 0.9999, 1e-9).unwrap();
        assert_near(c, printed_c, 5e-6);
        assert_near(-20.0 * c.log10(), printed_db, 0.000_5);
    }
}

/// Derived: a sine clipped on one side only.
#[test]
fn one_sided_clipping_for_a_given_thd() {
    let clipped = |c: f64| report(&period(FINE, |t| t.sin().min(c)));
    for (thd, printed_db) in [(1.0, 0.33), (5.0, 1.38), (10.0, 2.78)] {
        let c = bracketed_root(|c| thd_of_all(&clipped(c)) - thd, 0.3, 0.9999, 1e-9).unwrap();
        assert_near(-20.0 * c.log10(), printed_db, 0.005);
        if thd == 10.0 {
            let found = clipped(c);
            assert_near(-found.signed(2).unwrap(), 7.5, 0.05);
            assert_near(-found.signed(3).unwrap(), 5.5, 0.05);
            assert_near(found.dc, -0.0436, 0.000_05);
        }
    }
}

// ---- Loudness. ITU-R BS.1770-5 and EBU Tech 3341 (version 4, 2023).

/// Seconds, and level in dBFS peak.
type Piece = (f64, f64);

/// A sine whose pieces follow one another without a break in phase.
fn sine(rate: u32, hz: f64, pieces: &[Piece]) -> Vec<f64> {
    let step = TAU * hz / f64::from(rate);
    let levels = pieces.iter().flat_map(|&(seconds, dbfs)| {
        let frames = (seconds * f64::from(rate)).round() as usize;
        std::iter::repeat_n(10f64.powf(dbfs / 20.0), frames)
    });
    levels
        .enumerate()
        .map(|(m, peak)| peak * (step * m as f64).sin())
        .collect()
}

fn in_both_channels(rate: u32, pieces: &[Piece]) -> f64 {
    let x = sine(rate, 1000.0, pieces);
    let Loudness {
        integrated_lufs, ..
    } = loudness(&[&x, &x], rate).unwrap();
    integrated_lufs.unwrap()
}

/// Standard: BS.1770 states -3.01 LKFS for 997 Hz at 0 dBFS in one front channel.
#[test]
fn full_scale_sine_of_997_hertz_in_one_channel() {
    let x = sine(48_000, 997.0, &[(20.0, 0.0)]);
    let found = loudness(&[&x], 48_000).unwrap();
    assert_near(found.integrated_lufs.unwrap(), -3.01, 0.005);
    assert_near(found.true_peak_dbtp.unwrap(), 0.0, 0.2);
    // Derived: one channel less is half the power, 3.01 LU.
    let both = loudness(&[&x, &x], 48_000)
        .unwrap()
        .integrated_lufs
        .unwrap();
    assert_near(both - found.integrated_lufs.unwrap(), 3.0103, 0.000_1);
}

/// Standard: Tech 3341 cases 1 to 5, stereo 1 kHz, ±0.1 LU; the durations of cases 3 to 5 are
/// recalled. The third decimal was computed apart from here from the Recommendation's filters and
/// gates.
#[test]
fn cases_of_tech_3341() {
    let case_3 = [(10.0, -36.0), (60.0, -23.0), (10.0, -36.0)];
    let case_4 = [
        (10.0, -72.0),
        (10.0, -36.0),
        (60.0, -23.0),
        (10.0, -36.0),
        (10.0, -72.0),
    ];
    let case_5 = [(20.0, -26.0), (20.1, -20.0), (20.0, -26.0)];
    let cases: [(&[Piece], f64, f64); 5] = [
        (&[(20.0, -23.0)], -23.0, -22.993),
        (&[(20.0, -33.0)], -33.0, -32.993),
        (&case_3, -23.0, -23.014),
        (&case_4, -23.0, -23.014),
        (&case_5, -23.0, -22.979),
    ];
    for (pieces, standard, computed) in cases {
        let found = in_both_channels(48_000, pieces);
        assert_near(found, standard, 0.1);
        assert_near(found, computed, 0.001);
    }
}

/// Case 1 at other rates; the filters are the Recommendation's, moved to the rate. Computed
/// likewise.
#[test]
fn first_case_of_tech_3341_at_other_rates() {
    for (rate, computed) in [(44_100, -22.991), (96_000, -23.011), (192_000, -23.020)] {
        let found = in_both_channels(rate, &[(20.0, -23.0)]);
        assert_near(found, -23.0, 0.1);
        assert_near(found, computed, 0.001);
    }
}

/// Recalled: Tech 3341's sine of a quarter of the rate at 45 degrees, whose samples all lie 3 dB
/// below its peak of -6 dBFS. Standard: a true-peak meter may read 0.2 dB more or 0.4 dB less.
#[test]
fn true_peak_between_the_samples_is_seen() {
    let rate = 48_000;
    let x: Vec<f64> = (0..rate)
        .map(|m| {
            // Faded in and out, so that an abrupt start does not add a peak of its own.
            let edge = f64::from(m.min(rate - 1 - m)) / 4800.0;
            0.5 * edge.min(1.0) * (PI / 2.0 * f64::from(m) + PI / 4.0).sin()
        })
        .collect();
    let largest = x.iter().fold(0.0_f64, |l, x| l.max(x.abs()));
    assert_near(20.0 * largest.log10(), -9.03, 0.01);
    let found = loudness(&[&x], rate as u32)
        .unwrap()
        .true_peak_dbtp
        .unwrap();
    assert!((-6.42..=-5.82).contains(&found), "{found}");
}
