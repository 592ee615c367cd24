//! The reader as a whole: files as they come, the record they make, and what is said about them.

#![allow(clippy::format_push_string, clippy::format_collect, reason = "tests build small tables")]

use proptest::prelude::*;

use super::*;
use crate::case::{DateOrder, GapRemedy, RecordCase, RepeatRemedy, Stamp};
use crate::fault::{Fault, Result};
use crate::job::{Job, finish};

mod clocks;
mod containers;
mod dialects;
mod encodings;
mod shapes;
mod usage;
mod workbooks;
mod written;

fn read_with(files: &[(&str, &[u8])], terms: &RecordCase, named: &[&str]) -> Result<Record> {
    let sources =
        files.iter().map(|(name, bytes)| Box::new(Memory::new(*name, *bytes)) as Box<dyn Source>).collect();
    let named: Vec<String> = named.iter().map(|name| (*name).to_owned()).collect();
    finish(read("site", sources, terms, &named)?)
}

fn read_bytes(bytes: &[u8]) -> Result<Record> {
    read_with(&[("meter.csv", bytes)], &RecordCase::default(), &[])
}

fn read_text(text: &str) -> Record {
    read_bytes(text.as_bytes()).unwrap()
}

fn refusal(text: &str) -> Fault {
    read_bytes(text.as_bytes()).unwrap_err()
}

fn values(series: Option<&Series>) -> Vec<Option<f64>> {
    series.map(|series| series.iter().collect()).unwrap_or_default()
}

fn supply(record: &Record) -> Vec<Option<f64>> {
    values(record.supply_kw.as_ref())
}

fn demand(record: &Record) -> Vec<Option<f64>> {
    values(record.demand_kw.as_ref())
}

fn net(record: &Record) -> Vec<Option<f64>> {
    (0..record.clock.intervals).map(|i| record.net_kw(i)).collect()
}

fn some(values: &[f64]) -> Vec<Option<f64>> {
    values.iter().map(|value| Some(*value)).collect()
}

fn found(record: &Record, kind: FindingKind) -> Option<&Finding> {
    record.findings.iter().find(|finding| finding.kind == kind)
}

fn kinds(record: &Record) -> Vec<FindingKind> {
    record.findings.iter().map(|finding| finding.kind).collect()
}

/// Row numbers and counts of the findings of a kind.
fn places(record: &Record, kind: FindingKind) -> Vec<(u64, Option<u64>)> {
    record.findings.iter().filter(|f| f.kind == kind).map(|f| (f.count, f.first_row)).collect()
}

#[test]
fn tables_without_headers_are_read_by_guesses_that_are_said() {
    let record = read_text("2026-01-31 00:00,4.5\n2026-01-31 00:15,4\n2026-01-31 00:30,5\n");
    assert_eq!(demand(&record), some(&[4.5, 4.0, 5.0]));
    assert_eq!(record.supply_kw, None);
    assert_eq!(kinds(&record), [FindingKind::SignDoubt, FindingKind::UnitDoubt]);
    assert_eq!(record.reading.files[0].header_row, None);
    assert_eq!(record.reading.files[0].columns[1].header, "column 2");
}

#[test]
fn rows_count_as_in_a_spreadsheet() {
    let rows = "2026-01-31 00:00,1\n2026-01-31 00:15,n/a\n2026-01-31 00:30,3\n";
    for (before, row) in [
        ("", 2),
        ("time,load kW\n", 3),
        ("meter 1\n\ntime,load kW\n", 5),
        ("note,\"two\nlines\"\ntime,load kW\n", 4),
    ] {
        let record = read_text(&format!("{before}{rows}"));
        let text = found(&record, FindingKind::Text).unwrap();
        assert_eq!((text.count, text.first_row), (1, Some(row)), "{before:?}");
        assert_eq!(places(&record, FindingKind::Gap), [(1, Some(row))], "{before:?}");
        assert_eq!(demand(&record), [Some(1.0), None, Some(3.0)]);
    }
}

