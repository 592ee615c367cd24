//! Tables with one row per day and a column for each time of day.

use csv::ByteRecord;

use super::super::dialect::{Dialect, Look, look};
use super::super::number;
use super::super::stamp::{DAY, SECOND};
use super::super::unit::{self, Stated};

/// Fewest columns that make a day.
const FEWEST: usize = 23;

/// Readings per day that meters keep.
const COUNTS: [usize; 6] = [24, 48, 96, 144, 288, 1440];

/// One row per day.
#[derive(Debug, Clone, PartialEq)]
pub(in crate::record) struct Days {
    /// Column of the date.
    pub(in crate::record) date: usize,
    /// Columns of the times of day, and what is written as the time.
    slots: Vec<(usize, Vec<u8>)>,
    /// Length of an interval in microseconds.
    pub(in crate::record) step_us: i64,
    /// The labels in words, for the reading.
    pub(in crate::record) words: String,
    /// Whether a day may have an hour more than 24: readings are counted from midnight, not read from a clock.
    pub(in crate::record) elapsed: bool,
}

impl Days {
    /// Deals out the next reading of a day's row as date, time of day and value; false once there is none.
    pub(in crate::record) fn deal(&self, day: &ByteRecord, next: &mut usize, into: &mut ByteRecord) -> bool {
        while let Some((column, clock)) = self.slots.get(*next) {
            *next += 1;
            let cell = day.get(*column).unwrap_or(b"");
            // An empty cell is no reading: a day on which clocks change has fewer of them.
            if number::trim(cell).is_empty() {
                continue;
            }
            into.clear();
            into.push_field(day.get(self.date).unwrap_or(b""));
            into.push_field(clock);
            into.push_field(cell);
            return true;
        }
        false
    }

    /// Whether a column holds a time of day.
    pub(in crate::record) fn has(&self, column: usize) -> bool {
        self.slots.iter().any(|slot| slot.0 == column)
    }

    /// The unit that the columns' headers or units carry.
    pub(super) fn unit(&self, dialect: &Dialect) -> Stated {
        self.slots.first().and_then(|slot| dialect.units.get(slot.0)).map_or(Stated::Nothing, |stated| {
            // Hours are no unit of what is measured.
            match stated {
                Stated::Power(unit) => Stated::Power(*unit),
                _ => unit::unit_of(&dialect.headers[self.date]),
            }
        })
    }
}

/// A count of columns as a factor of times.
fn whole(count: usize) -> i64 {
    i64::try_from(count).unwrap_or(i64::MAX)
}

/// A header that may name a time of day: what stands before and after its digits, a time read from it and a count.
struct Label<'a> {
    around: (&'a str, &'a str),
    time_us: Option<i64>,
    count: Option<i64>,
}

fn label(header: &str) -> Option<Label<'_>> {
    let header = header.trim();
    let start = header.find(|c: char| c.is_ascii_digit())?;
    let before = &header[..start];
    let body = &header[start..];
    let digits = |text: &str| text.bytes().take_while(u8::is_ascii_digit).count();
    let first = digits(body);
    let number = |text: &str| text.parse::<i64>().ok();
    let clock = |hour: i64, minute: i64, second: i64| {
        (hour <= 24 && minute < 60 && second < 60 && (hour < 24 || minute + second == 0))
            .then_some((hour * 3600 + minute * 60 + second) * SECOND)
    };
    let mut end = first;
    let mut time = None;
    let mut count = number(&body[..first]).filter(|_| first <= 4);
    if first <= 2
        && let Some(rest) = body[first..].strip_prefix([':', 'h', '.'])
        && digits(rest) == 2
    {
        end = first + 3;
        let (hour, minute) = (number(&body[..first])?, number(&rest[..2])?);
        let mut second = 0;
        if let Some(more) = body[end..].strip_prefix([':', '.'])
            && digits(more) == 2
        {
            second = number(&more[..2])?;
            end += 3;
        }
        time = clock(hour, minute, second);
        count = None;
        let tail = body[end..].trim_start();
        let half =
            tail.get(..2).filter(|half| half.eq_ignore_ascii_case("am") || half.eq_ignore_ascii_case("pm"));
        if let Some(half) = half {
            let noon = if half.eq_ignore_ascii_case("pm") { 12 } else { 0 };
            time = if hour <= 12 { clock(hour % 12 + noon, minute, second) } else { None };
            end = body.len() - tail.len() + 2;
        }
    } else if first == 4 {
        let value = number(&body[..4])?;
        time = clock(value / 100, value % 100, 0);
    }
    // "00:00 - 00:15" and "0-1" name their interval's start first.
    let mut after = body[end..].trim();
    if let Some(rest) = after.strip_prefix(['-', '\u{2013}']) {
        let rest = rest.trim_start();
        let close = rest.find(|c: char| !(c.is_ascii_digit() || c == ':' || c == '.')).unwrap_or(rest.len());
        if close > 0 {
            after = rest[close..].trim();
        }
    }
    Some(Label { around: (before, after), time_us: time, count })
}

