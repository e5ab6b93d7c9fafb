//! Which files a command works on, and their texts. Must not know what is done with them.

use std::collections::{HashMap, HashSet};
use std::io::Read;
use std::path::{Path, PathBuf};
use std::sync::{Arc, Mutex, PoisonError};

use ampspec_grammar::{Tree, parse};
use derate::source::{Disk, Files, MAX_BYTES, normal, text_of};

/// The file name ending that is looked for in folders.
const ENDING: &str = "ampspec";
/// Standard input, as a path.
const STDIN: &str = "-";

/// A file to work on.
pub(crate) struct Input {
    /// For reading what it uses.
    pub(crate) path: PathBuf,
    /// As people see it: relative, with `/`.
    pub(crate) name: String,
}

impl Input {
    /// Whether it is standard input.
    pub(crate) fn is_stdin(&self) -> bool {
        self.path == Path::new(STDIN)
    }

    /// A file named on the command line.
    pub(crate) fn new(path: PathBuf) -> Self {
        let name = if path == Path::new(STDIN) {
            "<stdin>".to_owned()
        } else {
            shown(&path)
        };
        Self { path, name }
    }

    /// The folder that what it uses may not leave: the one derate was started in, or, for a file
    /// from elsewhere, its own.
    pub(crate) fn root(&self) -> Option<PathBuf> {
        let elsewhere = self.path.is_absolute() || normal(&self.path).starts_with("..");
        (!elsewhere).then(|| PathBuf::from("."))
    }

    /// The text.
    ///
    /// # Errors
    /// In words, when it cannot be read.
    pub(crate) fn read(&self) -> Result<Arc<str>, String> {
        if !self.is_stdin() {
            return Disk.read(&self.path);
        }
        let mut bytes = Vec::new();
        std::io::stdin()
            .lock()
            .take(MAX_BYTES + 1)
            .read_to_end(&mut bytes)
            .map_err(|e| e.to_string())?;
        if bytes.len() as u64 > MAX_BYTES {
            return Err("it is larger than 16 MiB".to_owned());
        }
        Ok(text_of(bytes))
    }
}

/// `./kits/a.ampspec` as `kits/a.ampspec`.
fn shown(path: &Path) -> String {
    let parts: Vec<_> = normal(path)
        .components()
        .map(|c| c.as_os_str().to_string_lossy().into_owned())
        .collect();
    // the root of an absolute path is a component that already is the separator
    parts.join("/").replacen("//", "/", 1)
}

/// The files named, and every spec below the folders named, ignored files left out; the folder one is
/// in where nothing is named. Sorted within each folder, each file once.
///
/// The second list says what could not be read.
pub(crate) fn inputs(paths: &[PathBuf]) -> (Vec<Input>, Vec<String>) {
    let here = [PathBuf::from(".")];
    let paths = if paths.is_empty() { &here[..] } else { paths };
    let mut found: Vec<PathBuf> = Vec::new();
    let mut notes = Vec::new();
    for path in paths {
        if !path.is_dir() {
            found.push(path.clone());
            continue;
        }
        let below = below(path, &mut notes);
        if below.is_empty() {
            notes.push(format!("no .{ENDING} file below {}", path.display()));
        }
        found.extend(below);
    }
    let mut seen = HashSet::new();
    found.retain(|path| seen.insert(normal(path)));
    (found.into_iter().map(Input::new).collect(), notes)
}

fn below(folder: &Path, notes: &mut Vec<String>) -> Vec<PathBuf> {
    let mut found = Vec::new();
    for entry in ignore::WalkBuilder::new(folder).build() {
        match entry {
            Ok(entry) => {
                let file = entry.file_type().is_some_and(|t| t.is_file());
                if file && entry.path().extension().is_some_and(|e| e == ENDING) {
                    found.push(entry.into_path());
                }
            }
            Err(error) => notes.push(error.to_string()),
        }
    }
    found.sort();
    found
}

/// Trees of the files that several specs use, each parsed once in a run.
#[derive(Default)]
pub(crate) struct Shelf(Mutex<HashMap<PathBuf, Arc<Tree>>>);

impl Shelf {
    fn tree(&self, path: &Path) -> Result<Arc<Tree>, String> {
        let shelf = || self.0.lock().unwrap_or_else(PoisonError::into_inner);
        if let Some(tree) = shelf().get(path) {
            return Ok(Arc::clone(tree));
        }
        // parsed with the shelf free: twice now and then, but nobody waits
        let tree = Disk.tree(path)?;
        shelf().insert(path.to_owned(), Arc::clone(&tree));
        Ok(tree)
    }
}

/// A text that is already read, over the disk for all that it uses.
pub(crate) struct Given<'a> {
    /// Its path.
    pub(crate) path: &'a Path,
    /// The text.
    pub(crate) text: Arc<str>,
    /// Trees of the others.
    pub(crate) shelf: &'a Shelf,
}

impl Files for Given<'_> {
    fn read(&self, path: &Path) -> Result<Arc<str>, String> {
        if path == self.path {
            Ok(Arc::clone(&self.text))
        } else {
            Disk.read(path)
        }
    }
    fn tree(&self, path: &Path) -> Result<Arc<Tree>, String> {
        if path == self.path {
            Ok(Arc::new(parse(Arc::clone(&self.text))))
        } else {
            self.shelf.tree(path)
        }
    }
    fn resolve(&self, path: &Path) -> PathBuf {
        // standard input is no file, and stands in the folder one is in
        if path == Path::new(STDIN) {
            path.to_owned()
        } else {
            Disk.resolve(path)
        }
    }
}
