//! The cautions that every reading of an operating point carries.

/// All of it, one paragraph each.
pub const SAFETY: [&str; 4] = [
    "The voltages in a tube amplifier kill. Several hundred volts stand on its rails, plates, screens and transformer leads, and \
     a supply of this size can push a fatal current through a body.",
    "Capacitors stay charged after the plug is pulled, for minutes or for days. Before touching anything, unplug the amplifier, \
     discharge every filter capacitor through a resistor made for it, and measure that the volts are gone.",
    "Even a few watts into a loudspeaker at close range can damage hearing for good. Start low, and keep the distance.",
    "These figures are calculated from a design on paper and prove nothing about the thing built. Follow the electrical codes of \
     the place you live in, and leave work on the mains side and the final safety check to licensed or otherwise qualified \
     persons.",
];

/// In one line, for the end of a terminal page.
pub const CAUTION: &str = "Caution: lethal volts, also on charged capacitors after unplugging: discharge and measure. Mind your \
     hearing. Follow local codes; leave mains work to licensed or qualified persons.";

/// All of it as one text, for documents that have a single place for it.
pub fn text() -> String {
    SAFETY.join(" ")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_caution_is_said_long_and_short() {
        let long = text().to_lowercase();
        let short = CAUTION.to_lowercase();
        for word in [
            "volts",
            "capacitors",
            "discharge",
            "measure",
            "hearing",
            "codes",
            "mains",
            "licensed",
            "qualified",
        ] {
            assert!(long.contains(word), "{word}");
            assert!(short.contains(word), "{word}");
        }
    }
}
