//! Interval data that are no text table: NEM12 records and usage data in XML. The files are of our own invention, laid out as the
//! published formats say.

use super::*;

/// A day of half-hours of one stream: values and the quality that ends the record.
fn day(date: &str, value: impl Fn(usize) -> String, quality: &str) -> String {
    let values: Vec<String> = (0..48).map(value).collect();
    format!("300,{date},{},{quality},,,20260203010203,\n", values.join(","))
}

fn stream(suffix: &str, unit: &str, minutes: u32) -> String {
    format!("200,6001234567,E1B1K1,01,{suffix},N1,METER1,{unit},{minutes},\n")
}

/// Two days of import, export and reactive energy, the second in part substituted and in part missing.
fn nem12() -> String {
    let mut text = "100,NEM12,202602030102,MDP1,RETAILER\n".to_owned();
    text += &stream("E1", "KWH", 30);
    text += &day("20260131", |i| format!("{}.5", i % 4), "A");
    text += &day("20260201", |i| format!("{i}"), "V");
    text += "400,1,40,A,,\n400,41,44,S14,,\n400,45,48,N,,\n";
    text += &stream("B1", "kWh", 30);
    text += &day("20260131", |_| "0.25".to_owned(), "A");
    text += &day("20260201", |i| if i == 3 { "broken".to_owned() } else { "0".to_owned() }, "A");
    text += &stream("K1", "KVARH", 30);
    text += &day("20260131", |_| "9".to_owned(), "A");
    text + "900\n"
}

#[test]
fn nem12_becomes_import_and_export_in_market_time() {
    let record = read_text(&nem12());
    // 2026-01-31 00:00 at ten hours east is 14:00 of the day before in UTC.
    assert_eq!(record.clock.start_us, 1_769_781_600 * 1_000_000);
    assert_eq!((record.clock.intervals, record.clock.step_s()), (96, 1800.0));
    assert_eq!((record.clock.civil(0).day, record.clock.civil(0).hour), (31, 0));
    let net = net(&record);
    // Energy of half an hour, twice as much in kW; net power is export less import.
    assert_eq!(net[2], Some((0.25 - 2.5) * 2.0));
    assert_eq!(net[48 + 10], Some(-10.0 * 2.0));
    assert_eq!(net[48 + 3], None, "a text among the values");
    assert_eq!(net[48 + 43], Some(-43.0 * 2.0), "a substituted value counts");
    assert!(net[48 + 44..].iter().all(Option::is_none), "missing values");
    let file = &record.reading.files[0];
    assert_eq!(file.container, "NEM12, market time (UTC+10)");
    let columns: Vec<(&str, Role)> =
        file.columns.iter().map(|column| (column.header.as_str(), column.role)).collect();
    assert_eq!(columns[1..], [("E1 import [kWh]", Role::Import), ("B1 export [kWh]", Role::Export)]);
    let text = found(&record, FindingKind::Text).unwrap();
    assert_eq!(text.first_row, Some(4), "the row of the day's first record");
    let filled = found(&record, FindingKind::Filled).unwrap();
    assert_eq!((filled.count, filled.first_row), (4, Some(4)));
    assert!(filled.text.contains("4 of 192 values (2.1 %)"), "{}", filled.text);
    let ignored = places(&record, FindingKind::Ignored);
    assert_eq!(ignored, [(1, None), (4, Some(4))]);
}

#[test]
fn the_order_of_nem12_records_does_not_matter() {
    let one = read_text(&nem12());
    let lines: Vec<String> = nem12().lines().map(|line| format!("{line}\n")).collect();
    // The export stream first, and its days in reverse.
    let text: String = [
        &lines[0], &lines[7], &lines[9], &lines[8], &lines[1], &lines[3], &lines[4], &lines[5], &lines[6],
        &lines[2], &lines[12],
    ]
    .into_iter()
    .map(String::as_str)
    .collect();
    let other = read_text(&text);
    assert_eq!((&other.clock, net(&other)), (&one.clock, net(&one)));
    let terms = RecordCase { stamp: Some(Stamp::End), ..RecordCase::default() };
    let ends = read_with(&[("meter.csv", nem12().as_bytes())], &terms, &[]).unwrap();
    assert_eq!(
        (&ends.clock, net(&ends)),
        (&one.clock, net(&one)),
        "which end the stamps mark is the file's own matter"
    );
}

