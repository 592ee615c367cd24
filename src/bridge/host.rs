//! The doors to the browser that the program needs outside the page's elements: where it runs, the worker's start, the
//! notice by plain DOM, and the milliseconds by which slices are measured.

use std::cell::RefCell;

use js_sys::{Function, Reflect, global};
use wasm_bindgen::{JsCast, JsValue};
use web_sys::DedicatedWorkerGlobalScope;

/// Where this copy of the program runs.
pub(crate) enum Place {
    /// With a document.
    Page,
    /// In a worker.
    Worker(DedicatedWorkerGlobalScope),
    /// Somewhere it was not made for.
    Elsewhere,
}

/// Where this copy of the program runs.
pub(crate) fn place() -> Place {
    if web_sys::window().is_some_and(|window| window.document().is_some()) {
        return Place::Page;
    }
    global().dyn_into().map_or(Place::Elsewhere, Place::Worker)
}

/// Starts a worker that runs the same program (see `www/boot.js`).
pub(crate) fn spawn() -> Result<web_sys::Worker, JsValue> {
    let millpond = millpond()?;
    let spawn: Function = Reflect::get(&millpond, &"spawn".into())?.dyn_into()?;
    spawn.call0(&millpond)?.dyn_into()
}

/// Shows a notice by plain DOM, since the page's own code may be what broke; the first line is what happened.
pub(crate) fn notice(text: &str) {
    let show = || -> Result<(), JsValue> {
        let millpond = millpond()?;
        let notice: Function = Reflect::get(&millpond, &"notice".into())?.dyn_into()?;
        notice.call1(&millpond, &text.into())?;
        Ok(())
    };
    if show().is_err() {
        log(text);
    }
}

/// Milliseconds on a clock that only runs forward; for the length of slices, never for a result.
pub(crate) fn now_ms() -> f64 {
    let read = || -> Result<JsValue, JsValue> {
        let performance = Reflect::get(&global(), &"performance".into())?;
        let now: Function = Reflect::get(&performance, &"now".into())?.dyn_into()?;
        now.call0(&performance)
    };
    read().ok().and_then(|value| value.as_f64()).unwrap_or(0.0)
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

thread_local! {
    /// The case as it last was, for the panic hook.
    static CASE: RefCell<String> = const { RefCell::new(String::new()) };
}

/// Name under which a broken page leaves its case to the next one in the same window; it ends with the window.
const LEFT: &str = "millpond-case";

/// Notes the case, so that it outlives the page's own code.
pub(crate) fn keep(case: &str) {
    CASE.with(|held| case.clone_into(&mut held.borrow_mut()));
}

/// The case that a page in this window left when it broke.
pub(crate) fn kept() -> Option<String> {
    let text = storage("getItem", &[LEFT]).ok()?.as_string();
    // It is taken over once: a later reload starts afresh.
    storage("removeItem", &[LEFT]).ok()?;
    text
}

/// Leaves the case to the page that follows, if there is one to leave.
fn leave_case() -> bool {
    CASE.with(|held| {
        held.try_borrow().is_ok_and(|case| !case.is_empty() && storage("setItem", &[LEFT, &case]).is_ok())
    })
}

fn storage(method: &str, arguments: &[&str]) -> Result<JsValue, JsValue> {
    let storage = Reflect::get(&global(), &"sessionStorage".into())?;
    let method: Function = Reflect::get(&storage, &method.into())?.dyn_into()?;
    method.apply(&storage, &arguments.iter().map(|argument| JsValue::from(*argument)).collect())
}

/// On a panic: the console has the words; the worker tells the page, the page shows the notice.
pub(crate) fn report_panics() {
    std::panic::set_hook(Box::new(|panic| {
        let text = panic.to_string();
        log(&text);
        match place() {
            Place::Page => {
                let kept = if leave_case() { "The case is kept. " } else { "" };
                notice(&format!(
                    "Millpond stopped: a defect in the page.\n{text}\n{kept}Reload the page to go on. No file has left this computer."
                ));
            }
            Place::Worker(scope) => super::worker::last_words(&scope, text),
            Place::Elsewhere => {}
        }
    }));
}

fn millpond() -> Result<JsValue, JsValue> {
    Reflect::get(&global(), &"millpond".into())
}
