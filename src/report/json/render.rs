//! What a render found.

use super::entry::{Inline, Nullable, objects};
use super::point::{self, Capacitor, Rail, Rating, Resistor, Solution, Stage, Supply, Transformer};
use super::tone::{Frame, ToneEntry, figure};
use super::{SCHEMA, point::WarningEntry, written};
use crate::report::safety;
use crate::study::result::{GainFigures, RenderStudy};
use crate::trial::figures::Response;

objects! {
    Render {
        schema: u32,
        kind: &'static str,
        design: String,
        description: String,
        safety: String,
        full_scale_v_peak: f64,
        test_level_v_peak: f64,
        tone_hz: f64,
        oversample: usize,
        rate_hz: f64,
        di: Recording,
        scale_db: f64,
        wav_full_scale_v_peak: f64,
        load_ohms: f64,
        render_load: String,
        listening: String,
        warnings: Vec<WarningEntry>,
        ratings: Vec<Rating>,
        gain_settings: Vec<GainSetting>,
        operating_point: Vec<Stage>,
        supply: Supply,
        rails: Vec<Rail>,
        resistors: Vec<Resistor>,
        capacitors: Vec<Capacitor>,
        transformer: Transformer,
        solution: Solution,
        /// Names within the set, this document included.
        files: Vec<String>,
    }
    Recording {
        name: String,
        rate_hz: u32,
        frames: usize,
        channels: usize,
        peak_v: f64,
        rms_v: f64,
    }
    GainSetting {
        setting: Nullable<f64>,
        wav: Nullable<String>,
        listening_wav: Nullable<String>,
        /// The headline tone.
        headline: Inline<ToneEntry>,
        alias_dbc: Nullable<f64>,
        alias_hz: Nullable<f64>,
        alias_tone_hz: f64,
        alias_input_v_peak: f64,
        loudness_lufs: Nullable<f64>,
        output_peak_v: f64,
        bias_excursion: Vec<BiasExcursion>,
        response: ResponseEntry,
        /// The same figures at the other tones.
        tones: Vec<ToneEntry>,
    }
    /// While the recording played.
    BiasExcursion {
        stage: String,
        lowest_v: f64,
        highest_v: f64,
    }
    ResponseEntry {
        low_3db_hz: Nullable<f64>,
        high_3db_hz: Nullable<f64>,
        gain_1khz_db: f64,
        points: Vec<ResponsePoint>,
    }
    /// Decibels re the gain at 1 kHz.
    ResponsePoint {
        hz: f64,
        db: f64,
    }
}

/// What `forehear render` found, as JSON; `files` are the names in the set, in the order they were written.
pub fn render_document(study: &RenderStudy, files: &[String]) -> String {
    let stages: Vec<String> = study.point.stages.iter().map(|s| s.name.clone()).collect();
    let frame = Frame {
        full_scale_v_peak: study.full_scale_v_peak,
        rate_hz: study.rate_hz,
        stages: &stages,
    };
    let p = &study.point;
    let gain_settings = study.gain_settings.iter();
    written(&Render {
        schema: SCHEMA,
        kind: "render",
        design: study.design.clone(),
        description: study.description.clone(),
        safety: safety::text(),
        full_scale_v_peak: study.full_scale_v_peak,
        test_level_v_peak: study.test_level_v_peak,
        tone_hz: study.tone_hz,
        oversample: study.oversample,
        rate_hz: study.rate_hz,
        di: Recording {
            name: study.di.name.clone(),
            rate_hz: study.di.rate_hz,
            frames: study.di.frames,
            channels: study.di.channels,
            peak_v: study.di.peak_v,
            rms_v: study.di.rms_v,
        },
        scale_db: study.scale_db,
        wav_full_scale_v_peak: study.wav_full_scale_v_peak,
        load_ohms: study.load_ohms,
        render_load: study.render_load.clone(),
        listening: study.listening.clone(),
        warnings: point::warnings(&study.warnings),
        ratings: study.ratings.iter().map(point::rating).collect(),
        gain_settings: gain_settings.map(|g| gain_setting(&frame, g)).collect(),
        operating_point: point::stages(p),
        supply: point::supply(p),
        rails: point::rails(p),
        resistors: point::resistors(p),
        capacitors: point::capacitors(p),
        transformer: point::transformer(&p.transformer),
        solution: point::solution(p),
        files: files.to_vec(),
    })
}

