//! Plate current of triodes.

use super::device::Currents;
use super::softplus::{DEEP_CUTOFF, LN_CURRENT_FLOOR, VOLTS_LIMIT, softplus};

/// Sharpness, in 1/V, of the turn at zero grid volts from which a positive grid softens the low-plate factor. Chosen.
const POSITIVE_GRID_SHARPNESS: f64 = 4.0;

/// Fitted parameters of [`TriodeLaw`], with the symbols of its equations.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TriodeParameters {
    /// µ: plate volts worth one grid volt.
    pub amplification_factor: f64,
    /// X: exponent of the space current, 1.5 for an ideal diode.
    pub current_exponent: f64,
    /// K_g, in V^X/A: the larger, the less current.
    pub inverse_perveance: f64,
    /// K_p: the larger, the sharper the cutoff.
    pub cutoff_sharpness: f64,
    /// K_vb, in V²: floor of the softness.
    pub softness_floor: f64,
    /// V_ct, in V: contact potential, added to the grid volts.
    pub contact_volts: f64,
    /// V_0, in V: plate volts within which the plate takes less than the space current.
    pub low_plate_volts: f64,
    /// V_A, in V per positive grid volt: how that range grows.
    pub low_plate_growth: f64,
}

/// Plate-current law of triodes.
///
/// All volts to the cathode; S(z) = ln(1 + e^z), and plate volts below zero count as zero:
///
/// ```text
/// c  = sqrt(Kvb + vp²)/Kp                       softness of the cutoff, in grid volts
/// E  = c S((vp/µ + vg + Vct)/c)                 control voltage
/// ip = E^X/Kg (1 - exp(-vp/(V0 + VA sg))),      sg = S(4 vg)/4
/// ```
///
/// Finite and never negative for all finite volts (held within ±1 MV), zero for a plate at or below the cathode, never
/// falling with rising plate volts. Space current under e^-200 A counts as zero. Slopes are the analytic
/// derivatives; at and below zero plate volts they are zero (the left-hand ones).
///
/// The control voltage follows N. L. Koren, "Improved vacuum tube models", Glass Audio 8(5),
/// 1996, with its constant K_vb moved from the grid's weight to the softness.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TriodeLaw {
    parameters: TriodeParameters,
    inverse_mu: f64,
    inverse_kp: f64,
    ln_kg: f64,
}

impl TriodeLaw {
    /// The law with these parameters; their ranges are the tube file's business.
    pub fn new(parameters: TriodeParameters) -> TriodeLaw {
        TriodeLaw {
            inverse_mu: 1.0 / parameters.amplification_factor,
            inverse_kp: 1.0 / parameters.cutoff_sharpness,
            ln_kg: parameters.inverse_perveance.ln(),
            parameters,
        }
    }

    /// The parameters it was made from.
    pub fn parameters(&self) -> &TriodeParameters {
        &self.parameters
    }

    /// Plate current and slopes at these volts to the cathode; grid current is another law's.
    #[inline]
    pub fn currents(&self, v_gk: f64, v_pk: f64) -> Currents {
        let k = &self.parameters;
        if v_pk <= 0.0 {
            return Currents::default();
        }
        let vg = v_gk.clamp(-VOLTS_LIMIT, VOLTS_LIMIT);
        let vp = v_pk.min(VOLTS_LIMIT);

        let root = (k.softness_floor + vp * vp).sqrt();
        let c = root * self.inverse_kp;
        let y = (vp * self.inverse_mu + vg + k.contact_volts) / c;
        if y < DEEP_CUTOFF {
            return Currents::default();
        }
        let s = softplus(y);
        let e = c * s.value;
        let ln_i0 = k.current_exponent * e.ln() - self.ln_kg;
        if ln_i0 < LN_CURRENT_FLOOR {
            return Currents::default();
        }
        let i0 = ln_i0.exp();
        let scale = k.current_exponent / e;
        let i0_g = scale * s.slope;
        let i0_p = scale * (s.slope * self.inverse_mu + s.rest * vp / root * self.inverse_kp);

        // Low-plate factor F = 1 - exp(-q) and its slopes.
        let g = softplus(POSITIVE_GRID_SHARPNESS * vg);
        let inverse_v = 1.0
            / (k.low_plate_volts + k.low_plate_growth * g.value * (1.0 / POSITIVE_GRID_SHARPNESS));
        let q = vp * inverse_v;
        let (f, rest) = if q > 40.0 {
            (1.0, 0.0)
        } else if q > 1.0 {
            let rest = (-q).exp();
            (1.0 - rest, rest)
        } else {
            // Close to zero the difference needs all its digits.
            let f = -(-q).exp_m1();
            (f, 1.0 - f)
        };
        let f_p = rest * inverse_v;
        let f_g = -f_p * q * k.low_plate_growth * g.slope;
        Currents {
            ip: i0 * f,
            ip_g: i0 * (i0_g * f + f_g),
            ip_p: i0 * (i0_p * f + f_p),
            ..Currents::default()
        }
    }
}
