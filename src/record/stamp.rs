//! Cells to moments: one scanner over bytes for all the ways in which people write dates and times of day.

use super::number::trim;
use crate::case::DateOrder;

mod fixed;
mod month;
#[cfg(test)]
mod tests;

use month::month;

/// Microseconds of a second and of a day.
pub(super) const SECOND: i64 = 1_000_000;
pub(super) const DAY: i64 = 86_400 * SECOND;

/// A stamp as it is written.
#[allow(clippy::struct_excessive_bools, reason = "independent facts about a stamp")]
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Written {
    /// Microseconds from 1970-01-01T00:00 on the clock that was read.
    pub(super) civil_us: i64,
    /// Offset from UTC in seconds east, where the stamp states it.
    pub(super) offset_s: Option<i32>,
    /// Whether the order of day and month is beyond doubt (year first in four digits, or a month's name).
    pub(super) clear: bool,
    /// Whether a time of day is there.
    pub(super) timed: bool,
    /// Whether the time of day came with AM or PM.
    pub(super) halves: bool,
    /// Whether the time of day was written as 24:00.
    pub(super) day_end: bool,
    /// Whether no year was written: [`NO_YEAR`] stands in its place.
    pub(super) yearless: bool,
    /// Which of the two hours that clocks show twice in autumn, where the stamp says so ("02:15A", "02:15B").
    pub(super) fold: Option<Fold>,
    /// The mark between the parts of the date.
    pub(super) mark: u8,
}

/// One of the two hours that clocks show twice.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Fold {
    First,
    Second,
}

/// The year that stands for none: a common one, so that a typical year of 365 days has no hole.
pub(super) const NO_YEAR: i64 = 2001;

/// Days before each month in a year without leap day.
const BEFORE: [i64; 12] = [0, 31, 59, 90, 120, 151, 181, 212, 243, 273, 304, 334];

/// Days from 1970-01-01 to a date of the Gregorian calendar; none if there is no such date.
pub(super) fn days(year: i64, month: i64, day: i64) -> Option<i64> {
    if !(1..=9999).contains(&year) || !(1..=12).contains(&month) || day < 1 {
        return None;
    }
    let leap = (year % 4 == 0 && year % 100 != 0) || year % 400 == 0;
    let longest = match month {
        2 if leap => 29,
        2 => 28,
        4 | 6 | 9 | 11 => 30,
        _ => 31,
    };
    if day > longest {
        return None;
    }
    // Whole years by the calendar's rule, then months.
    let before = BEFORE[(month - 1) as usize] + i64::from(leap && month > 2);
    let past = year - 1;
    Some(past * 365 + past / 4 - past / 100 + past / 400 + before + day - 1 - 719_162)
}

/// Year, month and day of a count of days from 1970-01-01: the reverse of [`days`].
pub(super) fn date_of(count: i64) -> (i64, i64, i64) {
    // Years of 365.2425 days, put right by looking.
    let mut year = 1970 + (count * 400).div_euclid(146_097);
    while days(year, 1, 1).is_some_and(|first| first > count) {
        year -= 1;
    }
    while days(year + 1, 1, 1).is_some_and(|first| first <= count) {
        year += 1;
    }
    let mut month = 12;
    while month > 1 && days(year, month, 1).is_some_and(|first| first > count) {
        month -= 1;
    }
    (year, month, count - days(year, month, 1).unwrap_or(count) + 1)
}

/// Reads a stamp, a date with or without time of day.
pub(super) fn stamp(cell: &[u8], order: DateOrder) -> Option<Written> {
    let cell = trim(cell);
    fixed::fixed(cell, order).or_else(|| scanned(cell, order))
}

