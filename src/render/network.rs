//! One linear network's step in all lanes, as columns of a small dense matrix.

use super::model::Model;
use crate::circuit::companion::{Form, Input, Network};

/// Rows are kept in groups of this many, padded with zeros, so that they go through the processor side by side.
const GROUP: usize = 4;

/// The rows of one group, lane after lane.
type Rows<const L: usize> = [[f64; GROUP]; L];

/// The coefficients of one group of rows, column by column.
struct Group<const L: usize> {
    constant: Rows<L>,
    states: Vec<Rows<L>>,
    inputs: Vec<Rows<L>>,
    currents: Vec<Rows<L>>,
}

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
    groups: Vec<Group<L>>,
    pub x: Vec<[f64; L]>,
    pub u: Vec<[f64; L]>,
    pub i: Vec<[f64; L]>,
    rows: Vec<Rows<L>>,
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
        // A port's own open volts leave its current out: that is what the tube is solved behind.
        let entry = |row: usize, column: usize, l: usize| -> f64 {
            let Some(form) = lanes[l].get(row) else {
                return 0.0;
            };
            if column < nx {
                form.states[column]
            } else if column < nx + nu {
                form.inputs[column - nx]
            } else if row < np {
                0.0
            } else {
                form.ports[column - nx - nu]
            }
        };
        let column = |g: usize, k: usize| -> Rows<L> {
            std::array::from_fn(|l| std::array::from_fn(|r| entry(g * GROUP + r, k, l)))
        };
        let groups = (0..groups)
            .map(|g| Group {
                constant: std::array::from_fn(|l| {
                    std::array::from_fn(|r| lanes[l].get(g * GROUP + r).map_or(0.0, |f| f.constant))
                }),
                states: (0..nx).map(|k| column(g, k)).collect(),
                inputs: (nx..nx + nu).map(|k| column(g, k)).collect(),
                currents: (nx + nu..nx + nu + np).map(|k| column(g, k)).collect(),
            })
            .collect();
        Block {
            states: nx,
            inputs: network.inputs.clone(),
            ports: np,
            draws: network.draws.iter().map(|(r, _)| *r).collect(),
            watches: !network.watched.is_empty(),
            groups,
            x: (0..nx)
                .map(|k| std::array::from_fn(|l| models[l].rest[first_state + k]))
                .collect(),
            u: vec![[0.0; L]; nu],
            i: vec![[0.0; L]; np],
            rows: vec![[[0.0; GROUP]; L]; count.div_ceil(GROUP)],
        }
    }

    /// `sum` plus every column times its quantity; the sum stays in registers.
    #[inline(always)]
    fn add(mut sum: Rows<L>, columns: &[Rows<L>], quantities: &[[f64; L]]) -> Rows<L> {
        for (c, q) in columns.iter().zip(quantities) {
            for l in 0..L {
                for r in 0..GROUP {
                    sum[l][r] += c[l][r] * q[l];
                }
            }
        }
        sum
    }

    /// Sums what is known before the tubes are solved.
    #[inline(always)]
    pub fn before(&mut self) {
        for (rows, g) in self.rows.iter_mut().zip(&self.groups) {
            *rows = Self::add(
                Self::add(g.constant, &g.states, &self.x),
                &g.inputs,
                &self.u,
            );
        }
    }

    /// Adds the port currents and moves the states on.
    #[inline(always)]
    pub fn after(&mut self) {
        for (rows, g) in self.rows.iter_mut().zip(&self.groups) {
            *rows = Self::add(*rows, &g.currents, &self.i);
        }
        for k in 0..self.x.len() {
            self.x[k] = self.row(self.ports + k);
        }
    }

    #[inline(always)]
    fn row(&self, row: usize) -> [f64; L] {
        let rows = &self.rows[row / GROUP];
        std::array::from_fn(|l| rows[l][row % GROUP])
    }

    /// Open-circuit volts of a port; call after [`Block::before`].
    #[inline(always)]
    pub fn open(&self, port: usize) -> [f64; L] {
        self.row(port)
    }

    /// Draw on the k-th of [`Block::draws`]; call after [`Block::after`].
    #[inline(always)]
    pub fn draw(&self, k: usize) -> [f64; L] {
        self.row(self.ports + self.states + k)
    }

    /// Volts of the watched node; call after [`Block::after`].
    #[inline(always)]
    pub fn watched(&self) -> [f64; L] {
        self.row(self.ports + self.states + self.draws.len())
    }
}
