//! A design and a catalog become a solved amplifier.

pub mod amplifier;
pub mod iron;
pub mod loudspeaker;
pub mod operating_point;
pub mod ratings;
pub mod resolve;
pub mod supply;
pub mod surface;
pub mod transfer;
pub mod wiring;
