//! Reading files, with the cause when one cannot be read.

use std::fs::File;
use std::io::{self, Read};
use std::path::Path;

use super::fault::{Failure, cause};
use forehear::diagnostic::{Code, Diagnostic};
use forehear::wav::{self, Recording};

/// Longest text that is read, in bytes. Chosen: a hundred times any design or tube file.
const LONGEST_TEXT: u64 = 1 << 20;
/// The same for reports. Chosen: a hundred times one of three gain settings.
const LONGEST_REPORT: u64 = 1 << 26;

/// A design or tube file.
pub fn read_text(path: &Path) -> Result<String, Failure> {
    text_of_at_most(path, LONGEST_TEXT, "no design or tube file")
}

/// A report that this program wrote.
pub fn read_report(path: &Path) -> Result<String, Failure> {
    text_of_at_most(path, LONGEST_REPORT, "no report of a set")
}

fn text_of_at_most(path: &Path, most: u64, otherwise: &str) -> Result<String, Failure> {
    let shown = path.display().to_string();
    let unreadable = |message: String| Failure::of(&shown, Code::UnreadableFile, message, None);
    let mut bytes = Vec::new();
    open(path)
        .and_then(|file| file.take(most + 1).read_to_end(&mut bytes))
        .map_err(|e| unreadable(format!("the file cannot be read: {}", cause(&e))))?;
    if bytes.len() as u64 > most {
        return Err(unreadable(format!(
            "the file is longer than {most} bytes and {otherwise}"
        )));
    }
    String::from_utf8(bytes).map_err(|e| {
        unreadable(format!(
            "the file is not text in UTF-8: byte {} is none of it",
            e.utf8_error().valid_up_to() + 1
        ))
    })
}

/// A sound file.
pub fn read_sound(path: &Path) -> Result<Recording, Failure> {
    let shown = path.display().to_string();
    let mut bytes = Vec::new();
    open(path)
        .and_then(|mut file| file.read_to_end(&mut bytes))
        .map_err(|e| {
            Failure::of(
                &shown,
                Code::UnreadableFile,
                format!("the file cannot be read: {}", cause(&e)),
                None,
            )
        })?;
    wav::read(&bytes).map_err(|fault| Failure::in_text(shown, None, vec![Diagnostic::from(fault)]))
}

/// The last part of a path, which says nothing about the machine.
pub fn file_name(path: &Path) -> String {
    path.file_name().map_or_else(
        || path.display().to_string(),
        |n| n.to_string_lossy().into_owned(),
    )
}

fn open(path: &Path) -> io::Result<File> {
    let file = File::open(path)?;
    let kind = file.metadata()?.file_type();
    if kind.is_dir() {
        return Err(io::Error::other("it is a folder"));
    }
    // Devices have no end; a pipe has one.
    #[cfg(unix)]
    if std::os::unix::fs::FileTypeExt::is_char_device(&kind)
        || std::os::unix::fs::FileTypeExt::is_block_device(&kind)
    {
        return Err(io::Error::other("it is a device"));
    }
    Ok(file)
}
