//! How a text table is written: separator, header, units row and first row of values, decided on the file's head.

use csv::ByteRecord;

use super::decode::{HEAD, text};
use super::made;
use super::number::{self, Cell, Evidence, Marks};
use super::rows::Rows;
use super::shape;
use super::stamp;
use super::unit::{self, Stated};
use crate::case::{DateOrder, RecordCase};
use crate::fault::{Fault, Result, quote};

/// Rows of the head that are looked at.
const MOST_ROWS: usize = 2000;

/// Most columns.
const MOST_COLUMNS: usize = 4096;

/// How a table is written.
#[derive(Debug)]
pub(super) struct Dialect {
    pub(super) separator: u8,
    pub(super) marks: Marks,
    pub(super) thousands: Option<char>,
    pub(super) header_row: Option<u64>,
    pub(super) unit_row: Option<u64>,
    pub(super) first_row: u64,
    /// Headers as in the file, "column 3" where there is none.
    pub(super) headers: Vec<String>,
    /// Units from the units row or the header.
    pub(super) units: Vec<Stated>,
    /// Rows of values in the head with their row numbers.
    pub(super) rows: Vec<(u64, ByteRecord)>,
    /// Columns that name the channel of a row.
    pub(super) names: Vec<usize>,
    /// What stands above the headers.
    pub(super) preamble: String,
}

/// What a cell looks like before the decimal mark is known.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Look {
    Empty,
    Stamp,
    Clock,
    Number,
    Other,
}

pub(super) const POINT: Marks = Marks { decimal: b'.', thousands: Some(b','), mixed: false };
const COMMA: Marks = Marks { decimal: b',', thousands: Some(b'.'), mixed: false };

/// Reads a stamp by whichever order makes a date of it.
pub(super) fn any_stamp(cell: &[u8]) -> Option<stamp::Written> {
    [DateOrder::DayFirst, DateOrder::MonthFirst, DateOrder::YearFirst]
        .iter()
        .find_map(|order| stamp::stamp(cell, *order))
}

pub(super) fn look(cell: &[u8]) -> Look {
    let cell = number::trim(cell);
    if cell.is_empty() {
        Look::Empty
    } else if any_stamp(cell).is_some() {
        Look::Stamp
    } else if [POINT, COMMA].iter().any(|marks| matches!(number::parse(cell, *marks), Cell::Number(_))) {
        Look::Number
    } else if stamp::time_of_day(cell).is_some() {
        Look::Clock
    } else {
        Look::Other
    }
}

fn comment(record: &ByteRecord) -> bool {
    record.get(0).is_some_and(|cell| cell.starts_with(b"#") || cell.starts_with(b"//"))
}

/// Whether every cell is blank.
pub(super) fn blank(record: &ByteRecord) -> bool {
    record.iter().all(|cell| number::trim(cell).is_empty())
}

/// Whether a row is a comment: it is passed over.
pub(super) fn is_comment(record: &ByteRecord) -> bool {
    comment(record)
}

