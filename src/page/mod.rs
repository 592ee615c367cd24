//! The page: one sheet with a station per stage, each in its own file. It lays out what the engine computed, and computes
//! nothing itself.

mod case_line;
mod desk;
mod drawing;
mod duty;
mod field;
mod figures;
mod findings;
mod fold;
mod head;
mod intake;
mod keep;
mod picture;
mod plane;
mod reading;
mod readout;
mod record;
mod requirement;
mod save;
mod screen;
mod station;
mod steps;
mod tables;
mod tree;
mod verdicts;

use leptos::prelude::*;

use desk::Desk;

/// Mounts the page.
pub(crate) fn mount() {
    mount_to_body(sheet);
}

fn sheet() -> impl IntoView {
    let desk = Desk::new();
    steps::listen(desk);
    let asked_for = intake::listen(desk);
    keep::begin(desk, asked_for);
    desk.settle_soon();
    view! {
        <a class="skip" href="#record">"To the stations"</a>
        {verdicts::symbols()}
        <div class="sheet">
            {head::title_block(desk)}
            {case_line::line(desk)}
            {head::contents_line(desk)}
            <div class="cols">
                {head::rail(desk)}
                <main>
                    {record::station(desk)}
                    {duty::station(desk)}
                    {requirement::station(desk)}
                    {plane::station(desk)}
                </main>
            </div>
        </div>
        {station::working(desk)}
    }
}
