//! The verdict list: a row a kind, with its verdict, eight small marks, its mass, and the number that decided.

use leptos::prelude::*;

use millpond::chart::Verdict;
use millpond::numeric::rising;
use millpond::technology::{Criterion, Screened};
use millpond::units::people;

use super::desk::Desk;
use super::picture::pick;

/// The columns of small marks, and the criteria that each sums up.
const COLUMNS: [(&str, &[Criterion]); 8] = [
    ("power", &[Criterion::DischargePower, Criterion::ChargePower, Criterion::PlantSize]),
    ("energy", &[Criterion::Energy, Criterion::Duration]),
    ("speed", &[Criterion::Ramp, Criterion::Response, Criterion::Transfer]),
    ("losses", &[Criterion::RoundTripEfficiency]),
    ("holding", &[Criterion::SelfDischarge]),
    ("cycles", &[Criterion::Cycles, Criterion::ServiceLife]),
    ("mass", &[Criterion::Mass, Criterion::Volume]),
    ("site", &[Criterion::Ambient, Criterion::Siting, Criterion::Market]),
];

const LETTERS: [(&str, &str); 4] = [("A", "a"), ("B", "b"), ("C", "c"), ("D", "d")];

/// The marks' drawings, used by reference.
pub(crate) fn symbols() -> impl IntoView {
    view! {
        <svg class="vh" width="0" height="0" aria-hidden="true"><defs>
            <symbol id="v-carries" viewBox="0 0 12 12"><rect class="v-ink" x="1" y="1" width="10" height="10"></rect></symbol>
            <symbol id="v-strains" viewBox="0 0 12 12">
                <rect class="v-pap" x="1" y="1" width="10" height="10"></rect>
                <path class="v-h" d="M1 6.5L6.5 1M1 11L11 1M5.5 11L11 5.5"></path>
            </symbol>
            <symbol id="v-fails" viewBox="0 0 12 12"><rect class="v-pap" x="1" y="1" width="10" height="10"></rect></symbol>
        </defs></svg>
    }
}

/// The verdicts with their legend, the cautions and the note on what a screening is.
pub(crate) fn list(desk: Desk) -> impl IntoView {
    // Rows are made anew only when the kinds or their order change, so that a pick keeps its focus.
    let order = Memo::new(move |_| {
        let all = desk.view.with(|view| view.all_kinds);
        desk.of(|sheet| {
            let screening = &sheet.screening;
            let verdicts: Vec<f64> = screening.iter().map(|kind| f64::from(kind.verdict as u8)).collect();
            let shown = rising(&verdicts).into_iter().filter(|i| all || screening[*i].default_on);
            shown.map(|i| (i, screening[i].technology.clone())).collect::<Vec<_>>()
        })
    });
    let cautions = Memo::new(move |_| {
        let shown = order.get();
        desk.of(|sheet| {
            let kinds = shown.iter().filter_map(|(i, _)| sheet.screening.get(*i));
            let cautions = kinds.filter(|kind| !kind.hazards.is_empty());
            cautions.map(|kind| (kind.name.clone(), kind.hazards.clone())).collect::<Vec<_>>()
        })
    });
    let notes = Memo::new(move |_| desk.of(|sheet| sheet.plane.notes.clone()));
    view! {
        <h3>"Verdicts"</h3>
        <p class="legend">
            <span>{mark(Verdict::Carries, 12)}" carries: the typical value meets it with the margin"</span>
            <span>{mark(Verdict::Strains, 12)}" strains: only the good end of its range does"</span>
            <span>{mark(Verdict::Fails, 12)}" fails: not even the good end"</span>
            <span><em>"unconfirmed"</em>": the deciding number is from memory"</span>
        </p>
        <p class="note">"Pick up to four kinds as candidates A to D; they are drawn apart on the plane."</p>
        <div class="scroll" tabindex="0" role="region" aria-label="Verdicts"><table class="verdicts">
            <thead><tr>
                <td></td><th>"Kind"</th><th>"Verdict"</th>
                {COLUMNS.map(|(name, _)| view! { <th class="m">{name}</th> }).collect_view()}
                <th class="n">"Mass, t"</th><th class="n g">"at best"</th>
            </tr></thead>
            <tbody>{move || order.get().into_iter().map(|(i, id)| row(desk, i, id)).collect_view()}</tbody>
        </table></div>
        <div class="note caution">
            {move || notes.get().into_iter().map(|note| view! { <p>{note}</p> }).collect_view()}
            <p>"Cautions of the kinds shown:"</p>
            <ul>{move || cautions.get().into_iter().map(|(name, words)| view! { <li><b>{name}</b>": "{words}</li> }).collect_view()}</ul>
        </div>
    }
}

