//! The least import limit that a given store can hold, with foresight.

use super::Window;
use crate::case::{FixedStore, Start};
use crate::duty::{Duty, Limits, Tube};
use crate::requirement::Losses;
use crate::requirement::capacity::{Inflow, least_of};

/// Halvings of the bracket: more than the digits of a double.
const HALVINGS: usize = 60;

/// Least import limit (kW) that the store can hold with the duty's other terms and its own ratings; none if it cannot hold even
/// the greatest import (an export limit, or self-discharge that may not be refilled).
///
/// Bisection, since holding a lower limit never becomes easier; good to about 1e-12 of the greatest import.
pub fn least_import_limit(duty: &Duty, limits: &Limits, store: &FixedStore) -> Option<f64> {
    let losses = Losses::of_store(store);
    let greatest = (0..duty.intervals())
        .filter_map(|i| duty.net_kw(i))
        .fold(0.0_f64, |most, net| most.max(losses.standing_kw - net));
    let holds =
        |import_kw: f64| holds(duty, &Limits { import_kw: Some(import_kw), ..*limits }, store, &losses);
    if !holds(greatest) {
        return None;
    }
    if holds(0.0) {
        return Some(0.0);
    }
    let (mut fails, mut carries) = (0.0, greatest);
    for _ in 0..HALVINGS {
        let middle = f64::midpoint(fails, carries);
        if middle <= fails || middle >= carries {
            break;
        }
        if holds(middle) {
            carries = middle;
        } else {
            fails = middle;
        }
    }
    Some(carries)
}

/// Whether the store can follow the tube of these limits.
fn holds(duty: &Duty, limits: &Limits, store: &FixedStore, losses: &Losses) -> bool {
    let step_h = duty.record.step_h();
    let leak = losses.leak(step_h);
    let inflow = |i: usize| {
        let tube = duty.net_kw(i).map(|net| {
            Tube::limits(net - losses.standing_kw, limits).rated(store.charge_kw, store.discharge_kw)
        });
        Inflow::of(tube, losses, step_h)
    };
    let window = Window::of(store);
    // Levels are compared with a rounding of the capacity, so that an exact fit holds.
    let slack = 1e-12 * store.energy_kwh;
    let start = match store.start {
        Start::Full => window.greatest,
        Start::Half => window.bounded(store.energy_kwh / 2.0),
        Start::Empty => window.least,
        Start::Cyclic => {
            // Levels above the window's least: self-discharge of what lies below it is a constant drain.
            let drain = leak.lost * window.least / leak.gain;
            let above = |i: usize| {
                let Inflow { most, least } = inflow(i);
                Inflow { most: most - drain, least: least - drain }
            };
            return least_of(duty.intervals(), leak, true, above)
                .is_some_and(|capacity| capacity <= window.greatest - window.least + slack);
        }
    };
    // The levels that can be reached are an interval; it is empty where the store fails.
    let (mut low, mut high) = (start, start);
    for i in 0..duty.intervals() {
        let Inflow { most, least } = inflow(i);
        if most < least {
            return false;
        }
        // Self-discharge may carry a level below the window, delivery may not.
        let floor = |level: f64| window.least.min(leak.keep * level);
        let forced = leak.keep * high + leak.gain * most;
        if most < 0.0 && forced < window.least - slack {
            return false;
        }
        low = (leak.keep * low + leak.gain * least).max(floor(low));
        high = forced.max(floor(high)).min(window.greatest);
        if low > window.greatest + slack {
            return false;
        }
        low = low.min(window.greatest);
    }
    true
}
