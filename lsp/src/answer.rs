//! Every question about a document: convert, ask the library, convert.
//! Must not know when the document changed, nor anything about amplifiers.

use std::path::PathBuf;
use std::sync::Arc;

use ampspec_grammar::{Span, Tree};
use derate::assist::fix::Fix;
use derate::assist::hints::Wanted;
use derate::assist::names::{Role, refused};
use derate::assist::web::{Spot, Web, declarations};
use derate::assist::{Scene, complete, fix, hints, hover, lay, links, outline, signature, tokens};
use derate::source::Files;
use derate::{Options, Outcome};
use serde_json::Value;
use tower_lsp::jsonrpc;
use tower_lsp::lsp_types::*;

use crate::capabilities::MARGINS;
use crate::check::Session;
use crate::convert;
use crate::snapshot::Snapshot;

/// Most symbols of a workspace that are listed.
const MOST_SYMBOLS: usize = 1000;

/// One document at one moment, with everything it is answered from.
pub(crate) struct View {
    pub(crate) snapshot: Snapshot,
    pub(crate) session: Arc<Session>,
    pub(crate) hints: Wanted,
    /// The specs that read it.
    pub(crate) near: Vec<PathBuf>,
    pub(crate) uri: Url,
    pub(crate) path: PathBuf,
    pub(crate) tree: Arc<Tree>,
    pub(crate) outcomes: Vec<Arc<Outcome>>,
}

impl View {
    fn offset(&self, at: Position) -> usize {
        convert::offset(self.tree.line_index(), at, self.session.client.unit)
    }

    fn range(&self, span: Span) -> Range {
        convert::range(self.tree.line_index(), span, self.session.client.unit)
    }

    fn span(&self, range: Range) -> Span {
        convert::span(self.tree.line_index(), range, self.session.client.unit)
    }

    /// The files that this one has to do with.
    fn web(&self) -> Web {
        Web::load(
            &self.snapshot,
            [self.path.clone()]
                .into_iter()
                .chain(self.near.iter().cloned()),
        )
    }

    /// Every file of the workspace besides.
    fn wide_web(&self) -> Web {
        wide_web(&self.snapshot, &self.session, Some(self.path.clone()))
    }

    fn scene<'a>(&'a self, web: &'a Web) -> Scene<'a> {
        Scene {
            path: &self.path,
            tree: &self.tree,
            web,
            outcomes: &self.outcomes,
        }
    }

