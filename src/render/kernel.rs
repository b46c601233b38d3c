//! Stagewise port reduction: one oversampled step of a whole amplifier, in several lanes at once.

use super::cell::{Cell, Observation, Open, Reach, Tally};
use super::lanes::V;
use super::model::{Model, instantaneous};
use super::network::Block;
use crate::circuit::companion::{Input, Port};

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
    cells: Vec<Cell<L>>,
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
                let between = |a: Port, b: Port| V::from_fn(|l| impedance(a, b, l));
                let (plate, next, own) = (Port::Plate(k), Port::Grid(k + 1), Port::Grid(k));
                let reach = Reach {
                    z_pg: between(plate, next),
                    z_gp: between(next, plate),
                    z_gg_own: between(own, own),
                };
                let surfaces = std::array::from_fn(|l| models[l].surfaces[k].clone());
                let mut cell = Cell::new(surfaces, reach);
                for (l, model) in models.iter().enumerate() {
                    let w = &model.rest[offset + 3 * k..];
                    cell.set_state(l, [w[0], w[1], w[2]]);
                }
                cell
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
        kernel.remember_rest(models);
        kernel
    }

    /// Fills the memories that only start iterations with their values at rest.
    fn remember_rest(&mut self, models: [&Model; L]) {
        for (l, model) in models.iter().enumerate() {
            for (cell, rest) in self.cells.iter_mut().zip(&model.stage_rest) {
                cell.remember_rest(l, rest);
            }
        }
        self.draw_last.fill([0.0; L]);
        self.draw_before.fill([0.0; L]);
        // A few passes from the same states settle what the rails are believed to deliver.
        let states: [Vec<f64>; L] = std::array::from_fn(|l| self.state(l));
        for _ in 0..4 {
            self.step([0.0; L]);
            for (l, state) in states.iter().enumerate() {
                self.set_state(l, state);
                for cell in &mut self.cells {
                    cell.hold_still(l);
                }
            }
            self.draw_before.clone_from(&self.draw_last);
        }
        self.strayed = 0;
    }

    /// Returns the memories of every lane to the rest of `model`, the states staying as they are.
    pub fn recall_rest(&mut self, model: &Model) {
        self.remember_rest([model; L]);
    }

    /// Puts every lane at its model's rest.
    pub fn reset(&mut self, models: [&Model; L]) {
        for (l, model) in models.iter().enumerate() {
            self.set_state(l, &model.rest);
        }
        self.remember_rest(models);
    }

    /// Every state of one lane: networks, supply, then the tubes' capacitances.
    pub fn state(&self, l: usize) -> Vec<f64> {
        let mut all = Vec::new();
        for b in self.blocks.iter().chain([&self.supply]) {
            all.extend(b.x.iter().map(|x| x[l]));
        }
        for c in &self.cells {
            all.extend(c.state(l));
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
            c.set_state(l, [next(), next(), next()]);
        }
    }

    pub fn stages(&self) -> usize {
        self.cells.len()
    }

    /// What stage `k` of lane `l` did at the last step.
    pub fn observe(&self, k: usize, l: usize) -> Observation {
        self.cells[k].observe(l)
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
            *volts = self.supply.open(r);
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
        let mut tally = Tally::default();
        for k in 0..self.cells.len() {
            self.solve_stage(k, &mut tally);
        }
        self.looks += tally.looks;
        self.strayed += tally.strayed;
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
        for (i, draw) in self.supply.i.iter_mut().zip(&self.draw_last) {
            *i = *draw;
        }
        self.supply.after();
        let top = self.blocks[self.output].watched();
        let rail = self.rail_volts[self.output_rail];
        std::array::from_fn(|l| (top[l] - rail[l]) * self.per_turns_ratio[l])
    }

    /// Solves stage `k`, the stages before it being solved, the next grid's current being estimated.
    #[inline(always)]
    fn solve_stage(&mut self, k: usize, tally: &mut Tally) {
        let ports = self.ports[k];
        let at = |(block, port): (usize, usize)| V(self.blocks[block].open(port));
        let open = Open {
            grid: at(ports.grid),
            plate: at(ports.plate),
            cathode: at(ports.cathode),
            screen: ports.screen.map(at),
        };
        let (before, from_k) = self.cells.split_at_mut(k);
        let (own, after) = from_k.split_first_mut().expect("stage k exists");
        let foreseen = after.first().map_or(V::ZERO, Cell::foreseen);
        own.solve(&open, before.last().map(Cell::hand_on), foreseen, tally);
    }

    /// Settles stage `k`, the stage behind it being settled, and hands its currents to the networks.
    #[inline(always)]
    fn finish_stage(&mut self, k: usize) {
        let ports = self.ports[k];
        let (upto, after) = self.cells.split_at_mut(k + 1);
        let own = &mut upto[k];
        if let Some(next) = after.first() {
            own.correct(next.taken());
        }
        let drawn = own.advance();
        let mut give = |(block, port): (usize, usize), amperes: V<L>| {
            self.blocks[block].i[port] = amperes.0;
        };
        give(ports.grid, drawn.grid);
        give(ports.plate, drawn.plate);
        give(ports.cathode, drawn.cathode);
        if let Some(screen) = ports.screen {
            give(screen, drawn.screen);
        }
    }
}
