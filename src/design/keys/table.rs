//! The rows of the table of keys.
//!
//! Ranges are chosen: wide enough for any small amplifier, narrow enough to catch a slipped prefix.

use super::{Key, Kind, Need};
use crate::units::Unit;

const fn key(path: &'static str, kind: Kind, help: &'static str, example: &'static str) -> Key {
    Key {
        path,
        kind,
        need: Need::Optional,
        default: None,
        range: None,
        help,
        example,
    }
}

const fn table(path: &'static str, help: &'static str) -> Key {
    key(path, Kind::Table, help, "")
}

const fn tables(path: &'static str, help: &'static str) -> Key {
    key(path, Kind::Tables, help, "").required()
}

const fn quantity(
    path: &'static str,
    unit: Unit,
    range: (f64, f64),
    help: &'static str,
    example: &'static str,
) -> Key {
    key(path, Kind::Quantity(unit), help, example).range(range)
}

impl Key {
    const fn required(mut self) -> Key {
        self.need = Need::Required;
        self
    }

    const fn depends(mut self, on: &'static str) -> Key {
        self.need = Need::Depends(on);
        self
    }

    const fn default(mut self, text: &'static str) -> Key {
        self.default = Some(text);
        self
    }

    const fn range(mut self, range: (f64, f64)) -> Key {
        self.range = Some(range);
        self
    }
}

const RESISTOR: (f64, f64) = (0.1, 100e6);
const CAPACITOR: (f64, f64) = (0.1e-12, 1e-3);
const FILTER: (f64, f64) = (0.1e-6, 10e-3);
const ROTATION: (f64, f64) = (0.0, 10.0);

