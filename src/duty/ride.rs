//! Riding through outages: the reserve that every start of an outage needs.
//!
//! The need of a window is the backward pass of the sequent peak method over its intervals, from an empty end. All windows of one
//! length take one pass each way (blocks of that length; van Herk 1992 and Gil and Werman 1993 for running maxima, from memory): a
//! window is the end of one block and the beginning of the next. The pass over the block's end is a map
//! x -> max(least, factor x + shift), and the next block's beginning gives the x.

use super::series::Known;
use crate::losses::Losses;
use crate::numeric::{Leak, sort_rising_long};

/// What an outage asks, by interval.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Outage {
    /// Critical demand less the supply that works, kW, positive = discharge.
    pub(super) need_kw: Known,
    /// Intervals of an outage.
    pub(super) steps: usize,
    /// Whether an outage may run over the record's end.
    pub(super) wraps: bool,
}

/// The reserves of all starts.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Reserve {
    /// Greatest reserve, kWh inside.
    pub(crate) greatest_kwh: f64,
    /// The start (interval) that needs it; the first of several.
    pub(crate) worst_start: usize,
    /// 95 % of all starts need no more (type 7 quantile of Hyndman and Fan 1996), kWh inside.
    pub(crate) p95_kwh: f64,
}

impl Outage {
    /// The reserves with which outages of every start are carried; none if the record is shorter than an outage. Charging during an
    /// outage, from supply that works, is limited by `charge_kw` (none = no limit).
    pub(super) fn reserve(&self, losses: &Losses, charge_kw: Option<f64>, step_h: f64) -> Option<Reserve> {
        let steps = self.need_kw.len();
        if self.steps == 0 || self.steps > steps {
            return None;
        }
        let leak = losses.leak(step_h);
        let inflow = |i: usize| {
            self.need_kw.get(i % steps).map_or(0.0, |need| {
                let power = need + losses.standing_kw;
                losses.inflow_kwh(charge_kw.map_or(power, |limit| power.max(0.0 - limit)), step_h)
            })
        };
        let starts = if self.wraps { steps } else { steps - self.steps + 1 };
        let mut reserves = vec![0.0; starts];
        let mut start = 0;
        while start < starts {
            self.block(start, leak, &inflow, &mut reserves);
            start += self.steps;
        }
        let (mut worst_start, mut greatest_kwh) = (0, reserves[0]);
        for (i, reserve) in reserves.iter().enumerate() {
            if *reserve > greatest_kwh {
                (worst_start, greatest_kwh) = (i, *reserve);
            }
        }
        Some(Reserve { greatest_kwh, worst_start, p95_kwh: quantile(&mut reserves, 0.95) })
    }

    /// The reserves of the starts in one block from `start`.
    fn block(&self, start: usize, leak: Leak, inflow: &impl Fn(usize) -> f64, reserves: &mut [f64]) {
        let border = start + self.steps;
        // The level needed at the border for the first k intervals after it: the greatest of the sums so far, each brought back to
        // the border through the self-discharge.
        let mut after = Vec::with_capacity(self.steps);
        let (mut sum, mut most, mut grown) = (0.0_f64, 0.0_f64, 1.0);
        after.push(0.0);
        for k in 0..self.steps - 1 {
            grown /= leak.keep;
            sum -= leak.gain * inflow(border + k) * grown;
            most = most.max(sum);
            after.push(most);
        }
        let (mut least, mut factor, mut shift) = (0.0_f64, 1.0, 0.0);
        for t in (start..border).rev() {
            let back = |level: f64| (level - leak.gain * inflow(t)) / leak.keep;
            least = back(least).max(0.0);
            shift = back(shift);
            factor /= leak.keep;
            if let Some(reserve) = reserves.get_mut(t) {
                *reserve = least.max(factor * after[t - start] + shift);
            }
        }
    }
}

/// The type 7 quantile (linear between neighbours).
fn quantile(values: &mut [f64], share: f64) -> f64 {
    sort_rising_long(values);
    let at = share * (values.len() - 1) as f64;
    let below = at as usize;
    let above = (below + 1).min(values.len() - 1);
    values[below] + (at - below as f64) * (values[above] - values[below])
}
