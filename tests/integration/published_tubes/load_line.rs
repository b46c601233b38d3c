//! A class A stage with a lossless transformer and a resistive load, solved plainly: the slow and sure way.

use forehear::tube::Currents;

/// Currents at grid, screen and plate volts to the cathode.
pub type Tube<'a> = &'a dyn Fn(f64, f64, f64) -> Currents;

/// Points on a half cycle; the other half mirrors it. Doubling them moves no figure by 1e-4 of itself.
const POINTS: usize = 96;

/// Conditions of one row: volts to the cathode at rest, ohms, and the peak drive.
#[derive(Clone, Copy, Debug)]
pub struct Stage {
    pub plate: f64,
    pub screen: f64,
    pub grid: f64,
    pub load: f64,
}

/// What the stage does over one cycle of a sine.
#[derive(Clone, Copy, Debug)]
pub struct Cycle {
    pub mean_plate_current: f64,
    pub mean_screen_current: f64,
    /// All alternating power in the load, harmonics included.
    pub power: f64,
    pub thd_percent: f64,
    pub second_percent: f64,
    pub third_percent: f64,
}

/// Plate volts over a cycle with v_p = V - R (i_p - mean i_p): the ideal transformer's line turns about the average
/// current, wherever that comes to lie.
///
/// Each point's equation v + R (i(v) - m) = V has a left side that rises with v, hence one root; the mean's equation
/// mean i(m) = m has a slope below 1 on its left side, hence one root too.
pub fn cycle(tube: Tube, stage: &Stage, peak_drive: f64) -> Cycle {
    let mut m = tube(stage.grid, stage.screen, stage.plate).ip;
    let angle = |k: usize| (k as f64 + 0.5) * std::f64::consts::PI / POINTS as f64;
    let mut plate = [stage.plate; POINTS];
    for _ in 0..60 {
        let (mut mean, mut slope) = (0.0, 0.0);
        for (k, v) in plate.iter_mut().enumerate() {
            let v_g = stage.grid + peak_drive * angle(k).cos();
            *v = plate_volts(tube, stage, v_g, m, *v);
            let c = tube(v_g, stage.screen, *v);
            mean += c.ip / POINTS as f64;
            slope += c.ip_p * stage.load / (1.0 + c.ip_p * stage.load) / POINTS as f64;
        }
        let step = (mean - m) / (1.0 - slope);
        m += step;
        if step.abs() < 1e-14 {
            return figures(tube, stage, peak_drive, &plate, angle);
        }
    }
    panic!("the mean plate current settles in 60 steps");
}

/// Root of v + R (i(v) - m) = V, by Newton steps kept inside a shrinking bracket.
fn plate_volts(tube: Tube, stage: &Stage, v_g: f64, m: f64, start: f64) -> f64 {
    let (mut low, mut high) = (0.0, stage.plate + stage.load * m);
    let mut v = start.clamp(low, high);
    for _ in 0..200 {
        let c = tube(v_g, stage.screen, v);
        let f = v + stage.load * (c.ip - m) - stage.plate;
        if f > 0.0 {
            high = v;
        } else {
            low = v;
        }
        let newton = v - f / (1.0 + stage.load * c.ip_p);
        let next = if newton > low && newton < high {
            newton
        } else {
            0.5 * (low + high)
        };
        if (next - v).abs() < 1e-11 {
            return next;
        }
        v = next;
    }
    panic!("plate volts settle in 200 steps");
}

fn figures(
    tube: Tube,
    stage: &Stage,
    peak_drive: f64,
    plate: &[f64; POINTS],
    angle: impl Fn(usize) -> f64,
) -> Cycle {
    let mut harmonics = [0.0; POINTS / 2];
    let (mut ip, mut is) = (0.0, 0.0);
    for (k, &v) in plate.iter().enumerate() {
        let c = tube(stage.grid + peak_drive * angle(k).cos(), stage.screen, v);
        ip += c.ip / POINTS as f64;
        is += c.is / POINTS as f64;
        for (n, h) in harmonics.iter_mut().enumerate().skip(1) {
            *h += 2.0 / POINTS as f64 * c.ip * (n as f64 * angle(k)).cos();
        }
    }
    let squares = |from: usize| harmonics[from..].iter().map(|h| h * h).sum::<f64>();
    let percent = |amplitude: f64| 100.0 * amplitude / harmonics[1].abs();
    Cycle {
        mean_plate_current: ip,
        mean_screen_current: is,
        power: 0.5 * stage.load * squares(1),
        thd_percent: percent(squares(2).sqrt()),
        second_percent: percent(harmonics[2].abs()),
        third_percent: percent(harmonics[3].abs()),
    }
}

/// Peak drive at which the load takes `power`, between zero and `most`.
pub fn drive_for_power(tube: Tube, stage: &Stage, power: f64, most: f64) -> f64 {
    let (mut low, mut high) = (0.0, most);
    for _ in 0..50 {
        let middle = 0.5 * (low + high);
        if cycle(tube, stage, middle).power < power {
            low = middle;
        } else {
            high = middle;
        }
    }
    0.5 * (low + high)
}

#[test]
fn a_square_law_tube_gives_the_harmonics_known_on_paper() {
    // i = k (E + A cos)^2 with a plate that does not act: first harmonic 2 k E A, second k A^2/2, mean k (E^2 + A^2/2).
    let (k, e, a, load) = (1e-3, 6.0, 4.0, 5000.0);
    let square = |v_g: f64, _: f64, _: f64| Currents {
        ip: k * v_g * v_g,
        ..Currents::default()
    };
    let stage = Stage {
        plate: 400.0,
        screen: 0.0,
        grid: e,
        load,
    };
    let c = cycle(&square, &stage, a);
    assert!((c.mean_plate_current - k * (e * e + a * a / 2.0)).abs() < 1e-12);
    assert!((c.second_percent - 100.0 * a / (4.0 * e)).abs() < 1e-9);
    assert!((c.thd_percent - c.second_percent).abs() < 1e-9 && c.third_percent < 1e-9);
    let (first, second) = (2.0 * k * e * a, k * a * a / 2.0);
    assert!((c.power - 0.5 * load * (first * first + second * second)).abs() < 1e-9);
}

#[test]
fn a_linear_tube_divides_with_its_load() {
    // i = gm vg + v/rp: first harmonic gm A rp/(rp + R), nothing else, the mean unmoved.
    let (gm, rp, load, a) = (5e-3, 2000.0, 3000.0, 3.0);
    let linear = |v_g: f64, _: f64, v_p: f64| Currents {
        ip: gm * v_g + v_p / rp,
        ip_p: 1.0 / rp,
        ..Currents::default()
    };
    let c = cycle(
        &linear,
        &Stage {
            plate: 250.0,
            screen: 0.0,
            grid: -5.0,
            load,
        },
        a,
    );
    let first = gm * a * rp / (rp + load);
    assert!((c.power - 0.5 * load * first * first).abs() < 1e-12);
    assert!((c.mean_plate_current - (250.0 / rp - 5.0 * gm)).abs() < 1e-13);
    assert!(c.thd_percent < 1e-9);
}
