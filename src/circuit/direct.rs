//! Where a circuit rests: capacitors open, inductors short.

use nalgebra::{DMatrix, DVector};

use super::netlist::{Drive, Netlist, Node, PartKind, Slopes};

/// A solution at rest.
#[derive(Clone, Debug)]
pub struct Rest {
    /// Volts to ground of every node, ground and driven nodes included.
    pub volts: Vec<f64>,
    /// Current from `a` to `b` through every part, in the netlist's order.
    pub part_amperes: Vec<f64>,
    /// Currents and slopes of every device.
    pub devices: Vec<Slopes>,
    /// Newton iterations in all.
    pub iterations: usize,
    /// Whether the plain iteration failed and the sources were stepped up from zero.
    pub used_fallback: bool,
}

/// The iteration did not settle.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[error(
    "the operating point did not settle after {iterations} iterations: node `{node}` is still {residual:.3e} A out of balance"
)]
pub struct NotSettled {
    pub node: String,
    pub residual: f64,
    pub iterations: usize,
}

/// Largest change of any node per iteration, in volts: keeps Newton inside the laws' curved region.
const STEP_LIMIT_V: f64 = 60.0;
/// Balance of currents that counts as settled, in amperes: a thousandth of the 1 nA that is promised.
const RESIDUAL_A: f64 = 1e-12;
/// Leakage given to nodes that hang on capacitors only, in siemens: sets them to 0 V and changes nothing else.
const FLOATING_LEAK_S: f64 = 1e-12;
/// Iterations before an attempt is given up.
const ITERATIONS: usize = 200;
/// Smallest step of the drives, as a share of their full values.
const SMALLEST_STEP_UP: f64 = 1e-4;
/// Settling in time: first and last conductance of the capacitors' steps, in siemens; largest change a step may make,
/// in volts and as a share of the largest; ohms of an inductor's step per siemens of a capacitor's; most steps.
/// Chosen; only whether it arrives counts.
const RELAX_FIRST_S: f64 = 1.0;
const RELAX_LAST_S: f64 = 1e-13;
const RELAX_LIMIT_V: f64 = 10.0;
const RELAX_SHARE: f64 = 0.05;
const RELAX_OHMS_PER_S: f64 = 1e4;
const RELAX_STEPS: usize = 3000;
/// Change of node volts that counts as none, in volts.
const STEP_SETTLED_V: f64 = 1e-9;
/// Full steps from a balanced point after which only rounding moves it: Newton doubles its digits at each.
const BALANCED_STEPS: usize = 5;
/// Roundings that a sum of a few currents gathers, in units of the largest term's last place.
const ROUNDINGS: f64 = 8.0;

/// Finds the voltages at which the currents at every node sum to zero.
///
/// Unknowns are the free nodes' volts and the inductors' currents; Newton's method with a limited step
/// and a line search on the sum of squared residuals. If that fails, all constant drives are stepped up
/// from zero, each solution starting the next; if that fails too, the circuit is let settle in time, with a
/// capacitor at every node. `device(k, v_gk, v_sk, v_pk)` gives the currents of device `k`.
///
/// Settled means balanced to 1e-12 A, or to the rounding of the currents where a small resistor on high
/// volts makes that larger.
///
/// # Errors
/// [`NotSettled`] names the node that is worst out of balance.
pub fn solve(
    net: &Netlist,
    start: Option<&[f64]>,
    device: &dyn Fn(usize, f64, f64, f64) -> Slopes,
) -> Result<Rest, NotSettled> {
    let system = System::new(net);
    let mut iterations = 0;
    let guess = system.guess(start);
    match system.newton(guess, 1.0, device, &mut iterations) {
        Ok(x) => Ok(system.rest(&x, device, iterations, false)),
        Err(_) => {
            let x = match system.step_up(device, &mut iterations) {
                Ok(x) => x,
                Err(_) => {
                    let relaxed = system.relax(system.guess(start), device, &mut iterations);
                    system.newton(relaxed, 1.0, device, &mut iterations)?
                }
            };
            Ok(system.rest(&x, device, iterations, true))
        }
    }
}

