//! The files of a workspace and which uses which, without checking any of them.
//! Must not know what a statement says beyond the names and paths in it.

use std::collections::{HashMap, VecDeque};
use std::path::{Path, PathBuf};
use std::sync::Arc;

use ampspec_grammar::{Span, Tree};

use crate::build::lower;
use crate::source::{Files, normal};
use crate::vocabulary::Block;

use super::names::{Name, Role, of_tree};

/// Most files that are followed.
const MOST_FILES: usize = 4000;

/// Names of blocks and their kinds.
pub type Kinds = HashMap<String, &'static Block>;

/// A file.
#[derive(Clone, Debug)]
pub struct Page {
    /// Its path, links resolved.
    pub path: PathBuf,
    /// Its tree.
    pub tree: Arc<Tree>,
    /// The files it names with `use`, links resolved.
    pub uses: Vec<PathBuf>,
}

/// Files that may have to do with one another.
#[derive(Clone, Debug, Default)]
pub struct Web {
    pages: Vec<Page>,
    at: HashMap<PathBuf, usize>,
}

/// A place in a file.
#[derive(Clone, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Spot {
    /// The file.
    pub path: PathBuf,
    /// The bytes.
    pub span: Span,
}

/// A declared block.
#[derive(Clone, Debug)]
pub struct Declaration {
    /// Its name.
    pub name: String,
    /// Its kind.
    pub kind: &'static Block,
    /// Its title, without quotation marks.
    pub title: Option<String>,
    /// The name in the header.
    pub spot: Spot,
    /// The header.
    pub header: Span,
    /// The whole block.
    pub whole: Span,
}

impl Web {
    /// The files at these paths and all that they use. What cannot be read is left out.
    #[must_use]
    pub fn load(files: &dyn Files, seeds: impl IntoIterator<Item = PathBuf>) -> Self {
        let mut web = Self::default();
        let mut open: VecDeque<PathBuf> = seeds.into_iter().collect();
        while let Some(path) = open.pop_front() {
            if web.at.contains_key(&path) || web.pages.len() >= MOST_FILES {
                continue;
            }
            let Ok(tree) = files.tree(&path) else {
                continue;
            };
            let base = path.parent().unwrap_or(Path::new(""));
            let uses: Vec<PathBuf> = lower::uses(&tree)
                .into_iter()
                .map(|(text, _)| files.resolve(&normal(&base.join(text))))
                .collect();
            open.extend(uses.iter().cloned());
            web.at.insert(path.clone(), web.pages.len());
            web.pages.push(Page { path, tree, uses });
        }
        web
    }

    /// The file at a path.
    #[must_use]
    pub fn page(&self, path: &Path) -> Option<&Page> {
        self.at.get(path).and_then(|at| self.pages.get(*at))
    }

    /// Every file.
    #[must_use]
    pub fn pages(&self) -> &[Page] {
        &self.pages
    }

    /// A file and all that it uses, itself first.
    #[must_use]
    pub fn project(&self, root: &Path) -> Vec<&Page> {
        let mut found: Vec<&Page> = self.page(root).into_iter().collect();
        let mut next = 0;
        while let Some(page) = found.get(next) {
            next += 1;
            for used in &page.uses {
                if !found.iter().any(|p| p.path == *used) {
                    found.extend(self.page(used));
                }
            }
        }
        found
    }

    /// The files from which this one is reached, itself first.
    #[must_use]
    pub fn roots_of(&self, path: &Path) -> Vec<&Page> {
        let mut found: Vec<&Page> = self.page(path).into_iter().collect();
        let mut next = 0;
        while let Some(page) = found.get(next).copied() {
            next += 1;
            for user in self.pages.iter().filter(|p| p.uses.contains(&page.path)) {
                if !found.iter().any(|p| p.path == user.path) {
                    found.push(user);
                }
            }
        }
        found
    }

    /// The files in which a name of this file may be declared or used: its own project first, then
    /// the projects it is a part of.
    #[must_use]
    pub fn around(&self, path: &Path) -> Vec<&Page> {
        let mut found: Vec<&Page> = Vec::new();
        for root in self.roots_of(path) {
            for page in self.project(&root.path) {
                if !found.iter().any(|p| p.path == page.path) {
                    found.push(page);
                }
            }
        }
        found
    }

    /// Every block that can be named in this file.
    #[must_use]
    pub fn declarations(&self, path: &Path) -> Vec<Declaration> {
        self.around(path)
            .into_iter()
            .flat_map(declarations)
            .collect()
    }

    /// The block of this name as seen from this file.
    #[must_use]
    pub fn find(&self, path: &Path, name: &str) -> Option<Declaration> {
        self.around(path)
            .into_iter()
            .flat_map(declarations)
            .find(|d| d.name == name)
    }

    /// Names and kinds that can be named in this file.
    #[must_use]
    pub fn kinds(&self, path: &Path) -> Kinds {
        let mut kinds = Kinds::new();
        for page in self.around(path) {
            for (name, kind) in lower::declared_kinds(&page.tree) {
                kinds.entry(name.to_owned()).or_insert(kind);
            }
        }
        kinds
    }

    /// The name at an offset of a file.
    #[must_use]
    pub fn name_at(&self, path: &Path, offset: usize) -> Option<Name> {
        let page = self.page(path)?;
        of_tree(&page.tree, &self.kinds(path))
            .into_iter()
            .find(|n| n.span.touches(offset))
    }

    /// Every place where the block of this name, as seen from this file, is declared or used.
    #[must_use]
    pub fn occurrences(&self, path: &Path, name: &str) -> Vec<(Spot, Role)> {
        // the projects that hold the declaration are those in which the name means it
        let home = self
            .find(path, name)
            .map_or_else(|| path.to_owned(), |d| d.spot.path);
        let mut found = Vec::new();
        for page in self.around(&home) {
            let kinds = self.kinds(&page.path);
            for one in of_tree(&page.tree, &kinds) {
                if one.span.slice(&page.tree.text) == name {
                    found.push((
                        Spot {
                            path: page.path.clone(),
                            span: one.span,
                        },
                        one.role,
                    ));
                }
            }
        }
        found.sort();
        found.dedup();
        found
    }
}

/// The blocks of a file.
pub fn declarations(page: &Page) -> impl Iterator<Item = Declaration> + '_ {
    let text = &page.tree.text;
    page.tree.blocks().filter_map(move |block| {
        let name = block.name()?;
        let title = block
            .header
            .iter()
            .find(|t| t.kind == ampspec_grammar::TokenKind::Text);
        Some(Declaration {
            name: name.text(text).to_owned(),
            kind: crate::vocabulary::block_kind(block.kind.text(text))?,
            title: title.map(|t| t.content(text).to_owned()),
            spot: Spot {
                path: page.path.clone(),
                span: name.span,
            },
            header: block.header_span,
            whole: block.span,
        })
    })
}
