//! Smoothing with the least energy: the set of what can be reached, exactly.
//!
//! Before each interval the state is a pair: the stored energy and the output of the coming interval. With a given capacity the pairs
//! that can be reached form a convex polygon: an interval shears it (output draws from the store), empty and full cut it, and the ramp
//! widens it up and down by its limit. The capacity is found by halving a bracket: too small where a polygon comes out empty. Losses are
//! left aside here. Derived here; checked against linear programmes.

use super::series::Known;
use super::smoothing::Smooth;

type Point = (f64, f64);
/// A convex polygon, counter-clockwise; one or two points where it has no area; empty where nothing can be reached.
type Polygon = Vec<Point>;

/// Halvings of a bracket of capacities.
const HALVINGS: usize = 52;
/// Share of the capacity that may be given away to close at both ends.
const CLOSE: f64 = 1e-9;
/// Narrowings of the bracket of starting levels.
const NARROWINGS: usize = 36;
/// What is left of a bracket by one narrowing: the golden section.
const GOLDEN: f64 = 0.618_033_988_749_894_8;

/// The task of one stretch: the powers that are there, and the intervals since the one before.
struct Task {
    /// kWh that the power brings in an interval.
    energy: Vec<f64>,
    /// Most that the output's energy may change to this interval, kWh.
    reach: Vec<f64>,
    least: f64,
}

/// The output of least energy, kW; NaN in gaps.
pub(super) fn least_energy(power: &Known, terms: &Smooth, step_h: f64) -> Vec<f64> {
    let mut task = Task {
        energy: Vec::new(),
        reach: Vec::new(),
        least: if terms.never_below_zero { 0.0 } else { f64::NEG_INFINITY },
    };
    let mut before = None;
    for (i, value) in power.there() {
        task.energy.push(value * step_h);
        task.reach.push(before.map_or(0.0, |before| (i - before) as f64 * terms.ramp_kw * step_h));
        before = Some(i);
    }
    let found = if terms.closes { task.closing() } else { task.free() };
    let mut output = vec![f64::NAN; power.len()];
    for ((i, _), energy) in power.there().zip(found) {
        output[i] = energy / step_h;
    }
    output
}

impl Task {
    /// Range of the running sum of the power less its mean: a constant output takes no more. With the level that it starts from.
    fn constant(&self) -> (f64, f64) {
        let mean = self.energy.iter().sum::<f64>() / self.energy.len() as f64;
        let (mut sum, mut least, mut most) = (0.0_f64, 0.0_f64, 0.0_f64);
        for energy in &self.energy {
            sum += energy - mean;
            least = least.min(sum);
            most = most.max(sum);
        }
        (most - least, 0.0 - least)
    }

    /// Free ends: from any level, to any.
    fn free(&self) -> Vec<f64> {
        self.follow(self.least_capacity(), None)
    }

    fn least_capacity(&self) -> f64 {
        let carried = |capacity: f64| self.reached(capacity, None, |_| {});
        if carried(0.0) { 0.0 } else { halved(0.0, self.constant().0, carried) }
    }

    /// Ending at the level of the start.
    fn closing(&self) -> Vec<f64> {
        let free = self.least_capacity();
        // Mostly closing costs nothing: the ends are free of what decides in the middle. Levels from which the capacity carries the
        // record, and levels at which it may end, are spans; one in both is tried.
        let capacity = free * (1.0 + CLOSE);
        let (from, to) = (self.starts(capacity), self.ends(capacity));
        let (low, high) = (from.0.max(to.0), from.1.min(to.1));
        if low <= high {
            for share in [0.5, 0.1, 0.9, 0.0, 1.0] {
                let level = low + share * (high - low);
                if self.reached(capacity, Some(level), |_| {}) {
                    return self.follow(capacity, Some(level));
                }
            }
        }
        self.searched(free)
    }

    /// Least and greatest level at the end, from any start.
    fn ends(&self, capacity: f64) -> (f64, f64) {
        let mut last = Vec::new();
        if self.reached(capacity, None, |set| last.clone_from(set)) { span(&last) } else { (1.0, 0.0) }
    }

    /// Least and greatest level at the start, to any end: the ends of the record read backwards, with the room left in place of the
    /// energy stored.
    fn starts(&self, capacity: f64) -> (f64, f64) {
        let backwards = Self {
            energy: self.energy.iter().rev().copied().collect(),
            reach: std::iter::once(0.0).chain(self.reach.iter().skip(1).rev().copied()).collect(),
            least: self.least,
        };
        let (low, high) = backwards.ends(capacity);
        (capacity - high, capacity - low)
    }