#[test]
fn reference_files_are_read_to_the_last_bit() {
    for (text, intervals, step_s) in [
        (include_str!("../../tests/reference/site_hourly.csv"), 672, 3600.0),
        (include_str!("../../tests/reference/site_minute.csv"), 1440, 60.0),
    ] {
        let record = read_text(text);
        assert_eq!((record.clock.intervals, record.clock.step_s()), (intervals, step_s));
        for (i, line) in text.lines().skip(1).enumerate() {
            let cells: Vec<f64> = line.split(',').map(|cell| cell.parse().unwrap()).collect();
            assert_eq!(record.supply_kw.as_ref().unwrap().get(i), Some(cells[1]));
            assert_eq!(record.demand_kw.as_ref().unwrap().get(i), Some(cells[2]));
            if let Some(price) = cells.get(3) {
                assert_eq!(record.extra("price_eur_kwh").unwrap().values.get(i), Some(*price));
            }
        }
        assert_eq!(kinds(&record), [FindingKind::StampDoubt]);
        assert_eq!(record.findings[0].file, "");
    }
}

#[test]
fn net_columns_and_meters_make_net_power() {
    let rows = "2026-01-31 00:00,3,0,1\n2026-01-31 01:00,0,2,5\n";
    let record = read_text(&format!("time,import kW,export kW,temp\n{rows}"));
    assert_eq!(net(&record), some(&[-3.0, 2.0]));
    assert!(found(&record, FindingKind::Netted).is_some());
    let record = read_text(&format!("time,import kW,export kW,PV kW\n{rows}"));
    assert_eq!((supply(&record), demand(&record)), (some(&[1.0, 5.0]), some(&[4.0, 3.0])));
    assert_eq!(record.reading.files[0].columns[3].role, Role::Generation);
    let record = read_text("time,net load kW\n2026-01-31 00:00,3\n2026-01-31 01:00,-2\n");
    assert_eq!(net(&record), some(&[-3.0, 2.0]));
    assert_eq!(found(&record, FindingKind::SignDoubt), None);
    let record = read_text("time,net_kw\n2026-01-31 00:00,3\n2026-01-31 12:00,-2\n");
    assert_eq!(net(&record), some(&[-3.0, 2.0]));
    assert!(found(&record, FindingKind::SignDoubt).is_some());
    let record = read_text("time,net_kw\n2026-01-31 00:00,-3\n2026-01-31 12:00,2\n");
    assert_eq!(net(&record), some(&[-3.0, 2.0]));
    let record = read_text(
        "time,Wind kW,PV kW,Load A kW,Load B kW\n2026-01-31 00:00,1,2,3,4\n2026-01-31 12:00,1,0,3,5\n",
    );
    assert_eq!((supply(&record), demand(&record)), (some(&[3.0, 1.0]), some(&[7.0, 8.0])));
}

#[test]
fn energy_becomes_average_power() {
    let record = read_text("time,load Wh,PV MW\n2026-01-31 00:00,500,0.001\n2026-01-31 00:15,7,0\n");
    assert_eq!(demand(&record), some(&[500.0 / 1000.0 / 0.25, 7.0 / 1000.0 / 0.25]));
    assert_eq!(supply(&record), some(&[0.001 * 1000.0, 0.0]));
}

#[test]
fn what_the_case_states_goes_before_guesses() {
    let text = "when;A;B;C\n31.01.2026 00:15;1;2;7\n31.01.2026 00:30;3;4;8\n";
    let mut terms = RecordCase { stamp: Some(Stamp::End), ..RecordCase::default() };
    terms.roles.insert("b".to_owned(), Role::Demand);
    terms.roles.insert("x.csv/a".to_owned(), Role::Supply);
    terms.units.insert("A".to_owned(), "W".to_owned());
    let record = read_with(&[("x.csv", text.as_bytes())], &terms, &["c"]).unwrap();
    assert_eq!((supply(&record), demand(&record)), (some(&[0.001, 0.003]), some(&[2.0, 4.0])));
    assert_eq!(record.clock.stamp(0), "2026-01-31T00:00:00+00:00");
    assert_eq!(values(Some(&record.extra("C").unwrap().values)), some(&[7.0, 8.0]));
    terms.roles.insert("D".to_owned(), Role::Supply);
    let fault = read_with(&[("x.csv", text.as_bytes())], &terms, &[]).unwrap_err();
    insta::assert_snapshot!(fault, @"no column is named “D”; the columns are “when”, “A”, “B”, “C” (case, at record.roles). Correct the name, or remove the entry.");
}

