//! A synthetic electric guitar: every string a sum of decaying partials, heard through a pickup and a cable.
//!
//! A partial n of a string of sounding length L and fundamental f0 gives the pickup
//!
//! ```text
//! v_n(t) = F sin(n pi b) / n          an ideal pluck of force F at the distance b L from the bridge, as string velocity
//!        * sinc(n p / 2)              the width p L of the plectrum
//!        / sqrt(1 + (f_n / f_F)^2)    softer plucks are duller: f_F grows with F
//!        * sin(n pi d) sinc(n w / 2)  a pickup at d L from the bridge that averages over w L
//!        * sin(2 pi f_n t) exp(-s_n t)
//!
//! f_n = n f0 sqrt((1 + B n^2) / (1 + B))         stiffness
//! s_n = s(f_n),  s(f) = b1 + b3 f^2              losses, s = ln(1000) / T60
//! ```
//!
//! with sinc(x) = sin(pi x) / (pi x). Each partial is there twice, for motion towards the top and along it, the second a little
//! off tune and slower to decay; their sum beats as a string does. What comes out has the pickup's and the cable's resonance, and
//! is coupled without DC.
//!
//! Sources: pluck, pick and pickup positions, dynamic level: D. A. Jaffe, J. O. Smith, "Extensions of the Karplus-Strong
//! plucked-string algorithm", Computer Music J. 7(2), 1983, and J. O. Smith, *Physical Audio Signal Processing*; stiffness: H.
//! Fletcher, "Normal vibration frequencies of a stiff piano string", J. Acoust. Soc. Am. 36, 1964; losses: A. Chaigne, A.
//! Askenfelt, "Numerical simulations of piano strings", J. Acoust. Soc. Am. 95, 1994; neck and string losses: A. Pate, J.-L. Le
//! Carrou, B. Fabre, "Predicting the decay time of solid body electric guitar tones", J. Acoust. Soc. Am. 135, 2014. All from
//! memory. The figures in the tables are estimates for no instrument in particular.

use super::Signal;
use std::f64::consts::{PI, TAU};

/// ln(1000): nepers in the 60 dB of a T60.
const NEPERS_60_DB: f64 = 6.907_755_278_982_137;
/// Frequency that [`GuitarString::t60_high_s`] is given for.
const T60_HIGH_HZ: f64 = 4000.0;
/// Partials above are left out: the pickup has taken 20 dB from them, and the losses the rest.
const HIGHEST_PARTIAL_HZ: f64 = 14_000.0;
/// Width of the plectrum's tip over the scale length: 2 mm of 648 mm. Chosen.
const PLECTRUM_WIDTH: f64 = 2.0 / 648.0;
/// Corner of the dullness of a pluck of force 0, and what a force of 1 adds to it, in hertz. Chosen by ear and eye.
const DULL_CORNER_HZ: f64 = 1200.0;
const BRIGHT_CORNER_HZ: f64 = 5000.0;
/// The second direction of motion: share, decay rate over the first's, detuning in cents. Chosen.
const SECOND_MOTION: (f64, f64, f64) = (0.35, 0.6, 0.5);
/// T60 of a string that is stopped by hand. Chosen.
const STOPPED_T60_S: f64 = 0.06;
/// T60 under the heel of the hand at low frequencies, and the frequency at which it has halved. Chosen.
const MUTED_T60_S: f64 = 0.28;
const MUTED_HALF_HZ: f64 = 700.0;
/// Corner of the coupling between pickup and recording, in hertz. A plucked string starts displaced, so its velocity has a small
/// mean; what records it passes none. Chosen: below anything that sounds.
const COUPLING_HZ: f64 = 10.0;
/// A partial below this, a string's strongest being about 1, is not followed any further: -120 dB.
const INAUDIBLE: f64 = 1e-6;

/// One string, open.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct GuitarString {
    /// Fundamental, in hertz.
    pub open_hz: f64,
    /// Inharmonicity B.
    pub inharmonicity: f64,
    /// Time to fall by 60 dB at the fundamental, in seconds.
    pub t60_low_s: f64,
    /// The same at 4 kHz.
    pub t60_high_s: f64,
}

