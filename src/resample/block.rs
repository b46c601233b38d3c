//! One FFT resampler, one block in, one block out.

use rubato::audioadapter_buffers::direct::SequentialSlice;
use rubato::{Fft, FixedSync, Resampler, WindowFunction};

/// Largest magnitude let into a transform: one sample that is not finite, or a sum that overflows inside, makes the library
/// panic. Chosen: far above any voltage, and 2^20 of them still sum to a finite number.
pub(super) const LIMIT: f64 = 1e100;

/// Is `x` fit to be filtered? False for NaN too.
pub(super) fn is_fit(x: f64) -> bool {
    x.abs() <= LIMIT
}

/// A mono resampler from blocks of `frames_in` to blocks of `frames_out`, delaying by half a block.
pub(super) struct Block {
    fft: Fft<f64>,
    frames_in: usize,
    frames_out: usize,
}

impl Block {
    /// `ratio_in : ratio_out` in lowest terms, and the block's length on the input side, a multiple of `ratio_in`.
    pub(super) fn new(ratio_in: usize, ratio_out: usize, frames_in: usize) -> Block {
        assert!(
            ratio_in > 0 && frames_in > 0 && frames_in.is_multiple_of(ratio_in),
            "a block holds whole periods of the ratio"
        );
        let frames_out = frames_in / ratio_in * ratio_out;
        assert!(
            frames_in.is_multiple_of(2) && frames_out.is_multiple_of(2),
            "an odd block is delayed by half a frame more"
        );
        let fft = Fft::new_custom(
            ratio_in,
            ratio_out,
            frames_in,
            1,
            1,
            WindowFunction::BlackmanHarris2,
            FixedSync::Both,
        )
        .expect("positive rates and a positive block are all the library asks for");
        assert!(
            fft.fft_size_in() == frames_in && fft.output_delay() == frames_out / 2,
            "the library's block and delay are as computed"
        );
        Block {
            fft,
            frames_in,
            frames_out,
        }
    }

    pub(super) fn frames_in(&self) -> usize {
        self.frames_in
    }

    pub(super) fn frames_out(&self) -> usize {
        self.frames_out
    }

    /// Filters one block. Every sample of `input` must be [`is_fit`].
    pub(super) fn run(&mut self, input: &[f64], output: &mut [f64]) {
        assert_eq!(input.len(), self.frames_in, "one whole block in");
        assert_eq!(output.len(), self.frames_out, "one whole block out");
        let source = SequentialSlice::new(input, 1, self.frames_in).expect("the length is checked");
        let mut target =
            SequentialSlice::new_mut(output, 1, self.frames_out).expect("the length is checked");
        self.fft
            .process_into_buffer(&source, &mut target, None)
            .expect("block lengths are checked");
    }
}
