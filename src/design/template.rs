//! The designs that come with the program, and a new file to start from.

/// Names and texts of the shipped designs; the first is the one to start with.
///
/// ```
/// for (name, text) in forehear::design::shipped() {
///     assert!(forehear::design::read(text, &[]).is_ok(), "{name}");
/// }
/// ```
pub fn shipped() -> &'static [(&'static str, &'static str)] {
    &[(
        "corner-room",
        include_str!("../../presets/designs/corner-room.toml"),
    )]
}

const HEADER: &str = "\
# A design to start from: change what you like, then check it.
# Values are written as on parts: 4K7, 4.7k, 470R, 22n, 0.022u, 285V, 35mA.
# Every key with its unit, range and default: forehear keys

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
