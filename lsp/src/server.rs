//! The handlers: each hands its message to the owner of the documents before anything else, so that
//! messages are taken in the order of arrival. Must not hold any state, nor answer anything itself.

use std::future::Future;
use std::sync::mpsc::SyncSender;

use derate::assist::hover::PageForm;
use serde_json::{Map, Value};
use tokio::sync::oneshot;
use tower_lsp::LanguageServer;
use tower_lsp::jsonrpc::{Error, Result};
use tower_lsp::lsp_types::*;

use crate::answer::{View, workspace_symbols};
use crate::capabilities::{Client, MARGINS, offered};
use crate::check::Session;
use crate::documents::{Event, Need};
use crate::snapshot::Snapshot;

/// The protocol's side of the server.
#[derive(Debug)]
pub(crate) struct Server {
    events: SyncSender<Event>,
}

impl Server {
    /// A server that tells its events to an owner.
    pub(crate) fn new(events: SyncSender<Event>) -> Self {
        Self { events }
    }

    fn tell(&self, event: Event) {
        // the owner is gone only when the process ends
        let _ = self.events.send(event);
    }

    /// Ask about a document. The question is put before this returns; only the answer is waited for.
    fn ask<T: Send + 'static, Q: FnOnce(&View) -> T + Send + 'static>(
        &self,
        uri: Url,
        need: Need,
        question: Q,
    ) -> impl Future<Output = Result<T>> + Send + use<T, Q> {
        let (reply, answer) = oneshot::channel();
        let work = Box::new(move |view: Result<View>| {
            // a cancelled question is not answered
            if !reply.is_closed() {
                let _ = reply.send(view.map(|v| question(&v)));
            }
        });
        self.tell(Event::Ask(uri, need, work));
        async move {
            answer
                .await
                .unwrap_or_else(|_| Err(Error::internal_error()))
        }
    }

    /// `window/workDoneProgress/cancel`.
    pub(crate) async fn stop(&self, _: Value) {
        self.tell(Event::Stop);
    }

    /// `$/setTrace`: nothing is traced.
    pub(crate) async fn trace(&self, _: Value) {}
}

#[tower_lsp::async_trait]
impl LanguageServer for Server {
    async fn initialize(&self, params: InitializeParams) -> Result<InitializeResult> {
        let client = Client::of(&params);
        let capabilities = offered(&client);
        // older clients send nothing else
        let old = params.root_uri;
        let folders = match params.workspace_folders {
            Some(folders) if !folders.is_empty() => folders.into_iter().map(|f| f.uri).collect(),
            _ => old.into_iter().collect(),
        };
        self.tell(Event::Start(
            Box::new(client),
            folders,
            params.initialization_options.filter(|o| !o.is_null()),
        ));
        let info = ServerInfo {
            name: env!("CARGO_PKG_NAME").to_owned(),
            version: Some(env!("CARGO_PKG_VERSION").to_owned()),
        };
        Ok(InitializeResult {
            capabilities,
            server_info: Some(info),
        })
    }

    async fn initialized(&self, _: InitializedParams) {
        self.tell(Event::Ready);
    }

    async fn shutdown(&self) -> Result<()> {
        Ok(())
    }

    async fn did_open(&self, params: DidOpenTextDocumentParams) {
        let document = params.text_document;
        self.tell(Event::Open(document.uri, document.version, document.text));
    }

    async fn did_change(&self, params: DidChangeTextDocumentParams) {
        let document = params.text_document;
        self.tell(Event::Change(
            document.uri,
            document.version,
            params.content_changes,
        ));
    }

    async fn did_save(&self, params: DidSaveTextDocumentParams) {
        self.tell(Event::Touched(vec![params.text_document.uri]));
    }

    async fn did_close(&self, params: DidCloseTextDocumentParams) {
        self.tell(Event::Close(params.text_document.uri));
    }

    async fn did_change_watched_files(&self, params: DidChangeWatchedFilesParams) {
        self.tell(Event::Touched(
            params.changes.into_iter().map(|c| c.uri).collect(),
        ));
    }

    async fn did_change_workspace_folders(&self, params: DidChangeWorkspaceFoldersParams) {
        let uris = |folders: Vec<WorkspaceFolder>| folders.into_iter().map(|f| f.uri).collect();
        self.tell(Event::Folders(
            uris(params.event.added),
            uris(params.event.removed),
        ));
    }

    async fn did_change_configuration(&self, params: DidChangeConfigurationParams) {
        // many clients say only that something changed, with nothing or an empty object
        let empty = |s: &Value| s.is_null() || s.as_object().is_some_and(Map::is_empty);
        self.tell(Event::Settings(Some(params.settings).filter(|s| !empty(s))));
    }

    async fn hover(&self, params: HoverParams) -> Result<Option<Hover>> {
        let TextDocumentPositionParams {
            text_document,
            position,
        } = params.text_document_position_params;
        self.ask(text_document.uri, Need::CheckAt(position), move |v| {
            v.hover(position)
        })
        .await
    }

    async fn completion(&self, params: CompletionParams) -> Result<Option<CompletionResponse>> {
        let TextDocumentPositionParams {
            text_document,
            position,
        } = params.text_document_position;
        self.ask(text_document.uri, Need::Text, move |v| {
            Some(v.completion(position))
        })
        .await
    }

    async fn signature_help(&self, params: SignatureHelpParams) -> Result<Option<SignatureHelp>> {
        let TextDocumentPositionParams {
            text_document,
            position,
        } = params.text_document_position_params;
        self.ask(text_document.uri, Need::Text, move |v| {
            v.signature(position)
        })
        .await
    }

