//! A solved amplifier made ready for one sample rate.

use std::sync::Arc;

use super::kernel::Kernel;
use crate::circuit::PartKind;
use crate::circuit::companion::{Network, Port, cut};
use crate::stage::amplifier::Amplifier;
use crate::stage::surface::{Extent, Surface, Surroundings};
use crate::stage::wiring::LoadKind;

/// Networks, surfaces and the rest state of an amplifier at one oversampled rate.
#[derive(Clone, Debug)]
pub struct Model {
    pub rate: f64,
    pub networks: Vec<Network>,
    pub surfaces: Vec<Arc<Surface>>,
    /// Every state at the surfaces' own rest.
    pub rest: Vec<f64>,
    scales: Vec<f64>,
    pub turns_ratio: f64,
    pub output_rail: usize,
    pub rails: usize,
    /// Rest volts of grid, plate and screen to the cathode and cathode to ground, per stage.
    pub stage_rest: Vec<StageRest>,
}

/// Where one stage rests, in volts and amperes.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct StageRest {
    pub v_gk: f64,
    pub v_pk: f64,
    pub v_sk: f64,
    pub v_k: f64,
    pub ip: f64,
    pub is: f64,
}

/// The time-stepped amplifier has no rest.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[error("the time-stepped amplifier does not come to rest: {drift:.3e} V per sample remain")]
pub struct ModelFault {
    pub drift: f64,
}

/// Fineness of the surfaces.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Fineness {
    pub triode: (usize, usize),
    pub pentode: (usize, usize),
    pub grid: (usize, usize),
}

impl Default for Fineness {
    fn default() -> Self {
        Fineness {
            triode: (64, 10),
            pentode: (96, 36),
            grid: (48, 8),
        }
    }
}

/// Steps from one state after which the kernel's memories have followed it.
const MEMORY_STEPS: usize = 6;
/// Steps of Newton's method towards the silent rest, and how many of them take a Jacobian of their own.
const SETTLE_ROUNDS: usize = 16;
const SETTLE_JACOBIANS: usize = 2;
/// Cathode current that counts as none when the surface's lower edge is sought, in amperes.
const CUTOFF_A: f64 = 1e-8;

impl Model {
    /// Discretizes at `rate` hertz (oversampled) for inputs up to `input_peak` volts at the jack.
    ///
    /// # Errors
    /// [`ModelFault`] when no rest state is found.
    pub fn new(amp: &Amplifier, rate: f64, input_peak: f64) -> Result<Model, ModelFault> {
        Model::with_fineness(amp, rate, input_peak, Fineness::default())
    }

    /// As [`Model::new`], with surfaces of a stated fineness.
    ///
    /// # Errors
    /// [`ModelFault`] when no rest state is found.
    pub fn with_fineness(
        amp: &Amplifier,
        rate: f64,
        input_peak: f64,
        fineness: Fineness,
    ) -> Result<Model, ModelFault> {
        let h = 1.0 / rate;
        let networks = cut(&amp.wiring.net, h, &[amp.wiring.load_top]);
        let surfaces = (0..amp.devices.len())
            .map(|k| Arc::new(build_surface(amp, &networks, k, h, input_peak, fineness)))
            .collect();
        let stage_rest = amp
            .wiring
            .net
            .devices
            .iter()
            .zip(&amp.rest.devices)
            .map(|(d, s)| {
                let v = &amp.rest.volts;
                let vk = v[d.cathode];
                StageRest {
                    v_gk: v[d.grid] - vk,
                    v_pk: v[d.plate] - vk,
                    v_sk: v[d.screen.unwrap_or(d.plate)] - vk,
                    v_k: vk,
                    ip: s.i[2],
                    is: s.i[1],
                }
            })
            .collect();
        let mut rest: Vec<f64> = Vec::new();
        for n in &networks {
            rest.extend(n.rest(&amp.wiring.net, &amp.rest.volts, &amp.rest.part_amperes));
        }
        for d in &amp.wiring.net.devices {
            let v = &amp.rest.volts;
            rest.extend([
                v[d.grid] - v[d.plate],
                v[d.grid] - v[d.cathode],
                v[d.plate] - v[d.cathode],
            ]);
        }
        let mut scales: Vec<f64> = networks
            .iter()
            .flat_map(|n| &n.reactive)
            .map(|&p| match amp.wiring.net.parts[p].kind {
                PartKind::Inductor(_) => 1e-3,
                _ => 1.0,
            })
            .collect();
        scales.resize(rest.len(), 1.0);
        let mut model = Model {
            rate,
            scales,
            networks,
            surfaces,
            rest,
            turns_ratio: amp.wiring.turns_ratio,
            output_rail: amp.wiring.output_rail,
            rails: amp.wiring.rails.len(),
            stage_rest,
        };
        model.settle()?;
        Ok(model)
    }

