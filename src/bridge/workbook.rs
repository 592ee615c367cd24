//! The engine's end of the talk about workbooks: their reader is another program (`src/workbooks.rs`), which the page's boot script
//! starts when the engine asks.

use js_sys::{Array, Object, Reflect, Uint8Array};
use wasm_bindgen::{JsCast, JsValue};
use web_sys::DedicatedWorkerGlobalScope;

use millpond::fault::{Fault, Result};
use millpond::record::WorkbookSheet;

/// Asks for the sheets of a workbook; the answer carries the same number.
pub(super) fn ask(
    scope: &DedicatedWorkerGlobalScope,
    id: u32,
    bytes: &[u8],
) -> std::result::Result<(), JsValue> {
    let bytes = Uint8Array::from(bytes);
    let question = Object::new();
    Reflect::set(&question, &"id".into(), &id.into())?;
    Reflect::set(&question, &"workbook".into(), &bytes)?;
    scope.post_message_with_transfer(&question, &Array::of1(&bytes.buffer()))
}

/// What came back, and for which question; none if the message is no such answer.
pub(super) fn answer(data: &JsValue) -> Option<(u32, Result<Vec<WorkbookSheet>>)> {
    let field = |object: &JsValue, name: &str| Reflect::get(object, &name.into()).ok();
    let text = |object: &JsValue, name: &str| field(object, name)?.as_string();
    let id = field(data, "id")?.as_f64()? as u32;
    if let Some(what) = text(data, "what") {
        return Some((id, Err(Fault::new(what, "", text(data, "remedy").unwrap_or_default()))));
    }
    let sheets = field(data, "sheets")?.dyn_into::<Array>().ok()?;
    let sheet = |sheet: JsValue| {
        Some(WorkbookSheet {
            name: text(&sheet, "name")?,
            note: text(&sheet, "note")?,
            numbers: field(&sheet, "numbers")?.as_f64()? as u64,
            text: field(&sheet, "text")?.dyn_into::<Uint8Array>().ok()?.to_vec(),
        })
    };
    Some((id, Ok(sheets.iter().filter_map(sheet).collect())))
}