#[test]
fn gaps_repeats_and_disorder_are_listed_with_their_rows() {
    let text = "time,load kW\n2026-01-31 00:00,1\n2026-01-31 01:00,2\n2026-01-31 01:00,2\n2026-01-31 04:00,5\n2026-01-31 04:00,7\n\
                2026-01-31 06:00,7\n2026-01-31 05:00,6\n2026-01-31 07:10,9\n2026-01-31 08:00,8\n2026-01-31 09:00,9\n\
                2026-01-31 10:00,10\n";
    let record = read_text(text);
    assert_eq!(places(&record, FindingKind::Gap), [(3, Some(4))]);
    assert_eq!(places(&record, FindingKind::Repeat), [(1, Some(4))]);
    assert_eq!(places(&record, FindingKind::Conflict), [(1, Some(6))]);
    assert_eq!(places(&record, FindingKind::Disorder), [(1, Some(8))]);
    assert_eq!(places(&record, FindingKind::MixedSteps), [(1, Some(9))]);
    let expected = [
        Some(1.0),
        Some(2.0),
        None,
        None,
        Some(5.0),
        Some(6.0),
        Some(7.0),
        None,
        Some(8.0),
        Some(9.0),
        Some(10.0),
    ];
    assert_eq!(demand(&record), expected);
    insta::assert_snapshot!(found(&record, FindingKind::Gap).unwrap().text, @"3 of 11 intervals (27.3 %) are missing: there is no row for them. The 2 gaps are 2 h from 2026-01-31 02:00, 1 h from 2026-01-31 07:00.");
    let mut terms = RecordCase::default();
    terms.remedies.repeat = RepeatRemedy::Mean;
    terms.remedies.gap = GapRemedy::Line;
    let record = read_with(&[("a", text.as_bytes())], &terms, &[]).unwrap();
    assert_eq!(
        demand(&record),
        some(&[
            1.0,
            2.0,
            2.0 + 4.0 * (1.0 / 3.0),
            2.0 + 4.0 * (2.0 / 3.0),
            6.0,
            6.0,
            7.0,
            7.5,
            8.0,
            9.0,
            10.0
        ])
    );
    assert_eq!((record.filled, places(&record, FindingKind::Filled)), (3, vec![(3, None)]));
    terms.remedies.repeat = RepeatRemedy::Last;
    let record = read_with(&[("a", text.as_bytes())], &terms, &[]).unwrap();
    assert_eq!(demand(&record)[4], Some(7.0));
}

#[test]
fn an_interval_counts_only_with_all_it_needs() {
    let record = read_text(
        "time,PV kW,load kW\n2026-01-31 00:00,1,2\n2026-01-31 01:00,,2\n2026-01-31 02:00,1,Err\n2026-01-31 03:00,1,inf\n2026-01-31 04:00,1,1e300\n2026-01-31 05:00,1,1\n",
    );
    assert_eq!(supply(&record), [Some(1.0), None, None, None, None, Some(1.0)]);
    assert_eq!(
        supply(&record).iter().map(Option::is_some).collect::<Vec<_>>(),
        demand(&record).iter().map(Option::is_some).collect::<Vec<_>>()
    );
    assert_eq!(places(&record, FindingKind::Text), [(2, Some(4))]);
    assert_eq!(places(&record, FindingKind::Outlier), [(1, Some(6))]);
    assert!(found(&record, FindingKind::Text).unwrap().text.contains("“Err”"));
}

