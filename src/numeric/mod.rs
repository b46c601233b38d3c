//! Numerics that the linear algebra crate lacks.

pub mod fft;
pub mod table;
