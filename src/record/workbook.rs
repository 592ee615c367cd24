//! Workbooks to text tables: one for each sheet, whose row n is the sheet's row n.
//!
//! Nothing of the record is decided here: dates become written dates, everything else the text that it is, and the reader of text
//! tables does the rest.

use std::io::Cursor;

use calamine::{Data, Dimensions, ExcelDateTime, Ods, Reader, Sheets, Xls, Xlsx};

use super::{WorkbookSheet, stamp};
use crate::fault::{Fault, Result};

/// Most bytes of text that a workbook may become.
const MOST_TEXT: usize = 256 << 20;

/// Most rows above the readings within which merged cells are filled.
const MOST_HEADER_ROWS: u32 = 50;

/// Most cells that are filled so.
const MOST_FILLED: usize = 4096;

/// Turns the sheets of a workbook (.xlsx, .xls, .ods) into text tables.
///
/// # Errors
/// If the bytes are no workbook that can be read, if it is locked by a password, or grows too large as text. The fault's place
/// is left to the caller, who knows the file's name.
pub fn workbook_sheets(bytes: Vec<u8>) -> Result<Vec<WorkbookSheet>> {
    let mut book = open(bytes)?;
    let names = book.sheet_names();
    let mut left = MOST_TEXT;
    names.into_iter().map(|name| sheet(&mut book, name, &mut left)).collect()
}

fn open(bytes: Vec<u8>) -> Result<Sheets<Cursor<Vec<u8>>>> {
    let holds = |part: &[u8], within: &[u8]| within.windows(part.len()).any(|window| window == part);
    let compound = !bytes.starts_with(b"PK");
    // A locked workbook is a container around its sealed package (Microsoft, [MS-OFFCRYPTO]).
    let sealed: Vec<u8> = "EncryptedPackage".encode_utf16().flat_map(u16::to_le_bytes).collect();
    if compound && holds(&sealed, &bytes) {
        return Err(broken("password"));
    }
    // The first entry of an OpenDocument file is its mimetype.
    let is_open_document = bytes.get(30..38) == Some(b"mimetype");
    let bytes = Cursor::new(bytes);
    if compound {
        Xls::new(bytes).map(Sheets::Xls).map_err(|error| broken(&error.to_string()))
    } else if is_open_document {
        Ods::new(bytes).map(Sheets::Ods).map_err(|error| broken(&error.to_string()))
    } else {
        Xlsx::new(bytes).map(Sheets::Xlsx).map_err(|error| broken(&error.to_string()))
    }
}

fn sheet(book: &mut Sheets<Cursor<Vec<u8>>>, name: String, left: &mut usize) -> Result<WorkbookSheet> {
    let merged = merged(book, &name);
    let mut lines = Lines {
        text: Vec::new(),
        row: 0,
        column: 0,
        numbers: 0,
        left: *left,
        merged,
        held: Vec::new(),
        filled: false,
    };
    if let Sheets::Xlsx(book) = book {
        // Cell by cell: a sheet with one cell in its far corner costs no more than that.
        let mut cells = match book.worksheet_cells_reader(&name) {
            Ok(cells) => cells,
            // A chart is a sheet without cells.
            Err(_no_cells) => return Ok(WorkbookSheet { name, ..WorkbookSheet::default() }),
        };
        while let Some(cell) = cells.next_cell().map_err(|error| broken(&error.to_string()))? {
            lines.cell(cell.get_position(), &value(cell.get_value().clone().into()))?;
        }
    } else {
        let range = match book.worksheet_range(&name) {
            Ok(range) => range,
            Err(_no_cells) => return Ok(WorkbookSheet { name, ..WorkbookSheet::default() }),
        };
        let (top, leftmost) = range.start().unwrap_or((0, 0));
        for (row, column, cell) in range.used_cells() {
            let at = (top.saturating_add(row as u32), leftmost.saturating_add(column as u32));
            lines.cell(at, &value(cell.clone()))?;
        }
    }
    lines.release()?;
    *left = lines.left;
    if !lines.text.is_empty() {
        lines.text.push(b'\n');
    }
    let note = if lines.filled { "merged header cells filled" } else { "" };
    Ok(WorkbookSheet { name, text: lines.text, note: note.to_owned(), numbers: lines.numbers })
}

/// The merged ranges of a sheet; none for the formats whose reader does not tell.
fn merged(book: &mut Sheets<Cursor<Vec<u8>>>, name: &str) -> Vec<Dimensions> {
    match book {
        Sheets::Xlsx(book) => book.merge_cells_by_sheet_name(name).unwrap_or_default(),
        Sheets::Xls(book) => book.merge_cells_by_sheet_name(name).unwrap_or_default(),
        _ => Vec::new(),
    }
}

/// What a cell holds.
enum Value {
    Empty,
    Number(f64),
    Stamp(String),
    Text(String),
}

fn value(cell: Data) -> Value {
    match cell {
        Data::Empty => Value::Empty,
        Data::Int(whole) => Value::Number(whole as f64),
        Data::Float(number) => Value::Number(number),
        Data::Bool(is) => Value::Text(if is { "TRUE" } else { "FALSE" }.to_owned()),
        Data::DateTime(moment) => Value::Stamp(written(moment)),
        Data::DateTimeIso(text) => Value::Stamp(text),
        Data::DurationIso(text) => Value::Stamp(clock(&text).unwrap_or(text)),
        Data::Error(error) => Value::Text(error.to_string()),
        Data::String(text) => Value::Text(text),
    }
}

