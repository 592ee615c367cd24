//! The doors to the browser that the page needs outside its elements: the worker's start, the notice by plain DOM, and the case
//! left behind by a page that breaks.

use std::cell::RefCell;

use js_sys::{Function, Reflect, global};
use wasm_bindgen::{JsCast, JsValue};

use super::log;

/// Starts a worker with the engine. What comes back stands in for the worker until its program is there, with the same methods and
/// events (see `www/boot.js`), so it is taken for one without asking for its class.
pub(crate) fn spawn() -> Result<web_sys::Worker, JsValue> {
    let millpond = millpond()?;
    let spawn: Function = Reflect::get(&millpond, &"spawn".into())?.dyn_into()?;
    Ok(spawn.call0(&millpond)?.unchecked_into())
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

/// On a panic: the console has the words, the page shows the notice, and the case is left to the page that follows.
pub(crate) fn report_panics() {
    std::panic::set_hook(Box::new(|panic| {
        let text = panic.to_string();
        log(&text);
        let kept = if leave_case() { "The case is kept. " } else { "" };
        notice(&format!(
            "Millpond stopped: a defect in the page.\n{text}\n{kept}Reload the page to go on. No file has left this computer."
        ));
    }));
}

fn millpond() -> Result<JsValue, JsValue> {
    Reflect::get(&global(), &"millpond".into())
}
