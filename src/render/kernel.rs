//! Stagewise port reduction: one oversampled step of a whole amplifier, in several lanes at once.

use std::sync::Arc;

use super::model::{Model, instantaneous};
use super::network::Block;
use crate::circuit::companion::{Input, Port};
use crate::stage::surface::Surface;

/// A grid voltage counts as found when Newton's last step was smaller than this, in volts.
///
/// The currents are carried on along their slopes by that step, so what remains is half their curvature
/// times its square: below 1e-10 A for every tube of the catalog.
const GRID_SETTLED_V: f64 = 3e-4;
const GRID_ITERATIONS: usize = 40;

/// What one tube does at one sample.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Observation {
    /// Volts to the cathode.
    pub v_gk: f64,
    pub v_sk: f64,
    pub v_pk: f64,
    /// Cathode to ground.
    pub v_k: f64,
    /// Currents of the tube itself, capacitances left out.
    pub ip: f64,
    pub is: f64,
    pub ig: f64,
}

#[derive(Clone)]
struct Cell {
    surface: Arc<Surface>,
    z_pp: f64,
    /// From this plate to the next grid and back, and the next grid's own; 0 for the last stage.
    z_pg: f64,
    z_gp: f64,
    z_gg_own: f64,
    r_k: f64,
    r_k_folded: f64,
    r_s: f64,
    g_gp: f64,
    g_gk: f64,
    g_pk: f64,
    // states
    w_gp: f64,
    w_gk: f64,
    w_pk: f64,
    v_last: f64,
    v_before: f64,
    ig_last: f64,
    ig_before: f64,
    cap_last: f64,
    cap_before: f64,
    is_last: f64,
    dp_last: f64,
    // this sample
    v: f64,
    e: f64,
    ek: f64,
    es: f64,
    ip: f64,
    is: f64,
    ig: f64,
    vp: f64,
    vk: f64,
    slope: f64,
    v_over_e: f64,
    ig_over_e: f64,
    next_estimate: f64,
}

/// Where a stage's ports lie: block and port.
#[derive(Clone, Copy)]
struct Ports {
    grid: (usize, usize),
    plate: (usize, usize),
    cathode: (usize, usize),
    screen: Option<(usize, usize)>,
}

/// The amplifiers of `L` lanes, stepped together. All lanes share one design; pots may differ.
pub struct Kernel<const L: usize> {
    blocks: Vec<Block<L>>,
    supply: Block<L>,
    /// Between the rails, ohms.
    rail_impedance: Vec<[f64; L]>,
    rail_volts: Vec<[f64; L]>,
    /// The block in which the load lies.
    output: usize,
    cells: Vec<[Cell; L]>,
    ports: Vec<Ports>,
    output_rail: usize,
    per_turns_ratio: [f64; L],
    draw_last: Vec<[f64; L]>,
    draw_before: Vec<[f64; L]>,
    /// Samples at which a stage left its surface or its grid did not settle.
    pub strayed: u64,
    #[cfg(target_arch = "x86_64")]
    wide: bool,
    /// Looks at a surface so far: what a render costs beside its networks.
    pub looks: u64,
}

/// Largest step of the grid's iteration, in volts: keeps the corner of conduction from throwing it.
const STEP_LIMIT_V: f64 = 20.0;

/// A step within [`STEP_LIMIT_V`]; not-a-number passes through.
#[inline(always)]
#[allow(clippy::manual_clamp)] // two compares are half of what `clamp` compiles to
fn bounded(step: f64) -> f64 {
    if step > STEP_LIMIT_V {
        STEP_LIMIT_V
    } else if step < -STEP_LIMIT_V {
        -STEP_LIMIT_V
    } else {
        step
    }
}

