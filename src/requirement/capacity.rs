//! Least capacities: sequent peak in its backward form, for any duty's tube.
//!
//! Level needed, backwards: `r_t = max(0, (r_{t+1} - gain w_max) / keep)`; level forced, forwards:
//! `s_{t+1} = max(0, keep s_t + gain w_min)`. The least capacity is the greatest of both. Without self-discharge these are the
//! two maximal window sums; with it the backward form needs no iteration. The record repeated (cyclic) takes each pass twice;
//! if the second pass still rises, no capacity does.
//!
//! Sequent peak: Thomas and Burden 1963 (from memory); mass curve: Rippl 1883 (from memory); the two-pass rule as in
//! Water 11(7):1413, 2019, sec. 2.2.1. The backward form with losses is derived here and checked against linear programmes.

use crate::case::{FixedStore, RequirementCase};
use crate::duty::{Duty, Tube};
use crate::numeric::Leak;

/// Sums that should balance exactly may miss by this share of the energy moved.
const BALANCE_TOLERANCE: f64 = 1e-9;

/// Losses of a store of fixed efficiencies.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Losses {
    /// Charge efficiency, connection point to store.
    pub charge: f64,
    /// Discharge efficiency, store to connection point.
    pub discharge: f64,
    /// Self-discharge of the stored energy, per hour.
    pub self_discharge_per_h: f64,
    /// Standing load, kW.
    pub standing_kw: f64,
}

impl Losses {
    /// The losses that a case states.
    pub fn of(case: &RequirementCase) -> Self {
        Self {
            charge: case.charge_efficiency,
            discharge: case.discharge_efficiency,
            self_discharge_per_h: case.self_discharge_per_h,
            standing_kw: case.standing_kw,
        }
    }

    /// The losses of a store.
    pub fn of_store(store: &FixedStore) -> Self {
        Self {
            charge: store.charge_efficiency,
            discharge: store.discharge_efficiency,
            self_discharge_per_h: store.self_discharge_per_h,
            standing_kw: store.standing_kw,
        }
    }

    /// Energy that goes into the store (kWh) when it discharges `discharge_kw` (negative: charges) for `step_h` hours.
    pub fn inflow_kwh(&self, discharge_kw: f64, step_h: f64) -> f64 {
        if discharge_kw >= 0.0 {
            0.0 - discharge_kw * step_h / self.discharge
        } else {
            -discharge_kw * self.charge * step_h
        }
    }

    /// The step of self-discharge.
    pub fn leak(&self, step_h: f64) -> Leak {
        Leak::new(self.self_discharge_per_h, step_h)
    }
}

/// The least and greatest inflow (kWh) that a tube allows in a step; a gap allows none.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Inflow {
    /// Greatest inflow.
    pub most: f64,
    /// Least inflow (negative: outflow).
    pub least: f64,
}

impl Inflow {
    /// Of a tube, with the losses.
    pub fn of(tube: Option<Tube>, losses: &Losses, step_h: f64) -> Self {
        tube.map_or(Self { most: 0.0, least: 0.0 }, |tube| Self {
            most: losses.inflow_kwh(tube.lo, step_h),
            least: losses.inflow_kwh(tube.hi, step_h),
        })
    }
}

/// Least capacity (kWh inside) for the duty's own tube; none if no capacity carries it.
pub fn least(duty: &Duty, losses: &Losses, cyclic: bool) -> Option<f64> {
    let step_h = duty.record.step_h();
    least_of(duty.intervals(), losses.leak(step_h), cyclic, |i| {
        Inflow::of(duty.tube(i, losses.standing_kw), losses, step_h)
    })
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

/// Least capacity for inflows given step by step (kWh), see the module's head.
pub fn least_of(steps: usize, leak: Leak, cyclic: bool, inflow: impl Fn(usize) -> Inflow) -> Option<f64> {
    let mut moved = crate::numeric::Sum::default();
    for i in 0..steps {
        let Inflow { most, least } = inflow(i);
        if most < least {
            return None;
        }
        moved.add(if most.is_finite() { most.abs() } else { 0.0 });
        moved.add(if least.is_finite() { least.abs() } else { 0.0 });
    }
    let slack = BALANCE_TOLERANCE * moved.value();
    let (needed, mut most_needed) = needed(steps, leak, 0.0, |i| inflow(i).most);
    let (left, mut most_forced) = forced(steps, leak, 0.0, |i| inflow(i).least);
    if cyclic {
        let again = self::needed(steps, leak, needed, |i| inflow(i).most);
        let forced_again = forced(steps, leak, left, |i| inflow(i).least);
        if again.0 > needed + slack || forced_again.0 > left + slack {
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
