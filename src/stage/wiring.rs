//! A design as a circuit: every component between its nodes.

use super::iron::Iron;
use super::loudspeaker::{self, CoilEquivalent};
use super::supply::Thevenin;
use crate::circuit::{Device, Drive, GROUND, Netlist, Node, PartKind};
use crate::design::{
    Branch, CathodeBias, Connection, Design, Element, ElementKind, Pot, RailFeed, Resistive, Stage,
    Taper,
};

/// What hangs on the secondary.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum LoadKind {
    /// The rated resistance: every quoted figure stands on it.
    Rated,
    /// The design's loudspeaker where it has one, else the rated resistance.
    Loudspeaker,
}

/// A design's circuit and where its stages sit in it.
#[derive(Clone, Debug)]
pub struct Wiring {
    pub net: Netlist,
    pub jack: Node,
    /// Source of the first rail, held at its open-circuit volts, and the node name of its resistance.
    pub source: Node,
    pub rails: Vec<Node>,
    /// Top of the load, referred to the primary; its other end is the transformer's rail.
    pub load_top: Node,
    pub output_rail: usize,
    pub turns_ratio: f64,
}

impl Wiring {
    /// Loudspeaker volts from node volts.
    pub fn output_volts(&self, volts: &[f64]) -> f64 {
        (volts[self.load_top] - volts[self.rails[self.output_rail]]) / self.turns_ratio
    }
}

/// Fraction of the track below the wiper at `setting` (0 to 10).
///
/// Linear: x; audio: two straight pieces that meet at `midpoint` at half rotation; reverse audio: one minus
/// audio of the rest.
pub fn track_fraction(taper: Taper, setting: f64) -> f64 {
    let audio = |x: f64, midpoint: f64| {
        if x <= 0.5 {
            2.0 * midpoint * x
        } else {
            midpoint + (2.0 * x - 1.0) * (1.0 - midpoint)
        }
    };
    let x = (setting / 10.0).clamp(0.0, 1.0);
    match taper {
        Taper::Linear => x,
        Taper::Audio { midpoint } => audio(x, midpoint),
        Taper::ReverseAudio { midpoint } => 1.0 - audio(1.0 - x, midpoint),
    }
}

/// Builds the circuit of `design` with its gain control at `gain` (where it has one).
///
/// `triode[k]` says whether stage k has no screen of its own; `source` is the supply's straight line.
pub fn wire(
    design: &Design,
    triode: &[bool],
    iron: &Iron,
    source: Thevenin,
    gain: Option<f64>,
    load: LoadKind,
) -> Wiring {
    let mut net = Netlist::new();
    let signal = net.driven("jack", Drive::Signal);
    let source_node = net.driven("supply.source", Drive::Constant(source.volts));
    let rails = wire_supply(&mut net, design, source_node, source.resistance);
    let mut running = net.resistor_onward(
        "jack.source_resistance",
        signal,
        design.jack_source_resistance.0,
    );
    let mut output = None;
    for (k, stage) in design.stages.iter().enumerate() {
        let grid = wire_ladder(&mut net, design, k, stage, running, gain);
        let prefix = format!("stage.{}", stage.name);
        let plate = net.node(format!("{prefix}.plate"));
        let rail = rails[stage.plate.rail];
        match stage.plate.resistor {
            Some(r) => net.add(
                format!("{prefix}.plate.resistor"),
                rail,
                plate,
                PartKind::Resistor(r.0),
            ),
            None => {
                output = Some((
                    wire_output(&mut net, design, iron, plate, rail, load),
                    stage.plate.rail,
                ))
            }
        }
        let cathode = wire_cathode(&mut net, stage, &prefix);
        let screen = stage.screen.as_ref().filter(|_| !triode[k]).map(|s| {
            let node = net.resistor_onward(
                format!("{prefix}.screen.resistor"),
                rails[s.rail],
                s.resistor.map_or(0.0, |r| r.0),
            );
            if let Some(c) = s.capacitor {
                net.add(
                    format!("{prefix}.screen.capacitor"),
                    node,
                    GROUND,
                    PartKind::Capacitor(c.0),
                );
            }
            node
        });
        net.devices.push(Device {
            grid,
            screen,
            plate,
            cathode,
        });
        running = plate;
    }
    let (load_top, output_rail) =
        output.expect("the reader demands one stage that drives the transformer");
    net.rails = rails.clone();
    Wiring {
        net,
        jack: signal,
        source: source_node,
        rails,
        load_top,
        output_rail,
        turns_ratio: iron.turns_ratio,
    }
}

