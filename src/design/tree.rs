//! A design file as a tree of values, each with its place; not yet checked against the table of keys.

use crate::diagnostic::{Code, Diagnostic, Place};
use std::ops::Range;
use toml::Spanned;
use toml::de::{DeTable, DeValue};

/// A value and where it stands.
#[derive(Clone, Debug)]
pub(super) struct Node {
    /// Of the value; of the header, for a table.
    pub place: Place,
    /// Of the key that holds it.
    pub key_place: Place,
    pub value: Value,
}

#[derive(Clone, Debug)]
pub(super) enum Value {
    Text(String),
    Number(f64),
    Flag(bool),
    /// Text of an override, whose type depends on the key.
    Bare(String),
    List(Vec<Node>),
    Table(Table),
    /// A date or time: nothing here is one.
    Moment,
}

/// Keys of a table, in the order of the file.
#[derive(Clone, Debug, Default)]
pub(super) struct Table {
    pub entries: Vec<(String, Node)>,
}

impl Table {
    pub fn get(&self, key: &str) -> Option<&Node> {
        self.entries
            .iter()
            .find(|(name, _)| name == key)
            .map(|(_, node)| node)
    }

    pub fn get_mut(&mut self, key: &str) -> Option<&mut Node> {
        self.entries
            .iter_mut()
            .find(|(name, _)| name == key)
            .map(|(_, node)| node)
    }
}

impl Node {
    pub fn table(&self) -> Option<&Table> {
        match &self.value {
            Value::Table(table) => Some(table),
            _ => None,
        }
    }

    /// The text of a text value.
    pub fn text(&self) -> Option<&str> {
        match &self.value {
            Value::Text(text) | Value::Bare(text) => Some(text),
            _ => None,
        }
    }

    /// The tables of a list of tables.
    pub fn list(&self) -> &[Node] {
        match &self.value {
            Value::List(nodes) => nodes,
            _ => &[],
        }
    }

    /// What stands there, with an article.
    pub fn noun(&self) -> &'static str {
        match &self.value {
            Value::Text(_) | Value::Bare(_) => "a text",
            Value::Number(_) => "a number",
            Value::Flag(_) => "true or false",
            Value::List(_) => "a list",
            Value::Table(_) => "a table",
            Value::Moment => "a date or time",
        }
    }
}

/// Parses `text` as TOML.
///
/// # Errors
/// Every syntax error that the parser could find its way past, in the order of the file.
pub(super) fn parse(text: &str) -> Result<Table, Vec<Diagnostic>> {
    let (document, errors) = DeTable::parse_recoverable(text);
    if errors.is_empty() {
        return Ok(table(text, document.get_ref()));
    }
    let mut faults: Vec<_> = errors
        .iter()
        .map(|error| Diagnostic {
            code: Code::Syntax,
            path: String::new(),
            place: error.span().map_or(Place::Whole, |span| within(text, span)),
            message: format!("not valid TOML: {}", error.message()),
            // The words of a library: only the hint depends on them.
            hint: (error.message().contains("must be quoted"))
                .then(|| "values with a unit stand in quotes, such as \"4K7\"".to_owned()),
        })
        .collect();
    faults.sort_by_key(|fault| match &fault.place {
        Place::Text(span) => span.start,
        _ => usize::MAX,
    });
    Err(faults)
}

fn table(text: &str, source: &DeTable<'_>) -> Table {
    let mut entries: Vec<_> = source
        .iter()
        .map(|(key, value)| {
            let node = node(text, key.span(), value);
            (key.span().start, key.get_ref().to_string(), node)
        })
        .collect();
    entries.sort_by_key(|(start, ..)| *start);
    Table {
        entries: entries
            .into_iter()
            .map(|(_, key, node)| (key, node))
            .collect(),
    }
}

fn node(text: &str, key: Range<usize>, source: &Spanned<DeValue<'_>>) -> Node {
    let value = match source.get_ref() {
        DeValue::String(string) => Value::Text(string.to_string()),
        // Whole numbers too large for 64 bits become what the nearest double is: every range refuses them.
        DeValue::Integer(integer) => Value::Number(
            i64::from_str_radix(integer.as_str(), integer.radix())
                .map_or(f64::MAX, |whole| whole as f64),
        ),
        DeValue::Float(float) => Value::Number(float.as_str().parse().unwrap_or(f64::NAN)),
        DeValue::Boolean(flag) => Value::Flag(*flag),
        DeValue::Datetime(_) => Value::Moment,
        DeValue::Array(items) => Value::List(
            items
                .iter()
                .map(|item| node(text, item.span(), item))
                .collect(),
        ),
        DeValue::Table(inner) => Value::Table(table(text, inner)),
    };
    Node {
        place: within(text, source.span()),
        key_place: within(text, key),
        value,
    }
}

/// The span cut to the text and to whole characters, so that whoever shows it cannot fail.
fn within(text: &str, span: Range<usize>) -> Place {
    let start = floor_boundary(text, span.start);
    let end = floor_boundary(text, span.end).max(start);
    Place::Text(start..end)
}

fn floor_boundary(text: &str, index: usize) -> usize {
    let mut index = index.min(text.len());
    while !text.is_char_boundary(index) {
        index -= 1;
    }
    index
}
