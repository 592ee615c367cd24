//! Filled series to a record: sums over files, gaps and their remedy.

use super::fill::{Bits, Table};
use super::grid::people_duration;
use super::stamp::{DAY, SECOND};
use super::{Clock, Extra, Finding, FindingKind, Series, Zone};
use crate::case::GapRemedy;
use crate::fault::Result;

/// Which of the table's series make up the record, as sums.
#[derive(Debug, Default)]
pub(super) struct Sums {
    /// Series of supply, demand and net power, to be added up.
    pub(super) targets: [Vec<usize>; 3],
    /// Further columns: header, role and series.
    pub(super) extras: Vec<(String, super::Role, usize)>,
}

/// The last stage, resumable by interval.
#[derive(Debug)]
pub(super) struct Settle {
    table: Table,
    sums: Sums,
    clock: Clock,
    remedy: GapRemedy,
    counted: bool,
    next: usize,
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
    pub(super) targets: [Option<Series>; 3],
    pub(super) extras: Vec<Extra>,
    pub(super) filled: usize,
}

impl Settle {
    pub(super) fn new(table: Table, sums: Sums, clock: Clock, remedy: GapRemedy, counted: bool) -> Self {
        let missing = Bits::new(clock.intervals);
        Self {
            table,
            sums,
            clock,
            remedy,
            counted,
            next: 0,
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
        self.next as f64 / self.clock.intervals.max(1) as f64
    }

    /// Adds up the next intervals and looks for gaps; true once all are done.
    pub(super) fn advance(&mut self, budget: usize) -> Result<bool> {
        let end = self.next.saturating_add(budget.max(1)).min(self.clock.intervals);
        for i in self.next..end {
            let present = self.add_up(i)?;
            if present {
                self.close_run(i);
            } else {
                self.missing.set(i);
                self.missing_count += 1;
                self.rowless += u64::from(self.table.seen.iter().all(|seen| !seen.get(i)));
                self.run.get_or_insert(i);
            }
        }
        self.next = end;
        if end == self.clock.intervals {
            self.close_run(end);
        }
        Ok(end == self.clock.intervals)
    }

    /// Adds the series of each sum into its first, and tells whether net power is there.
    fn add_up(&mut self, i: usize) -> Result<bool> {
        let mut there = [None; 3];
        for (target, there) in self.sums.targets.iter().zip(&mut there) {
            let Some((first, rest)) = target.split_first() else { continue };
            let mut sum = self.table.series[*first].get(i);
            for other in rest {
                sum = sum.zip(self.table.series[*other].get(i)).map(|(a, b)| a + b);
            }
            *there = Some(sum.is_some());
            if !rest.is_empty() {
                match sum {
                    Some(sum) => self.table.series[*first].set(i, sum)?,
                    None => self.table.series[*first].clear(i),
                }
            }
        }
        if there == [None; 3] {
            return Ok(self
                .sums
                .extras
                .iter()
                .all(|(_, _, series)| self.table.series[*series].get(i).is_some()));
        }
        Ok(there.iter().flatten().all(|there| *there))
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
        let mut targets: [Option<Series>; 3] = [None, None, None];
        for (target, list) in targets.iter_mut().zip(&self.sums.targets) {
            *target = list.first().map(|series| std::mem::take(&mut self.table.series[*series]));
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
            fill(series, self.remedy, self.clock.step_us)?;
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
                remedy: remedy_words(self.remedy).to_owned(),
                text: format!(
                    "{filled} of {} missing intervals were filled: {}.",
                    self.missing_count,
                    remedy_words(self.remedy)
                ),
                changes_figures: true,
            });
        }
        Ok(Settled { targets, extras, filled })
    }

    fn gaps(&self, files: &[String], findings: &mut Vec<Finding>) {
        let Some(first) = self.first_gap else { return };
        let place = self.table.holes.get(&first).or_else(|| {
            // The row after which the gap begins.
            first.checked_sub(1).and_then(|before| self.table.leaps.get(&before))
        });
        let long: Vec<String> = self
            .longest
            .iter()
            .map(|(len, start)| {
                format!("{} from {}", people_duration(*len as f64 * self.clock.step_s()), self.stamp(*start))
            })
            .collect();
        let cells = self.missing_count - self.rowless;
        let cause = match (self.rowless, cells) {
            (_, 0) => "there is no row for them".to_owned(),
            (0, _) => "a cell of their row is empty or unreadable".to_owned(),
            (rows, cells) => format!("{rows} have no row, {cells} an empty or unreadable cell"),
        };
        let text = format!(
            "{} of {} intervals ({}) are missing: {cause}. {} {}.",
            self.missing_count,
            self.clock.intervals,
            crate::units::people::percent(self.missing_count as f64 / self.clock.intervals.max(1) as f64),
            match self.runs {
                1 => "The gap is".to_owned(),
                2 | 3 => format!("The {} gaps are", self.runs),
                runs => format!("The longest of {runs} gaps are"),
            },
            long.join(", "),
        );
        findings.push(Finding {
            kind: FindingKind::Gap,
            count: self.missing_count,
            first_row: place.map(|(_, row)| *row),
            file: place.and_then(|(file, _)| files.get(*file)).cloned().unwrap_or_default(),
            remedy: remedy_words(self.remedy).to_owned(),
            text,
            changes_figures: true,
        });
    }

    /// Traces of summer time in stamps without a zone.
    fn clock_change(&self, findings: &mut Vec<Finding>) {
        if self.clock.zone != Zone::Unstated || self.counted || self.clock.step_us > 3600 * SECOND {
            return;
        }
        let hour = 3600 * SECOND / self.clock.step_us;
        let autumn = self
            .table
            .doubled
            .iter()
            .find(|(_, rows)| i64::try_from(**rows) == Ok(hour))
            .map(|(day, _)| *day);
        let mut traces = Vec::new();
        if let Some(spring) = self.spring {
            traces.push(format!("an hour is missing at {}", self.stamp(spring)));
        }
        if let Some(day) = autumn {
            let i = ((day * DAY - self.clock.start_us) / self.clock.step_us).max(0) as usize;
            let stamp = self.stamp(i);
            traces.push(format!("an hour comes twice on {}", stamp.get(..10).unwrap_or("a day in autumn")));
        }
        if traces.is_empty() {
            return;
        }
        findings.push(Finding {
            kind: FindingKind::ClockChange,
            count: traces.len() as u64,
            first_row: None,
            file: String::new(),
            remedy: "stamps taken as they stand".to_owned(),
            text: format!(
                "The stamps seem to follow summer time: {}. State the zone (such as Europe/Berlin), and each row falls in its place.",
                traces.join(" and ")
            ),
            changes_figures: true,
        });
    }

    /// A stamp for messages: without seconds, and without an offset that nobody stated.
    fn stamp(&self, i: usize) -> String {
        let stamp = self.clock.stamp(i);
        let long = self.clock.step_us % (60 * SECOND) != 0;
        let end = if long { 19 } else { 16 };
        stamp.get(..end).unwrap_or(&stamp).replace('T', " ")
    }
}

