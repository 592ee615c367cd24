//! Stamps and labels: ends of intervals, typical years, marks of the doubled hour, parts in columns, no stamps at all.

use super::*;

fn start(record: &Record) -> String {
    record.clock.stamp(0)
}

fn rows(header: &str, rows: impl Iterator<Item = (String, usize)>) -> String {
    let mut text = format!("{header}\n");
    rows.for_each(|(stamp, i)| text.push_str(&format!("{stamp},{}\n", 1 + i % 7)));
    text
}

fn hour(i: usize) -> String {
    format!("2026-01-{:02} {:02}:00", 1 + i / 24, i % 24)
}

#[test]
fn ends_are_told_by_headers_and_by_24_00() {
    let ends = |header: &str| read_text(&rows(header, (1..49).map(|i| (hour(i), i))));
    assert_eq!(start(&ends("Interval end,load kW")), "2026-01-01T00:00:00+00:00");
    let record = ends("time,load kW");
    assert_eq!(start(&record), "2026-01-01T01:00:00+00:00");
    let doubt = found(&record, FindingKind::StampDoubt).unwrap();
    assert!(doubt.text.contains("every interval begins 1\u{202f}h earlier"), "{}", doubt.text);
    let midnight = |i: usize| (format!("2026-01-{:02} {:02}:00", 1 + (i - 1) / 24, (i - 1) % 24 + 1), i);
    let record = read_text(&rows("time,load kW", (1..49).map(midnight)));
    assert_eq!((start(&record).as_str(), record.clock.intervals), ("2026-01-01T00:00:00+00:00", 48));
    assert!(record.reading.clock_note.contains("end (days end with a stamp of 24:00)"));
    let stated = RecordCase { stamp: Some(Stamp::Start), ..RecordCase::default() };
    let text = rows("Interval end,load kW", (1..49).map(|i| (hour(i), i)));
    let record = read_with(&[("a", text.as_bytes())], &stated, &[]).unwrap();
    assert_eq!(start(&record), "2026-01-01T01:00:00+00:00");
    // Start and end side by side, and hours counted from 1, need no shift.
    let both = "von,bis,Last kW\n2026-01-01 00:00,2026-01-01 01:00,1\n2026-01-01 01:00,2026-01-01 02:00,2\n";
    assert_eq!(start(&read_text(both)), "2026-01-01T00:00:00+00:00");
    let counted = rows(
        "Date,Hour ending,Load kW",
        (0..48).map(|i| (format!("2026-01-{:02},{}", 1 + i / 24, i % 24 + 1), i)),
    );
    assert_eq!(start(&read_text(&counted)), "2026-01-01T00:00:00+00:00");
}

#[test]
fn a_typical_year_is_laid_on_the_meters() {
    // The meter's year has a 29 February, the typical one has none and no year.
    let days = |year: i64, count: usize| {
        (0..count * 24).map(move |i| {
            let first = stamp::days(year, 1, 1).unwrap();
            let (y, m, d) = stamp::date_of(first + i64::try_from(i / 24).unwrap());
            (format!("{y}-{m:02}-{d:02} {:02}:00", i % 24), i)
        })
    };
    let load = rows("time,load kW", days(2024, 366));
    let sun: String = rows("time,PV kW", days(2001, 365)).replace("2001-", "");
    let other = rows("time,PV kW", days(2011, 365));
    let mixed = rows("time,PV kW", days(2011, 365))
        .replace("2011-02", "2007-02")
        .replace("2011-07", "2014-07")
        .replace("2011-12", "1999-12");
    for pv in [sun, other, mixed] {
        let files: [(&str, &[u8]); 2] = [("load", load.as_bytes()), ("pv", pv.as_bytes())];
        let record = read_with(&files, &RecordCase::default(), &[]).unwrap();
        assert_eq!((record.clock.intervals, start(&record).as_str()), (8784, "2024-01-01T00:00:00+00:00"));
        assert_eq!(found(&record, FindingKind::Gap), None);
        let supply = supply(&record);
        let value = |i: usize| Some((1 + i % 7) as f64);
        assert_eq!(
            (supply[0], supply[58 * 24 + 5], supply[59 * 24 + 5]),
            (value(0), value(58 * 24 + 5), value(58 * 24 + 5))
        );
        assert_eq!((supply[60 * 24], supply[8783]), (value(59 * 24), value(8759)));
        let told = found(&record, FindingKind::TypicalYear).unwrap();
        assert!(told.text.contains("Weather and load do not coincide"), "{}", told.text);
    }
    let alone = rows("time,PV kW", days(2001, 365)).replace("2001-", "");
    let record = read_text(&alone);
    assert_eq!((record.clock.intervals, found(&record, FindingKind::Gap)), (8760, None));
    assert!(found(&record, FindingKind::TypicalYear).is_some());
}

#[test]
fn a_factor_scales_a_column() {
    let text = "time,PV per kWp kW,load kW\n2026-01-31 00:00,0.5,3\n2026-01-31 01:00,0.25,4\n";
    let mut terms = RecordCase::default();
    terms.scale.insert("PV per kWp kW".to_owned(), 40.0);
    let record = read_with(&[("a", text.as_bytes())], &terms, &[]).unwrap();
    assert_eq!((supply(&record), demand(&record)), (some(&[20.0, 10.0]), some(&[3.0, 4.0])));
}

