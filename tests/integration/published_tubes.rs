//! The catalog's tubes against printed tables and readings of printed curves.
//!
//! `tests/data/tube_*.csv` hold the rows with their sources and how far to trust them. Errors of currents, slopes and powers
//! are 100 ln(ours/printed), in percent; distortion in percentage points; several rows together RMS. Rows that are from memory
//! or quoted in one place only are printed beside ours and gate nothing. See the tables with `cargo test published -- --nocapture`.

use std::collections::BTreeMap;

use forehear::tube::{Catalog, Currents, Device};
use serde::Deserialize;

mod load_line;

use load_line::{Cycle, Stage, cycle, drive_for_power};

fn rows<T: for<'de> Deserialize<'de>>(text: &str) -> Vec<T> {
    csv::Reader::from_reader(text.as_bytes())
        .deserialize()
        .collect::<Result<_, _>>()
        .expect("the data file's rows have the columns asked for")
}

fn shipped(name: &str, triode_connected: bool) -> Device {
    let tube = Catalog::shipped().find(name).expect("a shipped tube");
    Device::new(&tube, triode_connected, 1)
}

/// True for rows a test may rest on.
fn is_firm(confidence: &str) -> bool {
    confidence.starts_with("read in the sheet") || confidence == "graph reading"
}

/// 100 ln(ours/printed), the percent error of this file.
fn percent(ours: f64, printed: f64) -> f64 {
    100.0 * (ours / printed).ln()
}

fn rms(errors: &[f64]) -> f64 {
    (errors.iter().map(|e| e * e).sum::<f64>() / errors.len() as f64).sqrt()
}

/// Grid volts and currents with a resistor in the cathode, the other volts being to the cathode.
fn cathode_biased(device: &Device, screen: f64, plate: f64, resistor: f64) -> (f64, Currents) {
    let (mut low, mut high) = (-200.0, 0.0);
    for _ in 0..100 {
        let v_gk = 0.5 * (low + high);
        let c = device.currents(v_gk, screen, plate);
        if v_gk + resistor * (c.ip + c.is) > 0.0 {
            high = v_gk;
        } else {
            low = v_gk;
        }
    }
    let v_gk = 0.5 * (low + high);
    (v_gk, device.currents(v_gk, screen, plate))
}

// -- characteristic points of triodes

#[derive(Deserialize)]
struct Characteristic {
    r#type: String,
    #[serde(rename = "plate_V")]
    plate: f64,
    #[serde(rename = "grid1_V")]
    grid: Option<f64>,
    #[serde(rename = "cathode_resistor_ohm")]
    cathode_resistor: Option<f64>,
    #[serde(rename = "plate_current_A")]
    plate_current: f64,
    #[serde(rename = "transconductance_S")]
    transconductance: f64,
    #[serde(rename = "plate_resistance_ohm")]
    plate_resistance: f64,
    cutoff_text: String,
    confidence: String,
}

/// Printed current, transconductance and plate resistance of triodes, in percent: the fits' own worst residuals are 9 %, and makers'
/// printed gains of one type spread over 15 to 20 %.
const CHARACTERISTIC_LIMIT_PERCENT: f64 = 10.0;

#[test]
fn triodes_meet_their_characteristic_points() {
    println!(
        "\n{:28} {:>6} {:>6} | {:>8} {:>6} | {:>8} {:>6} | {:>8} {:>6} | V at 10 uA",
        "triode", "V_p", "V_g", "I mA", "err %", "gm mA/V", "err %", "rp k", "err %"
    );
    let mut misses = Vec::new();
    for row in rows::<Characteristic>(include_str!("../data/tube_small_signal.csv")) {
        let name = row
            .r#type
            .split(['/', ' '])
            .next()
            .expect("a type has a name");
        let device = shipped(name, false);
        let (v_gk, c) = match row.cathode_resistor {
            Some(resistor) => cathode_biased(&device, 0.0, row.plate, resistor),
            None => {
                let v_gk = row
                    .grid
                    .expect("a row has grid volts or a cathode resistor");
                (v_gk, device.currents(v_gk, 0.0, row.plate))
            }
        };
        let errors = [
            percent(c.ip, row.plate_current),
            percent(c.ip_g, row.transconductance),
            percent(1.0 / c.ip_p, row.plate_resistance),
        ];
        let cutoff = (0..4000)
            .map(|i| -0.01 * f64::from(i))
            .find(|v| device.currents(*v, 0.0, row.plate).ip < 10e-6)
            .expect("forty volts cut a small triode off");
        println!(
            "{:28} {:6.0} {:6.2} | {:8.3} {:6.1} | {:8.3} {:6.1} | {:8.2} {:6.1} | {:.1}, printed: {} ({})",
            row.r#type,
            row.plate,
            v_gk,
            c.ip * 1e3,
            errors[0],
            c.ip_g * 1e3,
            errors[1],
            1e-3 / c.ip_p,
            errors[2],
            cutoff,
            if row.cutoff_text.is_empty() {
                "-"
            } else {
                &row.cutoff_text
            },
            row.confidence
        );
        if is_firm(&row.confidence) {
            for (what, error) in ["I", "gm", "rp"].iter().zip(errors) {
                if error.abs() > CHARACTERISTIC_LIMIT_PERCENT {
                    misses.push(format!(
                        "{} {what} at {} V: {error:.1} %",
                        row.r#type, row.plate
                    ));
                }
            }
        }
    }
    assert!(misses.is_empty(), "{misses:#?}");
}