/// Reads a stamp by scanning it part by part.
fn scanned(cell: &[u8], order: DateOrder) -> Option<Written> {
    let mut scan = Scan { rest: cell, yearless: false };
    let (days, clear, mark, glued) = scan.date(order)?;
    let mut written = Written {
        civil_us: days.checked_mul(DAY)?,
        offset_s: None,
        clear,
        timed: false,
        halves: false,
        day_end: false,
        yearless: scan.yearless,
        fold: None,
        mark,
    };
    if scan.yearless && scan.rest.is_empty() {
        return None;
    }
    if scan.rest.is_empty() && glued.is_none() {
        return Some(written);
    }
    if glued.is_none() {
        scan.between();
        if scan.rest.is_empty() {
            return Some(written);
        }
    }
    let (time, halves) = match glued {
        Some(time) => (time, false),
        None => scan.time()?,
    };
    written.civil_us += time;
    written.day_end = time == DAY;
    written.timed = true;
    written.halves = halves;
    written.fold = scan.fold();
    written.offset_s = scan.offset()?;
    Some(written)
}

/// Reads a time of day in microseconds; 24:00 is the day's end.
pub(super) fn time_of_day(cell: &[u8]) -> Option<(i64, bool)> {
    let mut scan = Scan { rest: trim(cell), yearless: false };
    let time = scan.time()?;
    scan.fold();
    scan.tail().then_some(time)
}

struct Scan<'a> {
    rest: &'a [u8],
    yearless: bool,
}

