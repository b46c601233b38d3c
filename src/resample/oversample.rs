//! Up by a factor, through a stage, and down again.

use super::ResampleFault;
use super::block::{Block, is_fit};

/// Frames of the base rate in one block, and the whole delay of the pair, which is taken out.
pub const BLOCK: usize = 1024;

/// Largest factor: 8 is what renders use, the rest is for convergence checks.
pub(super) const MAX_FACTOR: usize = 64;

/// Runs a stage at a multiple of the sample rate.
///
/// With the factor L, the stage sees the input band-limited at L times its rate, and what it makes is band-limited and
/// brought back. Output frame n belongs to input frame n; the output is as long as the input.
///
/// - Blocks come in order and follow each other without gap: the stage may keep states. For L > 1 each has `BLOCK * L` samples,
///   and the first `BLOCK * L / 2` samples are a run-in before the clip (silence, and the filter's ringing before an abrupt
///   start). For L = 1 nothing is filtered and there is no run-in; blocks have up to `BLOCK` samples.
/// - Silence reaches the stage as exact zeros; what the stage makes of it is what comes out: zeros as exact zeros, a constant
///   within rounding, from the first frame on.
/// - Flat within 1e-9 dB to 20 kHz and within 1e-3 dB to 21 kHz at 44.1 kHz and above; frequencies near half the rate are lost.
/// - Memory: the input, the output and a constant.
///
/// ```
/// use forehear::resample::Oversampler;
/// let input: Vec<f64> = (0..4800).map(|n| 0.1 * (0.1 * n as f64).sin()).collect();
/// let doubled = Oversampler::new(8)?.process(&input, |block| block.iter_mut().for_each(|x| *x *= 2.0))?;
/// assert_eq!(doubled.len(), input.len());
/// assert!((doubled[2400] - 2.0 * input[2400]).abs() < 1e-8);
/// # Ok::<(), forehear::resample::ResampleFault>(())
/// ```
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Oversampler {
    factor: usize,
}

impl Oversampler {
    /// A factor of 1, 2, 4 or 8; 16, 32 and 64 are there for convergence checks.
    ///
    /// # Errors
    /// [`ResampleFault::Factor`] for any other.
    pub fn new(factor: usize) -> Result<Oversampler, ResampleFault> {
        if factor.is_power_of_two() && factor <= MAX_FACTOR {
            Ok(Oversampler { factor })
        } else {
            Err(ResampleFault::Factor(factor))
        }
    }

    /// The factor L.
    pub fn factor(&self) -> usize {
        self.factor
    }

    /// Runs `stage` over the whole of `input`, in place, block by block.
    ///
    /// # Errors
    /// [`ResampleFault::Input`] or [`ResampleFault::Stage`] when a sample is not finite.
    pub fn process(
        &self,
        input: &[f64],
        mut stage: impl FnMut(&mut [f64]),
    ) -> Result<Vec<f64>, ResampleFault> {
        let [output] = self.process_lanes::<1>(input, |up, [lane]| {
            lane.copy_from_slice(up);
            stage(lane);
        })?;
        Ok(output)
    }

    /// Runs `stage` over the whole of `input`, which is brought up once, into `L` lanes, each brought down on its own.
    ///
    /// The stage must fill every lane, each as long as the block it is given, and leave their lengths alone.
    ///
    /// # Errors
    /// [`ResampleFault::Input`] or [`ResampleFault::Stage`] when a sample is not finite.
    pub fn process_lanes<const L: usize>(
        &self,
        input: &[f64],
        mut stage: impl FnMut(&[f64], &mut [Vec<f64>; L]),
    ) -> Result<[Vec<f64>; L], ResampleFault> {
        let mut output = std::array::from_fn(|_| Vec::with_capacity(input.len()));
        let mut stream = self.stream::<L>();
        stream.push(input, &mut stage, &mut output)?;
        stream.finish(&mut stage, &mut output)?;
        Ok(output)
    }

