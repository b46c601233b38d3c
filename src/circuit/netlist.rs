//! What a circuit is made of.

/// A node of a circuit; [`GROUND`] is node 0.
pub type Node = usize;

/// The reference node.
pub const GROUND: Node = 0;

/// A two-terminal linear part between nodes `a` and `b`.
#[derive(Clone, Debug, PartialEq)]
pub struct Part {
    /// Where it comes from, for reports: `first.plate.resistor`.
    pub name: String,
    pub a: Node,
    pub b: Node,
    pub kind: PartKind,
}

#[derive(Clone, Copy, Debug, PartialEq)]
pub enum PartKind {
    /// Ohms, positive.
    Resistor(f64),
    /// Farads, positive.
    Capacitor(f64),
    /// Henries, positive.
    Inductor(f64),
}

/// What holds a driven node at its voltage.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Drive {
    /// A direct voltage to ground.
    Constant(f64),
    /// The instrument's signal; 0 V at rest.
    Signal,
}

/// A device with a grid, a screen, a plate and a cathode.
///
/// Currents flow into grid, screen and plate and out of the cathode.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Device {
    pub grid: Node,
    /// `None`: the device has no screen of its own.
    pub screen: Option<Node>,
    pub plate: Node,
    pub cathode: Node,
}

/// Currents into grid, screen, plate, and their slopes over the volts of grid, screen and plate to the cathode.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Slopes {
    pub i: [f64; 3],
    /// `d[row][column]`: current of electrode `row` over volts of electrode `column`; order grid, screen, plate.
    pub d: [[f64; 3]; 3],
}

/// A circuit: named nodes, linear parts, driven nodes, devices.
#[derive(Clone, Debug, Default)]
pub struct Netlist {
    pub node_names: Vec<String>,
    pub parts: Vec<Part>,
    pub drives: Vec<(Node, Drive)>,
    pub devices: Vec<Device>,
    /// Nodes at which the time-stepping networks are cut: each has a filter capacitor to ground.
    pub rails: Vec<Node>,
}

impl Netlist {
    /// A circuit with ground only.
    pub fn new() -> Self {
        Netlist {
            node_names: vec!["ground".into()],
            ..Netlist::default()
        }
    }

    pub fn node(&mut self, name: impl Into<String>) -> Node {
        self.node_names.push(name.into());
        self.node_names.len() - 1
    }

    pub fn driven(&mut self, name: impl Into<String>, drive: Drive) -> Node {
        let node = self.node(name);
        self.drives.push((node, drive));
        node
    }

    pub fn add(&mut self, name: impl Into<String>, a: Node, b: Node, kind: PartKind) {
        let value = match kind {
            PartKind::Resistor(v) | PartKind::Capacitor(v) | PartKind::Inductor(v) => v,
        };
        assert!(
            value > 0.0 && value.is_finite(),
            "a part's value must be positive and finite"
        );
        self.parts.push(Part {
            name: name.into(),
            a,
            b,
            kind,
        });
    }

    /// Adds a resistor from `from` to a new node and returns that node; 0 Ω returns `from` itself.
    pub fn resistor_onward(&mut self, name: impl Into<String>, from: Node, ohms: f64) -> Node {
        let name = name.into();
        if ohms == 0.0 {
            return from;
        }
        let to = self.node(name.clone());
        self.add(name, from, to, PartKind::Resistor(ohms));
        to
    }

    pub fn node_count(&self) -> usize {
        self.node_names.len()
    }

    pub fn drive_of(&self, node: Node) -> Option<Drive> {
        if node == GROUND {
            return Some(Drive::Constant(0.0));
        }
        self.drives
            .iter()
            .find(|(n, _)| *n == node)
            .map(|(_, d)| *d)
    }

    pub fn part(&self, name: &str) -> Option<&Part> {
        self.parts.iter().find(|p| p.name == name)
    }
}
