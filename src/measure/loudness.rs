//! Integrated loudness and true peak of finished sound.

use ebur128::{Channel, EbuR128, Mode};
use thiserror::Error;

/// Why sound has no integrated loudness.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Error)]
pub enum Unmeasured {
    #[error("shorter than one gating block of 400 ms")]
    ShorterThanBlock,
    #[error("no block of 400 ms is above -70 LUFS: silence, or as good as")]
    BelowGate,
}

/// Why sound cannot be measured at all.
#[derive(Clone, Debug, PartialEq, Error)]
pub enum LoudnessError {
    #[error("no channels")]
    NoChannels,
    #[error("channels differ in length: {0:?} samples")]
    UnequalChannels(Vec<usize>),
    #[error("sample {index} of channel {channel} is not a finite number")]
    NotFinite { channel: usize, index: usize },
    #[error("the meter does not take {channels} channels at {rate_hz} Hz: {reason}")]
    Meter {
        channels: usize,
        rate_hz: u32,
        reason: String,
    },
}

/// Loudness figures; full scale is 1.0.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Loudness {
    /// Integrated (gated) loudness, in LUFS, or why there is none.
    pub integrated_lufs: Result<f64, Unmeasured>,
    /// Largest true peak of all channels, in dB re full scale (dBTP); `None` for digital silence.
    pub true_peak_dbtp: Option<f64>,
}

