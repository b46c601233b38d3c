//! Faults and places gathered on the way through a file.

use super::places::Places;
use crate::diagnostic::{Code, Diagnostic, Place};
use std::cell::RefCell;

/// Most faults that are told: chosen, more than anybody reads, so that the time for a file of nothing but faults stays short.
const MOST_FAULTS: usize = 500;

/// Faults and places gathered on the way through a file.
#[derive(Default)]
pub(super) struct Findings {
    faults: RefCell<Vec<Diagnostic>>,
    places: RefCell<Places>,
}

impl Findings {
    pub fn fault(
        &self,
        code: Code,
        path: &str,
        place: Place,
        message: impl Into<String>,
        hint: Option<String>,
    ) {
        let fault = Diagnostic {
            code,
            path: path.to_owned(),
            place,
            message: message.into(),
            hint,
        };
        let mut faults = self.faults.borrow_mut();
        // A value that is read twice has one fault.
        if faults.len() < MOST_FAULTS && !faults.contains(&fault) {
            faults.push(fault);
        }
    }

    /// The faults, if any, else the places.
    pub fn close(self) -> Result<Places, Vec<Diagnostic>> {
        let faults = self.faults.into_inner();
        if faults.is_empty() {
            Ok(self.places.into_inner())
        } else {
            Err(faults)
        }
    }

    /// Notes where `path` stands.
    pub fn stands(&self, path: &str, place: &Place) {
        self.places.borrow_mut().insert(path, place);
    }

    /// True when no fault was found at `path`.
    pub fn is_sound(&self, path: &str) -> bool {
        !self.faults.borrow().iter().any(|fault| fault.path == path)
    }

    /// True when no fault was found at `path` or anything under it.
    pub fn is_sound_throughout(&self, path: &str) -> bool {
        let below = format!("{path}.");
        !self
            .faults
            .borrow()
            .iter()
            .any(|fault| fault.path == path || fault.path.starts_with(&below))
    }
}
