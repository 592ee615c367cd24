//! The page's side of keeping: one worker for it alone, so that it is heard at once whatever is being computed.

use std::cell::RefCell;

use gloo::events::EventListener;
use js_sys::{Array, Function, Promise};
use wasm_bindgen::{JsCast, JsValue};
use wasm_bindgen_futures::JsFuture;
use web_sys::{MessageEvent, Worker};

use super::{Act, Answer, Request, Trouble, host};

#[derive(Default)]
struct Door {
    worker: Option<(Worker, [EventListener; 2])>,
    /// What is awaited: its number, and what its answer is handed to.
    awaited: Vec<(u32, Function)>,
    last: u32,
}

thread_local! {
    static DOOR: RefCell<Door> = RefCell::default();
}

/// Has something kept or taken from there, and gives back what was taken.
pub(crate) async fn keep(act: Act, beside: &Array) -> Result<Array, Trouble> {
    if DOOR.with_borrow(|door| door.worker.is_none()) {
        open().map_err(|_unopened| Trouble::Refused)?;
    }
    let answer = DOOR.with_borrow_mut(|door| {
        door.last += 1;
        let number = door.last;
        let answer = Promise::new(&mut |answered, _| door.awaited.push((number, answered)));
        let posted = super::envelope(&Request::Keep { number, act }).and_then(|envelope| {
            super::beside(&envelope, "kept", beside)?;
            door.worker.as_ref().map_or(Ok(()), |(worker, _)| worker.post_message(&envelope))
        });
        posted.map(|()| answer)
    });
    let answer = answer.map_err(|_unposted| Trouble::Refused)?;
    let data = JsFuture::from(answer).await.map_err(|_never| Trouble::Refused)?;
    match super::open::<Answer>(&data) {
        Ok(Answer::Kept { trouble: None, .. }) => Ok(super::list(&data, "kept")),
        Ok(Answer::Kept { trouble: Some(trouble), .. }) => Err(trouble),
        _ => Err(Trouble::Refused),
    }
}

fn open() -> Result<(), JsValue> {
    let worker = host::spawn()?;
    let heard = EventListener::new(&worker, "message", |event| {
        let data = event.dyn_ref::<MessageEvent>().map(MessageEvent::data).unwrap_or_default();
        if let Ok(Answer::Kept { number, .. }) = super::open(&data) {
            hand(|awaited| awaited == number, &data);
        }
    });
    let died = EventListener::new(&worker, "error", |event| {
        event.prevent_default();
        // Whoever waits hears that nothing came of it; the next request starts another worker.
        if let Some((worker, listeners)) = DOOR.with_borrow_mut(|door| door.worker.take()) {
            worker.terminate();
            drop(listeners);
        }
        hand(|_| true, &JsValue::NULL);
    });
    DOOR.with_borrow_mut(|door| door.worker = Some((worker, [heard, died])));
    Ok(())
}

fn hand(whose: impl Fn(u32) -> bool, data: &JsValue) {
    let answered: Vec<(u32, Function)> =
        DOOR.with_borrow_mut(|door| door.awaited.extract_if(.., |(number, _)| whose(*number)).collect());
    for (_, answered) in answered {
        // A promise takes its answer without fail.
        let _ = answered.call1(&JsValue::NULL, data);
    }
}
