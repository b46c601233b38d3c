//! One tube in several lanes: its grid solved against its surface, and what it remembers between samples.

use std::sync::Arc;

use super::lanes::V;
use super::model::StageRest;
use crate::numeric::table::{Sample, Spot};
use crate::stage::surface::Surface;

/// A grid voltage counts as found when Newton's last step was smaller than this, in volts.
///
/// The currents are carried on along their slopes by that step, so what remains is half their curvature
/// times its square: below 1e-10 A for every tube of the catalog.
const GRID_SETTLED_V: f64 = 3e-4;
const GRID_ITERATIONS: usize = 40;
/// Largest step of the grid's iteration, in volts: keeps the corner of conduction from throwing it.
const STEP_LIMIT_V: f64 = 20.0;

/// A step within [`STEP_LIMIT_V`]; not-a-number passes through.
#[inline(always)]
#[allow(clippy::manual_clamp)] // two compares are half of what `clamp` compiles to
fn bounded(step: f64) -> f64 {
    if step > STEP_LIMIT_V {
        STEP_LIMIT_V
    } else if step < -STEP_LIMIT_V {
        -STEP_LIMIT_V
    } else {
        step
    }
}

#[inline(always)]
fn settled(step: f64) -> bool {
    step < GRID_SETTLED_V && step > -GRID_SETTLED_V
}

/// Impedances between this plate and the next grid and back, and this grid's own, in ohms.
pub struct Reach<const L: usize> {
    /// 0 for the last stage, as is `z_gp`.
    pub z_pg: V<L>,
    pub z_gp: V<L>,
    pub z_gg_own: V<L>,
}

/// Open-circuit volts of a stage's ports.
pub struct Open<const L: usize> {
    pub grid: V<L>,
    pub plate: V<L>,
    pub cathode: V<L>,
    pub screen: Option<V<L>>,
}

/// Currents out of a stage's ports, in amperes.
pub struct Drawn<const L: usize> {
    pub grid: V<L>,
    pub plate: V<L>,
    pub cathode: V<L>,
    pub screen: V<L>,
}

/// What a stage passes on to the one behind it before both are settled.
pub struct Handed<const L: usize> {
    /// What its plate current, as far as known, lowers the next grid by, in volts.
    drop: V<L>,
    /// What its plate resistance takes off the next grid's impedance, in ohms.
    relief: V<L>,
}

/// Counts over a step: looks at a surface, and lanes that left the surface or did not settle.
#[derive(Clone, Copy, Debug, Default)]
pub struct Tally {
    pub looks: u64,
    pub strayed: u64,
}

/// The tube of one stage in every lane.
pub struct Cell<const L: usize> {
    surfaces: [Arc<Surface>; L],
    has_screen: bool,
    reach: Reach<L>,
    z_gp_z_pg: V<L>,
    z_pp: V<L>,
    r_k: V<L>,
    r_k_folded: V<L>,
    r_s: V<L>,
    g_gp: V<L>,
    g_gk: V<L>,
    g_pk: V<L>,
    s0: V<L>,
    per_screen_volt: V<L>,
    // states
    w_gp: V<L>,
    w_gk: V<L>,
    w_pk: V<L>,
    v_last: V<L>,
    v_before: V<L>,
    ig_last: V<L>,
    ig_before: V<L>,
    cap_last: V<L>,
    cap_before: V<L>,
    is_last: V<L>,
    dp_last: V<L>,
    // this sample
    v: V<L>,
    e: V<L>,
    ek: V<L>,
    es: V<L>,
    ip: V<L>,
    is: V<L>,
    ig: V<L>,
    vp: V<L>,
    vk: V<L>,
    slope: V<L>,
    v_over_e: V<L>,
    ig_over_e: V<L>,
    next_estimate: V<L>,
}

/// Samples of a table, one per lane, quantity by quantity.
struct Samples<const L: usize> {
    f: V<L>,
    fx: V<L>,
    fy: V<L>,
}

