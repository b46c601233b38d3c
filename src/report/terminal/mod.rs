//! Plain text for a terminal: what must not be missed first, then tables.

mod bias;
mod curve;
mod listing;
mod page;
mod render;
mod tube;

pub use bias::bias_text;
pub use curve::curve_text;
pub use listing::{designs_text, keys_text};
pub use page::{Page, Paint};
pub use render::{WrittenSet, render_text};
pub use tube::{tube_text, tubes_text};
