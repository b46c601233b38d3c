//! A design and a catalog become a solved amplifier.

pub mod iron;
pub mod loudspeaker;
pub mod supply;
pub mod wiring;
