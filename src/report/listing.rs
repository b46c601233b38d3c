//! Rows of the plain lists, as a caller hands them over.

use crate::design::keys::{Key, Kind, Need};

/// One shipped design.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct DesignRow {
    /// What is typed to choose it.
    pub word: String,
    /// Its name as the file gives it.
    pub name: String,
    pub description: String,
    /// Taken when no design is named.
    pub is_default: bool,
}

/// One key of the design file, already in words.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct KeyRow {
    /// Dotted; `*` stands for the name of a rail, a stage or an input element.
    pub path: String,
    /// What kind of value, such as `a resistance` or `a text`.
    pub kind: String,
    /// Unit symbol, where it has one.
    pub unit: Option<String>,
    /// `required`, `optional`, or what it depends on.
    pub need: String,
    pub default: Option<String>,
    /// Such as `1 Ω to 100 kΩ`.
    pub range: Option<String>,
    /// Words allowed, where only some are.
    pub words: Vec<String>,
    pub help: String,
    /// As a line of the file.
    pub example: String,
}

impl From<&Key> for KeyRow {
    fn from(key: &Key) -> KeyRow {
        let (unit, words) = match key.kind {
            Kind::Quantity(unit) | Kind::Quantities(unit) => (Some(unit.symbol()), [].as_slice()),
            Kind::Word(words) => (None, words),
            _ => (None, [].as_slice()),
        };
        KeyRow {
            path: key.path.to_owned(),
            kind: key.kind_text(),
            unit: unit.filter(|u| !u.is_empty()).map(str::to_owned),
            need: match key.need {
                Need::Required => "required".to_owned(),
                Need::Optional => "optional".to_owned(),
                Need::Depends(on) => on.to_owned(),
            },
            default: key.default.filter(|d| !d.is_empty()).map(str::to_owned),
            range: key.range_text(),
            words: words.iter().map(|&w| w.to_owned()).collect(),
            help: key.help.to_owned(),
            example: key.example_line(),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_key_of_the_design_file_makes_a_row() {
        for key in crate::design::keys() {
            let row = KeyRow::from(key);
            assert_eq!(row.path, key.path);
            assert!(!row.kind.is_empty() && !row.need.is_empty() && !row.example.is_empty());
            assert_eq!(row.range.is_some(), key.range.is_some());
        }
        let row = KeyRow::from(crate::design::keys::key("load.resistance").unwrap());
        assert_eq!(row.unit.as_deref(), Some("Ω"));
    }
}
