//! What can be said on the command line.

use std::path::PathBuf;

use clap::{Args, Parser, Subcommand, ValueEnum};

use super::values;
use forehear::report::safety;

/// Hear and measure a small single-ended tube guitar amplifier while it is still on paper.
#[derive(Debug, Parser)]
#[command(
    name = "forehear",
    version,
    arg_required_else_help = true,
    max_term_width = 100
)]
pub struct Cli {
    #[command(subcommand)]
    pub command: Command,

    /// One JSON document on standard output, everything else on standard error
    #[arg(long, global = true, help_heading = "Output")]
    pub json: bool,

    /// No progress and no text; errors, exceeded ratings and --json still come
    #[arg(long, global = true, help_heading = "Output")]
    pub quiet: bool,

    /// Colors in warnings and errors; auto: on a terminal, unless NO_COLOR is set
    #[arg(
        long,
        global = true,
        value_name = "WHEN",
        default_value = "auto",
        help_heading = "Output"
    )]
    pub color: Color,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub enum Color {
    Auto,
    Always,
    Never,
}

#[derive(Debug, Subcommand)]
pub enum Command {
    /// Play a DI through the design at its gain settings, measure it, write sound and report
    #[command(after_long_help = safety::CAUTION)]
    Render(Box<Render>),
    /// Operating point of every stage, and every rating with its margin
    #[command(after_long_help = safety::CAUTION)]
    Bias(Bias),
    /// Transfer curve of each stage at its bias, and load lines over the plate curves
    Curve(Curve),
    /// The catalog of tubes, or one tube and where its figures come from
    Tubes(Tubes),
    /// The designs that come with the program
    Designs,
    /// Write a commented design file to start from
    New(New),
    /// The keys of a design file, with unit, default and range
    Keys(Keys),
}

/// A design, and what is changed in it.
#[derive(Debug, Args)]
pub struct DesignChoice {
    /// Design file, or the name of a shipped design [default: the first of `forehear designs`]
    #[arg(value_name = "DESIGN")]
    pub design: Option<String>,

    /// Change one value, such as stage.power.cathode.resistor=330R; may be repeated
    #[arg(long = "set", value_name = "PATH=VALUE", help_heading = "Design")]
    pub overrides: Vec<String>,
}

#[derive(Debug, Args)]
pub struct Render {
    #[command(flatten)]
    pub design: DesignChoice,

    #[command(flatten)]
    pub recording: Recording,

    #[command(flatten)]
    pub measuring: Measuring,

    #[command(flatten)]
    pub files: SoundFiles,
}

/// What is played in.
#[derive(Debug, Args)]
pub struct Recording {
    /// Dry recording of the instrument, a WAV file [default: a shipped synthetic phrase]
    #[arg(long, value_name = "WAV", help_heading = "Recording")]
    pub di: Option<PathBuf>,

    /// Render this channel only, counted from 1 [default: every channel, each on its own]
    #[arg(long, value_name = "N", value_parser = values::channel, help_heading = "Recording")]
    pub channel: Option<usize>,

    /// Peak level at the jack that digital full scale stands for, such as 1V or 0dBV [default: 1V]
    #[arg(
        long,
        value_name = "LEVEL",
        value_parser = values::jack_level,
        allow_hyphen_values = true,
        conflicts_with = "di_peak",
        help_heading = "Recording"
    )]
    pub full_scale: Option<f64>,

    /// Peak level at the jack that the recording's own peak stands for, such as 400mV
    #[arg(
        long,
        value_name = "LEVEL",
        value_parser = values::jack_level,
        allow_hyphen_values = true,
        help_heading = "Recording"
    )]
    pub di_peak: Option<f64>,
}

/// At which settings and how the amplifier is measured.
#[derive(Debug, Args)]
pub struct Measuring {
    /// Positions of the gain control, 0 to 10, such as 2,5,10 [default: the design's]
    #[arg(
        long,
        value_name = "LIST",
        value_delimiter = ',',
        value_parser = values::gain,
        allow_negative_numbers = true,
        help_heading = "Measuring"
    )]
    pub gain: Vec<f64>,

    /// Peak level at the jack of the headline figures, such as 200mV or -17dBV [default: the design's]
    #[arg(
        long,
        value_name = "LEVEL",
        value_parser = values::jack_level,
        allow_hyphen_values = true,
        help_heading = "Measuring"
    )]
    pub test_level: Option<f64>,

    /// Frequency of the headline figures; 82.4 and 220 Hz are measured beside it
    #[arg(
        long,
        value_name = "FREQUENCY",
        default_value = "1kHz",
        value_parser = values::tone,
        help_heading = "Measuring"
    )]
    pub tone: f64,

    /// Steps of the circuit solution per sample: more is slower, with fewer aliases
    #[arg(
        long,
        value_name = "FACTOR",
        default_value = "8",
        help_heading = "Measuring"
    )]
    pub oversample: Oversample,

    /// Threads to use [default: one for each core]
    #[arg(long, value_name = "N", value_parser = values::jobs, help_heading = "Measuring")]
    pub jobs: Option<usize>,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub enum Oversample {
    #[value(name = "1")]
    By1,
    #[value(name = "2")]
    By2,
    #[value(name = "4")]
    By4,
    #[value(name = "8")]
    By8,
}