#[test]
fn nem12_that_is_not_whole_says_where() {
    let whole = nem12();
    let day = day("20260131", |_| "1".to_owned(), "A");
    let head = "100,NEM12,202602030102,MDP1,RETAILER\n";
    for (text, what, row) in [
        (format!("{head}{day}"), "before the data stream", 2),
        (format!("{head}{}400,1,2,A\n", stream("E1", "KWH", 30)), "before any day's values", 3),
        (format!("{head}{}{day}400,1,49,A\n", stream("E1", "KWH", 30)), "names no intervals", 4),
        (format!("{head}{}", stream("E1", "KWH", 7)), "length of an interval is “7”", 2),
        (
            format!("{head}{}{}", stream("E1", "KWH", 30), day.replace("20260131", "20260231")),
            "“20260231”",
            3,
        ),
        (format!("{head}{}{}", stream("E1", "KWH", 30), &day[..60]), "of 48: the record is cut off", 3),
    ] {
        let fault = refusal(&text);
        assert!(fault.what.contains(what) && fault.place == format!("meter.csv, row {row}"), "{fault}");
    }
    let fault = refusal(&format!("{head}{}{day}900\n", stream("Q1", "KVARH", 30)));
    assert!(fault.what.contains("it holds Q1 (KVARH)"), "{fault}");
    assert!(refusal("100,NEM13,202602030102,A,B\n").what.contains("NEM13"));
    let cut = read_text(whole.trim_end().trim_end_matches("900"));
    assert!(
        cut.findings.iter().any(|finding| finding.text.contains("(900)") && finding.first_row == Some(12))
    );
}

const HOUR: i64 = 3600;

