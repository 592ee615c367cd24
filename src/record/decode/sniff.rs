//! What a file is, told by its first bytes.

use super::{Container, Encoding, Kind, Returns};
use crate::fault::{Fault, Result};

/// What a file is, from its first bytes (unpacked, if it is gzipped).
///
/// # Errors
/// If it is known to be something that holds no text table.
pub(super) fn container(name: &str, gzip: bool, head: &[u8]) -> Result<Container> {
    if head.is_empty() {
        return Err(Fault::new(
            "the compressed file holds nothing",
            name,
            "Choose the file that holds the readings.",
        ));
    }
    let refuse = |what: &str, remedy: &str| {
        Err(Fault::new(format!("the file is {what}, not a text table"), name, remedy))
    };
    let table =
        "Choose a text table (CSV): one row per reading, columns separated by comma, semicolon or tab.";
    let starts = |magic: &[u8]| head.starts_with(magic);
    let kind = if starts(b"PK\x03\x04") || starts(b"PK\x05\x06") {
        Some(Kind::Zip)
    } else {
        starts(b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1").then_some(Kind::Compound)
    };
    if let Some(kind) = kind {
        if gzip {
            return refuse("an archive or workbook, gzipped", "Unpack the file once and choose the result.");
        }
        let carriage_returns = Returns::None;
        return Ok(Container {
            kind,
            gzip,
            encoding: Encoding::Bytes,
            bom: 0,
            carriage_returns,
            words: String::new(),
        });
    }
    for (magic, what, remedy) in [
        (
            &b"%PDF"[..],
            "a PDF document",
            "Ask for the readings as a text table (CSV); a PDF is a picture of them.",
        ),
        (b"\x89PNG", "a PNG picture", table),
        (b"\xff\xd8\xff", "a JPEG picture", table),
        (b"GIF8", "a GIF picture", table),
        (b"{\\rtf", "a rich text document", table),
        (b"7z\xbc\xaf", "a 7z archive", "Unpack the archive and choose the text table (CSV) inside."),
        (b"Rar!", "a RAR archive", "Unpack the archive and choose the text table (CSV) inside."),
        (
            b"\x28\xb5\x2f\xfd",
            "compressed with zstd",
            "Unpack the file and choose the text table (CSV) inside.",
        ),
        (b"BZh", "compressed with bzip2", "Unpack the file and choose the text table (CSV) inside."),
        (b"\xfd7zXZ", "compressed with xz", "Unpack the file and choose the text table (CSV) inside."),
        (b"PAR1", "a Parquet file", "Export the table as CSV and choose that file."),
        (b"SQLite format 3", "a SQLite database", "Export the table as CSV and choose that file."),
        (b"\x1f\x8b", "gzipped twice", "Unpack the file once and choose the result."),
    ] {
        if starts(magic) {
            return refuse(what, remedy);
        }
    }
    let (encoding, bom, mut words) = if starts(b"\xef\xbb\xbf") {
        (Encoding::Bytes, 3, "UTF-8 with byte order mark")
    } else if starts(b"\xff\xfe") {
        (Encoding::Utf16 { big: false }, 2, "UTF-16 (little-endian)")
    } else if starts(b"\xfe\xff") {
        (Encoding::Utf16 { big: true }, 2, "UTF-16 (big-endian)")
    } else if let Some(big) = bare_utf16(head) {
        (Encoding::Utf16 { big }, 0, "UTF-16 without byte order mark")
    } else {
        (Encoding::Bytes, 0, "UTF-8")
    };
    if encoding == Encoding::Bytes {
        if head.contains(&0) {
            return refuse("binary (it holds bytes that no text has)", table);
        }
        let strange = head
            .iter()
            .filter(|byte| **byte < 32 && !matches!(**byte, b'\t' | b'\n' | b'\r' | 12 | 26))
            .count();
        if strange * 50 > head.len() {
            return refuse("binary (it holds bytes that no text has)", table);
        }
        // The head may end within a character: only an error before its last bytes counts.
        if let Err(error) = std::str::from_utf8(head)
            && (error.error_len().is_some() || error.valid_up_to() + 4 < head.len())
        {
            words = "Windows-1252 (the bytes are not UTF-8)";
        }
    }
    let plain = |byte: u8| head.contains(&byte);
    let carriage_returns = match (plain(b'\r'), plain(b'\n')) {
        (false, _) => Returns::None,
        (true, true) => Returns::BeforeLineFeed,
        (true, false) => Returns::Alone,
    };
    let words = if gzip { format!("{words}, gzip") } else { words.to_owned() };
    Ok(Container { kind: Kind::Text, gzip, encoding, bom, carriage_returns, words })
}

/// What kind of text it is, from its first characters.
///
/// # Errors
/// If it is known to be no table.
pub(super) fn kind_of_text(name: &str, head: &[u8]) -> Result<Kind> {
    let trimmed = head.trim_ascii_start();
    let begins =
        |with: &[u8]| trimmed.get(..with.len()).is_some_and(|begins| begins.eq_ignore_ascii_case(with));
    let refuse = |what: &str| {
        Err(Fault::new(
            format!("the file is {what}, not a text table"),
            name,
            "Export the readings as a text table (CSV) and choose that file.",
        ))
    };
    if trimmed.first() == Some(&b'<') {
        let espi = b"naesb.org/espi";
        return if trimmed.windows(espi.len()).any(|window| window == espi) {
            Ok(Kind::Usage)
        } else if [&b"<!doctype"[..], b"<html", b"<?xml", b"<feed", b"<!--"].iter().any(|with| begins(with)) {
            refuse("a page or XML document")
        } else {
            Ok(Kind::Text)
        };
    }
    if begins(b"{") || begins(b"[{") || begins(b"[[") {
        return refuse("JSON");
    }
    if begins(b"100,NEM13") {
        return Err(Fault::new(
            "the file is NEM13: readings of a register weeks apart, not of intervals",
            name,
            "Ask for the interval data of the same meter (NEM12).",
        ));
    }
    Ok(if begins(b"100,NEM12") { Kind::Nem12 } else { Kind::Text })
}

/// Whether nearly every second byte is zero, as in ASCII text written as UTF-16; true for big-endian.
fn bare_utf16(head: &[u8]) -> Option<bool> {
    let pairs = head.len() / 2;
    let zero = |at: usize| head.iter().skip(at).step_by(2).filter(|byte| **byte == 0).count();
    let (even, odd) = (zero(0), zero(1));
    (pairs > 4).then_some(())?;
    if odd * 10 > pairs * 8 && even * 20 < pairs {
        Some(false)
    } else if even * 10 > pairs * 8 && odd * 20 < pairs {
        Some(true)
    } else {
        None
    }
}
