//! From what was said to what will be rendered, with everything that can be refused beforehand.

use std::path::{Path, PathBuf};

use super::args::{Measuring, Recording, Render, SampleFormat, SoundFiles};
use super::fault::{Failure, both};
use super::files;
use super::output::Existing;
use super::source::{self, Loaded};
use forehear::design::Design;
use forehear::diagnostic::Code;
use forehear::signal::{DEFAULT_DI, DEMO_FULL_SCALE_VOLTS};
use forehear::study::render::{Cabinet, Plan, Take};
use forehear::study::result::Warning;
use forehear::wav::{self, Encoding};

/// The report of a set: written last, it marks the set as complete.
pub const REPORT_FILE: &str = "report.json";
pub const LEVELS_FILE: &str = "levels.csv";
/// Where sets go when no folder is named.
const OUT_FOLDER: &str = "forehear-out";
/// How the default recording is called.
const DEFAULT_DI_NAME: &str = "practice-phrase.wav (shipped, synthetic)";
/// Volts peak that digital full scale stands for unless something else is said.
const FULL_SCALE_V: f64 = 1.0;

/// All that a render needs.
pub struct RenderPlan {
    pub design: Loaded,
    pub take: Take,
    pub study: Plan,
    pub format: SampleFormat,
    /// Folder of the set, and what to do when it is there.
    pub folder: PathBuf,
    pub existing: Existing,
    /// Names of the sound files, terminals and listening copy, one pair for each gain setting.
    pub sounds: Vec<(String, String)>,
    pub jobs: Option<usize>,
    /// What was odd about the sound files.
    pub odd: Vec<Warning>,
}

impl RenderPlan {
    /// # Errors
    /// All that is wrong with the design, the recording and the options, at once.
    pub fn new(args: &Render) -> Result<RenderPlan, Failure> {
        let mut odd = Vec::new();
        let sounding = both(
            take(&args.recording, &mut odd),
            cabinet(args.files.cabinet.as_deref(), &mut odd),
        );
        let design = source::load(&args.design).and_then(|loaded| {
            let settings = settings(&args.measuring, &loaded)?;
            Ok((loaded, settings))
        });
        let ((design, settings), (take, cabinet)) = both(design, sounding)?;
        check_length(&take, args.files.format)?;
        let (folder, existing) = target(&args.files, &design.stem);
        let is_set_by_gain = design.prepared.design.control.gain.is_some();
        let stem = &design.stem;
        let sounds = settings
            .iter()
            .map(|setting| {
                let base = if is_set_by_gain {
                    format!("{stem}-gain-{setting}")
                } else {
                    stem.clone()
                };
                (
                    format!("{base}-terminals.wav"),
                    format!("{base}-listening.wav"),
                )
            })
            .collect();
        Ok(RenderPlan {
            study: Plan {
                test_level_v: test_level(&args.measuring, &design.prepared.design),
                settings,
                tone_hz: args.measuring.tone,
                oversample: args.measuring.oversample.factor(),
                cabinet,
            },
            design,
            take,
            format: args.files.format,
            folder,
            existing,
            sounds,
            jobs: args.measuring.jobs,
            odd,
        })
    }
}

/// How the n-th file of a set is stored; each has dither of its own.
pub fn encoding(format: SampleFormat, n: usize) -> Encoding {
    match format {
        SampleFormat::Pcm16 => Encoding::Pcm16 { seed: n as u64 },
        SampleFormat::Pcm24 => Encoding::Pcm24,
        SampleFormat::Float32 => Encoding::Float32,
    }
}

fn test_level(args: &Measuring, design: &Design) -> f64 {
    args.test_level.unwrap_or(design.control.test_level.0)
}

