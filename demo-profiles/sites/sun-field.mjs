// A field of solar cells on a weak line: what it feeds in may change by no more than its grid allows. One clear day with a front in the
// afternoon, one of broken cloud.
//
// The file: two days at one minute, commas, stamps year first, kW.
import { Chance, Wander, limit, monthAndDay, sunHeight, two } from "./common.mjs";

const SEED = 20250614;
const FIRST_DAY = 164; // 14 June 2025
const FIELD_KW = 900;

export function sunField() {
  const chance = new Chance(SEED);
  const clouds = new Wander(chance, 3);
  const sky = new Wander(chance, 90);
  const rows = ["time,solar kW"];
  for (let i = 0; i < 2 * 1440; i += 1) {
    const day = FIRST_DAY + Math.floor(i / 1440);
    const minute = i % 1440;
    const hour = minute / 60;
    const cover = i < 1440 ? limit((hour - 14.5) / 1.5, 0, 0.9) : limit(0.55 + 0.25 * sky.next(), 0, 1);
    const broken = 1 - Math.abs(2 * cover - 1);
    const passing = limit(0.5 + clouds.next(), 0, 1);
    const light = (1 - 0.55 * cover) * (1 - 0.75 * broken * passing);
    const solar = limit(FIELD_KW * 1.1 * sunHeight(day, hour) * light, 0, FIELD_KW);
    const date = monthAndDay(day);
    rows.push(`2025-${two(date.month)}-${two(date.day)} ${two(Math.floor(hour))}:${two(minute % 60)},${solar.toFixed(1)}`);
  }
  return `${rows.join("\n")}\n`;
}
