//! A stage's static transfer curve and its plate diagram at the chosen bias.

use super::amplifier::Amplifier;
use super::operating_point::{MID_BAND_HZ, ac_load};
use super::surface::{Surroundings, solve_point};
use crate::circuit::alternating::Axis;
use crate::circuit::{PartKind, Slopes};

/// A stage's output against its drive at the chosen bias: the slice of the surface at rest, seen at 1 kHz.
#[derive(Clone, Debug, PartialEq)]
pub struct TransferCurve {
    pub stage: String,
    pub points: Vec<TransferPoint>,
    /// Marks on the curve: (name of the limit, drive in volts): "rest", "grid-conduction", "plate-knee", "cutoff".
    pub limits: Vec<(String, f64)>,
    /// Source impedance through which the grid is driven, ohms.
    pub drive_ohms: f64,
}

#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TransferPoint {
    /// Open-circuit drive re rest, volts.
    pub drive_v: f64,
    /// Grid to cathode, volts.
    pub v_gk: f64,
    /// Plate re rest, volts.
    pub plate_v: f64,
    pub plate_a: f64,
    pub grid_a: f64,
    /// Incremental gain re the one at rest (1 at rest).
    pub relative_gain: f64,
}

/// Plate curves with load lines.
#[derive(Clone, Debug, PartialEq)]
pub struct PlateDiagram {
    /// Grid volts of each curve and its (plate volts to cathode, plate amperes).
    pub curves: Vec<(f64, Vec<(f64, f64)>)>,
    /// Through the operating point, direct and alternating.
    pub direct_line: Vec<(f64, f64)>,
    pub alternating_line: Vec<(f64, f64)>,
    pub operating: (f64, f64),
    /// Plate dissipation limit as a hyperbola, when the rating is known: watts for all sections.
    pub dissipation_w: Option<f64>,
    pub plate_volts_limit: Option<f64>,
    /// Screen volts to the cathode at which the curves stand.
    pub screen_volts: Option<f64>,
}

const CURVE_POINTS: usize = 301;
/// Shares of swing and gain at which a limit is marked: those of the clipping onset.
const CONDUCTION_SHARE: f64 = 0.05;
const GAIN_SHARE: f64 = 0.5;
const CURRENT_SHARE: f64 = 0.02;

/// The curve of stage `k`: the law solved along the load as it is at 1 kHz, all bias held.
///
/// The plate drives the magnitude of its load at 1 kHz from the open-circuit volts that give the resting
/// point; cathode and screen stand behind the magnitudes of theirs. The drive is the grid's open-circuit
/// volts behind the magnitude of its source: drive = v + Z·ig.
pub fn transfer_curve(amp: &Amplifier, k: usize) -> TransferCurve {
    let d = amp.net().devices[k];
    let v = &amp.rest.volts;
    let device = &amp.devices[k];
    let i = amp.rest.devices[k].i;
    let mut bare = amp.clone();
    for s in &mut bare.rest.devices {
        *s = Slopes::default();
    }
    let ac_bare = bare.small_signal(MID_BAND_HZ, Axis::Continuous);
    let drive_ohms = amp
        .small_signal(MID_BAND_HZ, Axis::Continuous)
        .impedance(d.grid)
        .norm();
    let s = Surroundings {
        z_pp: ac_load(amp, k, MID_BAND_HZ),
        r_k: ac_bare.impedance(d.cathode).norm(),
        r_s: d.screen.map_or(0.0, |n| ac_bare.impedance(n).norm()),
        g_gp: 0.0,
        g_gk: 0.0,
        g_pk: 0.0,
    };
    let cathode = v[d.cathode] - s.r_k * (i[0] + i[1] + i[2]);
    let e = v[d.plate] + s.z_pp * i[2] - cathode;
    let screen = d.screen.map_or(0.0, |n| v[n] + s.r_s * i[1] - cathode);
    let rest = v[d.grid] - cathode;
    let start = [v[d.plate] - cathode, v[d.cathode] - cathode, screen];
    let at = |grid: f64| solve_point(device, &s, grid, e, screen, start);
    let gain_at_rest = at(rest).over_v[0];
    // From well past cutoff to well into conduction; an unbypassed cathode rises with the grid and widens both.
    let rise = s.r_k * (i[0] + i[1] + i[2]);
    let v_gk = v[d.grid] - v[d.cathode];
    let depth = (2.2 * v_gk.abs() + rise).max(1.5);
    let low = rest - depth;
    let mut high = rest + v_gk.abs() + 2.0 * rise + 0.5;
    // The drive that a conducting grid asks of its source grows without bound: the picture ends at the depth.
    let drive = |grid: f64| grid + drive_ohms * at(grid).currents.ig - rest;
    while high > rest + 0.1 && drive(high) > 1.2 * depth {
        high -= 0.02 * depth;
    }
    let points: Vec<TransferPoint> = (0..CURVE_POINTS)
        .map(|n| {
            let grid = low + (high - low) * n as f64 / (CURVE_POINTS - 1) as f64;
            let p = at(grid);
            TransferPoint {
                drive_v: grid + drive_ohms * p.currents.ig - rest,
                v_gk: grid - p.vk,
                plate_v: p.vp + cathode - v[d.plate],
                plate_a: p.currents.ip,
                grid_a: p.currents.ig,
                relative_gain: p.over_v[0] / gain_at_rest,
            }
        })
        .collect();
    let rest_a = i[2];
    let mut limits = vec![("rest".to_string(), 0.0)];
    let first = |mut test: Box<dyn FnMut(&TransferPoint) -> bool>, upward: bool| {
        let centre = points.iter().position(|p| p.drive_v >= 0.0).unwrap_or(0);
        if upward {
            points[centre..].iter().find(|p| test(p)).map(|p| p.drive_v)
        } else {
            points[..centre]
                .iter()
                .rev()
                .find(|p| test(p))
                .map(|p| p.drive_v)
        }
    };
    let marks = [
        (
            "grid-conduction",
            first(
                Box::new(|p| {
                    p.drive_v > 0.0 && drive_ohms * p.grid_a > CONDUCTION_SHARE * p.drive_v
                }),
                true,
            ),
        ),
        (
            "plate-knee",
            first(
                Box::new(|p| p.plate_a > rest_a && p.relative_gain < GAIN_SHARE),
                true,
            ),
        ),
        (
            "cutoff",
            first(
                Box::new(|p| p.relative_gain < GAIN_SHARE || p.plate_a < CURRENT_SHARE * rest_a),
                false,
            ),
        ),
    ];
    for (name, drive) in marks {
        if let Some(drive) = drive {
            limits.push((name.into(), drive));
        }
    }
    TransferCurve {
        stage: amp.design.stages[k].name.clone(),
        points,
        limits,
        drive_ohms,
    }
}

