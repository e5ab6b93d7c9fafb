//! What is read at one moment: open buffers win over the disk, and files of the disk are kept until
//! they change. Must not know what is read for.

use std::cell::RefCell;
use std::collections::{BTreeMap, HashMap};
use std::path::{Path, PathBuf};
use std::sync::{Arc, Mutex, PoisonError};
use std::time::SystemTime;

use ampspec_grammar::{Tree, parse};
use derate::source::{Disk, Files, normal};
use tower_lsp::lsp_types::Url;

/// An open document.
#[derive(Clone, Debug)]
pub(crate) struct Buffer {
    /// As the client names it.
    pub(crate) uri: Url,
    /// As the client counts it.
    pub(crate) version: i32,
    /// Its tree; the text is `tree.text`.
    pub(crate) tree: Arc<Tree>,
}

/// Everything that can be read, as of one moment. Cheap to clone.
#[derive(Clone, Debug, Default)]
pub(crate) struct Snapshot {
    /// Open documents by path, links resolved.
    pub(crate) buffers: Arc<HashMap<PathBuf, Buffer>>,
    shelf: Arc<Shelf>,
}

/// Files of the disk, kept until they change.
#[derive(Debug, Default)]
struct Shelf {
    texts: Mutex<HashMap<PathBuf, Kept>>,
    trees: Mutex<HashMap<PathBuf, Arc<Tree>>>,
    resolved: Mutex<HashMap<PathBuf, PathBuf>>,
}

#[derive(Clone, Debug)]
struct Kept {
    stamp: (Option<SystemTime>, u64),
    text: Arc<str>,
}

fn held<T>(lock: &Mutex<T>) -> std::sync::MutexGuard<'_, T> {
    lock.lock().unwrap_or_else(PoisonError::into_inner)
}

impl Shelf {
    fn text(&self, path: &Path) -> Result<Arc<str>, String> {
        let stamp = std::fs::metadata(path)
            .map(|m| (m.modified().ok(), m.len()))
            .ok();
        if let (Some(stamp), Some(kept)) = (stamp, held(&self.texts).get(path))
            && kept.stamp == stamp
        {
            return Ok(Arc::clone(&kept.text));
        }
        let text = Disk.read(path)?;
        if let Some(stamp) = stamp {
            held(&self.texts).insert(
                path.to_owned(),
                Kept {
                    stamp,
                    text: Arc::clone(&text),
                },
            );
        }
        Ok(text)
    }

    fn tree(&self, path: &Path) -> Result<Arc<Tree>, String> {
        let text = self.text(path)?;
        if let Some(tree) = held(&self.trees).get(path)
            && Arc::ptr_eq(&tree.text, &text)
        {
            return Ok(Arc::clone(tree));
        }
        let tree = Arc::new(parse(text));
        held(&self.trees).insert(path.to_owned(), Arc::clone(&tree));
        Ok(tree)
    }
}

impl Snapshot {
    /// Forget how paths resolve: files have come or gone.
    pub(crate) fn forget(&self) {
        held(&self.shelf.resolved).clear();
    }

    /// The path of a document. One that is no file has a path that no file has.
    pub(crate) fn path_of(&self, uri: &Url) -> PathBuf {
        match uri.to_file_path() {
            Ok(path) => self.resolve(&path),
            Err(()) => PathBuf::from(uri.as_str()),
        }
    }

    /// What the client calls a path.
    pub(crate) fn uri_of(&self, path: &Path) -> Option<Url> {
        match self.buffers.get(path) {
            Some(buffer) => Some(buffer.uri.clone()),
            None if path.is_absolute() => Url::from_file_path(path).ok(),
            None => None,
        }
    }
}

impl Files for Snapshot {
    fn read(&self, path: &Path) -> Result<Arc<str>, String> {
        match self.buffers.get(path) {
            Some(buffer) => Ok(Arc::clone(&buffer.tree.text)),
            None if path.is_absolute() => self.shelf.text(path),
            None => Err("this text is not saved, so that there is no folder to look in".to_owned()),
        }
    }

    fn tree(&self, path: &Path) -> Result<Arc<Tree>, String> {
        match self.buffers.get(path) {
            Some(buffer) => Ok(Arc::clone(&buffer.tree)),
            None if path.is_absolute() => self.shelf.tree(path),
            None => self.read(path).map(|text| Arc::new(parse(text))),
        }
    }

    fn resolve(&self, path: &Path) -> PathBuf {
        if !path.is_absolute() {
            return path.to_owned();
        }
        if let Some(known) = held(&self.shelf.resolved).get(path) {
            return known.clone();
        }
        let found = resolve(path);
        held(&self.shelf.resolved).insert(path.to_owned(), found.clone());
        found
    }
}

/// Links resolved as far as the path exists: a new buffer may not be on the disk yet.
fn resolve(path: &Path) -> PathBuf {
    let path = normal(path);
    let mut missing = Vec::new();
    let mut at = path.as_path();
    loop {
        if let Ok(mut found) = std::fs::canonicalize(at) {
            found.extend(missing.iter().rev());
            return found;
        }
        match (at.parent(), at.file_name()) {
            (Some(parent), Some(name)) => {
                missing.push(name);
                at = parent;
            }
            _ => return path,
        }
    }
}

/// What a check found at a path.
#[derive(Clone, Debug)]
pub(crate) enum Seen {
    /// A spec.
    Tree(Arc<Tree>),
    /// Another text.
    Text(Arc<str>),
    /// Nothing that can be read.
    Nothing,
}

/// A snapshot that notes what is asked for, there or not.
#[derive(Debug)]
pub(crate) struct Noting<'a> {
    snapshot: &'a Snapshot,
    seen: RefCell<BTreeMap<PathBuf, Seen>>,
}

impl<'a> Noting<'a> {
    /// Nothing asked yet.
    pub(crate) fn new(snapshot: &'a Snapshot) -> Self {
        Self {
            snapshot,
            seen: RefCell::default(),
        }
    }

    /// What was asked for, and found.
    pub(crate) fn seen(self) -> BTreeMap<PathBuf, Seen> {
        self.seen.into_inner()
    }

    fn note(&self, path: &Path, seen: Seen) {
        self.seen.borrow_mut().insert(path.to_owned(), seen);
    }
}

impl Files for Noting<'_> {
    fn read(&self, path: &Path) -> Result<Arc<str>, String> {
        let text = self.snapshot.read(path);
        self.note(
            path,
            text.as_ref()
                .map_or(Seen::Nothing, |t| Seen::Text(Arc::clone(t))),
        );
        text
    }
    fn tree(&self, path: &Path) -> Result<Arc<Tree>, String> {
        let tree = self.snapshot.tree(path);
        self.note(
            path,
            tree.as_ref()
                .map_or(Seen::Nothing, |t| Seen::Tree(Arc::clone(t))),
        );
        tree
    }
    fn resolve(&self, path: &Path) -> PathBuf {
        self.snapshot.resolve(path)
    }
}
