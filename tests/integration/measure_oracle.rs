//! Harmonic figures and crossings against NumPy and SciPy, as recorded by
//! `tests/oracle/measure_reference.py`.

use forehear::measure::crossing::{ValueScale, crossings};
use forehear::measure::harmonics::HarmonicAnalysis;
use serde_json::Value;

/// Rounding of a line in either transform, as a share of the largest sample: some tens of units in
/// the last place.
const ROUNDING: f64 = 64.0 * f64::EPSILON;
/// Rounding of a level found twice by root search, relative.
const SAME_LEVEL: f64 = 1e-12;

fn reference() -> Value {
    let path = concat!(
        env!("CARGO_MANIFEST_DIR"),
        "/tests/oracle/measure_reference.json"
    );
    let text = std::fs::read_to_string(path).expect("the recorded reference is in the repository");
    serde_json::from_str(&text).expect("the recorded reference is JSON")
}

fn numbers(value: &Value) -> Vec<f64> {
    let list = value.as_array().expect("a list");
    list.iter().map(|x| x.as_f64().expect("a number")).collect()
}

#[test]
fn harmonic_figures_are_those_of_numpy() {
    let reference = reference();
    let cases = reference["harmonics"].as_array().unwrap();
    assert_eq!(cases.len(), 6);
    for case in cases {
        let name = &case["name"];
        let samples = numbers(&case["samples"]);
        let periods = case["periods"].as_u64().unwrap() as usize;
        let analysis = HarmonicAnalysis::of_periods(&samples, periods, 10).unwrap();
        let report = analysis.report().unwrap();
        let figures = &case["figures"];
        let largest = samples.iter().fold(0.0_f64, |l, x| l.max(x.abs()));
        // The same share of the fundamental, which the ratios refer to.
        let rounding = ROUNDING * largest / report.fundamental_peak;
        let near = |key: &str, found: f64, expected: f64, tolerance: f64| {
            let error = (found - expected).abs();
            assert!(error < tolerance, "{name} {key}: {found} {expected}");
        };
        for (key, found) in [
            ("dc", report.dc),
            ("rms", report.rms),
            ("fundamental_peak", report.fundamental_peak),
        ] {
            near(
                key,
                found,
                figures[key].as_f64().unwrap(),
                ROUNDING * largest,
            );
        }
        for (key, found) in [
            ("thd_percent", report.thd_percent),
            ("thd_total_percent", report.thd_total_percent),
            ("residual_percent", report.residual_percent),
            ("weighted_rma_percent", report.weighted_rma_percent),
            ("weighted_shorter_percent", report.weighted_shorter_percent),
        ] {
            let expected = figures[key].as_f64().unwrap();
            // A small fundamental is uncertain itself, and every ratio to it with it.
            let ratio = 1.0 + expected / 100.0;
            near(key, found, expected, 100.0 * rounding * ratio);
        }
        let (dbc, phases) = (numbers(&figures["dbc"]), numbers(&figures["phases_deg"]));
        let signed = numbers(&figures["signed_percent"]);
        assert_eq!(
            report.harmonics_dbc.iter().flatten().count(),
            dbc.len(),
            "{name}"
        );
        for i in 0..dbc.len() {
            let n = (i + 2) as f64;
            let ratio = 10f64.powf(dbc[i] / 20.0);
            let error = rounding * (1.0 + ratio);
            let found = 10f64.powf(report.harmonics_dbc[i].unwrap() / 20.0);
            near("dbc", found, ratio, error);
            near(
                "signed_percent",
                report.signed_percent[i].unwrap(),
                signed[i],
                100.0 * error,
            );
            // Its own angle, and n times the fundamental's.
            let turn = report.phases_deg[i].unwrap() - phases[i];
            let turn = (turn + 180.0).rem_euclid(360.0) - 180.0;
            near(
                "phases_deg",
                turn,
                0.0,
                (rounding * (n + 1.0 / ratio)).to_degrees(),
            );
        }
    }
}

#[test]
fn crossings_are_those_of_scipy() {
    let reference = reference();
    let cases = reference["crossings"].as_array().unwrap();
    assert_eq!(cases.len(), 8);
    for case in cases {
        let (levels, values) = (numbers(&case["levels"]), numbers(&case["values"]));
        let mark = case["mark"].as_f64().unwrap();
        let found = crossings(&levels, &values, mark, ValueScale::Logarithmic).unwrap();
        let name = &case["name"];
        assert_eq!(
            found.upward as u64,
            case["upward"].as_u64().unwrap(),
            "{name}"
        );
        assert_eq!(
            found.downward as u64,
            case["downward"].as_u64().unwrap(),
            "{name}"
        );
        match (found.first_upward, case["first_upward"].as_f64()) {
            (Some(found), Some(expected)) => {
                let error = (found / expected - 1.0).abs();
                assert!(error < SAME_LEVEL, "{name} {mark}: {found} {expected}");
            }
            (found, expected) => assert_eq!(found, expected, "{name} {mark}"),
        }
    }
}
