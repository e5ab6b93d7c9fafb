//! Puts source lines together into blocks and statements, and says what is wrong with their
//! form. Knows nothing of keys, units or block kinds.
//!
//! Every source line gets at most one problem, so that a half-typed line shows one mistake; a
//! block without `}` gets one more.

use std::sync::Arc;

use crate::line_index::LineIndex;
use crate::problem::{Problem, ProblemKind};
use crate::read::{MAX_LINE_BYTES, content, split_line};
use crate::row::{Part, Phrase, Row, read_row};
use crate::span::Span;
use crate::tree::{Block, Group, Item, Line, Piece, Token, TokenKind, Tree};

/// So many problems are listed, then one that says there are more.
pub const MAX_PROBLEMS: usize = 1000;

/// A tab stop, where indentations are compared.
const TAB: usize = 4;

/// Puts the pieces of a text together.
pub(crate) fn assemble(lines: LineIndex, marks: Vec<Piece>) -> Tree {
    let text = Arc::clone(lines.text());
    let mut assembler = Assembler::new(&text, lines.line_count());
    let mut rest = marks.as_slice();
    for number in 0..lines.line_count() {
        let span = content(&lines, number);
        let (row, after) = split_line(rest, span.end);
        rest = after;
        assembler.source_line(number, span, row);
    }
    assembler.end_block(None);
    let Assembler {
        items,
        mut problems,
        faulty,
        ..
    } = assembler;
    problems.sort_by_key(|problem| problem.span.start);
    Tree {
        items,
        problems,
        lines,
        marks,
        faulty,
        text,
    }
}

struct Assembler<'t> {
    text: &'t str,
    items: Vec<Item>,
    problems: Vec<Problem>,
    faulty: Vec<bool>,
    /// The source line being read.
    number: usize,
    /// The block that the next statement belongs to.
    block: Option<Block>,
    /// The last statement, which the next source line may continue.
    statement: Option<Statement>,
    /// The column of the last key.
    key_column: usize,
    skip: Skip,
}

/// A statement whose end is not known yet.
struct Statement {
    /// `None` where it does not begin with a key.
    line: Option<Line>,
    /// The column, from 0, that a line must pass to continue it.
    column: usize,
    /// The comma it may be continued after, and the source line of that comma.
    comma: Option<(Span, usize)>,
    /// The source line of its first token.
    number: usize,
}

/// Which source lines are passed over because of a problem already reported.
#[derive(Copy, Clone, Eq, PartialEq)]
enum Skip {
    Nothing,
    /// Those of a nested block that began at this column: deeper ones, and one `}`.
    Nested(usize),
    /// Indented ones outside every block, and one `}`.
    Outside,
}

impl<'t> Assembler<'t> {
    fn new(text: &'t str, lines: usize) -> Self {
        Self {
            text,
            items: Vec::new(),
            problems: Vec::new(),
            faulty: vec![false; lines],
            number: 0,
            block: None,
            statement: None,
            key_column: 0,
            skip: Skip::Nothing,
        }
    }

    fn source_line(&mut self, number: usize, span: Span, pieces: &[Piece]) {
        self.number = number;
        if span.len() > MAX_LINE_BYTES {
            self.raise(Problem::new(
                ProblemKind::LineTooLong,
                Span::at(span.start),
                format!("this line is longer than {MAX_LINE_BYTES} bytes and is not read"),
                "break it after a comma",
            ));
        } else if !pieces.is_empty() {
            self.row(read_row(self.text, pieces), span.start);
        }
    }

    fn row(&mut self, row: Row, start: usize) {
        if let Some(problem) = row.problem {
            self.raise(problem);
        }
        let Some(first) = row.parts.first() else {
            return;
        };
        let column = self.column(start, first.span().start);
        let continues = self.continues(column, &row.parts);
        if !continues {
            self.end_statement(Some((column, first)));
            if self.skipped(column, &row.parts) {
                return self.mark_faulty(self.number);
            }
        }
        let mut parts = row.parts.into_iter().peekable();
        if continues && let Some(Part::Phrase(phrase)) = parts.next() {
            self.continue_statement(phrase, row.comment.filter(|_| parts.peek().is_none()));
        }
        let mut opened = false;
        let mut closed = false;
        while let Some(part) = parts.next() {
            if closed {
                self.after_brace(part.span());
            }
            match part {
                Part::Phrase(phrase) => match parts.next_if(|next| matches!(next, Part::Open(_))) {
                    Some(open) => {
                        self.open(phrase, open.span(), column, opened, &mut parts);
                        opened = true;
                    }
                    None => {
                        let comment = row.comment.filter(|_| parts.peek().is_none());
                        let column = self.column(start, phrase.span.start);
                        self.begin_statement(phrase, column, comment);
                    }
                },
                Part::Open(open) => self.lone_open(open, column),
                Part::Close(close) => {
                    self.close(close);
                    opened = false;
                    closed = true;
                }
            }
        }
    }

