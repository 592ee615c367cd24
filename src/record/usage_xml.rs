//! Usage data in XML: an Atom feed of usage points, meter readings, reading types and interval blocks.
//!
//! Source: NAESB REQ.21, Energy Services Provider Interface (ESPI). What is read: the values of `IntervalReading` (start in
//! seconds since 1970 in UTC, duration, integer value), and of `ReadingType` the unit (`uom` 72 Wh, 38 W), the power of ten, the
//! direction (1 forward, to the customer; 19 reverse; 4 net) and whether values are a register's (`accumulationBehaviour`). Entries
//! name each other by the addresses of their links. The codes were taken down from memory of the standard's tables.

use std::collections::BTreeMap;
use std::io::{self, BufRead, BufReader, Read};

use quick_xml::Reader;
use quick_xml::events::{BytesStart, Event};

use super::decode::{self, Decoded};
use super::made::{Made, Merge, Table};
use super::{Finding, FindingKind};
use crate::case::Stamp;
use crate::fault::{Fault, Result, quote};

/// Most interval readings that are held.
const MOST_READINGS: usize = 8 << 20;
/// Most entries of the feed.
const MOST_ENTRIES: usize = 1 << 20;
/// Deepest nesting of elements.
const DEEPEST: usize = 64;
/// Longest text of an element that is kept.
const LONGEST_TEXT: usize = 4096;

/// One value.
struct Value {
    start_s: i64,
    duration_s: i64,
    amount: i64,
}

/// What an entry of the feed is.
#[derive(Default)]
struct Entry {
    own: String,
    up: String,
    related: Vec<String>,
    content: Content,
}

#[derive(Default)]
enum Content {
    #[default]
    Other,
    MeterReading,
    ReadingType(ReadingType),
    /// Readings from this one on (from 0), up to that one.
    Block(usize, usize),
}

#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
struct ReadingType {
    unit: Option<i64>,
    power_of_ten: i64,
    direction: Option<i64>,
    accumulation: i64,
    length_s: Option<i64>,
}

#[derive(Default)]
struct Feed {
    entries: Vec<Entry>,
    values: Vec<Value>,
    /// Readings of estimated quality.
    estimated: u64,
    /// Offset of standard time (s east of UTC), if the feed states it.
    offset_s: Option<i32>,
    entry: Entry,
    block: Option<usize>,
    value: (Option<i64>, Option<i64>, Option<i64>),
    in_period: bool,
}

/// The text as the XML reader takes it: all that is read here is ASCII, so other characters become question marks and
/// nobody has to decide again how they were written.
struct Text(Decoded);

impl Read for Text {
    fn read(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
        let count = self.0.read(buffer)?;
        for byte in &mut buffer[..count] {
            if !byte.is_ascii() {
                *byte = b'?';
            }
        }
        Ok(count)
    }
}

/// Reads the whole feed into one table.
///
/// # Errors
/// If it is no well-formed feed, or does not say what its values are.
pub(super) fn tables(text: Decoded, mark: Stamp, findings: &mut Vec<Finding>) -> Result<Vec<Table>> {
    let name = text.name().to_owned();
    let mut text = BufReader::with_capacity(1 << 16, Text(text));
    // The declaration names the encoding that the file had before it was decoded.
    let declared = text.fill_buf().is_ok_and(|begins| begins.trim_ascii_start().starts_with(b"<?xml"));
    let passed = if declared { text.skip_until(b'>').map(|_| ()) } else { Ok(()) };
    let mut reader = Reader::from_reader(text);
    let mut feed = Feed::default();
    passed.map_err(|error| decode::fault(&error, &name, true))?;
    feed.read(&mut reader, &name)?;
    feed.table(&name, mark, findings).map(|table| vec![table])
}

