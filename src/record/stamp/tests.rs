//! Stamps as people write them.

use jiff::civil;
use proptest::prelude::*;

use super::*;

fn at(year: i64, month: i64, day: i64, seconds: i64) -> i64 {
    days(year, month, day).unwrap() * DAY + seconds * SECOND
}

#[test]
fn one_moment_in_many_hands() {
    let moment = at(2026, 1, 31, 13 * 3600 + 15 * 60);
    for (cell, order) in [
        ("2026-01-31T13:15", DateOrder::DayFirst),
        ("2026-01-31 13:15:00", DateOrder::MonthFirst),
        ("2026-01-31T13:15:00.000", DateOrder::DayFirst),
        ("2026/01/31 13:15", DateOrder::DayFirst),
        ("2026.1.31 13:15", DateOrder::DayFirst),
        ("202601311315", DateOrder::DayFirst),
        ("20260131131500", DateOrder::DayFirst),
        ("20260131 1315", DateOrder::DayFirst),
        ("20260131T131500", DateOrder::DayFirst),
        ("31.01.2026 13:15", DateOrder::DayFirst),
        ("31.1.26 13:15", DateOrder::DayFirst),
        ("31/01/2026 13:15:00", DateOrder::DayFirst),
        ("31-01-2026 13.15", DateOrder::DayFirst),
        ("01/31/2026 1:15 PM", DateOrder::MonthFirst),
        ("1/31/26 01:15:00 pm", DateOrder::MonthFirst),
        ("1/31/2026, 1:15 p.m.", DateOrder::MonthFirst),
        ("26-01-31 13:15", DateOrder::YearFirst),
        ("31-Jan-2026 13:15", DateOrder::MonthFirst),
        ("31 January 2026 13:15", DateOrder::DayFirst),
        ("31. Januar 2026 13:15 Uhr", DateOrder::DayFirst),
        ("Jan 31, 2026 13:15", DateOrder::DayFirst),
        ("Sat 31/01/2026 13:15", DateOrder::DayFirst),
        ("Sa, 31.01.2026 13:15", DateOrder::DayFirst),
        ("31.01.2026 13:15 - 31.01.2026 13:30", DateOrder::DayFirst),
        ("31/Jan/2026:13:15:00", DateOrder::DayFirst),
    ] {
        assert_eq!(stamp(cell.as_bytes(), order).map(|read| read.civil_us), Some(moment), "{cell}");
    }
}

#[test]
fn offsets_midnight_and_fractions() {
    let read =
        |cell: &str| stamp(cell.as_bytes(), DateOrder::DayFirst).map(|read| (read.civil_us, read.offset_s));
    let midnight = at(2026, 2, 1, 0);
    assert_eq!(read("2026-01-31 24:00"), Some((midnight, None)));
    assert_eq!(read("2026-02-01"), Some((midnight, None)));
    assert_eq!(read("2026-02-01T00:00Z"), Some((midnight, Some(0))));
    assert_eq!(read("2026-02-01T00:00:00+01:00"), Some((midnight, Some(3600))));
    assert_eq!(read("2026-02-01T00:00:00-0330"), Some((midnight, Some(-12_600))));
    assert_eq!(read("2026-02-01 00:00 +02"), Some((midnight, Some(7200))));
    assert_eq!(read("2026-02-01 00:00:00 UTC"), Some((midnight, Some(0))));
    assert_eq!(read("2026-02-01T00:00:00+01:00[Europe/Berlin]"), Some((midnight, Some(3600))));
    assert_eq!(read("2026-02-01 00:00:00,250"), Some((midnight + 250_000, None)));
    assert_eq!(stamp(b"12/31/2026 12:00 AM", DateOrder::MonthFirst).unwrap().civil_us, at(2026, 12, 31, 0));
    assert_eq!(time_of_day(b"7:05"), Some((25_500 * SECOND, false)));
    assert_eq!(time_of_day(b"0015"), Some((900 * SECOND, false)));
}

#[test]
fn what_is_no_stamp_is_refused() {
    for cell in [
        "",
        "12.5",
        "2026-02-30",
        "31.13.2026",
        "hello",
        "2026-01-01 25:00",
        "2026-01-01 12:60",
        "1234",
        "Total",
        "2026-01-01x",
        "0.0.0",
        "99999999",
        "2026-01-01 00:00 foo",
        "May",
        "1-2",
        "13:15",
    ] {
        assert_eq!(stamp(cell.as_bytes(), DateOrder::DayFirst), None, "{cell}");
    }
}

proptest! {
    #[test]
    fn every_date_agrees_with_the_calendar(year in 1i16..9999, month in 1i8..=12, day in 1i8..=31) {
        let expected = civil::Date::new(year, month, day).ok().map(|date| {
            i64::from((date - civil::date(1970, 1, 1)).get_days())
        });
        let found = days(i64::from(year), i64::from(month), i64::from(day));
        prop_assert_eq!(found, expected);
        if let Some(count) = found {
            prop_assert_eq!(date_of(count), (i64::from(year), i64::from(month), i64::from(day)));
        }
    }

    #[test]
    fn no_bytes_make_it_panic(bytes in proptest::collection::vec(any::<u8>(), 0..40)) {
        for order in [DateOrder::DayFirst, DateOrder::MonthFirst, DateOrder::YearFirst] {
            stamp(&bytes, order);
        }
        time_of_day(&bytes);
    }
}
