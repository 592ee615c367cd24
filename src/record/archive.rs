//! Zip archives: their entries as sources that unpack while they are read, so that nothing is held in memory whole.

use std::cell::RefCell;
use std::io::{self, BufReader, Read};
use std::rc::Rc;

use flate2::Crc;
use flate2::bufread::DeflateDecoder;
use rawzip::{CompressionMethod, ErrorKind, RECOMMENDED_BUFFER_SIZE, ReaderAt, ZipArchive};

use super::Source;
use super::decode::{self, MOST_BYTES};
use crate::fault::{Fault, Result, quote};

/// Most entries of an archive.
const MOST_ENTRIES: usize = 2000;

/// A source that several entries read from.
#[derive(Clone)]
struct Shared(Rc<RefCell<Box<dyn Source>>>);

impl ReaderAt for Shared {
    fn read_at(&self, buffer: &mut [u8], offset: u64) -> io::Result<usize> {
        self.0.borrow_mut().read_at(offset, buffer).map_err(io::Error::other)
    }
}

/// What an archive holds.
pub(super) struct Archive {
    pub(super) name: String,
    shared: Shared,
    pub(super) entries: Vec<Entry>,
}

/// An entry that is no folder.
pub(super) struct Entry {
    /// Its path within the archive.
    pub(super) path: String,
    method: CompressionMethod,
    encrypted: bool,
    /// Where its packed bytes begin and end.
    span: (u64, u64),
    size: u64,
    crc: u32,
}

impl Archive {
    /// Reads the directory of an archive.
    ///
    /// # Errors
    /// If it is damaged, or states more than a meter file can hold.
    pub(super) fn open(source: Box<dyn Source>) -> Result<Self> {
        let (name, len) = (source.name().to_owned(), source.len());
        let shared = Shared(Rc::new(RefCell::new(source)));
        let mut buffer = vec![0; RECOMMENDED_BUFFER_SIZE];
        let archive = ZipArchive::with_max_search_space(1 << 17)
            .locate_in_reader(shared.clone(), &mut buffer, len)
            .map_err(|(_, error)| damaged(&error, &name))?;
        let mut entries = Vec::new();
        let mut total = 0_u64;
        let mut listed = archive.entries(&mut buffer);
        while let Some(entry) = listed.next_entry().map_err(|error| damaged(&error, &name))? {
            if entry.is_dir() {
                continue;
            }
            if entries.len() == MOST_ENTRIES {
                return Err(Fault::new(
                    format!("the archive holds more than {MOST_ENTRIES} files"),
                    name,
                    "Choose an archive of one site's readings, or unpack it and choose the files.",
                ));
            }
            let found = archive.get_entry(entry.wayfinder()).map_err(|error| damaged(&error, &name))?;
            total = total.saturating_add(entry.uncompressed_size_hint());
            entries.push(Entry {
                path: decode::text(entry.file_path().as_bytes()),
                method: entry.compression_method(),
                encrypted: entry.flags().is_encrypted(),
                span: found.compressed_data_range(),
                size: entry.uncompressed_size_hint(),
                crc: entry.crc32(),
            });
        }
        if total > MOST_BYTES {
            return Err(Fault::new(
                format!("the archive unpacks to more than {} GB", MOST_BYTES >> 30),
                name,
                "Unpack it and choose the files of one site.",
            ));
        }
        Ok(Self { name, shared, entries })
    }

    /// Whether there is an entry with this path.
    pub(super) fn holds(&self, path: &str) -> bool {
        self.entries.iter().any(|entry| entry.path == path)
    }

    /// An entry as a source of its own.
    ///
    /// # Errors
    /// If it is encrypted, or packed by a method other than deflate.
    pub(super) fn entry(&self, entry: &Entry) -> Result<Packed> {
        let name = format!("{}/{}", self.name, entry.path);
        if entry.encrypted || entry.method == CompressionMethod::AES {
            return Err(Fault::new(
                format!("{} is encrypted", quote(&entry.path)),
                self.name.clone(),
                "Unpack the archive with its password and choose the files inside.",
            ));
        }
        let deflated = match entry.method {
            CompressionMethod::STORE => false,
            CompressionMethod::DEFLATE => true,
            other => {
                let method = other.name().map_or_else(|| other.as_u16().to_string(), str::to_owned);
                return Err(Fault::new(
                    format!("{} is packed by a method that is not read here ({method})", quote(&entry.path)),
                    self.name.clone(),
                    "Unpack the archive and choose the files inside, or pack them again by the usual method (deflate).",
                ));
            }
        };
        Ok(Packed {
            name,
            shared: self.shared.clone(),
            deflated,
            span: entry.span,
            size: entry.size,
            crc: entry.crc,
            open: None,
        })
    }

    /// Unpacks every entry once and throws it away: after that no other reader of the archive meets damage, a password or
    /// an entry that grows without end.
    pub(super) fn check(&self) -> Result<()> {
        for entry in &self.entries {
            self.entry(entry)?.drain(None)?;
        }
        Ok(())
    }

    /// The archive's own bytes.
    pub(super) fn bytes(&self, most: u64) -> Result<Vec<u8>> {
        let mut source = self.shared.0.borrow_mut();
        whole(source.as_mut(), most)
    }