/// A feed (NAESB REQ.21) of one usage point: what goes in, what comes out, and its daily sums; `kinds` are the reading types.
fn feed(kinds: [&str; 3], blocks: [&str; 3]) -> String {
    let entry = |own: &str, up: &str, related: &[&str], content: &str| {
        let links: String =
            related.iter().map(|to| format!(r#"<link rel="related" href="{to}"/>"#)).collect();
        format!(
            "<entry><id>urn:uuid:0</id><link rel=\"self\" href=\"{own}\"/><link rel=\"up\" href=\"{up}\"></link>{links}<title>Käse &amp; Wein</title><content>{content}</content></entry>\n"
        )
    };
    let mut text = "<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n<feed xmlns=\"http://www.w3.org/2005/Atom\" xmlns:xsi=\"http://www.w3.org/2001/XMLSchema-instance\">\n".to_owned();
    text += &entry(
        "/U/1",
        "/U",
        &["/U/1/M"],
        r#"<UsagePoint xmlns="http://naesb.org/espi"><ServiceCategory><kind>0</kind></ServiceCategory></UsagePoint>"#,
    );
    text += &entry(
        "/L/1",
        "/L",
        &[],
        r#"<LocalTimeParameters xmlns="http://naesb.org/espi"><dstOffset>3600</dstOffset><tzOffset>-18000</tzOffset></LocalTimeParameters>"#,
    );
    for (i, (kind, block)) in kinds.into_iter().zip(blocks).enumerate() {
        let (meter, blocks, of) = (format!("/U/1/M/{i}"), format!("/U/1/M/{i}/B"), format!("/T/{i}"));
        text += &entry(&meter, "/U/1/M", &[&of, &blocks], r#"<MeterReading xmlns="http://naesb.org/espi"/>"#);
        if !block.is_empty() {
            text += &entry(
                &format!("{blocks}/1"),
                &blocks,
                &[],
                &format!(
                    r#"<espi:IntervalBlock xmlns:espi="http://naesb.org/espi"><espi:interval><espi:duration>86400</espi:duration><espi:start>0</espi:start></espi:interval>{block}</espi:IntervalBlock>"#
                ),
            );
        }
        if !kind.is_empty() {
            text += &entry(
                &of,
                "/T",
                &[],
                &format!(r#"<ReadingType xmlns="http://naesb.org/espi">{kind}</ReadingType>"#),
            );
        }
    }
    text + "</feed>\n"
}

fn kind(unit: u32, ten: i32, direction: u32) -> String {
    format!(
        "<accumulationBehaviour>4</accumulationBehaviour><flowDirection>{direction}</flowDirection><powerOfTenMultiplier>{ten}</powerOfTenMultiplier><uom>{unit}</uom>"
    )
}

fn readings(step_s: i64, values: &[i64]) -> String {
    (0..)
        .zip(values)
        .map(|(i, value)| {
            let quality = if i == 1 { "<espi:ReadingQuality><espi:quality>8</espi:quality></espi:ReadingQuality>" } else { "" };
            format!("<espi:IntervalReading><espi:cost>77</espi:cost>{quality}<espi:timePeriod><espi:duration>{step_s}</espi:duration><espi:start>{}</espi:start></espi:timePeriod><espi:value>{value}</espi:value></espi:IntervalReading>", 1_767_243_600 + i * step_s)
        })
        .collect()
}

#[test]
fn usage_data_become_import_and_export() {
    let (hours, days) = (readings(HOUR, &[500, 1500, 0, 250]), readings(24 * HOUR, &[9000]));
    let out = readings(HOUR, &[0, 0, 7, 0]);
    let text = feed([&kind(72, 0, 1), &kind(72, -3, 19), &kind(72, 0, 1)], [&hours, &out, &days]);
    let record = read_text(&text);
    assert_eq!(net(&record), [Some(-0.5), Some(-1.5), Some(0.007 / 1000.0), Some(-0.25)]);
    // 2026-01-01 00:00 five hours west is 05:00 in UTC.
    assert_eq!(record.clock.start_us, 1_767_243_600 * 1_000_000);
    assert_eq!((record.clock.civil(0).day, record.clock.civil(0).hour), (1, 0));
    let file = &record.reading.files[0];
    assert!(file.container.starts_with("usage data in XML (ESPI), stamps are of UTC"), "{}", file.container);
    let columns: Vec<(&str, Role)> =
        file.columns.iter().map(|column| (column.header.as_str(), column.role)).collect();
    assert_eq!(columns[1..], [("import [Wh]", Role::Import), ("export [Wh]", Role::Export)]);
    let ignored = found(&record, FindingKind::Ignored).unwrap();
    assert_eq!(ignored.count, 1, "the day's sum beside its hours");
    let filled = found(&record, FindingKind::Filled).unwrap();
    assert!(filled.text.contains("2 of 9 readings (22.2 %)"), "{}", filled.text);

    let utf16: Vec<u8> = text.replace("UTF-8", "UTF-16").encode_utf16().flat_map(u16::to_le_bytes).collect();
    assert_eq!(net(&read_bytes(&utf16).unwrap()), net(&record));
    let terms = RecordCase { zone: Some("America/New_York".to_owned()), ..RecordCase::default() };
    let zoned = read_with(&[("usage.xml", text.as_bytes())], &terms, &[]).unwrap();
    assert_eq!((zoned.clock.start_us, net(&zoned)), (record.clock.start_us, net(&record)));
}

#[test]
fn power_and_one_type_for_all_are_read() {
    let text = feed([&kind(38, 3, 1), "", ""], ["", &readings(900, &[1, 2, 3]), ""]);
    let record = read_text(&text);
    assert_eq!(record.clock.step_s(), 900.0);
    assert_eq!(net(&record), some(&[-1.0, -2.0, -3.0]));
}

#[test]
fn usage_data_that_say_too_little_are_refused() {
    let (wh, hours) = (kind(72, 0, 1), readings(HOUR, &[1, 2, 3]));
    let good = feed([&wh, "", ""], [&hours, "", ""]);
    for (text, what) in [
        (feed(["", "", ""], [&hours, "", ""]), "ReadingType"),
        (feed([&wh, &kind(72, 0, 19), ""], ["", "", &hours]), "ReadingType"),
        (feed([&wh, "", ""], ["", "", ""]), "no interval readings"),
        (feed([&kind(169, 0, 1), "", ""], [&hours, "", ""]), "another unit (uom 169)"),
        (feed(["<flowDirection>1</flowDirection>", "", ""], [&hours, "", ""]), "uom is missing"),
        (feed([&wh.replace("iour>4", "iour>3"), "", ""], [&hours, "", ""]), "positions of a register"),
        (good.replace("<espi:start>1767247200</espi:start>", ""), "lacks its start"),
        (good.split("</espi:IntervalBlock>").next().unwrap_or_default().to_owned(), "cut off"),
        (good[..good.len() - 200].to_owned(), "XML cannot be read"),
        (good.replace("</espi:value>", "</espi:valve>"), "XML cannot be read"),
        (good.replace("<feed", "<!DOCTYPE feed [<!ENTITY a \"aaaa\">]>\n<feed"), "DOCTYPE"),
        (good.replace("naesb.org", "example.org"), "XML document"),
        (good.replace("</espi:cost>", &"<a>".repeat(100)), "nested"),
    ] {
        let fault = refusal(&text);
        assert!(fault.what.contains(what), "{fault}");
        assert!(fault.place.contains("meter.csv") && !fault.remedy.is_empty(), "{fault}");
    }
    let mixed = read_text(&feed([&wh, &kind(29, 0, 1), ""], [&hours, &hours, ""]));
    assert!(found(&mixed, FindingKind::Ignored).unwrap().text.contains("(uom 29)"));
}
