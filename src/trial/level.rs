//! One tone at one level, as figures.

use super::figures::{Figure, LevelFigures, Missing, StageLevel};
use super::limits::Reference;
use super::steady::Cycle;
use crate::measure::harmonics::{HarmonicAnalysis, HarmonicReport};
use crate::render::Observation;

fn report(samples: &[f64]) -> Figure<HarmonicReport> {
    HarmonicAnalysis::of_period(samples)
        .and_then(|a| a.report())
        .map_err(|_| Missing::NoSignal)
}

fn mean(trace: &[Observation], f: impl Fn(&Observation) -> f64) -> f64 {
    trace.iter().map(f).sum::<f64>() / trace.len() as f64
}

/// Figures of a settled period at a peak input of `input_v_peak`, into `load_ohms`.
///
/// Output power is the square of the RMS output (DC left out, harmonics included) over the load.
pub fn figures(
    cycle: &Cycle,
    references: &[Reference],
    input_v_peak: f64,
    load_ohms: f64,
) -> LevelFigures {
    let harmonics = report(&cycle.output);
    let rms = harmonics.as_ref().map_or(0.0, |h| h.rms);
    let stages = cycle
        .stages
        .iter()
        .zip(references)
        .map(|(trace, reference)| {
            let plate: Vec<f64> = trace.iter().map(|o| o.v_pk + o.v_k).collect();
            let h = report(&plate);
            let centre = plate.iter().sum::<f64>() / plate.len() as f64;
            StageLevel {
                bias_shift_v: mean(trace, |o| o.v_gk) - reference.rest_v_gk,
                h2_percent: signed(&h, 2),
                h3_percent: signed(&h, 3),
                plate_v_peak: plate.iter().fold(0.0f64, |m, v| m.max((v - centre).abs())),
                plate_watts: mean(trace, |o| o.ip * o.v_pk),
                screen_watts: mean(trace, |o| o.is * o.v_sk),
                plate_amperes: mean(trace, |o| o.ip),
                screen_amperes: mean(trace, |o| o.is),
                grid_amperes: mean(trace, |o| o.ig),
                v_gk_mean: mean(trace, |o| o.v_gk),
                towards: reference.towards(trace),
            }
        })
        .collect();
    LevelFigures {
        input_v_peak,
        output_v_rms: rms,
        output_w: rms * rms / load_ohms,
        gain_db: harmonics
            .as_ref()
            .map(|h| 20.0 * (h.fundamental_peak / input_v_peak).log10())
            .map_err(|m| *m),
        harmonics,
        stages,
        settled: cycle.settled,
    }
}

fn signed(h: &Figure<HarmonicReport>, n: usize) -> Figure<f64> {
    match h {
        Ok(h) => h.signed(n).ok_or(Missing::AboveBand),
        Err(m) => Err(*m),
    }
}
