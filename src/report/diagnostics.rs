//! Faults shown in the text that holds them: file, line, a pointer under the place, and what would do.

use std::ops::Range;

use annotate_snippets::renderer::DecorStyle;
use annotate_snippets::{AnnotationKind, Group, Level, Origin, Renderer, Snippet};

use super::json::Faults;
use super::terminal::Page;
use crate::diagnostic::{Diagnostic, Place};

/// All faults of all texts, in order, for a terminal. Ends with a line feed unless there are none.
pub fn faults_text(faults: &[Faults], page: &Page) -> String {
    let renderer = if page.paint.is_on() {
        Renderer::styled()
    } else {
        Renderer::plain()
    };
    let renderer = renderer
        .decor_style(DecorStyle::Unicode)
        .term_width(page.width);
    let mut out = String::new();
    for of in faults {
        for diagnostic in of.diagnostics {
            out += &renderer.render(&[group(of, diagnostic)]);
            out += "\n\n";
        }
    }
    out.truncate(out.trim_end().len());
    if !out.is_empty() {
        out.push('\n');
    }
    out
}

fn group<'a>(of: &Faults<'a>, diagnostic: &'a Diagnostic) -> Group<'a> {
    let title = Level::ERROR
        .primary_title(&diagnostic.message)
        .id(diagnostic.code.word());
    let group = match (&diagnostic.place, of.text) {
        (Place::Text(range), Some(text)) => title.element(
            Snippet::source(text)
                .path(of.name)
                .annotation(AnnotationKind::Primary.span(within(text, range))),
        ),
        (Place::Override(text), _) => title.element(
            Snippet::source(text)
                .path("--set")
                .annotation(AnnotationKind::Primary.span(0..text.len())),
        ),
        (Place::Whole | Place::Text(_), _) => title.element(Origin::path(of.name)),
    };
    match &diagnostic.hint {
        Some(hint) => group.element(Level::HELP.message(hint)),
        None => group,
    }
}

/// The same range inside the text, on the borders of characters.
fn within(text: &str, range: &Range<usize>) -> Range<usize> {
    let border = |mut at: usize| {
        at = at.min(text.len());
        while !text.is_char_boundary(at) {
            at -= 1;
        }
        at
    };
    let start = border(range.start);
    start..border(range.end).max(start)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::diagnostic::Code;
    use crate::report::terminal::Paint;

    fn fault(place: Place, hint: Option<&str>) -> Diagnostic {
        Diagnostic {
            code: Code::Syntax,
            path: "stage.first.cathode.resistor".into(),
            place,
            message: "`47n` is capacitance where a resistance is due".into(),
            hint: hint.map(Into::into),
        }
    }

    fn shown(text: &str, diagnostics: &[Diagnostic], paint: Paint) -> String {
        let faults = Faults {
            name: "amp.toml",
            text: Some(text),
            diagnostics,
        };
        faults_text(&[faults], &Page { width: 100, paint })
    }

    #[test]
    fn the_line_the_pointer_and_the_hint_are_there() {
        let text = "format = 1\nresistor = \"47n\"\n";
        let start = text.find("\"47n").unwrap();
        let faults = [fault(
            Place::Text(start..start + 5),
            Some("write ohms such as 1k5"),
        )];
        let out = shown(text, &faults, Paint::off());
        assert!(out.contains("syntax"), "{out}");
        assert!(out.contains("amp.toml:2:12"), "{out}");
        assert!(out.contains("resistor = \"47n\""), "{out}");
        assert!(out.contains("write ohms such as 1k5"), "{out}");
        let source = out.lines().position(|l| l.contains("47n\"")).unwrap();
        let pointer = out.lines().nth(source + 1).unwrap();
        let column = |line: &str, c: char| line.chars().position(|x| x == c);
        assert_eq!(
            column(pointer, '━').or(column(pointer, '^')),
            column(out.lines().nth(source).unwrap(), '"'),
            "{out}"
        );
        assert!(!out.contains('\u{1b}'));
        assert!(shown(text, &faults, Paint::on()).contains('\u{1b}'));
    }

    #[test]
    fn places_outside_a_file_are_named() {
        let out = shown(
            "x",
            &[
                fault(
                    Place::Override("stage.first.cathode.resistor=47n".into()),
                    None,
                ),
                fault(Place::Whole, None),
            ],
            Paint::off(),
        );
        assert!(out.contains("--set") && out.contains("stage.first.cathode.resistor=47n"));
        assert!(out.contains("amp.toml"));
        assert_eq!(out.matches("`47n` is capacitance").count(), 2);
    }

    #[test]
    fn odd_texts_and_ranges_do_no_harm() {
        for text in [
            "",
            "µµ\r\n\tx = 1\r\n",
            "no end of line",
            "\u{0}\u{1b}[31m",
            "日本語 = 1\n",
        ] {
            for start in 0..text.len() + 3 {
                for length in [0, 1, 2, 50] {
                    let out = shown(
                        text,
                        &[fault(Place::Text(start..start + length), None)],
                        Paint::off(),
                    );
                    assert!(out.contains("47n"));
                    assert!(!out.contains('\u{1b}'), "{out:?}");
                }
            }
        }
    }

    #[test]
    fn no_faults_are_no_text() {
        assert_eq!(shown("x", &[], Paint::off()), "");
    }
}
