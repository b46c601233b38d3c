//! Direct volts of a capacitor-input rectifier.

use std::f64::consts::{FRAC_PI_2, PI, SQRT_2};

use crate::design::{Rectifier, Source};

/// Forward drop of one silicon diode, in volts. Chosen: the usual figure at some tens of milliamperes.
const SILICON_DROP_V: f64 = 0.7;

/// A supply seen from its first rail at one current: open-circuit volts behind a resistance.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Thevenin {
    pub volts: f64,
    pub resistance: f64,
}

/// Volts that the source reaches when nothing draws current.
pub fn unloaded_volts(source: &Source) -> f64 {
    match source {
        Source::Plain { volts, .. } => volts.0,
        Source::Rectified {
            secondary,
            rectifier,
            ..
        } => peak_volts(secondary.0, *rectifier),
    }
}

fn peak_volts(secondary_rms: f64, rectifier: Rectifier) -> f64 {
    let drop = match rectifier {
        Rectifier::SiliconBridge => 2.0 * SILICON_DROP_V,
        Rectifier::SiliconFullWave => SILICON_DROP_V,
        Rectifier::TubeFullWave { .. } => 0.0,
    };
    (SQRT_2 * secondary_rms - drop).max(0.0)
}

/// The source as a straight line through its operating point at `amperes`.
///
/// Full-wave rectifier into a large capacitor, half conduction angle θ, source resistance Rs:
///
/// ```text
/// Vdc = Vpk cos θ     tan θ − θ = π·Rs/(2·RL)     so that  Idc = 2·Vpk·(sin θ − θ cos θ)/(π·Rs)
/// −dVdc/dIdc = π·Rs/(2θ)
/// ```
///
/// The closed form behind O. H. Schade's curves (Proc. IRE 31, 1943), good to the ripple being small. A
/// vacuum rectifier adds Vd/Ipk with the 3/2-power law Ipk = P·Vd^1.5 at the peak current
/// Ipk = (Vpk − Vdc)/Rs; its slope is taken by differences. Beyond the current at which θ = π/2 the
/// supply gives 0 V.
pub fn thevenin(source: &Source, amperes: f64) -> Thevenin {
    match source {
        Source::Plain { volts, resistance } => Thevenin {
            volts: volts.0,
            resistance: resistance.0,
        },
        Source::Rectified {
            secondary,
            winding_resistance,
            rectifier,
        } => {
            let peak = peak_volts(secondary.0, *rectifier);
            let rectified = Rectified {
                peak,
                winding: winding_resistance.0,
                rectifier: *rectifier,
            };
            // Below a hundredth of a milliampere the slope grows without bound; the line stays finite.
            let amperes = amperes.max(1e-5);
            let volts = rectified.volts(amperes);
            let step = 1e-4 * amperes;
            let slope =
                (rectified.volts(amperes - step) - rectified.volts(amperes + step)) / (2.0 * step);
            let resistance = slope.max(1e-3);
            Thevenin {
                volts: volts + resistance * amperes,
                resistance,
            }
        }
    }
}

struct Rectified {
    peak: f64,
    winding: f64,
    rectifier: Rectifier,
}

impl Rectified {
    /// Rs at half conduction angle θ, in ohms.
    fn series_resistance(&self, theta: f64) -> f64 {
        let Rectifier::TubeFullWave { perveance } = self.rectifier else {
            return self.winding;
        };
        // r = Rw + Vd/Ipk with Vd = (Ipk/P)^(2/3) and Ipk = Vpk(1 − cos θ)/r: a contraction by a third.
        let mut r = self.winding + 100.0;
        for _ in 0..60 {
            let i_peak = (self.peak * (1.0 - theta.cos()) / r).max(1e-9);
            r = self.winding + i_peak.powf(-1.0 / 3.0) * perveance.powf(-2.0 / 3.0);
        }
        r
    }

    fn volts(&self, amperes: f64) -> f64 {
        let excess = |theta: f64| {
            2.0 * self.peak * (theta.sin() - theta * theta.cos())
                / (PI * self.series_resistance(theta))
                - amperes
        };
        let (mut low, mut high) = (1e-9, FRAC_PI_2);
        if excess(high) <= 0.0 {
            return 0.0;
        }
        for _ in 0..100 {
            let middle = 0.5 * (low + high);
            if excess(middle) > 0.0 {
                high = middle;
            } else {
                low = middle;
            }
        }
        self.peak * (0.5 * (low + high)).cos()
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::units::{Ohms, VoltsRms};

    /// The large-capacitor limit of the standard curves: Vdc/Vpk at Rs/RL of 1, 2, 5, 10 and 20 %,
    /// to one unit of the third printed digit.
    #[test]
    fn the_closed_form_meets_the_large_capacitor_limit() {
        for (share, expected) in [
            (0.01, 0.938),
            (0.02, 0.904),
            (0.05, 0.832),
            (0.10, 0.752),
            (0.20, 0.645),
        ] {
            let source = Source::Rectified {
                secondary: VoltsRms(250.0),
                winding_resistance: Ohms(100.0),
                rectifier: Rectifier::SiliconFullWave,
            };
            let peak = unloaded_volts(&source);
            let volts = peak * expected;
            let amperes = volts / (100.0 / share);
            let line = thevenin(&source, amperes);
            let found = (line.volts - line.resistance * amperes) / peak;
            assert!((found - expected).abs() < 1e-3, "{share}: {found}");
        }
    }

    #[test]
    fn the_slope_is_pi_rs_over_two_theta() {
        let source = Source::Rectified {
            secondary: VoltsRms(250.0),
            winding_resistance: Ohms(100.0),
            rectifier: Rectifier::SiliconBridge,
        };
        let peak = unloaded_volts(&source);
        let theta = 0.5f64;
        let amperes = 2.0 * peak * (theta.sin() - theta * theta.cos()) / (PI * 100.0);
        let line = thevenin(&source, amperes);
        assert!((line.resistance - PI * 100.0 / (2.0 * theta)).abs() < 1e-2);
    }
}