fn gain_setting(frame: &Frame, g: &GainFigures) -> GainSetting {
    let mut tones = g.tones.iter().map(|t| frame.tone(t));
    let headline = tones.next().expect("a gain setting has its headline tone");
    let excursions = g.bias_excursion_v.iter().enumerate();
    GainSetting {
        setting: point::setting(g.setting),
        wav: g.wav.clone().ok_or("not-written"),
        listening_wav: g.listening_wav.clone().ok_or("not-written"),
        headline: Inline(headline),
        alias_dbc: figure(&g.alias.worst_dbc),
        alias_hz: figure(&g.alias.worst_hz),
        alias_tone_hz: g.alias.tone_hz,
        alias_input_v_peak: g.alias.input_v_peak,
        loudness_lufs: figure(&g.loudness_lufs),
        output_peak_v: g.output_peak_v,
        bias_excursion: excursions
            .map(|(k, &(lowest_v, highest_v))| BiasExcursion {
                stage: frame.stages.get(k).cloned().unwrap_or_default(),
                lowest_v,
                highest_v,
            })
            .collect(),
        response: response(&g.response),
        tones: tones.collect(),
    }
}

fn response(r: &Response) -> ResponseEntry {
    ResponseEntry {
        low_3db_hz: figure(&r.low_3db_hz),
        high_3db_hz: figure(&r.high_3db_hz),
        gain_1khz_db: r.gain_1khz_db,
        points: r
            .points
            .iter()
            .map(|&(hz, db)| ResponsePoint { hz, db })
            .collect(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::report::sample;
    use serde_json::Value;

    /// The JSON reader of these tests may be off by a unit in the last place.
    fn same(read: &Value, written: f64) -> bool {
        (read.as_f64().unwrap() - written).abs() <= 2.0 * f64::EPSILON * written.abs()
    }

    fn read(study: &RenderStudy) -> Value {
        let text = render_document(study, &["report.json".into()]);
        serde_json::from_str(&text).expect("a document is JSON")
    }

    #[test]
    fn figures_come_through_unrounded() {
        let study = sample::render();
        let document = read(&study);
        let first = &document["gain_settings"][0];
        let tone = &study.gain_settings[0].tones[0];
        let harmonics = tone.test.harmonics.as_ref().unwrap();
        assert!(same(&first["thd_percent"], harmonics.thd_percent));
        assert!(same(
            &first["harmonics_dbc"][8],
            harmonics.harmonics_dbc[8].unwrap()
        ));
        assert_eq!(first["tones"].as_array().unwrap().len(), 2);
        assert_eq!(first["tones"][0]["nominal_hz"].as_f64(), Some(82.4));
        assert_eq!(document["schema"], 1);
        assert_eq!(document["ratings"][3]["condition"], "driven");
        assert_eq!(document["ratings"][3]["exceeded"], true);
    }

    #[test]
    fn onset_stands_in_volts_dbv_and_dbfs() {
        let mut study = sample::render();
        study.full_scale_v_peak = 2.0;
        let volts = 2f64.sqrt();
        study.gain_settings[0].tones[0]
            .onset
            .as_mut()
            .unwrap()
            .input_v_peak = volts;
        let onset = &read(&study)["gain_settings"][0]["clipping_onset"];
        assert!(same(&onset["input_v_peak"], volts));
        assert!(onset["input_dbv"].as_f64().unwrap().abs() < 1e-12);
        assert!((onset["input_dbfs"].as_f64().unwrap() + 3.0103).abs() < 1e-4);
        assert_eq!(onset["stage"], "power");
        assert_eq!(onset["mechanism"], "grid-conduction");
    }

    /// Every null in the document, wherever it is, has its reason; every reason stands beside a null.
    #[test]
    fn nulls_and_reasons_come_in_pairs() {
        fn walk(value: &Value, nulls: &mut usize) {
            match value {
                Value::Object(map) => {
                    for (key, item) in map {
                        if item.is_null() {
                            *nulls += 1;
                            assert!(map[&format!("{key}_reason")].is_string(), "{key}");
                        }
                        if let Some(of) = key.strip_suffix("_reason") {
                            assert!(map[of].is_null(), "{key}");
                        }
                        walk(item, nulls);
                    }
                }
                Value::Array(items) => items.iter().for_each(|i| walk(i, nulls)),
                _ => {}
            }
        }
        let mut nulls = 0;
        walk(&read(&sample::render_without_figures()), &mut nulls);
        assert!(nulls > 100, "{nulls}");
    }

    #[test]
    fn harmonics_that_do_not_exist_say_whether_band_or_rounding_ends_them() {
        let mut study = sample::render();
        study.rate_hz = 19_000.0;
        let tone = &mut study.gain_settings[0].tones[0];
        let harmonics = tone.test.harmonics.as_mut().unwrap();
        harmonics.harmonics_dbc[0] = None;
        harmonics.harmonics_dbc[8] = None;
        let first = &read(&study)["gain_settings"][0];
        assert!(first["harmonics_dbc"][0].is_null());
        assert_eq!(first["harmonics_dbc_reasons"][0], "below-rounding");
        assert_eq!(first["harmonics_dbc_reasons"][8], "above-band");
        assert!(first["harmonics_dbc_reasons"][1].is_null());
    }
}
