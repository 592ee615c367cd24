//! Bytes as they come: encodings, line ends, characters that no one sees, and lines without end.

use super::*;

const PLAIN: &str =
    "Zeit;Erzeugung [kW];Größe °C\n31.01.2026 00:00;1,5;7\n31.01.2026 00:15;2;8\n31.01.2026 00:30;0,25;9\n";

fn utf16(text: &str, big: bool, mark: bool) -> Vec<u8> {
    let units = mark.then_some(0xfeff).into_iter().chain(text.encode_utf16());
    units.flat_map(|unit| if big { unit.to_be_bytes() } else { unit.to_le_bytes() }).collect()
}

#[test]
fn every_encoding_and_line_end_makes_the_same_record() {
    let latin: Vec<u8> = PLAIN.chars().map(|c| c as u8).collect();
    for (bytes, words) in [
        (PLAIN.as_bytes().to_vec(), "UTF-8"),
        ([b"\xef\xbb\xbf", PLAIN.as_bytes()].concat(), "UTF-8 with byte order mark"),
        (utf16(PLAIN, false, true), "UTF-16 (little-endian)"),
        (utf16(PLAIN, true, true), "UTF-16 (big-endian)"),
        (utf16(PLAIN, false, false), "UTF-16 without byte order mark"),
        (utf16(PLAIN, true, false), "UTF-16 without byte order mark"),
        (latin, "Windows-1252 (the bytes are not UTF-8)"),
    ] {
        for ends in ["\n", "\r\n", "\r"] {
            let text = |bytes: &[u8]| -> Vec<u8> {
                // Line ends are one unit in every encoding, so that they can be exchanged in the bytes.
                let unit = if words.starts_with("UTF-16") { 2 } else { 1 };
                let big = words.contains("big") || (unit == 2 && bytes.first() == Some(&0));
                bytes
                    .chunks(unit)
                    .flat_map(|one| {
                        let feed = one.contains(&b'\n') && one.iter().all(|byte| matches!(byte, 0 | b'\n'));
                        let written = |byte: u8| match (unit, big) {
                            (1, _) => vec![byte],
                            (_, true) => vec![0, byte],
                            (_, false) => vec![byte, 0],
                        };
                        if feed { ends.bytes().flat_map(written).collect() } else { one.to_vec() }
                    })
                    .collect()
            };
            let record = read_bytes(&text(&bytes)).unwrap();
            assert_eq!(supply(&record), some(&[1.5, 2.0, 0.25]), "{words} {ends:?}");
            let file = &record.reading.files[0];
            assert_eq!(
                (file.container.as_str(), file.columns[2].header.as_str()),
                (words, "Größe °C"),
                "{ends:?}"
            );
        }
    }
}

#[test]
fn characters_that_no_one_sees_do_not_change_the_record() {
    let plain = read_text(PLAIN);
    for (count, what, text) in [
        (0, "no-break spaces", PLAIN.replace("1,5", "\u{a0}1,5\u{a0}").replace(" 00:15", "\u{a0}00:15")),
        (
            2,
            "zero-width spaces",
            PLAIN.replace("31.01.2026 00:15", "\u{200b}31.01.2026 00:15").replace(";2;", ";\u{200b}2;"),
        ),
        (1, "byte order marks in the middle", PLAIN.replace("31.01.2026 00:30", "\u{feff}31.01.2026 00:30")),
        (1, "marks of direction", PLAIN.replace("1,5", "\u{200e}1,5")),
        (1, "two byte order marks", format!("\u{feff}\u{feff}{PLAIN}")),
    ] {
        let record = read_bytes(text.as_bytes()).unwrap_or_else(|fault| panic!("{what}: {fault}"));
        assert_eq!(supply(&record), supply(&plain), "{what}");
        let unseen: Vec<u64> = record
            .findings
            .iter()
            .filter(|finding| finding.text.contains("cannot be seen"))
            .map(|finding| finding.count)
            .collect();
        assert_eq!(unseen.iter().sum::<u64>(), count, "{what}");
        assert_eq!(record.findings.len(), plain.findings.len() + unseen.len(), "{what}");
        assert_eq!(record.reading.files[0].columns[0].header, "Zeit", "{what}");
    }
}

#[test]
fn damage_is_told_with_its_place() {
    // Past the head, where the kind of file has been decided.
    let rows: String = (0..20_000_u32)
        .map(|i| {
            format!(
                "2026-{:02}-{:02} {:02}:{:02},1\n",
                1 + i / 2880 % 12,
                1 + i / 96 % 28,
                i / 4 % 24,
                i % 4 * 15
            )
        })
        .collect();
    let long = format!("time,load kW\n{rows}");
    let late = |odd: &str| format!("{long}2026-12-31 00:00,{odd}\n");
    let nul = read_bytes(late("1\u{0}3").as_bytes()).unwrap();
    let text = found(&nul, FindingKind::Text).unwrap();
    assert_eq!(text.first_row, Some(20_002));
    let ragged = read_text(&late("7,8,9,10\n2026-12-31 00:15"));
    assert_eq!(demand(&ragged).last(), Some(&None), "a row that ends before its value");

    let unclosed = read_bytes(
        format!("{long}2026-12-31 00:00,\"1\n{}", "2026-12-31 00:15,2\n".repeat(300_000)).as_bytes(),
    );
    let fault = unclosed.unwrap_err();
    assert!(fault.what.contains("quotation mark"), "{fault}");
    for line in
        ["x".repeat(2_000_000), format!("time,load kW\n{}", "1;".repeat(1_000_000)), "\0".repeat(2_000_000)]
    {
        let fault = read_bytes(line.as_bytes()).unwrap_err();
        assert!(fault.place.contains("meter.csv") && !fault.remedy.is_empty(), "{fault}");
    }
    let endless = read_bytes(format!("{long}{}", "1".repeat(9 << 20)).as_bytes()).unwrap_err();
    assert!(endless.what.contains("longer than 4 MB"), "{endless}");
}