// -- class A output stages

#[derive(Deserialize)]
struct PowerRow {
    r#type: String,
    connection: String,
    #[serde(rename = "plate_V")]
    plate: f64,
    #[serde(rename = "screen_V")]
    screen: f64,
    #[serde(rename = "grid1_V")]
    grid: Option<f64>,
    #[serde(rename = "cathode_resistor_ohm")]
    cathode_resistor: Option<f64>,
    #[serde(rename = "peak_drive_V")]
    peak_drive: Option<f64>,
    #[serde(rename = "plate_current_zero_signal_A")]
    plate_current: f64,
    #[serde(rename = "plate_current_max_signal_A")]
    plate_current_driven: Option<f64>,
    #[serde(rename = "screen_current_zero_signal_A")]
    screen_current: Option<f64>,
    #[serde(rename = "screen_current_max_signal_A")]
    screen_current_driven: Option<f64>,
    #[serde(rename = "plate_resistance_ohm")]
    plate_resistance: Option<f64>,
    #[serde(rename = "transconductance_S")]
    transconductance: Option<f64>,
    #[serde(rename = "load_ohm")]
    load: Option<f64>,
    thd_percent: Option<f64>,
    #[serde(rename = "power_W")]
    power: Option<f64>,
    source: String,
    confidence: String,
}

/// Errors of one tube's firm rows, by figure.
type Errors = BTreeMap<&'static str, Vec<f64>>;

/// Prints every row of `prefix` beside ours and hands back the errors of the firm ones.
fn class_a(name: &str, prefix: &str) -> Errors {
    let all = rows::<PowerRow>(include_str!("../data/tube_power.csv"));
    let mut firm = Errors::new();
    // One condition printed with several drives counts once at rest.
    let mut seen = Vec::new();
    println!("\n{name}: printed, ours, error (%, THD in points)");
    for row in all.iter().filter(|r| r.r#type.starts_with(prefix)) {
        let device = shipped(name, row.connection.starts_with("triode"));
        let (v_gk, rest) = match (row.grid, row.cathode_resistor) {
            (Some(v_gk), _) => (v_gk, device.currents(v_gk, row.screen, row.plate)),
            (None, Some(resistor)) => cathode_biased(&device, row.screen, row.plate, resistor),
            (None, None) => panic!("a row has grid volts or a cathode resistor"),
        };
        let driven = row.load.zip(row.peak_drive).map(|(load, drive)| {
            let stage = Stage {
                plate: row.plate,
                screen: row.screen,
                grid: v_gk,
                load,
            };
            cycle(&|g, s, p| device.currents(g, s, p), &stage, drive)
        });
        let is_new = !seen.contains(&(row.plate, row.screen, v_gk));
        println!(
            "  {} {}/{} V, grid {v_gk:.2} V, drive {} V, load {} ohm [{}; {}]",
            row.connection,
            row.plate,
            row.screen,
            option(row.peak_drive),
            option(row.load),
            row.confidence,
            row.source.split([';', ',']).next().unwrap_or_default()
        );
        // A drive printed to one figure (0.3 V RMS for 50 mW) leaves its power open by a third either way.
        let is_sensitivity = row.power.is_some_and(|p| p < 0.1);
        let mut figure = |what: &'static str,
                          printed: Option<f64>,
                          ours: Option<f64>,
                          at_rest: bool| {
            let (Some(printed), Some(ours)) = (printed, ours) else {
                return;
            };
            let error = if what == "THD" {
                ours - printed
            } else {
                percent(ours, printed)
            };
            println!("    {what:4} {printed:10.5} {ours:10.5} {error:7.1}");
            if is_firm(&row.confidence) && (is_new || !at_rest) && !(what == "P" && is_sensitivity)
            {
                firm.entry(what).or_default().push(error);
            }
        };
        let of = |f: fn(&Cycle) -> f64| driven.as_ref().map(f);
        figure("I0", Some(row.plate_current), Some(rest.ip), true);
        figure("S0", row.screen_current, Some(rest.is), true);
        figure("gm", row.transconductance, Some(rest.ip_g), true);
        figure("rp", row.plate_resistance, Some(1.0 / rest.ip_p), true);
        figure(
            "I1",
            row.plate_current_driven,
            of(|c| c.mean_plate_current),
            false,
        );
        figure(
            "S1",
            row.screen_current_driven,
            of(|c| c.mean_screen_current),
            false,
        );
        figure("P", row.power, of(|c| c.power), false);
        figure("THD", row.thd_percent, of(|c| c.thd_percent), false);
        seen.push((row.plate, row.screen, v_gk));
    }
    for (what, errors) in &firm {
        println!(
            "  RMS of {} firm rows, {what}: {:.2}",
            errors.len(),
            rms(errors)
        );
    }
    firm
}

