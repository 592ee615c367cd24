//! Running meter readings to the energy of intervals.

use super::super::unit::Unit;
use super::super::{Clock, Finding, FindingKind};
use super::Settle;
use crate::fault::{Result, quote};
use crate::numeric::Sum;

/// A running reading: its series holds readings until they are turned into power.
#[derive(Debug)]
pub(in crate::record) struct Register {
    series: usize,
    header: String,
    unit: Unit,
    /// Whether a reading stands at the interval's end.
    pub(super) late: bool,
    scale: f64,
    /// The reading before, where the series holds power there by now.
    before: Option<f64>,
    /// The last reading, and where, before readings were missing.
    known: Option<(usize, f64)>,
    /// The largest difference so far.
    most: f64,
    turned: Happened,
    reset: Happened,
    stepped: Happened,
    /// Energy of intervals whose readings are missing, in the register's unit.
    bridged: Sum,
}

/// How often something happened, and in which interval first.
#[derive(Debug, Default)]
struct Happened {
    count: u64,
    first: usize,
}

impl Happened {
    fn add(&mut self, i: usize) {
        if self.count == 0 {
            self.first = i;
        }
        self.count += 1;
    }
}

impl Register {
    pub(in crate::record) fn new(series: usize, header: String, unit: Unit, late: bool, scale: f64) -> Self {
        Self {
            series,
            header,
            unit,
            late,
            scale,
            before: None,
            known: None,
            most: 0.0,
            turned: Happened::default(),
            reset: Happened::default(),
            stepped: Happened::default(),
            bridged: Sum::default(),
        }
    }

    /// What was consumed from one reading to the next; none if the register was reset.
    fn difference(&mut self, i: usize, from: f64, to: f64) -> Option<f64> {
        if to >= from {
            self.most = self.most.max(to - from);
            return Some(to - from);
        }
        // A register turns over at a power of ten: it stood close below it, and begins again close above zero.
        let turn = libm::pow(10.0, libm::ceil(libm::log10(from.max(1.0) + 1e-9)));
        if from >= 0.9 * turn && to <= 0.1 * turn && turn >= 100.0 {
            self.turned.add(i);
            return Some(turn - from + to);
        }
        self.reset.add(i);
        // Set back to zero it counts on from there; a reading of another meter says nothing.
        (0.0..=self.most).contains(&to).then_some(to)
    }

    /// Lists what happened to the register.
    pub(super) fn tell(&self, step_h: f64, clock: &Clock, findings: &mut Vec<Finding>) {
        let header = quote(&self.header);
        let at = |happened: &Happened| {
            let stamp = clock.stamp(happened.first);
            stamp.get(..16).unwrap_or(&stamp).replace('T', " ")
        };
        let mut say = |happened: &Happened, remedy: &str, changes: bool, text: String| {
            if happened.count > 0 {
                findings.push(Finding {
                    kind: FindingKind::Register,
                    count: happened.count,
                    first_row: None,
                    file: String::new(),
                    remedy: remedy.to_owned(),
                    text,
                    changes_figures: changes,
                });
            }
        };
        say(
            &self.turned,
            "carried over",
            false,
            format!(
                "The reading {header} turned over at its last digit, first in the interval from {}.",
                at(&self.turned)
            ),
        );
        say(
            &self.reset,
            "counted from zero",
            true,
            format!(
                "The reading {header} went back, as after a reset or a change of meter, first in the interval from {}: it is counted from zero there, or left out where it begins far above.",
                at(&self.reset)
            ),
        );
        let kwh = self.unit.kw(self.bridged.value(), step_h) * step_h * self.scale;
        say(
            &self.stepped,
            "left out",
            true,
            format!(
                "The reading {header} rose by {}\u{202f}kWh over intervals whose readings are missing, first from {}: that energy is known, not when.",
                crate::units::people::significant(kwh, 6),
                at(&self.stepped)
            ),
        );
    }
}

impl Settle {
    /// Turns the readings at one moment into the average power of its interval.
    pub(super) fn differences(&mut self, i: usize) -> Result<()> {
        let step_h = self.clock.step_s() / 3600.0;
        for register in &mut self.sums.registers {
            let series = &mut self.table.series[register.series];
            let here = series.get(i);
            let pair = if register.late { (register.before, here) } else { (here, series.get(i + 1)) };
            register.before = here;
            let energy = match pair {
                (Some(from), Some(to)) => register.difference(i, from, to),
                _ => None,
            };
            match (here, register.known) {
                (Some(reading), Some((last, known))) if i > last + 1 => {
                    register.stepped.add(last);
                    register.bridged.add((reading - known).max(0.0));
                    register.known = Some((i, reading));
                }
                (Some(reading), _) => register.known = Some((i, reading)),
                (None, _) => {}
            }
            match energy {
                Some(energy) => series.set(i, register.unit.kw(energy, step_h) * register.scale)?,
                None => series.clear(i),
            }
        }
        Ok(())
    }
}
