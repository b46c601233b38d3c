//! Width, colors, headings, tables, and the lines that nobody may miss.

use comfy_table::{
    CellAlignment, ColumnConstraint, ContentArrangement, ContentLineStyle, LineStyle, Table,
    TableStyle,
};

use crate::diagnostic::Code;
use crate::report::phrase;
use crate::stage::ratings::RatingCheck;
use crate::study::result::Warning;

/// Colors, or none. Only warnings and exceeded ratings are colored.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Paint {
    is_on: bool,
}

impl Paint {
    pub fn on() -> Paint {
        Paint { is_on: true }
    }

    pub fn off() -> Paint {
        Paint { is_on: false }
    }

    pub fn is_on(self) -> bool {
        self.is_on
    }

    /// Bold red: a rating is exceeded.
    fn alarm(self, text: &str) -> String {
        self.wrap("1;31", text)
    }

    /// Yellow: a warning.
    fn warning(self, text: &str) -> String {
        self.wrap("33", text)
    }

    fn wrap(self, code: &str, text: &str) -> String {
        if self.is_on && !text.is_empty() {
            format!("\u{1b}[{code}m{text}\u{1b}[0m")
        } else {
            text.to_owned()
        }
    }
}

/// What the text is laid out for.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Page {
    /// In characters.
    pub width: usize,
    pub paint: Paint,
}

impl Default for Page {
    fn default() -> Page {
        Page {
            width: 100,
            paint: Paint::off(),
        }
    }
}

/// A rule under the header, nothing else.
const STYLE: TableStyle = TableStyle::new()
    .header_separator(LineStyle::none().fill('─').junction('─'))
    .header_lines(ContentLineStyle::none())
    .content_lines(ContentLineStyle::none());

/// A space at which no line breaks.
const GLUE: &str = "\u{a0}";

/// In a row of a table, it makes the row an alarm.
pub(super) const EXCEEDED: &str = "EXCEEDED";

impl Page {
    /// Lines of a table. One letter a column: flush left (`<`), flush right (`>`), or left and wrapped first (`~`).
    pub(super) fn table(&self, columns: &str, header: &[&str], rows: Vec<Vec<String>>) -> String {
        let header: Vec<String> = header.iter().map(|&h| h.to_owned()).collect();
        let lines =
            [true, false].map(|keep_whole| self.table_lines(columns, &header, &rows, keep_whole));
        let fits = |lines: &Vec<String>| lines.iter().all(|l| l.chars().count() <= self.width);
        let [whole, wrapped] = lines;
        let lines = if fits(&whole) { whole } else { wrapped };
        let mut out = String::new();
        for line in lines {
            if line.contains(EXCEEDED) {
                out += &self.paint.alarm(&line);
            } else {
                out += &line;
            }
            out.push('\n');
        }
        out
    }

    fn table_lines(
        &self,
        columns: &str,
        header: &[String],
        rows: &[Vec<String>],
        keep_whole: bool,
    ) -> Vec<String> {
        let mut table = Table::new();
        table
            .load_style(STYLE)
            .set_content_arrangement(ContentArrangement::Dynamic)
            .set_width(u16::try_from(self.width).unwrap_or(u16::MAX));
        if header.iter().any(|h| !h.is_empty()) {
            table.set_header(header);
        }
        // A number and its unit stay together.
        let glued = |(cell, side): (&String, char)| match side {
            '>' => cell.replace(' ', GLUE),
            _ => cell.clone(),
        };
        for row in rows {
            let cells: Vec<String> = row.iter().zip(columns.chars()).map(glued).collect();
            table.add_row(cells);
        }
        table.discover_columns();
        for (k, side) in columns.chars().enumerate() {
            let Some(column) = table.column_mut(k) else {
                break;
            };
            column.set_padding((0, 1));
            if side == '>' {
                column.set_cell_alignment(CellAlignment::Right);
            }
            if keep_whole && side != '~' {
                column.set_constraint(ColumnConstraint::ContentWidth);
            }
        }
        table
            .lines()
            .map(|l| l.replace(GLUE, " ").trim_end().to_owned())
            .collect()
    }

    /// A paragraph, its lines after the first set in by `indent`; a number and its unit stay together.
    pub(super) fn paragraph(&self, text: &str, indent: usize) -> String {
        let mut words: Vec<String> = Vec::new();
        for word in text.split_whitespace() {
            match words.last_mut() {
                Some(last) if last.ends_with(|c: char| c.is_ascii_digit()) && is_unit(word) => {
                    last.push(' ');
                    last.push_str(word);
                }
                _ => words.push(word.to_owned()),
            }
        }
        let mut out = String::new();
        let mut length = 0;
        for word in words {
            let size = word.chars().count();
            if length > indent && length + 1 + size > self.width.max(20) {
                out.push('\n');
                out += &" ".repeat(indent);
                length = indent;
            } else if length > 0 {
                out.push(' ');
                length += 1;
            }
            out += &word;
            length += size;
        }
        out.push('\n');
        out
    }

