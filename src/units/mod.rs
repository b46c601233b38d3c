//! Quantities people write, as types that forbid mixing them up.

mod engineering;
pub mod notation;
mod quantity;
mod unit;

pub use notation::NotationError;
pub use quantity::{Amperes, Farads, Henries, Hertz, Ohms, Volts, VoltsPeak, VoltsRms, Watts};
pub use unit::Unit;
