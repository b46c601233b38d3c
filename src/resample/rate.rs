//! From one sample rate to another.

use super::ResampleFault;
use super::block::{Block, is_fit};

/// Frames of the lower rate in one block, at least: sets how close to half that rate the filter goes.
const SHORT_SIDE: u64 = 1024;

/// Longest block. Chosen: all pairs of the usual rates (8, 11.025, 16, 22.05, 24, 32, 44.1, 48, 88.2, 96, 176.4, 192 kHz) stay
/// below it, rates without a common divisor do not.
const MAX_BLOCK: u64 = 1 << 16;

/// The waveform of `samples`, taken at `from` hertz, as it would read at `to` hertz.
///
/// Sample values keep their size (a sine keeps its amplitude). The result has `ceil(len * to / from)` frames and its first
/// lines up with the first of `samples`; what the linear-phase filter would ring before it is cut off. Equal rates give the
/// samples back untouched. For an impulse response use [`resample_impulse_response`].
///
/// # Errors
/// [`ResampleFault::Ratio`] when the rates are in no ratio of small whole numbers, [`ResampleFault::ZeroRate`],
/// [`ResampleFault::Input`] when a sample is not finite.
pub fn resample_rate(samples: &[f64], from: u32, to: u32) -> Result<Vec<f64>, ResampleFault> {
    if from == 0 || to == 0 {
        return Err(ResampleFault::ZeroRate);
    }
    if let Some(frame) = samples.iter().position(|&x| !is_fit(x)) {
        return Err(ResampleFault::Input {
            frame: frame as u64,
            value: samples[frame],
        });
    }
    if from == to || samples.is_empty() {
        return Ok(samples.to_vec());
    }
    let divisor = u64::from(greatest_common_divisor(from, to));
    let (down, up) = (u64::from(from) / divisor, u64::from(to) / divisor);
    // An even number of periods makes both sides even, and only then is the library's stated delay exact.
    let periods = SHORT_SIDE.div_ceil(down.min(up)).next_multiple_of(2);
    let block = periods * down.max(up);
    if block > MAX_BLOCK {
        return Err(ResampleFault::Ratio {
            from,
            to,
            up,
            down,
            block,
        });
    }
    let mut resampler = Block::new(down as usize, up as usize, (periods * down) as usize);
    let (frames_in, frames_out) = (resampler.frames_in(), resampler.frames_out());
    let wanted = (samples.len() as u128 * u128::from(up)).div_ceil(u128::from(down)) as usize;
    let mut delay = frames_out / 2;

    let mut output = Vec::with_capacity(wanted);
    let mut input_block = vec![0.0; frames_in];
    let mut output_block = vec![0.0; frames_out];
    let mut blocks = samples.chunks(frames_in);
    while output.len() < wanted {
        let now = blocks.next().unwrap_or(&[]);
        input_block[..now.len()].copy_from_slice(now);
        input_block[now.len()..].fill(0.0);
        resampler.run(&input_block, &mut output_block);
        let ready = &output_block[delay.min(frames_out)..];
        delay = 0;
        output.extend_from_slice(&ready[..ready.len().min(wanted - output.len())]);
    }
    Ok(output)
}

/// An impulse response taken at `from` hertz, for convolution at `to` hertz.
///
/// As [`resample_rate`], and scaled by `from / to`: h\[n\] = T h(nT) holds the sample interval T, so the convolution keeps its
/// frequency response.
///
/// # Errors
/// As [`resample_rate`].
pub fn resample_impulse_response(
    response: &[f64],
    from: u32,
    to: u32,
) -> Result<Vec<f64>, ResampleFault> {
    let mut resampled = resample_rate(response, from, to)?;
    if from != to {
        let scale = f64::from(from) / f64::from(to);
        resampled.iter_mut().for_each(|x| *x *= scale);
    }
    Ok(resampled)
}

fn greatest_common_divisor(mut a: u32, mut b: u32) -> u32 {
    while b != 0 {
        (a, b) = (b, a % b);
    }
    a
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::f64::consts::TAU;

    const USUAL: [u32; 12] = [
        8000, 11_025, 16_000, 22_050, 24_000, 32_000, 44_100, 48_000, 88_200, 96_000, 176_400,
        192_000,
    ];

    #[test]
    fn a_tone_keeps_its_amplitude_and_place_between_all_usual_rates() {
        let f = 997.0;
        let mut worst: f64 = 0.0;
        for from in USUAL {
            let input: Vec<f64> = (0..from * 3 / 5)
                .map(|n| (TAU * f * f64::from(n) / f64::from(from)).sin())
                .collect();
            for to in USUAL {
                let output = resample_rate(&input, from, to).unwrap();
                assert_eq!(output.len(), (to as usize * 3).div_ceil(5));
                let middle = output.len() * 2 / 5..output.len() * 3 / 5;
                for n in middle {
                    let expected = (TAU * f * n as f64 / f64::from(to)).sin();
                    worst = worst.max((output[n] - expected).abs());
                }
            }
        }
        println!("worst error {worst:e}");
        assert!(worst < 1e-7, "{worst}");
    }

    #[test]
    fn an_impulse_response_keeps_its_response() {
        // h(t) = exp(-t/tau) cos(2 pi f t) as a Gaussian-windowed burst, band-limited in effect.
        let h = |rate: u32| -> Vec<f64> {
            (0..rate / 10)
                .map(|n| {
                    let t = f64::from(n) / f64::from(rate);
                    (-((t - 0.05) / 0.002).powi(2)).exp() * (TAU * 2000.0 * t).cos()
                        / f64::from(rate)
                })
                .collect()
        };
        let resampled = resample_impulse_response(&h(44_100), 44_100, 96_000).unwrap();
        for (a, b) in resampled.iter().zip(h(96_000)) {
            assert!((a - b).abs() * 96_000.0 < 1e-9);
        }
    }

    #[test]
    fn absurd_ratios_and_bad_samples_are_refused() {
        assert!(matches!(
            resample_rate(&[0.0], 44_101, 48_000),
            Err(ResampleFault::Ratio { up: 48_000, .. })
        ));
        assert_eq!(
            resample_rate(&[0.0], 0, 48_000),
            Err(ResampleFault::ZeroRate)
        );
        assert!(matches!(
            resample_rate(&[0.0, f64::NAN], 44_100, 48_000),
            Err(ResampleFault::Input { frame: 1, .. })
        ));
        assert_eq!(resample_rate(&[], 44_100, 48_000), Ok(Vec::new()));
        assert_eq!(resample_rate(&[1.0], 48_000, 48_000), Ok(vec![1.0]));
    }

    #[test]
    fn short_clips_have_the_length_they_should() {
        for frames in [1, 2, 3, 1000, 5000] {
            let output = resample_rate(&vec![0.5; frames], 44_100, 48_000).unwrap();
            assert_eq!(output.len(), (frames * 160).div_ceil(147));
        }
    }
}
