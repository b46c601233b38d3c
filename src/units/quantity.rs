use super::notation::{self, DBU_REFERENCE, DBV_REFERENCE, NotationError};
use super::unit::Unit;
use std::fmt;
use std::str::FromStr;

macro_rules! quantity {
    ($(#[$doc:meta])* $name:ident, $symbol:literal) => {
        $(#[$doc])*
        #[derive(Clone, Copy, Debug, PartialEq, PartialOrd, Default)]
        pub struct $name(pub f64);

        impl $name {
            /// Unit symbol.
            pub const SYMBOL: &'static str = $symbol;

            /// Value in the SI base unit.
            pub fn si(self) -> f64 {
                self.0
            }
        }

        /// Reads component notation, see [`notation`].
        impl FromStr for $name {
            type Err = NotationError;

            fn from_str(text: &str) -> Result<Self, NotationError> {
                notation::parse(text, Unit::$name).map(Self)
            }
        }

        impl fmt::Display for $name {
            fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
                f.write_str(&notation::engineering(self.0, $symbol))
            }
        }
    };
}

quantity!(
    /// Direct or instantaneous voltage, in volts.
    Volts, "V"
);
quantity!(
    /// Peak voltage of an alternating signal, in volts.
    VoltsPeak, "V"
);
quantity!(
    /// Root-mean-square voltage, in volts.
    VoltsRms, "V"
);
quantity!(
    /// Current, in amperes.
    Amperes, "A"
);
quantity!(
    /// Resistance or impedance magnitude, in ohms.
    Ohms, "Ω"
);
quantity!(
    /// Capacitance, in farads.
    Farads, "F"
);
quantity!(
    /// Inductance, in henries.
    Henries, "H"
);
quantity!(
    /// Frequency, in hertz.
    Hertz, "Hz"
);
quantity!(
    /// Power, in watts.
    Watts, "W"
);

impl VoltsPeak {
    /// Level of a sine with this peak, in dBV (RMS re 1 V): 20·lg(peak/√2). Minus infinity for silence.
    pub fn dbv(self) -> f64 {
        20.0 * (self.0 / (std::f64::consts::SQRT_2 * DBV_REFERENCE)).log10()
    }

    /// Level of a sine with this peak, in dBu (RMS re 0.7746 V). Minus infinity for silence.
    pub fn dbu(self) -> f64 {
        20.0 * (self.0 / (std::f64::consts::SQRT_2 * DBU_REFERENCE)).log10()
    }

    /// RMS volts of a sine with this peak: peak/√2.
    pub fn sine_rms(self) -> VoltsRms {
        VoltsRms(self.0 / std::f64::consts::SQRT_2)
    }
}

impl VoltsRms {
    /// Peak volts of a sine with this RMS value: √2·RMS.
    pub fn sine_peak(self) -> VoltsPeak {
        VoltsPeak(self.0 * std::f64::consts::SQRT_2)
    }
}
