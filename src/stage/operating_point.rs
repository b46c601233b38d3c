//! The operating point of a whole amplifier, in the words a builder reads.

use super::amplifier::Amplifier;
use super::supply;
use crate::circuit::PartKind;
use crate::circuit::alternating::Axis;
use crate::design::{CathodeBias, RailFeed};

/// Frequency at which AC loads and gains are quoted, in hertz.
pub const MID_BAND_HZ: f64 = 1000.0;

/// Where the whole amplifier rests. Volts, amperes, watts, ohms, siemens.
#[derive(Clone, Debug, PartialEq)]
pub struct OperatingPoint {
    pub supply: SupplyPoint,
    pub rails: Vec<RailPoint>,
    pub stages: Vec<StagePoint>,
    pub resistors: Vec<ResistorPoint>,
    pub capacitors: Vec<CapacitorPoint>,
    pub transformer: TransformerPoint,
    /// Newton iterations, and whether the supply had to be stepped up from zero.
    pub iterations: usize,
    pub used_fallback: bool,
}

#[derive(Clone, Debug, PartialEq)]
pub struct SupplyPoint {
    /// Volts when nothing draws current.
    pub cold_volts: f64,
    pub volts: f64,
    pub amperes: f64,
    /// Source resistance at this current.
    pub resistance: f64,
}

#[derive(Clone, Debug, PartialEq)]
pub struct RailPoint {
    pub name: String,
    pub volts: f64,
    /// Current that leaves the rail's feed.
    pub amperes: f64,
    /// Before any tube draws current.
    pub cold_volts: f64,
}

/// One stage at rest.
#[derive(Clone, Debug, PartialEq)]
pub struct StagePoint {
    pub name: String,
    pub tube: String,
    pub parallel: u32,
    pub triode_connected: bool,
    /// To ground.
    pub plate_volts: f64,
    pub screen_volts: Option<f64>,
    pub grid_volts: f64,
    pub cathode_volts: f64,
    /// To the cathode.
    pub v_gk: f64,
    pub v_pk: f64,
    pub v_sk: Option<f64>,
    /// All sections together.
    pub plate_amperes: f64,
    pub screen_amperes: Option<f64>,
    pub grid_amperes: f64,
    pub plate_watts: f64,
    pub screen_watts: Option<f64>,
    /// Slopes at this point; of all sections together. A triode-connected pentode counts as the triode it is.
    pub gm: f64,
    /// `None` when plate current does not depend on plate volts here.
    pub rp: Option<f64>,
    pub mu: Option<f64>,
    /// Magnitude of what the plate drives at 1 kHz.
    pub ac_load: f64,
    /// Plate volts per grid volt to ground at 1 kHz; negative means inverted.
    pub gain: f64,
    /// Source resistance the grid returns through at rest (the grid leak with what lies in series).
    pub grid_circuit_ohms: f64,
    pub fixed_bias: bool,
}

#[derive(Clone, Debug, PartialEq)]
pub struct ResistorPoint {
    pub name: String,
    pub ohms: f64,
    pub volts: f64,
    pub watts: f64,
}

#[derive(Clone, Debug, PartialEq)]
pub struct CapacitorPoint {
    pub name: String,
    pub farads: f64,
    pub volts: f64,
    /// Before any tube draws current.
    pub cold_volts: f64,
}

#[derive(Clone, Debug, PartialEq)]
pub struct TransformerPoint {
    pub turns_ratio: f64,
    pub primary_inductance: f64,
    pub leakage_inductance: f64,
    pub shunt_capacitance: f64,
    pub primary_resistance: f64,
    pub secondary_resistance: f64,
    pub core_loss: f64,
    /// What the low corner means when read from a pentode, and from a generator like the primary.
    pub inductance_if_pentode: Option<f64>,
    pub inductance_if_matched: Option<f64>,
    /// Direct current through the primary, and what the label allows.
    pub direct_amperes: f64,
    pub direct_rated: Option<f64>,
    /// Load reflected to the primary.
    pub reflected_load: f64,
    pub assumptions: Vec<String>,
}