struct System<'a> {
    net: &'a Netlist,
    /// Position of each node among the unknowns.
    index: Vec<Option<usize>>,
    /// Position of each inductor's current among the unknowns.
    inductor: Vec<Option<usize>>,
    floating: Vec<Node>,
    size: usize,
}

impl<'a> System<'a> {
    fn new(net: &'a Netlist) -> Self {
        let mut index = vec![None; net.node_count()];
        let mut size = 0;
        for (node, slot) in index.iter_mut().enumerate() {
            if net.drive_of(node).is_none() {
                *slot = Some(size);
                size += 1;
            }
        }
        let inductor = net
            .parts
            .iter()
            .map(|p| {
                matches!(p.kind, PartKind::Inductor(_)).then(|| {
                    size += 1;
                    size - 1
                })
            })
            .collect();
        let mut system = System {
            net,
            index,
            inductor,
            floating: Vec::new(),
            size,
        };
        system.floating = system.floating_nodes();
        system
    }

    /// Nodes with no path for direct current to a driven node.
    fn floating_nodes(&self) -> Vec<Node> {
        let mut reached: Vec<bool> = (0..self.net.node_count())
            .map(|n| self.net.drive_of(n).is_some())
            .collect();
        loop {
            let mut grown = false;
            let conducting = self
                .net
                .parts
                .iter()
                .filter(|p| !matches!(p.kind, PartKind::Capacitor(_)))
                .map(|p| (p.a, p.b));
            for (a, b) in conducting {
                if reached[a] != reached[b] {
                    reached[a] = true;
                    reached[b] = true;
                    grown = true;
                }
            }
            if !grown {
                break;
            }
        }
        (0..self.net.node_count())
            .filter(|&n| !reached[n])
            .collect()
    }

    fn guess(&self, start: Option<&[f64]>) -> DVector<f64> {
        let mut x = DVector::zeros(self.size);
        if let Some(start) = start {
            for (node, slot) in self.index.iter().enumerate() {
                if let Some(k) = slot {
                    x[*k] = start[node];
                }
            }
        }
        x
    }

    fn volts(&self, x: &DVector<f64>, node: Node, scale: f64) -> f64 {
        match (self.index[node], self.net.drive_of(node)) {
            (Some(k), _) => x[k],
            (None, Some(Drive::Constant(v))) => v * scale,
            (None, _) => 0.0,
        }
    }

