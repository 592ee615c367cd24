// Trunk's last step: finishes the staged site before it becomes dist/.
//
// - gives boot.js a name by its content, like the other files, and writes the script element that names glue and wasm;
// - compresses the demo sites and copies their list;
// - puts the licences of all that is shipped beside it.
import { execFileSync } from "node:child_process";
import { createHash } from "node:crypto";
import { mkdirSync, readFileSync, readdirSync, renameSync, writeFileSync } from "node:fs";
import { dirname, join } from "node:path";
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

const wasm = only(/^page-.*_bg\.wasm$/);
const glue = only(/^page-.*\.js$/);
const boot = `boot-${createHash("sha256").update(readFileSync(join(staging, "boot.js"))).digest("hex").slice(0, 16)}.js`;
renameSync(join(staging, "boot.js"), join(staging, boot));

// Trunk may or may not leave hints of its own for the wasm and the glue; ours replace them.
const page = readFileSync(join(staging, "index.html"), "utf8")
  .replace(/<link[^>]*rel="?(?:module)?preload"?[^>]*>\s*/g, "")
  .replace("</head>", `<link rel="preload" href="${wasm}" as="fetch" type="application/wasm" crossorigin>
<script src="${boot}" data-glue="${glue}" data-wasm="${wasm}" defer></script>
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
    ["metadata", "--format-version=1", "--locked", "--no-default-features", "--features=page", "--filter-platform=wasm32-unknown-unknown"],
    { cwd: root, encoding: "utf8", maxBuffer: 1 << 28, stdio: ["ignore", "pipe", "inherit"] },
  ),
);
writeFileSync(join(staging, "licences.txt"), licences(metadata, root));
