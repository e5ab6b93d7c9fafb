//! Writing a file so that no reader ever sees half of it. Must not know what is written.

use std::fs::{self, File, OpenOptions};
use std::io::{self, Write};
use std::path::{Path, PathBuf};

/// Names tried for the temporary file.
const TRIES: u32 = 100;

/// Put `text` in place of what `path` holds. The permissions of a file that is there are kept, a link
/// keeps pointing where it points, and what is no regular file is written to directly.
///
/// # Errors
/// When the file cannot be written; it then still holds what it held.
pub(crate) fn replace(path: &Path, text: &str) -> io::Result<()> {
    // a link is followed so that its target is replaced, not the link
    let path = fs::canonicalize(path).unwrap_or_else(|_| path.to_owned());
    let before = fs::metadata(&path).ok();
    if before.as_ref().is_some_and(|m| !m.is_file()) {
        return OpenOptions::new()
            .write(true)
            .open(&path)?
            .write_all(text.as_bytes());
    }
    let (temporary, mut file) = beside(&path)?;
    let written = file
        .write_all(text.as_bytes())
        .and_then(|()| before.map_or(Ok(()), |m| file.set_permissions(m.permissions())))
        .and_then(|()| file.sync_all())
        .and_then(|()| fs::rename(&temporary, &path));
    if written.is_err() {
        // the first error is the one to tell
        let _ = fs::remove_file(&temporary);
    }
    written
}

/// A new file in the same folder, so that renaming it is one step.
fn beside(path: &Path) -> io::Result<(PathBuf, File)> {
    let name = path
        .file_name()
        .ok_or_else(|| io::Error::from(io::ErrorKind::InvalidInput))?;
    for attempt in 0..TRIES {
        let mut hidden = std::ffi::OsString::from(".");
        hidden.push(name);
        hidden.push(format!(".{}-{attempt}", std::process::id()));
        let temporary = path.with_file_name(hidden);
        match OpenOptions::new()
            .write(true)
            .create_new(true)
            .open(&temporary)
        {
            Err(error) if error.kind() == io::ErrorKind::AlreadyExists => {}
            opened => return opened.map(|file| (temporary, file)),
        }
    }
    Err(io::ErrorKind::AlreadyExists.into())
}
