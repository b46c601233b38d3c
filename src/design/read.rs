//! From text to a checked design, with every fault of the text at once.

mod iron;
mod ladder;
mod stages;
mod supply;

use super::findings::Findings;
use super::model::{Control, Design, Element, ElementKind, PotPlace};
use super::overrides;
use super::places::Places;
use super::section::Section;
use super::tree;
use crate::diagnostic::{Code, Diagnostic, Place, nearest};
use crate::units::notation::clipped;
use crate::units::{Ohms, Unit, VoltsPeak};

/// Version of the design format that is read.
const FORMAT: u32 = 1;

/// Most entries of a list that are read: chosen, far above any small amplifier.
const MOST_RAILS: usize = 12;
const MOST_STAGES: usize = 8;
const MOST_ELEMENTS: usize = 24;
const MOST_SETTINGS: usize = 21;

/// A valid design, and where each part of it stands.
#[derive(Clone, Debug, PartialEq)]
pub struct Reading {
    pub design: Design,
    pub places: Places,
}

/// Reads a design file, with overrides `PATH=VALUE` applied in order.
///
/// What can be known without the catalog of tubes is checked: keys, units, ranges, names and references, how rails follow each other,
/// and that every grid has its path for direct current. A design that comes out keeps the promises of its types; whether the tubes
/// exist, and what a pentode needs, is for who knows the catalog.
///
/// # Errors
/// Every fault of the file and of the overrides, in the order of the file. Syntax errors come alone, and so does a format
/// version this program does not read, since nothing certain can be said behind them.
pub fn read(text: &str, overrides: &[String]) -> Result<Reading, Vec<Diagnostic>> {
    let mut table = tree::parse(text)?;
    let findings = Findings::default();
    for given in overrides {
        overrides::apply(&mut table, given, &findings);
    }
    check_format(&table)?;
    let design = design(&Section::root(&table, &findings));
    match findings.close() {
        Ok(places) => Ok(Reading { design, places }),
        Err(mut faults) => {
            faults.sort_by_key(|fault| match &fault.place {
                Place::Text(span) => (0, span.start),
                Place::Override(_) => (1, 0),
                Place::Whole => (2, 0),
            });
            Err(faults)
        }
    }
}

/// Refuses a version of the format that is well written but not this one.
fn check_format(table: &tree::Table) -> Result<(), Vec<Diagnostic>> {
    let findings = Findings::default();
    let stated = table.get("format").map(|node| &node.value);
    if let Some(tree::Value::Number(version)) = stated
        && *version != f64::from(FORMAT)
    {
        let place = table
            .get("format")
            .map_or(Place::Whole, |node| node.place.clone());
        let message = format!(
            "design format {} is not read here",
            Unit::Plain.format(*version)
        );
        let hint = Some(format!("this program reads format {FORMAT}"));
        findings.fault(Code::UnsupportedFormat, "format", place, message, hint);
    }
    findings.close().map(drop)
}

fn design(root: &Section<'_>) -> Design {
    root.count("format");
    let name = root.text("name");
    let description = root.text("description");
    let jack = root.table("jack");
    let jack_source_resistance = Ohms(jack.due("source_resistance", None));
    let (supply, rails) = supply::read(&root.table("supply"));
    let stages = stages::read(root, &rails);
    let transformer = iron::transformer(&root.table("transformer"));
    let load = iron::load(&root.table("load"));
    let control = control(&root.table("control"), &stages);
    Design {
        name,
        description,
        control,
        jack_source_resistance,
        supply,
        stages,
        transformer,
        load,
    }
}

fn control(section: &Section<'_>, stages: &[super::model::Stage]) -> Control {
    let test_level = VoltsPeak(section.due("test_level", None));
    let settings = section.quantities("settings").unwrap_or_default();
    if !section.is_given("gain") {
        let hint = "name the pot that is the gain control with `gain`";
        section.without_effect("settings", "the design names no gain control", Some(hint));
        return Control {
            gain: None,
            // One setting, and nothing that it turns.
            settings: vec![10.0],
            test_level,
        };
    }
    if settings.len() > MOST_SETTINGS {
        let message = format!(
            "{} settings, at most {MOST_SETTINGS} are read",
            settings.len()
        );
        section.fault(Code::TooMany, "settings", message, None);
    }
    for (index, setting) in settings.iter().enumerate() {
        if settings[..index].contains(setting) {
            let message = format!("setting {setting} stands twice");
            section.fault(
                Code::OutOfRange,
                "settings",
                message,
                Some("give each position once".to_owned()),
            );
        }
    }
    Control {
        gain: gain_control(section, stages),
        settings,
        test_level,
    }
}

/// The pot that `control.gain` names.
fn gain_control(section: &Section<'_>, stages: &[super::model::Stage]) -> Option<PotPlace> {
    let wanted = section.text("gain");
    // Without any stage that alone is the fault, and noted.
    if !section.is_sound("gain") || stages.is_empty() {
        return None;
    }
    let mut pots = Vec::new();
    let mut pot_names = Vec::new();
    for (stage_index, stage) in stages.iter().enumerate() {
        for (index, element) in stage.input.iter().enumerate() {
            let full = format!("{}/{}", stage.name, element.name);
            let is_meant = !element.name.is_empty() && (element.name == wanted || full == wanted);
            if is_pot(element) {
                let place = PotPlace {
                    stage: stage_index,
                    element: index,
                };
                if is_meant {
                    pots.push((place, full.clone()));
                }
                pot_names.push((element.name.clone(), full));
            } else if is_meant {
                let message = format!("`{wanted}` is no pot");
                let hint = Some("the gain control is an input element with a `pot`".to_owned());
                section.fault(Code::UnknownGainControl, "gain", message, hint);
                return None;
            }
        }
    }
    match pots.as_slice() {
        [(place, _)] => Some(*place),
        [] => {
            let names = pot_names
                .iter()
                .flat_map(|(name, full)| [name.as_str(), full.as_str()]);
            let hint = match nearest(&wanted, names) {
                Some(near) => format!("did you mean `{near}`?"),
                None if pot_names.is_empty() => {
                    "the design has no pot: leave `gain` out".to_owned()
                }
                None => {
                    let names: Vec<_> = pot_names.iter().map(|(name, _)| name.as_str()).collect();
                    format!("the design's pots are {}", names.join(", "))
                }
            };
            let message = format!("no pot is named `{}`", clipped(&wanted));
            section.fault(Code::UnknownGainControl, "gain", message, Some(hint));
            None
        }
        several => {
            let names: Vec<_> = several.iter().map(|(_, full)| full.as_str()).collect();
            let hint = Some(format!("say which: {}", names.join(" or ")));
            section.fault(
                Code::AmbiguousGainControl,
                "gain",
                format!("several pots are named `{wanted}`"),
                hint,
            );
            None
        }
    }
}

fn is_pot(element: &Element) -> bool {
    use super::model::{Branch, Resistive};
    let branch = match &element.kind {
        ElementKind::Divider { .. } => return true,
        ElementKind::Series(branch) | ElementKind::Shunt { branch, .. } => branch,
    };
    matches!(
        branch,
        Branch::Resistive(Resistive::Rheostat(_))
            | Branch::InSeries(Resistive::Rheostat(_), _)
            | Branch::InParallel(Resistive::Rheostat(_), _)
    )
}

#[cfg(test)]
mod tests;
