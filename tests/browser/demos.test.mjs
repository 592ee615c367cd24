// Each demo site, opened each way, gives the terminal program's figures, and the page stays within itself.
import assert from "node:assert/strict";
import { readFileSync } from "node:fs";
import { after, before, test } from "node:test";
import { assertQuiet, assertSameFigures, chooseFiles, demoFile, demos, dropFiles, figures, openDemo, setUp, settled, shot, terminal } from "./helpers.mjs";

let site;
before(async () => {
  site = await setUp();
});
after(() => site.close());

for (const demo of demos) {
  test(`${demo.name} by its demo control`, async () => {
    const page = await site.open();
    await openDemo(page, demo);
    await settled(page);
    const shown = await figures(page);
    const result = terminal(demoFile(demo));
    assertSameFigures(shown, result);
    assert.ok(shown.some(({ path }) => path === "duty.deficit_kwh"), "the deficit is among the figures");
    assert.equal(result.duty.connection, demo.connection, "the connection is guessed as the site's list says");
    assert.equal(await page.locator("[role=alert]").count(), 0, "nothing is wrong");
    assert.equal(await page.locator("[aria-busy=true]").count(), 0, "nothing is busy once settled");
    await shot(page, `${demo.name}-1280-light`);
    assertQuiet(page);
    await page.closeAll();
  });

  test(`${demo.name} by choosing its file, then by a link`, async () => {
    const page = await site.open();
    await chooseFiles(page, demoFile(demo));
    await settled(page);
    const chosen = await figures(page);
    assertSameFigures(chosen, terminal(demoFile(demo)));
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