#[test]
fn el84_needs_the_printed_drive_for_fifty_milliwatts() {
    // Philips EL84, pp. 2-3 and 5, prints 0.3 V RMS at both loads: between 0.25 and 0.35 V.
    let device = shipped("EL84", false);
    let law = |g, s, p| device.currents(g, s, p);
    for load in [5200.0, 4500.0] {
        let stage = Stage {
            plate: 250.0,
            screen: 250.0,
            grid: -7.3,
            load,
        };
        let rms = drive_for_power(&law, &stage, 0.05, 2.0) / 2_f64.sqrt();
        println!("EL84, {load} ohm: 50 mW at {rms:.3} V RMS, printed 0.3");
        assert!((0.25..0.35).contains(&rms), "{load} ohm: {rms:.3} V RMS");
    }
}

fn option(value: Option<f64>) -> String {
    value.map_or("-".into(), |v| v.to_string())
}

fn assert_within(name: &str, errors: &Errors, what: &str, limit: f64) {
    let found = rms(&errors[what]);
    assert!(
        found <= limit,
        "{name} {what}: {found:.2} RMS, limit {limit}"
    );
}

#[test]
fn el84_meets_its_typical_operation() {
    let errors = class_a("EL84", "EL84");
    assert_within("EL84", &errors, "I0", 5.0);
    assert_within("EL84", &errors, "P", 7.0);
    assert_within("EL84", &errors, "THD", 1.5);
}

#[test]
fn beam_tetrode_6v6_meets_its_typical_operation() {
    let errors = class_a("6V6", "6V6");
    assert_within("6V6", &errors, "I0", 8.0);
    assert_within("6V6", &errors, "P", 7.0);
    assert_within("6V6", &errors, "THD", 2.6);
}

/// The 6L6GC's plate family and its table differ by 10 % in current, so no law can meet both better.
const PROVISIONAL_CURRENT_LIMIT_PERCENT: f64 = 10.0;

#[test]
fn provisional_6l6gc_draws_the_printed_current_at_rest() {
    let errors = class_a("6L6GC", "6L6");
    assert_within("6L6GC", &errors, "I0", PROVISIONAL_CURRENT_LIMIT_PERCENT);
}

// -- harmonics against power

#[derive(Deserialize)]
struct HarmonicReading {
    r#type: String,
    condition: String,
    #[serde(rename = "power_W")]
    power: f64,
    second_harmonic_percent: f64,
    third_harmonic_percent: f64,
}

/// RMS miss allowed of each harmonic along a printed curve, in percentage points: the fits leave 0.26 to 0.47, and each reading
/// is uncertain by 0.1.
const HARMONIC_LIMIT_POINTS: f64 = 0.5;