/// Plate curves of stage `k` with the direct and the alternating load line through its operating point.
pub fn plate_diagram(amp: &Amplifier, k: usize) -> PlateDiagram {
    let d = amp.net().devices[k];
    let v = &amp.rest.volts;
    let device = &amp.devices[k];
    let vk = v[d.cathode];
    let (v_pk, ip) = (v[d.plate] - vk, amp.rest.devices[k].i[2]);
    let v_sk = d.screen.map(|n| v[n] - vk);
    let load = ac_load(amp, k, MID_BAND_HZ);
    let rail = v[amp.wiring.rails[amp.design.stages[k].plate.rail]];
    let far = if amp.drives_transformer(k) {
        2.0 * v_pk
    } else {
        1.1 * rail
    };
    let rest_v_gk = v[d.grid] - vk;
    let step = tidy(rest_v_gk.abs() / 3.0);
    let mut curves = Vec::new();
    for n in 0..9 {
        let grid = -step * f64::from(n);
        let curve: Vec<(f64, f64)> = (0..=120)
            .map(|m| {
                let x = far * f64::from(m) / 120.0;
                (x, device.currents(grid, v_sk.unwrap_or(x), x).ip)
            })
            .collect();
        if curve.iter().all(|p| p.1 < 0.01 * ip) {
            break;
        }
        curves.push((grid, curve));
    }
    let direct_ohms: f64 = amp
        .net()
        .parts
        .iter()
        .filter(|p| {
            p.name == format!("stage.{}.plate.resistor", amp.design.stages[k].name)
                || p.name
                    .starts_with(&format!("stage.{}.cathode.", amp.design.stages[k].name))
                || (amp.drives_transformer(k) && p.name == "transformer.primary_resistance")
        })
        .filter_map(|p| match p.kind {
            PartKind::Resistor(r) => Some(r),
            _ => None,
        })
        .sum();
    let line = |ohms: f64| -> Vec<(f64, f64)> {
        let at = |x: f64| (x, ip + (v_pk - x) / ohms);
        let zero_current = v_pk + ip * ohms;
        let top = 2.6 * ip;
        let left = (v_pk - (top - ip) * ohms).max(0.0);
        vec![at(left), at(zero_current.min(far))]
    };
    let tube = device.tube();
    let sections = f64::from(device.parallel());
    PlateDiagram {
        curves,
        direct_line: if direct_ohms > 0.0 {
            line(direct_ohms)
        } else {
            Vec::new()
        },
        alternating_line: line(load),
        operating: (v_pk, ip),
        dissipation_w: tube.ratings.plate_dissipation.map(|w| w.0 * sections),
        plate_volts_limit: tube.ratings.plate_volts.map(|v| v.0),
        screen_volts: v_sk,
    }
}

/// The nearest of 1, 2, 2.5, 5 times a power of ten.
fn tidy(x: f64) -> f64 {
    let x = x.max(1e-3);
    let decade = 10f64.powf(x.log10().floor());
    let steps = [1.0, 2.0, 2.5, 5.0, 10.0];
    let best = steps
        .iter()
        .min_by(|a, b| (*a * decade - x).abs().total_cmp(&(*b * decade - x).abs()));
    best.expect("the list is not empty") * decade
}
