//! Keeping cases in the browser: by itself, several by name, with or without the record; and keeping nothing at all.
//!
//! Kept are the steps with the case after each, and the record's files. A case is open for keeping in one tab at a time (Web
//! Locks); another tab works on a copy.

mod kept;

use std::cell::{Cell, RefCell};
use std::rc::Rc;

use gloo::events::EventListener;
use js_sys::{Array, Date, Function, Math, Object, Promise, Reflect};
use leptos::prelude::*;
use leptos::task::spawn_local;
use wasm_bindgen::closure::Closure;
use wasm_bindgen::{JsCast, JsValue};
use wasm_bindgen_futures::JsFuture;
use web_sys::File;

use millpond::fault::Fault;

use crate::bridge::host::{Memory, remember, remembered};
use crate::bridge::keeping::keep;
use crate::bridge::{Act, Trouble};

use kept::{BARE, ELSEWHERE, EVICTED, FROM_DISK, GONE, UNREAD, WAITS, entry, sentence};
pub(crate) use kept::{Keeping, Kept};

use super::desk::Desk;
use super::save;
use super::steps::{Step, Steps};
use super::tree::Tree;

/// The word that a person left: `nothing` = keep nothing on this computer; `bare` = without the record.
const WISH: &str = "millpond-keep";
/// Says that something was kept here, so that its loss can be told.
const TRACE: &str = "millpond-kept";
/// The case that this tab is at.
const HERE: &str = "millpond-tab";

/// A case by its key, and the files of its record.
type Written = (Rc<str>, Rc<Vec<File>>);

#[derive(Default)]
struct Keeper {
    /// Whether nothing is to be kept.
    off: Cell<bool>,
    writing: Cell<bool>,
    again: Cell<bool>,
    /// The case and the files that were written last.
    written: RefCell<Option<Written>>,
    /// Files that the browser had no room for.
    too_large: RefCell<Option<Rc<Vec<File>>>>,
    /// The case that this tab holds, and what lets go of it.
    held: RefCell<Option<(Rc<str>, Function)>>,
}

thread_local! {
    static KEEPER: Keeper = Keeper::default();
}

/// A key that no other case has.
pub(crate) fn new_id() -> Rc<str> {
    format!("{:x}-{:x}", Date::now() as u64, (Math::random() * 4_294_967_296.0) as u64).into()
}

/// Begins to keep, and takes up the case that this tab, or else the last one, was at. `fresh` = only begin.
pub(crate) fn begin(desk: Desk, fresh: bool) {
    // Another tab may be told to keep nothing; that holds for all.
    EventListener::new(&window(), "storage", move |_| {
        if wish().as_deref() == Some("nothing") && desk.keeping.get_untracked() != Keeping::Nothing {
            stop(desk, Keeping::Nothing);
        }
    })
    .forget();
    if window().location().protocol().is_ok_and(|protocol| protocol == "file:") {
        return stop(desk, Keeping::Cannot(FROM_DISK));
    }
    if wish().as_deref() == Some("nothing") {
        return stop(desk, Keeping::Nothing);
    }
    if remembered(Memory::Browser, TRACE).is_none() {
        // Nothing to take up: the worker that keeps is called when there is something to keep.
        return;
    }
    desk.fetch();
    spawn_local(async move {
        start(desk, fresh).await;
        desk.fetched();
    });
}

async fn start(desk: Desk, fresh: bool) {
    let mut kept: Vec<Kept> = match keep(Act::List, &Array::new()).await {
        Ok(all) => all.iter().map(entry).collect(),
        Err(trouble) => return desk.keeping.set(Keeping::Cannot(sentence(trouble))),
    };
    kept.sort_by(|a, b| b.changed_ms.total_cmp(&a.changed_ms));
    if kept.is_empty() && remembered(Memory::Browser, TRACE).is_some() {
        remember(Memory::Browser, TRACE, None);
        desk.remark(EVICTED);
    }
    let here = remembered(Memory::Window, HERE);
    let last = kept
        .iter()
        .find(|kept| here.as_deref() == Some(kept.id.as_str()))
        .or_else(|| kept.first())
        .filter(|kept| kept.damaged.is_none())
        .cloned();
    desk.kept.update(|all| {
        let known: Vec<String> = all.iter().map(|kept| kept.id.clone()).collect();
        all.extend(kept.into_iter().filter(|kept| !known.contains(&kept.id)));
    });
    // Whoever has begun something meanwhile is not disturbed.
    let idle = || desk.with_steps(|steps| steps.list.len() == 1 && steps.here().files.is_empty());
    if !fresh && let Some(last) = last.filter(|_| idle()) {
        if hold(&last.id).await {
            take_up_if(desk, &last, last.id.as_str().into(), idle).await;
        } else {
            desk.remark(WAITS);
        }
    }
    soon(desk);
}

