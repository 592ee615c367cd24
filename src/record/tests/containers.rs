//! Files in archives, and archives that are none or that mean harm.

use std::io::Write as _;

use flate2::Compression;
use flate2::write::{DeflateEncoder, GzEncoder};
use rawzip::{CompressionMethod, ZipArchiveWriter};

use super::*;

const PV: &str = "time,PV kW\n2026-01-31 00:00,0\n2026-01-31 00:15,1.5\n2026-01-31 00:30,3\n";
const LOAD: &str = "time;Last [kW]\n31.01.2026 00:00;4,5\n31.01.2026 00:15;4,25\n31.01.2026 00:30;x\n";

pub(super) fn zip(files: &[(&str, &[u8])]) -> Vec<u8> {
    let mut bytes = Vec::new();
    let mut archive = ZipArchiveWriter::new(&mut bytes);
    for (name, content) in files {
        let deflate = !name.contains(".gz");
        let method = if deflate { CompressionMethod::DEFLATE } else { CompressionMethod::STORE };
        let (mut entry, config) = archive.new_file(name).compression_method(method).start().unwrap();
        let descriptor = if deflate {
            let mut writer = config.wrap(DeflateEncoder::new(&mut entry, Compression::default()));
            writer.write_all(content).unwrap();
            let (encoder, descriptor) = writer.finish().unwrap();
            encoder.finish().unwrap();
            descriptor
        } else {
            let mut writer = config.wrap(&mut entry);
            writer.write_all(content).unwrap();
            writer.finish().unwrap().1
        };
        entry.finish(descriptor).unwrap();
    }
    archive.finish().unwrap();
    bytes
}

fn gzip(bytes: &[u8]) -> Vec<u8> {
    let mut encoder = GzEncoder::new(Vec::new(), Compression::best());
    encoder.write_all(bytes).unwrap();
    encoder.finish().unwrap()
}

/// An archive of one site as it comes: two tables, one of them gzipped, and a document.
fn site() -> Vec<u8> {
    zip(&[
        ("2026/pv.csv", PV.as_bytes()),
        ("2026/load.txt.gz", &gzip(LOAD.as_bytes())),
        ("readme.pdf", b"%PDF-1.7 nothing of use"),
        ("notes.txt", b"The meter stands behind the third door.\n"),
    ])
}

#[test]
fn the_tables_of_an_archive_are_files_of_the_site() {
    let record = read_bytes(&site()).unwrap();
    assert_eq!(supply(&record), [Some(0.0), Some(1.5), None]);
    assert_eq!(demand(&record), [Some(4.5), Some(4.25), None]);
    let names: Vec<&str> = record.reading.files.iter().map(|file| file.name.as_str()).collect();
    assert_eq!(names, ["meter.csv/2026/pv.csv", "meter.csv/2026/load.txt.gz"]);
    assert_eq!(record.reading.files[1].container, "UTF-8, gzip");
    let text = found(&record, FindingKind::Text).unwrap();
    assert_eq!((text.first_row, text.file.as_str()), (Some(4), "meter.csv/2026/load.txt.gz"));
    let ignored = found(&record, FindingKind::Ignored).unwrap();
    assert_eq!((ignored.count, ignored.file.as_str()), (2, "meter.csv"));
    assert!(ignored.text.contains("readme.pdf") && ignored.text.contains("notes.txt"), "{}", ignored.text);
}

#[test]
fn an_archive_reads_like_its_file_in_any_slices() {
    let plain = read_text(PV);
    let packed = read_bytes(&zip(&[("pv.csv", PV.as_bytes())])).unwrap();
    assert_eq!((packed.clock, &packed.supply_kw), (plain.clock, &plain.supply_kw));
    let sources: Vec<Box<dyn Source>> = vec![Box::new(Memory::new("a.zip", site()))];
    let mut reader = read("site", sources, &RecordCase::default(), &[]).unwrap();
    let record = loop {
        if let Some(record) = reader.advance(1).unwrap() {
            break record;
        }
    };
    assert_eq!(net(&record), [Some(-4.5), Some(-2.75), None]);
    assert_eq!(reader.into_sources().len(), 4);
}

#[test]
fn roles_are_stated_for_files_in_archives() {
    let mut terms = RecordCase::default();
    terms.roles.insert("a.zip/pv.csv/PV kW".to_owned(), Role::Demand);
    let record = read_with(&[("a.zip", &zip(&[("pv.csv", PV.as_bytes())]))], &terms, &[]).unwrap();
    assert_eq!(demand(&record), some(&[0.0, 1.5, 3.0]));
}

/// The archive with bytes of its directory's first record changed (APPNOTE 4.3.12).
fn with_directory(mut bytes: Vec<u8>, at: usize, value: &[u8]) -> Vec<u8> {
    let directory = bytes.windows(4).position(|window| window == b"PK\x01\x02").unwrap();
    bytes[directory + at..directory + at + value.len()].copy_from_slice(value);
    bytes
}

#[test]
fn archives_that_cannot_be_read_say_why_and_what_to_do() {
    let one = || zip(&[("pv.csv", PV.as_bytes())]);
    let mut damaged = one();
    let data = damaged.windows(6).position(|window| window == b"pv.csv").unwrap() + 12;
    damaged[data] ^= 0x55;
    let zeros =
        [PV.as_bytes(), &format!("2026-01-31 00:45,{}\n", "0".repeat(200_000)).as_bytes().repeat(400)]
            .concat();
    for (bytes, what, remedy) in [
        (zip(&[]), "empty", "Choose"),
        (zip(&[("readme.pdf", b"%PDF-1.7")]), "“readme.pdf” (the file is a PDF document", "Choose"),
        (zip(&[("a.zip", &one())]), "an archive within the archive", "Choose"),
        (one()[..one().len() - 10].to_vec(), "cut off", "again"),
        (one()[..60].to_vec(), "cut off", "again"),
        (damaged, "damaged", "again"),
        (with_directory(one(), 8, &[1, 0]), "encrypted", "password"),
        (with_directory(one(), 10, &[14, 0]), "LZMA", "Unpack"),
        (with_directory(one(), 24, &[9, 0, 0, 0]), "damaged", "again"),
        (with_directory(one(), 24, &[255, 255, 255, 254]), "damaged", "again"),
        (zip(&[("zeros.csv", &zeros)]), "more than 500 times its size", "Choose"),
        (gzip(&zeros), "more than 500 times its size", "Choose"),
        (gzip(&one()), "gzipped", "Unpack"),
        (
            zip(&[("[Content_Types].xml", b"<Types/>"), ("word/document.xml", b"<w/>")]),
            "office document",
            "Choose",
        ),
    ] {
        let fault = read_bytes(&bytes).unwrap_err();
        assert!(fault.what.contains(what), "{fault}");
        assert!(fault.remedy.contains(remedy), "{fault}");
        assert!(fault.place.contains("meter.csv"), "{fault}");
    }
}

proptest! {
    #[test]
    fn any_damage_to_an_archive_gives_a_record_or_a_fault(at in 0usize..900, byte in any::<u8>(), cut in 0usize..900) {
        let mut bytes = site();
        let len = bytes.len();
        bytes[at % len] = byte;
        bytes.truncate(len - cut % 40);
        if let Err(fault) = read_bytes(&bytes) {
            prop_assert!(!fault.what.is_empty() && !fault.remedy.is_empty());
        }
    }
}
