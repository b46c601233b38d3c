//! What a transformer's label says about its iron.

use crate::design::Transformer;

/// Core loss taken when none is given, as a multiple of the primary impedance.
///
/// Chosen: a loss of 5 % at the rated load, inside the 7 to 20 % total loss of small output transformers.
const CORE_LOSS_RATIO: f64 = 20.0;
/// Copper taken when none is given, as a share of the impedance of its winding.
///
/// Chosen: 4 % on each side, again inside the 7 to 20 % total loss of small output transformers.
const COPPER_SHARE: f64 = 0.04;
/// Winding capacitance taken when neither it nor the leakage is given, in farads. Chosen.
const SHUNT_CAPACITANCE: f64 = 400e-12;

/// The output transformer's equivalent circuit, referred to the primary.
///
/// Winding copper, magnetizing inductance beside the core loss, total leakage, capacitance at the plate:
/// the usual equivalent circuit (F. Langford-Smith, ed., *Radiotron Designer's Handbook*, 4th ed.,
/// chapter 5). All values in SI units.
#[derive(Clone, Debug, PartialEq)]
pub struct Iron {
    /// Primary turns over secondary turns of the tap in use.
    pub turns_ratio: f64,
    pub primary_inductance: f64,
    pub leakage_inductance: f64,
    pub shunt_capacitance: f64,
    pub primary_resistance: f64,
    /// Copper of the secondary, not referred.
    pub secondary_resistance: f64,
    pub core_loss: f64,
    /// The label's low corner read with a current source (a pentode) as generator, when that corner was used.
    pub inductance_if_pentode: Option<f64>,
    /// The same read with a generator as large as the primary impedance.
    pub inductance_if_matched: Option<f64>,
    /// What had to be assumed, one sentence each.
    pub assumptions: Vec<String>,
}

/// A label that no transformer can have.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum LabelFault {
    #[error(
        "{given} alone already takes the response down by more than {drop_db} dB at the high corner; give a smaller one or a lower corner"
    )]
    AlreadyDown { given: &'static str, drop_db: f64 },
    #[error("the primary copper is as large as the primary impedance that is said to include it")]
    CopperTooLarge,
}

/// Derives the equivalent circuit from the label.
///
/// With generator Rs (the label's, else the primary impedance itself, which is then listed as an
/// assumption), rated load R' = n²·secondary, copper rp and rs' = n²·rs:
///
/// ```text
/// n² = primary / secondary                      or (primary − rp)/(secondary + rs) when copper is included
/// Lp = ((Rs + rp) ∥ (R' + rs')) / (2π f_low)    f_low: the −3 dB corner; a −1 dB corner is 0.5088 as low
/// |H(f_high)|² = 10^(−drop/10) |H(mid)|²        H = R'/(R + Rs − ω²CRsL + jω(L + CRsR)), R = rp + rs' + R'
/// ```
///
/// The first is the parallel form for a reactance beside resistances, the second the whole second-order
/// network of leakage L and capacitance C, solved for whichever of the two is not given.
///
/// # Errors
/// [`LabelFault`] when the figures contradict each other.
pub fn from_label(label: &Transformer) -> Result<Iron, LabelFault> {
    let mut assumptions = Vec::new();
    let primary = label.primary.0;
    let secondary = label.secondary.0;
    let rp = label.primary_resistance.map_or_else(
        || {
            assumptions.push(format!(
                "primary copper {:.0} Ω: 4 % of the primary impedance",
                COPPER_SHARE * primary
            ));
            COPPER_SHARE * primary
        },
        |r| r.0,
    );
    let rs = label.secondary_resistance.map_or_else(
        || {
            assumptions.push(format!(
                "secondary copper {:.2} Ω: 4 % of the rated load",
                COPPER_SHARE * secondary
            ));
            COPPER_SHARE * secondary
        },
        |r| r.0,
    );
    let core_loss = label.core_loss.map_or_else(
        || {
            assumptions.push(format!(
                "core loss {:.0} kΩ: 20 times the primary impedance",
                CORE_LOSS_RATIO * primary / 1e3
            ));
            CORE_LOSS_RATIO * primary
        },
        |r| r.0,
    );
    let n_squared = if label.impedance_includes_copper {
        if rp >= primary {
            return Err(LabelFault::CopperTooLarge);
        }
        (primary - rp) / (secondary + rs)
    } else {
        primary / secondary
    };
    let load = n_squared * secondary;
    let branch = load + n_squared * rs;
    let banded = label.primary_inductance.is_none()
        || label.leakage_inductance.is_none()
        || label.shunt_capacitance.is_none();
    let source = label.corner_source.map_or_else(
        || {
            if banded {
                assumptions.push(format!(
                    "the label's band was taken from a {:.1} kΩ generator, as large as the primary impedance",
                    primary / 1e3
                ));
            }
            primary
        },
        |r| r.0,
    );
    let drop_db = label.corner_drop_db;
    // A "3 dB" corner is the half-power corner.
    let ratio = if drop_db == 3.0 {
        2.0
    } else {
        10f64.powf(drop_db / 10.0)
    };

    let tau = std::f64::consts::TAU;
    let inductance_from = |generator: f64| {
        label.low_corner.map(|f| {
            let f3 = f.0 * (ratio - 1.0).sqrt();
            let across = if generator.is_infinite() {
                branch
            } else {
                parallel(generator + rp, branch)
            };
            across / (tau * f3)
        })
    };
    let from_band = label.primary_inductance.is_none();
    let primary_inductance = match label.primary_inductance {
        Some(l) => l.0,
        None => inductance_from(source)
            .expect("the reader asks for a low corner when no inductance is given"),
    };

    let w = tau * label.high_corner.map_or(0.0, |f| f.0);
    let r = rp + branch;
    let (leakage_inductance, shunt_capacitance) = match (
        label.leakage_inductance,
        label.shunt_capacitance,
    ) {
        (Some(l), Some(c)) => (l.0, c.0),
        (Some(l), None) => {
            let c = corner_partner(r, source, w, ratio, l.0, Given::Leakage).ok_or(
                LabelFault::AlreadyDown {
                    given: "the leakage inductance",
                    drop_db,
                },
            )?;
            (l.0, c)
        }
        (None, given) => {
            let c = given.map_or_else(
                || {
                    assumptions.push("winding capacitance 400 pF: one corner cannot give it and the leakage both".into());
                    SHUNT_CAPACITANCE
                },
                |c| c.0,
            );
            let l = corner_partner(r, source, w, ratio, c, Given::Capacitance).ok_or(
                LabelFault::AlreadyDown {
                    given: "the winding capacitance",
                    drop_db,
                },
            )?;
            (l, c)
        }
    };
    Ok(Iron {
        turns_ratio: n_squared.sqrt(),
        primary_inductance,
        leakage_inductance,
        shunt_capacitance,
        primary_resistance: rp,
        secondary_resistance: rs,
        core_loss,
        inductance_if_pentode: from_band.then(|| inductance_from(f64::INFINITY)).flatten(),
        inductance_if_matched: from_band.then(|| inductance_from(primary)).flatten(),
        assumptions,
    })
}