/// Opens a kept case in place of what is on the desk; one that another tab holds as a copy.
pub(crate) fn open(desk: Desk, kept: Kept) {
    desk.fetch();
    spawn_local(async move {
        // What is on the desk is written first.
        while KEEPER.with(|keeper| keeper.writing.get()) {
            pause().await;
        }
        let mine = hold(&kept.id).await;
        // Another tab may have gone on with it since the list was made.
        match stored(&kept.id).await {
            Some(kept) if mine => take_up(desk, &kept, kept.id.as_str().into()).await,
            Some(kept) => {
                take_up(desk, &kept, new_id()).await;
                desk.remark(ELSEWHERE);
            }
            None => desk.remark(GONE),
        }
        desk.fetched();
    });
}

/// A moment in which others come to their turn.
async fn pause() {
    let moment = Promise::new(&mut |done, _| {
        gloo::timers::callback::Timeout::new(20, move || {
            let _ = done.call0(&JsValue::NULL);
        })
        .forget();
    });
    let _ = JsFuture::from(moment).await;
}

/// A kept case as it stands in the browser now; none if it is not there or damaged.
async fn stored(id: &str) -> Option<Kept> {
    let all = keep(Act::List, &Array::new()).await.ok()?;
    all.iter().map(entry).find(|kept| kept.id == id && kept.damaged.is_none())
}

async fn take_up(desk: Desk, kept: &Kept, id: Rc<str>) {
    take_up_if(desk, kept, id, || true).await;
}

async fn take_up_if(desk: Desk, kept: &Kept, id: Rc<str>, still: impl Fn() -> bool) {
    let files = if kept.record { files_of(&kept.id).await } else { Ok(None) };
    let Ok(files) = files else { return desk.remark(UNREAD) };
    if !still() {
        return;
    }
    let bare = files.is_none() && !kept.files.is_empty();
    let files = Rc::new(files.unwrap_or_default());
    let list = kept
        .steps
        .iter()
        .filter_map(|(words, case)| {
            Some(Step::first(words.clone(), Tree::of_case(case)?, Rc::clone(&files), Rc::clone(&id)))
        })
        .collect();
    if *id == *kept.id && !files.is_empty() {
        KEEPER.with(|keeper| *keeper.written.borrow_mut() = Some((id, files)));
    }
    desk.resume(Steps { list, at: kept.at });
    if bare {
        desk.remark(BARE);
    }
}

async fn files_of(id: &str) -> Result<Option<Vec<File>>, Trouble> {
    let files = keep(Act::Files { id: id.to_owned() }, &Array::new()).await?;
    let files: Vec<File> = files.iter().filter_map(|file| file.dyn_into().ok()).collect();
    Ok((!files.is_empty()).then_some(files))
}

/// Keeps the present state, as soon as what is being written is done.
pub(crate) fn soon(desk: Desk) {
    let go = KEEPER.with(|keeper| {
        if keeper.off.get() {
            return false;
        }
        keeper.again.set(true);
        !keeper.writing.replace(true)
    });
    if !go {
        return;
    }
    spawn_local(async move {
        while KEEPER.with(|keeper| keeper.again.replace(false)) {
            write(desk).await;
        }
        KEEPER.with(|keeper| keeper.writing.set(false));
    });
}

