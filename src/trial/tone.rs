//! One tone over all levels: onset, headroom, THD crossings, compression, power.

use super::figures::{
    ClippingOnset, Figure, LevelFigures, Mechanism, Missing, Power, StageHeadroom, StageLevel,
    ThdCrossing, ToneFigures,
};
use super::level;
use super::limits::Reference;
use super::steady::{Shooter, Tone};
use crate::render::Model;
use crate::stage::amplifier::Amplifier;

/// Levels tried, in volts peak at the jack: 2 dB apart from 2 mV, so that 200 mV is one of them.
pub fn levels() -> Vec<f64> {
    (0..=36)
        .map(|k| 0.2 * 10f64.powf(f64::from(k - 20) / 10.0))
        .collect()
}

/// The headline tone, in hertz.
pub const HEADLINE_HZ: f64 = 1000.0;

/// The highest level of [`levels`]: a model must be built for it.
pub const HIGHEST_LEVEL_V: f64 = 8.0;

/// THD at which inputs are sought, in percent.
const THD_MARKS: [f64; 4] = [1.0, 3.0, 5.0, 10.0];
/// Fall of the fundamental's gain that counts as compression, in dB.
const COMPRESSION_DB: f64 = 1.0;
/// Mean grid current that European sheets call its start, in amperes.
const GRID_MARK_A: f64 = 0.3e-6;
/// A refined input is known to this share: 0.01 dB.
const LEVEL_TOLERANCE: f64 = 1.15e-3;
const REFINEMENTS: usize = 12;

struct Run<'a> {
    shooter: Shooter<'a>,
    /// Settled states of the levels, to go on from.
    states: Vec<Vec<f64>>,
    references: Vec<Reference>,
    load_ohms: f64,
}

impl Run<'_> {
    fn at(&mut self, level: f64) -> LevelFigures {
        let cycle = self.shooter.steady(level);
        level::figures(&cycle, &self.references, level, self.load_ohms)
    }

    /// Input between two levels at which `measure` passes 1, its logarithm met by the Illinois rule.
    fn refine(
        &mut self,
        (low, at_low): (f64, f64),
        (high, at_high): (f64, f64),
        measure: &dyn Fn(&LevelFigures) -> f64,
    ) -> (f64, LevelFigures) {
        let (mut a, mut fa) = (low.ln(), at_low - 1.0);
        let (mut b, mut fb) = (high.ln(), at_high - 1.0);
        let mut best = self.at(high);
        for _ in 0..REFINEMENTS {
            if b - a < LEVEL_TOLERANCE {
                break;
            }
            let share = if fb > fa {
                (-fa / (fb - fa)).clamp(0.02, 0.98)
            } else {
                0.5
            };
            let middle = a + share * (b - a);
            best = self.at(middle.exp());
            let f = measure(&best) - 1.0;
            if f.abs() < 1e-4 {
                break;
            }
            if f >= 0.0 {
                (b, fb) = (middle, f);
                fa *= 0.5;
            } else {
                (a, fa) = (middle, f);
                fb *= 0.5;
            }
        }
        (best.input_v_peak, best)
    }

    /// First upward passage of `measure` through 1 over the levels, refined; and how often it passes at all.
    fn first_passage(
        &mut self,
        levels: &[LevelFigures],
        measure: &dyn Fn(&LevelFigures) -> f64,
    ) -> (Figure<LevelFigures>, usize) {
        let values: Vec<f64> = levels.iter().map(measure).collect();
        let crossings = values
            .windows(2)
            .filter(|w| (w[0] >= 1.0) != (w[1] >= 1.0))
            .count();
        if values[0] >= 1.0 {
            return (Err(Missing::AlreadyPast), crossings);
        }
        match (1..values.len()).find(|&k| values[k] >= 1.0 && values[k - 1] < 1.0) {
            Some(k) => {
                self.shooter.resume(&self.states[k]);
                let found = self.refine(
                    (levels[k - 1].input_v_peak, values[k - 1]),
                    (levels[k].input_v_peak, values[k]),
                    measure,
                );
                (Ok(found.1), crossings)
            }
            None => (Err(Missing::NotReached), crossings),
        }
    }
}

/// THD of a level in percent, 0 where there is none: for comparisons only.
fn thd(l: &LevelFigures) -> f64 {
    l.harmonics.as_ref().map_or(0.0, |h| h.thd_percent)
}

fn limit_of(stage: &StageLevel, mechanism: Mechanism) -> f64 {
    match mechanism {
        Mechanism::GridConduction => stage.towards.grid_conduction,
        Mechanism::PlateKnee => stage.towards.plate_knee,
        Mechanism::Cutoff => stage.towards.cutoff,
    }
}

const MECHANISMS: [Mechanism; 3] = [
    Mechanism::GridConduction,
    Mechanism::PlateKnee,
    Mechanism::Cutoff,
];

