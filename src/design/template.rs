//! The designs that come with the program, and a new file to start from.

macro_rules! shipped {
    ($($name:literal,)*) => {
        &[$(($name, include_str!(concat!("../../presets/designs/", $name, ".toml"))),)*]
    };
}

const SHIPPED: &[(&str, &str)] = shipped![
    "corner-room",
    "window-room",
    "attic-room",
    "north-room",
    "ensemble-room",
    "garden-room",
];

/// Names and texts of the shipped designs; the first is the one to start with.
///
/// ```
/// for (name, text) in forehear::design::shipped() {
///     assert!(forehear::design::read(text, &[]).is_ok(), "{name}");
/// }
/// ```
pub fn shipped() -> &'static [(&'static str, &'static str)] {
    SHIPPED
}

const HEADER: &str = "\
# A design to start from: change what you like, then check it.
# Values are written as on parts: 4K7, 4.7k, 470R, 22n, 0.022u, 285V, 35mA.
# Every key with its unit, range and default: forehear keys
# HIGH VOLTAGE: the supply of a tube amplifier can kill, and its capacitors stay charged after it is switched off.
# Building and opening one is for those qualified and permitted to, under local codes.

";

/// A design file to start from: a shipped design under a header that says how to go on.
pub fn template(shipped_design: &str) -> String {
    // The shipped file's own head speaks of the shipped amplifier, up to the first blank line.
    let body = match shipped_design.split_once("\n\n") {
        Some((head, body)) if head.lines().all(|line| line.starts_with('#')) => body,
        _ => shipped_design,
    };
    format!("{HEADER}{body}")
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::design::read;

    #[test]
    fn every_shipped_design_is_called_as_its_file_is() {
        for (name, text) in shipped() {
            let design = read(text, &[])
                .unwrap_or_else(|faults| panic!("{name}: {faults:?}"))
                .design;
            assert_eq!(design.name.to_lowercase().replace(' ', "-"), *name);
            assert!(text.contains("invented"), "{name} says that it is invented");
            assert!(text.contains("HIGH VOLTAGE"), "{name} warns");
        }
    }

    #[test]
    fn every_design_file_of_the_folder_is_shipped() {
        let folder = concat!(env!("CARGO_MANIFEST_DIR"), "/presets/designs");
        for entry in std::fs::read_dir(folder).expect("presets") {
            let file = entry
                .expect("an entry")
                .file_name()
                .to_string_lossy()
                .into_owned();
            let name = file.strip_suffix(".toml").expect("a TOML file");
            assert!(
                shipped().iter().any(|(shipped, _)| *shipped == name),
                "{name}"
            );
        }
    }

    #[test]
    fn a_new_file_reads_as_the_design_it_came_from() {
        for (name, text) in shipped() {
            let new = template(text);
            assert!(new.starts_with(HEADER));
            let design = read(&new, &[])
                .unwrap_or_else(|faults| panic!("{name}: {faults:?}"))
                .design;
            assert_eq!(design, read(text, &[]).unwrap().design, "{name}");
        }
    }
}
