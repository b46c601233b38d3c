//! The linear parts of a circuit stepped through time by the trapezoidal rule, cut at devices and rails.
//!
//! With step h, a capacitor between a and b is a source w behind h/2C:
//! i = (2C/h)(v − w), next w = 2v − w. An inductor is 2L/h beside a source j: i = (h/2L)v + j,
//! next j = j + (h/L)v. Between two samples every port then sees one linear source behind one
//! resistance. Removing the devices and holding the rails leaves small separate [`Network`]s:
//!
//! ```text
//! v_port = D x + E u + f − K i        open-circuit volts behind impedance K; i flows out into the device
//! x_next = A x + B u + c + P i        x: w and j of the reactive parts; u: signal and rail volts
//! ```
//!
//! The rails with what feeds them are one more network, whose ports are the rails.

use nalgebra::DMatrix;

use super::netlist::{Drive, GROUND, Netlist, Node, PartKind};

/// Where a network meets a device or a rail.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Port {
    Grid(usize),
    Screen(usize),
    Plate(usize),
    Cathode(usize),
    Rail(usize),
}

/// What drives a network from outside, beside its own constant sources.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Input {
    Signal,
    Rail(usize),
}

/// A linear form over states, inputs and port currents.
#[derive(Clone, Debug, PartialEq)]
pub struct Form {
    pub states: Vec<f64>,
    pub inputs: Vec<f64>,
    pub ports: Vec<f64>,
    pub constant: f64,
}

/// One separate linear network.
#[derive(Clone, Debug)]
pub struct Network {
    pub ports: Vec<Port>,
    pub inputs: Vec<Input>,
    /// Reactive parts, as indices into the netlist, in the order of the states.
    pub reactive: Vec<usize>,
    /// Open-circuit volts of each port; `ports` entries are −K.
    pub port_volts: Vec<Form>,
    /// Next value of each state.
    pub next: Vec<Form>,
    /// Current drawn from each rail that this network touches.
    pub draws: Vec<(usize, Form)>,
    /// Volts of each watched node that lies in this network, by its place in the caller's list.
    pub watched: Vec<(usize, Form)>,
    /// Watts of each resistor in this network follow from the volts across it: (part, form of v).
    pub resistor_volts: Vec<(usize, Form)>,
}

impl Network {
    /// States at rest.
    pub fn rest(&self, net: &Netlist, volts: &[f64], part_amperes: &[f64]) -> Vec<f64> {
        self.reactive
            .iter()
            .map(|&p| {
                let part = &net.parts[p];
                match part.kind {
                    PartKind::Inductor(_) => part_amperes[p],
                    _ => volts[part.a] - volts[part.b],
                }
            })
            .collect()
    }
}

/// Cuts a circuit at its devices and rails and discretizes each piece with step `h` seconds.
///
/// Every device terminal becomes a port of exactly one network; the last network is the supply.
/// `watch` names nodes whose volts the caller wants.
pub fn cut(net: &Netlist, h: f64, watch: &[Node]) -> Vec<Network> {
    let is_free = |n: Node| net.drive_of(n).is_none() && !net.rails.contains(&n);
    let mut group: Vec<usize> = (0..net.node_count()).collect();
    fn root(group: &mut [usize], mut n: usize) -> usize {
        while group[n] != n {
            group[n] = group[group[n]];
            n = group[n];
        }
        n
    }
    for p in &net.parts {
        if is_free(p.a) && is_free(p.b) {
            let (a, b) = (root(&mut group, p.a), root(&mut group, p.b));
            group[a] = b;
        }
    }
    let mut ports: Vec<(Port, Node)> = Vec::new();
    for (k, d) in net.devices.iter().enumerate() {
        ports.push((Port::Grid(k), d.grid));
        if let Some(screen) = d.screen {
            ports.push((Port::Screen(k), screen));
        }
        ports.push((Port::Plate(k), d.plate));
        ports.push((Port::Cathode(k), d.cathode));
    }

    let mut networks = Vec::new();
    let mut ported: Vec<usize> = Vec::new();
    for &(port, node) in &ports {
        if is_free(node) {
            let r = root(&mut group, node);
            if !ported.contains(&r) {
                ported.push(r);
            }
        } else {
            networks.push(direct_port(net, port, node, watch));
        }
    }
    for &r in &ported {
        let nodes: Vec<Node> = (1..net.node_count())
            .filter(|&n| is_free(n) && root(&mut group, n) == r)
            .collect();
        let own: Vec<(Port, Node)> = ports
            .iter()
            .filter(|(_, n)| nodes.contains(n))
            .copied()
            .collect();
        let parts: Vec<usize> = (0..net.parts.len())
            .filter(|&p| nodes.contains(&net.parts[p].a) || nodes.contains(&net.parts[p].b))
            .collect();
        networks.push(discretize(net, h, &nodes, &parts, &own, watch));
    }
    let nodes: Vec<Node> = (1..net.node_count())
        .filter(|&n| {
            net.drive_of(n).is_none()
                && (net.rails.contains(&n) || !ported.contains(&root(&mut group, n)))
        })
        .collect();
    let parts: Vec<usize> = (0..net.parts.len())
        .filter(|&p| {
            let inside = |n: Node| nodes.contains(&n) || net.drive_of(n).is_some();
            inside(net.parts[p].a) && inside(net.parts[p].b)
        })
        .collect();
    let own: Vec<(Port, Node)> = net
        .rails
        .iter()
        .enumerate()
        .map(|(r, &n)| (Port::Rail(r), n))
        .collect();
    networks.push(discretize(net, h, &nodes, &parts, &own, watch));
    networks
}

