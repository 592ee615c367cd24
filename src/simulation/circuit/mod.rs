//! Stores as lumped circuits: battery, capacitor, reservoir, flywheel, coil, and a store that moves against a force.
//!
//! At every moment a circuit carries the least of what is asked, its ratings, and what its terminals allow at that moment; it tapers along such
//! a limit. At the end of its energy it rests until the interval ends, its own losses going on. What is not carried is unserved or
//! curtailed.
//!
//! Potential storage: a potential over a charge (battery, capacitor, reservoir, force over travel) with a loss in the flow and a leak; kinetic
//! storage: a momentum (flywheel) or flux (coil) with a drag. Constant-power theory of such circuits: Christen and Carlen 2000, J. Power
//! Sources 91(2):210-216. Checked against independent integrations and a circuit simulator's runs.

mod advance;
mod electric;
mod element;
mod mechanic;
mod ode;
mod table;

use self::advance::{Carried, Machine};
use self::element::{Cause, Element, State};
use super::tally::{Tally, rainflow_cycles, shares};
use super::{Step, asked, within};
use crate::case::{Converter, FixedStore, Store};
use crate::duty::Duty;
use crate::numeric::Sum;
use crate::requirement::Losses;
use crate::result::{CircuitLosses, LossesByCause, SimulationResult};
use crate::technology::Lumped;

/// Joules in a kilowatt-hour.
const J_PER_KWH: f64 = 3.6e6;

/// The element of a store; none for a store of fixed efficiencies.
fn element(store: &Store) -> Option<Box<dyn Element>> {
    Some(match store {
        Store::Fixed(_) => return None,
        Store::Battery(store) => Box::new(electric::Battery::new(store)),
        Store::Capacitor(store) => Box::new(electric::Capacitor::new(store)),
        Store::Coil(store) => Box::new(electric::Coil::new(store)),
        Store::Reservoir(store) => Box::new(mechanic::Reservoir::new(store)),
        Store::Flywheel(store) => Box::new(mechanic::Flywheel::new(store)),
        Store::Curve(store) => Box::new(mechanic::Curve::new(store)),
    })
}

/// Runs a store on the duty, whatever its kind; `see` is called for every interval in order.
pub fn run(duty: &Duty, store: &Store, mut see: impl FnMut(&Step)) -> SimulationResult {
    let terminals = store.terminals();
    let Some(element) = element(store) else {
        let Store::Fixed(fixed) = store else { return super::run(duty, &FixedStore::default(), see) };
        return super::run(duty, fixed, see);
    };
    let element = element.as_ref();
    let machine = Machine { element, converter: terminals.converter.unwrap_or_default() };
    let standing_kw = element.standing_w() / 1000.0;
    let losses = Losses { charge: 1.0, discharge: 1.0, self_discharge_per_h: 0.0, standing_kw };
    let step_h = duty.record.step_h();
    let seconds = step_h * 3600.0;
    let kwh = |at: State| (at.energy_j + element.pair_j(at)) / J_PER_KWH;
    let start = element.start();
    let mut state = start;
    let mut levels = Vec::with_capacity(duty.intervals() + 1);
    levels.push(kwh(state));
    let mut tally = Tally::default();
    let mut account = Account::default();
    let mut measured = 0_usize;
    for i in 0..duty.intervals() {
        let before = kwh(state);
        let asked = asked(duty, &losses, i);
        measured += usize::from(asked.is_some());
        let asked_now = asked.unwrap_or_default();
        let (charge, discharge) = within(asked_now, terminals.charge_kw, terminals.discharge_kw);
        let (after, carried) = machine.advance(state, (discharge - charge) * 1000.0, seconds);
        state = after;
        account.add(&carried, element.idle());
        let given_kw = if carried.fully { discharge - charge } else { carried.given_j / seconds / 1000.0 };
        let level = (before, kwh(state));
        levels.push(level.1);
        let short_of_energy = asked_now.discharge.min(discharge) * carried.rested_s / seconds;
        tally.add(&asked_now, (-given_kw).max(0.0), given_kw.max(0.0), short_of_energy, level);
        see(&Step {
            asked_kw: asked_now.charge - asked_now.discharge,
            carried_kw: -given_kw,
            level_kwh: level.0,
            after_kwh: level.1,
            gap: asked.is_none(),
        });
    }
    let capacity = element.capacity_j().map(|joule| joule / J_PER_KWH);
    let taken = account.taken.value() / J_PER_KWH;
    let unserved = tally.unserved_kwh(step_h);
    let curtailed = tally.curtailed_kwh(step_h);
    let (self_consumption, self_sufficiency) = shares(duty, unserved, curtailed);
    let lost = account.losses(element, standing_kw * measured as f64 * step_h);
    let stored = (kwh(start), kwh(state));
    SimulationResult {
        store: terminals.name.to_owned(),
        charge_kw: terminals.charge_kw,
        discharge_kw: terminals.discharge_kw,
        energy_kwh: capacity,
        served_kwh: tally.served_kwh(step_h),
        unserved_kwh: unserved,
        unserved_by_cause: tally.unserved_by_cause(step_h),
        curtailed_kwh: curtailed,
        self_consumption,
        self_sufficiency,
        tracking_error: tally.tracking_error(),
        account_residual_kwh: -account.given.value() / J_PER_KWH - lost.inside_kwh() - (stored.1 - stored.0),
        losses_kwh: LossesByCause::Circuit(lost),
        equivalent_full_cycles: capacity.filter(|kwh| *kwh > 0.0).map(|kwh| taken / kwh),
        rainflow_cycles: capacity.and_then(|kwh| rainflow_cycles(&levels, kwh)),
        mean_hold_s: tally.mean_hold_s(step_h, taken),
        stored_start_kwh: stored.0,
        stored_end_kwh: stored.1,
        state_end: Some(element.value(state)),
        least_import_limit_kw: None,
    }
}