fn wire_supply(
    net: &mut Netlist,
    design: &Design,
    source: Node,
    source_resistance: f64,
) -> Vec<Node> {
    let mut rails: Vec<Node> = Vec::new();
    for rail in &design.supply.rails {
        let prefix = format!("supply.rail.{}", rail.name);
        let node = net.node(prefix.clone());
        match rail.from {
            RailFeed::Source => {
                net.add(
                    "supply.resistance",
                    source,
                    node,
                    PartKind::Resistor(source_resistance),
                );
            }
            RailFeed::Resistor {
                rail: parent,
                resistor,
            } => {
                net.add(
                    format!("{prefix}.resistor"),
                    rails[parent],
                    node,
                    PartKind::Resistor(resistor.0),
                );
            }
            RailFeed::Choke {
                rail: parent,
                inductance,
                resistance,
            } => {
                let inner = net.resistor_onward(
                    format!("{prefix}.choke_resistance"),
                    rails[parent],
                    resistance.0,
                );
                net.add(
                    format!("{prefix}.choke"),
                    inner,
                    node,
                    PartKind::Inductor(inductance.0),
                );
            }
        }
        net.add(
            format!("{prefix}.capacitor"),
            node,
            GROUND,
            PartKind::Capacitor(rail.capacitor.0),
        );
        rails.push(node);
    }
    rails
}

fn wire_ladder(
    net: &mut Netlist,
    design: &Design,
    k: usize,
    stage: &Stage,
    mut running: Node,
    gain: Option<f64>,
) -> Node {
    let prefix = format!("stage.{}.input", stage.name);
    let bias = stage.fixed_bias.map(|v| {
        net.driven(
            format!("stage.{}.grid.fixed_bias", stage.name),
            Drive::Constant(v.0),
        )
    });
    for (e, element) in stage.input.iter().enumerate() {
        let setting = |pot: &Pot| match (design.control.gain, gain) {
            (Some(place), Some(gain)) if place.stage == k && place.element == e => gain,
            _ => pot.setting,
        };
        let name = format!("{prefix}.{}", element.name);
        running = wire_element(net, element, &name, running, bias, &setting);
    }
    running
}

fn wire_element(
    net: &mut Netlist,
    element: &Element,
    name: &str,
    running: Node,
    bias: Option<Node>,
    setting: &dyn Fn(&Pot) -> f64,
) -> Node {
    match &element.kind {
        ElementKind::Series(branch) => {
            let to = net.node(name);
            wire_branch(net, branch, name, running, to, setting);
            to
        }
        ElementKind::Shunt { branch, to_bias } => {
            let to = if *to_bias {
                bias.unwrap_or(GROUND)
            } else {
                GROUND
            };
            wire_branch(net, branch, name, running, to, setting);
            running
        }
        ElementKind::Divider { pot, bright } => {
            let wiper = net.node(format!("{name}.wiper"));
            let a = track_fraction(pot.taper, setting(pot));
            let upper = pot.end_resistance.0 + pot.resistance.0 * (1.0 - a);
            let lower = pot.end_resistance.0 + pot.resistance.0 * a;
            net.add(
                format!("{name}.pot.upper"),
                running,
                wiper,
                PartKind::Resistor(upper),
            );
            net.add(
                format!("{name}.pot.lower"),
                wiper,
                GROUND,
                PartKind::Resistor(lower),
            );
            if let Some(c) = bright {
                net.add(
                    format!("{name}.bright"),
                    running,
                    wiper,
                    PartKind::Capacitor(c.0),
                );
            }
            wiper
        }
    }
}

fn wire_branch(
    net: &mut Netlist,
    branch: &Branch,
    name: &str,
    a: Node,
    b: Node,
    setting: &dyn Fn(&Pot) -> f64,
) {
    let ohms = |r: &Resistive| match r {
        Resistive::Fixed(r) => r.0,
        Resistive::Rheostat(pot) => {
            pot.end_resistance.0 + pot.resistance.0 * track_fraction(pot.taper, setting(pot))
        }
    };
    match branch {
        Branch::Resistive(r) => {
            net.add(
                format!("{name}.resistor"),
                a,
                b,
                PartKind::Resistor(ohms(r)),
            );
        }
        Branch::Capacitor(c) => {
            net.add(format!("{name}.capacitor"), a, b, PartKind::Capacitor(c.0))
        }
        Branch::InSeries(r, c) => {
            let between = net.node(format!("{name}.between"));
            net.add(
                format!("{name}.resistor"),
                a,
                between,
                PartKind::Resistor(ohms(r)),
            );
            net.add(
                format!("{name}.capacitor"),
                between,
                b,
                PartKind::Capacitor(c.0),
            );
        }
        Branch::InParallel(r, c) => {
            net.add(
                format!("{name}.resistor"),
                a,
                b,
                PartKind::Resistor(ohms(r)),
            );
            net.add(format!("{name}.capacitor"), a, b, PartKind::Capacitor(c.0));
        }
    }
}

