//! What a file says is what comes out.

use super::super::model::*;
use super::super::shipped;
use super::read;
use crate::diagnostic::Place;
use crate::units::{Farads, Henries, Hertz, Ohms, Volts, VoltsPeak, VoltsRms};

fn corner_room() -> &'static str {
    shipped()[0].1
}

#[track_caller]
fn with(overrides: &[&str]) -> Design {
    let overrides: Vec<String> = overrides.iter().map(|&set| set.to_owned()).collect();
    read(corner_room(), &overrides)
        .unwrap_or_else(|faults| panic!("{faults:#?}"))
        .design
}

#[track_caller]
fn replaced(old: &str, new: &str) -> Design {
    assert_eq!(corner_room().matches(old).count(), 1, "{old}");
    let text = corner_room().replace(old, new);
    read(&text, &[])
        .unwrap_or_else(|faults| panic!("{faults:#?}"))
        .design
}

#[test]
fn the_first_shipped_design_comes_out_as_it_is_written() {
    let design = with(&[]);
    assert_eq!(design.name, "Corner Room");
    assert_eq!(
        design.control.gain,
        Some(PotPlace {
            stage: 1,
            element: 1
        })
    );
    assert_eq!(design.control.settings, [2.0, 5.0, 10.0]);
    assert_eq!(design.control.test_level, VoltsPeak(0.2));
    assert_eq!(design.jack_source_resistance, Ohms(0.0));
    let volts = Volts(250.0);
    let resistance = Ohms(150.0);
    assert_eq!(design.supply.source, Source::Plain { volts, resistance });
    let feeds: Vec<_> = design.supply.rails.iter().map(|rail| rail.from).collect();
    let resistor = |rail, ohms| RailFeed::Resistor {
        rail,
        resistor: Ohms(ohms),
    };
    assert_eq!(
        feeds,
        [RailFeed::Source, resistor(0, 1e3), resistor(1, 10e3)]
    );
    let [first, second, power] = design.stages.as_slice() else {
        panic!("three stages")
    };
    assert_eq!(
        (first.tube.as_str(), first.parallel, first.connection),
        ("12AX7", 1, None)
    );
    assert_eq!(
        first.plate,
        Plate {
            rail: 2,
            resistor: Some(Ohms(100e3))
        }
    );
    assert_eq!(first.cathode.bias, CathodeBias::Resistor(Ohms(1500.0)));
    assert_eq!(first.cathode.bypass, Some(Farads(22e-6)));
    let leak = ElementKind::Shunt {
        branch: Branch::Resistive(Resistive::Fixed(Ohms(1e6))),
        to_bias: false,
    };
    assert_eq!(first.input[0].kind, leak);
    assert_eq!(
        second.input[0].kind,
        ElementKind::Series(Branch::Capacitor(Farads(22e-9)))
    );
    let ElementKind::Divider { pot, bright: None } = &second.input[1].kind else {
        panic!("a divider")
    };
    assert_eq!(
        (pot.resistance, pot.setting, pot.end_resistance),
        (Ohms(1e6), 5.0, Ohms(10.0))
    );
    assert_eq!(pot.taper, Taper::Audio { midpoint: 0.1 });
    assert_eq!(second.cathode.bypass, None);
    assert_eq!(
        power.plate,
        Plate {
            rail: 0,
            resistor: None
        }
    );
    assert_eq!(power.connection, Some(Connection::Pentode));
    let screen = power.screen.as_ref().expect("a screen");
    assert_eq!(
        (screen.rail, screen.resistor, screen.capacitor),
        (1, Some(Ohms(4700.0)), None)
    );
    assert_eq!(design.transformer.low_corner, Some(Hertz(70.0)));
    assert_eq!(design.transformer.corner_drop_db, 3.0);
    assert_eq!(design.transformer.primary_inductance, None);
    let speaker = design.load.loudspeaker.expect("a loudspeaker");
    assert_eq!(
        (speaker.coil, speaker.qes),
        (Coil::Inductance(Henries(0.5e-3)), 1.1)
    );
}