pub(super) const KEYS: &[Key] = &[
    key("format", Kind::Count, "version of the design format", "1").required(),
    key("name", Kind::Text, "what the amplifier is called", "Corner Room").required(),
    key("description", Kind::Text, "one sentence on what it is for", "Invented example").default(""),
    // control
    table("control", "what the player turns, and where the headline figures stand"),
    key("control.gain", Kind::Text, "the pot that is the gain control: its name, or stage/name where several pots share it", "volume"),
    key("control.settings", Kind::Quantities(Unit::Plain), "positions of the gain control that are rendered and measured", "[2, 5, 10]")
        .range(ROTATION)
        .default("[2, 5, 10]"),
    quantity("control.test_level", Unit::VoltsPeak, (1e-4, 100.0), "peak volts at the jack at which the headline figures stand", "200mV")
        .default("200mV"),
    // jack
    table("jack", "what the guitar signal comes from"),
    quantity("jack.source_resistance", Unit::Ohms, (0.0, 1e6), "resistance of the source at the jack", "10k").default("0R"),
    // supply
    table("supply", "where the direct current comes from: `volts` behind `resistance`, or a transformer winding and its rectifier").required(),
    quantity("supply.volts", Unit::Volts, (5.0, 1000.0), "open-circuit direct voltage", "285V")
        .depends("either this with `resistance`, or `secondary_rms` and its companions"),
    quantity("supply.resistance", Unit::Ohms, (1.0, 100e3), "resistance in series with `volts`", "150R").depends("required with `volts`"),
    quantity("supply.secondary_rms", Unit::VoltsRms, (5.0, 1000.0), "winding volts RMS, of each half where the winding is center-tapped", "230V")
        .depends("either `volts`, or this with `winding_resistance` and `rectifier`"),
    quantity("supply.winding_resistance", Unit::Ohms, (0.1, 10e3), "resistance in the conduction path: secondary (one half where center-tapped) and reflected primary", "110R")
        .depends("required with `secondary_rms`"),
    key("supply.rectifier", Kind::Word(&["silicon-bridge", "silicon-full-wave", "tube-full-wave"]), "how the winding is rectified", "silicon-bridge")
        .depends("required with `secondary_rms`"),
    quantity("supply.rectifier_perveance", Unit::Perveance, (1e-5, 0.1), "plate current over volts to the power 3/2, each plate", "1.2e-3")
        .depends("required with a tube rectifier"),
    // rails
    tables("supply.rail", "a node of the supply with its filter capacitor; exactly one is fed from the source"),
    key("supply.rail.*.name", Kind::Name, "what stages call it", "main").required(),
    key("supply.rail.*.from", Kind::Text, "\"source\", or the rail it is fed from", "source").required(),
    quantity("supply.rail.*.resistor", Unit::Ohms, RESISTOR, "dropping resistor from the rail before", "1k")
        .depends("this or `choke`, unless fed from the source"),
    quantity("supply.rail.*.choke", Unit::Henries, (1e-3, 1000.0), "inductance from the rail before", "8H")
        .depends("this or `resistor`, unless fed from the source"),
    quantity("supply.rail.*.choke_resistance", Unit::Ohms, (0.1, 10e3), "winding resistance of the choke", "150R").depends("required with `choke`"),
    quantity("supply.rail.*.capacitor", Unit::Farads, FILTER, "filter capacitor to ground", "47u").required(),
    // stages
    tables("stage", "a tube with what hangs on it; in signal order, the last one drives the output transformer"),
    key("stage.*.name", Kind::Name, "what paths call it", "first").required(),
    key("stage.*.tube", Kind::Text, "name in the catalog of tubes, or path of a tube file ending in .toml, relative to this file", "12AX7").required(),
    key("stage.*.parallel", Kind::Count, "sections in parallel", "1").range((1.0, 4.0)).default("1"),
    key("stage.*.connection", Kind::Word(&["pentode", "triode"]), "how a pentode is connected; absent: as the tube is", "triode"),
    // input ladder
    key("stage.*.input", Kind::Tables, "an element between the jack or the plate before and this grid, in order", ""),
    key("stage.*.input.*.name", Kind::Name, "what paths call it", "coupling").required(),
    key("stage.*.input.*.place", Kind::Word(&["series", "shunt", "divider"]), "in the signal's way, from it to ground, or a pot that divides it", "series")
        .required(),
    quantity("stage.*.input.*.resistor", Unit::Ohms, RESISTOR, "fixed resistor of the branch", "68k").depends("a branch has a resistor, a pot, a capacitor, or one of the first two and a capacitor"),
    quantity("stage.*.input.*.capacitor", Unit::Farads, CAPACITOR, "capacitor of the branch", "22n").depends("a branch has a resistor, a pot, a capacitor, or one of the first two and a capacitor"),
    quantity("stage.*.input.*.pot", Unit::Ohms, (100.0, 100e6), "track of the pot; a rheostat in a series or shunt branch, growing with its setting", "1M")
        .depends("required in a divider"),
    key("stage.*.input.*.taper", Kind::Word(&["linear", "audio", "reverse-audio"]), "how the track's resistance follows rotation", "audio").default("linear"),
    quantity("stage.*.input.*.midpoint", Unit::Percent, (1.0, 50.0), "percent of the track at mid rotation of an audio taper (a reverse-audio one has the rest of 100)", "10")
        .default("10"),
    quantity("stage.*.input.*.setting", Unit::Plain, ROTATION, "rotation of the pot, 0 to 10; the gain settings replace it on the gain control", "5").default("5"),
    quantity("stage.*.input.*.end_resistance", Unit::Ohms, (0.1, 10e3), "what is left at each end of the track", "10R").default("10R"),
    quantity("stage.*.input.*.bright", Unit::Farads, (1e-12, 1e-6), "capacitor from the top of a divider to its wiper", "120p"),
    key("stage.*.input.*.wired", Kind::Word(&["series", "parallel"]), "how the two parts of a branch lie", "series").depends("required in a branch with two parts"),
    key("stage.*.input.*.to", Kind::Word(&["ground", "bias"]), "where a shunt ends", "bias").default("ground"),
    // plate
    table("stage.*.plate", "what the plate hangs on").required(),
    key("stage.*.plate.rail", Kind::Text, "rail that feeds the plate", "main").required(),
    quantity("stage.*.plate.resistor", Unit::Ohms, (100.0, 10e6), "plate load resistor; absent: the stage drives the output transformer", "100k"),
    // cathode
    table("stage.*.cathode", "what the cathode stands on; absent: ground"),
    quantity("stage.*.cathode.resistor", Unit::Ohms, (0.1, 1e6), "cathode resistor", "1k5"),
    quantity("stage.*.cathode.bypass", Unit::Farads, (1e-9, 100e-3), "capacitor across the resistor or the diode", "25u"),
    quantity("stage.*.cathode.unbypassed", Unit::Ohms, (0.1, 1e6), "further resistor next to the cathode that the bypass leaves alone", "100R"),
    quantity("stage.*.cathode.diode_volts", Unit::Volts, (0.1, 100.0), "forward volts of a diode or LED instead of the resistor", "1.8V"),
    quantity("stage.*.cathode.diode_resistance", Unit::Ohms, (0.01, 10e3), "slope resistance of that diode", "12R").depends("required with `diode_volts`"),
    // grid
    table("stage.*.grid", "fixed bias"),
    quantity("stage.*.grid.fixed_bias", Unit::Volts, (-300.0, -0.1), "negative volts that a shunt with to = \"bias\" brings to the grid", "-14V"),
    // screen
    table("stage.*.screen", "screen supply of a pentode in pentode connection").depends("required for a pentode in pentode connection"),
    key("stage.*.screen.rail", Kind::Text, "rail that feeds the screen", "screens").required(),
    quantity("stage.*.screen.resistor", Unit::Ohms, (0.0, 10e6), "screen resistor; 0: tied to the rail", "470R").default("0R"),
    quantity("stage.*.screen.capacitor", Unit::Farads, (1e-12, 1e-3), "capacitor from the screen to ground", "10u"),
    // strays
    table("stage.*.strays", "capacitances beyond the tube's own"),
    quantity("stage.*.strays.grid_cathode", Unit::Farads, (0.0, 1e-9), "between grid and cathode", "2p").default("0p"),
    quantity("stage.*.strays.grid_plate", Unit::Farads, (0.0, 1e-9), "between grid and plate", "0.5p").default("0p"),
    quantity("stage.*.strays.plate_cathode", Unit::Farads, (0.0, 1e-9), "between plate and cathode", "3p").default("0p"),
    // transformer
    table("transformer", "the output transformer, by its label or by what was measured").required(),
    quantity("transformer.primary", Unit::Ohms, (100.0, 100e3), "impedance of the primary with the rated load on the tap in use", "5k").required(),
    quantity("transformer.secondary", Unit::Ohms, (0.5, 2e3), "rated load of the tap in use", "8R").required(),
    key("transformer.taps", Kind::Quantities(Unit::Ohms), "rated loads of all taps", "[\"4R\", \"8R\"]").range((0.5, 2e3)),
    quantity("transformer.rated_power", Unit::Watts, (0.01, 500.0), "power on the label", "8W"),
    quantity("transformer.low_corner", Unit::Hertz, (1.0, 2e3), "lower corner of the label's band", "70Hz").depends("required unless `primary_inductance` is given"),
    quantity("transformer.high_corner", Unit::Hertz, (1e3, 1e6), "upper corner of the label's band", "15kHz")
        .depends("required unless both `leakage_inductance` and `shunt_capacitance` are given"),
    quantity("transformer.corner_drop", Unit::Decibels, (1.0, 3.0), "fall at the corners: 3 dB or 1 dB", "3dB").default("3dB"),
    quantity("transformer.corner_source", Unit::Ohms, (1.0, 1e6), "generator impedance that the band was taken with; absent: the primary impedance is assumed", "5k"),
    quantity("transformer.primary_inductance", Unit::Henries, (0.01, 10e3), "measured; used instead of the lower corner", "12H"),
    quantity("transformer.leakage_inductance", Unit::Henries, (1e-6, 10.0), "measured total, referred to the primary", "60mH"),
    quantity("transformer.shunt_capacitance", Unit::Farads, (1e-12, 1e-6), "measured, referred to the primary", "400p"),
    quantity("transformer.primary_resistance", Unit::Ohms, (0.0, 10e3), "copper of the primary; absent: 4 % of `primary`", "300R"),
    quantity("transformer.secondary_resistance", Unit::Ohms, (0.0, 200.0), "copper of the secondary; absent: 4 % of `secondary`", "0.4R"),
    quantity("transformer.core_loss", Unit::Ohms, (1e3, 1e9), "resistance across the magnetizing branch; absent: 20 times `primary`", "100k"),
    key("transformer.impedance_includes_copper", Kind::Flag, "whether the label's impedances include the copper", "true").default("false"),
    quantity("transformer.dc_rated", Unit::Amperes, (1e-3, 2.0), "direct current that the primary may carry", "60mA"),
    // load
    table("load", "what hangs on the secondary").required(),
    quantity("load.resistance", Unit::Ohms, (0.5, 2e3), "rated resistance, on which every quoted figure stands", "8R").required(),
    table("load.loudspeaker", "the loudspeaker; renders use it instead of the resistance"),
    quantity("load.loudspeaker.re", Unit::Ohms, (0.1, 2e3), "resistance of the voice coil", "6.4R").required(),
    quantity("load.loudspeaker.le", Unit::Henries, (1e-6, 0.5), "inductance of the voice coil", "0.4mH").depends("this, or `coil_at_1khz` with `coil_exponent`"),
    quantity("load.loudspeaker.coil_at_1khz", Unit::Ohms, (0.01, 2e3), "impedance magnitude of a lossy coil at 1 kHz", "4R").depends("this with `coil_exponent`, or `le`"),
    quantity("load.loudspeaker.coil_exponent", Unit::Plain, (0.1, 1.0), "power of frequency that the lossy coil's impedance follows; 1: lossless", "0.65")
        .depends("required with `coil_at_1khz`"),
    quantity("load.loudspeaker.fs", Unit::Hertz, (10.0, 2e3), "resonance frequency", "95Hz").required(),
    quantity("load.loudspeaker.qms", Unit::Plain, (0.1, 100.0), "mechanical quality factor at resonance", "7").required(),
    quantity("load.loudspeaker.qes", Unit::Plain, (0.05, 100.0), "electrical quality factor at resonance", "1.1").depends("this or `qts`"),
    quantity("load.loudspeaker.qts", Unit::Plain, (0.05, 100.0), "total quality factor at resonance, below `qms`", "0.95").depends("this or `qes`"),
];