#[test]
fn zones_make_summer_time_regular() {
    let mut text = "time,load kW\n".to_owned();
    for (stamp, value) in [("00:00", 0), ("01:00", 1), ("02:00", 2), ("02:00", 3), ("03:00", 4), ("04:00", 5)]
    {
        text.push_str(&format!("2025-10-26 {stamp},{value}\n"));
    }
    let record = read_text(&text);
    assert_eq!(places(&record, FindingKind::Conflict), [(1, Some(5))]);
    assert!(found(&record, FindingKind::ClockChange).unwrap().text.contains("State the zone"));
    let terms = RecordCase { zone: Some("Europe/Berlin".to_owned()), ..RecordCase::default() };
    let record = read_with(&[("a", text.as_bytes())], &terms, &[]).unwrap();
    assert_eq!(demand(&record), some(&[0.0, 1.0, 2.0, 3.0, 4.0, 5.0]));
    assert_eq!(record.clock.stamp(0), "2025-10-26T00:00:00+02:00");
    assert_eq!(kinds(&record), []);
    let record = read_text(
        "time,load kW\n2026-01-31T00:00+01:00,1\n2026-01-31T01:00+01:00,2\n2026-01-31T03:00+02:00,2\n",
    );
    assert_eq!(record.clock.stamp(0), "2026-01-31T00:00:00+01:00");
    assert_eq!(record.clock.intervals, 3);
    let spring =
        "time,load kW\n2026-03-29 00:00,1\n2026-03-29 01:00,1\n2026-03-29 03:00,1\n2026-03-29 04:00,1\n";
    assert!(found(&read_text(spring), FindingKind::ClockChange).unwrap().text.contains("2026-03-29 02:00"));
    let record = read_with(&[("a", spring.as_bytes())], &terms, &[]).unwrap();
    assert_eq!((record.clock.intervals, kinds(&record)), (4, vec![]));
}

#[test]
fn absurd_stamps_are_left_out_not_stretched_to() {
    let mut text = "time,load kW\n".to_owned();
    for hour in 0..24 {
        text.push_str(&format!("2024-01-31 {hour:02}:00,{hour}\n"));
    }
    text.push_str("2924-02-01 00:00,1\n1970-01-01 00:00,1\n2024-02-01 00:00,24\n");
    let record = read_text(&text);
    assert_eq!(record.clock.intervals, 25);
    assert!(places(&record, FindingKind::Disorder).contains(&(2, Some(26))), "{:?}", record.findings);
    let fault = refusal(
        "time,load kW\n2024-01-31 00:00,1\n2024-01-31 00:01,1\n9924-01-31 00:00,1\n9924-01-31 00:01,1\n",
    );
    assert_eq!(fault.place, "meter.csv, row 4");
}

#[test]
fn rows_from_the_newest_to_the_oldest_make_the_same_record() {
    let head = "time,load kW\n";
    let rows =
        ["2026-01-31 00:00,1\n", "2026-01-31 01:00,2\n", "2026-01-31 02:00,3\n", "2026-01-31 03:00,4\n"];
    let backwards = read_text(&format!("{head}{}{}{}{}", rows[3], rows[2], rows[1], rows[0]));
    assert_eq!(demand(&backwards), demand(&read_text(&format!("{head}{}", rows.concat()))));
    assert_eq!(
        found(&backwards, FindingKind::Disorder).unwrap().text,
        "The rows run from the newest to the oldest."
    );
}