impl Feed {
    fn read(&mut self, reader: &mut Reader<BufReader<Text>>, file: &str) -> Result<()> {
        let mut path: Vec<String> = Vec::new();
        let mut buffer = Vec::new();
        let mut text = String::new();
        loop {
            buffer.clear();
            let event = reader.read_event_into(&mut buffer).map_err(|error| broken(&error, file))?;
            match event {
                Event::Start(start) => {
                    if path.len() == DEEPEST {
                        return Err(Fault::new(
                            format!("elements are nested more than {DEEPEST} deep"),
                            file,
                            "Ask for the readings again, or as a text table (CSV).",
                        ));
                    }
                    self.begin(&start);
                    path.push(start.local_name().into_inner().to_owned());
                    text.clear();
                }
                Event::Empty(start) => {
                    self.begin(&start);
                    self.link(&start);
                }
                Event::End(_) => {
                    let name = path.pop().unwrap_or_default();
                    self.end(file, &name, text.trim())?;
                    text.clear();
                }
                Event::Text(more) if text.len() < LONGEST_TEXT => text.push_str(&more.into_inner()),
                Event::DocType(_) => {
                    return Err(Fault::new(
                        "the file defines its own entities (DOCTYPE), which usage data have no need of",
                        file,
                        "Ask for the readings again, or as a text table (CSV).",
                    ));
                }
                Event::Eof if path.is_empty() => return Ok(()),
                Event::Eof => {
                    return Err(Fault::new(
                        format!(
                            "the file is cut off within the element {}",
                            quote(path.last().map_or("", String::as_str))
                        ),
                        file,
                        "Copy or download the file again and choose the copy.",
                    ));
                }
                _ => {}
            }
            reader.get_mut().get_mut().0.row_done();
        }
    }

    fn begin(&mut self, start: &BytesStart) {
        match start.local_name().into_inner() {
            "entry" => self.entry = Entry::default(),
            "link" => self.link(start),
            "MeterReading" => self.entry.content = Content::MeterReading,
            "ReadingType" => self.entry.content = Content::ReadingType(ReadingType::default()),
            "IntervalBlock" if self.block.is_none() => self.block = Some(self.values.len()),
            "IntervalReading" => self.value = (None, None, None),
            // A block's own span is called interval, that of a reading timePeriod.
            "timePeriod" => self.in_period = true,
            _ => {}
        }
    }

    fn link(&mut self, start: &BytesStart) {
        if start.local_name().into_inner() != "link" {
            return;
        }
        let attribute = |name: &str| {
            start
                .attributes()
                .flatten()
                .find(|found| found.key.into_inner() == name)
                .map(|found| found.value.trim().trim_end_matches('/').to_owned())
        };
        let Some(to) = attribute("href") else { return };
        match attribute("rel").as_deref() {
            Some("self") => self.entry.own = to,
            Some("up") => self.entry.up = to,
            // A start tag and an empty one both come here once; a hostile feed may repeat links without end.
            Some("related") if self.entry.related.len() < 64 => self.entry.related.push(to),
            _ => {}
        }
    }

    fn end(&mut self, file: &str, name: &str, text: &str) -> Result<()> {
        let number = || text.parse::<i64>().ok();
        if let Content::ReadingType(kind) = &mut self.entry.content {
            match name {
                "uom" => kind.unit = number(),
                "powerOfTenMultiplier" => kind.power_of_ten = number().unwrap_or(0),
                "flowDirection" => kind.direction = number(),
                "accumulationBehaviour" => kind.accumulation = number().unwrap_or(0),
                "intervalLength" => kind.length_s = number(),
                _ => {}
            }
        }
        match name {
            "start" if self.in_period => self.value.0 = number(),
            "duration" if self.in_period => self.value.1 = number(),
            "timePeriod" => self.in_period = false,
            "value" if self.block.is_some() => self.value.2 = number(),
            "quality" if self.block.is_some() => {
                // 8 and 9: estimated by a reference day, by a line; 12: projected.
                self.estimated += u64::from(matches!(number(), Some(8 | 9 | 12)));
            }
            "tzOffset" => {
                self.offset_s = number().and_then(|s| i32::try_from(s).ok()).filter(|s| s.abs() < 54_000);
            }
            "IntervalReading" => {
                if self.values.len() == MOST_READINGS {
                    return Err(Fault::new(
                        format!("the file holds more than {} million readings", MOST_READINGS >> 20),
                        file,
                        "Cut the file into shorter spans.",
                    ));
                }
                let (start_s, duration_s, value) = self.value;
                let (Some(start_s), Some(duration_s), Some(value)) = (start_s, duration_s.or(Some(0)), value)
                else {
                    return Err(Fault::new(
                        "an interval reading lacks its start or its value",
                        format!("{file}, reading {}", self.values.len() + 1),
                        "Ask for the readings again, or as a text table (CSV).",
                    ));
                };
                self.values.push(Value { start_s, duration_s, amount: value });
            }
            "entry" => {
                if let Some(from) = self.block.take() {
                    self.entry.content = Content::Block(from, self.values.len());
                }
                if self.entries.len() == MOST_ENTRIES {
                    return Err(Fault::new(
                        "the feed holds more than a million entries",
                        file,
                        "Cut the file into shorter spans.",
                    ));
                }
                self.entries.push(std::mem::take(&mut self.entry));
            }
            _ => {}
        }
        Ok(())
    }