    /// A phrase and `{`: the header of a block, or one inside the block `opened` in this line or
    /// before, whose `rest` is passed over.
    fn open(
        &mut self,
        phrase: Phrase,
        open: Span,
        column: usize,
        opened: bool,
        rest: &mut impl Iterator<Item = Part>,
    ) {
        if self.block.is_none() || (column == 0 && !opened) {
            return self.header(phrase, open, column);
        }
        self.nested(phrase, open, column);
        if !leave_nested(rest) {
            self.skip = Skip::Nested(column);
        }
    }

    // --- statements ---

    /// Whether a source line goes on with the statement before it.
    fn continues(&self, column: usize, parts: &[Part]) -> bool {
        let waits = self
            .statement
            .as_ref()
            .is_some_and(|last| last.comma.is_some() && column > last.column);
        let header = matches!(parts.get(1), Some(Part::Open(_)));
        waits && !header && matches!(parts.first(), Some(Part::Phrase(_)))
    }

    fn continue_statement(&mut self, phrase: Phrase, comment: Option<Span>) {
        let number = self.number;
        let Some(statement) = &mut self.statement else {
            return;
        };
        statement.comma = phrase.trailing_comma.map(|comma| (comma, number));
        let first = statement.number;
        if let Some(line) = &mut statement.line {
            if let Some(last) = phrase.groups.last() {
                line.span = line.span.cover(last.span);
            }
            line.groups.extend(phrase.groups);
            line.comment = comment;
        } else {
            self.mark_faulty(number);
        }
        // What is wrong with its last line is wrong with the whole statement.
        if self.faulty.get(number) == Some(&true) {
            self.mark_faulty(first);
        }
    }

    fn begin_statement(&mut self, phrase: Phrase, column: usize, comment: Option<Span>) {
        let comma = phrase.trailing_comma.map(|comma| (comma, self.number));
        let line = self.keyed_line(phrase, comment);
        // Without a key it is most likely what the comma before it has lost, and its lines go on
        // where that statement's would.
        if line.is_some() || column <= self.key_column {
            self.key_column = column;
        }
        self.statement = Some(Statement {
            line,
            column: self.key_column,
            comma,
            number: self.number,
        });
    }

    fn keyed_line(&mut self, phrase: Phrase, comment: Option<Span>) -> Option<Line> {
        let comma = phrase.first_comma;
        let mut groups = phrase.groups;
        let key = groups
            .first()
            .and_then(|group| group.tokens.first())
            .copied();
        let Some(key) = key.filter(|key| key.kind == TokenKind::Word && !phrase.headless) else {
            self.raise(Problem::new(
                ProblemKind::BrokenLine,
                phrase.span,
                "this line does not begin with a key",
                "write `key value`; a line that continues the one above stands deeper than its \
                 key, and the line above ends in a comma",
            ));
            return None;
        };
        let end = groups.last().map_or(key.span.end, |group| group.span.end);
        if !drop_first_token(&mut groups)
            && let Some(comma) = comma
        {
            self.raise(Problem::new(
                ProblemKind::StrayComma,
                comma,
                "a comma follows the key",
                "remove it: commas part the groups that follow a key",
            ));
        }
        Some(Line {
            key,
            groups,
            span: Span::new(key.span.start, end),
            comment,
        })
    }

    /// Ends the statement that waited for what comes next: a source line that begins at a column
    /// with a part, or the end of the block or the text.
    fn end_statement(&mut self, next: Option<(usize, &Part)>) {
        let Some(statement) = self.statement.take() else {
            return;
        };
        if let Some((comma, number)) = statement.comma {
            self.raise_at(
                number,
                Problem::new(
                    ProblemKind::StrayComma,
                    comma,
                    "nothing follows this comma",
                    "remove it, or go on in a line that stands deeper than the key",
                ),
            );
        }
        let Some(line) = statement.line else {
            return;
        };
        match &mut self.block {
            Some(block) => {
                block.span = block.span.cover(line.span);
                block.lines.push(line);
            }
            None if next.is_some_and(|(column, part)| {
                statement.comma.is_none() && looks_like_header(&line) && inside(column, part)
            }) =>
            {
                self.header_without_brace(line, statement.number);
            }
            None => self.items.push(Item::Line(line)),
        }
    }

