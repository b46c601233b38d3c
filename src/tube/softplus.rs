/// Softplus S(z) = ln(1 + e^z) with what its users need beside it.
#[derive(Clone, Copy, Debug)]
pub(super) struct Softplus {
    /// S(z), > 0.
    pub value: f64,
    /// Slope of S: the logistic function of z, from 0 to 1.
    pub slope: f64,
    /// S(z) - z * slope, > 0, summed from positive parts so that nothing cancels.
    pub rest: f64,
}

/// S(z) to full relative precision for every finite z > -700, and S(-700) below: subnormal numbers, slow on many
/// processors, never arise.
#[inline]
pub(super) fn softplus(z: f64) -> Softplus {
    let e = (-z.abs().min(700.0)).exp();
    let u = 1.0 + e;
    let d = 1.0 / u;
    // ln(1 + e) with what rounding took from 1 + e put back: as exact as `ln_1p`, and faster.
    let l = u.ln() + (e - (u - 1.0)) * d;
    if z > 0.0 {
        Softplus {
            value: z + l,
            slope: d,
            rest: l + z * e * d,
        }
    } else {
        Softplus {
            value: l,
            slope: e * d,
            rest: l - z * e * d,
        }
    }
}

/// Tube laws hold their arguments within this many volts either side of zero, so that squares stay finite.
pub(super) const VOLTS_LIMIT: f64 = 1e6;

/// Argument of a control voltage's softplus below which the space current is under e^-200 A and counted as zero.
pub(super) const DEEP_CUTOFF: f64 = -300.0;

/// Natural log of the space current in A below which a law returns zero: slow subnormal numbers never arise.
pub(super) const LN_CURRENT_FLOOR: f64 = -200.0;

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn softplus_keeps_its_digits_at_both_ends() {
        // Series on paper: S(z) = e^z - e^2z/2 + ... for z << 0, z + e^-z for z >> 0.
        for z in [-600.0_f64, -50.0, -20.0] {
            let s = softplus(z);
            assert!((s.value / z.exp() - 1.0 + z.exp() / 2.0).abs() < 1e-14);
            assert!((s.rest / (z.exp() * (1.0 - z)) - 1.0).abs() < 1e-8);
        }
        for z in [20.0_f64, 50.0, 600.0] {
            let s = softplus(z);
            assert_eq!(s.value, z + (-z).exp());
            let rest = (1.0 + z) * (-z).exp();
            assert!((s.rest / rest - 1.0).abs() < 1e-7, "{z}: {}", s.rest);
        }
        assert_eq!(softplus(0.0).value, std::f64::consts::LN_2);
    }
}
