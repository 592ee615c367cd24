//! A store run on a duty, interval by interval, with an energy account that closes.
//!
//! [`run`] is the stage's door.

mod billing;
mod limit;

pub use limit::least_import_limit;

use crate::case::{FixedStore, Start};
use crate::duty::{Duty, Kind, Limits};
use crate::numeric::{Leak, Sum};
use crate::requirement::Losses;
use crate::requirement::coverage::Settling;
use crate::requirement::cycles::rainflow;
use crate::result::{self, SimulationResult};

/// One interval of a run.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Step {
    /// The interval of the record.
    pub interval: usize,
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
///
/// Duties that fix the store's power hand it over: charge asked may be left, discharge must be served. For outages the run is the worst
/// one, from full.
pub fn run(duty: &Duty, store: &FixedStore, see: impl FnMut(&Step)) -> SimulationResult {
    let run = run_from(duty, store, start_kwh(duty, store), see);
    let least_import_limit_kw = match duty.kind {
        Kind::Limits(limits) => least_import_limit(duty, &limits, store),
        _ => None,
    };
    SimulationResult { least_import_limit_kw, ..run }
}

/// The level at which a store begins a duty, kWh.
pub fn start_kwh(duty: &Duty, store: &FixedStore) -> f64 {
    match store.start {
        _ if duty.kind == Kind::RideThrough => store.energy_kwh,
        Start::Full => store.energy_kwh,
        Start::Empty => 0.0,
        Start::Half => store.energy_kwh / 2.0,
        Start::Cyclic => {
            let losses = Losses::of_store(store);
            settled(duty, store, &losses, losses.leak(duty.record.step_h()))
        }
    }
}

/// The same from a level of one's own (kWh), held within empty and full, and without looking for the least import limit.
pub fn run_from(
    duty: &Duty,
    store: &FixedStore,
    start_kwh: f64,
    mut see: impl FnMut(&Step),
) -> SimulationResult {
    let losses = Losses::of_store(store);
    let step_h = duty.record.step_h();
    let leak = losses.leak(step_h);
    let start = bounded(start_kwh, store.energy_kwh);
    let mut level = start;
    let (first, count) = duty.run_intervals();
    let mut levels = Vec::with_capacity(count + 1);
    levels.push(level);
    let mut sums = Account::default();
    let mut months = billing::Months::of(duty);
    for i in (first..first + count).map(|i| i % duty.intervals()) {
        let before = level;
        let asked = asked(duty, &losses, i);
        let (charge, discharge) =
            asked.map_or((0.0, 0.0), |asked| carried(asked, store, &losses, leak, step_h, before));
        let flow = losses.inflow_kwh(discharge - charge, step_h);
        level = bounded(leak.keep * before + leak.gain * flow, store.energy_kwh);
        levels.push(level);
        let asked_now = asked.unwrap_or_default();
        sums.add(&asked_now, charge, discharge, flow, before, level, leak, &losses, step_h, asked.is_some());
        if let (Some(months), Some(net)) = (&mut months, duty.net_kw(i)) {
            months.add(i, net, net - losses.standing_kw + discharge - charge);
        }
        see(&Step {
            interval: i,
            asked_kw: asked_now.charge - asked_now.discharge,
            carried_kw: charge - discharge,
            level_kwh: before,
            after_kwh: level,
            gap: asked.is_none(),
        });
    }
    let capacity = store.energy_kwh;
    let taken = sums.taken.value();
    let cycles: Sum =
        rainflow(levels.iter().copied(), 1e-12 * capacity).iter().fold(Sum::default(), |mut sum, cycle| {
            sum.add(cycle.range * cycle.count);
            sum
        });
    let share =
        |lost: f64, whole: Option<f64>| whole.filter(|whole| *whole > 0.0).map(|whole| 1.0 - lost / whole);
    // Shares of supply and demand say something only where net power is what is asked.
    let of_net = duty.kind.balances() || matches!(duty.kind, Kind::Limits(_));
    let (unserved, curtailed) = (sums.unserved.value() * step_h, sums.curtailed.value() * step_h);
    let (charged, discharged) = (sums.charged.value() * step_h, sums.discharged.value() * step_h);
    let lost = result::Losses {
        charging: (1.0 - losses.charge) * charged,
        discharging: (1.0 / losses.discharge - 1.0) * discharged,
        self_discharge: sums.leaked.value(),
        standing: losses.standing_kw * sums.measured as f64 * step_h,
    };
    SimulationResult {
        store: store.name.clone(),
        charge_kw: store.charge_kw,
        discharge_kw: store.discharge_kw,
        energy_kwh: capacity,
        served_kwh: sums.served.value() * step_h,
        unserved_kwh: unserved,
        curtailed_kwh: curtailed,
        self_consumption: share(curtailed, duty.totals.supply_kwh.filter(|_| of_net)),
        self_sufficiency: share(unserved, duty.totals.demand_kwh.filter(|_| of_net)),
        account_residual_kwh: charged
            - discharged
            - lost.charging
            - lost.discharging
            - lost.self_discharge
            - (level - start),
        losses_kwh: lost,
        equivalent_full_cycles: (capacity > 0.0).then(|| taken / capacity),
        rainflow_cycles: (capacity > 0.0).then(|| cycles.value() / capacity),
        mean_hold_s: (taken > 0.0).then(|| sums.held.value() * step_h * 3600.0 / taken),
        stored_start_kwh: start,
        stored_end_kwh: level,
        billing: months.map(billing::Months::billed),
        least_import_limit_kw: None,
    }
}

