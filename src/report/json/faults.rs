//! Why a command could not be done.

use super::entry::{Nullable, objects};
use super::{SCHEMA, written};
use crate::diagnostic::{Diagnostic, Place};

/// The faults of one text.
#[derive(Clone, Copy, Debug)]
pub struct Faults<'a> {
    /// File name, or what else the user calls it.
    pub name: &'a str,
    /// Where places of [`Place::Text`] point into; `None` for what is no text, such as a sound file.
    pub text: Option<&'a str>,
    pub diagnostics: &'a [Diagnostic],
}

objects! {
    Failure {
        schema: u32,
        kind: &'static str,
        diagnostics: Vec<Fault>,
    }
    Fault {
        code: &'static str,
        path: String,
        /// File name, or the override that holds the fault.
        place: String,
        /// Both count from 1; the column in characters.
        line: Nullable<usize>,
        column: Nullable<usize>,
        message: String,
        hint: Nullable<String>,
    }
}

/// The document of a failure.
pub fn error_document(faults: &[Faults]) -> String {
    let fault = |of: &Faults, d: &Diagnostic| {
        let (place, at) = match &d.place {
            Place::Text(range) => (
                of.name.to_owned(),
                of.text
                    .map(|text| line_and_column(text, range.start))
                    .ok_or("not-a-text"),
            ),
            Place::Override(text) => (format!("--set {text}"), Err("not-in-a-file")),
            Place::Whole => (of.name.to_owned(), Err("whole-file")),
        };
        Fault {
            code: d.code.word(),
            path: d.path.clone(),
            place,
            line: at.map(|(line, _)| line),
            column: at.map(|(_, column)| column),
            message: d.message.clone(),
            hint: d.hint.clone().ok_or("none"),
        }
    };
    written(&Failure {
        schema: SCHEMA,
        kind: "error",
        diagnostics: faults
            .iter()
            .flat_map(|of| of.diagnostics.iter().map(move |d| fault(of, d)))
            .collect(),
    })
}

/// Line and column, from 1, of a byte; past the end it is the end.
fn line_and_column(text: &str, byte: usize) -> (usize, usize) {
    let before: String = text
        .char_indices()
        .take_while(|(at, c)| at + c.len_utf8() <= byte)
        .map(|(_, c)| c)
        .collect();
    let line_start = before.rfind('\n').map_or(0, |at| at + 1);
    (
        before.matches('\n').count() + 1,
        before[line_start..].chars().count() + 1,
    )
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::diagnostic::Code;

    #[test]
    fn lines_and_columns_count_characters_from_one() {
        let text = "a = 1\n# µµ\nb = 2\n";
        assert_eq!(line_and_column(text, 0), (1, 1));
        let b = text.find('b').unwrap();
        assert_eq!(line_and_column(text, b), (3, 1));
        let second_micro = text.find("µ").unwrap() + "µ".len();
        assert_eq!(line_and_column(text, second_micro), (2, 4));
        assert_eq!(line_and_column(text, 999), (4, 1));
        assert_eq!(line_and_column("", 0), (1, 1));
    }

    #[test]
    fn each_fault_says_where_it_stands() {
        let fault = |place, hint: Option<&str>| Diagnostic {
            code: Code::Syntax,
            path: "stage.first".into(),
            place,
            message: "no".into(),
            hint: hint.map(Into::into),
        };
        let design = [
            fault(Place::Text(6..7), Some("yes")),
            fault(Place::Override("a.b=c".into()), None),
        ];
        let sound = [fault(Place::Whole, None)];
        let text = error_document(&[
            Faults {
                name: "amp.toml",
                text: Some("a = 1\nb = 2\n"),
                diagnostics: &design,
            },
            Faults {
                name: "take.wav",
                text: None,
                diagnostics: &sound,
            },
        ]);
        let document: serde_json::Value = serde_json::from_str(&text).unwrap();
        assert_eq!(document["kind"], "error");
        let d = &document["diagnostics"];
        assert_eq!(
            (&d[0]["place"], &d[0]["line"], &d[0]["column"]),
            (&"amp.toml".into(), &2.into(), &1.into())
        );
        assert_eq!(d[0]["hint"], "yes");
        assert_eq!(d[1]["place"], "--set a.b=c");
        assert_eq!(d[1]["line_reason"], "not-in-a-file");
        assert_eq!(d[2]["place"], "take.wav");
        assert_eq!(d[2]["hint_reason"], "none");
    }
}