/// Decides how the table named `name` is written.
pub(super) fn decide(name: &str, head: &[u8], terms: &RecordCase) -> Result<Dialect> {
    // The last row of a longer file may be cut off.
    let head = if head.len() >= HEAD {
        head.iter().rposition(|byte| *byte == b'\n').map_or(head, |end| &head[..=end])
    } else {
        head
    };
    let separator =
        terms.separator.and_then(|mark| u8::try_from(mark).ok()).unwrap_or_else(|| separator(head));
    let rows = rows(name, head, separator)?;
    if rows.iter().all(|(_, record)| blank(record)) {
        return Err(Fault::new("the file holds no text", name, "Choose the file that holds the readings."));
    }
    let widest = rows.iter().map(|(_, record)| record.len()).max().unwrap_or(0);
    if widest > MOST_COLUMNS {
        return Err(Fault::new(
            format!("a row has {widest} columns, more than {MOST_COLUMNS}"),
            name,
            "Choose a table with one row per reading.",
        ));
    }
    let looks: Vec<Vec<Look>> = rows.iter().map(|(_, record)| record.iter().map(look).collect()).collect();
    let pattern = pattern(&looks);
    let fits = |i: usize| fits(&looks[i], &pattern);
    let usable = |i: usize| !comment(&rows[i].1);
    let first = (0..rows.len()).find(|i| {
        usable(*i)
            && fits(*i)
            && (i + 1..rows.len()).find(|next| usable(*next) && !blank(&rows[*next].1)).is_none_or(fits)
    });
    let Some(first) = first else {
        return Err(no_values(name, &rows));
    };
    let (header, units_row) = header(&rows, first, pattern.len());
    let mut headers: Vec<String> = match header {
        Some(row) => rows[row]
            .1
            .iter()
            .map(|cell| text(cell).trim_start_matches('#').trim().replace(['\n', '\r'], " "))
            .collect(),
        None => Vec::new(),
    };
    if let Some(row) = header {
        joined_from_above(&rows, row, &mut headers);
    }
    let mut width =
        rows[first..].iter().map(|(_, record)| record.len()).max().unwrap_or(0).max(headers.len());
    // A separator at the end of every row makes no column.
    while width > 0
        && headers.get(width - 1).is_none_or(String::is_empty)
        && rows[first..]
            .iter()
            .all(|(_, record)| record.get(width - 1).is_none_or(|cell| number::trim(cell).is_empty()))
    {
        width -= 1;
    }
    headers.truncate(width);
    if separator == b',' && header.is_some() && headers.len() >= 2 {
        let (row, record) = &rows[first];
        let filled = record.iter().take(width).filter(|cell| !cell.is_empty()).count();
        if filled > headers.len() && width >= 2 * headers.len() - 1 {
            return Err(Fault::new(
                format!(
                    "the row has {filled} cells under {} headers: decimal commas cannot be told from commas between cells",
                    headers.len()
                ),
                format!("{name}, row {row}"),
                "Export the table with semicolons between cells, or with decimal points.",
            ));
        }
    }
    for i in 0..width {
        match headers.get_mut(i) {
            Some(header) if header.is_empty() => *header = format!("column {}", i + 1),
            Some(_) => {}
            None => headers.push(format!("column {}", i + 1)),
        }
    }
    let units = (0..width)
        .map(|i| {
            let below = units_row
                .and_then(|row| rows[row].1.get(i))
                .map_or(Stated::Nothing, |cell| unit::unit_cell(&text(cell)));
            if below == Stated::Nothing { unit::unit_of(&headers[i]) } else { below }
        })
        .collect();
    // Column by column, since whole numbers in one say nothing of the marks in another.
    let mut evidence = Evidence::default();
    let mut of_column: Vec<Evidence> = vec![Evidence::default(); width];
    for i in first..rows.len() {
        for ((cell, look), of_column) in rows[i].1.iter().zip(&looks[i]).zip(&mut of_column) {
            if *look == Look::Number {
                of_column.add(cell);
            }
        }
    }
    for of_column in &of_column {
        evidence.join(of_column);
    }
    let (marks, _) = evidence.decide(terms.decimal);
    let preamble = rows[..header.unwrap_or(first)]
        .iter()
        .take(20)
        .flat_map(|(_, record)| record.iter().map(text))
        .collect::<Vec<_>>()
        .join(" ");
    let numbers = rows.iter().map(|(row, _)| *row).collect::<Vec<_>>();
    let rows =
        rows.into_iter().skip(first).filter(|(_, record)| !blank(record) && !comment(record)).collect();
    Ok(Dialect {
        separator,
        marks,
        thousands: evidence.thousands(marks),
        header_row: header.map(|row| numbers[row]),
        unit_row: units_row.map(|row| numbers[row]),
        first_row: numbers[first],
        headers,
        units,
        rows,
        names: Vec::new(),
        preamble,
    })
}

/// Headers in two rows, the upper one over several columns ("Load" over "kW" and "status"): where the lower row alone names
/// columns alike, the name above goes before, carried over the empty cells to its right.
fn joined_from_above(rows: &[(u64, ByteRecord)], row: usize, headers: &mut [String]) {
    let Some(above) = row.checked_sub(1).map(|above| &rows[above].1) else { return };
    let names = above.iter().filter(|cell| look(cell) == Look::Other).count();
    let filled = above.iter().filter(|cell| look(cell) != Look::Empty).count();
    let alike =
        |header: &String| !header.is_empty() && headers.iter().filter(|other| *other == header).count() > 1;
    if names < 2 || names < filled || above.len() + 1 < headers.len() || !headers.iter().any(alike) {
        return;
    }
    let mut name = String::new();
    for (i, header) in headers.iter_mut().enumerate() {
        let cell = above.get(i).map(text).unwrap_or_default();
        if !cell.trim().is_empty() {
            cell.trim().clone_into(&mut name);
        }
        if !name.is_empty() {
            format!("{name} {header}").trim().clone_into(header);
        }
    }
}

impl Dialect {
    /// Numbers the rows as those of the file that the table was made from; all of them are rows of values.
    pub(super) fn renumber(&mut self, runs: &[(u64, u64)]) {
        (self.header_row, self.unit_row, self.first_row) = (None, None, 1);
        for (row, _) in &mut self.rows {
            *row = made::row_in_file(runs, *row);
        }
    }
}

fn rows(name: &str, head: &[u8], separator: u8) -> Result<Vec<(u64, ByteRecord)>> {
    let mut reader = Rows::new(head, separator);
    let mut found = Vec::new();
    let mut record = ByteRecord::new();
    while found.len() < MOST_ROWS
        && let Some(row) = reader.next(&mut record).map_err(|error| super::decode::row_fault(&error, name))?
    {
        found.push((row, record.clone()));
    }
    Ok(found)
}

