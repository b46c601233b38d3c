//! Plate and screen current of pentodes and beam tetrodes.

use super::device::Currents;
use super::softplus::{DEEP_CUTOFF, LN_CURRENT_FLOOR, VOLTS_LIMIT, softplus};

/// Floor of the softness, in V²: with no field at all the cutoff is still rounded over 20 V / `cutoff_sharpness`.
///
/// Chosen: common to all types in a joint fit, where leaving it free gained nothing.
const SOFTNESS_FLOOR: f64 = 400.0;

/// Plate-to-screen volts ratio added to the true one, so that the division of current does not start with
/// an infinite slope at zero plate volts. Chosen: fixed in the joint fit at little cost.
const RATIO_OFFSET: f64 = 0.05;

/// How fast a rising grid moves current from screen to plate. Chosen: fits prefer 0.8 to 1.5; at 1 the screen current
/// does not fall with rising grid volts where it matters.
const GRID_DIVISION: f64 = 1.0;

/// Plate volts below which the plate takes nothing (3/2-power line under 1e-20 A): the line's logarithm stays finite.
const NO_PLATE: f64 = 1e-12;

/// Fitted parameters of [`PentodeLaw`], with the symbols of its equations.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct PentodeParameters {
    /// µ: screen volts worth one grid volt.
    pub screen_amplification_factor: f64,
    /// X: exponent of the space current, 1.5 for an ideal diode.
    pub current_exponent: f64,
    /// K_g, in V^X/A: the larger, the less current.
    pub inverse_perveance: f64,
    /// K_p: the larger, the sharper the cutoff.
    pub cutoff_sharpness: f64,
    /// V_ct, in V: contact potential, added to the grid volts.
    pub contact_volts: f64,
    /// D: plate volts reach the cathode with this weight beside the screen's.
    pub plate_penetration: f64,
    /// δ: plate current over screen current at equal volts and grid at cathode potential, knee aside.
    pub division_ratio: f64,
    /// m: exponent of the volts ratio in that division.
    pub division_exponent: f64,
    /// P, in A: the most a plate at 10 V takes.
    pub limit_current_at_ten_volts: f64,
    /// s: sharpness of the knee.
    pub knee_sharpness: f64,
    /// τ: share of the current refused by the plate that lands on the screen.
    pub returned_share: f64,
    /// A part of the cathode behind a coarser or finer piece of grid, where the type needs one.
    pub second_section: Option<SecondSection>,
}

/// A part of the space current with an amplification factor of its own.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SecondSection {
    /// W: weight of the second section, 0 to 1.
    pub share: f64,
    /// Its amplification factor over the first's.
    pub amplification_ratio: f64,
}

/// Current law of pentodes and beam tetrodes.
///
/// All volts to the cathode; S(z) = ln(1 + e^z), and volts below zero count as zero for plate and screen:
///
/// ```text
/// ve = vs + D vp                                    field seen through the screen
/// c  = sqrt(400 V² + ve²)/Kp                        softness of the cutoff, in grid volts
/// E  = c S((ve/µ + vg + Vct)/c)                     control voltage
/// I0 = E^X/Kg                                       space current
/// t  = µ vg,  z = t/sqrt(vs² + t² + 1 V²)           grid against screen, -1 to 1
/// x̂  = (vp/(vs + 1 V) + 0.05)/1.05
/// R  = δ x̂^m e^z                                    plate-to-screen division
/// A  = I0 R/(1 + R)                                 what the plate would take
/// B  = P (vp/10 V)^1.5                              the most it can take
/// ip = A B/(A^s + B^s)^(1/s)                        the smaller of the two, rounded
/// is = I0/(1 + R) + τ (A - ip)
/// ```
///
/// With a second section I0 = ((1 - W) E(µ)^X + W E(ratio µ)^X)/Kg.
///
/// Currents are finite and never negative for all finite volts (held within ±1 MV), `ip` never falls with rising plate or
/// grid volts and is zero for a plate at or below the cathode. Space current under e^-200 A counts as zero.
/// Slopes are the analytic derivatives; at and below zero, plate and screen slopes are zero (the left-hand ones).
/// Not covered: secondary emission at low plate volts and strongly negative grid; temperature.
///
/// The control voltage follows N. L. Koren, "Improved vacuum tube models", Glass Audio 8(5),
/// 1996; division of current as a power of the volts ratio is the classical form after Tank; the limit line is the 3/2-power
/// diode law. Triode connection is the same law with the screen at plate volts.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct PentodeLaw {
    parameters: PentodeParameters,
    inverse_mu: f64,
    inverse_kp: f64,
    ln_kg: f64,
    ln_division: f64,
    ln_limit: f64,
    inverse_s: f64,
    second: Option<Second>,
}

