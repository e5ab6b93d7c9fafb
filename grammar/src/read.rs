//! Reads a text line by line, or only the lines that an edit changed, and has them put together.
//! Knows nothing of what the pieces of a line mean.

use std::ops::Range;
use std::sync::Arc;

use crate::assemble::assemble;
use crate::line_index::LineIndex;
use crate::parse::read_line;
use crate::span::Span;
use crate::tree::{Piece, PieceKind, Tree};

/// A longer source line is not read: no hand writes one, and reading it would take memory many
/// times its size.
pub const MAX_LINE_BYTES: usize = 1 << 16;

pub(crate) const BYTE_ORDER_MARK: char = '\u{FEFF}';

/// Reads any text into a tree. Takes time linear in its length, and never fails: what cannot be
/// read is a problem of the tree.
#[must_use]
pub fn parse(text: impl Into<Arc<str>>) -> Tree {
    let text: Arc<str> = text.into();
    let lines = LineIndex::new(text);
    let mut marks = Vec::new();
    read_lines(&lines, 0..lines.line_count(), &mut marks);
    assemble(lines, marks)
}

impl Tree {
    /// The tree of a text that differs little from this one: the same as [`parse`] gives, but
    /// only the source lines between the first and the last difference are read anew.
    #[must_use]
    pub fn reparse(&self, text: impl Into<Arc<str>>) -> Self {
        let text: Arc<str> = text.into();
        let (head, tail) = common_ends(self.text.as_bytes(), text.as_bytes());
        let old_tail = self.text.len() - tail;
        let new_tail = text.len() - tail;
        let lines = LineIndex::new(text);

        // A line is kept if it and at least the first byte of its line end lie in the common
        // head, or it and at least the last byte of the line end before it in the common tail.
        let first = lines.line_of(head);
        let kept_until = lines.line_span(first).start;
        let after = lines.line_of(new_tail) + 1;
        let kept_from = lines.line_start(after) - new_tail + old_tail;

        let (kept_head, rest) = split_at(&self.marks, kept_until);
        let (_, kept_tail) = split_at(rest, kept_from);
        let mut marks = Vec::with_capacity(self.marks.len() + 16);
        marks.extend_from_slice(kept_head);
        read_lines(&lines, first..after, &mut marks);
        marks.extend(kept_tail.iter().map(|mark| Piece {
            kind: mark.kind,
            span: Span::new(
                mark.span.start - old_tail + new_tail,
                mark.span.end - old_tail + new_tail,
            ),
        }));
        assemble(lines, marks)
    }
}

/// Lengths of what two texts share at their beginnings, and at the ends of what is left.
fn common_ends(old: &[u8], new: &[u8]) -> (usize, usize) {
    let head = old.iter().zip(new).take_while(|(a, b)| a == b).count();
    let left = old.len().min(new.len()) - head;
    let tail = old.iter().rev().zip(new.iter().rev()).take(left);
    (head, tail.take_while(|(a, b)| a == b).count())
}

/// The pieces that begin before `offset`, and the others.
fn split_at(marks: &[Piece], offset: usize) -> (&[Piece], &[Piece]) {
    marks.split_at(marks.partition_point(|mark| mark.span.start < offset))
}

fn read_lines(lines: &LineIndex, numbers: Range<usize>, marks: &mut Vec<Piece>) {
    for number in numbers {
        let span = content(lines, number);
        if span.len() <= MAX_LINE_BYTES {
            read_line(span.slice(lines.text()), span.start, marks);
        } else {
            marks.push(Piece {
                kind: PieceKind::Unread,
                span,
            });
        }
    }
}

/// The bytes of a source line without its line end and without a byte-order mark.
pub(crate) fn content(lines: &LineIndex, number: usize) -> Span {
    let span = lines.line_span(number);
    let bom = number == 0 && lines.text().starts_with(BYTE_ORDER_MARK);
    let skipped = if bom { BYTE_ORDER_MARK.len_utf8() } else { 0 };
    Span::new(span.start + skipped, span.end)
}

/// The pieces up to the end of a line, and the others.
pub(crate) fn split_line(marks: &[Piece], end: usize) -> (&[Piece], &[Piece]) {
    let count = marks.iter().take_while(|mark| mark.span.end <= end).count();
    marks.split_at(count)
}
