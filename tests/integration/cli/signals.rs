//! Interruptions and closed pipes.

use std::io::Read;
use std::process::{Command, Stdio};
use std::time::{Duration, Instant};

use super::place::{Place, program};

/// Long enough that a render is under way and far from done: a minute of sound.
const LONG_TAKE: usize = 48_000 * 60;
/// An interruption must be felt within this; promptly is a fifth of a second, and the machine may be busy.
const PROMPT: Duration = Duration::from_secs(5);

#[test]
fn an_interrupted_render_ends_promptly_and_leaves_nothing() {
    let place = Place::new();
    place.write_take("take.wav", 1, LONG_TAKE);
    let before = place.all_files();
    let out = "new/set";
    for signal in ["INT", "TERM"] {
        let mut child = Command::new(program())
            .args(["render", "--di", "take.wav", "--json", "--out", out])
            .current_dir(place.path("."))
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .unwrap();
        // The folder is made when the render begins.
        let begin = Instant::now();
        while !place.path(out).exists() {
            assert!(begin.elapsed() < Duration::from_secs(30));
            std::thread::sleep(Duration::from_millis(10));
        }
        let sent = Instant::now();
        let kill = Command::new("kill")
            .args([format!("-{signal}"), child.id().to_string()])
            .status();
        assert!(kill.unwrap().success());
        let mut said = String::new();
        child
            .stdout
            .take()
            .unwrap()
            .read_to_string(&mut said)
            .unwrap();
        let mut err = String::new();
        child
            .stderr
            .take()
            .unwrap()
            .read_to_string(&mut err)
            .unwrap();
        assert_eq!(child.wait().unwrap().code(), Some(130), "{err}");
        assert!(sent.elapsed() < PROMPT, "{:?}", sent.elapsed());
        assert!(err.contains("[interrupted]"), "{err}");
        let document: serde_json::Value = serde_json::from_str(&said).unwrap();
        assert_eq!(document["diagnostics"][0]["code"], "interrupted");
        assert!(place.all_files() == before, "{:?}", place.names());
    }
}

#[test]
fn a_closed_pipe_ends_quietly() {
    let place = Place::new();
    for args in [
        &["keys"] as &[&str],
        &["tubes", "--json"],
        &["bias"],
        &["--help"],
    ] {
        let (reader, writer) = std::io::pipe().unwrap();
        drop(reader);
        let output = Command::new(program())
            .args(args)
            .current_dir(place.path("."))
            .stdout(writer)
            .stderr(Stdio::piped())
            .output()
            .unwrap();
        assert_eq!(output.status.code(), Some(0), "{args:?}");
        assert_eq!(String::from_utf8_lossy(&output.stderr), "", "{args:?}");
    }
}

#[test]
fn a_standard_output_that_is_full_is_an_error() {
    let full = std::fs::File::options()
        .write(true)
        .open("/dev/full")
        .unwrap();
    let output = Command::new(program())
        .arg("keys")
        .stdout(full)
        .output()
        .unwrap();
    assert_eq!(output.status.code(), Some(2));
    assert!(String::from_utf8_lossy(&output.stderr).contains("no space left"));
}
