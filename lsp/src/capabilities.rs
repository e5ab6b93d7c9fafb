//! What the client can do, what this server offers it, and the settings it may send.
//! Must not know how anything is answered.

use ampspec_grammar::ColumnUnit;
use derate::Duty;
use derate::assist::hints::Wanted;
use serde::Deserialize;
use serde_json::Value;
use tower_lsp::lsp_types::*;

use crate::convert::legend;

/// The command that answers with the margin summary of a spec: as Markdown, or as HTML where its second
/// argument says `html`.
pub(crate) const MARGINS: &str = "derate.margins";

/// What the client can do, as far as it matters here.
#[derive(Clone, Debug)]
pub(crate) struct Client {
    /// What a column counts.
    pub(crate) unit: ColumnUnit,
    /// It shows related places of a diagnostic.
    pub(crate) related: bool,
    /// It shows tags of a diagnostic.
    pub(crate) tags: bool,
    /// It takes versioned edits.
    pub(crate) document_changes: bool,
    /// It takes snippets.
    pub(crate) snippets: bool,
    /// It shows Markdown.
    pub(crate) markdown: bool,
    /// It shows an outline as a tree.
    pub(crate) symbol_tree: bool,
    /// It takes code actions, not only commands.
    pub(crate) actions: bool,
    /// It answers `workspace/configuration`.
    pub(crate) configuration: bool,
    /// It lets the server ask for watched files.
    pub(crate) watching: bool,
    /// It shows progress.
    pub(crate) progress: bool,
    /// It can be asked to fetch hints anew.
    pub(crate) hint_refresh: bool,
    /// It can be asked to fetch lenses anew.
    pub(crate) lens_refresh: bool,
    /// Its process.
    pub(crate) process: Option<u32>,
}

impl Client {
    /// Read off what the client says on starting.
    pub(crate) fn of(params: &InitializeParams) -> Self {
        let all = &params.capabilities;
        let text = all.text_document.clone().unwrap_or_default();
        let workspace = all.workspace.clone().unwrap_or_default();
        let encodings = all
            .general
            .as_ref()
            .and_then(|g| g.position_encodings.clone())
            .unwrap_or_default();
        let publish = text.publish_diagnostics.unwrap_or_default();
        let item = text
            .completion
            .and_then(|c| c.completion_item)
            .unwrap_or_default();
        let formats = text
            .hover
            .and_then(|h| h.content_format)
            .unwrap_or_default();
        Self {
            // bytes cost nothing to convert; UTF-16 is what every client takes
            unit: if encodings.contains(&PositionEncodingKind::UTF8) || takes_bytes(params) {
                ColumnUnit::Byte
            } else {
                ColumnUnit::Utf16
            },
            related: publish.related_information.unwrap_or(false),
            tags: publish.tag_support.is_some(),
            document_changes: workspace
                .workspace_edit
                .and_then(|e| e.document_changes)
                .unwrap_or(false),
            snippets: item.snippet_support.unwrap_or(false),
            markdown: formats.contains(&MarkupKind::Markdown),
            symbol_tree: text
                .document_symbol
                .and_then(|s| s.hierarchical_document_symbol_support)
                .unwrap_or(false),
            actions: text
                .code_action
                .is_some_and(|a| a.code_action_literal_support.is_some()),
            configuration: workspace.configuration.unwrap_or(false),
            watching: workspace
                .did_change_watched_files
                .and_then(|w| w.dynamic_registration)
                .unwrap_or(false),
            progress: all
                .window
                .as_ref()
                .and_then(|w| w.work_done_progress)
                .unwrap_or(false),
            hint_refresh: workspace
                .inlay_hint
                .and_then(|h| h.refresh_support)
                .unwrap_or(false),
            lens_refresh: workspace
                .code_lens
                .and_then(|l| l.refresh_support)
                .unwrap_or(false),
            process: params.process_id,
        }
    }

    fn encoding(&self) -> PositionEncodingKind {
        match self.unit {
            ColumnUnit::Byte => PositionEncodingKind::UTF8,
            ColumnUnit::Utf16 | ColumnUnit::Character => PositionEncodingKind::UTF16,
        }
    }
}

/// Whether the client's options say that it takes columns for bytes whatever is agreed on: some do, and
/// would put an edit behind a `±` in the wrong place.
fn takes_bytes(params: &InitializeParams) -> bool {
    let options = params.initialization_options.as_ref();
    options
        .and_then(|o| o.get("columns"))
        .and_then(Value::as_str)
        == Some("bytes")
}

