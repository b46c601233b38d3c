//! Commands that show what there is, and `new`; help, colors, streams.

use super::place::{Place, outcome};
use forehear::design;
use forehear::tube::Catalog;

#[test]
fn every_command_has_a_help_and_those_near_high_voltage_warn() {
    let place = Place::new();
    for command in ["render", "bias", "curve", "tubes", "designs", "new", "keys"] {
        let help = place.run(&[command, "--help"]).done();
        assert!(help.out.contains("Usage: forehear"), "{command}");
        assert!(help.out.contains("--json"), "{command}");
        assert_eq!(help.err, "");
        if ["render", "bias"].contains(&command) {
            assert!(help.out.contains("lethal"), "{command}");
        }
    }
    assert!(place.run(&["--version"]).done().out.contains("forehear"));
    assert_eq!(place.run(&[]).code, Some(2));
}

#[test]
fn bias_shows_every_stage_and_its_ratings() {
    let place = Place::new();
    let text = place.run(&["bias"]).done().out;
    for word in ["first", "second", "power", "12AX7", "EL84", "Ratings"] {
        assert!(text.contains(word), "{word}");
    }
    let run = place.run(&["bias", "corner-room", "--json"]).done();
    let document = run.document("bias");
    assert_eq!(document["operating_point"].as_array().unwrap().len(), 3);
    assert!(!document["ratings"].as_array().unwrap().is_empty());
    assert!(document["safety"].as_str().unwrap().contains("kill"));
}

#[test]
fn a_changed_value_changes_the_operating_point() {
    let place = Place::new();
    let milliamperes = |more: &[&str]| {
        let mut args = vec!["bias", "--json"];
        args.extend(more);
        let document = place.run(&args).done().document("bias");
        document["operating_point"][2]["plate_a"].as_f64().unwrap()
    };
    let as_shipped = milliamperes(&[]);
    let cooler = milliamperes(&["--set", "stage.power.cathode.resistor=330R"]);
    assert!(cooler < 0.8 * as_shipped, "{cooler} {as_shipped}");
}

#[test]
fn a_rating_exceeded_is_said_whatever_is_asked_for() {
    let place = Place::new();
    let hot = "stage.power.cathode.resistor=30R";
    let shown = place.run(&["bias", "--set", hot]).done();
    let first = shown.out.lines().next().unwrap();
    assert!(first.contains("RATING EXCEEDED"), "{first}");
    let quiet = place.run(&["bias", "--set", hot, "--quiet"]).done();
    assert_eq!(quiet.out, "");
    assert!(quiet.err.contains("RATING EXCEEDED"), "{}", quiet.err);
    let json = place.run(&["bias", "--set", hot, "--json"]).done();
    json.document("bias");
    assert!(json.err.contains("RATING EXCEEDED"), "{}", json.err);
}

#[test]
fn curve_shows_all_stages_or_one_and_writes_its_files_once() {
    let place = Place::new();
    let text = place.run(&["curve"]).done().out;
    for stage in ["first", "second", "power"] {
        assert!(text.contains(&format!("stage {stage}")), "{text}");
    }
    assert_eq!(place.names(), [""; 0]);
    let run = place
        .run(&["curve", "--stage", "power", "--out", "a/curves", "--json"])
        .done();
    let document = run.document("curve");
    assert_eq!(document["stages"].as_array().unwrap().len(), 1);
    let files = document["files"].as_array().unwrap();
    assert_eq!(files.len(), 4);
    for file in files {
        let content = place.read(file.as_str().unwrap());
        assert!(content.len() > 500, "{file}");
    }
    let before = place.all_files();
    place
        .run(&["curve", "--out", "a/curves"])
        .refused("file-exists");
    assert_eq!(place.all_files(), before);
    place
        .run(&["curve", "--stage", "powr"])
        .refused("unknown-name");
}

#[test]
fn tubes_lists_the_catalog_and_explains_one() {
    let place = Place::new();
    let text = place.run(&["tubes"]).done().out;
    let document = place.run(&["tubes", "--json"]).done().document("tubes");
    let names = document["tubes"].as_array().unwrap();
    for (name, entry) in Catalog::shipped().names().into_iter().zip(names) {
        assert!(text.contains(name));
        assert_eq!(entry["name"], name);
        let one = place.run(&["tubes", name, "--json"]).done();
        assert_eq!(one.document("tube")["name"], name);
    }
    assert!(place.run(&["tubes", "ecc83"]).done().out.contains("12AX7"));
    let unknown = place.run(&["tubes", "12AX77"]).refused("unknown-tube");
    assert!(unknown.err.contains("12AX7"));
}

