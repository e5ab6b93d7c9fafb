//! The canonical layout of a tree. Knows nothing of keys and units: how a token is spelled and
//! which words stand in the key column is asked of a [`Spelling`].
//!
//! Layout moves white space and nothing else. A block or line with a syntax problem stays as it
//! is, byte for byte, since where its lines stand may be all that tells what they mean.

use std::collections::BTreeMap;
use std::ops::Range;

use crate::line_index::LineIndex;
use crate::read::{BYTE_ORDER_MARK, parse, split_line};
use crate::span::Span;
use crate::tree::{Block, Group, Item, Line, Piece, PieceKind, Tree};

const INDENT: usize = 4;
/// The key column is at least this wide, so that most blocks of a text line up with each other.
const KEY_COLUMN: usize = 18;
/// A block in one line stays so up to this many characters.
const ONE_LINE: usize = 100;

/// What the vocabulary has to say about the layout of a line.
pub trait Spelling {
    /// How many tokens after the key stand in the key column with it (a selector: `soa dc`), or
    /// `None` if the line keeps out of the columns.
    fn selector(&self, tree: &Tree, block: &Block, line: &Line) -> Option<usize>;

    /// The tokens of `line.groups[group]` as they should be written; `None` leaves them.
    fn group(
        &self,
        tree: &Tree,
        block: Option<&Block>,
        line: &Line,
        group: usize,
    ) -> Option<Vec<String>>;
}

/// Leaves every token as it is, and lines up every value after its key.
#[derive(Copy, Clone, Debug)]
pub struct AsWritten;

impl Spelling for AsWritten {
    fn selector(&self, _: &Tree, _: &Block, _: &Line) -> Option<usize> {
        Some(0)
    }

    fn group(&self, _: &Tree, _: Option<&Block>, _: &Line, _: usize) -> Option<Vec<String>> {
        None
    }
}

/// The text in canonical layout. `None` if the respelled text would not be read as it was meant
/// (a token that is not one token, say, or a broken line whose neighbours have moved): then it is
/// better left alone.
#[must_use]
pub fn layout(tree: &Tree, spelling: &dyn Spelling) -> Option<String> {
    let respelled = respelled(tree, spelling);
    let meant = meant(tree, &respelled);
    let mut writer = Writer::new(tree, spelling, &respelled);
    writer.items();
    let result = parse(writer.out);
    let kinds = |tree: &Tree| tree.problems.iter().map(|p| p.kind).collect::<Vec<_>>();
    let same = meant == self::meant(&result, &Respelled::new()) && kinds(tree) == kinds(&result);
    same.then(|| result.text.to_string())
}

/// The new tokens of each group that is spelled anew, by the start of the group.
type Respelled = BTreeMap<usize, Vec<String>>;

fn respelled(tree: &Tree, spelling: &dyn Spelling) -> Respelled {
    let mut result = Respelled::new();
    for item in tree.items.iter().filter(|item| is_sound(tree, item)) {
        let (block, lines) = match item {
            Item::Block(block) => (Some(block), block.lines.as_slice()),
            Item::Line(line) => (None, std::slice::from_ref(line)),
        };
        for line in lines {
            for (index, group) in line.groups.iter().enumerate() {
                let tokens = spelling.group(tree, block, line, index);
                result.extend(tokens.map(|tokens| (group.span.start, tokens)));
            }
        }
    }
    result
}

/// All pieces that carry meaning, as they should be written.
fn meant<'t>(tree: &'t Tree, respelled: &'t Respelled) -> Vec<&'t str> {
    let groups = tree.items.iter().flat_map(|item| match item {
        Item::Block(block) => block.lines.as_slice(),
        Item::Line(line) => std::slice::from_ref(line),
    });
    let mut ends = groups.flat_map(|line| &line.groups).map(|group| group.span);
    let mut replaced = Span::at(0);
    let mut result = Vec::new();
    for mark in tree
        .marks
        .iter()
        .filter(|mark| mark.kind != PieceKind::Comment)
    {
        if let Some(tokens) = respelled.get(&mark.span.start) {
            result.extend(tokens.iter().map(String::as_str));
            let group = ends.find(|group| group.start == mark.span.start);
            replaced = group.unwrap_or(mark.span);
        } else if !replaced.contains(mark.span.start) {
            result.push(mark.span.slice(&tree.text));
        }
    }
    result
}

/// Whether layout may move the lines of an item: it is closed and has no syntax problem.
fn is_sound(tree: &Tree, item: &Item) -> bool {
    let closed = match item {
        Item::Block(block) => block.close.is_some(),
        Item::Line(_) => true,
    };
    closed && !tree.is_faulty(item.span())
}