impl<const L: usize> Kernel<L> {
    /// Sets up at rest. All models must come from one design at one rate.
    pub fn new(models: [&Model; L]) -> Self {
        let first = models[0];
        let mut blocks = Vec::new();
        let mut offset = 0;
        for (n, network) in first.networks.iter().enumerate() {
            blocks.push(Block::new(&models, n, offset));
            offset += network.reactive.len();
        }
        let supply = blocks.pop().expect("the supply is always a network");
        let stages = first.surfaces.len();
        let find = |port: Port| {
            first.networks.iter().enumerate().find_map(|(n, network)| {
                network
                    .ports
                    .iter()
                    .position(|p| *p == port)
                    .map(|k| (n, k))
            })
        };
        let ports: Vec<Ports> = (0..stages)
            .map(|k| Ports {
                grid: find(Port::Grid(k)).expect("every grid is a port"),
                plate: find(Port::Plate(k)).expect("every plate is a port"),
                cathode: find(Port::Cathode(k)).expect("every cathode is a port"),
                screen: find(Port::Screen(k)),
            })
            .collect();
        let impedance = |a: Port, b: Port, l: usize| instantaneous(&models[l].networks, a, b);
        let cells = (0..stages)
            .map(|k| {
                std::array::from_fn(|l| {
                    let m = models[l];
                    let surface = m.surfaces[k].clone();
                    let s = surface.surroundings;
                    let w = &m.rest[offset + 3 * k..offset + 3 * k + 3];
                    let (plate, grid) = (Port::Plate(k), Port::Grid(k + 1));
                    let has_next = k + 1 < stages;
                    Cell {
                        z_pp: s.z_pp,
                        z_pg: if has_next {
                            impedance(plate, grid, l)
                        } else {
                            0.0
                        },
                        z_gp: if has_next {
                            impedance(grid, plate, l)
                        } else {
                            0.0
                        },
                        z_gg_own: impedance(Port::Grid(k), Port::Grid(k), l),
                        r_k: s.r_k,
                        r_k_folded: s.r_k / (1.0 + s.r_k * s.g_gk),
                        r_s: s.r_s,
                        g_gp: s.g_gp,
                        g_gk: s.g_gk,
                        g_pk: s.g_pk,
                        surface,
                        w_gp: w[0],
                        w_gk: w[1],
                        w_pk: w[2],
                        v_last: 0.0,
                        v_before: 0.0,
                        ig_last: 0.0,
                        ig_before: 0.0,
                        cap_last: 0.0,
                        cap_before: 0.0,
                        is_last: 0.0,
                        dp_last: 0.0,
                        v: 0.0,
                        e: 0.0,
                        ek: 0.0,
                        es: 0.0,
                        ip: 0.0,
                        is: 0.0,
                        ig: 0.0,
                        vp: 0.0,
                        vk: 0.0,
                        slope: 0.0,
                        v_over_e: 0.0,
                        ig_over_e: 0.0,
                        next_estimate: 0.0,
                    }
                })
            })
            .collect();
        let rails = first.rails;
        let rail_impedance = (0..rails * rails)
            .map(|k| {
                let (a, b) = (Port::Rail(k / rails), Port::Rail(k % rails));
                std::array::from_fn(|l| impedance(a, b, l))
            })
            .collect();
        let mut kernel = Kernel {
            output: blocks
                .iter()
                .position(|b| b.watches)
                .expect("the load lies in one network"),
            blocks,
            supply,
            rail_volts: vec![[0.0; L]; rails],
            rail_impedance,
            cells,
            ports,
            output_rail: first.output_rail,
            per_turns_ratio: std::array::from_fn(|l| 1.0 / models[l].turns_ratio),
            draw_last: vec![[0.0; L]; rails],
            draw_before: vec![[0.0; L]; rails],
            strayed: 0,
            #[cfg(target_arch = "x86_64")]
            wide: std::arch::is_x86_feature_detected!("avx"),
            looks: 0,
        };
        for (l, model) in models.iter().enumerate() {
            kernel.remember_rest(l, model);
        }
        kernel
    }

