// A file that cannot be read is answered within two seconds, in words, and the page goes on working.
import assert from "node:assert/strict";
import { after, before, test } from "node:test";
import { assertQuiet, assertSameFigures, chooseFiles, demoFile, demos, figures, setUp, settled, terminal } from "./helpers.mjs";

const ANSWER_MS = 2000;
const bytes = (...list) => Buffer.from(list);
const noise = Buffer.from(Array.from({ length: 40_000 }, (_, i) => (i * 2654435761) >>> 24));

const BAD = {
  "empty.csv": Buffer.alloc(0),
  "blank.csv": "\n\n   \n",
  "prose.txt": "The meter stands behind the third door.\nAsk for the key at the office.\n",
  "head-only.csv": "time,supply kW,demand kW\n",
  "one-row.csv": "time,supply kW,demand kW\n2025-01-01 00:00,1,2\n",
  "no-clock.csv": "supply kW,demand kW\n1,2\n3,4\n5,6\n",
  "no-numbers.csv": "time,supply kW,demand kW\n2025-01-01 00:00,a,b\n2025-01-01 00:15,c,d\n2025-01-01 00:30,e,f\n",
  "noise.csv": noise,
  "picture.csv": Buffer.concat([bytes(0x89, 0x50, 0x4e, 0x47, 0x0d, 0x0a, 0x1a, 0x0a), noise]),
  "cut.csv.gz": Buffer.concat([bytes(0x1f, 0x8b, 8, 0, 0, 0, 0, 0, 0, 3), noise.subarray(0, 500)]),
  "odd-utf16.csv": Buffer.concat([bytes(0xff, 0xfe), noise.subarray(0, 1001)]),
  "zeros.csv": Buffer.alloc(100_000),
  "one-line.csv": "x".repeat(2_000_000),
  "quote.csv": `time,supply kW\n"2025-01-01 00:00,1\n${"a,b\n".repeat(1000)}`,
  "case.json": '{"millpond_case": 1, "duty": {"kind": "dance"}}',
};

let site;
before(async () => {
  site = await setUp();
});
after(() => site.close());

for (const [name, content] of Object.entries(BAD)) {
  test(`${name} is answered in words`, async () => {
    const page = await site.open();
    await chooseFiles(page, { name, mimeType: "application/octet-stream", buffer: Buffer.from(content) });
    await page.waitForSelector("[role=alert]", { timeout: ANSWER_MS });
    await settled(page, ANSWER_MS);
    const words = (await page.locator("[role=alert]").first().innerText()).trim();
    assert.match(words, new RegExp(name.replaceAll(".", "\\.")), "it says in which file");
    assert.ok(words.split(/\s+/).length >= 8, `what, where and the remedy, not just “${words}”`);
    assert.doesNotMatch(words, /panicked|unreachable|RuntimeError|undefined|NaN/);
    assertQuiet(page);

    await chooseFiles(page, demoFile(demos[0]));
    await settled(page);
    assert.equal(await page.locator("[role=alert]").count(), 0, "the notice is gone once a good file is read");
    assertSameFigures(await figures(page), terminal(demoFile(demos[0])));
    assertQuiet(page);
    await page.closeAll();
  });
}
