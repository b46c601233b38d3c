//! Grid current, for any tube.
//!
//! # Types without grid-current data
//!
//! Of the shipped types only the 12AT7 has published grid current above a few microamperes. The others' entries say *assumed*
//! and hold a stand-in: the 12AT7's exponents and sharpness, with its perveance G scaled by space current,
//!
//! ```text
//! G = G(12AT7) I0/I0(12AT7),    I0 = ip + is at vg = +2 V, vp = vs = 100 V,
//! ```
//!
//! and Q = 0 for pentodes, whose screen shields the grid from the plate. Onset volts are the 12AT7's too, except where a mark is
//! published (12AU7, EL84). Constants of one type have been seen to miss another's currents by factors of 2 to 6, so
//! treat an assumed grid current as right in its onset within a few tenths of a volt, and in its size within such a factor.

use super::softplus::{VOLTS_LIMIT, softplus};

/// Grid volts at and below which no grid current flows. Chosen: published marks (0.3 µA at -1.3 V or above) lie near, and
/// an endless exponential tail would make every sample of a clean sound a solve.
const END_OF_TAIL: f64 = -1.0;

/// Plate volts added before the weak power of [`GridParameters::plate_exponent`], so that it stays finite at zero.
/// Fitted with the 12AT7's published grid currents from 27 to 302 V.
const PLATE_OFFSET: f64 = 3.0;

/// Parameters of [`GridLaw`], with the symbols of its equations.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct GridParameters {
    /// G, in A/V^ξ.
    pub perveance: f64,
    /// ξ.
    pub current_exponent: f64,
    /// Q: how fast grid current falls with rising plate volts; 0 where a screen shields the grid.
    pub plate_exponent: f64,
    /// V_o, in V.
    pub onset_volts: f64,
    /// C, in 1/V: sharpness of the onset.
    pub onset_sharpness: f64,
}

/// Grid-current law.
///
/// All volts to the cathode; S(z) = ln(1 + e^z), and plate volts below zero count as zero:
///
/// ```text
/// u  = max(S(C (vg - Vo)) - S(C (-1 V - Vo)), 0)/C
/// ig = G u^ξ ((vp + 3 V)/100 V)^-Q
/// ```
///
/// Never negative (gas and leakage currents are left out), finite for all finite volts (held within ±1 MV), never falling with
/// rising grid volts, exactly zero at -1 V and below. The softplus power is the form of K. Dempwolf and U. Zölzer,
/// "A physically-motivated triode model for circuit simulations", DAFx 2011.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct GridLaw {
    parameters: GridParameters,
    tail: f64,
    ln_perveance: f64,
}

/// Grid current in A and its slopes over grid and plate volts, in A/V.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct GridCurrent {
    pub ig: f64,
    pub ig_g: f64,
    pub ig_p: f64,
}

impl GridLaw {
    /// The law with these parameters; their ranges are the tube file's business.
    pub fn new(parameters: GridParameters) -> GridLaw {
        let p = &parameters;
        GridLaw {
            tail: softplus(p.onset_sharpness * (END_OF_TAIL - p.onset_volts)).value
                / p.onset_sharpness,
            ln_perveance: p.perveance.ln() + p.plate_exponent * 100_f64.ln(),
            parameters,
        }
    }

    /// The parameters it was made from.
    pub fn parameters(&self) -> &GridParameters {
        &self.parameters
    }

    /// Grid current and slopes at these volts to the cathode.
    #[inline]
    pub fn current(&self, v_gk: f64, v_pk: f64) -> GridCurrent {
        if v_gk <= END_OF_TAIL {
            return GridCurrent::default();
        }
        let k = &self.parameters;
        let vg = v_gk.min(VOLTS_LIMIT);
        let s = softplus(k.onset_sharpness * (vg - k.onset_volts));
        let u = s.value / k.onset_sharpness - self.tail;
        if u <= 0.0 {
            return GridCurrent::default();
        }
        let shifted = v_pk.clamp(0.0, VOLTS_LIMIT) + PLATE_OFFSET;
        let mut ln_ig = self.ln_perveance + k.current_exponent * u.ln();
        if k.plate_exponent != 0.0 {
            ln_ig -= k.plate_exponent * shifted.ln();
        }
        let ig = ln_ig.exp();
        GridCurrent {
            ig,
            ig_g: ig * k.current_exponent * s.slope / u,
            ig_p: if v_pk > 0.0 {
                -ig * k.plate_exponent / shifted
            } else {
                0.0
            },
        }
    }
}
