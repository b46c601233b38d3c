//! Numerics that the linear algebra crate lacks.

pub mod fft;
pub mod table;
pub mod root;
pub mod window;
