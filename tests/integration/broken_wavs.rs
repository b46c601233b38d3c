//! Sound files as they come, made here byte by byte: odd ones that must be read, with the values expected, and broken ones that
//! must be refused, with the code expected.

use forehear::diagnostic::Code;
use forehear::wav::{self, Recording};
use proptest::prelude::*;

const PCM: u16 = 1;
const FLOAT: u16 = 3;
const EXTENSIBLE: u16 = 0xFFFE;

/// One chunk, padded to an even length.
fn chunk(id: &[u8; 4], content: &[u8]) -> Vec<u8> {
    let mut bytes = chunk_of_size(id, content.len() as u32, content);
    if content.len() % 2 == 1 {
        bytes.push(0);
    }
    bytes
}

/// One chunk whose header states `size`, whatever is in it.
fn chunk_of_size(id: &[u8; 4], size: u32, content: &[u8]) -> Vec<u8> {
    let mut bytes = id.to_vec();
    bytes.extend(size.to_le_bytes());
    bytes.extend(content);
    bytes
}

/// Format chunk content of 16 bytes, consistent.
fn fmt(tag: u16, channels: u16, rate: u32, container_bytes: u16, bits: u16) -> Vec<u8> {
    let frame = channels * container_bytes;
    let mut bytes = Vec::new();
    bytes.extend(tag.to_le_bytes());
    bytes.extend(channels.to_le_bytes());
    bytes.extend(rate.to_le_bytes());
    bytes.extend(rate.wrapping_mul(u32::from(frame)).to_le_bytes());
    bytes.extend(frame.to_le_bytes());
    bytes.extend(bits.to_le_bytes());
    bytes
}

/// Extensible format chunk content, 40 bytes.
fn fmt_extensible(sub: u16, channels: u16, rate: u32, container_bytes: u16, valid: u16) -> Vec<u8> {
    let mut bytes = fmt(
        EXTENSIBLE,
        channels,
        rate,
        container_bytes,
        container_bytes * 8,
    );
    bytes.extend(22u16.to_le_bytes());
    bytes.extend(valid.to_le_bytes());
    bytes.extend(0u32.to_le_bytes());
    bytes.extend(sub.to_le_bytes());
    bytes.extend([0, 0, 0, 0, 0x10, 0, 0x80, 0, 0, 0xAA, 0, 0x38, 0x9B, 0x71]);
    bytes
}

/// A file of the given start, with the size field that belongs to it.
fn file_as(start: &[u8; 4], chunks: &[Vec<u8>]) -> Vec<u8> {
    let body = chunks.concat();
    let mut bytes = start.to_vec();
    bytes.extend((body.len() as u32 + 4).to_le_bytes());
    bytes.extend(b"WAVE");
    bytes.extend(body);
    bytes
}

fn file(chunks: &[Vec<u8>]) -> Vec<u8> {
    file_as(b"RIFF", chunks)
}

/// Three frames of 16-bit mono, 0.5, -0.5 and -1, as bytes.
fn three() -> Vec<u8> {
    [16_384i16, -16_384, -32_768]
        .iter()
        .flat_map(|v| v.to_le_bytes())
        .collect()
}

const THREE: [f64; 3] = [0.5, -0.5, -1.0];

fn mono16() -> Vec<u8> {
    chunk(b"fmt ", &fmt(PCM, 1, 48_000, 2, 16))
}

fn plain() -> Vec<u8> {
    file(&[mono16(), chunk(b"data", &three())])
}

/// Little-endian bytes of `values`, `width` bytes each.
fn integers(values: &[i64], width: usize) -> Vec<u8> {
    values
        .iter()
        .flat_map(|v| v.to_le_bytes()[..width].to_vec())
        .collect()
}

struct Good {
    name: &'static str,
    bytes: Vec<u8>,
    channels: Vec<Vec<f64>>,
    rate: u32,
    bits: u16,
    float: bool,
    /// A word of each note expected.
    notes: &'static [&'static str],
}

