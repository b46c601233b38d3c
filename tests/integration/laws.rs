//! Laws that must hold whatever the design: Kirchhoff, silence, the linear limit, energy, order, repeatability.

mod bytes;
mod chains;
mod kirchhoff;
mod linear;
mod periodic;
mod random_design;

use forehear::design::{self, Design};
use forehear::measure::harmonics::{HarmonicAnalysis, HarmonicReport};
use forehear::render::Model;
use forehear::stage::amplifier::Amplifier;
use forehear::stage::resolve::{Prepared, prepare};
use forehear::stage::wiring::LoadKind;
use forehear::trial::steady::{Cycle, Shooter, Tone};
use forehear::tube::Catalog;

/// 48 kHz eight times oversampled, where figures are taken, in hertz.
const RATE_HZ: f64 = 8.0 * 48e3;

/// Reads a design and finds its tubes and iron.
fn prepared(text: &str, overrides: &[&str]) -> Prepared {
    let overrides: Vec<String> = overrides.iter().map(|o| (*o).to_owned()).collect();
    let reading = design::read(text, &overrides).unwrap_or_else(|f| panic!("{f:?}"));
    prepare(
        &reading.design,
        &reading.places,
        &Catalog::shipped(),
        &|_| None,
    )
    .unwrap_or_else(|f| panic!("{f:?}"))
}

/// The amplifier at one gain setting, on its rated resistance.
fn amplifier(prepared: &Prepared, gain: Option<f64>) -> Amplifier {
    Amplifier::solve(
        &prepared.design,
        &prepared.devices,
        &prepared.iron,
        gain,
        LoadKind::Rated,
    )
    .unwrap_or_else(|f| panic!("{}: {f}", prepared.design.name))
}

/// Every gain setting a design is measured at.
fn settings(design: &Design) -> Vec<Option<f64>> {
    match design.control.gain {
        Some(_) => design.control.settings.iter().map(|s| Some(*s)).collect(),
        None => vec![None],
    }
}

/// The one in the middle.
fn middle_setting(design: &Design) -> Option<f64> {
    let all = settings(design);
    all[all.len() / 2]
}

/// Every shipped design with its name.
fn shipped() -> Vec<(&'static str, Prepared)> {
    design::shipped()
        .iter()
        .map(|(name, text)| (*name, prepared(text, &[])))
        .collect()
}

/// The design one starts from, at gain 5.
fn default_amplifier() -> Amplifier {
    amplifier(&prepared(design::shipped()[0].1, &[]), Some(5.0))
}

fn harmonics(cycle: &[f64]) -> HarmonicReport {
    HarmonicAnalysis::of_period(cycle)
        .and_then(|a| a.report())
        .expect("a tone comes out")
}

/// A settled period of `tone` at `level` volts peak.
fn settled(model: &Model, tone: Tone, level: f64) -> Cycle {
    let mut shooter = Shooter::new(model, tone);
    let cycle = shooter.steady(level);
    assert!(cycle.settled, "{} Hz, {level} V", tone.hz);
    cycle
}
