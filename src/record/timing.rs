//! Which columns hold the stamps, and how a row's moment is read from them.

use csv::ByteRecord;

use super::Role;
use super::dialect::{Dialect, Look, look};
use super::number::{self, Cell, Marks};
use super::stamp::{self, DAY, Fold, SECOND};
use super::words;
use crate::case::DateOrder;
use crate::fault::{Fault, Result, quote};

mod parts;

pub(super) use parts::Parts;
use parts::parts;

/// Where the moment of a row stands.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Timing {
    /// Date and time in one column.
    Stamp(usize),
    /// Date in one column and time of day in another.
    DateClock(usize, usize),
    /// Date in one column, and in another the time passed since the day began.
    DateElapsed(usize, usize),
    /// Date in one column and the number of the hour in another; `first` is the number of the day's first hour.
    DateHour { date: usize, hour: usize, first: i64 },
    /// Year, month, day, hour and minute in columns of their own.
    Parts(Parts),
    /// Time since 1970-01-01T00:00Z in units of so many microseconds.
    Unix { column: usize, unit_us: i64 },
    /// Days since 1899-12-30, as spreadsheets count them.
    Serial(usize),
    /// Time since the first row of a plain count, in units of so many microseconds.
    Counter { column: usize, unit_us: i64, unit_known: bool },
    /// No column at all: rows follow each other at a step that the person stated, in microseconds.
    Rows(i64),
}

/// A row's moment as it is written.
#[allow(clippy::struct_excessive_bools, reason = "independent facts about a stamp")]
#[derive(Debug, Clone, Copy)]
pub(super) struct Moment {
    /// Microseconds on the clock that was read, or since 1970 in UTC where the offset is 0.
    pub(super) us: i64,
    /// Time passed since then, in microseconds: clocks may have changed meanwhile.
    pub(super) after_us: i64,
    /// Offset from UTC in seconds east, if stated.
    pub(super) offset_s: Option<i32>,
    /// Whether day and month cannot be mistaken.
    pub(super) clear: bool,
    /// Whether AM or PM was written.
    pub(super) halves: bool,
    /// Whether the time of day was written as 24:00.
    pub(super) day_end: bool,
    /// Whether no year was written.
    pub(super) yearless: bool,
    /// Which of the two hours that clocks show twice, if it is said.
    pub(super) fold: Option<Fold>,
    /// The mark between the parts of the date.
    pub(super) mark: u8,
}

impl Timing {
    /// The columns used, with their roles.
    pub(super) fn role(self, column: usize) -> Option<Role> {
        match self {
            Self::Stamp(c)
            | Self::Unix { column: c, .. }
            | Self::Serial(c)
            | Self::Counter { column: c, .. } => (c == column).then_some(Role::Time),
            Self::DateClock(date, clock)
            | Self::DateElapsed(date, clock)
            | Self::DateHour { date, hour: clock, .. } => {
                if column == date {
                    Some(Role::Date)
                } else {
                    (column == clock).then_some(Role::Clock)
                }
            }
            Self::Parts(parts) => {
                let clock = parts.hour == Some(column) || parts.minute == Some(column);
                parts.columns().any(|part| part == column).then_some(if clock {
                    Role::Clock
                } else {
                    Role::Date
                })
            }
            Self::Rows(_) => None,
        }
    }

    /// The columns used, the one with the date first.
    pub(super) fn columns(self) -> Vec<usize> {
        match self {
            Self::DateClock(date, clock)
            | Self::DateElapsed(date, clock)
            | Self::DateHour { date, hour: clock, .. } => vec![date, clock],
            Self::Parts(parts) => parts.columns().collect(),
            other => other.column().into_iter().collect(),
        }
    }

    /// The column that holds the date, or all of it.
    pub(super) fn column(self) -> Option<usize> {
        match self {
            Self::Stamp(c)
            | Self::Unix { column: c, .. }
            | Self::Serial(c)
            | Self::Counter { column: c, .. } => Some(c),
            Self::DateClock(date, _) | Self::DateElapsed(date, _) | Self::DateHour { date, .. } => Some(date),
            Self::Parts(parts) => Some(parts.day),
            Self::Rows(_) => None,
        }
    }

    /// What stands in that column.
    pub(super) fn cell(self, record: &ByteRecord) -> &[u8] {
        self.column().and_then(|column| record.get(column)).unwrap_or(b"")
    }

    /// Whether the stamps count from the record's start, so that they carry no date.
    pub(super) fn counted(self) -> bool {
        matches!(self, Self::Counter { .. } | Self::Rows(_))
    }