    /// Solves the surfaces alone: what a change of bias costs.
    pub fn surfaces_only(amp: &Amplifier, rate: f64, input_peak: f64) -> Vec<Surface> {
        let h = 1.0 / rate;
        let networks = cut(&amp.wiring.net, h, &[amp.wiring.load_top]);
        (0..amp.devices.len())
            .map(|k| build_surface(amp, &networks, k, h, input_peak, Fineness::default()))
            .collect()
    }

    /// What counts as one unit of each state: a volt on a capacitor, a milliampere in an inductor.
    pub fn state_scales(&self) -> Vec<f64> {
        self.scales.clone()
    }

    /// Newton's method on one silent step: the exact rest differs from the surfaces' by their interpolation error.
    ///
    /// The Jacobian is taken by differences twice and then kept: its error, about the share of a nudge, is what
    /// each further step leaves of the one before. Ended by the last of those steps that still gains.
    fn settle(&mut self) -> Result<(), ModelFault> {
        use nalgebra::{DMatrix, DVector};
        let n = self.rest.len();
        let mut kernel = Kernel::<1>::new([self]);
        // The memories that start iterations follow the state within a few steps.
        let image = |kernel: &mut Kernel<1>, x: &DVector<f64>| {
            for _ in 0..MEMORY_STEPS {
                kernel.set_state(0, x.as_slice());
                kernel.step([0.0]);
            }
            DVector::from_vec(kernel.state(0))
        };
        kernel.recall_rest(self);
        let mut x = DVector::from_vec(self.rest.clone());
        let mut f = image(&mut kernel, &x) - &x;
        let mut tangent = None;
        let mut smallest = f64::INFINITY;
        for round in 0..SETTLE_ROUNDS {
            if round < SETTLE_JACOBIANS {
                let base = image(&mut kernel, &x);
                let mut jacobian = DMatrix::zeros(n, n);
                for k in 0..n {
                    let nudge = 1e-4 * x[k].abs().max(1e-3);
                    let mut y = x.clone();
                    y[k] += nudge;
                    let moved = image(&mut kernel, &y);
                    for r in 0..n {
                        jacobian[(r, k)] = (moved[r] - base[r]) / nudge;
                    }
                    jacobian[(k, k)] -= 1.0;
                }
                f = image(&mut kernel, &x) - &x;
                tangent = Some(jacobian.lu());
            }
            let Some(step) = tangent.as_ref().and_then(|t| t.solve(&f)) else {
                break;
            };
            if !step.amax().is_finite() {
                break;
            }
            let size = step
                .iter()
                .zip(&self.scales)
                .fold(0.0f64, |m, (s, scale)| m.max(s.abs() / scale));
            if round > SETTLE_JACOBIANS && size > 0.5 * smallest {
                break;
            }
            smallest = smallest.min(size);
            x -= &step;
            f = image(&mut kernel, &x) - &x;
        }
        let drift = f.amax();
        self.rest = x.as_slice().to_vec();
        if drift.is_finite() && drift < 1e-3 {
            Ok(())
        } else {
            Err(ModelFault { drift })
        }
    }
}

/// The impedance between two ports at one instant, in ohms; 0 when they lie in different networks.
pub fn instantaneous(networks: &[Network], a: Port, b: Port) -> f64 {
    for n in networks {
        if let (Some(i), Some(j)) = (
            n.ports.iter().position(|p| *p == a),
            n.ports.iter().position(|p| *p == b),
        ) {
            return -n.port_volts[i].ports[j];
        }
    }
    0.0
}

