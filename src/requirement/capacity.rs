//! Least capacities: sequent peak in its backward form, for any duty's tube.
//!
//! Level needed, backwards: `r_t = max(0, (r_{t+1} - gain w_max) / keep)`; level forced, forwards:
//! `s_{t+1} = max(0, keep s_t + gain w_min)`. The least capacity is the greatest of both: the path that stays at the greater of the
//! two levels is carried, and no path can stay below either. Without self-discharge these are the two maximal window sums; with it the
//! backward form needs no iteration. For the record repeated (cyclic) each pass starts from its fixed point: of the map
//! x -> max(least, factor x + shift) of a pass. Backwards the factor is 1 or more, and there is one only if the second pass does not
//! rise; forwards it is 1 or less, and with self-discharge there always is one.
//!
//! Sequent peak: Thomas and Burden 1963 (from memory); mass curve: Rippl 1883 (from memory); the two-pass rule as in
//! Water 11(7):1413, 2019, sec. 2.2.1. The backward form with losses is derived here and checked against linear programmes.

use crate::duty::{Duty, Kind, Tube};
use crate::losses::Losses;
use crate::numeric::Leak;

/// Sums that should balance exactly may miss by this share of the energy moved.
const BALANCE_TOLERANCE: f64 = 1e-9;

/// The least and greatest inflow (kWh) that a tube allows in a step; a gap allows none.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Inflow {
    /// Greatest inflow.
    pub most: f64,
    /// Least inflow (negative: outflow).
    pub least: f64,
}

impl Inflow {
    /// Whether nothing is allowed: no power, or none that is finite.
    pub fn is_empty(self) -> bool {
        self.most < self.least || self.most == f64::NEG_INFINITY || self.least == f64::INFINITY
    }

    /// Of a tube, with the losses.
    pub fn of(tube: Option<Tube>, losses: &Losses, step_h: f64) -> Self {
        tube.map_or(Self { most: 0.0, least: 0.0 }, |tube| Self {
            most: losses.inflow_kwh(tube.lo, step_h),
            least: losses.inflow_kwh(tube.hi, step_h),
        })
    }
}

/// Least capacity (kWh inside) for the duty's own tube, within a power both ways (kW; none = no limit); none if no capacity
/// carries it.
pub fn least(duty: &Duty, losses: &Losses, power_kw: Option<f64>) -> Option<f64> {
    if duty.infeasible.is_some() {
        return None;
    }
    let step_h = duty.record.step_h();
    if duty.kind == Kind::RideThrough {
        return duty.reserve(losses, power_kw).map(|reserve| reserve.greatest_kwh);
    }
    least_of(duty.intervals(), losses.leak(step_h), duty.is_cyclic(), |i| {
        let tube = duty.tube(i, losses.standing_kw).map(|tube| tube.rated(power_kw, power_kw));
        Inflow::of(tube, losses, step_h)
    })
}

/// The first interval in which the tube is empty; none if it nowhere is.
pub fn empty_at(duty: &Duty, losses: &Losses) -> Option<usize> {
    let step_h = duty.record.step_h();
    (0..duty.intervals()).find(|i| Inflow::of(duty.tube(*i, losses.standing_kw), losses, step_h).is_empty())
}

/// Least capacity (kWh inside) with which every deficit of net power is met, whatever the duty's kind: cyclic, or from full.
pub fn balance(duty: &Duty, losses: &Losses, cyclic: bool) -> Option<f64> {
    let step_h = duty.record.step_h();
    least_of(duty.intervals(), losses.leak(step_h), cyclic, |i| Inflow {
        most: net_inflow(duty, losses, step_h, i),
        // Surplus may be left, so nothing is ever forced in.
        least: f64::NEG_INFINITY,
    })
}

/// Least capacity (kWh inside) with which a store that starts empty takes every surplus and serves what it can.
pub fn no_curtailment(duty: &Duty, losses: &Losses) -> f64 {
    let step_h = duty.record.step_h();
    let leak = losses.leak(step_h);
    forced(duty.intervals(), leak, 0.0, |i| net_inflow(duty, losses, step_h, i)).1
}

/// Range (kWh inside) of the cumulative net energy after charge and discharge losses, from its start at zero.
pub fn range(duty: &Duty, losses: &Losses) -> f64 {
    let step_h = duty.record.step_h();
    let mut sum = crate::numeric::Sum::default();
    let (mut least, mut greatest) = (0.0_f64, 0.0_f64);
    for i in 0..duty.intervals() {
        sum.add(net_inflow(duty, losses, step_h, i));
        least = least.min(sum.value());
        greatest = greatest.max(sum.value());
    }
    greatest - least
}

/// Inflow (kWh) if the whole of net power, less the standing load, passes through the store; 0 in a gap.
pub fn net_inflow(duty: &Duty, losses: &Losses, step_h: f64, i: usize) -> f64 {
    duty.net_kw(i).map_or(0.0, |net| losses.inflow_kwh(losses.standing_kw - net, step_h))
}

