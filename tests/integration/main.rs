//! One file for each kind of evidence.

mod published_tubes;
mod broken_wavs;
mod demo_audio;