/// Pickup, cable and what they are loaded with.
///
/// A second-order low-pass: f_r = 1 / (2 pi sqrt(L C)), 1/Q = R sqrt(C/L) + sqrt(L/C) / R_load.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Pickup {
    /// Distance from the bridge over the open string's length.
    pub position: f64,
    /// Length of string it senses over the open string's length.
    pub aperture: f64,
    pub inductance_h: f64,
    pub coil_ohms: f64,
    /// Coil and cable.
    pub capacitance_f: f64,
    /// Pots, amplifier input and eddy losses, in parallel.
    pub load_ohms: f64,
}

impl Pickup {
    /// Resonance in hertz, and its Q.
    pub fn resonance(&self) -> (f64, f64) {
        let (l, c) = (self.inductance_h, self.capacitance_f);
        let damping = self.coil_ohms * (c / l).sqrt() + (l / c).sqrt() / self.load_ohms;
        (1.0 / (TAU * (l * c).sqrt()), 1.0 / damping)
    }
}

/// One pluck of one string.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Pluck {
    /// When, in seconds.
    pub at_s: f64,
    /// 1 (highest) to 6 (lowest), as players count.
    pub string: usize,
    pub fret: u32,
    /// 0 to 1; sets level and brightness.
    pub force: f64,
    /// Distance from the bridge over the open string's length.
    pub position: f64,
    /// When the string is stopped, in seconds after the pluck. A later pluck of the same string stops it too.
    pub hold_s: f64,
    /// Damped by the heel of the hand at the bridge.
    pub muted: bool,
}

/// Six strings and a pickup.
#[derive(Clone, Debug, PartialEq)]
pub struct Guitar {
    /// String 1 first.
    pub strings: [GuitarString; 6],
    pub pickup: Pickup,
}

impl Guitar {
    /// An invented instrument in standard tuning (A = 440 Hz, equal temperament), 648 mm scale, one single-coil pickup in the
    /// middle, 5 m of cable.
    ///
    /// Inharmonicity: B = pi^3 E d^4 / (64 T L^2) for usual plain and wound gauges. T60: within what is known of electric
    /// guitars, 8 to 15 s for a low string and 3 to 6 s for a high one (from memory). Pickup: 2.3 H and 5.8 kOhm, usual for a
    /// single coil; 110 pF and 5 m at 100 pF/m; 250 kOhm, 1 MOhm and 400 kOhm of eddy losses in parallel, the last chosen for a
    /// Q within the usual 1.5 to 2.5.
    pub fn practice() -> Guitar {
        let string = |semitones_from_a4: i32, inharmonicity, t60_low_s, t60_high_s| GuitarString {
            open_hz: 440.0 * (f64::from(semitones_from_a4) / 12.0).exp2(),
            inharmonicity,
            t60_low_s,
            t60_high_s,
        };
        Guitar {
            strings: [
                string(-5, 1.3e-5, 4.5, 1.1),
                string(-10, 4.0e-5, 5.5, 1.1),
                string(-14, 1.1e-4, 6.5, 1.0),
                string(-19, 3.3e-5, 8.0, 0.8),
                string(-24, 5.4e-5, 9.0, 0.75),
                string(-29, 7.6e-5, 10.0, 0.7),
            ],
            pickup: Pickup {
                position: 0.15,
                aperture: 18.0 / 648.0,
                inductance_h: 2.3,
                coil_ohms: 5800.0,
                capacitance_f: 110e-12 + 500e-12,
                load_ohms: 1.0 / (1.0 / 250e3 + 1.0 / 1e6 + 1.0 / 400e3),
            },
        }
    }

