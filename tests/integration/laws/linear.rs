//! Silence, the linear limit, and how distortion grows out of it.

use std::f64::consts::TAU;

use forehear::circuit::alternating::Axis;
use forehear::render::{Kernel, Model};
use forehear::trial::steady::{Shooter, Tone};
use nalgebra::{Matrix4, Vector4};
use rayon::prelude::*;

use super::{RATE_HZ, amplifier, harmonics, middle_setting, prepared, settings, shipped};

/// Loudest output of a silent input, in volts: -180 dB re 1 V.
pub const SILENCE_V: f64 = 1e-9;
/// Half a step of 24 bits, as a share of full scale; full scale is taken as 1 V, less than any design puts out.
const HALF_STEP_24_BIT: f64 = 0.5 / 8_388_608.0;

#[test]
fn silence_stays_silent_in_every_shipped_design() {
    let worst: Vec<(String, f64)> = shipped()
        .par_iter()
        .flat_map(|(name, prepared)| {
            settings(&prepared.design).into_par_iter().map(move |gain| {
                let model = Model::new(&amplifier(prepared, gain), RATE_HZ, 1.0)
                    .expect("the model comes to rest");
                let mut kernel = Kernel::<1>::new([&model]);
                let loudest = (0..200_000).fold(0.0f64, |m, _| m.max(kernel.step([0.0])[0].abs()));
                (format!("{name} {gain:?}"), loudest)
            })
        })
        .collect();
    for (name, loudest) in &worst {
        println!(
            "{name}: {loudest:.2e} V, {:.1} dB re 1 V",
            20.0 * loudest.max(1e-300).log10()
        );
    }
    for (name, loudest) in &worst {
        assert!(*loudest < SILENCE_V, "{name}: {loudest:e} V");
        assert!(*loudest < HALF_STEP_24_BIT, "{name}: not zero in 24 bits");
    }
}

/// Gain against the AC analysis of the same discretized network, in dB.
const DISCRETE_DB: f64 = 0.001;
/// Gain against the continuous one, in dB: to 5 kHz, and to 20 kHz where the trapezoidal rule warps.
const CONTINUOUS_LOW_DB: f64 = 0.02;
const CONTINUOUS_HIGH_DB: f64 = 0.3;
const FREQUENCIES_HZ: [f64; 5] = [82.4, 440.0, 1000.0, 5000.0, 20000.0];
/// Peak at the jack, in volts: 60 dB below a soft note, so that distortion does not count.
const SMALL_V: f64 = 1e-5;
/// Rise of the tone and its whole length, in seconds: rails and cathodes have forgotten the rise by then.
const RISE_S: f64 = 0.1;
const LENGTH_S: f64 = 0.7;
/// What is fitted at the end, in seconds.
const FITTED_S: f64 = 0.05;

/// Gain of a small tone through the sample loop, by least squares on sine, cosine, a constant and a slope.
fn kernel_gain(model: &Model, hz: f64) -> f64 {
    let mut kernel = Kernel::<1>::new([model]);
    let steps = (LENGTH_S * model.rate) as usize;
    let first = steps - (FITTED_S * model.rate) as usize;
    let mut normal = Matrix4::zeros();
    let mut right = Vector4::zeros();
    for n in 0..steps {
        let t = n as f64 / model.rate;
        let rise = (t / RISE_S).min(1.0);
        let level = SMALL_V * 0.5 * (1.0 - (0.5 * TAU * rise).cos());
        let phase = TAU * (hz * t).fract();
        let y = kernel.step([level * phase.sin()])[0];
        if n >= first {
            let row = Vector4::new(
                phase.sin(),
                phase.cos(),
                1.0,
                (n - first) as f64 / (steps - first) as f64,
            );
            normal += row * row.transpose();
            right += row * y;
        }
    }
    let fit = normal
        .lu()
        .solve(&right)
        .expect("the four columns are independent");
    fit[0].hypot(fit[1]) / SMALL_V
}

/// Name, hertz, dB against the discretized and the continuous AC analysis.
fn gain_errors() -> Vec<(&'static str, f64, f64, f64)> {
    let ready: Vec<_> = shipped()
        .into_par_iter()
        .map(|(name, prepared)| {
            let amp = amplifier(&prepared, middle_setting(&prepared.design));
            let model = Model::new(&amp, RATE_HZ, 1.0).expect("the model comes to rest");
            (name, amp, model)
        })
        .collect();
    ready
        .par_iter()
        .flat_map(|(name, amp, model)| {
            FREQUENCIES_HZ.into_par_iter().map(move |hz| {
                let gain = kernel_gain(model, hz);
                let against = |axis| 20.0 * (gain / amp.gain_at(hz, axis).norm()).log10();
                let step = 1.0 / RATE_HZ;
                (
                    *name,
                    hz,
                    against(Axis::Trapezoidal { step }),
                    against(Axis::Continuous),
                )
            })
        })
        .collect()
}

#[test]
fn small_signals_meet_the_ac_analysis() {
    let errors = gain_errors();
    for (name, hz, discrete, continuous) in &errors {
        println!("{name:14} {hz:8.1} Hz discrete {discrete:+.5} dB continuous {continuous:+.5} dB");
    }
    for (name, hz, discrete, continuous) in &errors {
        let limit = if *hz <= 5000.0 {
            CONTINUOUS_LOW_DB
        } else {
            CONTINUOUS_HIGH_DB
        };
        assert!(
            discrete.abs() < DISCRETE_DB,
            "{name} {hz} Hz: {discrete:+.5} dB"
        );
        assert!(
            continuous.abs() < limit,
            "{name} {hz} Hz: {continuous:+.5} dB"
        );
    }
}

/// How far the growth of a harmonic may lie from its order less one, in dB per dB: the next orders' share at
/// these levels, which falls with the square of the level.
const GROWTH_DB_PER_DB: f64 = 0.05;

#[test]
fn second_and_third_harmonic_fall_one_and_two_db_per_db() {
    let prepared = prepared(super::chains::POWER_STAGE, &[]);
    let model = Model::new(&amplifier(&prepared, None), RATE_HZ, 8.0).expect("comes to rest");
    let mut shooter = Shooter::new(&model, Tone::new(1000.0, RATE_HZ));
    let mut last: Option<(f64, f64)> = None;
    let mut worst = 0.0f64;
    for level in [0.125, 0.25, 0.5, 1.0] {
        let cycle = shooter.steady(level);
        assert!(cycle.settled);
        let h = harmonics(&cycle.output);
        let now = (h.dbc(2).expect("present"), h.dbc(3).expect("present"));
        print!("{level} V: H2 {:.3} dBc, H3 {:.3} dBc", now.0, now.1);
        if let Some(before) = last {
            let doubling = 20.0 * 2f64.log10();
            let growth = ((now.0 - before.0) / doubling, (now.1 - before.1) / doubling);
            print!(", {:.4} and {:.4} dB per dB", growth.0, growth.1);
            worst = worst
                .max((growth.0 - 1.0).abs())
                .max((growth.1 - 2.0).abs());
        }
        println!();
        last = Some(now);
    }
    assert!(worst < GROWTH_DB_PER_DB, "{worst} dB per dB");
}
