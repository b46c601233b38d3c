//! Sound files as they come, made here byte by byte: odd ones that must be read, with the values expected, and broken ones that
//! must be refused, with the code expected.

mod broken;
mod make;
mod odd;

use broken::bad;
use make::{EXTENSIBLE, FLOAT, PCM, chunk, file, fmt, integers};
use odd::good;

use forehear::diagnostic::Code;
use forehear::wav::{self, Recording};
use proptest::prelude::*;

#[test]
fn odd_files_are_read_with_the_right_values() {
    for case in good() {
        let name = case.name;
        let read = wav::read(&case.bytes).unwrap_or_else(|fault| panic!("{name}: {fault}"));
        assert_eq!(read.channels, case.channels, "{name}");
        assert_eq!(
            (read.rate, read.bits, read.float, read.frames()),
            (case.rate, case.bits, case.float, case.channels[0].len()),
            "{name}"
        );
        assert_eq!(
            read.notes.len(),
            case.notes.len(),
            "{name}: {:?}",
            read.notes
        );
        for (note, word) in read.notes.iter().zip(case.notes) {
            assert!(note.contains(word), "{name}: {note}");
        }
    }
}

#[test]
fn broken_files_are_refused_by_name() {
    for (name, bytes, code) in bad() {
        let fault = match wav::read(&bytes) {
            Err(fault) => fault,
            Ok(read) => panic!("{name}: read as {read:?}"),
        };
        assert_eq!(fault.code, code, "{name}: {fault}");
        assert!(
            !fault.message.is_empty() && !fault.hint.is_empty(),
            "{name}"
        );
        assert!(!fault.to_string().contains('\n'), "{name}: {fault}");
    }
}

#[test]
fn every_sound_file_code_has_a_file_that_meets_it() {
    let cases = bad();
    let codes: Vec<Code> = Code::ALL
        .iter()
        .copied()
        .filter(|code| code.word().starts_with("wav-"))
        .collect();
    assert!(codes.len() >= 16);
    for code in codes {
        assert!(cases.iter().any(|(_, _, c)| *c == code), "{code}");
    }
}

#[test]
fn messages_say_what_was_found() {
    let message = |wanted: &str| {
        let (_, bytes, _) = bad()
            .into_iter()
            .find(|(name, ..)| *name == wanted)
            .unwrap();
        wav::read(&bytes).unwrap_err().to_string()
    };
    for (name, words) in [
        ("not a number", "sample 1 of channel 2"),
        (
            "infinite",
            "sample 1 of channel 1 (at 0.0000 s) is infinite",
        ),
        (
            "cut inside the samples",
            "promises 3 frames and 2 are there",
        ),
        ("mu-law", "mu-law"),
        ("FLAC", "FLAC"),
        ("a rate of 384 kHz", "384000 Hz"),
        ("text", "\"twel\""),
        ("another RIFF", "\"AVI \""),
    ] {
        let message = message(name);
        assert!(message.contains(words), "{name}: {message}");
    }
}

/// Samples cannot be more than the bytes they come from, each an `f64` at most eight times as large.
fn is_sane(read: &Recording, bytes: usize) -> bool {
    let samples: usize = read.channels.iter().map(Vec::len).sum();
    let capacity: usize = read.channels.iter().map(Vec::capacity).sum();
    samples > 0
        && samples <= bytes
        && capacity <= 2 * bytes + 8 * read.channels.len()
        && read.channels.iter().all(|c| c.len() == read.frames())
        && read.channels.iter().flatten().all(|x| x.is_finite())
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 2000, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn any_bytes_are_read_or_refused(bytes in proptest::collection::vec(any::<u8>(), 0..200)) {
        if let Ok(read) = wav::read(&bytes) {
            prop_assert!(is_sane(&read, bytes.len()));
        }
    }

    #[test]
    fn any_format_chunk_is_read_or_refused(
        content in proptest::collection::vec(any::<u8>(), 14..44),
        samples in proptest::collection::vec(any::<u8>(), 0..100),
        tag in prop::sample::select(vec![PCM, FLOAT, EXTENSIBLE, 7]),
        rate in prop::sample::select(vec![8_000u32, 48_000, 192_000]),
    ) {
        let mut content = content;
        content[..2].copy_from_slice(&tag.to_le_bytes());
        content[4..8].copy_from_slice(&rate.to_le_bytes());
        let bytes = file(&[chunk(b"fmt ", &content), chunk(b"data", &samples)]);
        if let Ok(read) = wav::read(&bytes) {
            prop_assert!(is_sane(&read, bytes.len()));
        }
    }

    #[test]
    fn a_good_file_with_some_bytes_changed_is_read_or_refused(
        which in any::<prop::sample::Index>(),
        changes in proptest::collection::vec((any::<prop::sample::Index>(), any::<u8>()), 1..6),
        cut in any::<prop::sample::Index>(),
        is_cut in any::<bool>(),
    ) {
        let mut cases = good();
        let mut bytes = cases.swap_remove(which.index(cases.len())).bytes;
        for (at, value) in changes {
            let at = at.index(bytes.len());
            bytes[at] = value;
        }
        if is_cut {
            bytes.truncate(cut.index(bytes.len()));
        }
        if let Ok(read) = wav::read(&bytes) {
            prop_assert!(is_sane(&read, bytes.len()));
        }
    }

    #[test]
    fn integers_come_back_exactly(
        values in proptest::collection::vec(any::<i64>(), 1..40),
        width in 2usize..=6,
    ) {
        let bytes = file(&[
            chunk(b"fmt ", &fmt(PCM, 1, 48_000, width as u16, 8 * width as u16)),
            chunk(b"data", &integers(&values, width)),
        ]);
        let read = wav::read(&bytes).unwrap();
        let drop = 64 - 8 * width;
        for (x, v) in read.channels[0].iter().zip(&values) {
            let value = v << drop >> drop;
            prop_assert_eq!(*x, value as f64 / 2f64.powi(8 * width as i32 - 1));
        }
    }
}