    /// What the cable carries, in no unit in particular: scale it with [`Signal::scale_to_peak`] to volts.
    ///
    /// # Panics
    /// When a pluck names a string other than 1 to 6, or lies beyond the end of the string.
    pub fn play(&self, plucks: &[Pluck], rate: f64, frames: usize) -> Signal {
        let mut samples = vec![0.0; frames];
        for pluck in plucks {
            assert!((1..=6).contains(&pluck.string), "strings are 1 to 6");
            let until_next = plucks
                .iter()
                .filter(|other| other.string == pluck.string && other.at_s > pluck.at_s)
                .map(|other| other.at_s - pluck.at_s)
                .fold(f64::INFINITY, f64::min);
            let hold_s = pluck.hold_s.min(until_next);
            self.pluck(pluck, hold_s, rate, &mut samples);
        }
        let (resonance_hz, q) = self.pickup.resonance();
        LowPass::new(resonance_hz, q, rate).run(&mut samples);
        couple(&mut samples, rate);
        Signal { samples, rate }
    }

    /// Adds the sound of one pluck.
    fn pluck(&self, pluck: &Pluck, hold_s: f64, rate: f64, samples: &mut [f64]) {
        let string = &self.strings[pluck.string - 1];
        // A fret shortens the string: all distances grow against its length, and B goes with 1 / L^2.
        let shortening = (f64::from(pluck.fret) / 12.0).exp2();
        let f0 = string.open_hz * shortening;
        let b = string.inharmonicity * shortening * shortening;
        let pick = pluck.position * shortening;
        let pickup = self.pickup.position * shortening;
        assert!(
            pick > 0.0 && pick < 1.0 && pickup < 1.0,
            "pick and pickup are between the bridge and the finger"
        );
        let corner = DULL_CORNER_HZ + BRIGHT_CORNER_HZ * pluck.force;
        let s_low = NEPERS_60_DB / string.t60_low_s;
        let s_high = NEPERS_60_DB / string.t60_high_s;
        let b3 = (s_high - s_low) / (T60_HIGH_HZ.powi(2) - string.open_hz.powi(2));
        let b1 = s_low - b3 * string.open_hz.powi(2);

        let start = (pluck.at_s * rate).round().max(0.0) as usize;
        let held = (hold_s * rate).min(samples.len() as f64).round() as usize;
        let (share, slower, cents) = SECOND_MOTION;
        for n in 1.. {
            let nf = f64::from(n);
            let f = nf * f0 * ((1.0 + b * nf * nf) / (1.0 + b)).sqrt();
            if f > HIGHEST_PARTIAL_HZ.min(0.45 * rate) {
                break;
            }
            let amplitude = pluck.force * (nf * PI * pick).sin() / nf
                * sinc(nf * PLECTRUM_WIDTH * shortening / 2.0)
                / (1.0 + (f / corner).powi(2)).sqrt()
                * (nf * PI * pickup).sin()
                * sinc(nf * self.pickup.aperture * shortening / 2.0);
            let losses = b1 + b3 * f * f;
            let muting = if pluck.muted {
                NEPERS_60_DB / MUTED_T60_S * (1.0 + (f / MUTED_HALF_HZ).powi(2))
            } else {
                0.0
            };
            let detuned = f * (cents / 1200.0).exp2();
            for (amplitude, f, losses) in [
                (amplitude * (1.0 - share), f, losses),
                (amplitude * share, detuned, losses * slower),
            ] {
                let partial = Partial {
                    amplitude,
                    frequency_hz: f,
                    decay: losses + muting,
                };
                partial.add(rate, held, samples.get_mut(start..).unwrap_or(&mut []));
            }
        }
    }
}

/// sin(pi x) / (pi x).
fn sinc(x: f64) -> f64 {
    if x == 0.0 {
        1.0
    } else {
        (PI * x).sin() / (PI * x)
    }
}

/// A decaying sine that starts at zero.
struct Partial {
    amplitude: f64,
    frequency_hz: f64,
    /// Nepers a second.
    decay: f64,
}

