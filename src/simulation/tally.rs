//! What runs of every kind of store count alike.

use super::Asked;
use crate::duty::Duty;
use crate::numeric::Sum;
use crate::requirement::cycles::rainflow;
use crate::result::Unserved;

/// Running sums of what was asked and carried; powers in kW, to be multiplied by the step.
#[derive(Debug, Default)]
pub(super) struct Tally {
    served: Sum,
    unserved: Sum,
    short_of_energy: Sum,
    curtailed: Sum,
    asked_squares: Sum,
    missed_squares: Sum,
    held: Sum,
}

impl Tally {
    /// Adds an interval: powers carried on average (kW at the terminals), the part of the unserved power that is missing because the
    /// energy was at its end, and the levels at both ends (kWh).
    pub(super) fn add(
        &mut self,
        asked: &Asked,
        charge: f64,
        discharge: f64,
        short_of_energy: f64,
        level: (f64, f64),
    ) {
        let served = discharge.min(asked.discharge);
        let (unserved, curtailed) = (asked.discharge - served, asked.charge - charge.min(asked.charge));
        self.served.add(served);
        self.unserved.add(unserved);
        self.short_of_energy.add(short_of_energy.clamp(0.0, unserved));
        self.curtailed.add(curtailed);
        let signal = asked.charge - asked.discharge;
        self.asked_squares.add(signal * signal);
        self.missed_squares.add((curtailed - unserved) * (curtailed - unserved));
        self.held.add(f64::midpoint(level.0, level.1));
    }

    /// Energy served, kWh.
    pub(super) fn served_kwh(&self, step_h: f64) -> f64 {
        self.served.value() * step_h
    }

    /// Energy unserved, kWh.
    pub(super) fn unserved_kwh(&self, step_h: f64) -> f64 {
        self.unserved.value() * step_h
    }

    /// Energy curtailed, kWh.
    pub(super) fn curtailed_kwh(&self, step_h: f64) -> f64 {
        self.curtailed.value() * step_h
    }

    /// The unserved energy by cause.
    pub(super) fn unserved_by_cause(&self, step_h: f64) -> Unserved {
        let energy = self.short_of_energy.value() * step_h;
        Unserved { power: (self.unserved_kwh(step_h) - energy).max(0.0), energy }
    }

    /// Root mean square of what was asked less what was carried of it, over that of what was asked; none if nothing was.
    ///
    /// The tracking of a reference signal as in PNNL-22010, Protocol for Uniformly Measuring and Expressing the Performance of Energy
    /// Storage Systems (2012; from memory).
    pub(super) fn tracking_error(&self) -> Option<f64> {
        let asked = self.asked_squares.value();
        (asked > 0.0).then(|| (self.missed_squares.value() / asked).sqrt())
    }

    /// Mean hold, s, for an energy taken from the store (kWh); none if nothing was taken.
    pub(super) fn mean_hold_s(&self, step_h: f64, taken_kwh: f64) -> Option<f64> {
        (taken_kwh > 0.0).then(|| self.held.value() * step_h * 3600.0 / taken_kwh)
    }
}

/// Share of a whole that was not lost; none without a whole.
pub(super) fn share_kept(lost: f64, whole: Option<f64>) -> Option<f64> {
    whole.filter(|whole| *whole > 0.0).map(|whole| 1.0 - lost / whole)
}

/// Self-consumption and self-sufficiency.
pub(super) fn shares(duty: &Duty, unserved_kwh: f64, curtailed_kwh: f64) -> (Option<f64>, Option<f64>) {
    (share_kept(curtailed_kwh, duty.totals.supply_kwh), share_kept(unserved_kwh, duty.totals.demand_kwh))
}

/// Sum of count times range over the capacity, of the levels at interval ends (kWh).
pub(super) fn rainflow_cycles(levels: &[f64], capacity: f64) -> Option<f64> {
    (capacity > 0.0).then(|| {
        let mut sum = Sum::default();
        for cycle in rainflow(levels.iter().copied(), 1e-12 * capacity) {
            sum.add(cycle.range * cycle.count);
        }
        sum.value() / capacity
    })
}
