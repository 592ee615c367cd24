//! The browser's reader of workbooks: a program of its own, in a worker of its own that is made when a workbook comes and ended
//! after it, so that neither its code nor its memory is there otherwise. The other end is in `src/bridge/workbook.rs`.

use gloo::events::EventListener;
use js_sys::{Array, Object, Reflect, Uint8Array, global};
use wasm_bindgen::{JsCast, JsValue};
use web_sys::{DedicatedWorkerGlobalScope, MessageEvent};

use millpond::record::{WorkbookSheet, workbook_sheets};

fn main() {
    // Where there is no worker, nobody asks.
    let Ok(scope) = global().dyn_into::<DedicatedWorkerGlobalScope>() else { return };
    let answering = scope.clone();
    EventListener::new(&scope, "message", move |event| {
        let data = event.dyn_ref::<MessageEvent>().map(MessageEvent::data).unwrap_or_default();
        let workbook = Reflect::get(&data, &"workbook".into()).ok();
        let Some(bytes) = workbook.and_then(|bytes| bytes.dyn_into::<Uint8Array>().ok()) else { return };
        let buffers = Array::new();
        // An answer that cannot be built or sent ends this worker, which the page hears of.
        let sent = answer(bytes.to_vec(), &buffers)
            .and_then(|answer| answering.post_message_with_transfer(&answer, &buffers));
        if let Err(error) = sent {
            wasm_bindgen::throw_val(error);
        }
    })
    .forget();
}

fn answer(bytes: Vec<u8>, buffers: &Array) -> Result<Object, JsValue> {
    match workbook_sheets(bytes) {
        Ok(sheets) => {
            let list = Array::new();
            for WorkbookSheet { name, text, note, numbers } in sheets {
                let text = Uint8Array::from(text.as_slice());
                buffers.push(&text.buffer());
                let sheet = object(&[
                    ("name", name.into()),
                    ("note", note.into()),
                    ("numbers", (numbers as f64).into()),
                    ("text", text.into()),
                ])?;
                list.push(&sheet);
            }
            object(&[("sheets", list.into())])
        }
        Err(fault) => object(&[("what", fault.what.into()), ("remedy", fault.remedy.into())]),
    }
}

fn object(fields: &[(&str, JsValue)]) -> Result<Object, JsValue> {
    let object = Object::new();
    for (name, value) in fields {
        Reflect::set(&object, &(*name).into(), value)?;
    }
    Ok(object)
}