    /// Fills the memories that only start iterations with their values at rest.
    fn remember_rest(&mut self, l: usize, model: &Model) {
        for (k, rest) in model.stage_rest.iter().enumerate() {
            let cell = &mut self.cells[k][l];
            let rise = cell.r_k * (rest.ip + rest.is);
            cell.v_last = rest.v_gk + rise;
            cell.v_before = cell.v_last;
            (cell.ig_last, cell.ig_before) = (0.0, 0.0);
            (cell.cap_last, cell.cap_before) = (0.0, 0.0);
            cell.is_last = rest.is;
            cell.dp_last = 0.0;
        }
        // Two passes settle what the rails are believed to deliver.
        for r in 0..self.draw_last.len() {
            self.draw_last[r][l] = 0.0;
            self.draw_before[r][l] = 0.0;
        }
        let state = self.state(l);
        for _ in 0..4 {
            let mut input = [0.0; L];
            input[l] = 0.0;
            self.step(input);
            self.set_state(l, &state);
            for cell in &mut self.cells {
                cell[l].v_before = cell[l].v_last;
                cell[l].ig_before = cell[l].ig_last;
                cell[l].cap_before = cell[l].cap_last;
            }
            for r in 0..self.draw_last.len() {
                self.draw_before[r][l] = self.draw_last[r][l];
            }
        }
        self.strayed = 0;
    }

    /// Returns the first lane's memories to rest.
    pub fn recall_rest(&mut self, model: &Model) {
        self.remember_rest(0, model);
    }

    /// Puts every lane at its model's rest.
    pub fn reset(&mut self, models: [&Model; L]) {
        for (l, model) in models.iter().enumerate() {
            self.set_state(l, &model.rest);
        }
        for (l, model) in models.iter().enumerate() {
            self.remember_rest(l, model);
        }
    }

    /// Every state of one lane: networks, supply, then the tubes' capacitances.
    pub fn state(&self, l: usize) -> Vec<f64> {
        let mut all = Vec::new();
        for b in self.blocks.iter().chain([&self.supply]) {
            all.extend(b.x.iter().map(|x| x[l]));
        }
        for c in &self.cells {
            all.extend([c[l].w_gp, c[l].w_gk, c[l].w_pk]);
        }
        all
    }

    /// Sets every state of one lane, in the order of [`Kernel::state`].
    pub fn set_state(&mut self, l: usize, state: &[f64]) {
        let mut values = state.iter().copied();
        let mut next = || values.next().expect("one value per state");
        for b in self.blocks.iter_mut().chain([&mut self.supply]) {
            for x in &mut b.x {
                x[l] = next();
            }
        }
        for c in &mut self.cells {
            c[l].w_gp = next();
            c[l].w_gk = next();
            c[l].w_pk = next();
        }
    }

    pub fn stages(&self) -> usize {
        self.cells.len()
    }

    /// What stage `k` of lane `l` did at the last step.
    pub fn observe(&self, k: usize, l: usize) -> Observation {
        let c = &self.cells[k][l];
        Observation {
            v_gk: c.v - c.vk,
            v_sk: if c.surface.has_screen() {
                c.es - c.r_s * c.is - c.vk
            } else {
                c.vp - c.vk
            },
            v_pk: c.vp - c.vk,
            v_k: c.ek + c.vk,
            ip: c.ip - c.g_gp * (c.vp - c.v) - c.g_pk * (c.vp - c.vk),
            is: c.is,
            ig: c.ig,
        }
    }

    /// Rail volts at the last step.
    pub fn rail(&self, r: usize, l: usize) -> f64 {
        self.rail_volts[r][l]
    }

    /// One step: volts at the jack in, volts at the loudspeaker out.
    #[inline]
    pub fn step(&mut self, input: [f64; L]) -> [f64; L] {
        #[cfg(target_arch = "x86_64")]
        if self.wide {
            // SAFETY: `wide` is set only where the processor has AVX.
            return unsafe { self.step_wide(input) };
        }
        self.step_plain(input)
    }

    /// The same instructions in their three-operand, 256-bit form. No fused multiplication, so the same bits.
    #[cfg(target_arch = "x86_64")]
    #[target_feature(enable = "avx")]
    fn step_wide(&mut self, input: [f64; L]) -> [f64; L] {
        self.step_plain(input)
    }

