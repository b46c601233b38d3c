//! What a written value may be of, and how each is spelled.

/// Dimension of a written value, with the scale a bare number stands on.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Unit {
    /// Direct or instantaneous voltage, in volts.
    Volts,
    /// Peak voltage of a sine, in volts; also read from dBV and dBu, which are RMS scales.
    VoltsPeak,
    /// RMS voltage, in volts.
    VoltsRms,
    /// Current, in amperes.
    Amperes,
    /// Resistance or impedance magnitude, in ohms.
    Ohms,
    /// Capacitance, in farads.
    Farads,
    /// Inductance, in henries.
    Henries,
    /// Frequency, in hertz.
    Hertz,
    /// Power, in watts.
    Watts,
    /// Ratio of levels, in decibels.
    Decibels,
    /// Share of a whole, in percent.
    Percent,
    /// Plate current over plate volts to the power 3/2, in A/V^1.5.
    Perveance,
    /// A number without a unit.
    Plain,
}

impl Unit {
    /// Every unit, in order.
    pub const ALL: &'static [Unit] = &[
        Unit::Volts,
        Unit::VoltsPeak,
        Unit::VoltsRms,
        Unit::Amperes,
        Unit::Ohms,
        Unit::Farads,
        Unit::Henries,
        Unit::Hertz,
        Unit::Watts,
        Unit::Decibels,
        Unit::Percent,
        Unit::Perveance,
        Unit::Plain,
    ];

    /// The dimension with its article, for sentences: "a resistance".
    pub fn noun(self) -> &'static str {
        match self {
            Unit::Volts => "a voltage",
            Unit::VoltsPeak => "a peak level",
            Unit::VoltsRms => "an RMS voltage",
            Unit::Amperes => "a current",
            Unit::Ohms => "a resistance",
            Unit::Farads => "a capacitance",
            Unit::Henries => "an inductance",
            Unit::Hertz => "a frequency",
            Unit::Watts => "a power",
            Unit::Decibels => "a ratio in decibels",
            Unit::Percent => "a percentage",
            Unit::Perveance => "a perveance",
            Unit::Plain => "a plain number",
        }
    }

    /// Symbol of the base unit, empty for a plain number.
    pub fn symbol(self) -> &'static str {
        match self {
            Unit::Volts | Unit::VoltsPeak | Unit::VoltsRms => "V",
            Unit::Amperes => "A",
            Unit::Ohms => "Ω",
            Unit::Farads => "F",
            Unit::Henries => "H",
            Unit::Hertz => "Hz",
            Unit::Watts => "W",
            Unit::Decibels => "dB",
            Unit::Percent => "%",
            Unit::Perveance => "A/V^1.5",
            Unit::Plain => "",
        }
    }

    /// Values as people write them, each readable as this unit.
    pub fn examples(self) -> &'static [&'static str] {
        match self {
            Unit::Volts => &["250V", "-14", "1.8V"],
            Unit::VoltsPeak => &["200mV", "0.2V", "-17dBV", "-15dBu"],
            Unit::VoltsRms => &["230V", "6.3"],
            Unit::Amperes => &["35mA", "0.035"],
            Unit::Ohms => &["470R", "4K7", "4.7k", "1M"],
            Unit::Farads => &["22n", "4n7", "500p", "0.022u", "47µF"],
            Unit::Henries => &["10H", "60mH", "0.4m"],
            Unit::Hertz => &["80Hz", "15kHz", "80"],
            Unit::Watts => &["5W", "500mW", "0.5"],
            Unit::Decibels => &["3dB", "1"],
            Unit::Percent => &["10%", "10"],
            Unit::Perveance => &["1.2e-3", "1.2mA/V^1.5"],
            Unit::Plain => &["0.65", "1", "1e-3"],
        }
    }

    /// Value in engineering writing, with its symbol where there is one.
    pub fn format(self, value: f64) -> String {
        match self {
            Unit::Plain => super::notation::significant(value),
            Unit::Percent | Unit::Decibels => {
                format!("{} {}", super::notation::significant(value), self.symbol())
            }
            _ => super::notation::engineering(value, self.symbol()),
        }
    }

    /// Spellings of the base unit that may follow a number or a prefix.
    pub(super) fn symbols(self) -> &'static [&'static str] {
        match self {
            Unit::Volts => &["V"],
            Unit::VoltsPeak => &["V", "Vp", "Vpk", "V peak"],
            Unit::VoltsRms => &["V", "Vrms", "V rms", "V RMS"],
            Unit::Amperes => &["A"],
            // U+03A9 is the letter omega, U+2126 the ohm sign: keyboards give either.
            Unit::Ohms => &["\u{3a9}", "\u{2126}", "ohm", "ohms"],
            Unit::Farads => &["F"],
            Unit::Henries => &["H"],
            Unit::Hertz => &["Hz"],
            Unit::Watts => &["W"],
            Unit::Decibels => &["dB"],
            Unit::Percent => &["%"],
            Unit::Perveance => &["A/V^1.5", "A/V1.5"],
            Unit::Plain => &[],
        }
    }

    /// Prefixes this unit is written with, and what each multiplies by.
    pub(super) fn prefixes(self) -> &'static [(&'static str, f64)] {
        // `R` holds the decimal place of a resistance (IEC 60062); U+00B5 is the micro sign, U+03BC the letter mu.
        match self {
            Unit::Ohms => &[
                ("R", 1.0),
                ("m", 1e-3),
                ("k", 1e3),
                ("K", 1e3),
                ("M", 1e6),
                ("G", 1e9),
            ],
            Unit::Farads => &[
                ("p", 1e-12),
                ("n", 1e-9),
                ("u", 1e-6),
                ("\u{b5}", 1e-6),
                ("\u{3bc}", 1e-6),
                ("m", 1e-3),
            ],
            Unit::Henries | Unit::Amperes => &[
                ("n", 1e-9),
                ("u", 1e-6),
                ("\u{b5}", 1e-6),
                ("\u{3bc}", 1e-6),
                ("m", 1e-3),
            ],
            Unit::Volts | Unit::VoltsPeak | Unit::VoltsRms => &[
                ("u", 1e-6),
                ("\u{b5}", 1e-6),
                ("\u{3bc}", 1e-6),
                ("m", 1e-3),
                ("k", 1e3),
            ],
            Unit::Hertz => &[("m", 1e-3), ("k", 1e3), ("K", 1e3), ("M", 1e6)],
            Unit::Watts => &[("m", 1e-3), ("k", 1e3)],
            Unit::Perveance => &[
                ("u", 1e-6),
                ("\u{b5}", 1e-6),
                ("\u{3bc}", 1e-6),
                ("m", 1e-3),
            ],
            Unit::Decibels | Unit::Percent | Unit::Plain => &[],
        }
    }
}