#[test]
fn files_of_one_site_share_a_clock() {
    let january: &[u8] = b"time,load kW\n2026-01-31 22:00,1\n2026-01-31 23:00,2\n";
    let february: &[u8] = b"time,load kW\n2026-02-01 00:00,3\n2026-02-01 01:00,4\n";
    let sun: &[u8] = b"time,PV kW\n2026-01-31 23:00,10\n2026-02-01 00:00,20\n";
    let other: &[u8] = b"time,load B kW\n2026-01-31 22:00,100\n2026-01-31 23:00,100\n2026-02-01 00:00,100\n2026-02-01 01:00,100\n";
    let terms = RecordCase::default();
    let record = read_with(&[("feb", february), ("jan", january)], &terms, &[]).unwrap();
    assert_eq!(demand(&record), some(&[1.0, 2.0, 3.0, 4.0]));
    let record = read_with(&[("jan", january), ("feb", february), ("b", other)], &terms, &[]).unwrap();
    assert_eq!(demand(&record), some(&[101.0, 102.0, 103.0, 104.0]));
    let record = read_with(&[("jan", january), ("feb", february), ("sun", sun)], &terms, &[]).unwrap();
    assert_eq!(net(&record), [None, Some(8.0), Some(17.0), None]);
    let quarter: &[u8] = b"time,PV kW\n2026-01-31 23:00,10\n2026-01-31 23:15,20\n";
    let record = read_with(&[("jan", january), ("q", quarter)], &terms, &[]).unwrap();
    assert_eq!(record.clock.step_s(), 900.0);
    assert_eq!(net(&record)[3..7], [None, Some(8.0), Some(18.0), None]);
}

#[test]
fn faults_say_what_where_and_what_to_do() {
    for (bytes, expected) in [
        (&b""[..], "the file is empty"),
        (b"\n\n\n", "the file holds no text"),
        (b"PK\x03\x04aaaa[Content_Types].xml", "archive is cut off"),
        (b"\x89PNG\r\n\x1a\n", "PNG picture"),
        (b"%PDF-1.7", "PDF"),
        (b"abc\0def\0\0\0ghi", "binary"),
        (b"\x1f\x8b\x08\0garbage", "compressed file is damaged"),
        (b"{\"a\": 1}", "JSON"),
        (b"time,load kW\n", "no row of the file holds a stamp and a number"),
        (b"time,load kW\n2026-01-31 00:00,1\n", "only one stamp reads"),
        (b"name,load kW\nfoo,1\nbar,5\n", "no column holds stamps"),
        (b"time,remark\n2026-01-31 00:00,foo\n2026-01-31 00:15,bar\n", "no column holds numbers"),
        (b"time,load kW\n00:00,1\n00:15,2\n", "no column with dates"),
        (b"time,load kW\n01.01.2026 00:00,1,5\n01.01.2026 00:15,2,5\n", "decimal commas"),
        (b"time,load kW\n2026-01-01,1\n2026-02-01,2\n2026-03-01,2\n", "nothing can be said of storage"),
        (
            format!("time,load kW\n2026-01-31 00:00,\"1\n{}", "2026-01-31 01:00,2\n".repeat(200)).as_bytes(),
            "a quotation mark opens a cell",
        ),
        (b"hello world", "no row of the file"),
    ] {
        let fault = read_bytes(bytes).unwrap_err();
        assert!(fault.what.contains(expected), "{fault}");
        assert!(fault.place.contains("meter.csv"), "{fault}");
        assert!(!fault.remedy.is_empty(), "{fault}");
    }
    insta::assert_snapshot!(refusal("name,load kW\nfoo,1\nbar,5\n"), @"no column holds stamps; the first row of values begins “foo 1” (meter.csv, row 2). State which column holds the stamps (role time) or, if rows follow each other at a regular step, that step in seconds (record.step_s).");
}

#[test]
fn one_row_is_enough_where_the_step_is_stated() {
    let terms = RecordCase { step_s: Some(900.0), ..RecordCase::default() };
    let record = read_with(&[("a", b"time,load kW\n2026-01-31 00:00,1\n")], &terms, &[]).unwrap();
    assert_eq!((record.clock.intervals, demand(&record)), (1, some(&[1.0])));
}

