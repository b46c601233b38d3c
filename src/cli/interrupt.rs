//! Interruptions: prompt, and without traces.

use std::fs;
use std::io::{self, IsTerminal};
use std::path::PathBuf;
use std::sync::atomic::{AtomicBool, Ordering};
use std::sync::{Mutex, PoisonError};
use std::time::Duration;

use super::console::Console;
use super::fault::{Failure, Stop};
use forehear::diagnostic::Code;

/// Exit code of an interrupted run.
pub const INTERRUPTED: u8 = 130;

/// Set by an interruption; everything long looks at it.
pub static STOP: AtomicBool = AtomicBool::new(false);

/// Are files being written? That stops by itself, at the next write.
static WRITING: AtomicBool = AtomicBool::new(false);
/// Has somebody said that the run was interrupted?
static SAID: AtomicBool = AtomicBool::new(false);
/// Folders made for a set that is not there yet, outermost first.
static MADE: Mutex<Vec<PathBuf>> = Mutex::new(Vec::new());

/// How long a computation may take to stop by itself. Chosen: hardly felt by who waits.
const GRACE: Duration = Duration::from_millis(200);

/// Listens for interruptions from now on.
///
/// A computation looks at [`STOP`] between its steps, and some steps take seconds. Then the process is ended from here, which
/// leaves nothing behind but the empty folders that are removed first.
pub fn listen(console: Console) {
    // Without a handler an interruption ends the process at once, which is the next best thing.
    let _ = ctrlc::set_handler(move || {
        STOP.store(true, Ordering::SeqCst);
        std::thread::sleep(GRACE);
        if !WRITING.load(Ordering::SeqCst) {
            remove_made();
            if say(console) {
                std::process::exit(i32::from(INTERRUPTED));
            }
        }
    });
}

/// # Errors
/// [`Stop::Interrupted`] once an interruption has come.
pub fn check_stop() -> Result<(), Stop> {
    if STOP.load(Ordering::SeqCst) {
        Err(Stop::Interrupted)
    } else {
        Ok(())
    }
}

/// From here to the end files are written, and only who writes them may end the process.
pub fn begin_writing() -> Result<(), Stop> {
    WRITING.store(true, Ordering::SeqCst);
    check_stop()
}

/// A folder was made that must go again unless the set comes about.
pub fn note_made(folder: PathBuf) {
    MADE.lock()
        .unwrap_or_else(PoisonError::into_inner)
        .push(folder);
}

/// The set is there: its folders stay.
pub fn keep_made() {
    MADE.lock().unwrap_or_else(PoisonError::into_inner).clear();
}

/// Removes the folders again, those that are empty.
pub fn remove_made() {
    let mut made = MADE.lock().unwrap_or_else(PoisonError::into_inner);
    for folder in made.drain(..).rev() {
        // One that somebody has put something into stays.
        let _ = fs::remove_dir(folder);
    }
}

/// Says that the run was interrupted; false when that has been said.
pub fn say(console: Console) -> bool {
    if SAID.swap(true, Ordering::SeqCst) {
        return false;
    }
    if !console.is_quiet() && io::stderr().is_terminal() {
        // Off the line of the progress bar.
        console.write_err("\n");
    }
    console.fail(&Failure::of(
        "forehear",
        Code::Interrupted,
        "interrupted; nothing was written".into(),
        None,
    ));
    true
}
