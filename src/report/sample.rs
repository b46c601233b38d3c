//! Hand-made results for the tests of the reports: plausible in shape, invented in every figure.

use crate::measure::harmonics::HarmonicReport;
use crate::stage::operating_point::*;
use crate::stage::ratings::{Condition, RatingCheck, RatingKind};
use crate::study::result::*;
use crate::trial::figures::*;

const STAGES: [&str; 2] = ["first", "power"];

fn stage(k: usize) -> StagePoint {
    let power = k == 1;
    let pick = |a: f64, b: f64| if power { b } else { a };
    StagePoint {
        name: STAGES[k].into(),
        tube: if power { "EL84" } else { "12AX7" }.into(),
        parallel: 1,
        triode_connected: false,
        plate_volts: pick(162.3, 251.7),
        screen_volts: power.then_some(244.1),
        grid_volts: 0.0,
        cathode_volts: pick(1.23, 7.41),
        v_gk: pick(-1.23, -7.41),
        v_pk: pick(161.1, 244.3),
        v_sk: power.then_some(236.7),
        plate_amperes: pick(0.00082, 0.0412),
        screen_amperes: power.then_some(0.0046),
        grid_amperes: 0.0,
        plate_watts: pick(0.132, 10.07),
        screen_watts: power.then_some(1.09),
        gm: pick(0.00148, 0.0108),
        rp: Some(pick(67_000.0, 39_500.0)),
        mu: Some(pick(99.2, 427.0)),
        ac_load: pick(82_000.0, 5200.0),
        gain: pick(-54.6, -49.1),
        grid_circuit_ohms: pick(68_000.0, 470_000.0),
        fixed_bias: false,
    }
}

pub fn point() -> OperatingPoint {
    let rail = |name: &str, volts: f64, amperes: f64| RailPoint {
        name: name.into(),
        volts,
        amperes,
        cold_volts: 285.0,
    };
    let resistor = |name: &str, ohms: f64, volts: f64| ResistorPoint {
        name: name.into(),
        ohms,
        volts,
        watts: volts * volts / ohms,
    };
    let capacitor = |name: &str, farads: f64, volts: f64, cold_volts: f64| CapacitorPoint {
        name: name.into(),
        farads,
        volts,
        cold_volts,
    };
    OperatingPoint {
        supply: SupplyPoint {
            cold_volts: 285.0,
            volts: 278.0,
            amperes: 0.0466,
            resistance: 150.0,
        },
        rails: vec![rail("main", 278.0, 0.0466), rail("screens", 244.1, 0.0054)],
        stages: vec![stage(0), stage(1)],
        resistors: vec![
            resistor("stage.first.plate.resistor", 100_000.0, 82.0),
            resistor("stage.power.cathode.resistor", 162.0, 7.41),
            resistor("stage.first.cathode.resistor", 1500.0, 1.23),
        ],
        capacitors: vec![
            capacitor("supply.rail.main.capacitor", 47e-6, 278.0, 285.0),
            capacitor("stage.power.input.coupling", 22e-9, 162.3, 285.0),
        ],
        transformer: TransformerPoint {
            turns_ratio: 25.0,
            primary_inductance: 6.1,
            leakage_inductance: 0.052,
            shunt_capacitance: 400e-12,
            primary_resistance: 200.0,
            secondary_resistance: 0.32,
            core_loss: 100_000.0,
            inductance_if_pentode: Some(11.8),
            inductance_if_matched: Some(6.1),
            direct_amperes: 0.0412,
            direct_rated: None,
            reflected_load: 5000.0,
            assumptions: vec!["primary copper 200 Ω: 4 % of the primary impedance".into()],
        },
        iterations: 9,
        used_fallback: false,
    }
}

pub fn ratings() -> Vec<RatingCheck> {
    let check = |k: usize, kind, condition, value, limit, memory| {
        let s = stage(k);
        RatingCheck::new(&s.name, &s.tube, kind, condition, value, limit, memory)
    };
    let driven = Condition::Driven {
        input_v_peak: 0.7,
        setting: Some(10.0),
    };
    vec![
        check(
            0,
            RatingKind::PlateVolts,
            Condition::Idle,
            161.1,
            300.0,
            false,
        ),
        check(
            1,
            RatingKind::PlateDissipation,
            Condition::Idle,
            10.07,
            12.0,
            false,
        ),
        check(
            1,
            RatingKind::PlateColdVolts,
            Condition::ColdStart,
            285.0,
            300.0,
            false,
        ),
        check(1, RatingKind::ScreenDissipation, driven, 2.31, 2.0, true),
    ]
}