/// Whether a row of cells heads a day's times.
pub(in crate::record) fn heads<'a>(cells: impl Iterator<Item = &'a str>) -> bool {
    let cells: Vec<&str> = cells.collect();
    sequence(&cells).is_some()
}

/// Columns of a day's times in order: where they begin, how many there are, the first time and the step.
struct Sequence {
    first: usize,
    count: usize,
    start_us: i64,
    step_us: i64,
    counted: bool,
}

fn sequence(headers: &[&str]) -> Option<Sequence> {
    let labels: Vec<Option<Label>> = headers.iter().map(|header| label(header)).collect();
    let runs = |value: &dyn Fn(&Label) -> Option<i64>, day: i64| {
        let mut best: Option<(usize, usize, i64, i64)> = None;
        let mut first = 0;
        while first + FEWEST <= headers.len() {
            let at = |i: usize| labels.get(i)?.as_ref().and_then(|l| Some((value(l)?, l.around)));
            let (Some((start, around)), Some((second, _))) = (at(first), at(first + 1)) else {
                first += 1;
                continue;
            };
            let step = second - start;
            let mut count = 1;
            while let Some((next, other)) = at(first + count) {
                let due = start + step * whole(count);
                // The day's last time may be written as midnight.
                if other != around || (next != due && !(next == 0 && due == day)) {
                    break;
                }
                count += 1;
            }
            if step > 0 && count >= FEWEST && best.is_none_or(|best| count > best.1) {
                best = Some((first, count, start, step));
            }
            first += count;
        }
        best
    };
    if let Some((first, count, start_us, step_us)) = runs(&|label| label.time_us, DAY)
        && DAY % step_us == 0
        && (start_us == 0 || start_us == step_us)
        && (whole(count) * step_us - DAY).abs() <= step_us
    {
        return Some(Sequence { first, count, start_us, step_us, counted: false });
    }
    let (first, count, start, step) = runs(&|label| label.count, -1)?;
    if step == 1 && (start == 0 || start == 1) {
        // A day on which clocks go back has an hour more.
        for per_day in COUNTS {
            if count == per_day || count == per_day + per_day / 24 {
                let step_us = DAY / whole(per_day);
                return Some(Sequence { first, count, start_us: 0, step_us, counted: true });
            }
        }
    }
    None
}

