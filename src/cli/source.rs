//! From a name on the command line to a design ready to be solved.

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};
use std::sync::Arc;

use super::args::DesignChoice;
use super::fault::Failure;
use super::files;
use forehear::design::{self, Design, Places};
use forehear::diagnostic::{Code, Diagnostic, nearest};
use forehear::stage::resolve::{Prepared, prepare};
use forehear::tube::{Catalog, Tube, read_tube};

/// What a tube of the builder's own ends in.
const TUBE_FILE: &str = ".toml";

/// The text of a design, and where it came from.
pub struct DesignText {
    /// As the user calls it.
    pub name: String,
    /// What sets of files are named after.
    pub stem: String,
    pub text: String,
    /// Folder that tube files are sought in.
    folder: PathBuf,
}

/// A design with its tubes and its iron.
pub struct Loaded {
    pub name: String,
    pub stem: String,
    pub prepared: Prepared,
}

/// Finds a shipped design by its name, or reads a file; without a name, the first shipped design.
pub fn design_text(name: Option<&str>) -> Result<DesignText, Failure> {
    let shipped = design::shipped();
    let found = match name {
        None => shipped.first(),
        Some(name) => shipped.iter().find(|(word, _)| *word == name),
    };
    if let Some((word, text)) = found {
        return Ok(DesignText {
            name: (*word).to_owned(),
            stem: (*word).to_owned(),
            text: (*text).to_owned(),
            folder: PathBuf::new(),
        });
    }
    let name = name.unwrap_or_default();
    let path = Path::new(name);
    if !name.contains(['/', '\\', '.']) && !path.exists() {
        let words = shipped.iter().map(|(word, _)| *word);
        let hint = match nearest(name, words.clone()) {
            Some(near) => format!("did you mean `{near}`?"),
            None => format!(
                "the shipped designs are {}",
                words.collect::<Vec<_>>().join(", ")
            ),
        };
        return Err(Failure::of(
            name,
            Code::UnknownDesign,
            format!("`{name}` is neither a shipped design nor a file"),
            Some(hint),
        ));
    }
    Ok(DesignText {
        name: name.to_owned(),
        stem: path
            .file_stem()
            .map_or_else(|| "design".into(), |s| s.to_string_lossy().into_owned()),
        text: files::read_text(path)?,
        folder: path.parent().map(Path::to_owned).unwrap_or_default(),
    })
}

/// Reads the chosen design with its overrides and the tube files it names.
pub fn load(choice: &DesignChoice) -> Result<Loaded, Failure> {
    let source = design_text(choice.design.as_deref())?;
    let in_design = |faults| Failure::in_text(&source.name, Some(source.text.clone()), faults);
    let reading = design::read(&source.text, &choice.overrides).map_err(in_design)?;
    let tubes = OwnTubes::new(&source.folder, &reading.design, &reading.places);
    let prepared = prepare(
        &reading.design,
        &reading.places,
        &Catalog::shipped(),
        &|name| tubes.find(name),
    );
    let mut failure = Failure::default();
    let prepared = match prepared {
        Ok(prepared) => Some(prepared),
        Err(mut faults) => {
            // A tube file that was named and has faults of its own is not unknown.
            faults.retain(|f| {
                !(f.code == Code::UnknownTube && tubes.is_faulty(&f.path, &reading.design))
            });
            if !faults.is_empty() {
                failure.join(in_design(faults));
            }
            None
        }
    };
    let (unread, in_files) = tubes.faults();
    if !unread.is_empty() {
        failure.join(in_design(unread));
    }
    in_files.into_iter().for_each(|f| failure.join(f));
    match prepared {
        Some(prepared) if failure.is_empty() => Ok(Loaded {
            name: source.name,
            stem: source.stem,
            prepared,
        }),
        _ => Err(failure),
    }
}

/// A tube of the catalog, or one read from a file; `None` when the catalog has none of this name.
pub fn tube(name: &str) -> Result<Option<Arc<Tube>>, Failure> {
    if name.ends_with(TUBE_FILE) {
        read_tube_file(Path::new(name)).map(Some)
    } else {
        Ok(Catalog::shipped().find(name))
    }
}

fn read_tube_file(path: &Path) -> Result<Arc<Tube>, Failure> {
    let text = files::read_text(path)?;
    match read_tube(&text) {
        Ok(tube) => Ok(Arc::new(tube)),
        Err(faults) => Err(Failure::in_text(
            path.display().to_string(),
            Some(text),
            faults,
        )),
    }
}

/// Tube files that a design names, each read once.
struct OwnTubes {
    read: BTreeMap<String, Option<Arc<Tube>>>,
    unread: Vec<Diagnostic>,
    faults: Vec<Failure>,
}

impl OwnTubes {
    fn new(folder: &Path, design: &Design, places: &Places) -> OwnTubes {
        let mut read = BTreeMap::new();
        let mut unread = Vec::new();
        let mut faults = Vec::new();
        for stage in &design.stages {
            if !stage.tube.ends_with(TUBE_FILE) || read.contains_key(&stage.tube) {
                continue;
            }
            let path = folder.join(&stage.tube);
            let tube = match read_tube_file(&path) {
                Ok(tube) => Some(tube),
                Err(failure) => {
                    // A file that is not there is the design's fault; what is wrong inside it is its own.
                    let of_file = failure.faults();
                    match of_file.as_slice() {
                        [one] if one.text.is_none() => {
                            let dotted = format!("stage.{}.tube", stage.name);
                            unread.extend(one.diagnostics.iter().map(|d| Diagnostic {
                                path: dotted.clone(),
                                place: places.of(&dotted),
                                message: format!("{}: {}", one.name, d.message),
                                hint: Some(
                                    "a tube file is sought beside the design file".to_owned(),
                                ),
                                ..d.clone()
                            }));
                        }
                        _ => faults.push(failure),
                    }
                    None
                }
            };
            read.insert(stage.tube.clone(), tube);
        }
        OwnTubes {
            read,
            unread,
            faults,
        }
    }

    fn find(&self, name: &str) -> Option<Arc<Tube>> {
        self.read.get(name).cloned().flatten()
    }

    fn is_faulty(&self, path: &str, design: &Design) -> bool {
        design.stages.iter().any(|stage| {
            format!("stage.{}.tube", stage.name) == path
                && matches!(self.read.get(&stage.tube), Some(None))
        })
    }

    fn faults(self) -> (Vec<Diagnostic>, Vec<Failure>) {
        (self.unread, self.faults)
    }
}
