//! Lists of designs and of keys.

use super::entry::{Nullable, objects};
use super::{SCHEMA, written};
use crate::report::listing::{DesignRow, KeyRow};

objects! {
    Designs {
        schema: u32,
        kind: &'static str,
        designs: Vec<Design>,
    }
    Design {
        word: String,
        name: String,
        description: String,
        is_default: bool,
    }
    Keys {
        schema: u32,
        kind: &'static str,
        keys: Vec<Key>,
    }
    Key {
        path: String,
        value: String,
        unit: Nullable<String>,
        need: String,
        default: Nullable<String>,
        range: Nullable<String>,
        words: Vec<String>,
        help: String,
        example: String,
    }
}

/// The shipped designs, as JSON.
pub fn designs_document(rows: &[DesignRow]) -> String {
    written(&Designs {
        schema: SCHEMA,
        kind: "designs",
        designs: rows
            .iter()
            .map(|r| Design {
                word: r.word.clone(),
                name: r.name.clone(),
                description: r.description.clone(),
                is_default: r.is_default,
            })
            .collect(),
    })
}

/// The keys of a design file, as JSON.
pub fn keys_document(rows: &[KeyRow]) -> String {
    written(&Keys {
        schema: SCHEMA,
        kind: "keys",
        keys: rows
            .iter()
            .map(|r| Key {
                path: r.path.clone(),
                value: r.kind.clone(),
                unit: r.unit.clone().ok_or("no-unit"),
                need: r.need.clone(),
                default: r.default.clone().ok_or("no-default"),
                range: r.range.clone().ok_or("no-range"),
                words: r.words.clone(),
                help: r.help.clone(),
                example: r.example.clone(),
            })
            .collect(),
    })
}
