//! One check of one spec on a snapshot, and its findings as diagnostics of each file.
//! Must not know when a check is due.

use std::collections::BTreeMap;
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::path::{Path, PathBuf};
use std::sync::Arc;

use ampspec_grammar::Tree;
use derate::Duty;
use derate::Memory;
use derate::assist::moved::moved;
use derate::render::shown::shown;
use derate::source::Files;
use derate::today::today;
use derate::{Options, Outcome};
use tower_lsp::lsp_types::{Diagnostic, DiagnosticSeverity, Position, Range};

use crate::capabilities::Client;
use crate::convert;
use crate::snapshot::{Noting, Seen, Snapshot};

/// Most specs looked for in a workspace.
const MOST_SPECS: usize = 4000;

/// What every check of a session has in common.
#[derive(Clone, Debug)]
pub(crate) struct Session {
    /// What the client can do.
    pub(crate) client: Client,
    /// A policy that replaces the one each build names.
    pub(crate) policy: Option<String>,
    /// A duty that replaces the one each build states.
    pub(crate) duty: Option<Duty>,
    /// The folders of the workspace, links resolved.
    pub(crate) folders: Vec<PathBuf>,
    /// What earlier checks solved.
    pub(crate) memory: Arc<Memory>,
}

/// The findings of one file, on one text.
#[derive(Clone, Debug)]
pub(crate) struct Page {
    /// The text they are about.
    pub(crate) tree: Arc<Tree>,
    /// The findings.
    pub(crate) diagnostics: Vec<Diagnostic>,
}

/// A check, done.
#[derive(Clone, Debug)]
pub(crate) struct Checked {
    /// Every path it asked for, and what was there.
    pub(crate) seen: BTreeMap<PathBuf, Seen>,
    /// What was found; `None` where the file cannot be read or the check failed.
    pub(crate) outcome: Option<Arc<Outcome>>,
    /// The findings of each file that was read.
    pub(crate) pages: BTreeMap<PathBuf, Page>,
}

impl Session {
    /// The folder that nothing used by a file may leave.
    fn root(&self, path: &Path) -> Option<PathBuf> {
        let holding = self.folders.iter().filter(|f| path.starts_with(f));
        holding.max_by_key(|f| f.components().count()).cloned()
    }

    /// Every spec below the workspace folders, ignored files left out.
    pub(crate) fn specs(&self) -> Vec<PathBuf> {
        let entries = self
            .folders
            .iter()
            .flat_map(|folder| ignore::WalkBuilder::new(folder).build().flatten());
        let files = entries.filter(|e| e.file_type().is_some_and(|t| t.is_file()));
        let specs = files
            .map(ignore::DirEntry::into_path)
            .filter(|p| p.extension().is_some_and(|e| e == "ampspec"));
        specs.take(MOST_SPECS).collect()
    }

    /// The options of a check of this file.
    pub(crate) fn options(&self, path: &Path) -> Options {
        Options {
            policy: self.policy.clone(),
            duty: self.duty.clone(),
            today: today(),
            root: self.root(path),
            memory: Arc::clone(&self.memory),
            ..Options::default()
        }
    }

    /// A path as people see it.
    pub(crate) fn shown(&self, path: &Path) -> String {
        let root = self.root(path);
        let base = root
            .as_deref()
            .or_else(|| path.parent())
            .unwrap_or(Path::new(""));
        path.strip_prefix(base)
            .unwrap_or(path)
            .to_string_lossy()
            .replace('\\', "/")
    }

    /// Check a file. Where nothing but comments and layout changed since `before`, what was found then
    /// is moved to its new places. A panic of the checker becomes a finding at the top of the file.
    pub(crate) fn check(
        &self,
        snapshot: &Snapshot,
        path: &Path,
        before: Option<&Checked>,
    ) -> Checked {
        if let Some(moved) = before.and_then(|b| self.moved(snapshot, b)) {
            return moved;
        }
        let noting = Noting::new(snapshot);
        let (shown, options) = (self.shown(path), self.options(path));
        let done = catch_unwind(AssertUnwindSafe(|| {
            derate::check(&noting, path, &shown, &options)
        }));
        let mut seen = noting.seen();
        seen.entry(path.to_owned()).or_insert(Seen::Nothing);
        match done {
            Ok(Ok(outcome)) => {
                let pages = self.pages(snapshot, &outcome);
                Checked {
                    seen,
                    outcome: Some(Arc::new(outcome)),
                    pages,
                }
            }
            Ok(Err(_)) => Checked {
                seen,
                outcome: None,
                pages: BTreeMap::new(),
            },
            Err(_) => Checked {
                seen,
                outcome: None,
                pages: failed(snapshot, path),
            },
        }
    }

    fn moved(&self, snapshot: &Snapshot, before: &Checked) -> Option<Checked> {
        let outcome = before.outcome.as_ref()?;
        let mut seen = before.seen.clone();
        let mut trees = Vec::new();
        for (path, old) in &mut seen {
            match old {
                Seen::Tree(old) => {
                    let new = snapshot.tree(path).ok()?;
                    if !Arc::ptr_eq(old, &new) {
                        trees.push((outcome.sources.find(path)?, Arc::clone(&new)));
                        *old = new;
                    }
                }
                Seen::Text(old) => {
                    let new = snapshot.read(path).ok()?;
                    if *old != new {
                        return None;
                    }
                }
                Seen::Nothing if snapshot.read(path).is_ok() => return None,
                Seen::Nothing => {}
            }
        }
        let moved = moved(outcome, &trees)?;
        let pages = self.pages(snapshot, &moved);
        Some(Checked {
            seen,
            outcome: Some(Arc::new(moved)),
            pages,
        })
    }

    /// The findings of a check, by file; every file that was read is in it.
    pub(crate) fn pages(&self, snapshot: &Snapshot, outcome: &Outcome) -> BTreeMap<PathBuf, Page> {
        let mut pages: BTreeMap<PathBuf, Page> = BTreeMap::new();
        for (_, file) in outcome.sources.iter() {
            pages.insert(
                file.path.clone(),
                Page {
                    tree: Arc::clone(&file.tree),
                    diagnostics: Vec::new(),
                },
            );
        }
        for finding in shown(&outcome.sources, &outcome.report) {
            let Some(file) = outcome.sources.file(finding.site.file) else {
                continue;
            };
            let Some(page) = pages.get_mut(&file.path) else {
                continue;
            };
            page.diagnostics.extend(convert::diagnostic(
                snapshot,
                outcome,
                &finding,
                &self.client,
            ));
        }
        pages
    }
}

fn failed(snapshot: &Snapshot, path: &Path) -> BTreeMap<PathBuf, Page> {
    let Ok(tree) = snapshot.tree(path) else {
        return BTreeMap::new();
    };
    let top = Position::new(0, 0);
    let diagnostic = Diagnostic {
        range: Range::new(top, top),
        severity: Some(DiagnosticSeverity::ERROR),
        source: Some("derate".to_owned()),
        message: "the check of this text failed inside the program: nothing here has been checked. Please report it".to_owned(),
        ..Diagnostic::default()
    };
    [(
        path.to_owned(),
        Page {
            tree,
            diagnostics: vec![diagnostic],
        },
    )]
    .into()
}
