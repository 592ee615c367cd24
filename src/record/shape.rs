//! The shape of a table: one row per reading as it stands, one row per day with a column for each time of day, or one row
//! per channel and reading. Everything behind this file sees one row per reading of one channel.

use std::io::Read;
use std::rc::Rc;

use csv::ByteRecord;

use super::Role;
use super::dialect::{Dialect, blank};
use super::number;
use super::rows::Rows;
use super::unit::{self, Stated};
use super::words::{self, Guess};

mod channels;
mod days;

pub(super) use channels::{Keys, Survey, keys};
pub(super) use days::{Days, days, heads};

/// Header of the times of day of a table with one row per day.
const CLOCK_HEADER: &str = "time of day";

/// What is done to a file's rows before they are read.
#[derive(Debug, Clone, Default)]
pub(super) struct Shape {
    /// One row per day: it is dealt out as a row for each time of day.
    pub(super) days: Option<Rc<Days>>,
    /// Rows of one channel alone.
    pub(super) cut: Option<Rc<Cut>>,
}

/// The rows of one channel.
#[derive(Debug)]
pub(super) struct Cut {
    /// Columns that name the channel.
    pub(super) keys: Vec<usize>,
    /// What stands in them.
    pub(super) wanted: Vec<Vec<u8>>,
}

impl Cut {
    fn holds(&self, record: &ByteRecord) -> bool {
        self.keys
            .iter()
            .zip(&self.wanted)
            .all(|(key, wanted)| number::trim(record.get(*key).unwrap_or(b"")) == wanted.as_slice())
    }
}

impl Shape {
    fn is_plain(&self) -> bool {
        self.days.is_none() && self.cut.is_none()
    }
}

/// A table's rows in the shape that the passes read.
pub(super) struct Shaped<R> {
    rows: Rows<R>,
    shape: Shape,
    first_row: u64,
    /// The row of a day that is being dealt out, its number, and its next time of day.
    day: ByteRecord,
    number: u64,
    next: usize,
}

impl<R: Read> Shaped<R> {
    pub(super) fn new(rows: Rows<R>, shape: Shape, first_row: u64) -> Self {
        Self { rows, shape, first_row, day: ByteRecord::new(), number: 0, next: usize::MAX }
    }

    /// Reads the next row and returns its number in the file; none at the end. `passed` is told of each row of the file.
    pub(super) fn next(
        &mut self,
        record: &mut ByteRecord,
        passed: impl Fn(&mut R),
    ) -> csv::Result<Option<u64>> {
        if self.shape.is_plain() {
            let row = self.rows.next(record)?;
            passed(self.rows.text_mut());
            return Ok(row);
        }
        loop {
            if let Some(days) = &self.shape.days
                && days.deal(&self.day, &mut self.next, record)
            {
                return Ok(Some(self.number));
            }
            let Some(row) = self.rows.next(&mut self.day)? else { return Ok(None) };
            passed(self.rows.text_mut());
            if row < self.first_row
                || blank(&self.day)
                || self.shape.cut.as_ref().is_some_and(|cut| !cut.holds(&self.day))
            {
                continue;
            }
            self.number = row;
            self.next = 0;
            if self.shape.days.is_none() {
                record.clone_from(&self.day);
                return Ok(Some(row));
            }
        }
    }

    /// The text being read.
    pub(super) fn text(&self) -> &R {
        self.rows.text()
    }

    /// The text being read, for good.
    pub(super) fn into_text(self) -> R {
        self.rows.into_text()
    }
}

/// One channel of a table as the survey saw it.
#[derive(Debug)]
pub(super) struct Channel {
    pub(super) wanted: Vec<Vec<u8>>,
    /// Its first rows.
    pub(super) rows: Vec<(u64, ByteRecord)>,
}

/// The dialect of one channel of a table, as if it were a file of its own with one row per reading.
pub(super) fn alone(
    dialect: &Dialect,
    days: Option<&Days>,
    keys: Option<&Keys>,
    channel: Option<&Channel>,
) -> Dialect {
    let rows = channel.map_or(&dialect.rows, |channel| &channel.rows);
    let label = channel.map(|channel| channels::label(&channel.wanted));
    let unit = channels::unit_of_rows(rows, &dialect.headers);
    let mut headers = dialect.headers.clone();
    let mut units = dialect.units.clone();
    let mut named = keys.map(|keys| keys.columns.clone()).unwrap_or_default();
    let mut shaped = rows.clone();
    if let Some(days) = days {
        let header = label.clone().unwrap_or_else(|| "value".to_owned());
        let of_header = unit::unit_of(&header);
        let of_slot = days.unit(dialect);
        headers = vec![dialect.headers[days.date].clone(), CLOCK_HEADER.to_owned(), header];
        let found = [unit.clone(), of_header, of_slot].into_iter().find(|unit| *unit != Stated::Nothing);
        units = vec![Stated::Nothing, Stated::Nothing, found.unwrap_or(Stated::Nothing)];
        named.clear();
        shaped = Vec::new();
        for (row, record) in rows {
            let (mut next, mut reading) = (0, ByteRecord::new());
            while shaped.len() < 4000 && days.deal(record, &mut next, &mut reading) {
                shaped.push((*row, reading.clone()));
            }
        }
    } else if let (Some(value), Some(label)) = (keys.and_then(|keys| keys.renamed), label) {
        let stated = unit::unit_of(&label);
        headers[value] = label;
        if stated != Stated::Nothing {
            units[value] = stated;
        }
    }
    if days.is_none() && unit != Stated::Nothing {
        let other = |header: &str| {
            matches!(
                words::guess(header),
                Guess::Role(Role::Price | Role::Frequency | Role::Reactive | Role::Quality | Role::Ignore, _)
            )
        };
        for (stated, header) in units.iter_mut().zip(&headers) {
            if *stated == Stated::Nothing && !other(header) {
                *stated = unit.clone();
            }
        }
    }
    Dialect {
        headers,
        units,
        rows: shaped,
        names: named,
        separator: dialect.separator,
        marks: dialect.marks,
        thousands: dialect.thousands,
        header_row: dialect.header_row,
        unit_row: dialect.unit_row,
        first_row: dialect.first_row,
        preamble: dialect.preamble.clone(),
    }
}
