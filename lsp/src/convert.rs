//! Byte offsets to protocol positions and back, and every answer of the library to its protocol form.
//! The one place where the two meet. Must not know how an answer was found.

use std::collections::HashMap;

use ampspec_grammar::{ColumnUnit, LineIndex, Span, Tree};
use derate::Outcome;
use derate::assist::complete::{Offer, Sort};
use derate::assist::outline::Entry;
use derate::assist::tokens::{Class, Coloured};
use derate::assist::web::Spot;
use derate::finding::{Severity, Site};
use derate::render::shown::Shown;
use derate::source::Files;
use tower_lsp::lsp_types::*;

use crate::capabilities::Client;
use crate::snapshot::Snapshot;

/// Most related places shown with one diagnostic.
const MOST_RELATED: usize = 12;

fn small(n: usize) -> u32 {
    u32::try_from(n).unwrap_or(u32::MAX >> 1)
}

/// The byte offset of a position; what does not exist is clamped.
pub(crate) fn offset(index: &LineIndex, at: Position, unit: ColumnUnit) -> usize {
    index.offset(at.line as usize, at.character as usize, unit)
}

/// The bytes of a range, whichever way round it is given.
pub(crate) fn span(index: &LineIndex, range: Range, unit: ColumnUnit) -> Span {
    let (a, b) = (
        offset(index, range.start, unit),
        offset(index, range.end, unit),
    );
    Span::new(a.min(b), a.max(b))
}

/// The position of a byte offset.
pub(crate) fn position(index: &LineIndex, offset: usize, unit: ColumnUnit) -> Position {
    let (line, column) = index.locate(offset, unit);
    Position::new(small(line), small(column))
}

/// The range of some bytes.
pub(crate) fn range(index: &LineIndex, span: Span, unit: ColumnUnit) -> Range {
    Range::new(
        position(index, span.start, unit),
        position(index, span.end, unit),
    )
}

/// A place in some file.
pub(crate) fn location(snapshot: &Snapshot, spot: &Spot, unit: ColumnUnit) -> Option<Location> {
    let tree = snapshot.tree(&spot.path).ok()?;
    Some(Location {
        uri: snapshot.uri_of(&spot.path)?,
        range: range(tree.line_index(), spot.span, unit),
    })
}

/// A finding.
pub(crate) fn diagnostic(
    snapshot: &Snapshot,
    outcome: &Outcome,
    shown: &Shown<'_>,
    client: &Client,
) -> Option<Diagnostic> {
    let file = outcome.sources.file(shown.site.file)?;
    let place = |site: Site| {
        let file = outcome.sources.file(site.file)?;
        Some(Location {
            uri: snapshot.uri_of(&file.path)?,
            range: range(file.tree.line_index(), site.span, client.unit),
        })
    };
    let related = shown.related.iter().take(MOST_RELATED).filter_map(|r| {
        Some(DiagnosticRelatedInformation {
            location: place(r.site)?,
            message: r.message.clone(),
        })
    });
    let related: Vec<_> = if client.related {
        related.collect()
    } else {
        Vec::new()
    };
    let severity = match (shown.waiver, shown.severity) {
        (Some(_), _) => DiagnosticSeverity::HINT,
        (None, Severity::Error) => DiagnosticSeverity::ERROR,
        (None, Severity::Warning) => DiagnosticSeverity::WARNING,
        (None, Severity::Information) => DiagnosticSeverity::INFORMATION,
    };
    let tag = match shown.rule {
        "data.unused" => Some(DiagnosticTag::UNNECESSARY),
        "data.stale-waiver" => Some(DiagnosticTag::DEPRECATED),
        _ => None,
    };
    let help = shown.help();
    let message = if help.is_empty() {
        shown.message.clone()
    } else {
        format!("{}\n{help}", shown.message)
    };
    Some(Diagnostic {
        range: range(file.tree.line_index(), shown.site.span, client.unit),
        severity: Some(severity),
        code: Some(NumberOrString::String(shown.rule.to_owned())),
        code_description: None,
        source: Some("derate".to_owned()),
        message,
        related_information: (!related.is_empty()).then_some(related),
        tags: tag.filter(|_| client.tags).map(|t| vec![t]),
        data: None,
    })
}