#[test]
fn a_tube_file_of_ones_own_is_shown_and_checked() {
    let place = Place::new();
    let shipped = include_str!("../../../presets/tubes/12ax7.toml");
    place.write("own.toml", shipped);
    assert!(
        place
            .run(&["tubes", "own.toml"])
            .done()
            .out
            .contains("12AX7")
    );
    place.write(
        "own.toml",
        shipped.replace("current_exponent", "curent_exponent"),
    );
    let broken = place
        .run(&["tubes", "own.toml"])
        .refused("tube-unknown-key");
    assert!(broken.err.contains("own.toml:"), "{}", broken.err);
    place
        .run(&["tubes", "none.toml"])
        .refused("unreadable-file");
}

#[test]
fn designs_lists_what_is_shipped() {
    let place = Place::new();
    let text = place.run(&["designs"]).done().out;
    let document = place.run(&["designs", "--json"]).done().document("designs");
    for (n, (name, _)) in design::shipped().iter().enumerate() {
        assert!(text.contains(name));
        assert_eq!(document["designs"][n]["word"], *name);
        assert_eq!(document["designs"][n]["is_default"], n == 0);
    }
}

#[test]
fn keys_shows_all_or_some() {
    let place = Place::new();
    let all = place.run(&["keys"]).done().out;
    assert!(all.contains("transformer.primary"));
    let some = place.run(&["keys", "transformer", "--json"]).done();
    let document = some.document("keys");
    for key in document["keys"].as_array().unwrap() {
        assert!(key["path"].as_str().unwrap().starts_with("transformer"));
    }
    let one = place
        .run(&["keys", "stage.power.cathode.bypass"])
        .done()
        .out;
    assert!(one.contains("bypass"));
    let unknown = place
        .run(&["keys", "transformer.primry"])
        .refused("unknown-key");
    assert!(
        unknown.err.contains("`transformer.primary`"),
        "{}",
        unknown.err
    );
}

#[test]
fn new_writes_a_design_that_runs_and_never_overwrites() {
    let place = Place::new();
    assert!(
        place
            .run(&["new", "mine.toml"])
            .done()
            .out
            .contains("mine.toml")
    );
    let before = place.all_files();
    place.run(&["new", "mine.toml"]).refused("file-exists");
    assert_eq!(place.all_files(), before);
    place.run(&["bias", "mine.toml"]).done();
    let run = place
        .run(&["new", "attic.toml", "--from", "attic-room", "--json"])
        .done();
    assert_eq!(run.document("new")["file"], "attic.toml");
    assert!(
        String::from_utf8(place.read("attic.toml"))
            .unwrap()
            .contains("Attic Room")
    );
    place
        .run(&["new", "copy.toml", "--from", "mine.toml"])
        .done();
    place
        .run(&["new", "x.toml", "--from", "atic-room"])
        .refused("unknown-design");
    place
        .run(&["new", "none/x.toml"])
        .refused("unwritable-output");
    assert_eq!(place.names(), ["attic.toml", "copy.toml", "mine.toml"]);
}

#[test]
fn files_are_as_readable_as_any_other() {
    use std::os::unix::fs::PermissionsExt;
    let place = Place::new();
    place.write("any", "");
    place.run(&["new", "mine.toml"]).done();
    let mode = |name: &str| place.path(name).metadata().unwrap().permissions().mode();
    assert_eq!(mode("mine.toml"), mode("any"));
}

#[test]
fn colors_come_when_asked_for_and_not_into_a_pipe() {
    let place = Place::new();
    let hot = ["bias", "--set", "stage.power.cathode.resistor=30R"];
    let colored = |more: &[&str], no_color: bool| {
        let mut command = place.command(&hot);
        command.args(more);
        if no_color {
            command.env("NO_COLOR", "1");
        }
        outcome(&mut command).done().out.contains('\u{1b}')
    };
    assert!(!colored(&[], false));
    assert!(!colored(&["--color", "never"], false));
    assert!(colored(&["--color", "always"], false));
    // Said on the command line, it counts more than the environment.
    assert!(colored(&["--color=always"], true));
    let mut forced = place.command(&hot);
    forced.env("CLICOLOR_FORCE", "1").env("NO_COLOR", "1");
    assert!(!outcome(&mut forced).done().out.contains('\u{1b}'));
    let usage = place.run(&["bias", "--nonsense", "--color", "always"]);
    assert!(usage.err.contains('\u{1b}'));
    assert!(!place.run(&["bias", "--nonsense"]).err.contains('\u{1b}'));
}

#[test]
fn quiet_is_silent() {
    let place = Place::new();
    for args in [
        &["designs", "--quiet"] as &[&str],
        &["keys", "--quiet"],
        &["tubes", "--quiet"],
        &["curve", "--quiet"],
        &["new", "mine.toml", "--quiet"],
    ] {
        let run = place.run(args).done();
        assert_eq!((run.out.as_str(), run.err.as_str()), ("", ""), "{args:?}");
    }
}