/// Integrated loudness of `channels` (one slice each, full scale 1.0), and their true peak.
///
/// ```text
/// L = -0.691 + 10 log10 Σ_channels <y²>,   y: K-weighted samples in blocks that pass the gates
/// ```
///
/// Blocks of 400 ms every 100 ms; gates at -70 LUFS and at 10 LU below the mean of the blocks above
/// that. Every channel has weight 1. **A mono signal is one channel**: the same signal in two
/// channels reads 3.01 LU more, and a player that sends mono to both loudspeakers makes it so.
/// Relations between mono renders do not depend on it.
///
/// True peak is the largest of the samples and of 4-fold (from 96 kHz 2-fold, from 192 kHz no)
/// oversampled values; EBU Tech 3341 allows such a meter to read 0.2 dB high or 0.4 dB low.
///
/// Source: ITU-R BS.1770-5 annexes 1 and 2, EBU R 128.
///
/// # Errors
/// [`LoudnessError`]. Sound that is too short or too soft is no error: the reason stands in
/// `integrated_lufs`.
pub fn loudness(channels: &[&[f64]], rate_hz: u32) -> Result<Loudness, LoudnessError> {
    let Some(first) = channels.first() else {
        return Err(LoudnessError::NoChannels);
    };
    if channels.iter().any(|c| c.len() != first.len()) {
        let lengths = channels.iter().map(|c| c.len()).collect();
        return Err(LoudnessError::UnequalChannels(lengths));
    }
    for (channel, samples) in channels.iter().enumerate() {
        if let Some(index) = samples.iter().position(|x| !x.is_finite()) {
            return Err(LoudnessError::NotFinite { channel, index });
        }
    }
    let refused = |error: ebur128::Error| LoudnessError::Meter {
        channels: channels.len(),
        rate_hz,
        reason: error.to_string(),
    };
    let count = channels.len() as u32;
    let mut meter = EbuR128::new(count, rate_hz, Mode::I | Mode::TRUE_PEAK).map_err(refused)?;
    // The meter would take the fourth and fifth channel of a file for surrounds.
    meter
        .set_channel_map(&vec![Channel::Center; channels.len()])
        .map_err(refused)?;
    meter.add_frames_planar_f64(channels).map_err(refused)?;

    let lufs = meter.loudness_global().map_err(refused)?;
    let has_block = meter
        .gating_block_count_and_energy()
        .is_some_and(|(blocks, _)| blocks > 0);
    let block = rate_hz as usize * 2 / 5;
    let integrated_lufs = if lufs.is_finite() && has_block {
        Ok(lufs)
    } else if first.len() < block {
        Err(Unmeasured::ShorterThanBlock)
    } else {
        Err(Unmeasured::BelowGate)
    };
    let mut peak = 0.0_f64;
    for channel in 0..count {
        peak = peak.max(meter.true_peak(channel).map_err(refused)?);
    }
    Ok(Loudness {
        integrated_lufs,
        true_peak_dbtp: (peak > 0.0).then(|| 20.0 * peak.log10()),
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::f64::consts::TAU;

    fn sine(peak: f64, hz: f64, rate: u32, seconds: f64) -> Vec<f64> {
        let frames = (f64::from(rate) * seconds) as usize;
        let step = TAU * hz / f64::from(rate);
        (0..frames)
            .map(|m| peak * (step * m as f64).sin())
            .collect()
    }

    #[test]
    fn twice_the_amplitude_is_six_decibels_more() {
        let soft = sine(0.1, 440.0, 48_000, 2.0);
        let loud: Vec<f64> = soft.iter().map(|x| 2.0 * x).collect();
        let of = |x: &[f64]| loudness(&[x], 48_000).unwrap();
        let (soft, loud) = (of(&soft), of(&loud));
        let six = 20.0 * 2f64.log10();
        let gain = loud.integrated_lufs.unwrap() - soft.integrated_lufs.unwrap();
        assert!((gain - six).abs() < 1e-9);
        let gain = loud.true_peak_dbtp.unwrap() - soft.true_peak_dbtp.unwrap();
        assert!(
            (gain - six).abs() < 1e-4,
            "the meter's interpolator works in single precision"
        );
    }

    #[test]
    fn mono_is_one_channel_and_every_channel_weighs_the_same() {
        let x = sine(0.1, 1000.0, 48_000, 1.0);
        let of = |channels: &[&[f64]]| loudness(channels, 48_000).unwrap().integrated_lufs.unwrap();
        let mono = of(&[&x]);
        for count in 2..=6 {
            let louder = of(&vec![x.as_slice(); count]) - mono;
            assert!(
                (louder - 10.0 * (count as f64).log10()).abs() < 1e-9,
                "{count} channels"
            );
        }
    }

    #[test]
    fn silence_and_a_click_have_no_loudness_and_say_why() {
        let silent = loudness(&[&[0.0; 48_000]], 48_000).unwrap();
        assert_eq!(silent.integrated_lufs, Err(Unmeasured::BelowGate));
        assert_eq!(silent.true_peak_dbtp, None);
        let short = loudness(&[&sine(0.5, 1000.0, 48_000, 0.399)], 48_000).unwrap();
        assert_eq!(short.integrated_lufs, Err(Unmeasured::ShorterThanBlock));
        assert!(short.true_peak_dbtp.is_some());
        let enough = loudness(&[&sine(0.5, 1000.0, 48_000, 0.4)], 48_000).unwrap();
        assert!(enough.integrated_lufs.is_ok());
        let whisper = loudness(&[&sine(1e-5, 1000.0, 48_000, 1.0)], 48_000).unwrap();
        assert_eq!(whisper.integrated_lufs, Err(Unmeasured::BelowGate));
    }

    #[test]
    fn what_cannot_be_measured_is_refused() {
        assert_eq!(loudness(&[], 48_000), Err(LoudnessError::NoChannels));
        let unequal = loudness(&[&[0.0; 3], &[0.0; 4]], 48_000);
        assert_eq!(unequal, Err(LoudnessError::UnequalChannels(vec![3, 4])));
        let broken = loudness(&[&[0.0, f64::NAN]], 48_000);
        assert_eq!(
            broken,
            Err(LoudnessError::NotFinite {
                channel: 0,
                index: 1
            })
        );
        let slow = loudness(&[&[0.0; 10]], 1);
        assert!(matches!(slow, Err(LoudnessError::Meter { rate_hz: 1, .. })));
    }
}
