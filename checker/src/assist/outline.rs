//! The shape of a text: what it declares, what folds, what a selection grows to.
//! Must not know what any block is for.

use ampspec_grammar::{Item, Line, PieceKind, Span, Tree};

/// A block or a line, for an outline.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Entry {
    /// The name of a block, or the key of a line.
    pub name: String,
    /// The kind of a block, or what a line says.
    pub detail: String,
    /// It is a block.
    pub block: bool,
    /// All of it.
    pub span: Span,
    /// Its name or key.
    pub name_span: Span,
    /// The lines of a block.
    pub children: Vec<Self>,
}

/// The outline of a tree.
#[must_use]
pub fn outline(tree: &Tree) -> Vec<Entry> {
    let text = &tree.text;
    let entries = tree.items.iter().map(|item| match item {
        Item::Line(line) => entry(text, line),
        Item::Block(block) => {
            let name = block.name().unwrap_or(block.kind);
            Entry {
                name: name.text(text).to_owned(),
                detail: block.kind.text(text).to_owned(),
                block: true,
                span: block.span,
                name_span: name.span,
                children: block.lines.iter().map(|l| entry(text, l)).collect(),
            }
        }
    });
    entries.collect()
}

fn entry(text: &str, line: &Line) -> Entry {
    let said = Span::new(line.key.span.end, line.span.end).slice(text);
    Entry {
        name: line.key.text(text).to_owned(),
        detail: said.split_whitespace().collect::<Vec<_>>().join(" "),
        block: false,
        span: line.span,
        name_span: line.key.span,
        children: Vec::new(),
    }
}

/// Something that folds.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Fold {
    /// From its first line to its last.
    pub span: Span,
    /// It is a run of comments.
    pub comment: bool,
}

/// Blocks, statements of several lines, and runs of comment lines.
#[must_use]
pub fn folds(tree: &Tree) -> Vec<Fold> {
    let index = tree.line_index();
    let tall = |span: Span| index.line_of(span.start) < index.line_of(span.end);
    let blocks = tree
        .blocks()
        .flat_map(|b| b.lines.iter().map(|l| l.span).chain([b.span]));
    let mut out: Vec<Fold> = blocks
        .filter(|s| tall(*s))
        .map(|span| Fold {
            span,
            comment: false,
        })
        .collect();
    let mut run: Option<Span> = None;
    for piece in tree.pieces().filter(|p| p.kind != PieceKind::Blank) {
        let alone = piece.kind == PieceKind::Comment
            && index
                .line_text(index.line_of(piece.span.start))
                .trim_start()
                .starts_with('#');
        run = match run {
            Some(span)
                if alone && index.line_of(piece.span.start) == index.line_of(span.end) + 1 =>
            {
                Some(span.cover(piece.span))
            }
            _ => {
                out.extend(run.filter(|s| tall(*s)).map(|span| Fold {
                    span,
                    comment: true,
                }));
                alone.then_some(piece.span)
            }
        };
    }
    out.extend(run.filter(|s| tall(*s)).map(|span| Fold {
        span,
        comment: true,
    }));
    out.sort_by_key(|f| f.span);
    out
}

/// What a selection at an offset grows to: token, group, line, block, everything.
#[must_use]
pub fn growing(tree: &Tree, offset: usize) -> Vec<Span> {
    let mut out: Vec<Span> = Vec::new();
    out.extend(super::cursor::token_at(tree, offset).map(|t| t.span));
    if let Some((_, line)) = super::cursor::line_at(tree, offset) {
        out.extend(
            line.groups
                .iter()
                .map(|g| g.span)
                .find(|s| s.touches(offset)),
        );
        out.push(line.span);
    }
    out.extend(tree.blocks().map(|b| b.span).find(|s| s.touches(offset)));
    out.push(Span::new(0, tree.text.len()));
    out.dedup();
    out
}
