//! One table of a tube file: typed values by key, every fault noted, nothing unknown passed over.

use std::ops::{Range, RangeInclusive};

use toml::Spanned;
use toml::de::{DeTable, DeValue};

use super::entry::{Confidence, Origin};
use crate::diagnostic::{Code, Diagnostic, Place};

/// Reads one table. Faulty values are noted in `faults` and a stand-in is handed back: a file with faults is never used.
pub(super) struct Reader<'a, 'f, 'i> {
    table: Option<&'a DeTable<'i>>,
    span: Option<Range<usize>>,
    path: &'static str,
    asked: Vec<&'static str>,
    faults: &'f mut Vec<Diagnostic>,
}

impl<'a, 'f, 'i> Reader<'a, 'f, 'i> {
    /// The file's top table.
    pub fn top(table: &'a DeTable<'i>, faults: &'f mut Vec<Diagnostic>) -> Self {
        Reader {
            table: Some(table),
            span: None,
            path: "",
            asked: Vec::new(),
            faults,
        }
    }

    /// A required table under `key`; when it is missing its own keys are not missed again.
    pub fn table<'s>(&'s mut self, key: &'static str) -> Reader<'a, 's, 'i> {
        let found = self.required(key);
        let span = found.map(|v| v.span());
        let table = found.and_then(|v| {
            let table = v.get_ref().as_table();
            if table.is_none() {
                self.wrong_type(key, v, "a table");
            }
            table
        });
        Reader {
            table,
            span,
            path: key,
            asked: Vec::new(),
            faults: self.faults,
        }
    }

    /// True when the table has the key.
    pub fn has(&self, key: &str) -> bool {
        self.table.is_some_and(|t| t.contains_key(key))
    }

    /// A number that must be there.
    pub fn number(&mut self, key: &'static str, range: RangeInclusive<f64>) -> f64 {
        let start = *range.start();
        match self.required(key) {
            Some(value) => self.number_in(key, value, &range).unwrap_or(start),
            None => start,
        }
    }

    /// A number that may be absent.
    pub fn optional_number(
        &mut self,
        key: &'static str,
        range: RangeInclusive<f64>,
    ) -> Option<f64> {
        let value = self.ask(key)?;
        self.number_in(key, value, &range)
    }

    /// A pair `[low, high]` that must be there.
    pub fn pair(&mut self, key: &'static str, range: RangeInclusive<f64>) -> (f64, f64) {
        let stand_in = (*range.start(), *range.end());
        let Some(value) = self.required(key) else {
            return stand_in;
        };
        let Some([low, high]) = value.get_ref().as_array().and_then(|a| {
            let both: Vec<_> = a.iter().collect();
            <[_; 2]>::try_from(both).ok()
        }) else {
            self.wrong_type(key, value, "a pair [lowest, highest]");
            return stand_in;
        };
        let read = (
            self.number_in(key, low, &range),
            self.number_in(key, high, &range),
        );
        match read {
            (Some(low), Some(high)) if low <= high => (low, high),
            (Some(low), Some(high)) => {
                self.fault(
                    Code::TubeOutOfRange,
                    key,
                    value.span(),
                    format!(
                        "the pair runs from the lowest to the highest, found {low} before {high}"
                    ),
                    Some(format!("[{high}, {low}]")),
                );
                stand_in
            }
            _ => stand_in,
        }
    }

    /// A text that must be there and say something.
    pub fn text(&mut self, key: &'static str) -> String {
        let Some(value) = self.required(key) else {
            return String::new();
        };
        match self.text_of(key, value) {
            Some(text) if text.trim().is_empty() => {
                self.fault(
                    Code::TubeOutOfRange,
                    key,
                    value.span(),
                    "this text must not be empty".into(),
                    None,
                );
                String::new()
            }
            Some(text) => text,
            None => String::new(),
        }
    }

    /// A text that may be absent.
    pub fn optional_text(&mut self, key: &'static str) -> Option<String> {
        let value = self.ask(key)?;
        self.text_of(key, value)
    }

    /// One of `words`, by its index.
    pub fn word(&mut self, key: &'static str, words: &[&str]) -> Option<usize> {
        let value = self.required(key)?;
        let text = self.text_of(key, value)?;
        let found = words.iter().position(|w| *w == text);
        if found.is_none() {
            let list = words.join("\", \"");
            let hint = nearest(&text, words.iter().copied())
                .map(|w| format!("nearest: \"{w}\""))
                .or_else(|| Some(format!("for example \"{}\"", words[0])));
            self.fault(
                Code::TubeUnknownWord,
                key,
                value.span(),
                format!("must be one of \"{list}\", found \"{text}\""),
                hint,
            );
        }
        found
    }

    /// A list of texts that may be absent, with the place of each.
    pub fn texts(&mut self, key: &'static str) -> Vec<(String, Range<usize>)> {
        let Some(value) = self.ask(key) else {
            return Vec::new();
        };
        let Some(array) = value.get_ref().as_array() else {
            self.wrong_type(key, value, "a list of texts");
            return Vec::new();
        };
        array
            .iter()
            .filter_map(|v| Some((self.text_of(key, v)?, v.span())))
            .collect()
    }

