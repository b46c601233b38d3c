//! `forehear bias`

use super::args::Bias;
use super::console::Console;
use super::fault::{Failure, Stop};
use super::interrupt::{STOP, check_stop};
use super::source;
use forehear::report::json::bias_document;
use forehear::report::terminal::bias_text;
use forehear::study::{StudyFault, Watch, bias};

pub fn run(args: &Bias, console: Console) -> Result<(), Stop> {
    let design = source::load(&args.design)?;
    let progress = console.progress();
    let watch = Watch {
        progress: &|share, what| progress.show(share, what),
        stop: &STOP,
    };
    let study =
        bias::study(&design.prepared, &watch).map_err(|fault| stop(&design.name, &fault))?;
    check_stop()?;
    drop(progress);
    console.alarm(&study.warnings);
    console.answer(|| bias_document(&study), |page| bias_text(&study, page))
}

/// Why a study of this design came to no result.
pub fn stop(design: &str, fault: &StudyFault) -> Stop {
    match fault {
        StudyFault::Interrupted => Stop::Interrupted,
        other => Failure::of_study(design, other).into(),
    }
}