/// What this server offers.
pub(crate) fn offered(client: &Client) -> ServerCapabilities {
    ServerCapabilities {
        position_encoding: Some(client.encoding()),
        text_document_sync: Some(TextDocumentSyncCapability::Options(
            TextDocumentSyncOptions {
                open_close: Some(true),
                change: Some(TextDocumentSyncKind::INCREMENTAL),
                will_save: None,
                will_save_wait_until: None,
                save: Some(TextDocumentSyncSaveOptions::Supported(true)),
            },
        )),
        hover_provider: Some(HoverProviderCapability::Simple(true)),
        inlay_hint_provider: Some(OneOf::Left(true)),
        code_lens_provider: Some(CodeLensOptions {
            resolve_provider: Some(false),
        }),
        completion_provider: Some(CompletionOptions {
            trigger_characters: Some(vec![" ".to_owned()]),
            ..CompletionOptions::default()
        }),
        signature_help_provider: Some(SignatureHelpOptions {
            trigger_characters: Some(vec![" ".to_owned(), ",".to_owned()]),
            retrigger_characters: None,
            work_done_progress_options: WorkDoneProgressOptions::default(),
        }),
        code_action_provider: client.actions.then(|| {
            CodeActionProviderCapability::Options(CodeActionOptions {
                code_action_kinds: Some(vec![CodeActionKind::QUICKFIX]),
                ..CodeActionOptions::default()
            })
        }),
        document_formatting_provider: Some(OneOf::Left(true)),
        document_range_formatting_provider: Some(OneOf::Left(true)),
        document_on_type_formatting_provider: Some(DocumentOnTypeFormattingOptions {
            first_trigger_character: "\n".to_owned(),
            more_trigger_character: Some(vec!["}".to_owned()]),
        }),
        definition_provider: Some(OneOf::Left(true)),
        references_provider: Some(OneOf::Left(true)),
        document_highlight_provider: Some(OneOf::Left(true)),
        rename_provider: Some(OneOf::Right(RenameOptions {
            prepare_provider: Some(true),
            work_done_progress_options: WorkDoneProgressOptions::default(),
        })),
        document_symbol_provider: Some(OneOf::Left(true)),
        workspace_symbol_provider: Some(OneOf::Left(true)),
        folding_range_provider: Some(FoldingRangeProviderCapability::Simple(true)),
        selection_range_provider: Some(SelectionRangeProviderCapability::Simple(true)),
        document_link_provider: Some(DocumentLinkOptions {
            resolve_provider: Some(false),
            work_done_progress_options: WorkDoneProgressOptions::default(),
        }),
        semantic_tokens_provider: Some(SemanticTokensServerCapabilities::SemanticTokensOptions(
            SemanticTokensOptions {
                legend: legend(),
                full: Some(SemanticTokensFullOptions::Bool(true)),
                range: Some(false),
                ..SemanticTokensOptions::default()
            },
        )),
        execute_command_provider: Some(ExecuteCommandOptions {
            commands: vec![MARGINS.to_owned()],
            ..ExecuteCommandOptions::default()
        }),
        workspace: Some(WorkspaceServerCapabilities {
            workspace_folders: Some(WorkspaceFoldersServerCapabilities {
                supported: Some(true),
                change_notifications: Some(OneOf::Left(true)),
            }),
            file_operations: None,
        }),
        ..ServerCapabilities::default()
    }
}

/// What a person can set, under `derate`.
#[derive(Clone, Debug, Default, PartialEq)]
pub(crate) struct Settings {
    /// A policy that replaces the one each build names.
    pub(crate) policy: Option<String>,
    /// A duty that replaces the one each build states.
    pub(crate) duty: Option<Duty>,
    /// Check every spec of the workspace, not only the open ones.
    pub(crate) workspace: bool,
    /// Which hints.
    pub(crate) hints: Wanted,
}

#[derive(Deserialize, Default)]
#[serde(default)]
struct Sent {
    policy: Option<String>,
    duty: Option<String>,
    workspace: bool,
    hints: SentHints,
}

#[derive(Deserialize)]
#[serde(default)]
struct SentHints {
    derived: bool,
    used: bool,
    names: Vec<String>,
}

impl Default for SentHints {
    fn default() -> Self {
        let Wanted {
            derived,
            used,
            names,
        } = Wanted::default();
        Self {
            derived,
            used,
            names,
        }
    }
}

impl Settings {
    /// Read settings as sent, with or without the word `derate` round them. What is not understood
    /// keeps its default.
    pub(crate) fn of(sent: &Value) -> Self {
        let sent = sent.get("derate").unwrap_or(sent);
        let Sent {
            policy,
            duty,
            workspace,
            hints,
        } = Sent::deserialize(sent).unwrap_or_default();
        let SentHints {
            derived,
            used,
            names,
        } = hints;
        Self {
            policy: policy.filter(|p| !p.is_empty()),
            duty: duty.as_deref().and_then(Duty::read),
            workspace,
            hints: Wanted {
                derived,
                used,
                names,
            },
        }
    }
}
