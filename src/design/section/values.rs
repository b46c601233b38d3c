//! The values of a table, read under the kinds and ranges of the table of keys.

use super::super::keys::{self, Key, Kind, Need};
use super::super::tree::{Node, Value};
use super::{Section, unquoted};
use crate::diagnostic::{Code, Place, nearest};
use crate::units::notation::clipped;
use crate::units::{Unit, notation};

impl<'a> Section<'a> {
    /// A quantity in its base unit, if given.
    pub fn quantity(&self, key: &str) -> Option<f64> {
        let row = self.row(key);
        let Kind::Quantity(unit) = row.kind else {
            unreachable!("{} is a quantity in the table of keys", row.path)
        };
        let node = self.given_or_missing(key, row)?;
        Some(
            self.value(key, node, row, unit)
                .unwrap_or_else(|| example(row, unit)),
        )
    }

    /// A quantity that must be given here, or stands in the table of keys as default.
    pub fn due(&self, key: &str, why: Option<&str>) -> f64 {
        let row = self.row(key);
        let Kind::Quantity(unit) = row.kind else {
            unreachable!("{} is a quantity in the table of keys", row.path)
        };
        if let Some(value) = self.quantity(key) {
            return value;
        }
        if let Some(default) = row.default {
            return notation::parse(default, unit)
                .unwrap_or_else(|fault| unreachable!("{}: {fault}", row.path));
        }
        if row.need != Need::Required && self.is_present() {
            self.missing(key, why);
        }
        example(row, unit)
    }

    /// A list of quantities, or the default's.
    pub fn quantities(&self, key: &str) -> Option<Vec<f64>> {
        let row = self.row(key);
        let Kind::Quantities(unit) = row.kind else {
            unreachable!("{} is a list in the table of keys", row.path)
        };
        let node = match (self.node(key), row.default) {
            (Some(node), _) => node.clone(),
            (None, Some(default)) => bare_list(default, &Place::Whole)?,
            (None, None) => return None,
        };
        let list = match &node.value {
            Value::Bare(text) => bare_list(text, &node.place),
            Value::List(_) => Some(node.clone()),
            _ => None,
        };
        let Some(list) = list else {
            self.wrong_type(
                key,
                &node,
                row,
                &format!("write a list such as {}", row.example),
            );
            return Some(Vec::new());
        };
        if list.list().is_empty() {
            let hint = Some(format!("write at least one value, such as {}", row.example));
            self.fault(
                Code::OutOfRange,
                key,
                format!("`{key}` is an empty list"),
                hint,
            );
        }
        Some(
            list.list()
                .iter()
                .filter_map(|node| self.value(key, node, row, unit))
                .collect(),
        )
    }

    /// A whole number, or the default.
    pub fn count(&self, key: &str) -> u32 {
        let row = self.row(key);
        let default = row.default.unwrap_or(row.example).parse().unwrap_or(1);
        let Some(node) = self.given_or_missing(key, row) else {
            return default;
        };
        let number = match &node.value {
            Value::Number(number) => Some(*number),
            Value::Bare(text) => text.trim().parse::<u32>().ok().map(f64::from),
            _ => None,
        };
        match number {
            Some(number) if number.fract() == 0.0 && (0.0..=1e9).contains(&number) => {
                self.check_range(key, node, row, number);
                number as u32
            }
            _ => {
                self.wrong_type(key, node, row, &format!("write {}", row.example_line()));
                default
            }
        }
    }

    /// True or false, or the default.
    pub fn flag(&self, key: &str) -> bool {
        let row = self.row(key);
        let default = row.default == Some("true");
        let Some(node) = self.given_or_missing(key, row) else {
            return default;
        };
        match &node.value {
            Value::Flag(flag) => *flag,
            Value::Bare(text) if text == "true" || text == "false" => text == "true",
            _ => {
                self.wrong_type(key, node, row, "write true or false, without quotes");
                default
            }
        }
    }

    /// A text, or the default; empty where it is faulty or missing.
    pub fn text(&self, key: &str) -> String {
        let row = self.row(key);
        let Some(node) = self.given_or_missing(key, row) else {
            return row.default.unwrap_or("").to_owned();
        };
        let Some(text) = node.text() else {
            self.wrong_type(
                key,
                node,
                row,
                &format!("write a text in quotes, {}", row.example_line()),
            );
            return String::new();
        };
        if text.trim().is_empty() && row.default.is_none() {
            let hint = Some(format!("for example {}", row.example_line()));
            self.fault(
                Code::UnreadableValue,
                key,
                format!("`{key}` is empty"),
                hint,
            );
        }
        text.to_owned()
    }

