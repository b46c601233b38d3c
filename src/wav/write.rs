//! Channels of samples to a WAV file.

use crate::signal::SplitMix64;
use std::io::{BufWriter, Seek, SeekFrom, Write};

/// How samples are stored.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Encoding {
    /// 16-bit integers with triangular dither of +-1 LSB, drawn from `seed`.
    Pcm16 { seed: u64 },
    /// 24-bit integers, rounded; their steps lie below the noise of any recording.
    Pcm24,
    /// 32-bit floats.
    Float32,
}

impl Encoding {
    fn bits(self) -> u16 {
        match self {
            Encoding::Pcm16 { .. } => 16,
            Encoding::Pcm24 => 24,
            Encoding::Float32 => 32,
        }
    }

    fn sample_bytes(self) -> u64 {
        u64::from(self.bits() / 8)
    }
}

/// What came of writing a file.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Written {
    /// Samples of each channel.
    pub frames: u64,
    /// Samples, of all channels, that lay beyond what the encoding holds and were set to its end.
    pub clipped: u64,
    /// Length of the file.
    pub bytes: u64,
}

/// Why a file was not written. Nothing was, except in the last case.
#[derive(Debug, thiserror::Error)]
pub enum WriteFault {
    #[error("sample {frame} of channel {channel} is {value}, which no sound file should hold")]
    NotFinite {
        /// Channel, from 1.
        channel: usize,
        /// Frame, from 0.
        frame: usize,
        value: f64,
    },
    #[error(
        "{frames} frames of {channels} channel(s) make {bytes} bytes, and a WAV file holds less than 4 GiB; render a shorter \
         take or fewer channels"
    )]
    TooLarge {
        frames: u64,
        channels: u64,
        bytes: u64,
    },
    #[error("a WAV file has 1 to 65535 channels of one length and a sample rate above 0 Hz; {0}")]
    Shape(String),
    #[error("the sound file could not be written")]
    Io(#[from] std::io::Error),
}

/// Length of the file that `frames` of `channels` would make: ask before rendering.
///
/// # Errors
/// [`WriteFault::TooLarge`] when the format's 32-bit sizes cannot say it.
pub fn bytes_needed(frames: u64, channels: u64, encoding: Encoding) -> Result<u64, WriteFault> {
    let data = frames
        .saturating_mul(channels)
        .saturating_mul(encoding.sample_bytes());
    let header = if is_extensible(channels, encoding) {
        EXTENSIBLE_HEADER
    } else {
        PLAIN_HEADER
    };
    let bytes = data.saturating_add(header + data % 2);
    if bytes - 8 > u64::from(u32::MAX) {
        return Err(WriteFault::TooLarge {
            frames,
            channels,
            bytes,
        });
    }
    Ok(bytes)
}

/// Does `hound` write the longer header?
fn is_extensible(channels: u64, encoding: Encoding) -> bool {
    channels > 2 || encoding.bits() > 16
}

/// Bytes before the samples, in the two forms that `hound` writes.
const PLAIN_HEADER: u64 = 44;
const EXTENSIBLE_HEADER: u64 = 68;
/// Where the speaker mask stands in the longer one.
const SPEAKER_MASK_AT: u64 = 40;

