// A hospital on a grid connection: theatres and wards by day, and a part of it all that must never go dark.
//
// The file: four weeks at 15 minutes, commas, stamps year first, kW; the critical demand in a column of its own.
import { Chance, Wander, limit, monthAndDay, two, weekday, within } from "./common.mjs";

const SEED = 20250901;
const FIRST_DAY = 243; // 1 September 2025, a Monday
const DAYS = 28;

export function lakesideHospital() {
  const chance = new Chance(SEED);
  const wards = new Wander(chance, 10);
  const theatres = new Wander(chance, 4);
  const rows = ["time,demand kW,critical kW"];
  for (let i = 0; i < DAYS * 96; i += 1) {
    const day = FIRST_DAY + Math.floor(i / 96);
    const quarter = i % 96;
    const hour = quarter / 4;
    const work = weekday(day) < 5;
    const surgery = (work ? 1 : 0.2) * within(hour, 7, 16.5, 0.75) * limit(110 + 18 * theatres.next(), 60, 170);
    const care = 140 + 55 * within(hour, 6, 21, 1) + 6 * wards.next();
    const comfort = (work ? 90 : 50) * within(hour, 6.5, 19, 1);
    const date = monthAndDay(day);
    const critical = 0.55 * care + 0.8 * surgery;
    rows.push(
      `2025-${two(date.month)}-${two(date.day)} ${two(Math.floor(hour))}:${two(15 * (quarter % 4))},` +
      `${(care + surgery + comfort).toFixed(1)},${critical.toFixed(1)}`,
    );
  }
  return `${rows.join("\n")}\n`;
}
