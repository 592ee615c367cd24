//! Rows of a text table with the numbers that a person sees in a spreadsheet.

use std::io::{self, Read};
use std::rc::Rc;

use csv::ByteRecord;

use super::made::{self, Runs};
use crate::fault::Fault;

/// Most lines in a row: past them a quotation mark stands where it should not.
const MOST_LINES: usize = 100;

/// A table's rows, one after the other. Blank rows are passed over but counted.
pub(super) struct Rows<R> {
    reader: csv::Reader<R>,
    /// Line feeds inside quoted cells so far: a spreadsheet shows such a cell in one row.
    inside: u64,
    /// Where the rows stand for others: see [`super::made::Made::runs`].
    runs: Runs,
}

impl<R: Read> Rows<R> {
    /// The rows of a text whose lines end in line feeds, the last one too.
    pub(super) fn new(text: R, separator: u8) -> Self {
        let reader = csv::ReaderBuilder::new()
            .has_headers(false)
            .flexible(true)
            .delimiter(separator)
            .buffer_capacity(1 << 16)
            .from_reader(text);
        Self { reader, inside: 0, runs: Rc::new([]) }
    }

    /// The same rows with the numbers of the rows that they were made from.
    pub(super) fn numbered(self, runs: Runs) -> Self {
        Self { runs, ..self }
    }

    /// Reads the next row that is not blank and returns its number from 1; none at the end.
    pub(super) fn next(&mut self, record: &mut ByteRecord) -> csv::Result<Option<u64>> {
        if !self.reader.read_byte_record(record)? {
            return Ok(None);
        }
        // Few rows hold a line feed, and looking for one is quicker than counting.
        let cells = record.as_slice();
        let inside = if cells.contains(&b'\n') { cells.split(|byte| *byte == b'\n').count() - 1 } else { 0 };
        self.inside += inside as u64;
        // The reader stands behind this row's line feed.
        let row = self.reader.position().line().saturating_sub(1 + self.inside).max(1);
        if inside > MOST_LINES {
            return Err(io::Error::other(Fault::new(
                format!("a quotation mark opens a cell that runs over {inside} lines"),
                format!("row {row}"),
                "Remove the stray quotation mark in that row.",
            ))
            .into());
        }
        Ok(Some(made::row_in_file(&self.runs, row)))
    }

    /// The text being read.
    pub(super) fn text(&self) -> &R {
        self.reader.get_ref()
    }

    /// The text being read, to be told things.
    pub(super) fn text_mut(&mut self) -> &mut R {
        self.reader.get_mut()
    }

    /// The text being read, for good.
    pub(super) fn into_text(self) -> R {
        self.reader.into_inner()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn rows_are_numbered_as_a_spreadsheet_does() {
        let text = "a,b\n\n1,\"two\nlines\"\n\n\n3,4\n5,6\n";
        let mut rows = Rows::new(text.as_bytes(), b',');
        let mut record = ByteRecord::new();
        let mut seen = Vec::new();
        while let Some(row) = rows.next(&mut record).unwrap() {
            seen.push((row, String::from_utf8_lossy(&record[0]).into_owned()));
        }
        let expected = [(1, "a"), (3, "1"), (6, "3"), (7, "5")].map(|(row, cell)| (row, cell.to_owned()));
        assert_eq!(seen, expected);
    }
}
