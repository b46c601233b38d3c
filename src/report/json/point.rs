//! The operating point and the ratings.

use super::entry::{Nullable, objects};
use super::{SCHEMA, written};
use crate::report::safety;
use crate::stage::operating_point::{OperatingPoint, StagePoint, TransformerPoint};
use crate::stage::ratings::{Condition, RatingCheck};
use crate::study::result::{BiasStudy, Warning};

objects! {
    Bias {
        schema: u32,
        kind: &'static str,
        design: String,
        description: String,
        safety: String,
        setting: Nullable<f64>,
        operating_point: Vec<Stage>,
        supply: Supply,
        rails: Vec<Rail>,
        resistors: Vec<Resistor>,
        capacitors: Vec<Capacitor>,
        transformer: Transformer,
        solution: Solution,
        ratings: Vec<Rating>,
        warnings: Vec<WarningEntry>,
    }
    /// One stage at rest; `_v` alone is to ground.
    Stage {
        stage: String,
        tube: String,
        parallel: u32,
        triode_connected: bool,
        fixed_bias: bool,
        plate_v: f64,
        screen_v: Nullable<f64>,
        grid_v: f64,
        cathode_v: f64,
        grid_to_cathode_v: f64,
        plate_to_cathode_v: f64,
        screen_to_cathode_v: Nullable<f64>,
        plate_a: f64,
        screen_a: Nullable<f64>,
        grid_a: f64,
        plate_w: f64,
        screen_w: Nullable<f64>,
        transconductance_s: f64,
        plate_resistance_ohms: Nullable<f64>,
        amplification_factor: Nullable<f64>,
        ac_load_ohms: f64,
        gain: f64,
        grid_circuit_ohms: f64,
    }
    Supply {
        cold_v: f64,
        running_v: f64,
        current_a: f64,
        source_ohms: f64,
    }
    Rail {
        rail: String,
        cold_v: f64,
        running_v: f64,
        current_a: f64,
    }
    Resistor {
        name: String,
        ohms: f64,
        across_v: f64,
        dissipation_w: f64,
    }
    Capacitor {
        name: String,
        farads: f64,
        cold_v: f64,
        running_v: f64,
    }
    /// Referred to the primary, the secondary's copper excepted.
    Transformer {
        turns_ratio: f64,
        reflected_load_ohms: f64,
        primary_inductance_h: f64,
        inductance_if_pentode_h: Nullable<f64>,
        inductance_if_matched_h: Nullable<f64>,
        leakage_inductance_h: f64,
        shunt_capacitance_f: f64,
        primary_resistance_ohms: f64,
        secondary_resistance_ohms: f64,
        core_loss_ohms: f64,
        direct_a: f64,
        direct_rated_a: Nullable<f64>,
        assumptions: Vec<String>,
    }
    /// How the rest was found.
    Solution {
        iterations: usize,
        supply_stepped_up: bool,
    }
    Rating {
        stage: String,
        tube: String,
        rating: &'static str,
        value: f64,
        limit: f64,
        margin_percent: f64,
        unit: &'static str,
        condition: &'static str,
        input_v_peak: Nullable<f64>,
        setting: Nullable<f64>,
        exceeded: bool,
        limit_from_memory: bool,
    }
    WarningEntry {
        code: &'static str,
        place: String,
        message: String,
    }
}

const NO_SCREEN: &str = "no-screen";
const NO_GAIN_CONTROL: &str = "no-gain-control";

/// What `forehear bias` found, as JSON.
pub fn bias_document(study: &BiasStudy) -> String {
    let p = &study.point;
    written(&Bias {
        schema: SCHEMA,
        kind: "bias",
        design: study.design.clone(),
        description: study.description.clone(),
        safety: safety::text(),
        setting: setting(study.gain),
        operating_point: stages(p),
        supply: supply(p),
        rails: rails(p),
        resistors: resistors(p),
        capacitors: capacitors(p),
        transformer: transformer(&p.transformer),
        solution: solution(p),
        ratings: study.ratings.iter().map(rating).collect(),
        warnings: warnings(&study.warnings),
    })
}

pub(super) fn setting(setting: Option<f64>) -> Nullable<f64> {
    setting.ok_or(NO_GAIN_CONTROL)
}

pub(super) fn stages(point: &OperatingPoint) -> Vec<Stage> {
    point.stages.iter().map(stage).collect()
}