impl<const L: usize> Samples<L> {
    const ZERO: Self = Samples {
        f: V::ZERO,
        fx: V::ZERO,
        fy: V::ZERO,
    };

    #[inline(always)]
    fn put(&mut self, l: usize, s: Sample) {
        self.f.0[l] = s.f;
        self.fx.0[l] = s.fx;
        self.fy.0[l] = s.fy;
    }
}

impl<const L: usize> Cell<L> {
    pub fn new(surfaces: [Arc<Surface>; L], reach: Reach<L>) -> Cell<L> {
        let of = |f: &dyn Fn(&Surface) -> f64| V::from_fn(|l| f(&surfaces[l]));
        let zero = V::ZERO;
        Cell {
            has_screen: surfaces.iter().all(|s| s.has_screen()),
            z_gp_z_pg: reach.z_gp * reach.z_pg,
            z_pp: of(&|s| s.surroundings.z_pp),
            r_k: of(&|s| s.surroundings.r_k),
            r_k_folded: of(&|s| {
                s.surroundings.r_k / (1.0 + s.surroundings.r_k * s.surroundings.g_gk)
            }),
            r_s: of(&|s| s.surroundings.r_s),
            g_gp: of(&|s| s.surroundings.g_gp),
            g_gk: of(&|s| s.surroundings.g_gk),
            g_pk: of(&|s| s.surroundings.g_pk),
            s0: of(&|s| s.extent.s0),
            per_screen_volt: of(&|s| s.per_screen_volt),
            surfaces,
            reach,
            w_gp: zero,
            w_gk: zero,
            w_pk: zero,
            v_last: zero,
            v_before: zero,
            ig_last: zero,
            ig_before: zero,
            cap_last: zero,
            cap_before: zero,
            is_last: zero,
            dp_last: zero,
            v: zero,
            e: zero,
            ek: zero,
            es: zero,
            ip: zero,
            is: zero,
            ig: zero,
            vp: zero,
            vk: zero,
            slope: zero,
            v_over_e: zero,
            ig_over_e: zero,
            next_estimate: zero,
        }
    }

    /// Fills one lane's memories that only start iterations with their values at rest.
    pub fn remember_rest(&mut self, l: usize, rest: &StageRest) {
        self.v_last.0[l] = rest.v_gk + self.r_k.0[l] * (rest.ip + rest.is);
        self.ig_last.0[l] = 0.0;
        self.cap_last.0[l] = 0.0;
        self.is_last.0[l] = rest.is;
        self.dp_last.0[l] = 0.0;
        self.hold_still(l);
    }

    /// Makes one lane's sample before the last equal to the last.
    pub fn hold_still(&mut self, l: usize) {
        self.v_before.0[l] = self.v_last.0[l];
        self.ig_before.0[l] = self.ig_last.0[l];
        self.cap_before.0[l] = self.cap_last.0[l];
    }

    /// Volts on the tube's own capacitances: grid to plate, grid to cathode, plate to cathode.
    pub fn state(&self, l: usize) -> [f64; 3] {
        [self.w_gp.0[l], self.w_gk.0[l], self.w_pk.0[l]]
    }

    pub fn set_state(&mut self, l: usize, [w_gp, w_gk, w_pk]: [f64; 3]) {
        self.w_gp.0[l] = w_gp;
        self.w_gk.0[l] = w_gk;
        self.w_pk.0[l] = w_pk;
    }

    /// What the tube did at the last step.
    pub fn observe(&self, l: usize) -> Observation {
        let (v, vp, vk) = (self.v.0[l], self.vp.0[l], self.vk.0[l]);
        let (g_gp, g_pk) = (self.g_gp.0[l], self.g_pk.0[l]);
        Observation {
            v_gk: v - vk,
            v_sk: if self.has_screen {
                self.es.0[l] - self.r_s.0[l] * self.is.0[l] - vk
            } else {
                vp - vk
            },
            v_pk: vp - vk,
            v_k: self.ek.0[l] + vk,
            ip: self.ip.0[l] - g_gp * (vp - v) - g_pk * (vp - vk),
            is: self.is.0[l],
            ig: self.ig.0[l],
        }
    }