fn parallel(a: f64, b: f64) -> f64 {
    a * b / (a + b)
}

enum Given {
    Leakage,
    Capacitance,
}

/// Solves (a − ω²·Rs·L·C)² + ω²(L + C·Rs·R)² = a²·ratio, a = R + Rs, for the partner of `value`.
///
/// The equation is quadratic in either unknown. `None` when it has no positive root.
fn corner_partner(r: f64, rs: f64, w: f64, ratio: f64, value: f64, given: Given) -> Option<f64> {
    let a = r + rs;
    // Coefficient of the unknown in the real part, and known and unknown shares of the imaginary part.
    let (real, fixed, slope) = match given {
        Given::Capacitance => (w * w * rs * value, w * value * rs * r, w),
        Given::Leakage => (w * w * rs * value, w * value, w * rs * r),
    };
    let q2 = real * real + slope * slope;
    let q1 = 2.0 * (fixed * slope - a * real);
    let q0 = a * a + fixed * fixed - a * a * ratio;
    let discriminant = q1 * q1 - 4.0 * q2 * q0;
    let root = (-q1 + discriminant.sqrt()) / (2.0 * q2);
    (root > 0.0).then_some(root)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::units::{Farads, Hertz, Ohms};

    fn label() -> Transformer {
        Transformer {
            primary: Ohms(5e3),
            secondary: Ohms(8.0),
            taps: vec![],
            rated_power: None,
            low_corner: Some(Hertz(80.0)),
            high_corner: Some(Hertz(15e3)),
            corner_drop_db: 3.0,
            corner_source: Some(Ohms(5e3)),
            primary_inductance: None,
            leakage_inductance: None,
            shunt_capacitance: Some(Farads(300e-12)),
            primary_resistance: Some(Ohms(0.0)),
            secondary_resistance: Some(Ohms(0.0)),
            core_loss: None,
            impedance_includes_copper: false,
            dc_rated: None,
        }
    }

    /// 80 Hz at 5 kΩ: 2.5 kΩ/(2π·80 Hz) = 4.97 H from a 5 kΩ source, twice that from a current source.
    #[test]
    fn one_corner_reads_differently_from_different_sources() {
        let iron = from_label(&label()).unwrap();
        assert!((iron.primary_inductance - 4.974).abs() < 1e-3);
        assert!((iron.inductance_if_pentode.unwrap() - 9.947).abs() < 1e-3);
        assert!((iron.turns_ratio - 25.0).abs() < 1e-12);
    }

    #[test]
    fn the_high_corner_comes_back() {
        let iron = from_label(&label()).unwrap();
        let (rs, r, w) = (5e3, 5e3, std::f64::consts::TAU * 15e3);
        let (l, c) = (iron.leakage_inductance, iron.shunt_capacitance);
        let power = (r + rs) * (r + rs)
            / ((r + rs - w * w * c * rs * l).powi(2) + (w * (l + c * rs * r)).powi(2));
        assert!((power - 0.5).abs() < 1e-12);
    }

    #[test]
    fn too_much_capacitance_is_refused() {
        let mut label = label();
        label.shunt_capacitance = Some(Farads(20e-9));
        assert!(matches!(
            from_label(&label),
            Err(LabelFault::AlreadyDown { .. })
        ));
    }
}
