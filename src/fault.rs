//! The one error type: what happened, where, and what to do about it.

use serde::{Deserialize, Serialize};

/// An error that stops the work on a site.
///
/// The three parts are kept apart so that the page can set them apart and the terminal can print them as fields.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize, thiserror::Error)]
#[error("{what} ({place}). {remedy}")]
pub struct Fault {
    /// What is wrong, quoting the offending text.
    pub what: String,
    /// Where: file, row and column in the counting that a person sees in a spreadsheet (rows and columns from 1).
    #[serde(rename = "where")]
    pub place: String,
    /// What the person can do.
    pub remedy: String,
}

impl Fault {
    /// A fault from its three sentences.
    #[cold]
    pub fn new(what: impl Into<String>, place: impl Into<String>, remedy: impl Into<String>) -> Self {
        Self { what: what.into(), place: place.into(), remedy: remedy.into() }
    }
}

/// The result of a stage.
pub type Result<T> = std::result::Result<T, Fault>;

/// A text from a file or a person, quoted and cut to a length that fits in a message.
pub fn quote(text: &str) -> String {
    const MOST: usize = 60;
    let mut short: String =
        text.chars().take(MOST).map(|c| if c.is_control() { '\u{fffd}' } else { c }).collect();
    if text.chars().count() > MOST {
        short.push('…');
    }
    format!("\u{201c}{short}\u{201d}")
}