    /// Whether the stamps can depend on the order of day and month.
    pub(super) fn dated(self) -> bool {
        matches!(self, Self::Stamp(_) | Self::DateClock(..) | Self::DateElapsed(..) | Self::DateHour { .. })
    }

    /// Reads the moment of the `nth` row of values, from 0; none if its cells hold none.
    pub(super) fn read(
        self,
        record: &ByteRecord,
        order: DateOrder,
        marks: Marks,
        nth: i64,
    ) -> Option<Moment> {
        let exact = |us: i64, offset_s| Moment {
            us,
            after_us: 0,
            offset_s,
            clear: true,
            halves: false,
            day_end: false,
            yearless: false,
            fold: None,
            mark: b'0',
        };
        let count = |column: usize| match number::parse(record.get(column)?, marks) {
            Cell::Number(value) if value.abs() < 1e17 => Some(value),
            _ => None,
        };
        match self {
            Self::Stamp(column) => {
                let read = stamp::stamp(record.get(column)?, order)?;
                Some(Moment {
                    us: read.civil_us,
                    after_us: 0,
                    offset_s: read.offset_s,
                    clear: read.clear,
                    halves: read.halves,
                    day_end: read.day_end,
                    yearless: read.yearless,
                    fold: read.fold,
                    mark: read.mark,
                })
            }
            Self::DateClock(date, clock) => {
                let read = stamp::stamp(record.get(date)?, order)?;
                let (time, halves) = stamp::time_of_day(record.get(clock)?)?;
                let us = read.civil_us.div_euclid(DAY) * DAY + time;
                let fold = match record.get(clock)?.trim_ascii_end().last() {
                    Some(b'A') => Some(Fold::First),
                    Some(b'B') => Some(Fold::Second),
                    _ => None,
                };
                Some(Moment {
                    us,
                    after_us: 0,
                    offset_s: read.offset_s,
                    clear: read.clear,
                    halves,
                    day_end: time == DAY,
                    yearless: read.yearless,
                    fold,
                    mark: read.mark,
                })
            }
            Self::DateElapsed(date, clock) => {
                let read = stamp::stamp(record.get(date)?, order)?;
                // "25:00:00" is written by the shape of the table alone.
                let mut after = 0;
                for part in record.get(clock)?.split(|byte| *byte == b':') {
                    after = after * 60 + std::str::from_utf8(part).ok()?.parse::<i64>().ok()?;
                }
                Some(Moment {
                    us: read.civil_us.div_euclid(DAY) * DAY,
                    after_us: after * SECOND,
                    offset_s: read.offset_s,
                    clear: read.clear,
                    halves: false,
                    day_end: false,
                    yearless: read.yearless,
                    fold: read.fold,
                    mark: read.mark,
                })
            }
            Self::DateHour { date, hour, first } => {
                let read = stamp::stamp(record.get(date)?, order)?;
                let hour = count(hour)? - first as f64;
                if !(0.0..=24.0).contains(&hour) {
                    return None;
                }
                let us = read.civil_us.div_euclid(DAY) * DAY + (hour * 3600.0).round() as i64 * SECOND;
                Some(Moment {
                    us,
                    after_us: 0,
                    offset_s: read.offset_s,
                    clear: read.clear,
                    halves: false,
                    day_end: false,
                    yearless: read.yearless,
                    fold: read.fold,
                    mark: read.mark,
                })
            }
            Self::Unix { column, unit_us } => {
                within(count(column)? * unit_us as f64).map(|us| exact(us.round() as i64, Some(0)))
            }
            // Serial days carry rounding of the spreadsheet: whole seconds are what was meant.
            Self::Serial(column) => within((count(column)? - 25_569.0) * 86_400.0 * 1e6)
                .map(|us| exact((us / 1e6).round() as i64 * SECOND, None)),
            Self::Parts(parts) => {
                let part =
                    |column: usize| count(column).filter(|value| value.fract() == 0.0).map(|v| v as i64);
                let year = parts.year.map_or(Some(stamp::NO_YEAR), part)?;
                let days = stamp::days(stamp::century(year), part(parts.month)?, part(parts.day)?)?;
                let hour = parts.hour.map_or(Some(0.0), count)? - parts.first as f64;
                let minute = parts.minute.map_or(Some(0.0), count)?;
                if !(0.0..=24.0).contains(&hour) || !(0.0..=60.0).contains(&minute) {
                    return None;
                }
                let us = days * DAY + ((hour * 3600.0 + minute * 60.0) * 1e6).round() as i64;
                let yearless = parts.year.is_none();
                Some(Moment { day_end: hour == 24.0, yearless, ..exact(us, None) })
            }
            Self::Rows(step_us) => {
                let number = |cell| matches!(number::parse(cell, marks), Cell::Number(_));
                record.get(0).filter(|_| record.iter().any(number))?;
                Some(exact(nth.saturating_mul(step_us), None))
            }
            // A count of hours with a few decimals means whole milliseconds.
            Self::Counter { column, unit_us, .. } => within(count(column)? * unit_us as f64)
                .map(|us| exact((us / 1e3).round() as i64 * 1000, None)),
        }
    }
}