impl Partial {
    /// Adds it from the first of `samples` on, stopped by hand after `held` frames, as the turning of a complex number.
    fn add(&self, rate: f64, held: usize, samples: &mut [f64]) {
        let stopped = self.decay + NEPERS_60_DB / STOPPED_T60_S;
        let (free, rest) = samples.split_at_mut(held.min(samples.len()));
        let (mut re, mut im): (f64, f64) = (self.amplitude, 0.0);
        for (part, decay) in [(free, self.decay), (rest, stopped)] {
            let (sin, cos) = (TAU * self.frequency_hz / rate).sin_cos();
            let shrink = (-decay / rate).exp();
            let (c, s) = (shrink * cos, shrink * sin);
            for block in part.chunks_mut(256) {
                if re.abs() + im.abs() < INAUDIBLE {
                    return;
                }
                for sample in block {
                    *sample += im;
                    (re, im) = (re * c - im * s, re * s + im * c);
                }
            }
        }
    }
}

/// Second-order low-pass: bilinear transform of 1 / (1 + s/(Q w) + (s/w)^2), the resonance kept in place.
///
/// Coefficients: R. Bristow-Johnson, "Cookbook formulae for audio equalizer biquad filter coefficients" (from memory).
struct LowPass {
    b: [f64; 3],
    a: [f64; 2],
}

impl LowPass {
    fn new(corner_hz: f64, q: f64, rate: f64) -> LowPass {
        let (sin, cos) = (TAU * corner_hz / rate).sin_cos();
        let alpha = sin / (2.0 * q);
        let a0 = 1.0 + alpha;
        LowPass {
            b: [
                (1.0 - cos) / 2.0 / a0,
                (1.0 - cos) / a0,
                (1.0 - cos) / 2.0 / a0,
            ],
            a: [-2.0 * cos / a0, (1.0 - alpha) / a0],
        }
    }

    /// Filters in place, from rest.
    fn run(&self, samples: &mut [f64]) {
        let [b0, b1, b2] = self.b;
        let [a1, a2] = self.a;
        let (mut s1, mut s2) = (0.0, 0.0);
        for sample in samples {
            let x = *sample;
            let y = b0 * x + s1;
            s1 = b1 * x - a1 * y + s2;
            s2 = b2 * x - a2 * y;
            *sample = y;
        }
    }
}

