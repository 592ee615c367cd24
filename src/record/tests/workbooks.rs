//! Workbooks: written by another program's library, or by hand from the published parts of their formats.

use rust_xlsxwriter::{ExcelDateTime, Format, Formula, Workbook};

use super::containers::zip;
use super::*;

/// A workbook with notes, readings of two hours, and a short list.
fn book() -> Vec<u8> {
    let mut book = Workbook::new();
    let stamp = Format::new().set_num_format("dd.mm.yyyy hh:mm");
    let plain = Format::new();
    book.add_worksheet().set_name("Notes").unwrap().write(0, 0, "Meter 4711, read by hand").unwrap();
    let sheet = book.add_worksheet().set_name("Load & PV").unwrap();
    sheet.write(0, 0, "Site \"mill\"\nof the valley").unwrap();
    sheet.merge_range(2, 0, 3, 0, "Time", &plain).unwrap();
    sheet.merge_range(2, 1, 2, 2, "Power", &plain).unwrap();
    sheet.write(3, 1, "PV [kW]").unwrap().write(3, 2, "Load [kW]").unwrap();
    for i in 0..8_u32 {
        let at = ExcelDateTime::from_ymd(2026, 1, 31)
            .unwrap()
            .and_hms(22 + (i / 4) as u16, (i % 4 * 15) as u8, 0)
            .unwrap();
        // The stamps of the second hour are sums of fractions of a day, as formulas make them.
        let serial = 46053.0 + 22.0 / 24.0 + f64::from(i) * (1.0 / 96.0);
        if i < 4 {
            sheet.write_with_format(4 + i, 0, &at, &stamp).unwrap();
        } else {
            sheet.write_with_format(4 + i, 0, serial, &stamp).unwrap();
        }
        sheet.write(4 + i, 1, f64::from(i) / 3.0).unwrap();
        sheet
            .write_formula(4 + i, 2, Formula::new("=1+1").set_result((f64::from(i) + 0.1).to_string()))
            .unwrap();
    }
    sheet.write_formula(9, 2, Formula::new("=1/0").set_result("#DIV/0!")).unwrap();
    let short = book.add_worksheet().set_name("Year before").unwrap();
    for i in 0..2_u8 {
        let at = ExcelDateTime::from_ymd(2025, 1, 31).unwrap().and_hms(0, 15 * i, 0).unwrap();
        short.write_with_format(u32::from(i), 0, &at, &stamp).unwrap().write(u32::from(i), 1, 7).unwrap();
    }
    book.save_to_buffer().unwrap()
}

fn read_book(bytes: &[u8], terms: &RecordCase) -> Result<Record> {
    read_with(&[("mill.dat", bytes)], terms, &[])
}

#[test]
fn the_sheet_with_the_readings_is_read_and_said() {
    let record = read_book(&book(), &RecordCase::default()).unwrap();
    let expected: Vec<Option<f64>> = (0..8).map(|i| (i != 5).then_some(f64::from(i) / 3.0)).collect();
    assert_eq!(supply(&record), expected);
    let expected: Vec<Option<f64>> = (0..8).map(|i| (i != 5).then_some(f64::from(i) + 0.1)).collect();
    assert_eq!(demand(&record), expected);
    assert_eq!(record.clock.step_s(), 900.0);
    assert_eq!((record.clock.civil(7).hour, record.clock.civil(7).minute), (23, 45));
    let file = &record.reading.files[0];
    assert_eq!(file.sheets, ["Load & PV", "Notes", "Year before"]);
    assert_eq!((file.header_row, file.first_row), (Some(4), 5));
    assert_eq!(file.container, "workbook, sheet “Load & PV” of 3, merged header cells filled");
    assert_eq!(file.columns[0].header, "Time");
    let text = found(&record, FindingKind::Text).unwrap();
    assert_eq!((text.count, text.first_row), (1, Some(10)));
    assert!(text.text.contains("#DIV/0!"), "{}", text.text);
    let other = found(&record, FindingKind::Ignored).unwrap();
    assert!(other.text.contains("“Year before”") && !other.text.contains("Notes"), "{}", other.text);
}

#[test]
fn the_case_chooses_the_sheet() {
    let mut terms = RecordCase::default();
    terms.sheets.insert("mill.dat".to_owned(), "year before".to_owned());
    let record = read_book(&book(), &terms).unwrap();
    assert_eq!(demand(&record), some(&[7.0, 7.0]));
    assert_eq!(found(&record, FindingKind::Ignored), None);
    terms.sheets.insert("mill.dat".to_owned(), "Nobody".to_owned());
    let fault = read_book(&book(), &terms).unwrap_err();
    assert!(fault.what.contains("“Load & PV”") && fault.place.contains("record.sheets"), "{fault}");
    terms.sheets.clear();
    terms.sheets.insert("hill.xlsx".to_owned(), "Load".to_owned());
    let fault = read_book(&book(), &terms).unwrap_err();
    assert!(fault.what.contains("no workbook is named “hill.xlsx”"), "{fault}");
}

