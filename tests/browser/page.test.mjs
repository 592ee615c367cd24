// The page as such: its policy, its stations, its fitness for readers and for narrow and dark screens.
import assert from "node:assert/strict";
import { readFileSync } from "node:fs";
import { createRequire } from "node:module";
import { after, before, test } from "node:test";
import { assertQuiet, chooseFiles, demoFile, demos, figures, setUp, settled, shot } from "./helpers.mjs";

const axe = readFileSync(createRequire(import.meta.url).resolve("axe-core/axe.min.js"), "utf8");
const STATIONS = ["record", "duty", "requirement", "plane", "simulation", "outlook", "statement"];

let site;
before(async () => {
  site = await setUp();
});
after(() => site.close());

/** Violations by axe's rules, as one line each. */
async function violations(page) {
  await page.evaluate(`${axe}; undefined`);
  const found = await page.evaluate(() => globalThis.axe.run(document, { resultTypes: ["violations"] }));
  return found.violations.flatMap(({ id, help, nodes }) => nodes.map(({ target }) => `${id} (${help}): ${target}`));
}

test("the policy forbids every other origin and every script in the document", async () => {
  const page = await site.open();
  const policy = await page.getAttribute("meta[http-equiv=Content-Security-Policy]", "content");
  assert.match(policy, /default-src 'none'/);
  assert.match(policy, /script-src 'self' 'wasm-unsafe-eval';/);
  assert.match(policy, /connect-src 'self';/);
  assert.equal(await page.locator("script:not([src])").count(), 0);
  const reached = await page.evaluate(() => fetch("http://127.0.0.1:9/").then(() => "reached", () => "refused"));
  assert.equal(reached, "refused");
  assert.match(page.faults.join("\n"), /Content Security Policy/, "refused by the policy, not by chance");
  await page.closeAll();
});

test("the empty page has its stations in order and is fit for readers", async () => {
  const page = await site.open();
  const stations = await page.$$eval("section[data-station]", (all) => all.map((one) => one.dataset.station));
  assert.ok(stations.length >= 4, "at least record to plane");
  assert.deepEqual(stations, STATIONS.slice(0, stations.length));
  assert.equal(await page.getAttribute("html", "data-settled"), "true", "an empty page has nothing left to compute");
  assert.deepEqual(await violations(page), []);
  await shot(page, "empty-1280-light");
  assertQuiet(page);
  await page.closeAll();
});

for (const [name, options] of Object.entries({
  "1280-light": { width: 1280, colorScheme: "light" },
  "1280-dark": { width: 1280, colorScheme: "dark" },
  "1920-light": { width: 1920, height: 1080, colorScheme: "light" },
  "390-light": { width: 390, height: 844, colorScheme: "light", hasTouch: true },
  "360-dark": { width: 360, height: 740, colorScheme: "dark", hasTouch: true },
})) {
  test(`a full page at ${name} fits its width and is fit for readers`, async () => {
    const page = await site.open(options);
    await chooseFiles(page, demoFile(demos[1]));
    await settled(page);
    await shot(page, `full-${name}`);
    const [content, window] = await page.evaluate(() => [document.documentElement.scrollWidth, document.documentElement.clientWidth]);
    assert.ok(content <= window, `the page is ${content} px wide in a window of ${window} px`);
    assert.deepEqual(await violations(page), []);
    assertQuiet(page);
    await page.closeAll();
  });
}

test("the page prints on paper's own terms", async () => {
  const page = await site.open({ colorScheme: "dark" });
  await chooseFiles(page, demoFile(demos[1]));
  await settled(page);
  const pdf = await page.pdf({ format: "A4", preferCSSPageSize: false, printBackground: false });
  assert.equal(pdf.subarray(0, 5).toString(), "%PDF-");
  await page.emulateMedia({ media: "print" });
  const paper = await page.evaluate(() => getComputedStyle(document.documentElement).getPropertyValue("--paper").trim());
  assert.match(paper, /^#fff(fff)?$/, "white, whatever the screen shows");
  assert.equal(await page.locator(".rail").isVisible(), false);
  await shot(page, "print");
  await page.closeAll();
});

test("once visited, the page and its demo sites open without a server", async () => {
  const own = await setUp();
  const page = await own.open();
  await page.evaluate(() => navigator.serviceWorker.ready);
  await page.waitForFunction(() => navigator.serviceWorker.ready.then(({ active }) => active.state === "activated"));
  own.cutOff();
  await page.goto(`${own.origin}/#demo=${demos[0].name}`);
  await page.reload();
  await settled(page);
  assert.ok((await page.locator("[data-figure]").count()) > 0);
  assert.deepEqual(page.strangers, []);
  await own.close();
});

test("a broken page says so, whatever broke", async () => {
  const page = await site.open();
  await page.evaluate(() => setTimeout(() => { throw new Error("tried on purpose"); }));
  const notice = page.locator(".notice[role=alert]");
  await notice.waitFor();
  assert.match(await notice.innerText(), /Millpond stopped: .*tried on purpose/);
  await page.closeAll();
});

test("a worker that dies is replaced, idle or at work, and nothing of the case is lost", async () => {
  const page = await site.open();
  await chooseFiles(page, demoFile(demos[0]));
  await settled(page);
  const before = await figures(page);
  const die = async () => {
    // All of them: the one that computes and the one that keeps.
    await Promise.all(page.workers().map(async (worker) => {
      const gone = new Promise((done) => worker.once("close", done));
      await worker.evaluate(() => void setTimeout(() => { throw new Error("a fault made by the test"); }));
      await gone;
    }));
  };

  await die();
  const share = page.getByRole("textbox", { name: "Share of the deficit served" });
  await share.fill("80 %");
  await share.blur();
  await settled(page);
  const asked = (all) => Number(all.find(({ path }) => path === "requirement.asked.served_share").value);
  assert.equal(asked(before), 0.9);
  assert.equal(asked(await figures(page)), 0.8, "the new worker was given the files and the case");

  await share.fill("70 %");
  await share.blur();
  await die();
  await settled(page);
  assert.equal(asked(await figures(page)), 0.7, "what was asked of the dead worker was asked anew");
  await page.closeAll();
});