    /// The series of each block: the meter reading that it belongs to, and that one's reading type.
    fn types(&self) -> Vec<(usize, usize, Option<ReadingType>)> {
        let readings: Vec<&Entry> =
            self.entries.iter().filter(|entry| matches!(entry.content, Content::MeterReading)).collect();
        let mut kinds: BTreeMap<&str, ReadingType> = BTreeMap::new();
        let mut all = Vec::new();
        for entry in &self.entries {
            if let Content::ReadingType(kind) = entry.content {
                kinds.insert(&entry.own, kind);
                all.push(kind);
            }
        }
        let of_reading = |entry: &Entry| entry.related.iter().find_map(|to| kinds.get(to.as_str()).copied());
        let mut by_address: BTreeMap<&str, Option<ReadingType>> = BTreeMap::new();
        for reading in &readings {
            by_address.insert(&reading.own, of_reading(reading));
            for to in &reading.related {
                by_address.entry(to).or_insert_with(|| of_reading(reading));
            }
        }
        // One type for all needs no links.
        let only = match all[..] {
            [first, ref rest @ ..] if rest.iter().all(|kind| *kind == first) => Some(first),
            _ => None,
        };
        let mut found = Vec::new();
        for entry in &self.entries {
            if let Content::Block(from, to) = entry.content {
                let above = entry.up.rsplit_once('/').map_or("", |(above, _)| above);
                let kind =
                    by_address.get(entry.up.as_str()).or_else(|| by_address.get(above)).copied().flatten();
                found.push((from, to, kind.or(only)));
            }
        }
        found
    }