async fn write(desk: Desk) {
    let (id, files, kept) = desk.with_steps(|steps| {
        let here = steps.here();
        // Steps on other files are remembered by this page, not by the browser.
        let same: Vec<&Step> =
            steps.list.iter().filter(|step| Rc::ptr_eq(&step.files, &here.files)).collect();
        let at = same.iter().position(|step| std::ptr::eq(*step, here)).unwrap_or(0);
        let kept = Kept {
            id: here.id.to_string(),
            name: desk.name(),
            changed_ms: Date::now(),
            files: names(desk, here),
            record: false,
            at,
            steps: same.into_iter().map(|step| (step.words.clone(), step.case.text())).collect(),
            damaged: None,
        };
        (Rc::clone(&here.id), Rc::clone(&here.files), kept)
    });
    if files.is_empty() && kept.steps.len() < 2 {
        return;
    }
    let (mut id, mut kept) = (id, kept);
    let holds = KEEPER.with(|keeper| keeper.held.borrow().as_ref().is_some_and(|(held, _)| *held == id));
    if !holds {
        let known = desk
            .kept
            .with_untracked(|all| all.iter().find(|other| other.id == *id).map(|other| other.changed_ms));
        let free = hold(&id).await;
        let newer = match known {
            Some(known) if free => stored(&id).await.is_some_and(|kept| kept.changed_ms > known),
            _ => false,
        };
        if !free || newer {
            // Steps back led to a case that another tab has gone on with: it is left alone, and these steps are another case.
            let new = new_id();
            desk.rename_steps(&id, &new);
            kept.id = new.to_string();
            id = new;
            hold(&id).await;
        }
    }
    if KEEPER.with(|keeper| keeper.off.get()) {
        return KEEPER.with(release);
    }
    remember(Memory::Window, HERE, Some(&id));
    let no_room = KEEPER
        .with(|keeper| keeper.too_large.borrow().as_ref().is_some_and(|known| Rc::ptr_eq(known, &files)));
    let record = with_record() && !no_room;
    let outcome = match put(&kept, &files, record).await {
        Err(trouble) if record && trouble != Trouble::Denied => {
            let state =
                if trouble == Trouble::Full { Keeping::NoRoom } else { Keeping::On { record: false } };
            if trouble == Trouble::Full {
                KEEPER.with(|keeper| *keeper.too_large.borrow_mut() = Some(Rc::clone(&files)));
            }
            put(&kept, &files, false).await.map(|kept| (kept, state))
        }
        Ok(kept) if no_room => Ok((kept, Keeping::NoRoom)),
        outcome => outcome.map(|kept| (kept, Keeping::On { record })),
    };
    let state = match outcome {
        _ if KEEPER.with(|keeper| keeper.off.get()) => return,
        Ok((kept, state)) => {
            remember(Memory::Browser, TRACE, Some("yes"));
            KEEPER.with(|keeper| *keeper.written.borrow_mut() = kept.record.then_some((id, files)));
            desk.kept.update(|all| {
                all.retain(|other| other.id != kept.id);
                all.insert(0, kept);
            });
            state
        }
        Err(trouble) => Keeping::Cannot(sentence(trouble)),
    };
    desk.keeping.set(state);
}

/// Names of the files of a step; of a case that waits for its record, those that it waits for.
fn names(desk: Desk, step: &Step) -> Vec<String> {
    if step.files.is_empty() {
        let known =
            |all: &Vec<Kept>| all.iter().find(|kept| kept.id == *step.id).map(|kept| kept.files.clone());
        return desk.kept.with_untracked(known).unwrap_or_default();
    }
    step.files.iter().map(File::name).collect()
}

/// Writes a case, and its files where they are not there yet.
async fn put(kept: &Kept, files: &Rc<Vec<File>>, record: bool) -> Result<Kept, Trouble> {
    if KEEPER.with(|keeper| keeper.off.get()) {
        // The person wished for nothing to be kept while this was on its way.
        return Ok(kept.clone());
    }
    let there = KEEPER.with(|keeper| {
        keeper.written.borrow().as_ref().is_some_and(|(id, last)| **id == *kept.id && Rc::ptr_eq(last, files))
    });
    let record = record && !files.is_empty();
    let kept = Kept { record, ..kept.clone() };
    let value = serde_wasm_bindgen::to_value(&kept).map_err(|_unwritten| Trouble::Refused)?;
    let beside = Array::of1(&value);
    if record && !there {
        beside.push(&files.iter().collect::<Array>());
    }
    keep(Act::Put { id: kept.id.clone(), record }, &beside).await.map(|_| kept)
}

/// Removes a kept case from the browser.
pub(crate) fn remove(desk: Desk, id: String) {
    spawn_local(async move {
        if let Err(trouble) = keep(Act::Remove { id: id.clone() }, &Array::new()).await {
            return desk.keeping.set(Keeping::Cannot(sentence(trouble)));
        }
        KEEPER.with(|keeper| {
            let mut written = keeper.written.borrow_mut();
            if written.as_ref().is_some_and(|(known, _)| **known == *id) {
                *written = None;
            }
        });
        desk.kept.update(|all| all.retain(|kept| kept.id != id));
        if desk.kept.with_untracked(Vec::is_empty) {
            remember(Memory::Browser, TRACE, None);
        }
        desk.remark("Removed from this browser.");
    });
}

/// Saves what is left of a damaged case, as it stands.
pub(crate) fn rescue(desk: Desk, kept: &Kept) {
    if let Some(text) = &kept.damaged {
        save::json(desk, "damaged case", text);
    }
}

