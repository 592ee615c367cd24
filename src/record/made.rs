//! Text tables made from files that are none: several series by their stamps, with the rows of the file that they came from.

use std::collections::BTreeMap;
use std::fmt::Write as _;
use std::rc::Rc;

use jiff::{Timestamp, tz::Offset};

use crate::fault::{Fault, Result};

/// Most values that are held while a table is made.
const MOST_VALUES: usize = 8 << 20;

/// Most values of one series with the same stamp.
const MOST_REPEATS: u32 = 100;

/// Row of a table (from 1) from which on its rows stand for a row of the file.
pub(super) type Runs = Rc<[(u64, u64)]>;

/// A table, and what is known of it.
pub(super) type Table = (String, Made);

/// What is known of a table that was made from another kind of file.
#[derive(Debug, Clone, Default)]
pub(super) struct Made {
    /// The kind of file in words, for people.
    pub(super) words: String,
    /// Which rows of the file its rows stand for; empty if they are the same.
    pub(super) runs: Runs,
    /// The sheets of a workbook, the one taken first.
    pub(super) sheets: Vec<String>,
    /// Whether numbers are known to be written with a decimal point.
    pub(super) point: bool,
}

/// The file's row that a row of a table made from it stands for.
pub(super) fn row_in_file(runs: &[(u64, u64)], row: u64) -> u64 {
    let after = runs.partition_point(|(from, _)| *from <= row);
    match after.checked_sub(1).and_then(|at| runs.get(at)) {
        Some((_, row)) => *row,
        None => row,
    }
}

/// One row: the file's row, and a cell for each series that has one.
#[derive(Debug)]
struct Row {
    row: u64,
    cells: Vec<Option<Box<str>>>,
}

/// Series being laid beside each other by their stamps.
#[derive(Debug, Default)]
pub(super) struct Merge {
    /// By the interval's start (s since 1970, UTC) and how often that stamp has come.
    rows: BTreeMap<(i64, u32), Row>,
    values: usize,
}

impl Merge {
    /// Adds a value of series `column`, whose interval starts at `start_s`, from the file's `row` (from 1).
    ///
    /// # Errors
    /// If there are more values than can be held.
    pub(super) fn put(
        &mut self,
        file: &str,
        (start_s, column): (i64, usize),
        row: u64,
        value: &str,
    ) -> Result<()> {
        self.values += 1;
        if self.values > MOST_VALUES {
            return Err(Fault::new(
                format!("the file holds more than {} million values", MOST_VALUES >> 20),
                file,
                "Cut the file into shorter spans.",
            ));
        }
        for again in 0..MOST_REPEATS {
            let Row { cells, .. } =
                self.rows.entry((start_s, again)).or_insert_with(|| Row { row, cells: Vec::new() });
            if cells.len() <= column {
                cells.resize(column + 1, None);
            }
            let cell = &mut cells[column];
            if cell.is_none() {
                *cell = Some(value.into());
                return Ok(());
            }
        }
        Err(Fault::new(
            format!("one interval has more than {MOST_REPEATS} values"),
            format!("{file}, row {row}"),
            "Ask for the readings again: a file that repeats itself so often is damaged.",
        ))
    }

    /// The table with these headers: tabs between cells, stamps on a clock so many seconds east of UTC, moved by
    /// `shift_s` (the interval's length where the case says that stamps mark the end); and which rows it came from.
    pub(super) fn table(
        self,
        file: &str,
        headers: &[String],
        offset_s: i32,
        shift_s: i64,
    ) -> Result<(String, Runs)> {
        let beyond = || Fault::new("a stamp lies beyond the calendar", file, "Ask for the readings again.");
        let offset = Offset::from_seconds(offset_s).map_err(|_beyond| beyond())?;
        let (sign, minutes) = (if offset_s < 0 { '-' } else { '+' }, offset_s.unsigned_abs() / 60);
        let east = format!("{sign}{:02}:{:02}", minutes / 60, minutes % 60);
        let mut text = String::from("time");
        for header in headers {
            text.push('\t');
            text.push_str(header);
        }
        text.push('\n');
        // The header stands for no row, so that it comes before the first row whatever the order of the file.
        let mut runs = vec![(1, 0)];
        for (table_row, ((start_s, _), Row { row, cells })) in (2..).zip(self.rows) {
            let at = Timestamp::from_second(start_s.saturating_add(shift_s)).map_err(|_beyond| beyond())?;
            let civil = offset.to_datetime(at);
            // Writing to a string cannot fail.
            let _ = write!(text, "{}T{}{east}", civil.date(), civil.time());
            for column in 0..headers.len() {
                text.push('\t');
                // Marks that would end the cell can only stand in text that is no number anyway.
                let cell = cells.get(column).and_then(Option::as_deref).unwrap_or("");
                text.extend(cell.chars().map(|c| if matches!(c, '\t' | '\n' | '"') { ' ' } else { c }));
            }
            text.push('\n');
            if runs.last().is_none_or(|(_, last)| *last != row) {
                runs.push((table_row, row));
            }
        }
        Ok((text, runs.into()))
    }
}