    /// The text of a small entry; none if there is no such entry.
    pub(super) fn small(&self, path: &str) -> Result<Option<Vec<u8>>> {
        match self.entries.iter().find(|entry| entry.path == path) {
            Some(entry) => self.entry(entry)?.drain(Some(1 << 16)).map(Some),
            None => Ok(None),
        }
    }
}

/// All bytes of a source.
///
/// # Errors
/// If there are more than `most`, or they cannot be read.
pub(super) fn whole(source: &mut dyn Source, most: u64) -> Result<Vec<u8>> {
    let name = source.name().to_owned();
    let len = source.len();
    let Some(room) = usize::try_from(len).ok().filter(|_| len <= most) else {
        return Err(Fault::new(
            format!("the workbook is larger than {} MB", most >> 20),
            name,
            "Save the sheet with the readings as CSV and choose that file.",
        ));
    };
    let mut bytes = vec![0; room];
    let mut count = 0;
    while count < room {
        match source.read_at(count as u64, &mut bytes[count..])? {
            0 => break,
            more => count += more,
        }
    }
    bytes.truncate(count);
    Ok(bytes)
}

/// An entry of an archive: unpacked from its start whenever it is read from further back than before.
pub(super) struct Packed {
    name: String,
    shared: Shared,
    deflated: bool,
    span: (u64, u64),
    size: u64,
    crc: u32,
    open: Option<Open>,
}

struct Open {
    feed: Feed,
    /// Bytes unpacked so far, and their check sum.
    at: u64,
    crc: Crc,
}

enum Feed {
    Stored(Span),
    Deflated(Box<DeflateDecoder<BufReader<Span>>>),
}

/// The packed bytes of an entry.
struct Span {
    shared: Shared,
    at: u64,
    end: u64,
}

impl Read for Span {
    fn read(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
        let rest = usize::try_from(self.end - self.at).unwrap_or(usize::MAX).min(buffer.len());
        let count = self.shared.read_at(&mut buffer[..rest], self.at)?;
        self.at += count as u64;
        Ok(count)
    }
}

impl Packed {
    fn open(&self) -> Open {
        let span = Span { shared: self.shared.clone(), at: self.span.0, end: self.span.1 };
        let feed = if self.deflated {
            Feed::Deflated(Box::new(DeflateDecoder::new(BufReader::with_capacity(1 << 15, span))))
        } else {
            Feed::Stored(span)
        };
        Open { feed, at: 0, crc: Crc::new() }
    }

    /// The next bytes; 0 at the end.
    fn next(&self, open: &mut Open, buffer: &mut [u8]) -> Result<usize> {
        let read = match &mut open.feed {
            Feed::Stored(span) => span.read(buffer),
            Feed::Deflated(decoder) => decoder.read(buffer),
        };
        let count = read.map_err(|error| decode::fault(&error, &self.name, true))?;
        open.at += count as u64;
        open.crc.update(&buffer[..count]);
        let taken = match &open.feed {
            Feed::Stored(_) => open.at,
            Feed::Deflated(decoder) => decoder.total_in(),
        };
        if decode::grows_without_end(open.at, taken) {
            return Err(decode::endless(&self.name));
        }
        let wrong = open.at > self.size
            || (count == 0 && !buffer.is_empty() && (open.at < self.size || open.crc.sum() != self.crc));
        if wrong {
            return Err(Fault::new(
                "the archive is damaged: what it unpacks to is not what its directory states",
                self.name.clone(),
                "Copy or download the archive again and choose the copy.",
            ));
        }
        Ok(count)
    }

    /// Unpacks everything, keeping up to `keep` bytes.
    fn drain(&self, keep: Option<usize>) -> Result<Vec<u8>> {
        let mut open = self.open();
        let mut kept = Vec::new();
        let mut buffer = vec![0; 1 << 16];
        loop {
            let count = self.next(&mut open, &mut buffer)?;
            if count == 0 {
                return Ok(kept);
            }
            let room = keep.unwrap_or(0).saturating_sub(kept.len()).min(count);
            kept.extend_from_slice(&buffer[..room]);
        }
    }
}

impl Source for Packed {
    fn name(&self) -> &str {
        &self.name
    }

    fn len(&self) -> u64 {
        self.size
    }

    fn read_at(&mut self, offset: u64, buffer: &mut [u8]) -> Result<usize> {
        let mut open = match self.open.take() {
            Some(open) if open.at <= offset => open,
            _ => self.open(),
        };
        let mut scratch = [0; 1 << 12];
        while open.at < offset {
            let room = usize::try_from(offset - open.at).unwrap_or(usize::MAX).min(scratch.len());
            if self.next(&mut open, &mut scratch[..room])? == 0 {
                return Ok(0);
            }
        }
        let count = self.next(&mut open, buffer)?;
        self.open = Some(open);
        Ok(count)
    }
}

#[cold]
fn damaged(error: &rawzip::Error, name: &str) -> Fault {
    let what = match error.kind() {
        ErrorKind::IO(error) => return decode::fault(error, name, true),
        ErrorKind::MissingEndOfCentralDirectory | ErrorKind::Eof => {
            "the archive is cut off: its end, with the list of what it holds, is missing".to_owned()
        }
        _ => format!("the archive is damaged: {error}"),
    };
    Fault::new(what, name, "Copy or download the archive again and choose the copy.")
}
