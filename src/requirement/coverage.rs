//! Coverage with and without self-discharge behind one door.

use super::capacity::net_inflow;
use super::{Losses, Ranges};
use crate::duty::Duty;
use crate::numeric::{Leak, Sum};

/// Unserved energy against capacity for one power limit.
#[derive(Debug)]
pub(crate) enum Curve<'a> {
    /// Exact for all capacities at once.
    Exact(Ranges),
    /// With self-discharge: a run for each capacity.
    Leaking(Leaking<'a>),
}

/// What a run with self-discharge needs.
#[derive(Debug)]
pub(crate) struct Leaking<'a> {
    duty: &'a Duty,
    losses: Losses,
    power_kw: f64,
    /// The same without self-discharge, for the deficit and for bounds.
    lossless: Ranges,
}

/// Halvings of a bracket of capacities.
const HALVINGS: usize = 64;

impl<'a> Curve<'a> {
    /// For a duty's net power and a power limit (kW, both ways; none = no limit).
    pub(crate) fn of(duty: &'a Duty, losses: &Losses, power_kw: Option<f64>) -> Self {
        let ranges = Ranges::of(duty, losses, power_kw);
        if losses.self_discharge_per_h == 0.0 {
            return Self::Exact(ranges);
        }
        Self::Leaking(Leaking {
            duty,
            losses: *losses,
            power_kw: power_kw.unwrap_or(f64::INFINITY),
            lossless: ranges,
        })
    }

    /// The deficit, kWh.
    pub(crate) fn deficit_kwh(&self) -> f64 {
        self.ranges().deficit_kwh()
    }

    /// The ranges without self-discharge.
    pub(crate) fn ranges(&self) -> &Ranges {
        match self {
            Self::Exact(ranges) => ranges,
            Self::Leaking(leaking) => &leaking.lossless,
        }
    }

    /// Unserved energy with a capacity (kWh inside), kWh at the terminals.
    pub(crate) fn unserved_kwh(&self, capacity_kwh: f64) -> f64 {
        match self {
            Self::Exact(ranges) => ranges.unserved_kwh(capacity_kwh),
            Self::Leaking(leaking) => leaking.unserved_kwh(capacity_kwh),
        }
    }

    /// Least capacity (kWh inside) for an unserved share of the deficit; none = not reachable.
    pub(crate) fn capacity_kwh(&self, unserved_share: f64) -> Option<f64> {
        match self {
            Self::Exact(ranges) => ranges.capacity_kwh(unserved_share),
            Self::Leaking(leaking) => leaking.capacity_kwh(unserved_share),
        }
    }
}

impl Leaking<'_> {
    /// One pass finds the level at which the repeated record settles (the map of a pass is a clamp), a second one counts.
    fn unserved_kwh(&self, capacity: f64) -> f64 {
        let step_h = self.duty.record.step_h();
        let leak = self.losses.leak(step_h);
        let mut settled = Settling::new(capacity);
        for i in 0..self.duty.intervals() {
            settled.step(leak, self.inflow(i, step_h));
        }
        let mut level = settled.level();
        let mut unserved = Sum::default();
        for i in 0..self.duty.intervals() {
            let inflow = self.inflow(i, step_h);
            let after = leak.keep * level + leak.gain * inflow;
            if after < 0.0 {
                unserved.add(-after / leak.gain * self.losses.discharge);
            }
            level = after.clamp(0.0, capacity);
        }
        let above = (0..self.duty.intervals()).filter_map(|i| self.duty.net_kw(i)).fold(
            Sum::default(),
            |mut sum, net| {
                sum.add((self.losses.standing_kw - net - self.power_kw).max(0.0));
                sum
            },
        );
        above.value() * step_h + unserved.value()
    }

    fn inflow(&self, i: usize, step_h: f64) -> f64 {
        if self.power_kw == f64::INFINITY {
            return net_inflow(self.duty, &self.losses, step_h, i);
        }
        self.duty.net_kw(i).map_or(0.0, |net| {
            let power = (self.losses.standing_kw - net).clamp(-self.power_kw, self.power_kw);
            self.losses.inflow_kwh(power, step_h)
        })
    }

    fn capacity_kwh(&self, unserved_share: f64) -> Option<f64> {
        let allowed = unserved_share * self.lossless.deficit_kwh();
        let slack = 1e-12 * self.lossless.deficit_kwh();
        let holds = |capacity: f64| self.unserved_kwh(capacity) <= allowed + slack;
        if holds(0.0) {
            return Some(0.0);
        }
        // A level that no inflow can exceed: everything charged in the record, and the largest fall.
        let step_h = self.duty.record.step_h();
        let mut greatest = (0..self.duty.intervals())
            .map(|i| self.inflow(i, step_h).max(0.0))
            .fold(0.0, |sum: f64, flow| sum + flow);
        if !holds(greatest) {
            return None;
        }
        let mut least = 0.0;
        for _ in 0..HALVINGS {
            let middle = f64::midpoint(least, greatest);
            if middle <= least || middle >= greatest {
                break;
            }
            if holds(middle) {
                greatest = middle;
            } else {
                least = middle;
            }
        }
        Some(greatest)
    }
}

/// Finds the level at which a record, repeated from full, settles.
///
/// A pass maps the starting level by x -> min(U, max(L, A x + B)): such maps compose, so one pass that carries A, B and the images
/// of empty and full gives the fixed point without iteration.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Settling {
    capacity: f64,
    low: f64,
    high: f64,
    factor: f64,
    shift: f64,
}

impl Settling {
    /// For a capacity, kWh.
    pub(crate) fn new(capacity: f64) -> Self {
        Self { capacity, low: 0.0, high: capacity, factor: 1.0, shift: 0.0 }
    }

    /// One step with an inflow (kWh), before limits of the level.
    pub(crate) fn step(&mut self, leak: Leak, inflow: f64) {
        let step = |level: f64| leak.keep * level + leak.gain * inflow;
        self.factor *= leak.keep;
        self.shift = step(self.shift);
        self.low = step(self.low).clamp(0.0, self.capacity);
        self.high = step(self.high).clamp(0.0, self.capacity);
    }

    /// The level.
    pub(crate) fn level(self) -> f64 {
        if self.factor < 1.0 {
            (self.shift / (1.0 - self.factor)).max(self.low).min(self.high)
        } else if self.shift < 0.0 {
            self.low
        } else {
            self.high
        }
    }
}
