//! Interval data in the records of NEM12, the format in which meter data travel in Australia's market.
//!
//! Source: AEMO, "Meter Data File Format Specification NEM12 & NEM13": 100 header, 200 data stream, 300 a day's values, 400
//! quality within a day, 500 manual reading, 900 end. Stamps are of market time, ten hours east of UTC the year round; the
//! first value of a day belongs to the interval that begins at 00:00.

use std::collections::BTreeMap;

use csv::ByteRecord;

use super::decode::{self, Decoded, text};
use super::made::{Made, Merge, Table};
use super::rows::Rows;
use super::stamp;
use super::unit::{self, Stated};
use super::{Finding, FindingKind};
use crate::case::Stamp;
use crate::fault::{Fault, Result, quote};

/// Market time (s east of UTC).
const MARKET_S: i32 = 10 * 3600;

/// A stream of values: one channel of one meter, by its interval's length.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord)]
struct Stream {
    minutes: i64,
    meter: String,
    suffix: String,
    unit: String,
}

/// A day being read: its values wait for the qualities that may follow.
struct Day {
    start_s: i64,
    row: u64,
    values: Vec<String>,
    quality: Vec<u8>,
}

#[derive(Default)]
struct Reading {
    file: String,
    streams: Vec<Stream>,
    /// One table for each length of interval, by minutes.
    tables: BTreeMap<i64, Merge>,
    current: Option<usize>,
    day: Option<Day>,
    values: u64,
    /// Values that are not measured, and the first row with one.
    stood_in: (u64, Option<u64>),
    nulls: (u64, Option<u64>),
    unknown: (u64, Option<u64>),
}

/// Reads the whole file into one table for each length of interval.
///
/// # Errors
/// If its records do not follow each other as they should, or hold no energy or power.
pub(super) fn tables(text: Decoded, mark: Stamp, findings: &mut Vec<Finding>) -> Result<Vec<Table>> {
    let mut rows = Rows::new(text, b',');
    let mut reading = Reading { file: rows.text().name().to_owned(), ..Reading::default() };
    let mut record = ByteRecord::new();
    let mut ended = false;
    let mut last = 1;
    while let Some(row) = rows.next(&mut record).map_err(|error| decode::row_fault(&error, &reading.file))? {
        rows.text_mut().row_done();
        last = row;
        match record.get(0).unwrap_or(b"") {
            b"200" => reading.stream(row, &record)?,
            b"300" => reading.day(row, &record)?,
            b"400" => reading.quality(row, &record)?,
            b"900" => ended = true,
            b"100" | b"500" => {}
            _ => count(&mut reading.unknown, row, 1),
        }
    }
    reading.settle()?;
    reading.findings((!ended).then_some(last), findings);
    reading.finish(mark, findings)
}

fn count(tally: &mut (u64, Option<u64>), row: u64, more: u64) {
    tally.0 += more;
    tally.1.get_or_insert(row);
}

impl Reading {
    fn fault(&self, row: u64, what: impl Into<String>) -> Fault {
        Fault::new(
            what,
            format!("{}, row {row}", self.file),
            "Ask for the file again, or for the readings as a text table (CSV).",
        )
    }

    fn stream(&mut self, row: u64, record: &ByteRecord) -> Result<()> {
        self.settle()?;
        let cell = |at: usize| record.get(at).map(text).unwrap_or_default();
        let length = cell(8);
        let minutes = length.parse().ok().filter(|minutes| (1..=60).contains(minutes) && 60 % minutes == 0);
        let Some(minutes) = minutes else {
            return Err(self.fault(
                row,
                format!("the length of an interval is {}, not one of 5, 15 or 30 minutes", quote(&length)),
            ));
        };
        let stream = Stream { minutes, meter: cell(1), suffix: cell(4), unit: cell(7) };
        let known = self.streams.iter().position(|known| *known == stream);
        if known.is_none() {
            if self.streams.len() == 256 {
                return Err(self.fault(row, "the file holds more than 256 data streams"));
            }
            self.streams.push(stream);
        }
        self.current = Some(known.unwrap_or(self.streams.len() - 1));
        Ok(())
    }

    fn day(&mut self, row: u64, record: &ByteRecord) -> Result<()> {
        self.settle()?;
        let Some(stream) = self.current.and_then(|at| self.streams.get(at)) else {
            return Err(
                self.fault(row, "a day's values (300) come before the data stream that they belong to (200)")
            );
        };
        let date = record.get(1).map(text).unwrap_or_default();
        let Some(days) = day_of(&date) else {
            return Err(self.fault(row, format!("the date {} is none", quote(&date))));
        };
        let wanted = (1440 / stream.minutes) as usize;
        let values: Vec<String> = record.iter().skip(2).take(wanted).map(text).collect();
        if values.len() < wanted {
            return Err(self.fault(
                row,
                format!("the day holds {} values of {wanted}: the record is cut off", values.len()),
            ));
        }
        let flag = record.get(2 + wanted).and_then(|cell| cell.first()).copied().unwrap_or(b'A');
        self.day = Some(Day {
            start_s: days * 86_400 - i64::from(MARKET_S),
            row,
            quality: vec![flag; wanted],
            values,
        });
        Ok(())
    }

    fn quality(&mut self, row: u64, record: &ByteRecord) -> Result<()> {
        let at = |cell: usize| record.get(cell).map(text).and_then(|text| text.parse::<usize>().ok());
        let flag = record.get(3).and_then(|cell| cell.first()).copied();
        match (&mut self.day, at(1), at(2), flag) {
            (Some(day), Some(from), Some(to), Some(flag))
                if from >= 1 && from <= to && to <= day.quality.len() =>
            {
                day.quality[from - 1..to].fill(flag);
                Ok(())
            }
            (None, ..) => {
                Err(self.fault(row, "a record of qualities (400) comes before any day's values (300)"))
            }
            _ => Err(self.fault(row, "the record of qualities (400) names no intervals of its day")),
        }
    }

