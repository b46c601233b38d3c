//! Values as text: SI prefixes and few digits.

/// Value with four significant digits at most and no trailing zeros.
pub fn significant(value: f64) -> String {
    let rounded = to_four_digits(value);
    if rounded == 0.0 {
        "0".to_owned()
    } else if !rounded.is_finite() || (1e-5..1e9).contains(&rounded.abs()) {
        format!("{rounded}")
    } else {
        format!("{rounded:e}")
    }
}

fn to_four_digits(value: f64) -> f64 {
    format!("{value:.3e}").parse().unwrap_or(value)
}

/// Value with an SI prefix and its unit, four significant digits at most: `4.7 kΩ`, `22 nF`, `23.4 mA`.
///
/// Farads go no higher than micro below 0.1 F (`2200 µF`), as the trade writes them.
pub fn engineering(value: f64, symbol: &str) -> String {
    const PREFIXES: [&str; 8] = ["p", "n", "µ", "m", "", "k", "M", "G"];
    const UNITY: i32 = 4;
    // Rounded first, so that 999.96 Ω becomes 1 kΩ and not 1000 Ω.
    let rounded = to_four_digits(value);
    let highest = match symbol {
        "F" if rounded.abs() < 0.1 => -2,
        "F" => 0,
        _ => 3,
    };
    let thousands = if rounded == 0.0 || !rounded.is_finite() {
        0
    } else {
        (rounded.abs().log10() / 3.0 + 1e-9).floor() as i32
    }
    .clamp(-UNITY, highest);
    let mantissa = if thousands < 0 {
        rounded * 1000f64.powi(-thousands)
    } else {
        rounded / 1000f64.powi(thousands)
    };
    let prefix = PREFIXES[(thousands + UNITY) as usize];
    format!("{} {prefix}{symbol}", significant(mantissa))
        .trim_end()
        .to_owned()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::units::{Unit, notation::parse};
    use proptest::prelude::*;

    #[test]
    fn engineering_writing_has_four_digits_and_the_right_prefix() {
        for (value, symbol, expected) in [
            (4700.0, "Ω", "4.7 kΩ"),
            (22e-9, "F", "22 nF"),
            (0.0234, "A", "23.4 mA"),
            (0.0, "V", "0 V"),
            (-0.0, "V", "0 V"),
            (-14.0, "V", "-14 V"),
            (999.96, "Ω", "1 kΩ"),
            (999.94, "Ω", "999.9 Ω"),
            (1000.0, "Ω", "1 kΩ"),
            (1e6, "Ω", "1 MΩ"),
            (0.001, "A", "1 mA"),
            (47e-6, "F", "47 µF"),
            (2200e-6, "F", "2200 µF"),
            (0.1, "F", "100 mF"),
            (22.0, "F", "22 F"),
            (0.5e-12, "F", "0.5 pF"),
            (123_456.0, "Ω", "123.5 kΩ"),
            (4.7, "", "4.7"),
        ] {
            assert_eq!(engineering(value, symbol), expected);
        }
    }

    proptest! {
        #![proptest_config(ProptestConfig { failure_persistence: None, ..Default::default() })]

        /// Four significant digits: half a unit of the last is 5e-4 of the value at most.
        #[test]
        fn what_is_displayed_reads_back(mantissa in 1.0f64..10.0, decade in -12i32..9) {
            let value = mantissa * 10f64.powi(decade);
            // The decades each unit has prefixes for.
            for (unit, decades) in [
                (Unit::Ohms, -3..9),
                (Unit::Farads, -12..9),
                (Unit::Henries, -9..3),
                (Unit::Amperes, -9..3),
                (Unit::Hertz, -3..6),
                (Unit::Volts, -6..6),
                (Unit::VoltsPeak, -6..6),
                (Unit::Watts, -3..6),
                (Unit::Percent, -12..9),
                (Unit::Decibels, -12..9),
                (Unit::Plain, -12..9),
            ] {
                if decades.contains(&decade) {
                    let text = unit.format(value);
                    let back = parse(&text, unit).map_err(|fault| TestCaseError::fail(fault.to_string()))?;
                    prop_assert!((back / value - 1.0).abs() <= 5.01e-4, "{} for {}", text, value);
                }
            }
        }
    }
}
