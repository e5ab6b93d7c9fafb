//! The tree of one text: blocks, lines, groups, tokens, and every byte between them.
//! Knows nothing of keys, units or block kinds.

use std::sync::Arc;

use crate::line_index::LineIndex;
use crate::problem::Problem;
use crate::span::Span;

/// What a text holds, and what is wrong with its form.
#[derive(Clone, Eq, PartialEq, Debug)]
pub struct Tree {
    /// The text.
    pub text: Arc<str>,
    /// Blocks and top-level lines in order.
    pub items: Vec<Item>,
    /// Syntax problems in order of place: at most one for each line, and at most one more for
    /// each block that is not closed.
    pub problems: Vec<Problem>,
    pub(crate) lines: LineIndex,
    /// All pieces but the blank ones, in order.
    pub(crate) marks: Vec<Piece>,
    /// Per source line: whether a problem touches it.
    pub(crate) faulty: Vec<bool>,
}

/// A block, or a line outside every block.
#[derive(Clone, Eq, PartialEq, Debug)]
pub enum Item {
    /// `kind NAME ... { ... }`
    Block(Block),
    /// A statement in column one outside every block.
    Line(Line),
}

impl Item {
    /// Its bytes.
    #[must_use]
    pub fn span(&self) -> Span {
        match self {
            Self::Block(block) => block.span,
            Self::Line(line) => line.span,
        }
    }
}

/// `kind NAME "title" words { lines }`
#[derive(Clone, Eq, PartialEq, Debug)]
pub struct Block {
    /// The first token of the header.
    pub kind: Token,
    /// The tokens between the kind and `{`.
    pub header: Vec<Token>,
    /// The lines inside.
    pub lines: Vec<Line>,
    /// From the kind to the last token before `{`.
    pub header_span: Span,
    /// The `{`; empty at the end of the header where it is missing.
    pub open: Span,
    /// The `}`, where there is one.
    pub close: Option<Span>,
    /// From the kind to `}`, or to the end of the last line.
    pub span: Span,
}

impl Block {
    /// The first token after the kind, where it is a word.
    #[must_use]
    pub fn name(&self) -> Option<Token> {
        self.header
            .first()
            .copied()
            .filter(|token| token.kind == TokenKind::Word)
    }
}

/// `key group, group, ...`
#[derive(Clone, Eq, PartialEq, Debug)]
pub struct Line {
    /// The key, always a word.
    pub key: Token,
    /// What the commas part; a group is never empty.
    pub groups: Vec<Group>,
    /// From the key to the last token, continuation lines included.
    pub span: Span,
    /// The comment after the last token, on the same source line.
    pub comment: Option<Span>,
}

/// The tokens between two separator commas.
#[derive(Clone, Eq, PartialEq, Debug)]
pub struct Group {
    /// At least one token.
    pub tokens: Vec<Token>,
    /// From the first token to the last.
    pub span: Span,
}

/// A word, a number or a string.
#[derive(Copy, Clone, Eq, PartialEq, Debug, Hash)]
pub struct Token {
    /// Its sort, by its first characters only.
    pub kind: TokenKind,
    /// Its bytes.
    pub span: Span,
}

impl Token {
    /// The token as written.
    #[must_use]
    pub fn text(self, source: &str) -> &str {
        self.span.slice(source)
    }

    /// The token without the quotation marks of a string.
    #[must_use]
    pub fn content(self, source: &str) -> &str {
        let text = self.text(source);
        if self.kind != TokenKind::Text {
            return text;
        }
        let marks = ['"', '“', '”', '„'];
        let inside = text.strip_prefix(marks).unwrap_or(text);
        inside.strip_suffix(marks).unwrap_or(inside)
    }
}

/// Sorts of token.
#[derive(Copy, Clone, Eq, PartialEq, Debug, Hash)]
pub enum TokenKind {
    /// Any run of characters that is no number: `ohm`, `R22`, `K/W`, `%`, `load.table`.
    Word,
    /// A run that starts with a digit, after signs and a decimal point if any: `4k7`, `±5`, `.5`.
    Number,
    /// `"..."`, the quotation marks included.
    Text,
    /// A lone `×` or `*`, or a lone `x` right after a number.
    Times,
}

/// A stretch of the text. The pieces of a tree, one after the other, are the whole text.
#[derive(Copy, Clone, Eq, PartialEq, Debug, Hash)]
pub struct Piece {
    /// What it is.
    pub kind: PieceKind,
    /// Its bytes, at least one.
    pub span: Span,
}

/// Sorts of piece.
#[derive(Copy, Clone, Eq, PartialEq, Debug, Hash)]
pub enum PieceKind {
    /// White space, line ends, and a byte-order mark at the start.
    Blank,
    /// `#` to the end of the line.
    Comment,
    /// A token.
    Token(TokenKind),
    /// A separator comma.
    Comma,
    /// `{`
    Open,
    /// `}`
    Close,
    /// Bytes that were not read: hidden characters, or a line that is too long.
    Unread,
}

impl Tree {
    /// Lines and columns of the text.
    #[must_use]
    pub fn line_index(&self) -> &LineIndex {
        &self.lines
    }

    /// Every piece of the text in order; together they are the text, byte for byte.
    pub fn pieces(&self) -> impl Iterator<Item = Piece> + '_ {
        let tail = Span::at(self.text.len());
        let mut reached = 0;
        self.marks
            .iter()
            .copied()
            .map(Some)
            .chain([None])
            .flat_map(move |mark| {
                let next = mark.map_or(tail, |mark| mark.span);
                let gap = Span::new(reached, next.start);
                reached = next.end;
                let blank = (!gap.is_empty()).then_some(Piece {
                    kind: PieceKind::Blank,
                    span: gap,
                });
                [blank, mark].into_iter().flatten()
            })
    }

    /// The blocks in order.
    pub fn blocks(&self) -> impl Iterator<Item = &Block> {
        self.items.iter().filter_map(|item| match item {
            Item::Block(block) => Some(block),
            Item::Line(_) => None,
        })
    }

    /// Whether a source line that `span` touches has a syntax problem, so that what was read
    /// there may be less than what was meant. A missing `}` does not count.
    #[must_use]
    pub fn is_faulty(&self, span: Span) -> bool {
        let first = self.lines.line_of(span.start);
        let last = self.lines.line_of(span.end);
        self.faulty
            .get(first..=last)
            .is_some_and(|rows| rows.contains(&true))
    }
}