    /// One of the key's words, if given or set by default; its first word where it is faulty.
    pub fn word(&self, key: &str) -> Option<&'static str> {
        let row = self.row(key);
        let Kind::Word(words) = row.kind else {
            unreachable!("{} is a word in the table of keys", row.path)
        };
        let Some(node) = self.given_or_missing(key, row) else {
            return row.default;
        };
        let Some(text) = node.text() else {
            self.wrong_type(
                key,
                node,
                row,
                &format!("write one of {}, in quotes", words.join(", ")),
            );
            return Some(words[0]);
        };
        if let Some(word) = words.iter().find(|word| **word == text) {
            return Some(word);
        }
        if let Some(why) = keys::not_supported(row.path, text) {
            let hint = Some(format!("`{key}` may be {}", words.join(", ")));
            self.fault(Code::NotSupported, key, format!("`{text}`: {why}"), hint);
        } else {
            let hint = match nearest(text, words.iter().copied()) {
                Some(word) => format!("did you mean `{word}`? `{key}` may be {}", words.join(", ")),
                None => format!("`{key}` may be {}", words.join(", ")),
            };
            let message = format!("`{}` is no word for `{key}`", clipped(text));
            self.fault(Code::UnknownWord, key, message, Some(hint));
        }
        Some(words[0])
    }

    /// Notes the faults of what stands under `keys`, where nothing else will read it.
    pub fn glance(&self, keys: &[&str]) {
        for key in keys.iter().filter(|key| self.is_given(key)) {
            match self.row(key).kind {
                Kind::Quantity(_) => drop(self.quantity(key)),
                Kind::Quantities(_) => drop(self.quantities(key)),
                Kind::Word(_) => drop(self.word(key)),
                Kind::Text | Kind::Name => drop(self.text(key)),
                Kind::Flag => drop(self.flag(key)),
                Kind::Count => drop(self.count(key)),
                Kind::Table | Kind::Tables => {}
            }
        }
    }

    /// True when `key` is given as nothing at all: 0, or 0 with a unit.
    pub fn is_zero(&self, key: &str) -> bool {
        match (self.node(key).map(|node| &node.value), self.row(key).kind) {
            (Some(Value::Number(number)), _) => *number == 0.0,
            (Some(Value::Text(text) | Value::Bare(text)), Kind::Quantity(unit)) => {
                notation::parse(text, unit) == Ok(0.0)
            }
            _ => false,
        }
    }

    fn given_or_missing(&self, key: &str, row: &Key) -> Option<&'a Node> {
        let node = self.node(key);
        // A table that is missing altogether was reported as such.
        if node.is_none() && row.need == Need::Required && self.is_present() {
            self.missing(key, None);
        }
        node
    }

    /// One value in the base unit, checked for unit and range.
    fn value(&self, key: &str, node: &Node, row: &Key, unit: Unit) -> Option<f64> {
        let number = match &node.value {
            Value::Number(number) => *number,
            Value::Text(text) | Value::Bare(text) => match notation::parse(text, unit) {
                Ok(number) => number,
                Err(fault) => {
                    let code = if fault.is_wrong_unit() {
                        Code::WrongUnit
                    } else {
                        Code::UnreadableValue
                    };
                    let message = format!("`{key}`: {fault}");
                    let path = self.path_of(key);
                    self.findings.fault(
                        code,
                        &path,
                        node.place.clone(),
                        message,
                        Some(fault.hint()),
                    );
                    return None;
                }
            },
            _ => {
                let hint = format!(
                    "write {} such as {}",
                    unit.noun(),
                    unit.examples().join(", ")
                );
                self.wrong_type(key, node, row, &hint);
                return None;
            }
        };
        if !number.is_finite() {
            let message = format!("`{key}` is not a finite value");
            let hint = row.range_text().map(|range| format!("allowed is {range}"));
            self.findings.fault(
                Code::UnreadableValue,
                &self.path_of(key),
                node.place.clone(),
                message,
                hint,
            );
            return None;
        }
        self.check_range(key, node, row, number).then_some(number)
    }

    fn check_range(&self, key: &str, node: &Node, row: &Key, number: f64) -> bool {
        let Some((low, high)) = row.range else {
            return true;
        };
        // Half a unit of the fifteenth digit: `0.1` and `100m` are one value.
        let slack = 1e-15 * number.abs();
        if (low - slack..=high + slack).contains(&number) {
            return true;
        }
        let unit = match row.kind {
            Kind::Quantity(unit) | Kind::Quantities(unit) => unit,
            _ => Unit::Plain,
        };
        let message = format!("`{key}` is {}, out of range", unit.format(number));
        let hint = row.range_text().map(|range| format!("allowed is {range}"));
        self.findings.fault(
            Code::OutOfRange,
            &self.path_of(key),
            node.place.clone(),
            message,
            hint,
        );
        false
    }
}

/// A list in TOML writing, whose entries may be bare words.
fn bare_list(text: &str, place: &Place) -> Option<Node> {
    let inner = text.trim().strip_prefix('[')?.strip_suffix(']')?.trim();
    let inner = inner.strip_suffix(',').unwrap_or(inner);
    let entry = |text: &str| Node {
        place: place.clone(),
        key_place: place.clone(),
        value: Value::Bare(unquoted(text).to_owned()),
    };
    let items = if inner.is_empty() {
        Vec::new()
    } else {
        inner.split(',').map(entry).collect()
    };
    Some(Node {
        place: place.clone(),
        key_place: place.clone(),
        value: Value::List(items),
    })
}

/// The key's example, which stands in for a faulty value.
fn example(row: &Key, unit: Unit) -> f64 {
    notation::parse(row.example, unit).unwrap_or_else(|fault| unreachable!("{}: {fault}", row.path))
}
