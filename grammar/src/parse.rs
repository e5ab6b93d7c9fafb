//! Reads one source line into phrases, braces and a comment. The only file that names pest.
//! Knows nothing of blocks: the lines are put together in `assemble`.

use pest::Parser;
use pest::iterators::Pair;

use crate::problem::{Problem, ProblemKind};
use crate::span::Span;
use crate::tree::{Group, Piece, PieceKind, Token, TokenKind};

#[derive(pest_derive::Parser)]
#[grammar = "ampspec.pest"]
struct Grammar;

/// What one source line holds, and the first thing wrong with its tokens.
#[derive(Default)]
pub(crate) struct Row {
    pub(crate) parts: Vec<Part>,
    pub(crate) comment: Option<Span>,
    pub(crate) problem: Option<Problem>,
}

/// A stretch of a source line; two phrases never touch.
pub(crate) enum Part {
    Phrase(Phrase),
    Open(Span),
    Close(Span),
}

impl Part {
    pub(crate) fn span(&self) -> Span {
        match self {
            Self::Phrase(phrase) => phrase.span,
            Self::Open(span) | Self::Close(span) => *span,
        }
    }
}

/// Groups and the commas between them. A phrase of stray commas holds no group.
pub(crate) struct Phrase {
    pub(crate) groups: Vec<Group>,
    /// Whether the first group could not be read, so that the first of `groups` is not it.
    pub(crate) headless: bool,
    pub(crate) span: Span,
    pub(crate) trailing_comma: Option<Span>,
}

/// Reads the line `source`, which begins at byte `base` of the text, and adds its pieces to
/// `marks`.
pub(crate) fn read_row(source: &str, base: usize, marks: &mut Vec<Piece>) -> Row {
    let mut reader = Reader {
        base,
        marks,
        row: Row::default(),
    };
    match Grammar::parse(Rule::line, source) {
        Ok(pairs) => pairs.for_each(|line| reader.line(line)),
        // The grammar accepts every line; should it ever not, the line is broken and no more.
        Err(_) => reader.unread(Span::new(base, base + source.len())),
    }
    reader.row
}

struct Reader<'a> {
    base: usize,
    marks: &'a mut Vec<Piece>,
    row: Row,
}

