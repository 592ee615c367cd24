//! One series in many hands.

use super::*;

const SUPPLY: [f64; 5] = [0.0, 1.5, 1234.5, 12.25, 0.125];
const DEMAND: [f64; 5] = [4.5, 4.25, 1000.0, 3.0, 2.5];

#[test]
fn one_series_in_many_dialects_is_one_record() {
    let plain = "time,supply_kw,demand_kw\n2026-01-31 00:00,0,4.5\n2026-01-31 00:15,1.5,4.25\n2026-01-31 00:30,1234.5,1000\n\
                 2026-01-31 00:45,12.25,3\n2026-01-31 01:00,0.125,2.5\n";
    let german = "Zeitstempel;Erzeugung [kW];Last [kW]\n31.01.2026 00:00;0,000;4,5\n31.01.2026 00:15;1,5;4,25\n31.01.2026 00:30;1.234,5;1.000\n\
                  31.01.2026 00:45;12,25;3\n31.01.2026 01:00;0,125;2,5\n";
    let energy = "Date,Time,PV (kWh),Load (kWh)\n01/31/2026,12:00 AM,0,1.125\n01/31/2026,12:15 AM,0.375,1.0625\n01/31/2026,12:30 AM,308.625,250\n\
                  01/31/2026,12:45 AM,3.0625,0.75\n01/31/2026,1:00 AM,0.03125,0.625\n";
    let variants: Vec<(&str, Vec<u8>)> = vec![
        ("plain", plain.into()),
        ("byte order mark", [b"\xef\xbb\xbf", plain.as_bytes()].concat()),
        ("carriage returns and line feeds", plain.replace('\n', "\r\n").into()),
        ("carriage returns alone", plain.replace('\n', "\r").into()),
        ("tabs", plain.replace(',', "\t").into()),
        ("bars", plain.replace(',', "|").into()),
        ("semicolons and points", plain.replace(',', ";").into()),
        (
            "quotes",
            plain
                .lines()
                .map(|line| format!("\"{}\"\n", line.replace(',', "\",\"")))
                .collect::<String>()
                .into(),
        ),
        ("trailing separators", plain.replace('\n', ",,\n").into()),
        ("blank lines at the end", format!("{plain}\n\n\n").into()),
        ("no line feed at the end", plain.trim_end().into()),
        ("preamble", format!("Site: mill\nSerial,4711\nExported by,somebody,today\n\n{plain}").into()),
        ("padded preamble", format!("Site;mill;\nSerial;4711;\n;;\n{}", plain.replace(',', ";")).into()),
        ("comments", format!("# made by a logger\n# second line\n{plain}").into()),
        ("header as a comment", format!("#{plain}").into()),
        ("units row", plain.replace("supply_kw,demand_kw\n", "supply,demand\n,kW,kW\n").into()),
        ("watts in the units row", {
            let watts = "time,supply,demand\n-,[W],[W]\n2026-01-31 00:00,0,4500\n2026-01-31 00:15,1500,4250\n2026-01-31 00:30,1234500,1000000\n\
                         2026-01-31 00:45,12250,3000\n2026-01-31 01:00,125,2500\n";
            watts.into()
        }),
        ("german", german.into()),
        (
            "thousands by spaces",
            german
                .replace("1.", "1 ")
                .replace(".01 ", ".01.")
                .replace("01 2026", "01.2026")
                .replace("31 01", "31.01")
                .into(),
        ),
        ("energy with AM and PM", energy.into()),
        ("T and Z left out", plain.replace(" 0", "T0").into()),
        ("compact", plain.replace("2026-01-31 ", "20260131").replace(':', "").into()),
        ("day first", plain.replace("2026-01-31", "31/01/2026").into()),
        ("month first", plain.replace("2026-01-31", "1/31/26").into()),
        ("month by name", plain.replace("2026-01-31", "31-Jan-2026").into()),
        ("spans", plain.replace("00,", "00 - 2026-01-31 09:00,").into()),
        ("UTF-16", plain.encode_utf16().flat_map(u16::to_le_bytes).collect()),
        (
            "UTF-16 with mark",
            [vec![0xfe, 0xff], plain.encode_utf16().flat_map(u16::to_be_bytes).collect()].concat(),
        ),
        ("total at the foot", format!("{plain}Total,1248.375,1014.25\n").into()),
        ("a line that names the separator", format!("sep=;\n{}", plain.replace(',', ";")).into()),
        ("decimal commas in quotes", plain.lines().map(quoted_commas).collect::<String>().into()),
        ("columns padded with spaces", plain.replace(',', " ,   ").into()),
        ("start and end columns", {
            let rows = plain.lines().skip(1).map(|line| line.replacen(',', ",2026-02-01 00:00,", 1) + "\n");
            format!("start,end,supply kW,demand kW\n{}", rows.collect::<String>()).into()
        }),
        ("gzip", gzip(plain.as_bytes())),
        ("gzip in two members", [gzip(&plain.as_bytes()[..60]), gzip(&plain.as_bytes()[60..])].concat()),
    ];
    for (name, bytes) in variants {
        let record = read_bytes(&bytes).unwrap_or_else(|fault| panic!("{name}: {fault}"));
        assert_eq!(supply(&record), some(&SUPPLY), "{name}: {:?}", record.reading);
        assert_eq!(demand(&record), some(&DEMAND), "{name}");
        assert_eq!(record.clock.stamp(0), "2026-01-31T00:00:00+00:00", "{name}");
        assert_eq!((record.clock.step_us, record.clock.intervals), (900_000_000, 5), "{name}");
        let harmless = [FindingKind::Ignored];
        assert!(kinds(&record).iter().all(|kind| harmless.contains(kind)), "{name}: {:?}", record.findings);
    }
}

