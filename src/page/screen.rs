//! The only file that listens to the screen: colour scheme, contrast, print, and the page's own flags.

use gloo::events::EventListener;
use leptos::prelude::*;
use wasm_bindgen::JsCast;
use web_sys::{Element, HtmlElement, MediaQueryList};

use millpond::chart::Scheme;

/// The colour scheme in force, followed from here on.
pub(crate) fn scheme() -> RwSignal<Scheme> {
    let scheme = RwSignal::new(present());
    for query in ["(prefers-color-scheme: dark)", "(prefers-contrast: more)", "print"] {
        if let Some(list) = media(query) {
            EventListener::new(&list, "change", move |_| scheme.set(present())).forget();
        }
    }
    // The face may arrive after the first picture; a picture drawn in another face is drawn again.
    let ready = document().unchecked_ref::<wasm_bindgen::JsValue>().clone();
    if let Ok(fonts) = js_sys::Reflect::get(&ready, &"fonts".into())
        && let Ok(fonts) = fonts.dyn_into::<web_sys::EventTarget>()
    {
        EventListener::new(&fonts, "loadingdone", move |_| scheme.set(present())).forget();
    }
    scheme
}

/// Whether what the page shows is the whole answer to what the person did last (read by tests).
pub(crate) fn settled(settled: bool) {
    if let Some(root) = root() {
        // A browser that refuses its own attribute has nothing better to offer.
        let _ = root.dataset().set("settled", if settled { "true" } else { "false" });
    }
}

/// Device pixels per px.
pub(crate) fn density() -> f64 {
    window().device_pixel_ratio().clamp(1.0, 4.0)
}

/// Upper edges of elements within the window, px; none for those that are not there.
pub(crate) fn tops(ids: &[&str]) -> Vec<Option<f64>> {
    let top = |element: Element| element.get_bounding_client_rect().top();
    ids.iter().map(|id| document().get_element_by_id(id).map(top)).collect()
}

/// Height of the window, px.
pub(crate) fn height() -> f64 {
    window().inner_height().ok().and_then(|height| height.as_f64()).unwrap_or(0.0)
}

/// The root element.
pub(crate) fn root() -> Option<HtmlElement> {
    document().document_element()?.dyn_into().ok()
}

fn present() -> Scheme {
    let holds = |query: &str| media(query).is_some_and(|list| list.matches());
    match (holds("print"), holds("(prefers-contrast: more)"), holds("(prefers-color-scheme: dark)")) {
        (true, ..) => Scheme::Print,
        (_, true, true) => Scheme::HighDark,
        (_, true, false) => Scheme::High,
        (_, false, true) => Scheme::Dark,
        _ => Scheme::Light,
    }
}

fn media(query: &str) -> Option<MediaQueryList> {
    window().match_media(query).ok().flatten()
}