    fn locations<'a>(&self, spots: impl IntoIterator<Item = &'a Spot>) -> Vec<Location> {
        spots
            .into_iter()
            .filter_map(|s| convert::location(&self.snapshot, s, self.session.client.unit))
            .collect()
    }

    pub(crate) fn hover(&self, at: Position) -> Option<Hover> {
        let web = self.web();
        let found = hover::hover(&self.scene(&web), self.offset(at))?;
        let contents = HoverContents::Markup(convert::markup(
            found.markdown,
            self.session.client.markdown,
        ));
        Some(Hover {
            contents,
            range: Some(self.range(found.span)),
        })
    }

    pub(crate) fn completion(&self, at: Position) -> CompletionResponse {
        let web = self.web();
        let offers = complete::complete(&self.scene(&web), self.offset(at));
        CompletionResponse::Array(
            offers
                .into_iter()
                .map(|o| convert::completion(&self.tree, o, &self.session.client))
                .collect(),
        )
    }

    pub(crate) fn signature(&self, at: Position) -> Option<SignatureHelp> {
        let web = self.web();
        let found = signature::signature(&self.scene(&web), self.offset(at))?;
        let label = |range: &(usize, usize)| {
            ParameterLabel::Simple(found.label.get(range.0..range.1).unwrap_or("").to_owned())
        };
        let parameters = found
            .items
            .iter()
            .map(|r| ParameterInformation {
                label: label(r),
                documentation: None,
            })
            .collect();
        let active = found.active.and_then(|a| u32::try_from(a).ok());
        let signature = SignatureInformation {
            label: found.label.clone(),
            documentation: Some(Documentation::String(found.meaning.to_owned())),
            parameters: Some(parameters),
            active_parameter: active,
        };
        Some(SignatureHelp {
            signatures: vec![signature],
            active_signature: Some(0),
            active_parameter: active,
        })
    }

    pub(crate) fn inlay_hints(&self, range: Range) -> Vec<InlayHint> {
        let web = self.web();
        let found = hints::hints(&self.scene(&web), self.span(range), &self.hints);
        let hint = |h: hints::Hint| InlayHint {
            position: self.range(Span::at(h.offset)).start,
            label: InlayHintLabel::String(h.label),
            kind: None,
            text_edits: None,
            tooltip: Some(InlayHintTooltip::String(h.more)),
            padding_left: Some(true),
            padding_right: None,
            data: None,
        };
        found.into_iter().map(hint).collect()
    }

    pub(crate) fn lenses(&self) -> Vec<CodeLens> {
        let web = self.web();
        let lens = |l: hints::Lens| CodeLens {
            range: self.range(l.span),
            command: Some(Command {
                title: l.label,
                command: MARGINS.to_owned(),
                arguments: Some(vec![Value::String(self.uri.to_string())]),
            }),
            data: None,
        };
        hints::lenses(&self.scene(&web))
            .into_iter()
            .map(lens)
            .collect()
    }

    pub(crate) fn actions(&self, params: &CodeActionParams) -> Vec<CodeActionOrCommand> {
        let wanted = |only: &Vec<CodeActionKind>| {
            only.iter()
                .any(|k| k.as_str().is_empty() || *k == CodeActionKind::QUICKFIX)
        };
        if params.context.only.as_ref().is_some_and(|o| !wanted(o)) {
            return Vec::new();
        }
        let (web, range) = (self.web(), self.span(params.range));
        let mut scene = self.scene(&web);
        let solved;
        if fix::worth_solving(&scene, range) {
            solved = self
                .outcomes
                .iter()
                .map(|o| self.with_changes(o))
                .collect::<Vec<_>>();
            scene.outcomes = &solved;
        }
        fix::fixes(&scene, range)
            .into_iter()
            .filter_map(|f| self.action(f, &params.context.diagnostics))
            .collect()
    }

    /// The same check, with changes looked for.
    fn with_changes(&self, outcome: &Arc<Outcome>) -> Arc<Outcome> {
        let Some((_, root)) = outcome.sources.iter().next() else {
            return Arc::clone(outcome);
        };
        let options = Options {
            changes: true,
            ..self.session.options(&root.path)
        };
        let solved = derate::check(&self.snapshot, &root.path, &root.name, &options);
        solved.map_or_else(|_| Arc::clone(outcome), Arc::new)
    }

    fn action(&self, fix: Fix, diagnostics: &[Diagnostic]) -> Option<CodeActionOrCommand> {
        let settles = fix
            .settles
            .as_ref()
            .map(|(rule, _, span)| (NumberOrString::String(rule.clone()), self.range(*span)));
        let settled = diagnostics.iter().filter(|d| {
            settles
                .as_ref()
                .is_some_and(|(rule, range)| d.code.as_ref() == Some(rule) && d.range == *range)
        });
        let settled: Vec<Diagnostic> = settled.cloned().collect();
        Some(CodeActionOrCommand::CodeAction(CodeAction {
            title: fix.title,
            kind: Some(CodeActionKind::QUICKFIX),
            diagnostics: (!settled.is_empty()).then_some(settled),
            edit: Some(convert::workspace_edit(
                &self.snapshot,
                &fix.edits,
                &self.session.client,
            )?),
            is_preferred: fix.preferred.then_some(true),
            ..CodeAction::default()
        }))
    }

    pub(crate) fn format(&self) -> Vec<TextEdit> {
        convert::text_edits(&self.tree, lay::edits(&self.tree), self.session.client.unit)
    }

    pub(crate) fn format_range(&self, range: Range) -> Vec<TextEdit> {
        convert::text_edits(
            &self.tree,
            lay::edits_in(&self.tree, self.span(range)),
            self.session.client.unit,
        )
    }

    pub(crate) fn format_typed(&self, at: Position, typed: &str) -> Vec<TextEdit> {
        convert::text_edits(
            &self.tree,
            lay::edits_behind(&self.tree, self.offset(at), typed),
            self.session.client.unit,
        )
    }

    pub(crate) fn definition(&self, at: Position) -> Option<GotoDefinitionResponse> {
        let offset = self.offset(at);
        for (span, path) in links::links(&self.path, &self.tree) {
            if span.touches(offset) {
                let start = Position::new(0, 0);
                return Some(GotoDefinitionResponse::Scalar(Location {
                    uri: self.snapshot.uri_of(&self.snapshot.resolve(&path))?,
                    range: Range::new(start, start),
                }));
            }
        }
        let web = self.web();
        let name = web.name_at(&self.path, offset)?;
        let found = web.find(&self.path, name.span.slice(&self.tree.text))?;
        convert::location(&self.snapshot, &found.spot, self.session.client.unit)
            .map(GotoDefinitionResponse::Scalar)
    }

    pub(crate) fn references(&self, at: Position, declaration: bool) -> Option<Vec<Location>> {
        let web = self.wide_web();
        let name = web.name_at(&self.path, self.offset(at))?;
        let all = web.occurrences(&self.path, name.span.slice(&self.tree.text));
        let wanted = all
            .iter()
            .filter(|(_, role)| declaration || *role == Role::Used);
        Some(self.locations(wanted.map(|(spot, _)| spot)))
    }

    pub(crate) fn highlights(&self, at: Position) -> Option<Vec<DocumentHighlight>> {
        let web = self.web();
        let name = web.name_at(&self.path, self.offset(at))?;
        let all = web.occurrences(&self.path, name.span.slice(&self.tree.text));
        let here = all.into_iter().filter(|(spot, _)| spot.path == self.path);
        let highlight = |(spot, role): (Spot, Role)| DocumentHighlight {
            range: self.range(spot.span),
            kind: Some(if role == Role::Declared {
                DocumentHighlightKind::WRITE
            } else {
                DocumentHighlightKind::READ
            }),
        };
        Some(here.map(highlight).collect())
    }

    pub(crate) fn prepare_rename(&self, at: Position) -> Option<PrepareRenameResponse> {
        let web = self.web();
        let name = web.name_at(&self.path, self.offset(at))?;
        let text = name.span.slice(&self.tree.text);
        web.find(&self.path, text)?;
        Some(PrepareRenameResponse::RangeWithPlaceholder {
            range: self.range(name.span),
            placeholder: text.to_owned(),
        })
    }

    pub(crate) fn rename(&self, at: Position, new: &str) -> jsonrpc::Result<Option<WorkspaceEdit>> {
        let refuse = |why: String| {
            Err(jsonrpc::Error {
                message: why.into(),
                ..jsonrpc::Error::invalid_params("")
            })
        };
        let web = self.wide_web();
        let Some(name) = web.name_at(&self.path, self.offset(at)) else {
            return Ok(None);
        };
        let old = name.span.slice(&self.tree.text);
        if web.find(&self.path, old).is_none() {
            return refuse(format!("`{old}` is declared nowhere"));
        }
        if new == old {
            return Ok(None);
        }
        if let Some(why) = refused(new) {
            return refuse(why);
        }
        let all = web.occurrences(&self.path, old);
        let mut homes: Vec<&PathBuf> = all.iter().map(|(spot, _)| &spot.path).collect();
        homes.dedup();
        for home in homes {
            if let Some(taken) = web.find(home, new) {
                return refuse(format!("`{new}` is a {} already", taken.kind.kind));
            }
        }
        let edits: Vec<(Spot, String)> = all
            .into_iter()
            .map(|(spot, _)| (spot, new.to_owned()))
            .collect();
        Ok(convert::workspace_edit(
            &self.snapshot,
            &edits,
            &self.session.client,
        ))
    }

    pub(crate) fn symbols(&self) -> DocumentSymbolResponse {
        convert::symbols(
            &self.tree,
            &self.uri,
            outline::outline(&self.tree),
            &self.session.client,
        )
    }

    pub(crate) fn folds(&self) -> Vec<FoldingRange> {
        let index = self.tree.line_index();
        let row = |at: usize| u32::try_from(index.line_of(at)).unwrap_or(0);
        let fold = |f: outline::Fold| FoldingRange {
            start_line: row(f.span.start),
            end_line: row(f.span.end),
            kind: Some(if f.comment {
                FoldingRangeKind::Comment
            } else {
                FoldingRangeKind::Region
            }),
            ..FoldingRange::default()
        };
        outline::folds(&self.tree).into_iter().map(fold).collect()
    }

    pub(crate) fn selections(&self, positions: &[Position]) -> Vec<SelectionRange> {
        let one = |at: &Position| {
            let spans = outline::growing(&self.tree, self.offset(*at));
            let grown = spans.into_iter().rev().fold(None, |parent, span| {
                Some(Box::new(SelectionRange {
                    range: self.range(span),
                    parent,
                }))
            });
            grown.map_or(
                SelectionRange {
                    range: Range::new(*at, *at),
                    parent: None,
                },
                |r| *r,
            )
        };
        positions.iter().map(one).collect()
    }

    pub(crate) fn links(&self) -> Vec<DocumentLink> {
        let link = |(span, path): (Span, PathBuf)| DocumentLink {
            range: self.range(span),
            target: Url::from_file_path(path).ok(),
            tooltip: None,
            data: None,
        };
        links::links(&self.path, &self.tree)
            .into_iter()
            .map(link)
            .filter(|l| l.target.is_some())
            .collect()
    }

    pub(crate) fn semantic_tokens(&self) -> SemanticTokensResult {
        let web = self.web();
        let words = tokens::tokens(&self.tree, &web.kinds(&self.path));
        SemanticTokensResult::Tokens(SemanticTokens {
            result_id: None,
            data: convert::semantic(&self.tree, &words, self.session.client.unit),
        })
    }

    /// The margin summary as a page.
    pub(crate) fn margins(&self, form: hover::PageForm) -> Option<Value> {
        let outcome = self.outcomes.first()?;
        Some(Value::String(hover::page(Outcome::clone(outcome), form)))
    }
}