fn build_surface(
    amp: &Amplifier,
    networks: &[Network],
    k: usize,
    h: f64,
    input_peak: f64,
    fineness: Fineness,
) -> Surface {
    let device = &amp.devices[k];
    let d = amp.wiring.net.devices[k];
    let volts = &amp.rest.volts;
    let c = amp.capacitances()[k];
    let s = Surroundings {
        z_pp: instantaneous(networks, Port::Plate(k), Port::Plate(k)),
        r_k: instantaneous(networks, Port::Cathode(k), Port::Cathode(k)),
        r_s: instantaneous(networks, Port::Screen(k), Port::Screen(k)),
        g_gp: 2.0 * c.grid_plate / h,
        g_gk: 2.0 * c.grid_cathode / h,
        g_pk: 2.0 * c.plate_cathode / h,
    };
    let currents = amp.rest.devices[k].i;
    let cathode = volts[d.cathode] - s.r_k * (currents[0] + currents[1] + currents[2]);
    let v_rest = volts[d.grid] - cathode;
    let e_rest = volts[d.plate] + s.z_pp * currents[2] - cathode;
    let s_rest = d
        .screen
        .map_or(0.0, |n| volts[n] + s.r_s * currents[1] - cathode);
    let supply = amp.supply_volts();
    // An inductive loudspeaker throws the open-circuit volts far above the supply when the tube lets go.
    let thrown = amp.drives_transformer(k)
        && amp.load == LoadKind::Loudspeaker
        && amp.design.load.loudspeaker.is_some();
    let e = if thrown {
        (-1.5 * supply, 9.0 * supply)
    } else if amp.drives_transformer(k) {
        (-0.6 * supply, 3.6 * supply)
    } else {
        (0.05 * e_rest, (1.25 * supply).max(e_rest + 20.0))
    };
    let device_volts_at = |v: f64| device.currents(v, s_rest, e.1);
    let mut cutoff = -1.0;
    while cutoff > -400.0 {
        let c = device_volts_at(cutoff);
        if c.ip + c.is < CUTOFF_A {
            break;
        }
        cutoff *= 1.15;
    }
    // The input's peak reaches the grid unweakened only where nothing but the jack stands before it.
    let source = instantaneous(networks, Port::Grid(k), Port::Grid(k));
    // An unbypassed cathode follows its grid: as far as the tube can pull it up while the grid conducts.
    let own_rise = s.r_k * device.currents(1.0, s_rest, 0.5 * supply).ip;
    let direct = if k == 0 && source < 1e3 {
        input_peak
    } else {
        0.0
    };
    // Elsewhere the source's resistance holds the grid: no higher than where the current it would have to
    // give drops the whole supply.
    let mut top = (2.0 + own_rise).max(direct);
    while k > 0
        && top < 40.0
        && source * device.currents(top - own_rise, s_rest, 0.3 * supply).ig < supply
    {
        top *= 1.25;
    }
    let bottom = cutoff.min(v_rest - 1.0);
    let (v_cells, e_cells) = if device.has_screen_port() || amp.drives_transformer(k) {
        let (v, e) = fineness.pentode;
        (v, if thrown { 2 * e } else { e })
    } else {
        fineness.triode
    };
    // As fine as if the top were at conduction's corner; conduction itself keeps its own spacing.
    let widened = |cells: usize, from: f64, usual: f64| -> usize {
        let share = (top - from) / (usual - from);
        (cells as f64 * share.clamp(1.0, 4.0)).ceil() as usize
    };
    let v_cells = widened(v_cells, bottom, 2.0 + own_rise);
    let grid_cells = widened(fineness.grid.0, -1.0, 2.0 + own_rise);
    let extent = Extent {
        v: (bottom, top),
        e,
        v_cells,
        e_cells,
        grid_cells,
        grid_e_cells: fineness.grid.1,
        s0: s_rest,
    };
    Surface::build(device, s, extent, (v_rest, e_rest))
}
