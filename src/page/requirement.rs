//! Station 3, the requirement: coverage, the deciding week, the cumulative curve, criteria and bands.

use leptos::prelude::*;

use millpond::units::asked::Asked;
use millpond::units::people;

use super::desk::Desk;
use super::drawing::Which;
use super::field::{Empty, Field, input};
use super::figures::{all_figures, figures};
use super::fold::{fold, method, methods_from};
use super::picture::picture;
use super::station::{self, PLACES};

const SERVED: Field = Field {
    asked: Asked::Share,
    name: "Share of the deficit served",
    size: 5,
    path: &["requirement", "served_share"],
    empty: Empty::Nothing,
};

const POWER: Field = Field {
    asked: Asked::Power,
    name: "Greatest power",
    size: 8,
    path: &["requirement", "served_power_kw"],
    empty: Empty::Nothing,
};

const CHARGE: Field = Field {
    asked: Asked::Share,
    name: "Charge efficiency",
    size: 5,
    path: &["requirement", "charge_efficiency"],
    empty: Empty::As(1.0),
};

const DISCHARGE: Field = Field {
    asked: Asked::Share,
    name: "Discharge efficiency",
    size: 5,
    path: &["requirement", "discharge_efficiency"],
    empty: Empty::As(1.0),
};

const DEPTH: Field = Field {
    asked: Asked::Share,
    name: "Usable depth",
    size: 5,
    path: &["requirement", "depth"],
    empty: Empty::Shown(0.9),
};

const END: Field = Field {
    asked: Asked::Share,
    name: "Capacity left at end of life",
    size: 5,
    path: &["requirement", "end_of_life"],
    empty: Empty::Shown(0.8),
};

const MARGIN: Field = Field {
    asked: Asked::Share,
    name: "Margin on nameplate energy",
    size: 5,
    path: &["requirement", "margin"],
    empty: Empty::Shown(0.0),
};

/// The station.
pub(crate) fn station(desk: Desk) -> impl IntoView {
    let place = PLACES[2];
    let has_sheet = Memo::new(move |_| desk.sheet.with(Option::is_some));
    let notes = Memo::new(move |_| desk.of(|sheet| sheet.requirement.notes.clone()));
    let has_week = Memo::new(move |_| desk.of(|sheet| sheet.pictures.week.is_some()));
    station::station(
        desk,
        place,
        view! {
            {station::lacking(desk, "Needs a duty: from it follow energies, powers, ramps, cycling and holding time.")}
            {figures(desk, place.of, 0)}
            {move || has_sheet.get().then(|| view! {
                <div class="work">
                    {terms(desk)}
                    {move || notes.get().into_iter().map(|note| view! { <p class="note">{note}</p> }).collect_view()}
                </div>
                <div class="pair">{picture(desk, Which::Coverage)}{figures(desk, place.of, 1)}</div>
                <div class="work">{method(desk, place.of, 0)}</div>
                {move || has_week.get().then(|| view! {
                    <div class="pair">{picture(desk, Which::Week)}{figures(desk, place.of, 2)}</div>
                    <div class="work">{method(desk, place.of, 1)}</div>
                })}
                <div class="pair">{picture(desk, Which::Cumulative)}{figures(desk, place.of, 3)}</div>
                <div class="work">{method(desk, place.of, 2)}</div>
                <div class="full">
                    {criteria(desk)}
                    {bands(desk)}
                    {coverage(desk)}
                    {methods_from(desk, place.of, 3)}
                    {all_figures(desk, &["requirement", "simulations"])}
                </div>
            })}
        },
    )
}

