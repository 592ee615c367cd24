//! The title block, and the rail of stations in its two forms: beside the sheet, and as a line of contents on a phone.

use gloo::events::EventListener;
use leptos::prelude::*;

use millpond::sheet::Sheet;

use super::desk::Desk;
use super::screen;
use super::station::{LATER, PLACES, Place};
use super::tree::Tree;

/// The title block across the top.
pub(crate) fn title_block(desk: Desk) -> impl IntoView {
    let entry = move |name: &'static str, pick: fn(&Sheet) -> String, lacks: &'static str| {
        let words = Memo::new(move |_| {
            let words = desk.of(pick);
            if words.is_empty() { lacks.to_owned() } else { words }
        });
        view! { <div><dt>{name}</dt><dd>{move || words.get()}</dd></div> }
    };
    let changed = Memo::new(move |_| desk.case.with(|case| *case != Tree::untouched()));
    Effect::new(move || {
        let site = desk.of(|sheet| sheet.site.clone());
        document().set_title(&if site.is_empty() {
            "Millpond".to_owned()
        } else {
            format!("{site}: Millpond")
        });
    });
    view! {
        <header class="block">
            <h1 class="brand">
                <svg width="30" height="26" viewBox="0 0 30 26" aria-hidden="true">
                    <path class="wm" d="M9 3h12l-6 8zM2 13.5h26M6 18h18M10.5 22.5h9"></path>
                </svg>
                <span>"Millpond"</span>
            </h1>
            <dl>
                {entry("Site", |sheet| sheet.site.clone(), "none yet")}
                {entry("Record", |sheet| sheet.heads.record.clone(), "–")}
                {entry("Connection", |sheet| sheet.heads.connection.clone(), "–")}
                {entry("Clock", |sheet| sheet.heads.clock.clone(), "–")}
                <div>
                    <dt>"Case"</dt>
                    <dd>
                        {move || if changed.get() { "changed" } else { "as guessed" }}
                    </dd>
                </div>
                {entry("Version", |sheet| sheet.heads.version.clone(), env!("CARGO_PKG_VERSION"))}
            </dl>
        </header>
    }
}

/// The rail beside the sheet.
pub(crate) fn rail(desk: Desk) -> impl IntoView {
    view! { <nav class="rail" aria-label="Stations">{list(desk, in_view())}</nav> }
}

/// The line of contents that takes the rail's place on a narrow screen.
pub(crate) fn contents_line(desk: Desk) -> impl IntoView {
    let current = in_view();
    let here = move || PLACES[current.get()];
    let node = NodeRef::<leptos::html::Details>::new();
    let close = move |_| {
        if let Some(details) = node.get_untracked() {
            details.set_open(false);
        }
    };
    view! {
        <details class="where" node_ref=node>
            <summary>
                <span>{move || format!("{} {}", here().number, here().name)}</span>
                <span class="fg">{move || line(desk, here())}</span>
            </summary>
            <nav aria-label="Stations" on:click=close>{list(desk, current)}</nav>
        </details>
    }
}

fn list(desk: Desk, current: Memo<usize>) -> impl IntoView {
    let entries = PLACES.into_iter().enumerate().map(move |(i, place)| {
        let warning = Memo::new(move |_| {
            let failed = i == 0 && desk.status.with(|status| status.fault.is_some());
            if failed { "the work stopped".to_owned() } else { desk.of(|sheet| (place.of)(sheet).warning.clone()) }
        });
        view! {
            <li
                class:later=move || i != 0 && desk.sheet.with(Option::is_none)
                aria-current=move || (current.get() == i).then_some("step")
            >
                <a href=format!("#{}", place.id)>
                    <span class="nm">{place.name}</span>
                    <span class="fg">{move || line(desk, place)}</span>
                    {move || (!warning.get().is_empty()).then(|| view! { <span class="wn">{warning.get()}</span> })}
                </a>
            </li>
        }
    });
    let later = LATER.into_iter().map(|(name, lacks)| {
        view! { <li class="later"><span class="still"><span class="nm">{name}</span><span class="fg">{lacks}</span></span></li> }
    });
    view! { <ol>{entries.collect_view()}{later.collect_view()}</ol> }
}

/// The one figure of a station, or what it lacks.
fn line(desk: Desk, place: Place) -> String {
    let figure = desk.of(|sheet| (place.of)(sheet).rail.clone());
    if figure.is_empty() { place.lacks.to_owned() } else { figure }
}

/// Which station is in view: the last whose heading has passed the upper third of the window.
fn in_view() -> Memo<usize> {
    let moved = RwSignal::new(());
    for name in ["scroll", "resize"] {
        EventListener::new(&window(), name, move |_| moved.set(())).forget();
    }
    Memo::new(move |_| {
        moved.get();
        let line = screen::height() / 3.0;
        let tops = screen::tops(&PLACES.map(|place| place.id));
        tops.iter().rposition(|top| top.is_some_and(|top| top < line)).unwrap_or(0)
    })
}
