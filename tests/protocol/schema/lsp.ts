// What a server may send, by method: results of requests, notifications, and requests of its own (`ask ...`).
// `npx ts-json-schema-generator` makes `lsp-3.17.schema.json` of it: see README.md.

import type * as lsp from "vscode-languageserver-protocol";

export interface Sent {
  initialize?: lsp.InitializeResult;
  shutdown?: null;
  "textDocument/codeAction"?: (lsp.Command | lsp.CodeAction)[] | null;
  "textDocument/codeLens"?: lsp.CodeLens[] | null;
  "textDocument/completion"?: lsp.CompletionItem[] | lsp.CompletionList | null;
  "textDocument/definition"?: lsp.Location | lsp.Location[] | lsp.LocationLink[] | null;
  "textDocument/documentHighlight"?: lsp.DocumentHighlight[] | null;
  "textDocument/documentLink"?: lsp.DocumentLink[] | null;
  "textDocument/documentSymbol"?: lsp.DocumentSymbol[] | lsp.SymbolInformation[] | null;
  "textDocument/foldingRange"?: lsp.FoldingRange[] | null;
  "textDocument/formatting"?: lsp.TextEdit[] | null;
  "textDocument/hover"?: lsp.Hover | null;
  "textDocument/inlayHint"?: lsp.InlayHint[] | null;
  "textDocument/onTypeFormatting"?: lsp.TextEdit[] | null;
  "textDocument/prepareRename"?: lsp.Range | { range: lsp.Range; placeholder: string } | { defaultBehavior: boolean } | null;
  "textDocument/rangeFormatting"?: lsp.TextEdit[] | null;
  "textDocument/references"?: lsp.Location[] | null;
  "textDocument/rename"?: lsp.WorkspaceEdit | null;
  "textDocument/selectionRange"?: lsp.SelectionRange[] | null;
  "textDocument/semanticTokens/full"?: lsp.SemanticTokens | null;
  "textDocument/signatureHelp"?: lsp.SignatureHelp | null;
  "workspace/executeCommand"?: lsp.LSPAny;
  "workspace/symbol"?: lsp.SymbolInformation[] | lsp.WorkspaceSymbol[] | null;
  error?: { code: lsp.integer; message: string; data?: lsp.LSPAny };

  "textDocument/publishDiagnostics"?: lsp.PublishDiagnosticsParams;
  "$/progress"?: { token: lsp.ProgressToken; value: lsp.WorkDoneProgressBegin | lsp.WorkDoneProgressReport | lsp.WorkDoneProgressEnd };
  "window/logMessage"?: lsp.LogMessageParams;
  "window/showMessage"?: lsp.ShowMessageParams;

  "ask client/registerCapability"?: lsp.RegistrationParams;
  "ask window/workDoneProgress/create"?: lsp.WorkDoneProgressCreateParams;
  "ask workspace/applyEdit"?: lsp.ApplyWorkspaceEditParams;
  "ask workspace/codeLens/refresh"?: null;
  "ask workspace/configuration"?: lsp.ConfigurationParams;
  "ask workspace/inlayHint/refresh"?: null;
}
