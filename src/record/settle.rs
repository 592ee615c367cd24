//! Filled series to a record: sums over files, differences of running readings, gaps and their remedy.

use super::fill::{Bits, Table};
use super::roles::{TARGETS, Target};
use super::stamp::SECOND;
use super::{Clock, Extra, Finding, FindingKind, Role, Series};
use crate::case::{GapRemedy, RecordCase, Values};
use crate::fault::Result;
use crate::numeric::Sum;

mod gaps;
mod register;
mod samples;

pub(super) use register::Register;

/// Which of the table's series make up the record, as sums.
#[derive(Debug, Default)]
pub(super) struct Sums {
    /// Number of series.
    pub(super) series: usize,
    /// Series of each sum with their signs.
    pub(super) targets: [Vec<(usize, f64)>; TARGETS],
    /// Whether a running reading is in the sum.
    pub(super) own: [bool; TARGETS],
    /// The series that each sum is written to.
    pub(super) out: [Option<usize>; TARGETS],
    /// Running readings.
    pub(super) registers: Vec<Register>,
    /// Series whose steps are covered by parts, with the series that says how far.
    pub(super) spread: Vec<(usize, usize)>,
    /// Further columns: header, role and series.
    pub(super) extras: Vec<(String, Role, usize)>,
}

/// Energy drawn and fed, where both were recorded.
#[derive(Debug, Default)]
struct Both {
    drawn: Sum,
    fed: Sum,
    /// The smaller of the two in each interval, added up, and the number of intervals in which it is more than zero.
    shared: Sum,
    intervals: u64,
}

/// The last stage, resumable by interval.
#[derive(Debug)]
pub(super) struct Settle {
    table: Table,
    sums: Sums,
    clock: Clock,
    /// Stamps on the clock: one more than intervals where values belong to moments.
    points: usize,
    remedy: GapRemedy,
    samples: bool,
    /// Longest distance of samples that a line joins, in steps.
    joined: usize,
    counted: bool,
    next: usize,
    both: Both,
    hidden_kw: Vec<(usize, f64)>,
    missing: Bits,
    missing_count: u64,
    /// Of the missing intervals, those without any row.
    rowless: u64,
    run: Option<usize>,
    runs: u64,
    /// The longest gaps: length and first interval.
    longest: Vec<(usize, usize)>,
    first_gap: Option<usize>,
    spring: Option<usize>,
}

/// What the last stage yields.
#[derive(Debug)]
pub(super) struct Settled {
    pub(super) clock: Clock,
    pub(super) targets: [Option<Series>; 3],
    pub(super) extras: Vec<Extra>,
    pub(super) filled: usize,
    pub(super) hidden_kw: Vec<(usize, f64)>,
}

impl Settle {
    /// `longest_us` is the longest step of a file.
    pub(super) fn new(
        table: Table,
        sums: Sums,
        mut clock: Clock,
        terms: &RecordCase,
        longest_us: i64,
        counted: bool,
    ) -> Self {
        let points = clock.intervals;
        let samples = terms.reading == Values::Samples;
        if (samples || sums.registers.iter().any(|register| !register.late)) && points > 1 {
            // Between as many moments lies one interval less.
            clock.intervals = points - 1;
        }
        let joined = (longest_us.max(4 * clock.step_us).max(3600 * SECOND) / clock.step_us) as usize;
        let missing = Bits::new(clock.intervals);
        Self {
            table,
            sums,
            clock,
            points,
            remedy: terms.remedies.gap,
            samples,
            joined,
            counted,
            next: 0,
            both: Both::default(),
            hidden_kw: Vec::new(),
            missing,
            missing_count: 0,
            rowless: 0,
            run: None,
            runs: 0,
            longest: Vec::new(),
            first_gap: None,
            spring: None,
        }
    }

    /// Share done.
    pub(super) fn done(&self) -> f64 {
        self.next as f64 / self.points.max(1) as f64
    }

