//! Sample bytes to numbers.
//!
//! `hound` decodes the common sizes, behind a canonical header whose sizes are true, and `dasp` brings integers to +-1, which
//! it does exactly: an integer of b bits divided by 2^(b-1).

use super::fault::WavFault;
use super::format::Format;
use crate::diagnostic::Code;
use dasp::Sample;
use dasp::sample::I24;
use std::io::{Cursor, Read};

/// Bytes decoded behind one header: well below what its 32-bit sizes can say. A multiple of every container.
const PIECE: usize = 840 << 20;

/// Every sample of `data` (whole frames), channel by channel, full scale at +-1; and a note where the bits needed one.
pub(super) fn decode(
    format: &Format,
    data: &[u8],
) -> Result<(Vec<Vec<f64>>, Option<String>), WavFault> {
    let channels = usize::from(format.channels);
    let frames = data.len() / format.frame_bytes();
    let mut out: Vec<Vec<f64>> = (0..channels).map(|_| Vec::with_capacity(frames)).collect();
    let alignment = Alignment::of(format, data);
    let mut channel = 0;
    let mut take = |value: f64| {
        out[channel].push(value);
        channel = (channel + 1) % channels;
    };
    for piece in data.chunks(PIECE) {
        match (format.float, format.container) {
            (true, 4) => through_hound::<f32>(format, piece, |v| take(v.to_sample::<f64>())),
            (true, _) => piece
                .chunks_exact(8)
                .for_each(|b| take(f64::from_le_bytes(b.try_into().expect("eight bytes")))),
            (false, 1) => through_hound::<i8>(format, piece, |v| take(v.to_sample::<f64>())),
            (false, 2) => through_hound::<i16>(format, piece, |v| {
                take((v << alignment.shift()).to_sample::<f64>());
            }),
            (false, 3) => through_hound::<i32>(format, piece, |v| {
                let wide = v << 8 << alignment.shift();
                take(I24::new_unchecked(wide >> 8).to_sample::<f64>());
            }),
            (false, 4) => through_hound::<i32>(format, piece, |v| {
                take((v << alignment.shift()).to_sample::<f64>());
            }),
            (false, wide) => piece.chunks_exact(usize::from(wide)).for_each(|b| {
                take((left_aligned(b) << alignment.shift()).to_sample::<f64>());
            }),
        }
    }
    for (channel, samples) in out.iter().enumerate() {
        if let Some(frame) = samples.iter().position(|x| !x.is_finite()) {
            return Err(WavFault::new(
                Code::WavNotFinite,
                format!(
                    "sample {frame} of channel {} (at {:.4} s) is {}",
                    channel + 1,
                    frame as f64 / f64::from(format.rate),
                    if samples[frame].is_nan() {
                        "not a number"
                    } else {
                        "infinite"
                    }
                ),
                "export it again, or repair that sample in an editor",
            ));
        }
    }
    Ok((out, alignment.note(format)))
}

/// Decodes `piece`, mono as far as `hound` knows, and hands on each sample.
fn through_hound<S: hound::Sample>(format: &Format, piece: &[u8], mut take: impl FnMut(S)) {
    let header = canonical_header(format, piece.len() as u32);
    let mut reader = hound::WavReader::new(Cursor::new(header).chain(piece))
        .expect("the canonical header is one that hound reads");
    for sample in reader.samples::<S>() {
        take(sample.expect("the header states the bytes that are there"));
    }
}

/// The 44 bytes before `data_bytes` of mono samples.
fn canonical_header(format: &Format, data_bytes: u32) -> Vec<u8> {
    let tag: u16 = if format.float { 3 } else { 1 };
    let mut header = Vec::with_capacity(44);
    header.extend_from_slice(b"RIFF");
    header.extend_from_slice(&(data_bytes + 36).to_le_bytes());
    header.extend_from_slice(b"WAVEfmt ");
    header.extend_from_slice(&16u32.to_le_bytes());
    header.extend_from_slice(&tag.to_le_bytes());
    header.extend_from_slice(&1u16.to_le_bytes());
    header.extend_from_slice(&format.rate.to_le_bytes());
    header.extend_from_slice(&(format.rate * u32::from(format.container)).to_le_bytes());
    header.extend_from_slice(&format.container.to_le_bytes());
    header.extend_from_slice(&(format.container * 8).to_le_bytes());
    header.extend_from_slice(b"data");
    header.extend_from_slice(&data_bytes.to_le_bytes());
    header
}

/// A little-endian integer of up to eight bytes, at the top of an `i64`.
fn left_aligned(bytes: &[u8]) -> i64 {
    let mut wide = [0; 8];
    wide[8 - bytes.len()..].copy_from_slice(bytes);
    i64::from_le_bytes(wide)
}

/// Where the valid bits stand in a container that is wider than they are.
enum Alignment {
    /// At the top, with zeros below, as the specification has it.
    Top,
    /// At the bottom, sign-extended: every sample of the file fits there, and some use bits that would have to be zero.
    Bottom { unused: u16 },
    /// Bits below the valid ones are in use: they are taken to be part of the sample.
    Full,
}

impl Alignment {
    fn of(format: &Format, data: &[u8]) -> Alignment {
        let unused = format.container * 8 - format.bits;
        if format.float || unused == 0 || format.container == 1 {
            return Alignment::Top;
        }
        // Only 24 bits in 32 are known to be written the wrong way round.
        let (mut low_bits_used, mut fits_bottom) =
            (false, (format.bits, format.container) == (24, 4));
        let drop = 64 - format.container * 8;
        for sample in data.chunks_exact(usize::from(format.container)) {
            let value = left_aligned(sample) >> drop;
            low_bits_used |= value & ((1 << unused) - 1) != 0;
            fits_bottom &= value << (drop + unused) >> (drop + unused) == value;
        }
        match (low_bits_used, fits_bottom) {
            (false, _) => Alignment::Top,
            (true, true) => Alignment::Bottom { unused },
            (true, false) => Alignment::Full,
        }
    }

    /// Bits to shift a sample up.
    fn shift(&self) -> u16 {
        match self {
            Alignment::Bottom { unused } => *unused,
            Alignment::Top | Alignment::Full => 0,
        }
    }

    fn note(&self, format: &Format) -> Option<String> {
        let (bits, container) = (format.bits, format.container * 8);
        match self {
            Alignment::Top => None,
            Alignment::Bottom { .. } => Some(format!(
                "its {bits}-bit samples stand at the bottom of {container} bits, against the rule, and were read so"
            )),
            Alignment::Full => Some(format!(
                "its header promises {bits} bits of {container}, but all {container} are in use, and were read"
            )),
        }
    }
}
