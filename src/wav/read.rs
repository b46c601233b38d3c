//! A WAV file's bytes to a recording.

use super::decode;
use super::fault::WavFault;
use super::walk;

/// A sound file as read.
#[derive(Clone, Debug, PartialEq)]
pub struct Recording {
    /// Samples of each channel, all of one length, full scale at +-1. Floats may go beyond.
    pub channels: Vec<Vec<f64>>,
    /// Sample rate, in hertz.
    pub rate: u32,
    /// Bits of a sample that count.
    pub bits: u16,
    /// Were the samples floats?
    pub float: bool,
    /// What was odd about the file and how it was taken, in sentences without a capital or a full stop.
    pub notes: Vec<String>,
}

impl Recording {
    /// Frames: samples of each channel.
    pub fn frames(&self) -> usize {
        self.channels[0].len()
    }
}

/// Reads a whole WAV file.
///
/// Takes PCM of 8 bits (offset binary) and 9 to 64 bits (signed), floats of 32 and 64 bits, at 8 to 192 kHz, with any number
/// of channels, behind a plain, extended or extensible header, RIFF, RF64 or BW64. An integer of b bits comes out divided by
/// 2^(b-1), exactly up to 53 bits. A recording has at least one channel and one frame, and every sample is finite.
///
/// Odd but harmless things become notes: a size of 0 or 0xFFFFFFFF (an unfinished or streamed file, read to its end), bytes
/// after the last whole frame, a second format chunk, samples at the wrong end of their container.
///
/// # Errors
/// One [`WavFault`] for the first thing that stands in the way. A file that promises more frames than it has is refused.
///
/// ```
/// use forehear::wav;
/// let fault = wav::read(b"OggS and so on").unwrap_err();
/// assert_eq!(fault.code.word(), "wav-other-kind");
/// ```
pub fn read(bytes: &[u8]) -> Result<Recording, WavFault> {
    let layout = walk::walk(bytes)?;
    let (channels, note) = decode::decode(&layout.format, layout.data)?;
    let mut notes = layout.notes;
    notes.extend(note);
    Ok(Recording {
        channels,
        rate: layout.format.rate,
        bits: layout.format.bits,
        float: layout.format.float,
        notes,
    })
}
