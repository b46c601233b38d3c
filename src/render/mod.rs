//! The sample loop: a solved amplifier, one sample after the other.

mod cell;
mod kernel;
#[cfg(test)]
mod lane_tests;
mod lanes;
pub mod listening;
mod model;
mod network;
#[cfg(test)]
mod tests;

pub use cell::Observation;
pub use kernel::Kernel;
pub use model::{Fineness, Model, ModelFault, instantaneous};
