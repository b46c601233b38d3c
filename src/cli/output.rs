//! A set of files that appears whole or not at all.

use std::fs::{self, File};
use std::io::{self, Seek, SeekFrom, Write};
use std::path::{Path, PathBuf};
use std::sync::atomic::Ordering;

use tempfile::{NamedTempFile, TempDir};

use super::fault::{Failure, Stop, cause};
use super::files;
use super::interrupt::{self, STOP, check_stop};
use super::plan::REPORT_FILE;
use forehear::diagnostic::Code;

/// Beginning of the names of files that are not yet, or no longer, part of a set.
const ASIDE: &str = ".forehear-";

/// What to do about a folder that is there already.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Existing {
    /// Take the next free name: NAME-2, NAME-3.
    Number,
    /// Refuse a folder that holds a set; put files beside others that have nothing to do with it.
    Refuse,
    /// Remove the files that the old set's report lists, then as [`Existing::Refuse`].
    Replace,
}

/// Files written aside in their folder until [`Output::commit`].
pub struct Output {
    folder: PathBuf,
    /// Files of the set that will be replaced.
    old: Vec<String>,
    aside: Vec<(String, NamedTempFile)>,
}

impl Output {
    /// Makes the folder where it is missing and looks whether the files of these names may be written there.
    pub fn open(folder: &Path, existing: Existing, names: &[String]) -> Result<Output, Stop> {
        check_stop()?;
        let mut output = Output {
            folder: folder.to_owned(),
            old: Vec::new(),
            aside: Vec::new(),
        };
        match existing {
            Existing::Number => output.make_numbered()?,
            Existing::Refuse | Existing::Replace => Self::make_folder(folder)?,
        }
        let report = output.folder.join(REPORT_FILE);
        if names.iter().any(|n| n == REPORT_FILE) && exists(&report) {
            if existing != Existing::Replace {
                return Err(Failure::of(
                    output.folder.display().to_string(),
                    Code::SetExists,
                    format!("a set is there already: it has a {REPORT_FILE}"),
                    Some(
                        "name another folder with --out, or write over the set with --force".into(),
                    ),
                )
                .into());
            }
            output.old = listed_files(&report)?;
        }
        for name in names {
            let path = output.folder.join(name);
            if exists(&path) && !output.old.contains(name) {
                return Err(Failure::of(
                    path.display().to_string(),
                    Code::FileExists,
                    "a file that is no part of the set has this name".into(),
                    Some("name another folder with --out, or move the file away".into()),
                )
                .into());
            }
        }
        // Found out now rather than after the render.
        new_file_in(&output.folder).map_err(|e| unwritable(&output.folder, &e))?;
        Ok(output)
    }

    /// Where the files go.
    pub fn folder(&self) -> &Path {
        &self.folder
    }

    /// Writes one file aside. What `write` gives back is handed on.
    pub fn add<T>(
        &mut self,
        name: &str,
        write: impl FnOnce(&mut Guarded) -> Result<T, io::Error>,
    ) -> Result<T, Stop> {
        check_stop()?;
        let path = self.folder.join(name);
        let file = new_file_in(&self.folder).map_err(|e| unwritable(&path, &e))?;
        let written = write(&mut Guarded(file.as_file())).and_then(|t| {
            file.as_file().sync_all()?;
            Ok(t)
        });
        check_stop()?;
        let written = written.map_err(|e| unwritable(&path, &e))?;
        self.aside.push((name.to_owned(), file));
        Ok(written)
    }

    /// Adds a text.
    pub fn add_text(&mut self, name: &str, text: &str) -> Result<(), Stop> {
        self.add(name, |out| out.write_all(text.as_bytes()))
    }

    /// Gives every file its name, in the order they were added. On failure all is as it was.
    pub fn commit(mut self) -> Result<(), Stop> {
        let mut swap = Swap {
            folder: self.folder.clone(),
            placed: Vec::new(),
            attic: None,
            moved: Vec::new(),
            is_done: false,
        };
        swap.move_away(&self.old)
            .map_err(|e| unwritable(&self.folder, &e))?;
        for (name, file) in self.aside.drain(..) {
            check_stop()?;
            let path = self.folder.join(&name);
            file.persist_noclobber(&path)
                .map_err(|e| unwritable(&path, &e.error))?;
            swap.placed.push(path);
        }
        swap.is_done = true;
        interrupt::keep_made();
        Ok(())
    }