/// Runs one tone over all levels and finds every figure that stands on it.
///
/// Clipping onset is the lowest peak input at which any stage meets any of its limits (see
/// [`Reference::towards`]); the inputs for 1, 3, 5 and 10 % THD are first upward crossings, with the number
/// of crossings beside them since cancellation makes THD dip; compression is the input at which the
/// fundamental's gain has fallen 1 dB below its value at the lowest level. Inputs are refined to 0.01 dB.
pub fn run(amp: &Amplifier, model: &Model, nominal_hz: f64, test_level: f64) -> ToneFigures {
    let tone = Tone::new(nominal_hz, model.rate);
    let mut run = Run {
        shooter: Shooter::new(model, tone),
        states: Vec::new(),
        references: Reference::all(amp, tone),
        load_ohms: amp.design.load.resistance.0,
    };
    let mut levels: Vec<LevelFigures> = Vec::new();
    for level in self::levels() {
        levels.push(run.at(level));
        run.states.push(run.shooter.state());
    }
    let test = match levels
        .iter()
        .position(|l| (l.input_v_peak / test_level - 1.0).abs() < 1e-9)
    {
        Some(k) => levels[k].clone(),
        None => {
            let nearest = levels
                .iter()
                .rposition(|l| l.input_v_peak < test_level)
                .unwrap_or(0);
            run.shooter.resume(&run.states[nearest]);
            run.at(test_level)
        }
    };

    let stages = amp.devices.len();
    let mut headroom = Vec::new();
    let mut first_levels: Vec<Option<LevelFigures>> = Vec::new();
    for k in 0..stages {
        let any = |l: &LevelFigures| {
            MECHANISMS
                .iter()
                .fold(0.0f64, |m, q| m.max(limit_of(&l.stages[k], *q)))
        };
        let (found, _) = run.first_passage(&levels, &any);
        let first = found.as_ref().map_err(|m| *m).map(|l| {
            let mechanism = MECHANISMS
                .into_iter()
                .max_by(|a, b| limit_of(&l.stages[k], *a).total_cmp(&limit_of(&l.stages[k], *b)))
                .expect("there are three mechanisms");
            (l.input_v_peak, mechanism)
        });
        let mark = |l: &LevelFigures| l.stages[k].grid_amperes / GRID_MARK_A;
        let (grid_mark, _) = run.first_passage(&levels, &mark);
        headroom.push(StageHeadroom {
            stage: k,
            first,
            to_next_db: None,
            grid_mark_v_peak: grid_mark.map(|l| l.input_v_peak),
        });
        first_levels.push(found.ok());
    }
    let mut order: Vec<usize> = (0..stages).filter(|&k| headroom[k].first.is_ok()).collect();
    let input = |h: &StageHeadroom| h.first.as_ref().map_or(f64::INFINITY, |f| f.0);
    order.sort_by(|a, b| input(&headroom[*a]).total_cmp(&input(&headroom[*b])));
    for pair in order.windows(2) {
        headroom[pair[0]].to_next_db =
            Some(20.0 * (input(&headroom[pair[1]]) / input(&headroom[pair[0]])).log10());
    }
    let onset = match order.first() {
        Some(&k) => headroom[k]
            .first
            .map(|(input_v_peak, mechanism)| ClippingOnset {
                input_v_peak,
                stage: k,
                mechanism,
            }),
        None => Err(headroom
            .iter()
            .find_map(|h| h.first.as_ref().err().copied())
            .unwrap_or(Missing::NotReached)),
    };
    // A stage past its limit at the very lowest level is the onset, though its place is not known.
    let onset = if headroom
        .iter()
        .any(|h| h.first.as_ref().err() == Some(&Missing::AlreadyPast))
    {
        Err(Missing::AlreadyPast)
    } else {
        onset
    };
    let onset_level = order.first().and_then(|&k| first_levels[k].clone());

    let mut thd_inputs = Vec::new();
    let mut thd_levels = Vec::new();
    for percent in THD_MARKS {
        let (found, crossings) = run.first_passage(&levels, &|l| thd(l) / percent);
        thd_inputs.push(ThdCrossing {
            percent,
            input_v_peak: found.as_ref().map(|l| l.input_v_peak).map_err(|m| *m),
            crossings,
        });
        thd_levels.push(found);
    }
    let small = levels[0].gain_db;
    let compression_1db_v_peak = match small {
        Err(m) => Err(m),
        Ok(small) => {
            let fall = |l: &LevelFigures| l.gain_db.map_or(0.0, |g| (small - g) / COMPRESSION_DB);
            run.first_passage(&levels, &fall).0.map(|l| l.input_v_peak)
        }
    };
    let watts = |l: &Figure<LevelFigures>| l.as_ref().map(|l| l.output_w).map_err(|m| *m);
    let power = Power {
        at_onset_w: match (&onset, &onset_level) {
            (Ok(_), Some(l)) => Ok(l.output_w),
            (Err(m), _) => Err(*m),
            (Ok(_), None) => Err(Missing::NotReached),
        },
        at_5_percent_w: watts(&thd_levels[2]),
        at_10_percent_w: watts(&thd_levels[3]),
        max_w: levels.iter().fold(0.0, |m, l| m.max(l.output_w)),
    };
    ToneFigures {
        nominal_hz,
        tone_hz: tone.hz,
        test,
        levels,
        onset,
        headroom,
        thd_inputs,
        compression_1db_v_peak,
        power,
    }
}