    // --- blocks ---

    fn header(&mut self, phrase: Phrase, open: Span, column: usize) {
        self.end_block(Some(phrase.span));
        if column > 0 {
            self.raise(Problem::new(
                ProblemKind::IndentedHeader,
                phrase.span,
                "a block begins in column one",
                "remove the space before it",
            ));
        }
        if let Some(comma) = phrase.first_comma {
            self.raise(Problem::new(
                ProblemKind::StrayComma,
                comma,
                "a block header holds no comma",
                "remove it",
            ));
        }
        let mut tokens = phrase.groups.into_iter().flat_map(|group| group.tokens);
        let Some(kind) = tokens.next().filter(|_| !phrase.headless) else {
            return self.lone_open(open, column);
        };
        let header: Vec<Token> = tokens.collect();
        let end = header.last().map_or(kind.span.end, |last| last.span.end);
        let block = Block {
            kind,
            header,
            lines: Vec::new(),
            header_span: Span::new(kind.span.start, end),
            open,
            close: None,
            span: Span::new(kind.span.start, open.end),
        };
        self.check_header(&block);
        self.block = Some(block);
    }

    fn check_header(&mut self, block: &Block) {
        if block.kind.kind != TokenKind::Word {
            self.raise(Problem::new(
                ProblemKind::BrokenLine,
                block.kind.span,
                "a block header begins with the kind of the block",
                "write `kind NAME {`",
            ));
        } else if block.name().is_none() {
            let span = block.header.first().map_or(block.kind.span, |t| t.span);
            self.raise(Problem::new(
                ProblemKind::MissingName,
                span,
                "this block has no name",
                "write `kind NAME {`; a name begins with a letter",
            ));
        }
    }

    /// The top-level line was the header of the indented lines that follow.
    fn header_without_brace(&mut self, line: Line, number: usize) {
        self.raise_at(
            number,
            Problem::new(
                ProblemKind::HeaderWithoutBrace,
                line.span,
                "lines of a block follow, but this line does not open one",
                "end the line with `{`",
            ),
        );
        let header = line.groups.into_iter().flat_map(|g| g.tokens).collect();
        self.block = Some(Block {
            kind: line.key,
            header,
            lines: Vec::new(),
            header_span: line.span,
            open: Span::at(line.span.end),
            close: None,
            span: line.span,
        });
    }

    fn nested(&mut self, phrase: Phrase, open: Span, column: usize) {
        self.end_statement(None);
        self.raise(Problem::new(
            ProblemKind::NestedBlock,
            open,
            "a block stands inside another one",
            "blocks do not nest: give it a name of its own in column one, or close the block \
             above with `}`",
        ));
        self.begin_statement(phrase, column, None);
        if let Some(statement) = &mut self.statement {
            statement.comma = None;
        }
    }

    fn lone_open(&mut self, open: Span, column: usize) {
        if let Some(block) = &mut self.block
            && block.open.is_empty()
            && block.lines.is_empty()
        {
            block.open = open;
            block.span = block.span.cover(open);
            return self.mark_faulty(self.number);
        }
        self.raise(Problem::new(
            ProblemKind::StrayBrace,
            open,
            "this `{` opens no block",
            "write `kind NAME {` on one line, in column one",
        ));
        if self.block.is_none() {
            self.skip = Skip::Outside;
        } else if column > 0 {
            self.skip = Skip::Nested(column);
        }
    }

    fn close(&mut self, close: Span) {
        self.end_statement(None);
        if let Some(mut block) = self.block.take() {
            block.close = Some(close);
            block.span = block.span.cover(close);
            self.items.push(Item::Block(block));
        } else {
            self.raise(Problem::new(
                ProblemKind::StrayBrace,
                close,
                "this `}` closes no block",
                "remove it",
            ));
        }
    }

    /// Ends a block that has no `}` where the next one, or the text, ends it.
    fn end_block(&mut self, next: Option<Span>) {
        self.end_statement(None);
        let Some(block) = self.block.take() else {
            return;
        };
        // Without `{` there is one problem already, and one is enough.
        if !block.open.is_empty() {
            let name = block.name().unwrap_or(block.kind).text(self.text);
            let mut problem = Problem::new(
                ProblemKind::UnclosedBlock,
                block.header_span,
                format!("the block `{}` is not closed", shortened(name)),
                "put `}` in a line of its own after its last line",
            );
            let note = next.map(|span| ("the next block begins here".to_owned(), span));
            problem.related.extend(note);
            self.list(problem);
        }
        self.items.push(Item::Block(block));
    }

