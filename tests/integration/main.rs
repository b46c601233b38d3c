//! One file for each kind of evidence.

mod broken_designs;
mod broken_wavs;
mod cli;
mod demo_audio;
mod golden;
mod laws;
mod layering;
mod measure_oracle;
mod oracles;
mod published_measures;
mod published_tubes;
mod report_bias;
mod shipped;
