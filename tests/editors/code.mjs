// Drives a host of the Visual Studio Code family in a browser without a window, with the packaged extension of
// editors/vscode: node code.mjs CHROMIUM VSIX. Screenshots of every step go to the folder of the artefacts.
// Must not configure anything that concerns the extension.

import { spawn, spawnSync } from "node:child_process";
import { mkdirSync, writeFileSync } from "node:fs";
import { createServer } from "node:net";
import { dirname, join } from "node:path";
import { fileURLToPath } from "node:url";
import { chromium } from "playwright-core";

const [browserPath, vsix] = process.argv.slice(2);
const { KIT, ARTEFACTS, HOME, LINE, CHARACTER } = process.env;
const PATIENCE = 30_000;
const host = fileURLToPath(new URL("node_modules/code-server/lib/vscode/out/server-main.js", import.meta.url));
const own = ["--accept-server-license-terms", "--user-data-dir", join(HOME, "user"), "--extensions-dir", join(HOME, "extensions")];

const step = (text) => console.log(`step: ${text}`);
const until = async (what, holds) => {
  const end = Date.now() + PATIENCE;
  while (Date.now() < end) {
    const found = await holds();
    if (found) {
      return found;
    }
    await new Promise((resolve) => setTimeout(resolve, 50));
  }
  throw new Error(`waited in vain for ${what}`);
};

/** Whether something comes to be seen within two seconds. */
const appears = (what) => what.waitFor({ timeout: 2000 }).then(() => true, () => false);

/** A port that nobody uses. */
const freePort = () =>
  new Promise((resolve) => {
    const probe = createServer().listen(0, "127.0.0.1", () => {
      const { port } = probe.address();
      probe.close(() => resolve(port));
    });
  });

function install() {
  mkdirSync(join(HOME, "user", "User"), { recursive: true });
  const quiet = { "workbench.startupEditor": "none", "telemetry.telemetryLevel": "off", "files.autoSave": "off", "workbench.tips.enabled": false };
  writeFileSync(join(HOME, "user", "User", "settings.json"), JSON.stringify(quiet));
  const done = spawnSync(process.execPath, [host, ...own, "--install-extension", vsix], { encoding: "utf8" });
  if (done.status !== 0) {
    throw new Error(`the extension does not install: ${done.stdout}${done.stderr}`);
  }
  step("the packaged extension installs");
}

async function start(port) {
  const server = spawn(process.execPath, [host, ...own, "--host", "127.0.0.1", "--port", String(port), "--without-connection-token"], { stdio: "ignore" });
  await until("the host", () => fetch(`http://127.0.0.1:${port}/version`).then((answer) => answer.ok, () => false));
  return server;
}

/** The page with what a person does on it. */
class Window {
  shots = 0;

  constructor(page) {
    this.page = page;
  }

  /** Keep what is seen. */
  async shot(name) {
    this.shots += 1;
    await this.page.screenshot({ path: join(ARTEFACTS, `code-${this.shots}-${name}.png`) });
  }

  /** Run a command by its name. The list goes away when the editor takes the focus late: then once more. */
  async palette(command) {
    const input = this.page.locator('.quick-input-widget input[type="text"]:visible');
    const row = this.page.locator(".quick-input-list .monaco-list-row", { hasText: command }).first();
    await until(`the command ${command}`, async () => {
      await this.page.keyboard.press("F1");
      const typed = (await appears(input)) && (await input.fill(`>${command}`, { timeout: 2000 }).then(() => true, () => false));
      return typed && (await appears(row));
    });
    await this.page.keyboard.press("Enter");
  }

  /** The rows of the Problems panel that are about something. */
  problems(text) {
    return this.page.locator(".markers-panel .monaco-list-row", { hasText: text });
  }

  /** The line of the editor that holds a text; the editor writes no plain spaces. */
  line(text) {
    return this.page.locator(".view-line", { hasText: new RegExp(text.replaceAll(" ", "\\s+")) }).first();
  }
}

async function drive(window) {
  const { page } = window;
  await page.locator(".monaco-workbench").waitFor();
  await page.getByRole("button", { name: "Yes, I trust the authors" }).click();
  await page.locator(".explorer-folders-view .monaco-list-row", { hasText: "kit.ampspec" }).dblclick();
  await page.keyboard.press("Control+Shift+M");
  const problem = window.problems("apparent power").first();
  await problem.waitFor();
  const place = `[Ln ${LINE}, Col ${CHARACTER}]`;
  const said = await problem.innerText();
  if (!said.includes(place) || !said.includes("syntax.unit")) {
    throw new Error(`the finding is not at ${place}: ${said}`);
  }
  step(`finding at ${place}: ${said.split("\n")[0]}`);
  await problem.dblclick();
  await page.locator(".squiggly-error").first().waitFor();
  step("a squiggle stands there");
  await window.shot("finding");

  await window.line("rail idle").waitFor();
  step(`a hint: ${(await window.line("rail idle").innerText()).trim().replace(/\s+/g, " ")}`);

  const key = window.line("bleeder").locator("span", { hasText: "bleeder" }).last();
  const hover = page.locator(".monaco-hover:visible", { hasText: "read by" });
  // an editor that is still busy drawing takes no notice of a mouse that came to rest
  await until("hover", async () => {
    await page.mouse.move(900, 300);
    await key.hover();
    return appears(hover.first());
  });
  step("hover explains bleeder");
  await window.shot("hover");
  await page.keyboard.press("Escape");

  await window.line("bleeder").locator("span", { hasText: /^VA$/ }).last().click();
  await page.keyboard.press("Control+.");
  const fix = page.locator(".action-widget .monaco-list-row.focused", { hasText: "write `3 W`" }).first();
  await fix.waitFor();
  await window.shot("quick-fix");
  await page.keyboard.press("Enter");
  await window.line("±5 % 3 W per rail").waitFor();
  step("quick fix: write `3 W`");
  await problem.waitFor({ state: "detached" });
  step("the finding clears");

  await window.palette("Format Document");
  await window.line("3300 ohm").waitFor();
  await page.keyboard.press("Control+S");
  await page.locator(".tab.dirty").waitFor({ state: "detached" });
  step("formatted and saved");
  await window.shot("sound");

  await page.keyboard.press("Control+End");
  const lens = page.locator(".codelens-decoration a", { hasText: /governed by .*, 0 unchecked/ }).first();
  await lens.waitFor();
  step(`a lens over the build: ${await lens.innerText()}`);
  await lens.click();
  const report = page.frameLocator("iframe.webview").frameLocator("iframe#active-frame").locator("body");
  await until("the report", async () => (await report.innerText().catch(() => "")).includes("thermal.sink"));
  step("the margin report opens beside the spec");
  await window.shot("margins");
  await window.palette("derate: Show Margins Beside");
  if ((await page.locator("iframe.webview").count()) !== 1) {
    throw new Error("a second report opens for the same spec");
  }
}

install();
const port = await freePort();
const server = await start(port);
const browser = await chromium.launch({ executablePath: browserPath, args: ["--no-sandbox"] });
const page = await browser.newPage({ viewport: { width: 1400, height: 900 } });
page.setDefaultTimeout(PATIENCE);
const window = new Window(page);
try {
  await page.goto(`http://127.0.0.1:${port}/?folder=${encodeURIComponent(dirname(KIT))}`);
  await drive(window);
} catch (problem) {
  console.log(`FAILED: ${problem.stack}`);
  await window.shot("failed");
  process.exitCode = 1;
} finally {
  await browser.close();
  server.kill();
  await until("the host to end", () => server.exitCode !== null || server.signalCode !== null);
}