    #[inline(always)]
    fn step_plain(&mut self, input: [f64; L]) -> [f64; L] {
        // Rails, from what was drawn before: their capacitors make the guess as good as the answer.
        self.supply.before();
        let rails = self.draw_last.len();
        for (r, volts) in self.rail_volts.iter_mut().enumerate() {
            *volts = *self.supply.open(r);
            let row = &self.rail_impedance[r * rails..(r + 1) * rails];
            for (z, (last, before)) in row.iter().zip(self.draw_last.iter().zip(&self.draw_before))
            {
                for l in 0..L {
                    volts[l] -= z[l] * (2.0 * last[l] - before[l]);
                }
            }
        }
        for b in &mut self.blocks {
            for (u, from) in b.u.iter_mut().zip(&b.inputs) {
                *u = match from {
                    Input::Signal => input,
                    Input::Rail(r) => self.rail_volts[*r],
                };
            }
            b.before();
        }
        for k in 0..self.cells.len() {
            self.solve_stage(k);
        }
        // Backward, so that each stage is settled with the final current of the grid behind it.
        for k in (0..self.cells.len()).rev() {
            self.finish_stage(k);
        }

        std::mem::swap(&mut self.draw_before, &mut self.draw_last);
        self.draw_last.fill([0.0; L]);
        for b in &mut self.blocks {
            b.after();
            for (k, rail) in b.draws.iter().enumerate() {
                for (sum, draw) in self.draw_last[*rail].iter_mut().zip(b.draw(k)) {
                    *sum += draw;
                }
            }
        }
        self.supply.i.copy_from_slice(&self.draw_last);
        self.supply.after();
        let top = self.blocks[self.output].watched();
        let rail = self.rail_volts[self.output_rail];
        std::array::from_fn(|l| (top[l] - rail[l]) * self.per_turns_ratio[l])
    }

    /// Finds the grid of stage `k` and with it all its currents, the next grid's current being estimated.
    #[inline(always)]
    fn solve_stage(&mut self, k: usize) {
        let ports = self.ports[k];
        let (before, from_k) = self.cells.split_at_mut(k);
        let (own, after) = from_k.split_first_mut().expect("stage k exists");
        for l in 0..L {
            let c = &mut own[l];
            let next = after.first().map(|n| &n[l]);
            let estimate = next.map_or(0.0, |n| {
                let conducted = 2.0 * n.ig_last - n.ig_before;
                (if conducted > 0.0 { conducted } else { 0.0 }) + 2.0 * n.cap_last - n.cap_before
            });
            c.next_estimate = estimate;
            let mut p = self.blocks[ports.grid.0].open(ports.grid.1)[l];
            let mut r = c.z_gg_own;
            if let Some(previous) = before.last() {
                let q = &previous[l];
                let plate_current = q.ip + q.g_gp * q.w_gp - q.g_pk * q.w_pk;
                p -= q.z_gp * (plate_current + q.slope * q.z_pg * q.next_estimate);
                r -= q.z_gp * q.z_pg * q.slope;
            }
            let ek = self.blocks[ports.cathode.0].open(ports.cathode.1)[l]
                - c.r_k * (c.g_gk * c.w_gk + c.g_pk * c.w_pk);
            let e = self.blocks[ports.plate.0].open(ports.plate.1)[l]
                - c.z_pg * estimate
                - c.z_pp * (c.g_gp * c.w_gp - c.g_pk * c.w_pk)
                - ek;
            p += r * (c.g_gp * c.w_gp + c.g_gk * c.w_gk) - ek;
            c.ek = ek;
            c.e = e;
            let surface = &*c.surface;
            let (mut shift, mut ds) = (0.0, 0.0);
            if let Some(screen) = ports.screen {
                c.es = self.blocks[screen.0].open(screen.1)[l] - ek;
                ds = c.es - surface.extent.s0;
                shift = ds * surface.per_screen_volt;
            }
            let lift = ds * c.dp_last;

            let mut v = if r > 0.0 {
                2.0 * c.v_last - c.v_before
            } else {
                p
            };
            let mut settled = false;
            let mut spot = None;
            for _ in 0..GRID_ITERATIONS {
                self.looks += 1;
                let (plate, found) = surface.plate(v + shift, e);
                spot = Some(found);
                let ip = plate.f + lift;
                let grid = surface.grid(v, e);
                let vp = e - c.z_pp * ip;
                let vp_v = -c.z_pp * plate.fx;
                let vp_e = 1.0 - c.z_pp * plate.fy;
                let vk = c.r_k_folded * (ip - c.g_gp * (vp - v) + c.is_last + grid.f + c.g_gk * v);
                let vk_v = c.r_k_folded * (plate.fx - c.g_gp * (vp_v - 1.0) + grid.fx + c.g_gk);
                let vk_e = c.r_k_folded * (plate.fy - c.g_gp * vp_e + grid.fy);
                let f = v - p + r * (grid.f + c.g_gp * (v - vp) + c.g_gk * (v - vk));
                let f_v = 1.0 + r * (grid.fx + c.g_gp * (1.0 - vp_v) + c.g_gk * (1.0 - vk_v));
                let f_e = r * (grid.fy - c.g_gp * vp_e - c.g_gk * vk_e);
                let per_slope = 1.0 / f_v;
                let step = bounded(-f * per_slope);
                v += step;
                if step < GRID_SETTLED_V && step > -GRID_SETTLED_V {
                    c.ip = ip + plate.fx * step;
                    let ig = grid.f + grid.fx * step;
                    c.ig = if ig > 0.0 { ig } else { 0.0 };
                    c.v_over_e = -f_e * per_slope;
                    c.slope = plate.fy + plate.fx * c.v_over_e;
                    c.ig_over_e = grid.fy + grid.fx * c.v_over_e;
                    settled = true;
                    break;
                }
            }
            // Below its lower edge the tube is off and the surface's straight continuation exact.
            if !settled || !surface.covers(v.max(surface.extent.v.0), e) {
                self.strayed += 1;
            }
            c.v = v;
            if let (true, Some(spot)) = (surface.has_screen(), spot) {
                let (is, dp, ds_is) = surface.screen(&spot);
                let is = is + ds * ds_is;
                c.is = if is > 0.0 { is } else { 0.0 };
                c.dp_last = dp;
            }
            c.vp = c.e - c.z_pp * c.ip;
            c.vk = c.r_k_folded * (c.ip - c.g_gp * (c.vp - c.v) + c.is + c.ig + c.g_gk * c.v);
        }
    }