/// A port on a node that is held: a grid on the jack itself, a grounded cathode, a screen on its rail.
fn direct_port(net: &Netlist, port: Port, node: Node, watch: &[Node]) -> Network {
    let (inputs, constant) = match net.drive_of(node) {
        Some(Drive::Signal) => (vec![Input::Signal], 0.0),
        Some(Drive::Constant(v)) => (vec![], v),
        None => {
            let rail = net
                .rails
                .iter()
                .position(|&r| r == node)
                .expect("a held node is driven or a rail");
            (vec![Input::Rail(rail)], 0.0)
        }
    };
    let form = Form {
        states: vec![],
        inputs: vec![1.0; inputs.len()],
        ports: vec![0.0],
        constant,
    };
    let draws = inputs
        .iter()
        .filter_map(|i| match i {
            Input::Rail(r) => {
                let form = Form {
                    states: vec![],
                    inputs: vec![0.0],
                    ports: vec![1.0],
                    constant: 0.0,
                };
                Some((*r, form))
            }
            Input::Signal => None,
        })
        .collect();
    let watched = watch
        .iter()
        .enumerate()
        .filter(|(_, n)| **n == node)
        .map(|(k, _)| (k, form.clone()))
        .collect();
    Network {
        ports: vec![port],
        inputs,
        reactive: vec![],
        port_volts: vec![form],
        next: vec![],
        draws,
        watched,
        resistor_volts: vec![],
    }
}

