//! Station 4, the plane: where the requirement stands among the kinds of storage, and which of them could do it.

use leptos::prelude::*;

use millpond::units::asked::Asked;

use super::desk::Desk;
use super::drawing::Which;
use super::field::{Empty, Field, answer, choice, input, tick};
use super::figures::{all_figures, figures};
use super::fold::{method, methods_from};
use super::picture::{BASES, picture};
use super::station::{self, PLACES};
use super::verdicts;

const MASS: Field = Field {
    asked: Asked::Mass,
    name: "Mass budget",
    size: 8,
    path: &["site", "mass_budget_kg"],
    empty: Empty::Nothing,
};

const VOLUME: Field = Field {
    asked: Asked::Volume,
    name: "Volume budget",
    size: 8,
    path: &["site", "volume_budget_l"],
    empty: Empty::Nothing,
};

const RESPONSE: Field = Field {
    asked: Asked::Seconds,
    name: "Time to full power",
    size: 7,
    path: &["site", "response_s"],
    empty: Empty::Nothing,
};

const TRANSFER: Field = Field {
    asked: Asked::Seconds,
    name: "Break at take-over",
    size: 7,
    path: &["site", "transfer_s"],
    empty: Empty::Nothing,
};

const LIFE: Field = Field {
    asked: Asked::Years,
    name: "Service life",
    size: 8,
    path: &["site", "service_life_years"],
    empty: Empty::Nothing,
};

const COLDEST: Field = Field {
    asked: Asked::Temperature,
    name: "Lowest air temperature",
    size: 7,
    path: &["site", "ambient_least_c"],
    empty: Empty::Nothing,
};

const WARMEST: Field = Field {
    asked: Asked::Temperature,
    name: "Highest air temperature",
    size: 7,
    path: &["site", "ambient_greatest_c"],
    empty: Empty::Nothing,
};

/// The station.
pub(crate) fn station(desk: Desk) -> impl IntoView {
    let place = PLACES[3];
    let has_sheet = Memo::new(move |_| desk.sheet.with(Option::is_some));
    station::station(
        desk,
        place,
        view! {
            {station::lacking(desk, "Needs a requirement: it is laid on the plane against what each kind can do.")}
            {figures(desk, place.of, 0)}
            {move || has_sheet.get().then(|| view! {
                <div class="work">
                    {axes(desk)}
                    {terms(desk)}
                    <p class="note">
                        "Each strand is a set of curves computed from the kind’s circuit: the heavy one typical, the fine ones from its \
                         energy-rich to its power-rich designs. Beaded: mass of the fluid only. A mark sits where the typical curve meets \
                         the requirement."
                    </p>
                </div>
                <div class="full">
                    {picture(desk, Which::Plane)}
                    {figures(desk, place.of, 1)}
                    {method(desk, place.of, 0)}
                    {verdicts::list(desk)}
                    {methods_from(desk, place.of, 1)}
                    {all_figures(desk, &["plane", "screening"])}
                </div>
            })}
        },
    )
}

fn axes(desk: Desk) -> impl IntoView {
    let answers = BASES.into_iter().map(move |(basis, words)| {
        answer(
            "basis",
            words,
            move || desk.view.with(|view| view.basis == basis),
            move || desk.look(|view| view.basis = basis),
        )
    });
    view! {
        <fieldset class="ask seg">
            <legend>"By"</legend>
            {answers.collect_view()}
            {tick("all kinds, also those a site can hardly buy", move || desk.view.with(|view| view.all_kinds), move |all| {
                desk.look(|view| view.all_kinds = all);
            })}
        </fieldset>
    }
}

fn terms(desk: Desk) -> impl IntoView {
    let any = || "any".to_owned();
    let places = vec![
        (None, "indoors or outdoors".to_owned()),
        (Some(true), "indoors".to_owned()),
        (Some(false), "outdoors".to_owned()),
    ];
    view! {
        <ol class="terms">
            <li>"The store may weigh "{input(desk, MASS, any)}" and take up "{input(desk, VOLUME, any)}"."</li>
            <li>
                "It reaches full power within "{input(desk, RESPONSE, any)}" and takes over after a break of at most "
                {input(desk, TRANSFER, any)}"."
            </li>
            <li>
                "It serves "{input(desk, LIFE, any)}", in air from "{input(desk, COLDEST, any)}" to "{input(desk, WARMEST, any)}", "
                {choice("Where it stands", places, move || desk.case.with(|case| case.flag(&["site", "indoors"])),
                    move |indoors| desk.edit(|case| case.put(&["site", "indoors"], indoors)))}
                "."
            </li>
        </ol>
    }
}