/// Harmonics that grow as weak curvature makes them, up to a square wave's order.
pub fn harmonics(drive: f64) -> HarmonicReport {
    let thd_limit = |percent: f64| percent / (1.0 + (percent / 45.0).powi(2)).sqrt();
    let percents: [f64; 9] = std::array::from_fn(|i| {
        let n = (i + 2) as f64;
        let odd = if i % 2 == 1 { 1.3 } else { 0.7 };
        thd_limit(3.0 * odd * drive.powf(0.9 * (n - 1.0)) / n)
    });
    let root_sum: f64 = percents.iter().map(|p| p * p).sum::<f64>().sqrt();
    HarmonicReport {
        fundamental_peak: 4.0 * drive / (1.0 + drive),
        dc: 0.0,
        rms: 2.8 * drive / (1.0 + drive),
        harmonics_dbc: percents.map(|p| Some(20.0 * (p / 100.0).log10())),
        phases_deg: std::array::from_fn(|i| Some(if i % 2 == 0 { 90.0 } else { -178.0 })),
        signed_percent: std::array::from_fn(|i| {
            Some(if i % 2 == 0 {
                percents[i]
            } else {
                -percents[i]
            })
        }),
        thd_percent: root_sum,
        thd_total_percent: 100.0 * root_sum / root_sum.hypot(100.0),
        residual_percent: root_sum,
        weighted_rma_percent: root_sum,
        weighted_shorter_percent: root_sum,
    }
}

pub fn level(input_v_peak: f64, gain: f64) -> LevelFigures {
    let drive = input_v_peak * gain;
    let h = harmonics(drive);
    let output_v_rms = h.rms;
    let stage = |share: f64| StageLevel {
        bias_shift_v: -0.4 * (drive - 1.0).max(0.0) * share,
        h2_percent: Ok(-2.0 * drive * share),
        h3_percent: Ok(0.6 * drive * drive * share),
        plate_v_peak: 40.0 * drive * share,
        plate_watts: 10.07 * share,
        screen_watts: 1.1 + 0.4 * drive * share,
        plate_amperes: 0.041,
        screen_amperes: 0.005,
        grid_amperes: 1e-7 * drive,
        v_gk_mean: -7.4 - 0.1 * drive,
        towards: Towards::default(),
    };
    LevelFigures {
        input_v_peak,
        output_v_rms,
        output_w: output_v_rms * output_v_rms / 8.0,
        gain_db: Ok(20.0 * (h.fundamental_peak / input_v_peak).log10()),
        harmonics: Ok(h),
        stages: vec![stage(0.2), stage(1.0)],
        settled: true,
    }
}

pub fn tone(nominal_hz: f64, gain: f64) -> ToneFigures {
    let levels: Vec<LevelFigures> = (0..25)
        .map(|i| level(0.005 * 10f64.powf(f64::from(i) * 0.1), gain))
        .collect();
    let onset_v = 1.0 / gain;
    let reached = |v: f64| {
        if v < 2.0 {
            Ok(v)
        } else {
            Err(Missing::NotReached)
        }
    };
    let crossing = |percent: f64, v: f64| ThdCrossing {
        percent,
        input_v_peak: reached(v),
        crossings: usize::from(v < 2.0),
    };
    ToneFigures {
        nominal_hz,
        tone_hz: nominal_hz * 1.0017,
        test: level(0.2, gain),
        levels,
        onset: reached(onset_v).map(|input_v_peak| ClippingOnset {
            input_v_peak,
            stage: 1,
            mechanism: Mechanism::GridConduction,
        }),
        headroom: vec![
            StageHeadroom {
                stage: 0,
                first: reached(3.0 * onset_v).map(|v| (v, Mechanism::Cutoff)),
                to_next_db: None,
                grid_mark_v_peak: Err(Missing::NotReached),
            },
            StageHeadroom {
                stage: 1,
                first: reached(onset_v).map(|v| (v, Mechanism::GridConduction)),
                to_next_db: Some(9.54),
                grid_mark_v_peak: reached(0.9 * onset_v),
            },
        ],
        thd_inputs: vec![
            crossing(1.0, 0.6 * onset_v),
            crossing(3.0, 1.2 * onset_v),
            crossing(5.0, 1.6 * onset_v),
            crossing(10.0, 2.4 * onset_v),
        ],
        compression_1db_v_peak: reached(1.1 * onset_v),
        power: Power {
            at_onset_w: reached(onset_v).map(|_| 1.9),
            at_5_percent_w: reached(1.6 * onset_v).map(|_| 2.8),
            at_10_percent_w: reached(2.4 * onset_v).map(|_| 3.6),
            max_w: 4.4,
        },
    }
}

