//! Bytes of a file to text: containers and encodings told by content, never by the file's ending.

use std::io::{self, BufReader, Read};

use flate2::bufread::MultiGzDecoder;

use super::Source;
use crate::fault::{Fault, Result};

mod sniff;

use sniff::{container, kind_of_text};

/// Most bytes that a packed file may hold.
pub(super) const MOST_BYTES: u64 = 4 << 30;

/// Most bytes that packed bytes may become, each: readings of nothing but zeros stay below it.
const MOST_GROWTH: u64 = 500;

/// Longest row in bytes: past it a quote was opened and never closed.
const LONGEST_ROW: u64 = 4 << 20;

/// Bytes looked at before the whole file is read.
pub(super) const HEAD: usize = 256 << 10;

/// What kind of file it is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Kind {
    /// Text that may be a table.
    Text,
    /// A zip archive, which a newer workbook is too.
    Zip,
    /// A container of an older workbook.
    Compound,
    /// Usage data in XML (ESPI).
    Usage,
    /// Interval data in records (NEM12).
    Nem12,
}

/// What a file is, decided on its first bytes.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Container {
    pub(super) kind: Kind,
    gzip: bool,
    encoding: Encoding,
    bom: usize,
    carriage_returns: Returns,
    /// In words, for people.
    pub(super) words: String,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Encoding {
    /// UTF-8, or single bytes of Windows-1252: digits and marks are the same, [`text`] tells them apart cell by cell.
    Bytes,
    Utf16 {
        big: bool,
    },
}

/// How lines end: all endings become a single line feed, so that rows can be counted.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Returns {
    None,
    BeforeLineFeed,
    Alone,
}

/// The text of a file as a stream of UTF-8 (or Windows-1252) bytes with line feeds, ending in a line feed.
pub(super) struct Decoded {
    feed: Feed,
    container: Container,
    name: String,
    total: u64,
    most: u64,
    allowance: u64,
    skip: usize,
    /// Bytes of the feed not yet handed on.
    raw: Vec<u8>,
    at: usize,
    last: u8,
    carry: Vec<u8>,
    ended: bool,
    /// Characters left out because nobody sees them.
    hidden: u64,
}

enum Feed {
    Plain(Raw),
    Gzip(Box<MultiGzDecoder<BufReader<Raw>>>),
}

/// A source as a reader from its start.
struct Raw {
    source: Box<dyn Source>,
    offset: u64,
}

impl Read for Raw {
    fn read(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
        let count = self.source.read_at(self.offset, buffer).map_err(io::Error::other)?;
        self.offset += count as u64;
        Ok(count.min(buffer.len()))
    }
}

impl Feed {
    fn new(source: Box<dyn Source>, gzip: bool) -> Self {
        let raw = Raw { source, offset: 0 };
        if gzip {
            Self::Gzip(Box::new(MultiGzDecoder::new(BufReader::with_capacity(1 << 16, raw))))
        } else {
            Self::Plain(raw)
        }
    }

    fn into_source(self) -> Box<dyn Source> {
        match self {
            Self::Plain(raw) => raw.source,
            Self::Gzip(decoder) => decoder.into_inner().into_inner().source,
        }
    }

    fn read(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
        match self {
            Self::Plain(raw) => raw.read(buffer),
            Self::Gzip(decoder) => decoder.read(buffer),
        }
    }

    /// Bytes of the source taken so far.
    fn offset(&self) -> u64 {
        match self {
            Self::Plain(raw) => raw.offset,
            Self::Gzip(decoder) => decoder.get_ref().get_ref().offset,
        }
    }
}

/// What a file is, and its first text.
type Looked = (Container, Vec<u8>);

/// Looks at the first bytes of a source: what it is, and its first text. The source comes back in any case.
pub(super) fn look(source: Box<dyn Source>) -> (Box<dyn Source>, Result<Looked>) {
    let name = source.name().to_owned();
    if source.is_empty() {
        let fault = Fault::new("the file is empty", name, "Choose the file that holds the readings.");
        return (source, Err(fault));
    }
    let mut source = source;
    let mut first = [0_u8; 8];
    let count = match source.read_at(0, &mut first) {
        Ok(count) => count,
        Err(fault) => return (source, Err(fault)),
    };
    let len = source.len();
    let gzip = first[..count].starts_with(&[0x1f, 0x8b]);
    let mut feed = Feed::new(source, gzip);
    // UTF-16 grows by a half at most as it becomes UTF-8.
    let room = if gzip {
        HEAD
    } else {
        usize::try_from(len.saturating_mul(2)).map_or(HEAD, |len| HEAD.min(len + 2))
    };
    let mut head = vec![0; room];
    let filled = fill(&mut feed, &mut head);
    let source = feed.into_source();
    let found = match filled {
        Ok(count) => {
            head.truncate(count);
            container(&name, gzip, &head)
        }
        Err(error) => Err(fault(&error, &name, gzip)),
    };
    match found {
        Ok(container) if matches!(container.kind, Kind::Zip | Kind::Compound) => {
            (source, Ok((container, Vec::new())))
        }
        Ok(mut container) => {
            let mut decoded = Decoded::open(source, &container);
            let mut text = vec![0; room];
            let read = decoded.read_full(&mut text);
            let name = decoded.name.clone();
            let source = decoded.into_source();
            let text = read.map(|count| {
                text.truncate(count);
                text
            });
            let looked = text.map_err(|error| fault(&error, &name, gzip)).and_then(|text| {
                container.kind = kind_of_text(&name, &text)?;
                Ok((container, text))
            });
            (source, looked)
        }
        Err(fault) => (source, Err(fault)),
    }
}

