//! What folds back below 20 kHz, measured.

use super::figures::{Alias, Missing};
use super::steady::{Shooter, Tone};
use crate::measure::spectrum::{Window, alias_level};
use crate::render::Model;
use crate::signal::coherent_bin;

/// Tone whose aliases are reported, in hertz: high notes alias most, and its second harmonic still matters.
pub const ALIAS_TONE_HZ: f64 = 4100.0;
/// Highest frequency at which an alias counts, in hertz.
const LIMIT_HZ: f64 = 20e3;
/// Steps of the analysed window per unit of oversampling, at a base rate of 48 kHz.
const WINDOW_PER_FACTOR: usize = 8192;

/// Plays a tone with an odd number of periods in the window and looks for lines that are no harmonics.
///
/// The bias is settled first with a neighboring tone of a whole number of steps, then one window is let
/// pass; what remains of the change decays between the lines of a seven-term window. The figure holds for
/// the sample loop at this rate; the resampling around it adds nothing above −150 dB.
pub fn measure(model: &Model, nominal_hz: f64, input_v_peak: f64, base_rate: f64) -> Alias {
    let factor = (model.rate / base_rate).round() as usize;
    let frames = WINDOW_PER_FACTOR * factor;
    let (bin, hz) = coherent_bin(nominal_hz, model.rate, frames);
    let mut shooter = Shooter::new(model, Tone::new(nominal_hz, model.rate));
    let settled = shooter.steady(input_v_peak).settled;
    let kernel = shooter.kernel();
    let mut window = Vec::with_capacity(frames);
    for pass in 0..2 {
        for k in 0..frames {
            let turns = (bin * k % frames) as f64 / frames as f64;
            let out = kernel.step([input_v_peak * (std::f64::consts::TAU * turns).sin()])[0];
            if pass == 1 {
                window.push(out);
            }
        }
    }
    let report = alias_level(&window, bin, LIMIT_HZ, model.rate, Window::BlackmanHarris7);
    let (worst_dbc, worst_hz) = match report {
        _ if !settled => (Err(Missing::NotSettled), Err(Missing::NotSettled)),
        Ok(r) => (
            Ok(r.worst_dbc.unwrap_or(r.floor_dbc).max(r.floor_dbc)),
            r.worst_hz.ok_or(Missing::NoSignal),
        ),
        Err(_) => (Err(Missing::NoSignal), Err(Missing::NoSignal)),
    };
    Alias {
        tone_hz: hz,
        input_v_peak,
        worst_dbc,
        worst_hz,
    }
}
