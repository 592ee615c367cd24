//! A measured series on a record's clock: values in fixed chunks, each one there or missing.

use crate::fault::{Fault, Result};

/// Values per chunk. Fixed chunks keep a growing series from ever needing one large move.
const CHUNK: usize = 1 << 16;

/// One value per interval; a missing value is a state of its own, never a number.
///
/// Values are finite. (A missing value is kept as a NaN inside, which no method gives out.)
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Series {
    chunks: Vec<Vec<f64>>,
    len: usize,
}

impl Series {
    /// A series of `len` missing values.
    ///
    /// # Errors
    /// If the memory cannot be had.
    pub fn missing(len: usize) -> Result<Self> {
        let mut chunks = Vec::new();
        let mut left = len;
        while left > 0 {
            let size = left.min(CHUNK);
            let mut chunk = Vec::new();
            chunk.try_reserve_exact(size).map_err(|_error| out_of_memory(len))?;
            chunk.resize(size, f64::NAN);
            chunks.push(chunk);
            left -= size;
        }
        Ok(Self { chunks, len })
    }

    /// A series of the values given.
    ///
    /// # Errors
    /// If a value is not finite, or the memory cannot be had.
    pub fn from_values(values: &[Option<f64>]) -> Result<Self> {
        let mut series = Self::missing(values.len())?;
        for (i, value) in values.iter().enumerate() {
            if let Some(value) = value {
                series.set(i, *value)?;
            }
        }
        Ok(series)
    }

    /// Number of intervals.
    pub fn len(&self) -> usize {
        self.len
    }

    /// Whether there are no intervals.
    pub fn is_empty(&self) -> bool {
        self.len == 0
    }

    /// The value of interval `i`, or none where it is missing or beyond the end.
    pub fn get(&self, i: usize) -> Option<f64> {
        let value = *self.chunks.get(i / CHUNK)?.get(i % CHUNK)?;
        (!value.is_nan()).then_some(value)
    }

    /// Sets the value of interval `i`.
    ///
    /// # Errors
    /// If the value is not finite or `i` is beyond the end.
    pub fn set(&mut self, i: usize, value: f64) -> Result<()> {
        let slot = self.chunks.get_mut(i / CHUNK).and_then(|chunk| chunk.get_mut(i % CHUNK));
        match slot {
            Some(slot) if value.is_finite() => {
                *slot = value;
                Ok(())
            }
            Some(_) => Err(Fault::new(
                "a value is not a finite number",
                format!("interval {i}"),
                "Correct the cell in the file.",
            )),
            None => Err(Fault::new(
                "an interval lies outside the record",
                format!("interval {i}"),
                "Report this as a defect.",
            )),
        }
    }

    /// Marks interval `i` as missing; nothing happens beyond the end.
    pub fn clear(&mut self, i: usize) {
        if let Some(slot) = self.chunks.get_mut(i / CHUNK).and_then(|chunk| chunk.get_mut(i % CHUNK)) {
            *slot = f64::NAN;
        }
    }

    /// Leaves out all values from `len` on.
    pub fn truncate(&mut self, len: usize) {
        if len < self.len {
            self.chunks.truncate(len.div_ceil(CHUNK));
            if let Some(last) = self.chunks.last_mut().filter(|_| !len.is_multiple_of(CHUNK)) {
                last.truncate(len % CHUNK);
            }
            self.len = len;
        }
    }

    /// The values in order.
    pub fn iter(&self) -> impl Iterator<Item = Option<f64>> + '_ {
        self.chunks.iter().flatten().map(|value| (!value.is_nan()).then_some(*value))
    }
}

#[cold]
fn out_of_memory(len: usize) -> Fault {
    Fault::new(
        format!("a series of {len} intervals does not fit in memory"),
        "while reading",
        "Close other programs or pages, or cut the file into shorter spans.",
    )
}
