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

    // -- sound file

    // -- results (warnings)
}
