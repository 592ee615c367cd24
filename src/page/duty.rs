//! Station 2, the duty: islanded or connected, what storage is asked, net power, its episodes.

use leptos::prelude::*;

use millpond::case::Connection;
use millpond::sheet::EpisodeRow;
use millpond::units::asked::Asked;
use millpond::units::people;

use super::desk::Desk;
use super::drawing::Which;
use super::field::{Empty, Field, answer, choice, input_with, named, tick};
use super::figures::{all_figures, figures};
use super::fold::{fold, method, methods_from};
use super::picture::{picture, show_window};
use super::station::{self, PLACES};
use super::tree::Tree;

/// Episodes that stand open.
const FIRST: usize = 5;

/// What can be asked, as a person says it.
#[derive(Clone, Copy, PartialEq, Eq)]
enum Kind {
    Balance,
    Limits,
    Given,
    /// Another duty, from a case file or a demo site.
    Own,
}

const IMPORT: Field = Field {
    asked: Asked::Power,
    name: "Import limit",
    size: 9,
    path: &["duty", "import_limit_kw"],
    empty: Empty::Nothing,
};

const EXPORT: Field = Field {
    asked: Asked::Power,
    name: "Export limit",
    size: 9,
    path: &["duty", "export_limit_kw"],
    empty: Empty::Nothing,
};

const SIGNS: [(&str, &str); 2] = [("charge", "charges"), ("discharge", "discharges")];

/// Makes the duty one that holds limits, if it was another.
pub(crate) fn hold_limits(case: &mut Tree) {
    if case.word(&["duty", "kind"]) != "limits" {
        case.put(&["duty"], Tree::None);
        case.put(&["duty", "kind"], "limits");
    }
}

/// The station.
pub(crate) fn station(desk: Desk) -> impl IntoView {
    let place = PLACES[1];
    let has_sheet = Memo::new(move |_| desk.sheet.with(Option::is_some));
    station::station(
        desk,
        place,
        view! {
            {station::lacking(desk, "Needs a record: the duty is read off its supply and demand.")}
            {figures(desk, place.of, 0)}
            {move || has_sheet.get().then(|| view! {
                <div class="work">{question(desk)}{terms(desk)}</div>
                <div class="pair">{picture(desk, Which::Net)}{figures(desk, place.of, 1)}</div>
                <div class="work">
                    {episodes(desk)}
                    {method(desk, place.of, 0)}
                    {methods_from(desk, place.of, 1)}
                    {all_figures(desk, &["duty"])}
                </div>
            })}
        },
    )
}

fn question(desk: Desk) -> impl IntoView {
    let connection = move || desk.of(|sheet| sheet.connection);
    let put = move |connection: &'static str| desk.edit(|case| case.put(&["site", "connection"], connection));
    let guessed = Memo::new(move |_| desk.case.with(|case| case.word(&["site", "connection"]).is_empty()));
    let note = move || desk.of(|sheet| sheet.duty.notes.join(" "));
    view! {
        <fieldset class="ask">
            <legend>"Is the site islanded or connected to a grid?"</legend>
            {answer("connection", "islanded", move || connection() == Some(Connection::Islanded), move || put("islanded"))}
            {answer("connection", "connected", move || connection() == Some(Connection::Connected), move || put("connected"))}
            {move || (!guessed.get()).then(|| view! {
                <button class="quiet" on:click=move |_| put("")>"Guess again"</button>
            })}
            <span class="note">{note}</span>
        </fieldset>
    }
}

fn terms(desk: Desk) -> impl IntoView {
    let kind = Memo::new(move |_| {
        let in_force = desk.of(|sheet| sheet.terms.kind.clone());
        desk.case.with(|case| match case.word(&["duty", "kind"]) {
            "limits" => Kind::Limits,
            "given" => Kind::Given,
            "guess" | "" if in_force == "limits" => Kind::Limits,
            "guess" | "" | "balance" => Kind::Balance,
            _ => Kind::Own,
        })
    });
    let columns = Memo::new(move |_| {
        desk.of(|sheet| {
            let columns = sheet.reading.files.iter().flat_map(|file| &file.columns);
            columns
                .filter(|column| !column.unit.is_empty())
                .map(|column| column.header.clone())
                .collect::<Vec<_>>()
        })
    });
    let put = move |kind: Kind| {
        let column = columns.with_untracked(|columns| columns.first().cloned());
        if kind == Kind::Own {
            return;
        }
        desk.edit(|case| {
            case.put(&["duty"], Tree::None);
            match (kind, column) {
                (Kind::Given, Some(column)) => {
                    case.put(&["duty", "kind"], "given");
                    case.put(&["duty", "column"], column.as_str());
                }
                (Kind::Limits, _) => hold_limits(case),
                _ => case.put(&["duty", "kind"], "balance"),
            }
        });
    };
    let kinds = move || {
        let mut kinds = vec![
            (Kind::Balance, "serve deficits from surplus".to_owned()),
            (Kind::Limits, "hold limits at the grid connection".to_owned()),
        ];
        if columns.with(|columns| !columns.is_empty()) {
            kinds.push((Kind::Given, "carry the power of a column".to_owned()));
        }
        if kind.get() == Kind::Own {
            kinds.push((Kind::Own, "do what the case file says".to_owned()));
        }
        kinds
    };
    view! {
        <ol class="terms">
            <li>"Storage is asked to "{move || choice("What storage is asked", kinds(), move || kind.get(), put)}"."</li>
            {move || match kind.get() {
                Kind::Balance => ().into_any(),
                // The engine's sentence states the terms in force.
                Kind::Own => view! { <li>{move || desk.of(|sheet| sheet.duty.sentence.clone())}</li> }.into_any(),
                Kind::Limits => limit_terms(desk).into_any(),
                Kind::Given => given_terms(desk, columns).into_any(),
            }}
        </ol>
    }
}

