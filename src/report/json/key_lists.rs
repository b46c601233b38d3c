//! The keys of every document. Adding one is a visible edit here; removing or redefining one raises the schema number.

use std::collections::{BTreeMap, BTreeSet};

use serde_json::Value;

use super::*;
use crate::diagnostic::{Code, Diagnostic, Place};
use crate::report::listing::{DesignRow, KeyRow};
use crate::report::sample;
use crate::tube::Catalog;

/// For each object `path: key key …`; a key that was null with a reason has a `?`.
fn keys(documents: &[String]) -> String {
    fn walk(value: &Value, path: &str, objects: &mut BTreeMap<String, BTreeSet<String>>) {
        match value {
            Value::Object(map) => {
                for (key, item) in map {
                    walk(item, &format!("{path}.{key}"), objects);
                    let keys = objects.entry(path.to_owned()).or_default();
                    match key.strip_suffix("_reason") {
                        Some(of) => keys.insert(format!("{of}?")),
                        None => keys.insert(key.clone()),
                    };
                }
            }
            Value::Array(items) => {
                for item in items {
                    walk(item, &format!("{path}[]"), objects);
                }
            }
            _ => {}
        }
    }
    let mut objects = BTreeMap::new();
    for document in documents {
        let value = serde_json::from_str(document).expect("a document is JSON");
        walk(&value, "", &mut objects);
    }
    let mut out = String::new();
    for (path, keys) in objects {
        let nullable = |key: &&String| !keys.contains(&format!("{key}?"));
        let keys: Vec<_> = keys.iter().filter(nullable).cloned().collect();
        let path = path.trim_start_matches('.');
        let path = if path.is_empty() { "document" } else { path };
        out += &format!("{path}: {}\n", keys.join(" "));
    }
    out
}

#[track_caller]
fn assert_keys(documents: &[String], recorded: &str) {
    let found = keys(documents);
    let same = found.split_whitespace().eq(recorded.split_whitespace());
    assert!(same, "the keys are now:\n{found}");
}

#[test]
fn render() {
    let files = ["report.json".to_owned()];
    let mut study = sample::render();
    let tone = &mut study.gain_settings[0].tones[0];
    let harmonics = tone
        .test
        .harmonics
        .as_mut()
        .expect("the sample has harmonics");
    (harmonics.harmonics_dbc[8], harmonics.phases_deg[8]) = (None, None);
    assert_keys(
        &[
            render_document(&study, &files),
            render_document(&sample::render_without_figures(), &files),
        ],
        "
         document: capacitors description design di files full_scale_v_peak gain_settings kind listening
           load_ohms operating_point oversample rails rate_hz ratings render_load resistors safety scale_db
           schema solution supply test_level_v_peak tone_hz transformer warnings wav_full_scale_v_peak
         capacitors[]: cold_v farads name running_v
         di: channels frames name peak_v rate_hz rms_v
         gain_settings[]: alias_dbc? alias_hz? alias_input_v_peak alias_tone_hz bias_excursion
           clipping_onset? compression_1db_input_v_peak? gain_db? harmonics_dbc? harmonics_dbc_reasons
           harmonics_phase_deg? harmonics_phase_deg_reasons headroom input_v_peak_for_thd listening_wav?
           loudness_lufs? nominal_hz output_peak_v output_v_rms output_w power residual_percent? response
           setting? settled stages thd_percent? thd_total_percent? tone_hz tones wav?
         gain_settings[].bias_excursion[]: highest_v lowest_v stage
         gain_settings[].clipping_onset: input_dbfs input_dbv input_v_peak mechanism stage
         gain_settings[].headroom[]: grid_mark_input_v_peak? input_v_peak? mechanism? stage to_next_db?
         gain_settings[].input_v_peak_for_thd[]: crossings input_v_peak? percent
         gain_settings[].power: at_10_percent_w? at_5_percent_w? at_onset_w? max_w
         gain_settings[].response: gain_1khz_db? high_3db_hz? low_3db_hz? points
         gain_settings[].response.points[]: db hz
         gain_settings[].stages[]: bias_shift_v h2_percent? h3_percent? stage
         gain_settings[].tones[]: clipping_onset? compression_1db_input_v_peak? gain_db? harmonics_dbc?
           harmonics_phase_deg? headroom input_v_peak_for_thd nominal_hz output_v_rms output_w power
           residual_percent? settled stages thd_percent? thd_total_percent? tone_hz
         gain_settings[].tones[].clipping_onset: input_dbfs input_dbv input_v_peak mechanism stage
         gain_settings[].tones[].headroom[]: grid_mark_input_v_peak? input_v_peak? mechanism? stage
           to_next_db?
         gain_settings[].tones[].input_v_peak_for_thd[]: crossings input_v_peak? percent
         gain_settings[].tones[].power: at_10_percent_w? at_5_percent_w? at_onset_w? max_w
         gain_settings[].tones[].stages[]: bias_shift_v h2_percent? h3_percent? stage
         operating_point[]: ac_load_ohms amplification_factor? cathode_v fixed_bias gain grid_a
           grid_circuit_ohms grid_to_cathode_v grid_v parallel plate_a plate_resistance_ohms?
           plate_to_cathode_v plate_v plate_w screen_a? screen_to_cathode_v? screen_v? screen_w? stage
           transconductance_s triode_connected tube
         rails[]: cold_v current_a rail running_v
         ratings[]: condition exceeded input_v_peak? limit limit_from_memory margin_percent rating setting?
           stage tube unit value
         resistors[]: across_v dissipation_w name ohms
         solution: iterations supply_stepped_up
         supply: cold_v current_a running_v source_ohms?
         transformer: assumptions core_loss_ohms direct_a direct_rated_a? inductance_if_matched_h?
           inductance_if_pentode_h? leakage_inductance_h primary_inductance_h primary_resistance_ohms
           reflected_load_ohms secondary_resistance_ohms shunt_capacitance_f turns_ratio
         warnings[]: code message place
        ",
    );
}

