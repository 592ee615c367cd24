//! A store run on a duty, interval by interval, with an energy account that closes.
//!
//! [`run`] is the stage's door.

mod circuit;
mod limit;
mod run_of;
mod size;
mod tally;
mod unit;

pub use circuit::run as run_circuit;
pub use limit::least_import_limit;
pub use size::Sizes;

use crate::case::{FixedStore, Start};
use crate::duty::{Duty, Kind, Limits};
use crate::numeric::{Leak, Sum};
use crate::requirement::Losses;
use crate::requirement::coverage::Settling;
use crate::result::{self, LossesByCause, SimulationResult};
use tally::{Tally, rainflow_cycles, shares};

/// One interval of a run.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Step {
    /// Power asked at the terminals, kW, positive = charge: what the duty needs carried, without optional refilling.
    pub asked_kw: f64,
    /// Power carried at the terminals, kW, positive = charge, refilling included.
    pub carried_kw: f64,
    /// Stored energy at the interval's start, kWh inside.
    pub level_kwh: f64,
    /// Stored energy at its end, kWh inside.
    pub after_kwh: f64,
    /// Whether the interval is a gap: nothing asked, nothing carried, self-discharge going on.
    pub gap: bool,
}

/// What a duty asks of a store in an interval, at the terminals, kW.
#[derive(Debug, Clone, Copy, Default)]
struct Asked {
    /// Discharge that must be served or counts as unserved.
    discharge: f64,
    /// Charge that must be taken or counts as curtailed.
    charge: f64,
    /// Further charge allowed for refilling.
    refill: f64,
    /// Further discharge allowed to make room.
    empty: f64,
}

/// Runs a store of fixed efficiencies on the duty; `see` is called for every interval in order.
///
/// Greedy: every surplus that fits is taken, every deficit that can be served is served. For limits: imports above the limit are
/// served, exports above the limit are taken, and the store refills as early as it may (or, with an export limit alone, empties
/// into the load as early as it may). Powers are limited at the terminals, and further so that the level at the interval's end stays
/// within its bounds; the step is the exact solution with constant power (see [`Leak`]).
pub fn run(duty: &Duty, store: &FixedStore, mut see: impl FnMut(&Step)) -> SimulationResult {
    let losses = Losses::of_store(store);
    let step_h = duty.record.step_h();
    let leak = losses.leak(step_h);
    let window = Window::of(store);
    let start = match store.start {
        Start::Full => window.greatest,
        Start::Empty => window.least,
        Start::Half => window.bounded(store.energy_kwh / 2.0),
        Start::Cyclic => settled(duty, store, &losses, leak),
    };
    let mut level = start;
    let mut levels = Vec::with_capacity(duty.intervals() + 1);
    levels.push(level);
    let mut tally = Tally::default();
    let mut account = Account::default();
    for i in 0..duty.intervals() {
        let before = level;
        let asked = asked(duty, &losses, i);
        let asked_now = asked.unwrap_or_default();
        let wanted = within(asked_now, store.charge_kw, store.discharge_kw);
        let (charge, discharge) = window.carried(wanted, &losses, leak, step_h, before);
        let flow = losses.inflow_kwh(discharge - charge, step_h);
        level = window.after(leak.keep * before + leak.gain * flow, before);
        levels.push(level);
        account.measured += usize::from(asked.is_some());
        account.charged.add(charge);
        account.discharged.add(discharge);
        account.leaked.add(before * leak.lost + flow * leak.inflow_lost);
        // Power that the rating allows and the energy does not.
        let short_of_energy = wanted.1.min(asked_now.discharge) - discharge;
        tally.add(&asked_now, charge, discharge, short_of_energy, (before, level));
        see(&Step {
            asked_kw: asked_now.charge - asked_now.discharge,
            carried_kw: charge - discharge,
            level_kwh: before,
            after_kwh: level,
            gap: asked.is_none(),
        });
    }
    let capacity = store.energy_kwh;
    let (unserved, curtailed) = (tally.unserved_kwh(step_h), tally.curtailed_kwh(step_h));
    let (self_consumption, self_sufficiency) = shares(duty, unserved, curtailed);
    let (charged, discharged) = (account.charged.value() * step_h, account.discharged.value() * step_h);
    let taken = discharged / losses.discharge;
    let lost = result::Losses {
        charging: (1.0 - losses.charge) * charged,
        discharging: (1.0 / losses.discharge - 1.0) * discharged,
        self_discharge: account.leaked.value(),
        standing: losses.standing_kw * account.measured as f64 * step_h,
    };
    SimulationResult {
        store: store.name.clone(),
        charge_kw: store.charge_kw,
        discharge_kw: store.discharge_kw,
        energy_kwh: Some(capacity),
        served_kwh: tally.served_kwh(step_h),
        unserved_kwh: unserved,
        unserved_by_cause: tally.unserved_by_cause(step_h),
        curtailed_kwh: curtailed,
        self_consumption,
        self_sufficiency,
        tracking_error: tally.tracking_error(),
        account_residual_kwh: charged
            - discharged
            - lost.charging
            - lost.discharging
            - lost.self_discharge
            - (level - start),
        losses_kwh: LossesByCause::Fixed(lost),
        equivalent_full_cycles: (capacity > 0.0).then(|| taken / capacity),
        rainflow_cycles: rainflow_cycles(&levels, capacity),
        mean_hold_s: tally.mean_hold_s(step_h, taken),
        stored_start_kwh: start,
        stored_end_kwh: level,
        state_end: None,
        least_import_limit_kw: match duty.kind {
            Kind::Limits(limits) => least_import_limit(duty, &limits, store),
            _ => None,
        },
    }
}

