//! What a builder must hear before any figure.

use super::result::{GainFigures, Warning};
use crate::diagnostic::Code;
use crate::stage::operating_point::OperatingPoint;
use crate::stage::ratings::{Condition, RatingCheck};
use crate::stage::resolve::Prepared;
use crate::trial::figures::Mechanism;
use crate::tube::Confidence;
use crate::units::{Amperes, Volts};

/// Alias level above which a report warns, in dB re the fundamental: the level every render must keep.
const ALIAS_LIMIT_DBC: f64 = -80.0;

fn warning(code: Code, place: &str, message: String) -> Warning {
    Warning {
        code,
        place: place.into(),
        message,
    }
}

/// Ratings exceeded, one warning each.
pub fn of_ratings(checks: &[RatingCheck]) -> Vec<Warning> {
    let mut found: Vec<Warning> = checks
        .iter()
        .filter(|c| c.exceeded)
        .map(|c| {
            let when = match c.condition {
                Condition::Idle => "at idle".to_string(),
                Condition::ColdStart => "at cold start".to_string(),
                Condition::Driven { input_v_peak, .. } => {
                    format!("driven with {input_v_peak:.3} V peak")
                }
            };
            warning(
                Code::RatingExceeded,
                &c.stage,
                format!(
                    "RATING EXCEEDED: {} of {} {when}: {:.4} {} where {:.4} {} is the limit",
                    c.kind.word().replace('-', " "),
                    c.tube,
                    c.value,
                    c.kind.unit(),
                    c.limit,
                    c.kind.unit()
                ),
            )
        })
        .collect();
    found.extend(checks.iter().filter(|c| c.condition == Condition::ColdStart && c.value > c.limit).map(|c| {
        warning(
            Code::ColdStartVolts,
            &c.stage,
            format!(
                "before the tubes warm up {:.0} V stand where {:.0} V is the running limit of {}; sheets allow a cold tube more, check yours",
                c.value, c.limit, c.tube
            ),
        )
    }));
    found
}

/// Where the catalog or the label leaves the ground of known figures.
pub fn of_design(prepared: &Prepared, point: &OperatingPoint) -> Vec<Warning> {
    let mut found = Vec::new();
    for (device, stage) in prepared.devices.iter().zip(&point.stages) {
        let tube = device.tube();
        let range = &tube.fitted_range;
        let sections = f64::from(device.parallel());
        let mut outside = Vec::new();
        if !range.plate_volts.contains(Volts(stage.v_pk)) {
            outside.push(format!("plate at {:.0} V", stage.v_pk));
        }
        if let (Some(v), Some(span)) = (stage.v_sk, &range.screen_volts)
            && !span.contains(Volts(v))
        {
            outside.push(format!("screen at {v:.0} V"));
        }
        if stage.plate_amperes / sections > range.plate_current.high.0
            || !range
                .plate_current
                .contains(Amperes(stage.plate_amperes / sections))
        {
            outside.push(format!(
                "{:.2} mA of plate current",
                1e3 * stage.plate_amperes / sections
            ));
        }
        if !outside.is_empty() {
            found.push(warning(
                Code::OutsideFittedRange,
                &stage.name,
                format!(
                    "{} rests outside the range its law was fitted over: {}",
                    tube.name,
                    outside.join(", ")
                ),
            ));
        }
        if tube.provenance.law.confidence == Confidence::FromMemory {
            found.push(warning(
                Code::FromMemory,
                &stage.name,
                format!("the law of {} rests on figures from memory", tube.name),
            ));
        }
        if let Some(caution) = &tube.caution {
            found.push(warning(
                Code::TubeCaution,
                &stage.name,
                format!("{}: {caution}", tube.name),
            ));
        }
    }
    for assumption in &point.transformer.assumptions {
        found.push(warning(
            Code::TransformerAssumed,
            "transformer",
            format!("assumed: {assumption}"),
        ));
    }
    found
}

/// What the figures of the gain settings say about themselves.
pub fn of_figures(prepared: &Prepared, gains: &[GainFigures]) -> Vec<Warning> {
    let mut found = Vec::new();
    for gain in gains {
        let setting = gain
            .setting
            .map_or("as designed".to_string(), |s| format!("at gain {s}"));
        if let Ok(dbc) = gain.alias.worst_dbc
            && dbc > ALIAS_LIMIT_DBC
        {
            found.push(warning(
                Code::AliasHigh,
                "render",
                format!("{setting} aliases reach {dbc:.0} dBc; use a higher --oversample"),
            ));
        }
        for tone in &gain.tones {
            let unsettled = tone.levels.iter().filter(|l| !l.settled).count();
            if unsettled > 0 {
                found.push(warning(
                    Code::NotSettled,
                    "render",
                    format!(
                        "{setting}, {:.0} Hz: {unsettled} of {} levels did not settle",
                        tone.nominal_hz,
                        tone.levels.len()
                    ),
                ));
            }
        }
        if let Some(Ok(onset)) = gain.tones.first().map(|t| &t.onset) {
            let device = &prepared.devices[onset.stage];
            if onset.mechanism == Mechanism::GridConduction && device.tube().grid_current_assumed {
                let name = &prepared.design.stages[onset.stage].name;
                found.push(warning(
                    Code::GridCurrentAssumed,
                    name,
                    format!("{setting} clipping begins with grid current of {}, for which no data exist: the stand-in law is assumed", device.tube().name),
                ));
            }
        }
    }
    found
}
