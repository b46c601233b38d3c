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
    /// A format version this program does not read.
    UnsupportedFormat = "unsupported-format",
    /// A key the table of keys does not know.
    UnknownKey = "unknown-key",
    /// A key that must be given is not.
    MissingKey = "missing-key",
    /// A text where a number, list or table is due, or the like.
    WrongType = "wrong-type",
    /// A value of another dimension than the key's.
    WrongUnit = "wrong-unit",
    /// A text that is no value in component notation.
    UnreadableValue = "unreadable-value",
    /// A value outside the key's range.
    OutOfRange = "out-of-range",
    /// A word that is none of the key's choices.
    UnknownWord = "unknown-word",
    /// Real, but not modeled.
    NotSupported = "not-supported",
    /// A name with characters that names cannot have, or a reserved one.
    InvalidName = "invalid-name",
    /// Two of a kind with the same name.
    DuplicateName = "duplicate-name",
    /// A name that nothing bears.
    UnknownName = "unknown-name",
    /// More of a kind than is allowed.
    TooMany = "too-many",
    /// Keys that exclude each other.
    ConflictingKeys = "conflicting-keys",
    /// A key without effect beside the others given.
    KeyWithoutEffect = "key-without-effect",
    /// An override that is not PATH=VALUE.
    InvalidOverride = "invalid-override",
    /// A rail that nothing bears the name of.
    UnknownRail = "unknown-rail",
    /// Rails that feed each other in a ring.
    RailCycle = "rail-cycle",
    /// No rail is fed from the source.
    NoSourceRail = "no-source-rail",
    /// Several rails are fed from the source.
    SeveralSourceRails = "several-source-rails",
    /// A design without a stage.
    NoStage = "no-stage",
    /// Every stage has a plate resistor.
    NoTransformerStage = "no-transformer-stage",
    /// Several stages lack a plate resistor.
    SeveralTransformerStages = "several-transformer-stages",
    /// A stage follows the one that drives the output transformer.
    TransformerStageNotLast = "transformer-stage-not-last",
    /// A pentode without a screen supply.
    ScreenMissing = "screen-missing",
    /// A screen supply where no screen is free.
    ScreenWithoutEffect = "screen-without-effect",
    /// Neither resistor, pot nor capacitor in a branch.
    EmptyBranch = "empty-branch",
    /// A leak returned to a bias that the stage does not have.
    NoFixedBias = "no-fixed-bias",
    /// Fixed bias that does not reach the grid.
    BiasLeakMissing = "bias-leak-missing",
    /// A grid without a resistive path to ground or bias.
    GridWithoutDcPath = "grid-without-dc-path",
    /// No capacitor keeps the previous plate's voltage off the grid.
    PlateNotBlocked = "plate-not-blocked",
    /// A gain control that is no pot of the design.
    UnknownGainControl = "unknown-gain-control",
    /// A gain control whose name several pots bear.
    AmbiguousGainControl = "ambiguous-gain-control",
    /// The secondary in use is none of the taps listed.
    TapNotListed = "tap-not-listed",
    /// The lower corner does not lie below the upper one.
    CornerOrder = "corner-order",

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
    /// The file has no bytes.
    WavEmptyFile = "wav-empty-file",
    /// Another kind of file that was recognized.
    WavOtherKind = "wav-other-kind",
    /// Does not begin as any WAV does, and was not recognized.
    WavNotRiff = "wav-not-riff",
    /// RIFF, but the form inside is not WAVE.
    WavNotWave = "wav-not-wave",
    /// RIFX: the same layout with its bytes the other way round.
    WavBigEndian = "wav-big-endian",
    /// The file ends inside its header.
    WavHeaderCut = "wav-header-cut",
    /// No `fmt ` chunk before the samples.
    WavNoFormat = "wav-no-format",
    /// The `fmt ` chunk contradicts itself.
    WavBadFormat = "wav-bad-format",
    /// Coded samples (mu-law, ADPCM, MP3 inside).
    WavCompressed = "wav-compressed",
    /// A sample size that is not read.
    WavBitDepth = "wav-bit-depth",
    /// The header promises zero channels.
    WavNoChannels = "wav-no-channels",
    /// Sample rate outside 8 to 192 kHz.
    WavRate = "wav-rate",
    /// No `data` chunk.
    WavNoData = "wav-no-data",
    /// A `data` chunk without a whole frame.
    WavNoFrames = "wav-no-frames",
    /// The header promises more frames than the file has.
    WavTruncated = "wav-truncated",
    /// A sample that is not a number, or infinite.
    WavNotFinite = "wav-not-finite",

    // -- design and catalog together
    /// A tube that neither the catalog nor a file knows.
    UnknownTube = "unknown-tube",
    /// A transformer label whose figures exclude each other.
    LabelContradiction = "label-contradiction",

    // -- results (warnings)
    /// A rating is exceeded.
    RatingExceeded = "rating-exceeded",
    /// More than the running limit stands at a cold tube.
    ColdStartVolts = "cold-start-volts",
    /// A tube rests outside the range its law was fitted over.
    OutsideFittedRange = "outside-fitted-range",
    /// A law that rests on figures from memory.
    FromMemory = "from-memory",
    /// What the catalog says must be known before trusting a tube.
    TubeCaution = "tube-caution",
    /// Something about the transformer had to be assumed.
    TransformerAssumed = "transformer-assumed",
    /// Clipping begins with a grid current nobody measured.
    GridCurrentAssumed = "grid-current-assumed",
    /// Aliases above the promised level.
    AliasHigh = "alias-high",
    /// A steady state was not reached.
    NotSettled = "not-settled",
    /// A stage was driven past its solved surface.
    SurfaceLeft = "surface-left",
    /// A recording whose level deserves a second look.
    DiLevel = "di-level",
    /// Something odd about a sound file, and how it was taken.
    OddSoundFile = "odd-sound-file",

    // -- the program
    /// A command line that says nothing this program does.
    Usage = "usage",
    /// A file that cannot be read.
    UnreadableFile = "unreadable-file",
    /// A file or folder that cannot be written.
    UnwritableOutput = "unwritable-output",
    /// A file stands where one would be written.
    FileExists = "file-exists",
    /// A finished set stands where one would be written.
    SetExists = "set-exists",
    /// A name that is neither a shipped design nor a file.
    UnknownDesign = "unknown-design",
    /// Gain settings for a design without a gain control.
    NoGainControl = "no-gain-control",
    /// A channel that the recording does not have.
    NoSuchChannel = "no-such-channel",
    /// A level given for the peak of a recording that is silent.
    SilentRecording = "silent-recording",
    /// Sound files longer than their format can say.
    TooLong = "too-long",
    /// A circuit or a sound that could not be computed.
    NotComputed = "not-computed",
    /// Stopped before it was done.
    Interrupted = "interrupted",
}
