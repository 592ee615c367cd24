// A metal workshop on a grid connection, with a roof of solar cells. Welding and a press set its greatest demand, a few minutes
// at a time; clouds set the steepest changes. What it needs of a store is minutes, and some hours for the roof's noon.
//
// The file: four weeks at one minute, tabs, date and time apart, month first with AM and PM, import and export apart, kW.
import { Chance, Wander, limit, monthAndDay, sunHeight, two, weekday, within } from "./common.mjs";

const SEED = 20250505;
const ROOF_KW = 46;
const FIRST_DAY = 124; // 5 May 2025, a Monday
const DAYS = 28;

/** Minutes left of a burst of work, and the minutes until the next. */
class Burst {
  constructor(chance, { least, greatest, pause }) {
    Object.assign(this, { chance, least, greatest, pause, left: 0, wait: 5 });
  }

  /** Whether the machine runs in this minute. */
  next(working) {
    if (this.left > 0) {
      this.left -= 1;
      return true;
    }
    if (!working) return false;
    this.wait -= 1;
    if (this.wait > 0) return false;
    this.left = Math.floor(this.chance.between(this.least, this.greatest)) - 1;
    this.wait = 1 + Math.floor(this.pause * (this.chance.even() + this.chance.even()));
    return true;
  }
}

export function solarWorkshop() {
  const chance = new Chance(SEED);
  const sky = new Wander(chance, 420);
  const clouds = new Wander(chance, 4);
  const shop = new Wander(chance, 20);
  const welding = new Burst(chance, { least: 2, greatest: 6, pause: 11 });
  const press = new Burst(chance, { least: 1, greatest: 3, pause: 34 });
  const air = new Burst(chance, { least: 4, greatest: 9, pause: 8 });
  const rows = ["Date\tTime\tImport kW\tExport kW\tSolar kW"];
  for (let i = 0; i < DAYS * 1440; i += 1) {
    const day = FIRST_DAY + Math.floor(i / 1440);
    const minute = i % 1440;
    const hour = minute / 60;
    const kind = weekday(day);
    const open = kind < 5 ? within(hour, 6, 15.5) : kind === 5 ? 0.6 * within(hour, 7, 12) : 0;
    const busy = open > 0.3 && !(hour >= 9.25 && hour < 9.5) && !(hour >= 12 && hour < 12.5);

    // Clear, broken or dull: broken skies let the sun through and hide it again within minutes.
    const cover = limit(0.45 + 0.4 * sky.next(), 0, 1);
    const broken = 1 - Math.abs(2 * cover - 1);
    const passing = limit(0.5 + 0.9 * clouds.next(), 0, 1);
    const light = (1 - 0.75 * cover) * (1 - 0.7 * broken * passing);
    const height = sunHeight(day, hour + 0.5);
    const solar = limit(ROOF_KW * 1.12 * height * light, 0, ROOF_KW * 0.97);

    const machines = open * limit(15 + 2.5 * shop.next(), 5, 24);
    const load = 5.2 + 0.25 * chance.bell() + machines +
      (welding.next(busy) ? 27 + chance.between(-2, 3) : 0) +
      (press.next(busy && kind < 5) ? 38 + chance.between(-3, 5) : 0) +
      (air.next(open > 0.3) ? 7.5 : 0) +
      (kind < 5 ? 5 * within(hour, 5, 6.5) : 0);

    const net = solar - load;
    const date = monthAndDay(day);
    const clock = `${two(Math.floor(hour) % 12 === 0 ? 12 : Math.floor(hour) % 12)}:${two(minute % 60)} ${hour < 12 ? "AM" : "PM"}`;
    const kw = (value) => (value > 0 ? value.toFixed(1).replace(/\.0$/, "") : "0");
    rows.push(`${two(date.month)}/${two(date.day)}/2025\t${clock}\t${kw(-net)}\t${kw(net)}\t${kw(solar)}`);
  }
  return `${rows.join("\n")}\n`;
}