    fn assemble(
        &self,
        x: &DVector<f64>,
        scale: f64,
        device: &dyn Fn(usize, f64, f64, f64) -> Slopes,
        mut jacobian: Option<&mut DMatrix<f64>>,
    ) -> DVector<f64> {
        let mut f = DVector::zeros(self.size);
        if let Some(j) = jacobian.as_deref_mut() {
            j.fill(0.0);
        }
        let v = |node| self.volts(x, node, scale);
        for (p, current) in self.net.parts.iter().zip(&self.inductor) {
            match (p.kind, current) {
                (PartKind::Resistor(r), _) => {
                    let g = 1.0 / r;
                    let i = g * (v(p.a) - v(p.b));
                    for (node, sign) in [(p.a, 1.0), (p.b, -1.0)] {
                        if let Some(row) = self.index[node] {
                            f[row] += sign * i;
                            if let Some(j) = jacobian.as_deref_mut() {
                                for (other, way) in [(p.a, 1.0), (p.b, -1.0)] {
                                    if let Some(col) = self.index[other] {
                                        j[(row, col)] += sign * way * g;
                                    }
                                }
                            }
                        }
                    }
                }
                (PartKind::Inductor(_), Some(k)) => {
                    f[*k] = v(p.a) - v(p.b);
                    for (node, sign) in [(p.a, 1.0), (p.b, -1.0)] {
                        if let Some(row) = self.index[node] {
                            f[row] += sign * x[*k];
                            if let Some(j) = jacobian.as_deref_mut() {
                                j[(row, *k)] += sign;
                                j[(*k, row)] += sign;
                            }
                        }
                    }
                }
                _ => {}
            }
        }
        for &node in &self.floating {
            if let Some(row) = self.index[node] {
                f[row] += FLOATING_LEAK_S * x[row];
                if let Some(j) = jacobian.as_deref_mut() {
                    j[(row, row)] += FLOATING_LEAK_S;
                }
            }
        }
        for (k, d) in self.net.devices.iter().enumerate() {
            let vk = v(d.cathode);
            let screen = d.screen.unwrap_or(d.plate);
            let s = device(k, v(d.grid) - vk, v(screen) - vk, v(d.plate) - vk);
            let electrodes = [d.grid, screen, d.plate];
            for e in 0..3 {
                for (node, sign) in [(electrodes[e], 1.0), (d.cathode, -1.0)] {
                    let Some(row) = self.index[node] else {
                        continue;
                    };
                    f[row] += sign * s.i[e];
                    if let Some(j) = jacobian.as_deref_mut() {
                        for (c, electrode) in electrodes.into_iter().enumerate() {
                            if let Some(col) = self.index[electrode] {
                                j[(row, col)] += sign * s.d[e][c];
                            }
                            if let Some(col) = self.index[d.cathode] {
                                j[(row, col)] -= sign * s.d[e][c];
                            }
                        }
                    }
                }
            }
        }
        f
    }

    /// All constant drives from zero to full, each solution starting the next.
    fn step_up(
        &self,
        device: &dyn Fn(usize, f64, f64, f64) -> Slopes,
        iterations: &mut usize,
    ) -> Result<DVector<f64>, NotSettled> {
        let mut x = DVector::zeros(self.size);
        let mut scale = 0.0f64;
        let mut step = 0.125f64;
        while scale < 1.0 {
            let next = (scale + step).min(1.0);
            match self.newton(x.clone(), next, device, iterations) {
                Ok(solved) => {
                    x = solved;
                    scale = next;
                    step *= 1.5;
                }
                Err(failure) => {
                    step *= 0.25;
                    if step < SMALLEST_STEP_UP {
                        return Err(failure);
                    }
                }
            }
        }
        Ok(x)
    }

    /// Lets the circuit settle in time: one capacitor from every node to ground, resistance in every inductor,
    /// backward Euler steps of one Newton iteration each, longer while the volts move little.
    ///
    /// With conductance G = C/h the step solves (J + G) dx = -f; as h grows it becomes Newton's. Returns where
    /// it got to, for Newton's method to finish.
    fn relax(
        &self,
        mut x: DVector<f64>,
        device: &dyn Fn(usize, f64, f64, f64) -> Slopes,
        iterations: &mut usize,
    ) -> DVector<f64> {
        let nodes = self.index.iter().flatten().count();
        let mut jacobian = DMatrix::zeros(self.size, self.size);
        let mut g = RELAX_FIRST_S;
        for _ in 0..RELAX_STEPS {
            *iterations += 1;
            let f = self.assemble(&x, 1.0, device, Some(&mut jacobian));
            let limit = x
                .iter()
                .take(nodes)
                .fold(RELAX_LIMIT_V, |m, v| m.max(RELAX_SHARE * v.abs()));
            let mut held = jacobian.clone();
            for k in 0..self.size {
                // An inductor's row is its volts: L di/dt has the other sign there.
                held[(k, k)] += if k < nodes { g } else { -RELAX_OHMS_PER_S * g };
            }
            let step = held.lu().solve(&(-&f));
            let largest = step.as_ref().map_or(f64::INFINITY, |s| {
                s.iter().take(nodes).fold(0.0f64, |m, d| m.max(d.abs()))
            });
            match step {
                Some(step) if largest < limit => {
                    x += step;
                    g *= if largest < 0.5 * limit { 0.5 } else { 1.0 };
                    if g < RELAX_LAST_S {
                        break;
                    }
                }
                _ => g *= 3.0,
            }
        }
        x
    }

