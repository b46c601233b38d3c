//! An amplifier under test tones: periodic steady state, and the figures that stand on it.

pub mod figures;
pub mod steady;
