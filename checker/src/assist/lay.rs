//! The canonical layout as the smallest edits that reach it, so that cursors stay where they are.
//! Must not know what a layout is.

use ampspec_grammar::{Span, Tree};
use similar::{ChangeTag, TextDiff};

/// Edits, in order, that lay the text out; none where it is laid out, or cannot be.
#[must_use]
pub fn edits(tree: &Tree) -> Vec<(Span, String)> {
    let Ok(tidied) = crate::tidy::tidy(&tree.text) else {
        return Vec::new();
    };
    if *tidied == *tree.text {
        return Vec::new();
    }
    let diff = TextDiff::from_lines(&*tree.text, &*tidied);
    let mut out: Vec<(Span, String)> = Vec::new();
    let mut at = 0;
    let mut open = false;
    for change in diff.iter_all_changes() {
        let value = change.value();
        let end = if change.tag() == ChangeTag::Insert {
            at
        } else {
            at + value.len()
        };
        if change.tag() == ChangeTag::Equal {
            open = false;
        } else {
            if !open {
                out.push((Span::at(at), String::new()));
                open = true;
            }
            if let Some((span, text)) = out.last_mut() {
                span.end = end;
                if change.tag() == ChangeTag::Insert {
                    text.push_str(value);
                }
            }
        }
        at = end;
    }
    out
}

/// Those edits that touch a range.
#[must_use]
pub fn edits_in(tree: &Tree, range: Span) -> Vec<(Span, String)> {
    let mut all = edits(tree);
    all.retain(|(span, _)| span.start <= range.end && range.start <= span.end);
    all
}

/// The edits for what was just finished at an offset: the block that a `}` closes, or the line
/// before a line end.
#[must_use]
pub fn edits_behind(tree: &Tree, offset: usize, typed: &str) -> Vec<(Span, String)> {
    let index = tree.line_index();
    let range = if typed == "}" {
        tree.blocks().map(|b| b.span).find(|s| s.touches(offset))
    } else {
        let line = index.line_of(offset);
        line.checked_sub(1).map(|before| index.line_span(before))
    };
    // a whole line is laid out only once it is read without fault
    let Some(range) = range.filter(|r| !r.is_empty() && !tree.is_faulty(*r)) else {
        return Vec::new();
    };
    let mut all = edits(tree);
    let row = |at: usize| index.line_of(at);
    all.retain(|(span, _)| row(range.start) <= row(span.start) && (span.end <= range.end + 2));
    all
}