#[test]
fn harmonics_follow_the_published_curves() {
    let readings = rows::<HarmonicReading>(include_str!("../data/tube_distortion.csv"));
    let curves = [
        (
            "6V6",
            "RL 5000",
            Stage {
                plate: 250.0,
                screen: 250.0,
                grid: -12.5,
                load: 5000.0,
            },
        ),
        (
            "EL84",
            "Ra 5.2k",
            Stage {
                plate: 250.0,
                screen: 250.0,
                grid: -7.3,
                load: 5200.0,
            },
        ),
        (
            "EL84",
            "Ra 4.5k",
            Stage {
                plate: 250.0,
                screen: 250.0,
                grid: -7.3,
                load: 4500.0,
            },
        ),
    ];
    let mut misses = Vec::new();
    for (name, load, stage) in curves {
        let device = shipped(name, false);
        let law = |g, s, p| device.currents(g, s, p);
        println!(
            "\n{name}, {load}: W, drive V RMS, second harmonic printed and ours, third printed and ours (%)"
        );
        let (mut second, mut third) = (Vec::new(), Vec::new());
        for r in readings
            .iter()
            .filter(|r| r.r#type == name && r.condition.contains(load))
        {
            let drive = drive_for_power(&law, &stage, r.power, -1.5 * stage.grid);
            let c = cycle(&law, &stage, drive);
            println!(
                "  {:5.2} {:5.2} | {:5.2} {:5.2} | {:5.2} {:5.2}",
                r.power,
                drive / 2_f64.sqrt(),
                r.second_harmonic_percent,
                c.second_percent,
                r.third_harmonic_percent,
                c.third_percent
            );
            second.push(c.second_percent - r.second_harmonic_percent);
            third.push(c.third_percent - r.third_harmonic_percent);
        }
        let (second, third) = (rms(&second), rms(&third));
        println!("  RMS miss: second {second:.2}, third {third:.2} points");
        for (what, miss) in [("second", second), ("third", third)] {
            if miss > HARMONIC_LIMIT_POINTS {
                misses.push(format!("{name} {load} {what}: {miss:.2} points RMS"));
            }
        }
    }
    assert!(misses.is_empty(), "{misses:#?}");
}

// -- grid current

#[derive(Deserialize)]
struct GridReading {
    r#type: String,
    #[serde(rename = "plate_V")]
    plate: Option<f64>,
    #[serde(rename = "grid1_V")]
    grid: f64,
    #[serde(rename = "grid1_current_A")]
    grid_current: f64,
}

/// The curve reads to ±0.3 mA, which is 5 % RMS of these currents.
const GRID_CURRENT_LIMIT_PERCENT: f64 = 5.0;

#[test]
fn grid_current_of_the_12at7_follows_its_published_family() {
    let device = shipped("12AT7", false);
    let errors: Vec<f64> = rows::<GridReading>(include_str!("../data/tube_grid_current.csv"))
        .iter()
        .filter(|r| r.r#type == "12AT7")
        .map(|r| {
            let plate = r.plate.expect("these rows state plate volts");
            percent(device.currents(r.grid, 0.0, plate).ig, r.grid_current)
        })
        .collect();
    println!(
        "12AT7 grid current: {} points, {:.2} % RMS",
        errors.len(),
        rms(&errors)
    );
    assert_eq!(errors.len(), 41);
    assert!(rms(&errors) < GRID_CURRENT_LIMIT_PERCENT);
}

/// Grid volts at which grid current reaches 0.3 µA.
fn onset_volts(device: &Device, plate: f64) -> f64 {
    let (mut low, mut high) = (-2.0, 2.0);
    for _ in 0..60 {
        let middle = 0.5 * (low + high);
        if device.currents(middle, plate, plate).ig < 0.3e-6 {
            low = middle;
        } else {
            high = middle;
        }
    }
    0.5 * (low + high)
}

#[test]
fn grid_current_starts_where_the_sheets_say() {
    // Philips EL84 (pp. 1 and 6) and ECC82 (1954/1959, p. 2): +0.3 µA at not more negative than -1.3 V.
    println!();
    for tube in Catalog::shipped().tubes() {
        let device = Device::new(tube, false, 1);
        let v = onset_volts(&device, 250.0);
        println!(
            "{:6} 0.3 uA of grid current at {v:.2} V{}",
            tube.name,
            if tube.grid_current_assumed {
                " (assumed)"
            } else {
                ""
            }
        );
        assert!(v >= -1.3, "{}: {v:.2} V", tube.name);
    }
    // The same EL84 sheet, p. 5: the drives that just give +0.3 µA peak at -0.65 V (5.2 k) and -0.51 V (4.5 k).
    let v = onset_volts(&shipped("EL84", false), 250.0);
    assert!((-0.65..=-0.51).contains(&v), "EL84: {v:.3} V");
    // Brimar VAD/513.4, curve 313.23, reads 0.3 µA at -0.3 V; its ±0.08 µA is ±0.03 V there.
    let v = onset_volts(&shipped("12AU7", false), 100.0);
    assert!((v + 0.3).abs() < 0.03, "12AU7: {v:.3} V");
}

// -- common practice

#[test]
fn a_6v6_with_470_ohms_in_its_cathode_draws_a_little_over_20_ma() {
    // Common practice, no source: 180 V from cathode to plate and screen, 20 to 24 mA.
    let (v_gk, c) = cathode_biased(&shipped("6V6", false), 180.0, 180.0, 470.0);
    let (plate, screen) = (c.ip * 1e3, c.is * 1e3);
    println!(
        "6V6, 470 ohm, 180 V: grid {v_gk:.2} V, plate {plate:.2} mA, screen {screen:.2} mA, cathode {:.2} mA",
        plate + screen
    );
    assert!((20.0..=24.0).contains(&plate), "plate {plate:.2} mA");
    assert!(
        (20.0..=24.0).contains(&(plate + screen)),
        "cathode {:.2} mA",
        plate + screen
    );
}