fn fill(feed: &mut Feed, buffer: &mut [u8]) -> io::Result<usize> {
    let mut count = 0;
    while count < buffer.len() {
        match feed.read(&mut buffer[count..])? {
            0 => break,
            more => count += more,
        }
    }
    Ok(count)
}

/// Whether the text goes on with a character that is not seen: U+200B to U+200F, U+202A to U+202E, U+2060 to U+2069, U+FEFF.
fn hidden(bytes: &[u8]) -> bool {
    matches!(
        bytes,
        [0xe2, 0x80, 0x8b..=0x8f | 0xaa..=0xae, ..] | [0xe2, 0x81, 0xa0..=0xa9, ..] | [0xef, 0xbb, 0xbf, ..]
    )
}

/// Whether `unpacked` bytes out of `packed` ones are more than any meter file would be.
pub(super) fn grows_without_end(unpacked: u64, packed: u64) -> bool {
    unpacked > 1 << 20 && unpacked / MOST_GROWTH > packed + (1 << 16)
}

/// The fault of a packed file that [`grows_without_end`].
#[cold]
pub(super) fn endless(name: &str) -> Fault {
    Fault::new(
        format!("the compressed file unpacks to more than {MOST_GROWTH} times its size; no meter file does"),
        name,
        "Choose the file that holds the readings.",
    )
}

impl Decoded {
    /// The text of a source from its start.
    pub(super) fn open(source: Box<dyn Source>, container: &Container) -> Self {
        let name = source.name().to_owned();
        Self {
            feed: Feed::new(source, container.gzip),
            container: container.clone(),
            name,
            total: 0,
            most: MOST_BYTES,
            allowance: LONGEST_ROW,
            skip: container.bom,
            raw: Vec::new(),
            at: 0,
            last: b'\n',
            carry: Vec::new(),
            ended: false,
            hidden: 0,
        }
    }

    /// The source again.
    pub(super) fn into_source(self) -> Box<dyn Source> {
        self.feed.into_source()
    }

    /// The file's name.
    pub(super) fn name(&self) -> &str {
        &self.name
    }

    /// How many characters were left out so far because nobody sees them.
    pub(super) fn hidden(&self) -> u64 {
        self.hidden
    }

    /// Says that a row was completed: the next may be as long again.
    pub(super) fn row_done(&mut self) {
        self.allowance = LONGEST_ROW;
    }

    /// Bytes of the file taken so far.
    pub(super) fn offset(&self) -> u64 {
        self.feed.offset()
    }

    fn read_full(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
        let mut count = 0;
        while count < buffer.len() {
            match self.read(&mut buffer[count..])? {
                0 => break,
                more => count += more,
            }
        }
        Ok(count)
    }

    /// Takes the next bytes of the feed and turns them into text with line feeds.
    fn refill(&mut self) -> io::Result<()> {
        self.raw.resize(1 << 16, 0);
        self.at = 0;
        let count = self.feed.read(&mut self.raw)?;
        self.raw.truncate(count);
        self.total += count as u64;
        if self.total > self.most {
            return Err(io::Error::other(Fault::new(
                format!("the file holds more than {} GB of text", self.most >> 30),
                self.name.clone(),
                "Cut the file into shorter spans.",
            )));
        }
        if grows_without_end(self.total, self.feed.offset()) {
            return Err(io::Error::other(endless(&self.name)));
        }
        if count == 0 {
            self.ended = true;
            self.raw.clear();
            if self.container.encoding == Encoding::Bytes {
                self.raw.append(&mut self.carry);
            }
            self.last = self.raw.last().copied().unwrap_or(self.last);
            if self.last != b'\n' {
                self.raw.push(b'\n');
                self.last = b'\n';
            }
            return Ok(());
        }
        if self.skip > 0 {
            let skipped = self.skip.min(self.raw.len());
            self.raw.drain(..skipped);
            self.skip -= skipped;
        }
        if let Encoding::Utf16 { big } = self.container.encoding {
            self.convert_utf16(big);
        }
        self.leave_out_hidden();
        match self.container.carriage_returns {
            Returns::None => {}
            // A return without a line feed after it is left to the row splitter, which takes it as a row's end too.
            Returns::BeforeLineFeed => self.raw.retain(|byte| *byte != b'\r'),
            Returns::Alone => {
                for byte in &mut self.raw {
                    if *byte == b'\r' {
                        *byte = b'\n';
                    }
                }
            }
        }
        if let Some(last) = self.raw.last() {
            self.last = *last;
        }
        Ok(())
    }