/// Writes a whole file to `out`, which must be empty and at its start.
///
/// A sample x becomes round(2^(b-1) x), +-1 LSB of triangular dither added before rounding where the encoding says so: full
/// scale is +-1 as in [`read`](super::read()), and +1 itself is one step too high and counts as clipped. Callers scale
/// beforehand and look at [`Written::clipped`]. The same samples give the same bytes.
///
/// Dither: S. P. Lipshitz, R. A. Wannamaker, J. Vanderkooy, "Quantization and dither: a theoretical survey", J. Audio Eng. Soc.
/// 40(5), 1992 (from memory): two uniform numbers subtracted make error mean and power independent of the signal.
///
/// # Errors
/// See [`WriteFault`].
pub fn write<W: Write + Seek, C: AsRef<[f64]>>(
    mut out: W,
    rate: u32,
    channels: &[C],
    encoding: Encoding,
) -> Result<Written, WriteFault> {
    let channels: Vec<&[f64]> = channels.iter().map(AsRef::as_ref).collect();
    let bytes = check(rate, &channels, encoding)?;
    let frames = channels[0].len();
    let spec = hound::WavSpec {
        channels: channels.len() as u16,
        sample_rate: rate,
        bits_per_sample: encoding.bits(),
        sample_format: match encoding {
            Encoding::Float32 => hound::SampleFormat::Float,
            _ => hound::SampleFormat::Int,
        },
    };
    let mut quantizer = Quantizer::new(encoding);
    {
        let mut writer =
            hound::WavWriter::new(BufWriter::with_capacity(1 << 16, &mut out), spec).map_err(io)?;
        for frame in 0..frames {
            for channel in &channels {
                match encoding {
                    Encoding::Float32 => writer.write_sample(channel[frame] as f32),
                    _ => writer.write_sample(quantizer.quantize(channel[frame])),
                }
                .map_err(io)?;
            }
        }
        writer.finalize().map_err(io)?;
    }
    let data_bytes = (frames * channels.len()) as u64 * encoding.sample_bytes();
    patch(
        &mut out,
        data_bytes,
        is_extensible(channels.len() as u64, encoding),
        channels.len(),
    )?;
    out.flush()?;
    Ok(Written {
        frames: frames as u64,
        clipped: quantizer.clipped,
        bytes,
    })
}

/// All that can be refused before the first byte; gives the file's length.
fn check(rate: u32, channels: &[&[f64]], encoding: Encoding) -> Result<u64, WriteFault> {
    let Some(first) = channels.first() else {
        return Err(WriteFault::Shape("there is no channel".to_string()));
    };
    // The byte-rate field has 32 bits; hound multiplies into it unchecked.
    let byte_rate = u64::from(rate) * channels.len() as u64 * encoding.sample_bytes();
    if rate == 0 || channels.len() > 65_535 || byte_rate > u64::from(u32::MAX) {
        return Err(WriteFault::Shape(format!(
            "{} channel(s) at {rate} Hz are not that",
            channels.len()
        )));
    }
    if channels.len() as u64 * encoding.sample_bytes() > 65_535 {
        return Err(WriteFault::Shape(format!(
            "{} channels do not fit its frame",
            channels.len()
        )));
    }
    for (k, samples) in channels.iter().enumerate() {
        if samples.len() != first.len() {
            return Err(WriteFault::Shape(format!(
                "channel {} has {} frames and channel 1 has {}",
                k + 1,
                samples.len(),
                first.len()
            )));
        }
        let fits = |x: f64| match encoding {
            Encoding::Float32 => (x as f32).is_finite(),
            _ => x.is_finite(),
        };
        if let Some(frame) = samples.iter().position(|&x| !fits(x)) {
            return Err(WriteFault::NotFinite {
                channel: k + 1,
                frame,
                value: samples[frame],
            });
        }
    }
    bytes_needed(first.len() as u64, channels.len() as u64, encoding)
}

/// Puts right what `hound` leaves: the pad byte after odd data, and the speaker mask of all but stereo files, where hound says
/// "front left" of a mono file and guesses at the rest.
fn patch<W: Write + Seek>(
    out: &mut W,
    data_bytes: u64,
    is_extensible: bool,
    channels: usize,
) -> Result<(), WriteFault> {
    if is_extensible && channels != 2 {
        out.seek(SeekFrom::Start(SPEAKER_MASK_AT))?;
        out.write_all(&0u32.to_le_bytes())?;
    }
    if data_bytes % 2 == 1 {
        let header = if is_extensible {
            EXTENSIBLE_HEADER
        } else {
            PLAIN_HEADER
        };
        let end = header + data_bytes;
        out.seek(SeekFrom::Start(end))?;
        out.write_all(&[0])?;
        out.seek(SeekFrom::Start(4))?;
        out.write_all(&((end + 1 - 8) as u32).to_le_bytes())?;
    }
    Ok(())
}

fn io(fault: hound::Error) -> WriteFault {
    match fault {
        hound::Error::IoError(cause) => WriteFault::Io(cause),
        other => WriteFault::Io(std::io::Error::other(other)),
    }
}

