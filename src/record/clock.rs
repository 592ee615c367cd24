//! The record's clock: a start, a step, and the offset in which people read it.

use std::fmt::Write as _;

use jiff::{Timestamp, civil, tz};

/// A regular clock. Instants are microseconds since 1970-01-01T00:00:00Z, so that steps of a few milliseconds are exact.
#[derive(Debug, Clone, PartialEq)]
pub struct Clock {
    /// Start of the first interval.
    pub start_us: i64,
    /// Length of an interval; more than 0.
    pub step_us: i64,
    /// Number of intervals.
    pub intervals: usize,
    /// The zone in which stamps are written.
    pub zone: Zone,
}

/// What is known of the zone of the stamps.
#[derive(Debug, Clone, PartialEq)]
pub enum Zone {
    /// The files state none: the stamps are taken as they stand, as one clock without summer time.
    Unstated,
    /// A fixed offset east of Greenwich, in seconds.
    Fixed(i32),
    /// A zone of the IANA database.
    Named(tz::TimeZone),
}

/// A clock reading, for calendars and ticks.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Civil {
    /// Year.
    pub year: i16,
    /// Month, 1 to 12.
    pub month: i8,
    /// Day of the month, from 1.
    pub day: i8,
    /// Day of the week, Monday = 0.
    pub weekday: i8,
    /// Hour, 0 to 23.
    pub hour: i8,
    /// Minute, 0 to 59.
    pub minute: i8,
}

impl Clock {
    /// Length of an interval in seconds.
    pub fn step_s(&self) -> f64 {
        self.step_us as f64 / 1e6
    }

    /// Start of interval `i` (or the record's end for `i` = number of intervals), in microseconds.
    pub fn at_us(&self, i: usize) -> i64 {
        self.start_us.saturating_add(self.step_us.saturating_mul(i64::try_from(i).unwrap_or(i64::MAX)))
    }

    /// Length of the record in seconds.
    pub fn span_s(&self) -> f64 {
        self.step_s() * self.intervals as f64
    }

    /// Start of interval `i` as an RFC 3339 stamp with its offset.
    pub fn stamp(&self, i: usize) -> String {
        let instant = instant(self.at_us(i));
        let zone = self.time_zone();
        let offset = zone.to_offset(instant).seconds();
        let read = zone.to_datetime(instant);
        let (sign, offset) = if offset < 0 { ('-', -offset) } else { ('+', offset) };
        let mut text = format!(
            "{:04}-{:02}-{:02}T{:02}:{:02}:{:02}",
            read.year(),
            read.month(),
            read.day(),
            read.hour(),
            read.minute(),
            read.second()
        );
        if read.subsec_nanosecond() != 0 {
            // Writing to a text cannot fail.
            let _ = write!(text, ".{:06}", read.subsec_nanosecond() / 1000);
        }
        let _ = write!(text, "{sign}{:02}:{:02}", offset / 3600, offset / 60 % 60);
        text
    }

    /// What a clock on the wall shows at the start of interval `i`.
    pub fn civil(&self, i: usize) -> Civil {
        Civil::from(self.time_zone().to_datetime(instant(self.at_us(i))))
    }

    /// Offset from UTC at the start of interval `i`, in seconds east.
    pub fn offset_s(&self, i: usize) -> i32 {
        self.time_zone().to_offset(instant(self.at_us(i))).seconds()
    }

    fn time_zone(&self) -> tz::TimeZone {
        match &self.zone {
            Zone::Unstated => tz::TimeZone::UTC,
            Zone::Fixed(seconds) => {
                tz::Offset::from_seconds(*seconds).map_or(tz::TimeZone::UTC, tz::TimeZone::fixed)
            }
            Zone::Named(zone) => zone.clone(),
        }
    }
}

impl From<civil::DateTime> for Civil {
    fn from(read: civil::DateTime) -> Self {
        Self {
            year: read.year(),
            month: read.month(),
            day: read.day(),
            weekday: read.weekday().to_monday_zero_offset(),
            hour: read.hour(),
            minute: read.minute(),
        }
    }
}

/// The instant, held inside the range that the calendar knows.
fn instant(us: i64) -> Timestamp {
    Timestamp::from_microsecond(us).unwrap_or(if us < 0 { Timestamp::MIN } else { Timestamp::MAX })
}
