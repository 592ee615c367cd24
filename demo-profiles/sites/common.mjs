// What the sites share: chance, waves and stamps, the same on every machine.

/** Random numbers from a seed: a counter stepped by the golden ratio and mixed by multiply and shift. */
export class Chance {
  constructor(seed) {
    this.state = seed >>> 0;
  }

  /** Evenly spread over 0 (included) to 1 (excluded), in steps of 2^-32. */
  even() {
    this.state = (this.state + 0x9e3779b9) >>> 0;
    let mixed = this.state;
    mixed = Math.imul(mixed ^ (mixed >>> 16), 0x21f0aaad);
    mixed = Math.imul(mixed ^ (mixed >>> 15), 0x735a2d97);
    return ((mixed ^ (mixed >>> 15)) >>> 0) / 4294967296;
  }

  /** From `least` to `greatest`. */
  between(least, greatest) {
    return least + (greatest - least) * this.even();
  }

  /** Bell-shaped around 0 with standard deviation 1: the sum of twelve even numbers, less six. */
  bell() {
    let sum = -6;
    for (let i = 0; i < 12; i += 1) sum += this.even();
    return sum;
  }

  /** Whether a thing of this probability happens. */
  happens(share) {
    return this.even() < share;
  }
}

/** A wandering value around 0 with standard deviation 1, whose memory fades by half in `half` steps. */
export class Wander {
  constructor(chance, half) {
    this.chance = chance;
    // 0.6931 is ln 2; for the long memories used here 1 - ln2/half is near enough to 2^(-1/half).
    this.keep = 1 - 0.6931 / (half + 0.6931);
    this.kick = root(1 - this.keep * this.keep);
    this.value = chance.bell();
  }

  next() {
    this.value = this.keep * this.value + this.kick * this.chance.bell();
    return this.value;
  }
}

/** Square root; exact rounding is required of it by the standard of floating-point numbers. */
export function root(value) {
  return Math.sqrt(value);
}

/** A sine wave over whole turns (1 turn = 360 degrees), by a parabola corrected once: within 0.001 of the sine. */
export function wave(turns) {
  let x = turns - Math.floor(turns);
  if (x >= 0.5) x -= 1;
  const y = 16 * x * (0.5 - Math.abs(x));
  return 0.225 * (y * Math.abs(y) - y) + y;
}

export function limit(value, least, greatest) {
  return value < least ? least : value > greatest ? greatest : value;
}

/** 1 inside a part of the day (hours), with edges `soft` hours wide, 0 outside. */
export function within(hour, from, to, soft = 0.25) {
  return limit((hour - from) / soft + 1, 0, 1) * limit((to - hour) / soft, 0, 1);
}

/**
 * Height of the sun as its sine (0 at night), at 50 degrees north.
 * `day` counts from 1 January, `hour` is solar time.
 */
export function sunHeight(day, hour) {
  const tilt = (23.44 / 360) * wave((day - 80) / 365);
  const height = 0.766 * wave(tilt) + 0.6428 * wave(tilt + 0.25) * wave((hour - 12) / 24 + 0.25);
  return height > 0 ? height : 0;
}

const LENGTHS = [31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31];

/** Month and day (both from 1) of a day of a year without a leap day, counted from 0. */
export function monthAndDay(day) {
  let month = 0;
  let left = day;
  while (left >= LENGTHS[month]) {
    left -= LENGTHS[month];
    month += 1;
  }
  return { month: month + 1, day: left + 1 };
}

/** Day of the week, Monday = 0, of a day of 2025 counted from 0 (1 January 2025 was a Wednesday). */
export function weekday(day) {
  return (day + 2) % 7;
}

export function two(number) {
  return String(number).padStart(2, "0");
}