    /// Settles stage `k` with the next grid's true current, hands its currents to the networks, moves its states on.
    #[inline(always)]
    fn finish_stage(&mut self, k: usize) {
        let ports = self.ports[k];
        let (upto, after) = self.cells.split_at_mut(k + 1);
        let own = &mut upto[k];
        for l in 0..L {
            let c = &mut own[l];
            if let Some(next) = after.first() {
                let n = &next[l];
                // The stage behind is settled already: its memories hold this sample's currents.
                let change = -c.z_pg * (n.ig_last + n.cap_last - c.next_estimate);
                c.ip += c.slope * change;
                c.v += c.v_over_e * change;
                let ig = c.ig + c.ig_over_e * change;
                c.ig = if ig > 0.0 { ig } else { 0.0 };
                c.e += change;
                c.vp = c.e - c.z_pp * c.ip;
                c.vk = c.r_k_folded * (c.ip - c.g_gp * (c.vp - c.v) + c.is + c.ig + c.g_gk * c.v);
            }
            let capacitive = c.g_gp * (c.v - c.vp - c.w_gp) + c.g_gk * (c.v - c.vk - c.w_gk);
            let grid = c.ig + capacitive;
            let plate = c.ip + c.g_gp * c.w_gp - c.g_pk * c.w_pk;
            self.blocks[ports.grid.0].i[ports.grid.1][l] = grid;
            self.blocks[ports.plate.0].i[ports.plate.1][l] = plate;
            if let Some(screen) = ports.screen {
                self.blocks[screen.0].i[screen.1][l] = c.is;
            }
            self.blocks[ports.cathode.0].i[ports.cathode.1][l] = -(grid + plate + c.is);
            c.w_gp = 2.0 * (c.v - c.vp) - c.w_gp;
            c.w_gk = 2.0 * (c.v - c.vk) - c.w_gk;
            c.w_pk = 2.0 * (c.vp - c.vk) - c.w_pk;
            c.v_before = c.v_last;
            c.v_last = c.v;
            c.ig_before = c.ig_last;
            c.ig_last = c.ig;
            c.cap_before = c.cap_last;
            c.cap_last = capacitive;
            c.is_last = c.is;
        }
    }
}
