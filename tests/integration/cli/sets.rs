//! Sets of files: numbered, replaced, whole or not there.

use super::place::{Place, program};
use std::fs;

const SET: &str = "forehear-out/window-room";

#[test]
fn a_set_is_numbered_when_its_name_is_taken() {
    let place = Place::new();
    for _ in 0..3 {
        place.quick(&["--quiet"]).done();
    }
    fs::write(place.path("forehear-out/window-room-4"), "a file").unwrap();
    let run = place.quick(&["--json"]).done();
    assert!(run.err.contains("window-room-5"), "{}", run.err);
    for folder in ["", "-2", "-3", "-5"] {
        let report = format!("{SET}{folder}/report.json");
        assert!(place.path(&report).exists(), "{report}");
    }
}

#[test]
fn a_set_is_written_over_only_by_force_which_keeps_foreign_files() {
    let place = Place::new();
    place
        .quick(&["--gain", "3", "--out", "set", "--quiet"])
        .done();
    place.write("set/notes.txt", "mine");
    let before = place.all_files();
    let refused = place.quick(&["--out", "set"]).refused("set-exists");
    assert!(refused.err.contains("--force"), "{}", refused.err);
    assert_eq!(place.all_files(), before);

    place.quick(&["--out", "set", "--force", "--quiet"]).done();
    let names = place.names();
    assert_eq!(place.read("set/notes.txt"), b"mine");
    assert!(names.contains(&"set/window-room-gain-5-terminals.wav".into()));
    assert!(!names.iter().any(|n| n.contains("gain-3")), "{names:?}");
    assert!(!names.iter().any(|n| n.contains(".forehear")), "{names:?}");
}

#[test]
fn force_without_a_folder_writes_over_the_set_of_that_name() {
    let place = Place::new();
    place.quick(&["--quiet"]).done();
    place.quick(&["--quiet", "--force", "--gain", "3"]).done();
    let names = place.names();
    assert!(names.contains(&format!("{SET}/window-room-gain-3-terminals.wav")));
    assert!(
        !names.iter().any(|n| n.contains("window-room-2")),
        "{names:?}"
    );
}

#[test]
fn files_that_are_no_part_of_a_set_are_never_written_over() {
    let place = Place::new();
    place.write_take("take.wav", 1, 480);
    fs::create_dir(place.path("set")).unwrap();
    place.write("set/levels.csv", "mine");
    let before = place.all_files();
    place.quick(&["--out", "set"]).refused("file-exists");
    place
        .quick(&["--out", "set", "--force"])
        .refused("file-exists");
    // A report that is none of ours protects its folder even from force.
    place.write("set/report.json", r#"{"files": ["../take.wav"]}"#);
    place
        .quick(&["--out", "set", "--force"])
        .refused("file-exists");
    fs::remove_file(place.path("set/report.json")).unwrap();
    assert_eq!(place.all_files(), before);
}

#[test]
fn a_report_that_lists_files_elsewhere_removes_none_of_them() {
    let place = Place::new();
    place.write("precious.txt", "mine");
    fs::create_dir(place.path("set")).unwrap();
    let listed = place.path("precious.txt").display().to_string();
    let report =
        serde_json::json!({"kind": "render", "files": ["../precious.txt", listed, "..", ""]});
    place.write("set/report.json", report.to_string());
    place.quick(&["--out", "set", "--force", "--quiet"]).done();
    assert_eq!(place.read("precious.txt"), b"mine");
}

#[test]
fn a_folder_that_cannot_be_is_refused_before_the_render() {
    let place = Place::new();
    place.write("file", "");
    let before = [place.names(), vec!["take.wav".into()]].concat();
    place.quick(&["--out", "file"]).refused("unwritable-output");
    place
        .quick(&["--out", "file/set"])
        .refused("unwritable-output");
    place
        .quick(&["--out", "/proc/set"])
        .refused("unwritable-output");
    assert_eq!(place.names(), before);
    place.write("forehear-out", "");
    place.quick(&[]).refused("unwritable-output");
}

#[test]
fn a_full_disk_leaves_nothing_and_an_old_set_whole() {
    let place = Place::new();
    place.quick(&["--out", "old", "--quiet"]).done();
    let before = place.all_files();
    for more in ["--out new/set", "--out old --force"] {
        // A file may grow to 8 KiB; the signal that would end the process is ignored, so that the write fails as on a full disk.
        let line = format!(
            "trap '' XFSZ; ulimit -f 8; exec '{}' render window-room --di take.wav --oversample 1 --gain 5 --json {more}",
            program().display()
        );
        let mut command = assert_cmd::Command::new("bash");
        command.args(["-c", &line]).current_dir(place.path("."));
        let run = super::place::outcome(&mut command);
        assert_eq!(run.error_codes(), ["unwritable-output"]);
        assert!(run.err.contains("too large"), "{}", run.err);
        assert!(place.all_files() == before, "{:?}", place.names());
    }
}
