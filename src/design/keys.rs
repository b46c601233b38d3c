//! What may stand in a design file: the one table that checks files and explains them.

mod table;

use crate::units::Unit;

/// One key of the design file.
#[derive(Clone, Debug, PartialEq)]
pub struct Key {
    /// Dotted path; `*` stands for the name of a rail, a stage or an input element.
    pub path: &'static str,
    pub kind: Kind,
    pub need: Need,
    /// What holds when the key is absent, as it would be written.
    pub default: Option<&'static str>,
    /// Lowest and highest value, both allowed, in the base unit; of each entry where the key holds a list.
    pub range: Option<(f64, f64)>,
    /// One line on what it is.
    pub help: &'static str,
    /// A valid value as it would be written, without quotes.
    pub example: &'static str,
}

/// What kind of value a key holds.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Kind {
    /// `[path]`
    Table,
    /// `[[path]]`, once for each.
    Tables,
    /// Free text.
    Text,
    /// A name: a letter, then letters, digits, `-` and `_`.
    Name,
    /// One of these words.
    Word(&'static [&'static str]),
    /// `true` or `false`.
    Flag,
    /// A whole number.
    Count,
    /// Component notation as text, or a bare number in the base unit.
    Quantity(Unit),
    /// A list of such values.
    Quantities(Unit),
}

/// Whether a key must be given.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Need {
    Required,
    Optional,
    /// Depends on other keys, in words.
    Depends(&'static str),
}

/// Every key, in the order of a file.
pub fn keys() -> &'static [Key] {
    table::KEYS
}

/// The key of this path, where names of rails, stages and elements match `*`.
pub fn key(path: &str) -> Option<&'static Key> {
    keys().iter().find(|key| matches(key.path, path))
}

/// Keys whose path begins with `path`, itself included; all of them for an empty path.
pub fn keys_under(path: &str) -> Vec<&'static Key> {
    let wanted = path.split('.').count();
    keys()
        .iter()
        .filter(|key| {
            let depth = key.path.split('.').count();
            path.is_empty() || (depth >= wanted && matches(&first_segments(key.path, wanted), path))
        })
        .collect()
}

/// Names of the keys that may stand directly in the table `pattern` (empty: at the top).
pub(super) fn names_in(pattern: &str) -> impl Iterator<Item = &'static str> {
    keys().iter().filter_map(move |key| {
        let name = match pattern {
            "" => key.path,
            _ => key.path.strip_prefix(pattern)?.strip_prefix('.')?,
        };
        (!name.contains('.') && name != "*").then_some(name)
    })
}

/// Why the key or word of this path is refused although it exists in real amplifiers.
pub(super) fn not_supported(pattern: &str, word: &str) -> Option<&'static str> {
    table::NOT_SUPPORTED
        .iter()
        .find(|(place, words, _)| (place.is_empty() || *place == pattern) && words.contains(&word))
        .map(|(_, _, sentence)| *sentence)
}

fn matches(pattern: &str, path: &str) -> bool {
    let mut given = path.split('.');
    pattern.split('.').all(|due| {
        given
            .next()
            .is_some_and(|segment| due == "*" || segment == due)
    }) && given.next().is_none()
}

fn first_segments(path: &str, count: usize) -> String {
    path.split('.').take(count).collect::<Vec<_>>().join(".")
}

impl Key {
    /// The last segment: the key as it stands in its table.
    pub fn name(&self) -> &'static str {
        self.path.rsplit('.').next().unwrap_or(self.path)
    }

    /// The range in words, with units: `1 Ω to 100 kΩ`.
    pub fn range_text(&self) -> Option<String> {
        let (low, high) = self.range?;
        let unit = match self.kind {
            Kind::Quantity(unit) | Kind::Quantities(unit) => unit,
            _ => Unit::Plain,
        };
        Some(format!("{} to {}", unit.format(low), unit.format(high)))
    }

    /// What the key holds, in words: `a resistance`, `one of series, shunt, divider`.
    pub fn kind_text(&self) -> String {
        match self.kind {
            Kind::Table => "a table".to_owned(),
            Kind::Tables => "tables, one for each".to_owned(),
            Kind::Text => "a text".to_owned(),
            Kind::Name => "a name".to_owned(),
            Kind::Word(words) => format!("one of {}", words.join(", ")),
            Kind::Flag => "true or false".to_owned(),
            Kind::Count => "a whole number".to_owned(),
            Kind::Quantity(unit) => unit.noun().to_owned(),
            Kind::Quantities(unit) => format!("a list, each {}", unit.noun()),
        }
    }

    /// The example as a line of a design file.
    pub fn example_line(&self) -> String {
        let name = self.name();
        match self.kind {
            Kind::Table => format!("[{}]", self.path.replace(".*", "")),
            Kind::Tables => format!("[[{}]]", self.path.replace(".*", "")),
            Kind::Text | Kind::Name | Kind::Word(_) | Kind::Quantity(_) => {
                match self.example.parse::<f64>() {
                    Ok(_) if matches!(self.kind, Kind::Quantity(_)) => {
                        format!("{name} = {}", self.example)
                    }
                    _ => format!("{name} = \"{}\"", self.example),
                }
            }
            Kind::Flag | Kind::Count | Kind::Quantities(_) => format!("{name} = {}", self.example),
        }
    }
}
