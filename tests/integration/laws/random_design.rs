//! Designs nobody would draw: every value from its row of the table of keys.

use std::fmt::Write;

use forehear::design::keys::{Kind, key};
use forehear::signal::SplitMix64;
use forehear::units::notation;

const TRIODES: [&str; 4] = ["12AX7", "12AT7", "12AU7", "6SN7"];
const PENTODES: [&str; 3] = ["EL84", "6V6", "6L6GC"];

/// Decades around the table's example within which the tamer values lie.
const NEAR_DECADES: f64 = 1.0;
/// Lowest share of the highest value that is drawn where a range begins at zero.
const NEARLY_ZERO: f64 = 1e-6;

struct Draw {
    random: SplitMix64,
    /// Share of values drawn from the whole range; the others lie near the example.
    wild: f64,
    text: String,
}

impl Draw {
    fn chance(&mut self, share: f64) -> bool {
        self.random.uniform() < share
    }

    fn below(&mut self, count: usize) -> usize {
        (self.random.uniform() * count as f64) as usize
    }

    fn pick<'a>(&mut self, words: &[&'a str]) -> &'a str {
        words[self.below(words.len())]
    }

    /// A value of the row `path`, even in its logarithm.
    fn value(&mut self, path: &str) -> f64 {
        let row = key(path).unwrap_or_else(|| panic!("{path} is a key"));
        let (low, high) = row.range.expect("a quantity has a range");
        let Kind::Quantity(unit) = row.kind else {
            panic!("{path} is a quantity");
        };
        if low < 0.0 {
            // Negative volts: even in the logarithm of their size.
            return -even(&mut self.random, -high, -low);
        }
        if low == 0.0 && self.chance(0.2) {
            return 0.0;
        }
        let floor = if low > 0.0 { low } else { NEARLY_ZERO * high };
        if self.random.uniform() < self.wild {
            return even(&mut self.random, floor, high);
        }
        let example = notation::parse(row.example, unit).expect("the example is valid");
        let reach = 10f64.powf(NEAR_DECADES);
        let example = example.max(floor);
        even(
            &mut self.random,
            (example / reach).max(floor),
            (example * reach).min(high),
        )
    }

    fn line(&mut self, name: &str, path: &str) {
        let value = self.value(path);
        writeln!(self.text, "{name} = {value:e}").expect("text grows");
    }

    fn maybe(&mut self, share: f64, name: &str, path: &str) {
        if self.chance(share) {
            self.line(name, path);
        }
    }

    fn raw(&mut self, line: &str) {
        self.text.push_str(line);
        self.text.push('\n');
    }

    fn word(&mut self, name: &str, word: &str) {
        writeln!(self.text, "{name} = \"{word}\"").expect("text grows");
    }

    fn supply(&mut self, rails: usize) {
        self.raw("[supply]");
        if self.chance(0.6) {
            self.line("volts", "supply.volts");
            self.line("resistance", "supply.resistance");
        } else {
            self.line("secondary_rms", "supply.secondary_rms");
            self.line("winding_resistance", "supply.winding_resistance");
            let rectifier = self.pick(&["silicon-bridge", "silicon-full-wave", "tube-full-wave"]);
            self.word("rectifier", rectifier);
            if rectifier == "tube-full-wave" {
                self.line("rectifier_perveance", "supply.rectifier_perveance");
            }
        }
        for k in 0..rails {
            self.raw("[[supply.rail]]");
            self.word("name", &format!("rail{k}"));
            if k == 0 {
                self.word("from", "source");
            } else {
                let parent = self.below(k);
                self.word("from", &format!("rail{parent}"));
                if self.chance(0.75) {
                    self.line("resistor", "supply.rail.*.resistor");
                } else {
                    self.line("choke", "supply.rail.*.choke");
                    self.line("choke_resistance", "supply.rail.*.choke_resistance");
                }
            }
            self.line("capacitor", "supply.rail.*.capacitor");
        }
    }

    fn pot(&mut self) {
        self.line("pot", "stage.*.input.*.pot");
        let taper = self.pick(&["linear", "audio", "reverse-audio"]);
        self.word("taper", taper);
        if taper != "linear" {
            self.maybe(0.5, "midpoint", "stage.*.input.*.midpoint");
        }
        let setting = self.random.between(0.0, 10.0);
        writeln!(self.text, "setting = {setting}").expect("text grows");
        self.maybe(0.5, "end_resistance", "stage.*.input.*.end_resistance");
    }

    fn element(&mut self, k: usize, place: &str, resistive: Option<bool>, to_bias: bool) {
        self.raw("[[stage.input]]");
        self.word("name", &format!("e{k}"));
        self.word("place", place);
        if to_bias {
            self.word("to", "bias");
        }
        if place == "divider" {
            self.pot();
            self.maybe(0.3, "bright", "stage.*.input.*.bright");
            return;
        }
        let (resistor, capacitor) = match resistive {
            Some(true) => (true, false),
            Some(false) => (false, true),
            None => [(true, false), (false, true), (true, true)][self.below(3)],
        };
        if resistor {
            if self.chance(0.7) {
                self.line("resistor", "stage.*.input.*.resistor");
            } else {
                self.pot();
            }
        }
        if capacitor {
            self.line("capacitor", "stage.*.input.*.capacitor");
        }
        if resistor && capacitor {
            let wired = self.pick(&["series", "parallel"]);
            self.word("wired", wired);
        }
    }

    fn ladder(&mut self, first: bool, has_bias: bool) {
        let mut k = 0;
        if !first || has_bias {
            self.element(k, "series", Some(false), false);
            k += 1;
        }
        for _ in 0..self.below(4) {
            let place = self.pick(&["series", "shunt", "divider"]);
            self.element(k, place, None, false);
            k += 1;
        }
        if has_bias {
            self.element(k, "shunt", Some(true), true);
            k += 1;
        } else if !first || self.chance(0.5) {
            self.element(k, "shunt", Some(true), false);
            k += 1;
        }
        if self.chance(0.5) {
            self.element(k, "series", Some(true), false);
        }
    }

    fn stage(&mut self, k: usize, last: bool, rails: usize) {
        self.raw("[[stage]]");
        self.word("name", &format!("s{k}"));
        let is_pentode = self.chance(if last { 0.7 } else { 0.25 });
        let tube = self.pick(if is_pentode { &PENTODES } else { &TRIODES });
        self.word("tube", tube);
        let parallel = 1 + self.below(4);
        writeln!(self.text, "parallel = {parallel}").expect("text grows");
        let triode_connected = is_pentode && self.chance(0.3);
        if triode_connected {
            self.word("connection", "triode");
        }
        let has_bias = self.chance(0.25);
        self.ladder(k == 0, has_bias);
        self.raw("[stage.plate]");
        let rail = self.below(rails);
        self.word("rail", &format!("rail{rail}"));
        if !last {
            self.line("resistor", "stage.*.plate.resistor");
        }
        match self.below(10) {
            0 => {}
            1 | 2 => {
                self.raw("[stage.cathode]");
                self.line("diode_volts", "stage.*.cathode.diode_volts");
                self.line("diode_resistance", "stage.*.cathode.diode_resistance");
                self.maybe(0.3, "unbypassed", "stage.*.cathode.unbypassed");
            }
            _ => {
                self.raw("[stage.cathode]");
                self.line("resistor", "stage.*.cathode.resistor");
                self.maybe(0.6, "bypass", "stage.*.cathode.bypass");
                self.maybe(0.3, "unbypassed", "stage.*.cathode.unbypassed");
            }
        }
        if has_bias {
            self.raw("[stage.grid]");
            self.line("fixed_bias", "stage.*.grid.fixed_bias");
        }
        if is_pentode && !triode_connected {
            self.raw("[stage.screen]");
            let rail = self.below(rails);
            self.word("rail", &format!("rail{rail}"));
            self.maybe(0.8, "resistor", "stage.*.screen.resistor");
        }
        if self.chance(0.3) {
            self.raw("[stage.strays]");
            self.line("grid_plate", "stage.*.strays.grid_plate");
        }
    }

    fn iron(&mut self) {
        self.raw("[transformer]");
        self.line("primary", "transformer.primary");
        self.line("secondary", "transformer.secondary");
        if self.chance(0.5) {
            self.line("low_corner", "transformer.low_corner");
        } else {
            self.line("primary_inductance", "transformer.primary_inductance");
        }
        if self.chance(0.4) {
            self.line("high_corner", "transformer.high_corner");
        } else {
            self.line("leakage_inductance", "transformer.leakage_inductance");
            self.line("shunt_capacitance", "transformer.shunt_capacitance");
        }
        self.maybe(0.5, "corner_source", "transformer.corner_source");
        self.maybe(0.5, "primary_resistance", "transformer.primary_resistance");
        self.maybe(
            0.5,
            "secondary_resistance",
            "transformer.secondary_resistance",
        );
        self.maybe(0.3, "core_loss", "transformer.core_loss");
        self.raw("[load]");
        self.line("resistance", "load.resistance");
    }
}

/// Even in its logarithm between two positive values.
fn even(random: &mut SplitMix64, low: f64, high: f64) -> f64 {
    if high <= low {
        return low;
    }
    random.between(low.ln(), high.ln()).exp().clamp(low, high)
}

/// The design of this seed: one to four stages on one to four rails.
///
/// A third of the designs lie near the table's examples, a third all over its ranges, a third between.
pub fn random_design(seed: u64) -> String {
    let mut draw = Draw {
        random: SplitMix64::new(seed),
        wild: [0.0, 0.3, 1.0][(seed % 3) as usize],
        text: String::from("format = 1\nname = \"Random\"\n"),
    };
    draw.raw("[jack]");
    draw.maybe(0.5, "source_resistance", "jack.source_resistance");
    let rails = 1 + draw.below(4);
    draw.supply(rails);
    let stages = 1 + draw.below(4);
    for k in 0..stages {
        draw.stage(k, k + 1 == stages, rails);
    }
    draw.iron();
    draw.text
}