/// The same of the power that the store is handed, where the duty's kind fixes it.
pub fn handed_inflow(duty: &Duty, losses: &Losses, step_h: f64, i: usize) -> f64 {
    duty.handed_kw(i).map_or(0.0, |power| losses.inflow_kwh(losses.standing_kw - power, step_h))
}

/// Least capacity for inflows given step by step (kWh), see the module's head.
pub fn least_of(steps: usize, leak: Leak, cyclic: bool, inflow: impl Fn(usize) -> Inflow) -> Option<f64> {
    let mut moved = crate::numeric::Sum::default();
    for i in 0..steps {
        let flow = inflow(i);
        if flow.is_empty() {
            return None;
        }
        let Inflow { most, least } = flow;
        moved.add(if most.is_finite() { most.abs() } else { 0.0 });
        moved.add(if least.is_finite() { least.abs() } else { 0.0 });
    }
    let slack = BALANCE_TOLERANCE * moved.value();
    let (needed, mut most_needed) = needed(steps, leak, 0.0, |i| inflow(i).most);
    let (left, mut most_forced) = forced(steps, leak, 0.0, |i| inflow(i).least);
    if cyclic {
        let again = self::needed(steps, leak, needed, |i| inflow(i).most);
        let settled = settled(steps, leak, left, |i| inflow(i).least);
        let forced_again = forced(steps, leak, settled, |i| inflow(i).least);
        if again.0 > needed + slack || forced_again.0 > settled + slack {
            return None;
        }
        most_needed = again.1;
        most_forced = forced_again.1;
    }
    Some(most_needed.max(most_forced))
}

/// Level needed at the start for a level `end` at the end, and the greatest level needed on the way.
pub fn needed(steps: usize, leak: Leak, end: f64, most: impl Fn(usize) -> f64) -> (f64, f64) {
    let (mut level, mut greatest) = (end, end);
    for i in (0..steps).rev() {
        level = ((level - leak.gain * most(i)) / leak.keep).max(0.0);
        greatest = greatest.max(level);
    }
    (level, greatest)
}

/// Least level that can be had at the end from `start`, and the greatest on the way.
fn forced(steps: usize, leak: Leak, start: f64, least: impl Fn(usize) -> f64) -> (f64, f64) {
    let (mut level, mut greatest) = (start, start);
    for i in 0..steps {
        level = (leak.keep * level + leak.gain * least(i)).max(0.0);
        greatest = greatest.max(level);
    }
    (level, greatest)
}

/// The level (kWh inside) at which a store of the least capacity may begin the duty.
pub fn start_level(duty: &Duty, losses: &Losses) -> f64 {
    let step_h = duty.record.step_h();
    let leak = losses.leak(step_h);
    let steps = duty.intervals();
    let inflow = |i: usize| Inflow::of(duty.tube(i, losses.standing_kw), losses, step_h);
    let (once, _) = needed(steps, leak, 0.0, |i| inflow(i).most);
    if !duty.is_cyclic() {
        return once;
    }
    let (left, _) = forced(steps, leak, 0.0, |i| inflow(i).least);
    once.max(settled(steps, leak, left, |i| inflow(i).least))
}

/// The level at which the forced passes settle when the record is repeated, if they do: `once` is what one pass from empty leaves,
/// and without limits a pass maps x to factor x + shift.
fn settled(steps: usize, leak: Leak, once: f64, least: impl Fn(usize) -> f64) -> f64 {
    let (mut factor, mut shift) = (1.0_f64, 0.0_f64);
    for i in 0..steps {
        factor *= leak.keep;
        shift = leak.keep * shift + leak.gain * least(i);
    }
    if factor < 1.0 { once.max(shift / (1.0 - factor)) } else { once }
}

/// The critical period: the fall of the cumulative energy curve that sets the capacity.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct CriticalPeriod {
    /// First interval of the fall.
    pub from: usize,
    /// First interval after it; beyond the number of intervals where the fall runs over the record's end.
    pub to: usize,
    /// Level needed at its start, kWh inside: the capacity.
    pub capacity_kwh: f64,
}

/// The critical period of the balance of net power; none if nothing is ever needed. On the repeated record if `cyclic` (and
/// feasible), otherwise on one pass.
pub fn critical(duty: &Duty, losses: &Losses, cyclic: bool) -> Option<CriticalPeriod> {
    let steps = duty.intervals();
    let step_h = duty.record.step_h();
    let leak = losses.leak(step_h);
    let passes = if cyclic { 2 } else { 1 };
    let mut level = 0.0_f64;
    let mut end = passes * steps;
    let mut best: Option<CriticalPeriod> = None;
    for t in (0..passes * steps).rev() {
        level = ((level - leak.gain * net_inflow(duty, losses, step_h, t % steps)) / leak.keep).max(0.0);
        if level == 0.0 {
            end = t;
        } else if t < steps && best.is_none_or(|best| level > best.capacity_kwh) {
            best = Some(CriticalPeriod { from: t, to: end, capacity_kwh: level });
        }
    }
    best
}