/// Numbers to integers: scale, dither, round, clamp, count. (Hand-written, for `dasp` truncates and does not clamp.)
struct Quantizer {
    dither: Option<SplitMix64>,
    scale: f64,
    clipped: u64,
}

impl Quantizer {
    fn new(encoding: Encoding) -> Quantizer {
        Quantizer {
            dither: match encoding {
                Encoding::Pcm16 { seed } => Some(SplitMix64::new(seed)),
                _ => None,
            },
            scale: f64::from(1u32 << (encoding.bits() - 1)),
            clipped: 0,
        }
    }

    fn quantize(&mut self, x: f64) -> i32 {
        let dither = match &mut self.dither {
            Some(random) => random.uniform() - random.uniform(),
            None => 0.0,
        };
        let rounded = (x * self.scale + dither).round();
        let held = rounded.clamp(-self.scale, self.scale - 1.0);
        self.clipped += u64::from(held != rounded);
        held as i32
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::wav::read;
    use std::io::Cursor;

    const DITHERED: Encoding = Encoding::Pcm16 { seed: 1 };

    fn encode(channels: &[Vec<f64>], encoding: Encoding) -> (Vec<u8>, Written) {
        let mut out = Cursor::new(Vec::new());
        let written = write(&mut out, 48_000, channels, encoding).unwrap();
        let bytes = out.into_inner();
        assert_eq!(bytes.len() as u64, written.bytes);
        (bytes, written)
    }

    fn ramp(frames: usize) -> Vec<f64> {
        (0..frames)
            .map(|n| 1.8 * n as f64 / frames as f64 - 0.9)
            .collect()
    }

    #[test]
    fn what_is_written_is_read_back() {
        for count in 1..=5 {
            for frames in [1, 2, 777] {
                let channels: Vec<Vec<f64>> = (0..count)
                    .map(|k| ramp(frames).iter().map(|x| x / (k + 1) as f64).collect())
                    .collect();
                // Half a step of rounding; with dither, another whole one.
                for (encoding, bits, tolerance) in [
                    (DITHERED, 16, 1.5 / 32_768.0),
                    (Encoding::Pcm24, 24, 0.5 / 8_388_608.0),
                    (Encoding::Float32, 32, 1e-7),
                ] {
                    let (bytes, written) = encode(&channels, encoding);
                    assert_eq!(written.clipped, 0);
                    assert_eq!(written.frames, frames as u64);
                    assert_eq!(
                        written.bytes,
                        bytes_needed(frames as u64, count as u64, encoding).unwrap()
                    );
                    let riff = u32::from_le_bytes(bytes[4..8].try_into().unwrap());
                    assert_eq!(riff as usize, bytes.len() - 8);
                    assert_eq!(bytes.len() % 2, 0);
                    let back = read(&bytes).unwrap();
                    assert_eq!((back.rate, back.bits), (48_000, bits));
                    assert_eq!(back.float, encoding == Encoding::Float32);
                    assert_eq!(back.notes, Vec::<String>::new());
                    assert_eq!(back.channels.len(), channels.len());
                    for (a, b) in back.channels.iter().zip(&channels) {
                        assert_eq!(a.len(), b.len());
                        for (x, y) in a.iter().zip(b) {
                            assert!((x - y).abs() <= tolerance, "{x} {y}");
                        }
                    }
                }
            }
        }
    }

    #[test]
    fn the_speaker_mask_is_unset_but_for_stereo() {
        let mask = |count: usize| {
            let (bytes, _) = encode(&vec![vec![0.0; 3]; count], Encoding::Pcm24);
            u32::from_le_bytes(bytes[40..44].try_into().unwrap())
        };
        assert_eq!((mask(1), mask(2), mask(3), mask(6)), (0, 3, 0, 0));
    }

    #[test]
    fn clipped_samples_are_counted_and_stand_at_the_end_of_the_range() {
        let samples = vec![vec![0.0, 1.0, 1.5, -1.0, -1.5, 0.5]];
        let (bytes, written) = encode(&samples, Encoding::Pcm24);
        assert_eq!(written.clipped, 3);
        let back = read(&bytes).unwrap().channels.remove(0);
        let top = 1.0 - 1.0 / 8_388_608.0;
        assert_eq!(back, [0.0, top, top, -1.0, -1.0, 0.5]);
        assert_eq!(encode(&samples, Encoding::Float32).1.clipped, 0);
    }

    #[test]
    fn dither_has_the_mean_and_power_of_its_kind_whatever_the_signal() {
        let step = 1.0 / 32_768.0;
        for offset in [0.0, 0.25, 0.5] {
            let frames = 200_000;
            let (bytes, _) = encode(&[vec![offset * step; frames]], DITHERED);
            let back = read(&bytes).unwrap().channels.remove(0);
            let error: Vec<f64> = back.iter().map(|x| x / step - offset).collect();
            let mean = error.iter().sum::<f64>() / frames as f64;
            let power = error.iter().map(|e| e * e).sum::<f64>() / frames as f64;
            // Triangular dither: 1/6 from itself, 1/12 from rounding, in LSB squared. Five standard errors.
            assert!(mean.abs() < 0.006, "{mean}");
            assert!((power - 0.25).abs() < 0.006, "{power}");
        }
    }

    #[test]
    fn the_same_samples_make_the_same_bytes() {
        let samples = vec![ramp(1000), ramp(1000)];
        assert_eq!(encode(&samples, DITHERED), encode(&samples, DITHERED));
        assert_ne!(
            encode(&samples, DITHERED).0,
            encode(&samples, Encoding::Pcm16 { seed: 2 }).0
        );
    }

    #[test]
    fn what_cannot_be_written_is_refused_before_the_first_byte() {
        let mut out = Cursor::new(Vec::new());
        let mut refuse = |rate, channels: &[Vec<f64>], encoding| {
            let fault = write(&mut out, rate, channels, encoding).unwrap_err();
            assert!(out.get_ref().is_empty());
            fault
        };
        let bad = vec![vec![0.0; 3], vec![0.0, f64::NAN, 0.0]];
        for encoding in [DITHERED, Encoding::Pcm24, Encoding::Float32] {
            assert!(matches!(
                refuse(48_000, &bad, encoding),
                WriteFault::NotFinite {
                    channel: 2,
                    frame: 1,
                    ..
                }
            ));
        }
        assert!(matches!(
            refuse(48_000, &[vec![1e300]], Encoding::Float32),
            WriteFault::NotFinite { .. }
        ));
        let shapes: [(u32, Vec<Vec<f64>>); 4] = [
            (48_000, vec![]),
            (0, vec![vec![0.0]]),
            (48_000, vec![vec![0.0], vec![]]),
            (48_000, vec![vec![0.0]; 40_000]),
        ];
        for (rate, channels) in shapes {
            assert!(matches!(
                refuse(rate, &channels, DITHERED),
                WriteFault::Shape(_)
            ));
        }
    }

    #[test]
    fn four_gibibytes_are_refused_and_a_little_less_is_not() {
        let most = (u64::from(u32::MAX) - 60) / 3;
        assert!(bytes_needed(most - 1, 1, Encoding::Pcm24).is_ok());
        assert!(matches!(
            bytes_needed(most + 1, 1, Encoding::Pcm24),
            Err(WriteFault::TooLarge { .. })
        ));
        assert!(bytes_needed(u64::MAX, u64::MAX, Encoding::Float32).is_err());
    }

    #[test]
    fn a_full_disk_is_reported() {
        struct Full(Cursor<Vec<u8>>);
        impl Write for Full {
            fn write(&mut self, buffer: &[u8]) -> std::io::Result<usize> {
                if self.0.get_ref().len() > 100_000 {
                    return Err(std::io::Error::other("no space left"));
                }
                self.0.write(buffer)
            }
            fn flush(&mut self) -> std::io::Result<()> {
                Ok(())
            }
        }
        impl Seek for Full {
            fn seek(&mut self, to: SeekFrom) -> std::io::Result<u64> {
                self.0.seek(to)
            }
        }
        let fault = write(
            Full(Cursor::new(Vec::new())),
            48_000,
            &[vec![0.0; 200_000]],
            Encoding::Pcm24,
        );
        assert!(matches!(fault, Err(WriteFault::Io(_))));
    }
}
