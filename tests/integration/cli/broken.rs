//! What cannot be done: said with code and place, exit code 2, and nothing written.

use super::place::Place;

#[test]
fn a_broken_design_is_answered_with_all_its_faults() {
    let place = Place::new();
    let text = include_str!("../../broken_designs/many-faults-at-once.toml");
    place.write("broken.toml", text);
    let codes: Vec<&str> = text
        .lines()
        .filter_map(|line| line.split_once("# <- ")?.1.split(' ').next())
        .collect();
    assert!(codes.len() > 4);
    for command in ["render", "bias", "curve"] {
        let run = place.run(&[command, "broken.toml"]);
        for code in &codes {
            let run = place_of(&run.err, code);
            assert!(run.contains("broken.toml:"), "{code}: {run}");
        }
        assert_eq!((run.code, run.out.as_str()), (Some(2), ""));
        let run = place.run(&[command, "broken.toml", "--json"]);
        assert_eq!(run.error_codes(), codes);
        let document = run.document("error");
        assert_eq!(document["diagnostics"][0]["place"], "broken.toml");
        assert!(document["diagnostics"][0]["line"].as_u64().unwrap() > 1);
        // Standard error says it as well.
        assert!(run.err.contains(codes[0]));
    }
    assert_eq!(place.names(), ["broken.toml"]);
}

/// The text from a code to the next fault.
fn place_of<'a>(err: &'a str, code: &str) -> &'a str {
    let from = err
        .find(&format!("[{code}]"))
        .unwrap_or_else(|| panic!("{code}: {err}"));
    let rest = &err[from..];
    rest.split("\n\n").next().unwrap()
}

#[test]
fn faults_of_design_recording_and_cabinet_come_together() {
    let place = Place::new();
    let run = place.run(&[
        "render",
        "corner-rom",
        "--di",
        "none.wav",
        "--cabinet",
        "none-either.wav",
        "--json",
    ]);
    let unreadable = "unreadable-file";
    assert_eq!(
        run.error_codes(),
        ["unknown-design", unreadable, unreadable]
    );
}

#[test]
fn designs_that_cannot_be_read_are_refused_with_the_cause() {
    let place = Place::new();
    std::fs::create_dir(place.path("folder")).unwrap();
    place.write("binary.toml", [0x66, 0xff, 0xfe]);
    place.write("long.toml", vec![b'#'; (1 << 20) + 1]);
    for (name, code, cause) in [
        ("none.toml", "unreadable-file", "no such file"),
        ("folder", "unreadable-file", "it is a folder"),
        ("/dev/zero", "unreadable-file", "it is a device"),
        ("binary.toml", "unreadable-file", "byte 2"),
        ("long.toml", "unreadable-file", "longer than"),
        ("corner-rom", "unknown-design", "`corner-room`"),
        ("zzz", "unknown-design", "attic-room"),
    ] {
        let run = place.run(&["bias", name]).refused(code);
        assert!(run.err.contains(cause), "{name}: {}", run.err);
    }
}

#[test]
fn sound_files_that_cannot_be_read_are_refused_with_the_cause() {
    let place = Place::new();
    std::fs::create_dir(place.path("folder")).unwrap();
    place.write("empty.wav", "");
    place.write("text.wav", "once upon a time");
    place.write_take("whole.wav", 1, 4800);
    let whole = place.read("whole.wav");
    place.write("cut.wav", &whole[..whole.len() / 2]);
    for (name, code) in [
        ("none.wav", "unreadable-file"),
        ("folder", "unreadable-file"),
        ("empty.wav", "wav-empty-file"),
        ("text.wav", "wav-not-riff"),
        ("cut.wav", "wav-truncated"),
    ] {
        let before = place.names();
        let run = place.run(&["render", "--di", name]).refused(code);
        assert!(run.err.contains(name), "{name}: {}", run.err);
        let run = place.run(&["render", "--cabinet", name, "--json"]);
        assert_eq!(run.error_codes(), [code]);
        assert_eq!(place.names(), before);
    }
}

#[test]
fn a_command_line_that_means_nothing_is_refused_in_json_too() {
    let place = Place::new();
    for args in [
        &["render", "--gain", "11"] as &[&str],
        &["render", "--gain", "-1"],
        &["render", "--gain", "loud"],
        &["render", "--test-level", "21V"],
        &["render", "--test-level", "0.5uV"],
        &["render", "--test-level", "nan"],
        &["render", "--test-level", "47k"],
        &["render", "--tone", "19Hz"],
        &["render", "--tone", "11kHz"],
        &["render", "--oversample", "3"],
        &["render", "--format", "12"],
        &["render", "--channel", "0"],
        &["render", "--jobs", "0"],
        &["render", "--full-scale", "1V", "--di-peak", "1V"],
        &["render", "a", "b"],
        &["bias", "--volume", "11"],
        &["amplify"],
        &["new"],
    ] {
        let plain = place.run(args);
        assert_eq!((plain.code, plain.out.as_str()), (Some(2), ""), "{args:?}");
        assert!(plain.err.starts_with("error: "), "{args:?}: {}", plain.err);
        let mut with_json = vec!["--json"];
        with_json.extend(args);
        let run = place.run(&with_json);
        assert_eq!(run.error_codes(), ["usage"], "{args:?}");
        let document = run.document("error");
        let message = document["diagnostics"][0]["message"].as_str().unwrap();
        assert!(
            message.len() > 10 && !message.contains('\u{1b}'),
            "{message}"
        );
    }
    assert_eq!(place.names(), [""; 0]);
}

#[test]
fn a_level_left_out_does_not_take_the_next_option() {
    let place = Place::new();
    let run = place.run(&["render", "--test-level", "--quiet"]);
    assert_eq!(run.code, Some(2));
    assert!(run.err.contains("missing"), "{}", run.err);
}

#[test]
fn a_faulty_override_is_shown_as_it_was_given() {
    let place = Place::new();
    let run = place.run(&["bias", "--set", "stage.power.cathode.resistor=47n"]);
    let run = run.refused("wrong-unit");
    assert!(run.err.contains("stage.power.cathode.resistor=47n"));
    let run = place.run(&["bias", "--set", "stage.first.tube=12AX8", "--json"]);
    assert_eq!(run.error_codes(), ["unknown-tube"]);
    let document = run.document("error");
    let place = document["diagnostics"][0]["place"].as_str().unwrap();
    assert!(place.starts_with("--set stage.first.tube"), "{place}");
}
