//! A file as it stood in a revision of the git repository one is in, with all that it uses.
//! Must not know what is done with the texts.

use std::ffi::OsStr;
use std::path::{Component, Path, PathBuf};
use std::process::Command;
use std::sync::Arc;

use derate::source::{Files, MAX_BYTES, normal, text_of};

/// The files of one revision. A path is written from the top of the repository and begins with `/`.
pub(crate) struct Revision {
    /// The top folder of the repository.
    top: PathBuf,
    /// The commit, spelled out.
    commit: String,
}

/// A file of a revision, found.
pub(crate) struct Found {
    /// The revision.
    pub(crate) files: Revision,
    /// The file in it.
    pub(crate) path: PathBuf,
    /// The folder that what it uses may not leave.
    pub(crate) root: PathBuf,
}

/// `HEAD~1:kit.ampspec` as revision and path; none for what names a file that is there.
pub(crate) fn split(text: &str) -> Option<(&str, &str)> {
    if Path::new(text).exists() {
        return None;
    }
    let (revision, path) = text.split_once(':')?;
    // one letter is the drive of a path
    (revision.len() > 1 && !path.is_empty()).then_some((revision, path))
}

/// Find a file of a revision. As git has it, the path counts from the top of the repository, or from
/// the folder one is in where it begins with `./` or `../`; where there is nothing at the top, the
/// folder one is in is tried as well.
///
/// # Errors
/// In words, when there is no repository, no such revision, or no such file in it.
pub(crate) fn find(revision: &str, path: &str) -> Result<Found, String> {
    let top = git(Path::new("."), ["rev-parse", "--show-toplevel"])?;
    let top = PathBuf::from(line(&top));
    let inside = git(Path::new("."), ["rev-parse", "--show-prefix"])?;
    let here = Path::new("/").join(line(&inside));
    let wanted = format!("{revision}^{{commit}}");
    let commit = git(
        &top,
        [
            "rev-parse",
            "--verify",
            "--quiet",
            "--end-of-options",
            wanted.as_str(),
        ],
    )
    .map_err(|_| format!("git knows no revision {revision}"))?;
    let files = Revision {
        top,
        commit: line(&commit),
    };
    let beside = normal(&here.join(path));
    let from_top = normal(&Path::new("/").join(path));
    let relative = path.starts_with("./") || path.starts_with("../");
    let tries = if relative {
        vec![beside]
    } else {
        vec![from_top, beside]
    };
    for path in tries {
        if files.object(&path).is_ok() {
            let root = if path.starts_with(&here) {
                here
            } else {
                path.parent().unwrap_or(Path::new("/")).to_owned()
            };
            return Ok(Found { files, path, root });
        }
    }
    Err(format!("there is no such file in {revision}"))
}

impl Revision {
    /// The object that holds a file.
    fn object(&self, path: &Path) -> Result<String, String> {
        let absent = || "there is no such file in this revision".to_owned();
        let inside = path.strip_prefix("/").map_err(|_| absent())?;
        if inside
            .components()
            .any(|c| !matches!(c, Component::Normal(_)))
        {
            return Err(absent());
        }
        let commit = OsStr::new(self.commit.as_str());
        let plain = ["--literal-pathspecs", "ls-tree", "-l", "-z", "--full-tree"].map(OsStr::new);
        let arguments = plain
            .into_iter()
            .chain([commit, OsStr::new("--"), inside.as_os_str()]);
        let listed = git(&self.top, arguments)?;
        // mode, kind, object and size, then a tab and the name
        let listed = String::from_utf8_lossy(&listed).into_owned();
        let about = listed.split('\t').next().unwrap_or_default();
        let mut words = about.split_whitespace();
        let (mode, kind) = (words.next(), words.next());
        let (object, size) = (words.next(), words.next());
        let Some((object, size)) = object.zip(size) else {
            return Err(absent());
        };
        if kind != Some("blob") || !mode.is_some_and(|m| m.starts_with("100")) {
            return Err("it is not a regular file".to_owned());
        }
        if size.parse::<u64>().map_or(true, |size| size > MAX_BYTES) {
            return Err("it is larger than 16 MiB".to_owned());
        }
        Ok(object.to_owned())
    }
}

impl Files for Revision {
    fn read(&self, path: &Path) -> Result<Arc<str>, String> {
        let object = self.object(path)?;
        git(&self.top, ["cat-file", "blob", object.as_str()]).map(text_of)
    }
    fn resolve(&self, path: &Path) -> PathBuf {
        // a link is no regular file here, so that there is none to follow
        normal(path)
    }
}

/// What git prints, or in words why it does not. The arguments go to the program as they are; no
/// shell reads them, and nothing is fetched.
fn git<I>(folder: &Path, arguments: I) -> Result<Vec<u8>, String>
where
    I: IntoIterator,
    I::Item: AsRef<OsStr>,
{
    let output = Command::new("git")
        .arg("-C")
        .arg(folder)
        .args(arguments)
        .env("GIT_NO_LAZY_FETCH", "1")
        .env("GIT_OPTIONAL_LOCKS", "0")
        .output()
        .map_err(|error| format!("git cannot be started: {error}"))?;
    if output.status.success() {
        return Ok(output.stdout);
    }
    let said = String::from_utf8_lossy(&output.stderr).into_owned();
    Err(said.lines().next().unwrap_or("git failed").to_owned())
}

/// The first line, without its end.
fn line(bytes: &[u8]) -> String {
    let text = String::from_utf8_lossy(bytes);
    text.lines().next().unwrap_or_default().to_owned()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_revision_stands_before_the_colon() {
        assert_eq!(
            split("HEAD~1:kits/a.ampspec"),
            Some(("HEAD~1", "kits/a.ampspec"))
        );
        assert_eq!(split("C:kit.ampspec"), None);
        assert_eq!(split(":kit.ampspec"), None);
        assert_eq!(split("kit.ampspec"), None);
        assert_eq!(split("HEAD:"), None);
    }
}
