//! Imports point down: what is in a layer knows the layers below it only. And the sources speak of themselves alone.

use std::fs;
use std::path::{Path, PathBuf};

/// The layers of `src/lib.rs`, from the ground up.
const LAYERS: [&[&str]; 8] = [
    &["units", "numeric", "diagnostic"],
    &["signal", "resample"],
    &["design", "tube", "circuit", "measure", "wav"],
    &["stage"],
    &["render"],
    &["trial"],
    &["study"],
    &["report"],
];

/// The program: another crate, which the compiler keeps out of the library.
const PROGRAM: &str = "cli";

fn layer(module: &str) -> Option<usize> {
    LAYERS.iter().position(|names| names.contains(&module))
}

fn root() -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR"))
}

/// Every file below a folder, in a fixed order.
fn files(folder: &Path) -> Vec<PathBuf> {
    let mut found = Vec::new();
    let mut entries: Vec<PathBuf> = fs::read_dir(folder)
        .unwrap_or_else(|e| panic!("{}: {e}", folder.display()))
        .map(|entry| entry.expect("a folder entry can be read").path())
        .collect();
    entries.sort();
    for path in entries {
        if path.is_dir() {
            found.extend(files(&path));
        } else {
            found.push(path);
        }
    }
    found
}

/// Path below the package's root, for messages.
fn shown(path: &Path) -> String {
    path.strip_prefix(root())
        .unwrap_or(path)
        .to_string_lossy()
        .replace('\\', "/")
}

/// The code of a source text without its comments. Good enough for paths: a string that holds `//` loses its end.
fn without_comments(text: &str) -> String {
    text.lines()
        .map(|line| line.find("//").map_or(line, |at| &line[..at]))
        .collect::<Vec<_>>()
        .join("\n")
}

/// Names of the modules at the crate's root that a source text mentions, each with its line: `crate::a::B`,
/// `crate::{a::B, c}` and as many `super::` as lead up to the root (`depth` of them).
fn mentioned(text: &str, depth: usize) -> Vec<(usize, String)> {
    let code = without_comments(text);
    let upwards = "super::".repeat(depth);
    let mut found = Vec::new();
    for prefix in ["crate::", &upwards] {
        for (at, _) in code.match_indices(prefix) {
            let before = code[..at].chars().next_back();
            let is_part = before.is_some_and(|c| c.is_alphanumeric() || "_:$".contains(c));
            if is_part {
                continue;
            }
            let line = code[..at].matches('\n').count() + 1;
            let after = &code[at + prefix.len()..];
            found.extend(first_names(after).into_iter().map(|name| (line, name)));
        }
    }
    found
}

/// The first name of each path of a use tree.
fn first_names(tree: &str) -> Vec<String> {
    let name = |text: &str| -> String {
        text.trim_start()
            .chars()
            .take_while(|c| c.is_alphanumeric() || *c == '_')
            .collect()
    };
    let Some(group) = tree.strip_prefix('{') else {
        return vec![name(tree)];
    };
    let (mut names, mut open, mut start) = (Vec::new(), 0usize, 0usize);
    for (at, c) in group.char_indices() {
        match c {
            '{' => open += 1,
            '}' if open > 0 => open -= 1,
            ',' | '}' if open == 0 => {
                names.push(name(&group[start..at]));
                start = at + 1;
                if c == '}' {
                    break;
                }
            }
            _ => {}
        }
    }
    names.retain(|n| !n.is_empty());
    names
}

/// Mentions in a file of a module that do not point down, as `line: what`.
fn upward(module: &str, text: &str, depth: usize) -> Vec<String> {
    let own = layer(module).expect("the module has a layer");
    mentioned(text, depth)
        .into_iter()
        .filter(|(_, name)| name != module)
        .filter_map(|(line, name)| {
            let other = layer(&name)?;
            (other >= own)
                .then(|| format!("{line}: {module} (layer {own}) uses {name} (layer {other})"))
        })
        .collect()
}

#[test]
fn imports_point_down() {
    let mut faults = Vec::new();
    let mut looked_at = 0;
    for path in files(&root().join("src")) {
        let below = shown(&path);
        let parts: Vec<&str> = below.split('/').collect();
        let module = parts[1].trim_end_matches(".rs");
        if parts.len() == 2 && ["lib", "main"].contains(&module) || module == PROGRAM {
            continue;
        }
        if layer(module).is_none() {
            faults.push(format!("{below}: `{module}` has no layer"));
            continue;
        }
        // `src/a/mod.rs` is the module `a` itself, one `super` from the root; `src/a/b.rs` is two.
        let depth = parts.len() - 1 - usize::from(parts.ends_with(&["mod.rs"]) || parts.len() == 2);
        let depth = depth.max(1);
        let text = fs::read_to_string(&path).expect("sources are text");
        looked_at += 1;
        faults.extend(
            upward(module, &text, depth)
                .into_iter()
                .map(|fault| format!("{below}:{fault}")),
        );
    }
    assert!(looked_at > 50, "only {looked_at} sources found");
    assert!(faults.is_empty(), "{}", faults.join("\n"));
}

