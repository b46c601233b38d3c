//! Signals in, figures out. This layer knows neither circuits nor the renderer.
//!
//! | module | figures | definitions |
//! | --- | --- | --- |
//! | [`harmonics`] | harmonics, phases, THD and its kin | IEC 60268-3, AES17 in kind |
//! | [`spectrum`] | lines of a long tone; aliases | |
//! | [`intermodulation`] | difference tones of two tones | SMPTE RP 120, the twin-tone method |
//! | [`loudness`] | integrated loudness, true peak | ITU-R BS.1770-5, EBU R 128 |
//! | [`envelope`] | peak and RMS; envelopes; recovery | |
//! | [`crossing`] | level at which a figure passes a mark | |
//!
//! Signals are slices of samples in volts (for loudness: re full scale) beside their rate in hertz.
//! A figure that does not exist is `None` or an error that says why, never a number.

pub mod crossing;
pub mod envelope;
mod fourier_basis;
pub mod harmonics;
pub mod intermodulation;
pub mod loudness;
pub mod spectrum;
