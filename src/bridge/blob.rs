//! A file of the browser as a source of bytes, read in place: a worker may wait for it, so nothing is copied whole.

use js_sys::Uint8Array;
use wasm_bindgen::JsValue;
use web_sys::{File, FileReaderSync};

use millpond::fault::{Fault, Result};
use millpond::record::Source;

/// Bytes fetched at least at a time, since each read is a call to the browser.
const CHUNK: u64 = 1 << 20;

/// A file posted to the worker.
pub(crate) struct BlobSource {
    name: String,
    len: u64,
    file: File,
    reader: FileReaderSync,
    /// The bytes fetched last, and where they begin.
    chunk: (u64, Vec<u8>),
}

impl BlobSource {
    /// A source over a file.
    pub(crate) fn new(file: File) -> Result<Self> {
        let name = file.name();
        let reader = FileReaderSync::new().map_err(|error| cannot_read(&name, &error))?;
        Ok(Self { len: file.size() as u64, name, file, reader, chunk: (0, Vec::new()) })
    }

    fn fetch(&mut self, offset: u64, least: u64) -> Result<()> {
        let end = (offset + least.max(CHUNK)).min(self.len);
        let bytes = self
            .file
            .slice_with_f64_and_f64(offset as f64, end as f64)
            .and_then(|blob| self.reader.read_as_array_buffer(&blob))
            .map_err(|error| cannot_read(&self.name, &error))?;
        self.chunk = (offset, Uint8Array::new(&bytes).to_vec());
        Ok(())
    }
}

impl Source for BlobSource {
    fn name(&self) -> &str {
        &self.name
    }

    fn len(&self) -> u64 {
        self.len
    }

    fn read_at(&mut self, offset: u64, buffer: &mut [u8]) -> Result<usize> {
        if offset >= self.len || buffer.is_empty() {
            return Ok(0);
        }
        let (start, bytes) = &self.chunk;
        if offset < *start || offset >= start + bytes.len() as u64 {
            self.fetch(offset, buffer.len() as u64)?;
        }
        let (start, bytes) = &self.chunk;
        let rest = usize::try_from(offset - start).ok().and_then(|from| bytes.get(from..)).unwrap_or(&[]);
        let count = rest.len().min(buffer.len());
        buffer[..count].copy_from_slice(&rest[..count]);
        Ok(count)
    }
}

#[cold]
fn cannot_read(name: &str, error: &JsValue) -> Fault {
    let why = js_sys::Reflect::get(error, &"message".into()).ok().and_then(|text| text.as_string());
    Fault::new(
        format!(
            "the file cannot be read: {}",
            why.unwrap_or_else(|| "the browser gave no reason".to_owned())
        ),
        name,
        "Choose it again: a file that was moved, changed or opened by another program must be handed over anew.",
    )
}
