//! Numerics that the linear algebra crate lacks.

pub mod fft;
pub mod root;
pub mod table;
pub mod window;
