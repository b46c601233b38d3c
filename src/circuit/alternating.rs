//! How a circuit answers small signals about its rest.

use nalgebra::{Complex, DMatrix, DVector};

use super::netlist::{Drive, Netlist, Node, PartKind, Slopes};

/// Which time axis the reactive parts live on.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Axis {
    /// Continuous time: admittances jωC and 1/(jωL).
    Continuous,
    /// The trapezoidal rule at this step in seconds: ω is replaced by (2/h)·tan(ωh/2).
    Trapezoidal { step: f64 },
}

/// Small-signal circuit at one frequency, factored once.
pub struct SmallSignal {
    index: Vec<Option<usize>>,
    lu: nalgebra::LU<Complex<f64>, nalgebra::Dyn, nalgebra::Dyn>,
    /// Right-hand side of 1 V at the signal's node.
    signal: DVector<Complex<f64>>,
    size: usize,
    signal_node: Option<Node>,
}

/// Capacitances between a device's own electrodes, in farads.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct DeviceCapacitances {
    pub grid_plate: f64,
    pub grid_cathode: f64,
    pub plate_cathode: f64,
}

impl SmallSignal {
    /// Sets up the nodal equations at `frequency` (Hz, positive) with each device replaced by its slopes and
    /// capacitances.
    pub fn new(
        net: &Netlist,
        devices: &[Slopes],
        capacitances: &[DeviceCapacitances],
        frequency: f64,
        axis: Axis,
    ) -> SmallSignal {
        let w = std::f64::consts::TAU * frequency;
        let w = match axis {
            Axis::Continuous => w,
            Axis::Trapezoidal { step } => 2.0 / step * (w * step / 2.0).tan(),
        };
        let mut index = vec![None; net.node_count()];
        let mut size = 0;
        for (node, slot) in index.iter_mut().enumerate() {
            if net.drive_of(node).is_none() {
                *slot = Some(size);
                size += 1;
            }
        }
        let signal_node = net
            .drives
            .iter()
            .find(|(_, d)| *d == Drive::Signal)
            .map(|(n, _)| *n);
        let mut y = DMatrix::<Complex<f64>>::zeros(size, size);
        let mut rhs = DVector::<Complex<f64>>::zeros(size);
        {
            let mut stamp = |out: [(Node, f64); 2], across: [(Node, f64); 2], g: Complex<f64>| {
                for (node, sign) in out {
                    let Some(row) = index[node] else { continue };
                    for (other, way) in across {
                        if let Some(col) = index[other] {
                            y[(row, col)] += g * (sign * way);
                        } else if Some(other) == signal_node {
                            rhs[row] -= g * (sign * way);
                        }
                    }
                }
            };
            for p in &net.parts {
                let g = match p.kind {
                    PartKind::Resistor(r) => Complex::new(1.0 / r, 0.0),
                    PartKind::Capacitor(c) => Complex::new(0.0, w * c),
                    PartKind::Inductor(l) => Complex::new(0.0, -1.0 / (w * l)),
                };
                stamp([(p.a, 1.0), (p.b, -1.0)], [(p.a, 1.0), (p.b, -1.0)], g);
            }
            for ((d, s), c) in net.devices.iter().zip(devices).zip(capacitances) {
                let electrodes = [d.grid, d.screen.unwrap_or(d.plate), d.plate];
                for e in 0..3 {
                    for col in 0..3 {
                        let g = Complex::new(s.d[e][col], 0.0);
                        stamp(
                            [(electrodes[e], 1.0), (d.cathode, -1.0)],
                            [(electrodes[col], 1.0), (d.cathode, -1.0)],
                            g,
                        );
                    }
                }
                for (a, b, farads) in [
                    (d.grid, d.plate, c.grid_plate),
                    (d.grid, d.cathode, c.grid_cathode),
                    (d.plate, d.cathode, c.plate_cathode),
                ] {
                    stamp(
                        [(a, 1.0), (b, -1.0)],
                        [(a, 1.0), (b, -1.0)],
                        Complex::new(0.0, w * farads),
                    );
                }
            }
        }
        // Nodes that nothing but an open circuit touches keep the matrix regular.
        for k in 0..size {
            if y[(k, k)] == Complex::new(0.0, 0.0) {
                y[(k, k)] = Complex::new(1.0, 0.0);
            }
        }
        SmallSignal {
            index,
            lu: y.lu(),
            signal: rhs,
            size,
            signal_node,
        }
    }

    /// Volts at every node for 1 V at the signal's node.
    pub fn response(&self) -> Vec<Complex<f64>> {
        let x = self
            .lu
            .solve(&self.signal)
            .unwrap_or_else(|| DVector::zeros(self.size));
        self.index
            .iter()
            .enumerate()
            .map(|(node, slot)| match slot {
                Some(k) => x[*k],
                None if Some(node) == self.signal_node => Complex::new(1.0, 0.0),
                None => Complex::new(0.0, 0.0),
            })
            .collect()
    }

    /// Impedance between `node` and ground, in ohms; 0 at a driven node.
    pub fn impedance(&self, node: Node) -> Complex<f64> {
        let Some(k) = self.index[node] else {
            return Complex::new(0.0, 0.0);
        };
        let mut rhs = DVector::zeros(self.size);
        rhs[k] = Complex::new(1.0, 0.0);
        self.lu.solve(&rhs).map_or(Complex::new(0.0, 0.0), |x| x[k])
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::circuit::netlist::GROUND;

    #[test]
    fn a_low_pass_is_3_db_down_at_its_corner() {
        let mut net = Netlist::new();
        let input = net.driven("in", Drive::Signal);
        let out = net.node("out");
        net.add("r", input, out, PartKind::Resistor(10e3));
        net.add("c", out, GROUND, PartKind::Capacitor(1e-9));
        let corner = 1.0 / (std::f64::consts::TAU * 10e3 * 1e-9);
        let ac = SmallSignal::new(&net, &[], &[], corner, Axis::Continuous);
        let v = ac.response()[out];
        assert!((v - Complex::new(0.5, -0.5)).norm() < 1e-12);
        let z = ac.impedance(out);
        assert!((z - Complex::new(5e3, -5e3)).norm() < 1e-8);
    }
}
