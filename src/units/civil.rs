//! Civil dates without a zone: the calendar of clock readings, as plain arithmetic on days since 1970-01-01.
//!
//! The two ways between a day and its year, month and day are those of Howard Hinnant, "chrono-Compatible Low-Level Date
//! Algorithms" (2013 and later), for the proleptic Gregorian calendar: years are counted from 1 March, so that a leap day
//! ends one, and in eras of 400 years, which all have the same number of days.

/// Days in 400 years.
const ERA: i64 = 146_097;
/// Days from 0000-03-01 to 1970-01-01.
const SHIFT: i64 = 719_468;
const DAY_US: i64 = 86_400_000_000;
const MINUTE_US: i64 = 60_000_000;
/// First and last clock reading with a date, microseconds: the instants that a record's stamps can name
/// (-9999-01-02T01:59:59Z to 9999-12-30T22:00:00.999999Z).
const READINGS: (i64, i64) = (-377_705_023_201_000_000, 253_402_207_200_999_999);

/// A date of the proleptic Gregorian calendar.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub struct Date {
    /// Days since 1970-01-01.
    pub days: i64,
}

impl Date {
    /// From a year, a month (1 to 12) and a day of the month (from 1).
    pub fn new(year: i64, month: i64, day: i64) -> Self {
        let year = if month > 2 { year } else { year - 1 };
        let (era, of_era) = (year.div_euclid(400), year.rem_euclid(400));
        let of_year = (153 * ((month + 9) % 12) + 2) / 5 + day - 1;
        Self { days: era * ERA + of_era * 365 + of_era / 4 - of_era / 100 + of_year - SHIFT }
    }

    /// Year, month (1 to 12) and day of the month (from 1).
    pub fn parts(self) -> (i64, i64, i64) {
        let (era, of_era) = ((self.days + SHIFT).div_euclid(ERA), (self.days + SHIFT).rem_euclid(ERA));
        let year = (of_era - of_era / 1460 + of_era / 36_524 - of_era / 146_096) / 365;
        let of_year = of_era - (365 * year + year / 4 - year / 100);
        let from_march = (5 * of_year + 2) / 153;
        let month = if from_march < 10 { from_march + 3 } else { from_march - 9 };
        let year = year + era * 400 + i64::from(month <= 2);
        (year, month, of_year - (153 * from_march + 2) / 5 + 1)
    }

    /// Day of the week, Monday = 0.
    pub fn weekday(self) -> usize {
        // 1970-01-01 was a Thursday.
        (self.days + 3).rem_euclid(7) as usize
    }

    /// The day after.
    #[must_use]
    pub fn tomorrow(self) -> Self {
        Self { days: self.days + 1 }
    }

    /// The first day of its month.
    #[must_use]
    pub fn month_start(self) -> Self {
        Self { days: self.days - self.parts().2 + 1 }
    }

    /// The first day of the month after.
    #[must_use]
    pub fn next_month(self) -> Self {
        let (year, month, _) = self.parts();
        if month == 12 { Self::new(year + 1, 1, 1) } else { Self::new(year, month + 1, 1) }
    }

    /// Clock reading at its start, microseconds since 1970-01-01 00:00 of the same clock.
    pub fn start_us(self) -> i64 {
        self.days * DAY_US
    }
}

/// What a clock shows, to the minute.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Reading {
    /// The date.
    pub date: Date,
    /// Minute of the day, 0 to 1439.
    pub minute: i64,
}

impl Reading {
    /// From microseconds since 1970-01-01 00:00 of the same clock; none outside the calendar of the records.
    pub fn new(us: f64) -> Option<Self> {
        let whole = us as i64;
        (us.is_finite() && whole >= READINGS.0 && whole <= READINGS.1).then(|| Self {
            date: Date { days: whole.div_euclid(DAY_US) },
            minute: whole.rem_euclid(DAY_US) / MINUTE_US,
        })
    }

    /// Its time: "18:30".
    pub fn time(self) -> String {
        format!("{:02}:{:02}", self.minute / 60, self.minute % 60)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use jiff::{Timestamp, tz::Offset};
    use proptest::prelude::*;

    fn same(us: i64) {
        let read = Reading::new(us as f64).unwrap();
        // The double may be another microsecond.
        let other = Offset::UTC.to_datetime(Timestamp::from_microsecond(us as f64 as i64).unwrap());
        let (year, month, day) = read.date.parts();
        assert_eq!(
            (year, month, day),
            (i64::from(other.year()), i64::from(other.month()), i64::from(other.day()))
        );
        assert_eq!(read.date.weekday() as i8, other.weekday().to_monday_zero_offset());
        assert_eq!(read.time(), format!("{:02}:{:02}", other.hour(), other.minute()));
        assert_eq!(Date::new(year, month, day), read.date);
        let first = other.date().first_of_month();
        assert_eq!(read.date.month_start(), Date::new(year, month, i64::from(first.day())));
        if let Ok(next) = other.date().last_of_month().tomorrow() {
            assert_eq!(
                read.date.next_month(),
                Date::new(i64::from(next.year()), i64::from(next.month()), i64::from(next.day()))
            );
        }
    }

    #[test]
    fn every_day_of_nine_centuries_is_the_one_of_another_calendar() {
        for day in Date::new(1600, 1, 1).days..Date::new(2500, 1, 1).days {
            same(Date { days: day }.start_us() + (day * 7_777).rem_euclid(1440) * MINUTE_US);
        }
    }

    #[test]
    fn leap_days_are_where_they_belong() {
        for (year, leap) in [(1900, false), (2000, true), (2024, true), (2025, false), (-4, true), (0, true)]
        {
            assert_eq!(Date::new(year, 2, 28).tomorrow().parts().2 == 29, leap, "{year}");
        }
    }

    #[test]
    fn the_calendar_ends_where_that_of_the_stamps_does() {
        for edge in [Timestamp::MIN, Timestamp::MAX] {
            // Near its ends a double is exact to 64 microseconds.
            let us = edge.as_microsecond() as f64;
            for offset in [-1e6, 1e6] {
                let us = us + offset;
                assert_eq!(
                    Reading::new(us).is_some(),
                    Timestamp::from_microsecond(us as i64).is_ok(),
                    "{us}"
                );
            }
        }
        assert_eq!(
            (READINGS.0, READINGS.1),
            (Timestamp::MIN.as_microsecond(), Timestamp::MAX.as_microsecond())
        );
        for none in [f64::NAN, f64::INFINITY, 1e300, -1e300] {
            assert_eq!(Reading::new(none), None);
        }
    }

    proptest! {
        #[test]
        fn any_reading_is_the_one_of_another_calendar(us in READINGS.0 + 64..READINGS.1 - 64) {
            same(us);
        }
    }
}