pub fn response() -> Response {
    Response {
        points: (0..=60)
            .map(|i| {
                let f = 20.0 * 1000f64.powf(f64::from(i) / 60.0);
                let low = -10.0 * (1.0 + (70.0 / f).powi(2)).log10();
                let high = -10.0 * (1.0 + (f / 9000.0).powi(2)).log10();
                (f, low + high + 1.2 * (-(f / 400.0).ln().powi(2)).exp())
            })
            .collect(),
        gain_1khz_db: 28.4,
        low_3db_hz: Ok(66.0),
        high_3db_hz: Ok(9200.0),
    }
}

pub fn gain_figures(setting: f64) -> GainFigures {
    let gain = 0.5 + 0.06 * setting * setting;
    GainFigures {
        setting: Some(setting),
        wav: Some(format!("gain-{setting}.wav")),
        listening_wav: Some(format!("gain-{setting}-listening.wav")),
        tones: vec![tone(1000.0, gain), tone(82.4, gain), tone(220.0, gain)],
        response: response(),
        alias: Alias {
            tone_hz: 4110.0,
            input_v_peak: 0.2,
            worst_dbc: Ok(-104.2),
            worst_hz: Ok(3111.0),
        },
        loudness_lufs: Ok(-21.3),
        output_peak_v: 6.7,
        bias_excursion_v: vec![(-0.02, 0.01), (-2.1, 0.4)],
    }
}

pub fn transfer(k: usize) -> TransferCurve {
    let span = if k == 0 { 4.0 } else { 20.0 };
    let swing = if k == 0 { 130.0 } else { 220.0 };
    let slope = if k == 0 { 55.0 } else { 25.0 };
    let plate = |x: f64| -swing * (slope * x / swing + 0.15).tanh() + swing * 0.15f64.tanh();
    TransferCurve {
        stage: STAGES[k].into(),
        points: (0..=160)
            .map(|i| {
                let x = span * (f64::from(i) / 80.0 - 1.0);
                let step = 1e-4 * span;
                let gain = (plate(x + step) - plate(x - step)) / (2.0 * step);
                let rest = (plate(step) - plate(-step)) / (2.0 * step);
                TransferPoint {
                    drive_v: x,
                    v_gk: stage(k).v_gk + x,
                    plate_v: plate(x),
                    plate_a: stage(k).plate_amperes * (1.0 - plate(x) / swing),
                    grid_a: 1e-5 * (x - 0.3 * span).max(0.0),
                    relative_gain: gain / rest,
                }
            })
            .collect(),
        limits: vec![
            ("cutoff".into(), -0.55 * span),
            ("rest".into(), 0.0),
            ("grid-conduction".into(), 0.3 * span),
            ("plate-knee".into(), 0.62 * span),
        ],
        drive_ohms: 220_000.0,
    }
}

pub fn diagram(k: usize) -> PlateDiagram {
    let s = stage(k);
    let (top_v, load) = if k == 0 {
        (320.0, 100_000.0)
    } else {
        (480.0, 5200.0)
    };
    let law = |vg: f64, v: f64| {
        if k == 0 {
            1e-3 * (v / 100.0 + vg).max(0.0).powf(1.4) / 1.1
        } else {
            0.0019 * (12.5 + vg).max(0.0).powf(1.5) * (1.0 - (-v / 25.0).exp()) * (1.0 + v / 3000.0)
        }
    };
    let grids: Vec<f64> = if k == 0 {
        (0..9).map(|i| -0.5 * f64::from(i)).collect()
    } else {
        (0..7).map(|i| -2.0 * f64::from(i)).collect()
    };
    let line = |ohms: f64| {
        let reach = s.v_pk + s.plate_amperes * ohms;
        vec![(0.0, reach / ohms), (reach, 0.0)]
    };
    PlateDiagram {
        curves: grids
            .into_iter()
            .map(|vg| {
                let points = (0..=80)
                    .map(|i| top_v * f64::from(i) / 80.0)
                    .map(|v| (v, law(vg, v)))
                    .collect();
                (vg, points)
            })
            .collect(),
        direct_line: if k == 0 { line(101_500.0) } else { line(362.0) },
        alternating_line: line(0.82 * load),
        operating: (s.v_pk, s.plate_amperes),
        dissipation_w: Some(if k == 0 { 1.0 } else { 12.0 }),
        plate_volts_limit: Some(300.0),
        screen_volts: s.v_sk,
    }
}

