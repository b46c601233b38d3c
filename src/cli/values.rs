//! Values of options, with their ranges.

use forehear::units::{Unit, notation};

/// Levels at the jack, in volts peak: from far below any noise to far beyond any pickup.
const JACK_LEVEL_V: (f64, f64) = (1e-6, 20.0);
/// Tones a guitar amplifier is measured with, in hertz.
const TONE_HZ: (f64, f64) = (20.0, 10e3);
/// Travel of a pot.
const TRAVEL: (f64, f64) = (0.0, 10.0);
/// Most threads. Chosen: beyond, there is surely a slip of the keys.
const MOST_JOBS: usize = 1024;

/// A peak level at the jack, in volts peak.
pub fn jack_level(text: &str) -> Result<f64, String> {
    quantity(text, Unit::VoltsPeak, JACK_LEVEL_V)
}

/// A test tone, in hertz.
pub fn tone(text: &str) -> Result<f64, String> {
    quantity(text, Unit::Hertz, TONE_HZ)
}

/// A position of the gain control.
pub fn gain(text: &str) -> Result<f64, String> {
    quantity(text, Unit::Plain, TRAVEL)
}

/// A channel, counted from 1.
pub fn channel(text: &str) -> Result<usize, String> {
    match text.parse() {
        Ok(n) if n >= 1 => Ok(n),
        _ => Err("channels are counted 1, 2, 3".into()),
    }
}

/// A number of threads.
pub fn jobs(text: &str) -> Result<usize, String> {
    match text.parse() {
        Ok(n) if (1..=MOST_JOBS).contains(&n) => Ok(n),
        _ => Err(format!("a whole number from 1 to {MOST_JOBS} will do")),
    }
}

fn quantity(text: &str, unit: Unit, (low, high): (f64, f64)) -> Result<f64, String> {
    // An option that takes negative values also takes the next option for its value.
    if text.starts_with("--") {
        return Err(format!("{} is missing before `{text}`", unit.noun()));
    }
    let value = notation::parse(text, unit).map_err(|e| format!("{e}; {}", e.hint()))?;
    if (low..=high).contains(&value) {
        Ok(value)
    } else {
        Err(format!(
            "{} is outside {} to {}",
            unit.format(value),
            unit.format(low),
            unit.format(high)
        ))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ranges_hold_at_both_ends_and_are_said() {
        assert_eq!(jack_level("20V"), Ok(20.0));
        assert_eq!(jack_level("1uV"), Ok(1e-6));
        assert!(jack_level("20.1V").unwrap_err().contains("20 V"));
        assert!(jack_level("-1V").is_err());
        assert!(jack_level("nan").is_err());
        assert!(jack_level("47k").is_err());
        assert!(tone("19").is_err());
        assert_eq!(tone("10kHz"), Ok(1e4));
        assert!(gain("10.5").unwrap_err().contains("0 to 10"));
        assert!(channel("0").is_err());
        assert!(jobs("0").is_err());
        assert!(jobs("4").is_ok());
    }
}
