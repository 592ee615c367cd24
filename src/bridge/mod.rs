//! Page and worker: typed requests one way, typed answers the other.
//!
//! One worker owns the files and the record. The page posts what it wants with a revision; the worker works in slices, one
//! per turn of its loop, so that it hears the next request, and drops what it was doing when one comes. Answers carry the
//! revision they were asked for; the page drops stale ones. Long series travel as transferred buffers beside the envelope.

pub(crate) mod blob;
pub(crate) mod client;
pub(crate) mod host;
pub(crate) mod worker;

use js_sys::{Array, Float64Array, Object, Reflect};
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
    /// Shows something else of the same results.
    Look { revision: u32, view: View },
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
    /// It still turns.
    Pong,
    /// It stopped for good, with what it said last.
    Died { text: String },
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

/// An envelope around a message; what travels beside it (files, series) is added by [`beside`].
pub(crate) fn envelope<T: Serialize>(message: &T) -> Result<Object, JsValue> {
    let envelope = Object::new();
    Reflect::set(&envelope, &"message".into(), &serde_wasm_bindgen::to_value(message)?)?;
    Ok(envelope)
}

/// Adds a list to an envelope.
pub(crate) fn beside(envelope: &Object, name: &str, list: &Array) -> Result<(), JsValue> {
    Reflect::set(envelope, &name.into(), list).map(|_| ())
}

/// The message in an envelope.
pub(crate) fn open<T: DeserializeOwned>(envelope: &JsValue) -> Result<T, JsValue> {
    Ok(serde_wasm_bindgen::from_value(Reflect::get(envelope, &"message".into())?)?)
}

/// A list that came with an envelope; empty if there was none.
pub(crate) fn list(envelope: &JsValue, name: &str) -> Array {
    Reflect::get(envelope, &name.into()).ok().and_then(|list| list.dyn_into().ok()).unwrap_or_default()
}

/// Takes the long series out of a sheet: typed arrays, and their buffers to be transferred.
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
pub(crate) fn put_columns(sheet: &mut Sheet, columns: &Array) {
    for (column, series) in sheet.pictures.columns_mut().into_iter().zip(columns.iter()) {
        if let Ok(series) = series.dyn_into::<Float64Array>() {
            *column = series.to_vec();
        }
    }
}
