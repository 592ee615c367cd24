// A small island off the grid: wind, a fish hall and some houses. Calms last for days. What it needs of a store is days.
//
// The file: two lines before the head, semicolons, decimal commas, day first, kWh in each quarter of an hour, and the faults
// of a real one: a gap of some hours, a row that comes twice, a word where a number belongs.
import { Chance, Wander, limit, monthAndDay, two, wave, weekday, within } from "./common.mjs";

const SEED = 20250712;
const RATED_KW = 250;
const comma = (kwh) => kwh.toFixed(2).replace(".", ",");

/** Power of the turbines at a wind speed in m/s. */
function windKw(speed) {
  if (speed < 3 || speed > 24) return 0;
  if (speed >= 12) return RATED_KW;
  return (RATED_KW * (speed * speed * speed - 27)) / (1728 - 27);
}

export function windIsland() {
  const chance = new Chance(SEED);
  const weather = new Wander(chance, 130); // a day and a third
  const hours = new Wander(chance, 10);
  const gusts = new Wander(chance, 1);
  const houses = new Wander(chance, 8);
  const rows = [
    "Site;Ondrey island, fish hall and houses;;",
    "Values;energy of the quarter hour that begins at the stamp;;",
    "Time;Wind kWh;Load kWh;Status",
  ];
  let landing = 1;
  for (let i = 0; i < 35040; i += 1) {
    const day = Math.floor(i / 96);
    const hour = (i % 96) / 4;
    const work = weekday(day) < 5;
    if (i % 96 === 0) landing = limit(0.75 + 0.35 * chance.bell() + 0.3 * wave((day - 15) / 182.5), 0.1, 1.6);

    const season = 8.1 + 1.3 * wave((day + 75) / 365);
    const speed = season * (1 + 0.46 * weather.next() + 0.12 * hours.next() + 0.05 * gusts.next());
    const wind = windKw(limit(speed, 0, 40)) * 0.96;

    const cold = 0.5 + 0.5 * wave((day + 70) / 365); // 1 in deep winter, 0 in high summer
    const ice = 13 + 4 * (1 - cold) + 5 * within(hour, 3, 8, 2);
    const hall = work ? landing * (26 * within(hour, 6, 15.5, 0.75) + 9 * within(hour, 9, 13, 1)) : 3 * within(hour, 7, 11, 1);
    const homes = 9 + 10 * cold + 6 * within(hour, 6, 8.5, 1) + (8 + 5 * cold) * within(hour, 16.5, 21.5, 1.5) + 1.8 * houses.next();
    const load = limit(ice + hall + homes + 0.8 * chance.bell(), 8, 120);

    const date = monthAndDay(day);
    const stamp = `${two(date.day)}.${two(date.month)}.2025 ${two(Math.floor(hour))}:${two((i % 4) * 15)}`;
    if (day === 78 && hour >= 2 && hour < 9.5) continue; // 20 March: the logger was being replaced
    const offline = day === 208 && hour >= 11 && hour < 12; // 28 July: the wind meter answered with a word
    const row = `${stamp};${offline ? "offline" : comma(wind / 4)};${comma(load / 4)};${offline ? "check" : "ok"}`;
    rows.push(row);
    if (day === 131 && hour === 14.25) rows.push(row); // 12 May: sent twice
  }
  return `${rows.join("\r\n")}\r\n`;
}