/// Running sums of a run; powers in kW, to be multiplied by the step.
#[derive(Debug, Default)]
struct Account {
    served: Sum,
    unserved: Sum,
    curtailed: Sum,
    charged: Sum,
    discharged: Sum,
    /// Energy taken from the store, kWh.
    taken: Sum,
    /// Self-discharge, kWh, from the exact integral of the level (so that the account's residual is a real check).
    leaked: Sum,
    /// Trapezoids of the level, kWh.
    held: Sum,
    measured: usize,
}

impl Account {
    #[allow(clippy::too_many_arguments, reason = "one call, in the loop that has all of these at hand")]
    fn add(
        &mut self,
        asked: &Asked,
        charge: f64,
        discharge: f64,
        flow: f64,
        before: f64,
        after: f64,
        leak: Leak,
        losses: &Losses,
        step_h: f64,
        measured: bool,
    ) {
        self.measured += usize::from(measured);
        let served = discharge.min(asked.discharge);
        self.served.add(served);
        self.unserved.add(asked.discharge - served);
        self.curtailed.add(asked.charge - charge.min(asked.charge));
        self.charged.add(charge);
        self.discharged.add(discharge);
        self.taken.add(discharge * step_h / losses.discharge);
        self.leaked.add(before * leak.lost + flow * leak.inflow_lost);
        self.held.add(f64::midpoint(before, after));
    }
}

/// What the duty asks in interval `i` after the store's standing load; none in a gap.
fn asked(duty: &Duty, losses: &Losses, i: usize) -> Option<Asked> {
    let net = duty.handed_kw(i)? - losses.standing_kw;
    Some(match duty.kind {
        Kind::Limits(limits) => asked_by_limits(net, &duty.limits_at(i, &limits)),
        _ => Asked { discharge: (-net).max(0.0), charge: net.max(0.0), ..Asked::default() },
    })
}

fn asked_by_limits(net_kw: f64, limits: &Limits) -> Asked {
    let load = -net_kw;
    // A limit that no power holds (below nothing) asks for the whole load.
    let import_kw = limits.import_kw.map(|limit| limit.max(0.0));
    let discharge = import_kw.map_or(0.0, |limit| (load - limit).max(0.0));
    let charge = limits.export_kw.map_or(0.0, |limit| (-load - limit).max(0.0));
    let surplus_left = (-load).max(0.0) - charge;
    let (refill, empty) = match import_kw {
        // Nothing to serve later: the store keeps room for exports by serving the load (or the grid, up to the limit).
        None if limits.discharge => (0.0, limits.export_kw.map_or(0.0, |limit| (load + limit).max(0.0))),
        None => (0.0, load.max(0.0)),
        Some(limit) if limits.recharge => ((limit - load).max(0.0) - charge, 0.0),
        Some(_) => (surplus_left.max(0.0), 0.0),
    };
    Asked { discharge, charge, refill: refill.max(0.0), empty }
}

/// Charge and discharge carried at the terminals, kW.
fn carried(
    asked: Asked,
    store: &FixedStore,
    losses: &Losses,
    leak: Leak,
    step_h: f64,
    level: f64,
) -> (f64, f64) {
    let (charge, discharge) = wanted(asked, store);
    if discharge > 0.0 {
        let there = leak.keep * level * losses.discharge / (leak.gain * step_h);
        return (0.0, discharge.min(there.max(0.0)));
    }
    let room = (store.energy_kwh - leak.keep * level) / (leak.gain * losses.charge * step_h);
    (charge.min(room.max(0.0)), 0.0)
}

/// Rounding must not carry the level out of its bounds.
fn bounded(level: f64, capacity: f64) -> f64 {
    level.clamp(0.0, capacity)
}

/// The level at which the record, repeated from full, settles.
fn settled(duty: &Duty, store: &FixedStore, losses: &Losses, leak: Leak) -> f64 {
    let step_h = duty.record.step_h();
    let mut settling = Settling::new(store.energy_kwh);
    for i in 0..duty.intervals() {
        let (charge, discharge) = asked(duty, losses, i).map_or((0.0, 0.0), |asked| wanted(asked, store));
        settling.step(leak, losses.inflow_kwh(discharge - charge, step_h));
    }
    settling.level()
}

/// Charge and discharge within the ratings, whatever the level, kW.
fn wanted(asked: Asked, store: &FixedStore) -> (f64, f64) {
    let limit = |power: f64, rating: Option<f64>| rating.map_or(power, |rating| power.min(rating));
    let discharge = limit(asked.discharge + asked.empty, store.discharge_kw);
    if discharge > 0.0 {
        (0.0, discharge)
    } else {
        (limit(asked.charge + asked.refill, store.charge_kw), 0.0)
    }
}