struct Writer<'a> {
    tree: &'a Tree,
    lines: &'a LineIndex,
    spelling: &'a dyn Spelling,
    respelled: &'a Respelled,
    /// The pieces of each source line.
    rows: Vec<&'a [Piece]>,
    newline: &'static str,
    out: String,
    /// Whether an empty line is due before the next one.
    gap: bool,
    /// Whether an empty line may not follow: at the start of the text and of a block.
    fresh: bool,
}

impl<'a> Writer<'a> {
    fn new(tree: &'a Tree, spelling: &'a dyn Spelling, respelled: &'a Respelled) -> Self {
        let bom = tree.text.starts_with(BYTE_ORDER_MARK);
        Self {
            tree,
            lines: tree.line_index(),
            spelling,
            respelled,
            rows: rows(tree),
            newline: newline(&tree.text),
            out: bom.then_some(BYTE_ORDER_MARK).into_iter().collect(),
            gap: false,
            fresh: true,
        }
    }

    fn items(&mut self) {
        let mut next = 0;
        for item in &self.tree.items {
            let (first, last) = self.rows_of(item.span());
            self.between(next..first, 0);
            match item {
                _ if !is_sound(self.tree, item) => {
                    (next.max(first)..=last).for_each(|row| self.verbatim(row));
                }
                Item::Block(block) => self.block(block),
                Item::Line(line) => self.statement(line, 0, None, 0),
            }
            next = last + 1;
        }
        self.between(next..self.rows.len(), 0);
    }

    // --- blocks ---

    fn block(&mut self, block: &'a Block) {
        let (first, last) = self.rows_of(block.span);
        let header = self.header(block);
        let close = block.close.map_or(block.span.end, |close| close.end);
        if first == last
            && let Some(code) = self.one_line(block, &header)
        {
            return self.put(0, &code, self.comment_after(close));
        }
        let heads: Vec<Option<usize>> = block.lines.iter().map(|l| self.head(block, l)).collect();
        let column = self.key_column(block, &heads);
        self.put(0, &header, self.comment_after(block.open.end));
        self.fresh = true;
        let mut next = first + 1;
        for (line, head) in block.lines.iter().zip(heads) {
            let (from, to) = self.rows_of(line.span);
            self.between(next..from, INDENT);
            self.statement(line, INDENT, head.map(|_| column), head.unwrap_or(0));
            next = to + 1;
        }
        self.between(next..last, INDENT);
        self.gap = false;
        self.put(0, "}", self.comment_after(close));
    }

    fn header(&self, block: &'a Block) -> String {
        let tokens = std::iter::once(&block.kind).chain(&block.header);
        let words = tokens.map(|token| token.text(&self.tree.text));
        words.chain(["{"]).collect::<Vec<_>>().join(" ")
    }

    /// The block in one line, where it fits.
    fn one_line(&self, block: &'a Block, header: &str) -> Option<String> {
        let mut code = header.to_owned();
        for line in &block.lines {
            code.push(' ');
            code.push_str(line.key.text(&self.tree.text));
            for (index, tokens) in self.groups(line).iter().enumerate() {
                code.push_str(if index == 0 { " " } else { ", " });
                code.push_str(&tokens.join(" "));
            }
        }
        code.push_str(" }");
        (code.chars().count() <= ONE_LINE).then_some(code)
    }

    /// How many tokens of the first group stand in the key column, if the line keeps to it.
    fn head(&self, block: &'a Block, line: &Line) -> Option<usize> {
        let first = self.groups(line).first().map_or(0, Vec::len);
        let selector = self.spelling.selector(self.tree, block, line)?;
        Some(selector.min(first))
    }

    fn key_column(&self, block: &'a Block, heads: &[Option<usize>]) -> usize {
        let lines = block.lines.iter().zip(heads);
        let widths = lines.filter_map(|(line, head)| {
            let groups = self.groups(line);
            let selector = groups.iter().flatten().take((*head)?);
            let key = line.key.text(&self.tree.text).chars().count();
            Some(key + selector.map(|t| 1 + t.chars().count()).sum::<usize>())
        });
        widths.fold(KEY_COLUMN, usize::max) + 1
    }

    // --- statements ---

    /// The tokens of each group, as they should be written.
    fn groups(&self, line: &'a Line) -> Vec<Vec<&'a str>> {
        let as_written = |group: &'a Group| {
            let tokens = group.tokens.iter();
            tokens.map(|token| token.text(&self.tree.text)).collect()
        };
        let groups = line.groups.iter();
        groups
            .map(|group| match self.respelled.get(&group.span.start) {
                Some(tokens) => tokens.iter().map(String::as_str).collect(),
                None => as_written(group),
            })
            .collect()
    }