/// First-order high-pass at [`COUPLING_HZ`], in place, from rest: y\[n\] = r y\[n-1\] + x\[n\] - x\[n-1\], r = exp(-w / rate).
fn couple(samples: &mut [f64], rate: f64) {
    let r = (-TAU * COUPLING_HZ / rate).exp();
    let (mut last_x, mut y) = (0.0, 0.0);
    for sample in samples {
        y = r * y + *sample - last_x;
        last_x = *sample;
        *sample = y;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const RATE: f64 = 48_000.0;

    fn one(string: usize, fret: u32) -> Pluck {
        Pluck {
            at_s: 0.1,
            string,
            fret,
            force: 0.5,
            position: 0.2,
            hold_s: 60.0,
            muted: false,
        }
    }

    /// Amplitude at `f` of the second from `from_s` on, Hann-windowed.
    fn level(signal: &Signal, f: f64, from_s: f64) -> f64 {
        let start = (from_s * RATE) as usize;
        let n = RATE as usize;
        let (mut re, mut im) = (0.0, 0.0);
        for k in 0..n {
            let w = 1.0 - (TAU * k as f64 / n as f64).cos();
            let x = signal.samples[start + k] * w;
            let angle = TAU * f * k as f64 / RATE;
            re += x * angle.cos();
            im += x * angle.sin();
        }
        2.0 * re.hypot(im) / n as f64
    }

    #[test]
    fn strings_sound_at_the_pitches_of_standard_tuning() {
        let guitar = Guitar::practice();
        // E4 B3 G3 D3 A2 E2 in equal temperament at A = 440 Hz.
        for (string, hz) in [329.628, 246.942, 195.998, 146.832, 110.0, 82.4069]
            .iter()
            .enumerate()
        {
            assert!((guitar.strings[string].open_hz - hz).abs() < 1e-3);
            for fret in [0, 5] {
                let f0 = hz * (f64::from(fret) / 12.0).exp2();
                let signal = guitar.play(&[one(string + 1, fret)], RATE, 2 * 48_000);
                let here = level(&signal, f0, 0.2);
                // A second of Hann window resolves 2 Hz; 3 % away there is nothing.
                assert!(here > 20.0 * level(&signal, f0 * 1.06, 0.2), "{string}");
                assert!(here > 20.0 * level(&signal, f0 / 1.06, 0.2), "{string}");
            }
        }
    }

    #[test]
    fn a_low_string_falls_at_the_rate_of_its_table() {
        let mut guitar = Guitar::practice();
        // With both motions alike there is one rate; the mix of two is slower than the first and faster than the second.
        guitar.strings[5].t60_low_s = 6.0;
        let signal = guitar.play(&[one(6, 0)], RATE, 5 * 48_000);
        let fall_db = 20.0 * (level(&signal, 82.4069, 0.5) / level(&signal, 82.4069, 3.5)).log10();
        let (_, slower, _) = SECOND_MOTION;
        assert!(
            fall_db < 60.0 / 6.0 * 3.0 && fall_db > 60.0 / 6.0 * 3.0 * slower,
            "{fall_db}"
        );
    }

    #[test]
    fn a_pick_at_a_node_leaves_that_partial_out() {
        let guitar = Guitar::practice();
        let at = |position: f64| {
            let signal = guitar.play(
                &[Pluck {
                    position,
                    ..one(5, 0)
                }],
                RATE,
                2 * 48_000,
            );
            level(&signal, 220.0, 0.2) / level(&signal, 110.0, 0.2)
        };
        assert!(at(0.5) < 0.01 * at(0.2));
    }

    #[test]
    fn nothing_sounds_before_a_pluck_and_stopped_strings_fall_silent() {
        let guitar = Guitar::practice();
        let pluck = Pluck {
            hold_s: 0.3,
            ..one(4, 2)
        };
        let signal = guitar.play(&[pluck], RATE, 48_000);
        assert!(signal.samples[..4800].iter().all(|&x| x == 0.0));
        let peak = |x: &[f64]| x.iter().fold(0.0f64, |m, v| m.max(v.abs()));
        assert!(peak(&signal.samples[4800..]) > 0.01);
        // 0.1 s at 60 dB in 0.06 s leaves nothing of the string; what is left is the coupling's own tail, e^-6.
        let rest = peak(&signal.samples[24_000..]) / signal.peak();
        assert!(rest < 1e-4, "{rest:e}");
    }

    #[test]
    fn a_muted_string_is_short_and_dull() {
        let guitar = Guitar::practice();
        let muted = Pluck {
            muted: true,
            ..one(6, 0)
        };
        let signal = guitar.play(&[muted], RATE, 48_000);
        let open = guitar.play(&[one(6, 0)], RATE, 48_000);
        let rms = |s: &Signal| s.samples[12_000..18_000].iter().map(|x| x * x).sum::<f64>();
        assert!(rms(&signal) < 0.05 * rms(&open));
    }

    #[test]
    fn the_pickup_resonates_where_its_parts_say() {
        let (f, q) = Guitar::practice().pickup.resonance();
        // 2.3 H with 610 pF: 1 / (2 pi sqrt(1.403e-9)) = 4249 Hz.
        assert!(
            (f - 4249.0).abs() < 1.0 && (1.5..2.5).contains(&q),
            "{f} {q}"
        );
        let filter = LowPass::new(f, q, RATE);
        let mut impulse = vec![0.0; 4800];
        impulse[0] = 1.0;
        filter.run(&mut impulse);
        let gain = |hz: f64| {
            let (mut re, mut im) = (0.0, 0.0);
            for (n, x) in impulse.iter().enumerate() {
                re += x * (TAU * hz * n as f64 / RATE).cos();
                im += x * (TAU * hz * n as f64 / RATE).sin();
            }
            re.hypot(im)
        };
        assert!((gain(0.0) - 1.0).abs() < 1e-9);
        assert!((gain(f) / q - 1.0).abs() < 1e-9);
    }
}
