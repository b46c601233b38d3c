//! Every rating of every tube with the margin to it.

use super::amplifier::Amplifier;
use super::operating_point::{OperatingPoint, StagePoint};
use crate::tube::Confidence;

/// Which rating.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum RatingKind {
    PlateVolts,
    PlateColdVolts,
    ScreenVolts,
    ScreenColdVolts,
    PlateDissipation,
    ScreenDissipation,
    CathodeCurrent,
    GridLeak,
    HeaterCathodeVolts,
    GridNegativeVolts,
    /// Direct current through the output transformer's primary.
    TransformerCurrent,
}

impl RatingKind {
    pub fn word(self) -> &'static str {
        match self {
            RatingKind::PlateVolts => "plate-volts",
            RatingKind::PlateColdVolts => "plate-volts-cold-start",
            RatingKind::ScreenVolts => "screen-volts",
            RatingKind::ScreenColdVolts => "screen-volts-cold-start",
            RatingKind::PlateDissipation => "plate-dissipation",
            RatingKind::ScreenDissipation => "screen-dissipation",
            RatingKind::CathodeCurrent => "cathode-current",
            RatingKind::GridLeak => "grid-circuit-resistance",
            RatingKind::HeaterCathodeVolts => "heater-cathode-volts",
            RatingKind::GridNegativeVolts => "grid-negative-volts",
            RatingKind::TransformerCurrent => "transformer-direct-current",
        }
    }

    /// Unit of value and limit.
    pub fn unit(self) -> &'static str {
        match self {
            RatingKind::PlateDissipation | RatingKind::ScreenDissipation => "W",
            RatingKind::CathodeCurrent | RatingKind::TransformerCurrent => "A",
            RatingKind::GridLeak => "Ω",
            _ => "V",
        }
    }
}

/// In which state the value stands.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Condition {
    /// No signal.
    Idle,
    /// The worst over drive, averaged over the cycle, at this peak input and gain setting.
    Driven {
        input_v_peak: f64,
        setting: Option<f64>,
    },
    /// Before any tube draws current.
    ColdStart,
}

/// One rating held against its limit.
#[derive(Clone, Debug, PartialEq)]
pub struct RatingCheck {
    pub stage: String,
    pub tube: String,
    pub kind: RatingKind,
    pub condition: Condition,
    /// Per section where sections are in parallel; magnitudes.
    pub value: f64,
    pub limit: f64,
    /// (limit − value)/limit in percent; negative when exceeded.
    pub margin_percent: f64,
    /// At cold start the running limit is only shown: sheets allow a cold tube more, and seldom print how much.
    pub exceeded: bool,
    pub limit_from_memory: bool,
}

impl RatingCheck {
    pub fn new(
        stage: &str,
        tube: &str,
        kind: RatingKind,
        condition: Condition,
        value: f64,
        limit: f64,
        limit_from_memory: bool,
    ) -> RatingCheck {
        RatingCheck {
            stage: stage.into(),
            tube: tube.into(),
            kind,
            condition,
            value,
            limit,
            margin_percent: 100.0 * (limit - value) / limit,
            exceeded: value > limit && condition != Condition::ColdStart,
            limit_from_memory,
        }
    }
}

/// All checks at rest and at cold start.
pub fn at_idle(amp: &Amplifier, point: &OperatingPoint) -> Vec<RatingCheck> {
    let mut checks = Vec::new();
    for (k, stage) in point.stages.iter().enumerate() {
        checks.extend(stage_checks(amp, k, stage, point));
    }
    if let Some(rated) = point.transformer.direct_rated {
        let last = point.stages.last().map_or("", |s| s.name.as_str());
        checks.push(RatingCheck::new(
            last,
            "transformer",
            RatingKind::TransformerCurrent,
            Condition::Idle,
            point.transformer.direct_amperes,
            rated,
            false,
        ));
    }
    checks
}

