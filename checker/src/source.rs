//! The files of one check: texts, their trees, and which uses which.
//! Must not know what the statements in them mean beyond `use` and `table` paths.

use std::collections::HashMap;
use std::path::{Component, Path, PathBuf};
use std::sync::Arc;

use ampspec_grammar::{Tree, parse};

use crate::finding::FileId;

/// Largest file that is read, in bytes.
pub const MAX_BYTES: u64 = 16 * 1024 * 1024;

/// Where texts come from. The command line reads the disk; the editor lets open buffers win.
pub trait Files {
    /// The text at a path, or why not, in words that end a sentence (`it is larger than 16 MiB`).
    ///
    /// # Errors
    /// When the file is absent, not a regular file, too large, or unreadable.
    fn read(&self, path: &Path) -> Result<Arc<str>, String>;
    /// The tree of the text at a path. An editor keeps trees of files that did not change.
    ///
    /// # Errors
    /// As [`Files::read`].
    fn tree(&self, path: &Path) -> Result<Arc<Tree>, String> {
        Ok(Arc::new(parse(self.read(path)?)))
    }
    /// The path with links resolved, for the check that it stays below the root.
    fn resolve(&self, path: &Path) -> PathBuf;
}

/// The disk.
#[derive(Debug, Default, Clone, Copy)]
pub struct Disk;

impl Files for Disk {
    fn read(&self, path: &Path) -> Result<Arc<str>, String> {
        let about = std::fs::metadata(path).map_err(|e| match e.kind() {
            std::io::ErrorKind::NotFound => "there is no such file".to_owned(),
            _ => e.to_string(),
        })?;
        if !about.is_file() {
            return Err("it is not a regular file".to_owned());
        }
        if about.len() > MAX_BYTES {
            return Err("it is larger than 16 MiB".to_owned());
        }
        let bytes = std::fs::read(path).map_err(|e| e.to_string())?;
        Ok(text_of(bytes))
    }
    fn resolve(&self, path: &Path) -> PathBuf {
        std::fs::canonicalize(path).unwrap_or_else(|_| normal(path))
    }
}

/// Bytes as text: what is not UTF-8 becomes the replacement character, so that any bytes have a text
/// and the parser can point at the place.
#[must_use]
pub fn text_of(bytes: Vec<u8>) -> Arc<str> {
    match String::from_utf8(bytes) {
        Ok(text) => text.into(),
        Err(bad) => String::from_utf8_lossy(bad.as_bytes()).into_owned().into(),
    }
}

/// `a/./b/../c` as `a/c`, without asking the disk.
#[must_use]
pub fn normal(path: &Path) -> PathBuf {
    let mut out = PathBuf::new();
    for part in path.components() {
        match part {
            Component::CurDir => {}
            Component::ParentDir
                if matches!(out.components().next_back(), Some(Component::Normal(_))) =>
            {
                out.pop();
            }
            other => out.push(other),
        }
    }
    out
}

/// One file.
#[derive(Debug, Clone)]
pub struct File {
    /// As shown to people: relative to where the check was started, with `/`.
    pub name: String,
    /// For reading what it uses.
    pub path: PathBuf,
    /// Its tree; the text is `tree.text`.
    pub tree: Arc<Tree>,
    /// The files it names with `use`, in order.
    pub uses: Vec<FileId>,
}

/// The files of one check; the root file is first.
#[derive(Debug, Clone, Default)]
pub struct Sources {
    files: Vec<File>,
    by_path: HashMap<PathBuf, FileId>,
}

impl Sources {
    /// Add a text under a path and a shown name.
    pub fn add(&mut self, path: PathBuf, name: String, tree: Arc<Tree>) -> FileId {
        let id = FileId(u32::try_from(self.files.len()).unwrap_or(u32::MAX));
        self.by_path.insert(path.clone(), id);
        self.files.push(File {
            name,
            path,
            tree,
            uses: Vec::new(),
        });
        id
    }
    /// The file with this id. Ids come from [`Sources::add`] of the same value.
    #[must_use]
    pub fn file(&self, id: FileId) -> Option<&File> {
        self.files.get(id.0 as usize)
    }
    /// Its text, empty for an id of another `Sources`.
    #[must_use]
    pub fn text(&self, id: FileId) -> &str {
        self.file(id).map_or("", |f| &f.tree.text)
    }
    /// The id under a path.
    #[must_use]
    pub fn find(&self, path: &Path) -> Option<FileId> {
        self.by_path.get(path).copied()
    }
    /// Note that `file` uses `used`.
    pub fn note_use(&mut self, file: FileId, used: FileId) {
        if let Some(f) = self.files.get_mut(file.0 as usize) {
            f.uses.push(used);
        }
    }
    /// All files with their ids, root first.
    pub fn iter(&self) -> impl Iterator<Item = (FileId, &File)> {
        (0u32..).map(FileId).zip(&self.files)
    }
}