    /// Makes a folder and the folders above it.
    fn make_folder(folder: &Path) -> Result<(), Failure> {
        if folder.is_dir() || folder.as_os_str().is_empty() {
            return Ok(());
        }
        if exists(folder) {
            return Err(Failure::of(
                folder.display().to_string(),
                Code::UnwritableOutput,
                "a folder is wanted, and this is a file".into(),
                Some("name another folder".into()),
            ));
        }
        if let Some(above) = folder.parent() {
            Self::make_folder(above)?;
        }
        fs::create_dir(folder).map_err(|e| unwritable(folder, &e))?;
        interrupt::note_made(folder.to_owned());
        Ok(())
    }

    /// Makes the first folder of NAME, NAME-2, NAME-3 that is not there.
    fn make_numbered(&mut self) -> Result<(), Failure> {
        let first = self.folder.clone();
        if let Some(above) = first.parent() {
            Self::make_folder(above)?;
        }
        for n in 1u32.. {
            let mut name = first.as_os_str().to_owned();
            if n > 1 {
                name.push(format!("-{n}"));
            }
            self.folder = PathBuf::from(name);
            match fs::create_dir(&self.folder) {
                Ok(()) => {
                    interrupt::note_made(self.folder.clone());
                    return Ok(());
                }
                Err(e) if e.kind() == io::ErrorKind::AlreadyExists => {}
                Err(e) => return Err(unwritable(&self.folder, &e)),
            }
        }
        unreachable!("a folder does not hold four thousand million sets")
    }
}

/// Writes one new file, whole or not at all, and never over another.
pub fn write_new(path: &Path, text: &str) -> Result<(), Stop> {
    let (folder, name) = match (path.parent(), path.file_name()) {
        (Some(folder), Some(name)) if folder.as_os_str().is_empty() => (Path::new("."), name),
        (Some(folder), Some(name)) => (folder, name),
        _ => return Err(taken(path).into()),
    };
    if exists(path) {
        return Err(taken(path).into());
    }
    let mut file = new_file_in(folder).map_err(|e| unwritable(path, &e))?;
    file.write_all(text.as_bytes())
        .and_then(|()| file.as_file().sync_all())
        .map_err(|e| unwritable(path, &e))?;
    check_stop()?;
    file.persist_noclobber(folder.join(name))
        .map_err(|e| match e.error.kind() {
            io::ErrorKind::AlreadyExists => taken(path),
            _ => unwritable(path, &e.error),
        })?;
    Ok(())
}

fn taken(path: &Path) -> Failure {
    Failure::of(
        path.display().to_string(),
        Code::FileExists,
        "something of this name is there already, and is left as it is".into(),
        Some("name another file".into()),
    )
}

fn new_file_in(folder: &Path) -> io::Result<NamedTempFile> {
    let mut builder = tempfile::Builder::new();
    builder.prefix(ASIDE);
    // Readable as any other file would be: the mask of the user takes away what he wants taken away.
    #[cfg(unix)]
    builder.permissions(<fs::Permissions as std::os::unix::fs::PermissionsExt>::from_mode(0o666));
    builder.tempfile_in(folder)
}

/// Takes back what was made for a set that did not come about.
impl Drop for Output {
    fn drop(&mut self) {
        self.aside.clear();
        interrupt::remove_made();
    }
}

/// Old files out, new files in; back again unless it is done.
struct Swap {
    folder: PathBuf,
    placed: Vec<PathBuf>,
    attic: Option<TempDir>,
    /// Names of files in the attic.
    moved: Vec<String>,
    is_done: bool,
}

impl Swap {
    fn move_away(&mut self, names: &[String]) -> io::Result<()> {
        if names.is_empty() {
            return Ok(());
        }
        let attic = tempfile::Builder::new()
            .prefix(ASIDE)
            .tempdir_in(&self.folder)?;
        let attic = self.attic.insert(attic);
        for name in names {
            match fs::rename(self.folder.join(name), attic.path().join(name)) {
                Ok(()) => self.moved.push(name.clone()),
                Err(e) if e.kind() == io::ErrorKind::NotFound => {}
                Err(e) => return Err(e),
            }
        }
        Ok(())
    }
}

impl Drop for Swap {
    fn drop(&mut self) {
        if self.is_done {
            return;
        }
        for path in &self.placed {
            let _ = fs::remove_file(path);
        }
        if let Some(attic) = &self.attic {
            for name in &self.moved {
                let _ = fs::rename(attic.path().join(name), self.folder.join(name));
            }
        }
    }
}

