//! The second pass over a file: rows to series on the clock, and a tally of all that does not fit.

use std::collections::BTreeMap;

use csv::ByteRecord;

use super::decode::text;
use super::grid::{Fit, Grid};
use super::number::{self, Cell, Marks};
use super::quality::{Mark, Quality};
use super::roles::key;
use super::stamp::DAY;
use super::timing::Timing;
use super::unit::Unit;
use super::zone::Resolver;
use super::{Clock, Series, dialect};
use crate::case::{DateOrder, RepeatRemedy};
use crate::fault::Result;
use crate::numeric::Sum;

mod lay;
mod spread;
mod tally;

use spread::Pending;
use tally::Tally;

/// Powers beyond this (kW) are slips: a thousand times the largest plants.
const MOST_KW: f64 = 1e12;

/// Rows remembered beside gaps.
const MOST_ROWS: usize = 4096;

/// One bit per interval.
#[derive(Debug, Clone, Default)]
pub(super) struct Bits(Vec<u64>);

impl Bits {
    pub(super) fn new(len: usize) -> Self {
        Self(vec![0; len.div_ceil(64)])
    }

    pub(super) fn get(&self, i: usize) -> bool {
        self.0.get(i / 64).is_some_and(|word| word >> (i % 64) & 1 == 1)
    }

    pub(super) fn set(&mut self, i: usize) {
        if let Some(word) = self.0.get_mut(i / 64) {
            *word |= 1 << (i % 64);
        }
    }
}

/// The series under construction.
#[derive(Debug, Default)]
pub(super) struct Table {
    pub(super) series: Vec<Series>,
    /// Intervals that a row was read for, one set per lane of files that follow each other in time.
    pub(super) seen: Vec<Bits>,
    /// Rows taken into a mean so far, where more than one: lane and interval.
    means: BTreeMap<(usize, usize), u32>,
    /// Interval before a leap, and the file and row that hold it.
    pub(super) leaps: BTreeMap<usize, (usize, u64)>,
    /// Intervals whose row lacks a value, with file and row.
    pub(super) holes: BTreeMap<usize, (usize, u64)>,
    /// Repeated rows by day (since 1970) for days on which clocks are set back.
    pub(super) doubled: BTreeMap<i64, u64>,
}

/// One column of a file that is used.
#[derive(Debug)]
pub(super) struct Use {
    pub(super) cell: usize,
    pub(super) header: String,
    pub(super) unit: Option<Unit>,
    /// The file's slots that it is added to, with its sign.
    pub(super) into: Vec<(usize, f64)>,
    /// Whether negative values are worth a finding.
    pub(super) watched: bool,
    /// Whether it is one of three phases, and the sum of its values.
    pub(super) phase: bool,
    sum: Sum,
    text: Tally,
    outlier: Tally,
    negative: Tally,
}

impl Use {
    pub(super) fn new(
        cell: usize,
        header: String,
        unit: Option<Unit>,
        into: Vec<(usize, f64)>,
        watched: bool,
        phase: bool,
    ) -> Self {
        let none = Tally::default;
        Self {
            cell,
            header,
            unit,
            into,
            watched,
            phase,
            sum: Sum::default(),
            text: none(),
            outlier: none(),
            negative: none(),
        }
    }
}

/// How one file is read in the second pass.
#[derive(Debug)]
pub(super) struct FilePlan {
    pub(super) index: usize,
    pub(super) name: String,
    pub(super) timing: Timing,
    pub(super) order: DateOrder,
    pub(super) marks: Marks,
    pub(super) first_row: u64,
    pub(super) headers: Vec<String>,
    pub(super) uses: Vec<Use>,
    /// The table's series that the file's sums go to.
    pub(super) slots: Vec<usize>,
    pub(super) lane: usize,
    pub(super) repeat: RepeatRemedy,
    pub(super) resolver: Resolver,
    /// Columns of quality marks.
    pub(super) quality: Vec<Quality>,
    /// How the file's intervals lie on the clock.
    pub(super) fit: Fit,
    /// Whether rows run from the newest to the oldest.
    pub(super) falling: bool,
    /// Series that say how far each step is covered, one for each slot, where the file's intervals are no whole steps.
    pub(super) covers: Vec<usize>,
    /// The years that a typical year is laid on, if it is one.
    pub(super) years: Vec<i64>,
}

