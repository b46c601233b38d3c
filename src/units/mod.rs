//! Quantities people write, as types that forbid mixing them up.

pub mod notation;
mod quantity;

pub use quantity::{Amperes, Farads, Henries, Hertz, Ohms, Volts, VoltsPeak, VoltsRms, Watts};