#[test]
fn bias() {
    let full = sample::bias();
    let mut poor = sample::bias();
    poor.gain = None;
    poor.point = sample::render_without_figures().point;
    assert_keys(&[bias_document(&full), bias_document(&poor)], "
         document: capacitors description design kind operating_point rails ratings resistors safety schema
           setting? solution supply transformer warnings
         capacitors[]: cold_v farads name running_v
         operating_point[]: ac_load_ohms amplification_factor? cathode_v fixed_bias gain grid_a
           grid_circuit_ohms grid_to_cathode_v grid_v parallel plate_a plate_resistance_ohms?
           plate_to_cathode_v plate_v plate_w screen_a? screen_to_cathode_v? screen_v? screen_w? stage
           transconductance_s triode_connected tube
         rails[]: cold_v current_a rail running_v
         ratings[]: condition exceeded input_v_peak? limit limit_from_memory margin_percent rating setting?
           stage tube unit value
         resistors[]: across_v dissipation_w name ohms
         solution: iterations supply_stepped_up
         supply: cold_v current_a running_v source_ohms?
         transformer: assumptions core_loss_ohms direct_a direct_rated_a? inductance_if_matched_h?
           inductance_if_pentode_h? leakage_inductance_h primary_inductance_h primary_resistance_ohms
           reflected_load_ohms secondary_resistance_ohms shunt_capacitance_f turns_ratio
         warnings[]: code message place
        ");
}

#[test]
fn curve() {
    let mut studies = [sample::curve(0), sample::curve(1)];
    studies[0].diagram.dissipation_w = None;
    studies[0].diagram.plate_volts_limit = None;
    studies[0].warnings.push(sample::warning());
    assert_keys(
        &[curve_document(&studies, &["first.svg".into()])],
        "
         document: design files kind schema stages warnings
         stages[]: drive_ohms limits plate_diagram stage transfer tube
         stages[].limits[]: drive_v limit
         stages[].plate_diagram: alternating_load_line direct_load_line dissipation_limit_w? operating
           plate_curves plate_limit_v? screen_to_cathode_v?
         stages[].plate_diagram.alternating_load_line[]: plate_a plate_v
         stages[].plate_diagram.direct_load_line[]: plate_a plate_v
         stages[].plate_diagram.operating: plate_a plate_v
         stages[].plate_diagram.plate_curves[]: grid_to_cathode_v points
         stages[].plate_diagram.plate_curves[].points[]: plate_a plate_v
         stages[].transfer[]: drive_v grid_a grid_to_cathode_v plate_a plate_v relative_gain
         warnings[]: code message place
        ",
    );
}

#[test]
fn tubes() {
    let catalog = Catalog::shipped();
    let tubes = catalog.tubes().iter().map(AsRef::as_ref);
    assert_keys(
        &[tubes_document(tubes)],
        "
         document: kind schema tubes
         tubes[]: aliases caution? description grid_current_assumed name tube_type
        ",
    );
}

#[test]
fn tube() {
    let mut tube = Catalog::shipped().tubes()[0].as_ref().clone();
    let full = tube_document(&tube);
    tube.ratings.plate_volts = None;
    tube.caution = Some("invented".into());
    assert_keys(&[full, tube_document(&tube)], "
         document: aliases capacitances capacitances_origin caution? description fitted_range
           fitted_range_origin grid_current grid_current_assumed grid_current_origin kind law law_origin name
           rating_system ratings ratings_origin schema tube_type
         capacitances[]: name unit value
         capacitances_origin: confidence from_memory source
         fitted_range[]: high low name unit
         fitted_range_origin: confidence from_memory source
         grid_current[]: name unit? value
         grid_current_origin: confidence from_memory source
         law[]: name unit? value
         law_origin: confidence from_memory source
         ratings[]: limit? name unit
         ratings_origin: confidence from_memory source
        ");
}

#[test]
fn designs() {
    let row = DesignRow {
        word: "corner".into(),
        name: "Corner Room".into(),
        description: "invented".into(),
        is_default: true,
    };
    assert_keys(
        &[designs_document(&[row])],
        "
         document: designs kind schema
         designs[]: description is_default name word
        ",
    );
}

#[test]
fn keys_of_a_design() {
    let row = |unit: Option<&str>| KeyRow {
        path: "load.resistance".into(),
        kind: "ohms".into(),
        unit: unit.map(Into::into),
        need: "required".into(),
        default: unit.map(Into::into),
        range: unit.map(Into::into),
        words: vec![],
        help: "invented".into(),
        example: "8R".into(),
    };
    assert_keys(
        &[keys_document(&[row(Some("Ω")), row(None)])],
        "
         document: keys kind schema
         keys[]: default? example help need path range? unit? value words
        ",
    );
}

#[test]
fn error() {
    let fault = |place, hint: Option<&str>| Diagnostic {
        code: Code::Syntax,
        path: String::new(),
        place,
        message: "invented".into(),
        hint: hint.map(Into::into),
    };
    let faults = Faults {
        name: "amp.toml",
        text: Some("a"),
        diagnostics: &[
            fault(Place::Text(0..1), Some("so")),
            fault(Place::Whole, None),
        ],
    };
    assert_keys(
        &[error_document(&[faults])],
        "
         document: diagnostics kind schema
         diagnostics[]: code column? hint? line? message path place
        ",
    );
}
