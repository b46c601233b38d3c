//! The stages, each with what hangs on its tube.

use super::super::model::{Cathode, CathodeBias, Connection, Plate, Screen, Stage, Strays};
use super::super::section::Section;
use super::ladder::{self, Start};
use super::supply::RailNames;
use super::{MOST_ELEMENTS, MOST_STAGES};
use crate::diagnostic::Code;
use crate::units::{Farads, Ohms, Volts};

pub(super) fn read(root: &Section<'_>, rails: &RailNames) -> Vec<Stage> {
    let sections = root.tables("stage", MOST_STAGES);
    if sections.is_empty() && root.is_sound("stage") {
        let hint = Some("begin the first one with [[stage]]".to_owned());
        root.fault(Code::NoStage, "stage", "the design has no stage", hint);
    }
    let mut stages = Vec::new();
    let mut plates = Vec::new();
    for (index, (name, section)) in sections.iter().enumerate() {
        let start = if index == 0 {
            Start::Jack
        } else {
            Start::Plate
        };
        let plate = section.table("plate");
        stages.push(stage(name, section, &plate, rails, start));
        plates.push(plate);
    }
    check_transformer_stage(&plates);
    stages
}

fn stage(
    name: &str,
    section: &Section<'_>,
    plate: &Section<'_>,
    rails: &RailNames,
    start: Start,
) -> Stage {
    let connection = section.word("connection").map(|word| match word {
        "triode" => Connection::Triode,
        _ => Connection::Pentode,
    });
    let grid = section.table("grid");
    let fixed_bias = grid.quantity("fixed_bias").map(Volts);
    let elements = section.tables("input", MOST_ELEMENTS);
    let input = elements
        .iter()
        .map(|(name, element)| ladder::element(name, element))
        .collect();
    ladder::check(section, &grid, &elements, &input, start);
    Stage {
        name: name.to_owned(),
        tube: section.text("tube"),
        parallel: section.count("parallel"),
        connection,
        input,
        plate: Plate {
            rail: rails.find(plate, "rail"),
            resistor: plate_resistor(plate),
        },
        cathode: cathode(&section.table("cathode")),
        fixed_bias,
        screen: screen(section, connection, rails),
        strays: strays(&section.table("strays")),
    }
}

fn plate_resistor(plate: &Section<'_>) -> Option<Ohms> {
    if plate.is_zero("resistor") {
        let message =
            "a plate tied to its rail makes a cathode follower: those are not modeled yet";
        let hint = Some("without `resistor` the stage drives the output transformer".to_owned());
        plate.fault(Code::NotSupported, "resistor", message, hint);
        return None;
    }
    plate.quantity("resistor").map(Ohms)
}

/// Exactly the last stage drives the transformer, that is, has no plate resistor.
fn check_transformer_stage(plates: &[Section<'_>]) {
    let drives = |plate: &&Section<'_>| plate.is_present() && !plate.is_meant("resistor");
    let Some((last, before)) = plates.split_last() else {
        return;
    };
    if !last.is_present() {
        return;
    }
    let early: Vec<_> = before.iter().filter(drives).collect();
    let several = early.len() + usize::from(drives(&last)) > 1;
    for plate in &early {
        let message = "this stage has no plate resistor, but only the last stage drives the output transformer";
        let (code, message) = if several {
            (Code::SeveralTransformerStages, message.to_owned())
        } else {
            (
                Code::TransformerStageNotLast,
                format!("{message}, and the last stage does not"),
            )
        };
        plate.fault(
            code,
            "resistor",
            message,
            Some("give it a resistor such as 100k".to_owned()),
        );
    }
    if early.is_empty() && !drives(&last) {
        let message = "no stage drives the output transformer: every plate has a resistor";
        let hint = Some("leave the resistor of the last stage's plate out".to_owned());
        last.fault(Code::NoTransformerStage, "resistor", message, hint);
    }
}

fn cathode(section: &Section<'_>) -> Cathode {
    let resistor = section.quantity("resistor");
    let diode = ["diode_volts", "diode_resistance"]
        .into_iter()
        .find(|key| section.is_given(key));
    let bias = match (resistor, diode) {
        (Some(resistor), diode) => {
            if let Some(diode) = diode {
                section.conflict("resistor", diode, "a diode stands in place of the resistor");
                section.glance(&["diode_volts", "diode_resistance"]);
            }
            CathodeBias::Resistor(Ohms(resistor))
        }
        (None, Some(_)) => CathodeBias::Diode {
            volts: Volts(section.due(
                "diode_volts",
                Some("`diode_volts` and `diode_resistance` go together"),
            )),
            resistance: Ohms(section.due(
                "diode_resistance",
                Some("`diode_volts` and `diode_resistance` go together"),
            )),
        },
        (None, None) => {
            let hint = Some("give the cathode a `resistor` or `diode_volts`");
            section.without_effect("bypass", "there is nothing to bypass", hint);
            let hint = Some("a `resistor` without `bypass` is not bypassed");
            section.without_effect("unbypassed", "there is no bypassed part beside it", hint);
            CathodeBias::Grounded
        }
    };
    Cathode {
        bias,
        unbypassed: section.quantity("unbypassed").map(Ohms),
        bypass: section.quantity("bypass").map(Farads),
    }
}

/// What the tube needs is not known here; what the connection says is.
fn screen(
    stage: &Section<'_>,
    connection: Option<Connection>,
    rails: &RailNames,
) -> Option<Screen> {
    let section = stage.table("screen");
    let stated = stage.is_sound("connection").then_some(connection).flatten();
    if !section.is_present() {
        if stated == Some(Connection::Pentode) && !stage.is_given("screen") {
            let hint =
                Some("add [stage.screen] with its rail, or connection = \"triode\"".to_owned());
            stage.fault(
                Code::ScreenMissing,
                "screen",
                "a pentode connection needs a screen supply",
                hint,
            );
        }
        return None;
    }
    if stated == Some(Connection::Triode) {
        let hint = Some("leave it out, or say connection = \"pentode\"".to_owned());
        let message = "in triode connection the screen is tied to the plate";
        stage.fault(Code::ScreenWithoutEffect, "screen", message, hint);
    }
    let resistor = section.due("resistor", None);
    if resistor == 0.0 {
        let why = "the screen is tied to its rail";
        section.without_effect(
            "capacitor",
            why,
            Some("give it a `resistor`, or enlarge the rail's capacitor"),
        );
    }
    Some(Screen {
        rail: rails.find(&section, "rail"),
        resistor: (resistor > 0.0).then_some(Ohms(resistor)),
        capacitor: section.quantity("capacitor").map(Farads),
    })
}

fn strays(section: &Section<'_>) -> Strays {
    Strays {
        grid_cathode: Farads(section.due("grid_cathode", None)),
        grid_plate: Farads(section.due("grid_plate", None)),
        plate_cathode: Farads(section.due("plate_cathode", None)),
    }
}
