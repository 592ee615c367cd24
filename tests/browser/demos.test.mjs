// Each demo site, opened each way, gives the terminal program's figures, and the page stays within itself.
import assert from "node:assert/strict";
import { readFileSync } from "node:fs";
import { after, before, test } from "node:test";
import { assertQuiet, assertSameFigures, caseFile, chooseFiles, demoFile, demos, dropFiles, figures, openDemo, savedResult, setUp, settled, shot, terminal, terminalText } from "./helpers.mjs";

let site;
before(async () => {
  site = await setUp();
});
after(() => site.close());

for (const demo of demos) {
  // What the terminal program is told so that it does what the demo's own case asks.
  const told = demo.case ? ["--case", caseFile(demo.case)[0]] : [];
  test(`${demo.name} by its demo control`, async () => {
    const page = await site.open();
    await openDemo(page, demo);
    await settled(page);
    const shown = await figures(page);
    const result = terminal(demoFile(demo), told);
    assertSameFigures(shown, result);
    if (result.duty.deficit_kwh !== null) assert.ok(shown.some(({ path }) => path === "duty.deficit_kwh"), "the deficit is among the figures");
    assert.equal(result.duty.connection, demo.connection, "the connection is guessed as the site's list says");
    assert.equal(await page.locator("[role=alert]").count(), 0, "nothing is wrong");
    assert.equal(await page.locator("[aria-busy=true]").count(), 0, "nothing is busy once settled");
    assert.equal(await savedResult(page), terminalText(demoFile(demo), told), "the page's result is the terminal's, byte for byte");
    await shot(page, `${demo.name}-1280-light`);
    assertQuiet(page);
    await page.closeAll();
  });

  test(`${demo.name} by choosing its file, then by a link`, async () => {
    const page = await site.open();
    if (demo.case) {
      const files = [{ name: "case.json", text: JSON.stringify(demo.case) }, { name: demo.file, text: readFileSync(demoFile(demo), "utf8") }];
      await dropFiles(page, files);
    } else {
      await chooseFiles(page, demoFile(demo));
    }
    await settled(page);
    const chosen = await figures(page);
    assertSameFigures(chosen, terminal(demoFile(demo), told));
    assertQuiet(page);
    await page.closeAll();

    const linked = await site.open({ hash: `#demo=${demo.name}` });
    await settled(linked);
    assert.deepEqual(await figures(linked), chosen, "the packed demo gives what its file gives");
    assertQuiet(linked);
    await linked.closeAll();
  });
}

test("a file dropped anywhere on the page is read", async () => {
  const demo = demos[0];
  const page = await site.open();
  await dropFiles(page, [{ name: demo.file, text: readFileSync(demoFile(demo), "utf8") }]);
  await settled(page);
  assertSameFigures(await figures(page), terminal(demoFile(demo)));
  assertQuiet(page);
  await page.closeAll();
});

test("a second site replaces the first", async () => {
  const page = await site.open();
  await chooseFiles(page, demoFile(demos[0]));
  await settled(page);
  await chooseFiles(page, demoFile(demos[1]));
  await settled(page);
  assertSameFigures(await figures(page), terminal(demoFile(demos[1])));
  assertQuiet(page);
  await page.closeAll();
});

test("every picture is drawn, in more than one colour", async () => {
  const page = await site.open();
  await chooseFiles(page, demoFile(demos[0]));
  await settled(page);
  const colours = await page.$$eval("section[data-station] canvas", (all) =>
    all.filter((canvas) => canvas.checkVisibility() && canvas.width > 0).map((canvas) => {
      const copy = document.createElement("canvas");
      [copy.width, copy.height] = [canvas.width, canvas.height];
      const context = copy.getContext("2d");
      context.drawImage(canvas, 0, 0);
      const pixels = new Uint32Array(context.getImageData(0, 0, copy.width, copy.height).data.buffer);
      return new Set(pixels).size;
    }));
  assert.ok(colours.length >= 5, `year, net power, coverage, week and plane: ${colours.length} canvases`);
  for (const count of colours) assert.ok(count > 4, `a picture has ${count} colours`);
  assertQuiet(page);
  await page.closeAll();
});

test("changing the case gives what the terminal program gives with that case", async () => {
  const page = await site.open();
  const case_ = {
    millpond_case: 1,
    requirement: { charge_efficiency: 0.93, discharge_efficiency: 0.91, standing_kw: 0.2, powers_kw: [10, 25], unserved_shares: [0, 0.02, 0.2] },
    site: { connection: "connected", mass_budget_kg: 4000, response_s: 1, service_life_years: 15 },
    stores: [{ kind: "fixed", name: "shed", energy_kwh: 40, charge_kw: 12, discharge_kw: 12, self_discharge_per_h: 0.0004, start: "cyclic" }],
  };
  const [file, text] = caseFile(case_);
  await dropFiles(page, [{ name: "case.json", text }, { name: demos[0].file, text: readFileSync(demoFile(demos[0]), "utf8") }]);
  await settled(page);
  assert.equal(await savedResult(page), terminalText(demoFile(demos[0]), ["--case", file]));
  assertQuiet(page);
  await page.closeAll();
});
