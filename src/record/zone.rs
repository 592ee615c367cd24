//! Local stamps to instants: the ambiguous hour in autumn by the order of rows, the missing hour in spring refused.

use jiff::civil::DateTime;
use jiff::tz::{AmbiguousOffset, TimeZone};
use jiff::{SignedDuration, Timestamp};

use super::stamp::{DAY, Fold, SECOND};
use super::timing::Moment;

/// A span of local readings in which the offset holds for certain: start, end, offset (all microseconds).
type Steady = (i64, i64, i64);

/// Turns the stamps of one file into instants, row by row in the file's order.
#[derive(Debug, Clone)]
pub(super) struct Resolver {
    zone: Option<TimeZone>,
    /// Whether rows run from the newest to the oldest.
    falling: bool,
    before: Option<i64>,
    steady: Steady,
}

impl Resolver {
    /// A resolver for stamps in `zone`, or for stamps that are taken as they stand.
    pub(super) fn new(zone: Option<TimeZone>, falling: bool) -> Self {
        Self { zone, falling, before: None, steady: (0, 0, 0) }
    }

    /// The instant of a moment, or none if clocks in the zone never show it.
    ///
    /// Time counted since a day's beginning runs on past changes of the clock; where no zone is known it ends with the day.
    pub(super) fn moment(&mut self, moment: &Moment) -> Option<i64> {
        if let (Some(fold), None, Some(_)) = (moment.fold, moment.offset_s, &self.zone) {
            let both = self.moments(moment);
            let instant = if fold == Fold::Second { both[1].or(both[0]) } else { both[0] };
            self.before = instant.or(self.before);
            return instant;
        }
        if moment.after_us == 0 {
            return self.instant(moment.us, moment.offset_s);
        }
        if self.zone.is_none() && moment.after_us >= DAY {
            return None;
        }
        self.instant(moment.us, moment.offset_s).map(|instant| instant + moment.after_us)
    }

    /// Every instant at which clocks show a moment: two in the hour that comes twice, none in the one left out.
    pub(super) fn moments(&self, moment: &Moment) -> [Option<i64>; 2] {
        match (moment.offset_s, &self.zone) {
            (Some(offset), _) => [Some(moment.us - i64::from(offset) * SECOND), None],
            (None, None) => [Some(moment.us + moment.after_us), None],
            (None, Some(zone)) => {
                let read = DateTime::constant(1970, 1, 1, 0, 0, 0, 0)
                    .checked_add(SignedDuration::from_micros(moment.us));
                let shift = |offset: jiff::tz::Offset| moment.us - i64::from(offset.seconds()) * SECOND;
                match read.map(|read| zone.to_ambiguous_timestamp(read).offset()) {
                    Ok(AmbiguousOffset::Unambiguous { offset }) => [Some(shift(offset)), None],
                    Ok(AmbiguousOffset::Fold { before, after }) => [Some(shift(before)), Some(shift(after))],
                    Ok(AmbiguousOffset::Gap { .. }) | Err(_) => [None, None],
                }
            }
        }
    }

    /// The instant of a reading, or none if clocks in the zone never show it.
    pub(super) fn instant(&mut self, us: i64, offset_s: Option<i32>) -> Option<i64> {
        let instant = match (offset_s, &self.zone) {
            (Some(offset), _) => us - i64::from(offset) * SECOND,
            (None, None) => us,
            (None, Some(_)) if (self.steady.0..self.steady.1).contains(&us) => us - self.steady.2,
            (None, Some(zone)) => {
                let (instant, steady) = ambiguous(zone, us, self.before, self.falling)?;
                if let Some(steady) = steady {
                    self.steady = steady;
                }
                instant
            }
        };
        self.before = Some(instant);
        Some(instant)
    }
}

fn ambiguous(zone: &TimeZone, us: i64, before: Option<i64>, falling: bool) -> Option<(i64, Option<Steady>)> {
    let read =
        DateTime::constant(1970, 1, 1, 0, 0, 0, 0).checked_add(SignedDuration::from_micros(us)).ok()?;
    let shift = |offset: jiff::tz::Offset| i64::from(offset.seconds()) * SECOND;
    match zone.to_ambiguous_timestamp(read).offset() {
        AmbiguousOffset::Unambiguous { offset } => {
            let offset = shift(offset);
            let instant = us - offset;
            let at = Timestamp::from_microsecond(instant).ok()?;
            // A day's distance from either change keeps clear of its doubtful hours.
            let start =
                zone.preceding(at).next().map_or(i64::MIN / 2, |change| change.timestamp().as_microsecond());
            let end =
                zone.following(at).next().map_or(i64::MAX / 2, |change| change.timestamp().as_microsecond());
            Some((instant, Some((start + offset + DAY, end + offset - DAY, offset))))
        }
        AmbiguousOffset::Fold { before: summer, after: winter } => {
            let (first, second) = (us - shift(summer), us - shift(winter));
            let take_first = if falling {
                before.is_some_and(|before| second >= before)
            } else {
                before.is_none_or(|before| first > before)
            };
            Some((if take_first { first } else { second }, None))
        }
        AmbiguousOffset::Gap { .. } => None,
    }
}

#[cfg(test)]
mod tests {
    use super::super::stamp::stamp;
    use super::*;
    use crate::case::DateOrder;

    fn berlin() -> Resolver {
        Resolver::new(Some(TimeZone::get("Europe/Berlin").unwrap()), false)
    }

    fn at(cell: &str) -> i64 {
        stamp(cell.as_bytes(), DateOrder::YearFirst).unwrap().civil_us
    }

    #[test]
    fn the_doubled_hour_goes_by_the_order_of_rows() {
        let mut resolver = berlin();
        let rows = [
            "2025-10-26 01:30",
            "2025-10-26 02:00",
            "2025-10-26 02:30",
            "2025-10-26 02:00",
            "2025-10-26 02:30",
            "2025-10-26 03:00",
        ];
        let instants: Vec<i64> = rows.iter().map(|row| resolver.instant(at(row), None).unwrap()).collect();
        assert_eq!(instants[0], at("2025-10-25 23:30"));
        assert!(instants.windows(2).all(|pair| pair[1] - pair[0] == 1800 * SECOND), "{instants:?}");
        let mut backwards = Resolver::new(berlin().zone, true);
        let back: Vec<i64> = rows.iter().rev().map(|row| backwards.instant(at(row), None).unwrap()).collect();
        assert!(back.iter().rev().eq(&instants), "{back:?}");
    }

    #[test]
    fn the_hour_that_spring_leaves_out_is_no_instant() {
        let mut resolver = berlin();
        assert_eq!(resolver.instant(at("2025-03-30 01:45"), None), Some(at("2025-03-30 00:45")));
        assert_eq!(resolver.instant(at("2025-03-30 02:15"), None), None);
        assert_eq!(resolver.instant(at("2025-03-30 03:00"), None), Some(at("2025-03-30 01:00")));
    }

    #[test]
    fn the_short_way_agrees_with_the_calendar() {
        let mut resolver = berlin();
        let zone = TimeZone::get("Europe/Berlin").unwrap();
        let mut instant = at("2024-12-31 22:00");
        for _ in 0..(2 * 365 * 24) {
            let read = zone.to_datetime(Timestamp::from_microsecond(instant).unwrap());
            let us = read.duration_since(DateTime::constant(1970, 1, 1, 0, 0, 0, 0)).as_micros() as i64;
            assert_eq!(resolver.instant(us, None), Some(instant));
            instant += 3600 * SECOND;
        }
    }
}
