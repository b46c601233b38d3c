//! The tubes known by name.

use std::sync::{Arc, OnceLock};

use super::entry::Tube;
use super::file::read_tube;

/// Tube files that come with the program.
const SHIPPED: &[(&str, &str)] = &[
    ("12ax7", include_str!("../../presets/tubes/12ax7.toml")),
    ("12at7", include_str!("../../presets/tubes/12at7.toml")),
    ("12au7", include_str!("../../presets/tubes/12au7.toml")),
    ("6sn7", include_str!("../../presets/tubes/6sn7.toml")),
    ("el84", include_str!("../../presets/tubes/el84.toml")),
    ("6v6", include_str!("../../presets/tubes/6v6.toml")),
    ("6l6gc", include_str!("../../presets/tubes/6l6gc.toml")),
];

/// Tubes found by name or alias, whatever the case of the letters.
///
/// ```
/// use forehear::tube::Catalog;
///
/// let catalog = Catalog::shipped();
/// let tube = catalog.find("ecc83").expect("a shipped tube");
/// assert_eq!(tube.name, "12AX7");
/// assert_eq!(catalog.nearest("ECC-83"), Some("ECC83"));
/// ```
#[derive(Clone, Debug)]
pub struct Catalog {
    tubes: Vec<Arc<Tube>>,
}

impl Catalog {
    /// The tubes that come with the program.
    pub fn shipped() -> Catalog {
        static SHIPPED_TUBES: OnceLock<Vec<Arc<Tube>>> = OnceLock::new();
        let tubes = SHIPPED_TUBES.get_or_init(|| {
            SHIPPED
                .iter()
                .map(|(file, text)| match read_tube(text) {
                    Ok(tube) => Arc::new(tube),
                    Err(faults) => {
                        panic!("the shipped tube file {file} reads without fault: {faults:?}")
                    }
                })
                .collect()
        });
        Catalog {
            tubes: tubes.clone(),
        }
    }

    /// The tube of this name or alias.
    pub fn find(&self, name: &str) -> Option<Arc<Tube>> {
        let wanted = name.trim();
        self.tubes
            .iter()
            .find(|t| designations(t).any(|n| n.eq_ignore_ascii_case(wanted)))
            .cloned()
    }

    /// The names, without aliases, in the catalog's order.
    pub fn names(&self) -> Vec<&str> {
        self.tubes.iter().map(|t| t.name.as_str()).collect()
    }

    /// All tubes, in the catalog's order.
    pub fn tubes(&self) -> &[Arc<Tube>] {
        &self.tubes
    }

    /// The name or alias most like `name`, if any is like it.
    pub fn nearest(&self, name: &str) -> Option<&str> {
        super::reader::nearest(name.trim(), self.tubes.iter().flat_map(|t| designations(t)))
    }
}

fn designations(tube: &Tube) -> impl Iterator<Item = &str> {
    std::iter::once(tube.name.as_str()).chain(tube.aliases.iter().map(String::as_str))
}