#[test]
fn rails_come_out_parents_first_whatever_their_order_in_the_file() {
    let (head, rest) = corner_room().split_once("[[supply.rail]]").expect("rails");
    let (main, rest) = rest.split_once("[[supply.rail]]").expect("three rails");
    let (screens, rest) = rest.split_once("[[supply.rail]]").expect("three rails");
    let (triodes, tail) = rest.split_once("[[stage]]").expect("stages");
    for order in [
        [triodes, screens, main],
        [screens, triodes, main],
        [triodes, main, screens],
    ] {
        let rails: String = order
            .iter()
            .map(|rail| format!("[[supply.rail]]{rail}"))
            .collect();
        let text = format!("{head}{rails}[[stage]]{tail}");
        let design = read(&text, &[])
            .unwrap_or_else(|faults| panic!("{faults:#?}"))
            .design;
        assert_eq!(design, with(&[]));
    }
}

#[test]
fn a_bare_number_stands_in_the_base_unit() {
    let design = replaced("volts = \"250V\"", "volts = 250");
    assert_eq!(design, with(&[]));
    let design = replaced("capacitor = \"47u\"", "capacitor = 47e-6");
    assert_eq!(design, with(&[]));
}

#[test]
fn an_override_replaces_a_value_and_says_where_it_stands() {
    let set = "stage.power.cathode.resistor=330R".to_owned();
    let reading = read(corner_room(), std::slice::from_ref(&set)).expect("valid");
    let power = &reading.design.stages[2];
    assert_eq!(power.cathode.bias, CathodeBias::Resistor(Ohms(330.0)));
    assert_eq!(
        reading.places.of("stage.power.cathode.resistor"),
        Place::Override(set)
    );
    let Place::Text(span) = reading.places.of("stage.power.cathode.bypass") else {
        panic!("a place in the file")
    };
    assert_eq!(&corner_room()[span], "\"47u\"");
    // What is not given stands where its table does.
    let Place::Text(span) = reading.places.of("stage.power.cathode.unbypassed") else {
        panic!("a place in the file")
    };
    assert_eq!(&corner_room()[span], "[stage.cathode]");
}

#[test]
fn overrides_add_absent_keys_and_tables() {
    let design = with(&[
        "stage.first.strays.grid_plate = 1p",
        "stage.second.input.volume.bright=\"120p\"",
        "stage.second.input.volume.setting=7.5",
        "jack.source_resistance=10k",
        "control.settings=[1, 4,]",
        "control.test_level=-17dBV",
        "stage.power.parallel=2",
        "transformer.taps=[8R, 16R]",
        "transformer.impedance_includes_copper=true",
        "supply.rail.main.capacitor=22u",
        "supply.rail.main.capacitor=33u",
    ]);
    assert_eq!(design.stages[0].strays.grid_plate, Farads(1e-12));
    let ElementKind::Divider { pot, bright } = &design.stages[1].input[1].kind else {
        panic!("a divider")
    };
    assert_eq!((pot.setting, *bright), (7.5, Some(Farads(120e-12))));
    assert_eq!(design.jack_source_resistance, Ohms(10e3));
    assert_eq!(design.control.settings, [1.0, 4.0]);
    assert!((design.control.test_level.si() - 0.199_76).abs() < 1e-5);
    assert_eq!(design.stages[2].parallel, 2);
    assert_eq!(design.transformer.taps, [Ohms(8.0), Ohms(16.0)]);
    assert!(design.transformer.impedance_includes_copper);
    assert_eq!(
        design.supply.rails[0].capacitor,
        Farads(33e-6),
        "the later override holds"
    );
}

