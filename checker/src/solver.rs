//! A project read once and solved many times, with lines changed: what sizing and spread are made of.
//! Must not know why a line is changed.

use std::path::Path;
use std::sync::Arc;

use crate::analysis::Tables;
use crate::build::statement::{Declared, Statement};
use crate::build::view::{Seen, names};
use crate::build::{Project, View, project};
use crate::finding::{BuildReport, Finding};
use crate::source::Files;
use crate::{Options, policy, tables, waiver};

/// Blocks that a build reaches at most.
const MOST_BLOCKS: usize = 200;

/// Lines to put in place of others: the block, and the line as if it stood there.
pub type Changes = [(String, Arc<Statement>)];

/// A project that is read.
#[derive(Debug)]
pub struct Solver {
    /// The files and blocks.
    pub project: Project,
    tables: Tables,
    options: Options,
    /// What is wrong with its text.
    pub findings: Vec<Finding>,
}

impl Solver {
    /// Read a file and what it uses.
    ///
    /// # Errors
    /// When the file cannot be read; the text says why.
    pub fn read(
        files: &dyn Files,
        path: &Path,
        shown: &str,
        options: &Options,
    ) -> Result<Self, String> {
        let root = options
            .root
            .as_deref()
            .or_else(|| path.parent())
            .unwrap_or(Path::new(""));
        let mut project = project::load(files, path, shown, root, policy::NAMES)?;
        let mut findings = std::mem::take(&mut project.findings);
        let tables = tables::load(&project, files, &mut findings);
        Ok(Self {
            project,
            tables,
            options: Options {
                changes: false,
                curves: false,
                ..options.clone()
            },
            findings,
        })
    }

    /// The builds asked for, without alternates.
    pub fn builds(&self) -> impl Iterator<Item = &Declared> {
        let only = self.options.build.as_deref();
        self.project
            .of_kind("build")
            .filter(move |b| only.is_none_or(|o| b.name == o))
    }

    /// What a build says with lines changed.
    #[must_use]
    pub fn view<'s>(&'s self, build: &'s Declared, changes: &Changes) -> View<'s> {
        View::new(&self.project, build, None, changes)
    }

    /// The blocks that a build is made of, itself first: all that it names, the only amplifier where it
    /// names none, and what those name.
    #[must_use]
    pub fn blocks<'s>(&'s self, build: &'s Declared) -> Vec<Seen<'s>> {
        let view = self.view(build, &[]);
        let mut queue = vec![build.name.clone()];
        if view.seen(build).line("amplifier").is_none() {
            queue.extend(
                self.project
                    .of_kind("amplifier")
                    .next()
                    .map(|a| a.name.clone()),
            );
        }
        let mut out = Vec::new();
        let mut at = 0;
        while let Some(name) = queue.get(at).cloned() {
            at += 1;
            let Some(declared) = self.project.find(view.name(&name)) else {
                continue;
            };
            let seen = view.seen(declared);
            for next in seen
                .lines
                .iter()
                .flat_map(|l| names(l))
                .map(|n| view.name(n).to_owned())
            {
                if queue.len() < MOST_BLOCKS && !queue.contains(&next) {
                    queue.push(next);
                }
            }
            out.push(seen);
        }
        out
    }

    /// Solve a build with lines changed, waivers honoured.
    #[must_use]
    pub fn solve(&self, build: &Declared, changes: &Changes) -> BuildReport {
        let view = self.view(build, changes);
        let mut findings = Vec::new();
        let (report, _) = crate::solve(&view, &self.options, &self.tables, &mut findings);
        let mut one = [report];
        waiver::apply(&self.project, &self.options, &mut one, &mut findings);
        let [report] = one;
        report
    }
}