/// Table's path (empty: anywhere), words that people may write there, and why they are refused.
pub(super) const NOT_SUPPORTED: &[(&str, &[&str], &str)] = &[
    (
        "",
        &[
            "feedback",
            "negative_feedback",
            "global_feedback",
            "local_feedback",
        ],
        "feedback loops are not modeled yet",
    ),
    (
        "",
        &["presence", "resonance"],
        "controls inside a feedback loop are not modeled yet",
    ),
    (
        "",
        &["cathode_follower", "follower"],
        "cathode followers are not modeled yet",
    ),
    (
        "",
        &[
            "ultralinear",
            "ultra_linear",
            "screen_tap",
            "ultralinear-tap",
        ],
        "screens fed from a tap of the primary are not modeled yet",
    ),
    (
        "",
        &["push_pull", "phase_inverter", "phase_splitter"],
        "push-pull output stages are not modeled: the output stage is single-ended",
    ),
    (
        "",
        &["tremolo", "vibrato", "reverb", "effects_loop"],
        "effects are not modeled",
    ),
    (
        "",
        &["tone_stack"],
        "networks with more than one signal path are not modeled yet; treble cuts and one-knob controls are input elements",
    ),
    (
        "",
        &["channel", "mixer"],
        "several input channels are not modeled yet",
    ),
    (
        "",
        &["saturation", "core_saturation"],
        "saturation of the core is not modeled yet",
    ),
    (
        "stage.*.plate",
        &["choke", "inductor"],
        "choke-loaded plates are not modeled yet",
    ),
    (
        "supply.rectifier",
        &[
            "half-wave",
            "silicon-half-wave",
            "tube-half-wave",
            "voltage-doubler",
            "doubler",
            "tube-bridge",
        ],
        "only full-wave rectifiers are modeled",
    ),
    (
        "supply",
        &["input_choke", "choke_input", "choke"],
        "choke-input filters are not modeled; a choke may feed a rail from another rail",
    ),
    (
        "supply",
        &["regulator", "regulated"],
        "regulated supplies are not modeled; give `volts` with a small `resistance`",
    ),
];
