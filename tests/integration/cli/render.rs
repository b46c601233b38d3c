//! What `render` writes and says.

use super::place::{Place, outcome};
use forehear::wav;

#[test]
fn a_render_writes_its_set_and_says_so() {
    let place = Place::new();
    let run = place.quick(&["--gain", "2,7.5"]).done();
    for word in [
        "Window Room",
        "take.wav",
        "full scale is 1 V",
        "forehear-out/window-room",
    ] {
        assert!(run.out.contains(word), "{word}: {}", run.out);
    }
    let report = place.json("forehear-out/window-room/report.json");
    assert_eq!(report["kind"], "render");
    let settings = report["gain_settings"].as_array().unwrap();
    assert_eq!(settings.len(), 2);
    assert_eq!(settings[1]["setting"], 7.5);
    assert_eq!(settings[0]["wav"], "window-room-gain-2-terminals.wav");
    assert_eq!(
        settings[1]["listening_wav"],
        "window-room-gain-7.5-listening.wav"
    );
    // Everything the report lists is there, and nothing else.
    let mut listed: Vec<String> = report["files"]
        .as_array()
        .unwrap()
        .iter()
        .map(|f| format!("forehear-out/window-room/{}", f.as_str().unwrap()))
        .collect();
    assert!(listed.last().unwrap().ends_with("report.json"));
    listed.extend([
        "forehear-out/".into(),
        "forehear-out/window-room/".into(),
        "take.wav".into(),
    ]);
    listed.sort();
    assert_eq!(place.names(), listed);
    for setting in settings {
        for key in ["wav", "listening_wav"] {
            let name = setting[key].as_str().unwrap();
            let sound =
                wav::read(&place.read(&format!("forehear-out/window-room/{name}"))).unwrap();
            assert_eq!((sound.rate, sound.frames(), sound.bits), (48_000, 4800, 24));
            assert!(sound.channels[0].iter().any(|x| x.abs() > 1e-3));
        }
    }
    let levels = String::from_utf8(place.read("forehear-out/window-room/levels.csv")).unwrap();
    assert!(levels.lines().count() > 2 * 3 * 30);
    for picture in ["transfer", "thd", "harmonics", "response"] {
        let name = format!("forehear-out/window-room/{picture}.svg");
        let text = String::from_utf8(place.read(&name)).unwrap();
        assert!(text.contains("<svg") && text.trim_end().ends_with("</svg>"));
    }
}

#[test]
fn the_document_on_standard_output_is_the_report() {
    let place = Place::new();
    let run = place.quick(&["--json", "--out", "set"]).done();
    let document = run.document("render");
    assert_eq!(run.out.as_bytes(), place.read("set/report.json"));
    assert_eq!(document["full_scale_v_peak"], 1.0);
    assert!(run.err.contains("set"));
    let quiet = place.quick(&["--json", "--out", "again", "--quiet"]).done();
    assert_eq!(
        quiet.err.replace("!! ", ""),
        quiet.err,
        "no rating is exceeded"
    );
    assert_eq!(quiet.err, "");
    assert_eq!(quiet.out.as_bytes(), place.read("again/report.json"));
}

#[test]
fn quiet_renders_silently() {
    let place = Place::new();
    let run = place.quick(&["--quiet"]).done();
    assert_eq!((run.out.as_str(), run.err.as_str()), ("", ""));
    assert!(place.path("forehear-out/window-room/report.json").exists());
}

#[test]
fn the_same_bytes_come_from_any_number_of_threads() {
    let place = Place::new();
    place
        .quick(&["--out", "one", "--jobs", "1", "--quiet"])
        .done();
    place
        .quick(&["--out", "two", "--jobs", "3", "--quiet"])
        .done();
    let files = place.all_files();
    let of = |folder: &str| -> Vec<(String, Vec<u8>)> {
        let inside = files.iter().filter(|(name, _)| name.starts_with(folder));
        inside
            .map(|(name, bytes)| (name.replace(folder, ""), bytes.clone()))
            .collect()
    };
    assert!(of("one/").len() > 4);
    assert!(of("one/") == of("two/"));
}

#[test]
fn the_default_recording_and_design_render() {
    let place = Place::new();
    let run = place
        .run(&["render", "--oversample", "1", "--gain", "5", "--json"])
        .done();
    let document = run.document("render");
    assert_eq!(document["design"], "Corner Room");
    assert!(
        document["di"]["name"]
            .as_str()
            .unwrap()
            .contains("practice-phrase")
    );
    assert_eq!(document["full_scale_v_peak"], 1.0);
    assert!(place.path("forehear-out/corner-room/report.json").exists());
}