/// A file that takes nothing more once an interruption has come.
pub struct Guarded<'a>(&'a File);

impl Write for Guarded<'_> {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        if STOP.load(Ordering::SeqCst) {
            return Err(io::Error::other("interrupted"));
        }
        self.0.write(bytes)
    }

    fn flush(&mut self) -> io::Result<()> {
        self.0.flush()
    }
}

impl Seek for Guarded<'_> {
    fn seek(&mut self, to: SeekFrom) -> io::Result<u64> {
        self.0.seek(to)
    }
}

/// Names that the report of a set lists, itself included; only names of files within the folder count.
fn listed_files(report: &Path) -> Result<Vec<String>, Failure> {
    let foreign = |message: &str| {
        Failure::of(
            report.display().to_string(),
            Code::FileExists,
            message.to_owned(),
            Some("name another folder with --out".into()),
        )
    };
    let text = files::read_report(report)?;
    let document: serde_json::Value = serde_json::from_str(&text)
        .map_err(|_| foreign("the file is no report of a set, and is left as it is"))?;
    let (Some("render"), Some(listed)) = (document["kind"].as_str(), document["files"].as_array())
    else {
        return Err(foreign(
            "the file is no report of a set, and is left as it is",
        ));
    };
    let mut names: Vec<String> = listed
        .iter()
        .filter_map(|n| n.as_str())
        .filter(|n| is_plain_name(n))
        .map(str::to_owned)
        .collect();
    if !names.iter().any(|n| n == REPORT_FILE) {
        names.push(REPORT_FILE.to_owned());
    }
    Ok(names)
}

fn is_plain_name(name: &str) -> bool {
    let mut parts = Path::new(name).components();
    matches!(parts.next(), Some(std::path::Component::Normal(n)) if n == name)
        && parts.next().is_none()
        && !name.contains(['/', '\\'])
}

/// Is something there, if only a link that leads nowhere?
fn exists(path: &Path) -> bool {
    path.symlink_metadata().is_ok()
}

pub fn unwritable(path: &Path, error: &io::Error) -> Failure {
    Failure::of(
        path.display().to_string(),
        Code::UnwritableOutput,
        format!("this cannot be written: {}", cause(error)),
        None,
    )
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::sync::{Mutex, PoisonError};

    /// The list of folders made is one for the process.
    static ONE_BY_ONE: Mutex<()> = Mutex::new(());

    #[test]
    fn only_names_within_the_folder_are_plain() {
        assert!(is_plain_name("levels.csv"));
        for name in ["", ".", "..", "../x", "/etc/passwd", "a/b", "a/", "a\\b"] {
            assert!(!is_plain_name(name), "{name}");
        }
    }

    #[test]
    fn a_set_that_is_not_committed_leaves_nothing() {
        let _alone = ONE_BY_ONE.lock().unwrap_or_else(PoisonError::into_inner);
        let top = tempfile::tempdir().unwrap();
        let folder = top.path().join("a/b");
        let mut output = Output::open(&folder, Existing::Refuse, &["x".into()]).unwrap();
        output.add_text("x", "half").unwrap();
        assert_eq!(fs::read_dir(&folder).unwrap().count(), 1);
        drop(output);
        assert_eq!(fs::read_dir(top.path()).unwrap().count(), 0);
    }

    #[test]
    fn a_commit_that_fails_puts_the_old_set_back() {
        let _alone = ONE_BY_ONE.lock().unwrap_or_else(PoisonError::into_inner);
        let top = tempfile::tempdir().unwrap();
        let report = format!(r#"{{"kind":"render","files":["old","{REPORT_FILE}"]}}"#);
        fs::write(top.path().join(REPORT_FILE), &report).unwrap();
        fs::write(top.path().join("old"), "old").unwrap();
        let names = ["new".to_owned(), REPORT_FILE.to_owned()];
        let mut output = Output::open(top.path(), Existing::Replace, &names).unwrap();
        output.add_text(REPORT_FILE, "new report").unwrap();
        output.add_text("new", "new").unwrap();
        // Somebody writes a file of that name meanwhile.
        fs::write(top.path().join("new"), "foreign").unwrap();
        assert!(output.commit().is_err());
        let read = |name: &str| fs::read_to_string(top.path().join(name)).unwrap();
        assert_eq!(read(REPORT_FILE), report);
        assert_eq!((read("old"), read("new")), ("old".into(), "foreign".into()));
        assert_eq!(fs::read_dir(top.path()).unwrap().count(), 3);
    }
}