fn stage_checks(
    amp: &Amplifier,
    k: usize,
    stage: &StagePoint,
    point: &OperatingPoint,
) -> Vec<RatingCheck> {
    let tube = amp.devices[k].tube();
    let r = &tube.ratings;
    let sections = f64::from(stage.parallel);
    let origin = &tube.provenance.ratings;
    let memory = |key: &str| {
        origin.confidence == Confidence::FromMemory
            || origin.from_memory.iter().any(|m| m.starts_with(key))
    };
    let mut out = Vec::new();
    let mut check = |kind, condition, value: f64, limit: Option<f64>, key: &str| {
        if let Some(limit) = limit {
            out.push(RatingCheck::new(
                &stage.name,
                &stage.tube,
                kind,
                condition,
                value,
                limit.abs(),
                memory(key),
            ));
        }
    };
    let idle = Condition::Idle;
    check(
        RatingKind::PlateVolts,
        idle,
        stage.v_pk,
        r.plate_volts.map(|v| v.0),
        "plate_volts",
    );
    check(
        RatingKind::PlateDissipation,
        idle,
        stage.plate_watts / sections,
        r.plate_dissipation.map(|w| w.0),
        "plate_watts",
    );
    let screen_volts = stage.v_sk.or(stage.triode_connected.then_some(stage.v_pk));
    if let Some(v) = screen_volts {
        check(
            RatingKind::ScreenVolts,
            idle,
            v,
            r.screen_volts.map(|v| v.0),
            "screen_volts",
        );
    }
    if let Some(w) = stage.screen_watts {
        check(
            RatingKind::ScreenDissipation,
            idle,
            w / sections,
            r.screen_dissipation.map(|w| w.0),
            "screen_watts",
        );
    }
    let cathode =
        (stage.plate_amperes + stage.screen_amperes.unwrap_or(0.0) + stage.grid_amperes) / sections;
    check(
        RatingKind::CathodeCurrent,
        idle,
        cathode,
        r.cathode_current.map(|a| a.0),
        "cathode_",
    );
    let leak = if stage.fixed_bias {
        r.grid_leak_fixed_bias
    } else {
        r.grid_leak_cathode_bias
    };
    // Sections in parallel share one leak, so each may count on its share of the limit only.
    check(
        RatingKind::GridLeak,
        idle,
        stage.grid_circuit_ohms * sections,
        leak.map(|o| o.0),
        "grid_leak",
    );
    check(
        RatingKind::HeaterCathodeVolts,
        idle,
        stage.cathode_volts.abs(),
        r.heater_cathode_volts.map(|v| v.0),
        "heater_cathode",
    );
    check(
        RatingKind::GridNegativeVolts,
        idle,
        (-stage.v_gk).max(0.0),
        r.grid_volts_minimum.filter(|v| v.0 < 0.0).map(|v| v.0),
        "grid_volts",
    );
    let rail = |r: usize| point.rails[r].cold_volts;
    let spec = &amp.design.stages[k];
    check(
        RatingKind::PlateColdVolts,
        Condition::ColdStart,
        rail(spec.plate.rail),
        r.plate_volts.map(|v| v.0),
        "plate_volts",
    );
    if let Some(screen) = &spec.screen {
        check(
            RatingKind::ScreenColdVolts,
            Condition::ColdStart,
            rail(screen.rail),
            r.screen_volts.map(|v| v.0),
            "screen_volts",
        );
    }
    out
}

/// What a stage takes on average over a driven cycle.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct DrivenLoad {
    pub plate_watts: f64,
    pub screen_watts: f64,
    pub cathode_amperes: f64,
    /// Mean grid volts to the cathode: the bias as drive has shifted it.
    pub v_gk_mean: f64,
}

/// Checks of one stage under drive.
pub fn when_driven(
    amp: &Amplifier,
    k: usize,
    load: &DrivenLoad,
    condition: Condition,
) -> Vec<RatingCheck> {
    let tube = amp.devices[k].tube();
    let r = &tube.ratings;
    let name = &amp.design.stages[k].name;
    let sections = f64::from(amp.design.stages[k].parallel);
    let origin = &tube.provenance.ratings;
    let memory = |key: &str| {
        origin.confidence == Confidence::FromMemory
            || origin.from_memory.iter().any(|m| m.starts_with(key))
    };
    let mut out = Vec::new();
    let mut check = |kind, value: f64, limit: Option<f64>, key: &str| {
        if let Some(limit) = limit {
            out.push(RatingCheck::new(
                name,
                &tube.name,
                kind,
                condition,
                value,
                limit.abs(),
                memory(key),
            ));
        }
    };
    check(
        RatingKind::PlateDissipation,
        load.plate_watts / sections,
        r.plate_dissipation.map(|w| w.0),
        "plate_watts",
    );
    if load.screen_watts > 0.0 {
        check(
            RatingKind::ScreenDissipation,
            load.screen_watts / sections,
            r.screen_dissipation.map(|w| w.0),
            "screen_watts",
        );
    }
    check(
        RatingKind::CathodeCurrent,
        load.cathode_amperes / sections,
        r.cathode_current.map(|a| a.0),
        "cathode_",
    );
    check(
        RatingKind::GridNegativeVolts,
        (-load.v_gk_mean).max(0.0),
        r.grid_volts_minimum.filter(|v| v.0 < 0.0).map(|v| v.0),
        "grid_volts",
    );
    out
}
