//! The demonstration clips: five short pieces for the synthetic guitar. Invented; no recording is in them.
//!
//! The scene is a practice room of a music school at 120 beats a minute. All clips are 48 kHz mono, and full scale stands for
//! 1 V peak at the jack. The seed sets the small unevennesses of a hand: a few milliseconds, a few percent of force and place.

use super::guitar::{Guitar, Pluck};
use super::{Signal, SplitMix64};
use std::f64::consts::PI;

/// The clip that a render takes when it is given none: `practice_phrase` in 16 bits, as `demo_audio/practice-phrase.wav`.
pub const DEFAULT_DI: &[u8] = include_bytes!("../../demo_audio/practice-phrase.wav");

/// Volts peak at the jack that full scale of every demonstration clip stands for.
pub const DEMO_FULL_SCALE_VOLTS: f64 = 1.0;

/// Sample rate of the clips, in hertz.
pub const DEMO_RATE: f64 = 48_000.0;

/// Where all unevenness comes from. Chosen.
const SEED: u64 = 20_261_201;

/// Sixteenth note at 120 beats a minute: eight a second.
const SIXTEENTH_S: f64 = 0.125;

/// Steps of [`rising_notes`].
const RISING_STEPS: u32 = 9;

/// A fretted chord: frets of strings 6 to 1.
type Chord = [Option<u32>; 6];
const E_MAJOR: Chord = [Some(0), Some(2), Some(2), Some(1), Some(0), Some(0)];
const A_MINOR: Chord = [None, Some(0), Some(2), Some(2), Some(1), Some(0)];
const D_MAJOR: Chord = [None, None, Some(0), Some(2), Some(3), Some(2)];
const G_MAJOR: Chord = [Some(3), Some(2), Some(0), Some(0), Some(0), Some(3)];
/// Root and fifth on the low strings.
const A_FIFTH: Chord = [None, Some(0), Some(2), Some(2), None, None];
const E_FIFTH: Chord = [Some(0), Some(2), Some(2), None, None, None];

/// One A, nine times, from 10 mV to 1 V peak in steps of 5 dB, each note plucked harder than the one before. 5.9 s.
pub fn rising_notes() -> Signal {
    let mut hand = Hand::new(1);
    let mut clip = silence(5.9);
    for step in 0..RISING_STEPS {
        let force = 0.1 + 0.9 * f64::from(step) / f64::from(RISING_STEPS - 1);
        let at = 0.05 + 0.65 * f64::from(step);
        let note = hand.pluck(at, 4, 7, force, 0.55);
        // A thousandth below 1 V, so that the last one does not touch full scale.
        let volts = 0.999 * 10f64.powf(-2.0 + f64::from(step) / 4.0);
        add(&mut clip, &[note], volts);
    }
    faded(clip)
}

/// Four open chords, strummed hard: G, D, A minor, E. Peak 0.9 V. 4.5 s.
pub fn open_chords() -> Signal {
    let mut hand = Hand::new(2);
    let mut clip = silence(4.5);
    let mut plucks = Vec::new();
    for (k, chord) in [G_MAJOR, D_MAJOR, A_MINOR, E_MAJOR].into_iter().enumerate() {
        let hold = if k == 3 { 2.0 } else { 0.95 };
        plucks.extend(hand.strum(0.05 + k as f64, chord, 0.9, hold));
    }
    add(&mut clip, &plucks, 0.9);
    faded(clip)
}

/// Damped fifths, sixteen in two seconds at 0.9 V peak, then one soft note at 60 mV: how fast does the amplifier come back? 3 s.
pub fn damped_bursts() -> Signal {
    let mut hand = Hand::new(3);
    let mut clip = silence(3.0);
    let bursts = hand.bursts(0.05, E_FIFTH, 16);
    add(&mut clip, &bursts, 0.9);
    let soft = hand.pluck(2.05, 2, 5, 0.25, 0.85);
    add(&mut clip, &[soft], 0.06);
    faded(clip)
}

/// A slow arpeggio of A minor, softly, every string left to ring. Peak 0.2 V. 4.5 s.
pub fn slow_arpeggio() -> Signal {
    let mut hand = Hand::new(4);
    let mut clip = silence(4.5);
    let plucks = hand.arpeggio(0.05, 0.5, 4.4);
    add(&mut clip, &plucks, 0.2);
    faded(clip)
}

