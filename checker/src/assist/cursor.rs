//! Where in a text a cursor stands: outside blocks, in a header, at a key, among the values of a key.
//! Must not know what is done there.

use ampspec_grammar::{Block, Item, Line, PieceKind, Token, Tree};

use crate::vocabulary::{self, Key, STATEMENTS, block_kind};

use super::web::Kinds;

/// What surrounds a cursor.
#[derive(Clone, Debug)]
pub enum Place<'a> {
    /// Inside a comment.
    Comment,
    /// Where a statement or a header begins.
    Outside,
    /// After the kind of a block, before its brace.
    Header {
        /// The kind.
        kind: &'static vocabulary::Block,
        /// The tokens of the header before the one at the cursor.
        before: Vec<Token>,
    },
    /// Where a key of a block begins.
    Key {
        /// The block.
        block: &'a Block,
        /// Its kind.
        kind: &'static vocabulary::Block,
    },
    /// After a key.
    Values(Values),
}

/// What surrounds a cursor after a key.
#[derive(Clone, Debug)]
pub struct Values {
    /// The key; of a changed line, the changed one.
    pub key: &'static Key,
    /// Number of the group, from 0.
    pub group: usize,
    /// The tokens of the group before the one at the cursor. A changed line begins after its own key.
    pub before: Vec<Token>,
    /// For `change`: how many of block and key are still to be named, and the kind of the block.
    pub change: Change,
}

/// How far a `change` has been typed.
#[derive(Clone, Copy, Debug)]
pub enum Change {
    /// It is no `change`, or both block and key are there.
    Settled,
    /// The block comes next.
    Block,
    /// The key comes next.
    Key(&'static vocabulary::Block),
}

/// The token that the cursor touches; of two, the one that begins there.
#[must_use]
pub fn token_at(tree: &Tree, offset: usize) -> Option<Token> {
    let tokens = tree.pieces().filter_map(|p| match p.kind {
        PieceKind::Token(kind) => Some(Token { kind, span: p.span }),
        _ => None,
    });
    tokens.filter(|t| t.span.touches(offset)).last()
}

/// The line of a tree that holds the cursor, with its block.
#[must_use]
pub fn line_at(tree: &Tree, offset: usize) -> Option<(Option<&Block>, &Line)> {
    tree.items.iter().find_map(|item| match item {
        Item::Line(line) => line.span.touches(offset).then_some((None, line)),
        Item::Block(block) => block
            .lines
            .iter()
            .find(|l| l.span.touches(offset))
            .map(|l| (Some(block), l)),
    })
}

/// The block that holds the cursor.
#[must_use]
pub fn block_at(tree: &Tree, offset: usize) -> Option<&Block> {
    tree.blocks()
        .filter(|b| b.span.start <= offset)
        .last()
        .filter(|b| match b.close {
            Some(close) => offset < close.end,
            None => true,
        })
}

/// What surrounds the cursor.
#[must_use]
pub fn place<'a>(tree: &'a Tree, offset: usize, kinds: &Kinds) -> Place<'a> {
    let commented = tree
        .pieces()
        .any(|p| p.kind == PieceKind::Comment && p.span.start < offset && p.span.touches(offset));
    if commented {
        return Place::Comment;
    }
    let text = &tree.text;
    if let Some(block) = block_at(tree, offset) {
        let Some(kind) = block_kind(block.kind.text(text)) else {
            return Place::Outside;
        };
        if block.kind.span.touches(offset) {
            return Place::Outside;
        }
        if offset <= block.open.start {
            let before = block
                .header
                .iter()
                .filter(|t| t.span.end < offset)
                .copied()
                .collect();
            return Place::Header { kind, before };
        }
        return match block.lines.iter().rfind(|l| l.span.start <= offset) {
            Some(line) if continues(tree, line, offset) => values(tree, kind, line, offset, kinds)
                .map_or(Place::Key { block, kind }, Place::Values),
            _ => Place::Key { block, kind },
        };
    }
    let lines = tree.items.iter().filter_map(|i| match i {
        Item::Line(line) => Some(line),
        Item::Block(_) => None,
    });
    let Some(line) = lines
        .rev()
        .find(|l| l.span.start <= offset && continues(tree, l, offset))
    else {
        return Place::Outside;
    };
    if line.key.span.touches(offset) {
        return Place::Outside;
    }
    let word = line.key.text(text);
    let before = before(line, 0, offset);
    if let Some(kind) = block_kind(word) {
        return Place::Header { kind, before };
    }
    match STATEMENTS.iter().find(|k| k.name == word) {
        Some(key) => Place::Values(Values {
            key,
            group: 0,
            before,
            change: Change::Settled,
        }),
        None => Place::Outside,
    }
}

/// Whether a cursor after the start of a line still belongs to it.
fn continues(tree: &Tree, line: &Line, offset: usize) -> bool {
    let index = tree.line_index();
    if index.line_of(offset) <= index.line_of(line.span.end) {
        return true;
    }
    let between = tree.text.get(line.span.end..offset).unwrap_or("");
    let rest: String = between
        .split('\n')
        .map(|l| l.split('#').next().unwrap_or(""))
        .collect();
    rest.trim() == ","
}

fn group_at(tree: &Tree, line: &Line, offset: usize) -> usize {
    // a comma after a group that ends before the cursor starts the next one
    line.groups
        .iter()
        .filter(|g| g.span.end < offset)
        .filter(|g| {
            tree.text
                .get(g.span.end..offset)
                .is_some_and(|gap| gap.trim_start().starts_with(','))
        })
        .count()
}

fn before(line: &Line, group: usize, offset: usize) -> Vec<Token> {
    let tokens = line
        .groups
        .get(group)
        .map(|g| g.tokens.as_slice())
        .unwrap_or_default();
    tokens
        .iter()
        .filter(|t| t.span.end < offset)
        .copied()
        .collect()
}

fn values(
    tree: &Tree,
    kind: &'static vocabulary::Block,
    line: &Line,
    offset: usize,
    kinds: &Kinds,
) -> Option<Values> {
    if line.key.span.touches(offset) {
        return None;
    }
    let text = &tree.text;
    let key = kind.key(line.key.text(text))?;
    let group = group_at(tree, line, offset);
    let mut found = Values {
        key,
        group,
        before: before(line, group, offset),
        change: Change::Settled,
    };
    if key.shape().special != Some("CHANGE") {
        return Some(found);
    }
    let first = line
        .groups
        .first()
        .map(|g| g.tokens.as_slice())
        .unwrap_or_default();
    let named = first
        .iter()
        .filter(|t| t.span.end < offset || group > 0)
        .count();
    let changed = first.first().and_then(|t| kinds.get(t.text(text))).copied();
    match (named, changed) {
        (0, _) => found.change = Change::Block,
        (1, Some(kind)) => found.change = Change::Key(kind),
        (_, Some(kind)) => {
            found.key = kind.key(first.get(1)?.text(text))?;
            if group == 0 {
                found.before.drain(..2.min(found.before.len()));
            }
        }
        (_, None) => return None,
    }
    Some(found)
}
