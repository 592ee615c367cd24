//! Shifting by price: the schedule of greatest value, exactly.
//!
//! Backwards through the record the value of the stored energy is a function of its level. Where charging and discharging in one
//! interval never pays (every price at or above zero, or little enough below) that function stays concave and piecewise linear, and a
//! step inserts two pieces among its pieces sorted by slope and cuts the ends ([`concave`]). Otherwise ([`general`]) the function is
//! carried as it comes, piecewise linear of any shape, and a step takes the greater of charging and discharging: this is the optimum
//! without doing both in one interval, which a linear programme cannot express.
//!
//! Supremal convolution: Rockafellar, Convex Analysis, 1970 (from memory); shifting with an efficient store: Cruise, Flatley, Gibbens
//! and Zachary 2019. The form with sorted pieces is derived here and checked against linear and integer programmes.

mod concave;
mod general;
mod tree;

use super::series::Known;
use crate::case::Shifting;
use crate::losses::Losses;
use crate::numeric::{Leak, Sum};

/// A price may be below what makes the step concave by this share: rounding.
const ROUNDING: f64 = 1e-12;

/// The terms in store units.
#[derive(Debug, Clone, Copy)]
pub(super) struct Terms {
    leak: Leak,
    /// Self-discharge over a step (rate x step).
    decay: f64,
    /// Most that a step can bring into the store, after the step's own self-discharge, kWh.
    most_in: f64,
    /// Most that a step can take out of it, likewise, kWh.
    most_out: f64,
    energy: f64,
    charge_efficiency: f64,
    discharge_efficiency: f64,
    wear: f64,
    step_h: f64,
}

/// The price of a kWh brought into the store, and of one taken out, in a step.
#[derive(Debug, Clone, Copy)]
struct Slopes {
    buy: f64,
    sell: f64,
}

impl Terms {
    fn of(terms: &Shifting, losses: &Losses, step_h: f64) -> Self {
        let leak = losses.leak(step_h);
        Self {
            leak,
            decay: losses.self_discharge_per_h * step_h,
            most_in: leak.gain * losses.charge * terms.charge_kw * step_h,
            most_out: leak.gain * terms.discharge_kw * step_h / losses.discharge,
            energy: terms.energy_kwh,
            charge_efficiency: losses.charge,
            discharge_efficiency: losses.discharge,
            wear: terms.wear_per_kwh,
            step_h,
        }
    }

    fn slopes(&self, price: f64) -> Slopes {
        Slopes {
            buy: price / (self.charge_efficiency * self.leak.gain),
            sell: (price - self.wear) * self.discharge_efficiency / self.leak.gain,
        }
    }

    /// Whether doing one thing in a step is never worse than doing both.
    fn is_concave(&self, price: f64) -> bool {
        let Slopes { buy, sell } = self.slopes(price);
        buy >= sell - ROUNDING * (buy.abs() + sell.abs())
    }

    /// Power at the terminals (kW, positive = charge) of a change of level beyond self-discharge.
    fn power_kw(&self, change: f64) -> f64 {
        if change > 0.0 {
            change / (self.leak.gain * self.charge_efficiency * self.step_h)
        } else {
            change * self.discharge_efficiency / (self.leak.gain * self.step_h)
        }
    }
}

/// A schedule of greatest value.
#[derive(Debug, Clone)]
pub(super) struct Schedule {
    /// Power at the terminals, kW, positive = charge; NaN where no price is known.
    pub(super) power_kw: Vec<f64>,
    /// Its value: energy sold less energy bought less wear, in the price's currency.
    pub(super) value: f64,
}

/// The schedule for prices (of a kWh, by interval). Days (first intervals, rising, from 0) are planned each by itself; one day is the
/// whole record. None with the interval from which the level asked at the end cannot be reached.
pub(super) fn schedule(
    price: &Known,
    days: &[usize],
    terms: &Shifting,
    losses: &Losses,
    step_h: f64,
) -> Result<Schedule, usize> {
    let store = Terms::of(terms, losses, step_h);
    let mut level = terms.start_kwh;
    let mut power_kw = Vec::with_capacity(price.len());
    for (k, start) in days.iter().enumerate() {
        let end = days.get(k + 1).copied().unwrap_or(price.len());
        let aim = if k + 1 == days.len() { terms.end_kwh } else { None };
        let concave = (*start..end).filter_map(|i| price.get(i)).all(|price| store.is_concave(price));
        let span = Span { price, start: *start, end };
        let levels = if concave {
            concave::plan(&span, &store, level, aim)
        } else {
            general::plan(&span, &store, level, aim)
        };
        let Some(levels) = levels else { return Err(*start) };
        for (i, after) in (*start..end).zip(levels) {
            let change = after - store.leak.keep * level;
            power_kw.push(price.get(i).map_or(f64::NAN, |_| store.power_kw(change)));
            level = after;
        }
    }
    let mut value = Sum::default();
    for (i, price) in price.there() {
        let power = power_kw[i];
        value.add(0.0 - price * power * step_h);
        value.add(terms.wear_per_kwh * power.min(0.0) * step_h);
    }
    Ok(Schedule { power_kw, value: value.value() })
}

/// The prices of a stretch of the record.
#[derive(Debug, Clone, Copy)]
struct Span<'a> {
    price: &'a Known,
    start: usize,
    end: usize,
}

impl Span<'_> {
    fn len(&self) -> usize {
        self.end - self.start
    }

    fn price(&self, k: usize) -> Option<f64> {
        self.price.get(self.start + k)
    }
}
