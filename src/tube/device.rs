//! A tube as a circuit sees it: connection and sections in parallel applied.

/// Currents into a tube's electrodes and their slopes, in A and A/V.
///
/// `ip`, `is`, `ig` flow into plate, screen and grid; their sum leaves the cathode.
/// `ip_g` is the slope of plate current over grid volts, and so on; all volts to the cathode.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Currents {
    pub ip: f64,
    pub is: f64,
    pub ig: f64,
    pub ip_g: f64,
    pub ip_s: f64,
    pub ip_p: f64,
    pub is_g: f64,
    pub is_s: f64,
    pub is_p: f64,
    pub ig_g: f64,
    pub ig_p: f64,
}

/// One or more sections of a tube in parallel, as connected in a stage.
#[derive(Clone, Debug)]
pub struct Device {}
