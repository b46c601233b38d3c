//! No number or order of stages is special, and figures move the way they must.

use forehear::design;
use forehear::render::{Kernel, Model};
use forehear::stage::amplifier::Amplifier;
use forehear::stage::operating_point::{OperatingPoint, operating_point};
use forehear::trial::{response, tone};

use super::{RATE_HZ, amplifier, prepared};

/// A power stage alone, for a line-level source. Invented for this test.
pub const POWER_STAGE: &str = r#"
format = 1
name = "Alone"
[supply]
volts = "270V"
resistance = "100R"
[[supply.rail]]
name = "main"
from = "source"
capacitor = "100u"
[[stage]]
name = "power"
tube = "EL84"
  [[stage.input]]
  name = "leak"
  place = "shunt"
  resistor = "470k"
  [[stage.input]]
  name = "stopper"
  place = "series"
  resistor = "2k2"
  [stage.plate]
  rail = "main"
  [stage.cathode]
  resistor = "150R"
  bypass = "220u"
  [stage.screen]
  rail = "main"
  resistor = "470R"
[transformer]
primary = "5k"
secondary = "8R"
low_corner = "50Hz"
high_corner = "20kHz"
[load]
resistance = "8R"
"#;

/// Three triode sections, one behind the other, before a power stage. Invented for this test.
fn four_stages() -> String {
    let (head, power) = POWER_STAGE
        .split_once("[[stage]]")
        .expect("the power stage begins there");
    let (power_head, power_rest) = power.split_once("  [[stage.input]]").expect("its ladder");
    let rail = "[[supply.rail]]\nname = \"small\"\nfrom = \"main\"\nresistor = \"10k\"\ncapacitor = \"22u\"\n";
    let coupled = |name: &str, lower: &str| {
        format!(
            "  [[stage.input]]\n  name = \"{name}\"\n  place = \"series\"\n  capacitor = \"22n\"\n  \
             [[stage.input]]\n  name = \"pad\"\n  place = \"series\"\n  resistor = \"470k\"\n  \
             [[stage.input]]\n  name = \"foot\"\n  place = \"shunt\"\n  resistor = \"{lower}\"\n"
        )
    };
    let triode = |name: &str, tube: &str, input: &str| {
        format!(
            "[[stage]]\nname = \"{name}\"\ntube = \"{tube}\"\n{input}  [stage.plate]\n  rail = \"small\"\n  \
             resistor = \"100k\"\n  [stage.cathode]\n  resistor = \"1k5\"\n  bypass = \"22u\"\n"
        )
    };
    let leak = "  [[stage.input]]\n  name = \"leak\"\n  place = \"shunt\"\n  resistor = \"1M\"\n";
    [
        head,
        rail,
        &triode("one", "12AX7", leak),
        &triode("two", "12AT7", &coupled("coupling", "22k")),
        &triode("three", "12AU7", &coupled("coupling", "47k")),
        "[[stage]]",
        power_head,
        &coupled("coupling", "100k"),
        "  [[stage.input]]",
        power_rest,
    ]
    .concat()
}