impl Scan<'_> {
    /// A whole number of up to 14 digits and how many digits it has.
    fn number(&mut self) -> Option<(i64, usize)> {
        let mut value = 0_i64;
        let mut count = 0;
        while let Some(byte) = self.rest.get(count).filter(|byte| byte.is_ascii_digit()) {
            if count == 14 {
                return None;
            }
            value = value * 10 + i64::from(byte - b'0');
            count += 1;
        }
        self.rest = &self.rest[count..];
        (count > 0).then_some((value, count))
    }

    fn skip(&mut self, marks: &[u8]) -> usize {
        let count = self.rest.iter().take_while(|byte| marks.contains(byte)).count();
        self.rest = &self.rest[count..];
        count
    }

    /// The letters ahead, umlauts included.
    fn word(&mut self) -> &[u8] {
        let count = self.rest.iter().take_while(|byte| byte.is_ascii_alphabetic() || **byte >= 0x80).count();
        let (word, rest) = self.rest.split_at(count);
        self.rest = rest;
        word
    }

    fn month_name(&mut self) -> Option<i64> {
        month(self.word())
    }

    /// Days, whether the order is clear, the mark, and a time of day written on without a break.
    fn date(&mut self, order: DateOrder) -> Option<(i64, bool, u8, Option<i64>)> {
        if self.rest.first()?.is_ascii_alphabetic() {
            let before = self.rest;
            let word = self.word();
            if let Some(month) = month(word) {
                // January 31, 2026
                self.skip(b" .-/");
                let (day, _) = self.number()?;
                self.skip(b" ,.-/");
                let year = self.year()?;
                return Some((days(year, month, day)?, true, b' ', None));
            }
            if !(2..=10).contains(&word.len()) || before.len() == word.len() {
                return None;
            }
            // A weekday: what follows must be a date on its own.
            self.skip(b" ,.");
            if !self.rest.first()?.is_ascii_digit() {
                return None;
            }
        }
        let (first, width) = self.number()?;
        match width {
            8 | 10 | 12 | 14 => return compact(first, width),
            4 | 2 | 1 => {}
            _ => return None,
        }
        let mark = *self.rest.first()?;
        if !matches!(mark, b'-' | b'/' | b'.' | b' ') {
            return None;
        }
        self.skip(b"-/. ");
        if !self.rest.first()?.is_ascii_digit() {
            let month = self.month_name()?;
            self.skip(b"-/. ,");
            let (year, day) = if width == 4 { (first, self.number()?.0) } else { (self.year()?, first) };
            return Some((days(year, month, day)?, true, mark, None));
        }
        if mark == b' ' {
            return None;
        }
        let (second, second_width) = self.number()?;
        if second_width > 2 {
            return None;
        }
        // "01-31 00:00" and "31.01. 00:00" state no year; a time of day must follow, since "1-2" is no date.
        let dotted = mark == b'.' && self.rest.starts_with(b". ");
        if width <= 2 && (dotted || self.rest.first() == Some(&b' ') || self.rest.first() == Some(&b'T')) {
            self.skip(b".");
            let (month, day) = match (order, mark) {
                (_, b'-') | (DateOrder::MonthFirst | DateOrder::YearFirst, _) => (first, second),
                (DateOrder::DayFirst, _) => (second, first),
            };
            self.yearless = true;
            return Some((days(NO_YEAR, month, day)?, mark == b'-', mark, None));
        }
        if self.skip(&[mark]) != 1 {
            return None;
        }
        let (third, third_width) = self.number()?;
        if width == 4 {
            return (third_width <= 2)
                .then(|| days(first, second, third))
                .flatten()
                .map(|days| (days, true, mark, None));
        }
        let found = match (order, third_width) {
            (DateOrder::YearFirst, 1 | 2) => days(century(first), second, third),
            (DateOrder::DayFirst, 2) => days(century(third), second, first),
            (DateOrder::DayFirst, 4) => days(third, second, first),
            (DateOrder::MonthFirst, 2) => days(century(third), first, second),
            (DateOrder::MonthFirst, 4) => days(third, first, second),
            _ => None,
        };
        found.map(|days| (days, false, mark, None))
    }

    fn year(&mut self) -> Option<i64> {
        match self.number()? {
            (year, 4) => Some(year),
            (year, 2) => Some(century(year)),
            _ => None,
        }
    }

    /// Skips what stands between date and time.
    fn between(&mut self) {
        self.skip(b" ,_");
        if let [b'T' | b't' | b':' | b'-', digit, ..] = self.rest
            && digit.is_ascii_digit()
        {
            self.rest = &self.rest[1..];
        }
    }

    /// The time of day in microseconds and whether AM or PM was written.
    fn time(&mut self) -> Option<(i64, bool)> {
        let (first, width) = self.number()?;
        let (mut hour, mut minute, mut second, mut micro) = (first, 0, 0, 0);
        match width {
            1 | 2 => {
                let mut parts = 0;
                while parts < 2
                    && let [b':' | b'.' | b'h' | b'H', digit, ..] = self.rest
                    && digit.is_ascii_digit()
                {
                    self.rest = &self.rest[1..];
                    let (value, digits) = self.number()?;
                    if digits != 2 {
                        return None;
                    }
                    if parts == 0 {
                        minute = value;
                    } else {
                        second = value;
                    }
                    parts += 1;
                }
                if parts == 2
                    && let [b'.' | b',', digit, ..] = self.rest
                    && digit.is_ascii_digit()
                {
                    self.rest = &self.rest[1..];
                    let mut scale = 100_000;
                    while let Some(digit) = self.rest.first().filter(|byte| byte.is_ascii_digit()) {
                        micro += i64::from(digit - b'0') * scale;
                        scale /= 10;
                        self.rest = &self.rest[1..];
                    }
                }
            }
            4 => (hour, minute) = (first / 100, first % 100),
            6 => (hour, minute, second) = (first / 10_000, first / 100 % 100, first % 100),
            _ => return None,
        }
        let before = self.rest;
        self.skip(b" ");
        let halves = match self.rest {
            [half @ (b'a' | b'A' | b'p' | b'P'), b'm' | b'M', ..] => {
                Some((half.eq_ignore_ascii_case(&b'p'), 2))
            }
            [half @ (b'a' | b'A' | b'p' | b'P'), b'.', b'm' | b'M', b'.', ..] => {
                Some((half.eq_ignore_ascii_case(&b'p'), 4))
            }
            _ => None,
        };
        match halves {
            Some((after_noon, width)) => {
                if !(1..=12).contains(&hour) {
                    return None;
                }
                hour = hour % 12 + if after_noon { 12 } else { 0 };
                self.rest = &self.rest[width..];
            }
            None => self.rest = before,
        }
        let right = (hour < 24 && minute < 60 && second < 60)
            || (hour == 24 && minute == 0 && second == 0 && micro == 0);
        right.then_some(((hour * 3600 + minute * 60 + second) * SECOND + micro, halves.is_some()))
    }

    /// The mark of one of the hours that come twice.
    fn fold(&mut self) -> Option<Fold> {
        let fold = match self.rest {
            [b'A'] => Fold::First,
            [b'B'] => Fold::Second,
            _ => return None,
        };
        self.rest = &[];
        Some(fold)
    }

    /// The offset from UTC, if one is written; none if something else follows.
    #[allow(clippy::option_option, reason = "no offset and no stamp are two things")]
    fn offset(&mut self) -> Option<Option<i32>> {
        if self.rest.is_empty() {
            return Some(None);
        }
        let before = self.rest;
        self.skip(b" ");
        let spaced = before.len() != self.rest.len();
        let offset = match self.rest {
            [] => None,
            [sign @ (b'+' | b'-'), digit, ..] if digit.is_ascii_digit() => {
                let sign = if *sign == b'-' { -1 } else { 1 };
                self.rest = &self.rest[1..];
                let (value, width) = self.number()?;
                let (hours, minutes) = match width {
                    1 | 2 => {
                        if self.rest.first() == Some(&b':') {
                            self.rest = &self.rest[1..];
                            let (minutes, 2) = self.number()? else { return None };
                            (value, minutes)
                        } else {
                            (value, 0)
                        }
                    }
                    4 => (value / 100, value % 100),
                    _ => return None,
                };
                if hours > 18 || minutes > 59 {
                    return None;
                }
                Some(sign * (hours * 3600 + minutes * 60) as i32)
            }
            [b'+' | b'-', ..] if spaced => None,
            _ => match self.word() {
                b"Z" | b"z" | b"UTC" | b"GMT" | b"WET" => Some(0),
                b"CET" | b"MEZ" | b"BST" => Some(3600),
                b"CEST" | b"MESZ" | b"EET" => Some(7200),
                b"EEST" => Some(10_800),
                b"Uhr" | b"h" | b"" => None,
                _ => return None,
            },
        };
        self.tail().then_some(offset)
    }

    /// Whether nothing follows that changes the stamp: a zone in brackets may, and the end of a span ("00:00 - 00:15").
    fn tail(&mut self) -> bool {
        self.skip(b" ");
        matches!(self.rest, [] | [b'[' | b'(', ..] | [b'-', b' ', ..])
    }
}

pub(super) fn century(year: i64) -> i64 {
    match year {
        0..70 => 2000 + year,
        70..100 => 1900 + year,
        _ => year,
    }
}

fn compact(value: i64, width: usize) -> Option<(i64, bool, u8, Option<i64>)> {
    let (date, time) = match width {
        8 => (value, None),
        10 => (value / 100, Some((value % 100, 0, 0))),
        12 => (value / 10_000, Some((value / 100 % 100, value % 100, 0))),
        _ => (value / 1_000_000, Some((value / 10_000 % 100, value / 100 % 100, value % 100))),
    };
    let year = date / 10_000;
    if !(1900..=2200).contains(&year) {
        return None;
    }
    let days = days(year, date / 100 % 100, date % 100)?;
    let time = match time {
        None => None,
        Some((hour, minute, second))
            if minute < 60 && second < 60 && (hour < 24 || (hour == 24 && minute + second == 0)) =>
        {
            Some((hour * 3600 + minute * 60 + second) * SECOND)
        }
        Some(_) => return None,
    };
    Some((days, true, b'0', time))
}
