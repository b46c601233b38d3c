//! Text in, a valid [`Design`] and its map of places out. Knows tubes by name only.

mod model;

pub use model::*;
