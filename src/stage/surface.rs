//! The waveshaper of one stage: its tube solved through everything that hangs on it between two samples.
//!
//! Between two samples every port of a stage sees one source behind one resistance (see
//! [`crate::circuit::companion`]): the plate E behind Zpp, the cathode 0 behind rk, the screen S behind rs,
//! all volts measured from the cathode's open-circuit volts. With the grid held at v the tube's solution
//!
//! ```text
//! E − vp = Zpp (ip + Ggp (vp − v) + Gpk (vp − vk))
//! vk     = rk (ip + is + ig + Gpk (vp − vk) + Ggk (v − vk))
//! S − vs = rs is
//! ```
//!
//! is a surface over (v, E); ip, is, ig are the tube's law at (v − vk, vs − vk, vp − vk) and G = 2C/h the
//! companions of its interelectrode capacitances, whose own sources the caller adds to E, v and the cathode.
//! Solved at grid points with the law itself, with exact slopes by implicit differentiation, and
//! interpolated by bicubic Hermite pieces in between.

use crate::numeric::table::{Axis, Sample, Spot, Table, difference};
use crate::tube::{Currents, Device};

/// What a stage's tube sees between two samples, in ohms and siemens.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Surroundings {
    pub z_pp: f64,
    pub r_k: f64,
    pub r_s: f64,
    pub g_gp: f64,
    pub g_gk: f64,
    pub g_pk: f64,
}

/// Rectangle and fineness of a surface.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Extent {
    pub v: (f64, f64),
    pub e: (f64, f64),
    pub v_cells: usize,
    pub e_cells: usize,
    pub grid_cells: usize,
    pub grid_e_cells: usize,
    /// Screen volts from the cathode's open-circuit volts at which the surface is solved.
    pub s0: f64,
}

/// The solved point under one grid voltage.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Solution {
    pub vp: f64,
    pub vk: f64,
    pub vs: f64,
    pub currents: Currents,
    /// Slopes of (vp, vk, vs) over v, E and S.
    pub over_v: [f64; 3],
    pub over_e: [f64; 3],
    pub over_s: [f64; 3],
}

/// Newton iterations before a point counts as unsolved.
const ITERATIONS: usize = 80;
/// Settled when no voltage moves by more than this, in volts.
const SETTLED_V: f64 = 1e-10;

/// Solves one point; `start` warm-starts (vp, vk, vs).
pub fn solve_point(
    device: &Device,
    s: &Surroundings,
    v: f64,
    e: f64,
    screen: f64,
    start: [f64; 3],
) -> Solution {
    let mut z = start;
    let residual = |z: &[f64; 3], c: &Currents| {
        let plate = c.ip + s.g_gp * (z[0] - v) + s.g_pk * (z[0] - z[1]);
        let cathode = c.ip + c.is + c.ig + s.g_pk * (z[0] - z[1]) + s.g_gk * (v - z[1]);
        [
            e - z[0] - s.z_pp * plate,
            z[1] - s.r_k * cathode,
            screen - z[2] - s.r_s * c.is,
        ]
    };
    let law = |z: &[f64; 3]| device.currents(v - z[1], z[2] - z[1], z[0] - z[1]);
    let mut c = law(&z);
    let mut f = residual(&z, &c);
    for _ in 0..ITERATIONS {
        let inverse = inverse_jacobian(s, &c);
        let step = apply(&inverse, f);
        let moved = step.iter().fold(0.0f64, |m, d| m.max(d.abs()));
        if moved < SETTLED_V {
            break;
        }
        let size = |f: &[f64; 3]| f.iter().map(|r| r * r).sum::<f64>();
        let before = size(&f);
        let mut damping = 1.0;
        loop {
            let trial = [0, 1, 2].map(|k| z[k] - damping * step[k]);
            let c_trial = law(&trial);
            let f_trial = residual(&trial, &c_trial);
            if size(&f_trial) < before || damping < 1e-4 || moved < 1e-7 {
                z = trial;
                c = c_trial;
                f = f_trial;
                break;
            }
            damping *= 0.5;
        }
    }
    let inverse = inverse_jacobian(s, &c);
    let by_v = [
        -s.z_pp * (c.ip_g - s.g_gp),
        -s.r_k * (c.ip_g + c.is_g + c.ig_g + s.g_gk),
        -s.r_s * c.is_g,
    ];
    let negative = |x: [f64; 3]| x.map(|d| -d);
    Solution {
        vp: z[0],
        vk: z[1],
        vs: z[2],
        currents: c,
        over_v: negative(apply(&inverse, by_v)),
        over_e: negative(apply(&inverse, [1.0, 0.0, 0.0])),
        over_s: negative(apply(&inverse, [0.0, 0.0, 1.0])),
    }
}

