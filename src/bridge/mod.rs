//! Page and worker: typed requests one way, typed answers the other.
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
mod workbook;
#[cfg(feature = "engine")]
pub(crate) mod worker;

use js_sys::{Array, Float64Array, Function, Object, Reflect, global};
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
    /// Says what is wrong with the text of a case file, by its name.
    Explain { revision: u32, name: String, case: String },
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

/// A case as the text of its file, written by the browser's own JSON, so that the page carries no writer of its own.
#[cfg(feature = "page")]
pub(crate) fn case_text(case: &millpond::case::Case) -> Result<String, JsValue> {
    let value = case.serialize(&serde_wasm_bindgen::Serializer::json_compatible())?;
    let text = js_sys::JSON::stringify_with_replacer_and_space(&value, &JsValue::NULL, &JsValue::from(2))?;
    Ok(text.into())
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
