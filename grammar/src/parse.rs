//! Reads one source line into pieces. The only file that names pest.
//! Knows nothing of groups, statements and blocks: `row` and `assemble` put the pieces together.

use pest::Parser;
use pest::iterators::Pair;

use crate::span::Span;
use crate::tree::{Piece, PieceKind, TokenKind};

#[derive(pest_derive::Parser)]
#[grammar = "ampspec.pest"]
struct Grammar;

/// Reads the line `source`, which begins at byte `base` of the text, and adds its pieces to
/// `pieces`.
pub(crate) fn read_line(source: &str, base: usize, pieces: &mut Vec<Piece>) {
    // Each parse costs about a microsecond whatever it reads.
    if source.trim_matches([' ', '\t']).is_empty() {
        return;
    }
    match Grammar::parse(Rule::line, source) {
        Ok(lines) => {
            let mut last = None;
            for pair in lines.flat_map(Pair::into_inner) {
                let found = pair.as_span();
                let span = Span::new(base + found.start(), base + found.end());
                let kind = kind(pair.as_rule(), found.as_str(), last);
                pieces.extend(kind.map(|kind| Piece { kind, span }));
                last = kind;
            }
        }
        // The grammar accepts every line; should it ever not, the line is unread and no more.
        Err(_) => pieces.push(Piece {
            kind: PieceKind::Unread,
            span: Span::new(base, base + source.len()),
        }),
    }
}

fn kind(rule: Rule, text: &str, last: Option<PieceKind>) -> Option<PieceKind> {
    let after_number = last == Some(PieceKind::Token(TokenKind::Number));
    Some(match (rule, text) {
        (Rule::symbol, "×" | "*") => PieceKind::Token(TokenKind::Times),
        // `2 x 28 Vac` counts; elsewhere a part may be called `x`.
        (Rule::word, "x" | "X") if after_number => PieceKind::Token(TokenKind::Times),
        (Rule::word | Rule::symbol, _) => PieceKind::Token(TokenKind::Word),
        (Rule::number, _) => PieceKind::Token(TokenKind::Number),
        (Rule::text | Rule::curly, _) => PieceKind::Token(TokenKind::Text),
        (Rule::comma, _) => PieceKind::Comma,
        (Rule::open, _) => PieceKind::Open,
        (Rule::close, _) => PieceKind::Close,
        (Rule::comment, _) => PieceKind::Comment,
        (Rule::hidden, _) => PieceKind::Unread,
        _ => return None,
    })
}
