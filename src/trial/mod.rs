//! An amplifier under test tones: periodic steady state, and the figures that stand on it.

pub mod alias;
pub mod figures;
pub mod level;
pub mod limits;
pub mod response;
pub mod steady;
pub mod tone;
