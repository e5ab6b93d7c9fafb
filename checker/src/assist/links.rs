//! The files that a text names, as places to follow. Must not know what is in them.

use std::path::{Path, PathBuf};

use ampspec_grammar::{Span, TokenKind, Tree};

use crate::build::lower;
use crate::source::normal;

/// The path of every `use` and `table`, with its place, quotation marks included.
#[must_use]
pub fn links(path: &Path, tree: &Tree) -> Vec<(Span, PathBuf)> {
    let base = path.parent().unwrap_or(Path::new(""));
    let text = &tree.text;
    let mut out = lower::uses(tree);
    for block in tree.blocks().filter(|b| b.kind.text(text) == "load") {
        for line in block.lines.iter().filter(|l| l.key.text(text) == "table") {
            let texts = line
                .groups
                .iter()
                .flat_map(|g| &g.tokens)
                .filter(|t| t.kind == TokenKind::Text);
            out.extend(texts.map(|t| (t.content(text).to_owned(), t.span)));
        }
    }
    out.into_iter()
        .map(|(text, span)| (span, normal(&base.join(text))))
        .collect()
}
