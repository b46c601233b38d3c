//! Files that must be refused, and the code expected.

use super::make::*;
use forehear::diagnostic::Code;

pub fn bad() -> Vec<(&'static str, Vec<u8>, Code)> {
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
