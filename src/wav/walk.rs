//! The walk through the chunks of a RIFF file, from its first byte to its samples.
//!
//! RIFF as in the 1991 specification named in `format`; RF64 and its `ds64` chunk as in EBU Tech 3306 (from memory).

use super::fault::WavFault;
use super::format::{self, Format};
use crate::diagnostic::Code;

const WOULD_DO: &str = "export it as uncompressed WAV";
const EXPORT_AGAIN: &str =
    "copy or export it again, for part of it is missing, and a part would not be the take it was";

/// What a data chunk's size field says when its writer could not know.
const UNKNOWN_SIZE: u32 = u32::MAX;

/// A file as found.
#[derive(Debug)]
pub(super) struct Layout<'a> {
    pub format: Format,
    /// Whole frames only.
    pub data: &'a [u8],
    pub notes: Vec<String>,
}

/// Finds the format and the samples.
pub(super) fn walk(bytes: &[u8]) -> Result<Layout<'_>, WavFault> {
    check_start(bytes)?;
    let is_rf64 = &bytes[..4] != b"RIFF";
    let mut format = None;
    let mut long_data_size = None;
    let mut notes = Vec::new();
    let mut at = 12;
    while let Some((id, size)) = chunk_header(bytes, at) {
        let start = at + 8;
        if &id == b"data" {
            let Some(format) = format else {
                return Err(WavFault::new(
                    Code::WavNoFormat,
                    "its samples come without a format chunk before them, so nothing says what they mean",
                    WOULD_DO,
                ));
            };
            let data = samples(bytes, start, size, long_data_size, &format, &mut notes)?;
            return Ok(Layout {
                format,
                data,
                notes,
            });
        }
        let end = start as u64 + u64::from(size);
        if end > bytes.len() as u64 {
            return Err(WavFault::new(
                Code::WavHeaderCut,
                format!(
                    "it ends inside its header: the {} chunk promises {size} bytes and {} are there",
                    name(id),
                    bytes.len() - start
                ),
                EXPORT_AGAIN,
            ));
        }
        let content = &bytes[start..end as usize];
        match &id {
            b"fmt " if format.is_none() => format = Some(format::parse(content)?),
            b"fmt " => notes.push("a second format chunk was passed over".to_string()),
            b"ds64" if is_rf64 && content.len() >= 16 => {
                let field: [u8; 8] = content[8..16].try_into().expect("eight bytes");
                long_data_size = Some(u64::from_le_bytes(field));
            }
            _ => {}
        }
        // Chunks begin at even offsets: an odd one is followed by a pad byte.
        at = end as usize + (size % 2) as usize;
    }
    if at < bytes.len() || format.is_none() {
        return Err(WavFault::new(
            Code::WavHeaderCut,
            format!("it ends inside its header, after {} bytes", bytes.len()),
            EXPORT_AGAIN,
        ));
    }
    Err(WavFault::new(
        Code::WavNoData,
        "it has a header and no samples: there is no data chunk",
        WOULD_DO,
    ))
}

/// Identifier and size of the chunk that starts at `at`.
fn chunk_header(bytes: &[u8], at: usize) -> Option<([u8; 4], u32)> {
    let header = bytes.get(at..at + 8)?;
    let id = header[..4].try_into().expect("four bytes");
    let size = u32::from_le_bytes(header[4..].try_into().expect("four bytes"));
    Some((id, size))
}

/// The data chunk's content, as much of it as is whole frames.
fn samples<'a>(
    bytes: &'a [u8],
    start: usize,
    size: u32,
    long_size: Option<u64>,
    format: &Format,
    notes: &mut Vec<String>,
) -> Result<&'a [u8], WavFault> {
    let there = &bytes[start..];
    let stated = match (size, long_size) {
        (UNKNOWN_SIZE, Some(0 | u64::MAX) | None) => None,
        (UNKNOWN_SIZE, Some(long)) => Some(long),
        (0, _) if !there.is_empty() && !is_chunks(there) => None,
        _ => Some(u64::from(size)),
    };
    let frame_bytes = format.frame_bytes();
    let length = match stated {
        Some(stated) if stated > there.len() as u64 => {
            return Err(WavFault::new(
                Code::WavTruncated,
                format!(
                    "its header promises {} frames and {} are there",
                    stated / frame_bytes as u64,
                    there.len() / frame_bytes
                ),
                EXPORT_AGAIN,
            ));
        }
        Some(stated) => stated as usize,
        None => {
            notes.push(
                "its header does not say how long it is, as a recording that was never closed or a stream; all to the end of the \
                 file was read"
                    .to_string(),
            );
            there.len()
        }
    };
    let ragged = length % frame_bytes;
    if length < frame_bytes {
        return Err(WavFault::new(
            Code::WavNoFrames,
            "it holds no sound: its data chunk has no whole frame",
            "a recording of at least one frame will do",
        ));
    }
    if ragged > 0 {
        notes.push(format!(
            "the last {ragged} byte(s) are no whole frame and were passed over"
        ));
    }
    Ok(&there[..length - ragged])
}