/// Microseconds inside the years that a calendar knows.
fn within(us: f64) -> Option<f64> {
    const FAR: f64 = 2.5e17;
    (us.abs() < FAR).then_some(us)
}

/// What the head's cells of a column look like.
struct Profile {
    filled: usize,
    stamps: usize,
    /// Stamps at the start of a day.
    dates: usize,
    clocks: usize,
    values: Vec<f64>,
}

impl Profile {
    fn new(dialect: &Dialect, column: usize) -> Self {
        let mut profile = Self { filled: 0, stamps: 0, dates: 0, clocks: 0, values: Vec::new() };
        for (_, record) in &dialect.rows {
            let cell = record.get(column).unwrap_or(b"");
            match look(cell) {
                Look::Empty => continue,
                Look::Stamp => {
                    profile.stamps += 1;
                    let midnight =
                        super::dialect::any_stamp(cell).is_some_and(|read| read.civil_us % DAY == 0);
                    profile.dates += usize::from(midnight);
                }
                Look::Clock => profile.clocks += 1,
                Look::Number => {
                    if let Cell::Number(value) = number::parse(cell, dialect.marks) {
                        profile.values.push(value);
                    }
                }
                Look::Other => {}
            }
            profile.filled += 1;
        }
        profile
    }

    fn mostly(&self, count: usize) -> bool {
        count > 0 && count * 5 >= self.filled * 4
    }

    fn rising(&self) -> bool {
        let pairs = self.values.len().saturating_sub(1);
        let up = self.values.windows(2).filter(|pair| pair[1] > pair[0]).count();
        self.mostly(self.values.len()) && pairs > 0 && up * 10 >= pairs * 9
    }

    fn all_between(&self, least: f64, most: f64) -> bool {
        let inside = self.values.iter().filter(|value| (least..=most).contains(*value)).count();
        inside > 0 && inside * 10 >= self.values.len() * 9
    }
}

/// Finds the columns of the stamps. `stated` gives the role that the person stated for a column.
pub(super) fn choose(
    name: &str,
    dialect: &Dialect,
    stated: &dyn Fn(usize) -> Option<Role>,
    step_s: Option<f64>,
) -> Result<Timing> {
    let width = dialect.headers.len();
    let profiles: Vec<Profile> = (0..width).map(|column| Profile::new(dialect, column)).collect();
    let find = |role: Role| (0..width).find(|column| stated(*column) == Some(role));
    let free = |column: &usize| {
        stated(*column).is_none_or(|role| matches!(role, Role::Time | Role::Date | Role::Clock))
    };
    let header = |column: usize| dialect.headers[column].as_str();
    if let (Some(date), Some(clock)) = (find(Role::Date), find(Role::Clock)) {
        return Ok(date_and(date, clock, &profiles));
    }
    let stated_time = find(Role::Time).or_else(|| find(Role::Date));
    let is_stamp = |column: &usize| profiles[*column].mostly(profiles[*column].stamps);
    let is_date = |column: &usize| is_stamp(column) && profiles[*column].dates == profiles[*column].stamps;
    let named = |column: &usize| words::says_time(header(*column));
    if let Some(column) = stated_time
        && is_stamp(&column)
    {
        return Ok(Timing::Stamp(column));
    }
    if stated_time.is_none() {
        let columns = || (0..width).filter(|column| free(column));
        let whole = || columns().filter(|column| is_stamp(column) && !is_date(column));
        if let Some(column) = whole().find(named).or_else(|| whole().next()) {
            return Ok(Timing::Stamp(column));
        }
        let dates = || columns().filter(is_date);
        if let Some(date) = dates().find(named).or_else(|| dates().next()) {
            let clock = find(Role::Clock).or_else(|| {
                columns().find(|column| profiles[*column].mostly(profiles[*column].clocks)).or_else(|| {
                    let hours = |column: &usize| {
                        *column != date
                            && words::says_clock(header(*column))
                            && profiles[*column].mostly(profiles[*column].values.len())
                            && profiles[*column].all_between(0.0, 24.0)
                    };
                    columns().find(hours)
                })
            });
            return Ok(clock.map_or(Timing::Stamp(date), |clock| date_and(date, clock, &profiles)));
        }
    }
    if stated_time.is_none()
        && let Some(parts) = parts(dialect, &profiles, &free)
    {
        return Ok(Timing::Parts(parts));
    }
    let counted = |column: usize| numeric(dialect, column, &profiles[column], stated_time == Some(column));
    let numbers = || (0..width).filter(|column| stated_time.map_or(free(column), |stated| stated == *column));
    let found = numbers()
        .filter(|column| named(column) || unit_us(dialect, *column).is_some())
        .find_map(counted)
        .or_else(|| numbers().take(1).find_map(counted));
    if let Some(timing) = found {
        return Ok(timing);
    }
    // Rows without stamps, one step after the other.
    if let Some(step_s) = step_s.filter(|step_s| (1e-6..=1e7).contains(step_s)) {
        return Ok(Timing::Rows((step_s * 1e6).round() as i64));
    }
    let clocks_only = (0..width).any(|column| profiles[column].mostly(profiles[column].clocks));
    let (row, cells) = dialect.rows.first().map_or((dialect.first_row, String::new()), |(row, record)| {
        (*row, record.iter().take(3).map(super::decode::text).collect::<Vec<_>>().join(" "))
    });
    Err(Fault::new(
        if clocks_only {
            "the table has times of day but no column with dates".to_owned()
        } else {
            format!("no column holds stamps; the first row of values begins {}", quote(&cells))
        },
        format!("{name}, row {row}"),
        "State which column holds the stamps (role time) or, if rows follow each other at a regular step, that step in seconds (record.step_s).",
    ))
}