    /// Leaves out what stands between the characters and is not seen: zero-width spaces, marks of direction, byte order marks.
    fn leave_out_hidden(&mut self) {
        if self.container.encoding == Encoding::Bytes && !self.carry.is_empty() {
            self.carry.append(&mut self.raw);
            std::mem::swap(&mut self.carry, &mut self.raw);
        }
        if !self.raw.iter().any(|byte| matches!(byte, 0xc2 | 0xe2 | 0xef)) {
            return;
        }
        let (mut from, mut to) = (0, 0);
        while from < self.raw.len() {
            let rest = &self.raw[from..];
            if hidden(rest) {
                self.hidden += 1;
                from += 3;
                continue;
            }
            // A space that does not break is a space, in a stamp as between them.
            if rest.starts_with(&[0xc2, 0xa0]) {
                self.raw[to] = b' ';
                (from, to) = (from + 2, to + 1);
                continue;
            }
            // A character that is cut off waits for the next bytes.
            let whole = match rest[0] {
                0xc2 => 2,
                0xe2 | 0xef => 3,
                _ => 1,
            };
            if rest.len() < whole && self.container.encoding == Encoding::Bytes {
                self.carry.extend_from_slice(rest);
                break;
            }
            self.raw[to] = self.raw[from];
            (from, to) = (from + 1, to + 1);
        }
        self.raw.truncate(to);
    }

    fn convert_utf16(&mut self, big: bool) {
        let mut bytes = std::mem::take(&mut self.carry);
        bytes.append(&mut self.raw);
        // A half unit, or the first half of a pair, waits for the next bytes.
        let mut whole = bytes.len() & !1;
        let unit = |pair: &[u8]| {
            let pair = [pair[0], pair[1]];
            if big { u16::from_be_bytes(pair) } else { u16::from_le_bytes(pair) }
        };
        if whole >= 2 && (0xd800..0xdc00).contains(&unit(&bytes[whole - 2..whole])) {
            whole -= 2;
        }
        self.carry = bytes.split_off(whole);
        let units = bytes.chunks_exact(2).map(unit);
        let text: String =
            char::decode_utf16(units).map(|c| c.unwrap_or(char::REPLACEMENT_CHARACTER)).collect();
        self.raw = text.into_bytes();
    }
}

impl Read for Decoded {
    fn read(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
        while self.at >= self.raw.len() && !self.ended {
            self.refill()?;
        }
        let count = (self.raw.len() - self.at).min(buffer.len());
        if count as u64 > self.allowance {
            return Err(io::Error::other(Fault::new(
                format!(
                    "a row is longer than {} MB: probably a quotation mark is opened and never closed",
                    LONGEST_ROW >> 20
                ),
                self.name.clone(),
                "Remove the stray quotation mark, or choose a text table.",
            )));
        }
        self.allowance -= count as u64;
        buffer[..count].copy_from_slice(&self.raw[self.at..self.at + count]);
        self.at += count;
        Ok(count)
    }
}

/// The fault behind a reading error, at row `row` if that is known.
#[cold]
pub(super) fn fault(error: &io::Error, name: &str, gzip: bool) -> Fault {
    if let Some(fault) = error.get_ref().and_then(|inner| inner.downcast_ref::<Fault>()) {
        return fault.clone();
    }
    let what = if gzip { "the compressed file is damaged" } else { "the file cannot be read" };
    Fault::new(format!("{what}: {error}"), name, "Copy or unpack the file again and choose the copy.")
}

/// The fault behind an error of the row splitter.
#[cold]
pub(super) fn row_fault(error: &csv::Error, name: &str) -> Fault {
    match error.kind() {
        csv::ErrorKind::Io(error) => {
            let mut fault = fault(error, name, true);
            if !fault.place.contains(name) {
                fault.place = format!("{name}, {}", fault.place);
            }
            fault
        }
        _ => {
            Fault::new(format!("the rows cannot be told apart: {error}"), name, "Choose a text table (CSV).")
        }
    }
}

/// A cell as text: UTF-8, or else Windows-1252.
pub(super) fn text(bytes: &[u8]) -> String {
    match std::str::from_utf8(bytes) {
        Ok(text) => text.trim().to_owned(),
        Err(_not_utf8) => bytes.iter().map(|byte| windows_1252(*byte)).collect::<String>().trim().to_owned(),
    }
}

/// The character of a byte in Windows-1252 (WHATWG Encoding Standard, index windows-1252).
fn windows_1252(byte: u8) -> char {
    const HIGH: [char; 32] = [
        '€', '\u{81}', '‚', 'ƒ', '„', '…', '†', '‡', 'ˆ', '‰', 'Š', '‹', 'Œ', '\u{8d}', 'Ž', '\u{8f}',
        '\u{90}', '‘', '’', '“', '”', '•', '–', '—', '˜', '™', 'š', '›', 'œ', '\u{9d}', 'ž', 'Ÿ',
    ];
    match byte {
        0x80..=0x9f => HIGH[usize::from(byte - 0x80)],
        _ => char::from(byte),
    }
}
