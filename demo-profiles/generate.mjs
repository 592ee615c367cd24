// Makes the demo sites' meter files. Every site is invented; nothing here was measured anywhere.
//
// The same files on every machine: the only arithmetic used is + - * / and comparison, random numbers are 32-bit integers, and
// the sine is a parabola. Run `node demo-profiles/generate.mjs` to write the files beside this script, or give another folder.
// Change a site's seed or terms and its file changes: commit both.
import { mkdirSync, writeFileSync } from "node:fs";
import { dirname, join } from "node:path";
import { fileURLToPath } from "node:url";
import { coldStore } from "./sites/cold-store.mjs";
import { hillFarm } from "./sites/hill-farm.mjs";
import { islandFrequency } from "./sites/island-frequency.mjs";
import { lakesideHospital } from "./sites/lakeside-hospital.mjs";
import { priceMill } from "./sites/price-mill.mjs";
import { solarWorkshop } from "./sites/solar-workshop.mjs";
import { sunField } from "./sites/sun-field.mjs";
import { windIsland } from "./sites/wind-island.mjs";

const here = dirname(fileURLToPath(import.meta.url));
const folder = process.argv[2] ?? here;
mkdirSync(folder, { recursive: true });

const files = {
  "hill-farm.csv": hillFarm,
  "wind-island.csv": windIsland,
  "solar-workshop.txt": solarWorkshop,
  "cold-store.csv": coldStore,
  "sun-field.csv": sunField,
  "lakeside-hospital.csv": lakesideHospital,
  "island-frequency.csv": islandFrequency,
  "price-mill.csv": priceMill,
};
for (const [name, site] of Object.entries(files)) writeFileSync(join(folder, name), site());