/// A circuit of the catalogue, integrated with error control; kWh and hours stand for joules and seconds.
#[derive(Debug)]
pub(super) struct Slow(electric::Capacitor);

impl Slow {
    pub(super) fn new(lumped: &Lumped) -> Self {
        Self(electric::Capacitor::of(lumped))
    }

    /// From y, under a power of the element (kW, discharge positive), over hours: y after it, and the energy given, kWh.
    pub(super) fn advance(&self, y: f64, inner_kw: f64, hours: f64) -> (f64, f64) {
        let machine = Machine { element: &self.0, converter: Converter::default() };
        let half = self.0.energy_j(1.0);
        let (after, carried) = machine.advance(State { energy_j: half * y, pair_v: 0.0 }, inner_kw, hours);
        (after.energy_j / half, carried.given_j)
    }
}

/// Running sums of a run, J.
#[derive(Debug, Default)]
struct Account {
    given: Sum,
    converter: Sum,
    lost: [Sum; 3],
    /// Taken from the store for delivery: what the element gave and what its conversion lost.
    taken: Sum,
}

impl Account {
    fn add(&mut self, carried: &Carried, idle: [bool; 3]) {
        self.given.add(carried.given_j);
        self.converter.add(carried.inner_j - carried.given_j);
        for (sum, lost) in self.lost.iter_mut().zip(carried.lost_j) {
            sum.add(lost);
        }
        if carried.given_j > 0.0 {
            self.taken.add(carried.inner_j);
            for (lost, idle) in carried.lost_j.iter().zip(idle) {
                self.taken.add(if idle { 0.0 } else { *lost });
            }
        }
    }

    fn losses(&self, element: &dyn Element, cryogenic: f64) -> CircuitLosses {
        let mut lost = CircuitLosses {
            converter: self.converter.value() / J_PER_KWH,
            cryogenic,
            ..CircuitLosses::default()
        };
        for (cause, sum) in element.causes().into_iter().zip(self.lost) {
            let kwh = sum.value() / J_PER_KWH;
            match cause {
                Cause::Series => lost.series = kwh,
                Cause::Pair => lost.pair = kwh,
                Cause::Leak => lost.leak = kwh,
                Cause::Pipe => lost.pipe = kwh,
                Cause::Machine => lost.machine = kwh,
                Cause::Viscous => lost.viscous = kwh,
                Cause::Coulomb => lost.coulomb = kwh,
                Cause::None => {}
            }
        }
        lost
    }
}
