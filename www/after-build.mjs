// Trunk's last step: finishes the staged site before it becomes dist/.
//
// - gives boot.js, the engine and the reader of workbooks names by their content, like the other files, and writes the script element that names them;
// - compresses the demo sites and copies their list;
// - puts the licences of all that is shipped beside it;
// - tells the service worker which files to keep.
import { execFileSync } from "node:child_process";
import { createHash } from "node:crypto";
import { mkdirSync, readFileSync, readdirSync, renameSync, writeFileSync } from "node:fs";
import { dirname, join, relative, sep } from "node:path";
import { fileURLToPath } from "node:url";
import { gzipSync } from "node:zlib";
import { licences } from "./licences.mjs";

const root = join(dirname(fileURLToPath(import.meta.url)), "..");
const staging = process.env.TRUNK_STAGING_DIR;
if (!staging) throw new Error("TRUNK_STAGING_DIR is not set: this script is run by Trunk (see Trunk.toml)");

function only(pattern) {
  const found = readdirSync(staging).filter((name) => pattern.test(name));
  if (found.length !== 1) throw new Error(`expected one file like ${pattern} in the build, found ${found.length}: ${found}`);
  return found[0];
}

/** Gives a file a name by its content, as Trunk does with the page's own, so that no old copy is taken for a new one. */
function hashed(name) {
  const [stem, ending] = name.split(".");
  const renamed = `${stem}-${digest(readFileSync(join(staging, name)))}.${ending}`;
  renameSync(join(staging, name), join(staging, renamed));
  return renamed;
}

const digest = (content) => createHash("sha256").update(content).digest("hex").slice(0, 16);

const wasm = only(/^page-.*_bg\.wasm$/);
const glue = only(/^page-.*\.js$/);
const engineWasm = hashed(only(/^engine_bg\.wasm$/));
const engineGlue = hashed(only(/^engine\.js$/));
const workbooksWasm = hashed(only(/^workbooks_bg\.wasm$/));
const workbooksGlue = hashed(only(/^workbooks\.js$/));
const boot = hashed("boot.js");

// Trunk leaves its own element for the program in the document, and empty lines where the others were.
const page = readFileSync(join(staging, "index.html"), "utf8")
  .replace(/<link data-trunk[^>]*>/g, "")
  .replace(/\n\s*\n+/g, "\n")
  .replace("</head>", `<link rel="preload" href="${wasm}" as="fetch" type="application/wasm" crossorigin>
<script src="${boot}" data-glue="${glue}" data-wasm="${wasm}"
 data-engine-glue="${engineGlue}" data-engine-wasm="${engineWasm}"
 data-workbooks-glue="${workbooksGlue}" data-workbooks-wasm="${workbooksWasm}" defer></script>
</head>`);
if (/<script(?![^>]*\bsrc=)/.test(page)) throw new Error("index.html holds a script inside the document: the policy forbids it");
writeFileSync(join(staging, "index.html"), page);

const demos = join(staging, "demos");
mkdirSync(demos, { recursive: true });
const sites = JSON.parse(readFileSync(join(root, "demo-profiles/sites.json"), "utf8"));
for (const site of sites) {
  writeFileSync(join(demos, `${site.file}.gz`), gzipSync(readFileSync(join(root, "demo-profiles", site.file)), { level: 9 }));
}
writeFileSync(join(demos, "sites.json"), JSON.stringify(sites.map((site) => ({ ...site, file: `demos/${site.file}.gz` }))));

const metadata = JSON.parse(
  execFileSync(
    "cargo",
    ["metadata", "--format-version=1", "--locked", "--no-default-features", "--features=page,engine,workbooks", "--filter-platform=wasm32-unknown-unknown"],
    { cwd: root, encoding: "utf8", maxBuffer: 1 << 28, stdio: ["ignore", "pipe", "inherit"] },
  ),
);
writeFileSync(join(staging, "licences.txt"), licences(metadata, root));

/** Every file in a folder and those below it, in the order of their names. */
function filesIn(folder) {
  return readdirSync(folder, { withFileTypes: true }).sort((a, b) => (a.name < b.name ? -1 : 1))
    .flatMap((entry) => (entry.isDirectory() ? filesIn(join(folder, entry.name)) : [join(folder, entry.name)]));
}

const kept = filesIn(staging).filter((file) => !/(offline\.js|licences\.txt|OFL\.txt)$/.test(file));
const mark = digest(Buffer.concat(kept.map((file) => readFileSync(file))));
const names = kept.map((file) => relative(staging, file).split(sep).join("/")).map((name) => (name === "index.html" ? "./" : name));
const offline = readFileSync(join(staging, "offline.js"), "utf8")
  .replace(/^const FILES = .*$/m, `const FILES = ${JSON.stringify(names)};`)
  .replace(/^const MARK = .*$/m, `const MARK = "${mark}";`);
writeFileSync(join(staging, "offline.js"), offline);
