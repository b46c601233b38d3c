//! Component notation: the letter code of IEC 60062 and SI writing.
//!
//! In the letter code the multiplier stands in place of the decimal mark: `4K7` is 4.7 kΩ, `R47` 0.47 Ω, `4n7` 4.7 nF. SI writing
//! puts number, prefix and unit in this order: `4.7k`, `4.7 kΩ`, `0.022u`, `22nF`. A bare number counts in the base unit.
//! Tolerance letters of the code (`4K7J`) are not read.
//!
//! ```
//! use forehear::units::{Unit, notation};
//! assert_eq!(notation::parse("4K7", Unit::Ohms).unwrap(), 4700.0);
//! assert_eq!(notation::parse("4.7 kΩ", Unit::Ohms).unwrap(), 4700.0);
//! assert!(notation::parse("47n", Unit::Ohms).is_err());
//! ```
//!
//! Source: IEC 60062:2016, *Marking codes for resistors and capacitors*, letter code of clause "resistance and capacitance
//! values" (clause title from memory). Letters in place of the mark of other units (`6V3`) follow the trade's habit.

pub use super::engineering::{engineering, significant};

use super::unit::Unit;
use std::f64::consts::SQRT_2;
use thiserror::Error;

/// RMS volts of 0 dBV.
pub const DBV_REFERENCE: f64 = 1.0;

/// RMS volts of 0 dBu: 1 mW in 600 Ω, sqrt(0.6) V, 0.7746 V.
pub const DBU_REFERENCE: f64 = 0.774_596_669_241_483_4;

/// Why a written value could not be read.
#[derive(Clone, Debug, PartialEq, Eq, Error)]
#[error("{}", self.sentence())]
pub struct NotationError {
    /// What was written.
    pub found: String,
    /// What it should have been a value of.
    pub unit: Unit,
    /// What is wrong with it.
    pub problem: Problem,
}

/// What is wrong with a written value.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Problem {
    /// Nothing is written.
    Empty,
    /// No number stands at the beginning.
    NotANumber,
    /// Infinite, not a number, or too large to hold.
    NotFinite,
    /// A comma where the decimal mark is a point.
    DecimalComma,
    /// A value of one of these instead.
    OtherUnit(Vec<Unit>),
    /// The number is followed by something that is no prefix or unit.
    UnknownSuffix(String),
}

impl NotationError {
    fn sentence(&self) -> String {
        let due = self.unit.noun();
        let found = clipped(&self.found);
        match &self.problem {
            Problem::Empty => format!("nothing is written where {due} is due"),
            Problem::NotANumber => format!("`{found}` is not {due}"),
            Problem::NotFinite => format!("`{found}` is not a finite value"),
            Problem::DecimalComma => {
                format!("`{found}` has a comma: the decimal mark is a point")
            }
            Problem::OtherUnit(others) => {
                let nouns: Vec<_> = others.iter().map(|unit| unit.noun()).collect();
                format!("`{found}` is {}, not {due}", nouns.join(" or "))
            }
            Problem::UnknownSuffix(suffix) => {
                format!(
                    "`{found}` is not {due}: `{}` says nothing here",
                    clipped(suffix)
                )
            }
        }
    }

    /// What would have been read.
    pub fn hint(&self) -> String {
        format!(
            "write {} such as {}",
            self.unit.noun(),
            self.unit.examples().join(", ")
        )
    }

    /// True when the value could be read, but as something else.
    pub fn is_wrong_unit(&self) -> bool {
        matches!(self.problem, Problem::OtherUnit(_))
    }
}

/// First forty characters of what somebody wrote, on one line, to quote it.
pub fn clipped(text: &str) -> String {
    let mut short: String = text.chars().take(40).flat_map(char::escape_debug).collect();
    if text.chars().nth(40).is_some() {
        short.push('…');
    }
    short
}

/// Value of `text` in the base unit of `unit`.
///
/// Levels ([`Unit::VoltsPeak`]) in dBV and dBu are RMS scales of a sine: peak = sqrt(2) · reference · 10^(level/20).
///
/// # Errors
/// [`NotationError`] for an empty text, a value that is not finite, the wrong unit, or anything unreadable.
pub fn parse(text: &str, unit: Unit) -> Result<f64, NotationError> {
    let fault = |problem| NotationError {
        found: text.trim().to_owned(),
        unit,
        problem,
    };
    match read(text, unit) {
        Ok(value) if value.is_finite() => Ok(value),
        Ok(_) => Err(fault(Problem::NotFinite)),
        Err(Problem::UnknownSuffix(suffix)) => {
            let others = units_that_read(text, unit);
            Err(fault(if others.is_empty() {
                Problem::UnknownSuffix(suffix)
            } else {
                Problem::OtherUnit(others)
            }))
        }
        Err(problem) => Err(fault(problem)),
    }
}

