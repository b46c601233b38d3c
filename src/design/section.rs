//! One table of a design file under the table of keys: what it is called, where it stands, what may stand in it.

mod values;

use super::findings::Findings;
use super::keys::{self, Key, Need};
use super::tree::{Node, Table, Value};
use crate::diagnostic::{Code, Place, nearest};
use crate::units::notation::clipped;
use std::cell::RefCell;

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
    /// Keys that an unknown one in this table was probably meant to be.
    meant: RefCell<Vec<&'static str>>,
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
            meant: RefCell::default(),
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
            meant: RefCell::default(),
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
                format!(
                    "{} stands {} times, at most {most} are read",
                    row.example_line(),
                    nodes.len()
                ),
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
                meant: RefCell::default(),
                findings: self.findings,
            };
            section.findings.stands(&section.path, &section.place);
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

    /// True when `key` is given, or a misspelled key was probably meant to be it.
    pub fn is_meant(&self, key: &str) -> bool {
        self.is_given(key) || self.meant.borrow().contains(&key)
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
        self.findings.is_sound_throughout(&self.path)
    }

    /// Notes a fault of what stands under `key`.
    pub fn fault(&self, code: Code, key: &str, message: impl Into<String>, hint: Option<String>) {
        self.findings
            .fault(code, &self.path_of(key), self.place_of(key), message, hint);
    }

    /// Notes that `key` must be given, and why or what else would do; not where a misspelled key was meant to be it.
    pub fn missing(&self, key: &str, why: Option<&str>) {
        if self.meant.borrow().contains(&key) {
            return;
        }
        let row = self.row(key);
        let table = if self.path.is_empty() {
            "the design".to_owned()
        } else {
            format!("`{}`", self.path)
        };
        let why = match why {
            Some(other) if other.starts_with("or ") => format!(", {other}"),
            Some(why) => format!(": {why}"),
            None => String::new(),
        };
        self.findings.fault(
            Code::MissingKey,
            &self.path_of(key),
            self.place.clone(),
            format!("{table} lacks `{key}`, {}", row.help),
            Some(format!("write {}{why}", row.example_line())),
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
                self.findings.stands(&path, &node.place);
                continue;
            }
            self.meant
                .borrow_mut()
                .extend(nearest(name, keys::names_in(&self.pattern)));
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
            self.findings.stands(path, &self.place);
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
        let hint = "leave it out; what is computed then is the design without it".to_owned();
        return (
            Code::NotSupported,
            format!("`{}`: {why}", clipped(name)),
            Some(hint),
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

/// The text without the pair of quotes around it.
pub(super) fn unquoted(text: &str) -> &str {
    let text = text.trim();
    ['"', '\'']
        .iter()
        .find_map(|&quote| text.strip_prefix(quote)?.strip_suffix(quote))
        .unwrap_or(text)
}