impl Oversample {
    pub fn factor(self) -> usize {
        match self {
            Oversample::By1 => 1,
            Oversample::By2 => 2,
            Oversample::By4 => 4,
            Oversample::By8 => 8,
        }
    }
}

/// What is written, and where.
#[derive(Debug, Args)]
pub struct SoundFiles {
    /// Sample format of the sound files
    #[arg(
        long,
        value_name = "FORMAT",
        default_value = "24",
        help_heading = "Files"
    )]
    pub format: SampleFormat,

    /// Impulse response of a cabinet, a WAV file, for the listening copies (first channel)
    /// [default: a plain band-limit]
    #[arg(long, value_name = "WAV", help_heading = "Files")]
    pub cabinet: Option<PathBuf>,

    /// Folder for the set [default: forehear-out/NAME, numbered if taken]
    #[arg(long, value_name = "DIR", help_heading = "Files")]
    pub out: Option<PathBuf>,

    /// Write over a set that exists; removes only files that its report lists
    #[arg(long, help_heading = "Files")]
    pub force: bool,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq, ValueEnum)]
pub enum SampleFormat {
    /// 16-bit integers, dithered
    #[value(name = "16")]
    Pcm16,
    /// 24-bit integers
    #[value(name = "24")]
    Pcm24,
    /// 32-bit floats
    #[value(name = "32f")]
    Float32,
}

#[derive(Debug, Args)]
pub struct Bias {
    #[command(flatten)]
    pub design: DesignChoice,
}

#[derive(Debug, Args)]
pub struct Curve {
    #[command(flatten)]
    pub design: DesignChoice,

    /// Only the stage of this name [default: all stages]
    #[arg(long, value_name = "NAME", help_heading = "Design")]
    pub stage: Option<String>,

    /// Write the curves into this folder too, as CSV and SVG files
    #[arg(long, value_name = "DIR", help_heading = "Files")]
    pub out: Option<PathBuf>,
}

#[derive(Debug, Args)]
pub struct Tubes {
    /// A tube of the catalog, or a tube file of your own (ending in .toml) [default: list them all]
    pub tube: Option<String>,
}

#[derive(Debug, Args)]
pub struct New {
    /// File to write; one that exists is left as it is
    pub file: PathBuf,

    /// Start from this design: a shipped one, or a design file
    #[arg(long, value_name = "DESIGN", help_heading = "Design")]
    pub from: Option<String>,
}

#[derive(Debug, Args)]
pub struct Keys {
    /// Show the keys under this path only, such as stage.cathode
    pub path: Option<String>,
}

#[cfg(test)]
mod tests {
    use super::*;
    use clap::CommandFactory;

    #[test]
    fn the_command_line_contradicts_itself_nowhere() {
        Cli::command().debug_assert();
    }

    #[test]
    fn every_option_has_a_heading_and_a_help() {
        for command in Cli::command().get_subcommands() {
            for arg in command.get_opts() {
                assert!(arg.get_help_heading().is_some(), "{arg}");
                assert!(arg.get_help().is_some(), "{arg}");
            }
        }
    }

    #[test]
    fn negative_levels_are_values_and_a_missing_value_swallows_no_option() {
        let parse = |line: &str| Cli::try_parse_from(line.split(' '));
        let cli =
            parse("forehear render --test-level -20dBV --full-scale -3dBu --gain 2,5").unwrap();
        let Command::Render(render) = cli.command else {
            panic!("render");
        };
        assert!((render.measuring.test_level.unwrap() - 0.141_421).abs() < 1e-6);
        assert_eq!(render.measuring.gain, [2.0, 5.0]);
        assert!(parse("forehear render --test-level --quiet").is_err());
        assert!(parse("forehear render --gain -1").is_err());
        assert!(parse("forehear render --full-scale 1V --di-peak 1V").is_err());
    }
}