    /// Starts a stream that is fed piece by piece. However a clip is cut, the stage sees the same blocks.
    pub fn stream<const L: usize>(&self) -> Stream<L> {
        let factor = self.factor;
        let (up, down) = if factor == 1 {
            (None, Vec::new())
        } else {
            (
                Some(Block::new(1, factor, BLOCK)),
                (0..L)
                    .map(|_| Block::new(factor, 1, BLOCK * factor))
                    .collect(),
            )
        };
        Stream {
            factor,
            up,
            down,
            pending: Vec::with_capacity(BLOCK),
            up_block: vec![0.0; BLOCK * factor],
            lanes: std::array::from_fn(|_| vec![0.0; BLOCK * factor]),
            down_block: vec![0.0; BLOCK],
            received: 0,
            blocks: 0,
        }
    }
}

/// An oversampled clip under way, from [`Oversampler::stream`].
pub struct Stream<const L: usize> {
    factor: usize,
    up: Option<Block>,
    down: Vec<Block>,
    pending: Vec<f64>,
    up_block: Vec<f64>,
    lanes: [Vec<f64>; L],
    down_block: Vec<f64>,
    /// Input frames taken so far.
    received: u64,
    /// Blocks run so far.
    blocks: u64,
}

impl<const L: usize> Stream<L> {
    /// Takes some input; appends to `output` what is ready.
    ///
    /// # Errors
    /// As [`Oversampler::process_lanes`]; the stream is of no use afterwards.
    pub fn push(
        &mut self,
        input: &[f64],
        stage: &mut impl FnMut(&[f64], &mut [Vec<f64>; L]),
        output: &mut [Vec<f64>; L],
    ) -> Result<(), ResampleFault> {
        let mut rest = input;
        while !rest.is_empty() {
            let (now, later) = rest.split_at(rest.len().min(BLOCK - self.pending.len()));
            for (n, &value) in now.iter().enumerate() {
                if !is_fit(value) {
                    let frame = self.received + n as u64;
                    return Err(ResampleFault::Input { frame, value });
                }
            }
            self.pending.extend_from_slice(now);
            self.received += now.len() as u64;
            rest = later;
            if self.pending.len() == BLOCK {
                self.run(stage, output)?;
            }
        }
        Ok(())
    }

    /// Ends the clip: appends the rest, so that as many frames have come out as went in.
    ///
    /// # Errors
    /// As [`Oversampler::process_lanes`].
    pub fn finish(
        mut self,
        stage: &mut impl FnMut(&[f64], &mut [Vec<f64>; L]),
        output: &mut [Vec<f64>; L],
    ) -> Result<(), ResampleFault> {
        if self.received == 0 {
            return Ok(());
        }
        if self.up.is_none() {
            return if self.pending.is_empty() {
                Ok(())
            } else {
                self.run(stage, output)
            };
        }
        let blocks_needed = (self.received + BLOCK as u64).div_ceil(BLOCK as u64);
        while self.blocks < blocks_needed {
            self.pending.resize(BLOCK, 0.0);
            self.run(stage, output)?;
        }
        Ok(())
    }