fn wire_cathode(net: &mut Netlist, stage: &Stage, prefix: &str) -> Node {
    let (return_to, ohms, part) = match stage.cathode.bias {
        CathodeBias::Grounded => return GROUND,
        CathodeBias::Resistor(r) => (GROUND, r.0, "resistor"),
        CathodeBias::Diode { volts, resistance } => {
            let held = net.driven(
                format!("{prefix}.cathode.diode_volts"),
                Drive::Constant(volts.0),
            );
            (held, resistance.0, "diode_resistance")
        }
    };
    let cathode = net.node(format!("{prefix}.cathode"));
    let lower = match stage.cathode.unbypassed {
        Some(r) => net.resistor_onward(format!("{prefix}.cathode.unbypassed"), cathode, r.0),
        None => cathode,
    };
    net.add(
        format!("{prefix}.cathode.{part}"),
        lower,
        return_to,
        PartKind::Resistor(ohms),
    );
    if let Some(c) = stage.cathode.bypass {
        net.add(
            format!("{prefix}.cathode.bypass"),
            lower,
            GROUND,
            PartKind::Capacitor(c.0),
        );
    }
    cathode
}

/// Transformer and load between plate and rail, referred to the primary; returns the top of the load.
fn wire_output(
    net: &mut Netlist,
    design: &Design,
    iron: &Iron,
    plate: Node,
    rail: Node,
    load: LoadKind,
) -> Node {
    let n2 = iron.turns_ratio * iron.turns_ratio;
    net.add(
        "transformer.shunt_capacitance",
        plate,
        GROUND,
        PartKind::Capacitor(iron.shunt_capacitance),
    );
    let core = net.resistor_onward(
        "transformer.primary_resistance",
        plate,
        iron.primary_resistance,
    );
    net.add(
        "transformer.primary_inductance",
        core,
        rail,
        PartKind::Inductor(iron.primary_inductance),
    );
    net.add(
        "transformer.core_loss",
        core,
        rail,
        PartKind::Resistor(iron.core_loss),
    );
    let leaked = net.node("transformer.leakage");
    net.add(
        "transformer.leakage_inductance",
        core,
        leaked,
        PartKind::Inductor(iron.leakage_inductance),
    );
    let top = net.resistor_onward(
        "transformer.secondary_resistance",
        leaked,
        n2 * iron.secondary_resistance,
    );
    match (&design.load.loudspeaker, load) {
        (Some(speaker), LoadKind::Loudspeaker) => {
            let eq = loudspeaker::equivalent(speaker);
            let mut node = net.resistor_onward("load.loudspeaker.re", top, n2 * eq.re);
            match eq.coil {
                CoilEquivalent::Inductance(l) => {
                    let next = net.node("load.loudspeaker.coil");
                    net.add(
                        "load.loudspeaker.le",
                        node,
                        next,
                        PartKind::Inductor(n2 * l),
                    );
                    node = next;
                }
                CoilEquivalent::Ladder(pairs) => {
                    for (k, (r, l)) in pairs.into_iter().enumerate() {
                        let name = format!("load.loudspeaker.coil.{}", k + 1);
                        let next = net.node(name.clone());
                        net.add(
                            format!("{name}.loss"),
                            node,
                            next,
                            PartKind::Resistor(n2 * r),
                        );
                        net.add(format!("{name}.le"), node, next, PartKind::Inductor(n2 * l));
                        node = next;
                    }
                }
            }
            net.add(
                "load.loudspeaker.res",
                node,
                rail,
                PartKind::Resistor(n2 * eq.res),
            );
            net.add(
                "load.loudspeaker.lces",
                node,
                rail,
                PartKind::Inductor(n2 * eq.lces),
            );
            net.add(
                "load.loudspeaker.cmes",
                node,
                rail,
                PartKind::Capacitor(eq.cmes / n2),
            );
        }
        _ => net.add(
            "load.resistance",
            top,
            rail,
            PartKind::Resistor(n2 * design.load.resistance.0),
        ),
    }
    top
}

/// Whether a stage's tube has no screen circuit of its own.
pub fn is_triode(stage: &Stage, tube_has_screen: bool) -> bool {
    !tube_has_screen || stage.connection == Some(Connection::Triode)
}
