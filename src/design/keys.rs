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
///
/// Names may be given, starred or left out: `stage.power.cathode`, `stage.*.cathode` and `stage.cathode` mean the same.
pub fn keys_under(path: &str) -> Vec<&'static Key> {
    if path.is_empty() {
        return keys().iter().collect();
    }
    let under = |named: bool| {
        let begins = |key: &&'static Key| {
            let mut due = key
                .path
                .split('.')
                .filter(|segment| named || *segment != "*");
            path.split('.')
                .all(|given| due.next().is_some_and(|due| due == "*" || due == given))
        };
        keys().iter().filter(begins).collect::<Vec<_>>()
    };
    // Without names first, or `cathode` in `stage.cathode` would be taken for a name.
    let unnamed = under(false);
    if unnamed.is_empty() {
        under(true)
    } else {
        unnamed
    }
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
            Kind::Tables => "a list of tables".to_owned(),
            Kind::Text => "a text".to_owned(),
            Kind::Name => "a name".to_owned(),
            Kind::Word(words) => format!("one of {}", words.join(", ")),
            Kind::Flag => "true or false".to_owned(),
            Kind::Count => "a whole number".to_owned(),
            Kind::Quantity(unit) => unit.noun().to_owned(),
            Kind::Quantities(unit) => format!("a list (each entry {})", unit.noun()),
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

#[cfg(test)]
mod tests {
    use super::*;
    use crate::units::notation;

    #[test]
    fn every_path_stands_once_and_under_a_table_of_its_own() {
        for (index, row) in keys().iter().enumerate() {
            assert!(
                keys()[..index].iter().all(|other| other.path != row.path),
                "{}",
                row.path
            );
            let Some((parent, _)) = row.path.rsplit_once('.') else {
                continue;
            };
            let (parent, due) = match parent.strip_suffix(".*") {
                Some(list) => (list, Kind::Tables),
                None => (parent, Kind::Table),
            };
            assert_eq!(key(parent).map(|key| key.kind), Some(due), "{}", row.path);
        }
    }

    #[test]
    fn every_example_and_default_is_valid_under_its_own_row() {
        for row in keys() {
            assert!(!row.help.is_empty());
            for text in [Some(row.example), row.default].into_iter().flatten() {
                match row.kind {
                    Kind::Quantity(unit) => {
                        let value = notation::parse(text, unit)
                            .unwrap_or_else(|fault| panic!("{}: {fault}", row.path));
                        let (low, high) = row.range.expect("a quantity has a range");
                        assert!((low..=high).contains(&value), "{}: {text}", row.path);
                    }
                    Kind::Word(words) => assert!(words.contains(&text), "{}", row.path),
                    Kind::Count => assert!(text.parse::<u32>().is_ok(), "{}", row.path),
                    Kind::Flag => assert!(["true", "false"].contains(&text), "{}", row.path),
                    Kind::Name => assert!(!text.is_empty(), "{}", row.path),
                    Kind::Text | Kind::Quantities(_) | Kind::Table | Kind::Tables => {}
                }
            }
        }
    }

    #[test]
    fn words_for_a_required_key_have_no_default() {
        for row in keys() {
            assert!(
                row.need != Need::Required || row.default.is_none(),
                "{}",
                row.path
            );
        }
    }

    #[test]
    fn names_match_the_star_and_the_star_may_be_left_out() {
        let path = key("stage.power.cathode.resistor").map(|key| key.path);
        assert_eq!(path, Some("stage.*.cathode.resistor"));
        assert_eq!(key("stage.power.cathode"), key("stage.*.cathode"));
        assert_eq!(key("stage.cathode.resistor"), None);
        assert_eq!(keys_under("stage.power.cathode").len(), 6);
        assert_eq!(keys_under("stage.cathode").len(), 6);
        assert_eq!(keys_under("supply.rail.capacitor").len(), 1);
        assert_eq!(keys_under("").len(), keys().len());
        assert!(keys_under("nowhere").is_empty());
    }

    #[test]
    fn what_is_not_supported_is_no_key() {
        for (pattern, words, _) in table::NOT_SUPPORTED {
            for word in *words {
                let in_table = names_in(pattern).any(|name| name == *word);
                let is_choice = key(pattern).is_some_and(
                    |key| matches!(key.kind, Kind::Word(choices) if choices.contains(word)),
                );
                assert!(!in_table && !is_choice, "{pattern} {word}");
            }
        }
    }
}