    /// What this stage's grid will take from the plate before it, carried on from its last two samples.
    #[inline(always)]
    pub fn foreseen(&self) -> V<L> {
        (self.ig_last.twice() - self.ig_before).at_least_zero() + self.cap_last.twice()
            - self.cap_before
    }

    /// What the grid of this stage took from the plate before it at the sample just settled.
    #[inline(always)]
    pub fn taken(&self) -> V<L> {
        self.ig_last + self.cap_last
    }

    /// What the next stage has to know once this one is solved.
    #[inline(always)]
    pub fn hand_on(&self) -> Handed<L> {
        let plate_current = self.ip + self.g_gp * self.w_gp - self.g_pk * self.w_pk;
        let relief = self.z_gp_z_pg * self.slope;
        Handed {
            drop: self.reach.z_gp * plate_current + relief * self.next_estimate,
            relief,
        }
    }

    /// Finds the grid and with it all currents, the next grid's current being `foreseen`.
    #[inline(always)]
    pub fn solve(
        &mut self,
        open: &Open<L>,
        previous: Option<Handed<L>>,
        foreseen: V<L>,
        tally: &mut Tally,
    ) {
        let (z_pp, r_k, r_k_folded) = (self.z_pp, self.r_k, self.r_k_folded);
        let (g_gp, g_gk, g_pk) = (self.g_gp, self.g_gk, self.g_pk);
        self.next_estimate = foreseen;
        let mut p = open.grid;
        let mut r = self.reach.z_gg_own;
        if let Some(previous) = previous {
            p = p - previous.drop;
            r = r - previous.relief;
        }
        let (j_gp, j_gk, j_pk) = (g_gp * self.w_gp, g_gk * self.w_gk, g_pk * self.w_pk);
        let ek = open.cathode - r_k * (j_gk + j_pk);
        let e = open.plate - self.reach.z_pg * foreseen - z_pp * (j_gp - j_pk) - ek;
        p = p + r * (j_gp + j_gk) - ek;
        self.ek = ek;
        self.e = e;
        let (mut ds, mut shift) = (V::ZERO, V::ZERO);
        if let Some(screen) = open.screen {
            self.es = screen - ek;
            ds = self.es - self.s0;
            shift = ds * self.per_screen_volt;
        }
        let lift = ds * self.dp_last;

        // A settled lane keeps its place and its samples, so that working out its step again changes nothing.
        let carried_on = self.v_last.twice() - self.v_before;
        let mut at = V::from_fn(|l| {
            if r.0[l] > 0.0 {
                carried_on.0[l]
            } else {
                p.0[l]
            }
        });
        let mut step = V::ZERO;
        let mut done = [false; L];
        let (mut plate, mut grid) = (Samples::ZERO, Samples::ZERO);
        let mut spots = [Spot::default(); L];
        let mut per_slope = V::ZERO;
        for _ in 0..GRID_ITERATIONS {
            for l in 0..L {
                if !done[l] {
                    tally.looks += 1;
                    at.0[l] += step.0[l];
                    let surface = &*self.surfaces[l];
                    let (sample, spot) = surface.plate(at.0[l] + shift.0[l], e.0[l]);
                    plate.put(l, sample);
                    spots[l] = spot;
                    grid.put(l, surface.grid(at.0[l], e.0[l]));
                }
            }
            let ip = plate.f + lift;
            let through_gp = g_gp * (at - e + z_pp * ip);
            let through_gp_v = g_gp * (V([1.0; L]) + z_pp * plate.fx);
            let vk = r_k_folded * (ip + through_gp + self.is_last + grid.f + g_gk * at);
            let vk_v = r_k_folded * (plate.fx + through_gp_v + grid.fx + g_gk);
            let f = at - p + r * (grid.f + through_gp + g_gk * (at - vk));
            let f_v = V([1.0; L]) + r * (grid.fx + through_gp_v + g_gk * (V([1.0; L]) - vk_v));
            per_slope = f_v.map(|d| 1.0 / d);
            step = (-f * per_slope).map(bounded);
            done = step.0.map(settled);
            if done.iter().all(|d| *d) {
                break;
            }
        }
        let vp_e = V([1.0; L]) - z_pp * plate.fy;
        let vk_e = r_k_folded * (plate.fy - g_gp * vp_e + grid.fy);
        let f_e = r * (grid.fy - g_gp * vp_e - g_gk * vk_e);
        let v_over_e = -f_e * per_slope;
        let v = at + step;
        let new = [
            plate.f + lift + plate.fx * step,
            (grid.f + grid.fx * step).at_least_zero(),
            v_over_e,
            plate.fy + plate.fx * v_over_e,
            grid.fy + grid.fx * v_over_e,
        ];
        for (l, done) in done.into_iter().enumerate() {
            // A lane that did not settle keeps its last currents.
            if done {
                self.ip.0[l] = new[0].0[l];
                self.ig.0[l] = new[1].0[l];
                self.v_over_e.0[l] = new[2].0[l];
                self.slope.0[l] = new[3].0[l];
                self.ig_over_e.0[l] = new[4].0[l];
            }
            // Below its lower edge the tube is off and the surface's straight continuation exact.
            let surface = &*self.surfaces[l];
            if !done || !surface.covers(v.0[l].max(surface.extent.v.0), e.0[l]) {
                tally.strayed += 1;
            }
        }
        self.v = v;
        if self.has_screen {
            for (l, spot) in spots.iter().enumerate() {
                let (is, dp, ds_is) = self.surfaces[l].screen(spot);
                self.is.0[l] = is + ds.0[l] * ds_is;
                self.dp_last.0[l] = dp;
            }
            self.is = self.is.at_least_zero();
        }
        self.place_plate_and_cathode();
    }

