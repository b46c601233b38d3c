//! Where each part of a design stands.

use crate::diagnostic::Place;
use std::collections::BTreeMap;

/// Dotted paths to the places they stand at: a stretch of the file, or an override.
///
/// Rails, stages and input elements are named in paths: `stage.power.input.leak.resistor`.
#[derive(Clone, Debug, PartialEq, Default)]
pub struct Places {
    by_path: BTreeMap<String, Place>,
}

impl Places {
    /// Place of `path`; of the innermost table around it where it is not given itself.
    ///
    /// ```
    /// use forehear::diagnostic::Place;
    /// let reading = forehear::design::read(forehear::design::shipped()[0].1, &[]).unwrap();
    /// assert!(matches!(reading.places.of("transformer.primary"), Place::Text(_)));
    /// assert_eq!(reading.places.of("nowhere"), Place::Whole);
    /// ```
    pub fn of(&self, path: &str) -> Place {
        let mut path = path;
        loop {
            if let Some(place) = self.by_path.get(path) {
                return place.clone();
            }
            match path.rfind('.') {
                Some(dot) => path = &path[..dot],
                None => return Place::Whole,
            }
        }
    }

    /// True when `path` stands in the file or in an override.
    pub fn is_given(&self, path: &str) -> bool {
        self.by_path.contains_key(path)
    }

    /// Every path with its place, in alphabetical order.
    pub fn iter(&self) -> impl Iterator<Item = (&str, &Place)> {
        self.by_path
            .iter()
            .map(|(path, place)| (path.as_str(), place))
    }

    pub(super) fn insert(&mut self, path: &str, place: &Place) {
        self.by_path.insert(path.to_owned(), place.clone());
    }
}
