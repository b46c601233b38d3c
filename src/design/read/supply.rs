//! The supply and its rails.

use super::super::model::{Rail, RailFeed, Rectifier, Source, Supply};
use super::super::section::Section;
use super::MOST_RAILS;
use crate::diagnostic::{Code, nearest};
use crate::units::notation::clipped;
use crate::units::{Farads, Henries, Ohms, Volts, VoltsRms};

/// Names of the rails, in the order of [`Supply::rails`].
pub(super) struct RailNames(Vec<String>);

impl RailNames {
    /// Index of the rail that `key` names; noted as a fault if there is none.
    pub fn find(&self, section: &Section<'_>, key: &str) -> usize {
        let wanted = section.text(key);
        if wanted.trim().is_empty() || !section.is_sound(key) {
            return 0;
        }
        position(&self.0, &wanted).unwrap_or_else(|| {
            // Without any rail that alone is the fault, and noted.
            if !self.0.is_empty() {
                unknown(section, key, &wanted, &self.0);
            }
            0
        })
    }
}

pub(super) fn read(section: &Section<'_>) -> (Supply, RailNames) {
    let source = source(section);
    let (rails, names) = rails(section);
    (Supply { source, rails }, RailNames(names))
}

fn source(section: &Section<'_>) -> Source {
    const PLAIN: [&str; 2] = ["volts", "resistance"];
    const BUILT: [&str; 4] = [
        "secondary_rms",
        "winding_resistance",
        "rectifier",
        "rectifier_perveance",
    ];
    const HINT: &str = "give either `volts` with `resistance`, or `secondary_rms` with `winding_resistance` and `rectifier`";
    let plain = PLAIN.into_iter().find(|key| section.is_given(key));
    let built = BUILT.into_iter().find(|key| section.is_given(key));
    match (plain, built) {
        (Some(plain), Some(built)) => {
            section.conflict(plain, built, HINT);
            section.glance(&BUILT);
        }
        (None, None) if section.is_present() => {
            section.missing("volts", Some("or give `secondary_rms` with its companions"));
        }
        _ => {}
    }
    if plain.is_some() || built.is_none() {
        // What lacks beside a conflict would be a fault that only follows.
        let complete = built.is_none() && plain.is_some();
        let value = |key| {
            if complete {
                section.due(key, Some("`volts` and `resistance` go together"))
            } else {
                section.quantity(key).unwrap_or(1.0)
            }
        };
        return Source::Plain {
            volts: Volts(value("volts")),
            resistance: Ohms(value("resistance")),
        };
    }
    let why = Some("`secondary_rms`, `winding_resistance` and `rectifier` go together");
    let secondary = VoltsRms(section.due("secondary_rms", why));
    let winding_resistance = Ohms(section.due("winding_resistance", why));
    let word = section.word("rectifier");
    if word.is_none() {
        section.missing("rectifier", why);
    }
    let rectifier = match word {
        Some("tube-full-wave") => Rectifier::TubeFullWave {
            perveance: section.due("rectifier_perveance", Some("a tube rectifier needs it")),
        },
        other => {
            if section.is_sound("rectifier") {
                section.without_effect("rectifier_perveance", "the rectifier is no tube", None);
            }
            match other {
                Some("silicon-full-wave") => Rectifier::SiliconFullWave,
                _ => Rectifier::SiliconBridge,
            }
        }
    };
    Source::Rectified {
        secondary,
        winding_resistance,
        rectifier,
    }
}

/// One rail before the rails are put in order.
struct Found {
    name: String,
    from: From,
    series: Series,
    capacitor: Farads,
}

#[derive(Clone, Copy, PartialEq)]
enum From {
    Source,
    Rail(usize),
    /// Not known, which is noted.
    Nowhere,
}

enum Series {
    Resistor(Ohms),
    Choke(Henries, Ohms),
}

fn rails(section: &Section<'_>) -> (Vec<Rail>, Vec<String>) {
    let sections = section.tables("rail", MOST_RAILS);
    if sections.is_empty() && section.is_present() && section.is_sound("rail") {
        section.missing("rail", None);
    }
    let names: Vec<String> = sections.iter().map(|(name, _)| name.clone()).collect();
    let found: Vec<Found> = sections
        .iter()
        .map(|(name, section)| rail(name, section, &names))
        .collect();
    report_rings(&sections, &found);
    report_sources(section, &sections, &found);
    let order = order(&found);
    let rank = |index: usize| order.iter().position(|&other| other == index).unwrap_or(0);
    let rails = order.iter().map(|&index| {
        let rail = &found[index];
        Rail {
            name: rail.name.clone(),
            from: match (rail.from, &rail.series) {
                (From::Rail(parent), Series::Resistor(resistor)) => RailFeed::Resistor {
                    rail: rank(parent),
                    resistor: *resistor,
                },
                (From::Rail(parent), Series::Choke(inductance, resistance)) => RailFeed::Choke {
                    rail: rank(parent),
                    inductance: *inductance,
                    resistance: *resistance,
                },
                _ => RailFeed::Source,
            },
            capacitor: rail.capacitor,
        }
    });
    (
        rails.collect(),
        order.iter().map(|&index| names[index].clone()).collect(),
    )
}

