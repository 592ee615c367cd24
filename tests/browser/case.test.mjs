// The case as a person lives with it: steps back and forth, kept through reloads and crashes, saved and opened, hostile files.
import assert from "node:assert/strict";
import { mkdtempSync, readFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { after, before, test } from "node:test";
import {
  assertQuiet, chooseFiles, demoFile, demos, dropFiles, figures, openDemo, savedResult, setUp, settled, shot, terminalText,
} from "./helpers.mjs";

let site;
before(async () => {
  site = await setUp();
});
after(() => site.close());

const share = (page) => page.getByRole("textbox", { name: "Share of the deficit served" });
const served = async (page) =>
  Number((await figures(page)).find(({ path }) => path === "requirement.asked.served_share")?.value);
const keeping = (page, words) =>
  page.waitForFunction((words) => document.querySelector("[data-role=keeping]").textContent.includes(words), words);
/** Waits for a remark at the foot of the window. */
const says = (page, words) => page.locator(".working .said", { hasText: words }).waitFor();
const kept = (page) => keeping(page, "Kept in this browser, with the record.");
const openFold = async (page, name) => {
  const fold = page.locator("details.fold", { has: page.locator(`summary:has-text("${name}")`) }).first();
  if ((await fold.getAttribute("open")) === null) await fold.locator("summary").click();
  return fold;
};

async function withSite() {
  const page = await site.open();
  await chooseFiles(page, demoFile(demos[0]));
  await settled(page);
  return page;
}

/** Waits until what is kept holds the last step. */
async function written(page) {
  await settled(page);
  await page.waitForFunction(async () => {
    const step = document.querySelector(".steps [aria-current]")?.textContent;
    const open = indexedDB.open("millpond");
    const database = await new Promise((done, failed) => { open.onsuccess = () => done(open.result); open.onerror = failed; });
    if (!database.objectStoreNames.contains("cases")) return database.close();
    const all = database.transaction("cases").objectStore("cases").getAll();
    const cases = await new Promise((done) => { all.onsuccess = () => done(all.result); });
    database.close();
    return cases.some((one) => step === undefined ? one.steps.length > 0 : one.steps[one.at]?.[0] === step);
  });
}

async function download(page, role) {
  const [file] = await Promise.all([page.waitForEvent("download"), page.locator(`[data-role=${role}]`).click()]);
  const path = join(mkdtempSync(join(tmpdir(), "millpond-")), file.suggestedFilename());
  await file.saveAs(path);
  return path;
}

test("every step can be taken back and done again, by button, key and list", async () => {
  const page = await withSite();
  const first = await savedResult(page);
  // Letters typed into one field are one step.
  await share(page).pressSequentially("80 %");
  await share(page).blur();
  await settled(page);
  assert.equal(await served(page), 0.8);
  await page.getByRole("radio", { name: "connected" }).check();
  await settled(page);
  const second = await savedResult(page);
  const steps = await openFold(page, "Steps");
  const words = await steps.locator("li").allInnerTexts();
  assert.deepEqual(words, [`Opened ${demos[0].file}`, "Requirement: served share 0.8", "Site: connection connected"]);
  await shot(page, "case-steps");

  await page.keyboard.press("Control+z");
  await page.locator("[data-role=undo]").click();
  await settled(page);
  assert.equal(await savedResult(page), first, "back at the start");
  assert.ok(await page.locator("[data-role=undo]").isDisabled());
  await page.keyboard.press("Control+Shift+Z");
  await page.keyboard.press("Control+y");
  await settled(page);
  assert.equal(await savedResult(page), second, "and there again");
  await steps.locator("li button").nth(1).click();
  await settled(page);
  assert.equal(await served(page), 0.8);
  assert.equal((await figures(page)).length > 10, true);

  // A new step takes the place of those that were taken back.
  await share(page).fill("70 %");
  await share(page).blur();
  await settled(page);
  assert.equal((await steps.locator("li").count()), 3);
  assert.match(await steps.locator("li").last().innerText(), /0\.8 to 0\.7/);
  assertQuiet(page);
  await page.closeAll();
});

test("what is typed into two fields are two steps", async () => {
  const page = await withSite();
  await page.locator("input[name=case-name]").pressSequentially("Farm");
  const notes = await openFold(page, "Notes").then((fold) => fold.locator("textarea"));
  await notes.pressSequentially("as agreed");
  await page.locator("[data-role=undo]").click();
  assert.equal(await notes.inputValue(), "");
  assert.equal(await page.locator("input[name=case-name]").inputValue(), "Farm");
  await page.locator("[data-role=undo]").click();
  assert.equal(await page.locator("input[name=case-name]").inputValue(), "");
  await page.closeAll();
});

test("another site is a step like any other, and its predecessor comes back with its case", async () => {
  const page = await withSite();
  await share(page).fill("80 %");
  await share(page).blur();
  await settled(page);
  const before = await savedResult(page);
  await chooseFiles(page, demoFile(demos[1]));
  await settled(page);
  assert.notEqual(await savedResult(page), before);
  await page.locator("[data-role=undo]").click();
  await settled(page);
  assert.equal(await savedResult(page), before);
  await page.closeAll();
});

test("a field that does not read leaves the keys to the browser, and the case as it was", async () => {
  const page = await withSite();
  await share(page).fill("80 %");
  await share(page).blur();
  await settled(page);
  await share(page).fill("12 kWh");
  await page.keyboard.press("Control+z");
  await settled(page);
  assert.equal(await served(page), 0.8);
  await page.closeAll();
});

for (const demo of demos) {
  test(`${demo.name}: a saved case gives the same result wherever it is opened, bit for bit`, async () => {
    const page = await site.open();
    await openDemo(page, demo);
    await settled(page);
    await page.locator("input[name=case-name]").fill("Second try, with losses");
    await openFold(page, "Notes").then((fold) => fold.locator("textarea").fill("as agreed\non Monday"));
    const radio = page.getByRole("radio", { name: "connected" });
    await (await radio.isChecked() ? page.getByRole("radio", { name: "islanded" }) : radio).check();
    await settled(page);
    const result = await savedResult(page);
    const [bare, whole] = [await download(page, "save-case"), await download(page, "save-with-record")];
    await settled(page);
    assert.match(whole, /Second try, with losses case with record\.json$/);
    assert.equal(terminalText(whole), result.trim(), "by the terminal, from the one file");
    assert.equal(terminalText(demoFile(demo), ["--case", bare]), result.trim(), "by the terminal, case and meter file");
    await page.closeAll();

    const other = await site.open();
    await chooseFiles(other, whole);
    await settled(other);
    assert.equal(await savedResult(other), result, "by another page, from the one file");
    assert.equal(await other.locator("input[name=case-name]").inputValue(), "Second try, with losses");
    assert.equal(await openFold(other, "Notes").then((fold) => fold.locator("textarea").inputValue()), "as agreed\non Monday");
    assertQuiet(other);
    await other.closeAll();

    const third = await site.open();
    await chooseFiles(third, [demoFile(demo), bare]);
    await settled(third);
    assert.equal(await savedResult(third), result, "by another page, case and meter file together");
    await third.closeAll();
  });
}

test("hostile case files get one clear error each, change nothing and show nothing as markup", async () => {
  const page = await withSite();
  const before = await savedResult(page);
  const bomb = { name: "a.csv", bytes: 10, gzip_base64: Buffer.from("not gzip").toString("base64") };
  const hostile = {
    "deep.json": [`{"millpond_case":1,"duty":${"[".repeat(50000)}${"]".repeat(50000)}}`, /recursion|deep/],
    "nan.json": [`{"millpond_case":1,"site":{"response_s":NaN}}`, /expected/],
    "huge.json": [`{"millpond_case":1,"site":{"mass_budget_kg":1e300}}`, /mass_budget_kg/],
    "overflow.json": [`{"millpond_case":1,"site":{"mass_budget_kg":1e999}}`, /out of range/],
    "type.json": [`{"millpond_case":1,"duty":{"kind":"limits","import_limit_kw":"forty"}}`, /duty\.import_limit_kw/],
    "twice.json": [`{"millpond_case":1,"site":{"indoors":true,"indoors":false}}`, /duplicate/],
    "key-twice.json": [`{"millpond_case":1,"record":{"roles":{"a":"supply","a":"demand"}}}`, /duplicate/],
    "unknown.json": [`{"millpond_case":1,"site":{"<img src=x onerror=alert(1)>":1}}`, /unknown field/],
    "future.json": [`{"millpond_case":77}`, /newer Millpond/],
    "not.json": ["time;kW", /not a case file/],
    "empty.json": ["", /not a case file/],
    "damaged.json": [JSON.stringify({ millpond_case: 1, name: "x", files: [bomb] }), /damaged/],
    "long.json": [JSON.stringify({ millpond_case: 1, notes: "x".repeat(5 << 20) }), /bytes long/],
    "half.json": [`{"millpond_case":1,"requirement":{"served_share":0.5,"margin":-3}}`, /requirement\.margin/],
  };
  for (const [name, [text, says]] of Object.entries(hostile)) {
    await dropFiles(page, [{ name, text }]);
    await settled(page);
    const alert = page.locator("[role=alert]");
    assert.equal(await alert.count(), 1, name);
    const words = await alert.innerText();
    assert.match(words, says, name);
    assert.match(words, new RegExp(name.replace(".", "\\.")), `${name} is named`);
    assert.equal(await page.locator("img").count(), 0, name);
    assert.equal(await savedResult(page), before, `${name} changes nothing`);
  }
  assert.ok(await page.locator("[data-role=undo]").isDisabled(), "no step was made");
  await dropFiles(page, [{ name: "good.json", text: `{"millpond_case":1,"name":"<b>bold</b><script>alert(1)</script>"}` }]);
  await settled(page);
  assert.equal(await page.locator("[role=alert]").count(), 0, "the error goes when a good case comes");
  assert.equal(await page.locator("input[name=case-name]").inputValue(), "<b>bold</b><script>alert(1)</script>");
  await kept(page);
  const fold = await openFold(page, "Kept in this browser");
  assert.match(await fold.innerText(), /<b>bold<\/b>/);
  assertQuiet(page);
  await page.closeAll();
});

test("a reload in the middle of work loses nothing", async () => {
  const page = await withSite();
  await share(page).fill("80 %");
  await share(page).blur();
  await page.getByRole("radio", { name: "connected" }).check();
  await written(page);
  const before = await savedResult(page);
  await page.reload();
  await page.waitForSelector("section[data-station=record]");
  await settled(page);
  assert.equal(await savedResult(page), before);
  assert.equal(await served(page), 0.8);
  // The steps are there too.
  await page.locator("[data-role=undo]").click();
  await page.locator("[data-role=undo]").click();
  await settled(page);
  assert.equal(await served(page), 0.9);
  assertQuiet(page);
  await page.closeAll();
});

test("a page that is killed while it works comes back with its case", async () => {
  const page = await withSite();
  await share(page).fill("60 %");
  await kept(page);
  await page.waitForTimeout(300);
  // The renderer goes as it would for want of memory: no handler of the page's runs.
  const session = await page.context().newCDPSession(page);
  const gone = page.waitForEvent("crash");
  session.send("Page.crash").catch(() => {}); // It has nobody left to answer it.
  await gone;
  const next = await page.context().newPage();
  await next.goto(site.origin);
  await next.waitForSelector("[data-figure]");
  await settled(next);
  assert.equal(await served(next), 0.6);
  await page.closeAll();
});

test("several cases are kept by name, opened again and removed", async () => {
  const page = await withSite();
  await page.locator("input[name=case-name]").fill("Farm, as metered");
  await written(page);
  await chooseFiles(page, demoFile(demos[1]));
  await written(page);
  await page.locator("input[name=case-name]").fill("Island");
  await written(page);
  const fold = await openFold(page, "Kept in this browser");
  await fold.locator("li").nth(1).waitFor();
  assert.deepEqual(await fold.locator("li b").allInnerTexts(), ["Island", "Farm, as metered"]);
  await shot(page, "case-kept");
  await fold.locator("li", { hasText: "Farm" }).locator("[data-role=open-kept]").click();
  await page.waitForFunction(() => document.querySelector("input[name=case-name]").value === "Farm, as metered");
  await settled(page);
  assert.equal(JSON.parse(await savedResult(page)).site, JSON.parse(terminalText(demoFile(demos[0]))).site);
  await fold.locator("li", { hasText: "Island" }).locator("[data-role=remove-kept]").click();
  await page.waitForFunction(() => document.querySelectorAll(".kept li").length === 1);
  await says(page, "Removed from this browser");
  await page.reload();
  await page.waitForSelector("[data-figure]");
  await settled(page);
  assert.equal(await page.locator("input[name=case-name]").inputValue(), "Farm, as metered");
  assertQuiet(page);
  await page.closeAll();
});

test("without the record the case is kept, and the meter file is asked for", async () => {
  const page = await withSite();
  await share(page).fill("80 %");
  await share(page).blur();
  const fold = await openFold(page, "Kept in this browser");
  await fold.getByRole("checkbox", { name: "keep the record too" }).uncheck();
  await keeping(page, "without the record");
  await page.reload();
  await page.waitForSelector("section[data-station=record]");
  await settled(page);
  await says(page, "hand over the meter file again");
  assert.equal(await page.locator("[data-figure]").count(), 0);
  await chooseFiles(page, demoFile(demos[0]));
  await settled(page);
  assert.equal(await served(page), 0.8, "the case was waiting for its record");
  await page.closeAll();
});

test("one click keeps nothing on this computer", async () => {
  const page = await withSite();
  await kept(page);
  await openFold(page, "Kept in this browser");
  await page.locator("[data-role=keep-nothing]").click();
  await keeping(page, "Nothing is kept on this computer.");
  await says(page, "removed from this browser");
  await share(page).fill("80 %");
  await share(page).blur();
  await settled(page);
  const left = await page.evaluate(async () => {
    const open = indexedDB.open("millpond");
    const database = await new Promise((done) => { open.onsuccess = () => done(open.result); });
    const count = (store) => new Promise((done) => {
      const all = database.transaction(store).objectStore(store).count();
      all.onsuccess = () => done(all.result);
    });
    const counts = [await count("cases"), await count("files")];
    database.close();
    return { counts, words: Object.entries(localStorage), window: sessionStorage.length };
  });
  assert.deepEqual(left, { counts: [0, 0], words: [["millpond-keep", "nothing"]], window: 0 });
  await page.reload();
  await page.waitForSelector("section[data-station=record]");
  await settled(page);
  assert.equal(await page.locator("[data-figure]").count(), 0, "nothing came back");
  await keeping(page, "Nothing is kept on this computer.");
  // And back again.
  await chooseFiles(page, demoFile(demos[0]));
  await settled(page);
  await openFold(page, "Kept in this browser");
  await page.locator("[data-role=keep-again]").click();
  await kept(page);
  assertQuiet(page);
  await page.closeAll();
});

test("two tabs do not write over each other", async () => {
  const page = await withSite();
  await share(page).fill("80 %");
  await share(page).blur();
  await written(page);
  const other = await page.context().newPage();
  await other.goto(site.origin);
  await other.waitForSelector("section[data-station=record]");
  await settled(other);
  assert.equal(await other.locator("[data-figure]").count(), 0, "the case is open in the first tab");
  await says(other, "open in another tab");
  const fold = await openFold(other, "Kept in this browser");
  await fold.locator("[data-role=open-kept]").first().click();
  await other.waitForSelector("[data-figure]");
  await settled(other);
  await says(other, "is a copy");
  await share(other).fill("50 %");
  await share(other).blur();
  await written(other);
  await kept(other);
  await page.reload();
  await page.waitForSelector("[data-figure]");
  await settled(page);
  assert.equal(await served(page), 0.8, "what the first tab had is as it was");
  // Told in one tab, it holds in the other.
  await openFold(other, "Kept in this browser");
  await other.locator("[data-role=keep-nothing]").click();
  await keeping(page, "Nothing is kept on this computer.");
  await page.closeAll();
});

// Faults of the browser's store are made inside the worker that keeps, in front of its own script.
async function faulty(code) {
  const page = await site.open({ serviceWorkers: "block" });
  await page.context().route("**/engine-*.js", async (route) => {
    const answer = await route.fetch();
    await route.fulfill({ response: answer, body: `${code}\n${await answer.text()}` });
  });
  await page.reload();
  await page.waitForSelector("section[data-station=record]");
  await chooseFiles(page, demoFile(demos[0]));
  await settled(page);
  return page;
}

test("a browser that denies its store is told of in a sentence, and the work goes on", async () => {
  const page = await faulty(`IDBFactory.prototype.open = () => { throw new DOMException("no", "SecurityError"); };`);
  await keeping(page, "does not let the page keep anything");
  await share(page).fill("80 %");
  await share(page).blur();
  await settled(page);
  assert.equal(await served(page), 0.8);
  await page.closeAll();
});

test("a store that is full keeps the case without its record, or says that it cannot", async () => {
  const put = "const put = IDBObjectStore.prototype.put; const full = () => { throw new DOMException('full', 'QuotaExceededError'); };";
  const page = await faulty(`${put} IDBObjectStore.prototype.put = function (...a) { return a[0].steps ? put.apply(this, a) : full(); };`);
  await keeping(page, "no room for the record: the case is kept without it");
  await page.closeAll();
  const fuller = await faulty(`${put} IDBObjectStore.prototype.put = full;`);
  await keeping(fuller, "no room left to keep the case");
  await fuller.closeAll();
  // A disk that fills while the transaction ends: every request went well, and nothing is there.
  const late = await faulty(`const put = IDBObjectStore.prototype.put; IDBObjectStore.prototype.put = function (...a) {
    const request = put.apply(this, a);
    if (a[0].files?.[0] instanceof File) this.transaction.large = true;
    else if (this.transaction.large) request.addEventListener("success", () => this.transaction.abort());
    return request;
  };`);
  await keeping(late, "no room for the record: the case is kept without it");
  await share(late).fill("80 %");
  await share(late).blur();
  await settled(late);
  await keeping(late, "no room for the record: the case is kept without it");
  await late.closeAll();
});

async function meddle(page, act) {
  await page.goto(`${site.origin}/licences.txt`);
  await page.evaluate(act);
  // A bare file names no icon, so that the browser may have looked for one in vain; that is no fault of the page.
  page.faults.length = 0;
  await page.goto(site.origin);
  await page.waitForSelector("section[data-station=record]");
  await settled(page);
}

test("what the browser has removed is missed in a sentence", async () => {
  const page = await withSite();
  await kept(page);
  await meddle(page, () => new Promise((done) => {
    const gone = indexedDB.deleteDatabase("millpond");
    gone.onsuccess = () => done();
  }));
  await says(page, "What was kept here is gone");
  assert.equal(await page.locator("[data-figure]").count(), 0);
  await page.closeAll();
});

test("a damaged case is said to be one, can be saved as it stands and removed, and harms no other", async () => {
  const page = await withSite();
  await kept(page);
  await meddle(page, () => new Promise((done) => {
    const open = indexedDB.open("millpond");
    open.onsuccess = () => {
      const store = open.result.transaction("cases", "readwrite");
      store.objectStore("cases").put({ id: "torn", name: "torn", changed_ms: 9e15, files: [], record: false, at: 3, steps: [["Opened", "{"]] });
      store.oncomplete = () => { open.result.close(); done(); };
    };
  }));
  const fold = await openFold(page, "Kept in this browser");
  const torn = fold.locator("li", { hasText: "cannot be read any more" });
  await torn.waitFor();
  const [file] = await Promise.all([page.waitForEvent("download"), torn.getByRole("button", { name: "Save what is left" }).click()]);
  assert.equal(JSON.parse(readFileSync(await file.path(), "utf8")).id, "torn");
  await torn.locator("[data-role=remove-kept]").click();
  await page.waitForFunction(() => !document.querySelector(".kept").textContent.includes("cannot be read"));
  await fold.locator("[data-role=open-kept]").first().click();
  await page.waitForSelector("[data-figure]");
  await settled(page);
  assertQuiet(page);
  await page.closeAll();
});