fn good() -> Vec<Good> {
    let mut cases = Vec::new();
    let mut add = |name, bytes, channels: &[&[f64]], rate, bits, float, notes| {
        cases.push(Good {
            name,
            bytes,
            channels: channels.iter().map(|c| c.to_vec()).collect(),
            rate,
            bits,
            float,
            notes,
        });
    };
    let data = || chunk(b"data", &three());

    add("16 bit", plain(), &[&THREE], 48_000, 16, false, &[]);
    for rate in [8_000, 11_025, 44_100, 96_000, 192_000] {
        let head = chunk(b"fmt ", &fmt(PCM, 1, rate, 2, 16));
        add(
            "a usual rate",
            file(&[head, data()]),
            &[&THREE],
            rate,
            16,
            false,
            &[],
        );
    }
    add(
        "8 bit, offset binary, odd length, padded",
        file(&[
            chunk(b"fmt ", &fmt(PCM, 1, 48_000, 1, 8)),
            chunk(b"data", &[0, 128, 192]),
        ]),
        &[&[-1.0, 0.0, 0.5]],
        48_000,
        8,
        false,
        &[],
    );
    add(
        "24 bit",
        file(&[
            chunk(b"fmt ", &fmt(PCM, 1, 48_000, 3, 24)),
            chunk(b"data", &integers(&[1, -1, -0x80_0000, 0x40_0000], 3)),
        ]),
        &[&[1.0 / 8_388_608.0, -1.0 / 8_388_608.0, -1.0, 0.5]],
        48_000,
        24,
        false,
        &[],
    );
    let extended =
        |content: Vec<u8>, more: &[u8]| chunk(b"fmt ", &[content, more.to_vec()].concat());
    add(
        "32 bit behind an 18-byte format chunk",
        file(&[
            extended(fmt(PCM, 1, 48_000, 4, 32), &[0, 0]),
            chunk(b"data", &integers(&[1, -1 << 31, 1 << 30], 4)),
        ]),
        &[&[1.0 / 2_147_483_648.0, -1.0, 0.5]],
        48_000,
        32,
        false,
        &[],
    );
    add(
        "a 20-byte format chunk",
        file(&[extended(fmt(PCM, 1, 48_000, 2, 16), &[0, 0, 7, 7]), data()]),
        &[&THREE],
        48_000,
        16,
        false,
        &[],
    );
    let float32: Vec<u8> = [0.25f32, -1.5]
        .iter()
        .flat_map(|v| v.to_le_bytes())
        .collect();
    let float64: Vec<u8> = [0.1f64, -1.5]
        .iter()
        .flat_map(|v| v.to_le_bytes())
        .collect();
    add(
        "32-bit float, beyond full scale",
        file(&[
            chunk(b"fmt ", &fmt(FLOAT, 1, 48_000, 4, 32)),
            chunk(b"fact", &2u32.to_le_bytes()),
            chunk(b"data", &float32),
        ]),
        &[&[0.25, -1.5]],
        48_000,
        32,
        true,
        &[],
    );
    add(
        "32-bit float behind a 40-byte format chunk and a long fact chunk",
        file(&[
            extended(fmt(FLOAT, 1, 48_000, 4, 32), &[0; 24]),
            chunk(b"fact", &[0; 12]),
            chunk(b"data", &float32),
        ]),
        &[&[0.25, -1.5]],
        48_000,
        32,
        true,
        &[],
    );
    add(
        "64-bit float",
        file(&[
            chunk(b"fmt ", &fmt(FLOAT, 1, 48_000, 8, 64)),
            chunk(b"data", &float64),
        ]),
        &[&[0.1, -1.5]],
        48_000,
        64,
        true,
        &[],
    );
    add(
        "64-bit float, extensible",
        file(&[
            chunk(b"fmt ", &fmt_extensible(FLOAT, 1, 48_000, 8, 64)),
            chunk(b"data", &float64),
        ]),
        &[&[0.1, -1.5]],
        48_000,
        64,
        true,
        &[],
    );
    add(
        "24 bits at the top of 32, as the rule is",
        file(&[
            chunk(b"fmt ", &fmt_extensible(PCM, 1, 48_000, 4, 24)),
            chunk(b"data", &integers(&[0x100, -0x100, 0x4000_0000], 4)),
        ]),
        &[&[1.0 / 8_388_608.0, -1.0 / 8_388_608.0, 0.5]],
        48_000,
        24,
        false,
        &[],
    );
    add(
        "24 bits at the bottom of 32, against the rule",
        file(&[
            chunk(b"fmt ", &fmt(PCM, 1, 48_000, 4, 24)),
            chunk(b"data", &integers(&[1, -1, 0x40_0000], 4)),
        ]),
        &[&[1.0 / 8_388_608.0, -1.0 / 8_388_608.0, 0.5]],
        48_000,
        24,
        false,
        &["bottom"],
    );
    add(
        "20 bits promised in 24, all 24 in use",
        file(&[
            chunk(b"fmt ", &fmt_extensible(PCM, 1, 48_000, 3, 20)),
            chunk(b"data", &integers(&[1, 0x40_0000], 3)),
        ]),
        &[&[1.0 / 8_388_608.0, 0.5]],
        48_000,
        20,
        false,
        &["all 24 are in use"],
    );
    add(
        "12 bits in 16",
        file(&[
            chunk(b"fmt ", &fmt(PCM, 1, 48_000, 2, 12)),
            chunk(b"data", &integers(&[0x10, -0x8000], 2)),
        ]),
        &[&[1.0 / 2048.0, -1.0]],
        48_000,
        12,
        false,
        &[],
    );
    add(
        "20 bits in 24",
        file(&[
            chunk(b"fmt ", &fmt_extensible(PCM, 1, 48_000, 3, 20)),
            chunk(b"data", &integers(&[0x10, -0x80_0000], 3)),
        ]),
        &[&[1.0 / 524_288.0, -1.0]],
        48_000,
        20,
        false,
        &[],
    );
    add(
        "36 bits in 40",
        file(&[
            chunk(b"fmt ", &fmt(PCM, 1, 48_000, 5, 36)),
            chunk(b"data", &integers(&[0x10, -1 << 39], 5)),
        ]),
        &[&[1.0 / (1u64 << 35) as f64, -1.0]],
        48_000,
        36,
        false,
        &[],
    );
    add(
        "64-bit integers",
        file(&[
            chunk(b"fmt ", &fmt(PCM, 1, 48_000, 8, 64)),
            chunk(b"data", &integers(&[1 << 62, i64::MIN], 8)),
        ]),
        &[&[0.5, -1.0]],
        48_000,
        64,
        false,
        &[],
    );
    add(
        "stereo",
        file(&[
            chunk(b"fmt ", &fmt(PCM, 2, 44_100, 2, 16)),
            chunk(b"data", &integers(&[0x4000, -0x4000, 0x2000, -0x2000], 2)),
        ]),
        &[&[0.5, 0.25], &[-0.5, -0.25]],
        44_100,
        16,
        false,
        &[],
    );
    add(
        "five channels, one frame",
        file(&[
            chunk(b"fmt ", &fmt_extensible(PCM, 5, 48_000, 2, 16)),
            chunk(b"data", &integers(&[0, 0x1000, 0x2000, 0x4000, -0x8000], 2)),
        ]),
        &[&[0.0], &[0.125], &[0.25], &[0.5], &[-1.0]],
        48_000,
        16,
        false,
        &[],
    );
    add(
        "an odd chunk with its pad byte before the format",
        file(&[
            chunk(b"LIST", b"odd"),
            mono16(),
            chunk(b"note", b"x"),
            data(),
        ]),
        &[&THREE],
        48_000,
        16,
        false,
        &[],
    );
    add(
        "chunks after the samples",
        file(&[mono16(), data(), chunk(b"LIST", b"INFO")]),
        &[&THREE],
        48_000,
        16,
        false,
        &[],
    );
    let mut wrong_byte_rate = plain();
    wrong_byte_rate[28..32].copy_from_slice(&7u32.to_le_bytes());
    add(
        "a wrong byte rate",
        wrong_byte_rate,
        &[&THREE],
        48_000,
        16,
        false,
        &[],
    );
    let mut wrong_size = plain();
    wrong_size[4..8].copy_from_slice(&0u32.to_le_bytes());
    add(
        "a RIFF size of zero",
        wrong_size,
        &[&THREE],
        48_000,
        16,
        false,
        &[],
    );
    for size in [0, u32::MAX] {
        add(
            "a stream, its length unknown",
            file(&[mono16(), chunk_of_size(b"data", size, &three())]),
            &[&THREE],
            48_000,
            16,
            false,
            &["does not say how long"],
        );
    }
    add(
        "a stream cut inside a frame",
        file(&[
            mono16(),
            chunk_of_size(b"data", u32::MAX, &[three(), vec![9]].concat()),
        ]),
        &[&THREE],
        48_000,
        16,
        false,
        &["does not say how long", "no whole frame"],
    );
    add(
        "a data chunk that ends inside a frame",
        file(&[mono16(), chunk(b"data", &[three(), vec![9]].concat())]),
        &[&THREE],
        48_000,
        16,
        false,
        &["no whole frame"],
    );
    add(
        "two format chunks",
        file(&[mono16(), chunk(b"fmt ", &fmt(PCM, 2, 8_000, 1, 8)), data()]),
        &[&THREE],
        48_000,
        16,
        false,
        &["second format"],
    );
    let ds64 = |size: u64| {
        let mut content = vec![0; 28];
        content[8..16].copy_from_slice(&size.to_le_bytes());
        chunk(b"ds64", &content)
    };
    for start in [b"RF64", b"BW64"] {
        add(
            "64-bit sizes",
            file_as(
                start,
                &[
                    ds64(6),
                    mono16(),
                    chunk_of_size(b"data", u32::MAX, &three()),
                    chunk(b"LIST", b"INFO"),
                ],
            ),
            &[&THREE],
            48_000,
            16,
            false,
            &[],
        );
    }
    add(
        "64-bit sizes that were never filled in",
        file_as(
            b"RF64",
            &[
                ds64(0),
                mono16(),
                chunk_of_size(b"data", u32::MAX, &three()),
            ],
        ),
        &[&THREE],
        48_000,
        16,
        false,
        &["does not say how long"],
    );
    cases
}

