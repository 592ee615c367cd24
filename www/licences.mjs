// The note of third-party licences that is shipped beside the page.
import { existsSync, readFileSync, readdirSync } from "node:fs";
import { dirname, join } from "node:path";

/** Names of the packages that end up in the page: what the root depends on, without build and test dependencies. */
function shipped(metadata) {
  const nodes = new Map(metadata.resolve.nodes.map((node) => [node.id, node]));
  const seen = new Set();
  const open = [metadata.resolve.root];
  while (open.length > 0) {
    const id = open.pop();
    if (seen.has(id)) continue;
    seen.add(id);
    for (const next of nodes.get(id).deps) {
      if (next.dep_kinds.some(({ kind }) => kind === null)) open.push(next.pkg);
    }
  }
  seen.delete(metadata.resolve.root);
  return seen;
}

function licenceFiles(folder) {
  if (!existsSync(folder)) return [];
  return readdirSync(folder).filter((name) => /^(licen[cs]e|copying|notice|unlicense)/i.test(name)).sort().map((name) => join(folder, name));
}

/** The note's text, from the output of `cargo metadata` for the page's build. Each licence text stands once. */
export function licences(metadata, root) {
  const ids = shipped(metadata);
  const packages = metadata.packages.filter((item) => ids.has(item.id)).sort((a, b) => (a.name < b.name ? -1 : 1));
  const list = [];
  const texts = new Map();
  for (const item of packages) {
    list.push(`${item.name} ${item.version}: ${item.license ?? "see its licence file"}`);
    for (const file of licenceFiles(dirname(item.manifest_path))) {
      const text = readFileSync(file, "utf8").replace(/\r\n/g, "\n").trim();
      if (!texts.has(text)) texts.set(text, []);
      texts.get(text).push(`${item.name} ${item.version}`);
    }
  }
  const font = readFileSync(join(root, "www/fonts/OFL.txt"), "utf8").trim();
  return [
    "Millpond: licences",
    "==================",
    "",
    readFileSync(join(root, "LICENSE"), "utf8").trim(),
    "",
    "The page is built with the works of others, each under its own licence:",
    "",
    ...list.map((line) => `- ${line}`),
    "- Source Sans 3 (typeface): SIL Open Font License 1.1",
    "",
    ...[...texts, [font, ["Source Sans 3"]]].flatMap(([text, names]) => ["-".repeat(72), names.join(", "), "", text, ""]),
  ].join("\n");
}
