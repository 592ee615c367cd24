//! Where bytes come from: anything with a length that can be read from a place.

use crate::fault::Result;

/// A file to be read: a file of the system in the terminal, a `Blob` read synchronously in the worker, bytes in a test.
pub trait Source {
    /// The file's name, for messages; its ending decides nothing.
    fn name(&self) -> &str;

    /// Length in bytes.
    fn len(&self) -> u64;

    /// Whether the file has no bytes.
    fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// Fills `buffer` from `offset`, and returns how many bytes were read (0 only at the end).
    ///
    /// # Errors
    /// If the file cannot be read (any more).
    fn read_at(&mut self, offset: u64, buffer: &mut [u8]) -> Result<usize>;
}

/// The name of a site after its file: without the ending, and without that of its compression.
///
/// ```
/// assert_eq!(millpond::record::site_name("hill-farm.csv.gz"), "hill-farm");
/// assert_eq!(millpond::record::site_name(".csv"), ".csv");
/// ```
pub fn site_name(file: &str) -> String {
    let stem = |name: &str| match name.rsplit_once('.') {
        Some((stem, _)) if !stem.is_empty() => stem.to_owned(),
        _ => name.to_owned(),
    };
    let is_compressed = file.to_ascii_lowercase().ends_with(".gz");
    if is_compressed { stem(&stem(file)) } else { stem(file) }
}

/// The name of a site after its files: the only file's, or what the names begin with.
///
/// ```
/// use millpond::record::site_of;
/// assert_eq!(site_of(&["hill-farm.csv"]), "hill-farm");
/// assert_eq!(site_of(&["hill-farm load.csv", "hill-farm pv.csv"]), "hill-farm");
/// assert_eq!(site_of(&["load.csv", "pv.csv"]), "load");
/// ```
pub fn site_of<T: AsRef<str>>(files: &[T]) -> String {
    let Some((first, rest)) = files.split_first() else { return String::new() };
    let first = site_name(first.as_ref());
    let mut common = first.as_str();
    for name in rest {
        while !name.as_ref().starts_with(common) {
            let shorter = common.char_indices().next_back().map_or(0, |(at, _)| at);
            common = &common[..shorter];
        }
    }
    let common = common.trim_end_matches(|c: char| c.is_ascii() && !c.is_ascii_alphanumeric());
    if common.is_empty() { first } else { common.to_owned() }
}

/// A source of bytes in memory.
#[derive(Debug, Clone)]
pub struct Memory {
    name: String,
    bytes: Vec<u8>,
}

impl Memory {
    /// A source named `name` that holds `bytes`.
    pub fn new(name: impl Into<String>, bytes: impl Into<Vec<u8>>) -> Self {
        Self { name: name.into(), bytes: bytes.into() }
    }
}

impl Source for Memory {
    fn name(&self) -> &str {
        &self.name
    }

    fn len(&self) -> u64 {
        self.bytes.len() as u64
    }

    fn read_at(&mut self, offset: u64, buffer: &mut [u8]) -> Result<usize> {
        let rest = usize::try_from(offset).ok().and_then(|offset| self.bytes.get(offset..)).unwrap_or(&[]);
        let count = rest.len().min(buffer.len());
        buffer[..count].copy_from_slice(&rest[..count]);
        Ok(count)
    }
}

/// A file of the system.
#[cfg(not(target_arch = "wasm32"))]
#[derive(Debug)]
pub struct Disk {
    name: String,
    file: std::fs::File,
    len: u64,
}

#[cfg(not(target_arch = "wasm32"))]
impl Disk {
    /// Opens the file at `path`.
    ///
    /// # Errors
    /// If it cannot be opened.
    pub fn open(path: &std::path::Path) -> Result<Self> {
        let failed = |error: std::io::Error| cannot_read(&path.display().to_string(), &error);
        let file = std::fs::File::open(path).map_err(failed)?;
        let len = file.metadata().map_err(failed)?.len();
        let name = path
            .file_name()
            .map_or_else(|| path.display().to_string(), |name| name.to_string_lossy().into_owned());
        Ok(Self { name, file, len })
    }
}

#[cfg(not(target_arch = "wasm32"))]
impl Source for Disk {
    fn name(&self) -> &str {
        &self.name
    }

    fn len(&self) -> u64 {
        self.len
    }

    fn read_at(&mut self, offset: u64, buffer: &mut [u8]) -> Result<usize> {
        use std::io::{Read, Seek, SeekFrom};
        let read = self.file.seek(SeekFrom::Start(offset)).and_then(|_| self.file.read(buffer));
        read.map_err(|error| cannot_read(&self.name, &error))
    }
}

#[cfg(not(target_arch = "wasm32"))]
#[cold]
fn cannot_read(name: &str, error: &std::io::Error) -> crate::fault::Fault {
    crate::fault::Fault::new(
        format!("the file cannot be read: {error}"),
        name,
        "Check that it exists, that it is not open in another program, and that you may read it.",
    )
}
