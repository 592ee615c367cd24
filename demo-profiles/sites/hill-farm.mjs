// A hill farm off the grid: a stream turbine and a dairy. Milking asks for more than the stream gives, twice a day for some
// hours; in a dry late summer nearly all that it gives is asked for. What it needs of a store is hours.
//
// The file: commas, decimal points, stamps year first, kW, one clock all year.
import { Chance, Wander, limit, monthAndDay, sunHeight, two, weekday, within } from "./common.mjs";

const SEED = 20250311;
const RATED_KW = 30;

/** Daily mean of what the turbine could give, kW: rain feeds a quick and a slow store, a spring never dries up. */
function streamKw(chance) {
  const days = [];
  let quick = 8;
  let slow = 12;
  let wet = true;
  for (let day = 0; day < 365; day += 1) {
    const dry = day > 205 && day < 268; // 25 July to 25 September
    const summer = day > 135 && day <= 205;
    const begins = dry ? 0.03 : summer ? 0.2 : 0.35;
    const goesOn = dry ? 0.2 : summer ? 0.45 : 0.68;
    wet = chance.happens(wet ? goesOn : begins);
    const rain = wet ? 14 * chance.even() * chance.even() * (dry ? 0.5 : 1) : 0;
    quick = quick * 0.62 + rain * 0.8;
    slow = slow * 0.975 + rain * 0.12;
    days.push(6.5 + 0.75 * slow + quick);
  }
  return days;
}

export function hillFarm() {
  const chance = new Chance(SEED);
  const stream = streamKw(new Chance(SEED + 1));
  const house = new Wander(chance, 6);
  const ripple = new Wander(chance, 12);
  const rows = ["time,stream turbine (kW),farm load (kW)"];
  let raked = 40; // intervals until the intake's rack is raked, which stops the turbine
  let herd = 0;
  for (let i = 0; i < 35040; i += 1) {
    const day = Math.floor(i / 96);
    const hour = (i % 96) / 4;
    if (i % 96 === 0) herd = chance.between(0.92, 1.08);

    const tomorrow = stream[day + 1] ?? stream[day];
    const flow = stream[day] + ((tomorrow - stream[day]) * hour) / 24;
    let supply = limit(flow * (1 + 0.012 * ripple.next()), 0, RATED_KW);
    raked -= 1;
    if (raked === 0) {
      supply = 0;
      raked = 700 + Math.floor(600 * chance.even());
    }

    const milking = 8.5 * (within(hour, 5.5, 7.75) + within(hour, 16.5, 18.5));
    const cooling = 6.2 * (within(hour, 6, 9) + within(hour, 17, 19.75)) * (0.82 + 0.3 * sunHeight(day, 13));
    const washing = 6.5 * (within(hour, 7.75, 8.75) + within(hour, 18.5, 19.25));
    const mill = weekday(day) === 1 ? 7.5 * within(hour, 10, 12) : 0;
    const barn = 1.6 + (day > 130 && day < 270 ? 1.1 * within(hour, 9, 19, 2) : 0.4);
    const home = limit(0.9 + 1.3 * within(hour, 6.5, 22.5, 1) + 0.8 * within(hour, 17, 21, 1) + 0.5 * house.next(), 0.3, 6);
    const load = herd * (milking + cooling + washing) * (1 + 0.03 * chance.bell()) + mill + barn + home;

    const date = monthAndDay(day);
    const stamp = `2025-${two(date.month)}-${two(date.day)} ${two(Math.floor(hour))}:${two((i % 4) * 15)}`;
    rows.push(`${stamp},${supply.toFixed(2)},${load.toFixed(2)}`);
  }
  return `${rows.join("\n")}\n`;
}
