/// Declares [`Code`] with its kebab-case words and the list of all.
macro_rules! codes {
    ($($(#[$doc:meta])* $variant:ident = $word:literal,)*) => {
        /// What kind of fault or warning. Tests and JSON use the word, never the message.
        #[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
        pub enum Code {
            $($(#[$doc])* $variant,)*
        }

        impl Code {
            /// Every code, in order.
            pub const ALL: &'static [Code] = &[$(Code::$variant,)*];

            /// The kebab-case word.
            pub fn word(self) -> &'static str {
                match self {
                    $(Code::$variant => $word,)*
                }
            }
        }
    };
}

codes! {
    // -- any text file
    /// The file is not valid TOML.
    Syntax = "syntax",

    // -- design file

    // -- tube file
    /// A tube file of a format this program does not read.
    TubeFormat = "tube-format",
    /// A key no tube file has at that place.
    TubeUnknownKey = "tube-unknown-key",
    /// A key every tube file must have.
    TubeMissingKey = "tube-missing-key",
    /// A value of the wrong type.
    TubeWrongType = "tube-wrong-type",
    /// A value outside the allowed range.
    TubeOutOfRange = "tube-out-of-range",
    /// A text that is none of the allowed words.
    TubeUnknownWord = "tube-unknown-word",
    /// Parameters that make plate current negative or let it fall with rising volts.
    TubeLaw = "tube-law",

    // -- sound file

    // -- results (warnings)
}
