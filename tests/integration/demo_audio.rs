//! The demonstration clips are what the generator makes from its seed, and no more.
//!
//! `FOREHEAR_RECORD=1 cargo test demo_audio` writes them anew.

use forehear::signal::{self, Signal};
use forehear::wav::{self, Encoding};
use std::io::Cursor;
use std::path::PathBuf;

/// Name, generator, encoding, stated peak in volts, stated length in seconds.
type Clip = (&'static str, fn() -> Signal, Encoding, f64, f64);

/// 16 bits but for the clip that goes down to 10 mV.
const CLIPS: [Clip; 5] = [
    (
        "rising-notes",
        signal::rising_notes,
        Encoding::Pcm24,
        0.999,
        5.9,
    ),
    ("open-chords", signal::open_chords, DITHERED, 0.9, 4.5),
    ("damped-bursts", signal::damped_bursts, DITHERED, 0.9, 3.0),
    ("slow-arpeggio", signal::slow_arpeggio, DITHERED, 0.2, 4.5),
    (
        "practice-phrase",
        signal::practice_phrase,
        DITHERED,
        0.7,
        8.0,
    ),
];
const DITHERED: Encoding = Encoding::Pcm16 { seed: 48 };

fn folder() -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("demo_audio")
}

fn encode(clip: &Signal, encoding: Encoding) -> Vec<u8> {
    let mut out = Cursor::new(Vec::new());
    let written = wav::write(&mut out, clip.rate as u32, &[&clip.samples], encoding).unwrap();
    assert_eq!(written.clipped, 0);
    out.into_inner()
}

#[test]
fn every_clip_is_what_its_seed_makes() {
    let recording = std::env::var_os("FOREHEAR_RECORD").is_some_and(|v| v == "1");
    for (name, generate, encoding, volts, seconds) in CLIPS {
        let clip = generate();
        let peak = clip.peak() * signal::DEMO_FULL_SCALE_VOLTS;
        // Parts of a clip overlap a little: a peak may lie a few percent off the one stated.
        assert!((peak / volts - 1.0).abs() < 0.05, "{name}: peak {peak} V");
        assert!((clip.duration_s() - seconds).abs() < 1e-9, "{name}");
        let bytes = encode(&clip, encoding);
        let path = folder().join(name).with_extension("wav");
        if recording {
            std::fs::write(&path, &bytes).unwrap();
        }
        let stored = wav::read(&std::fs::read(&path).unwrap())
            .unwrap_or_else(|fault| panic!("{name}: {fault}"));
        let made = wav::read(&bytes).unwrap();
        assert_eq!(
            (stored.rate, stored.bits, stored.float, stored.notes.len()),
            (48_000, made.bits, false, 0),
            "{name}"
        );
        assert_eq!(stored.channels.len(), 1, "{name}");
        assert_eq!(stored.frames(), made.frames(), "{name}");
        // One step, for sines and exponentials differ in their last bit between machines, and rounding may turn on it.
        let step = (1.0 - f64::from(made.bits)).exp2();
        for (n, (a, b)) in stored.channels[0].iter().zip(&made.channels[0]).enumerate() {
            assert!(
                (a - b).abs() <= step,
                "{name}, frame {n}: {a} stored, {b} made"
            );
        }
    }
}

#[test]
fn the_notes_rise_from_10_millivolts_to_1_volt_in_steps_of_5_decibels() {
    let clip = signal::rising_notes();
    let mut before: Option<f64> = None;
    for k in 0..9 {
        let start = ((0.04 + 0.65 * f64::from(k)) * clip.rate) as usize;
        let note = &clip.samples[start..start + (0.5 * clip.rate) as usize];
        let peak = note.iter().fold(0.0f64, |m, x| m.max(x.abs()));
        match before {
            None => assert!((peak - 0.01).abs() < 0.0002, "{peak}"),
            Some(b) => {
                let step = 20.0 * (peak / b).log10();
                assert!((step - 5.0).abs() < 0.2, "step {k}: {step} dB");
            }
        }
        before = Some(peak);
    }
    assert!((before.unwrap() - 0.999).abs() < 0.01);
}

#[test]
fn the_bursts_come_eight_times_a_second() {
    let clip = signal::damped_bursts();
    // Energy of 10 ms pieces; a burst starts where it rises by 9 dB over the least of the last three.
    let piece = 480;
    let energy: Vec<f64> = clip.samples[..96_000]
        .chunks(piece)
        .map(|c| c.iter().map(|x| x * x).sum::<f64>() + 1e-6)
        .collect();
    let mut starts: Vec<usize> = Vec::new();
    for k in 3..energy.len() {
        let least = energy[k - 3..k]
            .iter()
            .copied()
            .fold(f64::INFINITY, f64::min);
        if energy[k] > 8.0 * least && starts.last().is_none_or(|&last| k - last > 5) {
            starts.push(k);
        }
    }
    assert_eq!(starts.len(), 16, "{starts:?}");
    let span_s = (starts[15] - starts[0]) as f64 * piece as f64 / clip.rate;
    assert!((15.0 / span_s - 8.0).abs() < 0.1, "{span_s}");
}

#[test]
fn the_clips_take_three_megabytes_at_most_and_the_default_is_one_of_them() {
    let mut bytes = 0;
    let mut names = Vec::new();
    for entry in std::fs::read_dir(folder()).unwrap() {
        let entry = entry.unwrap();
        bytes += entry.metadata().unwrap().len();
        names.push(entry.file_name().into_string().unwrap());
    }
    assert!(bytes <= 3_000_000, "{bytes}");
    names.sort();
    let mut expected: Vec<String> = CLIPS.iter().map(|clip| format!("{}.wav", clip.0)).collect();
    expected.extend(["LICENSE".to_string(), "README.md".to_string()]);
    expected.sort();
    assert_eq!(names, expected);
    let stored = std::fs::read(folder().join("practice-phrase.wav")).unwrap();
    assert_eq!(stored, signal::DEFAULT_DI);
}