/// Running sums of the energy account; powers in kW, to be multiplied by the step.
#[derive(Debug, Default)]
struct Account {
    charged: Sum,
    discharged: Sum,
    /// Self-discharge, kWh, from the exact integral of the level (so that the account's residual is a real check).
    leaked: Sum,
    measured: usize,
}

/// What the duty asks in interval `i` after the store's standing load; none in a gap.
fn asked(duty: &Duty, losses: &Losses, i: usize) -> Option<Asked> {
    let net = duty.net_kw(i)? - losses.standing_kw;
    Some(match duty.kind {
        Kind::Balance | Kind::Given => {
            Asked { discharge: (-net).max(0.0), charge: net.max(0.0), ..Asked::default() }
        }
        Kind::Limits(limits) => asked_by_limits(net, &limits),
    })
}

fn asked_by_limits(net_kw: f64, limits: &Limits) -> Asked {
    let load = -net_kw;
    let discharge = limits.import_kw.map_or(0.0, |limit| (load - limit).max(0.0));
    let charge = limits.export_kw.map_or(0.0, |limit| (-load - limit).max(0.0));
    let surplus_left = (-load).max(0.0) - charge;
    let (refill, empty) = match limits.import_kw {
        // Nothing to serve later: the store keeps room for exports by serving the load (or the grid, up to the limit).
        None if limits.discharge => (0.0, limits.export_kw.map_or(0.0, |limit| (load + limit).max(0.0))),
        None => (0.0, load.max(0.0)),
        Some(limit) if limits.recharge => ((limit - load).max(0.0) - charge, 0.0),
        Some(_) => (surplus_left.max(0.0), 0.0),
    };
    Asked { discharge, charge, refill: refill.max(0.0), empty }
}

/// The levels between which a store of fixed efficiencies works, kWh inside.
#[derive(Debug, Clone, Copy)]
struct Window {
    least: f64,
    greatest: f64,
}

impl Window {
    fn of(store: &FixedStore) -> Self {
        Self {
            least: store.least_level * store.energy_kwh,
            greatest: store.greatest_level * store.energy_kwh,
        }
    }

    /// Charge and discharge carried at the terminals of those within the ratings, kW: the level at the interval's end stays inside.
    fn carried(
        &self,
        (charge, discharge): (f64, f64),
        losses: &Losses,
        leak: Leak,
        step_h: f64,
        level: f64,
    ) -> (f64, f64) {
        if discharge > 0.0 {
            let there = (leak.keep * level - self.least) * losses.discharge / (leak.gain * step_h);
            return (0.0, discharge.min(there.max(0.0)));
        }
        let room = (self.greatest - leak.keep * level) / (leak.gain * losses.charge * step_h);
        (charge.min(room.max(0.0)), 0.0)
    }

    /// The level after a step, from a level before it: rounding must not carry it out of its bounds; self-discharge may, but not below
    /// zero.
    fn after(&self, level: f64, before: f64) -> f64 {
        let rounding = 1e-12 * self.greatest;
        let least = if level < self.least - rounding || before < self.least { 0.0 } else { self.least };
        level.clamp(least, self.greatest)
    }

    fn bounded(&self, level: f64) -> f64 {
        level.clamp(self.least, self.greatest)
    }
}

/// The level at which the record, repeated from full, settles.
fn settled(duty: &Duty, store: &FixedStore, losses: &Losses, leak: Leak) -> f64 {
    let step_h = duty.record.step_h();
    let window = Window::of(store);
    let wanted = |i: usize| {
        asked(duty, losses, i).map_or((0.0, 0.0), |asked| within(asked, store.charge_kw, store.discharge_kw))
    };
    if window.least > 0.0 && leak.lost > 0.0 {
        // Below the window only self-discharge goes on, so that a pass is no clamp of a line: the passes themselves, falling from full.
        let mut level = window.greatest;
        for _ in 0..MOST_PASSES {
            let start = level;
            for i in 0..duty.intervals() {
                let (charge, discharge) = window.carried(wanted(i), losses, leak, step_h, level);
                let flow = losses.inflow_kwh(discharge - charge, step_h);
                level = window.after(leak.keep * level + leak.gain * flow, level);
            }
            if (level - start).abs() <= 1e-13 * window.greatest {
                break;
            }
        }
        return level;
    }
    let mut settling = Settling::new(window.greatest - window.least);
    for i in 0..duty.intervals() {
        let (charge, discharge) = wanted(i);
        settling.step(leak, losses.inflow_kwh(discharge - charge, step_h));
    }
    window.least + settling.level()
}

/// Passes after which a level that still falls is taken as settled.
const MOST_PASSES: usize = 60;

/// Charge and discharge within the ratings (kW, none = no limit), whatever the level, kW.
fn within(asked: Asked, charge_kw: Option<f64>, discharge_kw: Option<f64>) -> (f64, f64) {
    let limit = |power: f64, rating: Option<f64>| rating.map_or(power, |rating| power.min(rating));
    let discharge = limit(asked.discharge + asked.empty, discharge_kw);
    if discharge > 0.0 { (0.0, discharge) } else { (limit(asked.charge + asked.refill, charge_kw), 0.0) }
}