fn terms(desk: Desk) -> impl IntoView {
    let limits = Memo::new(move |_| desk.of(|sheet| sheet.terms.kind == "limits"));
    let served = move || desk.of(|sheet| people::percent(sheet.terms.served_share).to_string());
    let power = move || desk.of(|sheet| people::power(sheet.terms.power_kw).to_string());
    let word = move || {
        if desk.of(|sheet| sheet.heads.connection == "connected") { "the import" } else { "the deficit" }
    };
    let charge = move || desk.of(|sheet| people::percent(sheet.terms.charge_efficiency).to_string());
    let discharge = move || desk.of(|sheet| people::percent(sheet.terms.discharge_efficiency).to_string());
    let none = String::new;
    view! {
        <ol class="terms">
            {move || (!limits.get()).then(|| view! {
                <li>"Serve "{input(desk, SERVED, served)}" of "{word}", with at most "{input(desk, POWER, power)}" both ways."</li>
            })}
            <li>
                "Of what is charged "{input(desk, CHARGE, charge)}" reaches the store, of what leaves it "
                {input(desk, DISCHARGE, discharge)}" the connection."
            </li>
            <li>
                "Of nameplate "{input(desk, DEPTH, none)}" is used, "{input(desk, END, none)}
                " left at end of life; add a margin of "{input(desk, MARGIN, none)}"."
            </li>
        </ol>
    }
}

fn criteria(desk: Desk) -> impl IntoView {
    let rows = Memo::new(move |_| desk.of(|sheet| sheet.criteria.clone()));
    view! {
        <h3>"Criteria"</h3>
        <div class="scroll" tabindex="0" role="region" aria-label="Criteria"><table class="criteria">
            <thead><tr>
                <th>"Quantity"</th><th>"Bound"</th><th class="n">"Value"</th><th>"Unit"</th><th>"Origin"</th><th>"From"</th><th>"Sure"</th>
            </tr></thead>
            <tbody>{move || rows.get().into_iter().map(criterion).collect_view()}</tbody>
        </table></div>
    }
}

fn criterion(row: Vec<String>) -> impl IntoView {
    // Each cell's class, by its place; a row's class is its origin.
    const CLASSES: [&str; 7] = ["", "bd", "n", "", "or", "fr", "su"];
    let origin = row.get(4).cloned().unwrap_or_default();
    let mut cells = row.into_iter();
    let head = cells.next();
    let cells = cells.zip(CLASSES.into_iter().skip(1));
    view! {
        <tr class=origin>
            <th scope="row">{head}</th>
            {cells.map(|(cell, class)| view! { <td class=class>{cell}</td> }).collect_view()}
        </tr>
    }
}

/// A row of words and numbers: a head, then numbers.
fn numbers(row: Vec<String>) -> impl IntoView {
    let mut cells = row.into_iter();
    let head = cells.next();
    view! {
        <tr>
            <th scope="row">{head}</th>
            {cells.map(|cell| view! { <td class="n">{cell}</td> }).collect_view()}
        </tr>
    }
}

fn bands(desk: Desk) -> impl IntoView {
    let rows = Memo::new(move |_| desk.of(|sheet| sheet.bands.clone()));
    fold(
        "Time-scale bands",
        move || format!("{} bands, which add up to the net power", rows.with(Vec::len)),
        false,
        move || {
            view! {
                <div class="scroll" tabindex="0" role="region" aria-label="Time-scale bands"><table>
                    <thead><tr>
                        <th>"Changes"</th><th class="n">"Charge, kW"</th><th class="n">"Discharge, kW"</th><th class="n">"Energy, kWh"</th>
                    </tr></thead>
                    <tbody>{move || rows.get().into_iter().map(numbers).collect_view()}</tbody>
                </table></div>
            }
        },
    )
}

fn coverage(desk: Desk) -> impl IntoView {
    let rows = Memo::new(move |_| desk.of(|sheet| sheet.coverage.clone()));
    fold("Least capacity for a power and an unserved share", String::new, false, move || {
        view! {
            <div class="scroll" tabindex="0" role="region" aria-label="Least capacity"><table>
                <thead><tr><th>"Power both ways"</th><th class="n">"Unserved, %"</th><th class="n">"Capacity inside, kWh"</th></tr></thead>
                <tbody>{move || rows.get().into_iter().map(numbers).collect_view()}</tbody>
            </table></div>
        }
    })
}
