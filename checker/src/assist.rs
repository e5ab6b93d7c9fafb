//! What an editor asks of a text, answered on byte offsets: hover, completion, names, fixes, hints.
//! Must not know any protocol, nor what any particular rule or key is about.

pub mod complete;
pub mod cursor;
pub mod fix;
pub mod hints;
pub mod hover;
pub mod lay;
pub mod links;
pub mod moved;
pub mod names;
pub mod outline;
pub mod signature;
pub mod tokens;
pub mod web;

#[cfg(test)]
mod tests;

use std::path::Path;
use std::sync::Arc;

use ampspec_grammar::Tree;

use crate::Outcome;
use crate::finding::FileId;
use web::Web;

/// One open text, the files it belongs with, and what the last checks of this very text found.
#[derive(Clone, Copy)]
pub struct Scene<'a> {
    /// Its path, links resolved.
    pub path: &'a Path,
    /// Its tree.
    pub tree: &'a Arc<Tree>,
    /// The files it uses, and those that use it.
    pub web: &'a Web,
    /// Checks that read this text, the one that starts from it first.
    pub outcomes: &'a [Arc<Outcome>],
}

impl<'a> Scene<'a> {
    /// The text.
    #[must_use]
    pub fn text(&self) -> &'a str {
        &self.tree.text
    }

    /// The checks, each with the number that this file has in it.
    pub fn checks(&self) -> impl Iterator<Item = (&'a Outcome, FileId)> + use<'a> {
        let path = self.path;
        self.outcomes
            .iter()
            .filter_map(move |outcome| Some((outcome.as_ref(), outcome.sources.find(path)?)))
    }
}