fn date_and(date: usize, clock: usize, profiles: &[Profile]) -> Timing {
    let hours = &profiles[clock];
    // Four digits are a time of day without a mark ("0015").
    if hours.mostly(hours.values.len()) && hours.all_between(0.0, 24.0) {
        let first = i64::from(hours.all_between(1.0, 24.0) && hours.values.contains(&24.0));
        Timing::DateHour { date, hour: clock, first }
    } else {
        Timing::DateClock(date, clock)
    }
}

/// What a column of rising numbers means as time; none if it is no time.
fn numeric(dialect: &Dialect, column: usize, profile: &Profile, stated: bool) -> Option<Timing> {
    let single = profile.values.len() == 1 && profile.filled == 1;
    if !(profile.rising()
        || stated && !profile.values.is_empty()
        || single && words::says_time(&dialect.headers[column]))
    {
        return None;
    }
    for (least, most, unit_us) in [(1e8, 1e10, SECOND), (1e11, 1e13, 1000), (1e14, 1e16, 1)] {
        if profile.all_between(least, most) {
            return Some(Timing::Unix { column, unit_us });
        }
    }
    let unit = unit_us(dialect, column);
    let slow = profile.values.windows(2).all(|pair| pair[1] - pair[0] <= 1.5);
    if unit.is_none()
        && slow
        && profile.all_between(20_000.0, 80_000.0)
        && profile.values.iter().any(|value| value.fract() != 0.0)
    {
        return Some(Timing::Serial(column));
    }
    // Hours that begin again each day are no count of time.
    if !stated && profile.values.windows(2).any(|pair| pair[1] < pair[0]) {
        return None;
    }
    if let Some(unit_us) = unit {
        return Some(Timing::Counter { column, unit_us, unit_known: true });
    }
    let whole = profile.values.iter().all(|value| value.fract() == 0.0);
    let even = profile.values.windows(2).all(|pair| pair[1] - pair[0] == 1.0);
    (stated || whole && even && dialect.headers.len() > 1).then_some(Timing::Counter {
        column,
        unit_us: 3600 * SECOND,
        unit_known: false,
    })
}

/// The unit in which a column counts time, from its header or the units row.
fn unit_us(dialect: &Dialect, column: usize) -> Option<i64> {
    let header = dialect.headers.get(column)?.to_lowercase();
    let words: Vec<&str> = header.split(|c: char| !c.is_alphanumeric()).collect();
    for (names, seconds) in [
        (
            &[
                "h", "hr", "hrs", "hour", "hours", "std", "stunde", "stunden", "heure", "heures", "hora",
                "horas", "uur",
            ][..],
            3600,
        ),
        (&["min", "mins", "minute", "minutes", "minuten", "minuto", "minutos"], 60),
        (&["s", "sec", "secs", "second", "seconds", "sek", "sekunde", "sekunden"], 1),
        (&["d", "day", "days", "tag", "tage"], 86_400),
    ] {
        if names.iter().any(|name| words.contains(name)) {
            return Some(seconds * SECOND);
        }
    }
    None
}
