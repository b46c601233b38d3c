//! A folder to run the program in, and what came of a run.

use std::collections::BTreeMap;
use std::fs;
use std::path::{Path, PathBuf};

use assert_cmd::cargo::cargo_bin;
use forehear::wav::{self, Encoding};
use serde_json::Value;
use tempfile::TempDir;

/// The program, as built with these tests.
pub fn program() -> PathBuf {
    cargo_bin!("forehear").to_owned()
}

/// An empty folder that the program is run in, without a terminal.
pub struct Place {
    folder: TempDir,
}

/// What came of a run.
#[derive(Debug)]
pub struct Outcome {
    pub code: Option<i32>,
    pub out: String,
    pub err: String,
}

impl Place {
    pub fn new() -> Place {
        Place {
            folder: tempfile::tempdir().unwrap(),
        }
    }

    /// The command, ready to be changed and run.
    pub fn command(&self, args: &[&str]) -> assert_cmd::Command {
        let mut command = assert_cmd::Command::new(program());
        command
            .current_dir(self.folder.path())
            .env_remove("NO_COLOR")
            .env_remove("CLICOLOR_FORCE")
            .args(args);
        command
    }

    pub fn run(&self, args: &[&str]) -> Outcome {
        outcome(&mut self.command(args))
    }

    /// A quick render: one gain setting of a two-stage design, a tenth of a second, few steps.
    pub fn quick(&self, more: &[&str]) -> Outcome {
        if !self.path("take.wav").exists() {
            self.write_take("take.wav", 1, 4800);
        }
        let mut args = vec!["render", "window-room", "--di", "take.wav"];
        args.extend(["--oversample", "1"]);
        if !more.contains(&"--gain") {
            args.extend(["--gain", "5"]);
        }
        args.extend(more);
        self.run(&args)
    }

    pub fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    pub fn write(&self, name: &str, content: impl AsRef<[u8]>) {
        fs::write(self.path(name), content).unwrap();
    }

    pub fn read(&self, name: &str) -> Vec<u8> {
        fs::read(self.path(name)).unwrap_or_else(|e| panic!("{name}: {e}"))
    }

    pub fn json(&self, name: &str) -> Value {
        serde_json::from_slice(&self.read(name)).unwrap()
    }

    /// A tone that peaks at half of full scale, softer in each further channel, at 48 kHz.
    pub fn write_take(&self, name: &str, channels: usize, frames: usize) {
        let channel = |c: usize| -> Vec<f64> {
            (0..frames)
                .map(|n| {
                    let t = n as f64 / 48e3;
                    0.5 / (c + 1) as f64 * (std::f64::consts::TAU * 240.0 * t).sin()
                })
                .collect()
        };
        let all: Vec<Vec<f64>> = (0..channels).map(channel).collect();
        let file = fs::File::create(self.path(name)).unwrap();
        wav::write(file, 48_000, &all, Encoding::Pcm24).unwrap();
    }

    /// Names and contents of every file below a folder, hidden ones too; folders end in `/`.
    pub fn all_files(&self) -> BTreeMap<String, Vec<u8>> {
        let mut found = BTreeMap::new();
        collect(self.folder.path(), "", &mut found);
        found
    }

    pub fn names(&self) -> Vec<String> {
        self.all_files().into_keys().collect()
    }
}

fn collect(folder: &Path, prefix: &str, found: &mut BTreeMap<String, Vec<u8>>) {
    for entry in fs::read_dir(folder).unwrap() {
        let entry = entry.unwrap();
        let name = format!("{prefix}{}", entry.file_name().to_string_lossy());
        if entry.file_type().unwrap().is_dir() {
            found.insert(format!("{name}/"), Vec::new());
            collect(&entry.path(), &format!("{name}/"), found);
        } else {
            found.insert(name, fs::read(entry.path()).unwrap());
        }
    }
}

pub fn outcome(command: &mut assert_cmd::Command) -> Outcome {
    let output = command.output().unwrap();
    Outcome {
        code: output.status.code(),
        out: String::from_utf8(output.stdout).unwrap(),
        err: String::from_utf8(output.stderr).unwrap(),
    }
}

impl Outcome {
    /// The run did what was asked.
    #[track_caller]
    pub fn done(self) -> Outcome {
        assert_eq!(self.code, Some(0), "{}\n{}", self.out, self.err);
        self
    }

    /// The run could not be done and says this code on standard error, and nothing on standard output.
    #[track_caller]
    pub fn refused(self, code: &str) -> Outcome {
        assert_eq!(self.code, Some(2), "{}\n{}", self.out, self.err);
        assert!(self.err.contains(&format!("[{code}]")), "{}", self.err);
        assert_eq!(self.out, "");
        self
    }

    /// The one document on standard output, with the schema and this kind.
    #[track_caller]
    pub fn document(&self, kind: &str) -> Value {
        let document: Value = serde_json::from_str(&self.out)
            .unwrap_or_else(|e| panic!("{e}: {}\n{}", self.out, self.err));
        assert_eq!(document["schema"], 1);
        assert_eq!(document["kind"], kind);
        document
    }

    /// The failure's document, and its codes.
    #[track_caller]
    pub fn error_codes(&self) -> Vec<String> {
        assert_eq!(self.code, Some(2), "{}\n{}", self.out, self.err);
        let document = self.document("error");
        let codes = document["diagnostics"].as_array().unwrap().iter();
        codes
            .map(|d| d["code"].as_str().unwrap().to_owned())
            .collect()
    }
}
