//! What every station has: heading, sentence, state; and the line at the foot of the window while something is computed.

use leptos::prelude::*;

use millpond::fault::Fault;
use millpond::sheet::{Sheet, Station};
use millpond::units::people;

use super::desk::Desk;

/// A station's place on the sheet.
#[derive(Clone, Copy)]
pub(crate) struct Place {
    /// Its number.
    pub(crate) number: u8,
    /// Its identifier, in lower case.
    pub(crate) id: &'static str,
    /// Its name.
    pub(crate) name: &'static str,
    /// What it says.
    pub(crate) of: fn(&Sheet) -> &Station,
    /// What is missing as long as there is no sheet.
    pub(crate) lacks: &'static str,
}

/// The stations that have contents, in order.
pub(crate) const PLACES: [Place; 4] = [
    Place { number: 1, id: "record", name: "Record", of: |sheet| &sheet.record, lacks: "no file yet" },
    Place { number: 2, id: "duty", name: "Duty", of: |sheet| &sheet.duty, lacks: "needs a record" },
    Place {
        number: 3,
        id: "requirement",
        name: "Requirement",
        of: |sheet| &sheet.requirement,
        lacks: "needs a duty",
    },
    Place { number: 4, id: "plane", name: "Plane", of: |sheet| &sheet.plane, lacks: "needs a requirement" },
];

/// The stations that this version does not have, and what they will need.
pub(crate) const LATER: [(&str, &str); 3] = [
    ("Simulation", "not in this version yet"),
    ("Outlook", "not in this version yet"),
    ("Statement", "not in this version yet"),
];

/// A station: its heading and sentence, then what is inside.
pub(crate) fn station(desk: Desk, place: Place, inside: impl IntoView) -> impl IntoView {
    let sentence = Memo::new(move |_| desk.of(|sheet| (place.of)(sheet).sentence.clone()));
    let busy = Memo::new(move |_| desk.status.with(|status| status.busy));
    view! {
        <section
            class="station"
            id=place.id
            data-station=place.id
            aria-labelledby=format!("h-{}", place.id)
            aria-busy=move || if busy.get() { "true" } else { "false" }
        >
            <h2 id=format!("h-{}", place.id) tabindex="-1"><span class="no">{place.number}</span>{place.name}</h2>
            {move || {
                let sentence = sentence.get();
                (!sentence.is_empty()).then(|| view! { <p class="sentence">{sentence}</p> })
            }}
            {inside}
        </section>
    }
}

/// What a station after the first shows as long as there is no sheet.
pub(crate) fn lacking(desk: Desk, words: &'static str) -> impl IntoView {
    let lacking = Memo::new(move |_| desk.sheet.with(Option::is_none));
    move || lacking.get().then(|| view! { <p class="empty">{words}</p> })
}

/// The error box: what, where, remedy.
pub(crate) fn error_box(desk: Desk) -> impl IntoView {
    let fault = Memo::new(move |_| desk.status.with(|status| status.fault.clone()));
    move || {
        fault.get().map(|Fault { what, place, remedy }| {
            view! {
                <div class="error" role="alert">
                    <b>{people::capital(&what)}</b><span class="wh">{place}</span><span>{remedy}</span>
                </div>
            }
        })
    }
}

/// The line at the foot of the window while something is computed: what, how far, Stop. It stands over the sheet, so that
/// nothing jumps, and only appears when the work takes a while.
pub(crate) fn working(desk: Desk) -> impl IntoView {
    let busy = Memo::new(move |_| desk.status.with(|status| status.busy));
    let remark = Memo::new(move |_| desk.status.with(|status| status.remark));
    let done =
        move || desk.status.with(|status| status.progress.as_ref().map_or(0.0, |progress| progress.done));
    let words = move || {
        desk.status.with(|status| match &status.progress {
            Some(progress) => {
                format!("{}, {}", people::capital(&progress.what), people::percent(progress.done))
            }
            None => "Computing".to_owned(),
        })
    };
    view! {
        <div class="working" role="status">
            {move || busy.get().then(|| view! {
                <div class="busy">
                    <span aria-hidden="true">{words}</span>
                    <button on:click=move |_| desk.stop()>"Stop"</button>
                    <progress class="bar" aria-label="Share done" max="1" value=done></progress>
                    {move || desk.sheet.with(Option::is_some).then(|| view! {
                        <span class="note">"The figures on the sheet are still those of the case before."</span>
                    })}
                </div>
            })}
            {move || (!remark.get().is_empty()).then(|| view! { <p class="busy said">{remark.get()}</p> })}
        </div>
    }
}