fn rail(name: &str, section: &Section<'_>, names: &[String]) -> Found {
    let capacitor = Farads(section.due("capacitor", None));
    let wanted = section.text("from");
    let from = if wanted == "source" {
        From::Source
    } else if wanted.trim().is_empty() {
        From::Nowhere
    } else if let Some(index) = position(names, &wanted) {
        From::Rail(index)
    } else {
        unknown(section, "from", &wanted, names);
        From::Nowhere
    };
    if from == From::Source {
        let why = "the first rail is the source's own capacitor";
        let hint = Some(
            "resistance before it belongs to `supply.resistance` or `supply.winding_resistance`",
        );
        for key in ["resistor", "choke", "choke_resistance"] {
            section.without_effect(key, why, hint);
        }
    }
    // Where the feed is not known, what belongs before the rail is not known either.
    let between_rails = matches!(from, From::Rail(_));
    let series = match (section.quantity("resistor"), section.quantity("choke")) {
        (Some(resistor), choke) => {
            if choke.is_some() && between_rails {
                section.conflict(
                    "resistor",
                    "choke",
                    "give the choke's own resistance as `choke_resistance`",
                );
            } else if between_rails {
                section.without_effect("choke_resistance", "the rail has no `choke`", None);
            }
            Series::Resistor(Ohms(resistor))
        }
        (None, Some(choke)) if between_rails => Series::Choke(
            Henries(choke),
            Ohms(section.due("choke_resistance", Some("every choke has one"))),
        ),
        _ => {
            if between_rails {
                section.missing("resistor", Some("or give a `choke`"));
                section.without_effect("choke_resistance", "the rail has no `choke`", None);
            }
            Series::Resistor(Ohms(1.0))
        }
    };
    Found {
        name: name.to_owned(),
        from,
        series,
        capacitor,
    }
}

/// Notes each ring of rails once.
fn report_rings(sections: &[(String, Section<'_>)], found: &[Found]) {
    let mut in_a_ring = vec![false; found.len()];
    for start in 0..found.len() {
        let mut ring = vec![start];
        let mut at = start;
        while let From::Rail(parent) = found[at].from {
            if parent == start || ring.contains(&parent) {
                break;
            }
            ring.push(parent);
            at = parent;
        }
        if found[at].from != From::Rail(start) || in_a_ring[start] {
            continue;
        }
        for &rail in &ring {
            in_a_ring[rail] = true;
        }
        let message = match ring.as_slice() {
            [_] => format!("rail `{}` feeds itself", found[start].name),
            _ => {
                let names: Vec<_> = ring
                    .iter()
                    .chain([&start])
                    .map(|&rail| found[rail].name.as_str())
                    .collect();
                format!("rails feed each other in a ring: {}", names.join(" from "))
            }
        };
        let hint = Some("the way back from every rail ends at \"source\"".to_owned());
        sections[start]
            .1
            .fault(Code::RailCycle, "from", message, hint);
    }
}

fn report_sources(section: &Section<'_>, sections: &[(String, Section<'_>)], found: &[Found]) {
    let mut from_source = (0..found.len()).filter(|&index| found[index].from == From::Source);
    let Some(first) = from_source.next() else {
        // Where a feed is not known, it may have been meant for the source.
        if !found.is_empty() && !found.iter().any(|rail| rail.from == From::Nowhere) {
            let hint = Some("give the first rail from = \"source\"".to_owned());
            section.fault(
                Code::NoSourceRail,
                "rail",
                "no rail is fed from the source",
                hint,
            );
        }
        return;
    };
    for index in from_source {
        let message = format!(
            "rail `{}` is fed from the source as `{}` is",
            found[index].name, found[first].name
        );
        let hint =
            Some("exactly one rail comes from the source; feed the others from a rail".to_owned());
        sections[index]
            .1
            .fault(Code::SeveralSourceRails, "from", message, hint);
    }
}

/// Indices such that every rail comes after the one it is fed from; otherwise as in the file.
fn order(found: &[Found]) -> Vec<usize> {
    let mut order: Vec<usize> = Vec::with_capacity(found.len());
    while order.len() < found.len() {
        let next = (0..found.len()).find(|index| {
            !order.contains(index)
                && !matches!(found[*index].from, From::Rail(parent) if !order.contains(&parent))
        });
        // Rails in a ring have no order: they are noted as faults.
        let next = next.or_else(|| (0..found.len()).find(|index| !order.contains(index)));
        order.extend(next);
    }
    order
}

fn position(names: &[String], wanted: &str) -> Option<usize> {
    names
        .iter()
        .position(|name| !name.is_empty() && name == wanted)
}

fn unknown(section: &Section<'_>, key: &str, wanted: &str, names: &[String]) {
    let known: Vec<&str> = names
        .iter()
        .map(String::as_str)
        .filter(|name| !name.is_empty())
        .collect();
    let source = (key == "from").then_some("source");
    let hint = match nearest(wanted, known.iter().copied().chain(source)) {
        Some(near) => format!("did you mean `{near}`?"),
        None => format!("the rails are {}", known.join(", ")),
    };
    section.fault(
        Code::UnknownRail,
        key,
        format!("no rail is named `{}`", clipped(wanted)),
        Some(hint),
    );
}
