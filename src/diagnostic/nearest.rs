//! The valid word that a misspelled one most likely meant.

/// Similarity (Jaro-Winkler, 0 to 1) from which a word is worth suggesting. Chosen: `resitor` scores 0.975 and
/// `capacitance` for `capacitor` 0.88, while `plate` for `cathode` scores 0.68.
const WORTH_SAYING: f64 = 0.8;

/// Longest word compared, in characters: the work grows with the product of both lengths.
const LONGEST: usize = 64;

/// The candidate most like `word`, if any is like it at all. Case does not count; of equals the first wins.
///
/// ```
/// use forehear::diagnostic::nearest;
/// assert_eq!(nearest("resitor", ["resistor", "rail"]), Some("resistor"));
/// assert_eq!(nearest("xyz", ["resistor", "rail"]), None);
/// ```
pub fn nearest<'a>(word: &str, candidates: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    if word.chars().nth(LONGEST).is_some() {
        return None;
    }
    let word = word.to_lowercase();
    let mut best: Option<(&str, f64)> = None;
    for candidate in candidates {
        let likeness = likeness(&word, &candidate.to_lowercase());
        if likeness >= WORTH_SAYING && best.is_none_or(|(_, most)| likeness > most) {
            best = Some((candidate, likeness));
        }
    }
    best.map(|(candidate, _)| candidate)
}

/// From 0 to 1. One slip of the keys (a letter wrong, missing, added or two exchanged) always counts, since Jaro-Winkler rates
/// short words low.
fn likeness(word: &str, candidate: &str) -> f64 {
    let likeness = strsim::jaro_winkler(word, candidate);
    if word.len() > 2 && strsim::osa_distance(word, candidate) == 1 {
        likeness.max(0.9)
    } else {
        likeness
    }
}

#[cfg(test)]
mod tests {
    use super::{likeness, nearest};

    #[test]
    fn the_limit_lies_between_slips_and_other_words() {
        for (word, candidate, expected) in [
            ("resitor", "resistor", 0.975),
            ("capacitance", "capacitor", 0.88),
            ("plate", "cathode", 0.68),
            ("pto", "pot", 0.9),
        ] {
            let found = likeness(word, candidate);
            assert!(
                (found - expected).abs() < 0.006,
                "{word} {candidate} {found}"
            );
        }
    }

    #[test]
    fn a_slip_of_the_keys_finds_its_word() {
        let words = ["resistor", "capacitor", "wired", "pot", "taper"];
        assert_eq!(nearest("resitor", words), Some("resistor"));
        assert_eq!(nearest("capacitance", words), Some("capacitor"));
        assert_eq!(nearest("Tapper", words), Some("taper"));
        assert_eq!(nearest("pto", words), Some("pot"));
        assert_eq!(nearest("cathode", ["plate"]), None);
    }

    #[test]
    fn very_long_and_empty_words_find_nothing() {
        assert_eq!(nearest(&"r".repeat(100_000), ["resistor"]), None);
        assert_eq!(nearest("", ["resistor"]), None);
        assert_eq!(nearest("resistor", []), None);
    }
}