fn discretize(
    net: &Netlist,
    h: f64,
    nodes: &[Node],
    parts: &[usize],
    ports: &[(Port, Node)],
    watch: &[Node],
) -> Network {
    let local = |n: Node| nodes.iter().position(|&m| m == n);
    let mut inputs: Vec<Input> = Vec::new();
    for &p in parts {
        for n in [net.parts[p].a, net.parts[p].b] {
            if local(n).is_some() {
                continue;
            }
            let input = match net.drive_of(n) {
                Some(Drive::Signal) => Input::Signal,
                Some(Drive::Constant(_)) => continue,
                None => Input::Rail(
                    net.rails
                        .iter()
                        .position(|&r| r == n)
                        .expect("a part's node is local, driven or a rail"),
                ),
            };
            if !inputs.contains(&input) {
                inputs.push(input);
            }
        }
    }
    let reactive: Vec<usize> = parts
        .iter()
        .copied()
        .filter(|&p| !matches!(net.parts[p].kind, PartKind::Resistor(_)))
        .collect();
    let (nx, nu, np, m) = (reactive.len(), inputs.len(), ports.len(), nodes.len());
    let width = nx + nu + np + 1;
    let conductance = |p: usize| match net.parts[p].kind {
        PartKind::Resistor(r) => 1.0 / r,
        PartKind::Capacitor(c) => 2.0 * c / h,
        PartKind::Inductor(l) => h / (2.0 * l),
    };
    // Column of the linear form that stands for a node held from outside, and its factor.
    let held = |n: Node| -> Option<(usize, f64)> {
        match net.drive_of(n) {
            Some(Drive::Signal) => inputs
                .iter()
                .position(|i| *i == Input::Signal)
                .map(|k| (nx + k, 1.0)),
            Some(Drive::Constant(v)) => Some((width - 1, v)),
            None => {
                let rail = net.rails.iter().position(|&r| r == n)?;
                inputs
                    .iter()
                    .position(|i| *i == Input::Rail(rail))
                    .map(|k| (nx + k, 1.0))
            }
        }
    };
    let mut y = DMatrix::<f64>::zeros(m, m);
    let mut rhs = DMatrix::<f64>::zeros(m, width);
    for &p in parts {
        let part = &net.parts[p];
        let g = conductance(p);
        for (n, other) in [(part.a, part.b), (part.b, part.a)] {
            let Some(row) = local(n) else { continue };
            y[(row, row)] += g;
            match local(other) {
                Some(col) => y[(row, col)] -= g,
                None => {
                    if let Some((col, factor)) = held(other) {
                        rhs[(row, col)] += g * factor;
                    }
                }
            }
        }
        if let Some(state) = reactive.iter().position(|&q| q == p) {
            let source = match part.kind {
                PartKind::Capacitor(_) => g,
                _ => -1.0,
            };
            if let Some(row) = local(part.a) {
                rhs[(row, state)] += source;
            }
            if let Some(row) = local(part.b) {
                rhs[(row, state)] -= source;
            }
        }
    }
    for (k, (_, n)) in ports.iter().enumerate() {
        let row = local(*n).expect("a network's ports are its own nodes");
        rhs[(row, nx + nu + k)] -= 1.0;
    }
    let volts = if m == 0 {
        rhs
    } else {
        y.lu()
            .solve(&rhs)
            .expect("every node of a network has a part to somewhere")
    };
    let node_form = |n: Node| -> Vec<f64> {
        if let Some(row) = local(n) {
            return volts.row(row).iter().copied().collect();
        }
        let mut form = vec![0.0; width];
        if n != GROUND
            && let Some((col, factor)) = held(n)
        {
            form[col] = factor;
        }
        form
    };
    let across = |p: usize| -> Vec<f64> {
        let part = &net.parts[p];
        node_form(part.a)
            .iter()
            .zip(node_form(part.b))
            .map(|(a, b)| a - b)
            .collect()
    };
    let current = |p: usize| -> Vec<f64> {
        let g = conductance(p);
        let mut form: Vec<f64> = across(p).iter().map(|v| g * v).collect();
        if let Some(state) = reactive.iter().position(|&q| q == p) {
            form[state] += match net.parts[p].kind {
                PartKind::Capacitor(_) => -g,
                _ => 1.0,
            };
        }
        form
    };
    let split = |form: Vec<f64>| Form {
        states: form[..nx].to_vec(),
        inputs: form[nx..nx + nu].to_vec(),
        ports: form[nx + nu..nx + nu + np].to_vec(),
        constant: form[width - 1],
    };
    let next = reactive
        .iter()
        .enumerate()
        .map(|(state, &p)| {
            let (factor, own) = match net.parts[p].kind {
                PartKind::Capacitor(_) => (2.0, -1.0),
                _ => (2.0 * conductance(p), 1.0),
            };
            let mut form: Vec<f64> = across(p).iter().map(|v| factor * v).collect();
            form[state] += own;
            split(form)
        })
        .collect();
    let mut draws: Vec<(usize, Vec<f64>)> = Vec::new();
    for input in &inputs {
        let Input::Rail(r) = *input else { continue };
        let mut total = vec![0.0; width];
        for &p in parts {
            let part = &net.parts[p];
            for (n, sign) in [(part.a, 1.0), (part.b, -1.0)] {
                if n == net.rails[r] {
                    for (t, i) in total.iter_mut().zip(current(p)) {
                        *t += sign * i;
                    }
                }
            }
        }
        draws.push((r, total));
    }
    Network {
        ports: ports.iter().map(|(p, _)| *p).collect(),
        port_volts: ports.iter().map(|(_, n)| split(node_form(*n))).collect(),
        next,
        draws: draws.into_iter().map(|(r, f)| (r, split(f))).collect(),
        watched: watch
            .iter()
            .enumerate()
            .filter(|(_, n)| local(**n).is_some())
            .map(|(k, n)| (k, split(node_form(*n))))
            .collect(),
        resistor_volts: parts
            .iter()
            .copied()
            .filter(|&p| matches!(net.parts[p].kind, PartKind::Resistor(_)))
            .map(|p| (p, split(across(p))))
            .collect(),
        inputs,
        reactive,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// An RC low-pass stepped by its network equals the bilinear recursion worked out by hand.
    #[test]
    fn an_rc_network_is_the_bilinear_filter() {
        let (r, c, h) = (10e3, 10e-9, 1.0 / 48e3);
        let mut net = Netlist::new();
        let input = net.driven("in", Drive::Signal);
        let out = net.node("out");
        net.add("r", input, out, PartKind::Resistor(r));
        net.add("c", out, GROUND, PartKind::Capacitor(c));
        let cathode = GROUND;
        let plate = net.node("plate");
        net.add("load", plate, GROUND, PartKind::Resistor(1.0));
        net.devices.push(super::super::Device {
            grid: out,
            screen: None,
            plate,
            cathode,
        });
        let networks = cut(&net, h, &[out]);
        let network = networks
            .iter()
            .find(|n| n.ports.contains(&Port::Grid(0)))
            .unwrap();
        let mut w = 0.0;
        let (mut u_before, mut y_before) = (0.0, 0.0);
        let k = 2.0 * r * c / h;
        for n in 0..50 {
            let u = (n as f64 * 0.3).sin();
            let y = network.port_volts[0].states[0] * w + network.port_volts[0].inputs[0] * u;
            w = network.next[0].states[0] * w + network.next[0].inputs[0] * u;
            // The state starts at v0 = 0 and i0 = 0, as the recursion does.
            let by_hand = (u + u_before + (k - 1.0) * y_before) / (k + 1.0);
            if n > 0 {
                assert!((y - by_hand).abs() < 1e-12, "{n}: {y} {by_hand}");
            }
            u_before = u;
            y_before = y;
        }
    }
}
