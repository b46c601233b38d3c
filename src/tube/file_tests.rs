//! Tube files with one flaw each, and the fault expected.

use super::*;
use crate::diagnostic::{Code, Diagnostic, Place};

const TRIODE: &str = include_str!("../../presets/tubes/12at7.toml");
const PENTODE: &str = include_str!("../../presets/tubes/6v6.toml");

/// Faults of `text` with its first `from` replaced by `to`.
fn faults(text: &str, from: &str, to: &str) -> (String, Vec<Diagnostic>) {
    assert!(text.contains(from), "the file has {from}");
    let flawed = text.replacen(from, to, 1);
    let faults = read_tube(&flawed).expect_err("a flawed file is refused");
    (flawed, faults)
}

/// The one fault of a file: its code, path, and the text it points at.
fn only_fault(text: &str, from: &str, to: &str) -> (Code, String, String, Diagnostic) {
    let (flawed, faults) = faults(text, from, to);
    assert_eq!(faults.len(), 1, "{faults:#?}");
    let fault = faults[0].clone();
    let at = match &fault.place {
        Place::Text(range) => flawed[range.clone()].to_owned(),
        _ => String::new(),
    };
    (fault.code, fault.path.clone(), at, fault)
}

#[test]
fn one_flaw_gives_one_fault_with_its_place() {
    #[rustfmt::skip]
    let flaws = [
        (TRIODE, "format = 1", "format = 2", Code::TubeFormat, "format", "2"),
        (TRIODE, "format = 1", "", Code::TubeMissingKey, "format", ""),
        (TRIODE, "contact_volts", "contact_volt", Code::TubeMissingKey, "law.contact_volts", "[law]"),
        (TRIODE, "cutoff_sharpness = 152.3", "cutoff_sharpness = \"152.3\"", Code::TubeWrongType, "law.cutoff_sharpness", "\"152.3\""),
        (TRIODE, "amplification_factor = 88.32", "amplification_factor = -88.32", Code::TubeOutOfRange, "law.amplification_factor", "-88.32"),
        (TRIODE, "amplification_factor = 88.32", "amplification_factor = nan", Code::TubeOutOfRange, "law.amplification_factor", "nan"),
        (TRIODE, "amplification_factor = 88.32", "amplification_factor = inf", Code::TubeOutOfRange, "law.amplification_factor", "inf"),
        (TRIODE, "kind = \"triode\"", "kind = \"triod\"", Code::TubeUnknownWord, "kind", "\"triod\""),
        (TRIODE, "confidence = \"fitted\"", "confidence = \"fited\"", Code::TubeUnknownWord, "law.confidence", "\"fited\""),
        (TRIODE, "assumed = false", "assumed = 0", Code::TubeWrongType, "grid_current.assumed", "0"),
        (TRIODE, "plate_volts = [27, 402]", "plate_volts = [402, 27]", Code::TubeOutOfRange, "fitted_range.plate_volts", "[402, 27]"),
        (TRIODE, "plate_volts = [27, 402]", "plate_volts = [27]", Code::TubeWrongType, "fitted_range.plate_volts", "[27]"),
        (TRIODE, "name = \"12AT7\"", "name = \" \"", Code::TubeOutOfRange, "name", "\" \""),
        (TRIODE, "plate_watts", "plate_wats", Code::TubeUnknownKey, "ratings.plate_wats", "plate_wats"),
        (TRIODE, "plate_watts = 2.5", "screen_volts = 300", Code::TubeUnknownKey, "ratings.screen_volts", "screen_volts"),
        (PENTODE, "knee_sharpness = 2.805", "knee_sharpness = 2.805\nsecond_section_share = 0.2", Code::TubeMissingKey, "law.second_section_amplification_ratio", "[law]"),
        (PENTODE, "screen_volts = [53, 427]", "", Code::TubeMissingKey, "fitted_range.screen_volts", "[fitted_range]"),
    ];
    for (text, from, to, code, path, at) in flaws {
        // A misspelled key is missing as well as unknown.
        let (flawed, found) = faults(text, from, to);
        let fault = &found[0];
        assert_eq!(
            (fault.code, fault.path.as_str()),
            (code, path),
            "{to}: {found:#?}"
        );
        let place = match &fault.place {
            Place::Text(range) => &flawed[range.clone()],
            _ => "",
        };
        assert_eq!(place, at, "{to}");
    }
}