fn stage(s: &StagePoint) -> Stage {
    Stage {
        stage: s.name.clone(),
        tube: s.tube.clone(),
        parallel: s.parallel,
        triode_connected: s.triode_connected,
        fixed_bias: s.fixed_bias,
        plate_v: s.plate_volts,
        screen_v: s.screen_volts.ok_or(NO_SCREEN),
        grid_v: s.grid_volts,
        cathode_v: s.cathode_volts,
        grid_to_cathode_v: s.v_gk,
        plate_to_cathode_v: s.v_pk,
        screen_to_cathode_v: s.v_sk.ok_or(NO_SCREEN),
        plate_a: s.plate_amperes,
        screen_a: s.screen_amperes.ok_or(NO_SCREEN),
        grid_a: s.grid_amperes,
        plate_w: s.plate_watts,
        screen_w: s.screen_watts.ok_or(NO_SCREEN),
        transconductance_s: s.gm,
        plate_resistance_ohms: s.rp.ok_or("infinite"),
        amplification_factor: s.mu.ok_or("infinite"),
        ac_load_ohms: s.ac_load,
        gain: s.gain,
        grid_circuit_ohms: s.grid_circuit_ohms,
    }
}

pub(super) fn supply(point: &OperatingPoint) -> Supply {
    let s = &point.supply;
    Supply {
        cold_v: s.cold_volts,
        running_v: s.volts,
        current_a: s.amperes,
        source_ohms: s.resistance,
    }
}

pub(super) fn rails(point: &OperatingPoint) -> Vec<Rail> {
    let rail = |r: &crate::stage::operating_point::RailPoint| Rail {
        rail: r.name.clone(),
        cold_v: r.cold_volts,
        running_v: r.volts,
        current_a: r.amperes,
    };
    point.rails.iter().map(rail).collect()
}

pub(super) fn resistors(point: &OperatingPoint) -> Vec<Resistor> {
    let resistor = |r: &crate::stage::operating_point::ResistorPoint| Resistor {
        name: r.name.clone(),
        ohms: r.ohms,
        across_v: r.volts,
        dissipation_w: r.watts,
    };
    point.resistors.iter().map(resistor).collect()
}

pub(super) fn capacitors(point: &OperatingPoint) -> Vec<Capacitor> {
    let capacitor = |c: &crate::stage::operating_point::CapacitorPoint| Capacitor {
        name: c.name.clone(),
        farads: c.farads,
        cold_v: c.cold_volts,
        running_v: c.volts,
    };
    point.capacitors.iter().map(capacitor).collect()
}

pub(super) fn transformer(t: &TransformerPoint) -> Transformer {
    Transformer {
        turns_ratio: t.turns_ratio,
        reflected_load_ohms: t.reflected_load,
        primary_inductance_h: t.primary_inductance,
        inductance_if_pentode_h: t.inductance_if_pentode.ok_or("not-from-label"),
        inductance_if_matched_h: t.inductance_if_matched.ok_or("not-from-label"),
        leakage_inductance_h: t.leakage_inductance,
        shunt_capacitance_f: t.shunt_capacitance,
        primary_resistance_ohms: t.primary_resistance,
        secondary_resistance_ohms: t.secondary_resistance,
        core_loss_ohms: t.core_loss,
        direct_a: t.direct_amperes,
        direct_rated_a: t.direct_rated.ok_or("not-given"),
        assumptions: t.assumptions.clone(),
    }
}

pub(super) fn solution(point: &OperatingPoint) -> Solution {
    Solution {
        iterations: point.iterations,
        supply_stepped_up: point.used_fallback,
    }
}

pub(super) fn rating(check: &RatingCheck) -> Rating {
    let (condition, input_v_peak, setting) = match check.condition {
        Condition::Idle => ("idle", Err("not-driven"), Err("not-driven")),
        Condition::ColdStart => ("cold-start", Err("not-driven"), Err("not-driven")),
        Condition::Driven {
            input_v_peak,
            setting,
        } => ("driven", Ok(input_v_peak), self::setting(setting)),
    };
    Rating {
        stage: check.stage.clone(),
        tube: check.tube.clone(),
        rating: check.kind.word(),
        value: check.value,
        limit: check.limit,
        margin_percent: check.margin_percent,
        unit: check.kind.unit(),
        condition,
        input_v_peak,
        setting,
        exceeded: check.exceeded,
        limit_from_memory: check.limit_from_memory,
    }
}

pub(super) fn warnings(warnings: &[Warning]) -> Vec<WarningEntry> {
    let entry = |w: &Warning| WarningEntry {
        code: w.code.word(),
        place: w.place.clone(),
        message: w.message.clone(),
    };
    warnings.iter().map(entry).collect()
}
