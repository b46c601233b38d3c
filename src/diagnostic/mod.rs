//! Code, place, hint; many at once.

mod code;
mod nearest;

pub use code::Code;
pub use nearest::nearest;

use std::fmt;

/// Where in a text, or where else, a fault stands.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Place {
    /// Byte range in the file's text.
    Text(std::ops::Range<usize>),
    /// The n-th `--set`, with its text.
    Override(String),
    /// Nowhere in particular.
    Whole,
}

/// One fault or warning, for the author of a design, a tube file or a sound file.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Diagnostic {
    pub code: Code,
    /// Dotted path in the file, or empty.
    pub path: String,
    pub place: Place,
    /// The rule, the value found.
    pub message: String,
    /// What would be allowed, or the nearest valid word.
    pub hint: Option<String>,
}

impl fmt::Display for Code {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.word())
    }
}
