//! Test signals: tones, bursts, and a synthetic guitar.

mod guitar;
mod practice;
mod random;
mod tone;

pub use guitar::{Guitar, GuitarString, Pickup, Pluck};
pub use practice::{
    DEFAULT_DI, DEMO_FULL_SCALE_VOLTS, DEMO_RATE, damped_bursts, open_chords, practice_phrase,
    rising_notes, slow_arpeggio,
};
pub use random::SplitMix64;
pub use tone::{Bursts, coherent_bin, coherent_tone, tone, two_tone};

/// One channel of samples.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Signal {
    /// In the unit of whoever made it; volts at the jack unless said otherwise.
    pub samples: Vec<f64>,
    /// Sample rate, in hertz.
    pub rate: f64,
}

impl Signal {
    /// Length, in seconds.
    pub fn duration_s(&self) -> f64 {
        self.samples.len() as f64 / self.rate
    }

    /// Largest magnitude; 0 without samples.
    pub fn peak(&self) -> f64 {
        self.samples.iter().fold(0.0, |m, x| x.abs().max(m))
    }

    /// Scales so that the largest magnitude becomes `peak`. Silence stays silence.
    pub fn scale_to_peak(&mut self, peak: f64) {
        let found = self.peak();
        if found > 0.0 {
            let scale = peak / found;
            self.samples.iter_mut().for_each(|x| *x *= scale);
        }
    }
}