impl Reader<'_> {
    fn span(&self, pair: &Pair<'_, Rule>) -> Span {
        let span = pair.as_span();
        Span::new(self.base + span.start(), self.base + span.end())
    }

    fn mark(&mut self, kind: PieceKind, span: Span) {
        self.marks.push(Piece { kind, span });
    }

    fn raise(&mut self, kind: ProblemKind, span: Span, message: &str, hint: &str) {
        if self.row.problem.is_none() {
            self.row.problem = Some(Problem::new(kind, span, message, hint));
        }
    }

    fn unread(&mut self, span: Span) {
        self.mark(PieceKind::Unread, span);
        self.raise(
            ProblemKind::BrokenLine,
            span,
            "this line cannot be read",
            "write `key value` or a block header `kind NAME {`",
        );
    }

    fn line(&mut self, line: Pair<'_, Rule>) {
        for pair in line.into_inner() {
            let span = self.span(&pair);
            match pair.as_rule() {
                Rule::phrase => {
                    let phrase = self.phrase(pair, span);
                    self.row.parts.push(Part::Phrase(phrase));
                }
                Rule::open => {
                    self.mark(PieceKind::Open, span);
                    self.row.parts.push(Part::Open(span));
                }
                Rule::close => {
                    self.mark(PieceKind::Close, span);
                    self.row.parts.push(Part::Close(span));
                }
                Rule::comment => {
                    self.mark(PieceKind::Comment, span);
                    self.check_quoted(pair.as_str(), span);
                    self.row.comment = Some(span);
                }
                _ => {}
            }
        }
    }

    fn phrase(&mut self, phrase: Pair<'_, Rule>, span: Span) -> Phrase {
        let mut groups: Vec<Group> = Vec::new();
        let mut headless = false;
        let mut trailing_comma = None;
        let mut after_group = false;
        for pair in phrase.into_inner() {
            let span = self.span(&pair);
            if pair.as_rule() == Rule::comma {
                self.mark(PieceKind::Comma, span);
                if !after_group {
                    self.stray_comma(span, "nothing stands before this comma");
                }
                after_group = false;
                trailing_comma = Some(span);
                continue;
            }
            // `4 ohm ,8 ohm` may mean two groups or 0.8 ohm.
            if let Some(comma) = trailing_comma
                && comma.end == span.start
                && !pair.as_str().starts_with(['"', '“', '„'])
            {
                self.stray_comma(comma, "this comma has a space before it, none after it");
            }
            after_group = true;
            trailing_comma = None;
            let group = self.group(pair, span);
            headless |= group.is_none() && groups.is_empty();
            groups.extend(group);
        }
        Phrase {
            groups,
            headless,
            span,
            trailing_comma,
        }
    }

    fn stray_comma(&mut self, comma: Span, message: &str) {
        self.raise(
            ProblemKind::StrayComma,
            comma,
            message,
            "a comma and a space part two groups; a decimal fraction is written `0.8`",
        );
    }

    /// The group up to the first hidden character, which makes all doubtful that touches or
    /// follows it.
    fn group(&mut self, group: Pair<'_, Rule>, span: Span) -> Option<Group> {
        let mut tokens: Vec<Token> = Vec::new();
        let mut doubtful = false;
        for pair in group.into_inner() {
            let span = self.span(&pair);
            let text = pair.as_str();
            let last = tokens.last().copied();
            let kind = match pair.as_rule() {
                Rule::number => TokenKind::Number,
                Rule::word => word_kind(text, last),
                Rule::hidden => {
                    self.mark(PieceKind::Unread, span);
                    text.chars().for_each(|c| self.hidden(c, span));
                    let touched = last.is_some_and(|last| last.span.end == span.start);
                    if touched && !doubtful {
                        tokens.pop();
                    }
                    doubtful = true;
                    continue;
                }
                rule => {
                    self.check_string(rule, text, span);
                    TokenKind::Text
                }
            };
            self.mark(PieceKind::Token(kind), span);
            if !doubtful {
                tokens.push(Token { kind, span });
            }
        }
        let end = tokens.last()?.span.end;
        Some(Group {
            tokens,
            span: Span::new(span.start, end),
        })
    }

    fn check_string(&mut self, rule: Rule, text: &str, span: Span) {
        if rule == Rule::curly {
            self.raise(
                ProblemKind::CurlyQuotes,
                span,
                "this text stands in typographic quotation marks",
                "use the straight quotation mark `\"` on both sides",
            );
        } else if text.len() < 2 || !text.ends_with('"') {
            self.raise(
                ProblemKind::UnclosedString,
                span,
                "this text is not closed on its line",
                "end it with `\"`",
            );
        }
        self.check_quoted(text, span);
    }

    /// Comments and strings may hold any script, but nothing that hides or reorders what follows.
    fn check_quoted(&mut self, text: &str, span: Span) {
        let found = text.char_indices().find(|&(_, c)| misleads(c));
        if let Some((at, character)) = found {
            let start = span.start + at;
            let here = Span::new(start, start + character.len_utf8());
            self.hidden(character, here);
        }
    }

    fn hidden(&mut self, character: char, span: Span) {
        let code = u32::from(character);
        let message = format!("a character that does not show (U+{code:04X}) stands here");
        self.raise(
            ProblemKind::HiddenCharacter,
            span,
            &message,
            "delete it; retype the value if it was pasted",
        );
    }
}

/// `x` counts (`2 x 28 Vac`) only after a number, so that a part may be called `x`.
fn word_kind(text: &str, last: Option<Token>) -> TokenKind {
    match text {
        "×" | "*" => TokenKind::Times,
        "x" | "X" if last.is_some_and(|t| t.kind == TokenKind::Number) => TokenKind::Times,
        _ => TokenKind::Word,
    }
}

/// Control characters, line breaks that only some programs know, and the characters that turn
/// the direction of writing.
fn misleads(character: char) -> bool {
    match character {
        '\t' => false,
        '\u{2028}' | '\u{2029}' | '\u{202A}'..='\u{202E}' | '\u{2066}'..='\u{2069}' => true,
        _ => character.is_control(),
    }
}
