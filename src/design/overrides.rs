//! `PATH=VALUE`: one value of a design replaced or added.

use super::findings::Findings;
use super::keys::{self, Kind};
use super::section::{refusal, unquoted};
use super::tree::{Node, Table, Value};
use crate::diagnostic::{Code, Place, nearest};
use crate::units::notation::clipped;

/// Sets one value of `design`, or notes why that cannot be done.
///
/// Paths are dotted, with rails, stages and input elements by name. The value is checked later, as if it stood in the file; quotes
/// around it are optional. Tables that are absent come into being, elements of lists do not.
pub(super) fn apply(design: &mut Table, text: &str, findings: &Findings) {
    let place = Place::Override(text.to_owned());
    let Some((path, value)) = text.split_once('=') else {
        let message = format!("`{}` is not PATH=VALUE", clipped(text));
        let hint = Some("for example transformer.primary=5k".to_owned());
        return findings.fault(Code::InvalidOverride, "", place, message, hint);
    };
    let (path, value) = (path.trim(), value.trim());
    if path.is_empty() || value.is_empty() {
        let what = if path.is_empty() {
            "path before"
        } else {
            "value after"
        };
        let message = format!("`{}` has no {what} its `=`", clipped(text));
        let hint = Some("for example transformer.primary=5k".to_owned());
        return findings.fault(Code::InvalidOverride, path, place, message, hint);
    }
    match steps(design, path) {
        Ok(steps) => set(design, &steps, value, &place),
        Err((code, message, hint)) => findings.fault(code, path, place, message, hint),
    }
}

enum Step {
    /// A key of a table.
    Key(String),
    /// The table of this place in a list.
    Item(usize),
}

type Refusal = (Code, String, Option<String>);

/// The way from the top of `design` to the value of `path`.
fn steps(design: &Table, path: &str) -> Result<Vec<Step>, Refusal> {
    let mut steps = Vec::new();
    let mut table = Some(design);
    let mut pattern = String::new();
    let mut gone = String::new();
    let mut segments = path.split('.').map(str::trim).peekable();
    while let Some(segment) = segments.next() {
        let longer = if pattern.is_empty() {
            segment.to_owned()
        } else {
            format!("{pattern}.{segment}")
        };
        let key = (segment != "*").then(|| keys::key(&longer)).flatten();
        let Some(key) = key else {
            return Err(refusal(&pattern, &gone, segment));
        };
        pattern = key.path.to_owned();
        gone = if gone.is_empty() {
            segment.to_owned()
        } else {
            format!("{gone}.{segment}")
        };
        steps.push(Step::Key(segment.to_owned()));
        let node = table.and_then(|table| table.get(segment));
        match key.kind {
            Kind::Table => table = node.and_then(Node::table),
            Kind::Tables => {
                let items = node.map_or(&[][..], Node::list);
                let (index, name) = named(items, &gone, segments.next())?;
                steps.push(Step::Item(index));
                table = items[index].table();
                pattern.push_str(".*");
                gone = format!("{gone}.{name}");
            }
            _ if segments.peek().is_some() => {
                let message = format!("`{gone}` holds a value, there is nothing under it");
                return Err((
                    Code::UnknownKey,
                    message,
                    Some(format!("write {gone}=VALUE")),
                ));
            }
            _ => return Ok(steps),
        }
    }
    let known: Vec<_> = keys::names_in(&pattern).collect();
    let hint = format!("its keys are {}", known.join(", "));
    Err((
        Code::UnknownKey,
        format!("`{gone}` is a table, not a value"),
        Some(hint),
    ))
}

/// Place in the list, and name, of the item that `segment` names.
fn named<'a>(
    items: &'a [Node],
    list: &str,
    segment: Option<&str>,
) -> Result<(usize, &'a str), Refusal> {
    let name_of = |node: &'a Node| node.table()?.get("name")?.text();
    let names: Vec<_> = items
        .iter()
        .map(|node| name_of(node).unwrap_or(""))
        .collect();
    let all = || {
        names
            .iter()
            .filter(|name| !name.is_empty())
            .copied()
            .collect::<Vec<_>>()
            .join(", ")
    };
    let Some(wanted) = segment else {
        let message = format!("`{list}` is a list: its items go by name");
        return Err((
            Code::UnknownName,
            message,
            Some(format!("say which: {}", all())),
        ));
    };
    if let Some(index) = names
        .iter()
        .position(|name| *name == wanted && !name.is_empty())
    {
        return Ok((index, names[index]));
    }
    let hint = match nearest(wanted, names.iter().copied()) {
        Some(near) => format!("did you mean `{near}`?"),
        None if names.is_empty() => "the design has none".to_owned(),
        None => format!("there are {}", all()),
    };
    let message = format!("`{list}` has none named `{}`", clipped(wanted));
    Err((Code::UnknownName, message, Some(hint)))
}

fn set(table: &mut Table, steps: &[Step], value: &str, place: &Place) {
    let Some((Step::Key(key), rest)) = steps.split_first() else {
        return;
    };
    let fresh = |value| Node {
        place: place.clone(),
        key_place: place.clone(),
        value,
    };
    if rest.is_empty() {
        let node = fresh(Value::Bare(unquoted(value).to_owned()));
        match table.get_mut(key) {
            Some(old) => *old = node,
            None => table.entries.push((key.clone(), node)),
        }
        return;
    }
    if table.get(key).is_none() {
        table
            .entries
            .push((key.clone(), fresh(Value::Table(Table::default()))));
    }
    match (table.get_mut(key).map(|node| &mut node.value), rest) {
        (Some(Value::Table(inner)), _) => set(inner, rest, value, place),
        (Some(Value::List(items)), [Step::Item(index), rest @ ..]) => {
            if let Some(Value::Table(inner)) = items.get_mut(*index).map(|node| &mut node.value) {
                set(inner, rest, value, place);
            }
        }
        // Something else stands where a table is due: the check of the file says so.
        _ => {}
    }
}
