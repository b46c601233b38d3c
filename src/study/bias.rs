//! The operating point with every rating, idle and driven.

use super::result::BiasStudy;
use super::{BASE_RATE_HZ, StudyFault, Watch, warnings};
use crate::render::Model;
use crate::stage::amplifier::Amplifier;
use crate::stage::operating_point::operating_point;
use crate::stage::ratings::{self, Condition, DrivenLoad, RatingCheck};
use crate::stage::resolve::Prepared;
use crate::stage::wiring::LoadKind;
use crate::trial::figures::LevelFigures;
use crate::trial::tone;

/// Oversampling of the driven sweep: enough for averages over a cycle.
const DRIVEN_OVERSAMPLE: f64 = 4.0;

/// Solves the operating point at the highest gain setting and seeks the worst drive there.
///
/// # Errors
/// [`StudyFault`] when the circuit has no rest, or on interruption.
pub fn study(prepared: &Prepared, watch: &Watch) -> Result<BiasStudy, StudyFault> {
    let design = &prepared.design;
    let gain = design
        .control
        .gain
        .map(|_| design.control.settings.iter().copied().fold(0.0, f64::max));
    (watch.progress)(0.0, "operating point");
    let amp = Amplifier::solve(
        design,
        &prepared.devices,
        &prepared.iron,
        gain,
        LoadKind::Rated,
    )?;
    let point = operating_point(&amp);
    let mut checks = ratings::at_idle(&amp, &point);
    watch.check()?;
    (watch.progress)(0.3, "ratings under drive");
    let model = Model::new(
        &amp,
        DRIVEN_OVERSAMPLE * BASE_RATE_HZ,
        tone::HIGHEST_LEVEL_V,
    )?;
    let figures = tone::run(&amp, &model, tone::HEADLINE_HZ, design.control.test_level.0);
    checks.extend(worst_driven(&amp, &figures.levels, gain));
    let mut found = warnings::of_design(prepared, &point);
    found.extend(warnings::of_ratings(&checks));
    Ok(BiasStudy {
        design: design.name.clone(),
        description: design.description.clone(),
        gain,
        point,
        ratings: checks,
        warnings: found,
    })
}

/// Highest input at which ratings are sought, in volts peak: above the hardest chord of a hot pickup. Chosen.
pub const HARDEST_PLAYING_V: f64 = 1.0;

/// For each stage and rating the level, up to [`HARDEST_PLAYING_V`], at which it is used most.
pub fn worst_driven(
    amp: &Amplifier,
    levels: &[LevelFigures],
    setting: Option<f64>,
) -> Vec<RatingCheck> {
    let mut worst: Vec<RatingCheck> = Vec::new();
    for level in levels
        .iter()
        .filter(|l| l.input_v_peak <= HARDEST_PLAYING_V)
    {
        let condition = Condition::Driven {
            input_v_peak: level.input_v_peak,
            setting,
        };
        for (k, s) in level.stages.iter().enumerate() {
            let load = DrivenLoad {
                plate_watts: s.plate_watts,
                screen_watts: s.screen_watts,
                cathode_amperes: s.plate_amperes + s.screen_amperes + s.grid_amperes,
                v_gk_mean: s.v_gk_mean,
            };
            for check in ratings::when_driven(amp, k, &load, condition) {
                keep_worst(&mut worst, check);
            }
        }
    }
    worst
}

/// Adds a driven check, or replaces the milder one of the same stage and rating.
pub fn keep_worst(worst: &mut Vec<RatingCheck>, check: RatingCheck) {
    match worst
        .iter_mut()
        .find(|w| w.stage == check.stage && w.kind == check.kind)
    {
        Some(w) => {
            if check.margin_percent < w.margin_percent {
                *w = check;
            }
        }
        None => worst.push(check),
    }
}