/// `2026-01-31 00:15:00`, or `00:15:00` where there is no day. Serial days are binary fractions: what lies a few milliseconds
/// beside a whole second is that second.
fn written(moment: ExcelDateTime) -> String {
    let serial = moment.as_f64();
    let seconds = libm::round(serial * 86_400.0);
    if moment.is_duration() || (0.0..1.0).contains(&serial) {
        let seconds =
            if (0.0..360_000.0).contains(&seconds) { seconds as u64 } else { return serial.to_string() };
        return format!("{:02}:{:02}:{:02}", seconds / 3600, seconds / 60 % 60, seconds % 60);
    }
    let (year, month, day, hour, minute, second, milli) = moment.to_ymd_hms_milli();
    let near = milli <= 20 || milli >= 980;
    let civil = stamp::days(year.into(), month.into(), day.into()).and_then(|days| {
        let clock = i64::from(hour) * 3600 + i64::from(minute) * 60 + i64::from(second);
        let second = days * 86_400 + clock + i64::from(milli >= 980);
        jiff::Timestamp::from_second(second).ok().map(|at| jiff::tz::Offset::UTC.to_datetime(at))
    });
    match civil {
        Some(civil) => {
            let fraction = if near { String::new() } else { format!(".{milli:03}") };
            format!("{} {}{fraction}", civil.date(), civil.time())
        }
        // The day that spreadsheets believe 1900 to have had stays the number that it is.
        None => serial.to_string(),
    }
}

/// The time of day of an ISO duration such as PT06H15M00S.
fn clock(text: &str) -> Option<String> {
    let (hours, rest) = text.strip_prefix("PT")?.split_once('H')?;
    let (minutes, seconds) = rest.split_once('M')?;
    let (hours, minutes) = (hours.parse::<u32>().ok()?, minutes.parse::<u32>().ok()?);
    let seconds = seconds.trim_end_matches('S').split(['.', ',']).next()?.parse::<u32>().ok()?;
    Some(format!("{hours:02}:{minutes:02}:{seconds:02}"))
}

/// A sheet being written, cells coming by rows and columns.
struct Lines {
    text: Vec<u8>,
    row: u32,
    column: u32,
    numbers: u64,
    left: usize,
    /// Merged ranges still open.
    merged: Vec<Dimensions>,
    /// Rows of texts alone, above the readings: held until it is known that merged cells among them head columns.
    held: Vec<(u32, u32, String)>,
    filled: bool,
}

impl Lines {
    fn cell(&mut self, (row, column): (u32, u32), value: &Value) -> Result<()> {
        let text = match value {
            Value::Empty => return Ok(()),
            Value::Number(number) => {
                self.numbers += 1;
                number.to_string()
            }
            Value::Stamp(text) | Value::Text(text) => text.clone(),
        };
        if !self.merged.is_empty() {
            if matches!(value, Value::Text(_)) && row < MOST_HEADER_ROWS {
                self.held.push((row, column, text));
                return Ok(());
            }
            self.head(row)?;
        }
        self.write(row, column, &text)
    }

    /// Writes the held header cells, each in all of its merged range above the first row of values.
    fn head(&mut self, first: u32) -> Result<()> {
        let merged = std::mem::take(&mut self.merged);
        let mut cells = std::mem::take(&mut self.held);
        let later: Vec<_> = cells.extract_if(.., |(row, ..)| *row >= first).collect();
        let mut more = Vec::new();
        for (row, column, text) in &cells {
            let Some(range) = merged.iter().find(|range| range.start == (*row, *column)) else { continue };
            let bottom = range.end.0.min(first.saturating_sub(1)).min(MOST_HEADER_ROWS);
            let right = range.end.1.min(column + 255);
            for r in *row..=bottom {
                for c in *column..=right {
                    if (r, c) != (*row, *column) && more.len() < MOST_FILLED {
                        more.push((r, c, text.clone()));
                    }
                }
            }
        }
        self.filled = !more.is_empty();
        cells.extend(more);
        cells.sort();
        cells.extend(later);
        for (row, column, text) in cells {
            self.write(row, column, &text)?;
        }
        Ok(())
    }

    /// At the end of a sheet of texts alone.
    fn release(&mut self) -> Result<()> {
        if self.held.is_empty() { Ok(()) } else { self.head(u32::MAX) }
    }

    fn write(&mut self, row: u32, column: u32, text: &str) -> Result<()> {
        if (row, column) < (self.row, self.column) {
            return Err(broken("its cells do not follow each other by rows and columns"));
        }
        let lines = (row - self.row) as usize;
        if lines > 0 {
            (self.row, self.column) = (row, 0);
        }
        let tabs = (column - self.column) as usize;
        self.column = column;
        let quoted = text.contains('"');
        self.left = self.left.checked_sub(lines + tabs + text.len()).ok_or_else(|| {
            Fault::new(
                format!("the workbook is more than {} MB of text", MOST_TEXT >> 20),
                "",
                "Save the sheet with the readings as CSV and choose that file.",
            )
        })?;
        self.text.resize(self.text.len() + lines, b'\n');
        self.text.resize(self.text.len() + tabs, b'\t');
        // A cell is one line of a table: breaks within it become spaces.
        let bytes = text.bytes().map(|byte| if matches!(byte, b'\t' | b'\n' | b'\r') { b' ' } else { byte });
        if quoted {
            self.text.push(b'"');
            for byte in bytes {
                self.text.extend(std::iter::repeat_n(byte, if byte == b'"' { 2 } else { 1 }));
            }
            self.text.push(b'"');
        } else {
            self.text.extend(bytes);
        }
        Ok(())
    }
}

#[cold]
fn broken(why: &str) -> Fault {
    if why.contains("assword") {
        return Fault::new(
            "the workbook is locked by a password",
            "",
            "Save it without a password, or save the sheet with the readings as CSV.",
        );
    }
    Fault::new(
        format!("the workbook cannot be read: {why}"),
        "",
        "Open it in a spreadsheet program, save the sheet with the readings as CSV and choose that file.",
    )
}
