//! One file for each kind of evidence.

mod broken_wavs;
mod demo_audio;
mod published_tubes;