/// Edits of several files. Open documents are named with the version the edits were made for.
pub(crate) fn workspace_edit(
    snapshot: &Snapshot,
    edits: &[(Spot, String)],
    client: &Client,
) -> Option<WorkspaceEdit> {
    let mut by_file: Vec<(Url, Option<i32>, Vec<TextEdit>)> = Vec::new();
    for (spot, text) in edits {
        let Location { uri, range } = location(snapshot, spot, client.unit)?;
        let edit = TextEdit::new(range, text.clone());
        match by_file.iter_mut().find(|f| f.0 == uri) {
            Some(file) => file.2.push(edit),
            None => by_file.push((
                uri,
                snapshot.buffers.get(&spot.path).map(|b| b.version),
                vec![edit],
            )),
        }
    }
    if client.document_changes {
        let changes = by_file
            .into_iter()
            .map(|(uri, version, edits)| TextDocumentEdit {
                text_document: OptionalVersionedTextDocumentIdentifier { uri, version },
                edits: edits.into_iter().map(OneOf::Left).collect(),
            });
        return Some(WorkspaceEdit {
            document_changes: Some(DocumentChanges::Edits(changes.collect())),
            ..WorkspaceEdit::default()
        });
    }
    let changes: HashMap<Url, Vec<TextEdit>> = by_file
        .into_iter()
        .map(|(uri, _, edits)| (uri, edits))
        .collect();
    Some(WorkspaceEdit {
        changes: Some(changes),
        ..WorkspaceEdit::default()
    })
}

/// Edits of one text.
pub(crate) fn text_edits(
    tree: &Tree,
    edits: Vec<(Span, String)>,
    unit: ColumnUnit,
) -> Vec<TextEdit> {
    edits
        .into_iter()
        .map(|(span, text)| TextEdit::new(range(tree.line_index(), span, unit), text))
        .collect()
}

/// Something that may be written.
pub(crate) fn completion(tree: &Tree, offer: Offer, client: &Client) -> CompletionItem {
    let kind = match offer.sort {
        Sort::Block => CompletionItemKind::CLASS,
        Sort::Key => CompletionItemKind::PROPERTY,
        Sort::Word => CompletionItemKind::ENUM_MEMBER,
        Sort::Unit => CompletionItemKind::UNIT,
        Sort::Name => CompletionItemKind::VARIABLE,
        Sort::Rule => CompletionItemKind::FUNCTION,
        Sort::Policy => CompletionItemKind::CONSTANT,
    };
    let snippet = offer.snippet.filter(|_| client.snippets);
    let format = if snippet.is_some() {
        InsertTextFormat::SNIPPET
    } else {
        InsertTextFormat::PLAIN_TEXT
    };
    let text = snippet.unwrap_or(offer.insert);
    CompletionItem {
        sort_text: Some(format!("{}{}", offer.rank, offer.label)),
        label: offer.label,
        kind: Some(kind),
        detail: Some(offer.detail).filter(|d| !d.is_empty()),
        documentation: Some(offer.help)
            .filter(|h| !h.is_empty())
            .map(|h| Documentation::MarkupContent(markup(h, client.markdown))),
        insert_text_format: Some(format),
        text_edit: Some(CompletionTextEdit::Edit(TextEdit::new(
            range(tree.line_index(), offer.replaces, client.unit),
            text,
        ))),
        ..CompletionItem::default()
    }
}

/// Markdown for clients that show it, and its bare text for those that do not.
pub(crate) fn markup(markdown: String, shows: bool) -> MarkupContent {
    if shows {
        return MarkupContent {
            kind: MarkupKind::Markdown,
            value: markdown,
        };
    }
    let mut plain = String::with_capacity(markdown.len());
    let mut escaped = false;
    for c in markdown.chars() {
        match c {
            '\\' if !escaped => escaped = true,
            '`' | '*' if !escaped => {}
            c => {
                plain.push(c);
                escaped = false;
            }
        }
    }
    let plain = plain
        .replace("&lt;", "<")
        .replace("&gt;", ">")
        .replace("&#64;", "@")
        .replace("&#58;", ":")
        .replace("&#46;", ".")
        .replace("&amp;", "&");
    MarkupContent {
        kind: MarkupKind::PlainText,
        value: plain,
    }
}

