use super::*;
use crate::circuit::alternating::Axis;
use crate::design::*;
use crate::stage::amplifier::Amplifier;
use crate::stage::iron;
use crate::stage::wiring::LoadKind;
use crate::tube::{Catalog, Device};
use crate::units::*;

fn triode(name: &str, input: Vec<Element>) -> Stage {
    Stage {
        name: name.into(),
        tube: "12AX7".into(),
        parallel: 1,
        connection: None,
        input,
        plate: Plate {
            rail: 1,
            resistor: Some(Ohms(100e3)),
        },
        cathode: Cathode {
            bias: CathodeBias::Resistor(Ohms(1500.0)),
            unbypassed: None,
            bypass: Some(Farads(25e-6)),
        },
        fixed_bias: None,
        screen: None,
        strays: Strays::default(),
    }
}

fn series(name: &str, branch: Branch) -> Element {
    Element {
        name: name.into(),
        kind: ElementKind::Series(branch),
    }
}

fn shunt(name: &str, r: f64) -> Element {
    Element {
        name: name.into(),
        kind: ElementKind::Shunt {
            branch: Branch::Resistive(Resistive::Fixed(Ohms(r))),
            to_bias: false,
        },
    }
}

pub fn design() -> Design {
    let fixed = |r| Branch::Resistive(Resistive::Fixed(Ohms(r)));
    let first = triode(
        "first",
        vec![shunt("leak", 1e6), series("stopper", fixed(68e3))],
    );
    let second = triode(
        "second",
        vec![
            series("coupling", Branch::Capacitor(Farads(22e-9))),
            Element {
                name: "volume".into(),
                kind: ElementKind::Divider {
                    pot: Pot {
                        resistance: Ohms(1e6),
                        taper: Taper::Audio { midpoint: 0.1 },
                        setting: 5.0,
                        end_resistance: Ohms(10.0),
                    },
                    bright: Some(Farads(120e-12)),
                },
            },
        ],
    );
    let power = Stage {
        name: "power".into(),
        tube: "EL84".into(),
        input: vec![
            series("coupling", Branch::Capacitor(Farads(22e-9))),
            shunt("leak", 470e3),
            series("stopper", fixed(4700.0)),
        ],
        plate: Plate {
            rail: 0,
            resistor: None,
        },
        cathode: Cathode {
            bias: CathodeBias::Resistor(Ohms(150.0)),
            unbypassed: None,
            bypass: Some(Farads(50e-6)),
        },
        screen: Some(Screen {
            rail: 1,
            resistor: Some(Ohms(1000.0)),
            capacitor: None,
        }),
        ..triode("power", vec![])
    };
    Design {
        name: "Trial".into(),
        description: String::new(),
        control: Control {
            gain: Some(PotPlace {
                stage: 1,
                element: 1,
            }),
            settings: vec![2.0, 5.0, 10.0],
            test_level: VoltsPeak(0.2),
        },
        jack_source_resistance: Ohms(0.0),
        supply: Supply {
            source: Source::Plain {
                volts: Volts(285.0),
                resistance: Ohms(150.0),
            },
            rails: vec![
                Rail {
                    name: "main".into(),
                    from: RailFeed::Source,
                    capacitor: Farads(47e-6),
                },
                Rail {
                    name: "second".into(),
                    from: RailFeed::Resistor {
                        rail: 0,
                        resistor: Ohms(2200.0),
                    },
                    capacitor: Farads(22e-6),
                },
            ],
        },
        stages: vec![first, second, power],
        transformer: Transformer {
            primary: Ohms(5200.0),
            secondary: Ohms(8.0),
            taps: vec![],
            rated_power: None,
            low_corner: Some(Hertz(80.0)),
            high_corner: Some(Hertz(15e3)),
            corner_drop_db: 3.0,
            corner_source: Some(Ohms(5200.0)),
            primary_inductance: None,
            leakage_inductance: None,
            shunt_capacitance: None,
            primary_resistance: Some(Ohms(300.0)),
            secondary_resistance: Some(Ohms(0.3)),
            core_loss: None,
            impedance_includes_copper: false,
            dc_rated: None,
        },
        load: Load {
            resistance: Ohms(8.0),
            loudspeaker: None,
        },
    }
}

pub fn amplifier(gain: f64) -> Amplifier {
    let design = design();
    let catalog = Catalog::shipped();
    let devices: Vec<Device> = design
        .stages
        .iter()
        .map(|s| Device::new(&catalog.find(&s.tube).unwrap(), false, s.parallel))
        .collect();
    let iron = iron::from_label(&design.transformer).unwrap();
    Amplifier::solve(&design, &devices, &iron, Some(gain), LoadKind::Rated).unwrap()
}

/// Silence within -180 dB re 1 V, and the gain of a small tone that of the AC analysis of the same steps.
#[test]
fn silence_stays_silent_and_small_signals_meet_the_ac_analysis() {
    const SILENT_V: f64 = 1e-9;
    const WITHIN_DB: f64 = 0.001;
    let rate = 384e3;
    let amp = amplifier(5.0);
    let model = Model::new(&amp, rate, 1.0).unwrap();
    let mut kernel = Kernel::<1>::new([&model]);
    for _ in 0..20_000 {
        let out = kernel.step([0.0])[0];
        assert!(out.abs() < SILENT_V, "{out:e} V from silence");
    }
    assert_eq!(kernel.strayed, 0);
    for hz in [1e3, 5e3, 20e3] {
        let mut kernel = Kernel::<1>::new([&model]);
        let peak = 1e-5;
        let steps = (rate / hz) as usize;
        let tone = rate / steps as f64;
        let mut out = (0.0, 0.0);
        for cycle in 0..3 + (0.6 * tone) as usize {
            let last = cycle == 2 + (0.6 * tone) as usize;
            for k in 0..steps {
                let phase = std::f64::consts::TAU * k as f64 / steps as f64;
                let y = kernel.step([peak * phase.sin()])[0];
                if last {
                    out.0 += 2.0 / steps as f64 * y * phase.cos();
                    out.1 += 2.0 / steps as f64 * y * phase.sin();
                }
            }
        }
        let found = out.0.hypot(out.1) / peak;
        let expected = amp
            .gain_at(tone, Axis::Trapezoidal { step: 1.0 / rate })
            .norm();
        let off = 20.0 * (found / expected).log10();
        assert!(off.abs() < WITHIN_DB, "{tone:.0} Hz: {off:.5} dB");
    }
}