    /// Rounding that the sum of currents at each node (and the volts across each inductor) carries.
    fn rounding(
        &self,
        x: &DVector<f64>,
        scale: f64,
        device: &dyn Fn(usize, f64, f64, f64) -> Slopes,
    ) -> DVector<f64> {
        let mut terms = DVector::zeros(self.size);
        let mut add = |node: Node, amperes: f64| {
            if let Some(row) = self.index[node] {
                terms[row] += amperes;
            }
        };
        let v = |node| self.volts(x, node, scale).abs();
        for (p, current) in self.net.parts.iter().zip(&self.inductor) {
            let amperes = match (p.kind, current) {
                (PartKind::Resistor(r), _) => (v(p.a) + v(p.b)) / r,
                (PartKind::Inductor(_), Some(k)) => x[*k].abs(),
                _ => 0.0,
            };
            add(p.a, amperes);
            add(p.b, amperes);
        }
        for (k, d) in self.net.devices.iter().enumerate() {
            let electrodes = [d.grid, d.screen.unwrap_or(d.plate), d.plate];
            let vk = self.volts(x, d.cathode, scale);
            let [g, s, p] = electrodes.map(|n| self.volts(x, n, scale) - vk);
            let slopes = device(k, g, s, p);
            for e in 0..3 {
                let amperes = slopes.i[e].abs()
                    + (0..3)
                        .map(|c| slopes.d[e][c].abs() * (v(electrodes[c]) + v(d.cathode)))
                        .sum::<f64>();
                add(electrodes[e], amperes);
                add(d.cathode, amperes);
            }
        }
        for (p, current) in self.net.parts.iter().zip(&self.inductor) {
            if let Some(k) = current {
                terms[*k] += v(p.a) + v(p.b);
            }
        }
        terms * (ROUNDINGS * f64::EPSILON)
    }

    fn newton(
        &self,
        mut x: DVector<f64>,
        scale: f64,
        device: &dyn Fn(usize, f64, f64, f64) -> Slopes,
        iterations: &mut usize,
    ) -> Result<DVector<f64>, NotSettled> {
        let nodes = self.index.iter().flatten().count();
        let mut jacobian = DMatrix::zeros(self.size, self.size);
        let mut balanced_steps = 0;
        for _ in 0..ITERATIONS {
            *iterations += 1;
            let f = self.assemble(&x, scale, device, Some(&mut jacobian));
            let Some(step) = jacobian.clone().lu().solve(&(-&f)) else {
                break;
            };
            let largest = step.iter().take(nodes).fold(0.0f64, |m, s| m.max(s.abs()));
            if !largest.is_finite() {
                break;
            }
            // The rounding is worth its sums only near the end.
            let balanced = f.amax() < RESIDUAL_A
                || f.amax() < 1e-6
                    && self
                        .rounding(&x, scale, device)
                        .iter()
                        .zip(f.iter())
                        .all(|(rounding, f)| f.abs() < RESIDUAL_A + rounding);
            if balanced {
                balanced_steps += 1;
                if largest < STEP_SETTLED_V || balanced_steps > BALANCED_STEPS {
                    return Ok(x + step);
                }
            } else {
                balanced_steps = 0;
            }
            let mut damping = (STEP_LIMIT_V / largest).min(1.0);
            let before = f.norm_squared();
            loop {
                let trial = &x + &step * damping;
                let after = self.assemble(&trial, scale, device, None).norm_squared();
                if after < before || damping < 1e-3 || balanced {
                    x = trial;
                    break;
                }
                damping *= 0.5;
            }
        }
        let f = self.assemble(&x, scale, device, None);
        let (row, residual) =
            f.iter()
                .enumerate()
                .take(nodes)
                .fold((0, 0.0f64), |worst, (k, r)| {
                    if r.abs() > worst.1 || r.is_nan() {
                        (k, r.abs())
                    } else {
                        worst
                    }
                });
        let node = self
            .index
            .iter()
            .position(|slot| *slot == Some(row))
            .unwrap_or(0);
        Err(NotSettled {
            node: self.net.node_names[node].clone(),
            residual,
            iterations: *iterations,
        })
    }

