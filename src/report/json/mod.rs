//! One JSON document for each command.
//!
//! Every document has `schema` (an integer) and `kind`. Adding a key keeps the schema number; removing or
//! redefining one raises it, and `key_lists.rs` pins them all. A figure that does not exist is null and `<key>_reason` says why
//! in one kebab-case word; that key is present only then. Numbers are SI base units, peak or RMS as the key says.

mod curve;
mod entry;
mod faults;
#[cfg(test)]
mod key_lists;
mod listing;
mod point;
mod render;
mod tone;
mod tube;

use serde::Serialize;

pub use curve::curve_document;
pub use faults::{Faults, error_document};
pub use listing::{designs_document, keys_document};
pub use point::bias_document;
pub use render::render_document;
pub use tube::{tube_document, tubes_document};

/// Number of the documents' layout.
pub const SCHEMA: u32 = 1;

fn written(document: &impl Serialize) -> String {
    let mut text =
        serde_json::to_string_pretty(document).expect("keys are strings and numbers are finite");
    text.push('\n');
    text
}
