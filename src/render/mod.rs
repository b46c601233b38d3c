//! The sample loop: a solved amplifier, one sample after the other.

mod kernel;
pub mod listening;
mod model;
mod network;
#[cfg(test)]
mod tests;

pub use kernel::{Kernel, Observation};
pub use model::{Fineness, Model, ModelFault, instantaneous};
