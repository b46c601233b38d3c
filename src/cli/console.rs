//! The two streams: results on standard output, everything else on standard error.

use std::io::{self, IsTerminal, Write};

use anstream::{AutoStream, ColorChoice};
use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};

use super::args::{Cli, Color};
use super::fault::{Failure, Stop, cause};
use forehear::diagnostic::Code;
use forehear::report::diagnostics::faults_text;
use forehear::report::json::error_document;
use forehear::report::terminal::{Page, Paint};
use forehear::study::result::Warning;

/// Exit codes.
pub const DONE: u8 = 0;
pub const NOT_DONE: u8 = 2;

/// Widest and narrowest page laid out for a terminal, in characters.
const WIDTHS: (usize, usize) = (60, 140);
/// Steps of the progress bar.
const PROGRESS_STEPS: u64 = 1000;

/// How and where this run speaks.
#[derive(Clone, Copy, Debug)]
pub struct Console {
    json: bool,
    quiet: bool,
    color: Color,
}

impl Console {
    pub fn new(cli: &Cli) -> Console {
        Console {
            json: cli.json,
            quiet: cli.quiet,
            color: cli.color,
        }
    }

    /// For a command line that could not be read: what it says about itself nevertheless.
    pub fn from_words(words: &[String]) -> Console {
        let words: Vec<&str> = words
            .iter()
            .map(String::as_str)
            .take_while(|w| *w != "--")
            .collect();
        let says = |word: &str| words.contains(&word);
        let color = |word: &str| {
            says(&format!("--color={word}")) || words.windows(2).any(|w| w == ["--color", word])
        };
        Console {
            json: says("--json"),
            quiet: says("--quiet"),
            color: match () {
                () if color("never") => Color::Never,
                () if color("always") => Color::Always,
                () => Color::Auto,
            },
        }
    }

    pub fn json(self) -> bool {
        self.json
    }

    pub fn is_quiet(self) -> bool {
        self.quiet
    }

    pub fn color(self) -> Color {
        self.color
    }

    /// Hands the result to standard output, as JSON or as text.
    pub fn answer(
        self,
        document: impl FnOnce() -> String,
        text: impl FnOnce(&Page) -> String,
    ) -> Result<(), Stop> {
        if self.json {
            write_out(&document())
        } else if self.quiet {
            Ok(())
        } else {
            let stdout = io::stdout();
            write_out(&text(&self.page(&stdout)))
        }
    }

    /// Ratings exceeded go to standard error when no text on standard output says them.
    pub fn alarm(self, warnings: &[Warning]) {
        if self.json || self.quiet {
            for w in warnings.iter().filter(|w| w.code == Code::RatingExceeded) {
                self.write_err(&format!("!! {}: {}\n", w.place, w.message));
            }
        }
    }

    /// Something worth knowing that is no part of the result.
    pub fn note(self, text: &str) {
        if !self.quiet {
            self.write_err(&format!("{text}\n"));
        }
    }

    /// Says what stood in the way: on standard error, and as JSON where that was asked for.
    pub fn fail(self, failure: &Failure) {
        let faults = failure.faults();
        self.write_err(&faults_text(&faults, &self.page(&io::stderr())));
        if self.json {
            // Standard error has said it; when nobody reads the document there is nothing left to do.
            let _ = write_out(&error_document(&faults));
        }
    }

    /// A bar on standard error, when that is a terminal.
    pub fn progress(self) -> Progress {
        let is_shown = !self.quiet && io::stderr().is_terminal();
        let target = if is_shown {
            ProgressDrawTarget::stderr()
        } else {
            ProgressDrawTarget::hidden()
        };
        let bar = ProgressBar::with_draw_target(Some(PROGRESS_STEPS), target);
        if let Ok(style) = ProgressStyle::with_template("{msg:24} {bar:32} {percent:>3} %") {
            bar.set_style(style);
        }
        Progress { bar }
    }

    pub fn write_err(self, text: &str) {
        // There is no third stream to complain on.
        let _ = io::stderr().lock().write_all(text.as_bytes());
    }

    fn page<S: anstream::stream::RawStream>(self, stream: &S) -> Page {
        let is_colored = match self.color {
            Color::Always => true,
            Color::Never => false,
            Color::Auto => AutoStream::choice(stream) != ColorChoice::Never,
        };
        let width = match terminal_size::terminal_size() {
            Some((columns, _)) if stream.is_terminal() => {
                usize::from(columns.0).clamp(WIDTHS.0, WIDTHS.1)
            }
            _ => Page::default().width,
        };
        Page {
            width,
            paint: if is_colored {
                Paint::on()
            } else {
                Paint::off()
            },
        }
    }
}

/// A progress bar that vanishes when it is dropped.
pub struct Progress {
    bar: ProgressBar,
}

impl Progress {
    pub fn show(&self, share: f64, what: &str) {
        self.bar.set_message(what.to_owned());
        self.bar
            .set_position((share.clamp(0.0, 1.0) * PROGRESS_STEPS as f64) as u64);
    }
}

impl Drop for Progress {
    fn drop(&mut self) {
        self.bar.finish_and_clear();
    }
}

/// Writes to standard output.
pub fn write_out(text: &str) -> Result<(), Stop> {
    let mut stdout = io::stdout().lock();
    match stdout
        .write_all(text.as_bytes())
        .and_then(|()| stdout.flush())
    {
        Ok(()) => Ok(()),
        Err(e) if e.kind() == io::ErrorKind::BrokenPipe => Err(Stop::PipeClosed),
        Err(e) => Err(Stop::Failed(Failure::of(
            "standard output",
            Code::UnwritableOutput,
            format!("standard output cannot be written: {}", cause(&e)),
            None,
        ))),
    }
}