#[test]
fn dates_and_times_of_day_in_two_columns_are_read() {
    let mut book = Workbook::new();
    let (date, clock) = (Format::new().set_num_format("yyyy-mm-dd"), Format::new().set_num_format("hh:mm"));
    let sheet = book.add_worksheet();
    sheet.write(0, 0, "Date").unwrap().write(0, 1, "Time").unwrap().write(0, 2, "Load kWh").unwrap();
    for i in 0..48_u32 {
        sheet.write_with_format(1 + i, 0, 46053.0 + f64::from(i / 24), &date).unwrap();
        sheet.write_with_format(1 + i, 1, f64::from(i % 24) / 24.0, &clock).unwrap();
        sheet.write(1 + i, 2, i).unwrap();
    }
    let record = read_book(&book.save_to_buffer().unwrap(), &RecordCase::default()).unwrap();
    assert_eq!((record.clock.intervals, record.clock.step_s()), (48, 3600.0));
    assert_eq!(demand(&record)[47], Some(47.0));
}

#[test]
fn numbers_that_are_texts_keep_their_own_marks() {
    let mut book = Workbook::new();
    let sheet = book.add_worksheet();
    sheet.write(0, 0, "Zeit").unwrap().write(0, 1, "Last kW").unwrap();
    for (i, load) in (0..).zip(["1.234,5", "0,25", "3"]) {
        sheet.write(1 + i, 0, format!("31.01.2026 00:{:02}", i * 15)).unwrap().write(1 + i, 1, load).unwrap();
    }
    let record = read_book(&book.save_to_buffer().unwrap(), &RecordCase::default()).unwrap();
    assert_eq!(demand(&record), some(&[1234.5, 0.25, 3.0]));
}

/// An OpenDocument spreadsheet from its parts (OASIS ODF 1.2): value types, repeated cells and rows.
fn open_document(rows: &str) -> Vec<u8> {
    let content = format!(
        r#"<?xml version="1.0" encoding="UTF-8"?><office:document-content xmlns:office="urn:oasis:names:tc:opendocument:xmlns:office:1.0" xmlns:table="urn:oasis:names:tc:opendocument:xmlns:table:1.0" xmlns:text="urn:oasis:names:tc:opendocument:xmlns:text:1.0" office:version="1.2"><office:body><office:spreadsheet><table:table table:name="Sheet1">{rows}</table:table></office:spreadsheet></office:body></office:document-content>"#
    );
    let manifest = r#"<?xml version="1.0" encoding="UTF-8"?><manifest:manifest xmlns:manifest="urn:oasis:names:tc:opendocument:xmlns:manifest:1.0"/>"#;
    zip(&[
        ("mimetype", b"application/vnd.oasis.opendocument.spreadsheet"),
        ("content.xml", content.as_bytes()),
        ("META-INF/manifest.xml", manifest.as_bytes()),
    ])
}

