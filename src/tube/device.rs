//! A tube as a circuit sees it: connection and sections in parallel applied.

use std::sync::Arc;

use super::entry::{Capacitances, Law, Tube};

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

impl Currents {
    #[inline]
    fn times(self, n: f64) -> Currents {
        Currents {
            ip: self.ip * n,
            is: self.is * n,
            ig: self.ig * n,
            ip_g: self.ip_g * n,
            ip_s: self.ip_s * n,
            ip_p: self.ip_p * n,
            is_g: self.is_g * n,
            is_s: self.is_s * n,
            is_p: self.is_p * n,
            ig_g: self.ig_g * n,
            ig_p: self.ig_p * n,
        }
    }
}

/// One or more sections of a tube in parallel, as connected in a stage.
#[derive(Clone, Debug)]
pub struct Device {
    tube: Arc<Tube>,
    triode_connected: bool,
    parallel: u32,
}

impl Device {
    /// `parallel` sections of `tube`; `triode_connected` ties a pentode's screen to its plate (a triode ignores it).
    ///
    /// # Panics
    /// When `parallel` is zero.
    pub fn new(tube: &Arc<Tube>, triode_connected: bool, parallel: u32) -> Device {
        assert!(parallel > 0, "a stage has at least one tube section");
        Device {
            triode_connected: triode_connected && matches!(tube.law, Law::Pentode(_)),
            tube: Arc::clone(tube),
            parallel,
        }
    }

    /// The catalog entry behind it.
    pub fn tube(&self) -> &Tube {
        &self.tube
    }

    /// Sections in parallel.
    pub fn parallel(&self) -> u32 {
        self.parallel
    }

    /// True for a pentode with its screen tied to its plate.
    pub fn is_triode_connected(&self) -> bool {
        self.triode_connected
    }

    /// True when the screen is a terminal of its own: a pentode not connected as a triode.
    pub fn has_screen_port(&self) -> bool {
        matches!(self.tube.law, Law::Pentode(_)) && !self.triode_connected
    }

    /// Currents into the terminals at these volts to the cathode.
    ///
    /// For a triode and a triode-connected pentode `v_sk` counts for nothing, `is` and its slopes are zero, and
    /// `ip` is all that plate and screen take together.
    #[inline]
    pub fn currents(&self, v_gk: f64, v_sk: f64, v_pk: f64) -> Currents {
        let c = self.electrode_currents(v_gk, v_sk, v_pk);
        if !self.triode_connected {
            return c;
        }
        Currents {
            ip: c.ip + c.is,
            is: 0.0,
            ip_g: c.ip_g + c.is_g,
            ip_p: c.ip_p + c.is_p,
            is_g: 0.0,
            is_p: 0.0,
            ..c
        }
    }

    /// Like [`Device::currents`], but plate and screen apart in triode connection too, as their dissipations need.
    ///
    /// There the screen moves with the plate: `ip_p` and `is_p` are slopes over the volts of both, `ip_s` and `is_s` zero.
    #[inline]
    pub fn electrode_currents(&self, v_gk: f64, v_sk: f64, v_pk: f64) -> Currents {
        let mut c = match &self.tube.law {
            Law::Triode(law) => law.currents(v_gk, v_pk),
            Law::Pentode(law) if self.triode_connected => {
                let c = law.currents(v_gk, v_pk, v_pk);
                Currents {
                    ip_p: c.ip_p + c.ip_s,
                    is_p: c.is_p + c.is_s,
                    ip_s: 0.0,
                    is_s: 0.0,
                    ..c
                }
            }
            Law::Pentode(law) => law.currents(v_gk, v_sk, v_pk),
        };
        let grid = self.tube.grid_law.current(v_gk, v_pk);
        c.ig = grid.ig;
        c.ig_g = grid.ig_g;
        c.ig_p = grid.ig_p;
        if self.parallel == 1 {
            c
        } else {
            c.times(f64::from(self.parallel))
        }
    }

    /// Interelectrode capacitances of all sections together.
    pub fn capacitances(&self) -> Capacitances {
        let n = f64::from(self.parallel);
        let one = &self.tube.capacitances;
        Capacitances {
            grid_plate: one.grid_plate * n,
            grid_cathode: one.grid_cathode * n,
            plate_cathode: one.plate_cathode * n,
        }
    }
}