/// Is all of `rest` well-formed chunks? Tells an empty data chunk with something after it from an unfinished stream.
fn is_chunks(rest: &[u8]) -> bool {
    let mut at = 0;
    while at < rest.len() {
        let Some((id, size)) = chunk_header(rest, at) else {
            return false;
        };
        let end = at as u64 + 8 + u64::from(size);
        if !id.iter().all(|b| (b' '..=b'~').contains(b)) || end > rest.len() as u64 {
            return false;
        }
        at = end as usize + (size % 2) as usize;
    }
    true
}

/// Refuses what does not begin as a WAV file does.
fn check_start(bytes: &[u8]) -> Result<(), WavFault> {
    if bytes.is_empty() {
        return Err(WavFault::new(
            Code::WavEmptyFile,
            "it is empty, 0 bytes long",
            "a WAV file will do",
        ));
    }
    if bytes.starts_with(b"RIFX") || bytes.starts_with(b"FFIR") {
        return Err(WavFault::new(
            Code::WavBigEndian,
            "it is a big-endian WAV (RIFX)",
            "export it as a little-endian WAV (RIFF), the usual kind",
        ));
    }
    let is_riff = [b"RIFF", b"RF64", b"BW64"]
        .iter()
        .any(|start| bytes.starts_with(*start));
    if !is_riff {
        return Err(match kind(bytes) {
            Some(kind) => WavFault::new(
                Code::WavOtherKind,
                format!("it is {kind}, whatever its name says"),
                WOULD_DO,
            ),
            None if b"RIFF".starts_with(bytes) => cut_at_start(bytes),
            None => WavFault::new(
                Code::WavNotRiff,
                format!(
                    "it is no WAV file: it begins with \"{}\" where RIFF is due",
                    bytes[..bytes.len().min(4)].escape_ascii()
                ),
                WOULD_DO,
            ),
        });
    }
    if bytes.len() < 12 {
        return Err(cut_at_start(bytes));
    }
    if &bytes[8..12] != b"WAVE" {
        return Err(WavFault::new(
            Code::WavNotWave,
            format!(
                "it is a RIFF file of the form \"{}\", not WAVE",
                bytes[8..12].escape_ascii()
            ),
            WOULD_DO,
        ));
    }
    Ok(())
}

fn cut_at_start(bytes: &[u8]) -> WavFault {
    WavFault::new(
        Code::WavHeaderCut,
        format!("it ends inside its header, after {} byte(s)", bytes.len()),
        EXPORT_AGAIN,
    )
}

/// What else it might be, by its first bytes.
fn kind(bytes: &[u8]) -> Option<&'static str> {
    const STARTS: &[(&[u8], &str)] = &[
        (b"fLaC", "a FLAC file"),
        (b"OggS", "an Ogg file"),
        (b"ID3", "a file behind an ID3 tag, as MP3 files are"),
        (b"FORM", "an AIFF file"),
        (b"MThd", "a MIDI file"),
        (b"caff", "a CAF file"),
        (b".snd", "an AU file"),
        (b"riff", "a Wave64 file"),
        (b"wvpk", "a WavPack file"),
        (b"PK\x03\x04", "a ZIP archive"),
        (b"\x1a\x45\xdf\xa3", "a Matroska file"),
    ];
    if let Some((_, kind)) = STARTS.iter().find(|(start, _)| bytes.starts_with(start)) {
        return Some(kind);
    }
    if bytes.get(4..8) == Some(b"ftyp") {
        return Some("an MP4 file");
    }
    // MPEG audio: eleven set bits, a layer and a bit rate that are not the forbidden ones.
    match bytes {
        [0xFF, b, c, ..] if b & 0xE0 == 0xE0 && b & 0x06 != 0 && c >> 4 != 15 => {
            Some("an MP3 file")
        }
        _ => None,
    }
}

/// A chunk's identifier as it may be printed.
fn name(id: [u8; 4]) -> String {
    format!("\"{}\"", id.escape_ascii())
}
