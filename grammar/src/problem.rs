//! What is wrong with the form of a text. Knows nothing of keys, units or block kinds.

use crate::span::Span;

/// The sorts of syntax problem.
#[derive(Copy, Clone, Eq, PartialEq, Debug, Hash)]
pub enum ProblemKind {
    /// A line does not begin with a key, or a header not with a block kind.
    BrokenLine,
    /// A block has no `}` before the next block or the end of the text.
    UnclosedBlock,
    /// A `"` has no partner on its line.
    UnclosedString,
    /// A string stands in typographic quotation marks.
    CurlyQuotes,
    /// A comma with nothing before or after it.
    StrayComma,
    /// A brace that opens or closes nothing.
    StrayBrace,
    /// A `{` inside a block.
    NestedBlock,
    /// A block header without a name that starts with a letter.
    MissingName,
    /// A header followed by the lines of a block, but not by `{`.
    HeaderWithoutBrace,
    /// A block header that is indented.
    IndentedHeader,
    /// Indented lines that belong to no block.
    OutsideBlock,
    /// Something follows the `}` on its line.
    AfterBrace,
    /// A control character, or one that shows nothing or reorders the text.
    HiddenCharacter,
    /// A line longer than [`crate::MAX_LINE_BYTES`]; it is not read.
    LineTooLong,
    /// More problems than [`crate::MAX_PROBLEMS`]; the rest is not listed.
    TooMany,
}

/// One syntax problem.
#[derive(Clone, Eq, PartialEq, Debug)]
pub struct Problem {
    /// Its sort.
    pub kind: ProblemKind,
    /// What is wrong.
    pub message: String,
    /// What was expected, and what to do.
    pub hint: String,
    /// The bytes to change.
    pub span: Span,
    /// Other places that led there, each with a note.
    pub related: Vec<(String, Span)>,
}

impl Problem {
    pub(crate) fn new(
        kind: ProblemKind,
        span: Span,
        message: impl Into<String>,
        hint: impl Into<String>,
    ) -> Self {
        Self {
            kind,
            message: message.into(),
            hint: hint.into(),
            span,
            related: Vec::new(),
        }
    }
}