    /// The least capacity is a convex function of the level at both ends: two levels are compared by halving one bracket of capacities
    /// until only one of them is carried.
    fn searched(&self, free: f64) -> Vec<f64> {
        let (greatest, start) = self.constant();
        let carried = |capacity: f64, level: f64| self.reached(capacity, Some(level), |_| {});
        let (mut low, mut high) = (0.0, greatest);
        for _ in 0..NARROWINGS {
            let (one, other) = (high - GOLDEN * (high - low), low + GOLDEN * (high - low));
            if other <= one {
                break;
            }
            let first_is_less = match (carried(greatest, one), carried(greatest, other)) {
                (true, false) => true,
                (false, true) => false,
                // Neither carries what the constant output's level does: that lies beyond one of them.
                (false, false) => start < one,
                (true, true) => {
                    let (mut fails, mut carries) = (free, greatest);
                    let mut less = true;
                    for _ in 0..HALVINGS {
                        let middle = f64::midpoint(fails, carries);
                        match (carried(middle, one), carried(middle, other)) {
                            (true, true) => carries = middle,
                            (false, false) => fails = middle,
                            (first, _) => {
                                less = first;
                                break;
                            }
                        }
                    }
                    less
                }
            };
            if first_is_less {
                high = other;
            } else {
                low = one;
            }
        }
        let level = f64::midpoint(low, high);
        let level = if carried(greatest, level) { level } else { start };
        self.follow(halved(free, greatest, |capacity| carried(capacity, level)), Some(level))
    }

    /// Whether a capacity carries the task, from and to a level or freely; `see` is shown the polygon before each interval and
    /// that after the last.
    fn reached(&self, capacity: f64, level: Option<f64>, mut see: impl FnMut(&Polygon)) -> bool {
        let most = self.energy.iter().fold(0.0, |most: f64, energy| most.max(energy.abs())) + capacity;
        let least = self.least.max(0.0 - most);
        let mut set: Polygon = match level {
            None => vec![(0.0, least), (capacity, least), (capacity, most), (0.0, most)],
            Some(level) => vec![(level, least), (level, most)],
        };
        if level.is_some_and(|level| level > capacity) {
            return false;
        }
        for (energy, reach) in self.energy.iter().zip(&self.reach) {
            if *reach > 0.0 {
                set = clipped(&widened(&set, *reach), |point| point.1 - self.least);
            }
            see(&set);
            for point in &mut set {
                point.0 += energy - point.1;
            }
            // A rounding of the sums must not empty a set that is just large enough.
            let slack = 1e-13 * most;
            set = clipped(&set, |point| point.0 + slack);
            set = clipped(&set, |point| capacity + slack - point.0);
            if set.is_empty() {
                return false;
            }
        }
        see(&set);
        let Some(level) = level else { return true };
        let slack = 1e-12 * most;
        let (low, high) = span(&set);
        (low - slack..=high + slack).contains(&level)
    }

    /// An output that the capacity carries, found from the end: a point of each polygon from which the next one's is reached.
    fn follow(&self, capacity: f64, level: Option<f64>) -> Vec<f64> {
        let mut sets: Vec<Polygon> = Vec::with_capacity(self.energy.len() + 1);
        self.reached(capacity, level, |set| sets.push(set.clone()));
        let Some(last) = sets.pop() else { return self.energy.clone() };
        let (low, high) = span(&last);
        let mut stored = level.unwrap_or_else(|| f64::midpoint(low, high)).clamp(low, high);
        let mut next: Option<(f64, f64)> = None;
        let mut outputs = Vec::with_capacity(self.energy.len());
        for (k, set) in sets.iter().enumerate().rev() {
            // Before the interval the store held stored - energy + output: a line through the polygon.
            let base = stored - self.energy[k];
            let (mut low, mut high) = on_line(set, base);
            if let Some((after, reach)) = next {
                (low, high) = (low.max(after - reach), high.min(after + reach));
            }
            // The middle of what is left; where rounding leaves nothing, the nearest of what the ramp allows.
            let mut output = f64::midpoint(low, high);
            if let Some((after, reach)) = next {
                output = output.clamp(after - reach, after + reach);
            }
            outputs.push(output);
            stored = base + output;
            next = Some((output, self.reach[k]));
        }
        outputs.reverse();
        outputs
    }
}

