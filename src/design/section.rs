//! One table of a design file, read key by key under the table of keys.

use super::keys::{self, Key, Kind, Need};
use super::places::Places;
use super::tree::{Node, Table, Value};
use crate::diagnostic::{Code, Diagnostic, Place, nearest};
use crate::units::{Unit, notation};
use std::cell::RefCell;

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
        if !faults.contains(&fault) {
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

    fn is_sound(&self, path: &str) -> bool {
        !self.faults.borrow().iter().any(|fault| fault.path == path)
    }
}

/// A table of the file, or the absence of one, with the keys it may hold.
///
/// A fault is noted once, where it is found, and the value replaced by the key's example, so that reading goes on without faults
/// that only follow from the first. What compares values asks [`Section::is_sound`] before.
pub(super) struct Section<'a> {
    /// Path in the table of keys, with `*` for names.
    pattern: String,
    /// Path in this file.
    pub path: String,
    /// Where the table begins; for an absent one, its parent.
    pub place: Place,
    table: Option<&'a Table>,
    findings: &'a Findings,
}

impl<'a> Section<'a> {
    /// The whole file.
    pub fn root(table: &'a Table, findings: &'a Findings) -> Section<'a> {
        let section = Section {
            pattern: String::new(),
            path: String::new(),
            place: Place::Text(0..0),
            table: Some(table),
            findings,
        };
        section.check_names();
        section
    }

    /// The table under `key`, absent or not.
    pub fn table(&self, key: &str) -> Section<'a> {
        let row = self.row(key);
        let node = self.node(key);
        if node.is_none() && row.need == Need::Required {
            self.missing(key, None);
        }
        let table = node.and_then(Node::table);
        if let (Some(node), None) = (node, table) {
            let header = row.example_line();
            self.wrong_type(
                key,
                node,
                row,
                &format!("write the table's header, {header}"),
            );
        }
        let section = Section {
            pattern: row.path.to_owned(),
            path: self.path_of(key),
            place: node.map_or_else(|| self.place.clone(), |node| node.place.clone()),
            table,
            findings: self.findings,
        };
        section.check_names();
        section
    }

    /// The tables of the list under `key`, each with its name, named in paths by it or else by its number from 1.
    ///
    /// Faults of the names are noted here; one that is missing or taken comes out as an empty text, which no reference can mean.
    pub fn tables(&self, key: &str, most: usize) -> Vec<(String, Section<'a>)> {
        let row = self.row(key);
        let Some(node) = self.node(key) else {
            return Vec::new();
        };
        let Value::List(nodes) = &node.value else {
            let header = row.example_line();
            self.wrong_type(key, node, row, &format!("write {header} before each"));
            return Vec::new();
        };
        if nodes.len() > most {
            self.findings.fault(
                Code::TooMany,
                &self.path_of(key),
                nodes[most].place.clone(),
                format!("{} times [[{key}]], at most {most} are read", nodes.len()),
                None,
            );
        }
        let mut taken: Vec<String> = Vec::new();
        // Some beyond the limit are read too, so that its fault brings no others; not all, since a text can hold any number.
        let mut sections = Vec::new();
        for (index, node) in nodes.iter().take(4 * most).enumerate() {
            let Some(table) = node.table() else {
                self.wrong_type(
                    key,
                    node,
                    row,
                    &format!("write {} before each", row.example_line()),
                );
                continue;
            };
            let name = table.get("name").and_then(Node::text).unwrap_or("");
            let fresh = !taken.iter().any(|other| other == name);
            let called = if fresh && is_name(name) {
                name.to_owned()
            } else {
                (index + 1).to_string()
            };
            let section = Section {
                pattern: format!("{}.*", row.path),
                path: format!("{}.{called}", self.path_of(key)),
                place: node.place.clone(),
                table: Some(table),
                findings: self.findings,
            };
            section
                .findings
                .places
                .borrow_mut()
                .insert(&section.path, &section.place);
            section.check_names();
            section.check_name(fresh);
            // A name that cannot be one still tells what refers to it; a second bearer is never meant.
            let name = if fresh {
                name.to_owned()
            } else {
                String::new()
            };
            taken.push(name.clone());
            sections.push((name, section));
        }
        sections
    }

    /// Where `key` stands, or the table in which it does not.
    pub fn place_of(&self, key: &str) -> Place {
        self.node(key)
            .map_or_else(|| self.place.clone(), |node| node.place.clone())
    }

    pub fn path_of(&self, key: &str) -> String {
        if self.path.is_empty() {
            key.to_owned()
        } else {
            format!("{}.{key}", self.path)
        }
    }

    pub fn is_given(&self, key: &str) -> bool {
        self.node(key).is_some()
    }

    /// True when the table itself stands in the file.
    pub fn is_present(&self) -> bool {
        self.table.is_some()
    }

    /// True when no fault was found in what stands under `key`.
    pub fn is_sound(&self, key: &str) -> bool {
        self.findings.is_sound(&self.path_of(key))
    }

    /// True when no fault was found in this table or anything under it.
    pub fn is_sound_throughout(&self) -> bool {
        let below = format!("{}.", self.path);
        let faults = self.findings.faults.borrow();
        !faults
            .iter()
            .any(|fault| fault.path == self.path || fault.path.starts_with(&below))
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

    /// Notes a fault of what stands under `key`.
    pub fn fault(&self, code: Code, key: &str, message: impl Into<String>, hint: Option<String>) {
        self.findings
            .fault(code, &self.path_of(key), self.place_of(key), message, hint);
    }

    /// Notes that `key` must be given, and why, if that depends.
    pub fn missing(&self, key: &str, why: Option<&str>) {
        let row = self.row(key);
        let table = if self.path.is_empty() {
            "the design".to_owned()
        } else {
            format!("`{}`", self.path)
        };
        let why = why.map_or_else(String::new, |why| format!(" {why}"));
        self.findings.fault(
            Code::MissingKey,
            &self.path_of(key),
            self.place.clone(),
            format!("{table} lacks `{key}`{why}: {}", row.help),
            Some(format!("for example {}", row.example_line())),
        );
    }

    /// Notes that `key`, if given, does nothing here.
    pub fn without_effect(&self, key: &str, why: &str, hint: Option<&str>) {
        if self.is_given(key) {
            self.glance(&[key]);
            let message = format!("`{key}` has no effect: {why}");
            self.fault(
                Code::KeyWithoutEffect,
                key,
                message,
                hint.map(str::to_owned),
            );
        }
    }

    /// Notes that at most one of two given keys can hold; points at the second.
    pub fn conflict(&self, first: &str, second: &str, hint: &str) {
        self.glance(&[first, second]);
        let message = format!("`{first}` and `{second}` exclude each other");
        self.fault(
            Code::ConflictingKeys,
            second,
            message,
            Some(hint.to_owned()),
        );
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

    fn row(&self, key: &str) -> &'static Key {
        let path = if self.pattern.is_empty() {
            key.to_owned()
        } else {
            format!("{}.{key}", self.pattern)
        };
        keys::key(&path).unwrap_or_else(|| unreachable!("{path} is in the table of keys"))
    }

    fn node(&self, key: &str) -> Option<&'a Node> {
        self.table.and_then(|table| table.get(key))
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

    fn wrong_type(&self, key: &str, node: &Node, row: &Key, hint: &str) {
        let message = format!(
            "`{key}` is {} where {} is due",
            node.noun(),
            row.kind_text()
        );
        let place = node.place.clone();
        self.findings.fault(
            Code::WrongType,
            &self.path_of(key),
            place,
            message,
            Some(hint.to_owned()),
        );
    }

    /// Notes every key that the table of keys does not know here, and where the others stand.
    fn check_names(&self) {
        let Some(table) = self.table else { return };
        for (name, node) in &table.entries {
            let path = self.path_of(name);
            let known = keys::names_in(&self.pattern).any(|known| known == name);
            if known {
                self.findings.places.borrow_mut().insert(&path, &node.place);
                continue;
            }
            let (code, message, hint) = refusal(&self.pattern, &self.path, name);
            self.findings
                .fault(code, &path, node.key_place.clone(), message, hint);
        }
        let own = if self.path.is_empty() {
            None
        } else {
            Some(&self.path)
        };
        if let Some(path) = own {
            self.findings.places.borrow_mut().insert(path, &self.place);
        }
    }

    fn check_name(&self, fresh: bool) {
        let name = self.text("name");
        if !self.is_given("name") || !self.is_sound("name") {
            return;
        }
        let message = format!("`{}` cannot be a name", clipped(&name));
        if !is_name(&name) {
            let hint =
                "a name is a letter, then letters, digits, `-` and `_`, 40 at most".to_owned();
            self.fault(Code::InvalidName, "name", message, Some(hint));
        } else if self.pattern == "supply.rail.*" && name == "source" {
            let hint = "`source` means the supply itself; call the first rail `main`, for example";
            self.fault(Code::InvalidName, "name", message, Some(hint.to_owned()));
        } else if !fresh {
            let message = format!("the name `{name}` is taken by an earlier one");
            self.fault(
                Code::DuplicateName,
                "name",
                message,
                Some("names are unique in their list".to_owned()),
            );
        }
    }
}

