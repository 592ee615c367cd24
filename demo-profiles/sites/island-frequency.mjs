// The frequency of a small grid over a morning: a slow wander, and one loss of a unit. No meter of power at all.
//
// The file: six hours at ten seconds, semicolons, Hz.
import { Chance, Wander, limit, two } from "./common.mjs";

const SEED = 20250321;

export function islandFrequency() {
  const chance = new Chance(SEED);
  const slow = new Wander(chance, 60);
  const fast = new Wander(chance, 2);
  const rows = ["time;frequency Hz"];
  let loss = 0;
  for (let i = 0; i < 6 * 360; i += 1) {
    if (i === 1500) loss = 0.19;
    loss *= 0.985;
    const hertz = limit(50 + 0.022 * slow.next() + 0.008 * fast.next() - loss, 49.5, 50.5);
    const second = 21600 + 10 * i;
    rows.push(`2025-03-21 ${two(Math.floor(second / 3600))}:${two(Math.floor(second / 60) % 60)}:${two(second % 60)};${hertz.toFixed(3)}`);
  }
  return `${rows.join("\n")}\n`;
}