    async fn inlay_hint(&self, params: InlayHintParams) -> Result<Option<Vec<InlayHint>>> {
        self.ask(params.text_document.uri, Need::Check, move |v| {
            Some(v.inlay_hints(params.range))
        })
        .await
    }

    async fn code_lens(&self, params: CodeLensParams) -> Result<Option<Vec<CodeLens>>> {
        self.ask(params.text_document.uri, Need::Check, |v| Some(v.lenses()))
            .await
    }

    async fn code_action(&self, params: CodeActionParams) -> Result<Option<CodeActionResponse>> {
        self.ask(params.text_document.uri.clone(), Need::Check, move |v| {
            Some(v.actions(&params))
        })
        .await
    }

    async fn formatting(&self, params: DocumentFormattingParams) -> Result<Option<Vec<TextEdit>>> {
        self.ask(params.text_document.uri, Need::Text, |v| Some(v.format()))
            .await
    }

    async fn range_formatting(
        &self,
        params: DocumentRangeFormattingParams,
    ) -> Result<Option<Vec<TextEdit>>> {
        self.ask(params.text_document.uri, Need::Text, move |v| {
            Some(v.format_range(params.range))
        })
        .await
    }

    async fn on_type_formatting(
        &self,
        params: DocumentOnTypeFormattingParams,
    ) -> Result<Option<Vec<TextEdit>>> {
        let TextDocumentPositionParams {
            text_document,
            position,
        } = params.text_document_position;
        self.ask(text_document.uri, Need::Text, move |v| {
            Some(v.format_typed(position, &params.ch))
        })
        .await
    }

    async fn goto_definition(
        &self,
        params: GotoDefinitionParams,
    ) -> Result<Option<GotoDefinitionResponse>> {
        let TextDocumentPositionParams {
            text_document,
            position,
        } = params.text_document_position_params;
        self.ask(text_document.uri, Need::Text, move |v| {
            v.definition(position)
        })
        .await
    }

    async fn references(&self, params: ReferenceParams) -> Result<Option<Vec<Location>>> {
        let TextDocumentPositionParams {
            text_document,
            position,
        } = params.text_document_position;
        let declaration = params.context.include_declaration;
        self.ask(text_document.uri, Need::Text, move |v| {
            v.references(position, declaration)
        })
        .await
    }

    async fn document_highlight(
        &self,
        params: DocumentHighlightParams,
    ) -> Result<Option<Vec<DocumentHighlight>>> {
        let TextDocumentPositionParams {
            text_document,
            position,
        } = params.text_document_position_params;
        self.ask(text_document.uri, Need::Text, move |v| {
            v.highlights(position)
        })
        .await
    }

    async fn prepare_rename(
        &self,
        params: TextDocumentPositionParams,
    ) -> Result<Option<PrepareRenameResponse>> {
        self.ask(params.text_document.uri, Need::Text, move |v| {
            v.prepare_rename(params.position)
        })
        .await
    }

    async fn rename(&self, params: RenameParams) -> Result<Option<WorkspaceEdit>> {
        let TextDocumentPositionParams {
            text_document,
            position,
        } = params.text_document_position;
        self.ask(text_document.uri, Need::Text, move |v| {
            v.rename(position, &params.new_name)
        })
        .await?
    }

    async fn document_symbol(
        &self,
        params: DocumentSymbolParams,
    ) -> Result<Option<DocumentSymbolResponse>> {
        self.ask(params.text_document.uri, Need::Text, |v| Some(v.symbols()))
            .await
    }

    async fn symbol(
        &self,
        params: WorkspaceSymbolParams,
    ) -> Result<Option<Vec<SymbolInformation>>> {
        let (reply, answer) = oneshot::channel();
        self.tell(Event::AskAll(Box::new(
            move |snapshot: &Snapshot, session: &Session| {
                if !reply.is_closed() {
                    let _ = reply.send(workspace_symbols(snapshot, session, &params.query));
                }
            },
        )));
        answer.await.map(Some).map_err(|_| Error::internal_error())
    }

    async fn folding_range(&self, params: FoldingRangeParams) -> Result<Option<Vec<FoldingRange>>> {
        self.ask(params.text_document.uri, Need::Text, |v| Some(v.folds()))
            .await
    }

    async fn selection_range(
        &self,
        params: SelectionRangeParams,
    ) -> Result<Option<Vec<SelectionRange>>> {
        self.ask(params.text_document.uri, Need::Text, move |v| {
            Some(v.selections(&params.positions))
        })
        .await
    }

    async fn document_link(&self, params: DocumentLinkParams) -> Result<Option<Vec<DocumentLink>>> {
        self.ask(params.text_document.uri, Need::Text, |v| Some(v.links()))
            .await
    }

    async fn semantic_tokens_full(
        &self,
        params: SemanticTokensParams,
    ) -> Result<Option<SemanticTokensResult>> {
        self.ask(params.text_document.uri, Need::Text, |v| {
            Some(v.semantic_tokens())
        })
        .await
    }

    async fn execute_command(&self, params: ExecuteCommandParams) -> Result<Option<Value>> {
        let argument = |at: usize| params.arguments.get(at).and_then(Value::as_str);
        let form = match argument(1) {
            Some("html") => PageForm::Html,
            _ => PageForm::Markdown,
        };
        match argument(0).and_then(|u| Url::parse(u).ok()) {
            Some(uri) if params.command == MARGINS => {
                self.ask(uri, Need::Check, move |v| v.margins(form)).await
            }
            _ => Err(Error::invalid_params(format!(
                "`{MARGINS}` takes the address of a spec"
            ))),
        }
    }
}