/// Why `name` cannot stand in the table of this pattern and path, and what might be meant.
pub(super) fn refusal(pattern: &str, path: &str, name: &str) -> (Code, String, Option<String>) {
    if let Some(why) = keys::not_supported(pattern, name) {
        return (
            Code::NotSupported,
            format!("`{}`: {why}", clipped(name)),
            None,
        );
    }
    let table = if path.is_empty() {
        "a design file".to_owned()
    } else {
        format!("`{path}`")
    };
    let message = format!("{table} has no key `{}`", clipped(name));
    let hint = if let Some(near) = nearest(name, keys::names_in(pattern)) {
        format!("did you mean `{near}`?")
    } else if let Some(elsewhere) = keys::keys().iter().find(|key| key.name() == name) {
        format!("there is a `{}`", elsewhere.path.replace('*', "NAME"))
    } else {
        let known: Vec<_> = keys::names_in(pattern).collect();
        format!("it may hold {}", known.join(", "))
    };
    (Code::UnknownKey, message, Some(hint))
}

fn is_name(text: &str) -> bool {
    let mut characters = text.chars();
    characters.next().is_some_and(char::is_alphabetic)
        && characters.all(|c| c.is_alphanumeric() || c == '-' || c == '_')
        && text.chars().count() <= 40
}

/// First forty characters, on one line.
pub(super) fn clipped(text: &str) -> String {
    let mut short: String = text.chars().take(40).flat_map(char::escape_debug).collect();
    if text.chars().nth(40).is_some() {
        short.push('…');
    }
    short
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

/// The text without the pair of quotes around it.
pub(super) fn unquoted(text: &str) -> &str {
    let text = text.trim();
    ['"', '\'']
        .iter()
        .find_map(|&quote| text.strip_prefix(quote)?.strip_suffix(quote))
        .unwrap_or(text)
}

/// The key's example, which stands in for a faulty value.
fn example(row: &Key, unit: Unit) -> f64 {
    notation::parse(row.example, unit).unwrap_or_else(|fault| unreachable!("{}: {fault}", row.path))
}
