// Weighs the first download, gzipped: all that the browser must have before the page works. Fails above the limit.
import { readFileSync, readdirSync } from "node:fs";
import { join } from "node:path";
import { gzipSync } from "node:zlib";

const LIMIT_KB = 400;
const folder = process.argv[2] ?? "dist";
const FIRST = /^(index\.html|icon\.svg|boot-.*\.js|page-.*\.js|page-.*_bg\.wasm|.*\.css)$/;

const THEN = /^engine.*\.(js|wasm)$/;
const AT_NEED = /^workbooks.*\.(js|wasm)$/;

const weigh = (pattern) => readdirSync(folder)
  .filter((name) => pattern.test(name))
  .map((name) => ({ name, bytes: gzipSync(readFileSync(join(folder, name)), { level: 9 }).length }))
  .sort((a, b) => b.bytes - a.bytes);
const sum = (parts) => parts.reduce((sum, part) => sum + part.bytes, 0);
const parts = weigh(FIRST);
const total = sum(parts);

const kb = (bytes) => (bytes / 1000).toFixed(1).padStart(7);
for (const { name, bytes } of parts) console.log(`${kb(bytes)} kB  ${name}`);
console.log(`${kb(sum(weigh(THEN)))} kB  the engine, fetched at the first sign of use`);
console.log(`${kb(sum(weigh(AT_NEED)))} kB  the reader of workbooks, fetched when one comes`);
console.log(`${kb(total)} kB  first download, gzipped (limit ${LIMIT_KB} kB)`);
if (!parts.some(({ name }) => name.endsWith(".wasm"))) {
  console.error(`\nStopped: ${folder} holds no page.\nRemedy:  run www/build.`);
  process.exit(1);
}
if (total > LIMIT_KB * 1000) {
  console.error(`\nStopped: the first download weighs more than ${LIMIT_KB} kB.\nRemedy:  find what grew (a new dependency, a regular expression, generic code); rare readers belong in a second wasm.`);
  process.exit(1);
}
