//! Shipped designs and keys of the design file.

use super::page::Page;
use crate::report::listing::{DesignRow, KeyRow};

/// One line for each design.
pub fn designs_text(rows: &[DesignRow], page: &Page) -> String {
    let row = |r: &DesignRow| {
        let word = if r.is_default {
            format!("{} (default)", r.word)
        } else {
            r.word.clone()
        };
        vec![word, r.name.clone(), r.description.clone()]
    };
    page.table(
        "<<~",
        &["design", "name", "what it is"],
        rows.iter().map(row).collect(),
    )
}

/// Two lines or more for each key; a single key at length.
pub fn keys_text(rows: &[KeyRow], page: &Page) -> String {
    if let [key] = rows {
        return one_key(key, page);
    }
    let mut out = String::new();
    for k in rows {
        let mut line = format!("{}: {}", k.path, k.kind);
        if let Some(range) = &k.range {
            line += &format!(", {range}");
        }
        line += &match &k.default {
            Some(default) => format!("; default {default}"),
            None => format!("; {}", k.need),
        };
        out += &page.paragraph(&line, 4);
        for line in page.narrower(4).paragraph(&k.help, 0).lines() {
            out += &format!("    {line}\n");
        }
    }
    out
}

fn one_key(k: &KeyRow, page: &Page) -> String {
    let mut rows = vec![vec!["value".to_owned(), k.kind.clone()]];
    let mut add = |name: &str, value: Option<String>| {
        if let Some(value) = value {
            rows.push(vec![name.to_owned(), value]);
        }
    };
    add("unit", k.unit.clone());
    add("range", k.range.clone());
    add("need", Some(k.need.clone()));
    add("default", k.default.clone());
    add("example", Some(k.example.clone()));
    let mut out = page.paragraph(&format!("{}: {}", k.path, k.help), 0);
    out += &page.table("<~", &["", ""], rows);
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    fn key(path: &str) -> KeyRow {
        KeyRow {
            path: path.into(),
            kind: "ohms".into(),
            unit: Some("Ω".into()),
            need: "optional".into(),
            default: Some("10R".into()),
            range: Some("0.1 Ω to 10 kΩ".into()),
            words: vec![],
            help: "what remains at each end of a pot".into(),
            example: "10R".into(),
        }
    }

    #[test]
    fn keys_show_unit_range_and_default() {
        let path = "stage.*.input.*.end_resistance";
        for rows in [vec![key(path)], vec![key(path), key("name")]] {
            let out = keys_text(&rows, &Page::default());
            for word in [path, "ohms", "0.1 Ω to 10 kΩ", "10R", "what remains"] {
                assert!(out.contains(word), "{word}\n{out}");
            }
        }
    }

    #[test]
    fn the_default_design_is_marked() {
        let row = |word: &str, is_default| DesignRow {
            word: word.into(),
            name: "Corner Room".into(),
            description: "invented".into(),
            is_default,
        };
        let out = designs_text(
            &[row("corner", true), row("stairs", false)],
            &Page::default(),
        );
        assert!(out.contains("corner (default)") && !out.contains("stairs (default)"));
    }
}