    // --- problems ---

    /// Whether a source line is passed over, because a problem above it or of its own leaves it
    /// without a place.
    fn skipped(&mut self, column: usize, parts: &[Part]) -> bool {
        let closes = matches!(parts, [Part::Close(_)]);
        let opens = parts.iter().any(|part| matches!(part, Part::Open(_)));
        match self.skip {
            Skip::Nested(depth) if column > depth => return true,
            Skip::Outside if column > 0 && !opens => return true,
            _ => {}
        }
        let absorbed = match std::mem::replace(&mut self.skip, Skip::Nothing) {
            Skip::Nothing => false,
            Skip::Nested(_) => closes && column > 0,
            Skip::Outside => closes,
        };
        if absorbed {
            return true;
        }
        if let Some(Part::Phrase(phrase)) = parts.first()
            && self.block.is_none()
            && column > 0
            && !opens
        {
            self.raise(Problem::new(
                ProblemKind::OutsideBlock,
                phrase.span,
                "this line stands in no block",
                "put it between the `{` and the `}` of a block; what belongs to no block begins \
                 in column one",
            ));
            self.skip = Skip::Outside;
            return true;
        }
        false
    }

    fn after_brace(&mut self, span: Span) {
        self.raise(Problem::new(
            ProblemKind::AfterBrace,
            span,
            "something follows the `}` that ends a block",
            "put it in a line of its own",
        ));
    }

    fn raise(&mut self, problem: Problem) {
        self.raise_at(self.number, problem);
    }

    /// Lists the problem, unless its source line has one.
    fn raise_at(&mut self, number: usize, problem: Problem) {
        if self.faulty.get(number) == Some(&false) {
            self.list(problem);
        }
        self.mark_faulty(number);
    }

    fn mark_faulty(&mut self, number: usize) {
        if let Some(faulty) = self.faulty.get_mut(number) {
            *faulty = true;
        }
    }

    fn list(&mut self, problem: Problem) {
        if self.problems.len() < MAX_PROBLEMS {
            self.problems.push(problem);
        } else if self.problems.len() == MAX_PROBLEMS {
            self.problems.push(Problem::new(
                ProblemKind::TooMany,
                problem.span,
                format!("more than {MAX_PROBLEMS} syntax problems; the rest is not listed"),
                "check that this is an ampspec text",
            ));
        }
    }

    /// The column, from 0, of a byte of the source line that begins at `start`.
    fn column(&self, start: usize, offset: usize) -> usize {
        let before = Span::new(start, offset).slice(self.text);
        before.chars().fold(0, |column, c| match c {
            '\t' => (column / TAB + 1) * TAB,
            _ => column + 1,
        })
    }
}

/// Passes over the rest of a nested block in its own source line; false where it goes on.
fn leave_nested(parts: &mut impl Iterator<Item = Part>) -> bool {
    let mut depth = 1_usize;
    for part in parts {
        match part {
            Part::Open(_) => depth += 1,
            Part::Close(_) => depth -= 1,
            Part::Phrase(_) => {}
        }
        if depth == 0 {
            return true;
        }
    }
    false
}

/// `kind NAME ...` or the first word of one, unlike `ampspec 1` and `use "..."`.
fn looks_like_header(line: &Line) -> bool {
    match line.groups.as_slice() {
        [] => true,
        [group] => group
            .tokens
            .first()
            .is_some_and(|t| t.kind == TokenKind::Word),
        _ => false,
    }
}

/// Whether a source line belongs to a block, be it known or not.
fn inside(column: usize, first: &Part) -> bool {
    column > 0 || !matches!(first, Part::Phrase(_))
}

/// Takes the key out of the first group; false if nothing but the key stood there.
fn drop_first_token(groups: &mut Vec<Group>) -> bool {
    let Some(first) = groups.first_mut() else {
        return false;
    };
    first.tokens.remove(0);
    let next = first.tokens.first().map(|token| token.span.start);
    match next {
        Some(start) => first.span.start = start,
        None => {
            groups.remove(0);
        }
    }
    next.is_some()
}

fn shortened(name: &str) -> String {
    const LONGEST: usize = 40;
    match name.char_indices().nth(LONGEST) {
        Some((end, _)) => format!("{}…", Span::new(0, end).slice(name)),
        None => name.to_owned(),
    }
}
