//! Text in, a valid [`Design`] and its map of places out. Knows tubes by name only.

mod findings;
pub mod keys;
mod model;
mod overrides;
mod places;
mod read;
mod section;
mod template;
mod tree;

pub use keys::{Key, Kind, Need, keys};
pub use model::*;
pub use places::Places;
pub use read::{Reading, read};
pub use template::{shipped, template};
