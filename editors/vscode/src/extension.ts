// Starts the language server and shows the margin report beside the spec. Knows no amplifier.

import { existsSync } from "node:fs";
import { homedir } from "node:os";
import { delimiter, join } from "node:path";
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

/** The server to start: as set, or where `cargo install` puts it, which desktops often leave out of `PATH`. */
function command(): string {
  const wanted = vscode.workspace.getConfiguration("derate").get<string>("server", "derate-lsp");
  const file = process.platform === "win32" ? `${wanted}.exe` : wanted;
  const found = (process.env.PATH ?? "").split(delimiter).some((folder) => existsSync(join(folder, file)));
  const installed = join(homedir(), ".cargo", "bin", file);
  return !found && !/[\\/]/.test(wanted) && existsSync(installed) ? installed : wanted;
}

/** Say what to do about a server that does not start. */
async function explain(server: string): Promise<void> {
  const settings = "Open Settings";
  const text = `The language server \`${server}\` does not start. \`cargo install --path lsp\` in derate's repository installs it; if it is elsewhere, set derate.server.`;
  if ((await vscode.window.showErrorMessage(text, settings)) === settings) {
    await vscode.commands.executeCommand("workbench.action.openSettings", "derate.server");
  }
}

export async function activate(context: vscode.ExtensionContext): Promise<void> {
  const server: ServerOptions = { command: command() };
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
  await client.start().catch(() => explain(server.command));
}

export async function deactivate(): Promise<void> {
  await client?.stop();
}