fn inverse_jacobian(s: &Surroundings, c: &Currents) -> [[f64; 3]; 3] {
    let ip_all = c.ip_g + c.ip_s + c.ip_p;
    let is_all = c.is_g + c.is_s + c.is_p;
    let ig_all = c.ig_g + c.ig_p;
    let j = [
        [
            -1.0 - s.z_pp * (c.ip_p + s.g_gp + s.g_pk),
            s.z_pp * (ip_all + s.g_pk),
            -s.z_pp * c.ip_s,
        ],
        [
            -s.r_k * (c.ip_p + c.is_p + c.ig_p + s.g_pk),
            1.0 + s.r_k * (ip_all + is_all + ig_all + s.g_pk + s.g_gk),
            -s.r_k * (c.ip_s + c.is_s),
        ],
        [-s.r_s * c.is_p, s.r_s * is_all, -1.0 - s.r_s * c.is_s],
    ];
    let cofactor = |r: usize, c: usize| {
        let (r1, r2) = ((r + 1) % 3, (r + 2) % 3);
        let (c1, c2) = ((c + 1) % 3, (c + 2) % 3);
        j[r1][c1] * j[r2][c2] - j[r1][c2] * j[r2][c1]
    };
    let determinant =
        j[0][0] * cofactor(0, 0) + j[0][1] * cofactor(0, 1) + j[0][2] * cofactor(0, 2);
    let mut inverse = [[0.0; 3]; 3];
    for (r, row) in inverse.iter_mut().enumerate() {
        for (c, slot) in row.iter_mut().enumerate() {
            *slot = cofactor(c, r) / determinant;
        }
    }
    inverse
}

fn apply(m: &[[f64; 3]; 3], x: [f64; 3]) -> [f64; 3] {
    m.map(|row| row[0] * x[0] + row[1] * x[1] + row[2] * x[2])
}

/// One stage's solved surface.
#[derive(Clone, Debug)]
pub struct Surface {
    pub surroundings: Surroundings,
    pub extent: Extent,
    /// Total plate-port current (E − vp)/Zpp over (v, E).
    plate: Table<1>,
    /// Screen current, and how plate and screen current change with S beside the shift of v.
    screen: Option<Table<3>>,
    /// Conducted grid current over (v, E), on a finer grid that starts where conduction does.
    grid: Table<1>,
    /// Shift of v per volt of screen: 1/mu_s at the middle of the surface.
    pub per_screen_volt: f64,
    pub conduction_start: f64,
}

/// Below this grid voltage to the cathode the grid-current law has ended.
const GRID_TAIL_END_V: f64 = -1.0;