/// The end of a bracket that carries, halved until only rounding is left; the other end fails.
fn halved(mut fails: f64, mut carries: f64, carried: impl Fn(f64) -> bool) -> f64 {
    for _ in 0..HALVINGS {
        let middle = f64::midpoint(fails, carries);
        if carries - fails <= 1e-12 * carries {
            break;
        }
        if carried(middle) {
            carries = middle;
        } else {
            fails = middle;
        }
    }
    carries
}

/// Least and greatest stored energy of a set.
fn span(set: &Polygon) -> (f64, f64) {
    set.iter()
        .fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), point| (low.min(point.0), high.max(point.0)))
}

/// The set with every output as much as `reach` higher or lower.
fn widened(set: &Polygon, reach: f64) -> Polygon {
    let count = set.len();
    let by = |better: fn(f64, f64) -> bool| {
        (0..count).fold(0, |best, i| if better(set[i].0, set[best].0) { i } else { best })
    };
    let (left, right) = (by(|a, b| a < b), by(|a, b| a > b));
    // Counter-clockwise: the lower side runs from the leftmost point to the rightmost, the upper one back.
    let mut wide = Vec::with_capacity(count + 4);
    let walk = |from: usize, to: usize, shift: f64, wide: &mut Polygon| {
        let mut i = from;
        loop {
            wide.push((set[i].0, set[i].1 + shift));
            if i == to {
                break;
            }
            i = (i + 1) % count;
        }
    };
    let lowest_left = lowest_of(set, left);
    let lowest_right = lowest_of(set, right);
    let highest_right = highest_of(set, right);
    let highest_left = highest_of(set, left);
    walk(lowest_left, lowest_right, 0.0 - reach, &mut wide);
    walk(highest_right, highest_left, reach, &mut wide);
    wide
}

/// Of the corners with this one's stored energy, the one of least output.
fn lowest_of(set: &Polygon, at: usize) -> usize {
    (0..set.len()).fold(at, |best, i| if set[i].0 == set[at].0 && set[i].1 < set[best].1 { i } else { best })
}

/// Of the corners with this one's stored energy, the one of greatest output.
fn highest_of(set: &Polygon, at: usize) -> usize {
    (0..set.len()).fold(at, |best, i| if set[i].0 == set[at].0 && set[i].1 > set[best].1 { i } else { best })
}

/// The part of a set where a linear function is not negative.
fn clipped(set: &Polygon, inside: impl Fn(&Point) -> f64) -> Polygon {
    let mut part = Vec::with_capacity(set.len() + 2);
    let mut add = |point: Point| {
        if part.last() != Some(&point) {
            part.push(point);
        }
    };
    for (i, point) in set.iter().enumerate() {
        let next = &set[(i + 1) % set.len()];
        let (here, there) = (inside(point), inside(next));
        if here >= 0.0 {
            add(*point);
        }
        if (here > 0.0 && there < 0.0) || (here < 0.0 && there > 0.0) {
            let share = here / (here - there);
            add((point.0 + share * (next.0 - point.0), point.1 + share * (next.1 - point.1)));
        }
    }
    if part.len() > 1 && part.first() == part.last() {
        part.pop();
    }
    part
}

/// Least and greatest output of a set on the line "stored energy = base + output"; the nearest corner where it misses the set.
fn on_line(set: &Polygon, base: f64) -> (f64, f64) {
    let off = |point: &Point| point.0 - point.1 - base;
    let (mut low, mut high) = (f64::INFINITY, f64::NEG_INFINITY);
    let mut nearest = (f64::INFINITY, 0.0);
    for (i, point) in set.iter().enumerate() {
        let next = &set[(i + 1) % set.len()];
        let (here, there) = (off(point), off(next));
        if here.abs() < nearest.0 {
            nearest = (here.abs(), point.1);
        }
        if here == 0.0 {
            (low, high) = (low.min(point.1), high.max(point.1));
        }
        if here * there < 0.0 {
            let share = here / (here - there);
            let output = point.1 + share * (next.1 - point.1);
            (low, high) = (low.min(output), high.max(output));
        }
    }
    if low > high { (nearest.1, nearest.1) } else { (low, high) }
}
