//! Why a sound file cannot be used, for its author.

use crate::diagnostic::{Code, Diagnostic, Place};
use std::fmt;

/// One fault of a sound file: what was found, and what would do.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct WavFault {
    pub code: Code,
    /// What was found.
    pub message: String,
    /// What would do.
    pub hint: String,
}

impl WavFault {
    pub(super) fn new(code: Code, message: impl Into<String>, hint: impl Into<String>) -> WavFault {
        WavFault {
            code,
            message: message.into(),
            hint: hint.into(),
        }
    }
}

impl fmt::Display for WavFault {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}; {}", self.message, self.hint)
    }
}

impl std::error::Error for WavFault {}

impl From<WavFault> for Diagnostic {
    fn from(fault: WavFault) -> Diagnostic {
        Diagnostic {
            code: fault.code,
            path: String::new(),
            place: Place::Whole,
            message: fault.message,
            hint: Some(fault.hint),
        }
    }
}
