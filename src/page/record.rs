//! Station 1, the record: files, how they were read, what was found, the year at a glance.

use leptos::prelude::*;

use super::desk::Desk;
use super::drawing::Which;
use super::figures::{all_figures, figures};
use super::fold::method;
use super::picture::picture;
use super::station::{self, PLACES};
use super::{findings, intake, reading};

/// The station.
pub(crate) fn station(desk: Desk) -> impl IntoView {
    let place = PLACES[0];
    let has_sheet = Memo::new(move |_| desk.sheet.with(Option::is_some));
    station::station(
        desk,
        place,
        view! {
            {move || (!has_sheet.get()).then(|| view! {
                <p class="sentence">
                    "Hand over a site’s meter file. The sheet then says what a store would have to do there, and which kinds could do it."
                </p>
            })}
            {figures(desk, place.of, 0)}
            <div class="work">
                {station::error_box(desk)}
                {intake::place(desk)}
                {move || has_sheet.get().then(|| view! {
                    {reading::as_read(desk)}
                    {findings::list(desk)}
                })}
            </div>
            {move || has_sheet.get().then(|| view! {
                <div class="pair">{picture(desk, Which::Year)}{figures(desk, place.of, 1)}</div>
                <div class="work">
                    {method(desk, place.of, 0)}
                    {all_figures(desk, &["record"])}
                </div>
            })}
        },
    )
}
