//! The output transformer and what hangs on it.

use super::super::model::{Coil, Load, Loudspeaker, Transformer};
use super::super::section::Section;
use crate::diagnostic::Code;
use crate::units::{Amperes, Farads, Henries, Hertz, Ohms, Watts};

pub(super) fn transformer(section: &Section<'_>) -> Transformer {
    let low_corner = section.quantity("low_corner").map(Hertz);
    let high_corner = section.quantity("high_corner").map(Hertz);
    let primary_inductance = section.quantity("primary_inductance").map(Henries);
    let leakage_inductance = section.quantity("leakage_inductance").map(Henries);
    let shunt_capacitance = section.quantity("shunt_capacitance").map(Farads);
    if section.is_present() {
        if low_corner.is_none() && primary_inductance.is_none() {
            section.missing("low_corner", Some("or give `primary_inductance`"));
        }
        if high_corner.is_none() && (leakage_inductance.is_none() || shunt_capacitance.is_none()) {
            section.missing(
                "high_corner",
                Some("or give both `leakage_inductance` and `shunt_capacitance`"),
            );
        }
    }
    if let (Some(low), Some(high)) = (low_corner, high_corner)
        && low.si() >= high.si()
        && section.is_sound("low_corner")
        && section.is_sound("high_corner")
    {
        let message = format!("the lower corner, {low}, does not lie below the upper one, {high}");
        section.fault(
            Code::CornerOrder,
            "low_corner",
            message,
            Some("exchange them?".to_owned()),
        );
    }
    let primary = Ohms(section.due("primary", None));
    let primary_resistance = section.quantity("primary_resistance").map(Ohms);
    let impedance_includes_copper = section.flag("impedance_includes_copper");
    if let Some(copper) = primary_resistance {
        let sound = section.is_sound("primary") && section.is_sound("primary_resistance");
        if impedance_includes_copper && copper.si() >= primary.si() && sound {
            let message = format!(
                "`primary_resistance` is {copper}, but the primary's {primary} is said to include it"
            );
            section.fault(
                Code::OutOfRange,
                "primary_resistance",
                message,
                Some("it lies below `primary`".to_owned()),
            );
        }
    }
    let secondary = Ohms(section.due("secondary", None));
    Transformer {
        primary,
        secondary,
        taps: taps(section, secondary),
        rated_power: section.quantity("rated_power").map(Watts),
        low_corner,
        high_corner,
        corner_drop_db: corner_drop(section),
        corner_source: section.quantity("corner_source").map(Ohms),
        primary_inductance,
        leakage_inductance,
        shunt_capacitance,
        primary_resistance,
        secondary_resistance: section.quantity("secondary_resistance").map(Ohms),
        core_loss: section.quantity("core_loss").map(Ohms),
        impedance_includes_copper,
        dc_rated: section.quantity("dc_rated").map(Amperes),
    }
}

fn taps(section: &Section<'_>, secondary: Ohms) -> Vec<Ohms> {
    let taps = section.quantities("taps").unwrap_or_default();
    let is_listed = taps
        .iter()
        .any(|tap| (tap / secondary.si() - 1.0).abs() < 1e-9);
    if !taps.is_empty() && !is_listed && section.is_sound("taps") && section.is_sound("secondary") {
        let listed: Vec<_> = taps.iter().map(|&tap| Ohms(tap).to_string()).collect();
        let hint = Some(format!("the taps are {}", listed.join(", ")));
        section.fault(
            Code::TapNotListed,
            "secondary",
            format!("there is no tap for {secondary}"),
            hint,
        );
    }
    taps.into_iter().map(Ohms).collect()
}

/// 3 or 1 dB: those are the corners that labels quote.
fn corner_drop(section: &Section<'_>) -> f64 {
    let drop = section.due("corner_drop", None);
    if drop != 1.0 && drop != 3.0 && section.is_sound("corner_drop") {
        let hint = Some("labels quote corners at 3dB or 1dB".to_owned());
        section.fault(
            Code::OutOfRange,
            "corner_drop",
            format!("`corner_drop` is {drop} dB"),
            hint,
        );
    }
    drop
}

pub(super) fn load(section: &Section<'_>) -> Load {
    let loudspeaker = section.table("loudspeaker");
    Load {
        resistance: Ohms(section.due("resistance", None)),
        loudspeaker: loudspeaker
            .is_present()
            .then(|| read_loudspeaker(&loudspeaker)),
    }
}

fn read_loudspeaker(section: &Section<'_>) -> Loudspeaker {
    let qms = section.due("qms", None);
    Loudspeaker {
        re: Ohms(section.due("re", None)),
        coil: coil(section),
        fs: Hertz(section.due("fs", None)),
        qms,
        qes: electrical_q(section, qms),
    }
}

fn coil(section: &Section<'_>) -> Coil {
    let lossy = ["coil_at_1khz", "coil_exponent"]
        .into_iter()
        .find(|key| section.is_given(key));
    match (section.quantity("le"), lossy) {
        (Some(_), Some(lossy)) => {
            section.conflict(
                "le",
                lossy,
                "give either `le`, or `coil_at_1khz` with `coil_exponent`",
            );
            section.glance(&["coil_at_1khz", "coil_exponent"]);
            Coil::Inductance(Henries(1e-3))
        }
        (Some(inductance), None) => Coil::Inductance(Henries(inductance)),
        (None, Some(_)) => Coil::Lossy {
            at_1khz: Ohms(section.due(
                "coil_at_1khz",
                Some("`coil_at_1khz` and `coil_exponent` go together"),
            )),
            exponent: section.due(
                "coil_exponent",
                Some("`coil_at_1khz` and `coil_exponent` go together"),
            ),
        },
        (None, None) => {
            section.missing("le", Some("or give `coil_at_1khz` with `coil_exponent`"));
            Coil::Inductance(Henries(1e-3))
        }
    }
}

/// Qes, or what follows from 1/Qts = 1/Qms + 1/Qes.
///
/// Source: R. H. Small, "Direct-Radiator Loudspeaker System Analysis", J. Audio Eng. Soc. 20(5), 1972.
fn electrical_q(section: &Section<'_>, qms: f64) -> f64 {
    match (section.quantity("qes"), section.quantity("qts")) {
        (Some(qes), None) => qes,
        (Some(qes), Some(_)) => {
            section.conflict("qes", "qts", "one follows from the other and `qms`");
            qes
        }
        (None, Some(qts)) if qts < qms => qts * qms / (qms - qts),
        (None, Some(qts)) => {
            if section.is_sound("qts") && section.is_sound("qms") {
                let message = format!("`qts` is {qts}, not below `qms`, {qms}");
                let hint =
                    Some("1/qts = 1/qms + 1/qes, so `qts` is the least of the three".to_owned());
                section.fault(Code::OutOfRange, "qts", message, hint);
            }
            qts
        }
        (None, None) => {
            section.missing("qes", Some("or give `qts`"));
            1.0
        }
    }
}
