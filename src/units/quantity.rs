use std::fmt;

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

        impl fmt::Display for $name {
            fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
                f.write_str(&super::notation::engineering(self.0, $symbol))
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
