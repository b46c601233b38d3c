//! One amplifier on paper, in the words of the design file.

use crate::units::{Amperes, Farads, Henries, Hertz, Ohms, Volts, VoltsPeak, VoltsRms, Watts};

/// One amplifier on paper: supply, chain of stages, output transformer, load.
#[derive(Clone, Debug, PartialEq)]
pub struct Design {
    pub name: String,
    pub description: String,
    pub control: Control,
    /// Resistance of the source at the jack.
    pub jack_source_resistance: Ohms,
    pub supply: Supply,
    /// In signal order; the last one drives the output transformer.
    pub stages: Vec<Stage>,
    pub transformer: Transformer,
    pub load: Load,
}

/// What the player turns, and where the headline figures stand.
#[derive(Clone, Debug, PartialEq)]
pub struct Control {
    pub gain: Option<PotPlace>,
    /// Gain settings from 0 to 10.
    pub settings: Vec<f64>,
    pub test_level: VoltsPeak,
}

/// A pot in a stage's input ladder, by index.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct PotPlace {
    pub stage: usize,
    pub element: usize,
}

#[derive(Clone, Debug, PartialEq)]
pub struct Supply {
    pub source: Source,
    /// Every rail comes after the one it is fed from.
    pub rails: Vec<Rail>,
}

#[derive(Clone, Debug, PartialEq)]
pub enum Source {
    /// Open-circuit volts behind a resistance.
    Plain { volts: Volts, resistance: Ohms },
    /// Capacitor-input rectifier, full wave.
    Rectified {
        secondary: VoltsRms,
        winding_resistance: Ohms,
        rectifier: Rectifier,
    },
}

#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Rectifier {
    SiliconBridge,
    SiliconFullWave,
    /// Two plates, each with this perveance in A/V^1.5.
    TubeFullWave {
        perveance: f64,
    },
}

#[derive(Clone, Debug, PartialEq)]
pub struct Rail {
    pub name: String,
    pub from: RailFeed,
    /// Filter capacitor to ground.
    pub capacitor: Farads,
}

#[derive(Clone, Copy, Debug, PartialEq)]
pub enum RailFeed {
    Source,
    Resistor {
        rail: usize,
        resistor: Ohms,
    },
    Choke {
        rail: usize,
        inductance: Henries,
        resistance: Ohms,
    },
}

#[derive(Clone, Debug, PartialEq)]
pub struct Stage {
    pub name: String,
    /// Catalog name or path of a tube file.
    pub tube: String,
    pub parallel: u32,
    /// `None`: as the tube is.
    pub connection: Option<Connection>,
    /// From the jack or the previous plate to this grid.
    pub input: Vec<Element>,
    pub plate: Plate,
    pub cathode: Cathode,
    pub fixed_bias: Option<Volts>,
    pub screen: Option<Screen>,
    pub strays: Strays,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Connection {
    Pentode,
    Triode,
}

#[derive(Clone, Debug, PartialEq)]
pub struct Element {
    pub name: String,
    pub kind: ElementKind,
}

#[derive(Clone, Debug, PartialEq)]
pub enum ElementKind {
    Series(Branch),
    Shunt { branch: Branch, to_bias: bool },
    Divider { pot: Pot, bright: Option<Farads> },
}

/// A resistor (or rheostat), a capacitor, or both.
#[derive(Clone, Debug, PartialEq)]
pub enum Branch {
    Resistive(Resistive),
    Capacitor(Farads),
    InSeries(Resistive, Farads),
    InParallel(Resistive, Farads),
}

#[derive(Clone, Debug, PartialEq)]
pub enum Resistive {
    Fixed(Ohms),
    Rheostat(Pot),
}

#[derive(Clone, Debug, PartialEq)]
pub struct Pot {
    pub resistance: Ohms,
    pub taper: Taper,
    /// From 0 to 10.
    pub setting: f64,
    /// Left over at each end.
    pub end_resistance: Ohms,
}

/// Fraction of the track between the counterclockwise end and the wiper.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Taper {
    Linear,
    /// Two straight pieces that meet at this fraction at mid rotation.
    Audio {
        midpoint: f64,
    },
    /// Mirror image of [`Taper::Audio`] with the same `midpoint`.
    ReverseAudio {
        midpoint: f64,
    },
}

#[derive(Clone, Debug, PartialEq)]
pub struct Plate {
    pub rail: usize,
    /// `None`: the stage drives the output transformer.
    pub resistor: Option<Ohms>,
}

#[derive(Clone, Debug, PartialEq)]
pub struct Cathode {
    pub bias: CathodeBias,
    /// Between the cathode and the bypassed part.
    pub unbypassed: Option<Ohms>,
    /// Across the resistor or the diode.
    pub bypass: Option<Farads>,
}

#[derive(Clone, Copy, Debug, PartialEq)]
pub enum CathodeBias {
    Grounded,
    Resistor(Ohms),
    Diode { volts: Volts, resistance: Ohms },
}

#[derive(Clone, Debug, PartialEq)]
pub struct Screen {
    pub rail: usize,
    /// `None`: tied to the rail.
    pub resistor: Option<Ohms>,
    pub capacitor: Option<Farads>,
}

/// Capacitances beyond the tube's own.
#[derive(Clone, Copy, Debug, PartialEq, Default)]
pub struct Strays {
    pub grid_cathode: Farads,
    pub grid_plate: Farads,
    pub plate_cathode: Farads,
}

#[derive(Clone, Debug, PartialEq)]
pub struct Transformer {
    /// Label impedance of the primary with the rated load on the tap.
    pub primary: Ohms,
    /// Rated load of the tap in use.
    pub secondary: Ohms,
    pub taps: Vec<Ohms>,
    pub rated_power: Option<Watts>,
    pub low_corner: Option<Hertz>,
    pub high_corner: Option<Hertz>,
    /// Fall at the label's corners, in dB: 3 or 1.
    pub corner_drop_db: f64,
    /// Generator impedance the label's band was taken with.
    pub corner_source: Option<Ohms>,
    pub primary_inductance: Option<Henries>,
    pub leakage_inductance: Option<Henries>,
    pub shunt_capacitance: Option<Farads>,
    pub primary_resistance: Option<Ohms>,
    pub secondary_resistance: Option<Ohms>,
    pub core_loss: Option<Ohms>,
    pub impedance_includes_copper: bool,
    pub dc_rated: Option<Amperes>,
}

#[derive(Clone, Debug, PartialEq)]
pub struct Load {
    pub resistance: Ohms,
    pub loudspeaker: Option<Loudspeaker>,
}

#[derive(Clone, Debug, PartialEq)]
pub struct Loudspeaker {
    pub re: Ohms,
    pub coil: Coil,
    pub fs: Hertz,
    pub qms: f64,
    pub qes: f64,
}

#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Coil {
    Inductance(Henries),
    /// Impedance magnitude K·ω^n, given by its value at 1 kHz.
    Lossy {
        at_1khz: Ohms,
        exponent: f64,
    },
}