    /// Adds up the next intervals and looks for gaps; true once all are done.
    pub(super) fn advance(&mut self, budget: usize) -> Result<bool> {
        let end = self.next.saturating_add(budget.max(1)).min(self.points);
        for i in self.next..end {
            self.whole_steps(i)?;
            self.differences(i)?;
            let present = self.add_up(i)?;
            if i < self.clock.intervals && !self.samples {
                self.note(i, present);
            }
        }
        self.next = end;
        if end < self.points {
            return Ok(false);
        }
        if self.samples {
            self.join_samples()?;
            for i in 0..self.clock.intervals {
                let present = self.present(i);
                self.note(i, present);
            }
        }
        self.close_run(self.clock.intervals);
        Ok(true)
    }

    fn note(&mut self, i: usize, present: bool) {
        if present {
            self.close_run(i);
        } else {
            self.missing.set(i);
            self.missing_count += 1;
            self.rowless += u64::from(self.table.seen.iter().all(|seen| !seen.get(i)));
            self.run.get_or_insert(i);
        }
    }

    /// Whether all is there that net power needs.
    fn present(&self, i: usize) -> bool {
        let mut outs = self.sums.out[..=Target::Net as usize].iter().flatten().peekable();
        if outs.peek().is_none() {
            return self.sums.extras.iter().all(|extra| self.table.series[extra.2].get(i).is_some());
        }
        outs.all(|out| self.table.series[*out].get(i).is_some())
    }

    /// Steps of the clock that are covered by parts of intervals: only those covered whole count.
    fn whole_steps(&mut self, i: usize) -> Result<()> {
        for (series, cover) in &self.sums.spread {
            match self.table.series[*cover].get(i) {
                Some(covered) if covered > 1.0 - 1e-6 => {
                    // Rows that overlap each other count together for their mean.
                    if covered > 1.0 + 1e-6
                        && let Some(value) = self.table.series[*series].get(i)
                    {
                        self.table.series[*series].set(i, value / covered)?;
                    }
                }
                Some(_) => self.table.series[*series].clear(i),
                None => {}
            }
        }
        Ok(())
    }

    /// Adds up the series of each sum, and tells whether net power is there.
    fn add_up(&mut self, i: usize) -> Result<bool> {
        let mut found: [Option<f64>; TARGETS] = [None; TARGETS];
        for (members, found) in self.sums.targets.iter().zip(&mut found) {
            let mut sum: Option<f64> = None;
            for (nth, (series, sign)) in members.iter().enumerate() {
                let value = self.table.series[*series]
                    .get(i)
                    .map(|value| if *sign == 1.0 { value } else { sign * value });
                sum = if nth == 0 { value } else { sum.zip(value).map(|(a, b)| a + b) };
            }
            *found = sum;
        }
        for (target, found) in found.iter().enumerate().take(Target::Net as usize + 1) {
            let Some(out) = self.sums.out[target] else { continue };
            if self.sums.targets[target].len() == 1 && !self.sums.own[target] {
                continue;
            }
            match *found {
                Some(sum) => self.table.series[out].set(i, sum)?,
                None => self.table.series[out].clear(i),
            }
        }
        if let (Some(drawn), Some(fed)) = (found[Target::Drawn as usize], found[Target::Fed as usize]) {
            self.both.drawn.add(drawn);
            self.both.fed.add(fed);
            if drawn > 0.0 && fed > 0.0 {
                self.both.shared.add(drawn.min(fed));
                self.both.intervals += 1;
            }
        }
        if self.sums.out[..=Target::Net as usize].iter().all(Option::is_none) {
            return Ok(self.present(i));
        }
        Ok((0..=Target::Net as usize)
            .all(|target| self.sums.out[target].is_none() || found[target].is_some()))
    }

