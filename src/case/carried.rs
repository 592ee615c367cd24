//! Files of the record that travel inside a case, compressed, byte for byte as they came.

use std::io::{Read, Write};

use base64::Engine;
use base64::engine::general_purpose::STANDARD;
use flate2::Compression;
use flate2::read::GzDecoder;
use flate2::write::GzEncoder;
use serde::{Deserialize, Serialize};

use crate::fault::{Fault, Result, quote};
use crate::record::Source;

/// Largest file that a case carries, in bytes as it came.
pub(super) const LARGEST: u64 = 1 << 29;

/// A file of the record inside a case.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(deny_unknown_fields)]
pub struct CarriedFile {
    /// Name of the file.
    pub name: String,
    /// Its length in bytes.
    pub bytes: u64,
    /// Its bytes, compressed by gzip (RFC 1952) and written in Base64 (RFC 4648, section 4).
    pub gzip_base64: String,
}

impl CarriedFile {
    /// Packs a file.
    ///
    /// # Errors
    /// If it cannot be read, or is larger than a case carries.
    pub fn pack(source: &mut dyn Source) -> Result<Self> {
        let name = source.name().to_owned();
        let bytes = source.len();
        if bytes > LARGEST {
            return Err(Fault::new(
                format!("the file has {bytes} bytes; a case carries files of up to {LARGEST}"),
                name,
                "Save the case without the record, and send the file beside it.",
            ));
        }
        let mut packed = GzEncoder::new(Vec::new(), Compression::default());
        let mut buffer = vec![0; 1 << 16];
        let mut at = 0;
        loop {
            let count = source.read_at(at, &mut buffer)?;
            if count == 0 {
                break;
            }
            packed.write_all(&buffer[..count]).map_err(|error| no_room(&name, &error))?;
            at += count as u64;
        }
        let packed = packed.finish().map_err(|error| no_room(&name, &error))?;
        Ok(Self { name, bytes: at, gzip_base64: STANDARD.encode(packed) })
    }

    /// The file's bytes. Never more than [`CarriedFile::bytes`] are unpacked, whatever the packed part would expand to.
    ///
    /// # Errors
    /// If the packed part is damaged, or does not have the stated length.
    pub fn unpack(&self) -> Result<Vec<u8>> {
        let damaged = |why: String| {
            Fault::new(
                format!("the file {} inside the case is damaged: {why}", quote(&self.name)),
                "case file, at files",
                "Save the case again where it was made, or open the meter file itself beside the case.",
            )
        };
        let packed = STANDARD.decode(&self.gzip_base64).map_err(|error| damaged(error.to_string()))?;
        let mut bytes = Vec::new();
        GzDecoder::new(packed.as_slice())
            .take(self.bytes.min(LARGEST) + 1)
            .read_to_end(&mut bytes)
            .map_err(|error| damaged(error.to_string()))?;
        if bytes.len() as u64 == self.bytes {
            return Ok(bytes);
        }
        Err(damaged(format!("its length is not the {} bytes that the case states", self.bytes)))
    }
}

#[cold]
fn no_room(name: &str, error: &std::io::Error) -> Fault {
    Fault::new(
        format!("the file cannot be packed: {error}"),
        name,
        "Save the case without the record, and send the file beside it.",
    )
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::record::Memory;

    #[test]
    fn a_file_comes_back_byte_for_byte() {
        let bytes: Vec<u8> = (0..200_000_u64).map(|i| (i * i % 251) as u8).collect();
        let packed = CarriedFile::pack(&mut Memory::new("meter.csv", bytes.clone())).unwrap();
        assert_eq!((packed.name.as_str(), packed.bytes), ("meter.csv", 200_000));
        assert_eq!(packed.unpack().unwrap(), bytes);
        let empty = CarriedFile::pack(&mut Memory::new("empty.csv", "")).unwrap();
        assert_eq!(empty.unpack().unwrap(), Vec::<u8>::new());
    }

    #[test]
    fn damage_and_bombs_are_told() {
        let packed = CarriedFile::pack(&mut Memory::new("zeros.csv", vec![b'0'; 10_000_000])).unwrap();
        // A length that lies: nothing beyond it is unpacked.
        let bomb = CarriedFile { bytes: 1000, ..packed.clone() };
        assert!(bomb.unpack().unwrap_err().what.contains("length"));
        let cut = CarriedFile {
            gzip_base64: packed.gzip_base64[..packed.gzip_base64.len() / 8 * 4].to_owned(),
            ..packed.clone()
        };
        assert!(cut.unpack().unwrap_err().what.contains("damaged"));
        let garbled = CarriedFile { gzip_base64: "no, not Base64".to_owned(), ..packed };
        assert!(garbled.unpack().unwrap_err().what.contains("zeros.csv"));
    }
}
