//! The program: what was said ([`args`]), what will be done ([`plan`]), and doing it. Alone reads arguments, opens files, prints.

mod args;
mod bias;
mod console;
mod curve;
mod fault;
mod files;
mod interrupt;
mod lists;
mod new;
mod output;
mod plan;
mod render;
mod source;
mod values;

use std::process::ExitCode;

use clap::{CommandFactory, FromArgMatches};

use args::{Cli, Color, Command};
use console::{Console, DONE, NOT_DONE};
use fault::{Failure, Stop};
use forehear::diagnostic::Code;
use interrupt::INTERRUPTED;

/// Runs the program and gives its exit code.
pub fn main() -> ExitCode {
    let words: Vec<String> = std::env::args_os()
        .map(|w| w.to_string_lossy().into_owned())
        .collect();
    let spoken = Console::from_words(&words);
    let color = match spoken.color() {
        Color::Auto => clap::ColorChoice::Auto,
        Color::Always => clap::ColorChoice::Always,
        Color::Never => clap::ColorChoice::Never,
    };
    let parsed = Cli::command()
        .color(color)
        .try_get_matches_from(std::env::args_os())
        .and_then(|matches| Cli::from_arg_matches(&matches));
    let code = match parsed {
        Ok(cli) => {
            let console = Console::new(&cli);
            interrupt::listen(console);
            match run(&cli.command, console) {
                Ok(()) | Err(Stop::PipeClosed) => DONE,
                Err(Stop::Failed(failure)) => {
                    console.fail(&failure);
                    NOT_DONE
                }
                Err(Stop::Interrupted) => {
                    interrupt::say(console);
                    INTERRUPTED
                }
            }
        }
        Err(error) => usage(&error, spoken),
    };
    ExitCode::from(code)
}

fn run(command: &Command, console: Console) -> Result<(), Stop> {
    match command {
        Command::Render(args) => render::run(args, console),
        Command::Bias(args) => bias::run(args, console),
        Command::Curve(args) => curve::run(args, console),
        Command::Tubes(args) => lists::tubes(args, console),
        Command::Designs => lists::designs(console),
        Command::New(args) => new::run(args, console),
        Command::Keys(args) => lists::keys(args, console),
    }
}

/// Help, version, or what is wrong with the command line.
fn usage(error: &clap::Error, console: Console) -> u8 {
    // Whoever closed the stream does not want to read it.
    let _ = error.print();
    if !error.use_stderr() {
        return DONE;
    }
    if console.json() {
        let text = error.render().to_string();
        let mut paragraphs = text.split("\n\n").map(str::trim);
        let first = paragraphs.next().unwrap_or_default();
        let message = first.strip_prefix("error: ").unwrap_or(first).to_owned();
        let failure = Failure::of(
            "command line",
            Code::Usage,
            message,
            Some("see forehear --help".into()),
        );
        let _ = console::write_out(&forehear::report::json::error_document(&failure.faults()));
    }
    NOT_DONE
}