    /// True or false; must be there.
    pub fn claim(&mut self, key: &'static str) -> bool {
        let Some(value) = self.required(key) else {
            return false;
        };
        let found = value.get_ref().as_bool();
        if found.is_none() {
            self.wrong_type(key, value, "true or false");
        }
        found.unwrap_or(false)
    }

    /// `source`, `confidence`, `from_memory`: the last things to ask of a group.
    pub fn origin(&mut self) -> Origin {
        let source = self.text("source");
        let words: Vec<_> = Confidence::ALL.iter().map(|c| c.words()).collect();
        let confidence = self
            .word("confidence", &words)
            .map_or(Confidence::Assumed, |i| Confidence::ALL[i]);
        let recalled = self.texts("from_memory");
        for (key, span) in &recalled {
            if !self.has(key) {
                let hint =
                    nearest(key, self.asked.iter().copied()).map(|w| format!("nearest key: `{w}`"));
                self.fault(
                    Code::TubeUnknownWord,
                    "from_memory",
                    span.clone(),
                    format!("names a key of this table, found \"{key}\""),
                    hint,
                );
            }
        }
        Origin {
            source,
            confidence,
            from_memory: recalled.into_iter().map(|(key, _)| key).collect(),
        }
    }

    /// Notes every key nobody asked for.
    pub fn finish(self) {
        let Some(table) = self.table else { return };
        for key in table.keys() {
            let word: &str = key.get_ref();
            if self.asked.contains(&word) {
                continue;
            }
            let hint = nearest(word, self.asked.iter().copied()).map_or_else(
                || format!("keys here: {}", self.asked.join(", ")),
                |w| format!("nearest key: `{w}`"),
            );
            self.faults.push(Diagnostic {
                code: Code::TubeUnknownKey,
                path: join(self.path, word),
                place: Place::Text(key.span()),
                message: format!("a tube file has no key `{}` here", join(self.path, word)),
                hint: Some(hint),
            });
        }
    }

    /// Notes a fault of the value under `key`.
    pub fn fault(
        &mut self,
        code: Code,
        key: &str,
        span: Range<usize>,
        message: String,
        hint: Option<String>,
    ) {
        let path = join(self.path, key);
        self.faults.push(Diagnostic {
            code,
            message: format!("`{path}`: {message}"),
            path,
            place: Place::Text(span),
            hint,
        });
    }

    /// True while the file shows no fault.
    pub fn is_sound(&self) -> bool {
        self.faults.is_empty()
    }

    /// Where the value under `key` stands.
    pub fn span_of(&self, key: &str) -> Option<Range<usize>> {
        self.table?.get(key).map(|v| v.span())
    }

    fn ask(&mut self, key: &'static str) -> Option<&'a Spanned<DeValue<'i>>> {
        self.asked.push(key);
        self.table?.get(key)
    }

    fn required(&mut self, key: &'static str) -> Option<&'a Spanned<DeValue<'i>>> {
        let found = self.ask(key);
        if found.is_none() && self.table.is_some() {
            let path = join(self.path, key);
            let place = self.span.clone().map_or(Place::Whole, Place::Text);
            self.faults.push(Diagnostic {
                code: Code::TubeMissingKey,
                message: format!("`{path}` is missing"),
                path,
                place,
                hint: None,
            });
        }
        found
    }

    fn number_in(
        &mut self,
        key: &str,
        value: &Spanned<DeValue<'i>>,
        range: &RangeInclusive<f64>,
    ) -> Option<f64> {
        let Some(number) = number_of(value.get_ref()) else {
            self.wrong_type(key, value, "a number");
            return None;
        };
        if range.contains(&number) {
            return Some(number);
        }
        self.fault(
            Code::TubeOutOfRange,
            key,
            value.span(),
            format!(
                "must be a number from {} to {}, found {number}",
                range.start(),
                range.end()
            ),
            None,
        );
        None
    }

    fn text_of(&mut self, key: &str, value: &Spanned<DeValue<'i>>) -> Option<String> {
        let text = value.get_ref().as_str();
        if text.is_none() {
            self.wrong_type(key, value, "a text");
        }
        text.map(str::to_owned)
    }

    fn wrong_type(&mut self, key: &str, value: &Spanned<DeValue<'i>>, due: &str) {
        let found = value.get_ref().type_str();
        self.fault(
            Code::TubeWrongType,
            key,
            value.span(),
            format!("must be {due}, found {found}"),
            None,
        );
    }
}

/// The word most like `word`, if any is like it.
pub(super) fn nearest<'w>(word: &str, words: impl IntoIterator<Item = &'w str>) -> Option<&'w str> {
    // Chosen: below 0.7 the Jaro-Winkler similarity pairs words that no slip of the pen connects.
    words
        .into_iter()
        .map(|w| {
            (
                strsim::jaro_winkler(&word.to_lowercase(), &w.to_lowercase()),
                w,
            )
        })
        .filter(|(likeness, _)| *likeness > 0.7)
        .max_by(|a, b| a.0.total_cmp(&b.0))
        .map(|(_, w)| w)
}

fn join(path: &str, key: &str) -> String {
    if path.is_empty() {
        key.to_owned()
    } else {
        format!("{path}.{key}")
    }
}

fn number_of(value: &DeValue<'_>) -> Option<f64> {
    match value {
        DeValue::Float(f) => f.as_str().parse().ok(),
        DeValue::Integer(i) if i.radix() == 10 => i.as_str().parse().ok(),
        _ => None,
    }
}