fn row(desk: Desk, at: usize, id: String) -> impl IntoView {
    let kind = Memo::new(move |_| desk.of(|sheet| sheet.screening.get(at).cloned()));
    let name = kind.with_untracked(|kind| kind.as_ref().map(|kind| kind.name.clone()).unwrap_or_default());
    let verdict =
        Memo::new(move |_| kind.with(|kind| kind.as_ref().map_or(Verdict::Fails, |kind| kind.verdict)));
    let words = move |pick: fn(&Screened) -> String| {
        move || kind.with(|kind| kind.as_ref().map(pick).unwrap_or_default())
    };
    let letter = {
        let id = id.clone();
        Memo::new(move |_| desk.view.with(|view| view.picks.iter().position(|picked| *picked == id)))
    };
    let chosen = move || letter.get().and_then(|at| LETTERS.get(at).copied());
    let marks = COLUMNS.map(|(column, criteria)| {
        let judged =
            Memo::new(move |_| kind.with(|kind| kind.as_ref().and_then(|kind| worst(kind, criteria))));
        view! { <td class="m" data-c=column>{move || judged.get().map_or_else(
            || view! { <span class="na">"–"</span> }.into_any(),
            |(verdict, reason)| view! { <span title=reason>{labelled(verdict)}</span> }.into_any(),
        )}</td> }
    });
    let label = format!("Pick {name} as a candidate");
    view! {
        <tr class=move || format!("k {}", word(verdict.get()))>
            <td class="pn">
                <button class="quiet pick" aria-label=label aria-pressed=move || letter.get().is_some().to_string() on:click=move |_| pick(desk, &id)>
                    {move || chosen().map_or_else(
                        || view! { "pick" }.into_any(),
                        |(letter, class)| view! { <span class=format!("pin c-{class}")>
                            <svg width="30" height="8" aria-hidden="true"><path class=format!("st-0 dash-{class}") d="M0 4h30"></path></svg>{letter}
                        </span> }.into_any(),
                    )}
                </button>
            </td>
            <th scope="row">{name}</th>
            <td class="vd">{move || mark(verdict.get(), 12)}" "{move || word(verdict.get())}</td>
            {marks.collect_view()}
            <td class="n ms">{words(|kind| tonnes(kind.mass_kg.map(|mass| mass.typical)))}</td>
            <td class="n g">{words(|kind| tonnes(kind.mass_kg.map(|mass| mass.good)))}</td>
        </tr>
        <tr class="why">
            <td></td>
            <td colspan="10">{words(|kind| kind.deciding.clone())}</td>
            <td colspan="2" class="uc">{words(|kind| if kind.confirmed { "" } else { "unconfirmed" }.to_owned())}</td>
        </tr>
    }
}

/// The worst verdict among some criteria, with its reason; none if none of them was judged.
fn worst(kind: &Screened, criteria: &[Criterion]) -> Option<(Verdict, String)> {
    let judged = kind.criteria.iter().filter(|judged| criteria.contains(&judged.quantity));
    judged.max_by_key(|judged| judged.verdict).map(|judged| (judged.verdict, judged.reason.clone()))
}

const fn word(verdict: Verdict) -> &'static str {
    match verdict {
        Verdict::Carries => "carries",
        Verdict::Strains => "strains",
        Verdict::Fails => "fails",
    }
}

/// A mark beside its word.
fn mark(verdict: Verdict, size: u8) -> impl IntoView {
    view! { <svg class="mark" width=size height=size aria-hidden="true"><use href=format!("#v-{}", word(verdict))></use></svg> }
}

/// A mark that stands alone, named for readers.
fn labelled(verdict: Verdict) -> impl IntoView {
    view! {
        <svg class="mark" width="10" height="10" role="img" aria-label=word(verdict)><use href=format!("#v-{}", word(verdict))></use></svg>
    }
}

fn tonnes(kg: Option<f64>) -> String {
    kg.map_or_else(|| "–".to_owned(), |kg| people::significant(kg / 1000.0, 3))
}
