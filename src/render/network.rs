//! One linear network's step in all lanes, as columns of a small dense matrix.

use super::model::Model;
use crate::circuit::companion::{Form, Input, Network};

/// Rows are kept in groups of this many, padded with zeros, so that they go through the processor side by side.
const GROUP: usize = 4;

/// Quantities in, rows out; both small and dense.
///
/// The rows of a network are its open ports, the next values of its states, what it draws from each rail,
/// and its watched node. Each is a form over states, inputs, the constant one, and port currents. The first
/// three are known before the tubes are solved, so [`Block::before`] sums them up and [`Block::after`] adds
/// the currents.
pub struct Block<const L: usize> {
    pub states: usize,
    pub inputs: Vec<Input>,
    pub ports: usize,
    /// Rails that this network draws from.
    pub draws: Vec<usize>,
    pub watches: bool,
    groups: usize,
    /// Columns: states, inputs, constant.
    known: Vec<[[f64; L]; GROUP]>,
    /// Columns: port currents.
    currents: Vec<[[f64; L]; GROUP]>,
    pub x: Vec<[f64; L]>,
    pub u: Vec<[f64; L]>,
    pub i: Vec<[f64; L]>,
    rows: Vec<[[f64; L]; GROUP]>,
}

impl<const L: usize> Block<L> {
    /// Network `n` of every lane's model, at rest with the states that begin at `first_state`.
    pub fn new(models: &[&Model; L], n: usize, first_state: usize) -> Self {
        let network = &models[0].networks[n];
        let (nx, nu, np) = (
            network.reactive.len(),
            network.inputs.len(),
            network.ports.len(),
        );
        let forms = |m: &Network| -> Vec<Form> {
            let mut all = m.port_volts.clone();
            all.extend(m.next.iter().cloned());
            all.extend(m.draws.iter().map(|(_, f)| f.clone()));
            all.extend(m.watched.iter().map(|(_, f)| f.clone()));
            all
        };
        let lanes: Vec<Vec<Form>> = models.iter().map(|m| forms(&m.networks[n])).collect();
        let count = lanes[0].len();
        let groups = count.div_ceil(GROUP);
        let column = |pick: &dyn Fn(&Form) -> f64| -> Vec<[[f64; L]; GROUP]> {
            (0..groups)
                .map(|g| {
                    std::array::from_fn(|r| {
                        let row = g * GROUP + r;
                        std::array::from_fn(|l| {
                            if row < count {
                                pick(&lanes[l][row])
                            } else {
                                0.0
                            }
                        })
                    })
                })
                .collect()
        };
        let mut known = Vec::new();
        for k in 0..nx {
            known.extend(column(&|f| f.states[k]));
        }
        for k in 0..nu {
            known.extend(column(&|f| f.inputs[k]));
        }
        known.extend(column(&|f| f.constant));
        let mut currents = Vec::new();
        for k in 0..np {
            // A port's own open volts leave its current out: that is what the tube is solved behind.
            let own = column(&|f| f.ports[k]);
            currents.extend(own.into_iter().enumerate().map(|(g, mut rows)| {
                for (r, row) in rows.iter_mut().enumerate() {
                    if g * GROUP + r < np {
                        *row = [0.0; L];
                    }
                }
                rows
            }));
        }
        Block {
            states: nx,
            inputs: network.inputs.clone(),
            ports: np,
            draws: network.draws.iter().map(|(r, _)| *r).collect(),
            watches: !network.watched.is_empty(),
            groups,
            known,
            currents,
            x: (0..nx)
                .map(|k| std::array::from_fn(|l| models[l].rest[first_state + k]))
                .collect(),
            u: vec![[0.0; L]; nu],
            i: vec![[0.0; L]; np],
            rows: vec![[[0.0; L]; GROUP]; groups],
        }
    }

    #[inline(always)]
    fn add(rows: &mut [[[f64; L]; GROUP]], column: &[[[f64; L]; GROUP]], q: &[f64; L]) {
        for (row, c) in rows.iter_mut().zip(column) {
            for r in 0..GROUP {
                for l in 0..L {
                    row[r][l] += c[r][l] * q[l];
                }
            }
        }
    }

    /// Sums what is known before the tubes are solved.
    #[inline(always)]
    pub fn before(&mut self) {
        let g = self.groups;
        let width = self.states + self.u.len();
        for (row, c) in self.rows.iter_mut().zip(&self.known[width * g..]) {
            *row = *c;
        }
        // Plain counting: splitting into chunks of a length known only here costs a division each time.
        let mut at = 0;
        for q in self.x.iter().chain(&self.u) {
            Self::add(&mut self.rows, &self.known[at..at + g], q);
            at += g;
        }
    }

    /// Adds the port currents and moves the states on.
    #[inline(always)]
    pub fn after(&mut self) {
        let g = self.groups;
        let mut at = 0;
        for q in &self.i {
            Self::add(&mut self.rows, &self.currents[at..at + g], q);
            at += g;
        }
        for (k, x) in self.x.iter_mut().enumerate() {
            let row = self.ports + k;
            *x = self.rows[row / GROUP][row % GROUP];
        }
    }

    #[inline(always)]
    fn row(&self, row: usize) -> &[f64; L] {
        &self.rows[row / GROUP][row % GROUP]
    }

    /// Open-circuit volts of a port; call after [`Block::before`].
    #[inline(always)]
    pub fn open(&self, port: usize) -> &[f64; L] {
        self.row(port)
    }

    /// Draw on the k-th of [`Block::draws`]; call after [`Block::after`].
    #[inline(always)]
    pub fn draw(&self, k: usize) -> &[f64; L] {
        self.row(self.ports + self.states + k)
    }

    /// Volts of the watched node; call after [`Block::after`].
    #[inline(always)]
    pub fn watched(&self) -> &[f64; L] {
        self.row(self.ports + self.states + self.draws.len())
    }
}