/// A row with every cell in quotes and decimal commas.
fn quoted_commas(line: &str) -> String {
    let cells: Vec<String> = line.split(',').map(|cell| format!("\"{}\"", cell.replace('.', ","))).collect();
    cells.join(",") + "\n"
}

fn gzip(bytes: &[u8]) -> Vec<u8> {
    use std::io::Write;
    let mut encoder = flate2::write::GzEncoder::new(Vec::new(), flate2::Compression::default());
    encoder.write_all(bytes).unwrap();
    encoder.finish().unwrap()
}

#[test]
fn counts_and_serial_days_are_stamps_too() {
    let start = |text: &str| {
        let record = read_text(text);
        (record.clock.stamp(0), record.clock.step_s())
    };
    assert_eq!(
        start("timestamp,load kW\n1769817600,1\n1769818500,2\n1769819400,3\n"),
        ("2026-01-31T00:00:00+00:00".to_owned(), 900.0)
    );
    assert_eq!(
        start("ts,load kW\n1769817600000,1\n1769817601000,2\n1769817602000,3\n"),
        ("2026-01-31T00:00:00+00:00".to_owned(), 1.0)
    );
    assert_eq!(
        start("time;load kW\n46053,0;1\n46053,0104166667;2\n46053,0208333333;3\n46053,03125;4\n"),
        ("2026-01-31T00:00:00+00:00".to_owned(), 900.0)
    );
    assert_eq!(start("t [h],load kW\n0,1\n0.25,2\n0.5,3\n"), ("1970-01-01T00:00:00+00:00".to_owned(), 900.0));
    assert_eq!(start("t_s,load kW\n0,1\n10,2\n20,3\n"), ("1970-01-01T00:00:00+00:00".to_owned(), 10.0));
    assert_eq!(
        start("Date,Hour,load kW\n31.01.2026,1,1\n31.01.2026,2,2\n31.01.2026,24,3\n"),
        ("2026-01-31T00:00:00+00:00".to_owned(), 3600.0)
    );
}

#[test]
fn the_order_of_day_and_month_is_decided_by_all_rows() {
    let build = |date: fn(u32, u32) -> String| {
        let mut text = "time,load kW\n".to_owned();
        for month in 1..=2 {
            for day in 1..=28 {
                text.push_str(&format!("{} 00:00,1\n{} 12:00,2\n", date(day, month), date(day, month)));
            }
        }
        text
    };
    for (date, order) in [
        ((|day, month| format!("{day:02}/{month:02}/2026")) as fn(u32, u32) -> String, "day first"),
        (|day, month| format!("{month:02}/{day:02}/2026"), "month first"),
        (|day, month| format!("{month}.{day}.26"), "month first"),
        (|day, month| format!("26-{month:02}-{day:02}"), "year first"),
    ] {
        let record = read_text(&build(date));
        assert_eq!(record.reading.files[0].stamps, order);
        assert_eq!(record.clock.stamp(0), "2026-01-01T00:00:00+00:00");
        assert_eq!(found(&record, FindingKind::StampDoubt), None, "{order}");
    }
    let doubtful = "time,load kW\n01/02/2026 00:00,1\n01/02/2026 01:00,2\n01/02/2026 02:00,2\n";
    let record = read_text(doubtful);
    assert_eq!(record.clock.stamp(0), "2026-02-01T00:00:00+00:00");
    assert!(found(&record, FindingKind::StampDoubt).unwrap().changes_figures);
    let terms = RecordCase { date_order: Some(DateOrder::MonthFirst), ..RecordCase::default() };
    let record = read_with(&[("a", doubtful.as_bytes())], &terms, &[]).unwrap();
    assert_eq!(record.clock.stamp(0), "2026-01-02T00:00:00+00:00");
    assert_eq!(found(&record, FindingKind::StampDoubt), None);
}