#[test]
fn a_rectified_winding_is_read_with_each_rectifier() {
    for (word, rectifier) in [
        ("\"silicon-bridge\"", Rectifier::SiliconBridge),
        ("\"silicon-full-wave\"", Rectifier::SiliconFullWave),
        (
            "\"tube-full-wave\"\nrectifier_perveance = \"1.2m\"",
            Rectifier::TubeFullWave { perveance: 1.2e-3 },
        ),
    ] {
        let design = replaced(
            "volts = \"250V\"\nresistance = \"150R\"",
            &format!("secondary_rms = \"230V\"\nwinding_resistance = \"110R\"\nrectifier = {word}"),
        );
        let expected = Source::Rectified {
            secondary: VoltsRms(230.0),
            winding_resistance: Ohms(110.0),
            rectifier,
        };
        assert_eq!(design.supply.source, expected);
    }
}

#[test]
fn branches_with_two_parts_and_rheostats_are_read() {
    let old = "name = \"stopper\"\n  place = \"series\"\n  resistor = \"22k\"";
    let branch = |text: &str| {
        let design = replaced(old, &format!("name = \"stopper\"\n  {text}"));
        design.stages[2].input[2].kind.clone()
    };
    let fixed = Resistive::Fixed(Ohms(4700.0));
    let capacitor = Farads(1e-9);
    assert_eq!(
        branch("place = \"series\"\nresistor = \"4k7\"\ncapacitor = \"1n\"\nwired = \"parallel\""),
        ElementKind::Series(Branch::InParallel(fixed.clone(), capacitor))
    );
    assert_eq!(
        branch("place = \"shunt\"\nresistor = \"4k7\"\ncapacitor = \"1n\"\nwired = \"series\""),
        ElementKind::Shunt {
            branch: Branch::InSeries(fixed, capacitor),
            to_bias: false
        }
    );
    let rheostat = Resistive::Rheostat(Pot {
        resistance: Ohms(250e3),
        taper: Taper::ReverseAudio { midpoint: 0.15 },
        setting: 3.0,
        end_resistance: Ohms(100.0),
    });
    let text = "place = \"shunt\"\npot = \"250k\"\ntaper = \"reverse-audio\"\nmidpoint = \"15%\"\nsetting = 3
        end_resistance = \"100R\"\ncapacitor = \"1n\"\nwired = \"series\"";
    let expected = ElementKind::Shunt {
        branch: Branch::InSeries(rheostat, capacitor),
        to_bias: false,
    };
    assert_eq!(branch(text), expected);
}

/// 1/Qts = 1/Qms + 1/Qes, worked by hand: Qms 6, Qts 1.2 give Qes 1.5.
#[test]
fn the_electrical_quality_factor_follows_from_the_total() {
    let design = replaced("qms = 7.0\nqes = 1.1", "qms = 6.0\nqts = 1.2");
    let speaker = design.load.loudspeaker.expect("a loudspeaker");
    assert!((speaker.qes - 1.5).abs() < 1e-12, "{}", speaker.qes);
}

#[test]
fn a_gain_control_may_be_named_with_its_stage() {
    assert_eq!(
        with(&["control.gain=second/volume"]).control,
        with(&[]).control
    );
}

#[test]
fn without_a_gain_control_there_is_one_setting() {
    let control = replaced("gain = \"volume\"\nsettings = [2, 5, 10]\n", "").control;
    assert_eq!((control.gain, control.settings.len()), (None, 1));
}

#[test]
fn fixed_bias_reaches_the_grid_through_its_leak() {
    let text = corner_room()
        .replace(
            "resistor = \"470k\"",
            "resistor = \"220k\"\n  to = \"bias\"",
        )
        .replace(
            "  [stage.screen]",
            "  [stage.grid]\n  fixed_bias = \"-9V\"\n  [stage.screen]",
        );
    let design = read(&text, &[])
        .unwrap_or_else(|faults| panic!("{faults:#?}"))
        .design;
    assert_eq!(design.stages[2].fixed_bias, Some(Volts(-9.0)));
    assert!(matches!(
        design.stages[2].input[1].kind,
        ElementKind::Shunt { to_bias: true, .. }
    ));
}