#[derive(Clone, Copy, Debug, PartialEq)]
struct Second {
    inverse_mu: f64,
    ln_first_share: f64,
    ln_second_share: f64,
}

/// Log of a control voltage (or of the space current), with its slopes over grid volts and field.
#[derive(Clone, Copy)]
struct LnSlopes {
    ln: f64,
    by_g: f64,
    by_e: f64,
}

impl PentodeLaw {
    /// The law with these parameters; their ranges are the tube file's business.
    pub fn new(parameters: PentodeParameters) -> PentodeLaw {
        let p = &parameters;
        PentodeLaw {
            inverse_mu: 1.0 / p.screen_amplification_factor,
            inverse_kp: 1.0 / p.cutoff_sharpness,
            ln_kg: p.inverse_perveance.ln(),
            ln_division: p.division_ratio.ln() - p.division_exponent * (1.0 + RATIO_OFFSET).ln(),
            ln_limit: p.limit_current_at_ten_volts.ln() - 1.5 * 10_f64.ln(),
            inverse_s: 1.0 / p.knee_sharpness,
            second: p.second_section.map(|s| Second {
                inverse_mu: 1.0 / (p.screen_amplification_factor * s.amplification_ratio),
                ln_first_share: (1.0 - s.share).ln(),
                ln_second_share: s.share.ln(),
            }),
            parameters,
        }
    }

    /// The parameters it was made from.
    pub fn parameters(&self) -> &PentodeParameters {
        &self.parameters
    }