/// A remedy in words.
fn remedy_words(remedy: GapRemedy) -> &'static str {
    match remedy {
        GapRemedy::LeaveOut => "left out",
        GapRemedy::Hold => "the last value is held",
        GapRemedy::Line => "a straight line joins the neighbours",
        GapRemedy::Zero => "zero is taken",
        GapRemedy::NeighbourDays => "the mean of the same time on the neighbouring days is taken",
    }
}

/// Fills the missing values of a series where the remedy knows how.
fn fill(series: &mut Series, remedy: GapRemedy, step_us: i64) -> Result<()> {
    let len = series.len();
    match remedy {
        GapRemedy::LeaveOut => {}
        GapRemedy::Zero => {
            for i in 0..len {
                if series.get(i).is_none() {
                    series.set(i, 0.0)?;
                }
            }
        }
        GapRemedy::Hold => {
            let mut last = None;
            for i in 0..len {
                match (series.get(i), last) {
                    (Some(value), _) => last = Some(value),
                    (None, Some(last)) => series.set(i, last)?,
                    (None, None) => {}
                }
            }
        }
        GapRemedy::Line => {
            let mut last: Option<(usize, f64)> = None;
            for i in 0..len {
                let Some(value) = series.get(i) else { continue };
                if let Some((from, start)) = last {
                    let steps = (i - from) as f64;
                    for k in from + 1..i {
                        series.set(k, start + (value - start) * ((k - from) as f64 / steps))?;
                    }
                }
                last = Some((i, value));
            }
        }
        GapRemedy::NeighbourDays => {
            if DAY % step_us != 0 {
                return Ok(());
            }
            let day = (DAY / step_us) as usize;
            let mut found = Vec::new();
            for i in (0..len).filter(|i| series.get(*i).is_none()) {
                let before = i.checked_sub(day).and_then(|at| series.get(at));
                let after = series.get(i + day);
                let value = match (before, after) {
                    (Some(before), Some(after)) => Some(before + (after - before) / 2.0),
                    (one, other) => one.or(other),
                };
                found.extend(value.map(|value| (i, value)));
            }
            for (i, value) in found {
                series.set(i, value)?;
            }
        }
    }
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;

    fn filled(values: &[Option<f64>], remedy: GapRemedy, step_us: i64) -> Vec<Option<f64>> {
        let mut series = Series::from_values(values).unwrap();
        fill(&mut series, remedy, step_us).unwrap();
        series.iter().collect()
    }

    #[test]
    fn remedies_fill_what_they_can() {
        let values = [None, Some(1.0), None, None, Some(4.0), None];
        let hour = 3600 * SECOND;
        assert_eq!(filled(&values, GapRemedy::LeaveOut, hour), values);
        assert_eq!(
            filled(&values, GapRemedy::Hold, hour),
            [None, Some(1.0), Some(1.0), Some(1.0), Some(4.0), Some(4.0)]
        );
        assert_eq!(
            filled(&values, GapRemedy::Line, hour),
            [None, Some(1.0), Some(2.0), Some(3.0), Some(4.0), None]
        );
        assert_eq!(
            filled(&values, GapRemedy::Zero, hour),
            [Some(0.0), Some(1.0), Some(0.0), Some(0.0), Some(4.0), Some(0.0)]
        );
        let half_days = [Some(1.0), Some(2.0), None, Some(4.0), Some(5.0), None];
        let expected = [Some(1.0), Some(2.0), Some(3.0), Some(4.0), Some(5.0), Some(4.0)];
        assert_eq!(filled(&half_days, GapRemedy::NeighbourDays, DAY / 2), expected);
    }
}
