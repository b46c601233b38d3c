//! Where every quantity of a model's networks stands in one vector.
//!
//! ```text
//! states of all networks, the supply's last | one | rails | signal | port currents | draws on the rails
//! ```

use super::model::Model;
use super::network::Rows;
use crate::circuit::companion::{Form, Input, Network, Port};

pub struct Layout {
    /// Device ports in the order of the networks.
    pub ports: Vec<Port>,
    pub states: usize,
    pub supply_states: usize,
    rails: usize,
    /// First state and first port of each network.
    starts: Vec<(usize, usize)>,
}

pub struct AllRows<const L: usize> {
    pub open: Rows<L>,
    pub rails: Rows<L>,
    pub step: Rows<L>,
    pub supply: Rows<L>,
}

impl Layout {
    pub fn of(model: &Model) -> Layout {
        let (supply, networks) = model
            .networks
            .split_last()
            .expect("the supply is always a network");
        let mut ports = Vec::new();
        let mut starts = Vec::new();
        let mut states = 0;
        for n in networks {
            starts.push((states, ports.len()));
            states += n.reactive.len();
            ports.extend_from_slice(&n.ports);
        }
        starts.push((states, ports.len()));
        let supply_states = supply.reactive.len();
        Layout {
            ports,
            states: states + supply_states,
            supply_states,
            rails: model.rails,
            starts,
        }
    }

    pub fn one(&self) -> usize {
        self.states
    }

    pub fn first_rail(&self) -> usize {
        self.states + 1
    }

    pub fn signal(&self) -> usize {
        self.first_rail() + self.rails
    }

    pub fn first_current(&self) -> usize {
        self.signal() + 1
    }

    pub fn width(&self) -> usize {
        self.first_current() + self.ports.len() + self.rails
    }

    /// A form of network `n`, spread over the vector; with or without its port currents.
    fn spread(
        &self,
        n: usize,
        network: &Network,
        form: &Form,
        with_ports: bool,
    ) -> Vec<(usize, f64)> {
        let (first_state, first_port) = self.starts[n];
        let mut row = Vec::new();
        row.extend(
            form.states
                .iter()
                .enumerate()
                .map(|(k, c)| (first_state + k, *c)),
        );
        row.extend(form.inputs.iter().zip(&network.inputs).map(|(c, input)| {
            let at = match input {
                Input::Signal => self.signal(),
                Input::Rail(r) => self.first_rail() + r,
            };
            (at, *c)
        }));
        row.push((self.one(), form.constant));
        if with_ports {
            let first = self.first_current() + first_port;
            row.extend(form.ports.iter().enumerate().map(|(k, c)| (first + k, *c)));
        }
        row
    }

    pub fn rows<const L: usize>(&self, models: &[&Model; L]) -> AllRows<L> {
        let count = self.starts.len();
        let row = |n: usize, with_ports: bool, pick: &dyn Fn(&Network) -> Form| {
            let lanes: [Vec<(usize, f64)>; L] = std::array::from_fn(|l| {
                let network = &models[l].networks[n];
                self.spread(n, network, &pick(network), with_ports)
            });
            (0..lanes[0].len())
                .map(|k| (lanes[0][k].0, std::array::from_fn(|l| lanes[l][k].1)))
                .collect::<Vec<(usize, [f64; L])>>()
        };
        let first = &models[0].networks;
        let mut all = AllRows {
            open: Rows::new(),
            rails: Rows::new(),
            step: Rows::new(),
            supply: Rows::new(),
        };
        for (n, network) in first[..count - 1].iter().enumerate() {
            for port in 0..network.ports.len() {
                all.open
                    .push(row(n, false, &|m| m.port_volts[port].clone()));
            }
            for state in 0..network.reactive.len() {
                all.step.push(row(n, true, &|m| m.next[state].clone()));
            }
        }
        for rail in 0..self.rails {
            let mut total = Vec::new();
            for (n, network) in first[..count - 1].iter().enumerate() {
                for (k, (r, _)) in network.draws.iter().enumerate() {
                    if *r == rail {
                        total.extend(row(n, true, &|m| m.draws[k].1.clone()));
                    }
                }
            }
            all.step.push(total);
        }
        let (n, _) = first[..count - 1]
            .iter()
            .enumerate()
            .find(|(_, network)| !network.watched.is_empty())
            .expect("the load lies in one network");
        all.step.push(row(n, true, &|m| m.watched[0].1.clone()));
        for rail in 0..self.rails {
            // The supply knows no rails from outside, so its open volts read states and the constant.
            let form = row(count - 1, false, &|m| m.port_volts[rail].clone());
            all.rails.push(form);
        }
        for state in 0..self.supply_states {
            all.supply
                .push(row(count - 1, true, &|m| m.next[state].clone()));
        }
        all
    }
}