/// Solves, renders a loud second tenth, and measures; all the figures that every design has must exist.
fn is_rendered_and_measured(text: &str, stages: usize, test_level: f64) {
    let amp = amplifier(&prepared(text, &[]), None);
    assert_eq!(amp.devices.len(), stages);
    let model = Model::new(&amp, RATE_HZ, tone::HIGHEST_LEVEL_V).expect("the model comes to rest");
    let mut kernel = Kernel::<1>::new([&model]);
    let mut peak = 0.0f64;
    for n in 0..40_000 {
        let t = f64::from(n) / RATE_HZ;
        let y = kernel.step([tone::HIGHEST_LEVEL_V * (std::f64::consts::TAU * 220.0 * t).sin()])[0];
        assert!(y.is_finite(), "step {n}");
        peak = peak.max(y.abs());
    }
    assert!(peak > 1.0 && peak < 100.0, "{peak} V at the loudspeaker");
    let figures = tone::run(&amp, &model, tone::HEADLINE_HZ, test_level);
    let onset = figures.onset.expect("it clips within 8 V");
    let thd = figures
        .test
        .harmonics
        .expect("a tone comes out")
        .thd_percent;
    let unsettled = figures.levels.iter().filter(|l| !l.settled).count();
    println!(
        "{stages} stages: peak {peak:.2} V, strayed {}, onset {:.4} V in stage {} by {:?}, THD at {test_level} V {thd:.3} %, \
         gain {:.2} dB, most {:.3} W, {unsettled} levels not settled",
        kernel.strayed,
        onset.input_v_peak,
        onset.stage,
        onset.mechanism,
        response::response(&amp).gain_1khz_db,
        figures.levels.iter().fold(0.0f64, |m, l| m.max(l.output_w)),
    );
    assert!(onset.stage < stages);
    assert!(thd > 0.0 && thd.is_finite());
    assert_eq!(figures.levels.len(), tone::levels().len());
    assert_eq!(unsettled, 0);
}

#[test]
fn a_power_stage_alone_is_rendered_and_measured() {
    is_rendered_and_measured(POWER_STAGE, 1, 2.0);
}

#[test]
fn four_stages_are_rendered_and_measured() {
    is_rendered_and_measured(&four_stages(), 4, 0.05);
}

fn default_with(overrides: &[&str]) -> Amplifier {
    amplifier(&prepared(design::shipped()[0].1, overrides), Some(5.0))
}

fn point(overrides: &[&str]) -> OperatingPoint {
    operating_point(&default_with(overrides))
}

/// True when each of `figures` is less than the one before.
fn falls(figures: &[f64]) -> bool {
    figures.windows(2).all(|w| w[1] < w[0])
}

#[test]
fn larger_cathode_resistor_means_less_current() {
    for (stage, name) in ["first", "second", "power"].into_iter().enumerate() {
        let currents = [100.0, 150.0, 330.0, 680.0, 1500.0, 4700.0].map(|r: f64| {
            point(&[&format!("stage.{name}.cathode.resistor={r}")]).stages[stage].plate_amperes
        });
        assert!(falls(&currents), "{name}: {currents:?}");
    }
}

#[test]
fn larger_supply_means_more_current_everywhere() {
    let volts = [300.0, 265.0, 230.0, 180.0, 120.0];
    let points: Vec<OperatingPoint> = volts
        .iter()
        .map(|v| point(&[&format!("supply.volts={v}")]))
        .collect();
    for stage in 0..3 {
        let currents: Vec<f64> = points
            .iter()
            .map(|p| p.stages[stage].plate_amperes)
            .collect();
        assert!(falls(&currents), "stage {stage}: {currents:?}");
    }
}

#[test]
fn larger_plate_resistor_means_lower_plate_volts_and_more_gain() {
    let points = [470e3, 220e3, 100e3, 47e3, 22e3]
        .map(|r: f64| point(&[&format!("stage.first.plate.resistor={r}")]));
    let gains: Vec<f64> = points.iter().map(|p| p.stages[0].gain.abs()).collect();
    let volts: Vec<f64> = points.iter().rev().map(|p| p.stages[0].v_pk).collect();
    assert!(falls(&gains), "{gains:?}");
    assert!(falls(&volts), "{volts:?}");
}

#[test]
fn stiffer_dropping_resistor_leaves_more_volts_on_the_rail_behind() {
    let volts = [1e3, 4.7e3, 10e3, 22e3, 47e3]
        .map(|r: f64| point(&[&format!("supply.rail.triodes.resistor={r}")]).rails[2].volts);
    assert!(falls(&volts), "{volts:?}");
}

#[test]
fn gain_rises_with_the_gain_setting() {
    let prepared = prepared(design::shipped()[0].1, &[]);
    let gains: Vec<f64> = (0..=10)
        .rev()
        .map(|g| response::response(&amplifier(&prepared, Some(f64::from(g)))).gain_1khz_db)
        .collect();
    assert!(falls(&gains), "{gains:?}");
}
