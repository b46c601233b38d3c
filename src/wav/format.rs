//! The `fmt ` chunk: how samples are stored.
//!
//! Layout: "Multimedia Programming Interface and Data Specifications 1.0" (IBM and Microsoft, 1991), chapter 3, and for the
//! extensible form the `WAVEFORMATEXTENSIBLE` structure of `mmreg.h`; both from memory, checked against the odd files in the test
//! data of SciPy 1.17, whose own reader gives the same values.

use super::fault::WavFault;
use crate::diagnostic::Code;

/// Rates read, in hertz.
pub(super) const RATES: std::ops::RangeInclusive<u32> = 8_000..=192_000;

const WOULD_DO: &str = "export it as uncompressed WAV: PCM of 16, 24 or 32 bits, or 32-bit float";

/// How samples are stored.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Format {
    pub channels: u16,
    pub rate: u32,
    /// Bytes that one sample takes.
    pub container: u16,
    /// Bits of them that count, the uppermost ones.
    pub bits: u16,
    pub float: bool,
}

impl Format {
    /// Bytes of one frame.
    pub fn frame_bytes(&self) -> usize {
        usize::from(self.channels) * usize::from(self.container)
    }
}

const TAG_PCM: u16 = 1;
const TAG_FLOAT: u16 = 3;
const TAG_EXTENSIBLE: u16 = 0xFFFE;

/// What follows the two bytes of the tag in the identifier of an extensible file's format.
const GUID_TAIL: [u8; 14] = [
    0x00, 0x00, 0x00, 0x00, 0x10, 0x00, 0x80, 0x00, 0x00, 0xAA, 0x00, 0x38, 0x9B, 0x71,
];

/// Reads the chunk's content. The byte-rate field is redundant, often wrong, and not looked at.
pub(super) fn parse(chunk: &[u8]) -> Result<Format, WavFault> {
    let u16_at = |at: usize| u16::from_le_bytes([chunk[at], chunk[at + 1]]);
    if chunk.len() < 16 {
        return Err(bad(format!(
            "its format chunk has {} bytes where at least 16 are due",
            chunk.len()
        )));
    }
    let mut tag = u16_at(0);
    let channels = u16_at(2);
    let rate = u32::from_le_bytes([chunk[4], chunk[5], chunk[6], chunk[7]]);
    let frame_bytes = u16_at(12);
    let mut bits = u16_at(14);

    let mut valid_bits = None;
    if tag == TAG_EXTENSIBLE {
        if chunk.len() < 40 {
            return Err(bad(format!(
                "its extensible format chunk has {} bytes where 40 are due",
                chunk.len()
            )));
        }
        if chunk[26..40] != GUID_TAIL {
            return Err(WavFault::new(
                Code::WavCompressed,
                "its samples are in a coding that is neither PCM nor float",
                WOULD_DO,
            ));
        }
        tag = u16_at(24);
        valid_bits = Some(u16_at(18));
    }
    if tag != TAG_PCM && tag != TAG_FLOAT {
        return Err(WavFault::new(
            Code::WavCompressed,
            format!(
                "its samples are coded as {} (format tag 0x{tag:04X}), not as plain numbers",
                coding(tag)
            ),
            WOULD_DO,
        ));
    }
    if channels == 0 {
        return Err(WavFault::new(
            Code::WavNoChannels,
            "its header promises zero channels",
            "one channel or more will do",
        ));
    }
    if !RATES.contains(&rate) {
        return Err(WavFault::new(
            Code::WavRate,
            format!("its sample rate is {rate} Hz"),
            format!(
                "{} to {} Hz will do, 48000 Hz for instance",
                RATES.start(),
                RATES.end()
            ),
        ));
    }
    if bits == 0 || bits > 64 {
        return Err(WavFault::new(
            Code::WavBitDepth,
            format!("its header promises samples of {bits} bits"),
            WOULD_DO,
        ));
    }
    if frame_bytes % channels != 0 || u32::from(frame_bytes / channels) * 8 < u32::from(bits) {
        return Err(bad(format!(
            "its header promises frames of {frame_bytes} bytes, which {channels} channel(s) of {bits} bits do not fill"
        )));
    }
    let container = frame_bytes / channels;
    if container > 8 {
        return Err(WavFault::new(
            Code::WavBitDepth,
            format!("its header promises {container} bytes for each sample"),
            WOULD_DO,
        ));
    }
    let float = tag == TAG_FLOAT;
    if float && !(bits == 32 && container == 4 || bits == 64 && container == 8) {
        return Err(WavFault::new(
            Code::WavBitDepth,
            format!("its samples are {bits}-bit floats in {container} bytes"),
            "floats of 32 or 64 bits will do",
        ));
    }
    // Some writers leave the count of valid bits at zero, or at nonsense; the container is the sensible reading then.
    if let Some(valid) = valid_bits
        && !float
        && (1..=container * 8).contains(&valid)
    {
        bits = valid;
    }
    Ok(Format {
        channels,
        rate,
        container,
        bits,
        float,
    })
}

fn bad(message: String) -> WavFault {
    WavFault::new(Code::WavBadFormat, message, WOULD_DO)
}

/// Name of a coding, from the registry of wave formats (RFC 2361, appendix A).
fn coding(tag: u16) -> &'static str {
    match tag {
        0x0002 | 0x0011 => "ADPCM",
        0x0006 => "A-law",
        0x0007 => "mu-law",
        0x0031 => "GSM 06.10",
        0x0050 => "MPEG audio",
        0x0055 => "MP3",
        0x00FF | 0x1600 | 0x1610 => "AAC",
        0xF1AC => "FLAC",
        _ => "something unknown",
    }
}