    fn table(&self, file: &str, mark: Stamp, findings: &mut Vec<Finding>) -> Result<Table> {
        let ask = "Ask for the readings with their reading types, or as a text table (CSV).";
        if self.values.is_empty() {
            return Err(Fault::new("the feed holds no interval readings", file, ask));
        }
        let blocks = self.types();
        let mut tell = |kind, count: u64, text: String, remedy: &str, changes_figures| {
            findings.push(Finding {
                kind,
                count,
                first_row: None,
                file: file.to_owned(),
                remedy: remedy.to_owned(),
                text,
                changes_figures,
            });
        };
        // How many readings each direction has of each length, and those of no use by what they are.
        let mut lengths: BTreeMap<(&'static str, i64), u64> = BTreeMap::new();
        let mut unused: BTreeMap<String, u64> = BTreeMap::new();
        let mut untyped = None;
        for (from, to, kind) in &blocks {
            let Some(kind) = kind else {
                untyped.get_or_insert(*from);
                continue;
            };
            match kind.column() {
                Ok((way, _)) => {
                    for value in &self.values[*from..*to] {
                        *lengths.entry((way, kind.length(value))).or_insert(0) += 1;
                    }
                }
                Err(what) => *unused.entry(what).or_insert(0) += (to - from) as u64,
            }
        }
        if let Some(from) = untyped {
            return Err(Fault::new(
                "the feed does not say what its values are: a meter reading names no reading type (ReadingType) that is there",
                format!("{file}, reading {}", from + 1),
                ask,
            ));
        }
        if lengths.is_empty() {
            let what = unused.keys().next().cloned().unwrap_or_default();
            return Err(Fault::new(
                format!("no reading of the feed is power, or energy of an interval: they are {what}"),
                file,
                ask,
            ));
        }
        for (what, count) in unused {
            tell(
                FindingKind::Ignored,
                count,
                format!("{count} readings are not used: they are {what}."),
                "left out",
                false,
            );
        }
        // The same energy may come by the hour and by the day: the shortest intervals that are common count.
        let mut taken: BTreeMap<&str, i64> = BTreeMap::new();
        let most = lengths.values().copied().max().unwrap_or(0);
        for ((way, length), count) in &lengths {
            if *count * 10 >= most
                || !lengths.keys().any(|(other, shorter)| other == way && shorter != length)
            {
                taken.entry(way).or_insert(*length);
            }
        }
        let mut headers: Vec<String> = Vec::new();
        let mut names: Vec<(&str, ReadingType, usize)> = Vec::new();
        let mut merge = Merge::default();
        let mut others = 0;
        let mut undirected = false;
        for (from, to, kind) in &blocks {
            let Some((kind, (way, unit))) = kind.and_then(|kind| Some((kind, kind.column().ok()?))) else {
                continue;
            };
            undirected |= kind.direction.is_none();
            for (at, value) in self.values[*from..*to].iter().enumerate() {
                if taken.get(way) != Some(&kind.length(value)) {
                    others += 1;
                    continue;
                }
                let known = names.iter().find(|(name, other, _)| *name == way && *other == kind);
                let column = if let Some((_, _, column)) = known {
                    *column
                } else {
                    headers.push(format!("{way} [{unit}]"));
                    names.push((way, kind, headers.len() - 1));
                    headers.len() - 1
                };
                let shift_s = if mark == Stamp::End { kind.length(value) } else { 0 };
                // The exponent keeps the value the exact decimal that it is.
                let text = format!("{}e{}", value.amount, kind.power_of_ten);
                merge.put(
                    file,
                    (value.start_s.saturating_add(shift_s), column),
                    (from + at + 1) as u64,
                    &text,
                )?;
            }
        }
        if others > 0 {
            let lengths: Vec<String> =
                taken.iter().map(|(way, length)| format!("{way} of {length} s")).collect();
            let text = format!(
                "{others} readings of other lengths are not used, since the same energy may come in several; read are {}.",
                lengths.join(" and ")
            );
            tell(FindingKind::Ignored, others, text, "left out", true);
        }
        if undirected {
            let text =
                "A reading type names no direction of flow: its values are taken as drawn from the grid.";
            tell(FindingKind::SignDoubt, 1, text.to_owned(), "taken as import", true);
        }
        if self.estimated > 0 {
            let text = format!(
                "{} of {} readings ({:.1} %) are estimated, not measured.",
                self.estimated,
                self.values.len(),
                100.0 * self.estimated as f64 / self.values.len() as f64
            );
            tell(FindingKind::Filled, self.estimated, text, "used as they are", true);
        }
        let offset_s = self.offset_s.unwrap_or(0);
        let (text, runs) = merge.table(file, &headers, offset_s, 0)?;
        let shown = match self.offset_s {
            Some(_) => "shown at the standard time that it states",
            None => "shown in UTC",
        };
        let words =
            format!("usage data in XML (ESPI), stamps are of UTC, {shown}; rows count its interval readings");
        Ok((text, Made { words, runs, point: true, ..Made::default() }))
    }
}

impl ReadingType {
    /// Direction and unit of its column, or what it is instead.
    fn column(&self) -> std::result::Result<(&'static str, &'static str), String> {
        let unit = match self.unit {
            Some(72) => "Wh",
            Some(38) => "W",
            None => return Err("of no unit that is stated (uom is missing)".to_owned()),
            Some(other) => return Err(format!("of another unit (uom {other})")),
        };
        // Bulk quantity, cumulative, continuously cumulative, summation.
        if matches!(self.accumulation, 1 | 2 | 3 | 9) {
            return Err("positions of a register, not energy of an interval".to_owned());
        }
        if self.power_of_ten.abs() > 12 {
            return Err(format!("of an absurd power of ten ({})", self.power_of_ten));
        }
        match self.direction {
            None | Some(0 | 1) => Ok(("import", unit)),
            Some(19) => Ok(("export", unit)),
            Some(4) => Ok(("net import", unit)),
            Some(other) => Err(format!("of another direction of flow (flowDirection {other})")),
        }
    }

    /// The length of a reading's interval.
    fn length(&self, value: &Value) -> i64 {
        if value.duration_s > 0 { value.duration_s } else { self.length_s.unwrap_or(0) }
    }
}

#[cold]
fn broken(error: &quick_xml::Error, file: &str) -> Fault {
    match error {
        quick_xml::Error::Io(error) => decode::fault(error, file, true),
        _ => Fault::new(
            format!("the XML cannot be read: {error}"),
            file,
            "Copy or download the file again; if it is the same, ask for the readings as a text table (CSV).",
        ),
    }
}
