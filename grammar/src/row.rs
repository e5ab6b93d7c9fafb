//! Puts the pieces of one source line together into phrases and braces, and finds what is wrong
//! with them. Knows nothing of the lines around it.

use crate::problem::{Problem, ProblemKind};
use crate::span::Span;
use crate::tree::{Group, Piece, PieceKind, Token, TokenKind};

/// What one source line holds, and the first thing wrong with it.
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

/// Groups and the commas between them. A phrase of nothing but commas holds no group.
pub(crate) struct Phrase {
    pub(crate) groups: Vec<Group>,
    /// Whether the first group could not be read, so that the first of `groups` is not it.
    pub(crate) headless: bool,
    pub(crate) span: Span,
    pub(crate) first_comma: Option<Span>,
    pub(crate) trailing_comma: Option<Span>,
}

/// Puts together the pieces of one line of `text`.
pub(crate) fn read_row(text: &str, pieces: &[Piece]) -> Row {
    let mut reader = Reader {
        text,
        row: Row::default(),
        phrase: None,
        group: None,
    };
    for piece in pieces {
        reader.piece(*piece);
    }
    reader.end_phrase();
    reader.row
}

struct Reader<'t> {
    text: &'t str,
    row: Row,
    phrase: Option<Phrase>,
    group: Option<Open>,
}

/// A group that may go on.
struct Open {
    tokens: Vec<Token>,
    /// Whether a hidden character makes doubtful what follows.
    doubtful: bool,
}

impl Reader<'_> {
    fn piece(&mut self, piece: Piece) {
        let span = piece.span;
        match piece.kind {
            PieceKind::Blank => {}
            PieceKind::Token(kind) => self.token(Token { kind, span }),
            PieceKind::Unread => self.unread(span),
            PieceKind::Comma => self.comma(span),
            PieceKind::Open => {
                self.end_phrase();
                self.row.parts.push(Part::Open(span));
            }
            PieceKind::Close => {
                self.end_phrase();
                self.row.parts.push(Part::Close(span));
            }
            PieceKind::Comment => {
                self.check_quoted(span);
                self.row.comment = Some(span);
            }
        }
    }

    fn token(&mut self, token: Token) {
        if token.kind == TokenKind::Text {
            self.check_string(token.span);
        }
        self.check_comma_before(token);
        let group = self.open_group(token.span);
        if !group.doubtful {
            group.tokens.push(token);
        }
    }

    /// A hidden character makes all doubtful that touches it or follows it in its group.
    fn unread(&mut self, span: Span) {
        self.hidden_characters(span);
        let group = self.open_group(span);
        let touched = group
            .tokens
            .last()
            .is_some_and(|t| t.span.end == span.start);
        if touched && !group.doubtful {
            group.tokens.pop();
        }
        group.doubtful = true;
    }

    fn comma(&mut self, span: Span) {
        if self.group.is_none() {
            self.stray_comma(span, "nothing stands before this comma");
        }
        self.end_group();
        let phrase = self.open_phrase(span);
        phrase.first_comma.get_or_insert(span);
        phrase.trailing_comma = Some(span);
    }

    fn open_phrase(&mut self, span: Span) -> &mut Phrase {
        let phrase = self.phrase.get_or_insert_with(|| Phrase {
            groups: Vec::new(),
            headless: false,
            span,
            first_comma: None,
            trailing_comma: None,
        });
        phrase.span = phrase.span.cover(span);
        phrase
    }

    fn open_group(&mut self, span: Span) -> &mut Open {
        self.open_phrase(span).trailing_comma = None;
        self.group.get_or_insert_with(|| Open {
            tokens: Vec::new(),
            doubtful: false,
        })
    }

    fn end_group(&mut self) {
        let (Some(group), Some(phrase)) = (self.group.take(), self.phrase.as_mut()) else {
            return;
        };
        let tokens = group.tokens;
        match (tokens.first(), tokens.last()) {
            (Some(first), Some(last)) => {
                let span = first.span.cover(last.span);
                phrase.groups.push(Group { tokens, span });
            }
            _ => phrase.headless |= phrase.groups.is_empty(),
        }
    }

    fn end_phrase(&mut self) {
        self.end_group();
        self.row.parts.extend(self.phrase.take().map(Part::Phrase));
    }

    // --- problems ---

    fn raise(&mut self, kind: ProblemKind, span: Span, message: &str, hint: &str) {
        if self.row.problem.is_none() {
            self.row.problem = Some(Problem::new(kind, span, message, hint));
        }
    }

    /// `4 ohm ,8 ohm` may mean two groups or 0.8 ohm. Before and after a string there is no doubt.
    fn check_comma_before(&mut self, token: Token) {
        let comma = self.phrase.as_ref().and_then(|p| p.trailing_comma);
        if let Some(comma) = comma
            && comma.end == token.span.start
            && token.kind != TokenKind::Text
            && !Span::new(0, comma.start).slice(self.text).ends_with('"')
        {
            self.stray_comma(comma, "no space follows this comma");
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

    fn check_string(&mut self, span: Span) {
        let text = span.slice(self.text);
        if !text.starts_with('"') {
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
        self.check_quoted(span);
    }

    /// Comments and strings may hold any script, but nothing that hides or reorders what follows.
    fn check_quoted(&mut self, span: Span) {
        let text = span.slice(self.text);
        if let Some((at, character)) = text.char_indices().find(|&(_, c)| misleads(c)) {
            let start = span.start + at;
            self.hidden_characters(Span::new(start, start + character.len_utf8()));
        }
    }

    fn hidden_characters(&mut self, span: Span) {
        let first = span.slice(self.text).chars().next();
        let code = first.map_or(0, u32::from);
        self.raise(
            ProblemKind::HiddenCharacter,
            span,
            &format!("a character that does not show (U+{code:04X}) stands here"),
            "delete it; retype the value if it was pasted",
        );
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