    /// Writes a statement: the key and `head` tokens, what follows at `column` if it keeps to
    /// one, and a new line wherever the author began one.
    fn statement(&mut self, line: &'a Line, indent: usize, column: Option<usize>, head: usize) {
        let groups = self.groups(line);
        let mut code = line.key.text(&self.tree.text).to_owned();
        if let Some(first) = groups.first() {
            push_first_group(&mut code, first, column, head);
        }
        let hanging = indent + column.unwrap_or(INDENT);
        let mut margin = indent;
        for (pair, tokens) in line.groups.windows(2).zip(groups.iter().skip(1)) {
            let [last, group] = pair else { continue };
            code.push(',');
            let (above, below) = self.rows_of(Span::new(last.span.end, group.span.start));
            if above == below {
                code.push(' ');
            } else {
                self.put(margin, &code, self.comment_after(last.span.end));
                for row in above + 1..below {
                    let comment = self.rows.get(row).and_then(|row| row.first());
                    let comment = comment.map(|mark| mark.span);
                    comment
                        .into_iter()
                        .for_each(|c| self.own_line_comment(c, hanging));
                }
                margin = hanging;
                code.clear();
            }
            code.push_str(&tokens.join(" "));
        }
        self.put(margin, &code, self.comment_after(line.span.end));
    }

    // --- source lines ---

    /// The source lines of the first and the last byte.
    fn rows_of(&self, span: Span) -> (usize, usize) {
        (self.lines.line_of(span.start), self.lines.line_of(span.end))
    }

    /// What stands on source lines that belong to no sound statement.
    fn between(&mut self, rows: Range<usize>, indent: usize) {
        for row in rows {
            match self.rows.get(row).copied() {
                None => {}
                Some([]) => self.gap = !self.fresh,
                Some([only]) if only.kind == PieceKind::Comment && !self.is_faulty(row) => {
                    self.own_line_comment(only.span, indent);
                }
                Some(_) => self.verbatim(row),
            }
        }
    }

    /// A comment in column one was put there on purpose.
    fn own_line_comment(&mut self, comment: Span, indent: usize) {
        let start = self.lines.line_start(self.lines.line_of(comment.start));
        let indent = if comment.start == start { 0 } else { indent };
        self.put(indent, "", Some(comment));
    }

    fn is_faulty(&self, row: usize) -> bool {
        self.tree.is_faulty(self.lines.line_span(row))
    }

    fn verbatim(&mut self, row: usize) {
        let text = self.lines.line_text(row);
        let text = text
            .strip_prefix(BYTE_ORDER_MARK)
            .filter(|_| row == 0)
            .unwrap_or(text);
        // In the first line this would be a byte-order mark, and no longer a problem.
        self.gap |= self.out.is_empty() && text.starts_with(BYTE_ORDER_MARK);
        self.begin_line();
        self.out.push_str(text);
        self.out.push_str(self.newline);
    }

    /// The comment on the source line of `end`, unless code other than a comma stands between.
    fn comment_after(&self, end: usize) -> Option<Span> {
        let row = self.rows.get(self.lines.line_of(end))?;
        let mut after = row.iter().filter(|mark| mark.span.start >= end);
        let next = after.find(|mark| mark.kind != PieceKind::Comma)?;
        (next.kind == PieceKind::Comment).then_some(next.span)
    }

    // --- output ---

    fn put(&mut self, indent: usize, code: &str, comment: Option<Span>) {
        self.begin_line();
        self.out.push_str(&" ".repeat(indent));
        self.out.push_str(code);
        if let Some(comment) = comment {
            self.out.push_str(if code.is_empty() { "" } else { "  " });
            self.out.push_str(comment.slice(&self.tree.text).trim_end());
        }
        self.out.push_str(self.newline);
    }

    fn begin_line(&mut self) {
        if std::mem::take(&mut self.gap) {
            self.out.push_str(self.newline);
        }
        self.fresh = false;
    }
}

/// Adds the first group to a key: `head` tokens beside it, the others at `column`.
fn push_first_group(code: &mut String, tokens: &[&str], column: Option<usize>, head: usize) {
    let (selector, rest) = tokens.split_at(head.min(tokens.len()));
    for token in selector {
        code.push(' ');
        code.push_str(token);
    }
    if !rest.is_empty() {
        let padding = column.unwrap_or(0).saturating_sub(code.chars().count());
        code.push_str(&" ".repeat(padding.max(1)));
        code.push_str(&rest.join(" "));
    }
}

/// The pieces of each source line.
fn rows(tree: &Tree) -> Vec<&[Piece]> {
    let lines = tree.line_index();
    let mut rest = tree.marks.as_slice();
    let ends = (0..lines.line_count()).map(|row| lines.line_span(row).end);
    ends.map(|end| {
        let (row, after) = split_line(rest, end);
        rest = after;
        row
    })
    .collect()
}

/// The line end that most lines of the text have; LF where it is a tie, and for a lone CR.
fn newline(text: &str) -> &'static str {
    let all = text.matches('\n').count();
    let with_return = text.matches("\r\n").count();
    if 2 * with_return > all { "\r\n" } else { "\n" }
}