/// An outline, as a tree or as a list, as the client takes it.
pub(crate) fn symbols(
    tree: &Tree,
    uri: &Url,
    entries: Vec<Entry>,
    client: &Client,
) -> DocumentSymbolResponse {
    if client.symbol_tree {
        return DocumentSymbolResponse::Nested(
            entries
                .into_iter()
                .map(|e| symbol(tree, e, client.unit))
                .collect(),
        );
    }
    let blocks = entries.into_iter().filter(|e| e.block);
    DocumentSymbolResponse::Flat(
        blocks
            .map(|e| {
                flat(
                    tree.line_index(),
                    uri,
                    e.name,
                    Some(e.detail),
                    e.span,
                    client.unit,
                )
            })
            .collect(),
    )
}

#[expect(deprecated, reason = "the field has no default")]
fn symbol(tree: &Tree, entry: Entry, unit: ColumnUnit) -> DocumentSymbol {
    let index = tree.line_index();
    DocumentSymbol {
        name: entry.name,
        detail: Some(entry.detail),
        kind: if entry.block {
            SymbolKind::OBJECT
        } else {
            SymbolKind::PROPERTY
        },
        tags: None,
        deprecated: None,
        range: range(index, entry.span, unit),
        selection_range: range(index, entry.name_span, unit),
        children: entry.block.then(|| {
            entry
                .children
                .into_iter()
                .map(|e| symbol(tree, e, unit))
                .collect()
        }),
    }
}

/// A symbol by its place.
#[expect(deprecated, reason = "the field has no default")]
pub(crate) fn flat(
    index: &LineIndex,
    uri: &Url,
    name: String,
    container: Option<String>,
    span: Span,
    unit: ColumnUnit,
) -> SymbolInformation {
    SymbolInformation {
        name,
        kind: SymbolKind::OBJECT,
        tags: None,
        deprecated: None,
        location: Location {
            uri: uri.clone(),
            range: range(index, span, unit),
        },
        container_name: container,
    }
}

/// The classes of words, in the order of [`legend`].
const CLASSES: &[(Class, SemanticTokenType)] = &[
    (Class::Keyword, SemanticTokenType::KEYWORD),
    (Class::Key, SemanticTokenType::PROPERTY),
    (Class::Name, SemanticTokenType::VARIABLE),
    (Class::Number, SemanticTokenType::NUMBER),
    (Class::Unit, SemanticTokenType::TYPE),
    (Class::Text, SemanticTokenType::STRING),
    (Class::Comment, SemanticTokenType::COMMENT),
    (Class::Word, SemanticTokenType::ENUM_MEMBER),
    (Class::Link, SemanticTokenType::OPERATOR),
];

/// What the numbers in semantic tokens stand for.
pub(crate) fn legend() -> SemanticTokensLegend {
    SemanticTokensLegend {
        token_types: CLASSES.iter().map(|c| c.1.clone()).collect(),
        token_modifiers: vec![SemanticTokenModifier::DECLARATION],
    }
}

/// Coloured words, each told from the one before.
pub(crate) fn semantic(tree: &Tree, words: &[Coloured], unit: ColumnUnit) -> Vec<SemanticToken> {
    let index = tree.line_index();
    let mut before = Position::new(0, 0);
    let mut out = Vec::with_capacity(words.len());
    for word in words {
        let Range { start, end } = range(index, word.span, unit);
        // no word goes over a line end
        if start.line != end.line {
            continue;
        }
        let delta_line = start.line - before.line;
        out.push(SemanticToken {
            delta_line,
            delta_start: if delta_line == 0 {
                start.character - before.character
            } else {
                start.character
            },
            length: end.character - start.character,
            token_type: small(CLASSES.iter().position(|c| c.0 == word.class).unwrap_or(0)),
            token_modifiers_bitset: u32::from(word.declares),
        });
        before = start;
    }
    out
}