fn bad() -> Vec<(&'static str, Vec<u8>, Code)> {
    let data = || chunk(b"data", &three());
    let with_fmt = |content: Vec<u8>| file(&[chunk(b"fmt ", &content), data()]);
    let mut riff_of_pictures = plain();
    riff_of_pictures[8..12].copy_from_slice(b"AVI ");
    let mut unknown_guid = fmt_extensible(PCM, 1, 48_000, 2, 16);
    unknown_guid[30] = 0x21;
    let mut ragged = fmt(PCM, 2, 48_000, 2, 16);
    ragged[12..14].copy_from_slice(&3u16.to_le_bytes());
    let mut no_frame_size = fmt(PCM, 1, 48_000, 2, 16);
    no_frame_size[12..14].copy_from_slice(&0u16.to_le_bytes());
    let floats = |v: &[f32]| {
        let content: Vec<u8> = v.iter().flat_map(|x| x.to_le_bytes()).collect();
        file(&[
            chunk(b"fmt ", &fmt(FLOAT, 2, 48_000, 4, 32)),
            chunk(b"data", &content),
        ])
    };
    let nan64: Vec<u8> = f64::NAN.to_le_bytes().to_vec();
    let mut ds64 = vec![0; 28];
    ds64[8..16].copy_from_slice(&(1u64 << 40).to_le_bytes());

    vec![
        ("nothing", vec![], Code::WavEmptyFile),
        ("FLAC", b"fLaC\0\0\0\x22".to_vec(), Code::WavOtherKind),
        ("Ogg", b"OggS\0\x02".to_vec(), Code::WavOtherKind),
        ("AIFF", b"FORM\0\0\0\x20AIFF".to_vec(), Code::WavOtherKind),
        (
            "an ID3 tag before a WAV",
            [b"ID3\x03".to_vec(), plain()].concat(),
            Code::WavOtherKind,
        ),
        ("MP3", vec![0xFF, 0xFB, 0x90, 0x64], Code::WavOtherKind),
        ("MP4", b"\0\0\0\x20ftypM4A ".to_vec(), Code::WavOtherKind),
        (
            "text",
            b"twelve bars of nothing\n".to_vec(),
            Code::WavNotRiff,
        ),
        ("zeros", vec![0; 100], Code::WavNotRiff),
        (
            "big-endian",
            file_as(b"RIFX", &[mono16(), data()]),
            Code::WavBigEndian,
        ),
        ("another RIFF", riff_of_pictures, Code::WavNotWave),
        ("three bytes", b"RIF".to_vec(), Code::WavHeaderCut),
        ("ten bytes", plain()[..10].to_vec(), Code::WavHeaderCut),
        (
            "cut inside the format chunk",
            plain()[..30].to_vec(),
            Code::WavHeaderCut,
        ),
        (
            "cut before the data chunk's size",
            plain()[..38].to_vec(),
            Code::WavHeaderCut,
        ),
        (
            "cut after the start",
            plain()[..12].to_vec(),
            Code::WavHeaderCut,
        ),
        (
            "a chunk that promises gigabytes",
            file(&[mono16(), chunk_of_size(b"LIST", 0xF000_0000, b"x"), data()]),
            Code::WavHeaderCut,
        ),
        ("no format chunk", file(&[data()]), Code::WavNoFormat),
        (
            "format after the samples",
            file(&[data(), mono16()]),
            Code::WavNoFormat,
        ),
        (
            "a format chunk of 14 bytes",
            with_fmt(fmt(PCM, 1, 48_000, 2, 16)[..14].to_vec()),
            Code::WavBadFormat,
        ),
        (
            "an extensible one of 18",
            with_fmt([fmt(EXTENSIBLE, 1, 48_000, 2, 16), vec![0, 0]].concat()),
            Code::WavBadFormat,
        ),
        (
            "a frame that channels do not divide",
            with_fmt(ragged),
            Code::WavBadFormat,
        ),
        (
            "a frame of no bytes",
            with_fmt(no_frame_size),
            Code::WavBadFormat,
        ),
        (
            "24 bits in two bytes",
            with_fmt(fmt(PCM, 1, 48_000, 2, 24)),
            Code::WavBadFormat,
        ),
        (
            "mu-law",
            with_fmt(fmt(7, 1, 8_000, 1, 8)),
            Code::WavCompressed,
        ),
        (
            "A-law",
            with_fmt(fmt(6, 1, 8_000, 1, 8)),
            Code::WavCompressed,
        ),
        (
            "ADPCM",
            with_fmt(fmt(2, 1, 44_100, 1, 4)),
            Code::WavCompressed,
        ),
        (
            "MP3 inside",
            with_fmt(fmt(0x55, 2, 44_100, 1, 0)),
            Code::WavCompressed,
        ),
        (
            "mu-law, extensible",
            with_fmt(fmt_extensible(7, 1, 48_000, 1, 8)),
            Code::WavCompressed,
        ),
        (
            "an unknown extensible coding",
            with_fmt(unknown_guid),
            Code::WavCompressed,
        ),
        (
            "16-bit float",
            with_fmt(fmt(FLOAT, 1, 48_000, 2, 16)),
            Code::WavBitDepth,
        ),
        (
            "samples of no bits",
            with_fmt(fmt(PCM, 1, 48_000, 2, 0)),
            Code::WavBitDepth,
        ),
        (
            "samples of 80 bits",
            with_fmt(fmt(PCM, 1, 48_000, 10, 80)),
            Code::WavBitDepth,
        ),
        (
            "16 bits in 10 bytes",
            with_fmt(fmt(PCM, 1, 48_000, 10, 16)),
            Code::WavBitDepth,
        ),
        (
            "zero channels",
            with_fmt(fmt(PCM, 0, 48_000, 2, 16)),
            Code::WavNoChannels,
        ),
        (
            "a rate of 0",
            with_fmt(fmt(PCM, 1, 0, 2, 16)),
            Code::WavRate,
        ),
        (
            "a rate of 4 kHz",
            with_fmt(fmt(PCM, 1, 4_000, 2, 16)),
            Code::WavRate,
        ),
        (
            "a rate of 384 kHz",
            with_fmt(fmt(PCM, 1, 384_000, 2, 16)),
            Code::WavRate,
        ),
        ("no samples", file(&[mono16()]), Code::WavNoData),
        (
            "an empty data chunk",
            file(&[mono16(), chunk(b"data", &[])]),
            Code::WavNoFrames,
        ),
        (
            "an empty data chunk with a list after it",
            file(&[mono16(), chunk(b"data", &[]), chunk(b"LIST", b"INFO")]),
            Code::WavNoFrames,
        ),
        (
            "half a frame",
            file(&[mono16(), chunk(b"data", &[7])]),
            Code::WavNoFrames,
        ),
        (
            "cut inside the samples",
            plain()[..plain().len() - 2].to_vec(),
            Code::WavTruncated,
        ),
        (
            "two gigabytes promised",
            file(&[mono16(), chunk_of_size(b"data", 0x7FFF_0000, &three())]),
            Code::WavTruncated,
        ),
        (
            "a terabyte promised",
            file_as(
                b"RF64",
                &[
                    chunk(b"ds64", &ds64),
                    mono16(),
                    chunk_of_size(b"data", u32::MAX, &three()),
                ],
            ),
            Code::WavTruncated,
        ),
        (
            "not a number",
            floats(&[0.0, 0.0, 0.0, f32::NAN]),
            Code::WavNotFinite,
        ),
        (
            "infinite",
            floats(&[0.0, 0.0, f32::NEG_INFINITY, 0.0]),
            Code::WavNotFinite,
        ),
        (
            "not a number, 64 bit",
            file(&[
                chunk(b"fmt ", &fmt(FLOAT, 1, 48_000, 8, 64)),
                chunk(b"data", &nan64),
            ]),
            Code::WavNotFinite,
        ),
    ]
}

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