/// Reads the operating point off a solved amplifier.
pub fn operating_point(amp: &Amplifier) -> OperatingPoint {
    let net = amp.net();
    let v = &amp.rest.volts;
    let ac = amp.small_signal(MID_BAND_HZ, Axis::Continuous);
    let response = ac.response();
    let cold = cold_volts(amp);
    let stages = net
        .devices
        .iter()
        .enumerate()
        .map(|(k, d)| {
            let spec = &amp.design.stages[k];
            let device = &amp.devices[k];
            let s = &amp.rest.devices[k];
            let vk = v[d.cathode];
            let v_sk = v[d.screen.unwrap_or(d.plate)] - vk;
            let v_pk = v[d.plate] - vk;
            let c = device.electrode_currents(v[d.grid] - vk, v_sk, v_pk);
            let (gm, gp) = (s.d[2][0], s.d[2][2]);
            let has_screen_current = device.tube().kind() == crate::tube::TubeKind::Pentode;
            let grid_signal = response[d.grid];
            let gain = if grid_signal.norm() > 0.0 {
                (response[d.plate] / grid_signal).re
            } else {
                0.0
            };
            StagePoint {
                name: spec.name.clone(),
                tube: device.tube().name.clone(),
                parallel: spec.parallel,
                triode_connected: device.is_triode_connected(),
                plate_volts: v[d.plate],
                screen_volts: d.screen.map(|n| v[n]),
                grid_volts: v[d.grid],
                cathode_volts: vk,
                v_gk: v[d.grid] - vk,
                v_pk,
                v_sk: d.screen.map(|n| v[n] - vk),
                plate_amperes: c.ip,
                screen_amperes: has_screen_current.then_some(c.is),
                grid_amperes: c.ig,
                plate_watts: c.ip * v_pk,
                screen_watts: has_screen_current.then_some(c.is * v_sk),
                gm,
                rp: (gp > 0.0).then(|| 1.0 / gp),
                mu: (gp > 0.0).then(|| gm / gp),
                ac_load: ac_load(amp, k, MID_BAND_HZ),
                gain,
                grid_circuit_ohms: grid_circuit_ohms(amp, k),
                fixed_bias: spec.fixed_bias.is_some(),
            }
        })
        .collect();
    let resistors = net
        .parts
        .iter()
        .filter_map(|p| match p.kind {
            PartKind::Resistor(ohms) => {
                let volts = v[p.a] - v[p.b];
                Some(ResistorPoint {
                    name: p.name.clone(),
                    ohms,
                    volts,
                    watts: volts * volts / ohms,
                })
            }
            _ => None,
        })
        .collect();
    let capacitors = net
        .parts
        .iter()
        .filter_map(|p| match p.kind {
            PartKind::Capacitor(farads) => Some(CapacitorPoint {
                name: p.name.clone(),
                farads,
                volts: v[p.a] - v[p.b],
                cold_volts: cold[p.a] - cold[p.b],
            }),
            _ => None,
        })
        .collect();
    let rails = amp
        .design
        .supply
        .rails
        .iter()
        .enumerate()
        .map(|(r, rail)| {
            let feed = match rail.from {
                RailFeed::Source => "supply.resistance".to_string(),
                RailFeed::Resistor { .. } => format!("supply.rail.{}.resistor", rail.name),
                RailFeed::Choke { .. } => format!("supply.rail.{}.choke", rail.name),
            };
            RailPoint {
                name: rail.name.clone(),
                volts: v[amp.wiring.rails[r]],
                amperes: part_amperes(amp, &feed),
                cold_volts: cold[amp.wiring.rails[r]],
            }
        })
        .collect();
    let iron = &amp.iron;
    OperatingPoint {
        supply: SupplyPoint {
            cold_volts: supply::unloaded_volts(&amp.design.supply.source),
            volts: amp.source.volts
                - amp.source.resistance * part_amperes(amp, "supply.resistance"),
            amperes: part_amperes(amp, "supply.resistance"),
            resistance: amp.source.resistance,
        },
        rails,
        stages,
        resistors,
        capacitors,
        transformer: TransformerPoint {
            turns_ratio: iron.turns_ratio,
            primary_inductance: iron.primary_inductance,
            leakage_inductance: iron.leakage_inductance,
            shunt_capacitance: iron.shunt_capacitance,
            primary_resistance: iron.primary_resistance,
            secondary_resistance: iron.secondary_resistance,
            core_loss: iron.core_loss,
            inductance_if_pentode: iron.inductance_if_pentode,
            inductance_if_matched: iron.inductance_if_matched,
            direct_amperes: -part_amperes(amp, "transformer.primary_inductance"),
            direct_rated: amp.design.transformer.dc_rated.map(|a| a.0),
            reflected_load: iron.turns_ratio.powi(2) * amp.design.load.resistance.0,
            assumptions: iron.assumptions.clone(),
        },
        iterations: amp.rest.iterations,
        used_fallback: amp.rest.used_fallback,
    }
}

fn part_amperes(amp: &Amplifier, name: &str) -> f64 {
    let at = amp.net().parts.iter().position(|p| p.name == name);
    at.map_or(0.0, |k| amp.rest.part_amperes[k])
}

/// Magnitude of the impedance that stage `k`'s plate drives at `frequency`, the tube's own rp taken away.
pub fn ac_load(amp: &Amplifier, k: usize, frequency: f64) -> f64 {
    let ac = amp.small_signal(frequency, Axis::Continuous);
    let d = amp.net().devices[k];
    let whole = ac.impedance(d.plate);
    let gp = amp.rest.devices[k].d[2][2];
    let left = 1.0 / whole - nalgebra::Complex::new(gp, 0.0);
    1.0 / left.norm()
}

/// Direct-current resistance from stage `k`'s grid to ground or bias, in ohms.
pub fn grid_circuit_ohms(amp: &Amplifier, k: usize) -> f64 {
    // Far below every coupling corner only the path for direct current is left.
    const NEARLY_DIRECT_HZ: f64 = 1e-6;
    let mut cold = amp.clone();
    for s in &mut cold.rest.devices {
        *s = crate::circuit::Slopes::default();
    }
    cold.small_signal(NEARLY_DIRECT_HZ, Axis::Continuous)
        .impedance(amp.net().devices[k].grid)
        .norm()
}

/// Node volts before any tube draws current: rails at the unloaded source, plates and screens with them.
fn cold_volts(amp: &Amplifier) -> Vec<f64> {
    let mut net = amp.net().clone();
    net.devices.clear();
    for (node, drive) in &mut net.drives {
        if *node == amp.wiring.source {
            *drive =
                crate::circuit::Drive::Constant(supply::unloaded_volts(&amp.design.supply.source));
        }
    }
    crate::circuit::direct::solve(&net, None, &|_, _, _, _| crate::circuit::Slopes::default())
        .map(|r| r.volts)
        .unwrap_or_else(|_| amp.rest.volts.clone())
}

/// Whether stage `k` biases itself by its cathode.
pub fn is_cathode_biased(amp: &Amplifier, k: usize) -> bool {
    !matches!(amp.design.stages[k].cathode.bias, CathodeBias::Grounded)
        && amp.design.stages[k].fixed_bias.is_none()
}
