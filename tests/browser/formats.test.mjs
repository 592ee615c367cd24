// Archives, workbooks and meter formats that are no text tables, made here from a demo site or from the published layouts: the page
// has the figures that the terminal program has, and those of the same readings as a text table.
import assert from "node:assert/strict";
import { mkdtempSync, readFileSync, readdirSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { after, before, test } from "node:test";
import { crc32, deflateRawSync } from "node:zlib";
import { assertQuiet, assertSameFigures, chooseFiles, demoFile, demos, figures, root, savedResult, setUp, settled, shot, terminal, terminalText } from "./helpers.mjs";

const farm = demos.find((demo) => demo.file === "hill-farm.csv");
const text = readFileSync(demoFile(farm), "utf8");

/** A zip archive (APPNOTE 6.3): each entry deflated, then the directory. */
function zip(files) {
  const [parts, directory] = [[], []];
  let at = 0;
  for (const [name, content] of Object.entries(files)) {
    const [path, bytes] = [Buffer.from(name), Buffer.from(content)];
    const packed = deflateRawSync(bytes);
    const facts = Buffer.alloc(26);
    facts.writeUInt16LE(20, 0);
    facts.writeUInt16LE(8, 4);
    facts.writeUInt32LE(crc32(bytes), 10);
    facts.writeUInt32LE(packed.length, 14);
    facts.writeUInt32LE(bytes.length, 18);
    facts.writeUInt16LE(path.length, 22);
    const local = Buffer.concat([Buffer.from("PK\x03\x04"), facts, path, packed]);
    const rest = Buffer.alloc(14);
    rest.writeUInt32LE(at, 10);
    directory.push(Buffer.from("PK\x01\x02"), Buffer.from([20, 0]), facts, rest, path);
    parts.push(local);
    at += local.length;
  }
  const listed = Buffer.concat(directory);
  const end = Buffer.alloc(18);
  const count = Object.keys(files).length;
  end.writeUInt16LE(count, 4);
  end.writeUInt16LE(count, 6);
  end.writeUInt32LE(listed.length, 8);
  end.writeUInt32LE(at, 12);
  return Buffer.concat([...parts, listed, Buffer.from("PK\x05\x06"), end]);
}

/** A workbook (ECMA-376) with a sheet of notes and the readings of a text table: its stamps as days since 1899-12-30, formatted as dates. */
function workbook(table) {
  const main = "http://schemas.openxmlformats.org/spreadsheetml/2006/main";
  const relations = "http://schemas.openxmlformats.org/officeDocument/2006/relationships";
  const words = (text) => `<c t="inlineStr"><is><t>${text}</t></is></c>`;
  const rows = table.trim().split("\n").map((line, i) => {
    const [stamp, ...cells] = line.split(",");
    if (i === 0) return `<row r="1">${[stamp, ...cells].map(words).join("")}</row>`;
    const days = Date.parse(`${stamp.replace(" ", "T")}:00Z`) / 86_400_000 + 25_569;
    return `<row r="${i + 1}"><c s="1"><v>${days}</v></c>${cells.map((cell) => `<c><v>${cell}</v></c>`).join("")}</row>`;
  });
  const sheet = (rows) => `<worksheet xmlns="${main}"><sheetData>${rows}</sheetData></worksheet>`;
  const kind = (part, what) => `<Override PartName="/${part}" ContentType="application/vnd.openxmlformats-officedocument.spreadsheetml.${what}+xml"/>`;
  const link = (id, what, to) => `<Relationship Id="${id}" Type="${relations}/${what}" Target="${to}"/>`;
  const links = (list) => `<Relationships xmlns="http://schemas.openxmlformats.org/package/2006/relationships">${list}</Relationships>`;
  return zip({
    "[Content_Types].xml": `<Types xmlns="http://schemas.openxmlformats.org/package/2006/content-types"><Default Extension="rels" ContentType="application/vnd.openxmlformats-package.relationships+xml"/>${kind("xl/workbook.xml", "sheet.main")}${kind("xl/styles.xml", "styles")}${kind("xl/worksheets/sheet1.xml", "worksheet")}${kind("xl/worksheets/sheet2.xml", "worksheet")}</Types>`,
    "_rels/.rels": links(link("r1", "officeDocument", "xl/workbook.xml")),
    "xl/workbook.xml": `<workbook xmlns="${main}" xmlns:r="${relations}"><sheets><sheet name="Notes" sheetId="1" r:id="r1"/><sheet name="Readings" sheetId="2" r:id="r2"/></sheets></workbook>`,
    "xl/_rels/workbook.xml.rels": links(link("r1", "worksheet", "worksheets/sheet1.xml") + link("r2", "worksheet", "worksheets/sheet2.xml") + link("r3", "styles", "styles.xml")),
    "xl/styles.xml": `<styleSheet xmlns="${main}"><numFmts count="1"><numFmt numFmtId="164" formatCode="yyyy\\-mm\\-dd\\ hh:mm"/></numFmts><cellXfs count="2"><xf numFmtId="0"/><xf numFmtId="164" applyNumberFormat="1"/></cellXfs></styleSheet>`,
    "xl/worksheets/sheet1.xml": sheet(`<row r="1">${words("Read by the miller")}</row>`),
    "xl/worksheets/sheet2.xml": sheet(rows.join("")),
  });
}

/** Two weeks of hours: what is drawn and what is fed in, in Wh. */
const HOURS = Array.from({ length: 336 }, (_, i) => [400 + ((i * 37) % 11) * 90, i % 24 > 8 && i % 24 < 17 ? 150 * (i % 24) : 0]);

function usageXml() {
  const entry = (own, up, related, content) =>
    `<entry><link rel="self" href="${own}"/><link rel="up" href="${up}"/>${related.map((to) => `<link rel="related" href="${to}"/>`).join("")}<content>${content}</content></entry>`;
  const series = [1, 19].map((direction, i) => {
    const readings = HOURS.map((pair, hour) => `<IntervalReading><timePeriod><duration>3600</duration><start>${1767225600 + hour * 3600}</start></timePeriod><value>${pair[i]}</value></IntervalReading>`);
    return [
      entry(`/U/1/M/${i}`, "/U/1/M", [`/U/1/M/${i}/B`, `/T/${i}`], `<MeterReading xmlns="http://naesb.org/espi"/>`),
      entry(`/T/${i}`, "/T", [], `<ReadingType xmlns="http://naesb.org/espi"><flowDirection>${direction}</flowDirection><powerOfTenMultiplier>0</powerOfTenMultiplier><uom>72</uom></ReadingType>`),
      entry(`/U/1/M/${i}/B/1`, `/U/1/M/${i}/B`, [], `<IntervalBlock xmlns="http://naesb.org/espi">${readings.join("")}</IntervalBlock>`),
    ].join("");
  });
  return `<?xml version="1.0" encoding="UTF-8"?><feed xmlns="http://www.w3.org/2005/Atom">${series.join("")}</feed>`;
}

function nem12() {
  const lines = ["100,NEM12,202601150000,MDP,RETAILER"];
  ["E1", "B1"].forEach((suffix, i) => {
    lines.push(`200,6000000001,E1B1,1,${suffix},N1,M1,WH,30,`);
    for (let day = 0; day < 14; day += 1) {
      const values = HOURS.slice(day * 24, day * 24 + 24).flatMap((pair) => [pair[i] / 2, pair[i] / 2]);
      lines.push(`300,202601${String(day + 1).padStart(2, "0")},${values.join(",")},A,,,20260115000000,`);
    }
  });
  return `${lines.join("\n")}\n900\n`;
}

const folder = mkdtempSync(join(tmpdir(), "millpond-formats-"));
/** Writes a file whose name says nothing of what it is. */
function file(name, content) {
  writeFileSync(join(folder, name), content);
  return join(folder, name);
}

let site;
before(async () => {
  site = await setUp();
});
after(() => site.close());

/** Opens a file in the page: no complaint, and the terminal program's result for the same file, byte for byte. */
async function opened(path) {
  const page = await site.open();
  page.asked = [];
  page.on("request", (request) => page.asked.push(request.url()));
  await chooseFiles(page, path);
  await settled(page);
  assert.equal(await page.locator("[role=alert]").count(), 0, "nothing is wrong");
  assert.equal(await savedResult(page), terminalText(path), "the page's result is the terminal's, byte for byte");
  assertQuiet(page);
  return page;
}

const asksForWorkbooks = (page) => page.asked.some((url) => /workbooks.*\.wasm$/.test(url));

test("a workbook gives the figures of the same table as text, by a program of its own", async () => {
  const path = file("hill-farm.xlsx", workbook(text));
  const page = await opened(path);
  assertSameFigures(await figures(page), terminal(demoFile(farm)));
  assert.ok(asksForWorkbooks(page), "the reader of workbooks came when it was needed");
  assert.match(await page.locator("section[data-station=record]").innerText(), /sheet “Readings” of 2/);
  await shot(page, "workbook-1280-light");
  await page.closeAll();
});

test("an archive of a table and a document gives the table's figures", async () => {
  const path = file("hill-farm.zip", zip({ "2025/hill-farm.csv": text, "readme.pdf": "%PDF-1.7" }));
  const page = await opened(path);
  const shown = (await figures(page)).filter(({ path }) => !path.startsWith("record.findings"));
  assertSameFigures(shown, terminal(demoFile(farm)));
  assert.ok(!asksForWorkbooks(page), "no workbook, no reader of workbooks");
  assert.match(await page.locator("section[data-station=record]").innerText(), /readme\.pdf/);
  await page.closeAll();
});

test("a workbook in an archive", async () => {
  const path = file("both.zip", zip({ "hill-farm.xlsx": workbook(text) }));
  const page = await opened(path);
  assertSameFigures(await figures(page), terminal(demoFile(farm)));
  await page.closeAll();
});

test("usage data in XML and NEM12 of the same weeks have the same energies", async () => {
  const sum = HOURS.reduce((sum, [drawn, fed]) => sum + Math.max(0, drawn - fed), 0) / 1000;
  for (const [name, content] of [["usage.xml", usageXml()], ["meter.csv", nem12()]]) {
    const page = await opened(file(name, content));
    const deficit = (await figures(page)).find(({ path }) => path === "duty.deficit_kwh");
    assert.ok(Math.abs(Number(deficit.value) - sum) < 1e-6 * sum, `${name}: ${deficit.value} kWh, not ${sum}`);
    await shot(page, `${name.replace(/\..*/, "")}-1280-light`);
    await page.closeAll();
  }
});

test("archives and workbooks that cannot be read are answered in words, and the page goes on", async () => {
  const whole = workbook(text);
  const page = await site.open();
  for (const [name, content, words] of [
    ["cut.xlsx", whole.subarray(0, whole.length / 2), /cut off/],
    ["hollow.xlsx", zip({ "xl/workbook.xml": "<workbook/>" }), /workbook cannot be read/],
    ["old.xls", Buffer.concat([Buffer.from("d0cf11e0a1b11ae1", "hex"), Buffer.alloc(4000, 7)]), /workbook cannot be read/],
    ["papers.zip", zip({ "a.pdf": "%PDF-1.7", "b.txt": "Good day." }), /no table of readings; it holds “a\.pdf”/],
  ]) {
    await chooseFiles(page, { name, mimeType: "application/octet-stream", buffer: content });
    await settled(page);
    const said = await page.locator("[role=alert]").first().innerText();
    assert.match(said, words);
    assert.ok(said.includes(name), "it says in which file");
  }
  await chooseFiles(page, file("again.xlsx", whole));
  await settled(page);
  assert.equal(await page.locator("[role=alert]").count(), 0);
  assertSameFigures(await figures(page), terminal(demoFile(farm)));
  assertQuiet(page);
  await page.closeAll();
});

test("without the reader of workbooks the page says so, and reads text tables", async () => {
  const page = await site.open();
  await page.route(/workbooks/, (route) => route.abort());
  await chooseFiles(page, file("kept.xlsx", workbook(text.split("\n").slice(0, 200).join("\n"))));
  await settled(page);
  assert.match(await page.locator("[role=alert]").first().innerText(), /reader of workbooks could not be loaded/);
  await chooseFiles(page, demoFile(farm));
  await settled(page);
  assertSameFigures(await figures(page), terminal(demoFile(farm)));
  await page.closeAll();
});

test("the reader of workbooks is kept for later without a network", () => {
  const kept = readFileSync(join(root, "dist/offline.js"), "utf8");
  const parts = readdirSync(join(root, "dist")).filter((name) => /^workbooks/.test(name));
  assert.equal(parts.length, 2);
  for (const part of parts) assert.ok(kept.includes(`"${part}"`), part);
});