    #[inline(always)]
    fn place_plate_and_cathode(&mut self) {
        self.vp = self.e - self.z_pp * self.ip;
        self.vk = self.r_k_folded
            * (self.ip - self.g_gp * (self.vp - self.v) + self.is + self.ig + self.g_gk * self.v);
    }

    /// Settles the stage with the current the next grid has truly taken.
    #[inline(always)]
    pub fn correct(&mut self, taken: V<L>) {
        let change = -self.reach.z_pg * (taken - self.next_estimate);
        self.ip = self.ip + self.slope * change;
        self.v = self.v + self.v_over_e * change;
        self.ig = (self.ig + self.ig_over_e * change).at_least_zero();
        self.e = self.e + change;
        self.place_plate_and_cathode();
    }

    /// Moves the states on and gives the currents to hand to the networks.
    #[inline(always)]
    pub fn advance(&mut self) -> Drawn<L> {
        let (v_gp, v_gk, v_pk) = (self.v - self.vp, self.v - self.vk, self.vp - self.vk);
        let capacitive = self.g_gp * (v_gp - self.w_gp) + self.g_gk * (v_gk - self.w_gk);
        let grid = self.ig + capacitive;
        let plate = self.ip + self.g_gp * self.w_gp - self.g_pk * self.w_pk;
        self.w_gp = v_gp.twice() - self.w_gp;
        self.w_gk = v_gk.twice() - self.w_gk;
        self.w_pk = v_pk.twice() - self.w_pk;
        self.v_before = self.v_last;
        self.v_last = self.v;
        self.ig_before = self.ig_last;
        self.ig_last = self.ig;
        self.cap_before = self.cap_last;
        self.cap_last = capacitive;
        self.is_last = self.is;
        Drawn {
            grid,
            plate,
            cathode: -(grid + plate + self.is),
            screen: self.is,
        }
    }
}

/// What one tube does at one sample.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Observation {
    /// Volts to the cathode.
    pub v_gk: f64,
    pub v_sk: f64,
    pub v_pk: f64,
    /// Cathode to ground.
    pub v_k: f64,
    /// Currents of the tube itself, capacitances left out.
    pub ip: f64,
    pub is: f64,
    pub ig: f64,
}