#[test]
fn a_misspelled_word_gets_the_nearest_valid_one() {
    let (_, found) = faults(TRIODE, "contact_volts", "contact_volt");
    assert_eq!(found.len(), 2);
    assert_eq!(found[1].code, Code::TubeUnknownKey);
    assert_eq!(
        found[1].hint.as_deref(),
        Some("nearest key: `contact_volts`")
    );
    let (.., fault) = only_fault(TRIODE, "kind = \"triode\"", "kind = \"Pentod\"");
    assert_eq!(fault.hint.as_deref(), Some("nearest: \"pentode\""));
}

#[test]
fn all_faults_come_at_once() {
    let text = TRIODE
        .replace("cutoff_sharpness = 152.3", "cutoff_sharpness = 0")
        .replace(
            "heater_cathode_volts = 90",
            "heater_cathode_volts = \"90 V\"",
        )
        .replace("grid_cathode_pf = 2.2", "");
    let codes: Vec<_> = read_tube(&text)
        .expect_err("three flaws")
        .iter()
        .map(|f| f.code)
        .collect();
    assert_eq!(
        codes,
        [
            Code::TubeOutOfRange,
            Code::TubeWrongType,
            Code::TubeMissingKey
        ]
    );
}

#[test]
fn text_that_is_not_toml_is_one_kind_of_fault() {
    let (.., fault) = only_fault(TRIODE, "format = 1", "format 1");
    assert_eq!(fault.code, Code::Syntax);
    assert!(matches!(fault.place, Place::Text(_)));
    // No text is no syntax error: the keys are missing.
    let found = read_tube("").expect_err("an empty file is no tube");
    assert!(found.iter().all(|f| f.code == Code::TubeMissingKey) && found.len() > 2);
}

#[test]
fn a_recalled_figure_must_name_a_key_that_is_there() {
    let (code, path, at, fault) = only_fault(
        TRIODE,
        "grid_volts_minimum = -50",
        "grid_volts_minimum = -50\nfrom_memory = [\"plate_watt\"]",
    );
    assert_eq!(
        (code, path.as_str(), at.as_str()),
        (
            Code::TubeUnknownWord,
            "ratings.from_memory",
            "\"plate_watt\""
        )
    );
    assert_eq!(fault.hint.as_deref(), Some("nearest key: `plate_watts`"));
}

#[test]
fn a_law_with_falling_plate_current_is_refused() {
    // A plate that takes ever less as the grid goes positive: more grid volts, less current.
    let (code, path, ..) = only_fault(
        TRIODE,
        "contact_volts = 0.8427\nlow_plate_volts = 26.3\nlow_plate_growth = 9.502",
        "contact_volts = 10\nlow_plate_volts = 1\nlow_plate_growth = 100",
    );
    assert_eq!((code, path.as_str()), (Code::TubeLaw, "law"));
}

#[test]
fn every_shipped_file_reads_and_is_found_by_any_of_its_names() {
    let catalog = Catalog::shipped();
    assert_eq!(
        catalog.names(),
        ["12AX7", "12AT7", "12AU7", "6SN7", "EL84", "6V6", "6L6GC"]
    );
    let mut all = Vec::new();
    for tube in catalog.tubes() {
        for name in std::iter::once(&tube.name).chain(&tube.aliases) {
            let found = catalog
                .find(&name.to_lowercase())
                .expect("found by any name");
            assert_eq!(found.name, tube.name);
            assert!(!all.contains(name), "{name} means two tubes");
            all.push(name.clone());
        }
    }
    assert!(catalog.find("no such tube").is_none());
    assert_eq!(catalog.nearest("6v6gtt"), Some("6V6GT"));
    assert_eq!(catalog.nearest("???"), None);
}

#[test]
fn ratings_and_capacitances_arrive_in_base_units() {
    let tube = Catalog::shipped().find("EL84").expect("a shipped tube");
    let r = &tube.ratings;
    assert_eq!(r.cathode_current.map(|i| i.si()), Some(0.065));
    assert_eq!(r.plate_dissipation.map(|p| p.si()), Some(12.0));
    assert_eq!(r.grid_volts_minimum.map(|v| v.si()), Some(-100.0));
    assert!((tube.capacitances.grid_cathode - 10.8e-12).abs() < 1e-24);
    let range = &tube.fitted_range;
    assert!(range.grid_volts.contains(crate::units::Volts(-7.3)));
    assert!(!range.grid_volts.contains(crate::units::Volts(1.0)));
    let beam = Catalog::shipped().find("6L6-GC").expect("a shipped tube");
    assert_eq!(beam.provenance.ratings.from_memory, ["screen_watts"]);
    assert!(
        beam.caution
            .as_deref()
            .is_some_and(|c| c.starts_with("provisional"))
    );
}