#[test]
fn every_channel_is_rendered_unless_one_is_picked() {
    let place = Place::new();
    place.write_take("take.wav", 3, 2400);
    let peak_of = |folder: &str, more: &[&str]| {
        let mut args = vec!["--out", folder, "--json"];
        args.extend(more);
        let document = place.quick(&args).done().document("render");
        let name = document["gain_settings"][0]["wav"].as_str().unwrap();
        let sound = wav::read(&place.read(&format!("{folder}/{name}"))).unwrap();
        assert_eq!(sound.channels.len() as u64, document["di"]["channels"]);
        (
            sound.channels.len(),
            document["di"]["peak_v"].as_f64().unwrap(),
        )
    };
    let near = |found: f64, expected: f64| (found - expected).abs() < 1e-3 * expected;
    let (channels, peak) = peak_of("all", &[]);
    assert!(channels == 3 && near(peak, 0.5), "{peak}");
    let (channels, peak) = peak_of("second", &["--channel", "2"]);
    assert!(channels == 1 && near(peak, 0.25), "{peak}");
    place.quick(&["--channel", "4"]).refused("no-such-channel");
}

#[test]
fn the_level_of_a_recording_is_stated_in_two_ways() {
    let place = Place::new();
    let levels = |folder: &str, more: &[&str]| {
        let mut args = vec!["--json", "--out", folder];
        args.extend(more);
        let document = place.quick(&args).done().document("render");
        let number = |v: &serde_json::Value| v.as_f64().unwrap();
        (
            number(&document["full_scale_v_peak"]),
            number(&document["di"]["peak_v"]),
        )
    };
    let near = |found: f64, expected: f64| (found / expected - 1.0).abs() < 1e-3;
    let (full_scale, peak) = levels("a", &["--full-scale", "2V"]);
    assert!(
        near(full_scale, 2.0) && near(peak, 1.0),
        "{full_scale} {peak}"
    );
    let (full_scale, peak) = levels("b", &["--di-peak", "300mV"]);
    assert!(
        near(full_scale, 0.6) && near(peak, 0.3),
        "{full_scale} {peak}"
    );
    // -20 dBV is 0.1 V RMS.
    let (full_scale, _) = levels("c", &["--full-scale", "-20dBV"]);
    assert!(near(full_scale, 0.141_421), "{full_scale}");
    let both = place.quick(&["--full-scale", "1V", "--di-peak", "1V"]);
    assert_eq!(both.code, Some(2));
    place.write("take.wav", silent());
    place
        .quick(&["--di-peak", "300mV"])
        .refused("silent-recording");
}

fn silent() -> Vec<u8> {
    let mut out = std::io::Cursor::new(Vec::new());
    wav::write(&mut out, 48_000, &[vec![0.0; 480]], wav::Encoding::Pcm24).unwrap();
    out.into_inner()
}

#[test]
fn a_silent_recording_is_warned_of() {
    let place = Place::new();
    place.write("take.wav", silent());
    let document = place.quick(&["--json"]).done().document("render");
    let warnings = document["warnings"].as_array().unwrap();
    assert!(warnings.iter().any(|w| w["code"] == "di-level"));
}

#[test]
fn silence_renders_to_silence() {
    let place = Place::new();
    place.write("take.wav", silent());
    let document = place
        .quick(&["--out", "set", "--json"])
        .done()
        .document("render");
    let name = document["gain_settings"][0]["wav"].as_str().unwrap();
    let sound = wav::read(&place.read(&format!("set/{name}"))).unwrap();
    assert!(sound.channels[0].iter().all(|x| *x == 0.0));
}

#[test]
fn sample_formats_are_as_asked_for() {
    let place = Place::new();
    for (format, bits, is_float) in [("16", 16, false), ("32f", 32, true)] {
        place
            .quick(&["--format", format, "--out", format, "--quiet"])
            .done();
        let name = format!("{format}/window-room-gain-5-listening.wav");
        let sound = wav::read(&place.read(&name)).unwrap();
        assert_eq!((sound.bits, sound.float), (bits, is_float));
    }
}

#[test]
fn a_cabinet_of_ones_own_replaces_the_band_limit() {
    let place = Place::new();
    // Half a unit impulse: the listening copy is half of what is at the terminals.
    let mut out = std::io::Cursor::new(Vec::new());
    let impulse = [vec![0.5, 0.0, 0.0], vec![0.9, 0.9, 0.9]];
    wav::write(&mut out, 48_000, &impulse, wav::Encoding::Float32).unwrap();
    place.write("cabinet.wav", out.into_inner());
    let args = [
        "--cabinet",
        "cabinet.wav",
        "--out",
        "set",
        "--json",
        "--format",
        "32f",
    ];
    let document = place.quick(&args).done().document("render");
    assert!(
        document["listening"]
            .as_str()
            .unwrap()
            .contains("cabinet.wav")
    );
    let warnings = document["warnings"].as_array().unwrap();
    let odd: Vec<_> = warnings
        .iter()
        .filter(|w| w["code"] == "odd-sound-file")
        .collect();
    assert!(
        odd.len() == 1 && odd[0]["place"] == "cabinet.wav",
        "{odd:?}"
    );
    let sound = |kind: &str| {
        let name = format!("set/window-room-gain-5-{kind}.wav");
        wav::read(&place.read(&name)).unwrap().channels.remove(0)
    };
    for (x, y) in sound("terminals").iter().zip(sound("listening")) {
        assert!((0.5 * x - y).abs() < 1e-6, "{x} {y}");
    }
    place
        .quick(&["--cabinet", "none.wav"])
        .refused("unreadable-file");
}

