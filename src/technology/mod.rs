//! Kinds of storage: the catalogue of published ranges, their circuits, their Ragone curves, and verdicts on a need.
//!
//! [`screen`] is the stage's door.

use serde::{Deserialize, Serialize};

/// A requirement's point on the Ragone plane.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct PlanePoint {
    /// Its name.
    pub name: String,
}

/// A technology's verdict.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Screened {
    /// Identifier in the catalogue.
    pub technology: String,
}