#[test]
fn marks_of_the_doubled_hour_are_followed() {
    let terms = RecordCase { zone: Some("Europe/Berlin".to_owned()), ..RecordCase::default() };
    // Sorted by what the clock shows, so that only the marks tell the hours apart.
    let text =
        "Zeit;Last kW\n26.10.2025 01:00;1\n26.10.2025 02:00A;2\n26.10.2025 02:00B;3\n26.10.2025 03:00;4\n";
    let record = read_with(&[("a", text.as_bytes())], &terms, &[]).unwrap();
    assert_eq!(demand(&record), some(&[1.0, 2.0, 3.0, 4.0]));
    let named = text
        .replace("02:00A", "02:00 MESZ")
        .replace("02:00B", "02:00 MEZ")
        .replace("01:00;", "01:00 MESZ;")
        .replace("03:00;", "03:00 MEZ;");
    assert_eq!(demand(&read_text(&named)), some(&[1.0, 2.0, 3.0, 4.0]));
}

#[test]
fn parts_of_stamps_and_rows_without_stamps() {
    let parts = rows(
        "Year,Month,Day,Hour,load kW",
        (0..48).map(|i| (format!("2026,1,{},{}", 1 + i / 24, i % 24), i)),
    );
    let record = read_text(&parts);
    assert_eq!((start(&record).as_str(), record.clock.intervals), ("2026-01-01T00:00:00+00:00", 48));
    let bare = "load kW,PV kW\n4.5,0\n4.25,1\n5,2.5\n";
    assert!(refusal(bare).remedy.contains("record.step_s"));
    let terms = RecordCase { step_s: Some(900.0), ..RecordCase::default() };
    let record = read_with(&[("a", bare.as_bytes())], &terms, &[]).unwrap();
    assert_eq!((demand(&record), supply(&record)), (some(&[4.5, 4.25, 5.0]), some(&[0.0, 1.0, 2.5])));
    assert_eq!(kinds(&record), [FindingKind::StampDoubt]);
}

#[test]
fn what_is_marked_as_missing_is_missing() {
    for (marks, column) in [
        (["W", "E", "F", "W"], "Status"),
        (["actual", "estimated", "missing", "actual"], "quality"),
        (["0", "1", "x", "0"], "estimated"),
    ] {
        let mut text = format!("time,load kW,{column}\n");
        for (i, mark) in marks.iter().enumerate() {
            text.push_str(&format!("2026-01-31 {i:02}:00,{},{mark}\n", i + 1));
        }
        let record = read_text(&text);
        let third = if marks[2] == "x" { Some(3.0) } else { None };
        assert_eq!(demand(&record), [Some(1.0), Some(2.0), third, Some(4.0)], "{column}");
        assert!(
            record.findings.iter().any(|f| f.kind == FindingKind::Quality && f.text.contains("25\u{202f}%")),
            "{:?}",
            record.findings
        );
    }
    // Each of two marks speaks of the column before it.
    let text = "time,load kW,Status,PV kW,Status\n2026-01-31 00:00,1,W,5,F\n2026-01-31 01:00,2,W,6,W\n";
    let record = read_text(text);
    assert_eq!((demand(&record)[1], supply(&record)), (Some(2.0), vec![None, Some(6.0)]));
}

#[test]
fn roles_add_up_around_a_store() {
    let text = "time,Grid import kW,Grid export kW,PV kW,Battery charge kW,Battery discharge kW\n\
                2026-01-31 00:00,1,0,0,0,2\n2026-01-31 12:00,0,3,10,4,0\n";
    let record = read_text(text);
    // Demand = import - export + generation + discharge - charge.
    assert_eq!((supply(&record), demand(&record)), (some(&[0.0, 10.0]), some(&[3.0, 3.0])));
    let text = "time,Grid import kW,Grid export kW,Battery charge kW,Battery discharge kW\n\
                2026-01-31 00:00,1,0,0,2\n2026-01-31 12:00,0,3,4,0\n";
    assert_eq!(net(&read_text(text)), some(&[-3.0, 7.0]));
    // Power and energy of one thing count once; the names of files say what their columns do not.
    let mut both = "time,Load kW,Load kWh\n".to_owned();
    (0..24).for_each(|i| both.push_str(&format!("2026-01-31 {i:02}:30,{},{}\n", 4 + i % 3, 4 + i % 3)));
    assert_eq!(demand(&read_text(&both))[..2], some(&[4.0, 5.0]));
    let file = |value: u32| format!("time,kW\n2026-01-31 00:00,{value}\n2026-01-31 01:00,{value}\n");
    let (pv, house) = (file(3), file(5));
    let files: [(&str, &[u8]); 2] = [("pv_2026.csv", pv.as_bytes()), ("load.csv", house.as_bytes())];
    let record = read_with(&files, &RecordCase::default(), &[]).unwrap();
    assert_eq!((supply(&record), demand(&record)), (some(&[3.0, 3.0]), some(&[5.0, 5.0])));
}

#[test]
fn both_decimal_marks_in_one_file() {
    let text = "time;load kW;id\n2026-01-31 00:00;4.25;1\n2026-01-31 01:00;4,5;2\n2026-01-31 02:00;13,125;3\n2026-01-31 03:00;2.5;4\n";
    let record = read_text(text);
    assert_eq!(demand(&record), some(&[4.25, 4.5, 13.125, 2.5]));
    assert!(found(&record, FindingKind::Text).is_some());
    // Whole numbers in one column say nothing of the marks in another.
    let record = read_text("time;meter;load kW\n2026-01-31 00:00;4711;4.255\n2026-01-31 01:00;4711;5.125\n");
    assert_eq!(demand(&record), some(&[4.255, 5.125]));
}