#[test]
fn open_document_spreadsheets_are_read() {
    let head = r#"<table:table-row><table:table-cell office:value-type="string"><text:p>Zeit</text:p></table:table-cell><table:table-cell office:value-type="string"><text:p>Last [kW]</text:p></table:table-cell></table:table-row><table:table-row table:number-rows-repeated="2"><table:table-cell table:number-columns-repeated="16384"/></table:table-row>"#;
    let rows: String = (0..4)
        .map(|i| format!(r#"<table:table-row><table:table-cell office:value-type="date" office:date-value="2026-01-31T00:{:02}:00"><text:p>shown otherwise</text:p></table:table-cell><table:table-cell office:value-type="float" office:value="{}.25"><text:p>{i}</text:p></table:table-cell></table:table-row>"#, i * 15, i))
        .collect();
    let foot = r#"<table:table-row table:number-rows-repeated="1048569"><table:table-cell table:number-columns-repeated="16384"/></table:table-row>"#;
    let record = read_book(&open_document(&format!("{head}{rows}{foot}")), &RecordCase::default()).unwrap();
    assert_eq!(demand(&record), some(&[0.25, 1.25, 2.25, 3.25]));
    let file = &record.reading.files[0];
    assert_eq!((file.first_row, &file.sheets[..]), (4, &["Sheet1".to_owned()][..]));
}

#[test]
fn workbooks_in_archives_are_read_too() {
    let record = read_bytes(&zip(&[("2026/mill.xlsx", &book())])).unwrap();
    assert_eq!(record.reading.files[0].name, "meter.csv/2026/mill.xlsx");
    assert_eq!(record.clock.intervals, 8);
}

#[test]
fn a_program_without_a_reader_of_workbooks_may_ask_for_their_sheets() {
    let start = || {
        let sources: Vec<Box<dyn Source>> = vec![Box::new(Memory::new("mill.xlsx", book()))];
        read("site", sources, &RecordCase::default(), &[]).unwrap().without_workbooks()
    };
    let mut reader = start();
    assert_eq!(reader.workbook(), None);
    assert_eq!(reader.advance(1_000_000).unwrap(), None);
    let bytes = reader.workbook().unwrap();
    assert_eq!(bytes, book());
    assert_eq!((reader.advance(1_000_000).unwrap(), reader.workbook()), (None, None));
    reader.give_sheets(workbook_sheets(bytes));
    let asked = finish(reader).unwrap();
    let read_here = read_with(&[("mill.xlsx", &book())], &RecordCase::default(), &[]).unwrap();
    assert_eq!(
        (net(&asked), &asked.findings, &asked.reading),
        (net(&read_here), &read_here.findings, &read_here.reading)
    );

    let mut reader = start();
    reader.advance(1).unwrap();
    let fault = reader.advance(1).unwrap_err();
    assert!(fault.what.contains("no reader of workbooks") && fault.place == "mill.xlsx", "{fault}");
    let mut reader = start();
    reader.advance(1).unwrap();
    reader.workbook().unwrap();
    reader.give_sheets(Err(Fault::new("it broke", "", "Save it anew.")));
    assert_eq!(finish(reader).unwrap_err(), Fault::new("it broke", "mill.xlsx", "Save it anew."));
}

#[test]
fn workbooks_that_cannot_be_read_say_why_and_what_to_do() {
    let compound = b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1".repeat(100);
    let mut words = Workbook::new();
    words.add_worksheet().set_name("Words").unwrap().write(0, 0, "nothing here").unwrap();
    let words = words.save_to_buffer().unwrap();
    let encrypted = zip(&[
        ("mimetype", b"application/vnd.oasis.opendocument.spreadsheet"),
        ("content.xml", b"sealed"),
        (
            "META-INF/manifest.xml",
            br#"<manifest:manifest><manifest:file-entry manifest:full-path="content.xml"><manifest:encryption-data/></manifest:file-entry></manifest:manifest>"#,
        ),
    ]);
    for (bytes, what) in [
        (compound.clone(), "cannot be read"),
        (book()[..book().len() - 30].to_vec(), "cut off"),
        (zip(&[("xl/workbook.bin", b"x")]), ".xlsb"),
        (words, "no sheet of the workbook holds rows of numbers; it has “Words”"),
        (zip(&[("xl/workbook.xml", b"<workbook/>")]), "cannot be read"),
        (encrypted, "password"),
        (
            [
                &compound[..],
                &"EncryptedPackage".encode_utf16().flat_map(u16::to_le_bytes).collect::<Vec<_>>(),
            ]
            .concat(),
            "password",
        ),
    ] {
        let fault = read_book(&bytes, &RecordCase::default()).unwrap_err();
        assert!(fault.what.contains(what), "{fault}");
        assert_eq!(fault.place, "mill.dat");
        assert!(!fault.remedy.is_empty());
    }
}

/// A sheet with one cell in its last corner costs what its text costs, not what its area would.
#[test]
fn a_cell_in_the_far_corner_is_no_burden() {
    let mut book = Workbook::new();
    let sheet = book.add_worksheet();
    for i in 0..4_u32 {
        sheet.write(i, 0, format!("2026-01-31 00:{:02}", i * 15)).unwrap().write(i, 1, i).unwrap();
    }
    sheet.write(1_048_575, 16_383, 1).unwrap();
    let sheets = workbook_sheets(book.save_to_buffer().unwrap()).unwrap();
    assert!(sheets[0].text.len() < 1_100_000);
}

/// `mill.xls` was written by the npm package `xlsx` 0.18.5 (Apache-2.0): a title, an empty row, headers, and four quarters of an
/// hour of 2026-01-31 as serial days, the third value an error.
#[test]
fn older_workbooks_are_read() {
    let record = read_book(include_bytes!("mill.xls"), &RecordCase::default()).unwrap();
    assert_eq!(demand(&record), [Some(0.125), Some(1.125), None, Some(3.125)]);
    assert_eq!((record.clock.civil(0).day, record.clock.civil(3).minute), (31, 45));
    let file = &record.reading.files[0];
    assert_eq!((file.header_row, file.first_row, &file.sheets[..]), (Some(3), 4, &["Last".to_owned()][..]));
    assert_eq!(file.sample[0].1, ["2026-01-31 00:00:00", "0.125"]);
    let text = found(&record, FindingKind::Text).unwrap();
    assert!(text.first_row == Some(6) && text.text.contains("#DIV/0!"), "{}", text.text);
}