/// Gain settings to render; a single one that nothing reads for a design without gain control.
fn settings(args: &Measuring, loaded: &Loaded) -> Result<Vec<f64>, Failure> {
    let control = &loaded.prepared.design.control;
    if args.gain.is_empty() {
        return Ok(control.settings.clone());
    }
    if control.gain.is_none() {
        return Err(Failure::of(
            "--gain",
            Code::NoGainControl,
            format!("the design {} names no gain control", loaded.name),
            Some("leave --gain out, or name a pot with --set control.gain=NAME".into()),
        ));
    }
    for (n, setting) in args.gain.iter().enumerate() {
        if args.gain[..n].contains(setting) {
            return Err(Failure::of(
                "--gain",
                Code::Usage,
                format!("setting {setting} stands twice"),
                Some("give each position once".into()),
            ));
        }
    }
    Ok(args.gain.clone())
}

/// The recording in volts at the jack.
fn take(args: &Recording, odd: &mut Vec<Warning>) -> Result<Take, Failure> {
    let (name, recording, stated_v) = match &args.di {
        Some(path) => (
            files::file_name(path),
            files::read_sound(path)?,
            FULL_SCALE_V,
        ),
        None => {
            let recording = wav::read(DEFAULT_DI).expect("the shipped recording is a sound file");
            (DEFAULT_DI_NAME.to_owned(), recording, DEMO_FULL_SCALE_VOLTS)
        }
    };
    odd.extend(oddities(&name, &recording.notes));
    let mut channels = recording.channels;
    if let Some(wanted) = args.channel {
        if wanted > channels.len() {
            let count = channels.len();
            return Err(Failure::of(
                &name,
                Code::NoSuchChannel,
                format!("channel {wanted} is wanted, and the recording has {count}"),
                Some(if count == 1 {
                    "leave --channel out".to_owned()
                } else {
                    format!("--channel 1 to {count}")
                }),
            ));
        }
        channels = vec![channels.swap_remove(wanted - 1)];
    }
    let full_scale_v = match args.di_peak {
        None => args.full_scale.unwrap_or(stated_v),
        Some(peak_v) => {
            let peak = channels
                .iter()
                .flatten()
                .fold(0.0, |m: f64, x| m.max(x.abs()));
            if peak == 0.0 {
                return Err(Failure::of(
                    &name,
                    Code::SilentRecording,
                    "the recording is silent and has no peak to set a level for".into(),
                    Some("use --full-scale, or another channel or recording".into()),
                ));
            }
            peak_v / peak
        }
    };
    for x in channels.iter_mut().flatten() {
        *x *= full_scale_v;
    }
    Ok(Take {
        name,
        rate: recording.rate,
        channels,
        full_scale_v,
    })
}

fn cabinet(path: Option<&Path>, odd: &mut Vec<Warning>) -> Result<Option<Cabinet>, Failure> {
    let Some(path) = path else { return Ok(None) };
    let name = files::file_name(path);
    let mut recording = files::read_sound(path)?;
    odd.extend(oddities(&name, &recording.notes));
    let count = recording.channels.len();
    if count > 1 {
        let note = format!("of its {count} channels the first is taken");
        odd.extend(oddities(&name, &[note]));
    }
    Ok(Some(Cabinet {
        name,
        rate: recording.rate,
        samples: recording.channels.swap_remove(0),
    }))
}

fn oddities(name: &str, notes: &[String]) -> Vec<Warning> {
    let warning = |note: &String| Warning {
        code: Code::OddSoundFile,
        place: name.to_owned(),
        message: note.clone(),
    };
    notes.iter().map(warning).collect()
}

/// Refuses, before anything is rendered, what a sound file could not hold.
fn check_length(take: &Take, format: SampleFormat) -> Result<(), Failure> {
    let frames = take.channels[0].len() as u64;
    match wav::bytes_needed(frames, take.channels.len() as u64, encoding(format, 0)) {
        Ok(_) => Ok(()),
        Err(fault) => Err(Failure::of(
            &take.name,
            Code::TooLong,
            fault.to_string(),
            None,
        )),
    }
}

fn target(args: &SoundFiles, stem: &str) -> (PathBuf, Existing) {
    let folder = match &args.out {
        Some(folder) => folder.clone(),
        None => Path::new(OUT_FOLDER).join(stem),
    };
    let existing = match (args.force, &args.out) {
        (true, _) => Existing::Replace,
        (false, Some(_)) => Existing::Refuse,
        (false, None) => Existing::Number,
    };
    (folder, existing)
}
