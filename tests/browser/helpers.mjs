// What the browser tests share: the site served, a browser, a page that keeps account of errors and requests, and the hooks by
// which a page is driven (data-role) and read (data-figure).
import assert from "node:assert/strict";
import { execFileSync } from "node:child_process";
import { mkdirSync, mkdtempSync, readFileSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { dirname, join } from "node:path";
import { fileURLToPath } from "node:url";
import { chromium } from "playwright-core";
import { serve } from "../../www/serve.mjs";

const here = dirname(fileURLToPath(import.meta.url));
export const root = join(here, "../..");
export const demos = JSON.parse(readFileSync(join(root, "demo-profiles/sites.json"), "utf8"));
export const demoFile = (demo) => join(root, "demo-profiles", demo.file);

const FLAGS = [
  "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run", "--disable-background-networking",
  "--disable-component-update", "--disable-sync",
];

/** Serves dist/ and starts the browser; `close` ends both, `cutOff` only the server. */
export async function setUp() {
  const server = await serve(join(root, "dist"));
  const browser = await chromium.launch({ executablePath: process.env.CHROMIUM ?? "/usr/bin/chromium", args: FLAGS });
  const origin = `http://127.0.0.1:${server.address().port}`;
  const cutOff = () => {
    server.close();
    server.closeAllConnections();
  };
  const close = async () => {
    await browser.close();
    cutOff();
  };
  return { browser, origin, close, cutOff, open: (options) => openPage(browser, origin, options) };
}

/**
 * A fresh page with nothing kept from another. `page.faults` gathers script errors and what the console calls an error (such as a
 * breach of the policy), `page.strangers` requests to anywhere else than the site itself.
 */
async function openPage(browser, origin, { hash = "", width = 1280, height = 900, colorScheme = "light", ...context } = {}) {
  const inner = await browser.newContext({ viewport: { width, height }, colorScheme, reducedMotion: "reduce", ...context });
  const page = await inner.newPage();
  page.faults = [];
  page.strangers = [];
  page.on("pageerror", (error) => page.faults.push(String(error)));
  page.on("console", (message) => message.type() === "error" && page.faults.push(message.text()));
  inner.on("request", (request) => {
    const url = request.url();
    if (!url.startsWith(`${origin}/`) && !/^(blob|data):/.test(url)) page.strangers.push(url);
  });
  page.closeAll = () => inner.close();
  await page.goto(`${origin}/${hash}`);
  await page.waitForSelector("section[data-station=record]");
  return page;
}

/** Waits until the whole chain has been computed. The page says "false" in the same turn as the event that starts it. */
export async function settled(page, timeout = 60_000) {
  await page.waitForFunction(() => document.documentElement.dataset.settled === "true", null, { timeout });
}

export async function chooseFiles(page, files) {
  await page.setInputFiles("input[type=file][data-role=files]", files);
}

/** Drops files on the page's body, as a person does who misses the marked place. */
export async function dropFiles(page, files) {
  const transfer = await page.evaluateHandle((list) => {
    const data = new DataTransfer();
    for (const { name, text } of list) data.items.add(new File([text], name));
    return data;
  }, files);
  for (const kind of ["dragenter", "dragover", "drop"]) await page.dispatchEvent("body", kind, { dataTransfer: transfer });
}

/** Opens a demo site by its control, whether that is one button a site or a list to choose from. */
export async function openDemo(page, demo) {
  const control = page.locator(`[data-role=demo][data-demo="${demo.name}"]`);
  if ((await control.count()) === 0) {
    await page.locator("select[data-role=demo]").selectOption(demo.name);
    return;
  }
  // The list of demo sites may stand in a fold.
  const fold = page.locator("details:not([open])").filter({ has: control });
  if ((await fold.count()) > 0) await fold.first().locator("> summary").click();
  await control.first().click();
}

/** Every headline figure on the page: path in the result object, unrounded value, and the words a person sees. */
export function figures(page) {
  return page.$$eval("[data-figure]", (all) =>
    all.map((one) => ({ path: one.dataset.figure, value: one.dataset.value, words: one.textContent.trim(), shown: one.checkVisibility() })),
  );
}

/** The terminal program's result for a file or folder, as the bytes it writes. */
export function terminalText(path, extra = []) {
  const program = process.env.MILLPOND_TERMINAL ?? join(process.env.CARGO_TARGET_DIR ?? join(root, "target"), "release/millpond");
  const lines = execFileSync(program, [path, "--out", "json", ...extra], { encoding: "utf8", maxBuffer: 1 << 28 }).trim().split("\n");
  assert.equal(lines.length, 1, "one site gives one line");
  return lines[0];
}

/** The terminal program's result object for a file or folder. */
export const terminal = (path, extra) => JSON.parse(terminalText(path, extra));

/** The result as the page saves it. */
export async function savedResult(page) {
  const [download] = await Promise.all([page.waitForEvent("download"), page.locator("[data-role=result]").click()]);
  return readFileSync(await download.path(), "utf8");
}

/** A case in a file of its own: its path and its text. */
export function caseFile(content) {
  const text = JSON.stringify(content);
  const path = join(mkdtempSync(join(tmpdir(), "millpond-")), "case.json");
  writeFileSync(path, text);
  return [path, text];
}

/** The value at a path such as `duty.deficit_kwh`, `simulations.0.served_kwh` or `simulations[0].served_kwh`. */
export function at(object, path) {
  return path.split(/[.[\]]+/).filter(Boolean).reduce((value, key) => value?.[key], object);
}

/** Every figure on the page must be the terminal program's number, bit for bit. */
export function assertSameFigures(shown, result) {
  assert.ok(shown.length > 0, "the page shows figures");
  const wrong = [];
  for (const { path, value, words } of shown) {
    const expected = at(result, path);
    if (typeof expected !== "number") wrong.push(`${path}: the page shows ${value}, the terminal program has ${JSON.stringify(expected)}`);
    else if (value === "" || Number(value) !== expected) wrong.push(`${path}: page ${value}, terminal ${expected}`);
    else if (!/\d/.test(words)) wrong.push(`${path}: no number is written (“${words}”)`);
  }
  assert.deepEqual(wrong, []);
}

export async function shot(page, name) {
  const folder = join(here, "shots");
  mkdirSync(folder, { recursive: true });
  await page.screenshot({ path: join(folder, `${name}.png`), fullPage: true });
}

/** The page ran without a script error, a breach of the policy or a word to anyone else. */
export function assertQuiet(page) {
  assert.deepEqual(page.faults, [], "no script error and no breach of the policy");
  assert.deepEqual(page.strangers, [], "no request to anywhere else");
}
