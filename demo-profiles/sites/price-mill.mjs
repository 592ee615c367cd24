// A mill that buys at hourly prices: cheap at night and at noon, dear in the evening, some noons below zero.
//
// The file: four weeks at one hour, commas, stamps year first, kW and EUR/MWh.
import { Chance, Wander, limit, monthAndDay, two, weekday, within } from "./common.mjs";

const SEED = 20250407;
const FIRST_DAY = 96; // 7 April 2025, a Monday
const DAYS = 28;

export function priceMill() {
  const chance = new Chance(SEED);
  const wind = new Wander(chance, 20);
  const mill = new Wander(chance, 5);
  const rows = ["time,demand kW,price EUR/MWh"];
  for (let i = 0; i < DAYS * 24; i += 1) {
    const day = FIRST_DAY + Math.floor(i / 24);
    const hour = i % 24;
    const work = weekday(day) < 6;
    const sun = within(hour, 9, 17, 3);
    const price = limit(
      92 - 24 * wind.next() - (work ? 58 : 88) * sun + 46 * within(hour, 17, 21, 2) + 18 * within(hour, 6, 9, 1) + 4 * chance.bell(),
      -60,
      320,
    );
    const load = 25 + (work ? limit(160 + 15 * mill.next(), 90, 210) * within(hour, 5, 21, 1) : 0);
    const date = monthAndDay(day);
    rows.push(`2025-${two(date.month)}-${two(date.day)} ${two(hour)}:00,${load.toFixed(1)},${price.toFixed(2)}`);
  }
  return `${rows.join("\n")}\n`;
}
