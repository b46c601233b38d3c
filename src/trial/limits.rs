//! How far each stage has gone towards clipping.

use super::figures::Towards;
use super::steady::{Cycle, Tone};
use crate::circuit::alternating::Axis;
use crate::render::Observation;
use crate::stage::amplifier::Amplifier;
use crate::stage::operating_point::{ac_load, grid_circuit_ohms};
use crate::tube::Device;

/// Share of the grid's swing, or of its bias, at which conduction counts as clipping. Chosen.
const CONDUCTION_SHARE: f64 = 0.05;
/// Share of the quiescent gain at which knee or cutoff counts as clipping. Chosen.
const GAIN_SHARE: f64 = 0.5;
/// Share of the quiescent current at which a stage counts as cut off. Chosen.
const CURRENT_SHARE: f64 = 0.02;
/// Places in a period at which the gain is looked at.
const LOOKS: usize = 96;

/// What a stage's limits are measured against, at one tone.
#[derive(Clone, Debug)]
pub struct Reference {
    device: Device,
    /// Magnitude of the source behind the grid at the tone, and for direct current.
    source_ohms: f64,
    direct_ohms: f64,
    /// Magnitudes at the tone of what the plate drives and of what stands in the cathode.
    load_ohms: f64,
    cathode_ohms: f64,
    rest_gain: f64,
    rest_ip: f64,
    /// Grid volts to the cathode at rest.
    pub rest_v_gk: f64,
}

impl Reference {
    pub fn all(amp: &Amplifier, tone: Tone) -> Vec<Reference> {
        let ac = amp.small_signal(tone.hz, Axis::Continuous);
        let v = &amp.rest.volts;
        amp.net()
            .devices
            .iter()
            .enumerate()
            .map(|(k, d)| {
                let s = &amp.rest.devices[k];
                let mut reference = Reference {
                    device: amp.devices[k].clone(),
                    source_ohms: ac.impedance(d.grid).norm(),
                    direct_ohms: grid_circuit_ohms(amp, k),
                    load_ohms: ac_load(amp, k, tone.hz),
                    cathode_ohms: cathode_ohms(amp, k, tone),
                    rest_gain: 0.0,
                    rest_ip: s.i[2],
                    rest_v_gk: v[d.grid] - v[d.cathode],
                };
                reference.rest_gain = reference.gain(s.d[2][0], s.d[2][2]);
                reference
            })
            .collect()
    }

    /// Magnitude of plate volts per grid volt with these slopes: gm·R/(1 + R/rp + Rk(gm + 1/rp)).
    fn gain(&self, gm: f64, gp: f64) -> f64 {
        let r = self.load_ohms;
        gm * r / (1.0 + r * gp + self.cathode_ohms * (gm + gp))
    }

    /// Incremental gain at an instant, re the gain at rest.
    pub fn relative_gain(&self, o: &Observation) -> f64 {
        let c = self.device.currents(o.v_gk, o.v_sk, o.v_pk);
        self.gain(c.ip_g, c.ip_p) / self.rest_gain
    }

    /// Measures of all three limits over a settled period; each is 1 where the limit counts as met.
    ///
    /// *Grid conduction*: with the source of magnitude Z (at the tone) and R (direct) behind the grid, grid
    /// current at the positive peak holds it Z·ig below its open-circuit source, measured against 5 % of the
    /// open-circuit peak's distance from the mean; or its mean shifts the bias by R·mean(ig), measured against
    /// 5 % of the bias. The greater counts. *Plate knee*: the fall of the incremental gain (the law's slopes at
    /// each instant on the load's magnitude at the tone) below its quiescent value while plate current is above
    /// quiescent, measured against a half. *Cutoff*: the same while it is below, or the fall of plate current
    /// below quiescent measured against 98 %, whichever is greater.
    pub fn towards(&self, trace: &[Observation]) -> Towards {
        let count = trace.len() as f64;
        let mean_ig = trace.iter().map(|o| o.ig).sum::<f64>() / count;
        let mut towards = Towards::default();
        if mean_ig > 0.0 {
            let v_g = |o: &Observation| o.v_gk + o.v_k;
            let mean_v = trace.iter().map(v_g).sum::<f64>() / count;
            let peak = trace
                .iter()
                .fold(&trace[0], |p, o| if v_g(o) > v_g(p) { o } else { p });
            let held = self.source_ohms * peak.ig;
            let swing = v_g(peak) - mean_v + held;
            let by_peak = if swing > 0.0 {
                held / (CONDUCTION_SHARE * swing)
            } else {
                0.0
            };
            let bias = self.rest_v_gk.abs().max(0.1);
            let by_mean = self.direct_ohms * mean_ig / (CONDUCTION_SHARE * bias);
            towards.grid_conduction = by_peak.max(by_mean);
        }
        let stride = (trace.len() / LOOKS).max(1);
        for o in trace.iter().step_by(stride) {
            let fall = (1.0 - self.relative_gain(o)) / (1.0 - GAIN_SHARE);
            if o.ip > self.rest_ip {
                towards.plate_knee = towards.plate_knee.max(fall);
            } else {
                let current = (1.0 - o.ip / self.rest_ip) / (1.0 - CURRENT_SHARE);
                towards.cutoff = towards.cutoff.max(fall.max(current));
            }
        }
        towards
    }

    pub fn towards_all(references: &[Reference], cycle: &Cycle) -> Vec<Towards> {
        references
            .iter()
            .zip(&cycle.stages)
            .map(|(r, trace)| r.towards(trace))
            .collect()
    }
}

/// Magnitude of what stands between cathode and ground at the tone, the tube's own slopes taken away.
fn cathode_ohms(amp: &Amplifier, k: usize, tone: Tone) -> f64 {
    let mut bare = amp.clone();
    for s in &mut bare.rest.devices {
        *s = crate::circuit::Slopes::default();
    }
    bare.small_signal(tone.hz, Axis::Continuous)
        .impedance(amp.net().devices[k].cathode)
        .norm()
}