/// The second pass over one file.
#[derive(Debug)]
pub(super) struct Fill {
    pub(super) plan: FilePlan,
    record: ByteRecord,
    sums: Vec<Option<f64>>,
    before: Option<i64>,
    at: Option<usize>,
    /// Rows of values so far.
    nth: i64,
    /// Rows with a stamp.
    rows: u64,
    stampless: Tally,
    /// Rows without a stamp since the last row with one: the table's foot, if nothing follows.
    foot: Tally,
    heads: Tally,
    skipped: Tally,
    off_step: Tally,
    outside: Tally,
    disorder: Tally,
    repeat: Tally,
    conflict: Tally,
    comments: Tally,
    snapped: Tally,
    snapped_most: i64,
    marked_missing: Tally,
    estimated: Tally,
    leap_days: Tally,
    pending: Pending,
}

impl Fill {
    pub(super) fn new(plan: FilePlan) -> Self {
        let none = Tally::default;
        Self {
            sums: Vec::with_capacity(plan.slots.len()),
            plan,
            record: ByteRecord::new(),
            before: None,
            at: None,
            nth: 0,
            rows: 0,
            stampless: none(),
            foot: none(),
            heads: none(),
            skipped: none(),
            off_step: none(),
            outside: none(),
            disorder: none(),
            repeat: none(),
            conflict: none(),
            comments: none(),
            snapped: none(),
            snapped_most: 0,
            marked_missing: none(),
            estimated: none(),
            leap_days: none(),
            pending: Pending::default(),
        }
    }

    /// The buffer for the next row.
    pub(super) fn buffer(&mut self) -> &mut ByteRecord {
        &mut self.record
    }

    /// Takes the row in the buffer.
    pub(super) fn row(&mut self, row: u64, grid: &Grid, table: &mut Table) -> Result<()> {
        if row < self.plan.first_row {
            return Ok(());
        }
        let nth = self.nth;
        self.nth += 1;
        let Some(moment) = self.plan.timing.read(&self.record, self.plan.order, self.plan.marks, nth) else {
            self.without_stamp(row);
            return Ok(());
        };
        if self.foot.count > 0 {
            let foot = std::mem::take(&mut self.foot);
            if self.stampless.count == 0 {
                self.stampless.first_row = foot.first_row;
                self.stampless.what = foot.what;
            }
            self.stampless.count += foot.count;
        }
        self.rows += 1;
        if !self.plan.years.is_empty() {
            return self.lay(row, moment, grid, table);
        }
        let record = &self.record;
        let shown = || text(self.plan.timing.cell(record));
        let Some(instant) = self.plan.resolver.moment(&moment) else {
            self.skipped.add(row, shown);
            return Ok(());
        };
        if self.before.is_some_and(|before| instant < before) {
            self.disorder.add(row, shown);
        }
        self.before = Some(instant);
        if !self.plan.covers.is_empty() {
            return self.spread(row, instant, grid, table);
        }
        let Some(i) = self.place(row, instant, grid) else { return Ok(()) };
        // The last step of the clock that the row before holds.
        let last = self.at.replace(i).map(|last| last + self.plan.fit.cells - 1);
        if let Some(last) = last
            && i > last + 1
            && table.leaps.len() < MOST_ROWS
        {
            table.leaps.insert(last, (self.plan.index, row.saturating_sub(1)));
        }
        let whole = self.cells(row, self.plan.fit.step_us);
        if !whole && table.holes.len() < MOST_ROWS {
            table.holes.entry(i).or_insert((self.plan.index, row));
        }
        self.store(row, i, &grid.clock, table)
    }

    /// The step of the clock at which an instant's interval begins; none if it lies off the steps or outside.
    fn place(&mut self, row: u64, instant: i64, grid: &Grid) -> Option<usize> {
        let Self { record, plan, .. } = self;
        let shown = || text(plan.timing.cell(record));
        let (start, off) = plan.fit.start(instant);
        let Some(i) = grid.step_at(start) else {
            self.outside.add(row, shown);
            return None;
        };
        if off > plan.fit.step_us / 20 {
            self.off_step.add(row, shown);
            return None;
        }
        if off > 1000 {
            self.snapped.add(row, shown);
            self.snapped_most = self.snapped_most.max(off);
        }
        Some(i)
    }

    fn without_stamp(&mut self, row: u64) {
        if dialect::blank(&self.record) {
            return;
        }
        let Self { record, plan, .. } = self;
        let shown = || text(plan.timing.cell(record));
        if dialect::is_comment(record) {
            self.comments.add(row, shown);
            return;
        }
        let again = record
            .iter()
            .zip(&plan.headers)
            .all(|(cell, header)| cell.is_empty() || key(&text(cell)) == key(header));
        if again {
            self.heads.add(row, shown);
            return;
        }
        self.foot.add(row, || {
            let first = record.iter().map(text).find(|cell| !cell.is_empty()).unwrap_or_default();
            let stamp = shown();
            if stamp.is_empty() { first } else { stamp }
        });
    }