    fn rest(
        &self,
        x: &DVector<f64>,
        device: &dyn Fn(usize, f64, f64, f64) -> Slopes,
        iterations: usize,
        used_fallback: bool,
    ) -> Rest {
        let volts: Vec<f64> = (0..self.net.node_count())
            .map(|n| self.volts(x, n, 1.0))
            .collect();
        let part_amperes = self
            .net
            .parts
            .iter()
            .zip(&self.inductor)
            .map(|(p, current)| match (p.kind, current) {
                (PartKind::Resistor(r), _) => (volts[p.a] - volts[p.b]) / r,
                (PartKind::Inductor(_), Some(k)) => x[*k],
                _ => 0.0,
            })
            .collect();
        let devices = self
            .net
            .devices
            .iter()
            .enumerate()
            .map(|(k, d)| {
                let vk = volts[d.cathode];
                let screen = d.screen.unwrap_or(d.plate);
                device(
                    k,
                    volts[d.grid] - vk,
                    volts[screen] - vk,
                    volts[d.plate] - vk,
                )
            })
            .collect();
        Rest {
            volts,
            part_amperes,
            devices,
            iterations,
            used_fallback,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::circuit::netlist::{Device, GROUND};

    #[test]
    fn a_divider_divides() {
        let mut net = Netlist::new();
        let top = net.driven("top", Drive::Constant(10.0));
        let mid = net.node("mid");
        net.add("upper", top, mid, PartKind::Resistor(1e3));
        net.add("lower", mid, GROUND, PartKind::Resistor(3e3));
        let end = net.node("end");
        net.add("coil", mid, end, PartKind::Inductor(1.0));
        net.add("drain", end, GROUND, PartKind::Resistor(6e3));
        let rest = solve(&net, None, &|_, _, _, _| Slopes::default()).unwrap();
        assert!((rest.volts[mid] - 10.0 * 2.0 / 3.0).abs() < 1e-12);
        assert!((rest.part_amperes[2] - rest.volts[mid] / 6e3).abs() < 1e-15);
    }

    /// Three-halves law i = P(vg + vp/mu)^1.5: the cathode resistor's drop has to solve the same equation.
    #[test]
    fn a_cathode_resistor_finds_its_own_bias() {
        let mut net = Netlist::new();
        let rail = net.driven("rail", Drive::Constant(250.0));
        let plate = net.node("plate");
        let cathode = net.node("cathode");
        net.add("load", rail, plate, PartKind::Resistor(100e3));
        net.add("bias", cathode, GROUND, PartKind::Resistor(1.5e3));
        net.devices.push(Device {
            grid: GROUND,
            screen: None,
            plate,
            cathode,
        });
        let law = |_: usize, vg: f64, _: f64, vp: f64| {
            let e = (vg + vp / 100.0).max(0.0);
            let mut s = Slopes::default();
            s.i[2] = 1e-3 * e.powf(1.5);
            s.d[2][0] = 1.5e-3 * e.sqrt();
            s.d[2][2] = s.d[2][0] / 100.0;
            s
        };
        let rest = solve(&net, None, &law).unwrap();
        let i = rest.devices[0].i[2];
        assert!((rest.volts[cathode] - 1.5e3 * i).abs() < 1e-9);
        assert!((250.0 - rest.volts[plate] - 100e3 * i).abs() < 1e-6);
        assert!(i > 1e-4 && i < 2.5e-3);
    }
}
