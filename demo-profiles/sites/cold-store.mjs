// A cold store on a grid connection that generates nothing: its record is demand alone. Trucks arrive on workdays, the blast
// freezer follows, and warm afternoons add to both.
//
// The file: energy of each quarter of an hour, stamps with their offset, summer time kept (Europe/Berlin's rules).
import { Chance, Wander, limit, monthAndDay, two, wave, weekday, within } from "./common.mjs";

const SEED = 20251123;
const SUMMER_FROM = 88 * 96 + 4; // 30 March 2025 01:00 UTC, in quarter hours of UTC
const SUMMER_TO = 298 * 96 + 4; // 26 October 2025 01:00 UTC

export function coldStore() {
  const chance = new Chance(SEED);
  const warm = new Wander(chance, 150);
  const doors = new Wander(chance, 3);
  const rows = ["interval_start,energy_kwh"];
  let freight = 1;
  // The year begins at midnight in UTC+1, which is the last hour of 2024 in UTC.
  for (let utc = -4; utc < 35036; utc += 1) {
    const offset = utc >= SUMMER_FROM && utc < SUMMER_TO ? 2 : 1;
    const local = utc + 4 * offset;
    const day = Math.floor(local / 96);
    const quarter = local % 96;
    const hour = quarter / 4;
    const work = weekday(day) < 6;
    if (quarter === 0) freight = limit(1 + 0.3 * chance.bell() + 0.25 * wave((day - 200) / 365), 0.3, 1.9);

    const outside = 9 - 9 * wave((day + 80) / 365) + 4 * wave((hour - 9) / 24) + 3 * warm.next();
    const shell = limit(34 + 1.7 * (outside - 5), 22, 90);
    const dock = work ? freight * (26 * within(hour, 4.5, 9.5, 0.5) + 16 * within(hour, 13, 16, 0.5)) : 0;
    const blast = work ? freight * 58 * within(hour, 9, 14.5, 0.5) * (1 + 0.008 * (outside - 5)) : 0;
    const defrost = quarter % 24 === 3 || quarter % 24 === 4 ? 21 : 0;
    const light = work ? 9 * within(hour, 4, 19) : 2;
    const kw = limit(shell + dock + blast + defrost + light + 2.4 * doors.next(), 15, 400);

    const date = monthAndDay(day);
    const stamp = `2025-${two(date.month)}-${two(date.day)}T${two(Math.floor(hour))}:${two((quarter % 4) * 15)}+0${offset}:00`;
    rows.push(`${stamp},${(kw / 4).toFixed(2)}`);
  }
  return `${rows.join("\n")}\n`;
}
