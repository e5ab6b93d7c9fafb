//! What each word of a text is, for colours. Must not know any particular key.

use ampspec_grammar::{Item, Line, PieceKind, Span, Token, TokenKind, Tree};

use crate::quantity::is_unit;
use crate::vocabulary::shape::CONNECTING;
use crate::vocabulary::{Block, STATEMENTS, block_kind};

use super::names::{Role, of_tree};
use super::web::Kinds;

/// What a word is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Class {
    /// A kind of block or a statement.
    Keyword,
    /// A key.
    Key,
    /// A declared name.
    Name,
    /// A number.
    Number,
    /// A unit.
    Unit,
    /// Text in quotes.
    Text,
    /// A comment.
    Comment,
    /// A word of the vocabulary after a key.
    Word,
    /// A connecting word or sign.
    Link,
}

/// A coloured stretch.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Coloured {
    /// Its bytes.
    pub span: Span,
    /// What it is.
    pub class: Class,
    /// It declares a name.
    pub declares: bool,
}

/// Every word of a tree, in order.
#[must_use]
pub fn tokens(tree: &Tree, kinds: &Kinds) -> Vec<Coloured> {
    let names = of_tree(tree, kinds);
    let keys = keys(tree);
    let mut out = Vec::new();
    for piece in tree.pieces() {
        let span = piece.span;
        let mut declares = false;
        let class = match piece.kind {
            PieceKind::Comment => Class::Comment,
            PieceKind::Token(TokenKind::Text) => Class::Text,
            PieceKind::Token(TokenKind::Number) => Class::Number,
            PieceKind::Token(TokenKind::Times) => Class::Link,
            PieceKind::Token(TokenKind::Word) => {
                if let Ok(at) = keys.binary_search_by_key(&span, |k| k.0) {
                    keys.get(at).map_or(Class::Word, |k| k.1)
                } else if let Some(name) = names.iter().find(|n| n.span == span) {
                    declares = name.role == Role::Declared;
                    Class::Name
                } else {
                    word(span.slice(&tree.text))
                }
            }
            PieceKind::Blank
            | PieceKind::Comma
            | PieceKind::Open
            | PieceKind::Close
            | PieceKind::Unread => continue,
        };
        out.push(Coloured {
            span,
            class,
            declares,
        });
    }
    out
}

fn word(text: &str) -> Class {
    if is_unit(text) || text == "%" || text == "±" {
        Class::Unit
    } else if CONNECTING.contains(&text) || text == "per" || text == "from" {
        Class::Link
    } else {
        Class::Word
    }
}

/// Kinds of block, statements and keys, by place.
fn keys(tree: &Tree) -> Vec<(Span, Class)> {
    let text = &tree.text;
    let mut out = Vec::new();
    let key = |token: Token, class| (token.span, class);
    for item in &tree.items {
        match item {
            Item::Line(Line { key: token, .. }) => {
                if STATEMENTS.iter().any(|s| s.name == token.text(text)) {
                    out.push(key(*token, Class::Keyword));
                }
            }
            Item::Block(block) => {
                let kind: Option<&Block> = block_kind(block.kind.text(text));
                if kind.is_some() {
                    out.push(key(block.kind, Class::Keyword));
                }
                let known = block
                    .lines
                    .iter()
                    .filter(|l| kind.is_some_and(|k| k.key(l.key.text(text)).is_some()));
                out.extend(known.map(|l| key(l.key, Class::Key)));
            }
        }
    }
    out
}
