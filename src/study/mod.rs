//! A design at its gain settings.

pub mod result;
