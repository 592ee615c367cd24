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
    let text = remembered(Memory::Window, LEFT);
    // It is taken over once: a later reload starts afresh.
    remember(Memory::Window, LEFT, None);
    text
}

/// Where the browser remembers a word for the page.
#[derive(Clone, Copy)]
pub(crate) enum Memory {
    /// As long as the window is there.
    Window,
    /// Until it is removed.
    Browser,
}

/// A word that the browser remembers; none too where it refuses to remember anything.
pub(crate) fn remembered(memory: Memory, name: &str) -> Option<String> {
    storage(memory, "getItem", &[name]).ok()?.as_string()
}

/// Has the browser remember a word, or forget it; whether it did.
pub(crate) fn remember(memory: Memory, name: &str, word: Option<&str>) -> bool {
    match word {
        Some(word) => storage(memory, "setItem", &[name, word]).is_ok(),
        None => storage(memory, "removeItem", &[name]).is_ok(),
    }
}

/// Leaves the case to the page that follows, if there is one to leave.
fn leave_case() -> bool {
    CASE.with(|held| {
        held.try_borrow().is_ok_and(|case| !case.is_empty() && remember(Memory::Window, LEFT, Some(&case)))
    })
}

fn storage(memory: Memory, method: &str, arguments: &[&str]) -> Result<JsValue, JsValue> {
    let area = match memory {
        Memory::Window => "sessionStorage",
        Memory::Browser => "localStorage",
    };
    let storage = Reflect::get(&global(), &area.into())?;
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
