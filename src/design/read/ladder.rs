//! The ladder from jack or plate to a grid, and what it does to direct current.

use super::super::model::{Branch, Element, ElementKind, Pot, Resistive, Taper};
use super::super::section::Section;
use crate::diagnostic::Code;
use crate::units::{Farads, Ohms};

/// What a ladder begins at.
#[derive(Clone, Copy, PartialEq, Eq)]
pub(super) enum Start {
    /// Direct current reaches ground through the source.
    Jack,
    /// The plate before, at its direct voltage.
    Plate,
}

const OF_A_POT: [&str; 4] = ["taper", "midpoint", "setting", "end_resistance"];

pub(super) fn element(name: &str, section: &Section<'_>) -> Element {
    let place = section.word("place");
    let kind = match place {
        Some("divider") => divider(section),
        _ => {
            let sound = place.is_some() && section.is_sound("place");
            if sound {
                section.without_effect("bright", "only a divider has a top and a wiper", None);
            }
            let branch = branch(section);
            let to = section.word("to");
            if place == Some("shunt") {
                ElementKind::Shunt {
                    branch,
                    to_bias: to == Some("bias"),
                }
            } else {
                if sound {
                    section.without_effect("to", "a series element ends at the next one", None);
                }
                ElementKind::Series(branch)
            }
        }
    };
    Element {
        name: name.to_owned(),
        kind,
    }
}

fn divider(section: &Section<'_>) -> ElementKind {
    let hint = Some("a fixed divider is a series resistor and a shunt resistor");
    section.without_effect("resistor", "a divider is a pot", hint);
    section.without_effect(
        "capacitor",
        "a divider is a pot",
        Some("a capacitor from its top to its wiper is `bright`"),
    );
    section.without_effect("wired", "a divider is a pot alone", None);
    section.without_effect("to", "a divider's lower end is at ground", None);
    ElementKind::Divider {
        pot: pot(section, section.due("pot", Some("a divider is a pot"))),
        bright: section.quantity("bright").map(Farads),
    }
}

fn branch(section: &Section<'_>) -> Branch {
    let resistor = section.quantity("resistor");
    let track = section.quantity("pot");
    let capacitor = section.quantity("capacitor").map(Farads);
    if resistor.is_some() && track.is_some() {
        section.conflict(
            "resistor",
            "pot",
            "put the fixed resistor into an element of its own",
        );
    }
    let wired = section.word("wired");
    let resistive = match (resistor, track) {
        (_, Some(track)) => Some(Resistive::Rheostat(pot(section, track))),
        (Some(resistor), None) => Some(Resistive::Fixed(Ohms(resistor))),
        (None, None) => None,
    };
    if track.is_none() {
        for key in OF_A_POT {
            section.without_effect(key, "the element has no `pot`", None);
        }
    }
    match (resistive, capacitor) {
        (Some(resistive), Some(capacitor)) => match wired {
            Some("parallel") => Branch::InParallel(resistive, capacitor),
            Some(_) => Branch::InSeries(resistive, capacitor),
            None => {
                section.missing("wired", Some("the branch has two parts"));
                Branch::InSeries(resistive, capacitor)
            }
        },
        (one, other) => {
            section.without_effect("wired", "the branch has one part only", None);
            match (one, other) {
                (Some(resistive), _) => Branch::Resistive(resistive),
                (None, Some(capacitor)) => Branch::Capacitor(capacitor),
                (None, None) => {
                    if ["resistor", "pot", "capacitor"]
                        .iter()
                        .any(|key| section.is_meant(key))
                    {
                        return Branch::Resistive(Resistive::Fixed(Ohms(1.0)));
                    }
                    let hint = Some(
                        "give it a `resistor`, a `pot`, a `capacitor`, or one of the first two and a capacitor",
                    );
                    let message = "there is nothing in this branch";
                    section.fault(
                        Code::EmptyBranch,
                        "resistor",
                        message,
                        hint.map(str::to_owned),
                    );
                    Branch::Resistive(Resistive::Fixed(Ohms(1.0)))
                }
            }
        }
    }
}

fn pot(section: &Section<'_>, track: f64) -> Pot {
    let word = section.word("taper");
    if word == Some("linear") && section.is_sound("taper") {
        let hint = Some("say taper = \"audio\" or \"reverse-audio\"");
        section.without_effect(
            "midpoint",
            "a linear taper has half its track at mid rotation",
            hint,
        );
    }
    let midpoint = section.due("midpoint", None) / 100.0;
    Pot {
        resistance: Ohms(track),
        taper: match word {
            Some("audio") => Taper::Audio { midpoint },
            Some("reverse-audio") => Taper::ReverseAudio { midpoint },
            _ => Taper::Linear,
        },
        setting: section.due("setting", None),
        end_resistance: Ohms(section.due("end_resistance", None)),
    }
}

/// What a node is tied to by resistances.
#[derive(Clone, Copy, Default)]
struct DirectPath {
    ground: bool,
    bias: bool,
    plate: bool,
}

/// Notes a grid that direct current reaches wrongly, or not at all.
pub(super) fn check(
    stage: &Section<'_>,
    grid: &Section<'_>,
    sections: &[(String, Section<'_>)],
    elements: &Vec<Element>,
    start: Start,
) {
    let has_bias = grid.is_given("fixed_bias");
    for ((_, section), element) in sections.iter().zip(elements) {
        if matches!(element.kind, ElementKind::Shunt { to_bias: true, .. })
            && section.is_sound("to")
            && !has_bias
        {
            let hint = Some(
                "give the stage `grid.fixed_bias`, or let the element end at ground".to_owned(),
            );
            section.fault(
                Code::NoFixedBias,
                "to",
                "this stage has no fixed bias",
                hint,
            );
        }
    }
    let faulty = |(_, section): &(String, Section<'_>)| !section.is_sound_throughout();
    if !stage.is_sound("input") || sections.iter().any(faulty) {
        return;
    }
    let path = direct_path(elements, start);
    if path.plate {
        let message = "the direct voltage of the plate before reaches this grid";
        let hint =
            Some("put a capacitor in series: place = \"series\", capacitor = \"22n\"".to_owned());
        stage.fault(Code::PlateNotBlocked, "input", message, hint);
        return;
    }
    if has_bias && !path.bias {
        let message = "no resistance brings the fixed bias to the grid";
        let hint =
            Some("after the last series capacitor, give a shunt resistor to = \"bias\"".to_owned());
        grid.fault(Code::BiasLeakMissing, "fixed_bias", message, hint);
    } else if !path.ground && !path.bias {
        let message = "this grid has no resistive path to ground";
        let hint = Some("after the last series capacitor, put a grid leak: place = \"shunt\", resistor = \"1M\"".to_owned());
        stage.fault(Code::GridWithoutDcPath, "input", message, hint);
    }
}

fn direct_path(elements: &[Element], start: Start) -> DirectPath {
    let mut path = DirectPath {
        ground: start == Start::Jack,
        plate: start == Start::Plate,
        bias: false,
    };
    for element in elements {
        match &element.kind {
            ElementKind::Series(branch) if conducts(branch) => {}
            ElementKind::Series(_) => path = DirectPath::default(),
            ElementKind::Shunt { branch, to_bias } if conducts(branch) => {
                path.bias |= to_bias;
                path.ground |= !to_bias;
            }
            ElementKind::Shunt { .. } => {}
            ElementKind::Divider { .. } => path.ground = true,
        }
    }
    path
}

/// Whether direct current passes.
fn conducts(branch: &Branch) -> bool {
    matches!(branch, Branch::Resistive(_) | Branch::InParallel(..))
}