/// Every file of the workspace and every open one.
fn wide_web(snapshot: &Snapshot, session: &Session, first: Option<PathBuf>) -> Web {
    let specs = session.specs().into_iter().map(|p| snapshot.resolve(&p));
    let open = snapshot.buffers.keys().cloned();
    Web::load(snapshot, first.into_iter().chain(open).chain(specs))
}

/// Blocks of the whole workspace whose name holds the letters of a query, in their order.
pub(crate) fn workspace_symbols(
    snapshot: &Snapshot,
    session: &Session,
    query: &str,
) -> Vec<SymbolInformation> {
    let web = wide_web(snapshot, session, None);
    let fits = |name: &str| {
        let mut left = name.chars().flat_map(char::to_lowercase);
        query
            .chars()
            .flat_map(char::to_lowercase)
            .all(|q| left.any(|c| c == q))
    };
    let all = web
        .pages()
        .iter()
        .flat_map(|p| declarations(p).map(move |d| (p, d)));
    let found = all.filter(|(_, d)| fits(&d.name)).filter_map(|(page, d)| {
        let uri = snapshot.uri_of(&page.path)?;
        Some(convert::flat(
            page.tree.line_index(),
            &uri,
            d.name,
            Some(d.kind.kind.to_owned()),
            d.whole,
            session.client.unit,
        ))
    });
    found.take(MOST_SYMBOLS).collect()
}