/// The mark that splits most rows into the same number of cells; a comma only if no other does, since it may be decimal.
fn separator(head: &[u8]) -> u8 {
    let lines: Vec<&[u8]> = head
        .split(|byte| *byte == b'\n')
        .filter(|line| !line.trim_ascii().is_empty() && !line.starts_with(b"#"))
        .take(200)
        .collect();
    let lines = &lines[lines.len() / 3..];
    let mut best = (0.0, b',');
    for mark in [b';', b'\t', b'|'] {
        let mut counts: Vec<usize> =
            lines.iter().map(|line| outside_quotes(line, mark)).filter(|count| *count > 0).collect();
        counts.sort_unstable();
        let most = counts.chunk_by(|a, b| a == b).map(|run| (run.len(), run[0])).max().unwrap_or((0, 0));
        let share = most.0 as f64 / lines.len().max(1) as f64;
        if share >= 0.5 && share * most.1 as f64 > best.0 {
            best = (share * most.1 as f64, mark);
        }
    }
    best.1
}

fn outside_quotes(line: &[u8], mark: u8) -> usize {
    let mut quoted = false;
    let mut count = 0;
    for byte in line {
        if *byte == b'"' {
            quoted = !quoted;
        } else if *byte == mark && !quoted {
            count += 1;
        }
    }
    count
}

/// What the columns of values look like, from the later half of the head.
fn pattern(looks: &[Vec<Look>]) -> Vec<Look> {
    let later = &looks[looks.len() / 2..];
    let mut widths: Vec<usize> = later.iter().map(Vec::len).collect();
    widths.sort_unstable();
    let width = widths.chunk_by(|a, b| a == b).map(|run| (run.len(), run[0])).max().map_or(0, |most| most.1);
    (0..width)
        .map(|column| {
            let count = |look: Look| later.iter().filter(|row| row.get(column) == Some(&look)).count();
            let found = [Look::Stamp, Look::Clock, Look::Number].map(|look| (count(look), look));
            let most =
                found.iter().rev().max_by_key(|(count, _)| *count).copied().unwrap_or((0, Look::Other));
            if most.0 * 5 >= later.len() && most.0 > 0 { most.1 } else { Look::Other }
        })
        .collect()
}

/// Whether a row is one of values: its stamp (if the table has any) reads and most other cells look like the column.
fn fits(row: &[Look], pattern: &[Look]) -> bool {
    let timed = pattern.contains(&Look::Stamp);
    let mut right = 0;
    let mut wrong = 0;
    let mut stamped = false;
    for (look, wanted) in row.iter().zip(pattern) {
        match (look, wanted) {
            (_, Look::Other | Look::Empty) | (Look::Empty, _) => {}
            (look, wanted) if look == wanted => {
                right += 1;
                stamped |= *wanted == Look::Stamp;
            }
            (Look::Stamp | Look::Number, Look::Number | Look::Stamp) => right += 1,
            _ => wrong += 1,
        }
    }
    right > 0 && (stamped || (!timed && right > wrong))
}

/// Rows of the header and of the units above the first row of values.
fn header(rows: &[(u64, ByteRecord)], first: usize, width: usize) -> (Option<usize>, Option<usize>) {
    let filled = |row: usize| rows[row].1.iter().filter(|cell| !number::trim(cell).is_empty()).count();
    let day = |row: usize| {
        let cells: Vec<String> = rows[row].1.iter().map(text).collect();
        shape::heads(cells.iter().map(String::as_str))
    };
    let heads = |row: usize| {
        let count = filled(row);
        let numbers =
            rows[row].1.iter().filter(|cell| matches!(look(cell), Look::Number | Look::Stamp)).count();
        rows[row].1.len() + 1 >= width
            && count >= 1
            && (count * 2 >= width || width <= 2)
            && (numbers * 2 <= count || day(row))
    };
    let above: Vec<usize> =
        (0..first).rev().filter(|row| !blank(&rows[*row].1) && !comment(&rows[*row].1)).collect();
    let units = |row: usize| {
        let cells = || rows[row].1.iter().map(text);
        cells().all(|cell| unit::in_unit_row(&cell))
            && cells().any(|cell| unit::unit_cell(&cell) != Stated::Nothing)
    };
    match above[..] {
        [unit, header, ..] if units(unit) && heads(header) => (Some(header), Some(unit)),
        [header, ..] if heads(header) => (Some(header), None),
        // A header marked as a comment.
        _ if first > 0 && comment(&rows[first - 1].1) && heads(first - 1) => (Some(first - 1), None),
        _ => (None, None),
    }
}

#[cold]
fn no_values(name: &str, rows: &[(u64, ByteRecord)]) -> Fault {
    let shown = rows.iter().find(|(_, record)| !blank(record));
    let (row, line) = shown.map_or((1, String::new()), |(row, record)| {
        (*row, record.iter().map(text).collect::<Vec<_>>().join(" "))
    });
    Fault::new(
        format!("no row of the file holds a stamp and a number; it begins {}", quote(&line)),
        format!("{name}, row {row}"),
        "Choose a table with one row per reading: a stamp and numbers, columns separated by comma, semicolon, tab or bar.",
    )
}