#[test]
fn the_layer_map_in_the_documentation_is_the_one_that_is_held() {
    let text = fs::read_to_string(root().join("src/lib.rs")).expect("lib.rs");
    let rows: Vec<Vec<&str>> = text
        .lines()
        .filter_map(|line| line.strip_prefix("//! | "))
        .map(|row| row.split(" | ").collect::<Vec<_>>())
        .filter(|cells| cells[0].parse::<usize>().is_ok())
        .collect();
    assert_eq!(rows.len(), LAYERS.len(), "{rows:?}");
    for (k, cells) in rows.iter().enumerate() {
        assert_eq!(cells[0], k.to_string());
        let names: Vec<&str> = cells[1]
            .split(", ")
            .map(|name| name.trim_matches(['[', ']', '`']))
            .collect();
        assert_eq!(names, LAYERS[k], "layer {k}");
    }
    for name in LAYERS.concat() {
        assert!(text.contains(&format!("pub mod {name};")), "{name}");
    }
}

#[test]
fn upward_and_sideways_imports_are_seen() {
    let seen = |text: &str| upward("render", text, 2).len();
    assert_eq!(
        seen("use crate::stage::wiring;\nuse crate::render::Kernel;"),
        0
    );
    assert_eq!(seen("// use crate::trial::tone;"), 0);
    assert_eq!(seen("use crate::trial::tone;"), 1);
    assert_eq!(seen("use crate::{stage::{a, b}, report, study::c};"), 2);
    assert_eq!(
        seen("use crate::{\n    units::Volts,\n    trial::tone,\n};"),
        1
    );
    assert_eq!(seen("let x = crate::report::safety::text();"), 1);
    assert_eq!(seen("use super::super::trial::tone;"), 1);
    assert_eq!(upward("design", "use crate::tube::Catalog;", 1).len(), 1);
    assert_eq!(upward("design", "use super::tube::Catalog;", 1).len(), 1);
}

/// Texts that name somebody's machine or where packages come from. Put together here, so that this file holds none.
fn forbidden() -> Vec<String> {
    let folders = ["home", "root", "work", "Users", "mnt"].map(|f| format!("/{f}/"));
    let hosts = [
        ("crates", "io"),
        ("pypi", "org"),
        ("npmjs", "org"),
        ("golang", "org"),
    ]
    .map(|(name, end)| format!("{name}.{end}"));
    let files = ["file:", "C:"].map(|f| format!("{f}{}", "\\"));
    folders.into_iter().chain(hosts).chain(files).collect()
}

/// Mentions in a text, as `line: what`. A folder counts where a path begins, not inside a longer one.
fn machine_words(text: &str) -> Vec<String> {
    let words = forbidden();
    let mut found = Vec::new();
    for (k, line) in text.lines().enumerate() {
        for word in &words {
            let begins = line.match_indices(word.as_str()).any(|(at, _)| {
                let before = line[..at].chars().next_back();
                !before.is_some_and(|c| c.is_alphanumeric() || "_.-<>)}*".contains(c))
            });
            if begins {
                found.push(format!("{}: {word}", k + 1));
            }
        }
    }
    found
}

#[test]
fn no_source_names_a_machine_or_a_registry() {
    let mut faults = Vec::new();
    let mut looked_at = 0;
    for folder in ["src", "tests", "presets"] {
        for path in files(&root().join(folder)) {
            // Recorded sound is not text; what Python leaves behind is not a source.
            if path.components().any(|c| c.as_os_str() == "__pycache__") {
                continue;
            }
            let Ok(text) = fs::read_to_string(&path) else {
                continue;
            };
            looked_at += 1;
            faults.extend(
                machine_words(&text)
                    .into_iter()
                    .map(|fault| format!("{}:{fault}", shown(&path))),
            );
        }
    }
    assert!(looked_at > 200, "only {looked_at} sources found");
    assert!(faults.is_empty(), "{}", faults.join("\n"));
}

#[test]
fn machine_words_are_seen_where_a_path_begins() {
    let folder = forbidden()[0].clone();
    assert_eq!(machine_words(&format!("x = \"{folder}me\"")).len(), 1);
    assert_eq!(
        machine_words(&format!("x\n{folder}me")),
        [format!("2: {folder}")]
    );
    assert_eq!(machine_words(&format!("designs{folder}me")).len(), 0);
    assert_eq!(machine_words("volts/amperes, src/stage/iron.rs").len(), 0);
}
