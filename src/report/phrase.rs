//! Numbers and words as a builder reads them.

use std::f64::consts::SQRT_2;

use crate::stage::ratings::{Condition, RatingCheck, RatingKind};
use crate::trial::figures::Mechanism;
use crate::units::notation::engineering;

/// Level of a sine of this peak, dB re 1 V RMS.
pub fn dbv(v_peak: f64) -> f64 {
    20.0 * (v_peak / SQRT_2).log10()
}

/// Level of this peak, dB re digital full scale.
pub fn dbfs(v_peak: f64, full_scale_v_peak: f64) -> f64 {
    20.0 * (v_peak / full_scale_v_peak).log10()
}

/// Three significant digits with SI prefix and unit.
pub fn short(value: f64, symbol: &str) -> String {
    if !value.is_finite() {
        return "not finite".to_owned();
    }
    let rounded = format!("{value:.2e}").parse().unwrap_or(value);
    engineering(rounded, symbol)
}

/// Percent with two significant digits below 10 and none after the point above.
pub fn percent(value: f64) -> String {
    let size = value.abs();
    if !size.is_finite() {
        "not finite".to_owned()
    } else if size >= 9.95 {
        format!("{value:.0} %")
    } else if size >= 0.995 {
        format!("{value:.1} %")
    } else if size >= 0.0995 {
        format!("{value:.2} %")
    } else {
        format!("{value:.3} %")
    }
}

/// Decibels with one digit after the point.
pub fn decibels(value: f64) -> String {
    if value.is_finite() {
        format!("{value:.1} dB")
    } else {
        "not finite".to_owned()
    }
}

/// A gain setting: a pot's position.
pub fn setting(setting: Option<f64>) -> String {
    setting.map_or_else(|| "none".to_owned(), |s| short(s, ""))
}

pub fn mechanism(mechanism: Mechanism) -> &'static str {
    match mechanism {
        Mechanism::GridConduction => "grid conduction",
        Mechanism::PlateKnee => "plate knee",
        Mechanism::Cutoff => "cutoff",
    }
}

/// A rating in words, cold start left to its condition.
pub fn rating(kind: RatingKind) -> &'static str {
    match kind {
        RatingKind::PlateVolts | RatingKind::PlateColdVolts => "plate volts",
        RatingKind::ScreenVolts | RatingKind::ScreenColdVolts => "screen volts",
        RatingKind::PlateDissipation => "plate dissipation",
        RatingKind::ScreenDissipation => "screen dissipation",
        RatingKind::CathodeCurrent => "cathode current",
        RatingKind::GridLeak => "grid-circuit resistance",
        RatingKind::HeaterCathodeVolts => "heater-to-cathode volts",
        RatingKind::GridNegativeVolts => "negative grid volts",
        RatingKind::TransformerCurrent => "transformer direct current",
    }
}

/// State in which a rating's value stands.
pub fn condition(condition: Condition) -> String {
    match condition {
        Condition::Idle => "idle".into(),
        Condition::ColdStart => "cold start".into(),
        Condition::Driven {
            input_v_peak,
            setting,
        } => {
            let input = short(input_v_peak, "V");
            match setting {
                Some(s) => format!("driven, {input} peak, gain {}", short(s, "")),
                None => format!("driven, {input} peak"),
            }
        }
    }
}

/// One sentence about a rating that is exceeded.
pub fn exceeded(check: &RatingCheck) -> String {
    let unit = check.kind.unit();
    format!(
        "{} ({}): {} {} of {} allowed, {} over ({}){}",
        check.stage,
        check.tube,
        rating(check.kind),
        short(check.value, unit),
        short(check.limit, unit),
        percent(-check.margin_percent),
        condition(check.condition),
        if check.limit_from_memory {
            ", limit from memory"
        } else {
            ""
        }
    )
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn one_volt_rms_is_zero_dbv_and_full_scale_is_zero_dbfs() {
        assert!(dbv(SQRT_2).abs() < 1e-12);
        assert!((dbv(0.2) + 16.9897).abs() < 1e-4);
        assert_eq!(dbfs(0.7, 0.7), 0.0);
        assert!((dbfs(0.5, 1.0) + 6.0206).abs() < 1e-4);
    }

    #[test]
    fn three_digits_are_enough_to_read() {
        assert_eq!(short(0.51234, "V"), "512 mV");
        assert_eq!(short(0.99996, "V"), "1 V");
        assert_eq!(short(f64::NAN, "V"), "not finite");
        assert_eq!(percent(f64::INFINITY), "not finite");
        assert_eq!(decibels(f64::NEG_INFINITY), "not finite");
        assert_eq!(decibels(-3.04), "-3.0 dB");
        assert_eq!(percent(12.34), "12 %");
        assert_eq!(percent(1.234), "1.2 %");
        assert_eq!(percent(0.1234), "0.12 %");
        assert_eq!(percent(0.0123), "0.012 %");
    }
}
