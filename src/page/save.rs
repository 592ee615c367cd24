//! What leaves the page as a file or through the clipboard, always by the person's own click.

use js_sys::Array;
use leptos::prelude::*;
use wasm_bindgen::{JsCast, JsValue};
use web_sys::{Blob, BlobPropertyBag, HtmlAnchorElement, HtmlCanvasElement, Url};

use millpond::chart;
use millpond::fault::Fault;
use millpond::sheet::Sheet;

use crate::bridge::words;

use super::desk::Desk;
use super::drawing::{self, Which};

/// Px of a picture's width in a file.
const WIDTH: u32 = 742;
/// Dots of a bitmap per px.
const DOTS: f64 = 2.0;

/// Saves the case as JSON.
pub(crate) fn case(desk: Desk) {
    json(desk, &format!("{} case", desk.name()), &desk.case_text());
}

/// Saves a case that carries its record.
pub(crate) fn packed(desk: Desk, text: &str) {
    json(desk, &format!("{} case with record", desk.name()), text);
}

/// Saves the result as JSON: the same bytes that the terminal program writes.
pub(crate) fn result(desk: Desk) {
    let (site, text) = desk.of(|sheet| (sheet.site.clone(), sheet.result.clone()));
    json(desk, &format!("{site} result"), &text);
}

/// Saves text of JSON under a name.
pub(crate) fn json(desk: Desk, name: &str, text: &str) {
    let saved = save_text(&format!("{name}.json"), "application/json", text).map_err(|error| refused(&error));
    report(desk, saved);
}

/// Saves a picture as SVG, in the colours of paper.
pub(crate) fn svg(desk: Desk, which: Which, sheet: &Sheet) {
    let size = (WIDTH, drawing::height(which, sheet, WIDTH));
    let drawn = chart::svg(size, &drawing::sentence(which, sheet), |surface| {
        drawing::draw(which, sheet, surface, size, &chart::PRINT)
    });
    let saved = drawn.and_then(|text| {
        save_text(&file_name(which, sheet, "svg"), "image/svg+xml", &text).map_err(|error| refused(&error))
    });
    report(desk, saved);
}

/// Saves a picture as PNG, in the colours of paper on white.
pub(crate) fn png(desk: Desk, which: Which, sheet: &Sheet) {
    let size = (WIDTH, drawing::height(which, sheet, WIDTH));
    let saved = bitmap(which, sheet, size)
        .and_then(|address| save(&file_name(which, sheet, "png"), &address))
        .map_err(|error| refused(&error));
    report(desk, saved);
}

/// Puts text on the clipboard.
pub(crate) fn copy(desk: Desk, text: &str) {
    if !window().is_secure_context() {
        // Browsers keep the clipboard from pages that came over plain http.
        return desk.fail(Fault::new(
            "the table cannot be copied",
            "clipboard",
            "Browsers allow it only over https or from this machine; open the table behind the picture and mark it instead.",
        ));
    }
    let promise = window().navigator().clipboard().write_text(text);
    leptos::task::spawn_local(async move {
        if let Err(error) = wasm_bindgen_futures::JsFuture::from(promise).await {
            desk.fail(refused(&error));
        }
    });
}

fn bitmap(which: Which, sheet: &Sheet, size: (u32, u32)) -> Result<String, JsValue> {
    let canvas: HtmlCanvasElement = document().create_element("canvas")?.dyn_into()?;
    drawing::on_canvas(which, sheet, &canvas, size, DOTS, &chart::PRINT, true)
        .map_err(|fault| JsValue::from(fault.to_string()))?;
    canvas.to_data_url_with_type("image/png")
}

fn file_name(which: Which, sheet: &Sheet, ending: &str) -> String {
    format!("{} {}.{ending}", sheet.site, which.title().to_ascii_lowercase())
}

fn save_text(name: &str, kind: &str, text: &str) -> Result<(), JsValue> {
    let options = BlobPropertyBag::new();
    options.set_type(kind);
    let blob = Blob::new_with_str_sequence_and_options(&Array::of1(&text.into()), &options)?;
    let address = Url::create_object_url_with_blob(&blob)?;
    let saved = save(name, &address);
    // The browser needs the address until it has begun to write; nothing tells when that is.
    gloo::timers::callback::Timeout::new(10_000, move || {
        let _ = Url::revoke_object_url(&address);
    })
    .forget();
    saved
}

fn save(name: &str, address: &str) -> Result<(), JsValue> {
    let link: HtmlAnchorElement = document().create_element("a")?.dyn_into()?;
    link.set_href(address);
    link.set_download(name);
    link.click();
    Ok(())
}

#[cold]
fn refused(error: &JsValue) -> Fault {
    Fault::new(
        format!("the browser refused: {}", words(error)),
        "saving or copying",
        "Allow downloads and the clipboard for this page, then try again.",
    )
}

fn report(desk: Desk, saved: millpond::fault::Result<()>) {
    if let Err(fault) = saved {
        desk.fail(fault);
    }
}
