// Starts the language server and shows the margin report beside the spec. Knows no amplifier.

import * as vscode from "vscode";
import { LanguageClient, LanguageClientOptions, ServerOptions } from "vscode-languageclient/node";

/** The server's command that answers with the margin summary of a spec, as Markdown. */
const MARGINS = "derate.margins";
const SCHEME = "derate-margins";

let client: LanguageClient | undefined;

/** Margin summaries as read-only documents, each under the address of its spec. */
class Reports implements vscode.TextDocumentContentProvider {
  private readonly changed = new vscode.EventEmitter<vscode.Uri>();
  readonly onDidChange = this.changed.event;

  async provideTextDocumentContent(report: vscode.Uri): Promise<string> {
    const answer = await client?.sendRequest<string | null>("workspace/executeCommand", { command: MARGINS, arguments: [report.query] });
    return answer ?? "This spec has no margins yet.";
  }

  refresh(spec: vscode.Uri): void {
    this.changed.fire(address(spec));
  }
}

function address(spec: vscode.Uri): vscode.Uri {
  const name = spec.path.split("/").pop() ?? "spec";
  return vscode.Uri.from({ scheme: SCHEME, path: `Margins of ${name}.md`, query: client?.code2ProtocolConverter.asUri(spec) ?? spec.toString() });
}

async function show(spec: vscode.Uri | undefined): Promise<void> {
  const wanted = spec ?? vscode.window.activeTextEditor?.document.uri;
  if (wanted) {
    await vscode.commands.executeCommand("markdown.showPreviewToSide", address(wanted));
  }
}

export async function activate(context: vscode.ExtensionContext): Promise<void> {
  const command = vscode.workspace.getConfiguration("derate").get<string>("server", "derate-lsp");
  const server: ServerOptions = { command };
  const options: LanguageClientOptions = {
    documentSelector: [{ language: "ampspec" }],
    synchronize: { configurationSection: "derate" },
    initializationOptions: { derate: vscode.workspace.getConfiguration("derate") },
    middleware: {
      // the lens over a build asks the server for the summary: show it
      executeCommand: async (name, args, next) => {
        if (name === MARGINS && typeof args[0] === "string") {
          return show(client?.protocol2CodeConverter.asUri(args[0]));
        }
        return next(name, args);
      },
    },
  };
  client = new LanguageClient("derate", "derate", server, options);
  const reports = new Reports();
  context.subscriptions.push(
    vscode.workspace.registerTextDocumentContentProvider(SCHEME, reports),
    vscode.commands.registerCommand("derate.report", (spec?: vscode.Uri) => show(spec)),
    vscode.languages.onDidChangeDiagnostics((event) => event.uris.forEach((uri) => reports.refresh(uri))),
  );
  await client.start();
}

export async function deactivate(): Promise<void> {
  await client?.stop();
}