/// Units other than `due` under which `text` is a value; the three kinds of volts count as one.
fn units_that_read(text: &str, due: Unit) -> Vec<Unit> {
    let mut others = Vec::new();
    for &unit in Unit::ALL {
        let same_symbol = |other: &Unit| other.symbol() == unit.symbol();
        if unit != due
            && unit != Unit::Plain
            && read(text, unit).is_ok()
            && !others.iter().any(same_symbol)
        {
            others.push(unit);
        }
    }
    others
}

fn read(text: &str, unit: Unit) -> Result<f64, Problem> {
    let text = text.trim();
    if text.is_empty() {
        return Err(Problem::Empty);
    }
    let (sign, body) = match text.chars().next() {
        Some('-' | '\u{2212}') => (-1.0, text.trim_start_matches(['-', '\u{2212}'])),
        Some('+') => (1.0, &text[1..]),
        _ => (1.0, text),
    };
    // A second sign is no number: trim_start_matches takes them all, so compare lengths.
    if sign < 0.0 && text.chars().count() != body.chars().count() + 1 {
        return Err(Problem::NotANumber);
    }
    let lower = body.to_ascii_lowercase();
    if ["nan", "inf", "infinity"].contains(&lower.as_str()) {
        return Err(Problem::NotFinite);
    }
    let end = number_length(body);
    let (number, rest) = body.split_at(end);
    if number.is_empty() {
        // The letter code may begin with its letter: R47, p33.
        return letter_code("0", rest, unit)
            .map(|value| sign * value)
            .ok_or(Problem::NotANumber);
    }
    if number == "." {
        return Err(Problem::NotANumber);
    }
    let value: f64 = number.parse().map_err(|_| Problem::NotANumber)?;
    if !value.is_finite() {
        return Err(Problem::NotFinite);
    }
    if let Some(scaled) = level(sign * value, rest, unit) {
        return Ok(scaled);
    }
    if let Some(factor) = suffix(rest.trim_start(), unit) {
        return Ok(scaled(sign * value, factor));
    }
    if number.bytes().all(|b| b.is_ascii_digit()) {
        if let Some(value) = letter_code(number, rest, unit) {
            return Ok(sign * value);
        }
        if rest.starts_with(',') {
            return Err(Problem::DecimalComma);
        }
    }
    Err(Problem::UnknownSuffix(rest.trim().to_owned()))
}

/// Bytes of the decimal number, with exponent, at the beginning of `text`.
fn number_length(text: &str) -> usize {
    let bytes = text.as_bytes();
    let digits_from = |from: usize| {
        bytes[from..]
            .iter()
            .take_while(|b| b.is_ascii_digit())
            .count()
    };
    let mut end = digits_from(0);
    if bytes.get(end) == Some(&b'.') {
        end += 1 + digits_from(end + 1);
    }
    if end > 0 && matches!(bytes.get(end), Some(b'e' | b'E')) {
        let sign = usize::from(matches!(bytes.get(end + 1), Some(b'+' | b'-')));
        let from = end + 1 + sign;
        let digits = if from <= bytes.len() {
            digits_from(from)
        } else {
            0
        };
        if digits > 0 {
            end = from + digits;
        }
    }
    end
}

/// Peak volts of a level in dBV or dBu.
fn level(value: f64, rest: &str, unit: Unit) -> Option<f64> {
    if unit != Unit::VoltsPeak {
        return None;
    }
    let reference = match rest.trim_start() {
        "dBV" => DBV_REFERENCE,
        "dBu" => DBU_REFERENCE,
        _ => return None,
    };
    Some(SQRT_2 * reference * 10f64.powf(value / 20.0))
}

/// Multiplier of what follows a number: nothing, a prefix, a unit, or both.
fn suffix(rest: &str, unit: Unit) -> Option<f64> {
    if rest.is_empty() || unit.symbols().contains(&rest) {
        return Some(1.0);
    }
    unit.prefixes().iter().find_map(|&(prefix, factor)| {
        let symbol = rest.strip_prefix(prefix)?;
        (symbol.is_empty() || unit.symbols().contains(&symbol)).then_some(factor)
    })
}

/// Value of `whole` LETTER digits [unit], the letter standing for the decimal mark.
fn letter_code(whole: &str, rest: &str, unit: Unit) -> Option<f64> {
    let as_place = unit.symbols().iter().map(|&symbol| (symbol, 1.0));
    unit.prefixes()
        .iter()
        .copied()
        .chain(as_place)
        .find_map(|(letter, factor)| {
            let tail = rest.strip_prefix(letter)?;
            let digits = tail.bytes().take_while(u8::is_ascii_digit).count();
            let symbol = tail[digits..].trim_start();
            // `6V3A` would be two units: a unit in place of the mark stands alone.
            let unit_may_follow = !unit.symbols().contains(&letter);
            let closes = symbol.is_empty() || (unit_may_follow && unit.symbols().contains(&symbol));
            if digits == 0 || !closes || letter.chars().count() != 1 {
                return None;
            }
            let value: f64 = format!("{whole}.{}", &tail[..digits]).parse().ok()?;
            Some(scaled(value, factor))
        })
}

