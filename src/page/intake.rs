//! Where files come in: chosen, dropped anywhere on the page, or a demo site of the page's own.

use gloo::events::{EventListener, EventListenerOptions};
use js_sys::{Array, Uint8Array};
use leptos::prelude::*;
use leptos::task::spawn_local;
use wasm_bindgen::{JsCast, JsValue};
use wasm_bindgen_futures::JsFuture;
use web_sys::{DragEvent, File, FileList, HtmlInputElement, Response};

use millpond::fault::Fault;

use crate::bridge::{of_json, words};

use super::desk::Desk;
use super::screen;
use super::tree::Tree;

/// The demo sites that come with the page.
const SITES: &str = include_str!("../../demo-profiles/sites.json");

/// Bytes of the largest case file; the engine's reader has the same bound.
const LARGEST_CASE: f64 = 268_435_456.0;

#[derive(Clone, serde::Deserialize)]
struct Demo {
    name: String,
    title: String,
    text: String,
    file: String,
}

/// Where files are taken, with the demo sites below.
pub(crate) fn place(desk: Desk) -> impl IntoView {
    let chosen = move |event: web_sys::Event| {
        if let Some(input) = event.target().and_then(|target| target.dyn_into::<HtmlInputElement>().ok()) {
            take(desk, files(input.files()));
            // So that the same file, corrected meanwhile, can be chosen again.
            input.set_value("");
        }
    };
    let node = NodeRef::<leptos::html::Input>::new();
    let choose = move |_| {
        if let Some(input) = node.get_untracked() {
            input.click();
        }
    };
    view! {
        <div class="drop">
            <span>"Drop files anywhere on this page, or"</span>
            <input
                type="file" multiple data-role="files" id="files" tabindex="-1" aria-label="Meter files"
                node_ref=node on:change=chosen
            />
            <button class:first=move || desk.files.with(Vec::is_empty) on:click=choose>"Choose files"</button>
            <span class="note">"They are read here, in the browser, and go nowhere."</span>
        </div>
        <details class="fold" prop:open=move || desk.files.with(Vec::is_empty)>
            <summary>"Demo sites"<span class="count">"invented, with the faults that real files have"</span></summary>
            <div><ul class="demos">{demos().into_iter().map(move |demo| entry(desk, demo)).collect_view()}</ul></div>
        </details>
    }
}

fn entry(desk: Desk, demo: Demo) -> impl IntoView {
    let Demo { name, title, text, file } = demo;
    view! {
        <li>
            <button class="quiet" data-role="demo" data-demo=name on:click=move |_| open_demo(desk, file.clone())>{title}</button>
            <span class="note">{text}</span>
        </li>
    }
}

/// Listens for files dropped anywhere, and for a demo site named after the hash; whether one is named there now.
pub(crate) fn listen(desk: Desk) -> bool {
    let options = EventListenerOptions::enable_prevent_default();
    let root = document();
    for name in ["dragenter", "dragover", "dragleave", "drop"] {
        EventListener::new_with_options(&root, name, options, move |event| {
            let Some(drag) = event.dyn_ref::<DragEvent>() else { return };
            let Some(transfer) = drag.data_transfer() else { return };
            // Text dragged within the page is none of our business.
            if !transfer.types().iter().any(|kind| kind.as_string().as_deref() == Some("Files")) {
                return;
            }
            drag.prevent_default();
            if let Some(root) = screen::root() {
                let over = matches!(drag.type_().as_str(), "dragenter" | "dragover");
                let _ = root.class_list().toggle_with_force("dropping", over);
            }
            if drag.type_() == "drop" {
                take(desk, files(transfer.files()));
            }
        })
        .forget();
    }
    let by_hash = move || {
        let hash = window().location().hash().unwrap_or_default();
        let demo =
            hash.strip_prefix("#demo=").and_then(|name| demos().into_iter().find(|demo| demo.name == name));
        demo.map(|demo| open_demo(desk, demo.file)).is_some()
    };
    let named = by_hash();
    EventListener::new(&window(), "hashchange", move |_| {
        by_hash();
    })
    .forget();
    named
}

fn demos() -> Vec<Demo> {
    of_json(SITES).unwrap_or_default()
}

/// The case of a demo site by its file: what its entry says, over the untouched one.
fn case_of(file: &str) -> Tree {
    let mut case = Tree::untouched();
    let sites = Tree::of_text(SITES);
    for (_, site) in sites.inside() {
        if site.word(&["file"]) == file {
            case.lay_over(site.get(&["case"]));
        }
    }
    case
}

fn files(list: Option<FileList>) -> Vec<File> {
    list.map(|list| (0..list.length()).filter_map(|i| list.get(i)).collect()).unwrap_or_default()
}

/// Opens meter files; a case file among them is taken as the case.
fn take(desk: Desk, files: Vec<File>) {
    let (cases, meters): (Vec<File>, Vec<File>) =
        files.into_iter().partition(|file| file.name().to_ascii_lowercase().ends_with(".json"));
    if let Some(file) = cases.into_iter().next_back() {
        if file.size() > LARGEST_CASE {
            return desk.fail(Fault::new(
                "the case file is larger than any that this page writes",
                file.name(),
                "Choose a case file that this page wrote.",
            ));
        }
        desk.fetch();
        spawn_local(async move {
            let name = file.name();
            match JsFuture::from(file.text()).await.ok().and_then(|text| text.as_string()) {
                // The engine reads it, since the browser's own reader would let the last of two equal keys win in silence.
                Some(text) => desk.read_case(name, text, meters),
                None => desk.fail(Fault::new("the case file cannot be read", name, "Choose it again.")),
            }
            desk.fetched();
        });
        return;
    }
    desk.open(meters);
}

fn open_demo(desk: Desk, name: String) {
    desk.fetch();
    spawn_local(async move {
        match fetch(&name).await {
            Ok(file) => {
                // A demo site is a fresh start: no case of another site is carried over to it.
                desk.open_with(vec![file], case_of(&name));
            }
            Err(error) => desk.fail(Fault::new(
                "the demo site could not be fetched",
                format!("demos/{name}: {}", words(&error)),
                "Check the connection, then try again; files of your own can be read without one.",
            )),
        }
        desk.fetched();
    });
}

/// The build packs the demo sites; what they are is told by their bytes, so they keep their own names.
async fn fetch(name: &str) -> Result<File, JsValue> {
    let answer: Response =
        JsFuture::from(window().fetch_with_str(&format!("demos/{name}.gz"))).await?.dyn_into()?;
    if !answer.ok() {
        return Err(format!("the server answered {}", answer.status()).into());
    }
    let bytes = JsFuture::from(answer.array_buffer()?).await?;
    File::new_with_u8_array_sequence(&Array::of1(&Uint8Array::new(&bytes)), name)
}