impl Surface {
    /// Solves the surface of `device` in `s`; about `v_cells`·`e_cells` points with the full law.
    pub fn build(device: &Device, s: Surroundings, extent: Extent, rest: (f64, f64)) -> Surface {
        let x = Axis::new(extent.v.0, extent.v.1, extent.v_cells);
        let y = Axis::new(extent.e.0, extent.e.1, extent.e_cells);
        let (nx, ny) = (x.cells + 1, y.cells + 1);
        let mut points: Vec<Solution> = Vec::with_capacity(nx * ny);
        for i in 0..nx {
            let mut start = [y.start, 0.0, extent.s0];
            for j in 0..ny {
                if j == 0 && i > 0 {
                    let below = &points[(i - 1) * ny];
                    start = [below.vp, below.vk, below.vs];
                }
                let point = solve_point(device, &s, x.at(i), y.at(j), extent.s0, start);
                start = [
                    point.vp + point.over_e[0] * y.cell,
                    point.vk + point.over_e[1] * y.cell,
                    point.vs + point.over_e[2] * y.cell,
                ];
                points.push(point);
            }
        }
        let at = |i: usize, j: usize| &points[i * ny + j];
        let z = s.z_pp;
        let mut plate = Vec::with_capacity(nx * ny);
        for i in 0..nx {
            for j in 0..ny {
                let p = at(i, j);
                let cross = if nx >= ny {
                    difference(|k| -at(k, j).over_e[0] / z, i, nx, x.cell)
                } else {
                    difference(|k| -at(i, k).over_v[0] / z, j, ny, y.cell)
                };
                plate.push([[
                    (y.at(j) - p.vp) / z,
                    -p.over_v[0] / z,
                    (1.0 - p.over_e[0]) / z,
                    cross,
                ]]);
            }
        }
        let plate = Table::new(x, y, &plate);

        let has_screen = device.has_screen_port();
        let mut per_screen_volt = 0.0;
        let screen = has_screen.then(|| {
            let q = solve_point(
                device,
                &s,
                rest.0,
                rest.1,
                extent.s0,
                [rest.1, 0.0, extent.s0],
            );
            if q.over_v[0] != 0.0 {
                per_screen_volt = q.over_s[0] / q.over_v[0];
            }
            let slope = |p: &Solution, over: &[f64; 3], own: f64| {
                let c = &p.currents;
                c.is_g * (own - over[1])
                    + c.is_s * (over[2] - over[1])
                    + c.is_p * (over[0] - over[1])
            };
            let is_v = |p: &Solution| slope(p, &p.over_v, 1.0);
            let is_e = |p: &Solution| slope(p, &p.over_e, 0.0);
            let is_s = |p: &Solution| slope(p, &p.over_s, 0.0);
            let dp = |p: &Solution| -p.over_s[0] / z + per_screen_volt * p.over_v[0] / z;
            let ds = |p: &Solution| is_s(p) - per_screen_volt * is_v(p);
            let mut out = Vec::with_capacity(nx * ny);
            for i in 0..nx {
                for j in 0..ny {
                    let p = at(i, j);
                    let over_x = |f: &dyn Fn(&Solution) -> f64, j: usize| {
                        difference(|k| f(at(k, j)), i, nx, x.cell)
                    };
                    let over_y =
                        |f: &dyn Fn(&Solution) -> f64| difference(|k| f(at(i, k)), j, ny, y.cell);
                    let cross =
                        |f: &dyn Fn(&Solution) -> f64| difference(|k| over_x(f, k), j, ny, y.cell);
                    out.push([
                        [
                            p.currents.is,
                            is_v(p),
                            is_e(p),
                            difference(|k| is_e(at(k, j)), i, nx, x.cell),
                        ],
                        [dp(p), over_x(&dp, j), over_y(&dp), cross(&dp)],
                        [ds(p), over_x(&ds, j), over_y(&ds), cross(&ds)],
                    ]);
                }
            }
            Table::new(x, y, &out)
        });

        // The cathode's own rise keeps the grid from conducting below this.
        let conduction_start = GRID_TAIL_END_V.min(extent.v.1 - 0.5);
        let gx = Axis::new(conduction_start, extent.v.1, extent.grid_cells);
        let gy = Axis::new(extent.e.0, extent.e.1, extent.grid_e_cells);
        let mut grid = Vec::with_capacity((gx.cells + 1) * (gy.cells + 1));
        let mut rows: Vec<Solution> = Vec::new();
        for i in 0..=gx.cells {
            let mut start = rows
                .get((i.max(1) - 1) * (gy.cells + 1))
                .map_or([gy.start, 0.0, extent.s0], |p: &Solution| {
                    [p.vp, p.vk, p.vs]
                });
            for j in 0..=gy.cells {
                let p = solve_point(device, &s, gx.at(i), gy.at(j), extent.s0, start);
                start = [
                    p.vp + p.over_e[0] * gy.cell,
                    p.vk + p.over_e[1] * gy.cell,
                    p.vs + p.over_e[2] * gy.cell,
                ];
                rows.push(p);
            }
        }
        let ig_slope = |p: &Solution, over: &[f64; 3], own: f64| {
            p.currents.ig_g * (own - over[1]) + p.currents.ig_p * (over[0] - over[1])
        };
        for i in 0..=gx.cells {
            for j in 0..=gy.cells {
                let p = &rows[i * (gy.cells + 1) + j];
                let cross = difference(
                    |k| {
                        let q = &rows[k * (gy.cells + 1) + j];
                        ig_slope(q, &q.over_e, 0.0)
                    },
                    i,
                    gx.cells + 1,
                    gx.cell,
                );
                grid.push([[
                    p.currents.ig,
                    ig_slope(p, &p.over_v, 1.0),
                    ig_slope(p, &p.over_e, 0.0),
                    cross,
                ]]);
            }
        }
        Surface {
            surroundings: s,
            extent,
            plate,
            screen,
            grid: Table::new(gx, gy, &grid),
            per_screen_volt,
            conduction_start,
        }
    }

    /// Plate-port current and its slopes at (v + shift of the screen, E).
    #[inline(always)]
    pub fn plate(&self, v: f64, e: f64) -> (Sample, Spot) {
        let spot = self.plate.spot(v, e);
        (self.plate.sample(&spot, 0), spot)
    }

    /// Screen current, and the slopes of plate and screen current over S beside the shift, at a spot.
    #[inline(always)]
    pub fn screen(&self, spot: &Spot) -> (f64, f64, f64) {
        match &self.screen {
            Some(t) => (t.value(spot, 0), t.value(spot, 1), t.value(spot, 2)),
            None => (0.0, 0.0, 0.0),
        }
    }

    /// Conducted grid current and its slopes; exactly zero below the start of conduction.
    #[inline(always)]
    pub fn grid(&self, v: f64, e: f64) -> Sample {
        if v <= self.conduction_start {
            return Sample::default();
        }
        let spot = self.grid.spot(v, e);
        let mut s = self.grid.sample(&spot, 0);
        if s.f < 0.0 {
            s.f = 0.0;
        }
        s
    }

    pub fn covers(&self, v: f64, e: f64) -> bool {
        self.plate.covers(v, e)
    }

    pub fn has_screen(&self) -> bool {
        self.screen.is_some()
    }
}
