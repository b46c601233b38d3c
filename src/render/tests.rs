use std::sync::Arc;

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

#[test]
fn silence_stays_silent_and_small_signals_meet_the_ac_analysis() {
    let rate = 384e3;
    let amp = amplifier(5.0);
    for (name, v) in amp.wiring.net.node_names.iter().zip(&amp.rest.volts) {
        println!("{name:40} {v:.6}");
    }
    println!(
        "iterations {} fallback {}",
        amp.rest.iterations, amp.rest.used_fallback
    );
    let t = std::time::Instant::now();
    let model = Model::new(&amp, rate, 1.0).unwrap();
    println!("model {:?}", t.elapsed());
    println!("iron {:?}", amp.iron);
    let mut kernel = Kernel::<1>::new([&model]);
    let mut worst = 0.0f64;
    for _ in 0..100_000 {
        worst = worst.max(kernel.step([0.0])[0].abs());
    }
    println!("silence {worst:.3e} V strayed {}", kernel.strayed);
    for hz in [100.0, 1e3, 5e3, 20e3] {
        let mut kernel = Kernel::<1>::new([&model]);
        let a = 1e-5;
        let n = (rate / hz) as usize;
        let f = rate / n as f64;
        let mut out = (0.0, 0.0);
        let cycles = 3 + (0.6 * f) as usize;
        for c in 0..cycles {
            out = (0.0, 0.0);
            for k in 0..n {
                let phase = std::f64::consts::TAU * k as f64 / n as f64;
                let y = kernel.step([a * phase.sin()])[0];
                if c == cycles - 1 {
                    out.0 += 2.0 / n as f64 * y * phase.cos();
                    out.1 += 2.0 / n as f64 * y * phase.sin();
                }
            }
        }
        let g = out.0.hypot(out.1) / a;
        let discrete = amp
            .gain_at(f, Axis::Trapezoidal { step: 1.0 / rate })
            .norm();
        let continuous = amp.gain_at(f, Axis::Continuous).norm();
        println!(
            "{f:8.1} Hz gain {g:.6} discrete {:+.5} dB continuous {:+.5} dB",
            20.0 * (g / discrete).log10(),
            20.0 * (g / continuous).log10()
        );
    }
}

#[test]
fn looks() {
    let text = crate::design::shipped()[0].1;
    let reading = crate::design::read(text, &[]).unwrap();
    let catalog = Catalog::shipped();
    let prepared =
        crate::stage::resolve::prepare(&reading.design, &reading.places, &catalog, &|_| None)
            .unwrap();
    let amp = Amplifier::solve(
        &prepared.design,
        &prepared.devices,
        &prepared.iron,
        Some(5.0),
        LoadKind::Rated,
    )
    .unwrap();
    let di = crate::wav::read(crate::signal::DEFAULT_DI).unwrap();
    let model = Model::new(&amp, 384e3, 1.0).unwrap();
    let mut kernel = Kernel::<1>::new([&model]);
    let over = crate::resample::Oversampler::new(8).unwrap();
    let mut n = 0u64;
    over.process(&di.channels[0][..96000], |b| {
        for x in b {
            n += 1;
            *x = kernel.step([*x])[0];
        }
    })
    .unwrap();
    println!(
        "looks per stage and sample {} strayed {}",
        kernel.looks as f64 / n as f64 / 3.0,
        kernel.strayed
    );
    for b in &model.networks {
        println!(
            "states {} inputs {} ports {} draws {} watched {}",
            b.reactive.len(),
            b.inputs.len(),
            b.ports.len(),
            b.draws.len(),
            b.watched.len()
        );
    }
}

#[test]
fn shoot() {
    use crate::measure::harmonics::HarmonicAnalysis;
    use crate::trial::steady::{Shooter, Tone};
    let rate = 384e3;
    let model = Model::new(&amplifier(5.0), rate, 8.0).unwrap();
    for hz in [1000.0, 82.4] {
        let t = std::time::Instant::now();
        let mut shooter = Shooter::new(&model, Tone::new(hz, rate));
        println!("{hz} new {:?}", t.elapsed());
        for k in -20..=16 {
            let level = 0.2 * 10f64.powf(k as f64 / 10.0);
            let t = std::time::Instant::now();
            let c = shooter.steady(level);
            let dt = t.elapsed();
            let h = HarmonicAnalysis::of_period(&c.output)
                .unwrap()
                .report()
                .unwrap();
            println!(
                "{level:8.4} V periods {:4} settled {} out {:8.4} V thd {:8.4} H2 {:?} H3 {:?}  {:?}",
                c.periods,
                c.settled,
                h.rms,
                h.thd_percent,
                h.signed_percent[0],
                h.signed_percent[1],
                dt
            );
        }
    }
}

#[test]
fn tone_run() {
    let rate = 384e3;
    let amp = amplifier(5.0);
    let model = Model::new(&amp, rate, 8.0).unwrap();
    for hz in [1000.0, 82.4] {
        let t = std::time::Instant::now();
        let f = crate::trial::tone::run(&amp, &model, hz, 0.2);
        println!(
            "{hz}: {:?} {:?}\n{:?}\n{:?}\n{:?}\n{:?}",
            t.elapsed(),
            f.onset,
            f.headroom,
            f.thd_inputs,
            f.compression_1db_v_peak,
            f.power
        );
    }
    for hz in [1200.0, 2600.0, 4100.0] {
        for v in [0.0015, 0.006, 0.024] {
            println!("{:?}", crate::trial::alias::measure(&model, hz, v, 48e3));
        }
    }
}
