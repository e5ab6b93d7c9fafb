// Starts the language server and shows the margin report beside the spec. Knows no amplifier.

import { existsSync } from "node:fs";
import { homedir } from "node:os";
import { delimiter, join } from "node:path";
import * as vscode from "vscode";
import { LanguageClient, LanguageClientOptions, ServerOptions } from "vscode-languageclient/node";

/** The server's command that answers with the margin summary of a spec. */
const MARGINS = "derate.margins";

/** The page in the colours of the editor, and fit for half its width; it brings its own look for a browser. */
const STYLE = `<style>
:root { color-scheme: normal; --over: var(--vscode-errorForeground); --thin: var(--vscode-editorWarning-foreground);
  --ok: var(--vscode-testing-iconPassed); --unchecked: var(--vscode-descriptionForeground); }
body { margin: 1rem 0; color: var(--vscode-foreground); font: var(--vscode-font-size) var(--vscode-font-family); }
th, td { padding: .15rem .5rem; }
th:last-child, td:last-child:not([colspan]) { min-width: 32rem; }
td:first-child { white-space: nowrap; }
tr:has(> .over) td:first-child { color: var(--over); } tr:has(> .thin) td:first-child { color: var(--thin); }
</style></head>`;

let client: LanguageClient | undefined;

/** Margin reports beside their specs, each kept up to date. */
class Reports {
  private readonly panels = new Map<string, vscode.WebviewPanel>();

  async show(spec: vscode.Uri | undefined): Promise<void> {
    const wanted = spec ?? vscode.window.activeTextEditor?.document.uri;
    if (!wanted) {
      return;
    }
    const key = wanted.toString();
    const open = this.panels.get(key);
    if (open) {
      return open.reveal(undefined, true);
    }
    const name = wanted.path.split("/").pop() ?? "spec";
    const beside = { viewColumn: vscode.ViewColumn.Beside, preserveFocus: true };
    const panel = vscode.window.createWebviewPanel("derate.report", `Margins of ${name}`, beside);
    this.panels.set(key, panel);
    panel.onDidDispose(() => this.panels.delete(key));
    await this.refresh(wanted);
  }

  async refresh(spec: vscode.Uri): Promise<void> {
    const panel = this.panels.get(spec.toString());
    if (!panel || !client) {
      return;
    }
    const address = client.code2ProtocolConverter.asUri(spec);
    // a text that changes meanwhile is answered anew when its findings come
    const page = await client.sendRequest<string | null>("workspace/executeCommand", { command: MARGINS, arguments: [address, "html"] }).catch(() => undefined);
    if (page !== undefined) {
      panel.webview.html = (page ?? "This spec has no margins yet.").replace("</head>", STYLE);
    }
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
  const reports = new Reports();
  const options: LanguageClientOptions = {
    documentSelector: [{ language: "ampspec" }],
    synchronize: { configurationSection: "derate" },
    initializationOptions: { derate: vscode.workspace.getConfiguration("derate") },
    middleware: {
      // the lens over a build asks the server for the summary: show it
      executeCommand: async (name, args, next) => {
        if (name === MARGINS && typeof args[0] === "string") {
          return reports.show(client?.protocol2CodeConverter.asUri(args[0]));
        }
        return next(name, args);
      },
    },
  };
  client = new LanguageClient("derate", "derate", server, options);
  context.subscriptions.push(
    vscode.commands.registerCommand("derate.report", (spec?: vscode.Uri) => reports.show(spec)),
    vscode.languages.onDidChangeDiagnostics((event) => event.uris.forEach((uri) => reports.refresh(uri))),
  );
  await client.start().catch(() => explain(server.command));
}

export async function deactivate(): Promise<void> {
  await client?.stop();
}
