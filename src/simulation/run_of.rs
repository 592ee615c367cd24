//! Runs of a kind of the catalogue at a size, that count nothing but what is missing.

use super::unit::Unit;
use super::{Asked, asked, within};
use crate::case::Start;
use crate::duty::{Duty, Kind};
use crate::numeric::Sum;
use crate::requirement::Losses;
use crate::technology::{Lumped, Standing};

/// Intervals between the places at which a pass is remembered.
const STRIDE: usize = 512;

/// Passes after which a level that still moves is taken as settled.
const MOST_PASSES: usize = 12;

/// Change of the level over a pass that is settled, share of full.
const SETTLED: f64 = 1e-9;

/// What is asked in every interval with a standing load.
#[derive(Debug)]
pub(super) struct Ask {
    asked: Vec<Asked>,
    asked_kwh: f64,
    step_h: f64,
    standing_kw: f64,
}

impl Ask {
    pub(super) fn new(duty: &Duty, standing_kw: f64) -> Self {
        let step_h = duty.record.step_h();
        let losses = Losses { charge: 1.0, discharge: 1.0, self_discharge_per_h: 0.0, standing_kw };
        let counts_charge = matches!(duty.kind, Kind::Limits(_));
        let mut sum = Sum::default();
        let asked = (0..duty.intervals())
            .map(|i| {
                let asked = asked(duty, &losses, i).unwrap_or_default();
                sum.add(asked.discharge + if counts_charge { asked.charge } else { 0.0 });
                asked
            })
            .collect();
        Self { asked, asked_kwh: sum.value() * step_h, step_h, standing_kw }
    }

    /// Energy that must be served: discharge, and for limits charge as well, kWh.
    pub(super) fn asked_kwh(&self) -> f64 {
        self.asked_kwh
    }
}

/// What a run leaves.
#[derive(Debug, Clone, Copy)]
pub(super) struct Outcome {
    /// Energy that was asked and not carried, kWh.
    pub(super) missed_kwh: f64,
}

/// A kind on a duty.
#[derive(Debug)]
pub(super) struct Rig<'a> {
    duty: &'a Duty,
    ask: &'a Ask,
    lumped: Lumped,
    unit: Unit,
    standing: Standing,
    power_kw: f64,
    start: Start,
    /// Level at which the last run settled, share of full.
    settled: f64,
}

impl<'a> Rig<'a> {
    pub(super) fn new(
        duty: &'a Duty,
        ask: &'a Ask,
        lumped: Lumped,
        standing: Standing,
        power_kw: f64,
        start: Start,
    ) -> Self {
        let unit = Unit::new(lumped, ask.step_h);
        Self { duty, ask, lumped, unit, standing, power_kw, start, settled: 1.0 }
    }

    pub(super) fn asked_kwh(&self) -> f64 {
        self.ask.asked_kwh
    }

    /// Runs a size (rated kWh). A cyclic run is repeated until it ends where it began; as soon as a pass falls in with the one before, the
    /// rest is that one's.
    pub(super) fn run(&mut self, size_kwh: f64) -> Outcome {
        let own_kw = self.standing.fixed_kw + self.standing.per_kwh_kw * size_kwh;
        let heavier;
        let ask = if own_kw > 0.0 {
            heavier = Ask::new(self.duty, self.ask.standing_kw + own_kw);
            &heavier
        } else {
            self.ask
        };
        let full = self.unit.full();
        if self.start != Start::Cyclic {
            return Outcome { missed_kwh: self.pass(ask, size_kwh, own_kw, full, &mut Vec::new()).0 };
        }
        let mut level = self.settled * full;
        let mut marks = Vec::with_capacity(ask.asked.len() / STRIDE + 1);
        let mut missed = 0.0;
        for _ in 0..MOST_PASSES {
            let begun = level;
            (missed, level) = self.pass(ask, size_kwh, own_kw, begun, &mut marks);
            if (level - begun).abs() <= SETTLED * full {
                break;
            }
        }
        self.settled = level / full;
        Outcome { missed_kwh: missed }
    }

    /// One pass from a level: what is missing (kWh), and the level at the end. `marks` holds, for every stride, the level and what was
    /// missing up to it in the pass before, and after its last stride that pass's end.
    fn pass(
        &self,
        ask: &Ask,
        size_kwh: f64,
        own_kw: f64,
        start: f64,
        marks: &mut Vec<(f64, f64)>,
    ) -> (f64, f64) {
        let before = std::mem::take(marks);
        // The converter's rating; what stands beside it is served through it as well.
        let rating = self.power_kw + own_kw;
        let unit_kw = self.lumped.peak_kw;
        let charge_kw = if self.lumped.fixed { rating } else { rating.min(unit_kw * size_kwh) };
        let discharge_kw = rating.min(unit_kw * size_kwh);
        let counts_charge = matches!(self.duty.kind, Kind::Limits(_));
        let mut level = start;
        let mut missed = Sum::default();
        for (i, asked) in ask.asked.iter().enumerate() {
            if i % STRIDE == 0 {
                if let Some((then, missed_then)) = before.get(i / STRIDE)
                    && *then == level
                    && let Some((end, whole)) = before.last()
                {
                    let rest = whole - missed_then;
                    marks.extend(before.iter().skip(i / STRIDE).take(before.len() - i / STRIDE - 1));
                    let all = missed.value() * ask.step_h + rest;
                    // What was missing before here may differ, so the marks are moved with it.
                    let moved = missed.value() * ask.step_h - missed_then;
                    for mark in marks.iter_mut().skip(i / STRIDE) {
                        mark.1 += moved;
                    }
                    marks.push((*end, all));
                    return (all, *end);
                }
                marks.push((level, missed.value() * ask.step_h));
            }
            let (charge, discharge) = within(*asked, Some(charge_kw), Some(discharge_kw));
            let moved = self.unit.step(level, (charge - discharge) / size_kwh);
            level = moved.after;
            let carried = moved.carried_kw * size_kwh;
            missed.add((asked.discharge - (-carried).max(0.0)).max(0.0));
            if counts_charge {
                missed.add((asked.charge - carried.max(0.0)).max(0.0));
            }
        }
        let all = missed.value() * ask.step_h;
        marks.push((level, all));
        (all, level)
    }
}