    /// Adds up the row's cells; returns whether every cell holds a number.
    fn cells(&mut self, row: u64, step_us: i64) -> bool {
        let step_h = step_us as f64 / 1e6 / 3600.0;
        self.sums.clear();
        self.sums.resize(self.plan.slots.len(), Some(0.0));
        let mut whole = true;
        let mut absent: Option<Option<usize>> = None;
        for quality in &self.plan.quality {
            let cell = self.record.get(quality.column).unwrap_or(b"");
            match quality.mark(cell) {
                Mark::Estimated => self.estimated.add(row, || text(cell)),
                Mark::Missing => {
                    self.marked_missing.add(row, || text(cell));
                    // Two marks on one row that speak of two columns: all of it is left out.
                    absent = Some(if absent.is_none() { quality.of } else { None });
                }
                Mark::Measured | Mark::Unknown => {}
            }
        }
        for column in &mut self.plan.uses {
            let cell = self.record.get(column.cell).unwrap_or(b"");
            let value = match number::parse(cell, self.plan.marks) {
                _ if absent.is_some_and(|of| of.is_none_or(|of| of == column.cell)) => None,
                Cell::Number(value) => {
                    let value = column.unit.map_or(value, |unit| unit.kw(value, step_h));
                    if value.abs() <= MOST_KW {
                        Some(value)
                    } else {
                        column.outlier.add(row, || text(cell));
                        None
                    }
                }
                Cell::Empty => None,
                Cell::Text => {
                    column.text.add(row, || text(cell));
                    None
                }
            };
            whole &= value.is_some();
            if column.phase
                && let Some(value) = value
            {
                column.sum.add(value);
            }
            if column.watched && value.is_some_and(|value| value < 0.0) {
                column.negative.add(row, || text(cell));
            }
            for (slot, sign) in &column.into {
                let sum = &mut self.sums[*slot];
                *sum = match (*sum, value) {
                    (Some(sum), Some(value)) => Some(sum + sign * value),
                    _ => None,
                };
            }
        }
        whole
    }

    fn store(&mut self, row: u64, i: usize, clock: &Clock, table: &mut Table) -> Result<()> {
        // A long interval holds its power through all the steps in it.
        let (mut again, mut differs) = (false, false);
        for i in i..(i + self.plan.fit.cells).min(clock.intervals) {
            let (known, other) = self.store_one(i, clock, table)?;
            again |= known;
            differs |= other;
        }
        let shown = || text(self.plan.timing.cell(&self.record));
        if differs {
            self.conflict.add(row, shown);
        } else if again {
            self.repeat.add(row, shown);
        }
        Ok(())
    }

    /// Stores the row in one interval; tells whether a row was there before, and whether it differs.
    fn store_one(&mut self, i: usize, clock: &Clock, table: &mut Table) -> Result<(bool, bool)> {
        let Self { plan, sums, .. } = self;
        let again = table.seen[plan.lane].get(i);
        if !again {
            table.seen[plan.lane].set(i);
            for (slot, value) in plan.slots.iter().zip(sums.iter()) {
                if let Some(value) = value {
                    table.series[*slot].set(i, *value)?;
                }
            }
            return Ok((false, false));
        }
        let differs = plan.slots.iter().zip(sums.iter()).any(|(slot, value)| {
            matches!((table.series[*slot].get(i), value), (Some(old), Some(new)) if old != *new)
        });
        let rows = if plan.repeat == RepeatRemedy::Mean {
            let rows = table.means.entry((plan.lane, i)).or_insert(1);
            *rows += 1;
            *rows
        } else {
            2
        };
        for (slot, value) in plan.slots.iter().zip(sums.iter()) {
            let series = &mut table.series[*slot];
            match (series.get(i), value) {
                (None, Some(new)) => series.set(i, *new)?,
                (Some(old), Some(new)) if old != *new => match plan.repeat {
                    RepeatRemedy::First => {}
                    RepeatRemedy::Last => series.set(i, *new)?,
                    RepeatRemedy::Mean => series.set(i, old + (new - old) / f64::from(rows))?,
                },
                _ => {}
            }
        }
        let civil = clock.civil(i);
        if civil.weekday == 6
            && matches!(civil.month, 10 | 11)
            && civil.hour <= 3
            && table.doubled.len() < MOST_ROWS
        {
            *table.doubled.entry(clock.at_us(i).div_euclid(DAY)).or_insert(0) += 1;
        }
        Ok((true, differs))
    }
}
