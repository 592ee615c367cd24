//! Months' import peaks without and with a store, as they are billed.

use crate::case::{Billing, DutyCase};
use crate::duty::Duty;
use crate::numeric::Sum;
use crate::result;
use crate::units::civil::Date;

/// Peaks of the months so far.
#[derive(Debug)]
pub(super) struct Months {
    terms: Billing,
    /// First day of each month with its peaks before and after, kW.
    peaks: Vec<(Date, f64, f64)>,
    /// Month of each interval, as an index; found once, since the calendar is slow.
    of_interval: Vec<u32>,
}

impl Months {
    /// For a duty of limits whose months are billed; none otherwise.
    pub(super) fn of(duty: &Duty) -> Option<Self> {
        let DutyCase::Limits { billing: Some(terms), .. } = duty.terms() else { return None };
        let mut peaks: Vec<(Date, f64, f64)> = Vec::new();
        let of_interval = (0..duty.intervals())
            .map(|i| {
                let month = duty.reading(i).map_or(Date { days: 0 }, |at| at.date.month_start());
                if peaks.last().is_none_or(|last| last.0 != month) {
                    peaks.push((month, 0.0, 0.0));
                }
                peaks.len() as u32 - 1
            })
            .collect();
        Some(Self { terms: *terms, peaks, of_interval })
    }

    /// Net power of an interval without and with the store, kW.
    pub(super) fn add(&mut self, i: usize, before_kw: f64, after_kw: f64) {
        let Some(peak) = self.of_interval.get(i).and_then(|month| self.peaks.get_mut(*month as usize)) else {
            return;
        };
        peak.1 = peak.1.max(0.0 - before_kw);
        peak.2 = peak.2.max(0.0 - after_kw);
    }

    /// What is billed.
    pub(super) fn billed(self) -> result::Billing {
        let billed = |k: usize, pick: fn(&(Date, f64, f64)) -> f64| {
            let earlier = k.saturating_sub(self.terms.ratchet_months as usize);
            let highest = self.peaks[earlier..k].iter().map(pick).fold(0.0, f64::max);
            self.terms.ratchet_share.map_or(0.0, |share| share * highest).max(pick(&self.peaks[k]))
        };
        let months: Vec<result::BilledMonth> = self
            .peaks
            .iter()
            .enumerate()
            .map(|(k, (month, before, after))| {
                let (year, number, _) = month.parts();
                result::BilledMonth {
                    month: format!("{year:04}-{number:02}"),
                    peak_before_kw: *before,
                    peak_after_kw: *after,
                    billed_before_kw: billed(k, |peak| peak.1),
                    billed_after_kw: billed(k, |peak| peak.2),
                }
            })
            .collect();
        let mut saved = Sum::default();
        for month in &months {
            saved.add(month.billed_before_kw - month.billed_after_kw);
        }
        let value = self.terms.rate_per_kw * saved.value();
        result::Billing { months, value }
    }
}