/// Keeps nothing on this computer from here on, and removes what was kept.
pub(crate) fn nothing(desk: Desk) {
    let count = desk.kept.with_untracked(Vec::len);
    stop(desk, Keeping::Nothing);
    remember(Memory::Browser, TRACE, None);
    remember(Memory::Window, HERE, None);
    let remembers = remember(Memory::Browser, WISH, Some("nothing"));
    spawn_local(async move {
        if keep(Act::Clear, &Array::new()).await.is_err() {
            return desk.fail(Fault::new(
                "the browser did not remove what was kept",
                "kept cases",
                "Clear the data of this page in the browser's settings.",
            ));
        }
        desk.remark(match (count, remembers) {
            (0, true) => "Nothing is kept from here on; one word remembers that.",
            (_, true) => "The kept cases are removed from this browser. Nothing is kept from here on; one word remembers that.",
            (_, false) => "The kept cases are removed from this browser. Nothing is kept until the page is opened again.",
        });
    });
}

/// Keeps cases again.
pub(crate) fn again(desk: Desk) {
    remember(Memory::Browser, WISH, None);
    KEEPER.with(|keeper| keeper.off.set(false));
    desk.keeping.set(Keeping::Starting);
    desk.fetch();
    spawn_local(async move {
        start(desk, true).await;
        desk.fetched();
    });
}

/// Keeps the record as well, or the case alone.
pub(crate) fn set_record(desk: Desk, record: bool) {
    remember(Memory::Browser, WISH, (!record).then_some("bare"));
    KEEPER.with(|keeper| {
        *keeper.written.borrow_mut() = None;
        *keeper.too_large.borrow_mut() = None;
    });
    soon(desk);
}

fn wish() -> Option<String> {
    remembered(Memory::Browser, WISH)
}

fn with_record() -> bool {
    wish().is_none()
}

/// Keeps nothing from here on, and leaves the case that this tab holds.
fn stop(desk: Desk, state: Keeping) {
    KEEPER.with(|keeper| {
        keeper.off.set(true);
        *keeper.written.borrow_mut() = None;
        release(keeper);
    });
    desk.keeping.set(state);
    desk.kept.set(Vec::new());
}

fn release(keeper: &Keeper) {
    if let Some((_, release)) = keeper.held.borrow_mut().take() {
        // The promise that it resolves has no other holder.
        let _ = release.call0(&JsValue::NULL);
    }
}

/// Takes a case for this tab, and lets go of the one held before; whether no other tab has it. A browser without locks (a
/// page over plain http) cannot tell: then the last one to write wins.
async fn hold(id: &str) -> bool {
    let get = |of: &JsValue, name: &str| Reflect::get(of, &name.into()).ok();
    let locks = get(&window().navigator(), "locks").filter(|locks| !locks.is_undefined());
    let request = locks.as_ref().and_then(|locks| get(locks, "request")?.dyn_into::<Function>().ok());
    let (Some(locks), Some(request)) = (locks, request) else { return true };
    let mine = KEEPER.with(|keeper| keeper.held.borrow().as_ref().is_some_and(|(held, _)| &**held == id));
    if mine {
        return true;
    }
    let options = Object::new();
    // A plain object takes any property.
    let _ = Reflect::set(&options, &"ifAvailable".into(), &JsValue::TRUE);
    let held_until = Rc::new(RefCell::new(None::<Function>));
    let (until, name) = (Rc::clone(&held_until), JsValue::from(format!("millpond-{id}")));
    // The lock lasts as long as the promise that its callback gives back.
    let answered = Promise::new(&mut |answer, _| {
        let until = Rc::clone(&until);
        let answer_of = answer.clone();
        let granted = Closure::once_into_js(move |lock: JsValue| -> JsValue {
            let _ = answer.call1(&JsValue::NULL, &JsValue::from(!lock.is_null()));
            if lock.is_null() {
                return JsValue::UNDEFINED;
            }
            Promise::new(&mut |release, _| *until.borrow_mut() = Some(release)).into()
        });
        let asked = request.call3(&locks, &name, &options, &granted).map(Promise::from);
        // A browser that refuses its locks cannot tell whose a case is; its store will say what it refuses.
        let refused = answer_of.clone();
        spawn_local(async move {
            let failed = match asked {
                Ok(promise) => JsFuture::from(promise).await.is_err(),
                Err(_) => true,
            };
            if failed {
                let _ = refused.call1(&JsValue::NULL, &JsValue::TRUE);
            }
        });
    });
    let free = JsFuture::from(answered).await.is_ok_and(|answer| answer.is_truthy());
    if free && let Some(function) = held_until.borrow_mut().take() {
        KEEPER.with(|keeper| {
            release(keeper);
            *keeper.held.borrow_mut() = Some((id.into(), function));
        });
    }
    free
}