    /// The same with `less` characters on a line.
    pub(super) fn narrower(&self, less: usize) -> Page {
        Page {
            width: self.width.saturating_sub(less),
            ..*self
        }
    }

    /// Ratings exceeded, then warnings; nothing where there are none.
    pub(super) fn alerts(&self, ratings: &[RatingCheck], warnings: &[Warning]) -> String {
        let mut out = String::new();
        for check in ratings.iter().filter(|c| c.exceeded) {
            let line = format!("!! RATING {EXCEEDED}: {}", phrase::exceeded(check));
            for line in self.paragraph(&line, 3).lines() {
                out += &self.paint.alarm(line);
                out.push('\n');
            }
        }
        // An exceeded rating has been told above.
        let told = |w: &&Warning| w.code == Code::RatingExceeded && !out.is_empty();
        let rest: Vec<_> = warnings.iter().filter(|w| !told(w)).collect();
        for w in rest {
            let place = if w.place.is_empty() {
                String::new()
            } else {
                format!("{}: ", w.place)
            };
            let line = format!("! {place}{} [{}]", w.message, w.code);
            for line in self.paragraph(&line, 2).lines() {
                out += &self.paint.warning(line);
                out.push('\n');
            }
        }
        if !out.is_empty() {
            out.push('\n');
        }
        out
    }
}

/// A unit symbol, with prefix and punctuation or without.
fn is_unit(word: &str) -> bool {
    let symbol = word.trim_end_matches(|c: char| c.is_ascii_punctuation() && c != '%');
    let base = ["V", "A", "W", "Ω", "H", "F", "Hz", "dB", "%"];
    symbol.chars().count() <= 3 && base.iter().any(|unit| symbol.ends_with(unit))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::report::sample;

    #[test]
    fn tables_keep_to_the_width() {
        let words = "a few words that do not fit on one line of a narrow terminal".to_owned();
        for width in [40, 60, 100] {
            let page = Page {
                width,
                paint: Paint::off(),
            };
            let rows = vec![vec!["x".into(), words.clone(), "1.25".into()]];
            let out = page.table("<~>", &["name", "what", "V"], rows);
            assert!(out.lines().all(|l| l.chars().count() <= width), "{out}");
            assert!(out.contains("1.25"));
        }
    }

    #[test]
    fn paragraphs_break_at_the_width_and_hang() {
        let page = Page {
            width: 30,
            paint: Paint::off(),
        };
        let out = page.paragraph("one two three four five six seven eight nine ten", 4);
        assert_eq!(
            out,
            "one two three four five six\n    seven eight nine ten\n"
        );
    }

    #[test]
    fn numbers_keep_their_units() {
        let page = Page {
            width: 24,
            paint: Paint::off(),
        };
        let out = page.paragraph("the rail that stands at 250 V, and more", 0);
        assert_eq!(out, "the rail that stands at\n250 V, and more\n");
    }

    #[test]
    fn exceeded_ratings_stand_before_warnings() {
        let out = Page::default().alerts(&sample::ratings(), &[sample::warning()]);
        let lines: Vec<_> = out.lines().collect();
        assert!(
            lines[0]
                .starts_with("!! RATING EXCEEDED: power (EL84): screen dissipation 2.31 W of 2 W")
        );
        assert!(out.contains("di-level"));
        assert!(!out.contains("plate volts"), "{out}");
        assert_eq!(Page::default().alerts(&sample::ratings()[..2], &[]), "");
    }

    #[test]
    fn an_exceeded_rating_is_told_once() {
        let warning = Warning {
            code: Code::RatingExceeded,
            ..sample::warning()
        };
        let out = Page::default().alerts(&sample::ratings(), std::slice::from_ref(&warning));
        assert!(!out.contains("rating-exceeded"));
        let out = Page::default().alerts(&[], &[warning]);
        assert!(out.contains("rating-exceeded"));
    }

    #[test]
    fn colors_are_off_unless_asked_for() {
        let (ratings, warnings) = (sample::ratings(), [sample::warning()]);
        let page = Page::default();
        assert!(!page.alerts(&ratings, &warnings).contains('\u{1b}'));
        let colored = Page {
            paint: Paint::on(),
            ..page
        };
        assert!(colored.alerts(&ratings, &warnings).contains("\u{1b}[1;31m"));
    }
}