fn limit_terms(desk: Desk) -> impl IntoView {
    let in_force = move |pick: fn(&millpond::sheet::Terms) -> Option<f64>| {
        move || match desk.of(|sheet| pick(&sheet.terms)) {
            Some(kw) => people::power(kw).to_string(),
            None => "no limit".to_owned(),
        }
    };
    // A duty that was guessed becomes one that was chosen as soon as one of its terms is.
    let allowed = move |words, name: &'static str, usual: bool| {
        tick(
            words,
            move || desk.case.with(|case| case.flag(&["duty", name]).unwrap_or(usual)),
            move |yes| {
                desk.edit(|case| {
                    hold_limits(case);
                    case.put(&["duty", name], yes);
                });
            },
        )
    };
    view! {
        <li>"Keep import at or below "{input_with(desk, IMPORT, in_force(|terms| terms.import_limit_kw), hold_limits)}"."</li>
        <li>"Keep export at or below "{input_with(desk, EXPORT, in_force(|terms| terms.export_limit_kw), hold_limits)}"."</li>
        <li>{allowed("recharge from the grid, below the import limit", "recharge_from_grid", true)}</li>
        <li>{allowed("discharge to the grid, below the export limit", "discharge_to_grid", false)}</li>
    }
}

fn given_terms(desk: Desk, columns: Memo<Vec<String>>) -> impl IntoView {
    let at = move || {
        let named = desk.case.with(|case| case.word(&["duty", "column"]).to_owned());
        columns.with(|columns| columns.iter().position(|column| *column == named).unwrap_or(0))
    };
    let names = move || columns.get().into_iter().enumerate().collect::<Vec<_>>();
    view! {
        <li>
            "Carry "
            {move || choice("Column to carry", names(), at, move |at| {
                let name = columns.with_untracked(|columns| columns.get(at).cloned());
                desk.edit(|case| case.put(&["duty", "column"], name.as_deref()));
            })}
            ", where a positive value "
            {named(desk, "A positive value", &["duty", "positive"], &SIGNS)}
            " the store."
        </li>
    }
}

fn episodes(desk: Desk) -> impl IntoView {
    let rows = Memo::new(move |_| desk.of(|sheet| sheet.episodes.clone()));
    let table = move |name: &'static str, from: usize, to: usize| {
        view! {
            <div class="scroll" tabindex="0" role="region" aria-label=name><table class="episodes">
                <thead><tr>
                    <th>"Began"</th><th class="ended">"Ended"</th><th class="n">"Hours"</th><th class="n">"Energy, kWh"</th><th class="n">"Peak, kW"</th>
                </tr></thead>
                <tbody>{move || rows.get().into_iter().take(to).skip(from).map(|row| episode(desk, row)).collect_view()}</tbody>
            </table></div>
        }
    };
    let further = Memo::new(move |_| rows.with(Vec::len).saturating_sub(FIRST));
    view! {
        {fold("Episodes", || "the largest first".to_owned(), true, move || table("Episodes", 0, FIRST))}
        {move || (further.get() > 0).then(|| {
            fold("Further episodes", move || further.get().to_string(), false, move || table("Further episodes", FIRST, usize::MAX))
        })}
    }
}

fn episode(desk: Desk, row: EpisodeRow) -> impl IntoView {
    let EpisodeRow { began, ended, from_us, to_us, hours, energy_kwh, peak_kw } = row;
    let name = format!("Show from {began} in the picture");
    view! {
        <tr>
            <td><button class="quiet" aria-label=name on:click=move |_| show_window(desk, from_us, to_us)>{began}</button></td>
            <td class="ended">{ended}</td>
            <td class="n">{people::plain(hours, 2)}</td>
            <td class="n">{people::significant(energy_kwh, 4)}</td>
            <td class="n">{people::significant(peak_kw, 3)}</td>
        </tr>
    }
}
