//! The second pass over a file: rows to series on the clock, and a tally of all that does not fit.

use std::collections::BTreeMap;

use csv::ByteRecord;

use super::decode::text;
use super::grid::Grid;
use super::number::{self, Cell, Marks};
use super::roles::key;
use super::stamp::DAY;
use super::timing::Timing;
use super::unit::Unit;
use super::zone::Resolver;
use super::{Clock, Series, dialect};
use crate::case::{DateOrder, RepeatRemedy};
use crate::fault::Result;

mod tally;

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
    ) -> Self {
        let none = Tally::default;
        Self { cell, header, unit, into, watched, text: none(), outlier: none(), negative: none() }
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
        self.rows += 1;
        let clock = &grid.clock;
        let from_start = instant - grid.shift_us - clock.start_us;
        let at = (from_start + clock.step_us / 2).div_euclid(clock.step_us);
        let Some(i) = usize::try_from(at).ok().filter(|i| *i < clock.intervals) else {
            self.outside.add(row, shown);
            return Ok(());
        };
        let off = (from_start - at * clock.step_us).abs();
        if off > grid.tolerance_us {
            self.off_step.add(row, shown);
            return Ok(());
        }
        if off > 1000 {
            self.snapped.add(row, shown);
            self.snapped_most = self.snapped_most.max(off);
        }
        if let Some(last) = self.at
            && i > last + 1
            && table.leaps.len() < MOST_ROWS
        {
            table.leaps.insert(last, (self.plan.index, row.saturating_sub(1)));
        }
        self.at = Some(i);
        let whole = self.cells(row, clock);
        if !whole && table.holes.len() < MOST_ROWS {
            table.holes.entry(i).or_insert((self.plan.index, row));
        }
        self.store(row, i, clock, table)
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
    fn cells(&mut self, row: u64, clock: &Clock) -> bool {
        let step_h = clock.step_s() / 3600.0;
        self.sums.clear();
        self.sums.resize(self.plan.slots.len(), Some(0.0));
        let mut whole = true;
        for column in &mut self.plan.uses {
            let cell = self.record.get(column.cell).unwrap_or(b"");
            let value = match number::parse(cell, self.plan.marks) {
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
            if column.watched && value.is_some_and(|value| value < 0.0) {
                column.negative.add(row, || text(cell));
            }
            for (slot, sign) in &column.into {
                let sum = &mut self.sums[*slot];
                *sum = match (*sum, value) {
                    (Some(sum), Some(value)) => Some(if *sign < 0.0 { sum - value } else { sum + value }),
                    _ => None,
                };
            }
        }
        whole
    }

    fn store(&mut self, row: u64, i: usize, clock: &Clock, table: &mut Table) -> Result<()> {
        let Self { plan, sums, .. } = self;
        let again = table.seen[plan.lane].get(i);
        if !again {
            table.seen[plan.lane].set(i);
            for (slot, value) in plan.slots.iter().zip(sums.iter()) {
                if let Some(value) = value {
                    table.series[*slot].set(i, *value)?;
                }
            }
            return Ok(());
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
        let shown = || text(plan.timing.cell(&self.record));
        if differs {
            self.conflict.add(row, shown);
        } else {
            self.repeat.add(row, shown);
        }
        Ok(())
    }
}