/// All of it in four bars: an arpeggio (peak 0.15 V), four notes that grow (0.1 to 0.45 V), damped bursts (0.55 V) with a soft
/// note after them (60 mV), and two open chords (0.7 V). 8 s.
pub fn practice_phrase() -> Signal {
    let mut hand = Hand::new(5);
    let mut clip = silence(8.0);
    let bar = 16.0 * SIXTEENTH_S;
    let start = 0.02;

    let arpeggio = hand.arpeggio(start, 2.0 * SIXTEENTH_S, bar - start);
    add(&mut clip, &arpeggio, 0.15);

    for (k, (fret, volts)) in [(5, 0.1), (7, 0.17), (5, 0.28), (8, 0.45)]
        .into_iter()
        .enumerate()
    {
        let at = start + bar + 4.0 * SIXTEENTH_S * k as f64;
        let note = hand.pluck(at, 2, fret, 0.3 + 0.2 * k as f64, 0.42);
        add(&mut clip, &[note], volts);
    }

    let bursts = hand.bursts(start + 2.0 * bar, A_FIFTH, 11);
    add(&mut clip, &bursts, 0.55);
    let soft = hand.pluck(start + 2.75 * bar, 3, 2, 0.25, 0.45);
    add(&mut clip, &[soft], 0.06);

    let mut chords = hand.strum(start + 3.0 * bar, A_MINOR, 0.8, 0.72);
    chords.extend(hand.strum(start + 3.375 * bar, E_MAJOR, 0.85, 1.2));
    add(&mut clip, &chords, 0.7);
    faded(clip)
}

fn silence(seconds: f64) -> Signal {
    Signal {
        samples: vec![0.0; (seconds * DEMO_RATE).round() as usize],
        rate: DEMO_RATE,
    }
}

/// Adds what the guitar makes of `plucks`, scaled to `volts` peak.
fn add(clip: &mut Signal, plucks: &[Pluck], volts: f64) {
    let mut part = Guitar::practice().play(plucks, clip.rate, clip.samples.len());
    part.scale_to_peak(volts / DEMO_FULL_SCALE_VOLTS);
    for (sum, x) in clip.samples.iter_mut().zip(&part.samples) {
        *sum += x;
    }
}

/// Fades the last 50 ms out along a raised cosine.
fn faded(mut clip: Signal) -> Signal {
    let length = (0.05 * clip.rate).round() as usize;
    let start = clip.samples.len() - length;
    for (n, x) in clip.samples[start..].iter_mut().enumerate() {
        *x *= (1.0 + (PI * (n + 1) as f64 / length as f64).cos()) / 2.0;
    }
    clip
}

/// A hand that is never quite even.
struct Hand {
    random: SplitMix64,
}

impl Hand {
    /// Each clip has its own.
    fn new(clip: u64) -> Hand {
        Hand {
            random: SplitMix64::new(SEED + clip),
        }
    }

    fn pluck(&mut self, at_s: f64, string: usize, fret: u32, force: f64, hold_s: f64) -> Pluck {
        Pluck {
            at_s: at_s + self.random.between(-0.004, 0.004),
            string,
            fret,
            force: force * self.random.between(0.93, 1.07),
            position: self.random.between(0.14, 0.2),
            hold_s,
            muted: false,
        }
    }

    /// From the lowest string to the highest, 9 ms apart.
    fn strum(&mut self, at_s: f64, chord: Chord, force: f64, hold_s: f64) -> Vec<Pluck> {
        let fretted = chord
            .iter()
            .enumerate()
            .filter_map(|(k, f)| f.map(|f| (6 - k, f)));
        fretted
            .enumerate()
            .map(|(k, (string, fret))| {
                let later = 0.009 * k as f64;
                self.pluck(at_s + later, string, fret, force, hold_s - later)
            })
            .collect()
    }

    /// `count` damped strums, a sixteenth apart, the first of each four a little harder.
    fn bursts(&mut self, at_s: f64, chord: Chord, count: u32) -> Vec<Pluck> {
        (0..count)
            .flat_map(|k| {
                let force = if k % 4 == 0 { 1.0 } else { 0.85 };
                self.strum(at_s + SIXTEENTH_S * f64::from(k), chord, force, 0.09)
            })
            .map(|pluck| Pluck {
                muted: true,
                ..pluck
            })
            .collect()
    }

    /// A minor up and down, eight notes `step_s` apart, all stopped at `end_s` after the first.
    fn arpeggio(&mut self, at_s: f64, step_s: f64, end_s: f64) -> Vec<Pluck> {
        [
            (5, 0),
            (4, 2),
            (3, 2),
            (2, 1),
            (1, 0),
            (2, 1),
            (3, 2),
            (4, 2),
        ]
        .into_iter()
        .enumerate()
        .map(|(k, (string, fret))| {
            let later = step_s * k as f64;
            self.pluck(at_s + later, string, fret, 0.35, end_s - later)
        })
        .collect()
    }
}