pub fn curve(k: usize) -> CurveStudy {
    CurveStudy {
        design: "Corner Room".into(),
        stage: STAGES[k].into(),
        tube: stage(k).tube,
        transfer: transfer(k),
        diagram: diagram(k),
        warnings: vec![],
    }
}

pub fn warning() -> Warning {
    Warning {
        code: crate::diagnostic::Code::DiLevel,
        place: "take.wav".into(),
        message: "its peak of 412 mV at the jack is that of a hard chord".into(),
    }
}

pub fn bias() -> BiasStudy {
    BiasStudy {
        design: "Corner Room".into(),
        description: "invented for tests".into(),
        gain: Some(10.0),
        point: point(),
        ratings: ratings(),
        warnings: vec![warning()],
    }
}

pub fn render() -> RenderStudy {
    RenderStudy {
        design: "Corner Room".into(),
        description: "invented for tests".into(),
        full_scale_v_peak: 1.0,
        test_level_v_peak: 0.2,
        tone_hz: 1000.0,
        oversample: 8,
        rate_hz: 384_000.0,
        di: DiFacts {
            name: "take.wav".into(),
            rate_hz: 48_000,
            frames: 480_000,
            channels: 1,
            peak_v: 0.412,
            rms_v: 0.031,
        },
        scale_db: -18.2,
        wav_full_scale_v_peak: 8.1,
        load_ohms: 8.0,
        render_load: "loudspeaker".into(),
        listening: "plain band-limit, 75 Hz to 5 kHz".into(),
        point: point(),
        ratings: ratings(),
        gain_settings: [2.0, 5.0, 10.0].map(gain_figures).to_vec(),
        transfer: vec![transfer(0), transfer(1)],
        warnings: vec![warning()],
    }
}

/// The same with every figure missing that can be.
pub fn render_without_figures() -> RenderStudy {
    let mut study = render();
    let missing = Missing::NotSettled;
    for s in &mut study.point.stages {
        (s.screen_volts, s.v_sk, s.screen_amperes, s.screen_watts) = (None, None, None, None);
        (s.rp, s.mu) = (None, None);
    }
    study.point.transformer.inductance_if_matched = None;
    study.point.transformer.inductance_if_pentode = None;
    study.point.supply.resistance = f64::INFINITY;
    for g in &mut study.gain_settings {
        (g.setting, g.wav, g.listening_wav) = (None, None, None);
        g.loudness_lufs = Err(Missing::NoSignal);
        g.response.low_3db_hz = Err(Missing::NotReached);
        g.response.high_3db_hz = Err(Missing::NotReached);
        g.response.gain_1khz_db = f64::NAN;
        g.alias.worst_dbc = Err(Missing::NoSignal);
        g.alias.worst_hz = Err(Missing::NoSignal);
        for t in &mut g.tones {
            t.onset = Err(missing);
            t.compression_1db_v_peak = Err(missing);
            t.power.at_onset_w = Err(missing);
            t.power.at_5_percent_w = Err(missing);
            t.power.at_10_percent_w = Err(missing);
            t.thd_inputs
                .iter_mut()
                .for_each(|c| c.input_v_peak = Err(missing));
            for h in &mut t.headroom {
                (h.first, h.to_next_db, h.grid_mark_v_peak) = (Err(missing), None, Err(missing));
            }
            for l in t.levels.iter_mut().chain([&mut t.test]) {
                (l.harmonics, l.gain_db) = (Err(missing), Err(missing));
                l.settled = false;
                for s in &mut l.stages {
                    (s.h2_percent, s.h3_percent) = (Err(missing), Err(missing));
                }
            }
        }
    }
    study
}
