//! Page and worker: typed requests one way, typed answers the other.
//!
//! Beside that work there are errands, a case file to be read or written: they neither wait for it nor disturb it.
//!
//! One worker owns the files and the record. The page posts what it wants with a revision; the worker works in slices, one
//! per turn of its loop, so that it hears the next request, and drops what it was doing when one comes. Answers carry the
//! revision they were asked for; the page drops stale ones. Long series travel as transferred buffers beside the envelope.

//!
//! The two ends are two programs (`src/main.rs` and `src/engine.rs`), each a wasm of its own; what they say to each other is
//! here.

#[cfg(feature = "engine")]
mod blob;
#[cfg(feature = "page")]
pub(crate) mod client;
#[cfg(feature = "page")]
pub(crate) mod host;
#[cfg(feature = "engine")]
mod keeper;
#[cfg(feature = "page")]
pub(crate) mod keeping;
#[cfg(feature = "engine")]
mod workbook;
#[cfg(feature = "engine")]
pub(crate) mod worker;

use js_sys::{Array, Float64Array, Function, Object, Reflect, Uint8Array, global};
use serde::de::DeserializeOwned;
use serde::{Deserialize, Serialize};
use wasm_bindgen::{JsCast, JsValue};

use millpond::fault::Fault;
use millpond::sheet::{Sheet, View};

/// What the page asks of the worker. The case travels as the text of its file, so that one reader serves both.
#[derive(Debug, Clone, Serialize, Deserialize)]
pub(crate) enum Request {
    /// Takes new files (beside the envelope) and does everything.
    Open { revision: u32, site: String, case: String, view: View },
    /// Does again what a changed case changes.
    Change { revision: u32, case: String, view: View },
    /// Reads the text of a case file, by its name.
    ReadCase { errand: u32, name: String, text: String },
    /// Packs files (beside the envelope) into a case.
    Pack { errand: u32, case: String },
    /// Shows something else of the same results.
    Look { revision: u32, view: View },
    /// Has something kept in the browser, or taken from there; what is to be kept stands beside the envelope.
    Keep { number: u32, act: Act },
    /// Leaves off.
    Stop,
    /// Asks whether the worker still turns.
    Ping,
}

/// What the worker answers.
#[derive(Debug, Clone, Serialize, Deserialize)]
pub(crate) enum Answer {
    /// How far it is.
    Progress { revision: u32, progress: Progress },
    /// All that the page shows; its long series stand beside the envelope.
    Sheet { revision: u32, sheet: Box<Sheet> },
    /// What stopped the work.
    Fault { revision: u32, fault: Fault },
    /// A case file that was read: the case as the text of its file, without its record; that stands beside the envelope.
    Case { errand: u32, case: String, names: Vec<String> },
    /// A case file with its record.
    Packed { errand: u32, text: String },
    /// What stopped an errand.
    Failed { errand: u32, fault: Fault },
    /// What became of keeping; what was taken from there stands beside the envelope.
    Kept { number: u32, trouble: Option<Trouble> },
    /// It still turns.
    Pong,
    /// It stopped for good, with what it said last.
    Died { text: String },
}

/// What is done with kept cases.
#[derive(Debug, Clone, Serialize, Deserialize)]
pub(crate) enum Act {
    /// Lists them.
    List,
    /// Writes one (the first thing beside the envelope), and its files (the second) where there is a second.
    Put { id: String, record: bool },
    /// Fetches the files of one.
    Files { id: String },
    /// Removes one.
    Remove { id: String },
    /// Removes all.
    Clear,
}

/// Why something could not be kept.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
pub(crate) enum Trouble {
    /// The browser does not let this page keep anything.
    Denied,
    /// It has no room left.
    Full,
    /// It did not do it.
    Refused,
}

/// How far the worker is.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub(crate) struct Progress {
    /// Whether the files are being read; otherwise the stations after the record are being computed.
    pub(crate) reading: bool,
    /// What is being done, in words.
    pub(crate) what: String,
    /// Share done, 0 to 1.
    pub(crate) done: f64,
}

/// An envelope around a message, in a compact form that both programs share (they are of one build); what travels beside it (files, series) is added by [`beside`].
pub(crate) fn envelope<T: Serialize>(message: &T) -> Result<Object, JsValue> {
    let envelope = Object::new();
    let bytes = postcard::to_allocvec(message)
        .map_err(|_unwritten| JsValue::from("the message cannot be written"))?;
    Reflect::set(&envelope, &"message".into(), &Uint8Array::from(bytes.as_slice()))?;
    Ok(envelope)
}

/// Adds a list to an envelope.
pub(crate) fn beside(envelope: &Object, name: &str, list: &Array) -> Result<(), JsValue> {
    Reflect::set(envelope, &name.into(), list).map(|_| ())
}

/// The message in an envelope.
pub(crate) fn open<T: DeserializeOwned>(envelope: &JsValue) -> Result<T, JsValue> {
    let bytes: Uint8Array = Reflect::get(envelope, &"message".into())?.dyn_into()?;
    postcard::from_bytes(&bytes.to_vec()).map_err(|_unread| JsValue::from("the message cannot be read"))
}

/// A list that came with an envelope; empty if there was none.
pub(crate) fn list(envelope: &JsValue, name: &str) -> Array {
    Reflect::get(envelope, &name.into()).ok().and_then(|list| list.dyn_into().ok()).unwrap_or_default()
}

/// A value in the text of a JSON file; none if it does not read, which the engine can put in words.
#[cfg(feature = "page")]
pub(crate) fn of_json<T: DeserializeOwned>(text: &str) -> Option<T> {
    serde_wasm_bindgen::from_value(js_sys::JSON::parse(text).ok()?).ok()
}

/// Takes the long series out of a sheet: typed arrays, and their buffers to be transferred.
#[cfg(feature = "engine")]
pub(crate) fn take_columns(sheet: &mut Sheet) -> (Array, Array) {
    let (columns, buffers) = (Array::new(), Array::new());
    for column in sheet.pictures.columns_mut() {
        let series = Float64Array::from(std::mem::take(column).as_slice());
        buffers.push(&series.buffer());
        columns.push(&series);
    }
    (columns, buffers)
}

/// Puts the long series back, in the same order.
#[cfg(feature = "page")]
pub(crate) fn put_columns(sheet: &mut Sheet, columns: &Array) {
    for (column, series) in sheet.pictures.columns_mut().into_iter().zip(columns.iter()) {
        if let Ok(series) = series.dyn_into::<Float64Array>() {
            *column = series.to_vec();
        }
    }
}

/// Writes to the browser's console.
pub(crate) fn log(text: &str) {
    let write = || -> Result<(), JsValue> {
        let console = Reflect::get(&global(), &"console".into())?;
        let error: Function = Reflect::get(&console, &"error".into())?.dyn_into()?;
        error.call1(&console, &text.into())?;
        Ok(())
    };
    // A browser without a console has nowhere to tell it.
    let _ = write();
}

/// What the browser says of an error. (The tables behind a debug print of it would weigh more than all that it has to say.)
#[cfg(feature = "page")]
pub(crate) fn words(error: &JsValue) -> String {
    let message = Reflect::get(error, &"message".into()).ok().and_then(|text| text.as_string());
    message.or_else(|| error.as_string()).unwrap_or_else(|| "no reason given".to_owned())
}
