//! A design solved at rest.

use super::iron::Iron;
use super::supply::{self, Thevenin};
use super::wiring::{self, LoadKind, Wiring};
use crate::circuit::alternating::{Axis, DeviceCapacitances, SmallSignal};
use crate::circuit::direct::{self, NotSettled, Rest};
use crate::circuit::{Netlist, Slopes};
use crate::design::Design;
use crate::tube::Device;

/// A design with one gain setting and one kind of load, at rest.
#[derive(Clone, Debug)]
pub struct Amplifier {
    pub design: Design,
    pub devices: Vec<Device>,
    pub iron: Iron,
    pub wiring: Wiring,
    pub source: Thevenin,
    pub rest: Rest,
    pub gain: Option<f64>,
    pub load: LoadKind,
}

/// Passes of the rectifier's straight line until it meets its own current.
const SUPPLY_PASSES: usize = 40;
/// Change of the supply's open-circuit volts that counts as none, in volts.
const SUPPLY_SETTLED_V: f64 = 1e-10;

/// A device's currents and slopes in the order the circuit wants them.
pub fn slopes(device: &Device, v_gk: f64, v_sk: f64, v_pk: f64) -> Slopes {
    let c = device.currents(v_gk, v_sk, v_pk);
    Slopes {
        i: [c.ig, c.is, c.ip],
        d: [
            [c.ig_g, 0.0, c.ig_p],
            [c.is_g, c.is_s, c.is_p],
            [c.ip_g, c.ip_s, c.ip_p],
        ],
    }
}

impl Amplifier {
    /// Solves the whole circuit at rest, supply included.
    ///
    /// A rectified supply is a curve; it is met by its tangent at the current found so far until that
    /// tangent no longer moves.
    ///
    /// # Errors
    /// [`NotSettled`] with the node that would not balance.
    pub fn solve(
        design: &Design,
        devices: &[Device],
        iron: &Iron,
        gain: Option<f64>,
        load: LoadKind,
    ) -> Result<Amplifier, NotSettled> {
        let triode: Vec<bool> = devices.iter().map(|d| !d.has_screen_port()).collect();
        let law = |k: usize, g: f64, s: f64, p: f64| slopes(&devices[k], g, s, p);
        let mut amperes = 0.03;
        let mut source = supply::thevenin(&design.supply.source, amperes);
        let mut wiring = wiring::wire(design, &triode, iron, source, gain, load);
        let start = starting_volts(&wiring, source.volts);
        let mut rest = direct::solve(&wiring.net, Some(&start), &law)?;
        for _ in 0..SUPPLY_PASSES {
            let part = wiring
                .net
                .parts
                .iter()
                .position(|p| p.name == "supply.resistance");
            amperes = part.map_or(0.0, |k| rest.part_amperes[k]);
            let next = supply::thevenin(&design.supply.source, amperes);
            let moved = (next.volts - source.volts).abs()
                + (next.resistance - source.resistance).abs() * amperes;
            if moved < SUPPLY_SETTLED_V {
                break;
            }
            source = next;
            wiring = wiring::wire(design, &triode, iron, source, gain, load);
            let fallback = rest.used_fallback;
            rest = direct::solve(&wiring.net, Some(&rest.volts), &law)?;
            rest.used_fallback |= fallback;
        }
        Ok(Amplifier {
            design: design.clone(),
            devices: devices.to_vec(),
            iron: iron.clone(),
            wiring,
            source,
            rest,
            gain,
            load,
        })
    }

    /// Open-circuit volts of the supply: no node of the amplifier rests higher.
    pub fn supply_volts(&self) -> f64 {
        self.source
            .volts
            .max(supply::unloaded_volts(&self.design.supply.source))
    }

    pub fn drives_transformer(&self, k: usize) -> bool {
        self.design.stages[k].plate.resistor.is_none()
    }

    pub fn net(&self) -> &Netlist {
        &self.wiring.net
    }

    pub fn capacitances(&self) -> Vec<DeviceCapacitances> {
        self.devices
            .iter()
            .zip(&self.design.stages)
            .map(|(d, stage)| {
                let c = d.capacitances();
                DeviceCapacitances {
                    grid_plate: c.grid_plate + stage.strays.grid_plate.0,
                    grid_cathode: c.grid_cathode + stage.strays.grid_cathode.0,
                    plate_cathode: c.plate_cathode + stage.strays.plate_cathode.0,
                }
            })
            .collect()
    }

    /// The small-signal circuit at `frequency` hertz.
    pub fn small_signal(&self, frequency: f64, axis: Axis) -> SmallSignal {
        SmallSignal::new(
            &self.wiring.net,
            &self.rest.devices,
            &self.capacitances(),
            frequency,
            axis,
        )
    }

    /// Complex gain from jack to loudspeaker terminals.
    pub fn gain_at(&self, frequency: f64, axis: Axis) -> nalgebra::Complex<f64> {
        let v = self.small_signal(frequency, axis).response();
        (v[self.wiring.load_top] - v[self.wiring.rails[self.wiring.output_rail]])
            / self.wiring.turns_ratio
    }
}

/// Where Newton starts: rails up, plates at two thirds, cathodes a little above ground.
fn starting_volts(wiring: &Wiring, supply: f64) -> Vec<f64> {
    let mut volts = vec![0.0; wiring.net.node_count()];
    for (name, v) in wiring.net.node_names.iter().zip(volts.iter_mut()) {
        if name.starts_with("supply.")
            || name.starts_with("transformer.")
            || name.starts_with("load.")
        {
            *v = 0.9 * supply;
        } else if name.ends_with(".plate") || name.ends_with(".screen.resistor") {
            *v = 0.67 * supply;
        }
    }
    volts
}