#[test]
fn many_columns_are_summed() {
    let mut text = "time".to_owned();
    (0..200).for_each(|i| text.push_str(&format!(";Last {i} [kW]")));
    for hour in 0..24 {
        text.push_str(&format!("\n31.01.2026 {hour:02}:00"));
        (0..200).for_each(|_| text.push_str(";0,5"));
    }
    assert_eq!(demand(&read_text(&text)), vec![Some(100.0); 24]);
}

#[test]
fn other_encodings_are_told_by_their_bytes() {
    let record =
        read_bytes(b"Zeit;Erzeugung f\xfcr S\xfcd [kW]\n31.01.2026 00:00;1\n31.01.2026 01:00;2\n").unwrap();
    assert_eq!(record.reading.files[0].columns[1].header, "Erzeugung für Süd [kW]");
    assert!(record.reading.files[0].container.starts_with("Windows-1252"));
}

#[test]
fn slices_make_the_same_record_and_give_the_sources_back() {
    let text = include_str!("../../tests/reference/site_hourly.csv");
    let whole = read_text(text);
    let source: Box<dyn Source> = Box::new(Memory::new("meter.csv", text));
    let mut reader = read("site", vec![source], &RecordCase::default(), &[]).unwrap();
    let mut done = 0.0;
    let record = loop {
        if let Some(record) = reader.advance(100).unwrap() {
            break record;
        }
        assert!(reader.progress().done >= done);
        done = reader.progress().done;
    };
    assert_eq!(record, whole);
    let sources = reader.into_sources();
    assert_eq!(finish(read("site", sources, &RecordCase::default(), &[]).unwrap()).unwrap(), whole);
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(250))]

    #[test]
    fn any_bytes_give_a_record_or_a_fault(bytes in proptest::collection::vec(any::<u8>(), 0..600)) {
        let _ = read_bytes(&bytes);
    }

    #[test]
    fn any_damage_gives_a_record_or_a_fault(at in 0usize..400, byte in any::<u8>(), cut in 0usize..400) {
        let mut bytes = b"Site;mill\nZeit;Erzeugung [kW];Last [kW]\n".to_vec();
        for hour in 0..14 {
            bytes.extend(format!("31.01.2026 {hour:02}:00;{hour},5;1.234,25\n").bytes());
        }
        if let Some(slot) = bytes.get_mut(at) {
            *slot = byte;
        }
        bytes.truncate(bytes.len().saturating_sub(cut));
        if let Ok(record) = read_bytes(&bytes) {
            prop_assert!(record.clock.intervals > 0);
        }
    }

    #[test]
    fn any_table_gives_a_record_or_a_fault(text in "(([0-9]{1,4}[-./]?[0-9]{1,2}[-./]?[0-9]{1,4}( [0-9]{1,2}:[0-9]{2})?|[0-9,.]{1,6}|[a-z\"]{0,4})[,;\t\n|]){0,60}") {
        if let Ok(record) = read_bytes(text.as_bytes()) {
            prop_assert!(record.clock.intervals > 0);
            for i in 0..record.clock.intervals.min(1000) {
                prop_assert!(record.net_kw(i).is_none_or(f64::is_finite));
            }
        }
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(50))]

    #[test]
    fn every_number_written_is_the_number_read(values in proptest::collection::vec(-1e9f64..1e9, 2..20)) {
        let mut text = "time;net export kW\n".to_owned();
        for (i, value) in values.iter().enumerate() {
            text.push_str(&format!("2026-01-31 {i:02}:00;{value:?}\n"));
        }
        let terms = RecordCase { decimal: Some('.'), ..RecordCase::default() };
        let record = read_with(&[("a", text.as_bytes())], &terms, &[]).unwrap();
        prop_assert_eq!(net(&record), some(&values));
        let comma = RecordCase { decimal: Some(','), ..RecordCase::default() };
        let record = read_with(&[("a", text.replace('.', ",").as_bytes())], &comma, &[]).unwrap();
        prop_assert_eq!(net(&record), some(&values));
    }
}
