//! Tube laws, ratings, catalog.

mod device;

pub use device::{Currents, Device};