    fn close_run(&mut self, end: usize) {
        let Some(start) = self.run.take() else { return };
        let len = end - start;
        self.runs += 1;
        self.first_gap.get_or_insert(start);
        self.longest.push((len, start));
        self.longest.sort_by_key(|(len, start)| (std::cmp::Reverse(*len), *start));
        self.longest.truncate(3);
        let hour = i64::try_from(len).unwrap_or(i64::MAX).saturating_mul(self.clock.step_us) == 3600 * SECOND;
        if hour && self.spring.is_none() {
            let civil = self.clock.civil(start);
            if civil.weekday == 6 && matches!(civil.month, 3 | 4) && (1..=3).contains(&civil.hour) {
                self.spring = Some(start);
            }
        }
    }

    /// Applies the remedy for gaps, and lists what was found.
    pub(super) fn finish(mut self, files: &[String], findings: &mut Vec<Finding>) -> Result<Settled> {
        self.gaps(files, findings);
        self.clock_change(findings);
        self.both_ways(findings);
        let step_h = self.clock.step_s() / 3600.0;
        for register in &self.sums.registers {
            register.tell(step_h, &self.clock, findings);
        }
        let mut targets: [Option<Series>; 3] = [None, None, None];
        for (target, out) in targets.iter_mut().zip(&self.sums.out) {
            *target = out.map(|series| std::mem::take(&mut self.table.series[series]));
        }
        let mut extras: Vec<Extra> = self
            .sums
            .extras
            .iter()
            .map(|(header, role, series)| Extra {
                header: header.clone(),
                role: *role,
                values: std::mem::take(&mut self.table.series[*series]),
            })
            .collect();
        for series in targets.iter_mut().flatten().chain(extras.iter_mut().map(|extra| &mut extra.values)) {
            series.truncate(self.clock.intervals);
            gaps::fill(series, self.remedy, self.clock.step_us)?;
        }
        let mut filled = 0;
        let powered = targets.iter().any(Option::is_some);
        if self.missing_count > 0 {
            for i in (0..self.clock.intervals).filter(|i| self.missing.get(*i)) {
                let present = if powered {
                    targets.iter().flatten().all(|series| series.get(i).is_some())
                } else {
                    extras.iter().all(|extra| extra.values.get(i).is_some())
                };
                if present {
                    filled += 1;
                } else {
                    // An interval counts only if everything that net power needs is there.
                    targets.iter_mut().flatten().for_each(|series| series.clear(i));
                }
            }
        }
        if filled > 0 {
            findings.push(Finding {
                kind: FindingKind::Filled,
                count: filled as u64,
                first_row: None,
                file: String::new(),
                remedy: gaps::words(self.remedy).to_owned(),
                text: format!(
                    "{filled} of {} missing intervals were filled: {}.",
                    self.missing_count,
                    gaps::words(self.remedy)
                ),
                changes_figures: true,
            });
        }
        Ok(Settled { clock: self.clock, targets, extras, filled, hidden_kw: self.hidden_kw })
    }

    /// Where energy was drawn and fed in one interval: what the registers say beside what is left of it net.
    fn both_ways(&self, findings: &mut Vec<Finding>) {
        if self.both.intervals == 0 {
            return;
        }
        let step_h = self.clock.step_s() / 3600.0;
        let kwh = |power: f64| format!("{}\u{202f}kWh", crate::units::people::significant(power * step_h, 6));
        let (drawn, fed, shared) = (self.both.drawn.value(), self.both.fed.value(), self.both.shared.value());
        findings.push(Finding {
            kind: FindingKind::Netted,
            count: self.both.intervals,
            first_row: None,
            file: String::new(),
            remedy: "net of each interval taken".to_owned(),
            text: format!(
                "In {} intervals energy was both drawn and fed. The registers add up to {} drawn and {} fed; net of each interval it is {} and {}. The net of each interval is used: what changes its sign within an interval does not show.",
                self.both.intervals,
                kwh(drawn),
                kwh(fed),
                kwh(drawn - shared),
                kwh(fed - shared),
            ),
            changes_figures: true,
        });
    }
}