/// Whether a table has one row per day, and which columns hold its times. `ends` says that the person stated that stamps
/// mark the end of their interval, `starts` that they stated the start.
pub(in crate::record) fn days(dialect: &Dialect, starts: bool, ends: bool) -> Option<Days> {
    let headers: Vec<&str> = dialect.headers.iter().map(String::as_str).collect();
    let found = if dialect.header_row.is_some() { sequence(&headers) } else { bare(dialect) }?;
    let is_date = |column: &usize| {
        let stamps = dialect
            .rows
            .iter()
            .filter(|(_, record)| look(record.get(*column).unwrap_or(b"")) == Look::Stamp)
            .count();
        stamps > 0 && stamps * 5 >= dialect.rows.len() * 4
    };
    let inside = |column: &usize| (found.first..found.first + found.count).contains(column);
    let date = (0..dialect.headers.len()).filter(|column| !inside(column)).find(is_date)?;
    let per_day = (DAY / found.step_us) as usize;
    let elapsed = found.counted && found.count > per_day;
    // Whatever the labels, the first reading of a row is that of the day's first interval, unless a person says otherwise.
    let late = if found.counted || found.start_us > 0 { ends || (starts && !found.counted) } else { false };
    let slots = (0..found.count)
        .map(|i| {
            let seconds = (whole(i) + i64::from(late)) * found.step_us / SECOND;
            let clock =
                format!("{:02}:{:02}:{:02}", seconds / 3600, seconds / 60 % 60, seconds % 60).into_bytes();
            (found.first + i, clock)
        })
        .collect();
    let named = |column: usize| crate::fault::quote(headers.get(column).copied().unwrap_or_default());
    let words = format!(
        "one row per day with {} columns from {} to {}{}",
        found.count,
        named(found.first),
        named(found.first + found.count - 1),
        if late { "" } else { "; the first is the interval from 00:00" }
    );
    Some(Days { date, slots, step_us: found.step_us, words, elapsed })
}

/// A table without headers: a date and as many numbers as a day has intervals.
fn bare(dialect: &Dialect) -> Option<Sequence> {
    let (_, record) = dialect.rows.first()?;
    let date = record.iter().position(|cell| look(cell) == Look::Stamp)?;
    let count = record.len() - date - 1;
    let numbers = record.iter().skip(date + 1).filter(|cell| look(cell) == Look::Number).count();
    (COUNTS.contains(&count) && numbers * 10 >= count * 9).then(|| Sequence {
        first: date + 1,
        count,
        start_us: 0,
        step_us: DAY / whole(count),
        counted: true,
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn headers_of_times_are_told_from_others() {
        let build = |one: &dyn Fn(i64) -> String, count: i64| -> Vec<String> {
            std::iter::once("Date".to_owned()).chain((0..count).map(one)).collect()
        };
        let minute = |i: i64, step: i64| i * step;
        let clock = |m: i64| format!("{:02}:{:02}", m / 60, m % 60);
        for (headers, step_s, counted) in [
            (build(&|i| clock(minute(i, 15)), 96), 900, false),
            (build(&|i| clock(minute(i + 1, 15)), 96), 900, false),
            (build(&|i| clock(minute(i + 1, 30) % 1440), 48), 1800, false),
            (build(&|i| format!("{i}:00"), 24), 3600, false),
            (build(&|i| format!("{:02}{:02}", i / 4, i % 4 * 15), 96), 900, false),
            (build(&|i| format!("{} - {}", clock(i * 15), clock(i * 15 + 15)), 96), 900, false),
            (build(&|i| format!("kWh {}", clock(i * 30)), 48), 1800, false),
            (build(&|i| format!("H{}", i + 1), 24), 3600, true),
            (build(&|i| format!("HE{:02}", i + 1), 24), 3600, true),
            (build(&|i| format!("Interval {}", i + 1), 48), 1800, true),
            (build(&|i| format!("{}", i + 1), 288), 300, true),
            (build(&|i| format!("M{:04}", i + 1), 1440), 60, true),
            (build(&|i| format!("{}", i + 1), 100), 900, true),
        ] {
            let cells: Vec<&str> = headers.iter().map(String::as_str).collect();
            let found = sequence(&cells).unwrap_or_else(|| panic!("{:?}", &cells[..4]));
            assert_eq!(
                (found.first, found.step_us / SECOND, found.counted),
                (1, step_s, counted),
                "{:?}",
                &cells[..4]
            );
        }
        for headers in
            [build(&|i| format!("meter {}", i * 2), 30), build(&|i| format!("meter {}", i + 1), 30)]
        {
            let cells: Vec<&str> = headers.iter().map(String::as_str).collect();
            assert!(sequence(&cells).is_none());
        }
    }
}