    /// Plate and screen currents and slopes at these volts to the cathode; grid current is another law's.
    #[inline]
    pub fn currents(&self, v_gk: f64, v_sk: f64, v_pk: f64) -> Currents {
        let k = &self.parameters;
        let vg = v_gk.clamp(-VOLTS_LIMIT, VOLTS_LIMIT);
        let vs = v_sk.clamp(0.0, VOLTS_LIMIT);
        let vp = v_pk.clamp(0.0, VOLTS_LIMIT);

        let Some(space) = self.space_current(vg, vs, vp) else {
            return Currents::default();
        };
        let i0 = space.ln.exp();
        let s_on = if v_sk > 0.0 { 1.0 } else { 0.0 };
        let i0_g = space.by_g;
        let i0_s = space.by_e * s_on;
        let i0_p = space.by_e * k.plate_penetration;

        // Division between plate and screen: ln R and its slopes.
        let t = k.screen_amplification_factor * vg;
        let inverse_q = 1.0 / (vs * vs + t * t + 1.0).sqrt();
        let inverse_q3 = inverse_q * inverse_q * inverse_q;
        let inverse_vs1 = 1.0 / (vs + 1.0);
        let x = vp * inverse_vs1;
        let m_per_x = k.division_exponent / (x + RATIO_OFFSET);
        let ln_r = self.ln_division
            + k.division_exponent * (x + RATIO_OFFSET).ln()
            + GRID_DIVISION * t * inverse_q;
        let r_g = GRID_DIVISION * k.screen_amplification_factor * (vs * vs + 1.0) * inverse_q3;
        let r_s = (-m_per_x * x * inverse_vs1 - GRID_DIVISION * t * vs * inverse_q3) * s_on;
        let r_p = m_per_x * inverse_vs1;
        let r = ln_r.exp();
        let to_screen = 1.0 / (1.0 + r);
        let to_plate = r * to_screen;

        // What the plate would take, and the screen's own share.
        let a = i0 * to_plate;
        let (a_g, a_s, a_p) = (
            i0_g + to_screen * r_g,
            i0_s + to_screen * r_s,
            i0_p + to_screen * r_p,
        );
        let own = i0 * to_screen;
        let (own_g, own_s, own_p) = (
            i0_g - to_plate * r_g,
            i0_s - to_plate * r_s,
            i0_p - to_plate * r_p,
        );

        if v_pk < NO_PLATE {
            let tau_a = k.returned_share * a;
            return Currents {
                is: own + tau_a,
                is_g: own * own_g + tau_a * a_g,
                is_s: own * own_s + tau_a * a_s,
                ..Currents::default()
            };
        }

        // Smooth minimum with the limit line: w = s ln(A/B).
        let ln_a_over_limit = space.ln + ln_r - self.ln_limit - ((1.0 + r) * vp * vp.sqrt()).ln();
        let w = k.knee_sharpness * ln_a_over_limit;
        // Soft is only ever exponentiated, so its absolute precision counts and ln(1 + e) needs no care near zero.
        let e = (-w.abs().min(300.0)).exp();
        let d = 1.0 / (1.0 + e);
        let l = (1.0 + e).ln();
        let (soft, limited) = if w > 0.0 { (w + l, d) } else { (l, e * d) };
        let free = 1.0 - limited;
        let ip = a * (-soft * self.inverse_s).max(-700.0).exp();
        let ip_g = ip * free * a_g;
        let ip_s = ip * free * a_s;
        let ip_p = ip * (free * a_p + limited * 1.5 / vp);
        let tau = k.returned_share;
        Currents {
            ip,
            is: own + tau * (a - ip),
            ip_g,
            ip_s,
            ip_p,
            is_g: own * own_g + tau * (a * a_g - ip_g),
            is_s: own * own_s + tau * (a * a_s - ip_s),
            is_p: own * own_p + tau * (a * a_p - ip_p),
            ..Currents::default()
        }
    }

    /// ln I0 and its slopes over grid volts and field, or none in deep cutoff.
    #[inline]
    fn space_current(&self, vg: f64, vs: f64, vp: f64) -> Option<LnSlopes> {
        let k = &self.parameters;
        let ve = vs + k.plate_penetration * vp;
        let root = (SOFTNESS_FLOOR + ve * ve).sqrt();
        let c = root * self.inverse_kp;
        let c_e = ve / root * self.inverse_kp;
        let v_control = vg + k.contact_volts;
        let section = |inverse_mu: f64| {
            let y = (ve * inverse_mu + v_control) / c;
            (y > DEEP_CUTOFF).then(|| {
                let s = softplus(y);
                let e = c * s.value;
                let scale = k.current_exponent / e;
                LnSlopes {
                    ln: k.current_exponent * e.ln() - self.ln_kg,
                    by_g: scale * s.slope,
                    by_e: scale * (s.slope * inverse_mu + s.rest * c_e),
                }
            })
        };
        let first = section(self.inverse_mu);
        let total = match &self.second {
            None => first?,
            Some(second) => {
                let shared = |s: LnSlopes, ln_share: f64| LnSlopes {
                    ln: s.ln + ln_share,
                    ..s
                };
                let first = first.map(|s| shared(s, second.ln_first_share));
                let other = section(second.inverse_mu).map(|s| shared(s, second.ln_second_share));
                match (first, other) {
                    (Some(a), Some(b)) => {
                        let s = softplus(b.ln - a.ln);
                        LnSlopes {
                            ln: a.ln + s.value,
                            by_g: a.by_g + (b.by_g - a.by_g) * s.slope,
                            by_e: a.by_e + (b.by_e - a.by_e) * s.slope,
                        }
                    }
                    (one, none) => one.or(none)?,
                }
            }
        };
        (total.ln > LN_CURRENT_FLOOR).then_some(total)
    }
}