    /// One block of `pending` up, through the stage, and down.
    fn run(
        &mut self,
        stage: &mut impl FnMut(&[f64], &mut [Vec<f64>; L]),
        output: &mut [Vec<f64>; L],
    ) -> Result<(), ResampleFault> {
        let frames = self.pending.len();
        match &mut self.up {
            Some(up) => up.run(&self.pending, &mut self.up_block),
            None => {
                self.up_block.clear();
                self.up_block.extend_from_slice(&self.pending);
                self.lanes.iter_mut().for_each(|lane| lane.truncate(frames));
            }
        }
        self.pending.clear();
        stage(&self.up_block, &mut self.lanes);
        for (lane, samples) in self.lanes.iter().enumerate() {
            assert_eq!(
                samples.len(),
                self.up_block.len(),
                "a stage leaves the length of its lanes alone"
            );
            if let Some(at) = samples.iter().position(|&x| !is_fit(x)) {
                let sample = self.blocks * (BLOCK * self.factor) as u64 + at as u64;
                let run_in = if self.factor == 1 {
                    0
                } else {
                    BLOCK as u64 / 2
                };
                return Err(ResampleFault::Stage {
                    lane,
                    frame: (sample / self.factor as u64).saturating_sub(run_in),
                    value: samples[at],
                });
            }
        }
        // The first block out of the pair is its delay, and is dropped; the last frames are those of the zeros added.
        let first_frame = self.blocks * BLOCK as u64;
        self.blocks += 1;
        if self.up.is_none() {
            for (samples, out) in self.lanes.iter().zip(output) {
                out.extend_from_slice(samples);
            }
            return Ok(());
        }
        for ((samples, down), out) in self.lanes.iter().zip(&mut self.down).zip(output) {
            down.run(samples, &mut self.down_block);
            if first_frame >= BLOCK as u64 {
                let wanted = self.received - (first_frame - BLOCK as u64);
                let keep = wanted.min(BLOCK as u64) as usize;
                out.extend_from_slice(&self.down_block[..keep]);
            }
        }
        Ok(())
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::f64::consts::TAU;

    const RATE: f64 = 48_000.0;

    fn multitone(frames: usize) -> Vec<f64> {
        let tones: Vec<(f64, f64)> = (0..20)
            .map(|k| (20.0 * 1000f64.powf(f64::from(k) / 19.0), f64::from(k * k)))
            .collect();
        (0..frames)
            .map(|n| {
                tones
                    .iter()
                    .map(|(f, phase)| (TAU * f * n as f64 / RATE + phase).sin() / 20.0)
                    .sum()
            })
            .collect()
    }

    fn rms(x: &[f64]) -> f64 {
        (x.iter().map(|v| v * v).sum::<f64>() / x.len() as f64).sqrt()
    }

    /// Amplitude and phase of the sine at `f` that fits `x` best, by projection over whole periods.
    fn phase(x: &[f64], f: f64) -> f64 {
        let (mut s, mut c) = (0.0, 0.0);
        for (n, v) in x.iter().enumerate() {
            let angle = TAU * f * n as f64 / RATE;
            s += v * angle.sin();
            c += v * angle.cos();
        }
        c.atan2(s)
    }

    #[test]
    fn a_multitone_goes_up_and_down_unchanged() {
        let input = multitone(32_768);
        for factor in [2, 4, 8] {
            let output = Oversampler::new(factor)
                .unwrap()
                .process(&input, |_| {})
                .unwrap();
            assert_eq!(output.len(), input.len());
            let middle = 2 * BLOCK..input.len() - 2 * BLOCK;
            let error: Vec<f64> = middle.clone().map(|n| output[n] - input[n]).collect();
            let residual = 20.0 * (rms(&error) / rms(&input[middle])).log10();
            println!("x{factor}: residual {residual:.1} dB");
            // -211 dB as found; -150 dB is what the rest of the program relies on.
            assert!(residual < -150.0, "x{factor}: {residual} dB");
        }
    }

    #[test]
    fn tones_keep_their_level_up_to_where_the_docs_say() {
        // Fractions of the rate: 20 kHz and 21 kHz at 44.1 kHz, 22 kHz at 48 kHz.
        for (fraction, decibels) in [
            (20.0 / 44.1, 1e-9),
            (22.0 / 48.0, 1e-9),
            (21.0 / 44.1, 1e-3),
        ] {
            let cycles = (fraction * 4800.0f64).round();
            let f = cycles / 4800.0 * RATE;
            let input: Vec<f64> = (0..14_400)
                .map(|n| (TAU * f * n as f64 / RATE).sin())
                .collect();
            let over = Oversampler::new(8).unwrap();
            let output = over.process(&input, |_| {}).unwrap();
            let gain = 20.0 * (rms(&output[4800..9600]) * 2f64.sqrt()).log10();
            println!("{fraction:.4} of the rate: {gain:e} dB");
            assert!(gain.abs() < decibels, "{fraction}: {gain} dB");
        }
    }

    #[test]
    fn a_stage_sees_the_tone_itself_and_no_images() {
        let f = 15_000.0;
        let input: Vec<f64> = (0..9600)
            .map(|n| (TAU * f * n as f64 / RATE).sin())
            .collect();
        for factor in [2, 8] {
            let mut seen = Vec::new();
            let over = Oversampler::new(factor).unwrap();
            over.process(&input, |block| seen.extend_from_slice(block))
                .unwrap();
            let start = (BLOCK / 2 + 4000) * factor;
            let error: Vec<f64> = (start..start + 1000 * factor)
                .map(|n| {
                    let frame = n as f64 / factor as f64 - (BLOCK / 2) as f64;
                    seen[n] - (TAU * f * frame / RATE).sin()
                })
                .collect();
            let residual = 20.0 * (rms(&error) * 2f64.sqrt()).log10();
            println!("x{factor}: images {residual:.1} dB");
            assert!(residual < -150.0, "x{factor}: {residual} dB");
        }
    }

    #[test]
    fn what_a_stage_makes_above_half_the_rate_does_not_come_down() {
        let over = Oversampler::new(8).unwrap();
        for f in [25_000.0, 28_000.0, 47_000.0, 100_000.0, 180_000.0] {
            let mut n = 0;
            let output = over
                .process(&[0.0; 9600], |block| {
                    for x in block {
                        *x = (TAU * f * f64::from(n) / (8.0 * RATE)).sin();
                        n += 1;
                    }
                })
                .unwrap();
            let leak = 20.0 * (rms(&output[4800..6800]) * 2f64.sqrt()).log10();
            println!("{f} Hz: {leak:.1} dB");
            assert!(leak < -150.0, "{f} Hz: {leak} dB");
        }
    }

    #[test]
    fn the_delay_is_zero() {
        let f = 1000.0;
        let input: Vec<f64> = (0..14_400)
            .map(|n| (TAU * f * n as f64 / RATE).sin())
            .collect();
        for factor in [1, 2, 4, 8] {
            let output = Oversampler::new(factor)
                .unwrap()
                .process(&input, |_| {})
                .unwrap();
            let delay = -phase(&output[4800..9600], f) / (TAU * f) * RATE;
            assert!(delay.abs() < 1e-6, "x{factor}: {delay} frames");
        }
    }

    #[test]
    fn an_impulse_stays_where_it_is() {
        let mut input = vec![0.0; 3000];
        input[1500] = 1.0;
        let output = Oversampler::new(8)
            .unwrap()
            .process(&input, |_| {})
            .unwrap();
        let peak = (0..3000).max_by(|&a, &b| output[a].total_cmp(&output[b]));
        assert_eq!(peak, Some(1500));
        for d in 1..100 {
            assert!((output[1500 - d] - output[1500 + d]).abs() < 1e-12);
        }
    }

    #[test]
    fn a_stage_sees_the_same_blocks_however_the_input_is_cut() {
        let input = multitone(5000);
        let run = |piece: usize, factor: usize| {
            let mut memory = 0.0;
            let mut stage = |up: &[f64], lanes: &mut [Vec<f64>; 2]| {
                for (n, x) in up.iter().enumerate() {
                    memory = 0.99 * memory + 0.01 * x;
                    lanes[0][n] = (3.0 * x).tanh() + memory;
                    lanes[1][n] = memory;
                }
            };
            let mut output = [Vec::new(), Vec::new()];
            let mut stream = Oversampler::new(factor).unwrap().stream::<2>();
            for chunk in input.chunks(piece) {
                stream.push(chunk, &mut stage, &mut output).unwrap();
            }
            stream.finish(&mut stage, &mut output).unwrap();
            output
        };
        for factor in [1, 8] {
            let whole = run(5000, factor);
            assert_eq!(whole[0].len(), 5000);
            for piece in [1, 7, 1023, 1024, 1025, 4999] {
                assert_eq!(run(piece, factor), whole, "pieces of {piece}, x{factor}");
            }
        }
    }

    #[test]
    fn lanes_are_what_each_would_be_alone() {
        let input = multitone(3000);
        let over = Oversampler::new(4).unwrap();
        let three = over
            .process_lanes::<3>(&input, |up, lanes| {
                for (k, lane) in lanes.iter_mut().enumerate() {
                    for (y, x) in lane.iter_mut().zip(up) {
                        *y = (x * (k + 1) as f64).tanh();
                    }
                }
            })
            .unwrap();
        for (k, lane) in three.iter().enumerate() {
            let alone = over
                .process(&input, |block| {
                    block
                        .iter_mut()
                        .for_each(|x| *x = (*x * (k + 1) as f64).tanh())
                })
                .unwrap();
            assert_eq!(*lane, alone);
        }
    }

    #[test]
    fn clips_of_any_length_keep_it() {
        for factor in [1, 2, 4, 8] {
            for frames in [0, 1, 2, 1000, 1023, 1024, 1025, 2048, 3000] {
                let input = vec![0.25; frames];
                let over = Oversampler::new(factor).unwrap();
                let output = over.process(&input, |_| {}).unwrap();
                assert_eq!(output.len(), frames, "x{factor}");
                assert!(output.iter().all(|x| x.is_finite()));
            }
        }
    }

    #[test]
    fn silence_is_what_the_stage_makes_of_it() {
        let over = Oversampler::new(8).unwrap();
        let silent = over.process(&[0.0; 2500], |_| {}).unwrap();
        assert!(silent.iter().all(|&x| x == 0.0));
        let constant = over
            .process(&[0.0; 2500], |block| {
                assert!(block.iter().all(|&x| x == 0.0));
                block.fill(3.25);
            })
            .unwrap();
        for x in constant {
            assert!((x - 3.25).abs() < 1e-9, "{x}");
        }
    }

    #[test]
    fn factor_one_hands_the_samples_on_untouched() {
        let input = multitone(2500);
        let mut lengths = Vec::new();
        let output = Oversampler::new(1)
            .unwrap()
            .process(&input, |block| lengths.push(block.len()))
            .unwrap();
        assert_eq!(output, input);
        assert_eq!(lengths, [1024, 1024, 452]);
    }

    #[test]
    fn what_is_not_finite_comes_back_as_an_error() {
        for factor in [1, 8] {
            let over = Oversampler::new(factor).unwrap();
            for bad in [f64::NAN, f64::INFINITY, -1e300] {
                let mut input = vec![0.0; 3000];
                input[2100] = bad;
                let fault = over.process(&input, |_| {}).unwrap_err();
                assert!(matches!(fault, ResampleFault::Input { frame: 2100, .. }));

                let mut count = 0;
                let fault = over
                    .process_lanes::<2>(&[0.0; 3000], |up, lanes| {
                        lanes[0].fill(0.0);
                        for (y, _) in lanes[1].iter_mut().zip(up) {
                            *y = if count == 2000 * factor { bad } else { 0.0 };
                            count += 1;
                        }
                    })
                    .unwrap_err();
                let expected = if factor == 1 { 2000 } else { 2000 - 512 };
                assert!(
                    matches!(fault, ResampleFault::Stage { lane: 1, frame, .. } if frame == expected),
                    "{fault}"
                );
            }
        }
    }

    #[test]
    fn factors_other_than_powers_of_two_are_refused() {
        for factor in [0, 3, 6, 128] {
            assert_eq!(Oversampler::new(factor), Err(ResampleFault::Factor(factor)));
        }
    }
}