/// `value · factor`, dividing by the inverse of a small factor so that `22n` is the double nearest to 22e-9.
fn scaled(value: f64, factor: f64) -> f64 {
    if factor < 1.0 {
        value / (1.0 / factor).round()
    } else {
        value * factor
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[track_caller]
    fn reads(text: &str, unit: Unit, expected: f64) {
        let value = parse(text, unit).unwrap_or_else(|fault| panic!("{text}: {fault}"));
        let tolerance = 1e-12 * expected.abs();
        assert!(
            (value - expected).abs() <= tolerance,
            "{text}: {value} for {expected}"
        );
    }

    /// IEC 60062, the letter code's own examples for resistance and capacitance (rows from memory).
    #[test]
    fn letter_code_examples_of_iec_60062_are_read() {
        for (text, ohms) in [
            ("R10", 0.1),
            ("R15", 0.15),
            ("R332", 0.332),
            ("R590", 0.59),
            ("1R0", 1.0),
            ("1R5", 1.5),
            ("3R32", 3.32),
            ("5R9", 5.9),
            ("10R", 10.0),
            ("33R2", 33.2),
            ("100R", 100.0),
            ("1K0", 1e3),
            ("1K5", 1.5e3),
            ("3K32", 3.32e3),
            ("10K", 10e3),
            ("33K2", 33.2e3),
            ("590K", 590e3),
            ("1M0", 1e6),
            ("3M32", 3.32e6),
            ("10M", 10e6),
            ("1G0", 1e9),
        ] {
            reads(text, Unit::Ohms, ohms);
        }
        for (text, farads) in [
            ("p10", 0.1e-12),
            ("p332", 0.332e-12),
            ("1p5", 1.5e-12),
            ("33p2", 33.2e-12),
            ("590p", 590e-12),
            ("1n0", 1e-9),
            ("3n32", 3.32e-9),
            ("100n", 100e-9),
            ("1u5", 1.5e-6),
            ("1µ0", 1e-6),
            ("33μ2", 33.2e-6),
            ("1m5", 1.5e-3),
            ("10m", 10e-3),
        ] {
            reads(text, Unit::Farads, farads);
        }
    }

    #[test]
    fn si_writing_and_letter_code_mean_the_same() {
        for text in [
            "4K7", "4k7", "4.7k", "4.7 k", "4700", "4700R", "4.7kΩ", "4.7 kΩ", "4.7kohm", "4.7e3",
            "4K7 ohms",
        ] {
            reads(text, Unit::Ohms, 4700.0);
        }
        for text in [
            "22n", "22nF", "22 nF", "0.022u", "0.022µF", ".022u", "22000p", "22e-9", "22E-9F",
        ] {
            reads(text, Unit::Farads, 22e-9);
        }
        for (text, unit, expected) in [
            ("470", Unit::Ohms, 470.0),
            ("1M", Unit::Ohms, 1e6),
            ("R47", Unit::Ohms, 0.47),
            ("1k5", Unit::Ohms, 1500.0),
            ("68\u{2126}", Unit::Ohms, 68.0),
            ("500p", Unit::Farads, 500e-12),
            ("4n7", Unit::Farads, 4.7e-9),
            ("250V", Unit::Volts, 250.0),
            ("6V3", Unit::Volts, 6.3),
            ("-14 V", Unit::Volts, -14.0),
            ("\u{2212}14V", Unit::Volts, -14.0),
            ("+1.8V", Unit::Volts, 1.8),
            ("230V RMS", Unit::VoltsRms, 230.0),
            ("35mA", Unit::Amperes, 0.035),
            ("10H", Unit::Henries, 10.0),
            ("60mH", Unit::Henries, 0.06),
            ("80Hz", Unit::Hertz, 80.0),
            ("15 kHz", Unit::Hertz, 15e3),
            ("5W", Unit::Watts, 5.0),
            ("-3dB", Unit::Decibels, -3.0),
            ("12.5 %", Unit::Percent, 12.5),
            ("1.2mA/V^1.5", Unit::Perveance, 1.2e-3),
            ("1.2e-3", Unit::Perveance, 1.2e-3),
            ("0.65", Unit::Plain, 0.65),
        ] {
            reads(text, unit, expected);
        }
    }

    /// dBV: re 1 V RMS, dBu: re 0.7746 V RMS (1 mW in 600 Ω); a sine's peak is √2 times its RMS value.
    #[test]
    fn levels_are_peak_volts_and_the_db_scales_are_rms() {
        reads("0dBV", Unit::VoltsPeak, 2f64.sqrt());
        reads("-20 dBV", Unit::VoltsPeak, 0.1 * 2f64.sqrt());
        reads("0dBu", Unit::VoltsPeak, (2.0f64 * 600.0 * 1e-3).sqrt());
        reads("200mV", Unit::VoltsPeak, 0.2);
        reads("0.2", Unit::VoltsPeak, 0.2);
        assert!((super::super::VoltsPeak(2f64.sqrt()).dbv()).abs() < 1e-12);
        assert!((super::super::VoltsPeak(2f64.sqrt()).dbu() - 2.218_487_5).abs() < 1e-6);
        assert!(parse("-17dB", Unit::VoltsPeak).is_err());
        assert!(parse("-17dBV", Unit::Volts).is_err());
    }

    #[test]
    fn what_is_no_value_is_refused_and_the_reason_is_told_apart() {
        let problem = |text, unit| parse(text, unit).expect_err(text).problem;
        for text in ["nan", "NaN", "inf", "-inf", "+Infinity", "1e999", "1e308k"] {
            assert_eq!(problem(text, Unit::Ohms), Problem::NotFinite, "{text}");
        }
        for text in ["", " ", "\t\n"] {
            assert_eq!(problem(text, Unit::Ohms), Problem::Empty, "{text:?}");
        }
        for text in ["abc", "--5", "- 5", ".", "-", "k", "R", ".k", "e5"] {
            assert_eq!(problem(text, Unit::Ohms), Problem::NotANumber, "{text}");
        }
        assert_eq!(problem("4,7k", Unit::Ohms), Problem::DecimalComma);
        for text in [
            "4k7k", "4k.7", "4.7k5", "5 5", "5x", "4.7.1", "1_000", "0x10", "5kk", "4R7k",
        ] {
            assert!(
                matches!(problem(text, Unit::Ohms), Problem::UnknownSuffix(_)),
                "{text}"
            );
        }
    }

    #[test]
    fn a_value_of_another_unit_is_named() {
        let fault = parse("22nF", Unit::Ohms).expect_err("capacitance");
        assert_eq!(fault.problem, Problem::OtherUnit(vec![Unit::Farads]));
        assert_eq!(
            fault.to_string(),
            "`22nF` is a capacitance, not a resistance"
        );
        assert!(fault.hint().contains("4K7"));
        let fault = parse("47n", Unit::Ohms).expect_err("capacitance");
        assert!(fault.is_wrong_unit() && fault.to_string().contains("a capacitance"));
        let fault = parse("4k7", Unit::Farads).expect_err("resistance");
        assert!(fault.to_string().contains("a resistance"));
    }

    /// `M` is mega and `m` milli: only the case tells them apart.
    #[test]
    fn capital_and_small_m_differ_by_nine_decades() {
        reads("1M", Unit::Ohms, 1e6);
        reads("1m", Unit::Ohms, 1e-3);
        assert!(parse("1M", Unit::Farads).is_err());
    }

    #[test]
    fn every_example_of_every_unit_is_readable() {
        for &unit in Unit::ALL {
            assert!(!unit.examples().is_empty());
            for example in unit.examples() {
                parse(example, unit).unwrap_or_else(|fault| panic!("{unit:?}: {fault}"));
            }
        }
    }

    proptest! {
        #![proptest_config(ProptestConfig { failure_persistence: None, ..Default::default() })]

        #[test]
        fn reading_never_panics_and_only_finite_values_come_out(text in "\\PC{0,24}", which in 0..Unit::ALL.len()) {
            if let Ok(value) = parse(&text, Unit::ALL[which]) {
                prop_assert!(value.is_finite());
            }
        }

        #[test]
        fn texts_made_of_the_notation_never_panic(text in "[-+.,0-9eERkKMmunpµFVAHzWdBs% ]{0,12}", which in 0..Unit::ALL.len()) {
            match parse(&text, Unit::ALL[which]) {
                Ok(value) => prop_assert!(value.is_finite()),
                Err(fault) => prop_assert!(!fault.to_string().is_empty() && !fault.hint().is_empty()),
            }
        }

        #[test]
        fn letter_code_equals_si_writing(whole in 0u32..1000, tenths in 0u32..10, prefix in prop::sample::select(vec!["k", "M", "R"])) {
            let code = parse(&format!("{whole}{prefix}{tenths}"), Unit::Ohms).unwrap();
            let si = parse(&format!("{whole}.{tenths}{prefix}"), Unit::Ohms).unwrap();
            prop_assert_eq!(code, si);
        }
    }
}