    /// Takes over the day that waited for its qualities.
    fn settle(&mut self) -> Result<()> {
        let (Some(day), Some(at)) = (self.day.take(), self.current) else { return Ok(()) };
        let stream = &self.streams[at];
        if stream.header(false).is_none() {
            return Ok(());
        }
        let column = self.columns(stream.minutes).take_while(|other| *other != stream).count();
        let table = self.tables.entry(stream.minutes).or_default();
        for (i, (value, flag)) in (0..).zip(day.values.iter().zip(&day.quality)) {
            let start_s = day.start_s + i * stream.minutes * 60;
            let value = if *flag == b'N' {
                count(&mut self.nulls, day.row, 1);
                ""
            } else {
                value
            };
            if matches!(flag, b'E' | b'F' | b'S') {
                count(&mut self.stood_in, day.row, 1);
            }
            self.values += 1;
            table.put(&self.file, (start_s, column), day.row, value)?;
        }
        Ok(())
    }

    /// The streams that are columns of the table of this length.
    fn columns(&self, minutes: i64) -> impl Iterator<Item = &Stream> {
        self.streams.iter().filter(move |stream| stream.minutes == minutes && stream.header(false).is_some())
    }

    fn findings(&self, cut_at: Option<u64>, findings: &mut Vec<Finding>) {
        let mut tell = |kind, (count, first_row): (u64, Option<u64>), text: String, remedy: &str| {
            if count > 0 {
                findings.push(Finding {
                    kind,
                    count,
                    first_row,
                    file: self.file.clone(),
                    remedy: remedy.to_owned(),
                    text,
                    changes_figures: true,
                });
            }
        };
        let share = |count: u64| 100.0 * count as f64 / self.values.max(1) as f64;
        tell(
            FindingKind::Filled,
            self.stood_in,
            format!(
                "{} of {} values ({:.1} %) are estimated or substituted (quality E, F or S), not measured.",
                self.stood_in.0,
                self.values,
                share(self.stood_in.0)
            ),
            "used as they are",
        );
        tell(
            FindingKind::Ignored,
            self.nulls,
            format!(
                "{} values ({:.1} %) are marked as missing (quality N): they are gaps, whatever number stands there.",
                self.nulls.0,
                share(self.nulls.0)
            ),
            "left out",
        );
        tell(
            FindingKind::Ignored,
            self.unknown,
            format!("{} rows are no records of NEM12.", self.unknown.0),
            "left out",
        );
        tell(
            FindingKind::Gap,
            (u64::from(cut_at.is_some()), cut_at),
            "The file ends without its end record (900): what follows its last row may be missing."
                .to_owned(),
            "read up to its last row",
        );
    }

    fn finish(mut self, mark: Stamp, findings: &mut Vec<Finding>) -> Result<Vec<Table>> {
        let unused: Vec<String> = self
            .streams
            .iter()
            .filter(|stream| stream.header(false).is_none())
            .map(|stream| format!("{} ({})", stream.suffix, stream.unit))
            .collect();
        if self.tables.is_empty() {
            let held = if unused.is_empty() { "none".to_owned() } else { unused.join(", ") };
            return Err(Fault::new(
                format!("no data stream of the file is energy or power to or from the site; it holds {held}"),
                self.file,
                "Ask for the streams of active energy, such as E1 and B1.",
            ));
        }
        if !unused.is_empty() {
            findings.push(Finding {
                kind: FindingKind::Ignored,
                count: unused.len() as u64,
                first_row: None,
                file: self.file.clone(),
                remedy: "left out".to_owned(),
                text: format!("Data streams of other quantities are not used: {}.", unused.join(", ")),
                changes_figures: false,
            });
        }
        let meters = self.streams.iter().any(|stream| stream.meter != self.streams[0].meter);
        let words = "NEM12, market time (UTC+10)";
        std::mem::take(&mut self.tables)
            .into_iter()
            .map(|(minutes, merge)| {
                let headers: Vec<String> =
                    self.columns(minutes).filter_map(|stream| stream.header(meters)).collect();
                let shift_s = if mark == Stamp::End { minutes * 60 } else { 0 };
                let (text, runs) = merge.table(&self.file, &headers, MARKET_S, shift_s)?;
                let made = Made { words: words.to_owned(), runs, point: true, ..Made::default() };
                Ok((text, made))
            })
            .collect()
    }
}

impl Stream {
    /// The header of its column; none if it is no active energy or power, or of neither direction.
    ///
    /// AEMO, "National Metering Identifier Procedure", suffixes of interval data: E from the network (import), B into it
    /// (export), K and Q reactive.
    fn header(&self, with_meter: bool) -> Option<String> {
        let way = match self.suffix.bytes().next()?.to_ascii_uppercase() {
            b'E' => "import",
            b'B' => "export",
            _ => return None,
        };
        let Stated::Power(unit) = unit::unit_cell(&self.unit) else { return None };
        let meter = if with_meter { format!("{} ", self.meter) } else { String::new() };
        Some(format!("{meter}{} {way} [{}]", self.suffix, unit.label()))
    }
}

/// Days since 1970 of a date such as 20260131.
fn day_of(date: &str) -> Option<i64> {
    if date.len() != 8 || !date.bytes().all(|byte| byte.is_ascii_digit()) {
        return None;
    }
    stamp::days(date[..4].parse().ok()?, date[4..6].parse().ok()?, date[6..].parse().ok()?)
}
