//! Why a command ended before it was done.

use std::io;

use forehear::diagnostic::{Code, Diagnostic, Place};
use forehear::report::json::Faults;
use forehear::study::StudyFault;

/// Why a command ended early.
#[derive(Debug)]
pub enum Stop {
    Failed(Failure),
    Interrupted,
    /// Nobody reads standard output any more.
    PipeClosed,
}

impl From<Failure> for Stop {
    fn from(failure: Failure) -> Stop {
        Stop::Failed(failure)
    }
}

/// All that stood in the way, text by text.
#[derive(Debug, Default)]
pub struct Failure {
    texts: Vec<FaultyText>,
}

#[derive(Debug)]
struct FaultyText {
    name: String,
    text: Option<String>,
    diagnostics: Vec<Diagnostic>,
}

impl Failure {
    /// One fault of a thing as a whole: a file, a folder, an option.
    pub fn of(
        name: impl Into<String>,
        code: Code,
        message: String,
        hint: Option<String>,
    ) -> Failure {
        Failure::in_text(
            name,
            None,
            vec![Diagnostic {
                code,
                path: String::new(),
                place: Place::Whole,
                message,
                hint,
            }],
        )
    }

    /// The faults of one text, or of one file that is no text.
    pub fn in_text(
        name: impl Into<String>,
        text: Option<String>,
        diagnostics: Vec<Diagnostic>,
    ) -> Failure {
        Failure {
            texts: vec![FaultyText {
                name: name.into(),
                text,
                diagnostics,
            }],
        }
    }

    /// A circuit or a sound that came to no result.
    pub fn of_study(design: &str, fault: &StudyFault) -> Failure {
        Failure::of(design, Code::NotComputed, fault.to_string(), None)
    }

    /// Adds what another has found.
    pub fn join(&mut self, other: Failure) {
        self.texts.extend(other.texts);
    }

    pub fn is_empty(&self) -> bool {
        self.texts.iter().all(|t| t.diagnostics.is_empty())
    }

    /// The faults as reports take them.
    pub fn faults(&self) -> Vec<Faults<'_>> {
        self.texts
            .iter()
            .map(|t| Faults {
                name: &t.name,
                text: t.text.as_deref(),
                diagnostics: &t.diagnostics,
            })
            .collect()
    }
}

/// Both results, or what stood in the way of either.
pub fn both<A, B>(a: Result<A, Failure>, b: Result<B, Failure>) -> Result<(A, B), Failure> {
    match (a, b) {
        (Ok(a), Ok(b)) => Ok((a, b)),
        (Err(mut a), Err(b)) => {
            a.join(b);
            Err(a)
        }
        (Err(failure), Ok(_)) | (Ok(_), Err(failure)) => Err(failure),
    }
}

/// What the system says, without its number.
pub fn cause(error: &io::Error) -> String {
    let text = error.to_string();
    let words = text.split(" (os error").next().unwrap_or(&text);
    let mut letters = words.chars();
    match letters.next() {
        Some(first) => first.to_lowercase().chain(letters).collect(),
        None => "no cause given".to_owned(),
    }
}
