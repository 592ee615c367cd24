//! The line under the title block: the case by its name, steps back and forth, saving, and what is kept in the browser.

use leptos::prelude::*;

use super::desk::Desk;
use super::fold::fold;
use super::keep::{self, Keeping, Kept};
use super::save;

/// Most letters of a name.
const LONGEST: u32 = 80;

/// The line.
pub(crate) fn line(desk: Desk) -> impl IntoView {
    let name = Memo::new(move |_| desk.case.with(|case| case.word(&["name"]).to_owned()));
    let site = Memo::new(move |_| desk.of(|sheet| sheet.site.clone()));
    let back = Memo::new(move |_| desk.trail.with(|trail| trail.at > 0));
    let forth = Memo::new(move |_| desk.trail.with(|trail| trail.at + 1 < trail.words.len()));
    let several = Memo::new(move |_| desk.trail.with(|trail| trail.words.len() > 1));
    let open = Memo::new(move |_| !desk.files.with(Vec::is_empty));
    let rename = move |event| {
        let name = event_target_value(&event);
        desk.type_words(|case| case.put(&["name"], name.as_str()));
    };
    view! {
        <section class="case" aria-label="Case">
            <div class="bar">
                <label>"Case "<input type="text" name="case-name" autocomplete="off" size="24" maxlength=LONGEST
                    prop:value=move || name.get()
                    placeholder=move || { let site = site.get(); if site.is_empty() { "no name yet".to_owned() } else { site } }
                    on:input=rename /></label>
                <span class="group">
                    <button data-role="undo" aria-keyshortcuts="Control+Z" prop:disabled=move || !back.get() on:click=move |_| desk.undo()>"Undo"</button>
                    <button data-role="redo" aria-keyshortcuts="Control+Shift+Z" prop:disabled=move || !forth.get() on:click=move |_| desk.redo()>"Redo"</button>
                </span>
                <span class="group">
                    "Save "
                    <button class="quiet" data-role="save-case" on:click=move |_| save::case(desk)>"case"</button>
                    {move || open.get().then(|| view! {
                        <button class="quiet" data-role="save-with-record" on:click=move |_| desk.pack()>"case with record"</button>
                    })}
                    {move || desk.sheet.with(Option::is_some).then(|| view! {
                        <button class="quiet" data-role="result" on:click=move |_| save::result(desk)>"result"</button>
                    })}
                </span>
                <span class="note" role="status" data-role="keeping">{move || desk.keeping.get().words()}</span>
            </div>
            {move || several.get().then(|| steps(desk))}
            {notes(desk)}
            {kept(desk)}
        </section>
    }
}

fn steps(desk: Desk) -> impl IntoView {
    let count = move || desk.trail.with(|trail| format!("{} of {}", trail.at + 1, trail.words.len()));
    let list = move || {
        desk.trail.with(|trail| {
            let at = trail.at;
            let one = |(i, words): (usize, &String)| {
                let words = words.clone();
                let undone = i > at;
                view! {
                    <li class:later=undone aria-current=(i == at).then_some("step")>
                        <button class="quiet" on:click=move |_| desk.go(i)>{words}</button>
                    </li>
                }
            };
            trail.words.iter().enumerate().map(one).collect_view()
        })
    };
    fold("Steps", count, false, move || view! { <ol class="steps">{list}</ol> })
}

fn notes(desk: Desk) -> impl IntoView {
    let notes = Memo::new(move |_| desk.case.with(|case| case.word(&["notes"]).to_owned()));
    let write = move |event| {
        let notes = event_target_value(&event);
        desk.type_words(|case| case.put(&["notes"], notes.as_str()));
    };
    let count = move || if notes.with(String::is_empty) { "none" } else { "written" }.to_owned();
    fold("Notes", count, false, move || {
        view! {
            <textarea aria-label="Notes on the case" rows="5" maxlength="20000" prop:value=move || notes.get() on:input=write></textarea>
            <p class="note">"They travel with the case."</p>
        }
    })
}

fn kept(desk: Desk) -> impl IntoView {
    let state = desk.keeping;
    let count = move || match desk.kept.with(Vec::len) {
        0 => "none".to_owned(),
        count => count.to_string(),
    };
    let off = Memo::new(move |_| matches!(state.get(), Keeping::Nothing));
    let controls = move || {
        if off.get() {
            return view! {
                <p><button data-role="keep-again" on:click=move |_| keep::again(desk)>"Keep cases in this browser"</button></p>
            }
            .into_any();
        }
        let record = move || !matches!(state.get(), Keeping::On { record: false });
        view! {
            <p class="group">
                {super::field::tick("keep the record too", record, move |yes| keep::set_record(desk, yes))}
                <button data-role="keep-nothing" on:click=move |_| keep::nothing(desk)>"Keep nothing on this computer"</button>
            </p>
        }
        .into_any()
    };
    let list = move || desk.kept.get().into_iter().map(|kept| entry(desk, kept)).collect_view();
    fold("Kept in this browser", count, false, move || {
        view! {
            <ul class="kept">{list}</ul>
            {controls}
            <p class="note">
                "Browsers may remove what a page keeps, to make room or when their data are cleared: the case file is the safe copy. "
                "Nothing of it leaves this computer."
            </p>
        }
    })
}

fn entry(desk: Desk, kept: Kept) -> impl IntoView {
    let Kept { id, name, record, damaged, .. } = kept.clone();
    let words = if damaged.is_some() {
        "cannot be read any more; save what is left of it, or remove it".to_owned()
    } else {
        format!("{}, {}", kept.when(), if record { "with its record" } else { "without its record" })
    };
    let act = if damaged.is_some() {
        view! { <button class="quiet" on:click=move |_| keep::rescue(desk, &kept)>"Save what is left"</button> }.into_any()
    } else {
        view! { <button class="quiet" data-role="open-kept" on:click=move |_| keep::open(desk, kept.clone())>"Open"</button> }.into_any()
    };
    view! {
        <li>
            <b>{name}</b><span class="note">{words}</span>{act}
            <button class="quiet" data-role="remove-kept" on:click=move |_| keep::remove(desk, id.clone())>"Remove"</button>
        </li>
    }
}