#[test]
fn what_is_measured_can_be_chosen() {
    let place = Place::new();
    let args = ["--json", "--test-level", "-40dBV", "--tone", "500Hz"];
    let document = place.quick(&args).done().document("render");
    let level = document["test_level_v_peak"].as_f64().unwrap();
    assert!((level - 0.014_142).abs() < 1e-6, "{level}");
    let tone = document["tone_hz"].as_f64().unwrap();
    assert!((tone / 500.0 - 1.0).abs() < 0.05, "{tone}");
    assert_eq!(document["oversample"], 1);
}

#[test]
fn a_design_without_gain_control_has_one_setting_and_takes_no_other() {
    let place = Place::new();
    let text = design_without_gain();
    place.write("fixed.toml", text);
    place.write_take("take.wav", 1, 480);
    let args = [
        "render",
        "fixed.toml",
        "--di",
        "take.wav",
        "--oversample",
        "1",
        "--json",
    ];
    let document = place.run(&args).done().document("render");
    let settings = document["gain_settings"].as_array().unwrap();
    assert_eq!(settings.len(), 1);
    assert!(settings[0]["setting"].is_null());
    assert_eq!(settings[0]["wav"], "fixed-terminals.wav");
    let refused = place.run(&["render", "fixed.toml", "--gain", "2"]);
    assert!(
        refused
            .refused("no-gain-control")
            .err
            .contains("control.gain")
    );
    place
        .run(&["render", "fixed.toml", "--gain", "2,2"])
        .refused("no-gain-control");
    place.quick(&["--gain", "2,2"]).refused("usage");
}

fn design_without_gain() -> String {
    let (_, text) = forehear::design::shipped()
        .iter()
        .find(|(name, _)| *name == "window-room")
        .unwrap();
    let of_gain = |line: &&str| !line.starts_with("gain =") && !line.starts_with("settings =");
    let lines: Vec<&str> = text.lines().filter(of_gain).collect();
    lines.join("\n")
}

#[test]
fn a_design_may_name_a_tube_file_beside_it() {
    let place = Place::new();
    std::fs::create_dir(place.path("amps")).unwrap();
    let (_, text) = forehear::design::shipped()[0];
    let design = text.replace("tube = \"12AX7\"", "tube = \"own.toml\"");
    assert_ne!(design, text);
    place.write("amps/mine.toml", design);
    let tube = include_str!("../../../presets/tubes/12ax7.toml");
    place.write("amps/own.toml", tube);
    let with_own = place
        .run(&["bias", "amps/mine.toml", "--json"])
        .done()
        .document("bias");
    let shipped = place.run(&["bias", "--json"]).done().document("bias");
    assert_eq!(with_own["operating_point"], shipped["operating_point"]);

    place.write("amps/own.toml", tube.replace("perveance", "perveanse"));
    let faulty = place
        .run(&["bias", "amps/mine.toml"])
        .refused("tube-unknown-key");
    assert!(faulty.err.contains("amps/own.toml:"), "{}", faulty.err);
    assert!(!faulty.err.contains("unknown-tube"), "{}", faulty.err);
    std::fs::remove_file(place.path("amps/own.toml")).unwrap();
    let missing = place
        .run(&["bias", "amps/mine.toml"])
        .refused("unreadable-file");
    assert!(missing.err.contains("amps/mine.toml:"), "{}", missing.err);
    assert!(missing.err.contains("amps/own.toml"), "{}", missing.err);
}

#[test]
fn a_file_named_as_a_shipped_design_is_meant_by_its_path() {
    let place = Place::new();
    let (_, text) = forehear::design::shipped()[1];
    place.write("corner-room", text.replace("Window Room", "My Own"));
    let design = |name: &str| {
        let mut command = place.command(&["bias", name, "--json"]);
        outcome(&mut command).done().document("bias")["design"].clone()
    };
    assert_eq!(design("corner-room"), "Corner Room");
    assert_eq!(design("./corner-room"), "My Own");
}
